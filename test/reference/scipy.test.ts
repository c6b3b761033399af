/**
 * The signal kernels and the spike measurements against SciPy and NumPy on the same traces. Runs where a Python with
 * SciPy is found (Debian: python3-scipy python3-h5py); elsewhere it is skipped and says so.
 */
import { spawnSync } from 'node:child_process';
import { fileURLToPath } from 'node:url';
import { describe, expect, test } from 'vitest';
import { spikeCriteria } from '../../pipeline/measure/spike-criteria.ts';
import { measureSpikes } from '../../pipeline/measure/spikes.ts';
import {
  butterworth,
  derivativeVPerS,
  exponentialFit,
  linearFit,
  localMaxima,
  prominence,
  quantile,
  robustSpread,
  sineFit,
  slopeVPerS,
  standardDeviation,
  theilSen,
  zeroPhase,
} from '../../pipeline/signal/index.ts';
import { hodgkinHuxley, normalNoise, pospischil, quantized, simulate, withNoise } from '../helpers/models.ts';
import { findPython } from '../tooling/prepare.ts';

const python = findPython();
const script = fileURLToPath(new URL('scipy_reference.py', import.meta.url));
if (!python) console.warn('No Python with SciPy found: the checks against SciPy are skipped (Debian: python3-scipy).');

