import { describe, expect, it } from 'vitest';
import { measureCell } from '../../pipeline/measure/cell.ts';
import { quantizationError } from '../../pipeline/measure/passive.ts';
import { combinedError } from '../../pipeline/measure/reading.ts';
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import type { Readings } from '../../pipeline/measure/types.ts';
import { cellContext, input, neuron, normalNoise, numbered, numberIn, passiveSweep, signalOf } from './made.ts';

/** A sweep of 1.2 s, the potential by a formula of ms after onset (step 0.2 to 0.8 s), with noise. */
function sweepOf(pa: number, response: (ms: number) => number, noise_mv = 0.02, seed = 1) {
  const next = normalNoise(seed);
  const voltage = signalOf(1.2, 20000, (t) => -70 + response((t - 0.2) * 1000 + 1e-6) + noise_mv * next());
  const current = signalOf(1.2, 20000, (t) => (t >= 0.2 - 1e-9 && t < 0.8 - 1e-9 ? pa : 0));
  return measureSweep(input({ voltage, current }), { ...neuron, filter_khz: null });
}
const cellOf = (sweeps: ReturnType<typeof sweepOf>[]): Readings =>
  measureCell(
    sweeps.map((sweep, k) => numbered(sweep, k)),
    () => cellContext(),
  ).conditions[0]!.readings;

/** On and off answers of a linear membrane. */
const step = (onset: (ms: number) => number) => (ms: number) =>
  ms < 0 ? 0 : onset(ms) - (ms >= 600 ? onset(ms - 600) : 0);

describe('a response of two exponentials', () => {
  // passive_oracles.json of the reference values: −4 mV with 20 ms and −1 mV with 2 ms; the slow one is the membrane's.
  const response = step((ms) => -4 * (1 - Math.exp(-ms / 20)) - (1 - Math.exp(-ms / 2)));
  const readings = cellOf([1, 2, 3].map((seed) => sweepOf(-50, response, 0.02, seed)));
  it('gives both time constants, the slow one as the membrane’s', () => {
    expect(Math.abs(numberIn(readings, 'slow_time_constant_ms') - 20)).toBeLessThan(0.4);
    expect(Math.abs(numberIn(readings, 'fast_time_constant_ms') - 2)).toBeLessThan(0.3);
    expect(readings['membrane_time_constant_ms']!.value).toBe(readings['slow_time_constant_ms']!.value);
    expect(readings['membrane_time_constant_ms']!.note).toContain('slow one of two');
    expect(Math.abs(numberIn(readings, 'bridge_error_mohm'))).toBeLessThan(1);
  });
  it('and one exponential has no second', () => {
    const one = cellOf(
      [1, 2, 3].map((seed) =>
        sweepOf(
          -50,
          step((ms) => -5 * (1 - Math.exp(-ms / 20))),
          0.02,
          seed,
        ),
      ),
    );
    expect(one['fast_time_constant_ms']).toMatchObject({ value: null, why: 'unresolved' });
    expect(Math.abs(numberIn(one, 'membrane_time_constant_ms') - 20)).toBeLessThan(0.2);
  });
  it('and an electrode’s own charging is none of the cell’s', () => {
    // 0.3 ms of 8 MΩ: −0.4 mV at 50 pA.
    const slow = step((ms) => -5 * (1 - Math.exp(-ms / 20)) - 0.4 * (1 - Math.exp(-ms / 0.3)));
    const electrode = cellOf([1, 2, 3].map((seed) => sweepOf(-50, slow, 0.02, seed)));
    expect(Math.abs(numberIn(electrode, 'membrane_time_constant_ms') - 20)).toBeLessThan(0.3);
    expect(Math.abs(numberIn(electrode, 'bridge_error_mohm') - 8)).toBeLessThan(0.8);
  });
});

