import { describe, expect, test } from 'vitest';
import {
  bandPass,
  butterworth,
  finiteStretches,
  highPass,
  lowPass,
  magnitude,
  standardDeviation,
  zeroPhase,
} from '../../pipeline/signal/index.ts';
import { normalNoise } from '../helpers/models.ts';

const rate = 20_000;
const gain = (sections: ReturnType<typeof butterworth>, hz: number): number =>
  sections.reduce((product, section) => product * magnitude(section, (2 * Math.PI * hz) / rate), 1);

describe('Butterworth', () => {
  test('1/√2 at the corners, 1 inside, less and less outside', () => {
    for (const order of [1, 2, 3, 4, 8]) {
      const low = butterworth(order, { low_hz: null, high_hz: 1000 }, rate);
      expect(gain(low, 1000)).toBeCloseTo(Math.SQRT1_2, 8);
      expect(gain(low, 1e-6)).toBeCloseTo(1, 10);
      const high = butterworth(order, { low_hz: 1000, high_hz: null }, rate);
      expect(gain(high, 1000)).toBeCloseTo(Math.SQRT1_2, 8);
      expect(gain(high, rate / 2)).toBeCloseTo(1, 10);
      const band = butterworth(order, { low_hz: 1000, high_hz: 5000 }, rate);
      expect(gain(band, 1000)).toBeCloseTo(Math.SQRT1_2, 8);
      expect(gain(band, 5000)).toBeCloseTo(Math.SQRT1_2, 8);
      expect(gain(band, 100)).toBeLessThan(0.3);
    }
  });
  // |H|² = 1/(1 + (tan(πf/rate)/tan(πf_c/rate))^(2n)): the bilinear transform of the Butterworth magnitude.
  test('the magnitude is that of the definition at every frequency', () => {
    const sections = butterworth(4, { low_hz: null, high_hz: 2000 }, rate);
    for (let hz = 50; hz < rate / 2; hz += 333) {
      const ratio = Math.tan((Math.PI * hz) / rate) / Math.tan((Math.PI * 2000) / rate);
      expect(gain(sections, hz)).toBeCloseTo(1 / Math.sqrt(1 + ratio ** 8), 9);
    }
  });
  test('impossible corners are refused with the range', () => {
    expect(() => butterworth(2, { low_hz: null, high_hz: 10_000 }, rate)).toThrow(/between 0 and 10000 Hz.*got 10000/);
    expect(() => butterworth(2, { low_hz: 500, high_hz: 400 }, rate)).toThrow(/low_hz must be below high_hz/);
    expect(() => butterworth(2, { low_hz: null, high_hz: null }, rate)).toThrow(/at least one corner/);
    expect(() => butterworth(0, { low_hz: 1, high_hz: null }, rate)).toThrow(/order/);
  });
});

describe('zero phase', () => {
  test('a constant passes a low-pass and vanishes in a high-pass', () => {
    const flat = new Float64Array(500).fill(-70);
    for (const v of lowPass(flat, rate, 1000)) expect(v).toBeCloseTo(-70, 9);
    for (const v of highPass(flat, rate, 1000)) expect(v).toBeCloseTo(0, 9);
    for (const v of bandPass(flat, rate, 1000, 5000)) expect(v).toBeCloseTo(0, 9);
  });
  test('a peak stays where it is', () => {
    const bump = Float64Array.from({ length: 2001 }, (_, i) => Math.exp(-(((i - 1000) / 30) ** 2)));
    const smooth = lowPass(bump, rate, 300);
    for (let k = 1; k < 900; k++) expect(smooth[1000 + k]!).toBeCloseTo(smooth[1000 - k]!, 8);
  });
  test('white noise keeps the share of the band, run twice', () => {
    const next = normalNoise(13);
    const noise = Float64Array.from({ length: 200_000 }, () => next());
    const sections = butterworth(4, { low_hz: 1000, high_hz: 5000 }, rate);
    let power = 0;
    for (let k = 0; k < 5000; k++) power += gain(sections, ((k + 0.5) * rate) / 10_000) ** 4 / 5000;
    expect(standardDeviation(zeroPhase(noise, sections))!).toBeCloseTo(Math.sqrt(power), 2);
  });
  test('stretches between gaps are filtered by themselves, short ones are not measured', () => {
    const samples = new Float64Array(1000).fill(5);
    samples[300] = Number.NaN;
    samples[310] = Number.NaN;
    const out = lowPass(samples, rate, 1000);
    expect(finiteStretches(samples)).toEqual([
      [0, 300],
      [301, 310],
      [311, 1000],
    ]);
    for (let i = 300; i <= 310; i++) expect(out[i]).toBeNaN();
    expect(out[299]).toBeCloseTo(5, 9);
    expect(lowPass(new Float64Array(0), rate, 1000)).toHaveLength(0);
    expect(lowPass(Float64Array.of(1), rate, 1000)[0]).toBeNaN();
  });
});
