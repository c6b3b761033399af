import { type ExponentialFit, exponentialFit } from '../signal/exponential.ts';
import { linearFit } from '../signal/line.ts';
import { movingAverage } from '../signal/smoothing.ts';
import { countFinite, mean, median, standardDeviation } from '../signal/statistics.ts';
import { stuckStretches } from './quality.ts';
import { absent, measured } from './reading.ts';
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
  voltage: Signal;
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

/** Level, spread and drift of the baseline. */
export function measureBaseline(input: PassiveInput): Readings {
  const { voltage } = input;
  const { stretches, note } = baselineStretches(input);
  const every = (reading: Reading): Readings => ({
    baseline_mv: reading,
    baseline_sd_mv: reading,
    baseline_drift_mv_per_s: reading,
  });
  const values = gathered(voltage.samples, stretches);
  if (values.length < 3) return every(absent(voltage.samples.length < 3 ? 'sweep-too-short' : 'no-baseline'));
  const at = { from_s: timeAt(voltage, stretches[0]!.from), to_s: timeAt(voltage, stretches.at(-1)!.to) };
  const sd = standardDeviation(values)!;
  // Neighbouring samples are not independent; means over 10 ms nearly are.
  const blocks = blockMeans(voltage, stretches, 0.01);
  const blockSd = blocks.mv.length >= 5 ? standardDeviation(blocks.mv)! : null;
  const extra = { n: values.length, at, ...(note ? { note } : {}) };
  const line = at.to_s - at.from_s >= 0.02 && blocks.mv.length >= 3 ? linearFit(blocks.s, blocks.mv) : null;
  return {
    baseline_mv: measured(median(values)!, {
      ...extra,
      sd,
      se: blockSd === null ? sd / Math.sqrt(Math.max(1, blocks.mv.length)) : blockSd / Math.sqrt(blocks.mv.length),
    }),
    baseline_sd_mv: measured(sd, extra),
    baseline_drift_mv_per_s: line
      ? measured(line.slope, { ...extra, ...(line.se_slope === null ? {} : { se: line.se_slope }) })
      : absent('sweep-too-short'),
  };
}

function blockMeans(voltage: Signal, stretches: readonly Stretch[], seconds: number): { s: number[]; mv: number[] } {
  const block = Math.max(1, Math.round(seconds * voltage.rate_hz));
  const out = { s: [] as number[], mv: [] as number[] };
  for (const { from, to } of stretches)
    for (let i = from; i + block <= to; i += block) {
      out.s.push(timeAt(voltage, i + block / 2));
      out.mv.push(mean(voltage.samples.subarray(i, i + block))!);
    }
  return out;
}

/** Steps shorter than this have no late part to speak of, s. */
const shortestStep_s = 0.0125;

/** `steady_deflection_mv` and `largest_deflection_mv` of a step. */
export function measureDeflections(input: PassiveInput, baseline: Reading): Readings {
  const { voltage, stimulus } = input;
  const both = (reading: Reading): Readings => ({ steady_deflection_mv: reading, largest_deflection_mv: reading });
  const step = stepOf(stimulus);
  if (!step) return both(withoutStep(stimulus));
  if (baseline.value === null) return both(absent(baseline.why ?? 'no-baseline'));
  if (step.to_s - step.from_s < shortestStep_s)
    return both(absent('sweep-too-short', { note: 'the step is too short' }));
  const ends_s = timeAt(voltage, voltage.samples.length);
  if (step.from_s >= ends_s) return both(absent('cut-off-by-sweep-end'));
  return {
    steady_deflection_mv: steadyDeflection(input, baseline, step),
    largest_deflection_mv: largestDeflection(input, baseline, step),
  };
}

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

