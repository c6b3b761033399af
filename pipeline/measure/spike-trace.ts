/**
 * A voltage trace made ready for finding spikes: unreadable samples bridged or cut out, stimulus edges masked, and its
 * noise known, so that every later step can ask 'could noise or the stimulus alone have done this?'
 */
import { slopeVPerS } from '../signal/derivative.ts';
import { quantile } from '../signal/statistics.ts';
import type { Signal } from './types.ts';

/** Gaps up to this length are joined by a straight line for finding spikes; numbers that touch one are not given. */
const bridgedGap_s = 0.001;

export interface Segment {
  /** Half-open sample range without an unbridged gap. */
  from: number;
  to: number;
}

export interface SpikeTrace {
  /** Potential, mV, short gaps bridged. */
  mv: Float64Array;
  /** The same with the samples under stimulus edges joined by straight lines. */
  masked: Float64Array;
  /** 1 where a sample lies in the guard zone of a stimulus edge. */
  underEdge: Uint8Array;
  rateHz: number;
  startS: number;
  segments: Segment[];
  /** Running count of unreadable samples, for `unreadable`. */
  missingBefore: Uint32Array;
  /** Samples of an edge's guard zone before and after the edge. */
  guard: { before: number; after: number };
  /** Stimulus edges inside the trace in order of time; `up` says whether current is added, null where not known. */
  edges: { index: number; up: boolean | null }[];
  /** Standard deviation of the fast noise of the potential, mV (see `fastNoise`). */
  noiseMv: number;
}

/**
 * @param edgesS times of the stimulus edges, s. @param filterKhz low-pass corner where known
 * @param addsCurrent whether the edge at a time adds current; null where not known
 * @param leastGuard samples before and after an edge that are its own at least
 */
export function prepareTrace(
  voltage: Signal,
  edgesS: readonly number[],
  filterKhz: number | null,
  addsCurrent: (time_s: number) => boolean | null = () => null,
  leastGuard: SpikeTrace['guard'] | null = null,
): SpikeTrace {
  const { samples, rate_hz: rateHz, start_s: startS } = voltage;
  const n = samples.length;
  const missingBefore = new Uint32Array(n + 1);
  for (let i = 0; i < n; i++) missingBefore[i + 1] = missingBefore[i]! + (Number.isFinite(samples[i]!) ? 0 : 1);
  const mv = samples.slice();
  const segments: Segment[] = [];
  const longest = Math.max(1, Math.round(bridgedGap_s * rateHz));
  let start = -1;
  let lastRead = -1;
  for (let i = 0; i < n; i++) {
    if (!Number.isFinite(mv[i]!)) continue;
    const gap = i - lastRead - 1;
    if (lastRead >= 0 && gap > longest) {
      segments.push({ from: start, to: lastRead + 1 });
      start = i;
    } else if (lastRead >= 0 && gap > 0) join(mv, lastRead, i);
    if (start < 0) start = i;
    lastRead = i;
  }
  if (start >= 0) segments.push({ from: start, to: lastRead + 1 });

  // A filter of corner f settles within about 0.7/f (0.05 ms where it is not known); two samples are the least.
  const settle_s = filterKhz === null ? 0.00005 : 0.0007 / filterKhz;
  const guard = {
    before: Math.max(1, leastGuard?.before ?? 1),
    after: Math.max(2, Math.ceil(settle_s * rateHz), leastGuard?.after ?? 2),
  };
  const masked = mv.slice();
  const underEdge = new Uint8Array(n);
  const edges = edgesS
    .map((edge) => ({ index: Math.round((edge - startS) * rateHz), up: addsCurrent(edge) }))
    .filter(({ index }) => index >= 0 && index < n)
    .sort((a, b) => a.index - b.index);
  for (const { index } of edges) {
    const first = Math.max(0, index - guard.before);
    const last = Math.min(n - 1, index + guard.after);
    underEdge.fill(1, first, last + 1);
    if (first > 0 && last < n - 1) join(masked, first - 1, last + 1);
  }
  const noiseMv = fastNoise(mv, rateHz);
  return { mv, masked, underEdge, rateHz, startS, segments, missingBefore, guard, edges, noiseMv };
}

/** Puts the samples between two on the straight line through these. */
export function join(mv: Float64Array, before: number, after: number): void {
  for (let i = before + 1; i < after; i++)
    mv[i] = mv[before]! + ((mv[after]! - mv[before]!) * (i - before)) / (after - before);
}

