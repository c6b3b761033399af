/**
 * What the pipeline measures on models of cortical cells against what was computed apart.
 *
 * Values: Pospischil et al. 2008, Biol Cybern 99:427–441, and Wang & Buzsáki 1996, J Neurosci 16:6402–6413, integrated
 * with SciPy's LSODA at rtol 1e-9 and sampled every 0.01 ms; threshold at 10 V/s. The traces measured here come from this
 * project's own Runge–Kutta integration.
 */
import { describe, expect, test } from 'vitest';
import { measureCell } from '../../pipeline/measure/cell.ts';
import { crossing } from '../../pipeline/signal/index.ts';
import { type Model, pospischil, simulate, type Trace, wangBuzsaki } from '../helpers/models.ts';
import { cellContext, numbered, numberIn } from '../measure/made.ts';
import { measure, near, numberOf, pf } from './traces.ts';

interface Train {
  name: string;
  model: Model;
  pf: number;
  density: number;
  /** Of the first spike: peak, its time after the onset ms, rise, threshold at 10 V/s, fall, half-width, minimum. */
  first: [number, number, number, number, number, number, number];
  spikes: number;
  cycles: [number, number];
  adaptation: number;
  cv: number;
  lv: number;
}
const rs = pospischil('RS');
const fs = pospischil('FS');
const wb = wangBuzsaki();
const ofCell = (name: string, cell: typeof rs, pa: number): Pick<Train, 'name' | 'model' | 'pf' | 'density'> => ({
  name: `${name}, ${pa} pA`,
  model: cell,
  pf: cell.capacitance_pf,
  density: pa / cell.capacitance_pf,
});
const ofWb = (density: number): Pick<Train, 'name' | 'model' | 'pf' | 'density'> => ({
  name: `Wang & Buzsáki 1996, ${density} µA/cm²`,
  model: wb,
  pf,
  density,
});
const trains: Train[] = [
  {
    ...ofCell('Pospischil RS', rs, 750),
    first: [47.11111, 20.72, 564.28261, -41.75328, -126.12514, 0.70318, -67.55858],
    spikes: 9,
    cycles: [27.96, 155.15],
    adaptation: 0.11938,
    cv: 0.50486,
    lv: 0.09159,
  },
  {
    ...ofCell('Pospischil RS', rs, 1000),
    first: [47.24947, 12.49, 565.71644, -41.97911, -126.14536, 0.70714, -66.8774],
    spikes: 29,
    cycles: [15.14, 39.16],
    adaptation: 0.01758,
    cv: 0.23079,
    lv: 0.00245,
  },
  {
    ...ofCell('Pospischil RS', rs, 1500),
    first: [47.47, 7.4, 567.75243, -42.47011, -126.19376, 0.71429, -65.64824],
    spikes: 70,
    cycles: [9.06, 14.97],
    adaptation: 0.00369,
    cv: 0.10552,
    lv: 0.00016,
  },
  {
    ...ofCell('Pospischil FS', fs, 500),
    first: [45.77465, 17.19, 561.04892, -41.65326, -156.62227, 0.56477, -74.63761],
    spikes: 49,
    cycles: [20.17, 20.17],
    adaptation: 0,
    cv: 0.0001,
    lv: 0,
  },
  {
    ...ofCell('Pospischil FS', fs, 1000),
    first: [46.40088, 5.7, 565.58568, -42.67396, -157.37477, 0.57764, -72.78864],
    spikes: 128,
    cycles: [7.84, 7.81],
    adaptation: -2e-5,
    cv: 0.00066,
    lv: 0,
  },
  {
    ...ofWb(0.3),
    first: [23.53977, 45.18, 388.32249, -46.99839, -156.10984, 0.50954, -66.89809],
    spikes: 18,
    cycles: [55.14, 55.14],
    adaptation: 0,
    cv: 7e-5,
    lv: 0,
  },
  {
    ...ofWb(1),
    first: [26.76204, 11.91, 441.56677, -47.70115, -164.66126, 0.50301, -66.69028],
    spikes: 59,
    cycles: [16.76, 16.75],
    adaptation: -1e-5,
    cv: 8e-5,
    lv: 0,
  },
  {
    ...ofWb(2),
    first: [30.6775, 6.45, 516.2717, -48.63238, -174.34196, 0.49655, -66.46563],
    spikes: 102,
    cycles: [9.85, 9.83],
    adaptation: -1e-5,
    cv: 0.00057,
    lv: 0,
  },
  {
    ...ofWb(5),
    first: [37.05397, 3.04, 668.67684, -50.96952, -187.57671, 0.49327, -65.40073],
    // The reference counts 189: it leaves out the last peak, 0.1 ms before the end of the step.
    spikes: 190,
    cycles: [5.39, 5.27],
    adaptation: -6e-5,
    cv: 0.00186,
    lv: 0,
  },
];

/** Largest central difference before a time, V/s. */
function steepest(trace: Trace, before_ms: number): number {
  let largest = 0;
  for (let i = 1; i < Math.min(trace.mv.length - 1, (before_ms / 1000) * trace.rateHz); i++)
    largest = Math.max(largest, ((trace.mv[i + 1]! - trace.mv[i - 1]!) * trace.rateHz) / 2000);
  return largest;
}

