/**
 * The signal kernels and the spike measurements against SciPy and NumPy on the same traces. Runs where a Python with
 * SciPy is found (Debian: python3-scipy python3-h5py); elsewhere it is skipped and says so.
 */
import { spawnSync } from 'node:child_process';
import { fileURLToPath } from 'node:url';
import { beforeAll, describe, expect, test } from 'vitest';
import { spikeCriteria } from '../../pipeline/measure/spike-criteria.ts';
import { measureSpikes } from '../../pipeline/measure/spikes.ts';
import {
  butterworth,
  coverage95,
  derivativeVPerS,
  type ExponentialTerm,
  exponentialSum,
  finiteStretches,
  linearFit,
  localMaxima,
  magnitude,
  movingAverage,
  prominence,
  quantile,
  robustSpread,
  runningMedian,
  slopeVPerS,
  standardDeviation,
  theilSen,
  zeroPhase,
} from '../../pipeline/signal/index.ts';
import { hodgkinHuxley, normalNoise, pospischil, quantized, simulate, withNoise } from '../helpers/models.ts';
import { oneExponential, oneSine, oneSineNear } from '../signal/single-fits.ts';
import { findPython } from '../tooling/prepare.ts';

const python = findPython();
const script = fileURLToPath(new URL('scipy_reference.py', import.meta.url));
if (!python) console.warn('No Python with SciPy found: the checks against SciPy are skipped (Debian: python3-scipy).');

const requests: Record<string, unknown>[] = [];
let answers: unknown[] = [];

/** Puts a question to SciPy while tests are collected; the answer is there once they run, all from one process. */
function scipy<T>(task: string, request: Record<string, unknown>): () => T {
  const plain = Object.entries(request).map(([key, value]) => [
    key,
    value instanceof Float64Array ? Array.from(value) : value,
  ]);
  const index = requests.push({ task, ...Object.fromEntries(plain) }) - 1;
  return () => answers[index] as T;
}

beforeAll(() => {
  if (!python) return;
  const { status, stdout, stderr } = spawnSync(python, [script], {
    input: JSON.stringify(requests),
    encoding: 'utf8',
    maxBuffer: 1 << 28,
  });
  if (status !== 0) throw new Error(`SciPy could not answer: ${stderr}`);
  answers = JSON.parse(stdout) as unknown[];
});

function expectAlike(ours: ArrayLike<number>, theirs: number[], tolerance: number): void {
  expect(ours.length).toBe(theirs.length);
  let worst = 0;
  for (let i = 0; i < theirs.length; i++) worst = Math.max(worst, Math.abs(ours[i]! - theirs[i]!));
  expect(worst).toBeLessThan(tolerance);
}

const cell = pospischil('RS');
const train = simulate(cell, 20_000, [
  [100, 0],
  [500, 1000 / cell.capacitance_pf],
  [100, 0],
]);
const noisy = withNoise(train.mv, 0.3, 17);

