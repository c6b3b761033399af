/**
 * A sampled trace between and across its samples: band-limited interpolation (Whittaker 1915; Shannon 1949, Proc IRE
 * 37:10–21) by a sinc under a Kaiser window (Kaiser 1974), low-passed at will. Value and slope at any place are weighted
 * sums of samples, so that noise is carried through by the same weights.
 */

/** Zero crossings of the sinc on either side, and the Kaiser window's shape. */
const lobes = 8;
const beta = 8;
/** Steps of the table for one zero crossing. */
const fine = 128;

/** Modified Bessel function of the first kind and order zero, by its power series. */
function besselI0(x: number): number {
  let term = 1;
  let sum = 1;
  for (let k = 1; term > 1e-16 * sum; k++) {
    term *= (x / (2 * k)) ** 2;
    sum += term;
  }
  return sum;
}

/** Half-length of a kernel, samples. @param cutoff as a share of half the sampling rate, 0 < cutoff ≤ 1 */
export const reachOf = (cutoff: number): number => lobes / cutoff;

const table = Float64Array.from({ length: lobes * fine + 2 }, (_, i) => {
  const u = i / fine;
  if (u >= lobes) return 0;
  const sinc = u === 0 ? 1 : Math.sin(Math.PI * u) / (Math.PI * u);
  return (sinc * besselI0(beta * Math.sqrt(1 - (u / lobes) ** 2))) / besselI0(beta);
});
const slopes = Float64Array.from({ length: lobes * fine + 2 }, (_, i) =>
  i === 0 || i >= lobes * fine ? 0 : ((table[i + 1]! - table[i - 1]!) * fine) / 2,
);

function lookUp(values: Float64Array, u: number): number {
  const place = Math.abs(u) * fine;
  const below = Math.floor(place);
  if (below >= values.length - 1) return 0;
  return values[below]! + (place - below) * (values[below + 1]! - values[below]!);
}

/** Weights of consecutive samples from `first` on. */
export interface Weights {
  first: number;
  weights: Float64Array;
}

export interface BandLimited {
  /** Weights that give the value at the place. */
  value: Weights;
  /** Weights that give the slope there, per sample interval. */
  slope: Weights;
}

/**
 * Weights for value and slope at a fractional index. Both are exact for a straight line, also where the trace ends
 * within the kernel.
 * @param cutoff share of half the sampling rate that is let through, 0 < cutoff ≤ 1
 * @param first,last samples that may take part, inclusive
 * @returns null where fewer than three samples lie within reach or the place lies outside them
 */
export function bandLimited(position: number, cutoff: number, first: number, last: number): BandLimited | null {
  if (!(position >= first && position <= last)) return null;
  const reach = reachOf(cutoff);
  const from = Math.max(first, Math.ceil(position - reach));
  const to = Math.min(last, Math.floor(position + reach));
  const n = to - from + 1;
  if (n < 3) return null;
  const value = new Float64Array(n);
  const slope = new Float64Array(n);
  let sum = 0;
  let slopeSum = 0;
  for (let j = 0; j < n; j++) {
    const u = cutoff * (position - from - j);
    value[j] = cutoff * lookUp(table, u);
    slope[j] = cutoff * cutoff * lookUp(slopes, u) * Math.sign(u);
    sum += value[j]!;
    slopeSum += slope[j]!;
  }
  let moment = 0;
  let slopeMoment = 0;
  for (let j = 0; j < n; j++) {
    value[j]! /= sum;
    slope[j]! -= slopeSum * value[j]!;
    moment += value[j]! * (from + j - position);
    slopeMoment += slope[j]! * (from + j - position);
  }
  for (let j = 0; j < n; j++) slope[j]! /= slopeMoment;
  for (let j = 0; j < n; j++) value[j]! -= moment * slope[j]!;
  return { value: { first: from, weights: value }, slope: { first: from, weights: slope } };
}

/**
 * The same by the weighted least-squares cubic through the samples within `half` of the place, weights (1 − (d/half)²)²
 * (local polynomial regression: Savitzky & Golay 1964, Anal Chem 36:1627–1639; Cleveland 1979, J Am Stat Assoc
 * 74:829–836; from memory). It does not ring where the trace bends sharply beside the window, as a low-pass does.
 * @param half samples on either side, 2.5 or more
 * @returns null where fewer than five samples take part
 */
