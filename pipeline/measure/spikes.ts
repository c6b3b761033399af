/** Spikes of one sweep and everything measured on each that needs no solution, capacitance or other sweep. */
import { crossing, valueAt } from '../signal/crossing.ts';
import { clippedRuns, quantum, type Run } from '../signal/runs.ts';
import { movingAverage } from '../signal/smoothing.ts';
import { vertex } from '../signal/vertex.ts';
import { type Pulse, withoutArtefacts } from './artefact.ts';
import { filterCorner, knownFilter, restored } from './filter.ts';
import { injectedCurrent, phasesOf } from './phases.ts';
import { slowPeak, withSlowValues } from './slow-spikes.ts';
import { detectSpikes, type FoundSpike, touchesEdge } from './spike-detection.ts';
import { fastNoiseOf, quietBetween } from './spike-noise.ts';
import { type Errors, type FilterView, type Places, uncertainties } from './spike-numbers.ts';
import { type Fine, fineCrossing, fineMinimum, finePeak, fineSlope, fineThreshold, type Trace } from './spike-shape.ts';
import { fastNoise, prepareTrace, type SpikeTrace, timeOf, unreadable } from './spike-trace.ts';
import type { AbsenceCode, MeasureContext, Signal, Spike, Stimulus } from './types.ts';

export { excerptOf } from './envelope.ts';

export interface SpikeInput {
  voltage: Signal;
  current: Signal | null;
  stimulus: Stimulus;
  /** The sweep's baseline, mV, for the height from rest. */
  baseline_mv: number | null;
  context: MeasureContext;
}

export interface MeasuredSpikes {
  spikes: Spike[];
  /** Expected errors of each spike's numbers, before what is slower than the fast noise is known. */
  errors: Errors[];
  /** Standard deviation of the fast noise, mV. */
  noise_mv: number;
  remarks: string[];
}

/** A number with its place, or why there is none. */
type Found = { at: number; value: number } | { why: AbsenceCode };
const missing = (why: AbsenceCode): Found => ({ why });
const isFound = (found: Found): found is { at: number; value: number } => 'at' in found;

/** What the measurements of one spike need of its surroundings; sample indices. */
interface Surroundings {
  trace: SpikeTrace;
  /** The trace averaged over a window that noise asks for; the trace itself where noise is low. */
  smooth: Float64Array;
  clipped: Run[];
  context: MeasureContext;
  /** Covariance of the fast noise, and the trace restored from its filter. */
  covariance: Float64Array;
  view: FilterView;
  /** First and last sample of this spike's segment. */
  first: number;
  last: number;
  /** Whether the segment ends where the sweep does; else a gap ends it. */
  endsWithSweep: boolean;
  previous: FoundSpike | null;
  next: FoundSpike | null;
}

/**
 * Finds the spikes of a sweep and measures each: see DESIGN 5 and `quantities.ts` for every definition. Values that
 * cannot be had are null with their reason in `why`.
 * @returns spikes in order of time, numbered from 0, and remarks for people; never throws for bad samples
 */
