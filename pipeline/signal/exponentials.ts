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
  /** False where a time constant ran to an edge of its range, or the Jacobian has no inverse. */
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
  const fits = startsOnGrid(x, y, ranges).map((start) => refined(x, y, start, ranges));
  return fits.length === 0 ? null : fits.reduce((best, one) => (one.rss < best.rss ? one : best));
}

/** Parameters in the order of the covariance. */
type Parameters = number[];

const logSpaced = ([from, to]: readonly [number, number], count: number): number[] =>
  Array.from({ length: count }, (_, k) => from * (to / from) ** (k / (count - 1)));

/**
 * The best node; with two terms the best in each third of the fast range, since the steps may end in a side valley
 * where both time constants are one.
 */
function startsOnGrid(x: ArrayLike<number>, y: ArrayLike<number>, { slow, fast }: TauRanges): Parameters[] {
  // Every product of two columns once: offset, slow decays, fast decays.
  const taus = [...logSpaced(slow, fast ? 12 : 24), ...(fast ? logSpaced(fast, 10) : [])];
  const columns = [
    new Float64Array(x.length).fill(1),
    ...taus.map((tau) => Float64Array.from(x, (value) => Math.exp(-value / tau))),
  ];
  const count = fast ? 12 : 24;
  const slows = Array.from({ length: count }, (_, k) => k + 1);
  const quicks = Array.from({ length: taus.length - count }, (_, k) => count + k + 1);
  const gram = columns.map(() => new Float64Array(columns.length));
  const needed = (r: number, c: number): boolean => r === c || r === 0 || (r <= slows.length && c > slows.length);
  for (let r = 0; r < columns.length; r++)
    for (let c = r; c < columns.length; c++) if (needed(r, c)) gram[r]![c] = dot(columns[r]!, columns[c]!);
  const right = columns.map((column) => dot(column, y));
  const best = new Map<number, { gained: number; start: Parameters }>();
  const tried = (picked: readonly number[], group: number): void => {
    const matrix = picked.map((r) => picked.map((c) => gram[Math.min(r, c)]![Math.max(r, c)]!));
    const own = picked.map((r) => right[r]!);
    const solved = solveSymmetric(matrix, own);
    if (!solved) return;
    // Less what the columns explain; the constant Σy² is the same everywhere.
    const gained = -solved.reduce((sum, value, k) => sum + value * own[k]!, 0);
    if (gained >= (best.get(group)?.gained ?? Number.POSITIVE_INFINITY)) return;
    const start = [
      solved[0]!,
      ...picked.slice(1).flatMap((column, k) => [solved[k + 1]!, Math.log(taus[column - 1]!)]),
    ];
    best.set(group, { gained, start });
  };
  for (const one of slows)
    if (!fast) tried([0, one], 0);
    else
      for (const quick of quicks)
        if (taus[one - 1]! > 1.5 * taus[quick - 1]!)
          tried([0, one, quick], Math.floor((3 * (quick - count - 1)) / quicks.length));
  return [...best.values()].map(({ start }) => start);
}

function dot(a: ArrayLike<number>, b: ArrayLike<number>): number {
  let sum = 0;
  for (let i = 0; i < a.length; i++) sum += a[i]! * b[i]!;
  return sum;
}

interface Normal {
  matrix: number[][];
  right: number[];
  rss: number;
}

function normalEquations(x: ArrayLike<number>, y: ArrayLike<number>, p: Parameters): Normal {
  const size = p.length;
  const matrix = Array.from({ length: size }, () => new Array<number>(size).fill(0));
  const right = new Array<number>(size).fill(0);
  const gradient = new Array<number>(size).fill(1);
  const taus = p.map((value) => Math.exp(value));
  let rss = 0;
  for (let i = 0; i < x.length; i++) {
    let residual = y[i]! - p[0]!;
    for (let k = 1; k < size; k += 2) {
      const scaled = x[i]! / taus[k + 1]!;
      const decay = Math.exp(-scaled);
      gradient[k] = decay;
      gradient[k + 1] = p[k]! * decay * scaled;
      residual -= p[k]! * decay;
    }
    rss += residual * residual;
    for (let r = 0; r < size; r++) {
      right[r]! += gradient[r]! * residual;
      for (let c = 0; c <= r; c++) matrix[r]![c]! += gradient[r]! * gradient[c]!;
    }
  }
  for (let r = 0; r < size; r++) for (let c = r + 1; c < size; c++) matrix[r]![c] = matrix[c]![r]!;
  return { matrix, right, rss };
}

