/** Sums of one or two exponentials with an offset, by least squares. */
import { slowVariance } from './serial.ts';

export interface ExponentialTerm {
  /** In the unit of y, at x = 0. */
  amplitude: number;
  /** In the unit of x. */
  tau: number;
}

export interface ExponentialSum {
  /** y = offset + Σ amplitude·exp(−x/tau). */
  offset: number;
  /** The slowest first. */
  terms: ExponentialTerm[];
  rss: number;
  n: number;
  /** Residuals in order of x. */
  residuals: Float64Array;
  /**
   * Covariance of [offset, amplitude₁, ln tau₁, amplitude₂, ln tau₂] from the Jacobian at the optimum, multiplied by
   * `correlation`.
   */
  covariance: number[][];
  /** How much more the slow part of the residuals moves the fit than white noise of their size would (variances). */
  correlation: number;
  /** Degrees of freedom behind the covariance. */
  freedom: number;
  /** False where a time constant ran to an edge of its range, a term is nil, or the Jacobian has no inverse. */
  converged: boolean;
}

export interface TauRanges {
  /** Allowed range of the slow (or only) time constant, in the unit of x. */
  slow: readonly [number, number];
  /** Of the fast one. */
  fast?: readonly [number, number];
}

/**
 * Least-squares fit of offset + Σ amplitude·exp(−x/tau) with one term, or with two where `ranges.fast` is given. A grid
 * over the logarithms of the time constants, offset and amplitudes solved exactly at each of its nodes (variable
 * projection, Golub & Pereyra 1973, SIAM J Numer Anal 10:413–432; from memory), then Levenberg–Marquardt steps in all
 * parameters (Marquardt 1963, J Soc Ind Appl Math 11:431–441; from memory).
 * @param x not negative, ascending, finite. @param y same length, finite
 * @returns null for fewer points than three more than there are parameters
 */
export function exponentialSum(x: ArrayLike<number>, y: ArrayLike<number>, ranges: TauRanges): ExponentialSum | null {
  if (x.length !== y.length) throw new RangeError(`x and y must be of one length, got ${x.length} and ${y.length}`);
  const wanted = ranges.fast ? 2 : 1;
  if (x.length < 2 * wanted + 4) return null;
  const points = pointsOf(x, y);
  const fits = startsOnGrid(points, ranges).map((start) => refined(points, start, ranges));
  return fits.length === 0
    ? null
    : described(
        points,
        fits.reduce((best, one) => (one.rss < best.rss ? one : best)),
      );
}

/** Parameters in the order of the covariance. */
type Parameters = number[];

interface Points {
  x: Float64Array;
  y: Float64Array;
  /** Distance of neighbouring x where all are the same, within rounding; null where they are not. */
  spacing: number | null;
}

function pointsOf(x: ArrayLike<number>, y: ArrayLike<number>): Points {
  const own = Float64Array.from(x);
  const n = own.length;
  const spacing = (own[n - 1]! - own[0]!) / (n - 1);
  const slack = 1e-13 * (Math.abs(own[0]!) + Math.abs(own[n - 1]!)) + 1e-11 * spacing;
  let even = spacing > 0;
  for (let i = 1; i < n && even; i++) even = Math.abs(own[i]! - own[0]! - i * spacing) <= slack;
  return { x: own, y: Float64Array.from(y), spacing: even ? spacing : null };
}

/** Evenly spaced points are carried on from the last exact exponential by a constant factor for so many points. */
const carried = 16;

/** exp(−x/tau) at every point. */
function decaysOf({ x, spacing }: Points, tau: number, into: Float64Array): void {
  const n = x.length;
  if (spacing === null) {
    for (let i = 0; i < n; i++) into[i] = Math.exp(-x[i]! / tau);
    return;
  }
  const factor = Math.exp(-spacing / tau);
  for (let from = 0; from < n; from += carried) {
    let value = Math.exp(-x[from]! / tau);
    const to = Math.min(n, from + carried);
    for (let i = from; i < to; i++) {
      into[i] = value;
      value *= factor;
    }
  }
}

const logSpaced = ([from, to]: readonly [number, number], count: number): number[] =>
  Array.from({ length: count }, (_, k) => from * (to / from) ** (k / (count - 1)));

/**
 * The best node; with two terms the best in each third of the fast range, since the steps may end in a side valley
 * where both time constants are one.
 */
