/**
 * Means and straight lines of samples that are not independent of their neighbours: filtered noise, channel noise,
 * slow wander. The textbook standard error counts every sample as a new observation and comes out far too small.
 */
import { finitePairs } from './line.ts';

/** A number with its standard error and the degrees of freedom behind that error. */
export interface SerialMean {
  value: number;
  /** Null where fewer than two samples are readable. */
  se: number | null;
  /** Degrees of freedom of `se`: its Student's t gives the interval. 0 where `se` is null. */
  freedom: number;
  /** Sample standard deviation of the values (n − 1). */
  sd: number | null;
  /** Readable values. */
  n: number;
}

export interface SerialLine {
  slope: number;
  /** Value of the line at x = 0. */
  intercept: number;
  /** Mean of x: there the error of the line is smallest, and that of the slope does not enter. */
  mean_x: number;
  /** Value of the line at `mean_x`: the mean of y. */
  mean_y: number;
  se_slope: number | null;
  se_intercept: number | null;
  se_mean: number | null;
  /** Degrees of freedom of all three errors. 0 where they are null. */
  freedom: number;
  /** Standard deviation of the residuals (n − 2). */
  residual_sd: number | null;
  n: number;
}

/** More blocks than this are not needed for the slow part of the noise, which alone moves a mean or a slope. */
const mostBlocks = 128;
/** Fewest and most cosines looked at; the most gives as many degrees of freedom. */
const fewestCosines = 4;
const mostCosines = 32;
/** How much weaker or stronger an octave must be than what lies below it, in standard deviations, to be told apart. */
const weaker = 0.7;
const stronger = 3;
/** Geometric mean of 1 to 4: how far above the slowest cosine the first four of them lie. */
const firstFour = 24 ** (1 / 4);

/**
 * Mean of regularly sampled values with a standard error that holds for serially correlated noise. Unreadable values
 * are left out and the rest closed up.
 *
 * Slow noise is what moves a mean, so its size is read from the slowest wiggles the values show beside their mean: their
 * coefficients on the cosines cos(πj(i + ½)/n), j = 1, 2, …, scaled to unit length. Where the noise's spectrum is flat
 * up to the B-th of them, each squared coefficient estimates n times the squared standard error independently, and
 * their average has B degrees of freedom. B begins at 4 and is doubled, to at most 32 or n − 1, until the average of
 * the next octave of cosines is lower than that of those before it by 0.7 standard deviations of the logarithm of
 * their ratio, or higher by three: white noise gives nearly the textbook error, correlated noise a larger one. Where the
 * spectrum falls from the first four cosines on, as the a-th power of the frequency between them and the next four
 * (a at most 1), it is carried on from the middle of the four to the first: their average is multiplied by 24^(a/4).
 *
 * Intervals of 95 % hold the truth in 92–98 % for noise whose correlation time is below a hundredth of the span, in
 * about 90 % where it is a twentieth; noise slower than that cannot be told from the mean itself, and the error comes
 * out too small (1/f noise down to the span: about 85 %). Hum makes it too large, the more the stronger it is: take it
 * out first (`sineInPieces`).
 *
 * @returns null where nothing is readable
 * @see Müller 2007, J Econometrics 141:1331–1352; Lazarus, Lewis, Stock & Watson 2018, J Bus Econ Stat 36:541–559 (both
 * from memory): averages of squared cosine coefficients; the choice of B is ours
 */
export function serialMean(values: ArrayLike<number>): SerialMean | null {
  const kept: number[] = [];
  for (let i = 0; i < values.length; i++) if (Number.isFinite(values[i]!)) kept.push(values[i]!);
  const n = kept.length;
  if (n === 0) return null;
  const value = kept.reduce((sum, one) => sum + one, 0) / n;
  const residuals = kept.map((one) => one - value);
  const slow = slowVariance(residuals, [new Array<number>(n).fill(1)]);
  return {
    value,
    se: slow === null ? null : Math.sqrt(slow.variance / n),
    freedom: slow?.freedom ?? 0,
    sd: n > 1 ? Math.sqrt(residuals.reduce((sum, one) => sum + one * one, 0) / (n - 1)) : null,
    n,
  };
}

/**
 * Least-squares line y = intercept + slope·x with standard errors that hold for serially correlated noise, had as those
 * of `serialMean`: the cosines are made orthogonal to the constant and the line, and the textbook errors are scaled
 * from the residuals' own variance to the average squared coefficient.
 * @param x ascending, about evenly spaced. @param y same length; pairs with NaN are left out
 * @returns null for fewer than two pairs or where x has no span
 */
export function serialLine(x: ArrayLike<number>, y: ArrayLike<number>): SerialLine | null {
  const { x: px, y: py } = finitePairs(x, y);
  const n = px.length;
  if (n < 2) return null;
  const mean_x = px.reduce((sum, value) => sum + value, 0) / n;
  const mean_y = py.reduce((sum, value) => sum + value, 0) / n;
  const dx = px.map((value) => value - mean_x);
  const dy = py.map((value) => value - mean_y);
  const sxx = dx.reduce((sum, value) => sum + value * value, 0);
  if (!(sxx > 0)) return null;
  const slope = dx.reduce((sum, value, i) => sum + value * dy[i]!, 0) / sxx;
  const residuals = dy.map((value, i) => value - slope * dx[i]!);
  const slow = slowVariance(residuals, [new Array<number>(n).fill(1), dx]);
  const error = (share: number): number | null => (slow === null ? null : Math.sqrt(slow.variance * share));
  return {
    slope,
    intercept: mean_y - slope * mean_x,
    mean_x,
    mean_y,
    se_slope: error(1 / sxx),
    se_intercept: error(1 / n + mean_x ** 2 / sxx),
    se_mean: error(1 / n),
    freedom: slow?.freedom ?? 0,
    residual_sd: n > 2 ? Math.sqrt(residuals.reduce((sum, value) => sum + value * value, 0) / (n - 2)) : null,
    n,
  };
}

