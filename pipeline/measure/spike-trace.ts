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
  /** Sample index of each stimulus edge inside the trace, ascending. */
  edges: number[];
  /** Standard deviation of the fast noise of the potential, mV. */
  noiseMv: number;
}

export function prepareTrace(voltage: Signal, edgesS: readonly number[], filterKhz: number | null): SpikeTrace {
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

  // A filter of corner f settles within about 0.7/f; two samples and 0.1 ms are the least.
  const settle_s = Math.max(0.0001, filterKhz === null ? 0 : 0.0007 / filterKhz);
  const guard = { before: 1, after: Math.max(2, Math.ceil(settle_s * rateHz)) };
  const masked = mv.slice();
  const underEdge = new Uint8Array(n);
  const edges = edgesS
    .map((edge) => Math.round((edge - startS) * rateHz))
    .filter((index) => index >= 0 && index < n)
    .sort((a, b) => a - b);
  for (const edge of edges) {
    const first = Math.max(0, edge - guard.before);
    const last = Math.min(n - 1, edge + guard.after);
    underEdge.fill(1, first, last + 1);
    if (first > 0 && last < n - 1) join(masked, first - 1, last + 1);
  }
  const trace: SpikeTrace = {
    mv,
    masked,
    underEdge,
    rateHz,
    startS,
    segments,
    missingBefore,
    guard,
    edges,
    noiseMv: 0,
  };
  trace.noiseMv = (slopeNoise(trace, slopeVPerS(mv, rateHz, 1), 1) * Math.SQRT2) / (rateHz / 1000);
  return trace;
}

function join(mv: Float64Array, before: number, after: number): void {
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

/**
 * Standard deviation, V/s, that noise gives to a slope over 2m+1 samples: each slope against the mean of the two that
 * share no sample with it. The lower quartile of the differences is used, so that up to half the trace may be spikes.
 * Where the digitizer's step hides the noise, that of rounding stands in.
 */
export function slopeNoise(trace: SpikeTrace, slope: Float64Array, m: number): number {
  const lag = 2 * m + 1;
  const n = slope.length;
  const stride = Math.max(1, Math.floor(n / 20_000));
  const differences: number[] = [];
  for (let i = lag; i < n - lag; i += stride) {
    const difference = Math.abs(slope[i]! - 0.5 * (slope[i - lag]! + slope[i + lag]!));
    if (Number.isFinite(difference)) differences.push(difference);
  }
  // Lower quartile of |x| for a normal x of SD 1: 0.31864; the difference has 1.5 times the variance.
  const found = (quantile(differences, 0.25) ?? 0) / 0.31864 / Math.sqrt(1.5);
  if (found > 0) return found;
  let step = Number.POSITIVE_INFINITY;
  for (let i = 1; i < trace.mv.length; i++) {
    const change = Math.abs(trace.mv[i]! - trace.mv[i - 1]!);
    if (change > 1e-9 && change < step) step = change;
  }
  if (!Number.isFinite(step)) return 0;
  return (step / Math.sqrt(12)) * (trace.rateHz / 1000) * Math.sqrt(3 / (m * (m + 1) * (2 * m + 1)));
}

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
    const slope = { values, m, noise: slopeNoise(trace, values, m) };
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
