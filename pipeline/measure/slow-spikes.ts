/**
 * What heart and calcium spikes have and others have not: a diastolic level, durations at three depths of
 * repolarization, a plateau, and a stimulus artefact. Tops, bottoms and crossings are read from least-squares parabolas
 * as wide as noise alone explains, so that no single noisy sample sets a number.
 */
import { coverage95 } from '../signal/coverage.ts';
import { crossing, valueAt } from '../signal/crossing.ts';
import { levelOf, type Parabola, parabolaAround, vertexOf, widestParabola } from '../signal/parabola.ts';
import { movingAverage } from '../signal/smoothing.ts';
import { vertex } from '../signal/vertex.ts';
import type { Pulse } from './artefact.ts';
import { type FoundSpike, touchesEdge } from './spike-detection.ts';
import { type SpikeTrace, timeOf, unreadable } from './spike-trace.ts';
import type { AbsenceCode, MeasureContext, Spike } from './types.ts';

/** A number with its place and its standard uncertainty. */
export interface Known {
  at: number;
  value: number;
  se: number;
}
type Maybe = Known | AbsenceCode;
const known = (found: Maybe): found is Known => typeof found === 'object';

/** Widest parabola over a top or a crossing, and over a diastolic minimum, s on each side. */
const widestTop_s = 0.01;
const widestBottom_s = 0.02;
/** Running mean that finds where the lowest diastolic potential lies, s on each side. */
const diastolicMean_s = 0.002;
/** Least stretch before a spike that can show a diastolic level, s. */
const leastDiastole_s = 0.001;
/** A pulse that ends this long before the upstroke still belongs to it, s. */
const answersWithin_s = 0.1;

export const durationsPercent = [30, 50, 90] as const;

/** Per-spike quantities that only slow spikes have. */
export const slowOnly: readonly string[] = [
  'upstroke_at_s',
  'diastolic_potential_mv',
  'apd30_ms',
  'triangulation_ms',
  'plateau_mv',
  'stimulus_artefact_mv',
];

/** Top or bottom of a slow trace around a sample: the vertex of the widest parabola that noise explains. */
export function slowExtreme(trace: SpikeTrace, near: number, widest_s: number): Known {
  const most = Math.max(1, Math.round(widest_s * trace.rateHz));
  const fit = widestParabola(trace.masked, near, trace.noiseMv, most);
  const own = fit && fit.half > 1 ? (vertexOf(fit) ?? { position: fit.centre, value: fit.c0 }) : null;
  if (!own && touchesEdge(trace, near, 1)) {
    // A parabola through samples bridged under an edge would invent a top: the sample itself, and its neighbours' doubt.
    const beside = Math.max(trace.masked[near - 1] ?? -1e9, trace.masked[near + 1] ?? -1e9);
    const value = trace.masked[near]!;
    return { at: near, value, se: Math.hypot(trace.noiseMv, Math.min(Math.abs(value - beside), 2)) };
  }
  if (!fit || !own) {
    const { position, value } = vertex(trace.masked, near);
    return { at: position, value, se: trace.noiseMv };
  }
  // How far the place can be told: where the parabola has left its vertex by its own error.
  return { at: own.position, value: own.value, se: bendOf(trace, fit, own.value) };
}

/** Error of a fitted level: the fit's own, the noise through it, and what half the window would have said instead. */
function bendOf(trace: SpikeTrace, fit: Parabola, value: number): number {
  const inner = widestParabola(trace.masked, fit.centre, Number.POSITIVE_INFINITY, Math.max(1, fit.half >> 1), 1);
  const through = trace.noiseMv * Math.sqrt(9 / (4 * (2 * fit.half + 1)));
  const other = inner ? Math.abs((vertexOf(inner)?.value ?? inner.c0) - value) : 0;
  return Math.hypot(Math.max(fit.seLevel, through), Math.min(0.5 * other, trace.noiseMv));
}

interface Around {
  trace: SpikeTrace;
  context: MeasureContext;
  pulses: readonly Pulse[];
  /** Running mean that finds the diastolic minimum, and the one that finds crossings. */
  calm: Float64Array;
  smooth: Float64Array;
  /** Noise slower than the fast one, mV: hum and wander that a fit over a few milliseconds follows. */
  slowNoise: number;
}

