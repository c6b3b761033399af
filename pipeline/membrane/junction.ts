import { daviesTerm, ionicStrengthMolar } from './activity.ts';
import { zeroCelsiusK } from './constants.ts';
import { requireAmount, requireNonNegative, requirePositive, requireValence } from './guards.ts';
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

/** The ions as they would be if one thing about the recipe were off by its 95 % half-width. */
export interface Variant {
  /** What is off: 'amount of KCl', 'pH'. Variants of one cause are its two directions. */
  cause: string;
  ions: readonly { ion: string; valence: number; millimolar: number }[];
}

/** A solution on one side; without variants its amounts are taken as exact. */
export interface JunctionSide {
  ions: readonly DissolvedIon[];
  variants?: readonly Variant[];
}

/** What one cause moves a potential by, mV: a part of its 95 % half-width. */
export interface UncertaintyPart {
  cause: string;
  mv: number;
}

/** One ion's place in the sums of the equation, so that they can be done by hand. */
export interface JunctionTerm {
  ion: string;
  valence: number;
  pipette_mm: number;
  bath_mm: number;
  /** Relative to potassium. */
  mobility: number;
  /** 95 % half-width of the mobility, as a share. */
  mobility_uncertainty: number;
  mobility_source: string;
  /** What that half-width moves the junction potential by, mV. */
  mobility_mv: number;
}

export interface Junction {
  /** Bath minus pipette, mV: V_membrane = V_recorded − mv. */
  mv: number;
  /** 95 % half-width, mV. */
  uncertainty_mv: number;
  /** Parts of it that are 0.05 mV or more, largest first; in quadrature, and never less than 3.5 mV. */
  parts: UncertaintyPart[];
  /** Ions in the order of their weight z²·u·(c_pipette + c_bath). */
  terms: JunctionTerm[];
  notes: string[];
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
 * Henderson's equation against measured junctions, 95 % half-width: 2.45 (Student's t, six degrees of freedom) times
 * 1.19 mV, the root mean square of measured minus calculated for the six junctions of 0.1 M chlorides of MacInnes 1939
 * (as in Bard & Faulkner, from memory). With activities, freshly cut salt bridges and dilutions of one salt the equation
 * has been met within 0.1 mV (Barry, Lewis & Moorhouse 2013, Eur Biophys J 42:631; found): this is the outer end.
 */
export const hendersonErrorMv = 2.9;

/**
 * No computed junction potential is taken to be known better than this, mV. Published values for K-gluconate pipettes lie
 * up to 3.2 mV below what the equation gives with tabulated mobilities (eLife preoptic neurons; Surmeli et al. 2015;
 * Astori et al. 2010): the half-width must hold them.
 */
export const computedJunctionUncertaintyMv = 3.5;

/** Half-width (95 %) taken for a stated bath temperature, K; common practice, no source. */
export const usualCelsiusUncertainty = 1;

interface Sum extends JunctionIon {
  ion: string;
}

/** Both solutions as one list, an ion listed twice added up. */
function together(
  pipette: readonly { ion: string; valence: number; millimolar: number }[],
  bath: readonly { ion: string; valence: number; millimolar: number }[],
): Sum[] {
  const sums = new Map<string, Sum>();
  for (const [where, given] of [
    ['pipette', pipette],
    ['bath', bath],
  ] as const)
    given.forEach((one, index) => {
      requireValence(`${where}[${index}].valence`, one.valence);
      requireAmount(`${where}[${index}].millimolar`, one.millimolar);
      const key = `${one.ion} ${one.valence}`;
      const sum = sums.get(key) ?? {
        ion: one.ion,
        valence: one.valence,
        mobility: mobilityOf(one.ion, one.valence).relative,
        pipetteMm: 0,
        bathMm: 0,
      };
      sums.set(key, sum);
      if (where === 'pipette') sum.pipetteMm += one.millimolar;
      else sum.bathMm += one.millimolar;
    });
  return [...sums.values()];
}

/** Concentrations turned into activities by the Davies equation, each side at its own ionic strength. */
function asActivities(ions: readonly Sum[], celsius: number): JunctionIon[] {
  const side = (pick: (ion: Sum) => number): number =>
    daviesTerm(ionicStrengthMolar(ions.map((ion) => ({ valence: ion.valence, millimolar: pick(ion) }))), celsius);
  const pipette = side((ion) => ion.pipetteMm);
  const bath = side((ion) => ion.bathMm);
  return ions.map((ion) => ({
    ...ion,
    pipetteMm: ion.pipetteMm * 10 ** (-ion.valence * ion.valence * pipette),
    bathMm: ion.bathMm * 10 ** (-ion.valence * ion.valence * bath),
  }));
}

