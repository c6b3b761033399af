import { describe, expect, test } from 'vitest';
import { withDerived } from '../../pipeline/measure/derive.ts';
import type { Phase, Spike } from '../../pipeline/measure/types.ts';

// By hand: net ionic current = I − C·dV/dt, outward positive. A rise of 58 mV in 0.5 ms in a cell of 80 pF takes
// 80 pF · 116 V/s = 9280 pA; with 100 pA injected the membrane itself carries 9180 pA inward.
const rise: Phase = {
  name: 'depolarization',
  from_s: 0.1,
  to_s: 0.1005,
  net_ionic_sign: 0,
  basis: { mv: 58, noise_mv: 0.1, pa: 100, se: 1 },
};
const signs = (phase: Phase, capacitance_pf: number | null) => {
  const spike: Spike = { spike: 0, values: {}, why: {}, phases: [phase] };
  return withDerived([spike], { e_na_mv: null, e_k_mv: null, capacitance_pf })[0]!.phases[0]!.net_ionic_sign;
};

describe('sign of the net ionic current once the capacitance is known', () => {
  test('a steep rise on a small current is inward', () => expect(signs(rise, 80)).toBe(-1));
  test('without a capacitance, current and rise pull in opposite ways: not resolved', () =>
    expect(signs(rise, null)).toBe(0));
  test('a slow rise that the current more than pays for is outward', () =>
    expect(signs({ ...rise, to_s: 0.2, basis: { ...rise.basis!, mv: 10 } }, 80)).toBe(1));
  test('where the two balance within the noise: not resolved', () =>
    expect(signs({ ...rise, to_s: 0.1464, basis: { ...rise.basis!, noise_mv: 1 } }, 80)).toBe(0));
  test('a phase without a basis keeps what it was given', () =>
    expect(signs({ name: 'recovery', from_s: 0, to_s: 1, net_ionic_sign: 0 }, 80)).toBe(0));
});