/**
 * Adds to measured slow spikes what only they have, with 95 % half-widths: see `quantities.ts` for each definition.
 * @param spikes as `measureSpikes` found them, one for one with `found`
 * @param pulses brief stimulus pulses with the jump each added
 * @param smoothed the trace averaged over 2·m − 1 samples
 */
export function withSlowValues(
  spikes: readonly Spike[],
  found: readonly FoundSpike[],
  trace: SpikeTrace,
  context: MeasureContext,
  pulses: readonly Pulse[],
  smoothed: (m: number) => Float64Array,
): Spike[] {
  const calm = movingAverage(trace.masked, Math.max(1, Math.round(diastolicMean_s * trace.rateHz)));
  const upstrokes = found.map((spike) => upstrokeOf(spike, trace));
  const slowNoise = slowNoiseOf(trace, calm, found);
  return spikes.map((spike, k) => {
    const around: Around = {
      trace,
      context,
      pulses,
      calm,
      smooth: smoothed(found[k]!.slope.m),

      slowNoise,
    };
    return withValues(spike, k, found, upstrokes, around);
  });
}

/**
 * Steepest rise: its time is the vertex over three slopes; it is uncertain by the stretch whose slope noise cannot tell
 * from the steepest.
 */
function upstrokeOf(spike: FoundSpike, trace: SpikeTrace): Maybe {
  const { values, noise, m } = spike.rateSlope;
  if (spike.hidden) {
    const { from, to } = spike.hidden;
    return { at: (from + to) / 2, value: Number.NaN, se: (to - from) / Math.sqrt(12) };
  }
  if (touchesEdge(trace, spike.steepest, m)) return 'under-stimulus';
  const top = vertex(values, spike.steepest);
  const near = Math.abs(top.position - spike.steepest) <= 1 ? top.position : spike.steepest;
  const level = values[spike.steepest]! - 2 * noise;
  let from = spike.steepest;
  while (from > spike.base && values[from - 1]! >= level) from--;
  let to = spike.steepest;
  while (to < spike.peak && values[to + 1]! >= level) to++;
  return { at: near, value: values[spike.steepest]!, se: Math.max(0.3, (to - from) / Math.sqrt(12)) };
}

/**
 * Wander that fast noise does not explain, mV: running means over 4 ms against the mean of those 10 ms before and after,
 * from the lowest potential after a spike to the rise of the next.
 */
function slowNoiseOf(trace: SpikeTrace, calm: Float64Array, found: readonly FoundSpike[]): number {
  const lag = Math.max(1, Math.round(0.01 * trace.rateHz));
  const bends: number[] = [];
  const quiet = (from: number, to: number): void => {
    for (let i = from + lag; i + lag < to; i += Math.ceil(lag / 2))
      bends.push(Math.abs(calm[i]! - 0.5 * (calm[i - lag]! + calm[i + lag]!)));
  };
  const risesAt = (spike: FoundSpike): number => Math.floor(spike.threshold ?? spike.base);
  found.forEach((spike, k) => {
    const segment = trace.segments[spike.segment]!;
    const next = found[k + 1];
    const until = (next ? risesAt(next) : segment.to) - lag;
    if (k === 0) quiet(segment.from, risesAt(spike) - lag);
    const lowest = lowestIn(calm, spike.peak, until);
    if (lowest !== null) quiet(lowest, until);
  });
  if (bends.length < 8) return 0;
  bends.sort((a, b) => a - b);
  // Median of |x| is 0.6745 SD; the difference has 1.5 times the variance.
  const seen = bends[bends.length >> 1]! / 0.6745 / Math.sqrt(1.5);
  const fast = trace.noiseMv / Math.sqrt(2 * diastolicMean_s * trace.rateHz + 1);
  return Math.sqrt(Math.max(0, seen * seen - fast * fast));
}

