/**
 * How often the pipeline finds published models firing in a step of 1 s, against counts and intervals computed apart
 * (SciPy's DOP853 and LSODA, see squid.test.ts and cortical.test.ts), and the spike times of bursting and low-threshold
 * cells from an independent implementation.
 */
import { describe, expect, test } from 'vitest';
import { integrator } from '../../content-sample/generate/integrate.ts';
import { bursting2008, corticalCell, cylinderCm2, lowThreshold2008 } from '../../content-sample/generate/models.ts';
import { hodgkinHuxley, type Model, pospischil, simulate, wangBuzsaki } from '../helpers/models.ts';
import { measure, near, numberOf, pf } from './traces.ts';

const fs = pospischil('FS');
const wb = wangBuzsaki();
const ofPa = (pa: number): number => pa / fs.capacitance_pf;

// [name, model, capacitance, density, spikes, last cycle ms].
test.each<[string, Model, number, number, number, number]>([
  ['Hodgkin–Huxley at 6.5 µA/cm²', hodgkinHuxley(), pf, 6.5, 55, 18.16],
  ['Hodgkin–Huxley at 8', hodgkinHuxley(), pf, 8, 63, 16.005],
  ['Hodgkin–Huxley at 12', hodgkinHuxley(), pf, 12, 73, 13.715],
  ['Hodgkin–Huxley at 20', hodgkinHuxley(), pf, 20, 87, 11.565],
  ['Hodgkin–Huxley at 40', hodgkinHuxley(), pf, 40, 109, 9.21],
  ['Hodgkin–Huxley at 80', hodgkinHuxley(), pf, 80, 137, 7.3],
  ['FS at 750 pA', fs, fs.capacitance_pf, ofPa(750), 94, 10.65],
  ['FS at 1500 pA', fs, fs.capacitance_pf, ofPa(1500), 182, 5.49],
  ['Wang & Buzsáki at 0.2 µA/cm²', wb, pf, 0.2, 8, 116],
  ['Wang & Buzsáki at 0.5', wb, pf, 0.5, 32, 31.04],
  ['Wang & Buzsáki at 3', wb, pf, 3, 135, 7.38],
  ['Wang & Buzsáki at 10', wb, pf, 10, 285, 3.51],
  ['Wang & Buzsáki at 15', wb, pf, 15, 352, 2.83],
  ['Wang & Buzsáki at 20', wb, pf, 20, 407, 2.46],
])('%s', (_, model, capacitance, density, count, cycle) => {
  const { spikes } = measure(
    simulate(model, 20_000, [
      [20, 0],
      [1000, density],
    ]),
    {},
    capacitance,
  );
  // A peak in the last tenth of a millisecond of the step may be counted or not.
  expect(Math.abs(spikes.length - count)).toBeLessThanOrEqual(count > 130 ? 1 : 0);
  near(numberOf(spikes.at(-3), 'cycle_length_ms') / cycle, 1, 0.006, 'cycle');
});

// Pospischil et al. 2008: upward crossings of 0 mV, ms; started at −84 mV, fixed-step solver of first order.
describe('bursting and low-threshold cells', () => {
  test.each([
    ['bursting', bursting2008, 500, 180, [617.725, 624.632, 631.101, 637.786, 644.909, 652.671, 661.42, 672.085]],
    ['low-threshold', lowThreshold2008, 400, 350, [431.423, 445.189, 517.237, 720.422]],
  ] as const)('%s, 0.15 nA', (_, parameters, wait, length, times) => {
    const model = corticalCell(parameters);
    const area = cylinderCm2(96);
    const run = integrator(model, model.stateAt(-84));
    const rateHz = 20_000;
    const n = ((wait + length) * rateHz) / 1000;
    const density = 0.15e-3 / area;
    const drive = Float64Array.from({ length: n }, (_unused, i) => (i >= (wait * rateHz) / 1000 ? density : 0));
    const mv = new Float64Array(n);
    for (let i = 0; i < n; i++) {
      mv[i] = run.state[0]!;
      for (let k = 0; k < 5; k++) run.step(0.01, drive[i]!, 0, 0);
    }
    const { spikes } = measure({ mv, drive, rateHz, edges_s: [wait / 1000] }, {}, area * 1e6);
    expect(spikes).toHaveLength(times.length);
    spikes.forEach((spike, k) => {
      // The peak follows the crossing of 0 mV by a few tenths of a millisecond, the threshold comes before it.
      const at = times[k]!;
      expect(numberOf(spike, 'threshold_at_s') * 1000).toBeLessThan(at + 0.25);
      near(numberOf(spike, 'peak_at_s') * 1000 - at, 0.2, 0.4, 'peak after the crossing');
    });
  });
});
