/**
 * Limits of an individuals control chart: mean ± 2.66 × the mean moving range (3 standard deviations estimated from
 * the moving range of two, d2 = 1.128). Source: NIST/SEMATECH e-Handbook of Statistical Methods, section 6.3.2.2.
 */
export interface ControlLimits {
  centre: number;
  low: number;
  high: number;
  n: number;
}

/** Constant d2 for ranges of two observations, as the handbook's table has it. */
const d2 = 1.128;

/** The fewest points from which limits are drawn: fewer say more about chance than about the rig. */
export const fewestForLimits = 20;

/**
 * @param values in order of time
 * @returns null for fewer than two values
 */
export function individualsLimits(values: readonly number[]): ControlLimits | null {
  if (values.length < 2) return null;
  const centre = values.reduce((sum, value) => sum + value, 0) / values.length;
  let range = 0;
  for (let i = 1; i < values.length; i++) range += Math.abs(values[i]! - values[i - 1]!);
  const spread = (3 * (range / (values.length - 1))) / d2;
  return { centre, low: centre - spread, high: centre + spread, n: values.length };
}
