import { linearFit } from '../signal/line.ts';
import { mean, meanWithin, median, quantile, standardDeviation } from '../signal/statistics.ts';
import type { Clamp, Signal, StatedStimulus, Stimulus, StimulusKind } from './types.ts';

/** A stretch of the command at one level. Times are s from the start of the sweep; the last ends with the trace. */
export interface Level {
  from_s: number;
  to_s: number;
  level: number;
}

/** Everything read off a command trace. */
export interface CommandReading {
  stimulus: Stimulus;
  /** The trace as a row of levels; a ramp or noise counts as one level, its mean. Empty without a trace. */
  levels: Level[];
  /** Spread of the samples at holding, pA or mV; null without a trace. */
  holding_sd: number | null;
  /** What a reader of the numbers must know. */
  remarks: string[];
}

/** Differences below this many pA or mV are rounding, whatever the trace. */
const rounding = 1e-6;

/**
 * Finds the stimulus in its own trace, relative to its own noise and holding level, so also at a fraction of a
 * picoampere. Without a readable trace the statement is taken; without either the kind is `unknown`.
 *
 * @param command injected current, pA (current clamp), or command potential, mV (voltage clamp)
 * @param stated what a sidecar or the file says; used only where there is no trace. It is taken to say everything:
 *   outside a stated step, and throughout a stated `none`, the commanded current is 0
 */
export function findStimulus(
  command: Signal | null,
  stated: StatedStimulus | null,
  clamp: Clamp = 'current',
): Stimulus {
  return readCommand(command, stated, clamp).stimulus;
}

/** As `findStimulus`, with the levels and remarks that measuring needs besides. */
export function readCommand(command: Signal | null, stated: StatedStimulus | null, clamp: Clamp): CommandReading {
  if (command && command.samples.length > 0) {
    const filled = withGapsFilled(command.samples);
    if (filled) {
      const found = fromChannel(filled, command, clamp);
      if (stated?.kind === 'step' && disagrees(stated, found.stimulus))
        found.remarks.push('the stated stimulus differs from the recorded one; the recorded one is used');
      return found;
    }
  }
  const remarks =
    command && command.samples.length > 0 ? ['no sample of the stimulus channel could be read'] : ([] as string[]);
  return { stimulus: fromStatement(stated), levels: [], holding_sd: null, remarks };
}

function fromStatement(stated: StatedStimulus | null): Stimulus {
  if (stated?.kind === 'step' && stated.end_s > stated.start_s && stated.pa !== 0)
    return {
      kind: 'step',
      from: 'stated',
      onset_s: stated.start_s,
      end_s: stated.end_s,
      amplitude: stated.pa,
      holding: 0,
      edges_s: [stated.start_s, stated.end_s],
    };
  const none = stated?.kind === 'none' || stated?.kind === 'step';
  return {
    kind: none ? 'none' : 'unknown',
    from: none ? 'stated' : 'absent',
    onset_s: null,
    end_s: null,
    amplitude: null,
    holding: none ? 0 : null,
    edges_s: [],
  };
}

function disagrees(stated: { start_s: number; end_s: number; pa: number }, found: Stimulus): boolean {
  if (found.kind !== 'step') return stated.pa !== 0;
  return (
    Math.abs(found.amplitude! - stated.pa) > 0.1 * Math.abs(stated.pa) + 2 ||
    Math.abs(found.onset_s! - stated.start_s) > 0.002 ||
    Math.abs(found.end_s! - stated.end_s) > 0.002
  );
}

/** Missing samples take the last readable value; null where nothing can be read. */
function withGapsFilled(samples: Float64Array): Float64Array | null {
  const first = samples.findIndex(Number.isFinite);
  if (first < 0) return null;
  const out = samples.slice();
  out.fill(samples[first]!, 0, first);
  for (let i = first; i < out.length; i++) if (!Number.isFinite(out[i]!)) out[i] = out[i - 1]!;
  return out;
}

/** A run of samples `[from, to)` at one level. */
interface Run {
  from: number;
  to: number;
  level: number;
}

