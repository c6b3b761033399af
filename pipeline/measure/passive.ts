import { coverage95 } from '../signal/coverage.ts';
import { lineErrorAt, type SerialLine, serialLine, serialMean } from '../signal/serial.ts';
import { countFinite, mean, meanWithin, median, standardDeviation } from '../signal/statistics.ts';
import { backToEdge, type EdgeValue } from './edge.ts';
import { stuckStretches } from './quality.ts';
import { absent, combinedError, errorOf, measured } from './reading.ts';
import type { Level } from './stimulus.ts';
import {
  filterDelayMs,
  gathered,
  indexAt,
  plateauHoles,
  readable,
  type Stretch,
  spikeHoles,
  spikeSpan,
  stimulusHoles,
  timeAt,
  without,
} from './stretches.ts';
import type { Reading, Readings, Signal, Spike, Stimulus, SweepMeasure } from './types.ts';

/** A current-clamp sweep as the functions of this file need it. */
export interface PassiveInput {
  /** The potential, freed of mains hum where there is some. */
  voltage: Signal;
  /** The potential as recorded, for what hum belongs to; left out where it is the same. */
  recorded?: Signal;
  /** Step of the digitizer, mV; left out where it is not known. */
  quantum_mv?: number | null;
  stimulus: Stimulus;
  /** Levels of the stimulus trace; empty where the stimulus is only stated. */
  levels: readonly Level[];
  spikes: readonly Spike[];
  slow: boolean;
  mains_hz: number | null;
  filter_khz: number | null;
}

const baselineSpan_s = 0.5;
/** After a pulse before the main stimulus, the membrane gets this long to come back, s. */
const recovery_s = 0.05;

/**
 * The stretches that make the baseline: at most 500 ms before onset, without spikes and without test pulses. Without
 * a stimulus the whole sweep; where nothing is known of a stimulus, the first 500 ms, or the whole sweep when that
 * holds no quiet stretch.
 */
export function baselineStretches(input: PassiveInput): { stretches: Stretch[]; note: string | null } {
  const { voltage, stimulus, levels, spikes, slow } = input;
  const holes = [
    ...spikeHoles(voltage, spikes, slow),
    ...(slow ? plateauHoles(voltage, spikes) : []),
    ...stimulusHoles(voltage, stimulus, levels, recovery_s),
  ];
  const all = { from: 0, to: voltage.samples.length };
  const shortest = Math.max(3, Math.round(0.001 * voltage.rate_hz));
  const inside = (whole: Stretch): Stretch[] =>
    without(whole, holes)
      .flatMap((one) => readable(voltage.samples, one))
      .filter((one) => one.to - one.from >= shortest);
  if (stimulus.onset_s !== null) {
    const onset = indexAt(voltage, stimulus.onset_s);
    const whole = { from: Math.max(0, onset - Math.round(baselineSpan_s * voltage.rate_hz)), to: onset };
    return {
      stretches: inside(whole),
      note: spikes.some((one) => isIn(one, voltage, whole)) ? 'between spikes' : null,
    };
  }
  const between = spikes.length > 0 ? ', between spikes' : '';
  if (stimulus.kind === 'none') return { stretches: inside(all), note: `no stimulus: over the whole sweep${between}` };
  const beginning = inside({ from: 0, to: Math.min(all.to, Math.round(baselineSpan_s * voltage.rate_hz)) });
  if (gathered(voltage.samples, beginning).length >= 0.02 * voltage.rate_hz)
    return { stretches: beginning, note: `stimulus not known: over the first 500 ms${between}` };
  return { stretches: inside(all), note: `stimulus not known: over the whole sweep${between}` };
}

function isIn(spike: Spike, voltage: Signal, whole: Stretch): boolean {
  const peak = spike.values['peak_at_s'] ?? null;
  return peak !== null && peak >= timeAt(voltage, whole.from) && peak < timeAt(voltage, whole.to);
}