export function measureSpikes(input: SpikeInput): MeasuredSpikes {
  const { voltage, current, stimulus, context } = input;
  const injected = injectedCurrent(current, stimulus);
  // 0.3 ms on either side of an edge says whether it adds current.
  const addsCurrent = (edge_s: number): boolean | null => {
    const before = injected.mean(edge_s - 0.0005, edge_s - 0.0002);
    const after = injected.mean(edge_s + 0.0002, edge_s + 0.0005);
    if (!before || !after || after.pa === before.pa) return null;
    return after.pa > before.pa;
  };
  const cleaned = context.slow
    ? withoutArtefacts(voltage, stimulus, current, fastNoise(voltage.samples, voltage.rate_hz))
    : { voltage, pulses: [], guard: null, remarks: [] };
  const trace = prepareTrace(
    cleaned.voltage,
    edgesOf(stimulus, cleaned.pulses),
    context.filter_khz,
    (edge_s) => pulseAdds(edge_s, cleaned.pulses) ?? addsCurrent(edge_s),
    cleaned.guard,
  );
  const detection = detectSpikes(trace, stimulus, context);
  const found = detection.spikes;
  const remarks = [...cleaned.remarks, ...detection.remarks];
  if (found.length === 0) return { spikes: [], errors: [], noise_mv: trace.noiseMv, remarks };
  const clipped = clippedRuns(voltage.samples);
  const smoothBy = new Map<number, Float64Array>();
  const smoothed = (m: number): Float64Array => {
    const half = m - 1;
    const held = smoothBy.get(half) ?? (half === 0 ? trace.masked : movingAverage(trace.masked, half));
    smoothBy.set(half, held);
    return held;
  };
  const quiet = quietBetween(trace, found);
  const { covariance } = fastNoiseOf(trace, trace.masked, quiet);
  const filter = knownFilter(
    context,
    () => filterCorner(voltage, quiet, quantum(voltage.samples.subarray(0, 20_000))),
    trace.rateHz,
  );
  const before = restored(trace.masked, trace.rateHz, filter);
  const view: FilterView = {
    filter,
    restored: before,
    covariance: fastNoiseOf(trace, before, quiet).covariance,
  };
  const measures = found.map((spike, k) => {
    const segment = trace.segments[spike.segment]!;
    const neighbour = (other: FoundSpike | undefined): FoundSpike | null =>
      other && other.segment === spike.segment ? other : null;
    const around: Surroundings = {
      trace,
      smooth: smoothed(context.slow ? spike.slope.m : spike.rateSlope.m),
      clipped,
      context,
      covariance,
      view,
      first: segment.from,
      last: segment.to - 1,
      endsWithSweep: spike.segment === trace.segments.length - 1 && segment.to === trace.mv.length,
      previous: neighbour(found[k - 1]),
      next: neighbour(found[k + 1]),
    };
    return measureOne(k, spike, found[k + 1] ?? null, around, input.baseline_mv, injected);
  });
  const spikes = measures.map((one) => one.spike);
  return {
    spikes: context.slow ? withSlowValues(spikes, found, trace, context, cleaned.pulses, smoothed) : spikes,
    errors: measures.map((one) => one.errors),
    noise_mv: Math.sqrt(covariance[0]!),
    remarks,
  };
}

/** Edges of the stimulus, with those of pulses that only the voltage shows. */
const edgesOf = (stimulus: Stimulus, pulses: readonly Pulse[]): number[] => [
  ...stimulus.edges_s,
  ...pulses.flatMap((pulse) => (pulse.inferred ? [pulse.on_s, pulse.off_s] : [])),
];

/** Whether an edge is a pulse's onset that pushes up or its end that lets go, as the voltage itself shows it. */
function pulseAdds(edge_s: number, pulses: readonly Pulse[]): boolean | null {
  for (const { on_s, off_s, jump_mv, inferred } of pulses) {
    if (!inferred || jump_mv === null) continue;
    if (Math.abs(on_s - edge_s) < 1e-9) return jump_mv > 0;
    if (Math.abs(off_s - edge_s) < 1e-9) return jump_mv < 0;
  }
  return null;
}