function withValues(
  spike: Spike,
  k: number,
  found: readonly FoundSpike[],
  upstrokes: readonly Maybe[],
  around: Around,
): Spike {
  const { trace, slowNoise } = around;
  const values = { ...spike.values };
  const why = { ...spike.why };
  const u95: Record<string, number> = { ...spike.u95 };
  const normal = coverage95();
  const put = (id: string, found: AbsenceCode | { value: number; se: number }): void => {
    delete u95[id];
    if (typeof found === 'string' || !Number.isFinite(found.value)) {
      values[id] = null;
      why[id] = typeof found === 'string' ? found : 'unresolved';
      return;
    }
    values[id] = found.value;
    delete why[id];
    if (Number.isFinite(found.se)) u95[id] = normal * found.se;
  };
  const own = found[k]!;
  const perMs = trace.rateHz / 1000;
  const rise = upstrokes[k]!;
  const next = found[k + 1];
  const sameStretch = next !== undefined && next.segment === own.segment;
  const peak: Maybe = values['peak_mv'] == null ? (why['peak_mv'] ?? 'unresolved') : peakOf(own, around);
  if (known(peak)) {
    const level = Math.hypot(peak.se, slowNoise);
    for (const id of ['peak_mv', 'overshoot_mv']) if (values[id] != null) u95[id] = normal * level;
  }
  const diastolic = diastolicOf(k, found, around);
  put(
    'diastolic_potential_mv',
    known(diastolic) ? { ...diastolic, se: Math.hypot(diastolic.se, slowNoise) } : diastolic,
  );
  put('upstroke_at_s', known(rise) ? { value: timeOf(trace, rise.at), se: rise.se / trace.rateHz } : rise);
  put('max_rise_v_per_s', maxRise(own, rise, around));
  const after = upstrokes[k + 1];
  put(
    'cycle_length_ms',
    next === undefined
      ? (why['cycle_length_ms'] ?? 'cut-off-by-sweep-end')
      : !sameStretch
        ? 'unreadable'
        : !known(rise)
          ? rise
          : !known(after!)
            ? after!
            : { value: (after.at - rise.at) / perMs, se: Math.hypot(after.se, rise.se) / perMs },
  );
  const ends = durationsPercent.map((percent) => {
    const end = fallsTo(percent / 100, own, sameStretch ? next : null, peak, diastolic, around);
    put(
      `apd${percent}_ms`,
      !known(end)
        ? end
        : !known(rise)
          ? rise
          : { value: (end.at - rise.at) / perMs, se: Math.hypot(end.se, rise.se) / perMs },
    );
    return end;
  });
  const [to30, , to90] = ends;
  put(
    'triangulation_ms',
    !known(to30!)
      ? to30!
      : !known(to90!)
        ? to90!
        : { value: (to90.at - to30.at) / perMs, se: Math.hypot(to30.se, to90.se) / perMs },
  );
  put('plateau_mv', plateauOf(rise, to90!, around));
  put('stimulus_artefact_mv', artefactOf(rise, own, around));
  const bottom = bottomOf(spike, around);
  if (known(bottom)) {
    put('ahp_minimum_mv', { ...bottom, se: Math.hypot(bottom.se, slowNoise) });
    if (values['threshold_mv'] != null) values['ahp_below_threshold_mv'] = values['threshold_mv'] - bottom.value;
  }
  if (values['max_fall_v_per_s'] != null) put('max_fall_v_per_s', maxFall(own, values, around));
  for (const [id, se] of Object.entries(commonErrors(own, values, peak, bottom, around)))
    if (values[id] != null && Number.isFinite(se)) u95[id] = normal * se;
  return { ...spike, values, why, u95 };
}

/** The minimum after the spike, where the samples have shown one: vertex of a parabola, as the diastolic level. */
function bottomOf(spike: Spike, around: Around): Maybe {
  const { trace, calm } = around;
  const { ahp_minimum_mv } = spike.values;
  const phase = spike.phases.find(({ name }) => name === 'afterhyperpolarization');
  if (ahp_minimum_mv == null || !phase) return spike.why['ahp_minimum_mv'] ?? 'unresolved';
  const found = Math.round((phase.to_s - trace.startS) * trace.rateHz);
  const back = Math.round((phase.from_s - trace.startS) * trace.rateHz);
  const reach = Math.round(widestBottom_s * trace.rateHz);
  const lowest = lowestIn(calm, Math.max(back, found - reach), found + Math.min(reach, Math.round((found - back) / 2)));
  return lowest === null ? 'unresolved' : bottomAt(lowest, around);
}

/** Windows that a fall is looked for with, ms on each side, the widest first. */
const fallWindows_ms = [4, 2, 1, 0.5, 0.25];

