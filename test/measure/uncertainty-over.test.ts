import { describe, expect, test } from 'vitest';
import { uncertaintyOver } from '../../pipeline/measure/cell-numbers.ts';
import { coverage95 } from '../../pipeline/signal/coverage.ts';
import { median, standardDeviation } from '../../pipeline/signal/statistics.ts';
import { normalNoise } from '../helpers/models.ts';

/** How often the 95 % interval of a median holds the truth, 0. */
function held(n: number, own: number, between: number, runs = 4000): number {
  const next = normalNoise(n * 100 + Math.round(between * 10) + 7);
  let hits = 0;
  for (let run = 0; run < runs; run++) {
    const values = Array.from({ length: n }, () => own * next() + between * next());
    const { se, freedom } = uncertaintyOver(
      values,
      values.map(() => own),
    );
    if (Math.abs(median(values)!) <= coverage95(freedom) * se!) hits++;
  }
  return hits / runs;
}

describe('uncertainty of a number over sweeps', () => {
  test.each([2, 3, 5, 12])('%d sweeps that scatter as their own uncertainties say', (n) => {
    expect(held(n, 1, 0)).toBeGreaterThan(0.93);
    expect(held(n, 1, 0)).toBeLessThan(0.985);
  });
  test.each([5, 12])('%d sweeps that scatter five times more', (n) => {
    expect(held(n, 1, 5)).toBeGreaterThan(0.92);
    expect(held(n, 1, 5)).toBeLessThan(0.985);
  });
  test('two sweeps that agree give no absurd interval', () => {
    const { se, freedom } = uncertaintyOver([10, 10.5], [1, 1]);
    expect(coverage95(freedom) * se!).toBeLessThan(2);
  });
  test('two sweeps that disagree: no more than a few times their distance, and that at least', () => {
    // Student's t of one degree of freedom would give 12.7/2 of it.
    const { se, freedom } = uncertaintyOver([10, 20], [0.1, 0.1]);
    expect(coverage95(freedom) * se!).toBeLessThan(20);
    expect(coverage95(freedom) * se!).toBeGreaterThan(10);
  });
  // 76 % (SciPy 1.10: 0.773 in 400 000 trials, 0.776 with one degree of freedom): not the few sweeps' t, but the single
  // sweeps' uncertainties are what falls short there.
  test('two sweeps whose own uncertainties are three times too small lose little by it', () => {
    expect(held(2, 1, Math.sqrt(8), 20000)).toBeGreaterThan(0.76);
  });
  test('without uncertainties of their own: the scatter alone', () => {
    const values = [1, 2, 4];
    const { se, freedom, sd } = uncertaintyOver(values, [null, null, null], 'mean');
    expect(sd).toBe(standardDeviation(values));
    expect(se).toBeCloseTo(sd! / Math.sqrt(3), 12);
    expect(freedom).toBe(2);
  });
  test('one value: its own', () => expect(uncertaintyOver([3], [0.2])).toEqual({ n: 1, se: 0.2 }));
  test('one value without any', () => expect(uncertaintyOver([3], [null])).toEqual({ n: 1 }));
});