function measureOne(
  number: number,
  spike: FoundSpike,
  following: FoundSpike | null,
  around: Surroundings,
  baseline_mv: number | null,
  injected: ReturnType<typeof injectedCurrent>,
): { spike: Spike; errors: Errors } {
  const { trace, context } = around;
  const values: Record<string, number | null> = {};
  const why: Record<string, AbsenceCode> = {};
  const put = (id: string, value: number | AbsenceCode): void => {
    if (typeof value === 'number' && Number.isFinite(value)) values[id] = value;
    else {
      values[id] = null;
      why[id] = typeof value === 'number' ? 'unresolved' : value;
    }
  };
  const perMs = trace.rateHz / 1000;
  const fine = fineTrace(spike, around);
  const slope = spike.threshold === null ? Number.NaN : valueAt(spike.slope.values, spike.threshold) / perMs;
  // Everything is found on the samples first; what has been found there is then placed between them.
  const roughPeak = peakOf(spike, around);
  const roughAt = isFound(roughPeak) ? roughPeak.at : spike.peak;
  const limit = afterSpike(roughAt, around);
  const rise_ms = Math.max(1, roughAt - (spike.threshold ?? spike.base));
  const coarsest = (samples: number): number => featureShare * samples;
  const thresholdAt = (at: number): Fine =>
    fineThreshold(fine, at, slope, Math.max(2, spike.slope.m), coarsest(rise_ms)) ??
    roughly(at, valueAt(trace.mv, at), fine);
  const peakAtFine = (at: number, value: number): Fine =>
    finePeak(fine, at, coarsest(rise_ms)) ?? roughly(at, value, fine);
  const places: Places = {
    threshold: spike.threshold === null ? null : thresholdAt(spike.threshold),
    peak: isFound(roughPeak) ? peakAtFine(roughPeak.at, roughPeak.value) : null,
    up: null,
    down: null,
    back: null,
    rise: null,
    fall: null,
    lowest: null,
  };
  const threshold: Found = places.threshold ?? missing(spike.why_no_threshold ?? 'never-crosses');
  const peak: Found = places.peak ?? roughPeak;
  put('threshold_mv', isFound(threshold) ? threshold.value : threshold.why);
  put('threshold_at_s', isFound(threshold) ? timeOf(trace, threshold.at) : threshold.why);
  put('peak_mv', isFound(peak) ? peak.value : peak.why);
  // Where the very top is clipped or unreadable its time is still known to within that stretch, and is given.
  put('peak_at_s', timeOf(trace, isFound(peak) ? peak.at : spike.peak));
  put('overshoot_mv', isFound(peak) ? peak.value : peak.why);
  put(
    'height_from_rest_mv',
    !isFound(peak) ? peak.why : baseline_mv === null ? 'no-baseline' : peak.value - baseline_mv,
  );

  const peakAt = isFound(peak) ? peak.at : spike.peak;
  const height: number | AbsenceCode = !isFound(peak)
    ? peak.why
    : !isFound(threshold)
      ? threshold.why
      : peak.value - threshold.value;
  put('spike_height_mv', height);
  const toPeak = !isFound(peak) ? peak.why : !isFound(threshold) ? threshold.why : peakAt - threshold.at;
  put('depolarization_ms', typeof toPeak === 'number' ? toPeak / perMs : toPeak);
  put('rise_samples', toPeak);

  const width =
    typeof height === 'number' && isFound(threshold)
      ? halfWidth(threshold.value + height / 2, spike, peakAt, limit.nextSpike, around)
      : (height as AbsenceCode);
  if (typeof width !== 'string' && typeof height === 'number' && isFound(threshold)) {
    const level = threshold.value + height / 2;
    const place = (at: number, up: boolean): Fine =>
      fineCrossing(fine, at, level, up, coarsest(up ? rise_ms : width.down - width.up)) ??
      roughly(at, valueAt(spike.slope.values, at) / perMs, fine);
    places.up = place(width.up, true);
    places.down = place(width.down, false);
  }
  put('half_width_ms', typeof width === 'string' ? width : (places.down!.at - places.up!.at) / perMs);
  const falls = typeof width === 'string' ? 2 * rise_ms : Math.max(rise_ms, width.down - width.up);

  const roughBack = isFound(threshold) ? fallTo(threshold.value, peakAt, limit.nextSpike, around) : threshold;
  if (isFound(roughBack))
    places.back =
      fineCrossing(fine, roughBack.at, roughBack.value, false, coarsest(falls)) ??
      roughly(roughBack.at, valueAt(spike.slope.values, roughBack.at) / perMs, fine);
  const back: Found = isFound(roughBack) ? { ...roughBack, at: places.back!.at } : roughBack;
  put('repolarization_ms', !isFound(peak) ? peak.why : isFound(back) ? (back.at - peakAt) / perMs : back.why);

  const rise = spike.hidden
    ? missing('under-stimulus')
    : extremeSlope(spike, 'rise', isFound(threshold) ? threshold.at : spike.base, peakAt, around);
  if (isFound(rise))
    places.rise = fineSlope(fine, rise.at, true, 0.7 * coarsest(rise_ms)) ?? roughly(rise.at, rise.value / perMs, fine);
  // Fewer points than that on the whole rise say nothing of its steepest part.
  const tooFew = typeof toPeak === 'number' && toPeak < fewestOnRise;
  put('max_rise_v_per_s', !isFound(rise) ? rise.why : tooFew ? 'rate-too-low' : places.rise!.value * perMs);
  const roughLowest = lowestAfter(peakAt, back, limit, around);
  if (isFound(roughLowest))
    places.lowest =
      fineMinimum(
        fine,
        roughLowest.at,
        Math.floor(Math.min(roughLowest.at - peakAt, limit.end - roughLowest.at, 0.02 * trace.rateHz)),
      ) ?? roughly(roughLowest.at, roughLowest.value, fine);
  const lowest: Found = places.lowest ?? roughLowest;
  const fallEnd = isFound(lowest) ? lowest.at : isFound(back) ? back.at : limit.end;
  const fall = extremeSlope(spike, 'fall', peakAt, fallEnd, around);
  if (isFound(fall))
    places.fall = fineSlope(fine, fall.at, false, coarsest(falls)) ?? roughly(fall.at, fall.value / perMs, fine);
  put('max_fall_v_per_s', !isFound(fall) ? fall.why : places.fall!.value * perMs);

  put('ahp_minimum_mv', isFound(lowest) ? lowest.value : lowest.why);
  put(
    'ahp_below_threshold_mv',
    !isFound(lowest) ? lowest.why : !isFound(threshold) ? threshold.why : threshold.value - lowest.value,
  );
  put('cycle_length_ms', cycle(roughPeak, following, around));
  const durations: Errors = {};
  for (const percent of [50, 90]) {
    const found = apd(percent / 100, spike, peak, rise, limit.nextSpike, around);
    put(`apd${percent}_ms`, typeof found === 'string' ? found : found.ms);
    if (typeof found !== 'string') durations[`apd${percent}_ms`] = { bias: 0, sd: found.sd };
  }

  const phases = phasesOf(
    {
      threshold_s: isFound(threshold) ? timeOf(trace, threshold.at) : null,
      peak_s: timeOf(trace, peakAt),
      return_s: isFound(back) && back.at <= limit.end ? timeOf(trace, back.at) : null,
      minimum_s: isFound(lowest) ? timeOf(trace, lowest.at) : null,
      end_s: timeOf(trace, limit.end),
    },
    (time_s) => {
      const value = valueAt(trace.mv, (time_s - trace.startS) * trace.rateHz);
      return Number.isFinite(value) ? value : null;
    },
    trace.noiseMv,
    injected,
    context.capacitance_pf,
  );
  if (context.slow) return { spike: { spike: number, values, why, phases }, errors: {} };
  const errors = { ...uncertainties(places, fine, { slope, perMs }, around.view, values, why), ...durations };
  const peakTime = errors['peak_at_s'];
  if (peakTime) errors['cycle_length_ms'] = { bias: 0, sd: 1000 * Math.SQRT2 * peakTime.sd };
  return { spike: { spike: number, values, why, phases }, errors };
}

