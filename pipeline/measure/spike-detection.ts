/** Which excursions of a trace are spikes, and where each has its steepest point and its threshold. */
import { crossing } from '../signal/crossing.ts';
import { type Excursion, excursions } from '../signal/excursions.ts';
import { type Slope, type SlopeBook, type SpikeTrace, slopesOf, unreadable } from './spike-trace.ts';
import type { AbsenceCode, MeasureContext, Stimulus } from './types.ts';

export interface FoundSpike {
  /** Sample indices: lowest point before the rise, steepest point, highest sample. */
  base: number;
  steepest: number;
  peak: number;
  /** Fractional sample index where dV/dt crosses the criterion, or why there is none. */
  threshold: number | null;
  why_no_threshold: AbsenceCode | null;
  /** Index of the segment of the trace that it lies in. */
  segment: number;
  /** The steepest part of the rise lies under the end of a stimulus: its rate is not known, its time to within that. */
  hidden: { from: number; to: number } | null;
  /** Slope used for this spike's threshold and for its steepest rise and fall. */
  slope: Slope;
  rateSlope: Slope;
}

export interface Detection {
  spikes: FoundSpike[];
  remarks: string[];
}

/** Excursions narrower than this at half their height are electrical artefacts, ms: no membrane is that fast. */
const narrowestFast_ms = 0.1;
/** Heart and calcium spikes last tens of milliseconds; what is narrower than this is a stimulus artefact. */
const narrowestSlow_ms = 4;
/** A slow spike must, at its steepest, cover its class's prominence within this time; drift does not. */
const slowestRise_ms = 100;
/** Share of a slow spike's own maximum rise that makes its threshold. */
const relativeCriterion = 0.05;
/** So many slow excursions without a single spike deserve a word; one or two are rebounds and steps. */
const severalSlow = 3;
/** How many standard deviations of slope noise a criterion must clear. */
const clearOfNoise = 5;

/**
 * Fall that ends an excursion: half its own rise, but at most the class's prominence and at least half of it. Noise
 * and notches on a plateau stay inside; a train whose troughs climb is still told apart.
 */
const fallFor =
  (prominence: number) =>
  (rise: number): number =>
    Math.max(prominence / 2, Math.min(rise / 2, prominence));

interface Candidate extends Excursion {
  segment: number;
}

/**
 * Spikes of a prepared trace: excursions of at least the class's prominence whose main rise reaches the class's dV/dt
 * criterion by the cell's own doing. dV/dt is taken over two sample intervals, or over as many more (up to 0.5 ms; for
 * slow spikes a quarter of the upstroke on each side) as bring its noise below a fifth of the criterion; where that is
 * not enough the criterion is raised to five standard deviations of the noise, and a remark says so.
 * @returns spikes in order of time and remarks for people
 */
export function detectSpikes(trace: SpikeTrace, stimulus: Stimulus, context: MeasureContext): Detection {
  const slopes = slopesOf(trace);
  const remarks: string[] = [];
  const candidates: Candidate[] = trace.segments.flatMap(({ from, to }, segment) =>
    excursions(trace.masked.subarray(from, to), context.prominence_mv, fallFor(context.prominence_mv)).map((found) => ({
      ...found,
      base: found.base + from,
      peak: found.peak + from,
      end: found.end + from,
      segment,
    })),
  );
  if (looksInverted(trace, candidates, context)) {
    remarks.push(
      'Every fast excursion goes down from the level where the trace rests and comes back more slowly: the voltage looks inverted, and no spike is counted. Check the sign of its gain.',
    );
    return { spikes: [], remarks };
  }
  const tally = { narrow: 0, slow: 0, cut: 0, passive: 0, raised: 0 };
  let highest = 0;
  const spikes: FoundSpike[] = [];
  let floor = 0;
  for (const candidate of candidates) {
    const { from } = trace.segments[candidate.segment]!;
    floor = Math.max(floor, from);
    const verdict = context.slow
      ? slowSpike(trace, slopes, candidate, context, floor)
      : fastSpike(trace, slopes, candidate, context, floor, stimulus.from === 'absent');
    if (typeof verdict === 'string') {
      tally[verdict]++;
      continue;
    }
    if (verdict.raised > 0) tally.raised++;
    highest = Math.max(highest, verdict.raised);
    spikes.push(verdict.spike);
    floor = candidate.peak;
  }
  const times = (count: number): string => (count === 1 ? 'One excursion' : `${count} excursions`);
  if (tally.narrow > 0)
    remarks.push(
      `${times(tally.narrow)} too brief for a membrane ${tally.narrow === 1 ? 'is' : 'are'} taken for an artefact.`,
    );
  if (tally.slow >= severalSlow && spikes.length === 0 && !context.slow)
    remarks.push(
      `${tally.slow} excursions of ${context.prominence_mv} mV or more rise more slowly than ${context.rise_criterion_v_per_s} V/s and are no spikes by this class's criterion. For heart or calcium spikes state the class, or spike_ion: calcium.`,
    );
  if (tally.cut > 0) remarks.push('A rise that the sweep cuts off before its peak is not counted as a spike.');
  if (tally.raised > 0)
    remarks.push(
      context.slow
        ? `Noise would cross 5 % of the maximum rise: the criterion for threshold was raised, at most to ${Math.ceil(highest * 100)} %, for ${tally.raised} of ${spikes.length} spikes.`
        : `Noise would cross the dV/dt criterion: it was raised to ${highest.toFixed(0)} V/s.`,
    );
  return { spikes, remarks };
}

