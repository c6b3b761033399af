/** The noise of a sweep as its spikes meet it: read where neither spike nor stimulus is, with its covariance. */
import type { FoundSpike } from './spike-detection.ts';
import { type SpikeTrace, unreadable } from './spike-trace.ts';
import { type Stretch, without } from './stretches.ts';

export interface FastNoise {
  /** Covariance, mV², at lags of 0, 1, 2 … samples up to about 0.5 ms. */
  covariance: Float64Array;
  /** Samples it was read from; 0 where only the trace's third differences speak. */
  n: number;
}

/** Left out before the rise and after the peak of a spike, and after a stimulus edge, s. */
const beforeRise_s = 0.002;
const afterPeak_s = 0.015;
const afterEdge_s = 0.02;
/** Length of the pieces whose own parabola is taken off: what is slower is not the fast noise. */
const piece_s = 0.006;
const mostPieces = 80;
/** How much of the noise third differences may miss. */
const mostTimesFast = 3;

/** Stretches without spike, stimulus edge or gap, at least one piece long. */
export function quietBetween(trace: SpikeTrace, found: readonly FoundSpike[]): Stretch[] {
  const { rateHz } = trace;
  const holes: Stretch[] = [
    ...found.map((spike) => ({
      from: Math.floor((spike.threshold ?? spike.base) - beforeRise_s * rateHz),
      to: Math.ceil(spike.peak + afterPeak_s * rateHz),
    })),
    ...trace.edges.map(({ index }) => ({ from: index - 2, to: Math.ceil(index + afterEdge_s * rateHz) })),
  ];
  return trace.segments.flatMap((segment) =>
    without(segment, holes).filter(({ from, to }) => to - from >= piece_s * rateHz),
  );
}

/** Residuals of the least-squares parabola through equally spaced samples. */
function aboutParabola(samples: Float64Array): Float64Array {
  const n = samples.length;
  const middle = (n - 1) / 2;
  let [s0, s1, s2, s22] = [0, 0, 0, 0];
  const mean2 = (n * n - 1) / 12;
  for (let i = 0; i < n; i++) {
    const x = i - middle;
    s0 += samples[i]!;
    s1 += x * samples[i]!;
    s2 += (x * x - mean2) * samples[i]!;
    s22 += (x * x - mean2) ** 2;
  }
  const [level, slope, bend] = [s0 / n, s1 / (n * mean2), s2 / s22];
  return samples.map((value, i) => value - level - slope * (i - middle) - bend * ((i - middle) ** 2 - mean2));
}

/** Pieces of the quiet stretches, each freed of its own parabola; spread over all of them where there are many. */
export function quietPieces(trace: SpikeTrace, samples: Float64Array, quiet: readonly Stretch[]): Float64Array[] {
  const length = Math.max(24, Math.round(piece_s * trace.rateHz));
  const starts = quiet.flatMap(({ from, to }) =>
    Array.from({ length: Math.floor((to - from) / length) }, (_, k) => from + k * length),
  );
  const stride = Math.max(1, Math.floor(starts.length / mostPieces));
  return starts
    .filter((start, k) => k % stride === 0 && !unreadable(trace, start, start + length - 1))
    .map((start) => aboutParabola(samples.subarray(start, start + length)));
}

/**
 * Covariance of the fast noise. Pieces with several times the usual variance (an event, a missed spikelet) are left
 * out. Without a quiet stretch: white noise of the size that third differences give.
 */
export function fastNoiseOf(trace: SpikeTrace, samples: Float64Array, quiet: readonly Stretch[]): FastNoise {
  const pieces = quietPieces(trace, samples, quiet);
  const powers = pieces.map((piece) => piece.reduce((sum, value) => sum + value * value, 0) / piece.length);
  const usual = powers.toSorted((a, b) => a - b)[Math.floor(pieces.length / 2)];
  const own = pieces.filter((_, k) => powers[k]! <= 4 * usual!);
  if (own.length < 2) return { covariance: Float64Array.of(trace.noiseMv ** 2), n: 0 };
  const length = own[0]!.length;
  const lags = Math.min(Math.max(4, Math.round(0.0005 * trace.rateHz)), Math.floor(length / 4));
  const covariance = new Float64Array(lags + 1);
  for (let lag = 0; lag <= lags; lag++) {
    let sum = 0;
    for (const piece of own) for (let i = lag; i < length; i++) sum += piece[i]! * piece[i - lag]!;
    covariance[lag] = sum / (own.length * (length - 3 - lag));
  }
  // What bends in the quiet trace itself is no noise: third differences, which see none of it, bound what is.
  const most = (mostTimesFast * trace.noiseMv) ** 2;
  const scale = covariance[0]! > most ? most / covariance[0]! : 1;
  for (let lag = 0; lag <= lags; lag++) covariance[lag]! *= scale;
  return { covariance, n: own.length * length };
}