/** Means over this long are the grain that levels and slopes are read from, s. */
const grain_s = 0.002;

/**
 * Level, spread and drift of the baseline. The level is the median of means over 2 ms: a median of samples would stand
 * on the digitizer's grid, a mean would follow whatever small event the stretch holds.
 */
export function measureBaseline(input: PassiveInput): Readings {
  const { voltage } = input;
  const { stretches, note } = baselineStretches(input);
  const every = (reading: Reading): Readings => ({
    baseline_mv: reading,
    baseline_sd_mv: reading,
    baseline_drift_mv_per_s: reading,
  });
  const values = gathered((input.recorded ?? voltage).samples, stretches);
  if (values.length < 3) return every(absent(voltage.samples.length < 3 ? 'sweep-too-short' : 'no-baseline'));
  const at = { from_s: timeAt(voltage, stretches[0]!.from), to_s: timeAt(voltage, stretches.at(-1)!.to) };
  const sd = standardDeviation(values)!;
  const grains = grainsOf(voltage, stretches);
  const line = serialLine(grains.s, grains.mv);
  const extra = { n: values.length, at, ...(note ? { note } : {}) };
  // About the line: a drifting level scatters by its drift.
  const level =
    line && grains.mv.length >= 5
      ? median(grains.mv.map((value, k) => value - line.slope * (grains.s[k]! - line.mean_x)))!
      : mean(gathered(voltage.samples, stretches))!;
  const own = line && line.se_mean !== null ? medianCost * line.se_mean : sd / Math.sqrt(Math.max(1, grains.mv.length));
  const known = line && line.se_mean !== null ? { freedom: line.freedom } : {};
  return {
    baseline_mv: measured(level, {
      ...extra,
      sd,
      ...combinedError([{ se: own, ...known }, { se: quantizationError(input.quantum_mv ?? 0, sd) }]),
    }),
    baseline_sd_mv: measured(sd, {
      ...extra,
      // The slow part of the noise decides: as many independent values as its variance of the mean speaks of.
      ...(line && line.se_mean !== null && sd > 0
        ? { se: sd / Math.sqrt(2 * Math.max(4, Math.min(values.length, (sd / line.se_mean) ** 2))) }
        : {}),
    }),
    baseline_drift_mv_per_s:
      line && at.to_s - at.from_s >= 0.02 && grains.mv.length >= 10
        ? measured(line.slope, {
            ...extra,
            ...(line.se_slope === null ? {} : { se: line.se_slope, freedom: line.freedom }),
          })
        : absent('sweep-too-short'),
  };
}

/** A median of normal numbers scatters √(π/2) times as much as their mean. */
const medianCost = Math.sqrt(Math.PI / 2);

/**
 * What rounding to steps of `q` does to a mean of values that scatter by `sd`: noise well above a step averages it out,
 * noise below a quarter of one does not. Root mean square over where the level lies on the grid, from the Fourier
 * series of the rounding error (Widrow & Kollár 2008, Quantization Noise; from memory).
 */
export function quantizationError(q: number, sd: number): number {
  if (!(q > 0)) return 0;
  // A tenth less than Sheppard's correction gives: with steps this coarse it is rough itself.
  const noise = (0.9 * Math.sqrt(Math.max(0, sd * sd - (q * q) / 12))) / q;
  let sum = 0;
  for (let k = 1; k <= 20; k++) sum += Math.exp(-((2 * Math.PI * k * noise) ** 2)) / (k * k);
  return (q * Math.sqrt(sum / 2)) / Math.PI;
}

/** Means over 2 ms of the stretches, finer where that would leave fewer than ten, and the times of their middles. */
function grainsOf(voltage: Signal, stretches: readonly Stretch[]): { s: number[]; mv: number[] } {
  const samples = stretches.reduce((sum, one) => sum + one.to - one.from, 0);
  return blockMeans(voltage, stretches, Math.min(grain_s, samples / voltage.rate_hz / 10));
}