/** `raised`: 0, or what noise made the criterion be: V/s, for slow spikes as a share of the maximum rise. */
type Verdict = { spike: FoundSpike; raised: number } | 'narrow' | 'slow' | 'cut' | 'passive';

/** Whether the peak was seen: the trace came down again by more than noise before the samples ended. */
function peakSeen(trace: SpikeTrace, candidate: Candidate): boolean {
  if (candidate.fell) return true;
  const top = trace.masked[candidate.peak]!;
  let lowest = top;
  for (let i = candidate.peak; i <= candidate.end; i++) lowest = Math.min(lowest, trace.masked[i]!);
  return top - lowest > Math.max(6 * trace.noiseMv, 0.02 * candidate.rise);
}

function widthMs(trace: SpikeTrace, candidate: Candidate): number {
  const level = trace.masked[candidate.peak]! - candidate.rise / 2;
  const up = crossing(trace.masked, level, { from: candidate.peak, to: candidate.base, direction: 'up' });
  const { to } = trace.segments[candidate.segment]!;
  const down = crossing(trace.masked, level, { from: candidate.peak, to: to - 1, direction: 'down' });
  if (up === null || down === null) return Number.POSITIVE_INFINITY;
  return ((down - up) / trace.rateHz) * 1000;
}

/**
 * The stretch of continuous rise through the middle of an excursion, as an index range: from where the slope was last
 * below 2 % of the excursion's steepest, to the peak. A stimulus artefact earlier on the rise is outside it.
 */
function mainRise(trace: SpikeTrace, slope: Slope, candidate: Candidate): { from: number; to: number } {
  const level = trace.masked[candidate.peak]! - candidate.rise / 2;
  const middle = crossing(trace.masked, level, { from: candidate.peak, to: candidate.base, direction: 'up' });
  const centre = middle === null ? candidate.peak : Math.round(middle);
  let steepest = Number.NEGATIVE_INFINITY;
  for (let i = candidate.base; i <= candidate.peak; i++) if (slope.values[i]! > steepest) steepest = slope.values[i]!;
  let from = centre;
  while (from > candidate.base && slope.values[from]! > 0.02 * steepest) from--;
  return { from, to: candidate.peak };
}

/** Index of the largest slope in a range, stimulus edges left out; −1 where nothing is left. */
function steepestIn(trace: SpikeTrace, slope: Slope, from: number, to: number): number {
  let best = -1;
  for (let i = from; i <= to; i++) {
    const value = slope.values[i]!;
    if (touchesEdge(trace, i, slope.m) || !Number.isFinite(value)) continue;
    if (best < 0 || value > slope.values[best]!) best = i;
  }
  return best;
}

/** Whether a slope window of `m` samples on each side reaches under a stimulus edge. */
export function touchesEdge(trace: SpikeTrace, index: number, m: number): boolean {
  if (trace.edges.length === 0) return false;
  for (let i = Math.max(0, index - m); i <= Math.min(trace.underEdge.length - 1, index + m); i++)
    if (trace.underEdge[i] === 1) return true;
  return false;
}

