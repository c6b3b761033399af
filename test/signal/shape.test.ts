import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import {
  clippedRuns,
  crossing,
  derivativeVPerS,
  envelope,
  excursions,
  localMaxima,
  prominence,
  quantum,
  slopeVPerS,
  valueAt,
  vertex,
} from '../../pipeline/signal/index.ts';
import { quantized, withNoise } from '../helpers/models.ts';

const samples = (...values: number[]): Float64Array => Float64Array.from(values);
const trace = fc
  .array(fc.double({ min: -200, max: 200, noNaN: true }), { minLength: 3, maxLength: 120 })
  .map((values) => Float64Array.from(values));

describe('derivative', () => {
  test('no slope in nothing, one sample, or beside NaN', () => {
    expect(derivativeVPerS(samples(), 1000)).toHaveLength(0);
    expect(derivativeVPerS(samples(5), 1000)[0]).toBeNaN();
    const beside = derivativeVPerS(samples(0, 1, Number.NaN, 3, 4, 5), 1000);
    expect(Array.from(beside, Number.isNaN)).toEqual([false, true, false, true, false, false]);
  });
  test('10 mV/ms is 10 V/s at any rate', () => {
    for (const rate of [1000, 20_000, 50_000]) {
      const line = Float64Array.from({ length: 40 }, (_, i) => -70 + (10 * i * 1000) / rate);
      for (const m of [1, 2, 5])
        slopeVPerS(line, rate, m).forEach((v) => {
          expect(v).toBeCloseTo(10, 8);
        });
    }
  });
  test('a rate that is none is refused', () => {
    for (const rate of [0, -1, Number.NaN, Number.POSITIVE_INFINITY])
      expect(() => derivativeVPerS(samples(1, 2), rate)).toThrow(/rateHz must be a finite rate above 0 Hz/);
    expect(() => slopeVPerS(samples(1, 2, 3), 1000, 0)).toThrow(/halfWidth/);
  });
  test('the running slope is the least-squares slope of every window', () => {
    fc.assert(
      fc.property(trace, fc.integer({ min: 1, max: 12 }), (mv, m) => {
        const fast = slopeVPerS(mv, 1000, m);
        for (let i = m; i < mv.length - m; i++) {
          let moment = 0;
          let squares = 0;
          for (let k = -m; k <= m; k++) {
            moment += k * mv[i + k]!;
            squares += k * k;
          }
          expect(fast[i]!).toBeCloseTo(moment / squares, 8);
        }
      }),
      { seed: 21 },
    );
  });
  test('a gap costs the windows that hold it and no more', () => {
    const mv = Float64Array.from({ length: 5000 }, (_, i) => Math.sin(i / 9));
    const whole = slopeVPerS(mv, 1000, 4);
    mv[2500] = Number.NaN;
    const broken = slopeVPerS(mv, 1000, 4);
    broken.forEach((v, i) => {
      if (Math.abs(i - 2500) <= 4) expect(v).toBeNaN();
      else expect(v).toBeCloseTo(whole[i]!, 9);
    });
  });
});

describe('crossing', () => {
  const wave = samples(0, 1, 2, 1, 0, -1, 0, 3);
  test('forwards, backwards, up and down', () => {
    expect(crossing(wave, 0.5, { from: 0, to: 7, direction: 'up' })).toBe(0.5);
    expect(crossing(wave, 0.5, { from: 0, to: 7, direction: 'down' })).toBe(3.5);
    expect(crossing(wave, 1.5, { from: 7, to: 0, direction: 'up' })).toBe(6.5);
    expect(crossing(wave, 1.5, { from: 5, to: 0, direction: 'up' })).toBe(1.5);
    expect(crossing(wave, 5, { from: 0, to: 7, direction: 'up' })).toBeNull();
  });
  test('nothing, one sample, flat at the level, across NaN', () => {
    expect(crossing(samples(), 0, { from: 0, to: 0, direction: 'up' })).toBeNull();
    expect(crossing(samples(1), 1, { from: 0, to: 0, direction: 'up' })).toBeNull();
    expect(crossing(samples(1, 1, 1), 1, { from: 0, to: 2, direction: 'up' })).toBeNull();
    expect(crossing(samples(0, Number.NaN, 2), 1, { from: 0, to: 2, direction: 'up' })).toBeNull();
  });
  test('the trace has the level there', () => {
    fc.assert(
      fc.property(trace, fc.double({ min: -150, max: 150, noNaN: true }), fc.boolean(), (mv, level, back) => {
        const ends = back ? { from: mv.length - 1, to: 0 } : { from: 0, to: mv.length - 1 };
        for (const direction of ['up', 'down'] as const) {
          const at = crossing(mv, level, { ...ends, direction });
          if (at !== null) expect(valueAt(mv, at)).toBeCloseTo(level, 6);
        }
      }),
      { seed: 22 },
    );
  });
});

describe('vertex', () => {
  test('is exact for a parabola', () => {
    const parabola = Float64Array.from({ length: 9 }, (_, i) => 7 - 2 * (i - 4.3) ** 2);
    const { position, value } = vertex(parabola, 4);
    expect(position).toBeCloseTo(4.3, 12);
    expect(value).toBeCloseTo(7, 12);
  });
  test('ends, NaN beside, and level tops', () => {
    expect(vertex(samples(3, 2, 1), 0)).toEqual({ position: 0, value: 3 });
    expect(vertex(samples(1, 3, Number.NaN), 1)).toEqual({ position: 1, value: 3 });
    expect(vertex(samples(0, 5, 5, 0), 1).position).toBeCloseTo(1.5, 12);
    expect(vertex(samples(0, 5, 5, 5, 0), 1)).toEqual({ position: 2, value: 5 });
  });
});

