import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { spikeCriteria } from '../../pipeline/measure/spike-criteria.ts';
import { measureSpikes } from '../../pipeline/measure/spikes.ts';
import type { MeasureContext, Spike, Stimulus } from '../../pipeline/measure/types.ts';
import {
  hodgkinHuxley,
  passive,
  pospischil,
  quantized,
  simulate,
  type Trace,
  wangBuzsaki,
  withNoise,
} from '../helpers/models.ts';

const unknown: Stimulus = {
  kind: 'unknown',
  from: 'absent',
  onset_s: null,
  end_s: null,
  amplitude: null,
  holding: null,
  edges_s: [],
};

interface Options {
  like?: string;
  context?: Partial<MeasureContext>;
  stimulus?: Stimulus;
  /** Leave the current channel away. */
  noCurrent?: boolean;
  baseline?: number | null;
}

function measure(trace: Pick<Trace, 'mv' | 'rateHz'> & Partial<Trace>, options: Options = {}) {
  const edges = trace.edges_s ?? [];
  const stimulus: Stimulus = options.stimulus ?? {
    kind: edges.length > 0 ? 'step' : 'none',
    from: 'channel',
    onset_s: edges[0] ?? null,
    end_s: edges[1] ?? null,
    amplitude: null,
    holding: 0,
    edges_s: edges,
  };
  return measureSpikes({
    voltage: { samples: trace.mv, rate_hz: trace.rateHz, start_s: 0 },
    current: options.noCurrent || !trace.drive ? null : { samples: trace.drive, rate_hz: trace.rateHz, start_s: 0 },
    stimulus,
    baseline_mv: options.baseline === undefined ? -65 : options.baseline,
    context: {
      ...spikeCriteria(options.like ?? 'any'),
      filter_khz: null,
      mains_hz: null,
      capacitance_pf: null,
      ...options.context,
    },
  });
}

const value = (spike: Spike | undefined, id: string): number => {
  const found = spike?.values[id];
  if (typeof found !== 'number') throw new Error(`${id} is ${found}: ${spike?.why[id]}`);
  return found;
};

/** Every value is a finite number or null with a reason, whatever the input. */
function expectComplete(spikes: Spike[]): void {
  for (const spike of spikes)
    for (const [id, found] of Object.entries(spike.values))
      if (found === null) expect(spike.why[id], `${id} of spike ${spike.spike}`).toBeTypeOf('string');
      else expect(Number.isFinite(found), id).toBe(true);
}

describe('nothing there', () => {
  for (const [name, samples] of [
    ['no samples', new Float64Array(0)],
    ['one sample', Float64Array.of(-70)],
    ['two samples', Float64Array.of(-70, 20)],
    ['a flat trace', new Float64Array(5000).fill(-70)],
    ['only unreadable samples', new Float64Array(5000).fill(Number.NaN)],
    ['noise of 3 mV', withNoise(new Float64Array(50_000).fill(-70), 3, 5)],
  ] as const)
    test(`${name} gives no spike`, () => {
      for (const like of ['any', 'ventricular-myocyte', 'chromaffin'])
        expect(measure({ mv: samples, rateHz: 20_000 }, { like }).spikes).toEqual([]);
    });
});

