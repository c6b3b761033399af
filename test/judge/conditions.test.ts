import { describe, expect, test } from 'vitest';
import type { Reading } from '../../pipeline/measure/types.ts';
import { finding, judged, type Made, outcome, read, spike, sweep } from './made.ts';

const six = (change: (number: number) => Parameters<typeof sweep>[1]) =>
  [0, 1, 2, 3, 4, 5].map((number) => sweep(number, change(number)));
const silentSweeps = six(() => ({ spikes: [] }));

/** Check, quantity, values with the outcome expected, and what else the cell is like. */
const ladders: [string, string, [number, string][], Made?][] = [
  [
    'rise-samples',
    'rise_samples',
    [
      [14, 'within'],
      [5.5, 'within'],
      [5, 'near limit'],
      [4.6, 'near limit'],
      [4, 'outside'],
      [0, 'outside'],
    ],
  ],
  // 8 kHz · 84 mV / 0.66 = 1018 V/s ± 10 %.
  [
    'filter-passes-rise',
    'max_rise_v_per_s',
    [
      [380, 'within'],
      [950, 'near limit'],
      [1100, 'near limit'],
      [1130, 'outside'],
    ],
  ],
  // The stated corner is 8 kHz; a third above and below, 10.64 and 6.02 kHz.
  [
    'filter-as-stated',
    'filter_corner_khz',
    [
      [5, 'outside'],
      [8, 'within'],
      [10, 'within'],
      [12, 'outside'],
    ],
  ],
  // 400 µs/8 = 50 µs ± 10 %.
  [
    'filter-below-sampling',
    'sample_interval_us',
    [
      [20, 'within'],
      [45, 'within'],
      [46, 'near limit'],
      [55, 'near limit'],
      [56, 'outside'],
    ],
  ],
  [
    'access-resistance',
    'access_resistance_mohm',
    [
      [14, 'within'],
      [35, 'within'],
      [35.1, 'outside'],
    ],
  ],
  [
    'access-change',
    'access_change_percent',
    [
      [8, 'within'],
      [-29, 'within'],
      [31, 'outside'],
      [-40, 'outside'],
    ],
  ],
  // 2 mV over 150 pA = 13.3 MΩ.
  [
    'bridge-error',
    'bridge_error_mohm',
    [
      [0.4, 'within'],
      [-13, 'within'],
      [13.4, 'outside'],
      [-20, 'outside'],
    ],
  ],
  [
    'clipping',
    'clipped_fraction',
    [
      [0, 'within'],
      [0.0001, 'outside'],
    ],
  ],
  [
    'missing',
    'missing_fraction',
    [
      [0, 'within'],
      [0.05, 'within'],
      [0.051, 'outside'],
    ],
  ],
  [
    'mains-hum',
    'mains_hum_mv',
    [
      [0.08, 'within'],
      [0.6, 'outside'],
    ],
  ],
  [
    'noise',
    'noise_rms_mv',
    [
      [0.1, 'within'],
      [0.51, 'outside'],
    ],
  ],
  // Sweeps of 1 s: ± 0.25 Hz of resolution about 49 to 51 Hz.
  [
    'hum-frequency',
    'mains_hum_hz',
    [
      [50, 'within'],
      [50.8, 'near limit'],
      [51.2, 'near limit'],
      [51.3, 'outside'],
      [40, 'outside'],
    ],
  ],
  // One step within two intervals of 20 µs: 10 V/s · 40 µs = 0.4 mV.
  [
    'quantization',
    'quantum_mv',
    [
      [0.03, 'within'],
      [0.41, 'outside'],
    ],
  ],
  // Six sweeps over one minute: 5 mV/min.
  [
    'drift',
    'drift_mv_per_min',
    [
      [0.1, 'within'],
      [4.9, 'within'],
      [-5.1, 'outside'],
      [7, 'outside'],
    ],
  ],
  [
    'baseline-negative',
    'resting_potential_mv',
    [
      [-79, 'within'],
      [-1, 'near limit'],
      [1, 'near limit'],
      [3, 'outside'],
      [71, 'outside'],
    ],
  ],
  [
    'no-cell',
    'resting_potential_mv',
    [
      [-79, 'within'],
      [-30, 'within'],
      [-16, 'near limit'],
      [-5, 'outside'],
      [0, 'outside'],
    ],
    { sweeps: silentSweeps },
  ],
];

test.each(ladders)('%s', (check, quantity, steps, cell = {}) =>
  expect(steps.map(([value]) => outcome(check, { ...cell, readings: { [quantity]: read(value) } }))).toEqual(
    steps.map(([, expected]) => expected),
  ),
);

test.each(ladders)(
  '%s says not measured, with the reason, where the number is missing',
  (check, quantity, _steps, cell = {}) => {
    const found = finding(check, {
      ...cell,
      without: ['baseline_mv'],
      sweeps: (cell.sweeps ?? six(() => ({}))).map((one) => ({
        ...one,
        spikes: one.spikes.map((own) => ({ ...own, values: {} })),
        readings: {},
      })),
      readings: { [quantity]: { value: null, why: 'fact-missing', missing: ['rate_hz'] } },
    });
    expect(found).toMatchObject({ outcome: 'not measured', value: null, limit_low: null, limit_high: null });
    expect(found.sentence).toBe(
      `${found.sentence.split(' was not judged')[0]} was not judged: a fact is missing. State “rate_hz” to have it judged.`,
    );
    expect(found.missing).toEqual(['rate_hz']);
  },
);

