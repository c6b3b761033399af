import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { judgeCell } from '../../pipeline/judge/judge.ts';
import { finding, judged, type Made, made, outcome, read, spike, sweep } from './made.ts';

const recorded = { reading: 'recorded', ljp_applied_mv: 0 } as const;
const unstated = { ...recorded, junction: 'unstated' } as const;

/** Outcomes of one check for a list of values of one quantity. */
const ladder = (check: string, quantity: string, values: number[], cell: Made = {}) =>
  values.map((value) => outcome(check, { ...cell, readings: { ...cell.readings, [quantity]: read(value) } }));

describe('peak against E_Na', () => {
  const peaks = (values: number[], cell: Made = {}) => ladder('peak-below-sodium', 'peak_mv', values, cell);
  // E_Na +60.5 mV. By hand: offset 2, junction 1 (stated), ions 1, noise 1.96 · 0.1: root of squares 2.457, so the floor
  // of 3 mV holds.
  test('stated junction potential: 3 mV floor', () =>
    expect(peaks([32, 57.4, 57.6, 60.5, 63.4, 63.6, 72.4])).toEqual([
      'within',
      'within',
      'near limit',
      'near limit',
      'near limit',
      'outside',
      'outside',
    ]));
  // By hand: √(2² + 3.5² + 1² + 0.196²) = 4.1577 mV.
  test('computed junction potential widens the band', () => {
    expect(peaks([64.6, 64.7], { circumstances: { ljp_from: 'computed' } })).toEqual(['near limit', 'outside']);
    expect(finding('peak-below-sodium', { circumstances: { ljp_from: 'computed' } }).uncertainty).toBeCloseTo(
      4.1577,
      3,
    );
  });
  test('a spread of the peak widens it further: √(2² + 1² + 1² + 4²) = 4.69', () =>
    expect(
      finding('peak-below-sodium', { readings: { peak_mv: read(40, { n: 1, se: 4 / 1.96 }) } }).uncertainty,
    ).toBeCloseTo(4.6904, 3));
  test('junction unstated: outside only when the corrected reading is outside too', () =>
    expect(peaks([50, 70, 77.6, 78.9], { circumstances: unstated })).toEqual([
      'within',
      'near limit',
      'near limit',
      'outside',
    ]));
  test('a class that implies sodium stands in for spike_ion', () => {
    expect(outcome('peak-below-sodium', { circumstances: { spike_ion: null } })).toBe('within');
    expect(outcome('peak-below-sodium', { circumstances: { spike_ion: null, like: 'sinoatrial-node' } })).toBe(
      'not measured',
    );
  });
  test('a stated calcium spike beats the class', () =>
    expect(finding('peak-below-sodium', { circumstances: { spike_ion: 'mixed' } })).toMatchObject({
      outcome: 'not measured',
      missing: [],
    }));
  test('where no step fires the cell, the first spike of its first firing sweep is judged', () => {
    const sweeps = [sweep(0, { spikes: [] }), sweep(1, { spikes: [spike(0, { peak_mv: 75 })] })];
    const input = made({ sweeps, without: ['peak_mv'] });
    input.measure.conditions[0]!.reference_spike = null;
    const found = judgeCell(input).findings.find((one) => one.check === 'peak-below-sodium');
    expect(found).toMatchObject({ outcome: 'outside', value: 75, at_s: 0.31 });
    expect(found?.sentence).toMatch(/sweep 1/);
  });
  test('that spike’s own half-width counts: √(2² + 1² + 1² + 4²) = 4.69', () => {
    const sweeps = [sweep(0, { spikes: [{ ...spike(0, { peak_mv: 62 }), u95: { peak_mv: 4 } }] })];
    const input = made({ sweeps, without: ['peak_mv'] });
    const found = judgeCell(input).findings.find((one) => one.check === 'peak-below-sodium');
    expect(found).toMatchObject({ outcome: 'near limit', value: 62, value_u95: 4 });
    expect(found?.uncertainty).toBeCloseTo(4.6904, 3);
  });
  test('a half-width known to be nil is no reason to put the noise in its place', () =>
    expect(
      finding('peak-below-sodium', {
        readings: { peak_mv: read(40, { u95: 0 }), noise_rms_mv: read(3) },
      }).uncertainty,
    ).toBe(3));
  test('a median over spikes of a cell that no step fires is called so', () =>
    expect(
      finding('peak-below-sodium', { readings: { peak_mv: read(40, { n: 12, sd: 1, at: { sweep: 3 } }) } }).sentence,
    ).toBe('The median peak of the spikes, +40.0 ± 0.6 mV (n = 12), stays 20.5 mV below E_Na (+60.5 mV at 33 °C).'));
  test.each([
    ['configuration not stated', { configuration: null }, ['configuration']],
    ['a sharp electrode', { configuration: 'sharp' }, []],
    ['spike ion and class not stated', { spike_ion: null, like: 'any', class_id: null }, ['spike_ion', 'class']],
    ['bath not stated', { e_na: null, missing_e_na: ['bath'] }, ['bath']],
    ['pipette without sodium', { e_na: null, pipette_sodium_mm: 0 }, []],
    ['pipette that states no sodium', { pipette_sodium_mm: null }, ['pipette']],
  ] as const)('not measured: %s', (_name, changes, missing) => {
    const found = finding('peak-below-sodium', {
      circumstances: { ...changes } as Made['circumstances'],
      readings: { peak_mv: read(200) },
    });
    expect(found).toMatchObject({ outcome: 'not measured', value: null, margin: null, missing });
    expect(found.sentence).toMatch(/was not judged: .+\./);
  });
});

