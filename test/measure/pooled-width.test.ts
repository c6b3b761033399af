import { describe, expect, it } from 'vitest';
import { pooledWidth } from '../../pipeline/measure/cell-spikes.ts';
import { normalNoise } from './made.ts';

const u95 = (values: number[], own: number[], usual: number | null): number => pooledWidth(values, own, usual).u95!;

describe('the half-width of a median over spikes', () => {
  it('is Student’s t alone where nothing is usual', () => {
    // t(0.975, 1) = 12.7062 (SciPy 1.10.1, stats.t.ppf); SD/√2 of 340 and 352 is 6.
    expect(u95([340, 352], [], null)).toBeCloseTo(12.7062 * 6, 2);
    expect(u95([340, 352], [8, 8], null)).toBeCloseTo(Math.hypot(12.7062 * 6, 8), 2);
  });

  it('of two beats that are as alike as beats are is no twelvefold', () => {
    // By hand: s = 4 % of 346 = 13.84, SD² = 72, √((72 + 4·191.5)/5) = 12.95, t(0.975, 5) = 2.5706.
    expect(u95([340, 352], [], 0.04 * 346)).toBeCloseTo((2.5706 * 12.947) / Math.SQRT2, 1);
  });

  it('of two beats that differ as beats do not stays what two numbers allow', () =>
    expect(u95([190, 850], [], 0.04 * 520)).toBeGreaterThan(4000));

  it('is never wider for what is usual', () =>
    expect(u95([340, 340.2, 340.1], [], 13)).toBeCloseTo(u95([340, 340.2, 340.1], [], null), 12));

  it('holds the truth for beats that scatter no more than is usual', () => {
    for (const n of [2, 3, 5])
      for (const share of [0.5, 1]) {
        const noise = normalNoise(100 * n + 10 * share);
        let held = 0;
        for (let k = 0; k < 2000; k++) {
          const values = Array.from({ length: n }, () => share * noise()).sort((a, b) => a - b);
          const median = (values[(n - 1) >> 1]! + values[n >> 1]!) / 2;
          if (Math.abs(median) <= u95(values, [], 1)) held++;
        }
        // 95 % ± three standard errors of 2000 trials, and what choosing the narrower one costs.
        expect(held / 2000).toBeGreaterThan(0.92);
        expect(held / 2000).toBeLessThan(0.98);
      }
  });
});