test('the spread of an extreme says nothing of how well it is known', () =>
  expect(
    finding('rise-samples', { readings: { rise_samples: read(27, { n: 2, sd: 8, at: { sweep: 1 } }) } }),
  ).toMatchObject({
    outcome: 'within',
    uncertainty: 0.5,
    sentence:
      'The smallest number of samples from threshold to peak (sweep 1), 27, stays 22 above the 5 samples that a rise needs.',
  }));

describe('facts a check needs', () => {
  test.each([
    ['filter-passes-rise', { filter_khz: null }, ['filter_khz']],
    ['filter-below-sampling', { filter_khz: null }, ['filter_khz']],
  ] as const)('%s', (check, changes, missing) =>
    expect(finding(check, { circumstances: changes })).toMatchObject({ outcome: 'not measured', missing }),
  );
  test('access of an unstated configuration is not called high', () =>
    expect(
      finding('access-resistance', {
        circumstances: { configuration: null },
        readings: { access_resistance_mohm: read(60) },
      }),
    ).toMatchObject({ outcome: 'not measured', missing: ['configuration'] }));
  test('a sharp electrode has no access limit', () =>
    expect(outcome('access-resistance', { circumstances: { configuration: 'sharp' } })).toBe('silent'));
  test('mains not stated: the nearer of 50 and 60 Hz', () => {
    const hum = (hz: number) =>
      outcome('hum-frequency', { circumstances: { mains_hz: null }, readings: { mains_hum_hz: read(hz) } });
    expect([hum(50), hum(60.1), hum(62.5)]).toEqual(['within', 'within', 'outside']);
  });
  test('a hum too weak to have a frequency', () =>
    expect(outcome('hum-frequency', { readings: { mains_hum_mv: read(0.01), mains_hum_hz: read(41) } })).toBe(
      'not measured',
    ));
  test('the hum of the sweeps that show it counts, not that of the others', () => {
    const shown = (mv: number) =>
      six((number) => ({
        readings: { mains_hum_mv: read(number === 2 ? mv : 0.03), ...(number === 2 && { mains_hum_hz: read(40) }) },
      }));
    const hum = (mv: number) =>
      outcome('hum-frequency', {
        sweeps: shown(mv),
        readings: { mains_hum_hz: read(40), mains_hum_mv: read(0.03, { n: 6 }) },
      });
    expect([hum(0.35), hum(0.04)]).toEqual(['outside', 'not measured']);
  });
  test('drift without clock times', () =>
    expect(outcome('drift', { sweeps: six(() => ({ since_start_s: null })) })).toBe('not measured'));
  test('a longer recording must drift less: 5 mV over 10 min', () => {
    const long = (drift: number) =>
      outcome('drift', {
        sweeps: six((number) => ({ since_start_s: number * 120 })),
        readings: { drift_mv_per_min: read(drift) },
      });
    expect([long(0.4), long(0.6)]).toEqual(['within', 'outside']);
  });
});

describe('where current flows', () => {
  test('a tenth of the access resistance is allowed where that is more', () => {
    const sweeps = six(() => ({ readings: { stimulus_pa: read(2000) } }));
    const bridge = (error: number) => outcome('bridge-error', { sweeps, readings: { bridge_error_mohm: read(error) } });
    // 2 mV over 2 nA is 1 MΩ; a tenth of 14 MΩ is 1.4 MΩ.
    expect([bridge(1.3), bridge(1.5)]).toEqual(['within', 'outside']);
  });
  test('without a bridge the access counts in full: 10 mV over 500 pA is 20 MΩ', () => {
    const sweeps = six(() => ({ readings: { stimulus_pa: read(500) } }));
    const access = (mohm: number) =>
      outcome('access-times-current', {
        sweeps,
        without: ['bridge_error_mohm'],
        circumstances: { bridge_mohm: null },
        readings: { access_resistance_mohm: read(mohm) },
      });
    expect([access(14), access(21)]).toEqual(['within', 'outside']);
  });
  test('with a bridge that check has nothing to say', () => expect(outcome('access-times-current')).toBe('silent'));
  test('in voltage clamp the holding current counts', () => {
    const sweeps = six(() => ({ clamp: 'voltage', spikes: [], readings: { holding_current_pa: read(-900) } }));
    expect(outcome('access-times-current', { sweeps, readings: { access_resistance_mohm: read(14) } })).toBe('outside');
  });
});

test('a brief pulse is over before its spike and does not count', () => {
  const pulse = { ...sweep(0).stimulus, end_s: 0.202 };
  const sweeps = six(() => ({ stimulus: pulse, readings: { stimulus_pa: read(3000) } }));
  expect(
    outcome('access-times-current', { sweeps, without: ['bridge_error_mohm'], circumstances: { bridge_mohm: null } }),
  ).toBe('silent');
});

