import { describe, expect, test } from 'vitest';
import { classesWithCriteria, spikeCriteria } from '../../pipeline/measure/spike-criteria.ts';
import { measureSpikes } from '../../pipeline/measure/spikes.ts';
import type { Spike, Stimulus } from '../../pipeline/measure/types.ts';
import { normalNoise, quantized, withNoise } from '../helpers/models.ts';

const absent: Stimulus = {
  kind: 'unknown',
  from: 'absent',
  onset_s: null,
  end_s: null,
  amplitude: null,
  holding: null,
  edges_s: [],
};

function measure(mv: Float64Array, rateHz: number, like: string, ion: 'calcium' | null = null, edges_s: number[] = []) {
  return measureSpikes({
    voltage: { samples: mv, rate_hz: rateHz, start_s: 0 },
    current: null,
    stimulus: edges_s.length > 0 ? { ...absent, kind: 'pulse train', from: 'channel', edges_s } : absent,
    baseline_mv: null,
    context: { ...spikeCriteria(like, ion), filter_khz: null, mains_hz: null, capacitance_pf: null },
  });
}

const value = (spike: Spike | undefined, id: string): number => {
  const found = spike?.values[id];
  if (typeof found !== 'number') throw new Error(`${id} is ${found}: ${spike?.why[id]}`);
  return found;
};

const logistic = (x: number): number => 1 / (1 + Math.exp(-x));

/**
 * A heart-like beat with known times: upstroke a logistic of `rise_ms` centred on `at`, plateau, and a logistic
 * repolarization of 15 ms scale centred `duration_ms` later. Height `high` above `rest`.
 */
const beat = (t_ms: number, at: number, duration_ms: number, rise_ms: number): number =>
  logistic((t_ms - at) / rise_ms) * (1 - logistic((t_ms - at - duration_ms) / 15));

interface Beats {
  rateHz: number;
  seconds: number;
  at_ms: number[];
  duration_ms: number;
  rise_ms: number;
  rest: number;
  high: number;
}

function beats(shape: Beats): Float64Array {
  return Float64Array.from({ length: Math.round(shape.seconds * shape.rateHz) }, (_, i) => {
    const t = (i / shape.rateHz) * 1000;
    return (
      shape.rest + shape.high * shape.at_ms.reduce((sum, at) => sum + beat(t, at, shape.duration_ms, shape.rise_ms), 0)
    );
  });
}

const heart: Beats = {
  rateHz: 10_000,
  seconds: 5,
  at_ms: [400, 1400, 2400, 3400, 4400],
  duration_ms: 300,
  rise_ms: 1,
  rest: -75,
  high: 105,
};

describe('heart cells', () => {
  test('clean beats: count, peak, steepest rise and durations are those put in', () => {
    const { spikes } = measure(beats(heart), heart.rateHz, 'stem-cell-cardiomyocyte');
    expect(spikes).toHaveLength(5);
    for (const spike of spikes) {
      // Steepest rise of a logistic: height/(4·scale) = 26.25 V/s, a little less over two sample intervals.
      expect(value(spike, 'max_rise_v_per_s')).toBeGreaterThan(26);
      expect(value(spike, 'max_rise_v_per_s')).toBeLessThan(26.25);
      expect(value(spike, 'peak_mv')).toBeCloseTo(30, 1);
      // Half and nine tenths down the falling logistic: 300 ms, and 15·ln 9 = 33 ms more.
      expect(value(spike, 'apd50_ms')).toBeCloseTo(300, 0);
      expect(value(spike, 'apd90_ms')).toBeCloseTo(300 + 15 * Math.log(9), 0);
      // 5 % of the maximum rise: a logistic of scale 1 ms is there 2.9 to 4.4 ms before its centre; s(1−s) = 0.0125.
      const share = (1 - Math.sqrt(1 - 4 * 0.0125)) / 2;
      expect(value(spike, 'threshold_mv')).toBeCloseTo(-75 + 105 * share, 0);
    }
    expect(value(spikes[0], 'cycle_length_ms')).toBeCloseTo(1000, 0);
  });

  for (const sd of [0.5, 2, 4])
    for (const like of ['stem-cell-cardiomyocyte', 'ventricular-myocyte', 'sinoatrial-node'])
      test(`noise of ${sd} mV on the plateau makes no further spikes (${like})`, () => {
        const { spikes } = measure(withNoise(beats(heart), sd, 21), heart.rateHz, like);
        expect(spikes).toHaveLength(5);
        for (const spike of spikes) {
          expect(Math.abs(value(spike, 'apd90_ms') - (300 + 15 * Math.log(9)))).toBeLessThan(20);
          expect(value(spike, 'max_rise_v_per_s')).toBeGreaterThan(18);
          expect(value(spike, 'max_rise_v_per_s')).toBeLessThan(40);
        }
      });

  test('noise on a plateau that hovers around 0 mV is not forty spikes', () => {
    const mv = withNoise(beats({ ...heart, rest: -72, high: 73 }), 3, 8);
    const crossings = mv.reduce((n, v, i) => n + (i > 0 && mv[i - 1]! < 0 && v >= 0 ? 1 : 0), 0);
    expect(crossings).toBeGreaterThan(40);
    expect(measure(mv, heart.rateHz, 'stem-cell-cardiomyocyte').spikes).toHaveLength(5);
  });

  /** 36 mV within 2 ms, 16 mV down again, then the upstroke from there: what a pacing pulse leaves. */
  const paced = (): Float64Array => {
    const mv = beats({ ...heart, seconds: 2, at_ms: [506, 1506], rise_ms: 0.5 });
    for (const at of [500, 1500]) for (let i = 0; i < 20; i++) mv[at * 10 + i]! += 20 + i * 0.8;
    return mv;
  };

  for (const [name, edges] of [
    ['not recorded', []],
    ['known', [0.5, 0.502, 1.5, 1.502]],
  ] as const)
    test(`a stimulus artefact before the upstroke is neither a spike nor its threshold (stimulus ${name})`, () => {
      for (const sd of [0, 0.5]) {
        const { spikes } = measure(withNoise(paced(), sd, 31), 10_000, 'ventricular-myocyte', null, [...edges]);
        expect(spikes).toHaveLength(2);
        spikes.forEach((spike, k) => {
          expect(value(spike, 'threshold_at_s')).toBeGreaterThan(k + 0.502);
          expect(value(spike, 'threshold_at_s')).toBeLessThan(k + 0.506);
          expect(value(spike, 'max_rise_v_per_s')).toBeGreaterThan(40);
          expect(value(spike, 'max_rise_v_per_s')).toBeLessThan(60);
        });
      }
    });

  test('a sweep that starts on a plateau and ends early on a fall counts what it saw rise', () => {
    const whole = beats(heart);
    const { spikes } = measure(whole.slice(6000, 46_800), heart.rateHz, 'stem-cell-cardiomyocyte');
    expect(spikes).toHaveLength(4);
    const last = spikes[3]!;
    expect([last.values['apd50_ms'], last.why['apd50_ms']]).toEqual([null, 'cut-off-by-sweep-end']);
    expect(value(last, 'threshold_mv')).toBeLessThan(-70);
  });

  test('an inverted heart trace gives no spikes and says why', () => {
    const { spikes, remarks } = measure(
      withNoise(beats(heart), 0.3, 2).map((v) => -v),
      heart.rateHz,
      'stem-cell-cardiomyocyte',
    );
    expect(spikes).toEqual([]);
    expect(remarks.join()).toMatch(/inverted/);
  });
});

