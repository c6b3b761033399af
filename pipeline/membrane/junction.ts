import { requireAmount, requirePositive, requireValence } from './guards.ts';
import { mobilityOf } from './mobilities.ts';
import { thermalVoltageMv } from './nernst.ts';

/** One ion of a solution. */
export interface DissolvedIon {
  ion: string;
  valence: number;
  millimolar: number;
  /** 95 % half-width, mmol/L. */
  uncertainty_mm: number;
}

export interface JunctionIon {
  valence: number;
  /** On any scale common to all ions of the junction. */
  mobility: number;
  pipetteMm: number;
  bathMm: number;
}

/**
 * Liquid junction potential (mV, bath minus pipette) by the stationary generalized Henderson equation:
 * (RT/F)·[Σ z·u·(aᴮ − aᴾ)]/[Σ z²·u·(aᴮ − aᴾ)]·ln(Σ z²·u·aᴾ/Σ z²·u·aᴮ), concentrations for activities.
 * Written with log1p(x)/x so that two sides of equal conductance (0/0 above) need no case of their own.
 * @throws RangeError naming the argument; also when one side conducts nothing
 * @see Barry & Lynch 1991, J Membr Biol 121:101–117; Barry & Diamond 1970, J Membr Biol 3:93–122 (from memory)
 */
export function hendersonPotential(ions: readonly JunctionIon[], celsius: number): number {
  let drive = 0;
  let pipetteConductance = 0;
  let bathConductance = 0;
  ions.forEach((ion, index) => {
    const valence = requireValence(`ions[${index}].valence`, ion.valence);
    const mobility = requirePositive(`ions[${index}].mobility`, ion.mobility, '');
    const pipette = requireAmount(`ions[${index}].pipetteMm`, ion.pipetteMm);
    const bath = requireAmount(`ions[${index}].bathMm`, ion.bathMm);
    drive += valence * mobility * (bath - pipette);
    pipetteConductance += valence * valence * mobility * pipette;
    bathConductance += valence * valence * mobility * bath;
  });
  for (const [name, conductance] of [
    ['pipette', pipetteConductance],
    ['bath', bathConductance],
  ] as const)
    if (conductance <= 0)
      throw new RangeError(
        `${name} must hold at least one ion above 0 mmol/L, got none: a junction needs ions on both sides`,
      );
  const excess = pipetteConductance / bathConductance - 1;
  const slope = excess === 0 ? 1 : Math.log1p(excess) / excess;
  // `+ 0` turns the -0 of equal solutions into 0.
  return -thermalVoltageMv(celsius) * (drive / bathConductance) * slope + 0;
}

/**
 * What remains of a computed junction potential's error when every ion has a tabulated mobility: concentrations for
 * activities, a reference electrode that is not ideal. Published values for the same pair of solutions differ by as
 * much. Common practice, no source.
 */
export const computedJunctionUncertaintyMv = 3.5;

/**
 * Liquid junction potential between a pipette and a bath, so that V_membrane = V_recorded − mv.
 * @param pipette ions of the pipette solution, as `dissolve` gives them
 * @param bath ions of the bath the pipette was zeroed in
 * @param celsius temperature, °C, above absolute zero
 * @returns mv bath minus pipette; uncertainty_mv 95 % half-width, never below 3.5 mV, wider where mobilities are
 * assumed or amounts uncertain; notes in words
 * @throws RangeError when a side holds no ions or an argument is impossible
 */
export function junctionPotential(
  pipette: readonly DissolvedIon[],
  bath: readonly DissolvedIon[],
  celsius: number,
): { mv: number; uncertainty_mv: number; notes: string[] } {
  interface Side extends JunctionIon {
    ion: string;
    pipetteUncertainty: number;
    bathUncertainty: number;
  }
  const sides = new Map<string, Side>();
  const add = (where: 'pipette' | 'bath', given: readonly DissolvedIon[]): void =>
    given.forEach((one, index) => {
      requireValence(`${where}[${index}].valence`, one.valence);
      requireAmount(`${where}[${index}].millimolar`, one.millimolar);
      const key = `${one.ion} ${one.valence}`;
      const side = sides.get(key) ?? {
        ion: one.ion,
        valence: one.valence,
        mobility: mobilityOf(one.ion, one.valence).relative,
        pipetteMm: 0,
        bathMm: 0,
        pipetteUncertainty: 0,
        bathUncertainty: 0,
      };
      sides.set(key, side);
      if (where === 'pipette') {
        side.pipetteMm += one.millimolar;
        side.pipetteUncertainty += one.uncertainty_mm;
      } else {
        side.bathMm += one.millimolar;
        side.bathUncertainty += one.uncertainty_mm;
      }
    });
  add('pipette', pipette);
  add('bath', bath);
  const ions = [...sides.values()];
  const mv = hendersonPotential(ions, celsius);
  const shifted = (index: number, change: Partial<JunctionIon>): number =>
    hendersonPotential(
      ions.map((ion, at) => (at === index ? { ...ion, ...change } : ion)),
      celsius,
    ) - mv;
  const shifts: number[] = [];
  const notes: string[] = [];
  ions.forEach((ion, index) => {
    const mobility = mobilityOf(ion.ion, ion.valence);
    // Weighing errors and tabulated mobilities are inside the 3.5 mV; what goes beyond them is added.
    if (mobility.assumed) {
      const shift = shifted(index, { mobility: ion.mobility * (1 + mobility.uncertainty) });
      shifts.push(shift);
      if (Math.abs(shift) >= 0.1)
        notes.push(
          `The mobility of ${ion.ion} is ${mobility.source} (${mobility.relative.toFixed(2)} of potassium's): ±${Math.abs(shift).toFixed(1)} mV.`,
        );
    }
    if (ion.pipetteUncertainty > 0.05 * ion.pipetteMm)
      shifts.push(shifted(index, { pipetteMm: ion.pipetteMm + ion.pipetteUncertainty }));
    if (ion.bathUncertainty > 0.05 * ion.bathMm)
      shifts.push(shifted(index, { bathMm: ion.bathMm + ion.bathUncertainty }));
  });
  return { mv, uncertainty_mv: Math.hypot(computedJunctionUncertaintyMv, ...shifts), notes };
}
