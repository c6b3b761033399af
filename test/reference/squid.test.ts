/**
 * What the pipeline measures on the Hodgkin–Huxley membrane against what was computed apart.
 *
 * Values: Hodgkin & Huxley 1952, J Physiol 117:500–544 (constants from memory, corroborated by many implementations),
 * integrated with SciPy's DOP853 at rtol 1e-10 (1e-9 for steps), sampled every 0.001 ms (0.005 ms for steps). Three
 * integrators agree on the peaks to 1e-6 mV. The traces measured here come from this project's own Runge–Kutta
 * integration.
 */
import { describe, expect, test } from 'vitest';
import { measureCell } from '../../pipeline/measure/cell.ts';
import { hodgkinHuxley, simulate } from '../helpers/models.ts';
import { cellContext, numbered, numberIn } from '../measure/made.ts';
import { measure, near, numberOf } from './traces.ts';

describe('Hodgkin & Huxley 1952', () => {
  test('rest, and the resistance near it: −64.99638 mV and 0.85698 kΩ·cm²', () => {
    const sweeps = [-0.06, -0.04, -0.02].map((density, k) =>
      numbered(
        measure(
          simulate(hodgkinHuxley(), 20_000, [
            [100, 0],
            [400, density],
            [100, 0],
          ]),
        ),
        k,
      ),
    );
    const readings = measureCell(sweeps, () => cellContext()).conditions[0]!.readings;
    near(numberIn(readings, 'resting_potential_mv'), -64.99637933, 1e-4, 'rest');
    // mV per µA/cm² over 100 cm²·10⁻⁶ (100 pF): 0.85698 kΩ·cm² is 8.5698 MΩ; even 0.05 mV bend the line a little.
    near(numberIn(readings, 'input_resistance_mohm'), 8.5698, 0.06, 'resistance');
  });

  // [°C, peak, from rest, steepest rise, steepest fall, minimum after it]: 40 µA/cm² for 0.5 ms.
  test.each([
    [6.3, 40.75367, 105.75005, 314.41674, -68.99626, -76.18366],
    [10, 39.35595, 104.35233, 389.05759, -89.74562, -76.08193],
    [12, 38.25829, 103.25467, 431.81887, -102.45374, -75.99991],
    [18.5, 31.98656, 96.98294, 563.19896, -198.8173, -75.49297],
    [20, 29.69217, 94.68855, 585.82343, -231.20552, -75.29036],
    // At 25 °C the pulse ends on the rise, whose steepest point it hides.
    [25, 18.57146, 83.56784, null, -343.92101, -74.17638],
  ])('a pulse at %d °C', (celsius, peak, height, rise, fall, minimum) => {
    const model = hodgkinHuxley(celsius);
    const { spikes } = measure(
      simulate(model, 200_000, [
        [5, 0],
        [0.5, 40],
        [25, 0],
      ]),
    );
    expect(spikes).toHaveLength(1);
    near(numberOf(spikes[0], 'peak_mv'), peak, 0.005, 'peak');
    near(numberOf(spikes[0], 'height_from_rest_mv'), height, 0.01, 'height from rest');
    if (rise !== null) near(numberOf(spikes[0], 'max_rise_v_per_s') / rise, 1, 0.005, 'rise');
    near(numberOf(spikes[0], 'max_fall_v_per_s') / fall, 1, 0.003, 'fall');
    near(numberOf(spikes[0], 'ahp_minimum_mv'), minimum, 0.01, 'minimum');
  });

  // [density, spikes, latency to the first peak ms, first and last peak, first and last cycle ms, last minimum, first and
  // last rise]: steps of 1 s from rest.
  test.each([
    [6.2, 3, 2.815, 39.4739, 26.9978, 18.93, 19.875, -75.3417, 299.992, 196.348],
    [6.3, 53, 2.785, 39.5046, 28.3324, 18.595, 19.095, -75.3055, 300.228, 205.118],
    [7, 59, 2.615, 39.6903, 30.6772, 17.275, 17.145, -75.2547, 302.079, 221.485],
    [10, 69, 2.14, 40.2628, 30.4297, 14.93, 14.64, -74.8962, 307.895, 219.402],
    [15, 79, 1.735, 40.8659, 27.9484, 13.13, 12.715, -74.2628, 313.844, 201.928],
    [30, 99, 1.245, 41.9528, 19.2697, 10.8, 10.13, -72.262, 323.623, 151.029],
    [60, 125, 0.91, 43.3997, 1.6654, 9.055, 8.035, -67.7955, 335.05, 78.654],
  ])(
    'a step of %d µA/cm² for 1 s',
    (density, count, latency, peak, lastPeak, cycle, lastCycle, minimum, rise, lastRise) => {
      const { spikes, readings } = measure(
        simulate(hodgkinHuxley(), 50_000, [
          [20, 0],
          [1000, density],
        ]),
      );
      expect(spikes).toHaveLength(count);
      const last = spikes.at(-1);
      near(numberOf(spikes[0], 'peak_at_s') * 1000 - 20, latency, 0.01, 'latency');
      near(numberOf(spikes[0], 'peak_mv'), peak, 0.02, 'first peak');
      near(numberOf(last, 'peak_mv'), lastPeak, 0.1, 'last peak');
      near(numberOf(spikes[0], 'cycle_length_ms'), cycle, 0.02, 'first cycle');
      near(numberOf(spikes.at(-2), 'cycle_length_ms'), lastCycle, 0.05, 'last cycle');
      near(numberOf(spikes.at(-2), 'ahp_minimum_mv'), minimum, 0.1, 'last minimum');
      near(numberOf(spikes[0], 'max_rise_v_per_s') / rise, 1, 0.015, 'first rise');
      near(numberOf(last, 'max_rise_v_per_s') / lastRise, 1, 0.01, 'last rise');
      near(numberIn(readings, 'mean_rate_hz'), count, 1e-6, 'rate');
    },
  );
  test('2 µA/cm² gives none, 4 one, 6 two', () => {
    const counts = [2, 4, 6].map(
      (density) =>
        measure(
          simulate(hodgkinHuxley(), 20_000, [
            [20, 0],
            [300, density],
          ]),
        ).spikes.length,
    );
    expect(counts).toEqual([0, 1, 2]);
  });

  // Smallest displacement that fires 6.505071 mV; rheobase for one spike within 60 ms 2.240334, for 20 or more in 1 s
  // 6.258789 µA/cm².
  test('all or none on either side of the least displacement and of both rheobases', () => {
    const jump = (mv: number): number => measure(simulate(hodgkinHuxley(), 50_000, [[25, 0]], mv)).spikes.length;
    expect([6.504, 6.506].map(jump)).toEqual([0, 1]);
    const step = (density: number, ms: number): number =>
      measure(
        simulate(hodgkinHuxley(), 20_000, [
          [10, 0],
          [ms, density],
        ]),
      ).spikes.length;
    expect([2.2398, 2.2408].map((density) => step(density, 60))).toEqual([0, 1]);
    expect([6.2578, 6.2598].map((density) => step(density, 1000) >= 20)).toEqual([false, true]);
  });

  test('10 µA/cm² from the first sample on: the four peaks on which three integrators agree', () => {
    const trace = simulate(hodgkinHuxley(), 200_000, [[60, 10]]);
    const { spikes } = measure(trace);
    [
      [40.263919, 2.138],
      [30.850583, 17.072],
      [30.462421, 31.722],
      [30.433248, 46.359],
    ].forEach(([mv, ms], k) => {
      near(numberOf(spikes[k], 'peak_mv'), mv!, 0.001, 'peak');
      near(numberOf(spikes[k], 'peak_at_s') * 1000, ms!, 0.002, 'peak time');
    });
  });
});
