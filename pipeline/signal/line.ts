/** Straight lines through points. Pairs with a NaN are left out. */
import { median } from './statistics.ts';

export interface LineFit {
  slope: number;
  intercept: number;
  /** Standard errors; null where two points leave no freedom. */
  se_slope: number | null;
  se_intercept: number | null;
  /** Standard deviation of the residuals with n − 2 degrees of freedom; null likewise. */
  residual_sd: number | null;
  r_squared: number | null;
  n: number;
}

/** The pairs of which both are finite. @throws RangeError where x and y are not of one length */
export function finitePairs(x: ArrayLike<number>, y: ArrayLike<number>): { x: number[]; y: number[] } {
  if (x.length !== y.length) throw new RangeError(`x and y must be of one length, got ${x.length} and ${y.length}`);
  const kept = { x: [] as number[], y: [] as number[] };
  for (let i = 0; i < x.length; i++)
    if (Number.isFinite(x[i]!) && Number.isFinite(y[i]!)) {
      kept.x.push(x[i]!);
      kept.y.push(y[i]!);
    }
  return kept;
}

/**
 * Ordinary least-squares line y = intercept + slope·x with standard errors.
 * @returns null for fewer than two finite pairs or when all x are equal
 * @see Draper & Smith, Applied Regression Analysis (from memory)
 */
export function linearFit(x: ArrayLike<number>, y: ArrayLike<number>): LineFit | null {
  const points = finitePairs(x, y);
  const n = points.x.length;
  if (n < 2) return null;
  const meanX = points.x.reduce((sum, value) => sum + value, 0) / n;
  const meanY = points.y.reduce((sum, value) => sum + value, 0) / n;
  let sxx = 0;
  let sxy = 0;
  let syy = 0;
  for (let i = 0; i < n; i++) {
    const dx = points.x[i]! - meanX;
    const dy = points.y[i]! - meanY;
    sxx += dx * dx;
    sxy += dx * dy;
    syy += dy * dy;
  }
  if (!(sxx > 0)) return null;
  const slope = sxy / sxx;
  const intercept = meanY - slope * meanX;
  let rss = 0;
  for (let i = 0; i < n; i++) rss += (points.y[i]! - meanY - slope * (points.x[i]! - meanX)) ** 2;
  const residualSd = n > 2 ? Math.sqrt(rss / (n - 2)) : null;
  return {
    slope,
    intercept,
    se_slope: residualSd === null ? null : residualSd / Math.sqrt(sxx),
    se_intercept: residualSd === null ? null : residualSd * Math.sqrt(1 / n + meanX ** 2 / sxx),
    residual_sd: residualSd,
    r_squared: syy > 0 ? 1 - rss / syy : null,
    n,
  };
}

export interface TheilSenFit {
  slope: number;
  intercept: number;
  /** Standard error of the slope from Sen's normal interval (half the 95 % width ÷ 1.96); null below four points. */
  se_slope: number | null;
  n: number;
}

/** Above this many points every k-th is taken, so that the number of pairs stays bounded. */
const mostPoints = 1500;

/**
 * Theil–Sen line: median of the slopes between all pairs of points, intercept median(y) − slope·median(x).
 * @returns null for fewer than two pairs with different x
 * @see Theil 1950; Sen 1968, J Am Stat Assoc 63:1379–1389
 */
export function theilSen(x: ArrayLike<number>, y: ArrayLike<number>): TheilSenFit | null {
  const all = finitePairs(x, y);
  const stride = Math.max(1, Math.ceil(all.x.length / mostPoints));
  const px = all.x.filter((_, i) => i % stride === 0);
  const py = all.y.filter((_, i) => i % stride === 0);
  const slopes: number[] = [];
  for (let i = 0; i < px.length; i++)
    for (let j = i + 1; j < px.length; j++) if (px[j] !== px[i]) slopes.push((py[j]! - py[i]!) / (px[j]! - px[i]!));
  if (slopes.length === 0) return null;
  const sorted = Float64Array.from(slopes).sort();
  const slope = median(sorted)!;
  const n = px.length;
  let standardError: number | null = null;
  if (n >= 4) {
    const half = 1.959964 * Math.sqrt((n * (n - 1) * (2 * n + 5)) / 18);
    const low = sorted[Math.max(0, Math.floor((sorted.length - half) / 2))]!;
    const high = sorted[Math.min(sorted.length - 1, Math.ceil((sorted.length + half) / 2))]!;
    standardError = (high - low) / (2 * 1.959964);
  }
  return { slope, intercept: median(py)! - slope * median(px)!, se_slope: standardError, n };
}
