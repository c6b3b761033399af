/**
 * Every kernel against a slow implementation written from its definition alone, on random and on awkward samples:
 * gaps, constants, steps, few samples, values a million away from zero or a millionth in size.
 */
import { describe, expect, test } from 'vitest';
import {
  clippedRuns,
  countFinite,
  crossing,
  derivativeVPerS,
  envelope,
  excursions,
  finiteStretches,
  goldenMinimum,
  linearFit,
  localMaxima,
  mean,
  median,
  movingAverage,
  prominence,
  quantile,
  quantum,
  robustSpread,
  runningMedian,
  serialLine,
  serialMean,
  slopeVPerS,
  standardDeviation,
  theilSen,
  valueAt,
  vertex,
} from '../../pipeline/signal/index.ts';
import { normalNoise } from '../helpers/models.ts';
import { oneExponential, oneSine, oneSineNear } from './single-fits.ts';

const made = (n: number, formula: (i: number) => number): Float64Array =>
  Float64Array.from({ length: n }, (_, i) => formula(i));
const noise = (seed: number): (() => number) => normalNoise(seed);

/** Name, samples, and the size of what varies in them (tolerances are relative to it). */
const awkward: [string, Float64Array, number][] = (() => {
  const g = noise(71);
  const walk = ((): Float64Array => {
    let v = 0;
    return made(300, () => (v += g()));
  })();
  const gaps = walk.map((v, i) => (i % 17 === 3 || (i > 100 && i < 112) ? Number.NaN : v));
  return [
    ['a random walk', walk, 1],
    ['white noise', made(257, () => g()), 1],
    ['with gaps', gaps, 1],
    ['gaps at both ends', gaps.map((v, i) => (i < 5 || i > 290 ? Number.NaN : v)), 1],
    ['on whole steps', walk.map((v) => Math.round(v * 2) / 2), 1],
    ['a million away from zero', walk.map((v) => v + 1e6), 1],
    ['a millionth in size', walk.map((v) => v * 1e-6), 1e-6],
    ['constant', new Float64Array(60).fill(-70), 1],
    ['three samples', Float64Array.of(1, 5, 2), 1],
    ['two samples', Float64Array.of(1, 5), 1],
    ['one sample', Float64Array.of(4), 1],
    ['nothing', new Float64Array(0), 1],
    ['nothing readable', new Float64Array(9).fill(Number.NaN), 1],
    ['a step', made(50, (i) => (i < 25 ? 0 : 10)), 1],
  ];
})();

const finite = (values: ArrayLike<number>): number[] => Array.from(values).filter((v) => Number.isFinite(v));
function expectSame(ours: ArrayLike<number>, theirs: ArrayLike<number>, tolerance: number): void {
  expect(ours.length).toBe(theirs.length);
  for (let i = 0; i < theirs.length; i++) {
    if (Number.isNaN(theirs[i]!)) expect(ours[i]).toBeNaN();
    else if (!(Math.abs(ours[i]! - theirs[i]!) <= tolerance)) expect([i, ours[i]]).toEqual([i, theirs[i]]);
  }
}

/** Least squares by Householder reflections: shares no formula with the normal equations of the kernels. */
function leastSquares(design: number[][], y: number[]): { beta: number[]; rss: number } {
  const rows = y.length;
  const columns = design[0]!.length;
  const a = design.map((row, i) => [...row, y[i]!]);
  for (let c = 0; c < columns; c++) {
    const length = Math.hypot(...a.slice(c).map((row) => row[c]!));
    const sign = a[c]![c]! >= 0 ? 1 : -1;
    const v = a.map((row, i) => (i < c ? 0 : i === c ? row[c]! + sign * length : row[c]!));
    const size = v.reduce((sum, x) => sum + x * x, 0);
    for (let k = c; k <= columns; k++) {
      const share = (2 * v.reduce((sum, x, i) => sum + x * a[i]![k]!, 0)) / size;
      for (let i = c; i < rows; i++) a[i]![k]! -= share * v[i]!;
    }
  }
  const beta = new Array<number>(columns).fill(0);
  for (let r = columns - 1; r >= 0; r--) {
    let value = a[r]![columns]!;
    for (let c = r + 1; c < columns; c++) value -= a[r]![c]! * beta[c]!;
    beta[r] = value / a[r]![r]!;
  }
  const rss = a.slice(columns).reduce((sum, row) => sum + row[columns]! ** 2, 0);
  return { beta, rss };
}