describe.skipIf(!python)('kernels', () => {
  const gradient = scipy<number[]>('gradient', { mv: noisy, rate_hz: 20_000 });
  test('dV/dt is NumPy’s gradient', () => expectAlike(derivativeVPerS(noisy, 20_000), gradient(), 1e-9));

  for (const m of [2, 5, 20]) {
    const savgol = scipy<number[]>('savgol', { mv: noisy, rate_hz: 20_000, half_width: m });
    test(`the slope over ${2 * m + 1} samples is a Savitzky–Golay filter of first order, ends aside`, () =>
      expectAlike(slopeVPerS(noisy, 20_000, m).slice(m, -m), savgol().slice(m, -m), 1e-8));
  }

  for (const [name, mv] of [
    ['noise', noisy],
    ['a coarse digitizer', quantized(noisy, 0.5)],
  ] as const) {
    const maxima = scipy<number[]>('maxima', { mv });
    const peaks = scipy<{ index: number[]; prominence: number[] }>('peaks', { mv, prominence: 0.4 });
    test(`local maxima and prominences on ${name}`, () => {
      expect(localMaxima(mv)).toEqual(maxima());
      const ours = localMaxima(mv)
        .map((index) => ({ index, prominence: prominence(mv, index) }))
        .filter((peak) => peak.prominence >= 0.4);
      expect(ours.map((peak) => peak.index)).toEqual(peaks().index);
      expectAlike(
        ours.map((peak) => peak.prominence),
        peaks().prominence,
        1e-12,
      );
    });
  }

  for (const [low_hz, high_hz] of [
    [null, 2000],
    [300, null],
    [1000, 5000],
    [1, 100],
  ] as const)
    for (const order of [1, 2, 3, 4]) {
      const filtered = scipy<number[]>('butter', { mv: noisy, rate_hz: 20_000, order, low_hz, high_hz });
      test(`Butterworth of order ${order} from ${low_hz ?? 0} to ${high_hz ?? '∞'} Hz, both ways, is sosfiltfilt`, () =>
        expectAlike(
          zeroPhase(noisy, butterworth(order, { low_hz, high_hz }, 20_000)),
          filtered(),
          // A corner of a few 10⁻⁵ of the rate costs digits in either program.
          low_hz === 1 ? 1e-4 : 1e-8,
        ));
    }

  for (const tau of [2, 12, 45]) {
    const next = normalNoise(23 + tau);
    const x = Array.from({ length: 500 }, (_, i) => 3 + i * 0.2);
    const y = x.map((v) => -70 - 6 * Math.exp(-(v - 3) / tau) + 0.2 * next());
    const fitted = scipy<{ best: number[]; se: number[] }>('exponential', { x, y });
    test(`exponential of ${tau} ms in noise: parameters and standard errors of curve_fit`, () => {
      const ours = oneExponential(x, y)!;
      // Ours are scaled to the slow part of the residuals.
      const white = Math.sqrt(ours.correlation);
      const errors = [ours.se_offset, ours.se_amplitude, ours.se_tau].map((se) => se / white);
      const mine = [ours.offset, ours.amplitude, ours.tau, ...errors];
      const theirs = [...fitted().best, ...fitted().se];
      theirs.forEach((value, k) => {
        expect(mine[k]! / value).toBeCloseTo(1, 4);
      });
    });
  }

  for (const [slow, fast] of [
    [30, 3],
    [12, 0.8],
  ] as const) {
    const next = normalNoise(41 + slow);
    const x = Array.from({ length: 600 }, (_, i) => 0.5 + i * 0.2);
    const y = x.map((t) => 100 - 80 * Math.exp(-t / slow) - 20 * Math.exp(-t / fast) + 0.1 * next());
    const fitted = scipy<{ rss: number; best: number[]; se: number[] }>('two_exponentials', { x, y });
    test(`two exponentials of ${slow} and ${fast} ms in noise: parameters and standard errors of curve_fit`, () => {
      const ours = exponentialSum(x, y, { slow: [1, 400], fast: [0.1, 40] })!;
      const { rss, best, se } = fitted();
      expect(ours.rss / rss).toBeCloseTo(1, 6);
      const [one, two] = ours.terms as [ExponentialTerm, ExponentialTerm];
      const mine = [ours.offset, one.amplitude, Math.log(one.tau), two.amplitude, Math.log(two.tau)];
      for (const [k, value] of mine.entries()) {
        expect(Math.abs(value - best[k]!)).toBeLessThan(0.01 * se[k]!);
        // Ours are scaled to the slow part of the residuals.
        expect(Math.sqrt(ours.covariance[k]![k]! / ours.correlation) / se[k]!).toBeCloseTo(1, 3);
      }
    });
  }

  const next = normalNoise(29);
  const x = Array.from({ length: 80 }, (_, i) => i * 0.7);
  const y = x.map((v) => 4 - 0.3 * v + next());
  const line = scipy<Record<string, number>>('line', { x, y });
  test('least-squares line with standard errors', () => {
    const ours = linearFit(x, y)!;
    for (const key of ['slope', 'intercept', 'se_slope', 'se_intercept', 'r_squared'] as const)
      expect(ours[key]!).toBeCloseTo(line()[key]!, 10);
  });
  const robust = scipy<Record<string, number>>('theil_sen', { x, y });
  test('Theil–Sen line', () => {
    expect(theilSen(x, y)!.slope).toBeCloseTo(robust()['slope']!, 10);
    expect(theilSen(x, y)!.intercept).toBeCloseTo(robust()['intercept']!, 10);
  });
  const spread = scipy<{ mad: number; quantiles: number[]; sd: number }>('spread', { values: y });
  test('robust spread, standard deviation, quantiles', () => {
    expect(robustSpread(y)!).toBeCloseTo(spread().mad, 10);
    expect(standardDeviation(y)!).toBeCloseTo(spread().sd, 10);
    expectAlike(
      [0, 0.05, 0.25, 0.5, 0.9, 1].map((p) => quantile(y, p)!),
      spread().quantiles,
      1e-12,
    );
  });
  const hum = noisy.slice(0, 2000).map((v, i) => v + 0.2 * Math.sin((2 * Math.PI * 50 * i) / 20_000));
  const amplitude = scipy<number>('sine', { mv: hum, rate_hz: 20_000, frequency_hz: 50 });
  test('sine beside a straight line', () => expect(oneSine(hum, 20_000, 50)!.amplitude).toBeCloseTo(amplitude(), 8));
});