function fastSpike(
  trace: SpikeTrace,
  slopes: SlopeBook,
  candidate: Candidate,
  context: MeasureContext,
  floor: number,
  inferEdges: boolean,
): Verdict {
  const stated = context.rise_criterion_v_per_s ?? 20;
  const widest = Math.floor(trace.rateHz * 0.00025);
  const slope = slopes.quietest(stated / clearOfNoise, widest);
  const criterion = Math.max(stated, clearOfNoise * slope.noise);
  if (widthMs(trace, candidate) < narrowestFast_ms) return 'narrow';
  const run = mainRise(trace, slope, candidate);
  const steepest = steepestIn(trace, slope, run.from, run.to);
  const hidden = hiddenRise(trace, candidate, context.prominence_mv, inView(trace, slopes, run));
  if (steepest < 0 && !hidden) return 'passive';
  if (!hidden && slope.values[steepest]! < criterion) return 'slow';
  if (!peakSeen(trace, candidate)) return 'cut';
  if (hidden) return { spike: underEdge(trace, candidate, hidden, slope, slope, criterion, floor), raised: 0 };
  const found = thresholdBefore(trace, slope, steepest, criterion, floor, inferEdges);
  if (found === 'passive') return 'passive';
  const rateSlope = slopes.quietest(0.03 * slope.values[steepest]!, widest);
  return {
    spike: {
      base: candidate.base,
      steepest: rateSlope === slope ? steepest : Math.max(0, steepestIn(trace, rateSlope, run.from, run.to)),
      peak: candidate.peak,
      ...found,
      segment: candidate.segment,
      hidden: null,
      slope,
      rateSlope,
    },
    raised: criterion > stated ? criterion : 0,
  };
}

function slowSpike(
  trace: SpikeTrace,
  slopes: SlopeBook,
  candidate: Candidate,
  context: MeasureContext,
  floor: number,
): Verdict {
  if (widthMs(trace, candidate) < narrowestSlow_ms) return 'narrow';
  // First look over 1 ms; then as narrow as noise allows, up to a quarter of the upstroke.
  const first = slopes.of(Math.max(1, Math.round(trace.rateHz * 0.0005)));
  const run = mainRise(trace, first, candidate);
  const roughly = steepestIn(trace, first, run.from, run.to);
  const hidden = hiddenRise(trace, candidate, context.prominence_mv, inView(trace, slopes, run));
  if (hidden) {
    if (!peakSeen(trace, candidate)) return 'cut';
    const slope = slopes.of(1);
    return {
      spike: underEdge(trace, candidate, hidden, slope, slope, relativeCriterion * hidden.rate, floor),
      raised: 0,
    };
  }
  if (roughly < 0) return 'passive';
  const rough = first.values[roughly]!;
  if (!(rough * slowestRise_ms >= context.prominence_mv)) return 'slow';
  if (!peakSeen(trace, candidate)) return 'cut';
  const upstroke_ms = candidate.rise / rough;
  const widest = Math.max(1, Math.round((upstroke_ms / 1000) * trace.rateHz * 0.25));
  const rateSlope = slopes.quietest(0.03 * rough, widest);
  const steepest = steepestIn(trace, rateSlope, run.from, run.to);
  if (steepest < 0) return 'passive';
  const largest = rateSlope.values[steepest]!;
  const wanted = relativeCriterion * largest;
  const slope = slopes.quietest(wanted / clearOfNoise, widest);
  const criterion = Math.max(wanted, clearOfNoise * slope.noise);
  if (criterion >= largest) return 'slow';
  const found = thresholdBefore(trace, slope, steepest, criterion, floor, false);
  if (found === 'passive') return 'passive';
  return {
    spike: {
      base: candidate.base,
      steepest,
      peak: candidate.peak,
      ...found,
      segment: candidate.segment,
      hidden: null,
      slope,
      rateSlope,
    },
    raised: criterion > wanted ? criterion / largest : 0,
  };
}

interface HiddenRise {
  from: number;
  to: number;
  /** Mean rise across the hidden stretch, V/s. */
  rate: number;
}

/** Steepest central difference outside the guard zones: the narrowest look at what happens beside them. */
function inView(
  trace: SpikeTrace,
  slopes: SlopeBook,
  run: { from: number; to: number },
): { at: number; m: number; rate: number } | null {
  const narrow = slopes.of(1);
  const at = steepestIn(trace, narrow, run.from, run.to);
  return at < 0 ? null : { at, m: 1, rate: narrow.values[at]! };
}

/**
 * The rise across the guard zone of an edge that takes current away, where it is steeper than anything seen outside, or
 * the steepest seen lies beside it, and covers half the prominence: with the current gone only the cell itself can have made it.
 */