/** A smoother takes in at most this share of the rise or of the width on either side of its place. */
const featureShare = 0.5;

/** Samples from threshold to peak below which there is no maximum rise. */
const fewestOnRise = 6;

/** The trace as one spike may use it: its own segment, between the stimulus edges before its rise and after its peak. */
function fineTrace(spike: FoundSpike, { trace, covariance, first, last, clipped, context }: Surroundings): Trace {
  // Slow spikes need no place between samples; `slow-spikes.ts` smooths them by its own lights and says how well.
  if (context.slow) return { samples: trace.masked, covariance, first: 0, last: -1 };
  const start = spike.threshold ?? spike.steepest;
  const before = trace.edges.findLast(({ index }) => index + trace.guard.after < start);
  const after = trace.edges.find(({ index }) => index - trace.guard.before > spike.peak + 1);
  // A clipped top is no trace to interpolate in.
  const cut = clipped.find((run) => run.at === 'top' && run.from > start && run.from <= spike.peak + 1);
  return {
    samples: trace.masked,
    covariance,
    first: Math.max(first, before ? before.index + trace.guard.after + 1 : first),
    last: Math.min(last, after ? after.index - trace.guard.before - 1 : last, cut ? cut.from - 1 : last),
  };
}

/** A place that could only be had on the samples: within a third of a sample, and within the noise of one. */
const roughly = (at: number, value: number, { covariance }: Trace): Fine => {
  const sd = Math.sqrt(covariance[0]!);
  return { at, value, sd, sdAt: 0.3, shift: 2 * sd, shiftAt: 0.3, smoother: { cutoff: 1 } };
};