function fromChannel(x: Float64Array, command: Signal, clamp: Clamp): CommandReading {
  const rate = command.rate_hz;
  const timeOf = (index: number): number => command.start_s + index / rate;
  const range = extent(x);
  const edges = range > rounding ? findEdges(x, rate, range) : [];
  const runs = levelRuns(x, edges, rate);
  const held = holdingRun(runs, clamp);
  const holding = held.level;
  const sd = standardDeviation(x.subarray(held.from, held.to)) ?? 0;

  const answer = (
    kind: StimulusKind,
    from: number | null,
    to: number | null,
    amplitude: number | null,
    edgeIndices: number[],
    remarks: string[] = [],
  ): CommandReading => ({
    stimulus: {
      kind,
      from: 'channel',
      onset_s: from === null ? null : timeOf(from),
      end_s: to === null ? null : timeOf(to),
      amplitude,
      holding,
      edges_s: edgeIndices.map(timeOf),
    },
    levels: runs.map((run) => ({ from_s: timeOf(run.from), to_s: timeOf(run.to), level: run.level })),
    holding_sd: sd,
    remarks,
  });

  const moving = movingStretch(x, runs, range, clamp);
  if (moving) {
    const { kind, from, to } = moving;
    const holdingBefore = from > 0 ? (median(thinned(x.subarray(0, from))) ?? holding) : moving.start;
    const reading = answer(
      kind,
      from,
      to,
      moving.extreme - holdingBefore,
      [from, to].filter((i) => i > 0 && i < x.length),
    );
    reading.stimulus.holding = holdingBefore;
    if (from > 0) reading.holding_sd = standardDeviation(x.subarray(0, from)) ?? 0;
    // For noise and other waveforms no single amplitude describes it.
    if (kind !== 'ramp') reading.stimulus.amplitude = null;
    return reading;
  }

  const tolerance = 0.02 * Math.max(...runs.map((run) => Math.abs(run.level - holding)));
  const active = joinedLevels(
    runs.filter((run) => Math.abs(run.level - holding) > Math.max(tolerance, rounding)),
    holding,
  );
  if (active.length === 0 || isChatter(active, holding)) return answer('none', null, null, null, []);

  const groups = similarPulses(active, holding);
  groups.sort((a, b) => weightOf(b, holding) - weightOf(a, holding));
  const main = groups[0]!;
  const boundaries = [...new Set(active.flatMap((run) => [run.from, run.to]))]
    .filter((index) => index > 0 && index < x.length)
    .sort((a, b) => a - b);
  const amplitude = mean(main.map((run) => run.level - holding))!;
  const remarks: string[] = [];
  if (main.length >= 2 && main.every((run, k) => k === 0 || run.from > main[k - 1]!.to))
    return answer('pulse train', main[0]!.from, main.at(-1)!.to, amplitude, boundaries, remarks);
  if (groups.length > 3 && clamp === 'current')
    return answer('unknown', active[0]!.from, active.at(-1)!.to, amplitude, boundaries, [
      `the stimulus steps through ${groups.length} levels; it is not measured as one step`,
    ]);
  if (groups.length > 1)
    remarks.push(`the stimulus has ${groups.length} steps; the one that moves most charge is measured`);
  const step = clamp === 'voltage' ? largest(active, holding) : main[0]!;
  return answer('step', step.from, step.to, step.level - holding, boundaries, clamp === 'voltage' ? [] : remarks);
}

/**
 * The run that is the holding level: the first. A current that starts at some level and then stays at exactly zero is
 * a step that was already on when the sweep began.
 */
function holdingRun(runs: readonly Run[], clamp: Clamp): Run {
  const [first, second] = runs as [Run, Run?];
  const released = clamp === 'current' && runs.length === 2 && Math.abs(second!.level) <= rounding;
  return released ? second! : first;
}

