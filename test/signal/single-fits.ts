/** One exponential and one sine in one stretch, as the kernels of several are asked for them. */
import {
  exponentialSum,
  finitePairs,
  linearFit,
  type Piece,
  type PiecesFit,
  sineInPieces,
  sineInPiecesNear,
  withoutSine,
} from '../../pipeline/signal/index.ts';

/**
 * Offset, amplitude at the first x and time constant, with their standard errors as stated; `correlation` is the variance
 * by which they exceed those of white noise. Pairs that are not finite are left out first, as measuring does.
 */
export function oneExponential(x: readonly number[], y: readonly number[]) {
  const kept = finitePairs(x, y);
  const since = kept.x.map((value) => value - kept.x[0]!);
  const span = since.at(-1) ?? 0;
  const fit = exponentialSum(since, kept.y, { slow: [(span / (since.length - 1)) * 0.2, 20 * span] });
  if (!fit) return null;
  const [offset = Number.POSITIVE_INFINITY, amplitude = Number.POSITIVE_INFINITY, logTau = Number.POSITIVE_INFINITY] =
    fit.covariance.map((row, k) => Math.sqrt(row[k]!));
  const { tau } = fit.terms[0]!;
  return {
    offset: fit.offset,
    amplitude: fit.terms[0]!.amplitude,
    tau,
    se_offset: offset,
    se_amplitude: amplitude,
    se_tau: tau * logTau,
    residual_sd: Math.sqrt(fit.rss / (fit.n - 3)),
    correlation: fit.correlation,
    // As measuring asks of it.
    converged: fit.converged && tau * logTau < tau,
  };
}

/** The readable runs of a trace. */
function runsOf(samples: Float64Array): Piece[] {
  const pieces: Piece[] = [];
  let from = -1;
  for (let i = 0; i <= samples.length; i++) {
    const finite = i < samples.length && Number.isFinite(samples[i]!);
    if (finite && from < 0) from = i;
    if (!finite && from >= 0) {
      pieces.push({ from, samples: samples.subarray(from, i) });
      from = -1;
    }
  }
  return pieces;
}

/** The fit, the line beside it (level in the middle of the trace) and the error of the amplitude in white noise. */
function described(samples: Float64Array, rate: number, fit: PiecesFit | null) {
  if (!fit) return null;
  const middle = (samples.length - 1) / 2;
  const rest = withoutSine(runsOf(samples), rate, fit);
  const line = linearFit(
    rest.flatMap((piece) => Array.from(piece.samples, (_, i) => (piece.from + i - middle) / rate)),
    rest.flatMap((piece) => Array.from(piece.samples)),
  )!;
  const residual_sd = Math.sqrt(fit.rss / Math.max(1, fit.n - 4));
  return {
    ...fit,
    offset: line.intercept,
    slope_per_s: line.slope,
    residual_sd,
    se_amplitude: residual_sd * Math.sqrt(2 / fit.n),
  };
}

export const oneSine = (samples: Float64Array, rate: number, hz: number) =>
  described(samples, rate, sineInPieces(runsOf(samples), rate, hz));

export const oneSineNear = (samples: Float64Array, rate: number, hz: number, range: number) =>
  described(samples, rate, sineInPiecesNear(runsOf(samples), rate, hz, range));