describe('sag and rebound', () => {
  // passive_oracles.json of the reference values: −70 at rest, −90 at the lowest, −85 mV in the end.
  const sagging = (ms: number): number => {
    if (ms < 0) return 0;
    if (ms < 600) return -20 * (1 - Math.exp(-ms / 5)) + 5 * (1 - Math.exp(-Math.max(0, ms - 80) / 30));
    return 4 * Math.exp(-(((ms - 700) / 60) ** 2)) - 15 * Math.exp(-(ms - 600) / 5);
  };
  const readings = cellOf([sweepOf(-200, sagging)]);
  it('in the stated convention, from which the others follow', () => {
    const sag = numberIn(readings, 'sag_fraction');
    expect(Math.abs(sag - 0.25)).toBeLessThan(0.01);
    expect(Math.abs(1 - sag - 0.75)).toBeLessThan(0.01);
    expect(Math.abs(1 / (1 - sag) - 4 / 3)).toBeLessThan(0.02);
    expect(Math.abs(numberIn(readings, 'sag_mv') - 5)).toBeLessThan(0.1);
  });
  it('rises above the baseline after the step', () => {
    expect(Math.abs(numberIn(readings, 'rebound_mv') - 4)).toBeLessThan(0.05);
    expect(readings['rebound_spikes']!.value).toBe(0);
  });
  it('are nothing in a passive cell, for all its noise', () => {
    const passive = cellOf([
      sweepOf(
        -150,
        step((ms) => -15 * (1 - Math.exp(-ms / 20))),
        0.5,
      ),
    ]);
    for (const id of ['sag_mv', 'rebound_mv']) {
      expect(Math.abs(numberIn(passive, id))).toBeLessThan(0.05);
      expect(passive[id]!.u95!).toBeLessThan(0.3);
    }
  });
});

it('rectification is the ratio of two slopes, 1 for a linear membrane', () => {
  const to = (mv: (pa: number) => number) =>
    numberIn(
      cellOf(
        [-200, -160, -120, -80, -40].map((pa, k) =>
          sweepOf(
            pa,
            step((ms) => mv(pa) * (1 - Math.exp(-ms / 15))),
            0.02,
            k + 1,
          ),
        ),
      ),
      'rectification_ratio',
    );
  expect(Math.abs(to((pa) => 0.1 * pa) - 1)).toBeLessThan(0.01);
  // 100 MΩ to −10 mV, 50 MΩ beyond: −15, −13, −11, −8 and −4 mV. Half the deepest is −7.5: the line through the first four
  // has Σ(dI·dV)/Σ(dI²) = 460/8000 mV/pA, 57.5 MΩ, against 100 MΩ of the last.
  expect(Math.abs(to((pa) => (pa > -100 ? 0.1 * pa : -10 + 0.05 * (pa + 100))) - 0.575)).toBeLessThan(0.01);
});

it('a drifting baseline is continued under the step', () => {
  const circuit = { rest_mv: -70, resistance_mohm: 100, tau_ms: 20, noise_mv: 0.05, drift_mv_per_s: 4 };
  const reading = measureSweep(input(passiveSweep(circuit, { pa: -50, from_s: 0.3, to_s: 0.7 }, 1.2)), neuron).readings[
    'steady_deflection_mv'
  ]!;
  expect(Math.abs(reading.value! + 5)).toBeLessThan(Math.max(0.03, reading.u95!));
  expect(reading.u95!).toBeLessThan(0.3);
  expect(reading.note).toContain('drift');
});

