import { zeroCelsiusK } from './constants.ts';
import { requireAmount, requireCelsius, requireNonNegative } from './guards.ts';

/** Ionic strength beyond which the Davies equation is not trusted and no longer followed, mol/L. */
const daviesLimitMolar = 0.5;

/**
 * Ionic strength ½·Σ z²·c, mol/L.
 * @param ions valence and concentration in mmol/L, 0 or more
 * @throws RangeError naming the concentration
 */
export function ionicStrengthMolar(ions: readonly { valence: number; millimolar: number }[]): number {
  return ions.reduce(
    (sum, ion, index) =>
      sum + (ion.valence * ion.valence * requireAmount(`ions[${index}].millimolar`, ion.millimolar)) / 2000,
    0,
  );
}

/**
 * What the Davies equation takes off log₁₀γ per squared charge: A·(√I/(1 + √I) − 0.3·I), so that log₁₀γ = −z²·this.
 * A of water by Alberty's fit (0.511 at 25 °C).
 * @param strengthMolar ionic strength, mol/L, 0 or more; above 0.5 the value at 0.5 is given
 * @param celsius temperature, °C, above absolute zero
 * @throws RangeError naming the argument
 * @see Davies 1962, Ion Association; A: Alberty 2003, Thermodynamics of Biochemical Reactions, eq. 3.6-2 (both from memory)
 */
export function daviesTerm(strengthMolar: number, celsius: number): number {
  const strength = Math.min(requireNonNegative('strengthMolar', strengthMolar, ' mol/L'), daviesLimitMolar);
  const kelvin = requireCelsius('celsius', celsius) + zeroCelsiusK;
  const slope = (1.10708 - 1.54508e-3 * kelvin + 5.95584e-6 * kelvin * kelvin) / Math.LN10;
  const root = Math.sqrt(strength);
  return slope * (root / (1 + root) - 0.3 * strength);
}

/**
 * Activity coefficient of a single ion by the Davies equation.
 * @throws RangeError as daviesTerm
 * @example activityCoefficient(1, 0.15, 25) // 0.76
 */
export const activityCoefficient = (valence: number, strengthMolar: number, celsius: number): number =>
  10 ** (-valence * valence * daviesTerm(strengthMolar, celsius));