describe.skipIf(!python)('more kernels', () => {
  // Corners at the edges of what can be had: next to 0, next to half the rate, and next to each other.
  for (const [low_hz, high_hz] of [
    [0.5, 9000],
    [1000, 8000],
    [4000, 4100],
    [9000, 9990],
    [null, 9990],
    [0.5, null],
  ] as const)
    for (const order of [1, 3, 4, 8]) {
      const frequency_hz = [
        0.1, 0.5, 1, 10, 100, 999, 1000, 3900, 4000, 4050, 4100, 5000, 8000, 9000, 9500, 9990, 9999,
      ];
      const answer = scipy<number[]>('gain', { rate_hz: 20_000, order, low_hz, high_hz, frequency_hz });
      test(`the gain of a Butterworth filter of order ${order} from ${low_hz ?? 0} to ${high_hz ?? '∞'} Hz`, () => {
        const sections = butterworth(order, { low_hz, high_hz }, 20_000);
        const ours = frequency_hz.map((hz) =>
          sections.reduce((product, section) => product * magnitude(section, (2 * Math.PI * hz) / 20_000), 1),
        );
        // At a corner of half a hertz the coefficients of either program lose digits to 1 − z.
        expectAlike(ours, answer(), low_hz === 0.5 ? 2e-3 : 1e-6);
      });
    }

  const freedom = Array.from({ length: 120 }, (_, k) => 1 + k * 0.25 + (k > 60 ? (k - 60) ** 3 : 0));
  const factors = scipy<number[]>('coverage', { freedom });
  test('Student’s t at 97.5 %, whole and fractional degrees of freedom', () => {
    factors().forEach((expected, k) => {
      expect(Math.abs(coverage95(freedom[k]!) / expected - 1)).toBeLessThan(1e-4);
    });
  });

  const g = normalNoise(41);
  const hum = Float64Array.from(
    { length: 20_000 },
    (_, i) => -70 + 0.3 * (i / 20_000) + 0.15 * Math.sin((2 * Math.PI * 50.37 * i) / 20_000 + 2) + 0.2 * g(),
  );
  const nearest = scipy<{ frequency_hz: number; amplitude: number }>('sine_near', {
    mv: hum,
    rate_hz: 20_000,
    frequency_hz: 50.3,
  });
  test('the frequency and amplitude of hum are those of a non-linear least-squares fit', () => {
    const ours = oneSineNear(hum, 20_000, 50, 2)!;
    expect(ours.frequency_hz).toBeCloseTo(nearest().frequency_hz, 2);
    expect(ours.amplitude / nearest().amplitude).toBeCloseTo(1, 3);
  });

  const x = Array.from({ length: 60 }, (_, i) => i * 0.7);
  const y = x.map((v) => 1e3 - 0.3 * v + 5 * g() ** 3);
  const interval = scipy<{ low: number; high: number }>('theil_sen_interval', { x, y });
  test('the standard error of the Theil–Sen slope is Sen’s interval over 2·1.96', () => {
    const width = interval().high - interval().low;
    expect(theilSen(x, y)!.se_slope! / (width / (2 * 1.959964))).toBeCloseTo(1, 1);
  });
  const far = x.map((_, i) => 1e6 + y[i]! * 1e-3);
  const farLine = scipy<Record<string, number>>('line', { x, y: far });
  test('a least-squares line a million away from zero', () => {
    const ours = linearFit(x, far)!;
    for (const key of ['slope', 'se_slope', 'se_intercept', 'r_squared'] as const)
      expect(ours[key]! / farLine()[key]!).toBeCloseTo(1, 6);
  });

  for (const half_width of [1, 6]) {
    const part = noisy.slice(0, 4000);
    const medians = scipy<number[]>('medians', { mv: part, half_width });
    const means = scipy<number[]>('means', { mv: part, half_width });
    test(`running mean and median over ${2 * half_width + 1} samples, ends aside`, () => {
      const inner = (values: ArrayLike<number>): number[] => Array.from(values).slice(half_width, -half_width);
      expectAlike(inner(runningMedian(part, half_width)), inner(medians()), 1e-12);
      expectAlike(inner(movingAverage(part, half_width)), inner(means()), 1e-9);
    });
  }
  const gap = [0, 5, 6, 7, 200, 201, 999];
  const stretches = scipy<[number, number][]>('stretches', { mv: noisy.slice(0, 1000), gap });
  test('readable stretches between gaps', () => {
    const samples = noisy.slice(0, 1000);
    for (const i of gap) samples[i] = Number.NaN;
    expect(finiteStretches(samples)).toEqual(stretches());
  });
});

