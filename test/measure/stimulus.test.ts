import { describe, expect, it } from 'vitest';
import { findStimulus, readCommand } from '../../pipeline/measure/stimulus.ts';
import { normalNoise, signalOf } from './made.ts';

const rate = 20000;
const step = (pa: number, from = 0.2, to = 0.7, holding = 0, seconds = 1) =>
  signalOf(seconds, rate, (t) => holding + (t >= from && t < to ? pa : 0));

describe('findStimulus', () => {
  it.each([0.05, -0.05, 1, -100, 2500])('finds a clean step of %d pA to the sample', (pa) => {
    const found = findStimulus(step(pa), null);
    expect(found).toMatchObject({ kind: 'step', from: 'channel', holding: 0 });
    expect(found.amplitude).toBeCloseTo(pa, 9);
    expect(found.onset_s).toBeCloseTo(0.2, 9);
    expect(found.end_s).toBeCloseTo(0.7, 9);
    expect(found.edges_s).toHaveLength(2);
  });

  it('measures the step from the holding level', () => {
    const found = findStimulus(step(-30, 0.2, 0.7, 45.5), null);
    expect(found.holding).toBeCloseTo(45.5, 9);
    expect(found.amplitude).toBeCloseTo(-30, 9);
  });

  it.each([
    [50, 3],
    [-20, 3],
    [8, 2],
    [0.05, 0.004],
  ])('finds a step of %d pA in measured current with noise of %d pA and an offset', (pa, sd) => {
    const noise = normalNoise(7);
    const clean = step(pa, 0.2, 0.7, -12.3);
    const found = findStimulus({ ...clean, samples: clean.samples.map((value) => value + sd * noise()) }, null);
    expect(found.kind).toBe('step');
    expect(Math.abs(found.amplitude! - pa)).toBeLessThan(0.1 * sd);
    expect(Math.abs(found.onset_s! - 0.2)).toBeLessThan(0.001);
    expect(Math.abs(found.end_s! - 0.7)).toBeLessThan(0.001);
    expect(found.holding).toBeCloseTo(-12.3, 0);
  });

  it('puts the edge of a filtered step where half of the way is gone', () => {
    const clean = signalOf(1, rate, (t) => {
      const edge = (at: number) => 1 / (1 + Math.exp(-(t - at) / 0.00005));
      return 100 * (edge(0.2) - edge(0.7));
    });
    const found = findStimulus(clean, null);
    expect(found.kind).toBe('step');
    expect(Math.abs(found.onset_s! - 0.2)).toBeLessThan(0.00011);
    expect(Math.abs(found.end_s! - 0.7)).toBeLessThan(0.00011);
  });

  it.each([0, 37])('says none for a flat channel at %d pA', (pa) => {
    expect(findStimulus(step(0, 0, 0, pa), null)).toMatchObject({ kind: 'none', holding: pa, onset_s: null });
  });

  it('says none for measured current that is only noise, hum and a digitizer', () => {
    const noise = normalNoise(3);
    const current = signalOf(
      2,
      rate,
      (t) => Math.round((5 * noise() + 4 * Math.sin(2 * Math.PI * 50 * t)) / 0.6) * 0.6,
    );
    expect(findStimulus(current, null).kind).toBe('none');
  });

  it('says none where single samples flicker by one digitizer step', () => {
    const noise = normalNoise(11);
    const current = signalOf(1, rate, () => (noise() > 2.6 ? 0.3 : 0));
    expect(findStimulus(current, null).kind).toBe('none');
  });

  it('does not take the first sample of a channel for its holding level', () => {
    const current = step(100, 0.2, 0.7, -25);
    current.samples[0] = 0;
    expect(findStimulus(current, null)).toMatchObject({ kind: 'step', holding: -25, amplitude: 100 });
  });

  it('finds a step that lasts to the end of the sweep', () => {
    expect(findStimulus(step(60, 0.2, 2), null)).toMatchObject({
      kind: 'step',
      onset_s: 0.2,
      end_s: 1,
      edges_s: [0.2],
    });
  });

  it('finds a brief pulse', () => {
    const found = findStimulus(step(1500, 0.01, 0.012), null);
    expect(found).toMatchObject({ kind: 'step', amplitude: 1500 });
    expect(found.end_s! - found.onset_s!).toBeCloseTo(0.002, 6);
  });

  it.each([0, 0.5])('finds a train of paced pulses, noise %d pA', (sd) => {
    const noise = normalNoise(5);
    const current = signalOf(5, 10000, (t) => (t % 1 >= 0.1 && t % 1 < 0.105 ? 400 : 0) + sd * noise());
    const found = findStimulus(current, null);
    expect(found.kind).toBe('pulse train');
    expect(found.amplitude).toBeCloseTo(400, 0);
    expect(found.onset_s).toBeCloseTo(0.1, 3);
    expect(found.end_s).toBeCloseTo(4.105, 3);
    expect(found.edges_s).toHaveLength(10);
  });

  it('takes the main step and not the test pulse before it, and says so', () => {
    const current = signalOf(1, rate, (t) => (t >= 0.02 && t < 0.03 ? -20 : t >= 0.3 && t < 0.8 ? 150 : 0));
    const found = readCommand(current, null, 'current');
    expect(found.stimulus).toMatchObject({ kind: 'step', onset_s: 0.3, end_s: 0.8, amplitude: 150 });
    expect(found.stimulus.edges_s).toHaveLength(4);
    expect(found.remarks.join()).toContain('2 steps');
  });

  it.each([0, 1.5])('finds a ramp from its foot to its end, noise %d pA', (sd) => {
    const noise = normalNoise(9);
    const current = signalOf(2, rate, (t) => 10 + (t >= 0.5 && t < 1.5 ? 300 * (t - 0.5) : 0) + sd * noise());
    const found = findStimulus(current, null);
    expect(found.kind).toBe('ramp');
    expect(Math.abs(found.onset_s! - 0.5)).toBeLessThan(0.02);
    expect(Math.abs(found.end_s! - 1.5)).toBeLessThan(0.006);
    expect(Math.abs(found.amplitude! - 300)).toBeLessThan(6);
    expect(found.holding).toBeCloseTo(10, 0);
  });

  it('finds a ramp that a digitizer has cut into small steps, and one that begins at once', () => {
    const coarse = signalOf(2, rate, (t) => (t >= 0.5 && t < 1.5 ? Math.round((100 * (t - 0.5)) / 0.5) * 0.5 : 0));
    expect(findStimulus(coarse, null).kind).toBe('ramp');
    const atOnce = signalOf(1, rate, (t) => 200 * t);
    expect(findStimulus(atOnce, null)).toMatchObject({ kind: 'ramp', onset_s: 0 });
  });

  it('tells injected noise from a step, and a sine from both', () => {
    const noise = normalNoise(21);
    let state = 0;
    const injected = signalOf(2, rate, (t) => {
      state += -state / 60 + noise() * 8;
      return t >= 0.5 && t < 1.5 ? state : 0;
    });
    const found = findStimulus(injected, null);
    expect(found.kind).toBe('noise');
    expect(Math.abs(found.onset_s! - 0.5)).toBeLessThan(0.02);
    expect(Math.abs(found.end_s! - 1.5)).toBeLessThan(0.02);
    const sine = signalOf(2, rate, (t) => (t >= 0.5 && t < 1.5 ? 50 * Math.sin(2 * Math.PI * 7 * t) : 0));
    expect(findStimulus(sine, null).kind).toBe('unknown');
  });

  it('reads over missing samples', () => {
    const current = step(-80);
    current.samples.fill(Number.NaN, 1000, 1400);
    current.samples[0] = Number.NaN;
    expect(findStimulus(current, null)).toMatchObject({ kind: 'step', amplitude: -80, onset_s: 0.2, end_s: 0.7 });
  });

  it('takes the statement where no channel can be read, and says when it cannot', () => {
    const stated = { kind: 'step', start_s: 1, end_s: 3, pa: -120 } as const;
    expect(findStimulus(null, stated)).toMatchObject({
      kind: 'step',
      from: 'stated',
      amplitude: -120,
      edges_s: [1, 3],
    });
    expect(findStimulus(null, { kind: 'none' })).toMatchObject({ kind: 'none', from: 'stated', holding: 0 });
    expect(findStimulus(null, null)).toMatchObject({ kind: 'unknown', from: 'absent', holding: null });
    const unreadable = { samples: new Float64Array(10).fill(Number.NaN), rate_hz: rate, start_s: 0 };
    expect(readCommand(unreadable, stated, 'current').remarks).toHaveLength(1);
    expect(findStimulus(unreadable, stated).from).toBe('stated');
  });

  it('believes the channel against the statement and says so', () => {
    const found = readCommand(step(50), { kind: 'step', start_s: 0.2, end_s: 0.7, pa: 500 }, 'current');
    expect(found.stimulus.amplitude).toBeCloseTo(50, 9);
    expect(found.remarks).toHaveLength(1);
  });

  it.each([0, 1, 2, 3, 7])('has an answer for a channel of %d samples', (length) => {
    const current = { samples: new Float64Array(length).map((_, i) => i), rate_hz: rate, start_s: 0 };
    expect(() => findStimulus(current, null)).not.toThrow();
  });

  it('finds the largest command of a voltage-clamp family', () => {
    const command = signalOf(1, rate, (t) => -80 + (t >= 0.1 && t < 0.12 ? -5 : t >= 0.3 && t < 0.6 ? 70 : 0));
    const found = readCommand(command, null, 'voltage');
    expect(found.stimulus).toMatchObject({ kind: 'step', holding: -80, amplitude: 70 });
    expect(found.levels).toHaveLength(5);
  });
});