/** Whether any sample of the inclusive index range was unreadable. */
export function unreadable(trace: SpikeTrace, from: number, to: number): boolean {
  const first = Math.max(0, Math.floor(from));
  const last = Math.min(trace.mv.length - 1, Math.ceil(to));
  return last >= first && trace.missingBefore[last + 1]! > trace.missingBefore[first]!;
}

export const timeOf = (trace: SpikeTrace, index: number): number => trace.startS + index / trace.rateHz;

/** Lower quartile of |x| for a normal x of SD 1. With it up to half a trace may be spikes. */
const lowerQuartile = 0.31864;
/** Samples looked at for noise: enough for a few per cent. */
const mostLooks = 20_000;

function quietSpread(count: number, differenceAt: (i: number) => number): number {
  const stride = Math.max(1, Math.floor(count / mostLooks));
  const differences = new Float64Array(Math.ceil(count / stride));
  for (let i = 0, k = 0; i < count; i += stride) differences[k++] = Math.abs(differenceAt(i));
  return (quantile(differences, 0.25) ?? 0) / lowerQuartile;
}

/**
 * Noise of the potential, mV, from third differences 0.05 ms apart, which leave next to nothing of the signal even
 * where spikes follow each other without pause, but too little of slow noise. The rounding of the digitizer is its
 * floor.
 */
export function fastNoise(mv: Float64Array, rateHz: number): number {
  const k = Math.max(1, Math.round(rateHz * 0.00005));
  const spread = quietSpread(
    Math.max(0, mv.length - 3 * k),
    (i) => mv[i + 3 * k]! - 3 * mv[i + 2 * k]! + 3 * mv[i + k]! - mv[i]!,
  );
  let step = Number.POSITIVE_INFINITY;
  for (let i = 1; i < mv.length; i++) {
    const change = Math.abs(mv[i]! - mv[i - 1]!);
    if (change > 1e-9 && change < step) step = change;
  }
  return Math.max(spread / Math.sqrt(20), Number.isFinite(step) ? step / Math.sqrt(12) : 0);
}

/** How much of the slower noise the third differences may miss. */
const missedBySlowNoise = 3;

/**
 * Standard deviation, V/s, that noise gives to a slope over 2m+1 samples: each slope against the mean of the two that
 * share no sample with it. Bends of the signal itself pass for noise there, the more the wider the window and the
 * faster the train, so it is bounded by what the fast noise would give, three times over.
 */
function slopeNoise(slope: Float64Array, m: number, fastNoiseMv: number, rateHz: number): number {
  const lag = 2 * m + 1;
  // The difference has 1.5 times the variance of a slope.
  const seen =
    quietSpread(Math.max(0, slope.length - 2 * lag), (i) => slope[i + lag]! - 0.5 * (slope[i]! + slope[i + 2 * lag]!)) /
    Math.sqrt(1.5);
  const white = fastNoiseMv * (rateHz / 1000) * whiteShare(m);
  return seen > 0 ? Math.min(seen, missedBySlowNoise * white) : white;
}

/** Standard deviation of a slope over 2m+1 samples of white noise of SD 1, per sample interval. */
const whiteShare = (m: number): number => Math.sqrt(3 / (m * (m + 1) * (2 * m + 1)));

export interface Slope {
  values: Float64Array;
  /** Half-width of the window in samples; 1 is the central difference. */
  m: number;
  noise: number;
}

const halfWidths = [1, 2, 3, 4, 5, 7, 10, 14, 20, 28, 40, 56, 80, 113, 160];

export interface SlopeBook {
  of(m: number): Slope;
  /** The narrowest window, up to `widest` samples on each side, whose noise stays below `target` V/s. */
  quietest(target: number, widest: number): Slope;
}

/** Slopes of one trace by half-width, each computed at most once. */
export function slopesOf(trace: SpikeTrace): SlopeBook {
  const known = new Map<number, Slope>();
  const of = (m: number): Slope => {
    const held = known.get(m);
    if (held) return held;
    const values = slopeVPerS(trace.mv, trace.rateHz, m);
    const seen = slopeNoise(values, m, trace.noiseMv, trace.rateHz);
    // Noise falls with the window's width as white noise does or, where it is slower, half as well.
    const bounds = m > 2 ? [1, 2].map((narrow) => (2 * of(narrow).noise * whiteShare(m)) / whiteShare(narrow)) : [];
    const slope = { values, m, noise: Math.min(seen, ...bounds) };
    known.set(m, slope);
    return slope;
  };
  const quietest = (target: number, widest: number): Slope => {
    let slope = of(1);
    for (const m of halfWidths) {
      if (m > Math.max(1, widest)) break;
      slope = of(m);
      if (slope.noise <= target) break;
    }
    return slope;
  };
  return { of, quietest };
}