describe.skipIf(!python)('spikes', () => {
  const measured = (mv: Float64Array, rateHz: number) =>
    measureSpikes({
      voltage: { samples: mv, rate_hz: rateHz, start_s: 0 },
      current: null,
      stimulus: {
        kind: 'unknown',
        from: 'absent',
        onset_s: null,
        end_s: null,
        amplitude: null,
        holding: null,
        edges_s: [],
      },
      baseline_mv: null,
      context: { ...spikeCriteria('any'), filter_khz: null, mains_hz: null, capacitance_pf: null },
    }).spikes;

  const axon = simulate(hodgkinHuxley(), 50_000, [
    [20, 0],
    [300, 10],
    [50, 0],
  ]);
  for (const [name, mv, rateHz] of [
    ['a cortical train', train.mv, 20_000],
    ['the same with noise', noisy, 20_000],
    ['a squid axon train', axon.mv, 50_000],
  ] as const) {
    const peaks = scipy<{ index: number[]; half_width_samples: number[] }>('peaks', { mv, prominence: 20 });
    const gradient = scipy<number[]>('gradient', { mv, rate_hz: rateHz });
    const fineGradient = scipy<number[]>('fine_gradient', { mv, rate_hz: rateHz });
    test(`${name}: as many spikes as find_peaks with a prominence of 20 mV, at the same samples, as steep`, () => {
      const theirs = peaks();
      const slope = gradient();
      const fine = fineGradient();
      const ours = measured(mv, rateHz);
      expect(ours).toHaveLength(theirs.index.length);
      ours.forEach((spike, k) => {
        const at = theirs.index[k]!;
        expect(Math.abs(spike.values['peak_at_s']! * rateHz - at)).toBeLessThanOrEqual(1);
        // The highest of noisy samples stands above the top that is read through the noise.
        expect(spike.values['peak_mv']!).toBeGreaterThanOrEqual(mv[at]! - (mv === noisy ? 0.5 : 0));
        expect(spike.values['peak_mv']! - mv[at]!).toBeLessThan(1);
        const from = Math.floor(spike.values['threshold_at_s']! * rateHz);
        // The central difference of the samples blunts the rise; a resampling of SciPy's own does not.
        const steepest = Math.max(...fine.slice(20 * from, 20 * (at + 1)));
        const rise = spike.values['max_rise_v_per_s']!;
        expect(Math.abs(rise / steepest - 1)).toBeLessThan(mv === noisy ? 0.05 : 0.01);
        expect(rise).toBeGreaterThan(0.98 * Math.max(...slope.slice(from, at + 1)));
        // SciPy's width lies at half the prominence, which is taken from a lower base than threshold: wider than ours.
        const wider = (theirs.half_width_samples[k]! / rateHz) * 1000;
        expect(spike.values['half_width_ms']!).toBeLessThan(wider);
        expect(spike.values['half_width_ms']!).toBeGreaterThan(0.6 * wider);
      });
    });
  }
});