/**
 * Steepest fall from the peak to the return to threshold, or to 90 % repolarization: the least-squares slope over the
 * widest window, unless a narrower one shows a steeper fall by more than noise makes the steepest of many slopes.
 */
function maxFall(spike: FoundSpike, values: Spike['values'], { trace }: Around): AbsenceCode | Omit<Known, 'at'> {
  const span_ms = values['repolarization_ms'] ?? values['apd90_ms'];
  if (span_ms == null) return 'unresolved';
  const perMs = trace.rateHz / 1000;
  const to = spike.peak + Math.ceil(span_ms * perMs);
  interface Fall {
    at: number;
    slope: number;
    se: number;
    half: number;
  }
  let best = null as Fall | null;
  // What the next narrower window would say: it shows what the chosen one has averaged away, and noise.
  let narrower = null as Fall | null;
  for (const ms of fallWindows_ms) {
    const half = Math.max(2, Math.round(ms * perMs));
    const se = trace.noiseMv * Math.sqrt(3 / (half * (half + 1) * (2 * half + 1)));
    let own = null as Fall | null;
    for (let i = spike.peak + Math.ceil(half / 2); i <= to; i += Math.max(1, half >> 2)) {
      const fit = parabolaAround(trace.masked, i, half);
      if (fit && (own === null || fit.c1 < own.slope)) own = { at: i, slope: fit.c1, se, half };
    }
    // The steepest of N independent slopes lies √(2 ln N) of their standard deviations out.
    const push = se * (2 + Math.sqrt(2 * Math.log(Math.max(2, (to - spike.peak) / half))));
    if (own && (best === null || own.slope < best.slope - push)) {
      best = own;
      narrower = null;
    } else narrower ??= own;
  }
  if (best === null) return 'unresolved';
  if (unreadable(trace, best.at, best.at)) return 'unreadable';
  const other = narrower?.slope ?? parabolaAround(trace.masked, best.at, Math.max(2, best.half >> 1))?.c1 ?? best.slope;
  return { value: best.slope * perMs, se: Math.hypot(best.se, other - best.slope) * perMs };
}

/** How many samples before the crossing lies earlier where the slope is taken over twice the window; 0 if not found. */
function widerShift({ steepest, threshold, slope }: FoundSpike, { trace }: Around): number {
  if (threshold === null) return 0;
  const level = valueAt(slope.values, threshold);
  for (let i = steepest; i > threshold - 20 * slope.m && i > 2 * slope.m; i--) {
    const fit = parabolaAround(trace.masked, i, 2 * slope.m);
    if (!fit) return 0;
    if ((fit.c1 * trace.rateHz) / 1000 < level) return Math.abs(threshold - (i + 0.5));
  }
  return 0;
}

/**
 * Standard errors of threshold, height, widths and phases of a slow spike. The crossing of the criterion is uncertain by
 * the noise of the slope over the slope's own change there, by what a window twice as wide would shift it, and by 0.3
 * samples; a time of falling by the error of its level, the fast noise and the slow one over the slope there.
 */
