import { activityCoefficient } from './activity.ts';
import { zeroCelsiusK } from './constants.ts';
import { requireCelsius, requireNonNegative } from './guards.ts';
import { sortedParts, type UncertaintyPart } from './junction.ts';
import { logHalfWidth, nernstPotential, thermalVoltageMv } from './nernst.ts';
import type { Dissolved } from './solutions.ts';

export interface Equilibrium {
  mv: number;
  /** 95 % half-width, mV. */
  uncertainty_mv: number;
  /** Parts of it that are 0.05 mV or more, largest first; in quadrature. */
  parts: UncertaintyPart[];
  valence: number;
  inside_mm: number;
  outside_mm: number;
}

export interface Equilibria {
  e_na: Equilibrium | null;
  e_k: Equilibrium | null;
  e_cl: Equilibrium | null;
  e_ca: Equilibrium | null;
}

/**
 * Equilibrium potentials of a dialysed cell: the pipette solution inside, the bath outside, with concentrations. Parts of
 * the half-width: each variant of either solution (what it does to ln c, on the wider side), the temperature, and
 * activities (Davies) in the place of concentrations.
 * @param given dissolved solutions, temperature in °C and its 95 % half-width in K
 * @returns mV with 95 % half-widths; null for an ion that one side does not hold
 * @throws RangeError naming an impossible temperature
 */
export function equilibria(given: {
  pipette: Dissolved;
  bath: Dissolved;
  celsius: number;
  celsiusUncertainty: number;
}): Equilibria {
  const { pipette, bath, celsius } = given;
  requireCelsius('celsius', celsius);
  requireNonNegative('celsiusUncertainty', given.celsiusUncertainty, ' K');
  const amountIn = (ions: readonly { ion: string; millimolar: number }[], ion: string): number =>
    ions.find((one) => one.ion === ion)?.millimolar ?? 0;
  const of = (ion: string): Equilibrium | null => {
    const inside = pipette.ions.find((one) => one.ion === ion);
    const outside = bath.ions.find((one) => one.ion === ion);
    if (!inside || !outside || inside.millimolar <= 0 || outside.millimolar <= 0) return null;
    const { valence } = inside;
    const mv = nernstPotential(valence, outside.millimolar, inside.millimolar, celsius);
    const perLog = thermalVoltageMv(celsius) / Math.abs(valence);
    const coefficient = (side: Dissolved): number => activityCoefficient(valence, side.strength, celsius);
    const found: UncertaintyPart[] = [
      { cause: 'temperature', mv: (mv / (celsius + zeroCelsiusK)) * given.celsiusUncertainty },
      { cause: 'concentrations for activities', mv: perLog * Math.log(coefficient(bath) / coefficient(pipette)) },
    ];
    for (const [where, side, amount] of [
      ['pipette', pipette, inside.millimolar],
      ['bath', bath, outside.millimolar],
    ] as const)
      for (const { cause, ions } of side.variants) {
        const share = Math.abs(amountIn(ions, ion) - amount) / amount;
        found.push({ cause: `${where}: ${cause}`, mv: perLog * logHalfWidth(share) });
      }
    const parts = sortedParts(found);
    return {
      mv,
      uncertainty_mv: Math.hypot(...parts.map((part) => part.mv)),
      parts,
      valence,
      inside_mm: inside.millimolar,
      outside_mm: outside.millimolar,
    };
  };
  return { e_na: of('Na'), e_k: of('K'), e_cl: of('Cl'), e_ca: of('Ca') };
}
