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
    const place = Math.abs(u) * fine;
    const below = Math.floor(place);
    if (below >= table.length - 1) continue;
    const share = place - below;
    const weight = cutoff * (table[below]! + share * (table[below + 1]! - table[below]!));
    const steep = cutoff * cutoff * (slopes[below]! + share * (slopes[below + 1]! - slopes[below]!)) * Math.sign(u);
    value[j] = weight;
    slope[j] = steep;
    sum += weight;
    slopeSum += steep;
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
 * What the weights of `bandLimited` give for a trace, without making them.
 * @param what the value, or the slope per sample interval
 * @returns NaN where `bandLimited` returns null
 */
export function bandLimitedOf(
  samples: Float64Array,
  position: number,
  cutoff: number,
  first: number,
  last: number,
  what: 'value' | 'slope',
): number {
  if (!(position >= first && position <= last)) return Number.NaN;
  const reach = reachOf(cutoff);
  const from = Math.max(first, Math.ceil(position - reach));
  const to = Math.min(last, Math.floor(position + reach));
  if (to - from + 1 < 3) return Number.NaN;
  const level = samples[Math.round(position)]!;
  let [sum, slopeSum, moment, slopeMoment, ofValue, ofSlope] = [0, 0, 0, 0, 0, 0];
  for (let i = from; i <= to; i++) {
    const u = cutoff * (position - i);
    const place = Math.abs(u) * fine;
    const below = Math.floor(place);
    if (below >= table.length - 1) continue;
    const share = place - below;
    const weight = table[below]! + share * (table[below + 1]! - table[below]!);
    const steep = (slopes[below]! + share * (slopes[below + 1]! - slopes[below]!)) * Math.sign(u);
    const y = samples[i]! - level;
    sum += weight;
    slopeSum += steep;
    moment += weight * (i - position);
    slopeMoment += steep * (i - position);
    ofValue += weight * y;
    ofSlope += steep * y;
  }
  const value = ofValue / sum;
  const slope = (ofSlope - slopeSum * value) / (slopeMoment - (slopeSum * moment) / sum);
  return what === 'slope' ? slope : level + value - (moment / sum) * slope;
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
  if (!cubicAt(position, half, from, to)) return null;
  const [v0, v1, v2, v3] = [solved[0]!, solved[1]!, solved[2]!, solved[3]!];
  const [s0, s1, s2, s3] = [solved[4]!, solved[5]!, solved[6]!, solved[7]!];
  const value = new Float64Array(n);
  const slope = new Float64Array(n);
  for (let j = 0; j < n; j++) {
    const d = (from + j - position) / half;
    const weight = (1 - d * d) * (1 - d * d);
    value[j] = weight * (v0 + d * (v1 + d * (v2 + d * v3)));
    slope[j] = (weight * (s0 + d * (s1 + d * (s2 + d * s3)))) / half;
  }
  return { value: { first: from, weights: value }, slope: { first: from, weights: slope } };
}

/**
 * What the weights of `localCubic` give for a trace, without making them: a search asks for hundreds of places.
 * @param what the value, or the slope per sample interval
 * @returns NaN where `localCubic` returns null
 */
export function localCubicOf(
  samples: Float64Array,
  position: number,
  half: number,
  first: number,
  last: number,
  what: 'value' | 'slope',
): number {
  if (!(position >= first && position <= last)) return Number.NaN;
  const from = Math.max(first, Math.ceil(position - half));
  const to = Math.min(last, Math.floor(position + half));
  if (to - from + 1 < 5) return Number.NaN;
  // A level near the trace's own keeps rounding small.
  const level = samples[Math.round(position)]!;
  if (!cubicAt(position, half, from, to)) return Number.NaN;
  const at = what === 'value' ? 0 : 4;
  const [c0, c1, c2, c3] = [solved[at]!, solved[at + 1]!, solved[at + 2]!, solved[at + 3]!];
  let sum = 0;
  for (let i = from; i <= to; i++) {
    const d = (i - position) / half;
    const w = 1 - d * d;
    sum += w * w * (c0 + d * (c1 + d * (c2 + d * c3))) * (samples[i]! - level);
  }
  return what === 'value' ? level + sum : sum / half;
}

/**
 * Leaves in `solved` the cubic's value and slope at a place as polynomials in d = (i − position)/half that weigh the
 * samples from `from` to `to`; false where they are too few.
 */
function cubicAt(position: number, half: number, from: number, to: number): boolean {
  let [m0, m1, m2, m3, m4, m5, m6] = [0, 0, 0, 0, 0, 0, 0];
  for (let i = from; i <= to; i++) {
    const d = (i - position) / half;
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
  return solveTwo(m0, m1, m2, m3, m4, m5, m6);
}

/** Where `solveTwo` works and leaves its answer: it is asked far too often for arrays of its own. */
const rows = new Float64Array(24);
const solved = new Float64Array(8);

/**
 * First two columns of the inverse of the 4 × 4 matrix of moments, value's four and slope's four one after the other in
 * `solved`, by Gauss–Jordan elimination without pivots, which a positive definite matrix does not need; false where it
 * is not.
 */
function solveTwo(m0: number, m1: number, m2: number, m3: number, m4: number, m5: number, m6: number): boolean {
  rows[0] = m0;
  rows[1] = m1;
  rows[2] = m2;
  rows[3] = m3;
  rows[6] = m1;
  rows[7] = m2;
  rows[8] = m3;
  rows[9] = m4;
  rows[12] = m2;
  rows[13] = m3;
  rows[14] = m4;
  rows[15] = m5;
  rows[18] = m3;
  rows[19] = m4;
  rows[20] = m5;
  rows[21] = m6;
  for (let r = 0; r < 4; r++) {
    rows[6 * r + 4] = r === 0 ? 1 : 0;
    rows[6 * r + 5] = r === 1 ? 1 : 0;
  }
  for (let c = 0; c < 4; c++) {
    const pivot = rows[7 * c]!;
    if (!(pivot > 1e-12)) return false;
    for (let k = c; k < 6; k++) rows[6 * c + k]! /= pivot;
    for (let r = 0; r < 4; r++) {
      if (r === c) continue;
      const share = rows[6 * r + c]!;
      for (let k = c; k < 6; k++) rows[6 * r + k]! -= share * rows[6 * c + k]!;
    }
  }
  for (let r = 0; r < 4; r++) {
    solved[r] = rows[6 * r + 4]!;
    solved[4 + r] = rows[6 * r + 5]!;
  }
  return true;
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