function commonErrors(
  spike: FoundSpike,
  values: Spike['values'],
  peak: Maybe,
  bottom: Maybe,
  around: Around,
): Record<string, number> {
  const { trace, slowNoise } = around;
  const { slope } = spike;
  const perMs = trace.rateHz / 1000;
  const at = spike.threshold;
  if (at === null || values['threshold_mv'] == null) return {};
  const i = Math.floor(at);
  const [before, after] = [slope.values[i - slope.m], slope.values[i + 1 + slope.m]];
  const bend = before === undefined || after === undefined ? Number.NaN : (after - before) / (2 * slope.m + 1);
  // Noise cannot move the crossing past the steepest point, nor as far the other way.
  const placeSe = Math.min(
    Math.hypot(bend > 0 ? slope.noise / bend : Number.POSITIVE_INFINITY, widerShift(spike, around), 0.3),
    spike.steepest - at,
  );
  const thresholdSe = Math.hypot(chord(trace, at, placeSe), trace.noiseMv / Math.sqrt(2 * slope.m + 1), slowNoise);
  const out: Record<string, number> = {
    threshold_mv: thresholdSe,
    threshold_at_s: placeSe / trace.rateHz,
  };
  if (known(bottom)) out['ahp_below_threshold_mv'] = Math.hypot(thresholdSe, bottom.se, slowNoise);
  if (!known(peak)) return out;
  const top = widestParabola(trace.masked, Math.round(peak.at), trace.noiseMv, Math.round(widestTop_s * trace.rateHz));
  const peakPlace = top && top.c2 < 0 ? Math.max(0.5, Math.sqrt(peak.se / -top.c2) / 2) : Number.NaN;
  const heightSe = Math.hypot(thresholdSe, peak.se);
  Object.assign(out, {
    peak_at_s: peakPlace / trace.rateHz,
    spike_height_mv: heightSe,
    height_from_rest_mv: Math.hypot(peak.se, slowNoise),
    depolarization_ms: Math.hypot(placeSe, peakPlace) / perMs,
  });
  const height = values['spike_height_mv'];
  if (height == null) return out;
  const half = values['threshold_mv'] + height / 2;
  const halfSe = Math.hypot(thresholdSe / 2, peak.se / 2);
  const down = fallErrorAt(half, halfSe, peak.at, around);
  const rises = valueAt(slope.values, spike.steepest) / perMs;
  if (down !== null)
    out['half_width_ms'] = Math.hypot(down, Math.hypot(halfSe, 2 * trace.noiseMv) / rises, 0.3) / perMs;
  const back = fallErrorAt(values['threshold_mv'], thresholdSe, peak.at, around);
  if (back !== null) out['repolarization_ms'] = Math.hypot(back, peakPlace) / perMs;
  return out;
}

/** How much the trace changes on average over ±`reach` samples about a place. */
function chord(trace: SpikeTrace, at: number, reach: number): number {
  const [from, to] = [valueAt(trace.masked, at - Math.max(1, reach)), valueAt(trace.masked, at + Math.max(1, reach))];
  const change = Math.abs(to - from) / 2;
  return Number.isFinite(change) ? change * Math.min(1, reach) : 0;
}

/** Standard error, samples, of the first fall through a level of known error. */
function fallErrorAt(level: number, levelSe: number, from: number, around: Around): number | null {
  const { trace, smooth, slowNoise } = around;
  const rough = crossing(smooth, level, { from: Math.floor(from), to: trace.mv.length - 1, direction: 'down' });
  if (rough === null) return null;
  const centre = Math.round(rough);
  const least = Math.max(1, Math.min(Math.round(0.002 * trace.rateHz), centre - Math.ceil(from)));
  const broad = widestParabola(
    trace.masked,
    centre,
    trace.noiseMv,
    Math.max(least, Math.round(0.01 * trace.rateHz)),
    least,
  );
  if (!broad || broad.c1 === 0) return null;
  // The first fall of a noisy trace comes early by as much as its noise: no averaging helps against that.
  return Math.hypot(levelSe, 2 * trace.noiseMv, slowNoise) / Math.abs(broad.c1);
}

/** The top as `peakAt` reads it. */
function peakOf(spike: FoundSpike, { trace, pulses }: Around): Known {
  const plain = slowExtreme(trace, spike.peak, widestTop_s);
  // While a pulse lasts its jump has been taken off, and with it comes what is not known of it.
  const during = pulses.find(({ on_s, off_s }) => on_s <= timeOf(trace, plain.at) && timeOf(trace, plain.at) <= off_s);
  const top = during?.u95_mv ? { ...plain, se: Math.hypot(plain.se, during.u95_mv / coverage95()) } : plain;
  const { before, after } = trace.guard;
  const edge = trace.edges.find(({ index }) => top.at >= index - before - 1 && top.at <= index + after + 3);
  if (!edge) return top;
  // Under a stimulus edge the electrode's own settling may stand on the top: what is seen outside is as good a reading.
  let outside = Number.NEGATIVE_INFINITY;
  for (const i of [edge.index - before - 2, edge.index + after + 2])
    if (i > spike.base && i < trace.mv.length) outside = Math.max(outside, trace.mv[i]!);
  // A top between the two may stand as much higher as the trace falls in as long a time after.
  const zone = before + after + 3;
  const falls = (trace.mv[edge.index + after + 2] ?? 0) - (trace.mv[edge.index + after + 2 + zone] ?? 0);
  const doubt = Number.isFinite(outside) ? Math.hypot(top.value - outside, falls / 2) : 0;
  return { ...top, se: Math.hypot(top.se, doubt) };
}