function steadyDeflection(input: PassiveInput, baseline: Reading, step: Step): Reading {
  const { voltage, spikes, slow } = input;
  const length_s = step.to_s - step.from_s;
  const to_s = step.to_s - Math.min(0.005, 0.1 * length_s);
  const from_s = to_s - Math.min(0.05, length_s / 10);
  const window = { from: indexAt(voltage, from_s), to: indexAt(voltage, to_s) };
  const at = { from_s, to_s };
  if (timeAt(voltage, voltage.samples.length) < to_s) return absent('cut-off-by-sweep-end');
  const disturbed = spikes.some((spike, k) => {
    const span = spikeSpan(spike, spikes[k + 1], slow);
    return span !== null && span.from_s < to_s && span.to_s > from_s;
  });
  if (disturbed) return absent('no-spike-free-stretch');
  const part = voltage.samples.subarray(window.from, window.to);
  if (countFinite(part) < 0.5 * part.length || part.length === 0) return absent('unreadable');
  if (touchesLimit(voltage, window)) return absent('clipped');
  const sd = standardDeviation(part) ?? 0;
  const blocks = blockMeans(voltage, [window], Math.min(0.005, (to_s - from_s) / 5)).mv;
  const own = blocks.length >= 3 ? standardDeviation(blocks)! / Math.sqrt(blocks.length) : sd;
  const during = spikes.some((spike) => isIn(spike, voltage, { from: indexAt(voltage, step.from_s), to: window.from }));
  return measured(mean(part)! - baseline.value!, {
    n: countFinite(part),
    sd,
    se: Math.hypot(own, baseline.se ?? 0),
    at,
    ...(during ? { note: 'spikes earlier in the step' } : {}),
  });
}

/** Whether the window holds samples that stand at the recorder's limits. */
function touchesLimit(voltage: Signal, window: Stretch): boolean {
  const part = voltage.samples.subarray(window.from, window.to);
  let low = Number.POSITIVE_INFINITY;
  let high = Number.NEGATIVE_INFINITY;
  for (const value of voltage.samples) {
    if (value < low) low = value;
    if (value > high) high = value;
  }
  // Looked at closely only where the window holds an extreme of the whole sweep.
  if (!part.some((value) => value === low || value === high)) return false;
  return stuckStretches(voltage.samples).some((run) => run.from < window.to && run.to > window.from);
}

function largestDeflection(input: PassiveInput, baseline: Reading, step: Step): Reading {
  const { voltage, spikes } = input;
  if (step.pa > 0) return absent('no-hyperpolarizing-steps');
  const window = { from: indexAt(voltage, step.from_s + 0.001), to: indexAt(voltage, step.to_s) };
  const part = voltage.samples.subarray(window.from, window.to);
  if (part.length === 0 || countFinite(part) < 0.5 * part.length) return absent('unreadable');
  if (spikes.some((spike) => isIn(spike, voltage, window))) return absent('no-spike-free-stretch');
  if (touchesLimit(voltage, window)) return absent('clipped');
  // Wide enough to average noise out, narrow against a sag, which takes tens of milliseconds. One period of the mains
  // takes the hum out as well, where the step is long enough for it.
  const length_s = step.to_s - step.from_s;
  const period_s = 1 / (input.mains_hz ?? 50);
  const width_s = length_s >= 15 * period_s ? period_s : Math.max(0.001, Math.min(0.01, length_s / 50));
  const half = Math.max(1, Math.round((width_s * voltage.rate_hz) / 2));
  const smooth = movingAverage(part, half);
  let lowest = -1;
  // At its ends the average runs over fewer samples: only whole windows count.
  for (let i = half; i < smooth.length - half; i++)
    if (Number.isFinite(smooth[i]!) && (lowest < 0 || smooth[i]! < smooth[lowest]!)) lowest = i;
  if (lowest < 0) return absent('sweep-too-short');
  return measured(smooth[lowest]! - baseline.value!, {
    at: {
      from_s: timeAt(voltage, window.from + lowest - half),
      to_s: timeAt(voltage, window.from + lowest + half + 1),
    },
    ...(baseline.se === undefined ? {} : { se: baseline.se }),
  });
}

/** After an edge, samples this near to it belong to the electrode, s. */
const electrodeTransient_s = 0.001;

/**
 * Jump of the potential at the edges of a step that no membrane can make. Before the edge a straight line over 10 ms
 * is continued to it; after it, beyond the electrode's own transient of 1 ms, a single exponential over at most 15 ms
 * is continued back to it. Mean over onset and end, each with the sign that a resistance left over would give it.
 */
