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
  // Columns of the inverse of the normal equations that belong to the cubic's value and slope at the place.
  let [m0, m1, m2, m3, m4, m5, m6] = [0, 0, 0, 0, 0, 0, 0];
  for (let j = 0; j < n; j++) {
    const d = (from + j - position) / half;
    const d2 = d * d;
    const w = (1 - d2) * (1 - d2);
    const wd = w * d;
    const d4 = d2 * d2;
    m0 += w;
    m1 += wd;
    m2 += w * d2;
    m3 += wd * d2;
    m4 += w * d4;
    m5 += wd * d4;
    m6 += w * d2 * d4;
  }
  const solved = solveTwo(Float64Array.of(m0, m1, m2, m3, m4, m5, m6));
  if (!solved) return null;
  const [v0, v1, v2, v3, s0, s1, s2, s3] = solved as unknown as readonly number[];
  const value = new Float64Array(n);
  const slope = new Float64Array(n);
  for (let j = 0; j < n; j++) {
    const d = (from + j - position) / half;
    const weight = (1 - d * d) * (1 - d * d);
    value[j] = weight * (v0! + d * (v1! + d * (v2! + d * v3!)));
    slope[j] = (weight * (s0! + d * (s1! + d * (s2! + d * s3!)))) / half;
  }
  return { value: { first: from, weights: value }, slope: { first: from, weights: slope } };
}

/**
 * First two columns of the inverse of the 4 × 4 matrix of moments, value's four and slope's four one after the other, by
 * Gauss–Jordan elimination without pivots, which a positive definite matrix does not need; null where it is not.
 */
function solveTwo(moments: Float64Array): Float64Array | null {
  const rows = new Float64Array(24);
  for (let r = 0; r < 4; r++) {
    for (let c = 0; c < 4; c++) rows[6 * r + c] = moments[r + c]!;
    if (r < 2) rows[6 * r + 4 + r] = 1;
  }
  for (let c = 0; c < 4; c++) {
    const pivot = rows[7 * c]!;
    if (!(pivot > 1e-12)) return null;
    for (let k = c; k < 6; k++) rows[6 * c + k]! /= pivot;
    for (let r = 0; r < 4; r++) {
      if (r === c) continue;
      const share = rows[6 * r + c]!;
      for (let k = c; k < 6; k++) rows[6 * r + k]! -= share * rows[6 * c + k]!;
    }
  }
  const out = new Float64Array(8);
  for (let r = 0; r < 4; r++) {
    out[r] = rows[6 * r + 4]!;
    out[4 + r] = rows[6 * r + 5]!;
  }
  return out;
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