describe('minimum after the spike against E_K', () => {
  const minima = (values: number[], cell: Made = {}) => ladder('ahp-above-potassium', 'ahp_minimum_mv', values, cell);
  test('E_K −104 mV with the 3 mV floor', () =>
    expect(minima([-72, -100.9, -101.1, -104, -106.9, -107.1])).toEqual([
      'within',
      'within',
      'near limit',
      'near limit',
      'near limit',
      'outside',
    ]));
  test('junction unstated: outside only when the recorded reading is outside too', () =>
    expect(minima([-80, -95, -104, -108], { circumstances: unstated })).toEqual([
      'within',
      'near limit',
      'near limit',
      'outside',
    ]));
  const during = (holding: number | null, amplitude: number, at: number) =>
    outcome('ahp-above-potassium', {
      readings: { ahp_minimum_mv: read(-120) },
      sweeps: [
        sweep(0, {
          spikes: [spike(0, { peak_at_s: at })],
          stimulus: { ...sweep(0).stimulus, amplitude, holding },
          readings: { holding_pa: holding === null ? { value: null, why: 'holding-unknown' } : read(holding) },
        }),
      ],
    });
  test.each([
    ['a step that outweighs negative holding', -50, 150, 0.3, 'outside'],
    ['a step that does not', -200, 150, 0.3, 'not measured'],
    ['negative holding after the step', -50, 150, 0.8, 'not measured'],
    ['no holding after the step', 0, 150, 0.8, 'outside'],
    ['rebound within a negative step', 0, -100, 0.3, 'not measured'],
    ['negative current too small to matter (half a millivolt)', -5, 0, 0.1, 'outside'],
    ['unknown holding', null, 150, 0.3, 'not measured'],
  ] as const)('%s', (_name, holding, amplitude, at, expected) => expect(during(holding, amplitude, at)).toBe(expected));
  const train = Array.from({ length: 12 }, (_, index) => spike(index, { peak_at_s: 0.2 + index * 0.04 }));
  const oncePast = (gap: number | null) => {
    const sweeps = [
      sweep(0, { spikes: train, since_start_s: gap === null ? null : 0 }),
      sweep(1, { since_start_s: gap }),
    ];
    const input = made({ sweeps, readings: { ahp_minimum_mv: read(-120) } });
    input.measure.conditions[0]!.reference_spike = { sweep: 1, spike: 0 };
    return judgeCell(input).findings.find((one) => one.check === 'ahp-above-potassium')!.outcome;
  };
  test('not within 5 s after a train, and not right after one without clock times', () =>
    expect([oncePast(3), oncePast(6), oncePast(null)]).toEqual(['not measured', 'outside', 'not measured']));
});