/** Peak of a slow spike, for `measureSpikes`. */
export const slowPeak = (trace: SpikeTrace, peak: number): { position: number; value: number } => {
  const { at, value } = slowExtreme(trace, peak, widestTop_s);
  return { position: at, value };
};

/**
 * Lowest potential between the spike before and this one. Where the sweep begins later than that minimum, the minimum
 * after this spike stands for it.
 */
function diastolicOf(k: number, found: readonly FoundSpike[], around: Around): Maybe {
  const { trace, context, calm } = around;
  const own = found[k]!;
  const reach = (context.ahp_window_ms / 1000) * trace.rateHz;
  const segment = trace.segments[own.segment]!;
  const before = found[k - 1]?.segment === own.segment ? found[k - 1]! : null;
  // What a pulse has already charged is no diastole.
  const pulse = around.pulses.findLast(({ on_s }) => on_s < timeOf(trace, own.threshold ?? own.base));
  const pulseAt = pulse ? Math.floor((pulse.on_s - 0.001 - trace.startS) * trace.rateHz) : Number.POSITIVE_INFINITY;
  const rises = Math.floor(own.threshold ?? own.base);
  const to =
    pulseAt > (before?.peak ?? segment.from) && rises - pulseAt < answersWithin_s * trace.rateHz
      ? Math.min(rises, pulseAt)
      : rises;
  const from = Math.ceil(Math.max(before ? before.peak : segment.from, to - reach));
  const settle = Math.round(diastolicMean_s * trace.rateHz);
  // The running mean shrinks at the ends of a trace, to single noisy samples.
  const inner = to - from > 4 * settle ? settle : 0;
  const lowest = to - from >= leastDiastole_s * trace.rateHz ? lowestIn(calm, from + inner, to) : null;
  // Rising from the first sample on: the minimum was before it.
  const missed =
    lowest !== null && !before && from === segment.from && lowest - from <= 3 * settle && to - from > 8 * settle;
  if (lowest !== null && !(missed && calm[to]! - calm[lowest]! > 6 * trace.noiseMv)) return bottomAt(lowest, around);
  const next = found[k + 1]?.segment === own.segment ? found[k + 1]! : null;
  const until = Math.floor(Math.min(next ? (next.threshold ?? next.base) : segment.to - 1, own.peak + reach));
  const later = lowestIn(calm, own.peak, until);
  if (later !== null && (next || until - later > 2 * settle)) return bottomAt(later, around);
  return lowest === null ? 'no-baseline' : bottomAt(lowest, around);
}

function bottomAt(index: number, around: Around): Maybe {
  const { trace } = around;
  if (unreadable(trace, index, index)) return 'unreadable';
  return slowExtreme(trace, index, widestBottom_s);
}

function lowestIn(values: Float64Array, from: number, to: number): number | null {
  let lowest = -1;
  for (let i = Math.max(0, from); i <= Math.min(values.length - 1, to); i++)
    if (Number.isFinite(values[i]!) && (lowest < 0 || values[i]! < values[lowest]!)) lowest = i;
  return lowest < 0 ? null : lowest;
}

/** First fall after the peak to a share of the way down to the diastolic level. */
function fallsTo(
  share: number,
  spike: FoundSpike,
  next: FoundSpike | null | undefined,
  peak: Maybe,
  diastolic: Maybe,
  around: Around,
): Maybe {
  if (!known(peak)) return peak;
  if (!known(diastolic)) return diastolic;
  const { trace, smooth, slowNoise } = around;
  const level = peak.value - share * (peak.value - diastolic.value);
  const segment = trace.segments[spike.segment]!;
  const until = next ? Math.ceil(next.threshold ?? next.base) : segment.to - 1;
  const rough = crossing(smooth, level, { from: Math.floor(peak.at), to: until, direction: 'down' });
  if (rough === null)
    return next ? 'never-crosses' : segment.to === trace.mv.length ? 'cut-off-by-sweep-end' : 'unreadable';
  if (unreadable(trace, rough, rough)) return 'unreadable';
  const most = Math.max(1, Math.round(widestTop_s * trace.rateHz));
  const centre = Math.round(rough);
  const fit = widestParabola(
    trace.masked,
    centre,
    trace.noiseMv,
    Math.min(most, Math.max(1, centre - Math.ceil(peak.at))),
  );
  const at = fit && fit.half > 1 ? (levelOf(fit, level) ?? rough) : rough;
  // A slope over too few samples is noise: it is taken over 2 ms on each side at least.
  const least = Math.max(1, Math.min(Math.round(0.002 * trace.rateHz), centre - Math.ceil(peak.at)));
  const broad = fit && fit.half >= least ? fit : widestParabola(trace.masked, centre, 0, least, least);
  const slope = broad ? Math.abs(broad.c1) : Number.NaN;
  const through = fit ? Math.max(fit.seLevel, trace.noiseMv * Math.sqrt(9 / (4 * (2 * fit.half + 1)))) : trace.noiseMv;
  const levelSe = Math.hypot((1 - share) * peak.se, share * diastolic.se, slowNoise * Math.SQRT2, through);
  return { at, value: level, se: slope > 0 ? Math.hypot(levelSe / slope, 0.05) : Number.NaN };
}