function blockMeans(voltage: Signal, stretches: readonly Stretch[], seconds: number): { s: number[]; mv: number[] } {
  const block = Math.max(1, Math.round(seconds * voltage.rate_hz));
  const out = { s: [] as number[], mv: [] as number[] };
  for (const { from, to } of stretches)
    for (let i = from; i + block <= to; i += block) {
      const value = meanWithin(voltage.samples, i, i + block);
      if (value === null) continue;
      out.s.push(timeAt(voltage, i + (block - 1) / 2));
      out.mv.push(value);
    }
  return out;
}

/** Where the baseline is heading under the step: nothing, or a straight line. */
export interface Drift {
  /** mV/s; 0 where none is resolved. */
  slope: number;
  se: number;
  /** The time to which the baseline's level belongs, s. */
  from_s: number;
}

const resolvedFrom = 3;

/** The next stimulus edge after a step, or the end of the sweep, s. */
const undisturbedUntil_s = ({ voltage, stimulus }: PassiveInput, step: Step): number =>
  Math.min(timeAt(voltage, voltage.samples.length), ...stimulus.edges_s.filter((s) => s > step.to_s + 1e-9));

/**
 * The line that the baseline follows under the step. Where the potential comes back to it afterwards, the line through
 * the levels before and after (a slope below three times its standard error counts as none); otherwise the slope
 * before, continued, a tenth of it taken as uncertain. Slow noise has a slope over any short stretch and none beyond it:
 * the slope before is continued only where it exceeds twice its 95 % half-width and the level after the step, if there
 * is one, lies nearer to the line than to the level before.
 * @returns null without a step
 */
export function driftUnder(input: PassiveInput): Drift | null {
  const step = stepOf(input.stimulus);
  if (!step) return null;
  const { voltage, spikes, slow } = input;
  const before = lineIn(voltage, baselineStretches(input).stretches);
  const none = { slope: 0, se: 0, from_s: before?.mean_x ?? step.from_s };
  if (!before || before.se_slope === null) return none;
  const next_s = undisturbedUntil_s(input, step);
  const whole = {
    from: indexAt(voltage, step.to_s + Math.max(0.06, 0.5 * (next_s - step.to_s))),
    to: indexAt(voltage, next_s),
  };
  const quiet = without(whole, spikeHoles(voltage, spikes, slow)).flatMap((one) => readable(voltage.samples, one));
  const after = whole.to - whole.from >= 0.03 * voltage.rate_hz ? lineIn(voltage, quiet) : null;
  if (after && after.se_slope !== null) {
    const reach = after.mean_x - before.mean_x;
    const slope = (after.mean_y - before.mean_y) / reach;
    const se = Math.hypot(after.se_mean!, before.se_mean!) / reach;
    const alike = (one: SerialLine): boolean => Math.abs(one.slope - slope) <= 2.5 * Math.hypot(one.se_slope!, se);
    if (alike(before) && alike(after))
      return Math.abs(slope) > resolvedFrom * se ? { slope, se, from_s: before.mean_x } : none;
    if (Math.abs(before.slope - slope) > Math.abs(slope)) return none;
  }
  if (!(Math.abs(before.slope) > 2 * coverage95(before.freedom) * before.se_slope)) return none;
  return { slope: before.slope, se: Math.hypot(before.se_slope, 0.1 * before.slope), from_s: before.mean_x };
}

function lineIn(voltage: Signal, stretches: readonly Stretch[]): SerialLine | null {
  const grains = grainsOf(voltage, stretches);
  const line = grains.mv.length >= 10 ? serialLine(grains.s, grains.mv) : null;
  return line && (lineErrorAt(line, line.mean_x) ?? null) !== null ? line : null;
}

/** Steps shorter than this have no late part to speak of, s. */
const shortestStep_s = 0.0125;