/** A pulse whose edge creeps to its level is one pulse: neighbours within a tenth of its height belong together. */
function joinedLevels(active: readonly Run[], holding: number): Run[] {
  const out: Run[] = [];
  for (const run of active) {
    const last = out.at(-1);
    const height = run.level - holding;
    if (last && last.to === run.from && Math.abs(height - (last.level - holding)) <= 0.1 * Math.abs(height)) {
      const longer = run.to - run.from > last.to - last.from ? run : last;
      out[out.length - 1] = { from: last.from, to: run.to, level: longer.level };
    } else out.push(run);
  }
  return out;
}

const largest = (runs: Run[], holding: number): Run =>
  runs.reduce((best, run) => (Math.abs(run.level - holding) > Math.abs(best.level - holding) ? run : best));

const weightOf = (group: Run[], holding: number): number =>
  group.reduce((sum, run) => sum + Math.abs(run.level - holding) * (run.to - run.from), 0);

/** Pulses of equal height (10 %) and length (20 % or two samples) belong together. */
function similarPulses(active: Run[], holding: number): Run[][] {
  const groups: Run[][] = [];
  for (const run of active) {
    const height = run.level - holding;
    const length = run.to - run.from;
    const group = groups.find(([first]) => {
      const ownHeight = first!.level - holding;
      const ownLength = first!.to - first!.from;
      return (
        Math.abs(height - ownHeight) <= 0.1 * Math.abs(ownHeight) &&
        Math.abs(length - ownLength) <= Math.max(2, 0.2 * ownLength)
      );
    });
    if (group) group.push(run);
    else groups.push([run]);
  }
  return groups;
}

/** Flicker of a digitizer by one step: many short stretches of the same height, at no common length or distance. */
function isChatter(active: Run[], holding: number): boolean {
  if (active.length < 4) return false;
  const heights = active.map((run) => Math.abs(run.level - holding));
  const lengths = active.map((run) => run.to - run.from);
  const gaps = active.slice(1).map((run, k) => run.from - active[k]!.from);
  const evenHeight = Math.max(...heights) < 1.1 * Math.min(...heights);
  const uneven = (values: number[], share: number): boolean => (standardDeviation(values) ?? 0) > share * mean(values)!;
  return evenHeight && mean(lengths)! < 20 && (uneven(lengths, 0.5) || uneven(gaps, 0.3));
}

function extent(x: Float64Array): number {
  let low = x[0]!;
  let high = low;
  for (let i = 1; i < x.length; i++) {
    if (x[i]! < low) low = x[i]!;
    else if (x[i]! > high) high = x[i]!;
  }
  return high - low;
}

/** At most about 20 000 values, evenly taken: enough for an order statistic. */
function thinned(values: Float64Array): Float64Array {
  const stride = Math.ceil(values.length / 20000);
  if (stride <= 1) return values;
  const some = new Float64Array(Math.floor(values.length / stride));
  for (let i = 0; i < some.length; i++) some[i] = values[i * stride]!;
  return some;
}

/** Sizes of such values. */
function thinnedSizes(values: Float64Array): Float64Array {
  const stride = Math.max(1, Math.ceil(values.length / 20000));
  const sizes = new Float64Array(Math.floor(values.length / stride));
  for (let i = 0; i < sizes.length; i++) sizes[i] = Math.abs(values[i * stride]!);
  return sizes;
}

/**
 * Indices of the first sample at a new level. Neighbouring means are compared over one sample, 1 ms and 10 ms: the
 * first finds clean edges exactly, the others find steps that are small against the noise of a measured current.
 */
function findEdges(x: Float64Array, rate: number, range: number): number[] {
  const edges: number[] = [];
  const tolerance = Math.max(rounding, 1e-6 * range);
  const widths = [1, Math.round(rate / 1000), Math.round(rate / 100)].filter(
    (width, k) => (k === 0 || width > 2) && 4 * width < x.length,
  );
  for (const width of widths) {
    const difference = differenceOfMeans(x, width);
    // What ordinary samples do: their 98th percentile for single samples (a clean trace has 0 there), the 75th for
    // means, whose edges spread over more samples. Both cutoffs lie near eight standard deviations of white noise.
    const ordinary = quantile(thinnedSizes(difference), width === 1 ? 0.98 : 0.75) ?? 0;
    const cutoff = Math.max(tolerance, (width === 1 ? 3.5 : 7) * ordinary);
    // What a finer comparison has already found shows again in the coarser one.
    const known = [...edges];
    for (const at of edgesAbove(difference, cutoff, width, rate))
      if (!known.some((edge) => Math.abs(edge - at) <= 2 * width)) edges.push(at);
  }
  edges.sort((a, b) => a - b);
  return edges.map((edge) => refined(x, edge));
}

