/** Single exponential with offset, by least squares. */

export interface ExponentialFit {
  /** y = offset + amplitude·exp(−(x − x₀)/tau), x₀ the first finite x. */
  offset: number;
  amplitude: number;
  /** In the unit of x, always above 0. */
  tau: number;
  x0: number;
  se_offset: number;
  se_amplitude: number;
  se_tau: number;
  residual_sd: number;
  n: number;
  /**
   * False where the data do not determine a time constant: it ran to the edge of the range searched (from a fifth of
   * the spacing to twenty times the span), or its standard error exceeds itself.
   */
  converged: boolean;
}

interface Linear {
  offset: number;
  amplitude: number;
  rss: number;
}

/**
 * Fits offset + amplitude·exp(−(x − x₀)/tau). The two linear parameters are solved exactly for each tau (variable
 * projection, Golub & Pereyra 1973, SIAM J Numer Anal 10:413–432, from memory); log tau is searched on a grid and
 * refined by golden section. Standard errors from the Jacobian at the optimum.
 * @param x ascending, any unit. @param y same length; pairs with NaN are left out
 * @returns null for fewer than five finite pairs, or when x has no span
 */
export function exponentialFit(x: ArrayLike<number>, y: ArrayLike<number>): ExponentialFit | null {
  if (x.length !== y.length) throw new RangeError(`x and y must be of one length, got ${x.length} and ${y.length}`);
  const px: number[] = [];
  const py: number[] = [];
  for (let i = 0; i < x.length; i++)
    if (Number.isFinite(x[i]!) && Number.isFinite(y[i]!)) {
      px.push(x[i]!);
      py.push(y[i]!);
    }
  const n = px.length;
  if (n < 5) return null;
  const x0 = px[0]!;
  const span = px[n - 1]! - x0;
  if (!(span > 0)) return null;
  const rel = px.map((value) => value - x0);
  const centre = py.reduce((sum, value) => sum + value, 0) / n;
  const dev = py.map((value) => value - centre);

  const solve = (tau: number): Linear => {
    let se = 0;
    let see = 0;
    let sy = 0;
    let sye = 0;
    for (let i = 0; i < n; i++) {
      const e = Math.exp(-rel[i]! / tau);
      se += e;
      see += e * e;
      sy += dev[i]!;
      sye += dev[i]! * e;
    }
    const determinant = n * see - se * se;
    if (!(determinant > 1e-14 * n * see)) return { offset: sy / n, amplitude: 0, rss: Number.POSITIVE_INFINITY };
    const amplitude = (n * sye - se * sy) / determinant;
    const offset = (sy - amplitude * se) / n;
    let rss = 0;
    for (let i = 0; i < n; i++) rss += (dev[i]! - offset - amplitude * Math.exp(-rel[i]! / tau)) ** 2;
    return { offset, amplitude, rss };
  };

  const low = Math.log((span / (n - 1)) * 0.2);
  const high = Math.log(span * 20);
  const cells = 60;
  const at = (k: number): number => low + ((high - low) * k) / cells;
  let best = 0;
  let bestRss = Number.POSITIVE_INFINITY;
  for (let k = 0; k <= cells; k++) {
    const { rss } = solve(Math.exp(at(k)));
    if (rss < bestRss) {
      bestRss = rss;
      best = k;
    }
  }
  const logTau = goldenMinimum(
    (value) => solve(Math.exp(value)).rss,
    at(Math.max(0, best - 1)),
    at(Math.min(cells, best + 1)),
  );
  const tau = Math.exp(logTau);
  const { offset, amplitude, rss } = solve(tau);
  if (!Number.isFinite(rss)) return null;
  const variance = n > 3 ? rss / (n - 3) : 0;
  const errors = standardErrors(rel, tau, amplitude, variance);
  const atEdge = best === 0 || best === cells;
  return {
    offset: offset + centre,
    amplitude,
    tau,
    x0,
    se_offset: errors[0],
    se_amplitude: errors[1],
    se_tau: errors[2],
    residual_sd: Math.sqrt(variance),
    n,
    converged: !atEdge && amplitude !== 0 && Number.isFinite(errors[2]) && errors[2] < tau,
  };
}

/** Minimum of a function that has one minimum in the bracket, to about `tolerance` of its abscissa. */
export function goldenMinimum(f: (x: number) => number, from: number, to: number, tolerance = 1e-10): number {
  const ratio = (Math.sqrt(5) - 1) / 2;
  let a = from;
  let b = to;
  let c = b - ratio * (b - a);
  let d = a + ratio * (b - a);
  let fc = f(c);
  let fd = f(d);
  for (let i = 0; i < 100 && Math.abs(b - a) > tolerance * (Math.abs(a) + Math.abs(b) + 1e-300); i++) {
    if (fc <= fd) {
      b = d;
      d = c;
      fd = fc;
      c = b - ratio * (b - a);
      fc = f(c);
    } else {
      a = c;
      c = d;
      fc = fd;
      d = a + ratio * (b - a);
      fd = f(d);
    }
  }
  return (a + b) / 2;
}

/** Square roots of the diagonal of variance·(JᵀJ)⁻¹ for offset, amplitude, tau. */
function standardErrors(rel: number[], tau: number, amplitude: number, variance: number): [number, number, number] {
  let s01 = 0;
  let s02 = 0;
  let s11 = 0;
  let s12 = 0;
  let s22 = 0;
  for (const t of rel) {
    const e = Math.exp(-t / tau);
    const g = (amplitude * e * t) / (tau * tau);
    s01 += e;
    s02 += g;
    s11 += e * e;
    s12 += e * g;
    s22 += g * g;
  }
  const s00 = rel.length;
  const c00 = s11 * s22 - s12 * s12;
  const c11 = s00 * s22 - s02 * s02;
  const c22 = s00 * s11 - s01 * s01;
  const determinant = s00 * c00 - s01 * (s01 * s22 - s12 * s02) + s02 * (s01 * s12 - s11 * s02);
  const root = (cofactor: number): number =>
    determinant > 0 ? Math.sqrt(Math.max(0, (variance * cofactor) / determinant)) : Number.POSITIVE_INFINITY;
  return [root(c00), root(c11), root(c22)];
}
