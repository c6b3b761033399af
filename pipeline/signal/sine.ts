/** Amplitude of a sine in noise, by least squares. */
import { requireRate } from './derivative.ts';
import { goldenMinimum } from './exponential.ts';

export interface SineFit {
  frequency_hz: number;
  amplitude: number;
  /** Phase of the sine at the first sample, rad: amplitude·sin(2πft + phase). */
  phase_rad: number;
  offset: number;
  /** Slope of the straight line fitted beside it, per s. */
  slope_per_s: number;
  residual_sd: number;
  /** Standard error of the amplitude if the residual is white; larger for slow noise. */
  se_amplitude: number;
  n: number;
}

/**
 * Least-squares sine of a given frequency beside a straight line. Unreadable samples are left out.
 * @param samples any unit. @param rateHz sampling rate, Hz. @param frequencyHz between 0 and half the rate
 * @returns null for fewer than six finite samples or less than one period
 */
export function sineFit(samples: Float64Array, rateHz: number, frequencyHz: number): SineFit | null {
  requireRate(rateHz);
  if (!(frequencyHz > 0 && frequencyHz < rateHz / 2))
    throw new RangeError(`frequencyHz must lie between 0 and ${rateHz / 2} Hz, half the rate, got ${frequencyHz}`);
  const n = samples.length;
  if (n < rateHz / frequencyHz) return null;
  const omega = (2 * Math.PI * frequencyHz) / rateHz;
  const middle = (n - 1) / 2;
  let level = 0;
  let held = 0;
  for (let i = 0; i < n; i++)
    if (Number.isFinite(samples[i]!)) {
      level += samples[i]!;
      held++;
    }
  if (held < 6) return null;
  level /= held;
  // Normal equations for [sin, cos, 1, u], u from −1 to 1 over the samples, of the samples less their mean.
  const matrix = Array.from({ length: 4 }, () => new Float64Array(5));
  const basis = new Float64Array(4);
  const fill = (i: number): void => {
    basis[0] = Math.sin(omega * i);
    basis[1] = Math.cos(omega * i);
    basis[2] = 1;
    basis[3] = (i - middle) / middle;
  };
  for (let i = 0; i < n; i++) {
    const value = samples[i]! - level;
    if (!Number.isFinite(value)) continue;
    fill(i);
    for (let r = 0; r < 4; r++) {
      for (let c = r; c < 4; c++) matrix[r]![c]! += basis[r]! * basis[c]!;
      matrix[r]![4]! += basis[r]! * value;
    }
  }
  for (let r = 0; r < 4; r++) for (let c = 0; c < r; c++) matrix[r]![c] = matrix[c]![r]!;
  const gram = (matrix[0]![0]! + matrix[1]![1]!) / 2;
  const solved = solve(matrix);
  if (!solved) return null;
  const [sine, cosine, offset, slope] = solved as [number, number, number, number];
  let rss = 0;
  for (let i = 0; i < n; i++) {
    const value = samples[i]! - level;
    if (!Number.isFinite(value)) continue;
    fill(i);
    rss += (value - sine * basis[0]! - cosine * basis[1]! - offset - slope * basis[3]!) ** 2;
  }
  const residualSd = Math.sqrt(rss / Math.max(1, held - 4));
  return {
    frequency_hz: frequencyHz,
    amplitude: Math.hypot(sine, cosine),
    phase_rad: Math.atan2(cosine, sine),
    offset: offset + level,
    slope_per_s: (slope * rateHz) / middle,
    residual_sd: residualSd,
    se_amplitude: residualSd / Math.sqrt(gram),
    n: held,
  };
}

/** Gaussian elimination with partial pivoting on rows [A | b]; null where singular. */
function solve(rows: Float64Array[]): number[] | null {
  const size = rows.length;
  for (let column = 0; column < size; column++) {
    let pivot = column;
    for (let r = column + 1; r < size; r++)
      if (Math.abs(rows[r]![column]!) > Math.abs(rows[pivot]![column]!)) pivot = r;
    if (Math.abs(rows[pivot]![column]!) < 1e-9) return null;
    [rows[column], rows[pivot]] = [rows[pivot]!, rows[column]!];
    for (let r = column + 1; r < size; r++) {
      const factor = rows[r]![column]! / rows[column]![column]!;
      for (let c = column; c <= size; c++) rows[r]![c]! -= factor * rows[column]![c]!;
    }
  }
  const x = new Array<number>(size).fill(0);
  for (let r = size - 1; r >= 0; r--) {
    let value = rows[r]![size]!;
    for (let c = r + 1; c < size; c++) value -= rows[r]![c]! * x[c]!;
    x[r] = value / rows[r]![r]!;
  }
  return x;
}

/**
 * The sine whose frequency, within ± `rangeHz` of `aroundHz`, leaves the smallest residual: a grid a quarter of the
 * resolution 1/duration apart, then golden section.
 * @returns null as `sineFit` does
 */
export function sineNear(samples: Float64Array, rateHz: number, aroundHz: number, rangeHz: number): SineFit | null {
  const low = Math.max(aroundHz - rangeHz, aroundHz / 10);
  const high = Math.min(aroundHz + rangeHz, rateHz * 0.49);
  if (!(high > low)) return sineFit(samples, rateHz, aroundHz);
  // The search runs on block means at twenty samples a period or more: the frequency is the same there, the work less.
  const block = Math.max(1, Math.floor(rateHz / (20 * high)));
  const coarse = block === 1 ? samples : blockMeans(samples, block);
  const coarseRate = rateHz / block;
  const residual = (hz: number): number => sineFit(coarse, coarseRate, hz)?.residual_sd ?? Number.POSITIVE_INFINITY;
  const spacing = rateHz / samples.length / 4;
  const cells = Math.max(4, Math.ceil((high - low) / spacing));
  const at = (k: number): number => low + ((high - low) * k) / cells;
  let best = 0;
  let least = Number.POSITIVE_INFINITY;
  for (let k = 0; k <= cells; k++) {
    const found = residual(at(k));
    if (found < least) {
      least = found;
      best = k;
    }
  }
  if (!Number.isFinite(least)) return null;
  const frequency = goldenMinimum(residual, at(Math.max(0, best - 1)), at(Math.min(cells, best + 1)), 1e-7);
  return sineFit(samples, rateHz, frequency);
}

function blockMeans(samples: Float64Array, block: number): Float64Array {
  return Float64Array.from({ length: Math.floor(samples.length / block) }, (_, b) => {
    let sum = 0;
    for (let i = b * block; i < (b + 1) * block; i++) sum += samples[i]!;
    return sum / block;
  });
}
