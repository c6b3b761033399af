import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import {
  checkCellReference,
  checkFact,
  factKeys,
  isCalendarDate,
  nearestOf,
  shippedClasses,
  urlSafeId,
} from '../../pipeline/archive/fact-keys.ts';

const checked = (key: string, value: unknown): string | number => {
  const result = checkFact(key, value);
  return result.ok ? result.value : `✗ ${result.message}`;
};

describe('the closed list', () => {
  test('is exactly the list of the design, in its order', () =>
    expect(factKeys.map((entry) => entry.key).join(', ')).toBe(
      'cell, subject, species, age, sex, genotype, region, slice, preparation, class, group, protocol, rig, person, date, time, configuration, bath, pipette, temperature_c, junction, ljp_mv, spike_ion, filter_khz, rate_hz, mains_hz, bridge_mohm, pipette_mohm, seal_gohm, break_in, bias_pa, capacitance_pf, volume_pl, access_mohm, end_offset_mv, clamp, batch_bath, batch_pipette, audience, figure, doi, note',
    ));
  test('every number has a range and a unit, every choice its words, every key a definition of one sentence', () => {
    for (const entry of factKeys) {
      expect(entry.range !== null && entry.unit !== '', entry.key).toBe(entry.kind === 'number');
      expect(entry.choices.length > 0, entry.key).toBe(entry.kind === 'choice');
      expect(entry.definition, entry.key).toMatch(/^[A-Z].*[^.]\.$/);
    }
  });
  test('a shipped class is never twice', () => expect(new Set(shippedClasses).size).toBe(shippedClasses.length));
});

describe('values', () => {
  const table: [string, unknown, string | number][] = [
    ['temperature_c', 33, 33],
    ['temperature_c', '33.5', 33.5],
    ['temperature_c', -0, 0],
    ['ljp_mv', '−14.2', -14.2],
    ['temperature_c', 310, '✗ temperature_c must be between -5 and 60 °C, got 310'],
    ['temperature_c', '33 °C', '✗ temperature_c must be a number in °C, got "33 °C"; write the number alone, in °C'],
    ['temperature_c', '33,5', '✗ temperature_c must be a number in °C, got "33,5"; write 33.5 with a point'],
    ['temperature_c', Number.NaN, '✗ temperature_c must be a number in °C, got "NaN"'],
    ['temperature_c', Number.POSITIVE_INFINITY, '✗ temperature_c must be a number in °C, got "Infinity"'],
    ['temperature_c', '', '✗ temperature_c has no value'],
    ['temperature_c', [33], '✗ temperature_c must be one value, got a list'],
    ['temperature_c', {}, '✗ temperature_c must be one value, got a block of keys'],
    ['temperature_c', null, '✗ temperature_c must be one value, got nothing'],
    ['temperature_c', true, '✗ temperature_c must be one value, got true'],
    ['filter_khz', 0, '✗ filter_khz must be between 0.001 and 1000 kHz, got 0'],
    ['configuration', 'Whole cell', 'whole-cell'],
    ['configuration', 'whole_cell', 'whole-cell'],
    [
      'configuration',
      'wholcell',
      '✗ configuration must be whole-cell, perforated, sharp, loose or other, got "wholcell"; the nearest is "whole-cell"',
    ],
    ['date', '2026-03-12', '2026-03-12'],
    ['date', '2026-03-12T23:59:59-11:00', '2026-03-12'],
    ['date', '2024-02-29', '2024-02-29'],
    ['date', '2026-02-29', '✗ date must be a day of the calendar between 1900 and 2100, got "2026-02-29"'],
    ['date', '1871-01-01', '✗ date must be a day of the calendar between 1900 and 2100, got "1871-01-01"'],
    ['date', '12.03.2026', '✗ date must be written YYYY-MM-DD, got "12.03.2026"'],
    ['date', 20260312, '✗ date must be written YYYY-MM-DD, got "20260312"'],
    ['time', '9:05', '09:05:00'],
    ['time', '14:05:33.25', '14:05:33.25'],
    ['time', '24:00', '✗ time must be a clock time written HH:MM or HH:MM:SS, got "24:00"'],
    ['break_in', '2 pm', '✗ break_in must be a clock time written HH:MM or HH:MM:SS, got "2 pm"'],
    ['cell', 's2 c1', 's2-c1'],
    ['cell', 7, '7'],
    ['cell', '2026-03-12-s2c1', '2026-03-12-s2c1'],
    ['cell', 'Zelle-ä', 'Zelle-ä'],
    [
      'cell',
      '12/03/26 #1',
      '✗ cell may hold letters, digits and . _ + - only, since it names a page, got "12/03/26 #1"; "12-03-26-1" would do',
    ],
    [
      'cell',
      '../x',
      '✗ cell may hold letters, digits and . _ + - only, since it names a page, got "../x"; "x" would do',
    ],
    [
      'cell',
      'CON',
      '✗ cell may hold letters, digits and . _ + - only, since it names a page, got "CON"; "CON_" would do',
    ],
    ['doi', 'https://doi.org/10.1234/ab.cd', '10.1234/ab.cd'],
    ['doi', 'ab', '✗ doi must look like 10.1234/abcd, got "ab"'],
    ['note', ' kept ', 'kept'],
    ['note', 'x'.repeat(2001), '✗ note must be at most 2000 characters long, got 2001'],
  ];
  for (const [key, value, result] of table)
    test(`${key}: ${JSON.stringify(value)?.slice(0, 40)}`, () => expect(checked(key, value)).toBe(result));

  test('an unknown key names the nearest', () => {
    expect(checkFact('temprature_c', 33)).toEqual({
      ok: false,
      message: '"temprature_c" is not a fact key; the nearest is "temperature_c"',
      nearest: 'temperature_c',
    });
    expect(
      nearestOf(
        'temp',
        factKeys.map((entry) => entry.key),
      ),
    ).toBe('temperature_c');
    expect(
      nearestOf(
        'Pipette Resistance',
        factKeys.map((entry) => entry.key),
      ),
    ).toBe('pipette');
    expect(nearestOf('x', [])).toBeUndefined();
  });
  test('keys of the language itself are not fact keys', () => {
    for (const key of ['__proto__', 'constructor', 'toString', '']) expect(checkFact(key, 1).ok, key).toBe(false);
  });
});