/** Mean of the next `width` samples minus mean of the `width` before, for every index. */
function differenceOfMeans(x: Float64Array, width: number): Float64Array {
  const n = x.length;
  const out = new Float64Array(n);
  let before = 0;
  let after = 0;
  for (let k = 0; k < width; k++) {
    before += x[k]! - x[0]!;
    after += x[width + k]! - x[0]!;
  }
  for (let i = width; i + width <= n; i++) {
    out[i] = (after - before) / width;
    if (i + width < n) {
      after += x[i + width]! - x[i]!;
      before += x[i]! - x[i - width]!;
    }
  }
  return out;
}

/** Tops of the stretches where the difference exceeds the cutoff, leaving out stretches too long for an edge. */
function edgesAbove(difference: Float64Array, cutoff: number, width: number, rate: number): number[] {
  const longest = 2 * width + Math.max(6, Math.round(rate / 2000));
  const found: number[] = [];
  let i = 0;
  while (i < difference.length) {
    const value = difference[i]!;
    if (!(Math.abs(value) > cutoff)) {
      i++;
      continue;
    }
    const sign = Math.sign(value);
    let top = i;
    let end = i;
    while (end < difference.length && difference[end]! * sign > cutoff) {
      if (Math.abs(difference[end]!) > Math.abs(difference[top]!)) top = end;
      end++;
    }
    // The faint tails of a filtered edge do not make it longer.
    const tail = 0.1 * Math.abs(difference[top]!);
    let from = i;
    let to = end;
    while (Math.abs(difference[from]!) < tail) from++;
    while (Math.abs(difference[to - 1]!) < tail) to--;
    if (to - from <= longest) found.push(top);
    i = end;
  }
  return found;
}

/** A filtered edge spreads over a few samples: the edge is where it has come half of the way. */
function refined(x: Float64Array, edge: number): number {
  const reach = 4;
  if (edge < reach + 2 || edge + reach + 2 >= x.length) return edge;
  const before = median(x.subarray(Math.max(0, edge - 3 * reach), edge - reach + 1))!;
  const after = median(x.subarray(edge + reach, Math.min(x.length, edge + 3 * reach)))!;
  const jump = after - before;
  // Only a smooth edge is moved: a clean one, or one inside noise, is already where it belongs.
  const single = x[edge]! - x[edge - 1]!;
  if (Math.abs(single) > 0.9 * Math.abs(jump) || Math.abs(single) < 0.2 * Math.abs(jump)) return edge;
  for (let i = edge - reach; i <= edge + reach; i++)
    if ((x[i]! - before) * Math.sign(jump) >= 0.5 * Math.abs(jump)) return i;
  return edge;
}