test('rundown: 10 % over the 600 spikes fired is 1.67 % per 100', () => {
  const sweeps = six(() => ({ spikes: Array.from({ length: 100 }, (_, index) => spike(index)) }));
  const rundown = (value: number) =>
    outcome('height-rundown', { sweeps, readings: { height_rundown_percent_per_100_spikes: read(value) } });
  expect([rundown(-1.6), rundown(-1.7), rundown(2)]).toEqual(['within', 'outside', 'outside']);
  const sentence = (value: number, more: Record<string, Reading>) =>
    finding('height-rundown', {
      sweeps,
      readings: { height_rundown_percent_per_100_spikes: read(value, { u95: 0.01 }), ...more },
    }).sentence;
  const alone = { expected_rundown_percent_per_100_spikes: read(-1.2, { u95: 0.9 }) };
  expect(sentence(-2.5, alone)).toMatch(
    /sodium that firing brings in would explain −1\.20? %? ?± 0\.90? % of it, without pump/,
  );
  const both = { ...alone, dialysed_rundown_percent_per_100_spikes: read(-0.3, { u95: 0.3 }) };
  expect(sentence(-2.5, both)).toMatch(/−0\.30? .* with the pipette’s exchange\./);
  expect(sentence(2.5, both)).not.toMatch(/sodium/);
  expect(sentence(-2.5, {})).not.toMatch(/sodium/);
});

describe('no cell', () => {
  test('a cell that fires is there, wherever it rests', () =>
    expect(outcome('no-cell', { readings: { resting_potential_mv: read(-5) } })).toBe('silent'));
  test('an empty pipette is unsound', () =>
    expect(judged({ sweeps: silentSweeps, readings: { resting_potential_mv: read(-0.5) } }).standing).toBe('unsound'));
});

describe('checks of every sweep', () => {
  const clipped = six((number) => ({ readings: { clipped_fraction: read(number === 2 ? 0.01 : 0) } }));
  test('one finding for the sweep that is outside, none for the others, and a summary that counts them', () => {
    const found = judged({ sweeps: clipped, readings: { clipped_fraction: read(0.0017) } }).findings.filter(
      (one) => one.check === 'clipping',
    );
    expect(found.map((one) => [one.sweep, one.outcome])).toEqual([
      [null, 'outside'],
      [2, 'outside'],
    ]);
    expect(found[0]!.sentence).toMatch(/Outside in 1 of 6 sweeps\.$/);
  });
  test('without a number for the cell the median over the sweeps stands in', () =>
    expect(
      finding('noise', { without: ['noise_rms_mv'], sweeps: six(() => ({ readings: { noise_rms_mv: read(0.9) } })) }),
    ).toMatchObject({
      outcome: 'outside',
      value: 0.9,
    }));
  test('the climbing baseline of a pacemaker is no drift', () => {
    const sweeps = six(() => ({
      spikes: [spike(0, { peak_at_s: 0.1 })],
      readings: { baseline_drift_mv_per_s: read(40) },
    }));
    expect(outcome('baseline-drift', { sweeps })).toBe('silent');
    expect(
      outcome('baseline-drift', { sweeps: six(() => ({ readings: { baseline_drift_mv_per_s: read(40) } })) }),
    ).toBe('outside');
  });
});

// Maximum rise, height (mV) and filter corner (kHz) of three published model spikes behind a 4-pole Bessel filter, and the
// share of the maximum rise lost; computed with SciPy from the equations of Hodgkin & Huxley 1952 (6.3 °C), Pospischil et
// al. 2008 (regular spiking, 36 °C) and Wang & Buzsáki 1996, sampled at 100 kHz.
describe('the limit of the filter is where a quarter of the maximum rise is lost', () => {
  test.each([
    ['Hodgkin–Huxley, 1 kHz: 40 % lost', 187.7, 100.4, 1, true],
    ['Hodgkin–Huxley, 2 kHz: 18 % lost', 256.4, 104.0, 2, false],
    ['Hodgkin–Huxley, 5 kHz: 4 % lost', 299.3, 105.1, 5, false],
    ['regular spiking, 2 kHz: 38 % lost', 351.9, 87.4, 2, true],
    ['regular spiking, 5 kHz: 12 % lost', 498.0, 88.6, 5, false],
    ['regular spiking, 10 kHz: 4 % lost', 545.0, 88.8, 10, false],
    ['Wang–Buzsáki, 2 kHz: 41 % lost', 305.0, 76.0, 2, true],
    ['Wang–Buzsáki, 5 kHz: 16 % lost', 434.4, 78.4, 5, false],
    ['Wang–Buzsáki, 10 kHz: 6 % lost', 484.8, 78.8, 10, false],
  ])('%s', (_name, rise, height, corner, lost) => {
    const found = finding('filter-passes-rise', {
      circumstances: { filter_khz: corner },
      readings: { max_rise_v_per_s: read(rise), spike_height_mv: read(height) },
    });
    expect(found.outcome).toBe(lost ? 'outside' : 'within');
  });
});
