/** What spikes take from the gradients of a small cell, and how fast a pipette gives it back. */
import { faradayCPerMol, gasConstantJPerMolK, zeroCelsiusK } from './constants.ts';
import {
  requireAmount,
  requireCelsius,
  requireConcentration,
  requireNonNegative,
  requirePositive,
  requireValence,
} from './guards.ts';
import { mobilityOf } from './mobilities.ts';
import { nernstPotential, thermalVoltageMv } from './nernst.ts';

/**
 * Sodium that enters during a spike over the least that could carry it, C·height. Published: 1.25 cortical pyramidal, 2
 * Purkinje and fast-spiking cells (Carter & Bean 2009, Neuron 64:898–909); 1.3 mossy fibre bouton (Alle, Roth & Geiger
 * 2009, Science 325:1405; from memory); 4 squid giant axon (Hodgkin 1975, Phil Trans R Soc B 270:297; from memory).
 * No spike can do with less than 1.
 */
export const excessFactor = { low: 1, usual: 2, high: 4 } as const;

/**
 * Sodium entry (and potassium loss) of one spike, fmol: κ·C·H/F. With capacitance in µF/cm² the result is
 * nmol/cm².
 * @param capacitancePf pF, above 0 @param heightMv mV, 0 or more @param excess κ, 1 or more
 * @throws RangeError naming the argument
 * @see Carter & Bean 2009, Neuron 64:898–909
 * @example entryPerSpikeFmol(100, 100, 1) // 0.104
 */
export function entryPerSpikeFmol(capacitancePf: number, heightMv: number, excess: number): number {
  requirePositive('capacitancePf', capacitancePf, ' pF');
  requireNonNegative('heightMv', heightMv, ' mV');
  if (!(Number.isFinite(excess) && excess >= 1))
    throw new RangeError(`excess must be a finite number of 1 or more, got ${excess}`);
  return (excess * capacitancePf * heightMv) / faradayCPerMol;
}

/**
 * Change of concentration by one spike, mmol/L: what enters over the volume. Potassium falls by as much as sodium rises.
 * @param volumePl water-filled volume of the cell, pL, above 0
 * @throws RangeError naming the argument
 */
export const changePerSpikeMm = (capacitancePf: number, heightMv: number, excess: number, volumePl: number): number =>
  entryPerSpikeFmol(capacitancePf, heightMv, excess) / requirePositive('volumePl', volumePl, ' pL');

export interface Sides {
  inside_mm: number;
  outside_mm: number;
}

/**
 * How far an equilibrium potential of a monovalent cation moves when its concentration inside changes, mV.
 * @param gainMm change inside, mmol/L; negative for a loss
 * @returns null where nothing would be left inside
 * @throws RangeError naming the argument
 */
export function equilibriumShiftMv(sides: Sides, gainMm: number, celsius: number): number | null {
  requireConcentration('inside_mm', sides.inside_mm);
  if (!Number.isFinite(gainMm)) throw new RangeError(`gainMm must be finite, got ${gainMm}`);
  if (sides.inside_mm + gainMm <= 0) return null;
  return (
    nernstPotential(1, sides.outside_mm, sides.inside_mm + gainMm, celsius) -
    nernstPotential(1, sides.outside_mm, sides.inside_mm, celsius)
  );
}

/**
 * How far the peak of a spike moves when the cell gains sodium and loses as much potassium, mV: the Goldman–Hodgkin–Katz
 * potential of sodium and potassium at the ratio of permeabilities that gives the observed peak, held while the
 * concentrations change. A peak at or above E_Na moves as E_Na does.
 * @param peakMv observed peak, mV; above E_K
 * @param gainMm sodium gained, mmol/L, 0 or more
 * @returns null where the peak is not above E_K or no potassium would be left
 * @throws RangeError naming the argument
 * @see Hodgkin & Katz 1949, J Physiol 108:37–77 (the peak as such a potential, P_Na/P_K = 20; from memory)
 */
