import { requireCelsius, requireNonNegative } from './guards.ts';
import { nernstWithUncertainty } from './nernst.ts';
import type { Dissolved } from './solutions.ts';

export interface Equilibrium {
  mv: number;
  /** 95 % half-width from concentrations and temperature, mV. */
  uncertainty_mv: number;
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
 * Equilibrium potentials of a dialysed cell: the pipette solution inside, the bath outside.
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
  const { pipette, bath } = given;
  requireCelsius('celsius', given.celsius);
  requireNonNegative('celsiusUncertainty', given.celsiusUncertainty, ' K');
  const of = (ion: string): Equilibrium | null => {
    const inside = pipette.ions.find((one) => one.ion === ion);
    const outside = bath.ions.find((one) => one.ion === ion);
    if (!inside || !outside || inside.millimolar <= 0 || outside.millimolar <= 0) return null;
    const result = nernstWithUncertainty({
      valence: inside.valence,
      outsideMm: outside.millimolar,
      insideMm: inside.millimolar,
      celsius: given.celsius,
      outsideRelative: outside.uncertainty_mm / outside.millimolar,
      insideRelative: inside.uncertainty_mm / inside.millimolar,
      celsiusUncertainty: given.celsiusUncertainty,
    });
    return { ...result, inside_mm: inside.millimolar, outside_mm: outside.millimolar };
  };
  return { e_na: of('Na'), e_k: of('K'), e_cl: of('Cl'), e_ca: of('Ca') };
}