function refined(
  x: ArrayLike<number>,
  y: ArrayLike<number>,
  start: Parameters,
  { slow, fast }: TauRanges,
): ExponentialSum {
  const bounds = [slow, ...(fast ? [fast] : [])].map(([from, to]) => [Math.log(from), Math.log(to)] as const);
  const held = (p: Parameters): Parameters =>
    p.map((value, k) => {
      if (k === 0 || k % 2 === 1) return value;
      const [from, to] = bounds[k / 2 - 1]!;
      return Math.min(to, Math.max(from, value));
    });
  let p = start;
  let here = normalEquations(x, y, p);
  let damping = 1e-3;
  for (let step = 0; step < 40; step++) {
    const matrix = here.matrix.map((row, r) => row.map((value, c) => (r === c ? value * (1 + damping) : value)));
    const move = solveSymmetric(matrix, here.right);
    if (!move) break;
    const next = held(p.map((value, k) => value + move[k]!));
    const there = normalEquations(x, y, next);
    if (there.rss < here.rss) {
      const gain = here.rss - there.rss;
      p = next;
      here = there;
      damping = Math.max(1e-12, damping / 8);
      if (gain <= 1e-10 * here.rss || here.rss < 1e-24 * x.length) break;
    } else {
      damping *= 6;
      if (damping > 1e8) break;
    }
  }
  return described(x, y, p, here, bounds);
}

function described(
  x: ArrayLike<number>,
  y: ArrayLike<number>,
  p: Parameters,
  { matrix, rss }: Normal,
  bounds: readonly (readonly [number, number])[],
): ExponentialSum {
  const n = x.length;
  const terms: ExponentialTerm[] = [];
  for (let k = 1; k < p.length; k += 2) terms.push({ amplitude: p[k]!, tau: Math.exp(p[k + 1]!) });
  const residuals = Float64Array.from({ length: n }, (_, i) => {
    let residual = y[i]! - p[0]!;
    for (const { amplitude, tau } of terms) residual -= amplitude * Math.exp(-x[i]! / tau);
    return residual;
  });
  const inverse = inverted(matrix);
  const white = rss / (n - p.length);
  const slow = slowVariance([...residuals], designOf(x, p));
  // Never better than white: the slowest wiggles of short stretches are few.
  const variance = Math.max(white, slow?.variance ?? 0);
  const inside = terms.every((_, k) => {
    const [from, to] = bounds[k]!;
    return p[2 * k + 2]! > from + 1e-6 && p[2 * k + 2]! < to - 1e-6;
  });
  return {
    offset: p[0]!,
    terms,
    rss,
    n,
    residuals,
    covariance: inverse ? inverse.map((row) => row.map((value) => value * variance)) : [],
    correlation: white > 0 ? variance / white : 1,
    freedom: slow && slow.variance > white ? slow.freedom : n - p.length,
    converged: inverse !== null && inside,
  };
}

/** The Jacobian's columns. */
function designOf(x: ArrayLike<number>, p: Parameters): number[][] {
  const columns = p.map(() => new Array<number>(x.length).fill(1));
  for (let k = 1; k < p.length; k += 2)
    for (let i = 0; i < x.length; i++) {
      const scaled = x[i]! / Math.exp(p[k + 1]!);
      columns[k]![i] = Math.exp(-scaled);
      columns[k + 1]![i] = p[k]! * Math.exp(-scaled) * scaled;
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

/** Gauss–Jordan elimination with partial pivoting; null where singular. */
function solveSymmetric(matrix: readonly number[][], right: readonly number[]): number[] | null {
  const size = right.length;
  const rows = matrix.map((row, r) => [...row, right[r]!]);
  return eliminated(rows, size) ? rows.map((row) => row[size]!) : null;
}

function inverted(matrix: readonly number[][]): number[][] | null {
  const size = matrix.length;
  const rows = matrix.map((row, r) => [...row, ...row.map((_, c) => (c === r ? 1 : 0))]);
  return eliminated(rows, size) ? rows.map((row) => row.slice(size)) : null;
}

function eliminated(rows: number[][], size: number): boolean {
  const scale = rows.map((row, r) => Math.abs(row[r]!));
  for (let column = 0; column < size; column++) {
    let pivot = column;
    for (let r = column + 1; r < size; r++)
      if (Math.abs(rows[r]![column]!) > Math.abs(rows[pivot]![column]!)) pivot = r;
    if (!(Math.abs(rows[pivot]![column]!) > 1e-13 * (scale[column]! || 1))) return false;
    [rows[column], rows[pivot]] = [rows[pivot]!, rows[column]!];
    const own = rows[column]!;
    const by = own[column]!;
    for (let c = column; c < own.length; c++) own[c]! /= by;
    for (let r = 0; r < size; r++) {
      const factor = rows[r]![column]!;
      if (r === column || factor === 0) continue;
      for (let c = column; c < own.length; c++) rows[r]![c]! -= factor * own[c]!;
    }
  }
  return true;
}