/** `steady_deflection_mv`, `largest_deflection_mv`, `rebound_mv` and `rebound_spikes` of a step. */
export function measureDeflections(
  input: PassiveInput,
  baseline: Reading,
  drift: Drift | null = driftUnder(input),
): Readings {
  const { voltage, stimulus } = input;
  const every = (reading: Reading): Readings => ({
    steady_deflection_mv: reading,
    largest_deflection_mv: reading,
    rebound_mv: reading,
    rebound_spikes: reading,
  });
  const step = stepOf(stimulus);
  if (!step || !drift) return every(withoutStep(stimulus));
  if (baseline.value === null) return every(absent(baseline.why ?? 'no-baseline'));
  if (step.to_s - step.from_s < shortestStep_s)
    return every(absent('sweep-too-short', { note: 'the step is too short' }));
  const ends_s = timeAt(voltage, voltage.samples.length);
  if (step.from_s >= ends_s) return every(absent('cut-off-by-sweep-end'));
  return {
    steady_deflection_mv: steadyDeflection(input, baseline, step, drift),
    largest_deflection_mv: largestDeflection(input, baseline, step, drift),
    ...reboundAfter(input, baseline, step, drift),
  };
}

/** Level of the baseline under a time, and its standard uncertainty with degrees of freedom. */
function levelUnder(baseline: Reading, drift: Drift, time_s: number) {
  const reach = time_s - drift.from_s;
  return {
    mv: baseline.value! + drift.slope * reach,
    errors: [errorOf(baseline), { se: drift.se * reach }],
    ...(drift.slope === 0 ? {} : { note: `baseline drift of ${drift.slope.toFixed(2)} mV/s taken off` }),
  };
}

const noteOf = (...notes: (string | undefined)[]): { note?: string } => {
  const said = notes.filter((note) => note !== undefined);
  return said.length > 0 ? { note: said.join('; ') } : {};
};

interface Step {
  from_s: number;
  to_s: number;
  pa: number;
}

export const stepOf = (stimulus: Stimulus): Step | null =>
  stimulus.kind === 'step' && stimulus.onset_s !== null && stimulus.end_s !== null && stimulus.amplitude !== null
    ? { from_s: stimulus.onset_s, to_s: stimulus.end_s, pa: stimulus.amplitude }
    : null;

/** Why there is no step to measure. */
export const withoutStep = (stimulus: Stimulus): Reading =>
  absent(stimulus.kind === 'none' || stimulus.from === 'absent' ? 'no-stimulus' : 'stimulus-not-a-step');

function steadyDeflection(input: PassiveInput, baseline: Reading, step: Step, drift: Drift): Reading {
  const { voltage, spikes, slow } = input;
  const length_s = step.to_s - step.from_s;
  const to_s = step.to_s - Math.min(0.005, 0.1 * length_s);
  const from_s = to_s - Math.min(0.05, length_s / 10);
  const window = { from: indexAt(voltage, from_s), to: indexAt(voltage, to_s) };
  const at = { from_s, to_s };
  if (timeAt(voltage, voltage.samples.length) < to_s) return absent('cut-off-by-sweep-end');
  const quiet = without(window, spikeHoles(voltage, spikes, slow));
  const kept = quiet.reduce((sum, one) => sum + one.to - one.from, 0);
  if (kept < 0.5 * (window.to - window.from)) return absent('no-spike-free-stretch');
  const part = gathered(voltage.samples, quiet);
  if (part.length < 0.5 * kept || part.length === 0) return absent('unreadable');
  if (touchesLimit(input, window)) return absent('clipped');
  const sd = standardDeviation(part) ?? 0;
  const grains = blockMeans(
    voltage,
    quiet.flatMap((one) => readable(voltage.samples, one)),
    Math.min(0.001, kept / voltage.rate_hz / 10),
  );
  const own = serialMean(grains.mv);
  const level = levelUnder(baseline, drift, (from_s + to_s) / 2);
  const during = spikes.some((spike) => isIn(spike, voltage, { from: indexAt(voltage, step.from_s), to: window.from }));
  return measured(mean(part)! - level.mv, {
    n: part.length,
    sd,
    ...combinedError([
      ...level.errors,
      own && own.se !== null ? { se: own.se, freedom: own.freedom } : { se: sd },
      { se: quantizationError(input.quantum_mv ?? 0, sd) },
    ]),
    at,
    ...noteOf(
      kept < window.to - window.from ? 'between spikes' : during ? 'spikes earlier in the step' : undefined,
      level.note,
    ),
  });
}