export function measureBridgeStep(input: PassiveInput): Reading {
  const step = stepOf(input.stimulus);
  if (!step) return withoutStep(input.stimulus);
  const jumps = [
    jumpAt(input, step.from_s, step.to_s, Math.sign(step.pa)),
    jumpAt(input, step.to_s, Number.POSITIVE_INFINITY, -Math.sign(step.pa)),
  ];
  const found = jumps.flatMap((jump, k) => (jump === null ? [] : [{ mv: k === 0 ? jump.mv : -jump.mv, se: jump.se }]));
  if (found.length === 0)
    return absent('no-electrode-transient', {
      note: 'no quiet stretch around an edge, or a response too fast to tell from a jump',
    });
  return measured(mean(found.map((jump) => jump.mv))!, {
    n: found.length,
    se: Math.sqrt(found.reduce((sum, jump) => sum + jump.se ** 2, 0)) / found.length,
    at: { from_s: step.from_s, to_s: step.to_s },
    note: found.length === 2 ? 'onset and end' : jumps[0] ? 'onset only' : 'end only',
  });
}

function jumpAt(
  input: PassiveInput,
  edge_s: number,
  next_s: number,
  direction: number,
): { mv: number; se: number } | null {
  const { voltage, stimulus, spikes, slow } = input;
  const rate = voltage.rate_hz;
  const edges = stimulus.edges_s;
  const previous = Math.max(voltage.start_s, ...edges.filter((edge) => edge < edge_s - 1e-9));
  const following = Math.min(next_s, ...edges.filter((edge) => edge > edge_s + 1e-9));
  const spans = spikes.flatMap((spike, k) => spikeSpan(spike, spikes[k + 1], slow) ?? []);
  const before_s = Math.max(edge_s - 0.01, previous + 0.4 * (edge_s - previous));
  const nextSpike = Math.min(...spans.map((span) => span.from_s - 0.001).filter((from) => from > edge_s - 0.001));
  const from_s = edge_s + electrodeTransient_s;
  const to_s = Math.min(from_s + 0.015, following - 0.0002, nextSpike);
  if (to_s - from_s < 0.002) return null;
  if (spans.some((span) => span.from_s < edge_s && span.to_s > before_s)) return null;

  const edge = (edge_s - voltage.start_s) * rate;
  const earlier = { from: indexAt(voltage, before_s), to: Math.round(edge) };
  const later = { from: indexAt(voltage, from_s), to: indexAt(voltage, to_s) };
  if (earlier.to - earlier.from < 4 || later.to - later.from < 8 || later.to >= voltage.samples.length) return null;
  // What the filter shows came a little earlier: time runs from when it shows the edge.
  const delay_ms = filterDelayMs(input.filter_khz);
  const take = (part: Stretch): { ms: Float64Array; mv: Float64Array } => ({
    ms: Float64Array.from({ length: part.to - part.from }, (_, i) => ((part.from + i - edge) * 1000) / rate - delay_ms),
    mv: voltage.samples.subarray(part.from, part.to),
  });
  const first = take(earlier);
  const line = linearFit(first.ms, first.mv);
  const second = take(later);
  if (!line || countFinite(second.mv) < 8) return null;
  const after = backToEdge(second.ms, second.mv, line.residual_sd ?? 0);
  if (!after) return null;
  const jump = { mv: after.mv - line.intercept, se: Math.hypot(after.se, line.se_intercept ?? 0) };
  // A jump without a response in the current's direction after it: the membrane has answered within the electrode's
  // time, or there is none.
  return Math.abs(jump.mv) > 3 * jump.se && after.rise_mv * direction < 0.2 * Math.abs(jump.mv) ? null : jump;
}

/** Windows after the edge, ms, the longest first: a response of more than one exponential fits only a shorter one. */
const windows_ms = [16, 9, 5];

/**
 * Value at 0 ms of the response after it, and how far the response goes on from there. Null where the response is too fast, or too far from an exponential, to be
 * told from a jump: a squid axon answers within the millisecond that the electrode needs.
 */
