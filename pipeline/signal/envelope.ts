export interface ColumnEnvelope {
  /** Lowest and highest readable sample of each column; NaN where a column has none. */
  low: Float64Array;
  high: Float64Array;
}

/**
 * Lowest and highest sample in each of `columns` equal stretches: what a drawing that wide can show, with nothing
 * narrow lost. Column k holds the samples from ⌊k·n/columns⌋ to before ⌊(k+1)·n/columns⌋; fewer samples than
 * columns give one column a sample.
 * @throws RangeError where columns is not a whole number above 0
 */
export function envelope(samples: Float64Array, columns: number): ColumnEnvelope {
  if (!(Number.isInteger(columns) && columns >= 1))
    throw new RangeError(`columns must be a whole number from 1 on, got ${columns}`);
  const n = samples.length;
  const width = Math.min(columns, n);
  const low = new Float64Array(width).fill(Number.NaN);
  const high = new Float64Array(width).fill(Number.NaN);
  for (let column = 0; column < width; column++) {
    const to = Math.floor(((column + 1) * n) / width);
    let least = Number.POSITIVE_INFINITY;
    let most = Number.NEGATIVE_INFINITY;
    for (let i = Math.floor((column * n) / width); i < to; i++) {
      const value = samples[i]!;
      if (value < least) least = value;
      if (value > most) most = value;
    }
    if (least <= most) {
      low[column] = least;
      high[column] = most;
    }
  }
  return { low, high };
}
