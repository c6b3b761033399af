/** Spikes of one sweep and everything measured on each that needs no solution, capacitance or other sweep. */
import { crossing, valueAt } from '../signal/crossing.ts';
import { clippedRuns, type Run } from '../signal/runs.ts';
import { movingAverage } from '../signal/smoothing.ts';
import { vertex } from '../signal/vertex.ts';
import { type Pulse, withoutArtefacts } from './artefact.ts';
import { injectedCurrent, phasesOf } from './phases.ts';
import { slowPeak, withSlowValues } from './slow-spikes.ts';
import { detectSpikes, type FoundSpike, touchesEdge } from './spike-detection.ts';
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
export function measureSpikes(input: SpikeInput): { spikes: Spike[]; remarks: string[] } {
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
  if (found.length === 0) return { spikes: [], remarks };
  const clipped = clippedRuns(voltage.samples);
  const smoothBy = new Map<number, Float64Array>();
  const smoothed = (m: number): Float64Array => {
    const half = m - 1;
    const held = smoothBy.get(half) ?? (half === 0 ? trace.masked : movingAverage(trace.masked, half));
    smoothBy.set(half, held);
    return held;
  };
  const spikes = found.map((spike, k): Spike => {
    const segment = trace.segments[spike.segment]!;
    const neighbour = (other: FoundSpike | undefined): FoundSpike | null =>
      other && other.segment === spike.segment ? other : null;
    const around: Surroundings = {
      trace,
      smooth: smoothed(context.slow ? spike.slope.m : spike.rateSlope.m),
      clipped,
      context,
      first: segment.from,
      last: segment.to - 1,
      endsWithSweep: spike.segment === trace.segments.length - 1 && segment.to === trace.mv.length,
      previous: neighbour(found[k - 1]),
      next: neighbour(found[k + 1]),
    };
    return measureOne(k, spike, found[k + 1] ?? null, around, input.baseline_mv, injected);
  });
  if (!context.slow) return { spikes, remarks };
  return { spikes: withSlowValues(spikes, found, trace, context, cleaned.pulses, smoothed), remarks };
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
): Spike {
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
  const threshold: Found =
    spike.threshold === null
      ? missing(spike.why_no_threshold ?? 'never-crosses')
      : { at: spike.threshold, value: valueAt(trace.mv, spike.threshold) };
  const peak = peakOf(spike, around);
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

  const limit = afterSpike(peakAt, around);
  const back = isFound(threshold) ? fallTo(threshold.value, peakAt, limit.nextSpike, around) : threshold;
  put('repolarization_ms', !isFound(peak) ? peak.why : isFound(back) ? (back.at - peakAt) / perMs : back.why);
  put(
    'half_width_ms',
    typeof height === 'number' && isFound(threshold)
      ? halfWidth(threshold.value + height / 2, spike, peakAt, limit.nextSpike, around)
      : (height as AbsenceCode),
  );

  const rise = spike.hidden
    ? missing('under-stimulus')
    : extremeSlope(spike, 'rise', isFound(threshold) ? threshold.at : spike.base, peakAt, around);
  put('max_rise_v_per_s', isFound(rise) ? rise.value : rise.why);
  const lowest = lowestAfter(peakAt, back, limit, around);
  const fallEnd = isFound(lowest) ? lowest.at : isFound(back) ? back.at : limit.end;
  const fall = extremeSlope(spike, 'fall', peakAt, fallEnd, around);
  put('max_fall_v_per_s', isFound(fall) ? fall.value : fall.why);

  put('ahp_minimum_mv', isFound(lowest) ? lowest.value : lowest.why);
  put(
    'ahp_below_threshold_mv',
    !isFound(lowest) ? lowest.why : !isFound(threshold) ? threshold.why : threshold.value - lowest.value,
  );
  put('cycle_length_ms', cycle(peak, following, around));
  for (const percent of [50, 90])
    put(`apd${percent}_ms`, apd(percent / 100, spike, peak, rise, limit.nextSpike, around));

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
  return { spike: number, values, why, phases };
}

/** Parabola through the top three samples. */
function peakOf(spike: FoundSpike, { trace, clipped, context }: Surroundings): Found {
  if (clipped.some((run) => run.at === 'top' && spike.peak >= run.from - 1 && spike.peak <= run.to))
    return missing('clipped');
  if (unreadable(trace, spike.peak - 1, spike.peak + 1)) return missing('unreadable');
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

function halfWidth(
  level: number,
  spike: FoundSpike,
  peakAt: number,
  nextSpike: number,
  around: Surroundings,
): number | AbsenceCode {
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
  return ((down - up) / trace.rateHz) * 1000;
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
): number | AbsenceCode {
  if (!isFound(peak)) return peak.why;
  if (!isFound(rise)) return rise.why;
  const { trace, smooth, first, previous, context } = around;
  const to = Math.floor(spike.threshold ?? spike.base);
  const from = Math.max(previous ? previous.peak : first, to - (context.ahp_window_ms / 1000) * trace.rateHz);
  if (to - from < leastDiastole_s * trace.rateHz) return 'no-baseline';
  let diastolic = Number.POSITIVE_INFINITY;
  for (let i = Math.ceil(from); i <= to; i++) diastolic = Math.min(diastolic, smooth[i]!);
  const end = fallTo(peak.value - share * (peak.value - diastolic), peak.at, nextSpike, around);
  return isFound(end) ? ((end.at - rise.at) / trace.rateHz) * 1000 : end.why;
}
