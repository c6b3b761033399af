import { describe, expect, test } from 'vitest';
import { bandLimited, localCubic, varianceOf, weighed } from '../../pipeline/signal/band-limited.ts';
import { coverage95Biased } from '../../pipeline/signal/coverage.ts';
import { besselGain, besselKernel, besselSpread_s, smoothedBy, unsmoothed } from '../../pipeline/signal/restoration.ts';

const places = Array.from({ length: 40 }, (_, k) => 90 + 0.137 * k);
const sampled = (f: (x: number) => number): Float64Array => Float64Array.from({ length: 200 }, (_, i) => f(i));

describe('between samples', () => {
  // A sine below the cutoff is what it is everywhere between its samples: Shannon 1949, Proc IRE 37:10–21.
  test.each([0.05, 0.2, 0.4])('a sine at %d of half the rate is read within a thousandth', (share) => {
    const w = Math.PI * share;
    const samples = sampled((x) => Math.sin(w * x));
    for (const x of places) {
      const read = bandLimited(x, 1, 0, 199)!;
      expect(Math.abs(weighed(samples, read.value) - Math.sin(w * x))).toBeLessThan(1e-3);
      expect(Math.abs(weighed(samples, read.slope) / w - Math.cos(w * x))).toBeLessThan(0.01);
    }
  });
  test('a sine well above the cutoff is gone', () => {
    const samples = sampled((x) => Math.sin(0.8 * Math.PI * x));
    for (const x of places) expect(Math.abs(weighed(samples, bandLimited(x, 0.4, 0, 199)!.value))).toBeLessThan(1e-3);
  });
  test('a straight line stays one, also at the ends of the trace', () => {
    const samples = sampled((x) => 3 - 0.7 * x);
    for (const x of [0, 0.3, 1.9, 100.4, 198.2, 199])
      for (const read of [bandLimited(x, 1, 0, 199), bandLimited(x, 0.3, 0, 199), localCubic(x, 6, 0, 199)]) {
        expect(weighed(samples, read!.value)).toBeCloseTo(3 - 0.7 * x, 9);
        expect(weighed(samples, read!.slope)).toBeCloseTo(-0.7, 9);
      }
  });
  test('a cubic is read exactly by the local cubic', () => {
    const f = (x: number): number => 2 + x - 0.02 * x ** 2 + 1e-4 * x ** 3;
    const samples = sampled(f);
    for (const x of places)
      for (const half of [3, 7.5, 40]) {
        const read = localCubic(x, half, 0, 199)!;
        expect(weighed(samples, read.value)).toBeCloseTo(f(x), 7);
        expect(weighed(samples, read.slope)).toBeCloseTo(1 - 0.04 * x + 3e-4 * x ** 2, 8);
      }
  });
  test('too few samples, or a place outside them, give nothing', () => {
    expect(localCubic(10, 1.5, 0, 199)).toBeNull();
    expect(bandLimited(-0.1, 1, 0, 199)).toBeNull();
    expect(bandLimited(5, 1, 5, 6)).toBeNull();
  });
  test('variance of a weighted sum, by the double sum over all pairs', () => {
    const weights = Float64Array.of(0.2, -0.5, 1, 0.3);
    const covariance = Float64Array.of(2, 0.7, -0.1);
    let slow = 0;
    for (const [i, a] of weights.entries())
      for (const [j, b] of weights.entries()) slow += a * b * (covariance[Math.abs(i - j)] ?? 0);
    expect(varianceOf(weights, covariance)).toBeCloseTo(slow, 12);
  });
});

describe('the four-pole Bessel low-pass', () => {
  // SciPy 1.10: scipy.signal.bessel(4, 2π·8000, analog=True, norm='mag'), freqs.
  test.each([
    [1000, 0.99502011],
    [4000, 0.92202805],
    [8000, Math.SQRT1_2],
    [16000, 0.21366346],
  ])('gain at %d Hz', (hz, gain) => expect(besselGain(hz, 8000)).toBeCloseTo(gain, 7));
  test.each([
    [20_000, 50_000],
    [8000, 20_000],
    [2000, 5000],
    [8000, 100_000],
  ])('its kernel at %d Hz on a grid of %d Hz has its spread in time', (corner, rate) => {
    const kernel = besselKernel(corner, rate);
    const square = kernel.reduce((sum, weight, lag) => sum + 2 * weight * lag * lag, 0);
    expect(Math.sqrt(square) / rate / besselSpread_s(corner)).toBeCloseTo(1, 2);
  });
  test('undoing it brings back 1 − (1 − g)³ of a sine that it passes with gain g', () => {
    const kernel = besselKernel(8000, 40_000);
    const samples = Float64Array.from({ length: 400 }, (_, i) => Math.sin((2 * Math.PI * 4000 * i) / 40_000));
    const passed = smoothedBy(samples, kernel);
    const gain = passed[202]! / samples[202]!;
    expect(gain).toBeCloseTo(besselGain(4000, 8000), 2);
    expect(unsmoothed(passed, kernel, 2)[202]! / samples[202]!).toBeCloseTo(1 - (1 - gain) ** 3, 6);
  });
});

describe('half-width of a number with an expected error', () => {
  // SciPy 1.10: root of norm.cdf((u − b)/s) − norm.cdf((−u − b)/s) = 0.95.
  test.each([
    [0, 1, 1.95996398],
    [0.5, 1, 2.18147744],
    [1, 1, 2.64614555],
    [-3, 1, 4.64485363],
    [0.3, 0.1, 0.46448536],
  ])('bias %d, spread %d', (bias, sd, expected) => expect(coverage95Biased(bias, sd)).toBeCloseTo(expected, 5));
  test('without spread: the bias', () => expect(coverage95Biased(-0.4, 0)).toBe(0.4));
});
