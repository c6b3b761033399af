/** Non-linear least squares with what is known beforehand: Levenberg–Marquardt with normal priors. */

export interface Prior {
  mean: number;
  /** Infinity: nothing is known. */
  sd: number;
}

export interface LeastSquares {
  parameters: number[];
  /** (JᵀJ + P)⁻¹ at the optimum, P the inverse variances of the priors; null where it is singular. */
  covariance: number[][] | null;
  /** Sum of squares of the weighted residuals alone, and together with the priors'. */
  chi2: number;
  cost: number;
  n: number;
}

/** Weighted residuals, and their derivatives by each parameter where they were asked for. */
export interface Evaluation {
  residuals: Float64Array;
  columns: Float64Array[] | null;
}

/**
 * Minimizes Σ r² + Σ ((p − mean)/sd)². Residuals must be weighted: divided by their standard deviation.
 * @param evaluate residuals at the parameters, always of one length, with their derivatives on demand
 * @param start first guess
 * @param priors one for each parameter. @param bounds [low, high] for each: steps are cut there
 * @see Levenberg 1944, Q Appl Math 2:164–168; Marquardt 1963, J SIAM 11:431–441 (from memory)
 */
export function leastSquares(
  evaluate: (parameters: readonly number[], derivatives: boolean) => Evaluation,
  start: readonly number[],
  priors: readonly Prior[],
  bounds: readonly (readonly [number, number])[],
  most = 40,
): LeastSquares {
  const size = start.length;
  const precision = priors.map(({ sd }) => (Number.isFinite(sd) ? 1 / sd ** 2 : 0));
  const held = (p: readonly number[]): number[] =>
    p.map((value, k) => Math.min(bounds[k]![1], Math.max(bounds[k]![0], value)));
  const squares = (r: Float64Array): number => {
    let sum = 0;
    for (const value of r) sum += value * value;
    return sum;
  };
  const priorCost = (p: readonly number[]): number =>
    p.reduce((sum, value, k) => sum + precision[k]! * (value - priors[k]!.mean) ** 2, 0);
  let parameters = held(start);
  // Most first steps are taken, and then their derivatives are wanted as well: they are had together.
  let here = evaluate(parameters, true);
  let r = here.residuals;
  let chi2 = squares(r);
  let cost = chi2 + priorCost(parameters);
  let damping = 1e-3;
  const system = (): { normal: number[][]; gradient: number[] } => {
    const columns = here.columns ?? evaluate(parameters, true).columns!;
    const normal = columns.map(() => new Array<number>(columns.length).fill(0));
    for (let j = 0; j < columns.length; j++)
      for (let k = j; k < columns.length; k++) {
        const [a, b] = [columns[j]!, columns[k]!];
        let sum = j === k ? precision[j]! : 0;
        for (let i = 0; i < a.length; i++) sum += a[i]! * b[i]!;
        normal[j]![k] = sum;
        normal[k]![j] = sum;
      }
    const gradient = columns.map((a, k) => {
      let sum = precision[k]! * (parameters[k]! - priors[k]!.mean);
      for (let i = 0; i < a.length; i++) sum += a[i]! * r[i]!;
      return sum;
    });
    return { normal, gradient };
  };
  let current = system();
  let slow = 0;
  let stale = false;
  for (let round = 0; round < most; round++) {
    let improved = false;
    for (let trial = 0; trial < 14; trial++) {
      const damped = current.normal.map((row, j) => row.map((value, k) => (j === k ? value * (1 + damping) : value)));
      const move = solve(damped, current.gradient);
      if (move) {
        const next = held(parameters.map((value, k) => value - move[k]!));
        const there = evaluate(next, trial === 0);
        const nextChi2 = squares(there.residuals);
        const nextCost = nextChi2 + priorCost(next);
        if (Number.isFinite(nextCost) && nextCost < cost) {
          improved = true;
          slow = cost - nextCost > 1e-6 * (1 + cost) ? 0 : slow + 1;
          parameters = next;
          here = there;
          r = there.residuals;
          chi2 = nextChi2;
          cost = nextCost;
          damping = Math.max(1e-9, damping / 4);
          stale = true;
          break;
        }
      }
      damping *= 4;
    }
    if (!improved || slow >= 2) break;
    current = system();
    stale = false;
  }
  if (stale) current = system();
  const inverse = invert(current.normal);
  return { parameters, covariance: size === 0 ? null : inverse, chi2, cost, n: r.length };
}

/** Solves a symmetric positive definite system by Cholesky, rows scaled to a unit diagonal; null where it is not one. */
export function solve(matrix: readonly (readonly number[])[], right: readonly number[]): number[] | null {
  const lower = cholesky(matrix);
  if (!lower) return null;
  const { l, scale } = lower;
  const n = right.length;
  const y = new Array<number>(n).fill(0);
  for (let i = 0; i < n; i++) {
    let sum = right[i]! * scale[i]!;
    for (let k = 0; k < i; k++) sum -= l[i]![k]! * y[k]!;
    y[i] = sum / l[i]![i]!;
  }
  for (let i = n - 1; i >= 0; i--) {
    let sum = y[i]!;
    for (let k = i + 1; k < n; k++) sum -= l[k]![i]! * y[k]!;
    y[i] = sum / l[i]![i]!;
  }
  return y.map((value, i) => value * scale[i]!);
}

/** Inverse of a symmetric positive definite matrix; null where it is not one. */
export function invert(matrix: readonly (readonly number[])[]): number[][] | null {
  const columns = matrix.map((_, k) =>
    solve(
      matrix,
      matrix.map((__, i) => (i === k ? 1 : 0)),
    ),
  );
  return columns.every((column) => column !== null) ? (columns as number[][]) : null;
}

function cholesky(matrix: readonly (readonly number[])[]): { l: number[][]; scale: number[] } | null {
  const n = matrix.length;
  const scale = matrix.map((row, i) => 1 / Math.sqrt(row[i]!));
  if (!scale.every((value) => Number.isFinite(value))) return null;
  const l = matrix.map(() => new Array<number>(n).fill(0));
  for (let i = 0; i < n; i++)
    for (let j = 0; j <= i; j++) {
      let sum = matrix[i]![j]! * scale[i]! * scale[j]!;
      for (let k = 0; k < j; k++) sum -= l[i]![k]! * l[j]![k]!;
      if (i === j) {
        if (!(sum > 1e-13)) return null;
        l[i]![i] = Math.sqrt(sum);
      } else l[i]![j] = sum / l[j]![j]!;
    }
  return { l, scale };
}