/** Whether the window holds samples that stand at the recorder's limits. */
function touchesLimit(input: PassiveInput, window: Stretch): boolean {
  const voltage = input.recorded ?? input.voltage;
  let low = Number.POSITIVE_INFINITY;
  let high = Number.NEGATIVE_INFINITY;
  for (let i = 0; i < voltage.samples.length; i++) {
    const value = voltage.samples[i]!;
    if (value < low) low = value;
    if (value > high) high = value;
  }
  // Looked at closely only where the window holds an extreme of the whole sweep.
  let touches = false;
  for (let i = window.from; i < window.to && !touches; i++)
    touches = voltage.samples[i] === low || voltage.samples[i] === high;
  if (!touches) return false;
  return stuckStretches(voltage.samples).some((run) => run.from < window.to && run.to > window.from);
}

function largestDeflection(input: PassiveInput, baseline: Reading, step: Step, drift: Drift): Reading {
  const { voltage, spikes } = input;
  if (step.pa > 0) return absent('no-hyperpolarizing-steps');
  const window = { from: indexAt(voltage, step.from_s + 0.001), to: indexAt(voltage, step.to_s) };
  const part = voltage.samples.subarray(window.from, window.to);
  if (part.length === 0 || countFinite(part) < 0.5 * part.length) return absent('unreadable');
  if (spikes.some((spike) => isIn(spike, voltage, window))) return absent('no-spike-free-stretch');
  if (touchesLimit(input, window)) return absent('clipped');
  const found = extremeOf(voltage, [window], widthFor(step), -1);
  if (!found) return absent('sweep-too-short');
  return aboveLevel(input, baseline, drift, found, step.to_s - step.from_s);
}

/** An extreme found over `span_s` against the baseline under it. */
function aboveLevel(
  input: PassiveInput,
  baseline: Reading,
  drift: Drift,
  found: Extreme,
  span_s: number,
  ...notes: (string | undefined)[]
): Reading {
  const level = levelUnder(baseline, drift, found.at_s);
  return measured(found.mv - level.mv, {
    at: { from_s: found.at_s - found.width_s / 2, to_s: found.at_s + found.width_s / 2 },
    ...combinedError([
      ...level.errors,
      found,
      { se: slowPush(input, found.width_s, span_s) },
      { se: quantizationError(input.quantum_mv ?? 0, baseline.sd ?? 0) },
    ]),
    ...noteOf(...notes, level.note),
  });
}

/** Wide enough to average noise out, narrow against a sag, which takes tens of milliseconds, s. */
const widthFor = (step: Step): number => Math.max(0.001, Math.min(0.01, (step.to_s - step.from_s) / 50));

interface Extreme {
  mv: number;
  at_s: number;
  width_s: number;
  se: number;
  freedom: number;
}

/**
 * Lowest (sign −1) or highest (+1) running mean of the width in the stretches, without the push that noise gives an
 * extreme: the samples are dealt alternately, half a millisecond at a time, into two halves; where the one half's
 * running mean is extreme the other's is read, and the two readings are averaged.
 */