/** Levels between edges, with level changes that mean nothing joined to their neighbour. */
function levelRuns(x: Float64Array, edges: number[], rate: number): Run[] {
  const boundaries = [0, ...edges.filter((edge, k) => edge > 0 && edge < x.length && edge !== edges[k - 1]), x.length];
  const levelOf = (from: number, to: number): number => {
    // A measured current overshoots at its edges: the middle of the stretch speaks for it.
    const margin = Math.floor((to - from) / 10);
    return median(thinned(x.subarray(from + margin, to - margin)))!;
  };
  let runs: Run[] = [];
  for (let k = 0; k + 1 < boundaries.length; k++)
    runs.push({ from: boundaries[k]!, to: boundaries[k + 1]!, level: levelOf(boundaries[k]!, boundaries[k + 1]!) });
  const spread = Math.max(...runs.map((run) => run.level)) - Math.min(...runs.map((run) => run.level));
  // The first or last few samples of a channel are often another level: a leftover of the recorder, no stimulus.
  const brief = Math.max(3, Math.round(rate * 0.0001));
  const join = (list: Run[], same: (a: Run, b: Run) => boolean): Run[] => {
    const out: Run[] = [];
    for (const run of list) {
      const last = out.at(-1);
      if (last && same(last, run))
        out[out.length - 1] = { from: last.from, to: run.to, level: levelOf(last.from, run.to) };
      else out.push(run);
    }
    return out;
  };
  runs = join(runs, (a, b) => Math.abs(a.level - b.level) <= Math.max(rounding, 0.01 * spread));
  if (runs.length > 1 && runs[0]!.to - runs[0]!.from <= brief) {
    const [first, second, ...rest] = runs as [Run, Run, ...Run[]];
    runs = [{ ...second, from: first.from }, ...rest];
  }
  if (runs.length > 1 && runs.at(-1)!.to - runs.at(-1)!.from <= brief) {
    const last = runs.pop()!;
    runs[runs.length - 1] = { ...runs.at(-1)!, to: last.to };
  }
  return runs;
}

interface Moving {
  kind: 'ramp' | 'noise' | 'unknown';
  /** Sample indices `[from, to)`. */
  from: number;
  to: number;
  start: number;
  extreme: number;
}

/**
 * A stimulus that does not stand still between its edges: a ramp, injected noise, or another waveform (`unknown`).
 * Null where the trace is a row of levels. Slow movement counts when it is at least a twentieth of the trace's range
 * and far above what averaging leaves of the sample noise.
 */
function movingStretch(x: Float64Array, runs: Run[], range: number, clamp: Clamp): Moving | null {
  if (range <= rounding) return null;
  const count = Math.min(400, Math.floor(x.length / 4));
  if (count < 8) return null;
  const startOf = (k: number): number => Math.floor((k * x.length) / count);
  const blocks = Float64Array.from({ length: count }, (_, k) => meanWithin(x, startOf(k), startOf(k + 1))!);
  const spreads = Float64Array.from(
    { length: count },
    (_, k) => standardDeviation(x.subarray(startOf(k), startOf(k + 1)))!,
  );
  const perBlock = x.length / count;
  const edges = runs.slice(1).map((run) => run.from);
  const holdsEdge = (k: number): boolean => edges.some((edge) => edge > startOf(k) - 1 && edge < startOf(k + 1) + 1);
  const quiet = (quantile(spreads, 0.1) ?? 0) / Math.sqrt(perBlock);

  // How far each block lies from the level of the run it is in.
  let run = 0;
  const away = blocks.map((value, k) => {
    while (run + 1 < runs.length && startOf(k) >= runs[run]!.to) run++;
    return holdsEdge(k) ? 0 : value - runs[run]!.level;
  });
  const farthest = Math.max(...away.map(Math.abs));
  const drifts = farthest > Math.max(0.05 * range, 8 * quiet, rounding);

  const loud = spreads.map((value, k) => (holdsEdge(k) ? 0 : value));
  const floor = quantile(spreads, 0.1) ?? 0;
  const noisy = [...loud.keys()].filter((k) => loud[k]! > Math.max(5 * floor, 0.02 * range, rounding));
  const contrast = noisy.length >= Math.max(4, 0.02 * count) && noisy.length >= 0.5 * (noisy.at(-1)! - noisy[0]! + 1);
  // A ramp may come as a flight of small stairs, each of them flat.
  const stairs =
    runs.length > 20 && runs.every((own, k) => k === 0 || k === runs.length - 1 || own.level !== runs[0]!.level);
  if (!drifts && !contrast && !stairs) return null;

  if (drifts || stairs) {
    const ramp = asRamp(x, blocks, startOf, quiet, range);
    if (ramp) return ramp;
    if (!drifts && !contrast) return null;
  }
  const busy = contrast
    ? noisy
    : [...away.keys()].filter((k) => Math.abs(away[k]!) > Math.max(0.05 * range, 8 * quiet));
  const first = busy[0]!;
  const last = busy.at(-1)!;
  const outside = [...blocks].filter((_, k) => (k < first || k > last) && !holdsEdge(k));
  const inside = standardDeviation([...blocks.subarray(first, last + 1)]) ?? 0;
  const whole = !contrast && (outside.length < 0.1 * count || (standardDeviation(outside) ?? 0) > 0.3 * inside);
  // Movement of the whole trace without a quiet stretch is the recording's own (hum, drift) unless it is large.
  if (whole && (standardDeviation(blocks) ?? 0) < (clamp === 'current' ? 10 : 2)) return null;
  if (busy.length < 4) return null;
  const from = startOf(first);
  const to = startOf(last + 1);
  const part = x.subarray(from, to);
  const sd = standardDeviation(part) ?? 0;
  const centre = mean(part)!;
  let fourth = 0;
  for (const value of part) fourth += (value - centre) ** 4;
  // A sine or a sweep of sines spends its time at its turning points (kurtosis 1.5); noise does not (3 for a normal one).
  const kurtosis = sd > 0 ? fourth / part.length / sd ** 4 : 0;
  const kind = kurtosis > 2 ? 'noise' : 'unknown';
  return { kind, from, to, start: x[0]!, extreme: centre };
}