export function localCubic(position: number, half: number, first: number, last: number): BandLimited | null {
  if (!(position >= first && position <= last)) return null;
  const from = Math.max(first, Math.ceil(position - half));
  const to = Math.min(last, Math.floor(position + half));
  const n = to - from + 1;
  if (n < 5) return null;
  const moments = new Float64Array(7);
  for (let j = 0; j < n; j++) {
    const d = (from + j - position) / half;
    let term = (1 - d * d) ** 2;
    for (let k = 0; k < 7; k++) {
      moments[k]! += term;
      term *= d;
    }
  }
  // Columns of the inverse of the normal equations that belong to the cubic's value and slope at the place.
  const solved = solveTwo(moments);
  if (!solved) return null;
  const [a, b] = solved;
  const value = new Float64Array(n);
  const slope = new Float64Array(n);
  for (let j = 0; j < n; j++) {
    const d = (from + j - position) / half;
    const weight = (1 - d * d) ** 2;
    value[j] = weight * (a[0]! + d * (a[1]! + d * (a[2]! + d * a[3]!)));
    slope[j] = (weight * (b[0]! + d * (b[1]! + d * (b[2]! + d * b[3]!)))) / half;
  }
  return { value: { first: from, weights: value }, slope: { first: from, weights: slope } };
}

/**
 * First two columns of the inverse of the 4 × 4 matrix of moments, by Cholesky's decomposition, written out: a spike
 * asks for some hundreds of them. Null where the matrix is not positive definite.
 */
function solveTwo(m: Float64Array): [Float64Array, Float64Array] | null {
  const [m0, m1, m2, m3, m4, m5, m6] = m as unknown as [number, number, number, number, number, number, number];
  const least = 1e-12 * m0;
  if (!(m0 > 0)) return null;
  const l00 = Math.sqrt(m0);
  const l10 = m1 / l00;
  const l20 = m2 / l00;
  const l30 = m3 / l00;
  const d1 = m2 - l10 * l10;
  if (!(d1 > least)) return null;
  const l11 = Math.sqrt(d1);
  const l21 = (m3 - l20 * l10) / l11;
  const l31 = (m4 - l30 * l10) / l11;
  const d2 = m4 - l20 * l20 - l21 * l21;
  if (!(d2 > least)) return null;
  const l22 = Math.sqrt(d2);
  const l32 = (m5 - l30 * l20 - l31 * l21) / l22;
  const d3 = m6 - l30 * l30 - l31 * l31 - l32 * l32;
  if (!(d3 > least)) return null;
  const l33 = Math.sqrt(d3);
  const column = (b0: number, b1: number): Float64Array => {
    const y0 = b0 / l00;
    const y1 = (b1 - l10 * y0) / l11;
    const y2 = (-l20 * y0 - l21 * y1) / l22;
    const y3 = (-l30 * y0 - l31 * y1 - l32 * y2) / l33;
    const x3 = y3 / l33;
    const x2 = (y2 - l32 * x3) / l22;
    const x1 = (y1 - l21 * x2 - l31 * x3) / l11;
    const x0 = (y0 - l10 * x1 - l20 * x2 - l30 * x3) / l00;
    return Float64Array.of(x0, x1, x2, x3);
  };
  return [column(1, 0), column(0, 1)];
}

/** Weighted sum of samples. */
export function weighed(samples: Float64Array, { first, weights }: Weights): number {
  let sum = 0;
  for (let j = 0; j < weights.length; j++) sum += weights[j]! * samples[first + j]!;
  return sum;
}

/**
 * Variance of a weighted sum of noise.
 * @param covariance of the noise at lags of 0, 1, 2 … samples; none beyond
 */
export function varianceOf(weights: Float64Array, covariance: Float64Array): number {
  let sum = 0;
  for (let lag = 0; lag < Math.min(covariance.length, weights.length); lag++) {
    let product = 0;
    for (let j = lag; j < weights.length; j++) product += weights[j]! * weights[j - lag]!;
    sum += (lag === 0 ? 1 : 2) * product * covariance[lag]!;
  }
  return Math.max(0, sum);
}
