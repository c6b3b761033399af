import { describe, expect, it } from 'vitest';
import { hum, noise, stuckStretches } from '../../pipeline/measure/quality.ts';
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import { addSpike, input, neuron, normalNoise, numberIn, passiveSweep, signalOf } from './made.ts';

const rate = 20000;
const whole = (signal: { samples: Float64Array }) => [{ from: 0, to: signal.samples.length }];
const white = (sd: number, seed: number, seconds = 1, at = rate) => {
  const next = normalNoise(seed);
  return signalOf(seconds, at, () => -70 + sd * next());
};

describe('noise', () => {
  it('is the share of white noise that lies in the stated band', () => {
    const signal = white(0.2, 1, 2);
    const found = noise(signal, whole(signal), null);
    // White noise is even up to half the rate: 7 of 10 kHz lie between 1 and 8 kHz. The filter's corners are not square.
    expect(found.value! / (0.2 * Math.sqrt(7 / 10))).toBeGreaterThan(0.95);
    expect(found.value! / (0.2 * Math.sqrt(7 / 10))).toBeLessThan(1.0);
    expect(found.note).toContain('1 kHz to 8 kHz');
    expect(found.note).toContain('not stated');
    const filtered = noise(signal, whole(signal), 3);
    expect(filtered.value! / (0.2 * Math.sqrt(2 / 10))).toBeGreaterThan(0.9);
    expect(filtered.note).toBe('1 kHz to 3 kHz');
  });

  it('scales with the trace', () => {
    const signal = white(0.1, 4);
    const tenfold = { ...signal, samples: signal.samples.map((value) => 10 * value) };
    expect(noise(tenfold, whole(signal), null).value!).toBeCloseTo(10 * noise(signal, whole(signal), null).value!, 9);
  });

  it('does not hear slow potentials, hum or drift', () => {
    const signal = signalOf(1, rate, (t) => -70 + 3 * Math.sin(2 * Math.PI * 50 * t) + 5 * t);
    expect(noise(signal, whole(signal), null).value!).toBeLessThan(0.01);
  });

  it('says why it cannot be had', () => {
    const signal = white(0.1, 2, 1, 2000);
    expect(noise(signal, whole(signal), null).why).toBe('rate-too-low');
    const fast = white(0.1, 2);
    expect(noise(fast, whole(fast), 1).why).toBe('unresolved');
    expect(noise(fast, [{ from: 0, to: 20 }], null).why).toBe('no-spike-free-stretch');
  });

  it('is not changed by spikes and steps in the sweep', () => {
    const made = passiveSweep(
      { rest_mv: -70, resistance_mohm: 100, tau_ms: 15, noise_mv: 0.1, seed: 8 },
      { pa: 150, from_s: 0.3, to_s: 0.8 },
      1.5,
    );
    for (const at of [0.35, 0.4, 0.5, 0.7]) addSpike(made.voltage.samples, rate, at);
    const { readings } = measureSweep(input(made), neuron);
    expect(Math.abs(numberIn(readings, 'noise_rms_mv') / (0.1 * Math.sqrt(0.7)) - 1)).toBeLessThan(0.06);
  });
});