function extremeOf(voltage: Signal, stretches: readonly Stretch[], width_s: number, sign: 1 | -1): Extreme | null {
  const turn = Math.max(1, Math.round(Math.min(0.0005, width_s / 4) * voltage.rate_hz));
  // A whole number of turns of both halves.
  const pairs = Math.max(1, Math.round((width_s * voltage.rate_hz) / (2 * turn)));
  const best = [0, 1].map((): { pick: number; read: number; index: number; values: number[] } | null => null);
  for (const { from, to } of stretches) {
    const turns = Math.floor((to - from) / turn);
    const means = Array.from({ length: turns }, (_, k) =>
      meanWithin(voltage.samples, from + k * turn, from + (k + 1) * turn),
    );
    for (let k = 0; k + 2 * pairs <= turns; k++) {
      const own = means.slice(k, k + 2 * pairs);
      if (own.some((value) => value === null)) continue;
      const halves = [0, 1].map((parity) => mean(own.filter((_, j) => (k + j) % 2 === parity) as number[])!);
      for (const half of [0, 1]) {
        const known = best[half];
        if (!known || sign * halves[half]! > sign * known.pick)
          best[half] = {
            pick: halves[half]!,
            read: halves[1 - half]!,
            index: from + k * turn + pairs * turn,
            values: own as number[],
          };
      }
    }
  }
  const [a, b] = best;
  if (!a || !b) return null;
  const noise = [a, b].map((one) => serialMean(one.values)!);
  const se = Math.max(...noise.map((one) => one.se ?? 0), Math.abs(a.read - b.read) / 2);
  const width = (2 * pairs * turn) / voltage.rate_hz;
  return {
    mv: (a.read + b.read) / 2,
    at_s: timeAt(voltage, (a.index + b.index) / 2),
    width_s: width,
    se,
    freedom: Math.max(1, noise[0]!.freedom),
  };
}

/**
 * How far slow noise may push an extreme of running means over `span_s`, which the two halves share and so do not see:
 * 1.25 times its standard deviation in the baseline, times √ln of how many independent means the span holds (the largest
 * of N normal numbers lies at √(2 ln N) of theirs).
 */
function slowPush(input: PassiveInput, width_s: number, span_s: number): number {
  const { stretches } = baselineStretches(input);
  const means = blockMeans(input.voltage, stretches, width_s);
  const grains = grainsOf(input.voltage, stretches);
  const line = serialLine(means.s, means.mv);
  if (!line || line.residual_sd === null || means.mv.length < 5 || grains.mv.length < 10) return 0;
  let fast = 0;
  for (let k = 1; k < grains.mv.length; k++) fast += (grains.mv[k]! - grains.mv[k - 1]!) ** 2;
  const white = ((fast / (2 * (grains.mv.length - 1))) * (grains.s[1]! - grains.s[0]!)) / width_s;
  return (
    1.25 *
    Math.sqrt(
      Math.max(0, line.residual_sd ** 2 - (1 + 4 / Math.sqrt(means.mv.length)) * white) *
        Math.log(Math.max(2, span_s / width_s)),
    )
  );
}

/** How long after the end of a step a rebound is looked for, s. */
const reboundSpan_s = 0.3;

