/** Least-squares parabolas over a few samples: smooth values, tops and crossings where noise hides them from a glance. */

export interface Parabola {
  /** Sample index that x is counted from, and half the window: x runs from −half to half. */
  centre: number;
  half: number;
  /** y = c0 + c1·x + c2·x². */
  c0: number;
  c1: number;
  c2: number;
  /** Variance of the residuals, 2·half − 2 degrees of freedom; 0 for three samples. */
  variance: number;
  /** How many times over neighbouring residuals repeat each other: 1 for white noise. */
  repeats: number;
  /** Standard error of c0, and of c1 per sample, from the residuals. */
  seLevel: number;
  seSlope: number;
}

/**
 * Parabola through the 2·half + 1 samples around one (Savitzky & Golay 1964, Anal Chem 36:1627–1639, second order).
 * @returns null where the window leaves the trace or meets an unreadable sample
 */
export function parabolaAround(samples: Float64Array, centre: number, half: number): Parabola | null {
  if (half < 1 || centre - half < 0 || centre + half >= samples.length) return null;
  const n = 2 * half + 1;
  const base = samples[centre]!;
  let s0 = 0;
  let s1 = 0;
  let s2 = 0;
  for (let x = -half; x <= half; x++) {
    const y = samples[centre + x]! - base;
    s0 += y;
    s1 += x * y;
    s2 += x * x * y;
  }
  if (!Number.isFinite(s0)) return null;
  const m2 = (half * (half + 1) * n) / 3;
  const m4 = (m2 * (3 * half * half + 3 * half - 1)) / 5;
  const determinant = n * m4 - m2 * m2;
  const level = (m4 * s0 - m2 * s2) / determinant;
  const c1 = s1 / m2;
  const c2 = (n * s2 - m2 * s0) / determinant;
  let squares = 0;
  let products = 0;
  let before = 0;
  for (let x = -half; x <= half; x++) {
    const left = samples[centre + x]! - base - level - x * (c1 + x * c2);
    squares += left * left;
    products += left * before;
    before = left;
  }
  const variance = n > 3 ? squares / (n - 3) : 0;
  // A fit of three terms makes white residuals look opposed to their neighbours, by about 3 in n.
  const likeness = squares > 0 && n > 7 ? Math.max(0, Math.min(0.95, products / squares + 3 / n)) : 0;
  const repeats = (1 + likeness) / (1 - likeness);
  return {
    centre,
    half,
    c0: base + level,
    c1,
    c2,
    variance,
    repeats,
    seLevel: Math.sqrt((variance * repeats * m4) / determinant),
    seSlope: Math.sqrt((variance * repeats) / m2),
  };
}

const halves = [1, 2, 3, 4, 5, 7, 10, 14, 20, 28, 40, 56, 80, 113, 160, 226, 320, 453, 640, 905, 1280];

/**
 * The widest parabola around a sample whose residuals are no larger than noise of a known SD explains: by more than
 * three standard errors of a variance, bends of the signal itself are showing. At least `least` samples on each side.
 */
export function widestParabola(
  samples: Float64Array,
  centre: number,
  noise: number,
  most: number,
  least = 1,
): Parabola | null {
  let kept = parabolaAround(samples, centre, least);
  for (const half of halves) {
    if (half <= least) continue;
    if (half > most) break;
    const wider = parabolaAround(samples, centre, half);
    if (!wider) break;
    const slack = 1 + 3 * Math.sqrt((2 * wider.repeats) / (2 * half - 2));
    // A stray sample may spoil a narrow window and not a wider one.
    if (wider.variance <= noise * noise * slack) kept = wider;
  }
  return kept;
}

/** Index, from the start of the trace, and value of the vertex; null where it lies outside the window. */
export function vertexOf(fit: Parabola): { position: number; value: number } | null {
  if (fit.c2 === 0) return null;
  const x = -fit.c1 / (2 * fit.c2);
  if (!(Math.abs(x) <= fit.half)) return null;
  return { position: fit.centre + x, value: fit.c0 + (fit.c1 * x) / 2 };
}

/** Index at which the parabola is at a level, the one nearest the middle of its window; null outside the window. */
export function levelOf(fit: Parabola, level: number): number | null {
  const { c0, c1, c2, half, centre } = fit;
  const c = c0 - level;
  const root = c1 * c1 - 4 * c2 * c;
  if (root < 0) return null;
  // The nearer root, without the cancellation of the school formula.
  const q = c1 + (c1 < 0 ? -1 : 1) * Math.sqrt(root);
  const x = q === 0 ? 0 : (-2 * c) / q;
  return Math.abs(x) <= half ? centre + x : null;
}