export function peakShiftMv(
  peakMv: number,
  sodium: Sides,
  potassium: Sides,
  gainMm: number,
  celsius: number,
): number | null {
  requireNonNegative('gainMm', gainMm, ' mmol/L');
  for (const [name, side] of [
    ['sodium', sodium],
    ['potassium', potassium],
  ] as const) {
    requireConcentration(`${name}.inside_mm`, side.inside_mm);
    requireConcentration(`${name}.outside_mm`, side.outside_mm);
  }
  if (potassium.inside_mm <= gainMm) return null;
  const thermal = thermalVoltageMv(celsius);
  const factor = Math.exp(peakMv / thermal);
  const fromPotassium = factor * potassium.inside_mm - potassium.outside_mm;
  const fromSodium = sodium.outside_mm - factor * sodium.inside_mm;
  if (fromPotassium <= 0) return null;
  if (fromSodium <= 0) return equilibriumShiftMv(sodium, gainMm, celsius);
  const ratio = fromPotassium / fromSodium;
  const outward = potassium.inside_mm - gainMm + ratio * (sodium.inside_mm + gainMm);
  return thermal * Math.log((potassium.outside_mm + ratio * sodium.outside_mm) / outward) - peakMv;
}

/**
 * Time constant with which a pipette's sodium exchanges with that of the cell it is open to, s. For a substance of
 * diffusion coefficient D it is (R_a/ρ)·V/D, ρ the resistivity of the pipette solution (Oliva, Cohen & Mathias 1988,
 * Biophys J 54:791–799; found). With the Nernst–Einstein relation for ρ and D it becomes
 * R_a·V·(F²/RT)·Σ z²·(u/u_Na)·c over the pipette's ions: temperature acts through RT alone. Pusch & Neher 1988 (Pflügers
 * Arch 411:204–211, from memory) measured 0.6·R_a·M^⅓ in chromaffin cells of some 1.5 pL (R_a in MΩ, M the molar mass):
 * 1.7 s per MΩ for sodium, where this gives 1.6.
 * @param accessMohm access resistance, MΩ, above 0 @param volumePl pL, above 0
 * @param pipette ions of the pipette solution, mmol/L
 * @throws RangeError naming the argument
 */
export function exchangeTimeConstantS(
  accessMohm: number,
  volumePl: number,
  pipette: readonly { ion: string; valence: number; millimolar: number }[],
  celsius: number,
): number {
  requirePositive('accessMohm', accessMohm, ' MΩ');
  requirePositive('volumePl', volumePl, ' pL');
  const kelvin = requireCelsius('celsius', celsius) + zeroCelsiusK;
  const conductance = pipette.reduce(
    (sum, one, index) =>
      sum +
      requireValence(`pipette[${index}].valence`, one.valence) ** 2 *
        mobilityOf(one.ion, one.valence).relative *
        requireAmount(`pipette[${index}].millimolar`, one.millimolar),
    0,
  );
  if (conductance <= 0) throw new RangeError('pipette must hold at least one ion above 0 mmol/L, got none');
  // MΩ·pL is 1e-9 Ω·m³; mmol/L is mol/m³.
  const resistanceVolume = accessMohm * volumePl * 1e-9;
  const perMole = faradayCPerMol ** 2 / (gasConstantJPerMolK * kelvin);
  return (resistanceVolume * perMole * conductance) / mobilityOf('Na', 1).relative;
}

/**
 * Share of what enters at a steady pace during a time that is still in the cell at its end: (1 − e^(−T/τ))/(T/τ). 1 where
 * exchange is slow, near 0 where a time constant is short against the time.
 * @param durationS T, s, 0 or more @param timeConstantS τ, s, above 0
 * @throws RangeError naming the argument
 */
export function shareRetained(durationS: number, timeConstantS: number): number {
  const times =
    requireNonNegative('durationS', durationS, ' s') / requirePositive('timeConstantS', timeConstantS, ' s');
  return times === 0 ? 1 : -Math.expm1(-times) / times;
}
