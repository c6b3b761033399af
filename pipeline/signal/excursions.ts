/** Peaks and how far they stand out. */

/**
 * Local maxima: samples higher than what comes just before and just after. A level top of equal samples counts once,
 * at its middle (the lower one of two). The first and last sample are none. As SciPy's `find_peaks` without conditions.
 */
export function localMaxima(samples: Float64Array): number[] {
  const found: number[] = [];
  let i = 1;
  while (i < samples.length - 1) {
    if (samples[i - 1]! < samples[i]!) {
      let ahead = i + 1;
      while (ahead < samples.length - 1 && samples[ahead] === samples[i]) ahead++;
      if (samples[ahead]! < samples[i]!) {
        found.push(Math.floor((i + ahead - 1) / 2));
        i = ahead;
      }
    }
    i++;
  }
  return found;
}

/**
 * Prominence of a peak: its height above the higher of the two lowest points between it and the next higher ground
 * (or the end of the trace) on either side. As SciPy's `peak_prominences`. Unreadable samples end the search.
 */
export function prominence(samples: Float64Array, peak: number): number {
  const top = samples[peak]!;
  let left = top;
  for (let i = peak; i >= 0 && samples[i]! <= top; i--) if (samples[i]! < left) left = samples[i]!;
  let right = top;
  for (let i = peak; i < samples.length && samples[i]! <= top; i++) if (samples[i]! < right) right = samples[i]!;
  return top - Math.max(left, right);
}

export interface Excursion {
  /** Index of the lowest point before the rise, of the highest point, and of the last sample that belongs to it. */
  base: number;
  peak: number;
  end: number;
  /** Height of the peak above the base. */
  rise: number;
  /** Whether the trace fell far enough after the peak, or the samples ended first. */
  fell: boolean;
}

/**
 * Upward excursions: each rises by at least `least` from the lowest point since the one before, and ends when the
 * trace has fallen from its highest point by the amount that `fallFor` asks of its rise. Wiggles smaller than that
 * are part of it, so noise on a plateau makes no excursion of its own. One pass.
 * @param samples without NaN, any unit. @param least above 0
 */
export function excursions(samples: Float64Array, least: number, fallFor: (rise: number) => number): Excursion[] {
  if (!(least > 0)) throw new RangeError(`least must be above 0, got ${least}`);
  const found: Excursion[] = [];
  const n = samples.length;
  if (n === 0) return found;
  let base = 0;
  let peak = -1;
  for (let i = 0; i < n; i++) {
    const value = samples[i]!;
    if (peak < 0) {
      if (value < samples[base]!) base = i;
      else if (value - samples[base]! >= least) peak = i;
      continue;
    }
    if (value > samples[peak]!) peak = i;
    const rise = samples[peak]! - samples[base]!;
    if (samples[peak]! - value >= fallFor(rise)) {
      found.push({ base, peak, end: i, rise, fell: true });
      base = i;
      peak = -1;
    }
  }
  if (peak >= 0) found.push({ base, peak, end: n - 1, rise: samples[peak]! - samples[base]!, fell: false });
  return found;
}