describe('cortical models', () => {
  test.each(trains)('$name for 1 s', (train) => {
    const trace = simulate(train.model, 100_000, [
      [100, 0],
      [1000, train.density],
    ]);
    const { spikes, readings } = measure(trace, { rise_criterion_v_per_s: 10 }, train.pf);
    const [peak, at, rise, threshold, fall, width, minimum] = train.first;
    const first = spikes[0];
    expect(spikes).toHaveLength(train.spikes);
    near(numberOf(first, 'peak_mv'), peak, 0.05, 'peak');
    near(numberOf(first, 'peak_at_s') * 1000 - 100, at, 0.015, 'peak time');
    // The reference's maximum is a central difference over 20 µs, which blunts the sharpest rises by 2 %: it is met by the
    // same difference here. What is measured is held to the model's own slope.
    near(steepest(trace, at + 100) / rise, 1, 0.002, 'rise as in the reference');
    const sharp = simulate(train.model, 1_600_000, [
      [1, 0],
      [at + 0.5, train.density],
    ]);
    near(numberOf(first, 'max_rise_v_per_s') / steepest(sharp, at + 1), 1, 0.004, 'rise');
    near(numberOf(first, 'threshold_mv'), threshold, 0.03, 'threshold');
    near(numberOf(first, 'max_fall_v_per_s') / fall, 1, 0.003, 'fall');
    near(numberOf(first, 'half_width_ms'), width, 0.001, 'half-width');
    near(numberOf(first, 'ahp_minimum_mv'), minimum, 0.01, 'minimum');
    near(numberOf(first, 'cycle_length_ms'), train.cycles[0], 0.015, 'first cycle');
    near(numberOf(spikes.at(-2), 'cycle_length_ms') / train.cycles[1], 1, 0.003, 'last cycle');
    near(numberIn(readings, 'mean_rate_hz'), train.spikes, 1e-6, 'rate');
    near(numberIn(readings, 'interval_adaptation'), train.adaptation, 3e-4, 'adaptation');
    near(numberIn(readings, 'interval_cv'), train.cv, 3e-3, 'CV');
    near(numberIn(readings, 'interval_lv'), train.lv, 5e-4, 'Lv');
  });

  // Rheobase in 1 s: RS 560.42, FS 384.18 pA; Wang & Buzsáki in 2 s 0.16026 µA/cm².
  test.each([
    ['RS', rs, 560.0 / rs.capacitance_pf, 560.9 / rs.capacitance_pf, 1000],
    ['FS', fs, 383.8 / fs.capacitance_pf, 384.6 / fs.capacitance_pf, 1000],
    ['Wang & Buzsáki', wb, 0.16, 0.1606, 2000],
  ] as const)('%s fires on one side of its rheobase and not on the other', (_, model, below, above, ms) => {
    const counts = [below, above].map(
      (density) =>
        measure(
          simulate(model, 10_000, [
            [20, 0],
            [ms, density],
          ]),
        ).spikes.length,
    );
    expect(counts[0]).toBe(0);
    expect(counts[1]).toBeGreaterThan(0);
  });

  // −0.1 nA for 1 s, mean of the last 100 ms; exponential over the first 150 ms of it.
  test.each([
    ['RS', rs, -70.571233, 32.526295, -73.823863, -73.915851],
    ['FS', fs, -69.999994, 47.272632, -74.727257, -74.727257],
  ] as const)(
    '%s: rest, input resistance, steady and lowest potential of a step',
    (_, model, rest, resistance, steady, lowest) => {
      const trace = simulate(model, 20_000, [
        [300, 0],
        [1000, -100 / model.capacitance_pf],
        [100, 0],
      ]);
      const sweep = measure(trace, {}, model.capacitance_pf);
      const readings = measureCell([numbered(sweep, 0)], () => cellContext()).conditions[0]!.readings;
      near(numberIn(readings, 'resting_potential_mv'), rest, 0.001, 'rest');
      near(numberIn(readings, 'input_resistance_mohm') / resistance, 1, 0.001, 'input resistance');
      near(numberIn(sweep.readings, 'steady_deflection_mv'), steady - rest, 0.005, 'steady');
      near(numberIn(sweep.readings, 'largest_deflection_mv'), lowest - rest, 0.01, 'largest');
    },
  );

  // Upward crossings of 0 mV under 0.5 nA from 300 ms on, started at rest (−70 mV).
  test('spike times of FS, by the crossing of 0 mV', () => {
    const trace = simulate(fs, 100_000, [
      [300, 0],
      [200, 500 / fs.capacitance_pf],
    ]);
    let from = 0;
    for (const expected of [317.021, 337.1918, 357.3622, 377.5326, 397.703, 417.8735, 438.0439, 458.2143]) {
      const at = crossing(trace.mv, 0, { from, to: trace.mv.length - 1, direction: 'up' })!;
      near(at / 100, expected, 0.01, 'crossing');
      from = Math.ceil(at) + 1;
    }
  });
});