describe('Hodgkin–Huxley membrane at 6.3 °C', () => {
  // Reference: the model integrated with SciPy's DOP853 at rtol 1e-10, sampled every 0.001 ms (computed for this
  // project, constants of the model from memory).
  test('a jump of 15 mV: peak 40.410 mV, steepest 310.86 and −68.92 V/s, threshold −48.762 mV at 20 V/s', () => {
    const { spikes } = measure(simulate(hodgkinHuxley(), 1_000_000, [[40, 0]], 15), { context: { ahp_window_ms: 10 } });
    expect(spikes).toHaveLength(1);
    const spike = spikes[0];
    expect(value(spike, 'peak_mv')).toBeCloseTo(40.41033, 3);
    expect(value(spike, 'peak_at_s') * 1000).toBeCloseTo(1.159, 2);
    expect(value(spike, 'max_rise_v_per_s')).toBeCloseTo(310.863, 1);
    expect(value(spike, 'max_fall_v_per_s')).toBeCloseTo(-68.9206, 2);
    expect(value(spike, 'threshold_mv')).toBeCloseTo(-48.76211, 2);
    expect(value(spike, 'threshold_at_s') * 1000).toBeCloseTo(0.43411, 3);
    expect(value(spike, 'spike_height_mv')).toBeCloseTo(89.17244, 2);
    expect(value(spike, 'half_width_ms')).toBeCloseTo(1.27339, 3);
    expect(value(spike, 'ahp_minimum_mv')).toBeCloseTo(-76.18109, 3);
    expect(value(spike, 'depolarization_ms')).toBeCloseTo(1.159 - 0.43411, 2);
    expect(value(spike, 'overshoot_mv')).toBe(value(spike, 'peak_mv'));
    expect(value(spike, 'height_from_rest_mv')).toBeCloseTo(105.41, 1);
    expect(spike?.why['cycle_length_ms']).toBe('cut-off-by-sweep-end');
  });

  // 1 ms pulses from 5 ms on, same reference. At 15 µA/cm² and a criterion of 10 V/s the first crossing of the criterion
  // lies on the stimulus edge (the reference's own −64.99 mV shows it); searched backwards it lies after the pulse.
  for (const [current, criterion, threshold, at] of [
    [10, 20, -49.92678, 6.73675],
    [10, 10, -53.36249, 6.49482],
    [15, 20, -48.4093, 6.09655],
    [20, 20, -53.84356, 5.61019],
  ] as const)
    test(`a pulse of ${current} µA/cm² has its ${criterion} V/s threshold at ${threshold} mV`, () => {
      const trace = simulate(hodgkinHuxley(), 200_000, [
        [5, 0],
        [1, current],
        [34, 0],
      ]);
      const { spikes } = measure(trace, { context: { rise_criterion_v_per_s: criterion, capacitance_pf: 1 } });
      expect(spikes).toHaveLength(1);
      expect(value(spikes[0], 'threshold_mv')).toBeCloseTo(threshold, 1);
      expect(value(spikes[0], 'threshold_at_s') * 1000).toBeCloseTo(at, 1);
    });

  for (const rateHz of [10_000, 20_000, 50_000, 200_000])
    for (const known of [true, false])
      for (const [pulse, criterion] of [
        [[1, 15], 10],
        [[1, 40], 20],
        [[40, 40], 20],
      ] as const)
        test(`the threshold is not on the edge of ${pulse[1]} µA/cm² for ${pulse[0]} ms at ${rateHz} Hz, stimulus ${known ? 'known' : 'not recorded'}`, () => {
          const trace = simulate(hodgkinHuxley(), rateHz, [[5, 0], [...pulse], [20, 0]]);
          const { spikes } = measure(trace, {
            context: { rise_criterion_v_per_s: criterion },
            ...(known ? {} : { stimulus: unknown, noCurrent: true }),
          });
          expect(spikes.length).toBeGreaterThan(0);
          expect(value(spikes[0], 'threshold_mv')).toBeGreaterThan(-62);
          expect(value(spikes[0], 'threshold_mv')).toBeLessThan(-25);
          expect(value(spikes[0], 'threshold_at_s')).toBeGreaterThan(0.0051);
        });

  test('phases carry the sign of the net ionic current', () => {
    const trace = simulate(hodgkinHuxley(), 100_000, [
      [5, 0],
      [1, 10],
      [40, 0],
    ]);
    for (const capacitance_pf of [null, 1]) {
      const { spikes } = measure(trace, { context: { capacitance_pf } });
      const phases = spikes[0]!.phases;
      expect(phases.map((phase) => phase.name)).toEqual([
        'depolarization',
        'repolarization',
        'afterhyperpolarization',
        'recovery',
      ]);
      expect(phases.map((phase) => phase.net_ionic_sign)).toEqual([-1, 1, 1, -1]);
      for (let k = 1; k < phases.length; k++) expect(phases[k]!.from_s).toBeCloseTo(phases[k - 1]!.to_s, 9);
    }
  });

  test('without a current channel or a statement no sign is claimed', () => {
    const trace = simulate(hodgkinHuxley(), 100_000, [[40, 0]], 15);
    const { spikes } = measure(trace, { stimulus: unknown, noCurrent: true });
    expect(spikes[0]!.phases.map((phase) => phase.net_ionic_sign)).toEqual([0, 0, 0, 0]);
  });

  test('a subthreshold jump of 6 mV is no spike', () =>
    expect(measure(simulate(hodgkinHuxley(), 50_000, [[40, 0]], 6)).spikes).toEqual([]));

  // Rate in a 1 s step of 10 µA/cm²: 68.31 Hz (same reference).
  test('10 µA/cm² fires at 68.31 Hz', () => {
    const { spikes } = measure(
      simulate(hodgkinHuxley(), 50_000, [
        [20, 0],
        [300, 10],
        [20, 0],
      ]),
    );
    const cycles = spikes.slice(3, -1).map((spike) => value(spike, 'cycle_length_ms'));
    expect(1000 / (cycles.reduce((sum, cycle) => sum + cycle, 0) / cycles.length)).toBeCloseTo(68.31, 1);
  });

  // Peaks in a 1 s step (same reference): 69 at 10, 109 at 40 and 137 at 80 µA/cm²; 2 before the block at 120.
  for (const [current, count] of [
    [10, 69],
    [40, 109],
    [80, 137],
    [120, 2],
  ] as const)
    test(`${current} µA/cm² for 1 s gives ${count} spikes`, () => {
      const trace = simulate(hodgkinHuxley(), 20_000, [
        [20, 0],
        [1000, current],
        [1, 0],
      ]);
      expect(measure(trace).spikes).toHaveLength(count);
    });

  test('a current channel recorded upside down does not put the threshold on the edge', () => {
    const trace = simulate(hodgkinHuxley(), 20_000, [
      [5, 0],
      [40, 40],
      [20, 0],
    ]);
    const { spikes } = measure({ ...trace, drive: trace.drive.map((current) => -current) });
    expect(value(spikes[0], 'threshold_mv')).toBeGreaterThan(-62);
  });

  test('depolarization block: a few spikes, then oscillations that are none', () => {
    const { spikes } = measure(
      simulate(hodgkinHuxley(), 50_000, [
        [20, 0],
        [300, 150],
        [20, 0],
      ]),
    );
    expect(spikes.length).toBeGreaterThanOrEqual(1);
    expect(spikes.length).toBeLessThanOrEqual(4);
    expect(value(spikes.at(-1), 'peak_at_s')).toBeLessThan(0.08);
    expectComplete(spikes);
  });
});

