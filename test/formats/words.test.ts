/** Units, headings, labels, names and numbers as people write them. */
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { claimFormat } from '../../pipeline/formats/claims.ts';
import { labelledAmplitude } from '../../pipeline/formats/labels.ts';
import { filterKhz, resistanceMohm } from '../../pipeline/formats/nwb-facts.ts';
import { sweepToken } from '../../pipeline/formats/nwb-match.ts';
import { parseHeading } from '../../pipeline/formats/text-headings.ts';
import { cellsOf, numberOf } from '../../pipeline/formats/text-numbers.ts';
import { spread, timeBase } from '../../pipeline/formats/time-base.ts';
import { parseUnit, potentialUnitBySize, timeUnitByStep } from '../../pipeline/formats/units.ts';

test('endings claim a format whatever their case', () => {
  expect(['a.nwb', 'b/C.NWB', 'x.csv', 'x.TSV', 'x.txt', 'x.dat', 'x.asc', 'x.tab'].map(claimFormat)).toEqual([
    'nwb',
    'nwb',
    ...Array<string>(6).fill('text'),
  ]);
  expect(['a.nwb.yaml', 'csv', '.csv', 'x.xlsx', 'x.', '', 'dir.csv/file', 'x.constructor'].map(claimFormat)).toEqual([
    null,
    null,
    'text',
    null,
    null,
    null,
    null,
    null,
  ]);
});

describe('units', () => {
  const known: [string, string, number][] = [
    ['V', 'voltage', 1000],
    ['volts', 'voltage', 1000],
    ['Volt', 'voltage', 1000],
    ['mV', 'voltage', 1],
    ['millivolts', 'voltage', 1],
    ['mv', 'voltage', 1],
    ['µV', 'voltage', 0.001],
    ['μV', 'voltage', 0.001],
    ['uV', 'voltage', 0.001],
    ['(mV)', 'voltage', 1],
    ['A', 'current', 1e12],
    ['amperes', 'current', 1e12],
    ['Amps', 'current', 1e12],
    ['nA', 'current', 1000],
    ['pA', 'current', 1],
    ['picoamperes', 'current', 1],
    ['fA', 'current', 0.001],
    ['pA/pF', 'current per capacitance', 1],
    ['A/F', 'current per capacitance', 1],
    ['nA/pF', 'current per capacitance', 1000],
    ['amperes per farad', 'current per capacitance', 1],
    ['s', 'time', 1],
    ['sec', 'time', 1],
    ['seconds', 'time', 1],
    ['ms', 'time', 0.001],
    ['msec', 'time', 0.001],
    ['milliseconds', 'time', 0.001],
    ['us', 'time', 1e-6],
    ['µs', 'time', 1e-6],
  ];
  for (const [text, dimension, factor] of known)
    test(`"${text}" is a ${dimension}`, () => expect(parseUnit(text)).toMatchObject({ dimension, factor }));
  for (const text of ['', 'a.u.', 'unknown', 'MV', 'celsius', 'n/a', 'counts', '%', 'Hz', 'V/s', 'ohms', 'pixels'])
    test(`"${text}" is none`, () => expect(parseUnit(text)).toBeNull());

  test('sizes that only one unit explains', () => {
    expect([0.08, 80, 80_000, 1, 5, 1e7, 0].map(potentialUnitBySize)).toEqual([
      'V',
      'mV',
      'uV',
      null,
      null,
      null,
      null,
    ]);
    expect([5e-5, 0.05, 50, 0.002, 1e-9].map(timeUnitByStep)).toEqual(['s', 'ms', 'us', null, null]);
  });
});

