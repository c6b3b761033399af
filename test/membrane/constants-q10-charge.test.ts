import fc from 'fast-check';
import { describe, expect, it, test } from 'vitest';
import { minimumChargePc, monovalentIons } from '../../pipeline/membrane/charge.ts';
import * as constants from '../../pipeline/membrane/constants.ts';
import {
  atTemperature,
  q10Factor,
  q10OfTimes,
  rangeAtTemperature,
  rateAtTemperature,
} from '../../pipeline/membrane/q10.ts';

// Exact 2019 SI (CODATA 2018 and 2022 agree), found; R and F as published rounded values.
test('constants', () => {
  expect(constants.boltzmannJPerK).toBe(1.380649e-23);
  expect(constants.elementaryChargeC).toBe(1.602176634e-19);
  expect(constants.avogadroPerMol).toBe(6.02214076e23);
  expect(constants.zeroCelsiusK).toBe(273.15);
  expect(constants.gasConstantJPerMolK).toBeCloseTo(8.314462618, 9);
  expect(constants.gasConstantJPerMolK).toBeCloseTo(8.31446261815324, 13);
  expect(constants.faradayCPerMol).toBeCloseTo(96485.33212, 5);
  expect(constants.faradayCPerMol).toBeCloseTo(96485.33212331001, 9);
});

describe('minimum charge', () => {
  // Q = C·H and Q/e, recomputed; the second is the regular-spiking model cell of Pospischil et al. 2008 from
  // threshold to peak.
  test.each([
    [100, 100, 10, 62415090.744607635],
    [289.53, 88.9, 25.739217, 160651556.47501475],
    [1e4, 100, 1000, 6241509074.460763],
    [1e6, 100, 1e5, 624150907446.0763],
  ])('%d pF through %d mV', (pf, mv, pc, ions) => {
    expect(minimumChargePc(pf, mv) / pc).toBeCloseTo(1, 12);
    expect(monovalentIons(minimumChargePc(pf, mv)) / ions).toBeCloseTo(1, 12);
  });
  it('per square centimetre of squid axon, 100 mV: 1.0364 pmol', () => {
    // 1 µF/cm² is 10⁶ pF; by hand 1e-7 C / F.
    const pmol = (monovalentIons(minimumChargePc(1e6, 100)) / constants.avogadroPerMol) * 1e12;
    expect(pmol).toBeCloseTo(1.0364269656617728, 10);
  });
  it('no height, no charge; an impossible cell is named', () => {
    expect(minimumChargePc(100, 0)).toBe(0);
    expect(() => minimumChargePc(0, 100)).toThrow(/capacitancePf must be .* got 0/);
    expect(() => minimumChargePc(100, -5)).toThrow(/heightMv must be .* got -5/);
    expect(() => monovalentIons(Number.NaN)).toThrow(/chargePc must be .* got NaN/);
  });
});

describe('Q10', () => {
  // Computed: widths of 1.6 ms at 22 °C and 0.6 ms at 37 °C.
  it('of two widths', () => expect(q10OfTimes(1.6, 22, 0.6, 37)).toBeCloseTo(1.9229994270765445, 12));
  it('takes the one width to the other and back', () => {
    const q10 = 1.9229994270765445;
    expect(atTemperature(1.6, q10, 22, 37)).toBeCloseTo(0.6, 12);
    expect(atTemperature(0.6, q10, 37, 22)).toBeCloseTo(1.6, 12);
  });
  // By hand: Hodgkin & Huxley 1952 scale rates by 3^((T − 6.3)/10); at 18.5 °C e^(1.22·1.098612) = e^1.340307 = 3.8202.
  it('of 3 from 6.3 to 18.5 °C', () => expect(q10Factor(3, 6.3, 18.5)).toBeCloseTo(3.8202, 4));
  it('rates grow where times shorten', () => {
    expect(rateAtTemperature(100, 2, 20, 30)).toBe(200);
    expect(atTemperature(100, 2, 20, 30)).toBe(50);
  });
  it('composes over a temperature between', () =>
    fc.assert(
      fc.property(
        fc.double({ min: 1, max: 4, noNaN: true }),
        fc.double({ min: 0, max: 40, noNaN: true }),
        fc.double({ min: 0, max: 40, noNaN: true }),
        fc.double({ min: 0, max: 40, noNaN: true }),
        (q10, a, b, c) => {
          const through = atTemperature(atTemperature(1, q10, a, b), q10, b, c);
          expect(through / atTemperature(1, q10, a, c)).toBeCloseTo(1, 9);
        },
      ),
      { seed: 15 },
    ));
  it('a range widens by the Q10 between 2 and 3, in either direction', () => {
    // By hand: 10 K warmer, times ÷2 and ÷3.
    const warmer = rangeAtTemperature('time', { low: 0.6, high: 1.2 }, 23, 33)!;
    expect(warmer.low).toBeCloseTo(0.2, 12);
    expect(warmer.high).toBeCloseTo(0.6, 12);
    const colder = rangeAtTemperature('time', { low: 0.6, high: 1.2 }, 33, 23)!;
    expect(colder.low).toBeCloseTo(1.2, 12);
    expect(colder.high).toBeCloseTo(3.6, 12);
    const rate = rangeAtTemperature('rate', { low: 100, high: 200 }, 23, 33)!;
    expect(rate.low).toBeCloseTo(200, 9);
    expect(rate.high).toBeCloseTo(600, 9);
  });
  it('stays as it is at its own temperature, and goes no further than 15 K', () => {
    expect(rangeAtTemperature('time', { low: 1, high: 2 }, 34, 34)).toEqual({ low: 1, high: 2 });
    expect(rangeAtTemperature('time', { low: 1, high: 2 }, 22, 37)).not.toBeNull();
    expect(rangeAtTemperature('time', { low: 1, high: 2 }, 21.9, 37)).toBeNull();
  });
  it('holds every single value moved by a Q10 of its own', () =>
    fc.assert(
      fc.property(
        fc.double({ min: 0, max: 1, noNaN: true }),
        fc.double({ min: 2, max: 3, noNaN: true }),
        fc.double({ min: -15, max: 15, noNaN: true }),
        (share, q10, shift) => {
          const moved = rangeAtTemperature('time', { low: 1, high: 3 }, 20, 20 + shift);
          const one = atTemperature(1 + 2 * share, q10, 20, 20 + shift);
          expect(moved).not.toBeNull();
          expect(one).toBeGreaterThanOrEqual(moved!.low - 1e-9);
          expect(one).toBeLessThanOrEqual(moved!.high + 1e-9);
        },
      ),
      { seed: 16 },
    ));
  it('names what is impossible', () => {
    expect(() => q10Factor(0, 20, 30)).toThrow(/q10 must be .* got 0/);
    expect(() => atTemperature(-1, 2, 20, 30)).toThrow(/valueMs must be .* got -1/);
    expect(() => q10OfTimes(1, 22, 2, 22)).toThrow(/secondC must differ/);
    expect(() => rangeAtTemperature('time', { low: 2, high: 1 }, 20, 30)).toThrow(/range.low .* 2 > 1/);
  });
});