describe('cortical models', () => {
  // Pospischil et al. 2008 models at 36 °C, integrated with SciPy's LSODA at rtol 1e-9 and sampled every 0.01 ms.
  test('regular spiking, 0.75 nA: 9 spikes in 1 s, first cycle 27.96 ms, half-width 0.703 ms', () => {
    const cell = pospischil('RS');
    const trace = simulate(cell, 100_000, [
      [100, 0],
      [1000, 750 / cell.capacitance_pf],
      [50, 0],
    ]);
    const { spikes } = measure(trace, { context: { rise_criterion_v_per_s: 10 } });
    expect(spikes).toHaveLength(9);
    expect(value(spikes[0], 'peak_mv')).toBeCloseTo(47.111, 1);
    expect(value(spikes[0], 'peak_at_s') * 1000).toBeCloseTo(120.72, 1);
    expect(value(spikes[0], 'threshold_mv')).toBeCloseTo(-41.753, 1);
    expect(value(spikes[0], 'half_width_ms')).toBeCloseTo(0.70318, 2);
    expect(value(spikes[0], 'cycle_length_ms')).toBeCloseTo(27.96, 1);
    expect(value(spikes[7], 'cycle_length_ms')).toBeCloseTo(155.15, 0);
    expect(value(spikes[0], 'ahp_minimum_mv')).toBeCloseTo(-67.55858, 1);
  });

  test('fast spiking, 0.5 nA: 49 spikes in 1 s every 20.17 ms, minimum −74.64 mV', () => {
    const cell = pospischil('FS');
    const { spikes } = measure(
      simulate(cell, 100_000, [
        [100, 0],
        [1000, 500 / cell.capacitance_pf],
        [50, 0],
      ]),
    );
    expect(spikes).toHaveLength(49);
    for (const spike of spikes.slice(0, -1)) expect(value(spike, 'cycle_length_ms')).toBeCloseTo(20.17, 1);
    expect(value(spikes[0], 'ahp_minimum_mv')).toBeCloseTo(-74.638, 1);
    expect(value(spikes[0], 'max_fall_v_per_s')).toBeCloseTo(-156.622, 0);
  });

  // Wang & Buzsáki 1996 at 20 µA/cm²: 406.9 Hz (SciPy, as above).
  for (const rateHz of [10_000, 20_000, 50_000])
    test(`above 400 Hz every spike is counted at ${rateHz} Hz`, () => {
      const { spikes } = measure(
        simulate(wangBuzsaki(), rateHz, [
          [20, 0],
          [200, 20],
          [20, 0],
        ]),
      );
      const cycles = spikes.slice(2, -1).map((spike) => value(spike, 'cycle_length_ms'));
      expect(1000 / (cycles.reduce((sum, cycle) => sum + cycle, 0) / cycles.length)).toBeCloseTo(406.9, -1);
      expect(spikes.length).toBe(Math.round(0.2 * 406.9) + 1);
      expectComplete(spikes);
    });

  test('a doublet is two spikes, each with its own threshold and afterhyperpolarization', () => {
    const cell = pospischil('FS');
    const pulse = 3000 / cell.capacitance_pf;
    const { spikes } = measure(
      simulate(cell, 50_000, [
        [20, 0],
        [1, 1.6 * pulse],
        [3, 0],
        [1, 2.5 * pulse],
        [60, 0],
      ]),
    );
    expect(spikes).toHaveLength(2);
    expect(value(spikes[0], 'cycle_length_ms')).toBeLessThan(6);
    expect(value(spikes[1], 'threshold_at_s')).toBeGreaterThan(value(spikes[0], 'peak_at_s'));
  });

  test('10 kHz leaves a handful of samples on the rise, and the numbers stay near', () => {
    const cell = pospischil('FS');
    const trace = simulate(cell, 10_000, [
      [100, 0],
      [200, 500 / cell.capacitance_pf],
      [50, 0],
    ]);
    const { spikes } = measure(trace);
    expect(spikes).toHaveLength(10);
    for (const spike of spikes) {
      expect(value(spike, 'rise_samples')).toBeLessThan(6);
      expect(value(spike, 'half_width_ms')).toBeGreaterThan(0.5);
      expect(value(spike, 'half_width_ms')).toBeLessThan(0.62);
      expect(value(spike, 'threshold_mv')).toBeGreaterThan(-46);
      expect(value(spike, 'threshold_mv')).toBeLessThan(-34);
    }
  });

  for (const [name, change] of [
    ['white noise of 0.5 mV', (mv: Float64Array) => withNoise(mv, 0.5, 11)],
    ['white noise of 2 mV', (mv: Float64Array) => withNoise(mv, 2, 12)],
    ['a digitizer step of 1 mV', (mv: Float64Array) => quantized(mv, 1)],
    ['noise and a digitizer step of 0.5 mV', (mv: Float64Array) => quantized(withNoise(mv, 0.3, 13), 0.5)],
  ] as const)
    test(`the count does not change with ${name}`, () => {
      const cell = pospischil('RS');
      const trace = simulate(cell, 20_000, [
        [100, 0],
        [500, 1000 / cell.capacitance_pf],
        [100, 0],
      ]);
      const clean = measure(trace).spikes;
      const { spikes } = measure({ ...trace, mv: change(trace.mv) });
      expect(spikes).toHaveLength(clean.length);
      expectComplete(spikes);
      spikes.forEach((spike, k) => {
        expect(Math.abs(value(spike, 'peak_at_s') - value(clean[k], 'peak_at_s'))).toBeLessThan(1.5e-4);
        expect(Math.abs(value(spike, 'threshold_mv') - value(clean[k], 'threshold_mv'))).toBeLessThan(10);
        expect(Math.abs(value(spike, 'half_width_ms') - value(clean[k], 'half_width_ms'))).toBeLessThan(0.1);
      });
    });
});

