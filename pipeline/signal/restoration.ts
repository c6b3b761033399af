/** The four-pole Bessel low-pass of most amplifiers, as far as it changes shapes and not times. */
import { besselCorner } from './bessel.ts';
import { requireRate } from './derivative.ts';

/** Gain of 105/(s⁴ + 10s³ + 45s² + 105s + 105) at a frequency. @param cornerHz −3 dB point, Hz, above 0 */
export function besselGain(hz: number, cornerHz: number): number {
  const w = (besselCorner * hz) / cornerHz;
  const re = w ** 4 - 45 * w ** 2 + 105;
  const im = 105 * w - 10 * w ** 3;
  return 105 / Math.hypot(re, im);
}

/** Standard deviation in time of its impulse response, s: the delay over √7, as 1 − |H|² begins with w²/7. */
export const besselSpread_s = (cornerHz: number): number => besselCorner / (2 * Math.PI * cornerHz * Math.sqrt(7));

/** Delay at low frequencies, s. */
export const besselDelay_s = (cornerHz: number): number => besselCorner / (2 * Math.PI * cornerHz);

/**
 * The filter's gain without its delay, as a symmetric kernel on the sampling grid: weights at lags of 0, 1, 2 …, the
 * cosine transform of the gain up to half the rate, scaled so that a constant stays what it is.
 */
export function besselKernel(cornerHz: number, rateHz: number): Float64Array {
  requireRate(rateHz);
  if (!(cornerHz > 0)) throw new RangeError(`cornerHz must be above 0, got ${cornerHz}`);
  const lags = Math.max(24, Math.ceil((1.5 * rateHz) / cornerHz));
  const points = Math.max(256, 8 * lags);
  const gains = Float64Array.from({ length: points }, (_, k) =>
    besselGain(((k + 0.5) / points) * (rateHz / 2), cornerHz),
  );
  const kernel = new Float64Array(lags + 1);
  for (let lag = 0; lag <= lags; lag++) {
    let sum = 0;
    for (let k = 0; k < points; k++) sum += gains[k]! * Math.cos((Math.PI * (k + 0.5) * lag) / points);
    // The gain ends at half the rate with a corner, which would ring for ever: a raised cosine ends it.
    kernel[lag] = (sum / points) * (0.5 + 0.5 * Math.cos((Math.PI * lag) / (lags + 1)));
  }
  let total = kernel[0]!;
  for (let lag = 1; lag <= lags; lag++) total += 2 * kernel[lag]!;
  return kernel.map((weight) => weight / total);
}

/** Convolution with a symmetric kernel of weights at lags 0, 1, 2 …; the ends are continued by their own values. */
export function smoothedBy(samples: Float64Array, kernel: Float64Array): Float64Array {
  const n = samples.length;
  const lags = kernel.length - 1;
  const out = new Float64Array(n);
  for (let i = 0; i < n; i++) {
    let sum = kernel[0]! * samples[i]!;
    if (i >= lags && i < n - lags) {
      // Two sums side by side do not wait for each other.
      let odd = 0;
      let lag = 1;
      for (; lag < lags; lag += 2) {
        odd += kernel[lag]! * (samples[i - lag]! + samples[i + lag]!);
        sum += kernel[lag + 1]! * (samples[i - lag - 1]! + samples[i + lag + 1]!);
      }
      if (lag === lags) odd += kernel[lag]! * (samples[i - lag]! + samples[i + lag]!);
      sum += odd;
    } else
      for (let lag = 1; lag <= lags; lag++)
        sum += kernel[lag]! * (samples[Math.max(0, i - lag)]! + samples[Math.min(n - 1, i + lag)]!);
    out[i] = sum;
  }
  return out;
}

/**
 * What stood before the filter, as far as it can be had back: the trace plus what smoothing it once more takes away,
 * and once again what smoothing that remainder takes away (van Cittert 1931, Z Phys 69:298–308; from memory). Of a
 * frequency that the filter passes with gain g, 1 − (1 − g)^(passes + 1) is restored.
 */
export function unsmoothed(samples: Float64Array, kernel: Float64Array, passes: number): Float64Array {
  const out = samples.slice();
  let rest = samples;
  for (let pass = 0; pass < passes; pass++) {
    const smooth = smoothedBy(rest, kernel);
    for (let i = 0; i < out.length; i++) smooth[i] = rest[i]! - smooth[i]!;
    rest = smooth;
    for (let i = 0; i < out.length; i++) out[i]! += rest[i]!;
  }
  return out;
}