/** The largest of each cause, at least 0.05 mV, largest first. */
export function sortedParts(found: readonly UncertaintyPart[]): UncertaintyPart[] {
  const largest = new Map<string, number>();
  for (const { cause, mv } of found) largest.set(cause, Math.max(largest.get(cause) ?? 0, Math.abs(mv)));
  return [...largest]
    .map(([cause, mv]) => ({ cause, mv }))
    .filter(({ mv }) => mv >= 0.05)
    .sort((a, b) => b.mv - a.mv || (a.cause < b.cause ? -1 : 1));
}

/**
 * Liquid junction potential between a pipette and a bath, so that V_membrane = V_recorded − mv, by the generalized
 * Henderson equation with concentrations. Its 95 % half-width has these parts, in quadrature: each mobility moved by its
 * own half-width; each variant of the two solutions; the temperature; activities (Davies) in the place of
 * concentrations; and the equation's own error against measured junctions. It is never below 3.5 mV.
 * @param pipette the pipette solution, as `dissolve` gives it
 * @param bath the bath the pipette was zeroed in
 * @param celsius temperature, °C, above absolute zero
 * @param celsiusUncertainty its 95 % half-width, K, 0 or more
 * @throws RangeError when a side holds no ions or an argument is impossible
 */
export function junctionPotential(
  pipette: JunctionSide,
  bath: JunctionSide,
  celsius: number,
  celsiusUncertainty = usualCelsiusUncertainty,
): Junction {
  requireNonNegative('celsiusUncertainty', celsiusUncertainty, ' K');
  const ions = together(pipette.ions, bath.ions);
  const mv = hendersonPotential(ions, celsius);
  const moved = (list: readonly JunctionIon[]): number => hendersonPotential(list, celsius) - mv;
  const notes: string[] = [];
  const found: UncertaintyPart[] = [
    { cause: 'Henderson’s equation against measured junctions', mv: hendersonErrorMv },
    { cause: 'temperature', mv: (mv / (celsius + zeroCelsiusK)) * celsiusUncertainty },
    { cause: 'concentrations for activities', mv: moved(asActivities(ions, celsius)) },
  ];
  const terms = ions.map((ion, index): JunctionTerm => {
    const { uncertainty, source, assumed } = mobilityOf(ion.ion, ion.valence);
    const shifts = [1 + uncertainty, 1 - uncertainty].map((factor) =>
      moved(ions.map((other, at) => (at === index ? { ...other, mobility: other.mobility * factor } : other))),
    );
    const shift = Math.max(...shifts.map(Math.abs));
    found.push({ cause: `mobility of ${ion.ion}`, mv: shift });
    if (assumed && shift >= 0.1)
      notes.push(
        `The mobility of ${ion.ion} is ${source} (${ion.mobility.toFixed(2)} of potassium's): ±${shift.toFixed(1)} mV.`,
      );
    return {
      ion: ion.ion,
      valence: ion.valence,
      pipette_mm: ion.pipetteMm,
      bath_mm: ion.bathMm,
      mobility: ion.mobility,
      mobility_uncertainty: uncertainty,
      mobility_source: source,
      mobility_mv: shift,
    };
  });
  for (const { cause, ions: varied } of pipette.variants ?? [])
    found.push({ cause: `pipette: ${cause}`, mv: moved(together(varied, bath.ions)) });
  for (const { cause, ions: varied } of bath.variants ?? [])
    found.push({ cause: `bath: ${cause}`, mv: moved(together(pipette.ions, varied)) });
  const parts = sortedParts(found);
  const weight = (term: JunctionTerm): number => term.valence ** 2 * term.mobility * (term.pipette_mm + term.bath_mm);
  return {
    mv,
    uncertainty_mv: Math.max(computedJunctionUncertaintyMv, Math.hypot(...parts.map((part) => part.mv))),
    parts,
    terms: terms.sort((a, b) => weight(b) - weight(a) || (a.ion < b.ion ? -1 : 1)),
    notes,
  };
}