function backToEdge(
  ms: Float64Array,
  mv: Float64Array,
  noise: number,
): { mv: number; se: number; rise_mv: number } | null {
  for (const window of windows_ms) {
    const beyond = ms.findIndex((value) => value > window);
    const n = beyond < 0 ? ms.length : beyond;
    if (n < 8) continue;
    const [x, y] = [ms.subarray(0, n), mv.subarray(0, n)];
    const span = Math.abs(y[n - 1]! - y[0]!);
    const fits = (residual: number): boolean => residual <= 1.5 * noise + 0.005 * span + 1e-9;
    const line = linearFit(x, y);
    const fit = exponentialFit(x, y);
    // A straight line where it does as well: then the exponential's three parameters are not determined.
    const curved = fit?.converged && line && fit.residual_sd < 0.95 * (line.residual_sd ?? 0);
    if (!curved && line && fits(line.residual_sd ?? 0))
      return { mv: line.intercept, se: line.se_intercept ?? 0, rise_mv: line.slope * (x[n - 1]! - x[0]!) };
    if (!fit?.converged || !fits(fit.residual_sd)) continue;
    // A membrane this fast has answered before the electrode is done.
    if (fit.tau < 2) return null;
    const value = fit.offset + fit.amplitude * Math.exp(fit.x0 / fit.tau);
    return { mv: value, se: errorAtEdge(x, y, fit), rise_mv: -fit.amplitude };
  }
  return null;
}

/**
 * Standard error of an exponential carried back to 0: from the Jacobian at the fit, made larger by what neighbouring
 * residuals have in common (slow noise counts as fewer values).
 */
function errorAtEdge(ms: Float64Array, mv: Float64Array, fit: ExponentialFit): number {
  const { offset, amplitude, tau, x0 } = fit;
  const gradient = (time: number): [number, number, number] => {
    const decay = Math.exp(-(time - x0) / tau);
    return [1, decay, (amplitude * (time - x0) * decay) / tau ** 2];
  };
  const m = [0, 0, 0, 0, 0, 0];
  const residuals: number[] = [];
  ms.forEach((time, i) => {
    if (!Number.isFinite(mv[i]!)) return;
    const [a, b, c] = gradient(time);
    [a * a, a * b, a * c, b * b, b * c, c * c].forEach((value, k) => {
      m[k]! += value;
    });
    residuals.push(mv[i]! - offset - amplitude * b);
  });
  const [aa, ab, ac, bb, bc, cc] = m as [number, number, number, number, number, number];
  const [ia, ib, ic] = [bb * cc - bc * bc, ac * bc - ab * cc, ab * bc - ac * bb];
  const [jb, jc, kc] = [aa * cc - ac * ac, ab * ac - aa * bc, aa * bb - ab * ab];
  const determinant = aa * ia + ab * ib + ac * ic;
  const [g, h, k] = gradient(0);
  const form = g * (g * ia + h * ib + k * ic) + h * (g * ib + h * jb + k * jc) + k * (g * ic + h * jc + k * kc);
  if (!(determinant > 0 && form >= 0)) return fit.residual_sd;
  return fit.residual_sd * Math.sqrt((form / determinant) * correlationFactor(residuals));
}

/** 1 + 2·Σ of the autocorrelations up to the first that is not positive. */
function correlationFactor(values: readonly number[]): number {
  const power = values.reduce((sum, value) => sum + value * value, 0);
  if (!(power > 0)) return 1;
  let factor = 1;
  for (let lag = 1; lag < values.length / 3; lag++) {
    let product = 0;
    for (let i = lag; i < values.length; i++) product += values[i]! * values[i - lag]!;
    if (product <= 0) break;
    factor += (2 * product) / power;
  }
  return factor;
}

/** Length kept of the response to a step and the finest bin, s; together at most about 1600 numbers. */
const responseSpan_s = 0.3;
const responseLead_s = 0.01;

/**
 * The potential from 10 ms before the onset of a hyperpolarizing step without spikes to its end or 300 ms into it, in
 * equal bins that begin exactly at the onset. Times from the start of the sweep. Null for every other sweep.
 */
export function stepResponse(input: PassiveInput): SweepMeasure['step_response'] {
  const { voltage, stimulus, spikes } = input;
  const step = stepOf(stimulus);
  if (!step || step.pa >= 0 || step.to_s - step.from_s < shortestStep_s) return null;
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
    const value = mean(voltage.samples.subarray(first + k * block, first + (k + 1) * block));
    if (value === null) return null;
    mv.push(Math.round(value * 1e4) / 1e4);
  }
  if (bins - lead < 10) return null;
  // The centre of the first bin.
  return { start_s: timeAt(voltage, first + (block - 1) / 2), rate_hz: rate / block, mv };
}