/** Parabola through the top three samples. */
function peakOf(spike: FoundSpike, { trace, clipped, context }: Surroundings): Found {
  if (clipped.some((run) => run.at === 'top' && spike.peak >= run.from - 1 && spike.peak <= run.to))
    return missing('clipped');
  if (unreadable(trace, spike.peak - 1, spike.peak + 1)) return missing('unreadable');
  // Under a stimulus edge the trace is a line drawn across it.
  if (!context.slow && touchesEdge(trace, spike.peak, 1)) return missing('unresolved');
  const { position, value } = context.slow ? slowPeak(trace, spike.peak) : vertex(trace.mv, spike.peak);
  return { at: position, value };
}

/** Time from this peak to the next spike's, ms. */
function cycle(peak: Found, following: FoundSpike | null, around: Surroundings): number | AbsenceCode {
  if (!isFound(peak)) return peak.why;
  if (following === null) return around.endsWithSweep ? 'cut-off-by-sweep-end' : 'unreadable';
  if (around.next === null) return 'unreadable';
  const next = peakOf(following, around);
  return isFound(next) ? ((next.at - peak.at) / around.trace.rateHz) * 1000 : next.why;
}

interface AfterSpike {
  /** Where the afterhyperpolarization window ends, and what ends it. */
  end: number;
  endedBy: 'threshold' | 'edge' | 'window' | 'samples';
  /** Where the next spike's rise begins, or the last sample. */
  nextSpike: number;
}

function afterSpike(peakAt: number, { trace, context, next, last }: Surroundings): AfterSpike {
  const nextSpike = next ? Math.max(peakAt, next.threshold ?? next.base) : last;
  const edge = trace.edges.find(({ index }) => index - trace.guard.before > peakAt);
  const ends: [number, AfterSpike['endedBy']][] = [
    [nextSpike, next ? 'threshold' : 'samples'],
    [peakAt + (context.ahp_window_ms / 1000) * trace.rateHz, 'window'],
    [edge === undefined ? Number.POSITIVE_INFINITY : edge.index - trace.guard.before, 'edge'],
  ];
  const [end, endedBy] = ends.reduce((nearest, candidate) => (candidate[0] < nearest[0] ? candidate : nearest));
  return { end, endedBy, nextSpike };
}

const endReason = (around: Surroundings): AbsenceCode =>
  around.next ? 'never-crosses' : around.endsWithSweep ? 'cut-off-by-sweep-end' : 'unreadable';

/** First fall to a level after the peak, before the next spike. */
function fallTo(level: number, peakAt: number, nextSpike: number, around: Surroundings): Found {
  const { trace, smooth } = around;
  const at = crossing(smooth, level, { from: Math.floor(peakAt), to: Math.ceil(nextSpike), direction: 'down' });
  if (at === null || at > nextSpike) return missing(endReason(around));
  if (unreadable(trace, at, at)) return missing('unreadable');
  return { at, value: level };
}

/** Where the spike passes a level on its way up and down, on the samples. */
function halfWidth(
  level: number,
  spike: FoundSpike,
  peakAt: number,
  nextSpike: number,
  around: Surroundings,
): { up: number; down: number } | AbsenceCode {
  const { trace, smooth } = around;
  const up = crossing(trace.masked, level, {
    from: Math.ceil(peakAt),
    to: Math.floor(spike.threshold ?? spike.base),
    direction: 'up',
  });
  if (up === null) return 'never-crosses';
  if (unreadable(trace, up, up)) return 'unreadable';
  const down = crossing(smooth, level, { from: Math.floor(peakAt), to: Math.ceil(nextSpike), direction: 'down' });
  if (down === null) return endReason(around);
  if (unreadable(trace, down, down)) return 'unreadable';
  return { up, down };
}