describe('laws', () => {
  test('what was accepted is accepted again, unchanged', () => {
    const key = fc.constantFrom(...factKeys.map((entry) => entry.key));
    const value = fc.oneof(
      fc.string(),
      fc.double(),
      fc.integer(),
      fc.constantFrom('whole cell', '2026-1-1', '9:05', '1e2'),
    );
    fc.assert(
      fc.property(key, value, (name, given) => {
        const once = checkFact(name, given);
        if (once.ok) expect(checkFact(name, once.value)).toEqual(once);
      }),
      { seed: 11, numRuns: 3000 },
    );
  });
  test('every number is finite and inside its range', () => {
    const numbers = factKeys.filter((entry) => entry.kind === 'number');
    fc.assert(
      fc.property(fc.constantFrom(...numbers), fc.double(), (entry, given) => {
        const once = checkFact(entry.key, given);
        const inside = given >= entry.range![0] && given <= entry.range![1];
        expect(once.ok).toBe(inside);
      }),
      { seed: 12, numRuns: 2000 },
    );
  });
  test('a derived id is always one that could be stated', () =>
    fc.assert(
      fc.property(fc.string({ unit: 'binary', maxLength: 200 }), (written) => {
        const id = urlSafeId(written);
        expect(checkFact('cell', id)).toEqual({ ok: true, value: id });
      }),
      { seed: 13, numRuns: 3000 },
    ));
  test('calendar dates agree with the language’s own calendar', () => {
    const two = (value: number): string => String(value).padStart(2, '0');
    fc.assert(
      fc.property(
        fc.integer({ min: 1900, max: 2100 }),
        fc.integer({ min: 0, max: 13 }),
        fc.integer({ min: 0, max: 32 }),
        (year, month, day) => {
          const back = new Date(Date.UTC(year, month - 1, day));
          const real = back.getUTCFullYear() === year && back.getUTCMonth() === month - 1 && back.getUTCDate() === day;
          expect(isCalendarDate(`${year}-${two(month)}-${two(day)}`)).toBe(real);
        },
      ),
      { seed: 14, numRuns: 3000 },
    );
  });
});

test('something may speak of a cell that was kept apart, and nothing may be named so', () => {
  expect(checkCellReference('c1~2')).toEqual({ ok: true, value: 'c1~2' });
  expect(checkFact('cell', 'c1~2').ok).toBe(false);
  expect(checkCellReference('~2').ok).toBe(false);
});
