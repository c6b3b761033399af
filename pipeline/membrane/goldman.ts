import { requireAmount, requireNonNegative } from './guards.ts';
import { thermalVoltageMv } from './nernst.ts';

export interface PermeantIon {
  /** Monovalent ions only: the equation has no closed form for others. */
  valence: 1 | -1;
  /** Relative permeability, 0 or more; only ratios matter. */
  permeability: number;
  /** Free concentrations, mmol/L, 0 or more. */
  insideMm: number;
  outsideMm: number;
}

/**
 * Potential (mV, inside minus outside) at which monovalent ions carry no net current through a membrane with a
 * constant field: (RT/F)·ln[(Σ P⁺·out + Σ P⁻·in)/(Σ P⁺·in + Σ P⁻·out)].
 * @param ions any number of monovalent ions
 * @param celsius temperature, °C, above absolute zero
 * @throws RangeError naming the ion and argument; also when nothing can cross in one direction
 * @see Goldman 1943, J Gen Physiol 27:37–60; Hodgkin & Katz 1949, J Physiol 108:37–77 (from memory)
 */
export function goldmanPotential(ions: readonly PermeantIon[], celsius: number): number {
  let outward = 0;
  let inward = 0;
  ions.forEach((ion, index) => {
    if (ion.valence !== 1 && ion.valence !== -1)
      throw new RangeError(`ions[${index}].valence must be 1 or -1, got ${ion.valence}`);
    const permeability = requireNonNegative(`ions[${index}].permeability`, ion.permeability, '');
    const inside = permeability * requireAmount(`ions[${index}].insideMm`, ion.insideMm);
    const outside = permeability * requireAmount(`ions[${index}].outsideMm`, ion.outsideMm);
    outward += ion.valence === 1 ? inside : outside;
    inward += ion.valence === 1 ? outside : inside;
  });
  if (outward <= 0 || inward <= 0)
    throw new RangeError(
      `ions must hold a permeant ion on both sides, got Σ P·c of ${inward} against ${outward} mmol/L: the potential has no bound`,
    );
  return thermalVoltageMv(celsius) * Math.log(inward / outward);
}