describe('rest against E_K and E_Na', () => {
  test('below E_K', () =>
    expect(ladder('rest-above-potassium', 'resting_potential_mv', [-79, -103, -106, -108])).toEqual([
      'within',
      'near limit',
      'near limit',
      'outside',
    ]));
  test('sweeps right after a train are left out and said so', () => {
    const train = Array.from({ length: 12 }, (_, index) => spike(index, { peak_at_s: 0.2 + index * 0.04 }));
    const sweeps = [
      sweep(0, { spikes: train, readings: { baseline_mv: read(-80) } }),
      sweep(1, { since_start_s: 2, readings: { baseline_mv: read(-120) } }),
      sweep(2, { since_start_s: 14, readings: { baseline_mv: read(-82) } }),
    ];
    const found = finding('rest-above-potassium', { sweeps, readings: { resting_potential_mv: read(-120) } });
    expect(found).toMatchObject({ outcome: 'within', value: -81 });
    expect(found.sentence).toMatch(/Left out: 1 of 3 sweeps/);
  });
  test('only sweeps after trains: not judged', () => {
    const train = Array.from({ length: 12 }, (_, index) => spike(index, { peak_at_s: 0.2 + index * 0.04 }));
    const sweeps = [
      sweep(0, { spikes: train, readings: { holding_pa: read(-100) } }),
      sweep(1, { since_start_s: 2, readings: { baseline_mv: read(-120) } }),
    ];
    expect(outcome('rest-above-potassium', { sweeps, readings: { resting_potential_mv: read(-120) } })).toBe(
      'not measured',
    );
  });
  test('no rest, held with positive current: the baseline is judged', () => {
    const held = (pa: number) => ({
      without: ['resting_potential_mv'],
      sweeps: [sweep(0, { readings: { holding_pa: read(pa), baseline_mv: read(-115) } })],
    });
    expect(outcome('baseline-above-potassium', held(40))).toBe('outside');
    expect(outcome('baseline-above-potassium', held(-40))).toBe('not measured');
    expect(outcome('baseline-above-potassium')).toBe('silent');
  });
  test('a cell that fires by itself is judged on its diastolic potential', () => {
    const spontaneous = (holding: number) => ({
      sweeps: [sweep(0, { readings: { holding_pa: read(holding) } })],
      readings: { maximum_diastolic_potential_mv: read(-112) },
    });
    expect(outcome('diastolic-above-potassium', spontaneous(0))).toBe('outside');
    expect(outcome('diastolic-above-potassium', spontaneous(-80))).toBe('not measured');
  });
  test('an inverted recording rests above E_Na', () =>
    expect(outcome('rest-below-sodium', { readings: { resting_potential_mv: read(70) } })).toBe('outside'));
});

describe('what offset and junction cannot excuse', () => {
  test('height against E_Na − E_K = 164.5 mV', () =>
    expect(ladder('height-below-sodium-potassium', 'spike_height_mv', [84, 163, 167, 168, 840])).toEqual([
      'within',
      'near limit',
      'near limit',
      'outside',
      'outside',
    ]));
  test('an excursion that falls from the baseline first is no spike', () =>
    expect(
      ladder('spike-goes-up', 'height_from_rest_mv', [111, 60, 43, 10], { readings: { spike_height_mv: read(84) } }),
    ).toEqual(['within', 'within', 'near limit', 'outside']));
  test.each([
    ['input-resistance-positive', 'input_resistance_mohm'],
    ['membrane-capacitance-positive', 'membrane_capacitance_pf'],
    ['access-resistance-positive', 'access_resistance_mohm'],
  ])('%s', (check, quantity) => {
    const one = (value: number, se: number) => outcome(check, { readings: { [quantity]: read(value, { se }) } });
    expect([one(50, 2), one(1, 2), one(-1, 2), one(-50, 2)]).toEqual(['within', 'near limit', 'near limit', 'outside']);
  });
});

test('every physics check is silent or not measured, never within, where its number is missing', () => {
  const empty = made({ sweeps: [sweep(0, { spikes: [], readings: {} })] });
  empty.measure.conditions[0]!.readings = {};
  empty.sweeps[0]!.readings = {};
  for (const found of judgeCell(empty).findings)
    expect([found.check, found.outcome]).toEqual([found.check, 'not measured']);
});

test('moving potentials, E_Na and E_K together leaves every physics outcome of a potential', () => {
  const checks = ['peak-below-sodium', 'ahp-above-potassium', 'rest-above-potassium', 'height-below-sodium-potassium'];
  fc.assert(
    fc.property(
      fc.integer({ min: -40, max: 90 }),
      fc.integer({ min: -130, max: -60 }),
      fc.integer({ min: -30, max: 30 }),
      (peak, low, by) => {
        const at = (move: number) =>
          checks.map((check) =>
            outcome(check, {
              sweeps: [sweep(0)],
              readings: {
                peak_mv: read(peak + move),
                ahp_minimum_mv: read(low + move),
                resting_potential_mv: read(low + move),
              },
              circumstances: {
                e_na: { mv: 60 + move, uncertainty_mv: 1, inside_mm: 15, outside_mm: 150 },
                e_k: { mv: -104 + move, uncertainty_mv: 1, inside_mm: 135, outside_mm: 2.6 },
              },
            }),
          );
        expect(at(by)).toEqual(at(0));
      },
    ),
    { seed: 21, numRuns: 40 },
  );
});

test('the recorded reading of a stated junction potential is never judged twice', () =>
  expect(judged().findings.filter((one) => one.check === 'peak-below-sodium')).toHaveLength(1));