describe('headings', () => {
  const cases: [string, string, string | null][] = [
    ['Time (s)', 'time', 's'],
    ['time/ms', 'time', 'ms'],
    ['t [µs]', 'time', 'µs'],
    ['Time, ms', 'time', 'ms'],
    ['times', 'time', null],
    ['t', 'time', null],
    ['Zeit', 'time', null],
    ['Voltage (V)', 'voltage', 'V'],
    ['Vm_mV', 'voltage', 'mV'],
    ['Vm', 'voltage', null],
    ['V', 'voltage', null],
    ['mV', 'voltage', 'mV'],
    ['Membrane potential in mV', 'voltage', 'mV'],
    ['Spannung [mV]', 'voltage', 'mV'],
    ['Sweep 3 (mV)', 'voltage', 'mV'],
    ['Current (pA/pF)', 'current', 'pA/pF'],
    ['I [nA]', 'current', 'nA'],
    ['current', 'current', null],
    ['Stimulus (pA)', 'current', 'pA'],
    ['pA', 'current', 'pA'],
    ['', 'number of row or sweep', null],
    ['index', 'number of row or sweep', null],
    ['Unnamed: 0', 'number of row or sweep', null],
    ['Temperature (C)', 'unknown', null],
    ['-50 pA', 'unknown', null],
    ['comment', 'unknown', null],
  ];
  for (const [text, kind, unit] of cases)
    test(`"${text}"`, () => {
      const heading = parseHeading(text);
      expect([heading.kind, heading.unit?.name ?? null]).toEqual([kind, unit]);
    });
});

test('amplitudes that labels claim', () => {
  const current: [string, number | null][] = [
    ['Long step -110 pA', -110],
    ['step_50pA', 50],
    ['0.3 nA', 300],
    ['−20 pA', -20],
    ['+30pA', 30],
    ['50 pA, then 50 pA', 50],
    ['-100 pA and 50 pA', null],
    ['steps of 10 pA', null],
    ['from -100 to 200 pA', null],
    ['ramp', null],
    ['', null],
    ['20 pA/pF', null],
    ['-70 mV', null],
  ];
  expect(current.map(([label]) => labelledAmplitude(label, 'current'))).toEqual(current.map(([, value]) => value));
  expect(labelledAmplitude('step -10 mV', 'voltage')).toBe(-10);
});

test('filters and resistances out of free text', () => {
  const filters: [string, number | null][] = [
    ['Bessel 10 kHz', 10],
    ['10kHz lowpass', 10],
    ['low-pass 5000 Hz', 5],
    ['2.9 kHz 4-pole Bessel', 2.9],
    ['high-pass 0.1 Hz, low-pass 3 kHz', 3],
    ['1 kHz and 10 kHz', null],
    ['none', null],
    ['', null],
    ['0 Hz', null],
  ];
  expect(filters.map(([text]) => filterKhz(text))).toEqual(filters.map(([, value]) => value));
  const resistances: [string, number | null][] = [
    ['5 MOhm', 5],
    ['4.5 MΩ', 4.5],
    ['2 GOhm', 2000],
    ['5e6 ohms', 5],
    ['5000000', 5],
    ['3-5 MOhm', null],
    ['5', null],
    ['about 5', null],
    ['5 mV', null],
    ['12 megaohms', 12],
  ];
  expect(resistances.map(([text]) => resistanceMohm(text))).toEqual(resistances.map(([, value]) => value));
});

test('names of one sweep agree, names of two do not', () => {
  const pairs = [
    ['CurrentClampSeries001', 'CurrentClampStimulusSeries001'],
    ['data_00004_AD0', 'data_00004_DA0'],
    ['Sweep_12_response', 'Sweep_12_stimulus'],
    ['index_07', 'stim_index_7'],
  ];
  for (const [response, stimulus] of pairs) expect(sweepToken(response!)).toBe(sweepToken(stimulus!));
  expect(sweepToken('Sweep_12')).not.toBe(sweepToken('Sweep_2'));
  expect(sweepToken('CurrentClampSeries')).toBe('');
});