describe.each(awkward)('%s', (_, samples, size) => {
  const values = finite(samples);
  const sorted = values.toSorted((a, b) => a - b);

  test('moments and order statistics', () => {
    expect(countFinite(samples)).toBe(values.length);
    if (values.length === 0)
      return expect([mean(samples), median(samples), robustSpread(samples)]).toEqual([null, null, null]);
    // Welford's recurrence, where the kernel takes two passes.
    let level = 0;
    let m2 = 0;
    values.forEach((v, i) => {
      const delta = v - level;
      level += delta / (i + 1);
      m2 += delta * (v - level);
    });
    expect(Math.abs(mean(samples)! - level)).toBeLessThan(1e-9);
    if (values.length > 1)
      expect(Math.abs(standardDeviation(samples)! - Math.sqrt(m2 / (values.length - 1)))).toBeLessThan(1e-7 * size);
    else expect(standardDeviation(samples)).toBeNull();
    // Type 7: the p-quantile is where the broken line through ((k−1)/(n−1), x_k) stands at p.
    for (const p of [0, 0.1, 0.5, 0.77, 1]) {
      let expected = sorted[sorted.length - 1]!;
      for (let k = 0; k + 1 < sorted.length; k++) {
        const [from, to] = [k / (sorted.length - 1), (k + 1) / (sorted.length - 1)];
        if (p >= from && p < to) {
          expected = sorted[k]! + ((p - from) / (to - from)) * (sorted[k + 1]! - sorted[k]!);
          break;
        }
      }
      expect(Math.abs(quantile(samples, p)! - expected)).toBeLessThan(1e-9);
    }
    const middle = median(values)!;
    const deviations = values.map((v) => Math.abs(v - middle)).sort((a, b) => a - b);
    const half = (deviations.length - 1) / 2;
    const mad = (deviations[Math.floor(half)]! + deviations[Math.ceil(half)]!) / 2;
    expect(Math.abs(robustSpread(samples)! - 1.482602218505602 * mad)).toBeLessThan(1e-9);
  });

  test('running mean and median', () => {
    for (const half of [0, 1, 4, 30]) {
      const windows = Array.from(samples, (_, i) => {
        const reach = Math.min(half, i, samples.length - 1 - i);
        return half === 0 ? [samples[i]!] : finite(samples.subarray(i - reach, i + reach + 1));
      });
      const sums = windows.map((w) => (w.length ? w.reduce((sum, v) => sum + v, 0) / w.length : Number.NaN));
      expectSame(movingAverage(samples, half), sums, 1e-8);
      const middles = windows.map((w) => {
        const s = finite(w).sort((a, b) => a - b);
        return s.length ? (s[Math.floor((s.length - 1) / 2)]! + s[Math.ceil((s.length - 1) / 2)]!) / 2 : Number.NaN;
      });
      expectSame(runningMedian(samples, half), middles, 1e-9);
    }
  });

  test('slopes over every width', () => {
    const rate = 20_000;
    const n = samples.length;
    const central = Array.from(samples, (_, i) => {
      const [a, b] = [Math.max(0, i - 1), Math.min(n - 1, i + 1)];
      return n < 2 || Number.isNaN(samples[i]!) ? Number.NaN : ((samples[b]! - samples[a]!) / (b - a)) * (rate / 1000);
    });
    // The central difference does not look at the sample itself.
    const plain = derivativeVPerS(samples, rate);
    central.forEach((v, i) => {
      if (Number.isFinite(v)) expect(Math.abs(plain[i]! - v)).toBeLessThan(1e-7);
    });
    for (const m of [2, 5, 13]) {
      if (n < 2 * m + 1) continue;
      const expected = Array.from(samples, (_, i) => {
        const reach = Math.min(m, i, n - 1 - i);
        if (reach === 0) return plain[i]!;
        const window = samples.subarray(i - reach, i + reach + 1);
        if (finite(window).length < window.length) return Number.NaN;
        return (
          leastSquares(
            Array.from(window, (_, k) => [1, k - reach]),
            Array.from(window),
          ).beta[1]! *
          (rate / 1000)
        );
      });
      expectSame(slopeVPerS(samples, rate, m), expected, 1e-6 * Math.max(1, size));
    }
  });

  test('columns, readable stretches, crossings', () => {
    for (const columns of [1, 7, 1000]) {
      const { low, high } = envelope(samples, columns);
      const width = Math.min(columns, samples.length);
      const held: number[][] = Array.from({ length: width }, () => []);
      samples.forEach((v, i) => {
        for (let c = 0; c < width; c++)
          if (
            i >= Math.floor((c * samples.length) / width) &&
            i < Math.floor(((c + 1) * samples.length) / width) &&
            Number.isFinite(v)
          )
            held[c]!.push(v);
      });
      expectSame(
        low,
        held.map((h) => (h.length ? Math.min(...h) : Number.NaN)),
        0,
      );
      expectSame(
        high,
        held.map((h) => (h.length ? Math.max(...h) : Number.NaN)),
        0,
      );
    }
    const inside = new Set(
      finiteStretches(samples).flatMap(([from, to]) => Array.from({ length: to - from }, (_, k) => from + k)),
    );
    samples.forEach((v, i) => {
      expect(inside.has(i)).toBe(Number.isFinite(v));
    });
    const level = (sorted[0] ?? 0) + 0.4 * ((sorted.at(-1) ?? 0) - (sorted[0] ?? 0)) + 1e-7 * size;
    const ups: number[] = [];
    for (let i = 0; i + 1 < samples.length; i++)
      if (samples[i]! < level && samples[i + 1]! >= level)
        ups.push(i + (level - samples[i]!) / (samples[i + 1]! - samples[i]!));
    const last = samples.length - 1;
    const close = (found: number | null, expected: number | undefined): void =>
      expected === undefined ? expect(found).toBeNull() : expect(found!).toBeCloseTo(expected, 6);
    close(crossing(samples, level, { from: 0, to: last, direction: 'up' }), ups[0]);
    close(crossing(samples, level, { from: last, to: 0, direction: 'up' }), ups.at(-1));
    for (const at of ups) expect(Math.abs(valueAt(samples, at) - level)).toBeLessThan(1e-6 * size + 1e-9);
  });

  test('maxima, prominences, excursions', () => {
    if (values.length !== samples.length) return;
    const n = samples.length;
    const maxima: number[] = [];
    for (let i = 1; i < n - 1; i++) {
      let left = i;
      let right = i;
      while (left > 0 && samples[left - 1] === samples[i]) left--;
      while (right < n - 1 && samples[right + 1] === samples[i]) right++;
      const top = left > 0 && right < n - 1 && samples[left - 1]! < samples[i]! && samples[right + 1]! < samples[i]!;
      if (top && i === Math.floor((left + right) / 2)) maxima.push(i);
    }
    expect(localMaxima(samples)).toEqual(maxima);
    for (const peak of maxima) {
      // The lowest level one must climb down to before higher ground: by trying every level met.
      const reach = (step: 1 | -1): number => {
        let lowest = samples[peak]!;
        for (let i = peak; i >= 0 && i < n && samples[i]! <= samples[peak]!; i += step)
          lowest = Math.min(lowest, samples[i]!);
        return lowest;
      };
      expect(prominence(samples, peak)).toBe(samples[peak]! - Math.max(reach(1), reach(-1)));
    }
    const least = 2 * size;
    const found = excursions(samples, least, (rise) => rise / 2);
    // Each: the base is the lowest since the end before it, the peak the highest until the end, and the fall just made.
    let from = 0;
    for (const one of found) {
      expect(samples[one.base]).toBe(Math.min(...samples.subarray(from, one.peak + 1)));
      expect(samples[one.peak]).toBe(Math.max(...samples.subarray(one.base, one.end + 1)));
      expect(one.rise).toBe(samples[one.peak]! - samples[one.base]!);
      expect(one.rise).toBeGreaterThanOrEqual(least);
      if (one.fell) {
        expect(samples[one.peak]! - samples[one.end]!).toBeGreaterThanOrEqual(one.rise / 2);
        for (let i = one.peak; i < one.end; i++) {
          const rise = samples[one.peak]! - samples[one.base]!;
          expect(samples[one.peak]! - samples[i]!).toBeLessThan(rise / 2);
        }
      }
      from = one.end;
    }
    // None is left out: after the last one no rise of that size.
    if (found.length === 0 || found.at(-1)!.fell) {
      let lowest = Number.POSITIVE_INFINITY;
      for (let i = from; i < n; i++) {
        lowest = Math.min(lowest, samples[i]!);
        expect(samples[i]! - lowest).toBeLessThan(least);
      }
    }
  });

  test('straight lines, plain, robust and serial', () => {
    const x = made(samples.length, (i) => 3 + 0.25 * i);
    const pairs = values.length;
    const plain = linearFit(x, samples);
    if (pairs < 2) return expect([plain, theilSen(x, samples), serialLine(x, samples)]).toEqual([null, null, null]);
    const px = Array.from(x).filter((_, i) => Number.isFinite(samples[i]!));
    const middle = px.reduce((sum, v) => sum + v, 0) / pairs;
    const { beta, rss } = leastSquares(
      px.map((v) => [1, v - middle]),
      values,
    );
    expect(Math.abs(plain!.slope - beta[1]!)).toBeLessThan(1e-8 * size);
    expect(Math.abs(plain!.intercept - (beta[0]! - beta[1]! * middle))).toBeLessThan(1e-8);
    if (pairs > 2) expect(Math.abs(plain!.residual_sd! - Math.sqrt(rss / (pairs - 2)))).toBeLessThan(1e-7 * size);
    const serial = serialLine(x, samples)!;
    expect(Math.abs(serial.slope - beta[1]!)).toBeLessThan(1e-8 * size);
    expect(Math.abs(serial.mean_y - beta[0]!)).toBeLessThan(1e-8);
    expect(Math.abs(serialMean(samples)!.value - beta[0]!)).toBeLessThan(1e-8);
    const slopes = px.flatMap((a, i) => px.slice(i + 1).map((b, k) => (values[i + 1 + k]! - values[i]!) / (b - a)));
    slopes.sort((a, b) => a - b);
    const mid = (slopes[Math.floor((slopes.length - 1) / 2)]! + slopes[Math.ceil((slopes.length - 1) / 2)]!) / 2;
    expect(Math.abs(theilSen(x, samples)!.slope - mid)).toBeLessThan(1e-8);
  });
});

