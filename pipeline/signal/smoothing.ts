/** Running mean and running median. Windows shrink at the ends; unreadable samples are left out of their window. */
import { quantileSorted, sortedFinite } from './statistics.ts';

function requireHalfWidth(halfWidth: number): void {
  if (!(Number.isInteger(halfWidth) && halfWidth >= 0))
    throw new RangeError(`halfWidth must be a whole number of samples from 0 on, got ${halfWidth}`);
}

/**
 * Mean of the `2·halfWidth + 1` samples around each one. The window shrinks symmetrically at the ends, so that a
 * straight line stays a straight line. A window without a finite sample gives NaN.
 */
export function movingAverage(samples: Float64Array, halfWidth: number): Float64Array {
  requireHalfWidth(halfWidth);
  const n = samples.length;
  if (halfWidth === 0) return samples.slice();
  // Sums relative to one sample keep the rounding of the running total small for signals far from zero.
  let offset = 0;
  for (let i = 0; i < n; i++)
    if (Number.isFinite(samples[i]!)) {
      offset = samples[i]!;
      break;
    }
  const total = new Float64Array(n + 1);
  const count = new Uint32Array(n + 1);
  for (let i = 0; i < n; i++) {
    const finite = Number.isFinite(samples[i]!);
    total[i + 1] = total[i]! + (finite ? samples[i]! - offset : 0);
    count[i + 1] = count[i]! + (finite ? 1 : 0);
  }
  return Float64Array.from({ length: n }, (_, i) => {
    const reach = Math.min(halfWidth, i, n - 1 - i);
    const held = count[i + reach + 1]! - count[i - reach]!;
    return held > 0 ? offset + (total[i + reach + 1]! - total[i - reach]!) / held : Number.NaN;
  });
}

/** Median of the `2·halfWidth + 1` samples around each one, window shrinking symmetrically at the ends. */
export function runningMedian(samples: Float64Array, halfWidth: number): Float64Array {
  requireHalfWidth(halfWidth);
  const n = samples.length;
  return Float64Array.from({ length: n }, (_, i) => {
    const reach = Math.min(halfWidth, i, n - 1 - i);
    return quantileSorted(sortedFinite(samples.subarray(i - reach, i + reach + 1)), 0.5) ?? Number.NaN;
  });
}
