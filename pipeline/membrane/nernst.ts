import { faradayCPerMol, gasConstantJPerMolK, zeroCelsiusK } from './constants.ts';
import { requireCelsius, requireConcentration, requireValence } from './guards.ts';

/**
 * Thermal voltage RT/F, mV.
 * @param celsius temperature, °C, above absolute zero
 * @throws RangeError naming the argument
 * @example thermalVoltageMv(37) // 26.7267
 */
export function thermalVoltageMv(celsius: number): number {
  requireCelsius('celsius', celsius);
  return (1000 * gasConstantJPerMolK * (celsius + zeroCelsiusK)) / faradayCPerMol;
}

/**
 * Potential (mV, inside minus outside) at which one ion has no net drive: (RT/zF)·ln(outside/inside).
 * @param valence signed charge number, not 0
 * @param outsideMm free concentration outside, mmol/L, above 0
 * @param insideMm likewise inside
 * @param celsius temperature, °C, above absolute zero
 * @throws RangeError naming the argument, the value given and the allowed range
 * @see Nernst 1888, Z Phys Chem 2:613–637 (from memory); R and F are exact in the 2019 SI
 * @example nernstPotential(1, 4, 155, 37) // -97.74
 */
export function nernstPotential(valence: number, outsideMm: number, insideMm: number, celsius: number): number {
  requireValence('valence', valence);
  requireConcentration('outsideMm', outsideMm);
  requireConcentration('insideMm', insideMm);
  // `+ 0` turns the -0 of equal sides into 0.
  return (thermalVoltageMv(celsius) / valence) * Math.log(outsideMm / insideMm) + 0;
}

/**
 * Half-width of ln c for a relative half-width of c, taken on the wider side and never beyond a factor of ten: the
 * logarithm of a concentration known to ±100 % has no lower end.
 */
export const logHalfWidth = (relative: number): number => -Math.log(1 - Math.min(relative, 0.9));