describe('numbers', () => {
  test('what is none', () => {
    for (const text of [
      '',
      ' ',
      '-',
      '+',
      '.',
      'e5',
      '1e',
      '1e+',
      '1.2.3',
      '1,2',
      '0x10',
      '1 2',
      'NaN',
      'Infinity',
      '1e999',
      '--1',
      '1-',
      '"',
      '""',
    ])
      expect(numberOf(text, 'point')).toBeNaN();
  });

  test('every number as the language writes it comes back the same', () => {
    fc.assert(
      fc.property(fc.double({ noNaN: true, noDefaultInfinity: true }), fc.boolean(), (value, exponent) => {
        const text = exponent ? value.toExponential(17 + (Math.abs(value) > 1e5 ? 0 : 2)) : String(value);
        expect(numberOf(text, 'point')).toBe(Number(text));
        expect(numberOf(` "${text.replace('.', ',')}" `, 'comma')).toBe(Number(text));
      }),
      { seed: 5, numRuns: 2000 },
    );
  });

  test('cells', () => {
    expect(cellsOf('a, "b, c" ,,d', ',')).toEqual(['a', 'b, c', '', 'd']);
    expect(cellsOf('  1   2\t3  ', 'space')).toEqual(['1', '2', '3']);
    expect(cellsOf('"say ""so"""', ';')).toEqual(['say "so"']);
    expect(cellsOf('', ',')).toEqual(['']);
    expect(cellsOf('', 'space')).toEqual([]);
  });
});

describe('time base', () => {
  const exact = (time: number): number => Math.abs(time) * 2 ** -50;

  test('too little to tell', () => {
    for (const times of [[], [1], [Number.NaN, 1], [1, 1], [2, 1], [Number.NaN, Number.NaN]])
      expect(timeBase(Float64Array.from(times), exact).ok).toBe(false);
  });

  test('any fixed step with jitter of a tenth of it is that step', () => {
    fc.assert(
      fc.property(
        fc.integer({ min: 3, max: 400 }),
        fc.double({ min: 1e-6, max: 10, noNaN: true }),
        fc.double({ min: -100, max: 100, noNaN: true }),
        fc.infiniteStream(fc.double({ min: -0.1, max: 0.1, noNaN: true })),
        (length, step, origin, jitter) => {
          const times = Float64Array.from({ length }, (_, index) => {
            const inner = index === 0 || index === length - 1 ? 0 : jitter.next().value;
            return origin + (index + inner) * step;
          });
          const base = timeBase(times, (time) => Math.abs(time) * 2 ** -40);
          expect(base).toMatchObject({ ok: true, samples: length, places: null });
          // A jitter of a tenth of a step leaves the rate uncertain by two tenths of a step over the whole.
          if (base.ok) expect(Math.abs(base.rate * step - 1)).toBeLessThan(0.25 / (length - 1));
        },
      ),
      { seed: 9, numRuns: 300 },
    );
  });

  test('samples taken out are found where they were', () => {
    fc.assert(
      fc.property(
        fc.integer({ min: 50, max: 300 }),
        fc.uniqueArray(fc.integer({ min: 2, max: 47 }), { minLength: 1, maxLength: 6 }),
        (length, missing) => {
          const all = Array.from({ length }, (_, index) => index);
          const kept = all.filter((index) => !missing.includes(index));
          const base = timeBase(
            Float64Array.from(kept, (index) => 3 + index * 5e-5),
            exact,
          );
          expect(base).toMatchObject({ ok: true, samples: length });
          if (!base.ok) return;
          const spreadOut = spread(Float64Array.from(kept), base.places, base.samples);
          expect([...spreadOut.keys()].filter((index) => Number.isNaN(spreadOut[index]!))).toEqual(
            missing.toSorted((a, b) => a - b),
          );
        },
      ),
      { seed: 10, numRuns: 200 },
    );
  });

  test('a step that changes is refused with the place', () => {
    const times = Float64Array.from({ length: 100 }, (_, index) => (index < 60 ? index : 60 + (index - 60) * 1.4));
    expect(timeBase(times, exact)).toMatchObject({ ok: false });
  });
});
