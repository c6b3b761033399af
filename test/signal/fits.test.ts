import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { linearFit, theilSen } from '../../pipeline/signal/index.ts';
import { normalNoise } from '../helpers/models.ts';
import { oneExponential, oneSine, oneSineNear } from './single-fits.ts';

const range = (n: number, step = 1): number[] => Array.from({ length: n }, (_, i) => i * step);

describe('straight lines', () => {
  test('too little to fit gives null', () => {
    for (const lineThrough of [linearFit, theilSen]) {
      expect(lineThrough([], [])).toBeNull();
      expect(lineThrough([1], [2])).toBeNull();
      expect(lineThrough([1, 1, 1], [1, 2, 3])).toBeNull();
      expect(lineThrough([1, Number.NaN], [1, 2])).toBeNull();
      expect(() => lineThrough([1, 2], [1])).toThrow(/one length, got 2 and 1/);
    }
    expect(linearFit([0, 1], [1, 3])).toMatchObject({ slope: 2, intercept: 1, se_slope: null, n: 2 });
  });
  // Worked by hand: x 1..5, y 2, 4, 5, 4, 5: slope 0.6, intercept 2.2, residual sum of squares 2.4.
  test('least squares with standard errors', () => {
    const fit = linearFit([1, 2, 3, 4, 5], [2, 4, 5, 4, 5])!;
    expect(fit.slope).toBeCloseTo(0.6, 12);
    expect(fit.intercept).toBeCloseTo(2.2, 12);
    expect(fit.residual_sd).toBeCloseTo(Math.sqrt(0.8), 12);
    expect(fit.se_slope).toBeCloseTo(Math.sqrt(0.08), 12);
    expect(fit.se_intercept).toBeCloseTo(Math.sqrt(0.8 * (1 / 5 + 9 / 10)), 12);
    expect(fit.r_squared).toBeCloseTo(0.6, 12);
  });
  test('both give back a line, whatever its place', () => {
    const finite = fc.double({ min: -1e3, max: 1e3, noNaN: true });
    fc.assert(
      fc.property(finite, finite, fc.integer({ min: 3, max: 30 }), (slope, intercept, n) => {
        const x = range(n, 0.5);
        const y = x.map((v) => intercept + slope * v);
        for (const fit of [linearFit(x, y)!, theilSen(x, y)!]) {
          expect(fit.slope).toBeCloseTo(slope, 6);
          expect(fit.intercept).toBeCloseTo(intercept, 6);
        }
      }),
      { seed: 31 },
    );
  });
  test('a quarter of wild points moves Theil–Sen little', () => {
    const x = range(40);
    const y = x.map((v, i) => 5 + 0.3 * v + (i % 4 === 0 ? 500 : 0));
    expect(theilSen(x, y)!.slope).toBeCloseTo(0.3, 1);
  });
  test('above 1500 points it takes every k-th and still finds the slope', () => {
    const x = range(5000);
    expect(
      theilSen(
        x,
        x.map((v) => 2 - 0.01 * v),
      )!.slope,
    ).toBeCloseTo(-0.01, 12);
  });
});