describe('excursions and prominence', () => {
  test('noise on a plateau belongs to the excursion; a fall of half the height ends it', () => {
    const mv = samples(0, 0, 40, 33, 41, 30, 39, 0, 0, 30, 0);
    expect(excursions(mv, 20, (rise) => rise / 2).map(({ base, peak }) => [base, peak])).toEqual([
      [1 - 1, 4],
      [7, 9],
    ]);
  });
  test('nothing, flat, a rise without a fall', () => {
    expect(excursions(samples(), 1, () => 1)).toEqual([]);
    expect(excursions(samples(2, 2, 2), 1, () => 1)).toEqual([]);
    expect(excursions(samples(0, 5, 9), 1, () => 1)).toEqual([{ base: 0, peak: 2, end: 2, rise: 9, fell: false }]);
    expect(() => excursions(samples(1), 0, () => 1)).toThrow(/least must be above 0/);
  });
  test('each one is as high as asked, they do not overlap, and their order is that of time', () => {
    fc.assert(
      fc.property(trace, fc.double({ min: 1, max: 100, noNaN: true }), (mv, least) => {
        const found = excursions(mv, least, (rise) => rise / 2);
        found.forEach((excursion, k) => {
          expect(excursion.rise).toBeGreaterThanOrEqual(least);
          expect(excursion.base).toBeLessThan(excursion.peak);
          if (k > 0) expect(excursion.base).toBeGreaterThanOrEqual(found[k - 1]!.end);
        });
      }),
      { seed: 23 },
    );
  });
  test('prominence is at most the height above the lowest point and at least 0', () => {
    fc.assert(
      fc.property(trace, (mv) => {
        const lowest = mv.reduce((least, v) => Math.min(least, v), Number.POSITIVE_INFINITY);
        for (const peak of localMaxima(mv)) {
          expect(prominence(mv, peak)).toBeGreaterThanOrEqual(0);
          expect(prominence(mv, peak)).toBeLessThanOrEqual(mv[peak]! - lowest);
        }
      }),
      { seed: 24 },
    );
  });
  test('a level top counts once', () => expect(localMaxima(samples(0, 2, 2, 2, 1, 3, 3, 4, 0))).toEqual([2, 7]));
});

describe('envelope', () => {
  test('nothing narrow is lost', () => {
    fc.assert(
      fc.property(trace, fc.integer({ min: 1, max: 200 }), (mv, columns) => {
        const { low, high } = envelope(mv, columns);
        expect(low).toHaveLength(Math.min(columns, mv.length));
        expect(Math.min(...low)).toBe(Math.min(...mv));
        expect(Math.max(...high)).toBe(Math.max(...mv));
        low.forEach((v, i) => {
          expect(v).toBeLessThanOrEqual(high[i]!);
        });
      }),
      { seed: 25 },
    );
  });
  test('a column without a readable sample is NaN', () => {
    const { low, high } = envelope(samples(1, 2, Number.NaN, Number.NaN, 5, 6), 3);
    expect(Array.from(low)).toEqual([1, Number.NaN, 5]);
    expect(Array.from(high)).toEqual([2, Number.NaN, 6]);
    expect(envelope(samples(), 5).low).toHaveLength(0);
    expect(() => envelope(samples(1), 0)).toThrow(/columns must be a whole number from 1 on, got 0/);
  });
});

describe('digitizer', () => {
  const wave = Float64Array.from({ length: 4000 }, (_, i) => -60 + 30 * Math.sin(i / 50));
  for (const step of [0.0061, 0.030517578125, 0.1, 0.5])
    test(`a step of ${step} mV is found`, () => {
      expect(quantum(quantized(withNoise(wave, 3 * step, 4), step))!).toBeCloseTo(step, 6);
      // Text with a few decimals and 32-bit floats blur the grid.
      const blurred = quantized(withNoise(wave, 3 * step, 4), step).map((v) => Math.fround(Math.round(v * 1e4) / 1e4));
      expect(quantum(blurred)! / step).toBeCloseTo(1, 1);
    });
  test('continuous values, a constant and an empty trace have none', () => {
    expect(quantum(withNoise(wave, 0.2, 5))).toBeNull();
    expect(quantum(new Float64Array(100).fill(3))).toBeNull();
    expect(quantum(samples())).toBeNull();
    expect(quantum(samples(Number.NaN, 1, 2))).toBeNull();
  });
  test('runs at a limit are clipping, a smooth coarse top is not, a flat trace is not', () => {
    const clipped = clippedRuns(wave.map((v) => Math.min(v, -45)));
    expect(clipped.length).toBeGreaterThan(10);
    for (const run of clipped) expect(run.at).toBe('top');
    expect(clippedRuns(quantized(wave, 0.5))).toEqual([]);
    expect(clippedRuns(new Float64Array(100).fill(10))).toEqual([]);
    expect(clippedRuns(samples())).toEqual([]);
    expect(clippedRuns(samples(0, 1, 9, 9, 9, 2, 0))).toEqual([{ from: 2, to: 5, at: 'top' }]);
    expect(clippedRuns(samples(0, 1, 9, 9, 2, 0))).toEqual([]);
  });
});
