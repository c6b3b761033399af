/** Rate of change of a regularly sampled potential. */

export function requireRate(rateHz: number): number {
  if (!(rateHz > 0 && Number.isFinite(rateHz)))
    throw new RangeError(`rateHz must be a finite rate above 0 Hz, got ${rateHz}`);
  return rateHz;
}

/**
 * dV/dt in V/s: central difference over two sample intervals, one-sided at the ends (as NumPy's `gradient`).
 * A sample next to NaN has NaN. One sample has no slope: NaN.
 * @param mv potential, mV. @param rateHz sampling rate, Hz, above 0
 * @throws RangeError naming a rate that is none
 */
export function derivativeVPerS(mv: Float64Array, rateHz: number): Float64Array {
  const perMs = requireRate(rateHz) / 1000;
  const n = mv.length;
  const out = new Float64Array(n).fill(Number.NaN);
  if (n < 2) return out;
  out[0] = (mv[1]! - mv[0]!) * perMs;
  out[n - 1] = (mv[n - 1]! - mv[n - 2]!) * perMs;
  for (let i = 1; i < n - 1; i++) out[i] = (mv[i + 1]! - mv[i - 1]!) * 0.5 * perMs;
  return out;
}

/**
 * dV/dt in V/s as the slope of the least-squares line through the `2·halfWidth + 1` samples around each one
 * (Savitzky & Golay 1964, first order). A half-width of 1 is the central difference. Windows shrink towards the ends;
 * a window with NaN in it gives NaN.
 * @param mv potential, mV. @param rateHz sampling rate, Hz. @param halfWidth samples on each side, 1 or more
 */
export function slopeVPerS(mv: Float64Array, rateHz: number, halfWidth: number): Float64Array {
  if (!(Number.isInteger(halfWidth) && halfWidth >= 1))
    throw new RangeError(`halfWidth must be a whole number of samples from 1 on, got ${halfWidth}`);
  const plain = derivativeVPerS(mv, rateHz);
  if (halfWidth === 1) return plain;
  const perMs = rateHz / 1000;
  const n = mv.length;
  const m = halfWidth;
  if (n < 2 * m + 1) return n >= 3 ? slopeVPerS(mv, rateHz, Math.max(1, Math.floor((n - 1) / 2))) : plain;
  const out = new Float64Array(n).fill(Number.NaN);
  const weight = (k: number): number => 3 / (k * (k + 1) * (2 * k + 1));
  // Moment M = Σ k·v[i+k] and sum S over the window; one step on, M' = M − S + (m+1)·leaving + m·entering.
  // Both are summed afresh now and then, and after NaN, so that rounding does not build up.
  let moment = Number.NaN;
  let sum = Number.NaN;
  // Σ k is 0, so a level taken off changes no slope; it keeps rounding small for samples far from zero.
  let level = 0;
  for (let i = m; i < n - m; i++) {
    if (Number.isFinite(moment) && (i & 1023) !== 0) {
      const leaving = mv[i - 1 - m]! - level;
      const entering = mv[i + m]! - level;
      moment += m * entering + (m + 1) * leaving - sum;
      sum += entering - leaving;
    } else {
      moment = 0;
      sum = 0;
      level = mv[i]!;
      for (let k = -m; k <= m; k++) {
        moment += k * (mv[i + k]! - level);
        sum += mv[i + k]! - level;
      }
    }
    out[i] = moment * weight(m) * perMs;
  }
  for (let i = 0; i < m; i++) {
    out[i] = i === 0 ? plain[0]! : windowSlope(mv, i, i) * perMs;
    const j = n - 1 - i;
    out[j] = i === 0 ? plain[n - 1]! : windowSlope(mv, j, i) * perMs;
  }
  return out;
}

function windowSlope(mv: Float64Array, at: number, m: number): number {
  let moment = 0;
  for (let k = -m; k <= m; k++) moment += k * (mv[at + k]! - mv[at]!);
  return (moment * 3) / (m * (m + 1) * (2 * m + 1));
}