describe('serial errors', () => {
  test('the average squared coefficient is what a least-squares fit of the cosines finds', () => {
    const g = noise(17);
    const y = Array.from({ length: 40 }, () => -70 + g());
    const ours = serialMean(y)!;
    const design = y.map((_, i) => [
      1,
      ...Array.from({ length: ours.freedom }, (_, j) => Math.cos((Math.PI * (j + 1) * (i + 0.5)) / 40)),
    ]);
    const { beta } = leastSquares(design, y);
    // A cosine over n samples has the squared length n/2.
    const average = beta.slice(1).reduce((sum, b) => sum + (b * b * 40) / 2, 0) / ours.freedom;
    expect(ours.freedom).toBeGreaterThanOrEqual(4);
    // Where the spectrum falls from the first four on, the rise multiplies it.
    const ratio = (ours.se! ** 2 * 40) / average;
    if (ours.freedom > 4) expect(ratio).toBeCloseTo(1, 9);
    else expect(ratio).toBeGreaterThanOrEqual(1 - 1e-9);
  });
});

describe('sines', () => {
  const g = noise(19);
  const hum = made(4000, (i) => 1e3 + 0.002 * i + 0.3 * Math.cos((2 * Math.PI * 49.7 * i) / 5000 + 1) + 0.2 * g());
  for (const [name, samples] of [
    ['plain', hum],
    ['a millionth in size', hum.map((v) => v * 1e-6)],
  ] as const)
    test(`amplitude, phase, level and error, ${name}`, () => {
      const fit = oneSine(samples, 5000, 50)!;
      const at = Array.from(samples.keys()).filter((i) => Number.isFinite(samples[i]!));
      const w = (2 * Math.PI * 50) / 5000;
      const { beta, rss } = leastSquares(
        at.map((i) => [Math.sin(w * i), Math.cos(w * i), 1, i - 1999.5]),
        at.map((i) => samples[i]!),
      );
      expect(fit.amplitude / Math.hypot(beta[0]!, beta[1]!)).toBeCloseTo(1, 7);
      expect(fit.phase_rad).toBeCloseTo(Math.atan2(beta[1]!, beta[0]!), 7);
      expect(fit.offset / beta[2]!).toBeCloseTo(1, 9);
      expect(fit.slope_per_s / (beta[3]! * 5000)).toBeCloseTo(1, 7);
      expect(fit.residual_sd / Math.sqrt(rss / (at.length - 4))).toBeCloseTo(1, 7);
    });
  test.each([
    ['0.8 s', 4000, 50, 3],
    ['60 s, where the resolution is a sixtieth of a hertz', 30_000, 50, 3],
  ] as const)('the frequency is the one that a fine grid finds, %s', (_, n, hz, range) => {
    const rate = n === 4000 ? 5000 : 500;
    const next = noise(n);
    const samples = made(n, (i) => 0.2 * Math.sin((2 * Math.PI * 51.234 * i) / rate) + 0.3 * next());
    const fit = oneSineNear(samples, rate, hz, range)!;
    const step = rate / n / 12;
    let [best, least] = [0, Number.POSITIVE_INFINITY];
    for (let f = 51.234 - 12 * step; f <= 51.234 + 12 * step; f += step / 2) {
      const sd = oneSine(samples, rate, f)!.residual_sd;
      if (sd < least) [best, least] = [f, sd];
    }
    expect(Math.abs(fit.frequency_hz - best)).toBeLessThanOrEqual(step);
    expect(fit.residual_sd).toBeLessThanOrEqual(least * (1 + 1e-4));
  });
  test('its amplitude’s standard error is the spread over repeated white noise', () => {
    const next = noise(23);
    const amplitudes: number[] = [];
    let stated = 0;
    for (let k = 0; k < 200; k++) {
      const fit = oneSine(
        made(1000, (i) => Math.sin((2 * Math.PI * 50 * i) / 5000) + 0.7 * next()),
        5000,
        50,
      )!;
      amplitudes.push(fit.amplitude);
      stated += fit.se_amplitude / 200;
    }
    // The spread of 200 estimates is known to 5 %; three times that.
    expect(Math.abs(stated / standardDeviation(amplitudes)! - 1)).toBeLessThan(0.15);
  });
});