function hiddenRise(
  trace: SpikeTrace,
  candidate: Candidate,
  prominence: number,
  visible: { at: number; m: number; rate: number } | null,
): HiddenRise | null {
  let best: HiddenRise | null = null;
  const seen = visible?.rate ?? 0;
  for (const { index, up } of trace.edges) {
    if (up !== false) continue;
    const from = index - trace.guard.before - 1;
    const to = index + trace.guard.after + 1;
    if (from < candidate.base || to > candidate.peak + trace.guard.after + 1 || to >= trace.mv.length) continue;
    const rise = trace.mv[to]! - trace.mv[from]!;
    const rate = (rise * trace.rateHz) / (to - from) / 1000;
    // The steepest slope in view right beside the zone has most likely not come to its top there.
    const beside = visible !== null && visible.at + visible.m + 1 >= from + 1 && visible.at - visible.m - 1 <= to - 1;
    if (rise >= prominence / 2 && (rate > seen || beside) && (!best || rate > best.rate)) best = { from, to, rate };
  }
  return best;
}

/** A spike whose steepest rise is hidden: its threshold is given where it was passed before the hidden stretch. */
function underEdge(
  trace: SpikeTrace,
  candidate: Candidate,
  hidden: HiddenRise,
  slope: Slope,
  rateSlope: Slope,
  criterion: number,
  floor: number,
): FoundSpike {
  const last = hidden.from - slope.m;
  const passed = last > floor && slope.values[last]! >= criterion;
  const found = passed ? thresholdBefore(trace, slope, last, criterion, floor, false) : 'passive';
  return {
    base: candidate.base,
    steepest: Math.round((hidden.from + hidden.to) / 2),
    peak: candidate.peak,
    ...(found === 'passive' ? { threshold: null, why_no_threshold: 'under-stimulus' as const } : found),
    segment: candidate.segment,
    hidden: { from: hidden.from, to: hidden.to },
    slope,
    rateSlope,
  };
}

type Threshold = Pick<FoundSpike, 'threshold' | 'why_no_threshold'>;

/**
 * Last upward crossing of the criterion by dV/dt before the steepest point, walking backwards from it. Where the walk
 * comes to a stimulus edge with dV/dt still above the criterion, the edge itself drove it there: threshold is then
 * where dV/dt exceeds its lowest value since that edge by the criterion, and an excursion that never does so is the
 * passive response to the edge, no spike.
 */
function thresholdBefore(
  trace: SpikeTrace,
  slope: Slope,
  steepest: number,
  criterion: number,
  floor: number,
  inferEdges: boolean,
): Threshold | 'passive' {
  const { values, m } = slope;
  let i = steepest;
  let lowest = steepest;
  while (i > floor) {
    if (values[i]! < values[lowest]!) lowest = i;
    if (touchesEdge(trace, i - 1, m)) {
      let before = i - 1;
      while (before > floor && touchesEdge(trace, before, m)) before--;
      if (before > floor && values[before]! >= criterion) {
        i = before;
        continue;
      }
      // An edge that takes current away from a rise already under way did not drive it: the crossing is the cell's own,
      // hidden under the edge. (From rest it did, whatever the sign of the current channel: some are recorded inverted.)
      if (before > floor && values[before]! > 0.25 * criterion && !drivesUp(trace, before, i)) {
        const share = (criterion - values[before]!) / (values[i]! - values[before]!);
        return { threshold: before + share * (i - before), why_no_threshold: null };
      }
      return aboveDrive(trace, slope, lowest, steepest, criterion);
    }
    if (Number.isNaN(values[i - 1]!)) return { threshold: null, why_no_threshold: 'unreadable' };
    if (values[i - 1]! < criterion && values[i]! >= criterion) {
      const sag = inferEdges ? sagAfterJump(slope, i, steepest, criterion) : null;
      if (sag !== null) return aboveDrive(trace, slope, sag, steepest, criterion);
      if (unreadable(trace, i - 1 - m, i + m)) return { threshold: null, why_no_threshold: 'unreadable' };
      return {
        threshold: i - 1 + (criterion - values[i - 1]!) / (values[i]! - values[i - 1]!),
        why_no_threshold: null,
      };
    }
    i--;
  }
  return { threshold: null, why_no_threshold: 'cut-off-by-sweep-end' };
}

/** Whether an edge between two samples adds current, or may do so for all that is known. */
const drivesUp = (trace: SpikeTrace, from: number, to: number): boolean =>
  trace.edges.some((edge) => edge.index >= from && edge.index <= to && edge.up !== false);