describe('exponential', () => {
  test('too little to fit, no span, a flat and a straight line', () => {
    expect(oneExponential([], [])).toBeNull();
    expect(oneExponential(range(4), [4, 3, 2, 1])).toBeNull();
    expect(oneExponential([1, 1, 1, 1, 1, 1], [1, 2, 3, 4, 5, 6])).toBeNull();
    expect(
      oneExponential(
        range(50),
        range(50).map(() => 3),
      )?.converged ?? false,
    ).toBe(false);
    expect(oneExponential(range(50), range(50))?.converged ?? false).toBe(false);
    expect(() => oneExponential([1], [])).toThrow(/one length/);
  });
  test('gives back what was put in', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 1, max: 60, noNaN: true }),
        fc.double({ min: 0.5, max: 50, noNaN: true }),
        fc.double({ min: -100, max: 100, noNaN: true }),
        fc.boolean(),
        (tau, size, offset, down) => {
          const x = range(400, 0.25);
          const amplitude = down ? -size : size;
          const fit = oneExponential(
            x,
            x.map((v) => offset + amplitude * Math.exp(-v / tau)),
          )!;
          expect(fit.converged).toBe(true);
          expect(fit.tau / tau).toBeCloseTo(1, 5);
          expect(fit.amplitude / amplitude).toBeCloseTo(1, 4);
          expect(fit.offset).toBeCloseTo(offset, 3);
        },
      ),
      { seed: 32, numRuns: 40 },
    );
  });
  test('its standard error is the spread over repeated noise', () => {
    const x = range(300, 0.2);
    const next = normalNoise(9);
    const taus: number[] = [];
    let stated = 0;
    for (let k = 0; k < 60; k++) {
      const fit = oneExponential(
        x,
        x.map((v) => -70 - 5 * Math.exp(-v / 12) + 0.3 * next()),
      )!;
      taus.push(fit.tau);
      stated += fit.se_tau / 60;
    }
    const centre = taus.reduce((sum, v) => sum + v, 0) / 60;
    const spread = Math.sqrt(taus.reduce((sum, v) => sum + (v - centre) ** 2, 0) / 59);
    expect(centre).toBeCloseTo(12, 0);
    // The spread of 60 estimates is known to 9 %; three times that.
    expect(Math.abs(stated / spread - 1)).toBeLessThan(0.28);
  });
  test('noise alone has no time constant', () => {
    const next = normalNoise(4);
    let claimed = 0;
    for (let k = 0; k < 20; k++) {
      const fit = oneExponential(
        range(200),
        range(200).map(() => next()),
      );
      if (fit?.converged && fit.se_tau < 0.1 * fit.tau) claimed++;
    }
    expect(claimed).toBe(0);
  });
  test('unreadable samples are left out', () => {
    const x = range(200, 0.5);
    const y = x.map((v, i) => (i % 7 === 0 ? Number.NaN : 3 + 2 * Math.exp(-v / 10)));
    expect(oneExponential(x, y)!.tau).toBeCloseTo(10, 5);
  });
});

describe('sine', () => {
  const hum = (n: number, rate: number, hz: number, amplitude: number, sd: number): Float64Array => {
    const next = normalNoise(6);
    return Float64Array.from(
      { length: n },
      (_, i) => -70 + (0.5 * i) / rate + amplitude * Math.sin((2 * Math.PI * hz * i) / rate + 0.7) + sd * next(),
    );
  };
  test('amplitude, phase and the line beside it', () => {
    const fit = oneSine(hum(10_000, 20_000, 50, 0.2, 0), 20_000, 50)!;
    expect(fit.amplitude).toBeCloseTo(0.2, 6);
    expect(fit.phase_rad).toBeCloseTo(0.7, 5);
    expect(fit.slope_per_s).toBeCloseTo(0.5, 5);
  });
  test('in noise ten times as large, within its standard error', () => {
    const fit = oneSine(hum(20_000, 20_000, 50, 0.05, 0.5), 20_000, 50)!;
    expect(fit.se_amplitude).toBeCloseTo(0.5 * Math.sqrt(2 / 20_000), 4);
    expect(Math.abs(fit.amplitude - 0.05)).toBeLessThan(4 * fit.se_amplitude);
  });
  test('the frequency is found when the rate is misdeclared by 2 %', () => {
    const fit = oneSineNear(hum(20_000, 20_000, 51, 0.1, 0.1), 20_000, 50, 3)!;
    expect(fit.frequency_hz).toBeCloseTo(51, 1);
    expect(fit.amplitude).toBeCloseTo(0.1, 2);
  });
  test('nothing readable, an impossible frequency', () => {
    expect(oneSine(new Float64Array(5000).fill(Number.NaN), 20_000, 50)).toBeNull();
    expect(oneSineNear(new Float64Array(5000).fill(Number.NaN), 20_000, 50, 2)).toBeNull();
    expect(() => oneSine(new Float64Array(10), 1000, 500)).toThrow(/frequencyHz must lie between 0 and 500 Hz/);
  });
  test('a gap does not spoil it', () => {
    const samples = hum(20_000, 20_000, 50, 0.2, 0);
    samples.fill(Number.NaN, 3000, 6000);
    expect(oneSine(samples, 20_000, 50)!.amplitude).toBeCloseTo(0.2, 6);
    expect(oneSineNear(samples, 20_000, 50, 1)!.frequency_hz).toBeCloseTo(50, 2);
  });
});