describe('exponentials', () => {
  /** Gauss–Newton from the truth with the Householder solver: another route to the same minimum. */
  function gaussNewton(x: number[], y: number[], start: [number, number, number]): { beta: number[]; rss: number } {
    let [offset, amplitude, tau] = start;
    let rss = 0;
    for (let k = 0; k < 60; k++) {
      const t = x.map((v) => v - x[0]!);
      const e = t.map((v) => Math.exp(-v / tau));
      const fit = leastSquares(
        t.map((v, i) => [1, e[i]!, (amplitude * e[i]! * v) / tau ** 2]),
        y.map((v, i) => v - offset - amplitude * e[i]!),
      );
      offset += fit.beta[0]!;
      amplitude += fit.beta[1]!;
      tau += fit.beta[2]!;
      rss = fit.rss;
    }
    return { beta: [offset, amplitude, tau], rss };
  }
  test.each([
    ['plain', 0, 1],
    ['a million away from zero', 1e6, 1],
    ['a millionth in size', 0, 1e-6],
  ] as const)('%s', (_, shift, scale) => {
    const g = noise(31);
    const x = Array.from({ length: 300 }, (_, i) => 7 + 0.1 * i);
    const y = x.map((v) => shift + scale * (-70 - 6 * Math.exp(-(v - 7) / 8) + 0.1 * g()));
    const ours = oneExponential(x, y)!;
    const { beta, rss } = gaussNewton(x, y, [shift - 70 * scale, -6 * scale, 8]);
    expect(Math.abs(ours.offset - beta[0]!)).toBeLessThan(1e-4 * scale + 1e-9);
    expect(ours.amplitude / beta[1]!).toBeCloseTo(1, 5);
    expect(ours.tau / beta[2]!).toBeCloseTo(1, 5);
    expect(ours.residual_sd / Math.sqrt(rss / 297)).toBeCloseTo(1, 3);
  });
  /** Share of intervals of 1.96 standard errors that hold the time constant, %. */
  const held = (maker: (next: () => number) => () => number, seed: number): number => {
    const next = noise(seed);
    const x = Array.from({ length: 120 }, (_, i) => 0.5 * i);
    let count = 0;
    for (let k = 0; k < 300; k++) {
      const own = maker(next);
      const fit = oneExponential(
        x,
        x.map((v) => -70 - 5 * Math.exp(-v / 12) + 0.15 * own()),
      )!;
      if (Math.abs(fit.tau - 12) <= 1.96 * fit.se_tau) count++;
    }
    return count / 3;
  };
  test('in white noise its error of the time constant is calibrated', () => {
    // 300 trials know 95 % to 1.3 %.
    const share = held((next) => next, 37);
    expect(share).toBeGreaterThan(91.5);
    expect(share).toBeLessThan(98.5);
  });
  test('in noise with a correlation time of ten samples it nearly holds, for the slow part of the residuals counts', () => {
    const share = held((next) => {
      let v = next();
      return () => (v = 0.905 * v + Math.sqrt(1 - 0.905 ** 2) * next());
    }, 38);
    // The errors of white noise alone would hold it in fewer than 65 of 100.
    expect(share).toBeGreaterThan(85);
  });
  test('the golden section finds a minimum', () => {
    for (const at of [-3, 0.001, 7]) expect(goldenMinimum((x) => (x - at) ** 2, -10, 10)).toBeCloseTo(at, 6);
  });
});