/** Standard error of a line's value at one x: error of the mean and of the slope together. */
export const lineErrorAt = (line: SerialLine, x: number): number | null =>
  line.se_mean === null || line.se_slope === null ? null : Math.hypot(line.se_mean, (x - line.mean_x) * line.se_slope);

/**
 * Variance per sample of the slow part of what a fit leaves over: what white noise would need to move the fit's
 * parameters as much as this noise does. Multiply (XᵀX)⁻¹ by it in place of the residual variance.
 * @param residuals of a least-squares fit, in order of time, evenly spaced
 * @param design the fit's regressors at the same samples (for a mean: ones); any number of them
 * @returns null where no freedom is left
 */
export function slowVariance(
  residuals: ArrayLike<number>,
  design: readonly ArrayLike<number>[],
): { variance: number; freedom: number } | null {
  const blocks = Math.min(mostBlocks, residuals.length);
  const own = blockSums(residuals, blocks);
  const taken: Float64Array[] = [];
  for (const one of design) orthonormal(blockSums(one, blocks), taken);
  const free = blocks - taken.length;
  if (free < 1) return null;
  const most = Math.min(mostCosines, free);
  const squares: number[] = [];
  const turn = quarterTurns(blocks);
  let j = 0;
  const reachTo = (count: number): void => {
    while (squares.length < count && ++j < blocks) {
      const cosine = new Float64Array(blocks);
      for (let i = 0; i < blocks; i++) cosine[i] = turn[(j * (2 * i + 1)) % (4 * blocks)]!;
      const unit = orthonormal(cosine, taken);
      if (unit) squares.push(dot(unit, own) ** 2);
    }
  };
  const average = (from: number, to: number): number =>
    squares.slice(from, to).reduce((sum, value) => sum + value, 0) / (to - from);
  let freedom = Math.min(fewestCosines, most);
  reachTo(freedom);
  let rise = 1;
  while (freedom < most) {
    const next = Math.min(2 * freedom, most);
    reachTo(next);
    if (squares.length < next) break;
    const ratio = Math.log(average(freedom, next) / average(0, freedom));
    // The logarithm of a mean of B squared normal numbers has a variance of about 2/B.
    const doubt = Math.sqrt(2 / freedom + 2 / (next - freedom));
    if (ratio < -weaker * doubt || ratio > stronger * doubt) {
      if (ratio < 0 && freedom === fewestCosines) rise = firstFour ** Math.min(1, -ratio / Math.LN2);
      break;
    }
    freedom = next;
  }
  return { variance: rise * average(0, freedom), freedom };
}

/** cos(πk/(2·blocks)) for k = 0 … 4·blocks − 1; kept, since nearly all calls are for one number of blocks. */
const turns = new Map<number, Float64Array>();
function quarterTurns(blocks: number): Float64Array {
  const held = turns.get(blocks);
  if (held) return held;
  const all = Float64Array.from({ length: 4 * blocks }, (_, k) => Math.cos((Math.PI * k) / (2 * blocks)));
  turns.set(blocks, all);
  return all;
}

/** Sums over nearly equal blocks, each over the root of its length: white noise keeps its variance. */
function blockSums(values: ArrayLike<number>, blocks: number): Float64Array {
  const n = values.length;
  const sums = new Float64Array(blocks);
  for (let b = 0; b < blocks; b++) {
    const from = Math.floor((b * n) / blocks);
    const to = Math.floor(((b + 1) * n) / blocks);
    let sum = 0;
    for (let i = from; i < to; i++) sum += values[i]!;
    sums[b] = sum / Math.sqrt(to - from);
  }
  return sums;
}

const dot = (a: Float64Array, b: Float64Array): number => {
  // Four sums side by side do not wait for one another.
  let [s0, s1, s2, s3] = [0, 0, 0, 0];
  const whole = a.length - (a.length % 4);
  for (let i = 0; i < whole; i += 4) {
    s0 += a[i]! * b[i]!;
    s1 += a[i + 1]! * b[i + 1]!;
    s2 += a[i + 2]! * b[i + 2]!;
    s3 += a[i + 3]! * b[i + 3]!;
  }
  for (let i = whole; i < a.length; i++) s0 += a[i]! * b[i]!;
  return s0 + s1 + (s2 + s3);
};

/** Makes a vector orthogonal to those taken, of unit length, and adds it to them; null where nothing is left of it. */
function orthonormal(vector: Float64Array, taken: Float64Array[]): Float64Array | null {
  const before = Math.sqrt(dot(vector, vector));
  let length = before;
  // Where little is left of it a second time, so that rounding does not build up (Kahan, in Parlett 1980; from memory).
  for (let pass = 0; pass < 2; pass++) {
    const held = length;
    for (const other of taken) {
      const share = dot(vector, other);
      for (let i = 0; i < vector.length; i++) vector[i]! -= share * other[i]!;
    }
    length = Math.sqrt(dot(vector, vector));
    if (length > 0.7 * held) break;
  }
  if (!(length > 1e-6 * before)) return null;
  for (let i = 0; i < vector.length; i++) vector[i]! /= length;
  taken.push(vector);
  return vector;
}