describe('what is no spike', () => {
  test('a passive membrane charged faster than the criterion, stimulus known', () => {
    // 60 V/s at the edge, 40 mV in the end.
    const trace = simulate(passive(1), 20_000, [
      [50, 0],
      [100, 60],
      [50, 0],
    ]);
    expect(measure(trace).spikes).toEqual([]);
    expect(measure({ ...trace, mv: withNoise(trace.mv, 0.3, 3) }).spikes).toEqual([]);
  });

  test('an instantaneous jump at both edges left by the bridge', () => {
    const trace = simulate(passive(20), 20_000, [
      [50, 0],
      [100, 1],
      [50, 0],
    ]);
    const jumped = trace.mv.map((mv, i) => mv + 40 * trace.drive[i]!);
    expect(measure({ ...trace, mv: jumped }).spikes).toEqual([]);
  });

  test('a glitch of one sample', () => {
    const mv = new Float64Array(20_000).fill(-70);
    mv[9000] = 30;
    const { spikes, remarks } = measure({ mv, rateHz: 20_000 });
    expect(spikes).toEqual([]);
    expect(remarks.join()).toMatch(/artefact/);
  });

  test('an inverted trace gives no spikes and says why', () => {
    const cell = pospischil('FS');
    const trace = simulate(cell, 20_000, [
      [100, 0],
      [300, 500 / cell.capacitance_pf],
      [100, 0],
    ]);
    for (const sd of [0, 0.5]) {
      const { spikes, remarks } = measure({ ...trace, mv: withNoise(trace.mv, sd, 4).map((mv) => -mv) });
      expect(spikes).toEqual([]);
      expect(remarks.join()).toMatch(/inverted/);
    }
  });

  test('an upright train beside a brief hyperpolarizing pulse is not taken for an inverted one', () => {
    const cell = pospischil('FS');
    const unit = 1000 / cell.capacitance_pf;
    const trace = simulate(cell, 20_000, [
      [50, 0],
      [5, -unit],
      [50, 0],
      [100, 0.5 * unit],
      [50, 0],
    ]);
    expect(measure(trace).spikes).toHaveLength(5);
    expect(measure(trace, { stimulus: unknown, noCurrent: true }).spikes).toHaveLength(5);
  });
});

