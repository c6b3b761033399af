/** The potentials of a pair of solutions as a person would work them out: the sums, the formula with its numbers. */
import type { IonPotential, SolutionIons } from '../../pipeline/judge/types.ts';
import { number } from '../format.ts';

const raised: Record<string, string> = { '1': '', '2': '²', '3': '³', '4': '⁴', '5': '⁵' };

/** 'EGTA2-' and 'Ca' with their charge as people write it: 'EGTA²⁻', 'Ca²⁺'. */
export function ionLabel(ion: string, valence: number): string {
  const bare = ion.replace(/\d?[+-]$/, '');
  return `${bare}${raised[String(Math.abs(valence))] ?? String(Math.abs(valence))}${valence > 0 ? '⁺' : '⁻'}`;
}

export interface Sums {
  /** Σ z·u·(c_bath − c_pipette). */
  drive: number;
  /** Σ z²·u·c on each side. */
  pipette: number;
  bath: number;
}

export function sumsOf(ions: SolutionIons['ions']): Sums {
  const over = (term: (ion: SolutionIons['ions'][number]) => number): number =>
    ions.reduce((sum, ion) => sum + term(ion), 0);
  return {
    drive: over((ion) => ion.valence * ion.mobility * (ion.bath_mm - ion.pipette_mm)),
    pipette: over((ion) => ion.valence ** 2 * ion.mobility * ion.pipette_mm),
    bath: over((ion) => ion.valence ** 2 * ion.mobility * ion.bath_mm),
  };
}

/** A concentration with three significant digits at least, none beyond a micromole. */
export const amountText = (millimolar: number): string =>
  number(millimolar, millimolar >= 100 ? 1 : millimolar >= 10 ? 2 : millimolar === 0 ? 0 : 3);

/** '(26.382/+1)·ln(2.500/146.8) = −107.4 ± 0.8 mV'. */
export function nernstLine(ion: IonPotential, thermal_mv: number): string {
  const valence = ion.valence ?? 1;
  const factor = valence === 1 ? number(thermal_mv, 3) : `(${number(thermal_mv, 3)}/${number(valence)})`;
  return `${factor}·ln(${amountText(ion.outside_mm)}/${amountText(ion.inside_mm)}) = ${number(ion.mv, 1)} ± ${number(ion.uncertainty_mv, 1)} mV`;
}

/** The equation with its sums filled in; where both sides conduct alike it is the limit of the same expression. */
export function hendersonLine(solution: SolutionIons): string {
  const { drive, pipette, bath } = sumsOf(solution.ions);
  const end = `${number(solution.ljp_mv, 1)} ± ${number(solution.ljp_uncertainty_mv, 1)} mV`;
  if (Math.abs(pipette / bath - 1) < 1e-9)
    return `−${number(solution.thermal_mv, 3)}·${number(drive, 3)}/${number(bath, 3)} = ${end}`;
  return `${number(solution.thermal_mv, 3)}·[${number(drive, 3)}/(${number(bath, 3)} − ${number(pipette, 3)})]·ln(${number(pipette, 3)}/${number(bath, 3)}) = ${end}`;
}

/** 'amount of KCl 0.5, temperature 0.4': the parts of a half-width, mV, in quadrature. */
export const partsText = (parts: readonly { cause: string; mv: number }[]): string =>
  parts.map(({ cause, mv }) => `${cause} ${number(mv, mv < 0.1 ? 2 : 1)}`).join(', ');