function aboveDrive(
  trace: SpikeTrace,
  slope: Slope,
  lowest: number,
  steepest: number,
  criterion: number,
): Threshold | 'passive' {
  const { values, m } = slope;
  const raised = values[lowest]! + criterion;
  if (values[steepest]! < raised) return 'passive';
  const at = crossing(values, raised, { from: steepest, to: lowest, direction: 'up' });
  if (at === null) return 'passive';
  if (unreadable(trace, at - m, at + m)) return { threshold: null, why_no_threshold: 'unreadable' };
  return { threshold: at, why_no_threshold: null };
}

/** A stimulus edge drives dV/dt to a few times the criterion; what is steeper is the cell's own. */
const steepestEdge = 5;

/**
 * Without a stimulus channel: a dV/dt that jumps from rest past the criterion within its own window, to less than five
 * times it, and then sags before it climbs to the spike, comes from a stimulus edge that nobody recorded. A spike's own
 * dV/dt climbs from the criterion on.
 * @returns where dV/dt is lowest between that edge and the steepest point, or null where there is no such jump
 */
function sagAfterJump(slope: Slope, crossingAt: number, steepest: number, criterion: number): number | null {
  const { values, m, noise } = slope;
  const reach = 2 * m + 1;
  if (!(values[Math.max(0, crossingAt - reach)]! < 0.25 * criterion)) return null;
  let top = crossingAt;
  while (top < Math.min(steepest, crossingAt + reach) && values[top + 1]! > values[top]!) top++;
  if (values[top]! > steepestEdge * criterion) return null;
  let lowest = top;
  for (let i = top; i <= steepest; i++) if (values[i]! < values[lowest]!) lowest = i;
  return values[top]! - values[lowest]! > Math.max(0.02 * values[top]!, clearOfNoise * noise) ? lowest : null;
}

/**
 * An inverted trace shows spikes as fast falls with a slower return, starting from its resting level. Told by the
 * majority of excursions, the first included: the trace was as high just before the trough as after it, the trough is
 * narrower than what follows, and the fall into it is steeper than the rise out of it.
 */
function looksInverted(trace: SpikeTrace, candidates: Candidate[], context: MeasureContext): boolean {
  if (candidates.length === 0) return false;
  const returns = candidates.map((candidate) => returnsFromBelow(trace, candidate, context));
  return returns[0]! && returns.filter(Boolean).length > 0.8 * returns.length;
}

function returnsFromBelow(trace: SpikeTrace, candidate: Candidate, context: MeasureContext): boolean {
  const { from, to } = trace.segments[candidate.segment]!;
  const level = trace.masked[candidate.peak]! - candidate.rise / 2;
  const longest = Math.round(trace.rateHz * (context.slow ? 2 : 0.02));
  const entry = crossing(trace.masked, level, {
    from: candidate.base,
    to: Math.max(from, candidate.base - longest),
    direction: 'down',
  });
  const exit = crossing(trace.masked, level, { from: candidate.base, to: candidate.peak, direction: 'up' });
  if (entry === null || exit === null) return false;
  const after = crossing(trace.masked, level, { from: candidate.peak, to: to - 1, direction: 'down' });
  const troughWidth = exit - entry;
  const topWidth = (after ?? to) - exit;
  if (!(troughWidth < topWidth)) return false;
  // A brief hyperpolarizing pulse looks alike, but its edges are known.
  if (trace.edges.some(({ index }) => index >= entry - troughWidth && index <= exit)) return false;
  let steepestFall = 0;
  for (let i = Math.max(from + 1, Math.floor(entry - 2 * troughWidth)); i <= candidate.base; i++)
    steepestFall = Math.max(steepestFall, trace.masked[i - 1]! - trace.masked[i]!);
  let steepestRise = 0;
  for (let i = candidate.base + 1; i <= candidate.peak; i++)
    steepestRise = Math.max(steepestRise, trace.masked[i]! - trace.masked[i - 1]!);
  let highestBefore = Number.NEGATIVE_INFINITY;
  for (let i = Math.max(from, Math.floor(entry - 2 * troughWidth)); i <= entry; i++)
    highestBefore = Math.max(highestBefore, trace.masked[i]!);
  return steepestFall > 1.2 * steepestRise && highestBefore > trace.masked[candidate.peak]! - 0.25 * candidate.rise;
}
