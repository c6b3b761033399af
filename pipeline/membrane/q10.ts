import { requireCelsius, requireNonNegative, requirePositive } from './guards.ts';

/** Q10 of membrane times and rates as published: 2 to 3 (common practice; Hodgkin & Huxley 1952 use 3). */
export const q10Range = { low: 2, high: 3 } as const;

/** A published time or rate is not moved by more than this, K. */
export const largestShiftK = 15;

/**
 * Factor by which a rate grows from one temperature to another: Q10^((to − from)/10).
 * @param q10 growth per 10 K, above 0
 * @throws RangeError naming the argument
 */
export function q10Factor(q10: number, fromC: number, toC: number): number {
  requirePositive('q10', q10, '');
  return q10 ** ((requireCelsius('toC', toC) - requireCelsius('fromC', fromC)) / 10);
}

/**
 * A time moved to another temperature: t(T) = t₀·Q10^(−(T − T₀)/10).
 * @param valueMs time at fromC, ms, 0 or more
 * @returns time at toC, ms
 * @throws RangeError naming the argument
 */
export function atTemperature(valueMs: number, q10: number, fromC: number, toC: number): number {
  return requireNonNegative('valueMs', valueMs, ' ms') / q10Factor(q10, fromC, toC);
}

/**
 * A rate (Hz, V/s) moved to another temperature: r(T) = r₀·Q10^((T − T₀)/10).
 * @throws RangeError naming the argument
 */
export function rateAtTemperature(value: number, q10: number, fromC: number, toC: number): number {
  return requireNonNegative('value', value, '') * q10Factor(q10, fromC, toC);
}

export interface Range {
  low: number;
  high: number;
}

/**
 * A published range of times moved to another temperature and widened by the Q10's own range: the lowest and the
 * highest value that any Q10 of the range gives.
 * @param kind a time shortens with warmth, a rate grows
 * @returns null where the shift is more than 15 K: too far for one Q10 to hold
 * @throws RangeError naming the argument; also when low is above high
 */
export function rangeAtTemperature(
  kind: 'time' | 'rate',
  range: Range,
  fromC: number,
  toC: number,
  q10: Range = q10Range,
): Range | null {
  if (range.low > range.high)
    throw new RangeError(`range.low must not be above range.high, got ${range.low} > ${range.high}`);
  if (q10.low > q10.high) throw new RangeError(`q10.low must not be above q10.high, got ${q10.low} > ${q10.high}`);
  const move = kind === 'time' ? atTemperature : rateAtTemperature;
  const low = [move(range.low, q10.low, fromC, toC), move(range.low, q10.high, fromC, toC)];
  const high = [move(range.high, q10.low, fromC, toC), move(range.high, q10.high, fromC, toC)];
  if (Math.abs(toC - fromC) > largestShiftK) return null;
  return { low: Math.min(...low), high: Math.max(...high) };
}

/**
 * Q10 of a time measured at two temperatures: (t₁/t₂)^(10/(T₂ − T₁)).
 * @throws RangeError naming the argument; also for equal temperatures
 */
export function q10OfTimes(firstMs: number, firstC: number, secondMs: number, secondC: number): number {
  requirePositive('firstMs', firstMs, ' ms');
  requirePositive('secondMs', secondMs, ' ms');
  if (requireCelsius('firstC', firstC) === requireCelsius('secondC', secondC))
    throw new RangeError(`secondC must differ from firstC, got ${secondC} °C twice`);
  return (firstMs / secondMs) ** (10 / (secondC - firstC));
}