describe('calcium spikes of a muscle', () => {
  /** 1.5 s at 5 kHz: rest near −30 mV, a ramp of 20 mV, and every 60 ms a spike of 14 mV and 20 ms, in 0.03 mV steps. */
  const muscle = (): Float64Array => {
    const next = normalNoise(77);
    const raw = Float64Array.from({ length: 7500 }, (_, i) => {
      const t = i / 5;
      const ramp = t < 100 ? 0 : (20 * (t - 100)) / 1400;
      let spikes = 0;
      for (let k = 0; k < 20; k++) spikes += 14 * Math.exp(-(((t - 200 - 60 * k) / 11) ** 2));
      return -30 + ramp + spikes + 0.12 * next();
    });
    return quantized(raw, 0.03125);
  };

  test('each low, broad spike counts once', () => {
    const { spikes } = measure(muscle(), 5000, 'any', 'calcium');
    expect(spikes).toHaveLength(20);
    for (const spike of spikes) {
      expect(value(spike, 'half_width_ms')).toBeGreaterThan(12);
      expect(value(spike, 'half_width_ms')).toBeLessThan(24);
      expect(value(spike, 'spike_height_mv')).toBeGreaterThan(9);
      expect(value(spike, 'spike_height_mv')).toBeLessThan(16);
    }
    expect(value(spikes[3], 'cycle_length_ms')).toBeCloseTo(60, -1);
  });

  test('by the criterion of a sodium spike none counts', () =>
    expect(measure(muscle(), 5000, 'any').spikes).toEqual([]));

  test('slow drift of 40 mV is no spike', () => {
    const mv = Float64Array.from({ length: 25_000 }, (_, i) => -50 + 20 * Math.sin((2 * Math.PI * i) / 12_500));
    for (const like of ['any', 'sinoatrial-node']) expect(measure(mv, 5000, like, 'calcium').spikes).toEqual([]);
  });
});

describe('criteria by class', () => {
  // DESIGN: 20 V/s, 20 mV and 60 ms unless the class says otherwise; 5 % of the own maximum rise for slow classes.
  test('every class has criteria that can be met', () => {
    expect(classesWithCriteria).toHaveLength(17);
    for (const like of classesWithCriteria) {
      const criteria = spikeCriteria(like);
      expect(criteria.rise_criterion_v_per_s === null).toBe(criteria.slow);
      expect(criteria.prominence_mv).toBeGreaterThan(0);
      expect(criteria.ahp_window_ms).toBeGreaterThanOrEqual(60);
    }
  });
  test('an unknown class is judged as any', () => {
    expect(spikeCriteria('no such class')).toEqual(spikeCriteria('any'));
    expect(spikeCriteria('constructor')).toEqual(spikeCriteria('any'));
    expect(spikeCriteria('any')).toEqual({
      rise_criterion_v_per_s: 20,
      prominence_mv: 20,
      ahp_window_ms: 60,
      slow: false,
    });
  });
  test('heart cells keep their own criteria when their spikes are said to be carried by calcium', () =>
    expect(spikeCriteria('sinoatrial-node', 'calcium')).toEqual(spikeCriteria('sinoatrial-node')));
});