/** Steepest rise with the noise of a slope and what the sampling interval may have cut off it. */
function maxRise(
  spike: FoundSpike,
  rise: Maybe,
  { trace, context }: Around,
): AbsenceCode | { value: number; se: number } {
  if (!known(rise)) return rise;
  if (spike.hidden) return 'under-stimulus';
  const { m, noise } = spike.rateSlope;
  const broad = widestParabola(trace.masked, spike.steepest, Number.POSITIVE_INFINITY, 2 * m, 2 * m);
  const wider = broad ? (broad.c1 * trace.rateHz) / 1000 : rise.value;
  // A bell-shaped dV/dt of spread σ whose peak is read through something of spread s is lowered by √(1 + s²/σ²). The
  // window over ±m has s² = Δt²·(3m² + 3m − 1)/15; a filter s = 0.1325/f (Gaussian; a Bessel one is near it).
  const spread = (half: number): number => ((1000 / trace.rateHz) ** 2 * (3 * half * half + 3 * half - 1)) / 15;
  const filter = context.filter_khz === null ? 0 : (0.1325 / context.filter_khz) ** 2;
  const ratio = (rise.value / wider) ** 2;
  const seen = ratio > 1 ? (spread(2 * m) - spread(m)) / (ratio - 1) : Number.POSITIVE_INFINITY;
  const own = seen - spread(m) - filter;
  if (!(own > 0.1 * seen)) return 'unresolved';
  const lost = rise.value * (Math.sqrt(seen / own) - 1);
  return { value: rise.value, se: Math.hypot(noise, Number.isFinite(lost) ? lost : 0) };
}

/** Mean potential over the middle fifth of the time from the steepest rise to 90 % repolarization. */
function plateauOf(
  rise: Maybe,
  to90: Maybe,
  { trace, slowNoise }: Around,
): AbsenceCode | { value: number; se: number } {
  if (!known(rise)) return rise;
  if (!known(to90)) return to90;
  const length = to90.at - rise.at;
  const from = Math.round(rise.at + 0.4 * length);
  const to = Math.round(rise.at + 0.6 * length);
  if (to - from < 2) return 'unresolved';
  if (unreadable(trace, from, to)) return 'unreadable';
  const stretch = trace.mv.subarray(from, to + 1);
  const value = stretch.reduce((sum, mv) => sum + mv, 0) / stretch.length;
  const slope = (trace.mv[to]! - trace.mv[from]!) / (to - from);
  const shift = 0.5 * Math.hypot(to90.se, rise.se) * slope;
  return { value, se: Math.hypot(trace.noiseMv / Math.sqrt(stretch.length), shift, slowNoise) };
}

/** The jump of the brief pulse that this upstroke answers. */
function artefactOf(
  rise: Maybe,
  spike: FoundSpike,
  { trace, pulses }: Around,
): AbsenceCode | { value: number; se: number } {
  const upstroke_s = timeOf(trace, known(rise) ? rise.at : spike.steepest);
  const own = pulses.findLast((pulse) => pulse.on_s <= upstroke_s && upstroke_s - pulse.off_s <= answersWithin_s);
  if (!own) return 'no-stimulus';
  if (own.jump_mv === null) return 'under-stimulus';
  return { value: own.jump_mv, se: (own.u95_mv ?? Number.NaN) / coverage95() };
}