function startsOnGrid(points: Points, { slow, fast }: TauRanges): Parameters[] {
  const n = points.x.length;
  // Every product of two columns once: offset, slow decays, fast decays.
  const count = fast ? 12 : 24;
  const taus = [...logSpaced(slow, count), ...(fast ? logSpaced(fast, 10) : [])];
  const columns = [
    new Float64Array(n).fill(1),
    ...taus.map((tau) => {
      const column = new Float64Array(n);
      decaysOf(points, tau, column);
      return column;
    }),
  ];
  const quicks = taus.length - count;
  const gram = columns.map(() => new Float64Array(columns.length));
  const needed = (r: number, c: number): boolean => r === c || r === 0 || (r <= count && c > count);
  for (let r = 0; r < columns.length; r++)
    for (let c = r; c < columns.length; c++)
      if (needed(r, c)) {
        const product = dot(columns[r]!, columns[c]!);
        gram[r]![c] = product;
        gram[c]![r] = product;
      }
  const right = columns.map((column) => dot(column, points.y));
  const best = new Map<number, { gained: number; start: Parameters }>();
  const tried = (picked: readonly number[], group: number): void => {
    const size = picked.length;
    const rows = new Float64Array(size * (size + 1));
    for (let r = 0; r < size; r++) {
      for (let c = 0; c < size; c++) rows[r * (size + 1) + c] = gram[picked[r]!]![picked[c]!]!;
      rows[r * (size + 1) + size] = right[picked[r]!]!;
    }
    if (!eliminated(rows, size, size + 1)) return;
    // Less what the columns explain; the constant Σy² is the same everywhere.
    let gained = 0;
    for (let r = 0; r < size; r++) gained -= rows[r * (size + 1) + size]! * right[picked[r]!]!;
    if (gained >= (best.get(group)?.gained ?? Number.POSITIVE_INFINITY)) return;
    const start = [rows[size]!];
    for (let r = 1; r < size; r++) start.push(rows[r * (size + 1) + size]!, Math.log(taus[picked[r]! - 1]!));
    best.set(group, { gained, start });
  };
  for (let one = 1; one <= count; one++)
    if (!fast) tried([0, one], 0);
    else
      for (let k = 0; k < quicks; k++)
        if (taus[one - 1]! > 1.5 * taus[count + k]!) tried([0, one, count + 1 + k], Math.floor((3 * k) / quicks));
  return [...best.values()].map(({ start }) => start);
}

function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0;
  for (let i = 0; i < a.length; i++) sum += a[i]! * b[i]!;
  return sum;
}

/** The sum at some parameters: decays of each term, residuals and their squares. Buffers are kept and filled anew. */
interface State {
  decays: Float64Array[];
  taus: number[];
  residuals: Float64Array;
  rss: number;
}

const stateFor = (n: number, terms: number): State => ({
  decays: Array.from({ length: terms }, () => new Float64Array(n)),
  taus: [],
  residuals: new Float64Array(n),
  rss: 0,
});

function evaluate(points: Points, p: Parameters, state: State): void {
  const { residuals, decays } = state;
  const { y } = points;
  const n = y.length;
  state.taus = decays.map((_, k) => Math.exp(p[2 * k + 2]!));
  for (let k = 0; k < decays.length; k++) decaysOf(points, state.taus[k]!, decays[k]!);
  const offset = p[0]!;
  const amplitude = p[1]!;
  const first = decays[0]!;
  const second = decays[1] ?? first;
  // Without a second term nothing of the first is taken twice.
  const other = decays.length > 1 ? p[3]! : 0;
  let rss = 0;
  for (let i = 0; i < n; i++) {
    const residual = y[i]! - offset - amplitude * first[i]! - other * second[i]!;
    residuals[i] = residual;
    rss += residual * residual;
  }
  state.rss = rss;
}

interface Normal {
  /** Row by row. */
  matrix: Float64Array;
  right: Float64Array;
}

