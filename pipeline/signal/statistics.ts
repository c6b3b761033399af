/** Order statistics and moments that leave unreadable samples (NaN) out. Empty input gives null, never NaN. */

type Numbers = ArrayLike<number>;

/** Finite values in ascending order, as a new array. */
export function sortedFinite(values: Numbers): Float64Array {
  return finite(values).sort();
}

/**
 * Quantile of values that are already sorted and finite, linear between order statistics (Hyndman & Fan 1996, type 7).
 * @param sorted ascending, without NaN. @param p from 0 to 1. @returns null for an empty list
 * @throws RangeError when p lies outside 0 to 1
 */
export function quantileSorted(sorted: Numbers, p: number): number | null {
  if (!(p >= 0 && p <= 1)) throw new RangeError(`p must lie between 0 and 1, got ${p}`);
  if (sorted.length === 0) return null;
  const position = (sorted.length - 1) * p;
  const below = Math.floor(position);
  const low = sorted[below]!;
  const high = sorted[Math.min(below + 1, sorted.length - 1)]!;
  return low + (high - low) * (position - below);
}

/** Finite values in their own order, as a new array. */
function finite(values: Numbers): Float64Array {
  const kept = new Float64Array(values.length);
  let count = 0;
  for (let i = 0; i < values.length; i++) {
    const value = values[i]!;
    if (Number.isFinite(value)) kept[count++] = value;
  }
  return kept.subarray(0, count);
}

/**
 * Reorders values so that the k-th smallest stands at index k, none larger before it and none smaller behind it
 * (Hoare 1961, Commun ACM 4:321–322; from memory).
 */
function select(values: Float64Array, k: number): void {
  let left = 0;
  let right = values.length - 1;
  while (left < right) {
    // Median of three as the pivot: sorted and constant stretches are common in recordings.
    const [a, b, c] = [values[left]!, values[(left + right) >> 1]!, values[right]!];
    const pivot = Math.max(Math.min(a, b), Math.min(Math.max(a, b), c));
    let i = left;
    let j = right;
    while (i <= j) {
      while (values[i]! < pivot) i++;
      while (values[j]! > pivot) j--;
      if (i > j) break;
      const held = values[i]!;
      values[i++] = values[j]!;
      values[j--] = held;
    }
    if (k <= j) right = j;
    else if (k >= i) left = i;
    else return;
  }
}

/** As `quantileSorted` of finite values in any order, which are reordered: selection takes a tenth of sorting's time. */
function quantileInPlace(values: Float64Array, p: number): number | null {
  if (!(p >= 0 && p <= 1)) throw new RangeError(`p must lie between 0 and 1, got ${p}`);
  if (values.length === 0) return null;
  const position = (values.length - 1) * p;
  const below = Math.floor(position);
  select(values, below);
  const low = values[below]!;
  if (position === below) return low;
  let high = values[below + 1]!;
  for (let i = below + 2; i < values.length; i++) if (values[i]! < high) high = values[i]!;
  return low + (high - low) * (position - below);
}

/** Quantile of the finite values (type 7). @returns null where there is none */
export const quantile = (values: Numbers, p: number): number | null => quantileInPlace(finite(values), p);

/** Median of the finite values. @returns null where there is none */
export const median = (values: Numbers): number | null => quantile(values, 0.5);

/** Arithmetic mean of the finite values. @returns null where there is none */
export const mean = (values: Numbers): number | null => meanWithin(values, 0, values.length);

/** Arithmetic mean of the finite values of an index range `[from, to)`. @returns null where there is none */
export function meanWithin(values: Numbers, from: number, to: number): number | null {
  let sum = 0;
  let count = 0;
  for (let i = from; i < to; i++) {
    const value = values[i]!;
    if (Number.isFinite(value)) {
      sum += value;
      count++;
    }
  }
  return count > 0 ? sum / count : null;
}

/** Sample standard deviation (n − 1) of the finite values, two passes. @returns null for fewer than two */
export function standardDeviation(values: Numbers): number | null {
  const centre = mean(values);
  if (centre === null) return null;
  let sum = 0;
  let count = 0;
  for (let i = 0; i < values.length; i++) {
    const value = values[i]!;
    if (Number.isFinite(value)) {
      sum += (value - centre) ** 2;
      count++;
    }
  }
  return count > 1 ? Math.sqrt(sum / (count - 1)) : null;
}

/** 1/Φ⁻¹(3/4): turns a median absolute deviation into the standard deviation of a normal distribution. */
export const madToSd = 1.482602218505602;

/**
 * Standard deviation estimated from the median absolute deviation; up to half the values may be outliers.
 * @returns null where there is no finite value. @see Hampel 1974, J Am Stat Assoc 69:383–393 (from memory)
 */
export function robustSpread(values: Numbers): number | null {
  const kept = finite(values);
  const centre = quantileInPlace(kept, 0.5);
  if (centre === null) return null;
  for (let i = 0; i < kept.length; i++) kept[i] = Math.abs(kept[i]! - centre);
  return madToSd * quantileInPlace(kept, 0.5)!;
}

/** Finite values, counted. */
export function countFinite(values: Numbers): number {
  let count = 0;
  for (let i = 0; i < values.length; i++) if (Number.isFinite(values[i]!)) count++;
  return count;
}
