import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { compare, compareReadings, junctionReadings, measuredUncertainty } from '../../pipeline/judge/compare.ts';

const number = fc.double({ min: -500, max: 500, noNaN: true });
const width = fc.double({ min: 0, max: 20, noNaN: true });
const limits = fc.oneof(
  fc.tuple(number, fc.constant(null)),
  fc.tuple(fc.constant(null), number),
  fc
    .tuple(number, fc.double({ min: 0, max: 100, noNaN: true }))
    .map(([low, span]): [number, number] => [low, low + span]),
);

describe('one number against limits', () => {
  test('no limit at all is refused: such a check could not fail', () =>
    expect(() => compare(1, null, null, 1)).toThrow(/needs a lower or an upper limit/));

  const outcomes = (high: number, uncertainty: number, values: number[]) =>
    values.map((value) => compare(value, null, high, uncertainty).outcome);
  test('upper limit of 55 with 3 of uncertainty', () =>
    expect(outcomes(55, 3, [40, 52, 52.1, 54, 55, 57, 58, 58.1, 60])).toEqual([
      'within',
      'within',
      'near limit',
      'near limit',
      'near limit',
      'near limit',
      'near limit',
      'outside',
      'outside',
    ]));
  test('without uncertainty a number at the limit meets it and any excess is outside', () =>
    expect(outcomes(0, 0, [0, 1e-12])).toEqual(['within', 'outside']));
  test('the margin is that of the nearest limit and negative beyond it', () => {
    expect(compare(3, 0, 10, 0)).toMatchObject({ margin: 3, side: 'low' });
    expect(compare(12, 0, 10, 1)).toMatchObject({ margin: -2, side: 'high', outcome: 'outside' });
    expect(compare(-1, 0, 10, 2)).toMatchObject({ margin: -1, side: 'low', outcome: 'near limit' });
  });
  test('readings that disagree are near the limit, whichever way', () => {
    expect(compareReadings(70, [0, -14], null, 60, 3)).toMatchObject({
      outcome: 'near limit',
      disagree: true,
      shift: -14,
    });
    expect(compareReadings(80, [0, -14], null, 60, 3)).toMatchObject({ outcome: 'outside', shift: -14, margin: -6 });
    expect(compareReadings(40, [0, -14], null, 60, 3)).toMatchObject({ outcome: 'within', disagree: false });
    expect(compareReadings(-110, [0, -14], -104, null, 3)).toMatchObject({ outcome: 'outside', shift: 0, margin: -6 });
  });
});

describe('laws of the comparison', () => {
  const rank = { within: 0, 'near limit': 1, outside: 2 } as const;
  test('widening a limit never makes an outcome worse than near limit, and never turns within into outside', () =>
    fc.assert(
      fc.property(
        number,
        limits,
        width,
        fc.double({ min: 0, max: 50, noNaN: true }),
        (value, [low, high], u, wider) => {
          const before = compare(value, low, high, u);
          const after = compare(value, low === null ? null : low - wider, high === null ? null : high + wider, u);
          expect(rank[after.outcome]).toBeLessThanOrEqual(rank[before.outcome]);
        },
      ),
      { seed: 11 },
    ));
  test('moving value and limits together leaves the outcome', () =>
    fc.assert(
      fc.property(
        fc.integer({ min: -400, max: 400 }),
        fc.integer({ min: -400, max: 400 }),
        fc.integer({ min: 0, max: 20 }),
        fc.integer({ min: -100, max: 100 }),
        (value, high, u, by) => {
          expect(compare(value + by, null, high + by, u).outcome).toBe(compare(value, null, high, u).outcome);
        },
      ),
      { seed: 12 },
    ));
  test('the mirror image of a case has the same outcome', () =>
    fc.assert(
      fc.property(number, limits, width, (value, [low, high], u) => {
        expect(compare(-value, high === null ? null : -high, low === null ? null : -low, u).outcome).toBe(
          compare(value, low, high, u).outcome,
        );
      }),
      { seed: 13 },
    ));
  test('one more possible reading never turns anything into outside', () =>
    fc.assert(
      fc.property(number, limits, width, number, (value, [low, high], u, shift) => {
        const alone = compare(value, low, high, u).outcome;
        const both = compareReadings(value, [0, shift], low, high, u).outcome;
        if (both === 'outside') expect(alone).toBe('outside');
        if (both === 'within') expect(alone).toBe('within');
      }),
      { seed: 14 },
    ));
});

// Student's t, two-sided 95 %: 12.706 (1 degree of freedom), 2.776 (4), 2.201 (11); standard table, from memory.
describe('what a measured number is worth', () => {
  test('its 95 % half-width', () => expect(measuredUncertainty({ value: 1, n: 5, sd: 3, se: 2, u95: 7 })).toBe(7));
  test('nothing where it has none', () => expect(measuredUncertainty({ value: 1, n: 5, sd: 3 })).toBe(0));
});

describe('readings of the junction potential', () => {
  test.each([
    ['corrected by a stated potential', { reading: 'corrected', ljp_mv: 14, ljp_from: 'stated' }, [0], 1],
    ['corrected by a computed potential', { reading: 'corrected', ljp_mv: 14, ljp_from: 'computed' }, [0], 3.5],
    ['corrected before, by an amount nobody states', { reading: 'corrected', ljp_mv: null, ljp_from: null }, [0], 3.5],
    ['as recorded with a computed potential', { reading: 'recorded', ljp_mv: 14, ljp_from: 'computed' }, [0, -14], 3.5],
    ['as recorded with nothing known', { reading: 'recorded', ljp_mv: null, ljp_from: null }, [0, -16], 3.5],
  ] as const)('%s', (_name, facts, shifts, uncertainty) =>
    expect(junctionReadings(facts)).toEqual({ shifts, uncertainty_mv: uncertainty }),
  );
});