/** Steepest rise or fall in an index range, stimulus edges left out. */
function extremeSlope(
  spike: FoundSpike,
  way: 'rise' | 'fall',
  from: number,
  to: number,
  { trace, clipped }: Surroundings,
): Found {
  const { values, m } = spike.rateSlope;
  const sign = way === 'rise' ? 1 : -1;
  let best = -1;
  for (let i = Math.max(0, Math.floor(from)); i <= Math.min(values.length - 1, Math.ceil(to)); i++) {
    if (touchesEdge(trace, i, m) || !Number.isFinite(values[i]!)) continue;
    if (best < 0 || sign * values[i]! > sign * values[best]!) best = i;
  }
  if (best < 0 || sign * values[best]! <= 0) return missing('unresolved');
  if (unreadable(trace, best - m, best + m)) return missing('unreadable');
  for (let i = Math.max(1, Math.floor(from)); i <= Math.min(values.length - 1, Math.ceil(to)); i++) {
    const across = sign * (trace.masked[i]! - trace.masked[i - 1]!) * (trace.rateHz / 1000);
    if (trace.underEdge[i] === 1 && across > sign * values[best]!) return missing('unresolved');
  }
  // A clipped top hides the fall or rise only where the steepest visible slope is the entry into it.
  if (clipped.some((run) => best >= run.from - m && best < run.to + m)) return missing('clipped');
  return { at: best, value: values[best]! };
}

/** Lowest potential of the afterhyperpolarization window. */
function lowestAfter(peakAt: number, back: Found, limit: AfterSpike, around: Surroundings): Found {
  const { trace, smooth, clipped } = around;
  const from = Math.ceil(peakAt);
  const to = Math.floor(limit.end);
  let lowest = from;
  for (let i = from; i <= to; i++) if (smooth[i]! < smooth[lowest]!) lowest = i;
  const returned = isFound(back) && back.at <= limit.end;
  // Still falling where the samples end, or towards threshold where the next edge comes: the minimum lies beyond.
  const lastTwentieth = to - Math.max(1, (to - from) / 20);
  if (lowest >= lastTwentieth && limit.endedBy === 'samples') return missing(endReason(around));
  if (lowest >= lastTwentieth && limit.endedBy === 'edge' && !returned) return missing('unresolved');
  if (to <= from) return missing(limit.endedBy === 'samples' ? endReason(around) : 'unresolved');
  if (unreadable(trace, lowest - 1, lowest + 1)) return missing('unreadable');
  if (clipped.some((run) => run.at === 'bottom' && lowest >= run.from && lowest < run.to)) return missing('clipped');
  return { at: lowest, value: smooth[lowest]! };
}

/** Least stretch before a spike that can show a diastolic level, s. */
const leastDiastole_s = 0.001;

/**
 * Time from the steepest rise until a share of the way from peak to the preceding diastolic level is gone: the lowest
 * potential since the peak before, at most the class's afterhyperpolarization window back.
 */
function apd(
  share: number,
  spike: FoundSpike,
  peak: Found,
  rise: Found,
  nextSpike: number,
  around: Surroundings,
): { ms: number; sd: number } | AbsenceCode {
  if (!isFound(peak)) return peak.why;
  if (!isFound(rise)) return rise.why;
  const { trace, smooth, first, previous, context } = around;
  const to = Math.floor(spike.threshold ?? spike.base);
  const from = Math.max(previous ? previous.peak : first, to - (context.ahp_window_ms / 1000) * trace.rateHz);
  if (to - from < leastDiastole_s * trace.rateHz) return 'no-baseline';
  let diastolic = Number.POSITIVE_INFINITY;
  for (let i = Math.ceil(from); i <= to; i++) diastolic = Math.min(diastolic, smooth[i]!);
  const end = fallTo(peak.value - share * (peak.value - diastolic), peak.at, nextSpike, around);
  if (!isFound(end)) return end.why;
  const perMs = trace.rateHz / 1000;
  // Noise at the crossing and in the level it is held against, over the slope there; a third of a sample at the rise.
  const reach = Math.max(2, 0.02 * (end.at - peak.at));
  const slope = (valueAt(smooth, end.at - reach) - valueAt(smooth, end.at + reach)) / (2 * reach);
  const noise = 1.5 * Math.sqrt(around.covariance[0]!);
  const late = slope > 0 ? noise / slope : reach;
  return { ms: (end.at - rise.at) / perMs, sd: Math.hypot(late, 0.3) / perMs };
}