/** Rebound after a hyperpolarizing step: how far above the baseline the potential rises, and spikes fired. */
function reboundAfter(input: PassiveInput, baseline: Reading, step: Step, drift: Drift): Readings {
  const { voltage, spikes, slow } = input;
  const both = (reading: Reading): Readings => ({ rebound_mv: reading, rebound_spikes: reading });
  if (step.pa >= 0) return both(absent('no-hyperpolarizing-steps'));
  const to_s = Math.min(step.to_s + reboundSpan_s, undisturbedUntil_s(input, step));
  if (to_s - step.to_s < 0.03) return both(absent('cut-off-by-sweep-end'));
  const window = { from: indexAt(voltage, step.to_s + 0.001), to: indexAt(voltage, to_s) };
  const fired = spikes.filter((spike) => isIn(spike, voltage, window));
  const cut =
    to_s < step.to_s + reboundSpan_s - 1e-9 ? { note: `over ${Math.round((to_s - step.to_s) * 1000)} ms` } : {};
  const counted = measured(fired.length, { at: { from_s: step.to_s, to_s }, ...cut });
  // Up to the foot of the first spike: what rises higher is the spike's.
  const first = fired[0] ? spikeSpan(fired[0], undefined, slow) : null;
  if (first && first.from_s - step.to_s < 0.03)
    return { rebound_mv: absent('no-spike-free-stretch'), rebound_spikes: counted };
  const quiet = { from: window.from, to: first ? indexAt(voltage, first.from_s) : window.to };
  const found = extremeOf(voltage, readable(voltage.samples, quiet), widthFor(step), 1);
  if (!found) return { rebound_mv: absent('unreadable'), rebound_spikes: counted };
  const span_s = (quiet.to - quiet.from) / voltage.rate_hz;
  const upTo = fired.length > 0 ? 'up to the first rebound spike' : undefined;
  return {
    rebound_mv: aboveLevel(input, baseline, drift, found, span_s, cut.note, upTo),
    rebound_spikes: counted,
  };
}

/**
 * Jump of the potential at the edges of a step that no membrane can make. Before the edge a straight line over 10 ms
 * is continued to it; after it, once filter and electrode have settled, the response is carried back to it (`edge.ts`).
 * Mean over onset and end, each with the sign that a resistance left over would give it.
 */
export function measureBridgeStep(input: PassiveInput): Reading {
  const step = stepOf(input.stimulus);
  if (!step) return withoutStep(input.stimulus);
  const jumps = [
    jumpAt(input, step.from_s, step.to_s, Math.sign(step.pa)),
    jumpAt(input, step.to_s, Number.POSITIVE_INFINITY, -Math.sign(step.pa)),
  ];
  const found = jumps.flatMap((jump, k) => (jump === null ? [] : [{ ...jump, mv: k === 0 ? jump.mv : -jump.mv }]));
  if (found.length === 0)
    return absent('no-electrode-transient', {
      note: 'no quiet stretch around an edge, or a response too fast to tell from a jump',
    });
  return measured(mean(found.map((jump) => jump.mv))!, {
    n: found.length,
    ...combinedError(found.map((jump) => ({ se: jump.se / found.length, freedom: jump.freedom }))),
    at: { from_s: step.from_s, to_s: step.to_s },
    note: found.length === 2 ? 'onset and end' : jumps[0] ? 'onset only' : 'end only',
  });
}

/** Windows after the edge, ms, the longest first. */
const windows_ms = [16, 9, 5];

function jumpAt(
  input: PassiveInput,
  edge_s: number,
  next_s: number,
  direction: number,
): { mv: number; se: number; freedom: number } | null {
  const { voltage, stimulus, spikes, slow } = input;
  const rate = voltage.rate_hz;
  const edges = stimulus.edges_s;
  const previous = Math.max(voltage.start_s, ...edges.filter((edge) => edge < edge_s - 1e-9));
  const following = Math.min(next_s, ...edges.filter((edge) => edge > edge_s + 1e-9));
  const spans = spikes.flatMap((spike, k) => spikeSpan(spike, spikes[k + 1], slow) ?? []);
  const before_s = Math.max(edge_s - 0.01, previous + 0.4 * (edge_s - previous));
  const nextSpike = Math.min(...spans.map((span) => span.from_s - 0.001).filter((from) => from > edge_s - 0.001));
  const settle_ms = settledAfter_ms(input.filter_khz);
  const to_s = Math.min(edge_s + 0.017, following - 0.0002, nextSpike);
  if (to_s - edge_s - settle_ms / 1000 < 0.002) return null;
  if (spans.some((span) => span.from_s < edge_s && span.to_s > before_s)) return null;

  const edge = (edge_s - voltage.start_s) * rate;
  const earlier = { from: indexAt(voltage, before_s), to: Math.round(edge) };
  const later = { from: Math.max(0, Math.round(edge)), to: indexAt(voltage, to_s) };
  if (earlier.to - earlier.from < 4 || later.to - later.from < 8 || later.to >= voltage.samples.length) return null;
  const first = blockMeans(voltage, [earlier], Math.min(0.0005, (edge_s - before_s) / 8));
  const before = serialLine(
    first.s.map((time) => (time - edge_s) * 1000),
    first.mv,
  );
  if (!before || before.se_intercept === null) return null;
  const second = blockMeans(voltage, [later], 0.0001);
  const after = backToEdge(
    second.s.map((time) => (time - edge_s) * 1000),
    second.mv,
    { ...filterAtEdge(input.filter_khz), windows_ms },
  );
  if (!after || isNoResponse(after, before.intercept, direction)) return null;
  const error = combinedError([
    { se: after.se, freedom: after.freedom },
    { se: before.se_intercept, freedom: before.freedom },
  ]);
  return { mv: after.mv - before.intercept, se: error.se, freedom: error.freedom ?? 1e6 };
}

