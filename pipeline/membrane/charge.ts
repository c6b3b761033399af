import { elementaryChargeC } from './constants.ts';
import { requireNonNegative, requirePositive } from './guards.ts';

/**
 * Least charge (pC) that moves a capacitance through a height: Q = C·H.
 * @param capacitancePf membrane capacitance, pF, above 0
 * @param heightMv height of the spike, mV, 0 or more
 * @throws RangeError naming the argument
 * @see Carter & Bean 2009, Neuron 64:898–909
 * @example minimumChargePc(100, 100) // 10
 */
export function minimumChargePc(capacitancePf: number, heightMv: number): number {
  return (
    (requirePositive('capacitancePf', capacitancePf, ' pF') * requireNonNegative('heightMv', heightMv, ' mV')) / 1000
  );
}

/**
 * Number of monovalent ions that carries a charge: Q/e.
 * @param chargePc charge, pC, 0 or more
 * @throws RangeError naming the argument
 */
export function monovalentIons(chargePc: number): number {
  return (requireNonNegative('chargePc', chargePc, ' pC') * 1e-12) / elementaryChargeC;
}
