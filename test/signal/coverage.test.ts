import { describe, expect, test } from 'vitest';
import { measured } from '../../pipeline/measure/reading.ts';
import { coverage95 } from '../../pipeline/signal/coverage.ts';

describe('coverage factor of 95 %', () => {
  // SciPy 1.10.1, scipy.stats.t.ppf(0.975, n).
  test.each([
    [1, 12.706204736432095],
    [2, 4.302652729911275],
    [2.5, 3.5746548420118773],
    [3, 3.182446305284263],
    [5, 2.5705818366147395],
    [10, 2.2281388519649385],
    [30, 2.0422724563012373],
    [100, 1.9839715184496334],
  ])('%d degrees of freedom', (n, expected) => expect(coverage95(n) / expected).toBeCloseTo(1, 4));
  test.each([
    [1.25, 8.027951388514332],
    [1.5, 6.016663107990447],
    [1.75, 4.948847849892041],
  ])('between one and two: %d', (n, expected) => expect(coverage95(n) / expected).toBeCloseTo(1, 4));
  test('without end: the normal distribution', () => expect(coverage95()).toBeCloseTo(1.959964, 6));
  test('falls as the degrees of freedom grow', () => {
    const factors = Array.from({ length: 60 }, (_, k) => coverage95(1 + k / 2));
    expect(factors).toEqual(factors.toSorted((a, b) => b - a));
  });
});

describe('a measured number', () => {
  test('carries Student’s t times its standard uncertainty', () =>
    expect(measured(3, { se: 2, freedom: 4 }).u95).toBeCloseTo(5.5529, 3));
  test('keeps a half-width that was had in another way', () => expect(measured(3, { se: 2, u95: 1 }).u95).toBe(1));
  test('has none without an uncertainty', () => expect(measured(3, { sd: 2, n: 9 })).not.toHaveProperty('u95'));
});