function normalEquations({ x }: Points, p: Parameters, { decays, taus, residuals }: State): Normal {
  const size = p.length;
  const n = x.length;
  const matrix = new Float64Array(size * size);
  const right = new Float64Array(size);
  const put = (r: number, c: number, sum: number): void => {
    matrix[r * size + c] = sum;
    matrix[c * size + r] = sum;
  };
  matrix[0] = n;
  right[0] = residuals.reduce((sum, value) => sum + value, 0);
  for (let k = 0; k < decays.length; k++) {
    const a = decays[k]!;
    const [scale, at] = [p[2 * k + 1]! / taus[k]!, 2 * k + 1];
    let [s1, sx, s11, s1x, sxx, r1, rx] = [0, 0, 0, 0, 0, 0, 0];
    for (let i = 0; i < n; i++) {
      const own = a[i]!;
      const timed = own * x[i]!;
      const residual = residuals[i]!;
      s1 += own;
      sx += timed;
      s11 += own * own;
      s1x += own * timed;
      sxx += timed * timed;
      r1 += own * residual;
      rx += timed * residual;
    }
    put(0, at, s1);
    put(0, at + 1, scale * sx);
    put(at, at, s11);
    put(at, at + 1, scale * s1x);
    put(at + 1, at + 1, scale * scale * sxx);
    right[at] = r1;
    right[at + 1] = scale * rx;
  }
  if (decays.length === 2) {
    const [a, b] = decays as [Float64Array, Float64Array];
    const [scaleA, scaleB] = [p[1]! / taus[0]!, p[3]! / taus[1]!];
    let [s11, s1x, sxx] = [0, 0, 0];
    for (let i = 0; i < n; i++) {
      const product = a[i]! * b[i]!;
      const time = x[i]!;
      s11 += product;
      s1x += product * time;
      sxx += product * time * time;
    }
    put(1, 3, s11);
    put(1, 4, scaleB * s1x);
    put(2, 3, scaleA * s1x);
    put(2, 4, scaleA * scaleB * sxx);
  }
  return { matrix, right };
}

/** Where the steps ended. */
interface Refined extends Normal {
  p: Parameters;
  rss: number;
  residuals: Float64Array;
  bounds: readonly (readonly [number, number])[];
}

function refined(points: Points, start: Parameters, { slow, fast }: TauRanges): Refined {
  const bounds = [slow, ...(fast ? [fast] : [])].map(([from, to]) => [Math.log(from), Math.log(to)] as const);
  const held = (p: Parameters): Parameters =>
    p.map((value, k) => {
      if (k === 0 || k % 2 === 1) return value;
      const [from, to] = bounds[k / 2 - 1]!;
      return Math.min(to, Math.max(from, value));
    });
  const n = points.x.length;
  const size = start.length;
  let p = start;
  let here = stateFor(n, bounds.length);
  let there = stateFor(n, bounds.length);
  evaluate(points, p, here);
  let normal = normalEquations(points, p, here);
  let damping = 1e-3;
  const rows = new Float64Array(size * (size + 1));
  for (let step = 0; step < 40; step++) {
    for (let r = 0; r < size; r++) {
      for (let c = 0; c < size; c++) rows[r * (size + 1) + c] = normal.matrix[r * size + c]!;
      rows[r * (size + 1) + r]! *= 1 + damping;
      rows[r * (size + 1) + size] = normal.right[r]!;
    }
    if (!eliminated(rows, size, size + 1)) break;
    const next = held(p.map((value, k) => value + rows[k * (size + 1) + size]!));
    evaluate(points, next, there);
    if (there.rss < here.rss) {
      const gain = here.rss - there.rss;
      p = next;
      [here, there] = [there, here];
      normal = normalEquations(points, p, here);
      damping = Math.max(1e-12, damping / 8);
      if (gain <= 1e-10 * here.rss || here.rss < 1e-24 * n) break;
    } else {
      damping *= 6;
      if (damping > 1e8) break;
    }
  }
  return { ...normal, p, rss: here.rss, residuals: here.residuals, bounds };
}

function described(points: Points, { p, rss, matrix, residuals, bounds }: Refined): ExponentialSum {
  const n = points.x.length;
  const terms: ExponentialTerm[] = [];
  for (let k = 1; k < p.length; k += 2) terms.push({ amplitude: p[k]!, tau: Math.exp(p[k + 1]!) });
  const inverse = inverted(matrix, p.length);
  const white = rss / (n - p.length);
  const slow = slowVariance(residuals, designOf(points, p));
  // Never better than white: the slowest wiggles of short stretches are few.
  const variance = Math.max(white, slow?.variance ?? 0);
  const inside = terms.every((_, k) => {
    const [from, to] = bounds[k]!;
    return p[2 * k + 2]! > from + 1e-6 && p[2 * k + 2]! < to - 1e-6;
  });
  // A level trace leaves rounding to fit: a term of that size is none.
  const there = terms.every(({ amplitude }) => Math.abs(amplitude) > 1e-13 * Math.abs(p[0]!));
  return {
    offset: p[0]!,
    terms,
    rss,
    n,
    residuals,
    covariance: inverse ? inverse.map((row) => row.map((value) => value * variance)) : [],
    correlation: white > 0 ? variance / white : 1,
    freedom: slow && slow.variance > white ? slow.freedom : n - p.length,
    converged: inverse !== null && inside && there,
  };
}