/** Straight to one extreme, then back at once, straight, or not at all. */
function asRamp(
  x: Float64Array,
  blocks: Float64Array,
  startOf: (k: number) => number,
  quiet: number,
  range: number,
): Moving | null {
  const start = mean(blocks.subarray(0, 3))!;
  const tolerance = Math.max(0.03 * range, 6 * quiet);
  const away = blocks.map((value) => value - start);
  let extreme = 0;
  for (let k = 1; k < away.length; k++) if (Math.abs(away[k]!) > Math.abs(away[extreme]!)) extreme = k;
  let first = extreme;
  while (first > 0 && Math.abs(away[first - 1]!) > tolerance) first--;
  const rise = extreme - first + 1;
  if (rise < 5) return null;
  const ks = Float64Array.from({ length: rise - 1 }, (_, k) => first + k);
  const line = linearFit(ks, blocks.subarray(first, extreme));
  if (!line || (line.r_squared ?? 0) < 0.98) return null;
  // After the extreme it may only fall back, or stay.
  let last = extreme;
  let turns = 0;
  while (last + 1 < away.length && Math.abs(away[last + 1]!) > tolerance) {
    last++;
    if (Math.abs(away[last]!) > Math.abs(away[last - 1]!) + tolerance) turns++;
  }
  if (turns > 0) return null;
  // Back to where the line meets the starting level, in samples.
  const step = x.length / blocks.length;
  const meeting = Math.max(0, ((start - line.intercept) / line.slope + 0.5) * step);
  // The starting level is a mean over three blocks: a ramp that begins at once meets it within them.
  const from = meeting < 4 * step ? 0 : Math.min(Math.round(meeting), startOf(extreme));
  let to = startOf(last + 1);
  if (last + 1 < blocks.length) {
    // The block in which it ends holds the end itself.
    const limit = Math.min(x.length, startOf(last + 2));
    while (to < limit && Math.abs(x[to]! - start) > tolerance) to++;
    while (to > startOf(last) && Math.abs(x[to - 1]! - start) <= tolerance) to--;
  }
  const low = Math.max(from, startOf(Math.max(0, extreme - 1)));
  let top = x[low]!;
  for (let i = low; i < Math.min(x.length, startOf(extreme + 2)); i++)
    if (Math.abs(x[i]! - start) > Math.abs(top - start)) top = x[i]!;
  const smooth = linearValueAt(line, extreme + 0.5);
  // One sample's noise must not set the end of the ramp: the line speaks unless the trace is clean.
  return {
    kind: 'ramp',
    from,
    to,
    start: from === 0 ? line.intercept - 0.5 * line.slope : start,
    extreme: quiet > 1e-9 && Math.abs(smooth - top) > 6 * quiet ? smooth : top,
  };
}

const linearValueAt = (line: { slope: number; intercept: number }, x: number): number =>
  line.intercept + line.slope * x;
