import { describe, expect, test } from 'vitest';
import { coverage95, linearFit, lineErrorAt, mean, serialLine, serialMean } from '../../pipeline/signal/index.ts';
import { normalNoise } from '../helpers/models.ts';

type Maker = (n: number, next: () => number) => number[];

const white: Maker = (n, next) => Array.from({ length: n }, next);
/** First-order autoregression: a membrane's noise, with a correlation time of −1/ln(share) samples. */
const coloured =
  (share: number): Maker =>
  (n, next) => {
    let value = next();
    return Array.from({ length: n }, () => {
      value = share * value + Math.sqrt(1 - share ** 2) * next();
      return value;
    });
  };
const withHum =
  (amplitude: number, period: number): Maker =>
  (n, next) => {
    const phase = 10 * next();
    return Array.from({ length: n }, (_, i) => next() + amplitude * Math.sin((2 * Math.PI * i) / period + phase));
  };
/** Sum of autoregressions with correlation times half a decade apart: falls as 1/f down to one over the span. */
const oneOverF: Maker = (n, next) => {
  const parts = [1, 3, 10, 30, 100].filter((tau) => tau < 0.6 * n).map((tau) => coloured(Math.exp(-1 / tau))(n, next));
  return Array.from({ length: n }, (_, i) => parts.reduce((sum, part) => sum + part[i]!, 0));
};

/** Share of intervals, %, that hold the truth, for the mean, the slope and the value of the line at its first point. */
function coverage(maker: Maker, n: number, trials: number): { mean: number; slope: number; start: number } {
  const next = normalNoise(41 + n);
  const x = Array.from({ length: n }, (_, i) => i / n);
  const held = { mean: 0, slope: 0, start: 0 };
  for (let k = 0; k < trials; k++) {
    const noise = maker(n, next);
    const level = serialMean(noise.map((v) => v - 65))!;
    if (Math.abs(level.value + 65) <= coverage95(level.freedom) * level.se!) held.mean++;
    const line = serialLine(
      x,
      noise.map((v, i) => v + 3 + 4 * x[i]!),
    )!;
    const t = coverage95(line.freedom);
    if (Math.abs(line.slope - 4) <= t * line.se_slope!) held.slope++;
    if (Math.abs(line.intercept - 3) <= t * line.se_intercept!) held.start++;
  }
  const percent = (count: number): number => (100 * count) / trials;
  return { mean: percent(held.mean), slope: percent(held.slope), start: percent(held.start) };
}

describe('mean and line of serially correlated samples', () => {
  test('nothing, one and two readable values', () => {
    expect(serialMean([])).toBeNull();
    expect(serialMean([Number.NaN])).toBeNull();
    expect(serialMean([3])).toEqual({ value: 3, se: null, freedom: 0, sd: null, n: 1 });
    // Two values: mean 2, standard deviation √2, standard error 1 with one degree of freedom.
    const two = serialMean([1, 3])!;
    expect(two).toMatchObject({ value: 2, freedom: 1, n: 2 });
    expect(two.se).toBeCloseTo(1, 12);
    expect(serialLine([1, 1], [2, 3])).toBeNull();
    expect(serialLine([1, 2], [2, 3])).toMatchObject({ slope: 1, intercept: 1, se_slope: null, freedom: 0 });
    expect(() => serialLine([1], [])).toThrow(/one length, got 1 and 0/);
  });
  test('of up to five values the error is the textbook’s', () => {
    const values = [2, 4, 5, 4, 5];
    expect(serialMean(values)!.se).toBeCloseTo(Math.sqrt(1.5 / 5), 12);
    expect(serialMean(values)!.freedom).toBe(4);
    // Worked by hand: residual sum of squares 2.4, three degrees of freedom.
    const line = serialLine([1, 2, 3, 4, 5], values)!;
    expect(line.freedom).toBe(3);
    expect(line.se_slope).toBeCloseTo(Math.sqrt(0.08), 12);
    expect(line.se_intercept).toBeCloseTo(Math.sqrt(0.8 * (1 / 5 + 9 / 10)), 12);
    expect(lineErrorAt(line, 0)).toBeCloseTo(line.se_intercept!, 12);
  });
  test('constant values have no error, a straight line none of its own', () => {
    expect(serialMean(new Array(50).fill(-70))).toMatchObject({ value: -70, se: 0, sd: 0 });
    const x = Array.from({ length: 90 }, (_, i) => i * 0.1);
    const line = serialLine(
      x,
      x.map((v) => 1e6 - 2 * v),
    )!;
    expect(line.slope).toBeCloseTo(-2, 6);
    expect(line.se_slope).toBeLessThan(1e-6);
  });
  test('value, slope and intercept are those of the plain mean and line, gaps left out', () => {
    const next = normalNoise(3);
    const x = Array.from({ length: 400 }, (_, i) => 5 + i * 0.02);
    const y = x.map((v, i) => (i % 11 === 4 ? Number.NaN : 2 - v + next()));
    const line = serialLine(x, y)!;
    const plain = linearFit(x, y)!;
    expect(line.slope).toBeCloseTo(plain.slope, 12);
    expect(line.intercept).toBeCloseTo(plain.intercept, 10);
    expect(line.residual_sd).toBeCloseTo(plain.residual_sd!, 12);
    expect(line.n).toBe(plain.n);
    expect(serialMean(y)!.value).toBeCloseTo(mean(y)!, 12);
  });
  test('shift and scale of the values go through', () => {
    const y = coloured(0.9)(500, normalNoise(5));
    const one = serialMean(y)!;
    const other = serialMean(y.map((v) => 1e6 - 20 * v))!;
    expect(other.se! / one.se!).toBeCloseTo(20, 6);
    expect(other.freedom).toBe(one.freedom);
  });

  // 400 trials know a coverage of 95 % to 1.1 %: 92–98 % leaves nearly three standard errors.
  test.each([
    ['white noise, 12 samples', white, 12],
    ['white noise, 200 samples', white, 200],
    ['white noise, 1500 samples', white, 1500],
    ['a correlation time of 1.4 samples in 200', coloured(0.5), 200],
    ['a correlation time of 10 samples in 1000', coloured(0.9), 1000],
  ] as const)('%s: 92–98 % of intervals hold the truth', (_, maker, n) => {
    const found = coverage(maker, n, 400);
    for (const share of [found.mean, found.slope, found.start]) {
      expect(share).toBeGreaterThan(92);
      expect(share).toBeLessThan(98.5);
    }
  });
  test('hum faster than half the span never makes it too small', () => {
    const found = coverage(withHum(0.5, 40), 500, 300);
    for (const share of [found.mean, found.slope, found.start]) expect(share).toBeGreaterThan(92);
  });
  test('1/f noise down to the span: too small, but by far less than the textbook error', () => {
    const found = coverage(oneOverF, 300, 300);
    for (const share of [found.mean, found.slope, found.start]) expect(share).toBeGreaterThan(80);
    const next = normalNoise(8);
    let textbook = 0;
    for (let k = 0; k < 300; k++) {
      const noise = oneOverF(300, next);
      const { value, sd } = serialMean(noise)!;
      if (Math.abs(value) <= (1.97 * sd!) / Math.sqrt(300)) textbook++;
    }
    expect(textbook / 3).toBeLessThan(35);
  });
});