describe('ends and gaps', () => {
  const cell = pospischil('FS');
  const trace = simulate(cell, 20_000, [
    [50, 0],
    [200, 500 / cell.capacitance_pf],
    [50, 0],
  ]);
  const whole = measure(trace).spikes;
  const cut = (from: number, to: number) =>
    measure({ mv: trace.mv.slice(from, to), rateHz: trace.rateHz }, { stimulus: unknown });

  test('a sweep that ends just after a peak keeps the spike and says what is cut off', () => {
    const peak = Math.round(value(whole[3], 'peak_at_s') * trace.rateHz);
    const { spikes } = cut(0, peak + 4);
    expect(spikes).toHaveLength(4);
    const last = spikes[3]!;
    // Interpolation has only four samples beyond the peak here.
    expect(Math.abs(value(last, 'peak_mv') - value(whole[3], 'peak_mv'))).toBeLessThan(0.1);
    expect(value(last, 'threshold_mv')).toBeCloseTo(value(whole[3], 'threshold_mv'), 1);
    for (const id of ['half_width_ms', 'repolarization_ms', 'ahp_minimum_mv', 'apd90_ms', 'cycle_length_ms'])
      expect([last.values[id], last.why[id]]).toEqual([null, 'cut-off-by-sweep-end']);
    expectComplete(spikes);
  });

  test('a sweep that ends on the rise does not count it and says so', () => {
    const peak = Math.round(value(whole[3], 'peak_at_s') * trace.rateHz);
    const { spikes, remarks } = cut(0, peak - 1);
    expect(spikes).toHaveLength(3);
    expect(remarks.join()).toMatch(/cuts off/);
  });

  test('a sweep that starts on the fall of a spike does not count that one', () => {
    const peak = Math.round(value(whole[3], 'peak_at_s') * trace.rateHz);
    expect(cut(peak + 2, trace.mv.length).spikes).toHaveLength(whole.length - 4);
  });

  test('a sweep that starts on the rise counts the spike, without a threshold if that came before', () => {
    const steep = Math.round(value(whole[3], 'threshold_at_s') * trace.rateHz) + 3;
    const { spikes } = cut(steep, trace.mv.length);
    expect(spikes).toHaveLength(whole.length - 3);
    expect([spikes[0]!.values['threshold_mv'], spikes[0]!.why['threshold_mv']]).toEqual([null, 'cut-off-by-sweep-end']);
    expect(value(spikes[0], 'peak_mv')).toBeCloseTo(value(whole[3], 'peak_mv'), 6);
    expectComplete(spikes);
  });

  test('one unreadable sample costs only the numbers that need it', () => {
    const peak = Math.round(value(whole[3], 'peak_at_s') * trace.rateHz);
    const mv = trace.mv.slice();
    mv[peak] = Number.NaN;
    const { spikes } = measure({ ...trace, mv });
    expect(spikes).toHaveLength(whole.length);
    expect([spikes[3]!.values['peak_mv'], spikes[3]!.why['peak_mv']]).toEqual([null, 'unreadable']);
    expect(spikes[3]!.why['half_width_ms']).toBe('unreadable');
    expect(value(spikes[3], 'threshold_mv')).toBeCloseTo(value(whole[3], 'threshold_mv'), 6);
    expect(spikes[2]!.values).toEqual({ ...whole[2]!.values, cycle_length_ms: null });
    // Without a filter that is known there is nothing to undo.
    const missing = Object.entries(spikes[2]!.why).filter(([, why]) => why !== 'filter-unknown');
    expect(Object.fromEntries(missing)).toEqual({ cycle_length_ms: 'unreadable' });
    expect(spikes[4]!.values).toEqual(whole[4]!.values);
    expectComplete(spikes);
  });

  test('a gap of 30 ms costs the spikes in it and joins nothing across it', () => {
    const peak = Math.round(value(whole[3], 'peak_at_s') * trace.rateHz);
    const mv = trace.mv.slice();
    mv.fill(Number.NaN, peak - 300, peak + 300);
    const { spikes } = measure({ ...trace, mv });
    expect(spikes).toHaveLength(whole.length - 1);
    expect([spikes[2]!.values['cycle_length_ms'], spikes[2]!.why['cycle_length_ms']]).toEqual([null, 'unreadable']);
    expectComplete(spikes);
  });

  test('a clipped top costs what needs the peak and leaves the threshold', () => {
    const mv = trace.mv.map((value) => Math.min(value, 20));
    const { spikes } = measure({ ...trace, mv });
    expect(spikes).toHaveLength(whole.length);
    for (const id of ['peak_mv', 'overshoot_mv', 'spike_height_mv', 'half_width_ms'])
      expect([spikes[0]!.values[id], spikes[0]!.why[id]]).toEqual([null, 'clipped']);
    // Interpolation may not look into the clipped stretch, a few samples after threshold.
    expect(Math.abs(value(spikes[0], 'threshold_mv') - value(whole[0], 'threshold_mv'))).toBeLessThan(0.15);
    expect(value(spikes[0], 'ahp_minimum_mv')).toBeCloseTo(value(whole[0], 'ahp_minimum_mv'), 1);
  });

  test('a start time other than 0 shifts every time and nothing else', () => {
    const shifted = measureSpikes({
      voltage: { samples: trace.mv, rate_hz: trace.rateHz, start_s: 2 },
      current: null,
      stimulus: { ...unknown, edges_s: trace.edges_s.map((edge) => edge + 2) },
      baseline_mv: -65,
      context: { ...spikeCriteria('any'), filter_khz: null, mains_hz: null, capacitance_pf: null },
    }).spikes;
    expect(shifted).toHaveLength(whole.length);
    shifted.forEach((spike, k) => {
      expect(value(spike, 'peak_at_s')).toBeCloseTo(value(whole[k], 'peak_at_s') + 2, 9);
      expect(value(spike, 'half_width_ms')).toBeCloseTo(value(whole[k], 'half_width_ms'), 6);
    });
  });

  test('a constant offset shifts the potentials and nothing else', () => {
    const absolute = ['threshold_mv', 'peak_mv', 'overshoot_mv', 'ahp_minimum_mv', 'height_from_rest_mv'];
    fc.assert(
      fc.property(fc.double({ min: -150, max: 150, noNaN: true }), (offset) => {
        const { spikes } = measure({ ...trace, mv: trace.mv.map((mv) => mv + offset) });
        expect(spikes).toHaveLength(whole.length);
        spikes.forEach((spike, k) => {
          for (const [id, found] of Object.entries(whole[k]!.values))
            if (found === null) expect(spike.why[id]).toBe(whole[k]!.why[id]);
            else expect(value(spike, id)).toBeCloseTo(found + (absolute.includes(id) ? offset : 0), 5);
        });
      }),
      { seed: 41, numRuns: 20 },
    );
  });
});