describe('hum', () => {
  it.each([
    [50, 50.04],
    [60, 59.97],
    [null, 50.02],
    [null, 60.05],
  ])('mains %s: finds amplitude and frequency at %d Hz', (mains, hz) => {
    const next = normalNoise(6);
    const signal = signalOf(3, rate, (t) => -65 + 0.25 * Math.sin(2 * Math.PI * hz * t + 1) + 0.1 * next() + 0.5 * t);
    const found = hum(signal, whole(signal), mains);
    expect(Math.abs(found['mains_hum_mv']!.value! - 0.25)).toBeLessThan(0.01);
    expect(Math.abs(found['mains_hum_hz']!.value! - hz)).toBeLessThan(0.03);
  });

  it('keeps its phase over the gaps that spikes leave', () => {
    const signal = signalOf(2, rate, (t) => -65 + 0.3 * Math.sin(2 * Math.PI * 50 * t));
    const stretches = [0, 0.2, 0.4, 0.6, 0.8, 1].map((s) => ({
      from: Math.round((s + 0.03) * rate),
      to: (s + 0.2) * rate,
    }));
    const found = hum(signal, stretches, 50);
    expect(found['mains_hum_mv']!.value!).toBeCloseTo(0.3, 1);
    expect(Math.abs(found['mains_hum_hz']!.value! - 50)).toBeLessThan(0.2);
  });

  it('has no frequency where there is no hum, and a small amplitude with its error', () => {
    const signal = white(0.2, 9, 2);
    const found = hum(signal, whole(signal), 50);
    expect(found['mains_hum_hz']).toMatchObject({ value: null, why: 'unresolved' });
    expect(found['mains_hum_mv']!.value!).toBeLessThan(0.01);
    expect(found['mains_hum_mv']!.se!).toBeGreaterThan(0);
  });

  it('shows a clear line elsewhere: the rate may be another than declared', () => {
    const next = normalNoise(16);
    // 50 Hz recorded at 25 kHz and declared as 20 kHz appears at 40 Hz.
    const signal = signalOf(2, rate, (t) => -65 + 0.2 * Math.sin(2 * Math.PI * 40 * t) + 0.05 * next());
    const found = hum(signal, whole(signal), 50);
    expect(Math.abs(found['mains_hum_hz']!.value! - 40)).toBeLessThan(0.1);
    expect(found['mains_hum_hz']!.note).toContain('no line near');
  });

  it('needs a tenth of a second of quiet', () => {
    const signal = white(0.1, 3);
    expect(hum(signal, [{ from: 0, to: 1000 }], 50)['mains_hum_mv']!.why).toBe('no-spike-free-stretch');
  });
});

describe('the recorder', () => {
  it('leaves its step in the samples', () => {
    const next = normalNoise(12);
    // 16 bits over 20 V at a gain of 10: 0.030517578125 mV (q = span/2^n, divided by the gain).
    const q = 0.030517578125;
    const voltage = signalOf(1, rate, () => Math.round((-70 + 0.2 * next()) / q) * q);
    const { readings } = measureSweep(input({ voltage, current: null }), neuron);
    expect(numberIn(readings, 'quantum_mv')).toBeCloseTo(q, 6);
    expect(numberIn(readings, 'sample_interval_us')).toBe(50);
    expect(measureSweep(input({ voltage: white(0.1, 1), current: null }), neuron).readings['quantum_mv']!.why).toBe(
      'unresolved',
    );
  });

  it('is stuck at its limit for a share of the samples', () => {
    const voltage = signalOf(1, rate, (t) => Math.min(20, -60 + 100 * Math.exp(-(((t - 0.5) / 0.02) ** 2))));
    const { readings } = measureSweep(input({ voltage, current: null }), neuron);
    const share = voltage.samples.filter((value) => value === 20).length / voltage.samples.length;
    expect(numberIn(readings, 'clipped_fraction')).toBeCloseTo(share, 9);
    expect(readings['clipped_fraction']!.at!.from_s!).toBeCloseTo(0.4874, 2);
  });

  it('is not stuck where noise repeats the lowest value three times', () => {
    const samples = Float64Array.from({ length: 2000 }, (_, i) => (i % 7) * 0.01);
    samples.fill(-0.05, 1000, 1003);
    expect(stuckStretches(samples)).toHaveLength(0);
  });

  it('misses samples', () => {
    const voltage = white(0.1, 7);
    voltage.samples.fill(Number.NaN, 3000, 4000);
    const { readings } = measureSweep(input({ voltage, current: null }), neuron);
    expect(numberIn(readings, 'missing_fraction')).toBeCloseTo(0.05, 9);
    expect(Math.abs(numberIn(readings, 'baseline_mv') + 70)).toBeLessThan(0.01);
    expect(numberIn(readings, 'noise_rms_mv')).toBeGreaterThan(0.05);
  });
});
