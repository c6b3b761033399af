import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import {
  countFinite,
  mean,
  median,
  movingAverage,
  quantile,
  robustSpread,
  runningMedian,
  standardDeviation,
} from '../../pipeline/signal/index.ts';
import { normalNoise } from '../helpers/models.ts';

const numbers = fc.array(fc.double({ min: -1e6, max: 1e6, noNaN: true }), { minLength: 1, maxLength: 60 });

describe('order statistics', () => {
  test('nothing readable gives null', () => {
    for (const f of [mean, median, standardDeviation, robustSpread]) {
      expect(f([])).toBeNull();
      expect(f([Number.NaN, Number.NaN])).toBeNull();
    }
    expect(standardDeviation([3])).toBeNull();
    expect(median([3])).toBe(3);
  });
  test('NaN is left out', () => {
    expect(median([Number.NaN, 1, 3, Number.NaN, 2])).toBe(2);
    expect(mean([1, Number.NaN, 3])).toBe(2);
    expect(standardDeviation([1, Number.NaN, 3])).toBeCloseTo(Math.SQRT2, 12);
    expect(countFinite([1, Number.NaN, Number.POSITIVE_INFINITY, 2])).toBe(2);
  });
  // Type 7 of Hyndman & Fan 1996: position (n − 1)·p.
  test('quantiles lie linearly between order statistics', () => {
    expect(quantile([1, 2, 3, 4], 0.25)).toBe(1.75);
    expect(quantile([10, 20], 0.9)).toBe(19);
    expect(() => quantile([1], 1.5)).toThrow(/p must lie between 0 and 1, got 1.5/);
  });
  // Dispersion from the median absolute deviation: 1, 1, 2, 2, 4, 6, 9 has MAD 1.
  test('robust spread', () => {
    expect(robustSpread([1, 1, 2, 2, 4, 6, 9])).toBeCloseTo(1.4826, 4);
    const next = normalNoise(3);
    expect(robustSpread(Float64Array.from({ length: 20_000 }, () => 5 * next()))).toBeCloseTo(5, 0);
  });
  test('shift and scale go through', () => {
    fc.assert(
      fc.property(numbers, fc.double({ min: -100, max: 100, noNaN: true }), (values, shift) => {
        const moved = values.map((v) => v + shift);
        expect(median(moved)!).toBeCloseTo(median(values)! + shift, 6);
        expect(robustSpread(moved)!).toBeCloseTo(robustSpread(values)!, 6);
      }),
      { seed: 11 },
    );
  });
  test('the input is not changed', () => {
    const values = Object.freeze([3, 1, 2]);
    median(values);
    expect(values).toEqual([3, 1, 2]);
  });
});

describe('smoothing', () => {
  test('a straight line stays one, ends included', () => {
    const line = Float64Array.from({ length: 50 }, (_, i) => 3 - 0.25 * i);
    for (const half of [0, 1, 7, 40]) {
      movingAverage(line, half).forEach((v, i) => {
        expect(v).toBeCloseTo(line[i]!, 10);
      });
      runningMedian(line, half).forEach((v, i) => {
        expect(v).toBeCloseTo(line[i]!, 10);
      });
    }
  });
  test('the running median drops a glitch, the running mean spreads it', () => {
    const glitch = new Float64Array(9);
    glitch[4] = 9;
    expect(Array.from(runningMedian(glitch, 1))).toEqual(new Array(9).fill(0));
    expect(Array.from(movingAverage(glitch, 1))).toEqual([0, 0, 0, 3, 3, 3, 0, 0, 0]);
  });
  test('unreadable samples are left out of their windows', () => {
    const gap = Float64Array.of(1, Number.NaN, 3, Number.NaN, Number.NaN, Number.NaN, 7);
    expect(movingAverage(gap, 1)[1]).toBe(2);
    expect(movingAverage(gap, 1)[4]).toBeNaN();
    expect(runningMedian(gap, 1)[4]).toBeNaN();
  });
  test('equal to the plain sum', () => {
    fc.assert(
      fc.property(numbers, fc.integer({ min: 0, max: 9 }), (values, half) => {
        const samples = Float64Array.from(values);
        const fast = movingAverage(samples, half);
        samples.forEach((_, i) => {
          const reach = Math.min(half, i, samples.length - 1 - i);
          expect(fast[i]!).toBeCloseTo(mean(samples.slice(i - reach, i + reach + 1))!, 5);
        });
      }),
      { seed: 12 },
    );
  });
  test('a window that is no number of samples is refused', () =>
    expect(() => movingAverage(new Float64Array(3), 1.5)).toThrow(/halfWidth must be a whole number .* got 1.5/));
});