/** The Jacobian's columns. */
function designOf(points: Points, p: Parameters): Float64Array[] {
  const { x } = points;
  const columns = p.map(() => new Float64Array(x.length).fill(1));
  for (let k = 1; k < p.length; k += 2) {
    const tau = Math.exp(p[k + 1]!);
    const decays = columns[k]!;
    decaysOf(points, tau, decays);
    for (let i = 0; i < x.length; i++) columns[k + 1]![i] = (p[k]! * decays[i]! * x[i]!) / tau;
  }
  return columns;
}

/**
 * Value at an x, and its standard error, of the offset and the first `terms` terms (all where left out).
 * @returns an infinite standard error where the fit has no covariance
 */
export function sumAt(fit: ExponentialSum, x: number, terms = fit.terms.length): { value: number; se: number } {
  const gradient = new Array<number>(1 + 2 * fit.terms.length).fill(0);
  gradient[0] = 1;
  let value = fit.offset;
  fit.terms.slice(0, terms).forEach(({ amplitude, tau }, k) => {
    const decay = Math.exp(-x / tau);
    value += amplitude * decay;
    gradient[2 * k + 1] = decay;
    gradient[2 * k + 2] = (amplitude * decay * x) / tau;
  });
  if (fit.covariance.length === 0) return { value, se: Number.POSITIVE_INFINITY };
  let variance = 0;
  gradient.forEach((a, r) => {
    gradient.forEach((b, c) => {
      variance += a * b * fit.covariance[r]![c]!;
    });
  });
  return { value, se: Math.sqrt(Math.max(0, variance)) };
}

/** Standard error of one of the time constants, 0 being the slowest. */
export const tauError = (fit: ExponentialSum, term: number): number =>
  fit.covariance.length === 0
    ? Number.POSITIVE_INFINITY
    : fit.terms[term]!.tau * Math.sqrt(Math.max(0, fit.covariance[2 * term + 2]![2 * term + 2]!));

/** Inverse of a square matrix given row by row; null where singular. */
function inverted(matrix: Float64Array, size: number): number[][] | null {
  const rows = new Float64Array(2 * size * size);
  for (let r = 0; r < size; r++) {
    for (let c = 0; c < size; c++) rows[2 * r * size + c] = matrix[r * size + c]!;
    rows[2 * r * size + size + r] = 1;
  }
  if (!eliminated(rows, size, 2 * size)) return null;
  return Array.from({ length: size }, (_, r) => [...rows.subarray((2 * r + 1) * size, (2 * r + 2) * size)]);
}

/**
 * Gauss–Jordan elimination with partial pivoting of `size` rows of `width` numbers, in place; false where singular.
 * Flat, since the grid solves hundreds of small systems for every fit.
 */
function eliminated(rows: Float64Array, size: number, width: number): boolean {
  let scales = 0;
  const scale = new Float64Array(size);
  for (let r = 0; r < size; r++) {
    scale[r] = Math.abs(rows[r * width + r]!);
    scales += scale[r]!;
  }
  if (!Number.isFinite(scales)) return false;
  for (let column = 0; column < size; column++) {
    let pivot = column;
    for (let r = column + 1; r < size; r++)
      if (Math.abs(rows[r * width + column]!) > Math.abs(rows[pivot * width + column]!)) pivot = r;
    if (!(Math.abs(rows[pivot * width + column]!) > 1e-13 * (scale[column]! || 1))) return false;
    if (pivot !== column)
      for (let c = 0; c < width; c++) {
        const held = rows[column * width + c]!;
        rows[column * width + c] = rows[pivot * width + c]!;
        rows[pivot * width + c] = held;
      }
    const by = rows[column * width + column]!;
    for (let c = column; c < width; c++) rows[column * width + c]! /= by;
    for (let r = 0; r < size; r++) {
      const factor = rows[r * width + column]!;
      if (r === column || factor === 0) continue;
      for (let c = column; c < width; c++) rows[r * width + c]! -= factor * rows[column * width + c]!;
    }
  }
  return true;
}