/** What SciPy answers to one task. */
function scipy<T>(task: string, request: Record<string, unknown>): T {
  const plain = Object.fromEntries(
    Object.entries(request).map(([key, value]) => [key, value instanceof Float64Array ? Array.from(value) : value]),
  );
  const { status, stdout, stderr } = spawnSync(python!, [script], {
    input: JSON.stringify({ task, ...plain }),
    encoding: 'utf8',
    maxBuffer: 1 << 28,
  });
  if (status !== 0) throw new Error(`SciPy could not answer "${task}": ${stderr}`);
  return JSON.parse(stdout) as T;
}

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
  test('dV/dt is NumPy’s gradient', () =>
    expectAlike(derivativeVPerS(noisy, 20_000), scipy('gradient', { mv: noisy, rate_hz: 20_000 }), 1e-9));

  test('the least-squares slope is a Savitzky–Golay filter of first order away from the ends', () => {
    for (const m of [2, 5, 20]) {
      const theirs = scipy<number[]>('savgol', { mv: noisy, rate_hz: 20_000, half_width: m });
      expectAlike(slopeVPerS(noisy, 20_000, m).slice(m, -m), theirs.slice(m, -m), 1e-8);
    }
  });

  test('local maxima and prominences, on noise and on a coarse digitizer', () => {
    for (const mv of [noisy, quantized(noisy, 0.5)]) {
      expect(localMaxima(mv)).toEqual(scipy('maxima', { mv }));
      const theirs = scipy<{ index: number[]; prominence: number[] }>('peaks', { mv, prominence: 0.4 });
      const ours = localMaxima(mv)
        .map((index) => ({ index, prominence: prominence(mv, index) }))
        .filter((peak) => peak.prominence >= 0.4);
      expect(ours.map((peak) => peak.index)).toEqual(theirs.index);
      expectAlike(
        ours.map((peak) => peak.prominence),
        theirs.prominence,
        1e-12,
      );
    }
  });

  for (const [low_hz, high_hz] of [
    [null, 2000],
    [300, null],
    [1000, 5000],
    [1, 100],
  ] as const)
    for (const order of [1, 2, 3, 4])
      test(`Butterworth of order ${order} from ${low_hz ?? 0} to ${high_hz ?? '∞'} Hz, both ways, is sosfiltfilt`, () =>
        expectAlike(
          zeroPhase(noisy, butterworth(order, { low_hz, high_hz }, 20_000)),
          scipy('butter', { mv: noisy, rate_hz: 20_000, order, low_hz, high_hz }),
          // A corner of a few 10⁻⁵ of the rate costs digits in either program.
          low_hz === 1 ? 1e-4 : 1e-8,
        ));

  test('single exponential: parameters and standard errors of curve_fit', () => {
    const next = normalNoise(23);
    for (const tau of [2, 12, 45]) {
      const x = Array.from({ length: 500 }, (_, i) => 3 + i * 0.2);
      const y = x.map((v) => -70 - 6 * Math.exp(-(v - 3) / tau) + 0.2 * next());
      const ours = exponentialFit(x, y)!;
      const theirs = scipy<{ best: number[]; se: number[] }>('exponential', { x, y });
      for (const [mine, other] of [
        [ours.offset, theirs.best[0]],
        [ours.amplitude, theirs.best[1]],
        [ours.tau, theirs.best[2]],
        [ours.se_offset, theirs.se[0]],
        [ours.se_amplitude, theirs.se[1]],
        [ours.se_tau, theirs.se[2]],
      ] as const)
        expect(mine / other!).toBeCloseTo(1, 4);
    }
  });

  test('lines, robust spread, quantiles, sine', () => {
    const next = normalNoise(29);
    const x = Array.from({ length: 80 }, (_, i) => i * 0.7);
    const y = x.map((v) => 4 - 0.3 * v + next());
    const fit = scipy<Record<string, number>>('line', { x, y });
    const ours = linearFit(x, y)!;
    for (const key of ['slope', 'intercept', 'se_slope', 'se_intercept', 'r_squared'] as const)
      expect(ours[key]!).toBeCloseTo(fit[key]!, 10);
    const robust = scipy<Record<string, number>>('theil_sen', { x, y });
    expect(theilSen(x, y)!.slope).toBeCloseTo(robust['slope']!, 10);
    expect(theilSen(x, y)!.intercept).toBeCloseTo(robust['intercept']!, 10);
    const spread = scipy<{ mad: number; quantiles: number[]; sd: number }>('spread', { values: y });
    expect(robustSpread(y)!).toBeCloseTo(spread.mad, 10);
    expect(standardDeviation(y)!).toBeCloseTo(spread.sd, 10);
    expectAlike(
      [0, 0.05, 0.25, 0.5, 0.9, 1].map((p) => quantile(y, p)!),
      spread.quantiles,
      1e-12,
    );
    const hum = noisy.subarray(0, 2000).map((v, i) => v + 0.2 * Math.sin((2 * Math.PI * 50 * i) / 20_000));
    expect(sineFit(hum, 20_000, 50)!.amplitude).toBeCloseTo(
      scipy<number>('sine', { mv: hum, rate_hz: 20_000, frequency_hz: 50 }),
      8,
    );
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
  ] as const)
    test(`${name}: as many spikes as find_peaks with a prominence of 20 mV, at the same samples, as steep`, () => {
      const theirs = scipy<{ index: number[]; prominence: number[]; half_width_samples: number[] }>('peaks', {
        mv,
        prominence: 20,
      });
      const slope = scipy<number[]>('gradient', { mv, rate_hz: rateHz });
      const ours = measured(mv, rateHz);
      expect(ours).toHaveLength(theirs.index.length);
      ours.forEach((spike, k) => {
        const at = theirs.index[k]!;
        expect(Math.abs(spike.values['peak_at_s']! * rateHz - at)).toBeLessThanOrEqual(1);
        expect(spike.values['peak_mv']!).toBeGreaterThanOrEqual(mv[at]!);
        expect(spike.values['peak_mv']! - mv[at]!).toBeLessThan(1);
        const from = Math.floor(spike.values['threshold_at_s']! * rateHz);
        const steepest = Math.max(...slope.slice(from, at + 1));
        expect(spike.values['max_rise_v_per_s']!).toBeCloseTo(steepest, 6);
        // SciPy's width lies at half the prominence, which is taken from a lower base than threshold: wider than ours.
        const wider = (theirs.half_width_samples[k]! / rateHz) * 1000;
        expect(spike.values['half_width_ms']!).toBeLessThan(wider);
        expect(spike.values['half_width_ms']!).toBeGreaterThan(0.6 * wider);
      });
    });
});