describe('digitizers', () => {
  test('the step is the one put in, whatever the offset and the values', () => {
    const g = noise(43);
    for (const step of [0.5, 0.0305, 0.153, 1e-4])
      for (const offset of [0, -70, 13.7])
        for (const spread of [3, 40, 400]) {
          const samples = made(4000, () => offset + step * Math.round(spread * g()));
          expect(quantum(samples)! / step).toBeCloseTo(1, 4);
        }
  });
  test('the steps that a converter skips do not hide it', () => {
    const g = noise(44);
    // Only even codes occur but for a few: the step is the single code.
    const samples = made(4000, (i) => 0.1 * (2 * Math.round(20 * g()) + (i % 100 === 0 ? 1 : 0)));
    expect(quantum(samples)!).toBeCloseTo(0.1, 6);
  });
  test('clipped runs are all stretches of three or more equal samples at an extreme that is reached by a jump', () => {
    const g = noise(47);
    for (let k = 0; k < 30; k++) {
      const limit = 1 + (k % 3);
      const samples = made(400, (i) => 3 * Math.sin(i / 9) + 0.3 * g()).map((v) =>
        Math.max(-limit - 1, Math.min(limit, v)),
      );
      const expected: { from: number; to: number; at: string }[] = [];
      for (const [level, at] of [
        [Math.max(...samples), 'top'],
        [Math.min(...samples), 'bottom'],
      ] as const)
        for (let i = 0; i < samples.length; i++)
          if (samples[i] === level && samples[i - 1] !== level) {
            let to = i;
            while (samples[to] === level) to++;
            if (to - i >= 3) expected.push({ from: i, to, at });
          }
      expect(clippedRuns(samples)).toEqual(expected.sort((a, b) => a.from - b.from));
    }
  });
});

describe('vertices', () => {
  test('is that of the parabola through three points, by solving for it', () => {
    const g = noise(53);
    for (let k = 0; k < 100; k++) {
      const samples = Float64Array.of(-Math.abs(g()), 0, -Math.abs(g())).map((v) => v * 5 + (k % 2 ? 1e6 : 0));
      const { beta } = leastSquares(
        [-1, 0, 1].map((t) => [1, t, t * t]),
        Array.from(samples, (v) => v - samples[1]!),
      );
      const at = -beta[1]! / (2 * beta[2]!);
      const found = vertex(samples, 1);
      expect(found.position).toBeCloseTo(1 + at, 6);
      expect(found.value).toBeCloseTo(samples[1]! + beta[0]! + beta[1]! * at + beta[2]! * at * at, 6);
    }
  });
});