it('hum of a millivolt and a half changes neither resistance nor time constant', () => {
  const hum = { mv: 1.5, hz: 50.03 };
  const sweeps = [-90, -60, -30].map((pa, k) =>
    measureSweep(
      input(
        passiveSweep(
          { rest_mv: -70, resistance_mohm: 100, tau_ms: 20, noise_mv: 0.05, hum, seed: k + 1 },
          { pa, from_s: 0.2 + 0.003 * k, to_s: 0.7 + 0.003 * k },
        ),
      ),
      neuron,
    ),
  );
  const readings = cellOf(sweeps);
  expect(Math.abs(numberIn(readings, 'input_resistance_mohm') - 100)).toBeLessThan(1);
  expect(Math.abs(numberIn(readings, 'membrane_time_constant_ms') - 20)).toBeLessThan(0.4);
  expect(Math.abs(numberIn(readings, 'bridge_error_mohm'))).toBeLessThan(1);
  expect(Math.abs(numberIn(readings, 'mains_hum_mv') - 1.5)).toBeLessThan(0.05);
});

describe('uncertainties', () => {
  it('of a rounded mean: a twelfth of the step’s square without noise, nothing with plenty', () => {
    expect(quantizationError(1, 0)).toBeCloseTo(Math.sqrt(1 / 12), 2);
    expect(quantizationError(0.03, 0.1)).toBeLessThan(1e-6);
    expect(quantizationError(0, 0.1)).toBe(0);
  });
  it('add in squares, with the degrees of freedom of JCGM 100:2008, G.4.1', () => {
    // G.4.1, example: four equal parts of n − 1 = 4 each would give 16.
    const four = combinedError(Array.from({ length: 4 }, () => ({ se: 1, freedom: 4 })));
    expect(four.se).toBeCloseTo(2, 12);
    expect(four.freedom).toBeCloseTo(16, 12);
    expect(combinedError([{ se: 3 }, { se: 4 }])).toEqual({ se: 5 });
  });
});

describe('slow noise about a step', () => {
  // Slow noise of correlation times 10 ms, 100 ms and 1 s (0.08 mV together) has a slope of some mV/s over any 100 ms and
  // none over a second; after the step the potential is still coming back. Truth: −5 mV of a passive cell.
  const wander = (seed: number, pa: number, drift_mv_per_s = 0) => {
    const next = normalNoise(seed);
    const taus = [0.01, 0.1, 1];
    const level = taus.map(() => (0.08 / Math.sqrt(3)) * next());
    const response = (t: number): number => {
      if (t < 0.1) return 0;
      const on = 1 - Math.exp(-(t - 0.1) / 0.016);
      return t < 0.6 ? -5 * on : -5 * Math.exp(-(t - 0.6) / 0.016) - 0.8 * Math.exp(-(t - 0.6) / 0.1);
    };
    const voltage = signalOf(0.8, 20000, (t) => {
      taus.forEach((tau, k) => {
        const decay = Math.exp(-1 / (20000 * tau));
        level[k] = decay * level[k]! + (0.08 / Math.sqrt(3)) * Math.sqrt(1 - decay * decay) * next();
      });
      return -70 + response(t) + drift_mv_per_s * (t - 0.05) + level[0]! + level[1]! + level[2]! + 0.05 * next();
    });
    const current = signalOf(0.8, 20000, (t) => (t >= 0.1 - 1e-9 && t < 0.6 - 1e-9 ? pa : 0));
    return measureSweep(input({ voltage, current }), neuron).readings;
  };
  const errors = Array.from({ length: 24 }, (_, seed) => numberIn(wander(seed, -50), 'steady_deflection_mv') + 5);
  it('is not taken for a drift that goes on under it', () => {
    // Levels half a second apart differ by about 0.1 mV (0.08 mV · √2, the slowest part less): no error above 4 of that.
    expect(Math.max(...errors.map(Math.abs))).toBeLessThan(0.4);
    expect(Math.sqrt(errors.reduce((sum, one) => sum + one * one, 0) / errors.length)).toBeLessThan(0.15);
  });
  it('and does not hide a drift that does', () => {
    const drifting = wander(3, -50, 20);
    expect(Math.abs(numberIn(drifting, 'steady_deflection_mv') + 5)).toBeLessThan(1.5);
    expect(drifting['steady_deflection_mv']!.note).toContain('drift');
  });
});