/** A jump without a response in the current's direction after it: the membrane has answered within the electrode's
 * time, or there is none. */
function isNoResponse(after: EdgeValue, before: number, direction: number): boolean {
  const jump = after.mv - before;
  return Math.abs(jump) > 3 * after.se && after.rise * direction < 0.2 * Math.abs(jump);
}

/** A four-pole Bessel filter has settled to a thousandth after about 1.2 over its corner; 1 ms where it is not known. */
const settledAfter_ms = (filter_khz: number | null): number =>
  filter_khz === null ? 1 : Math.max(0.3, 1.3 / filter_khz);

/**
 * What the recorder's filter does at an edge: its delay, and when it has settled. A corner that is not known is taken
 * to lie at 2 kHz or above: the delay then is anything up to 0.17 ms.
 */
export const filterAtEdge = (filter_khz: number | null) => ({
  delay_ms: filterDelayMs(filter_khz),
  delay_se_ms: filter_khz === null ? 0.08 : 0.05 * filterDelayMs(filter_khz),
  from_ms: settledAfter_ms(filter_khz),
});

/** Length kept of the response to a step and the finest bin, s; together at most about 1600 numbers. */
const responseSpan_s = 0.3;
const responseLead_s = 0.01;

/**
 * The potential from 10 ms before the onset of a hyperpolarizing step without spikes to its end or 300 ms into it, in
 * equal bins that begin exactly at the onset. Times from the start of the sweep. Null for every other sweep.
 */
export function stepResponse(
  input: PassiveInput,
  drift: Drift | null = driftUnder(input),
): SweepMeasure['step_response'] {
  const { voltage, stimulus, spikes } = input;
  const step = stepOf(stimulus);
  if (!step || !drift || step.pa >= 0 || step.to_s - step.from_s < shortestStep_s) return null;
  const rate = voltage.rate_hz;
  const onset = indexAt(voltage, step.from_s);
  const end = indexAt(voltage, Math.min(step.to_s, step.from_s + responseSpan_s));
  if (spikes.some((spike) => isIn(spike, voltage, { from: onset, to: end }))) return null;
  const block = Math.max(1, Math.round(0.0002 * rate));
  const lead = Math.floor(Math.min(onset, responseLead_s * rate) / block);
  const bins = lead + Math.floor((end - onset) / block);
  const first = onset - lead * block;
  const mv: number[] = [];
  for (let k = 0; k < bins; k++) {
    const value = meanWithin(voltage.samples, first + k * block, first + (k + 1) * block);
    if (value === null) return null;
    const drifted = drift.slope * ((k + 0.5) * (block / rate) - lead * (block / rate));
    mv.push(Math.round((value - drifted) * 1e4) / 1e4);
  }
  if (bins - lead < 10) return null;
  // The centre of the first bin.
  return { start_s: timeAt(voltage, first + (block - 1) / 2), rate_hz: rate / block, mv };
}
