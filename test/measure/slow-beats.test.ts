import { describe, expect, test } from 'vitest';
import { pulseResponse, withoutArtefacts } from '../../pipeline/measure/artefact.ts';
import { alternating, beatReadings } from '../../pipeline/measure/cell-beats.ts';
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import type { NumberedSweep, Signal, Stimulus } from '../../pipeline/measure/types.ts';
import { withNoise } from '../helpers/models.ts';
import { heart, input, normalNoise, numberIn } from './made.ts';

const unknown: Stimulus = {
  kind: 'unknown',
  from: 'absent',
  onset_s: null,
  end_s: null,
  amplitude: null,
  holding: null,
  edges_s: [],
};

const logistic = (x: number): number => 1 / (1 + Math.exp(-x));

/** Paced beats at 25 kHz: a 2 ms pulse that charges by 20 mV and jumps by `jump`, the upstroke `lag` ms after its start. */
function paced(jump: number, lag: number, noise: number, seed = 3): Signal {
  const rate = 25_000;
  const mv = Float64Array.from({ length: 2 * rate }, (_, i) => {
    const t = (i / rate) * 1000;
    return [50, 1050].reduce((v, on) => {
      const since = t - on;
      if (since < 0) return v;
      const charge = since < 2 ? 10 * since : 20 * Math.exp(-(since - 2) / 8);
      const beat = 100 * logistic((since - lag) / 0.15) * (1 - logistic((since - 250) / 20));
      return v + charge * (1 - logistic((since - lag) / 0.15)) + beat + (since < 2 ? jump : 0);
    }, -80);
  });
  return { samples: withNoise(mv, noise, seed), rate_hz: rate, start_s: 0 };
}

describe('stimulus artefacts seen in the voltage alone', () => {
  for (const [jump, lag] of [
    [10, 1.6],
    [6, 3],
    [14, 2.6],
  ] as const)
    test(`pulses that jump by ${jump} mV, upstroke ${lag} ms after onset`, () => {
      const { pulses, remarks } = withoutArtefacts(paced(jump, lag, 0.3), unknown, null, 0.3);
      expect(pulses).toHaveLength(2);
      pulses.forEach((pulse, k) => {
        expect(pulse.on_s).toBeCloseTo(0.05 + k, 4);
        expect(pulse.off_s).toBeCloseTo(0.052 + k, 4);
        expect(Math.abs(pulse.jump_mv! - jump)).toBeLessThan(pulse.u95_mv! + 0.5);
      });
      expect(remarks.join()).toMatch(/2 brief pulses of 2 ms/);
    });

  test('neither noise nor an unpaced beat has one', () => {
    for (const noise of [0.1, 0.5, 1])
      for (const seed of [1, 2, 3])
        expect(withoutArtefacts(paced(0, 1.6, noise, seed), unknown, null, noise).pulses).toEqual([]);
  });

  test('the peak of an upstroke inside the pulse is the cell’s, not the electrode’s', () => {
    const sweep = measureSweep(input({ voltage: paced(10, 1.2, 0.2), current: null }), { ...heart, prominence_mv: 40 });
    expect(sweep.spikes).toHaveLength(2);
    for (const spike of sweep.spikes) {
      expect(Math.abs(spike.values['peak_mv']! - 20)).toBeLessThan(1.5);
      expect(spike.values['stimulus_artefact_mv']!).toBeGreaterThan(8);
      expect(spike.values['stimulus_artefact_mv']!).toBeLessThan(12);
    }
  });
});

describe('the sign of a pulse', () => {
  const stimulus = (pa: number): Stimulus => ({
    kind: 'pulse train',
    from: 'channel',
    onset_s: 0.05,
    end_s: 1.052,
    amplitude: pa,
    holding: 0,
    edges_s: [0.05, 0.052, 1.05, 1.052],
  });
  test.each([1000, -1000])('%s pA', (pa) => {
    const reading = pulseResponse(paced(10, 3, 0.2), stimulus(pa), null, [], 0.2);
    expect(Math.sign(reading.value!)).toBe(Math.sign(pa));
    expect(Math.abs(reading.value!)).toBeGreaterThan(4 * reading.se!);
  });
});

const beats = (durations: number[]): NumberedSweep[] =>
  [
    {
      sweep: 0,
      spikes: durations.map((apd90_ms, spike) => ({
        spike,
        values: { apd90_ms, diastolic_potential_mv: -80 },
        why: {},
        phases: [],
      })),
    },
  ] as unknown as NumberedSweep[];

describe('beat to beat', () => {
  test('alternans is the difference between long and short beats, whatever the trend', () => {
    const durations = Array.from({ length: 9 }, (_, k) => 300 + 3 * k + (k % 2 === 0 ? 20 : -20));
    expect(numberIn(beatReadings(beats(durations)), 'apd90_alternation_ms')).toBeCloseTo(40, 9);
  });

  // Σ|D| / (n√2) by hand: |10| + |−20| + |10| + |0| = 40, n = 4.
  test('short-term variability', () =>
    expect(numberIn(beatReadings(beats([300, 310, 290, 300, 300])), 'apd90_variability_ms')).toBeCloseTo(
      40 / (4 * Math.SQRT2),
      9,
    ));

  test('its half-width holds the truth of chance variation 92 to 98 times in 100', () => {
    const next = normalNoise(8);
    let held = 0;
    const runs = 600;
    for (let run = 0; run < runs; run++) {
      const durations = Array.from({ length: 12 }, (_, k) => 300 + 5 * next() + (k % 2 === 0 ? 15 : -15));
      const { value, u95 } = beatReadings(beats(durations))['apd90_alternation_ms']!;
      if (Math.abs(value! - 30) <= u95!) held++;
    }
    expect(held / runs).toBeGreaterThan(0.92);
    expect(held / runs).toBeLessThan(0.98);
  });

  test('the fit is exact on its own model', () => {
    const { c, se } = alternating([1, 2, 3, 4, 5, 6].map((k) => 5 - 0.3 * k + 2 * (-1) ** k));
    expect(c).toBeCloseTo(-2, 9);
    expect(se).toBeLessThan(1e-9);
  });

  test('four beats show no pattern', () =>
    expect(beatReadings(beats([1, 2, 1, 2]))['apd90_alternation_ms']!.why).toBe('too-few-spikes'));
});
