/** Butterworth filters as cascades of second-order sections, run forwards and backwards so that nothing is delayed. */
import { requireRate } from './derivative.ts';

/** One section: b0, b1, b2, a1, a2 with a0 = 1. */
export type Section = readonly [number, number, number, number, number];

export type Band = { low_hz: number | null; high_hz: number | null };

interface Complex {
  re: number;
  im: number;
}
const add = (a: Complex, b: Complex): Complex => ({ re: a.re + b.re, im: a.im + b.im });
const sub = (a: Complex, b: Complex): Complex => ({ re: a.re - b.re, im: a.im - b.im });
const mul = (a: Complex, b: Complex): Complex => ({ re: a.re * b.re - a.im * b.im, im: a.re * b.im + a.im * b.re });
const div = (a: Complex, b: Complex): Complex => {
  const size = b.re * b.re + b.im * b.im;
  return { re: (a.re * b.re + a.im * b.im) / size, im: (a.im * b.re - a.re * b.im) / size };
};
const scale = (a: Complex, factor: number): Complex => ({ re: a.re * factor, im: a.im * factor });
function root(a: Complex): Complex {
  const size = Math.hypot(a.re, a.im);
  const re = Math.sqrt((size + a.re) / 2);
  const im = Math.sqrt((size - a.re) / 2);
  return { re, im: a.im < 0 ? -im : im };
}

/**
 * Sections of a digital Butterworth filter by the bilinear transform with prewarped corners.
 * `low_hz` alone is a high-pass, `high_hz` alone a low-pass, both a band-pass (whose order is then twice `order`).
 * @param order from 1 to 8. @param rateHz sampling rate, Hz
 * @throws RangeError where a corner is not between 0 and half the rate, or low is not below high
 * @see Oppenheim & Schafer, Discrete-Time Signal Processing (from memory); equal to SciPy `signal.butter`
 */
export function butterworth(order: number, band: Band, rateHz: number): Section[] {
  requireRate(rateHz);
  if (!(Number.isInteger(order) && order >= 1 && order <= 8))
    throw new RangeError(`order must be a whole number from 1 to 8, got ${order}`);
  for (const corner of [band.low_hz, band.high_hz])
    if (corner !== null && !(corner > 0 && corner < rateHz / 2))
      throw new RangeError(`corner must lie between 0 and ${rateHz / 2} Hz, half the rate, got ${corner}`);
  if (band.low_hz === null && band.high_hz === null)
    throw new RangeError('a filter needs at least one corner, got none');
  if (band.low_hz !== null && band.high_hz !== null && !(band.low_hz < band.high_hz))
    throw new RangeError(`low_hz must be below high_hz, got ${band.low_hz} and ${band.high_hz}`);

  const warp = (hz: number): number => 2 * rateHz * Math.tan((Math.PI * hz) / rateHz);
  const prototype = Array.from({ length: order }, (_, k): Complex => {
    const angle = (Math.PI * (2 * k + 1 + order)) / (2 * order);
    return { re: Math.cos(angle), im: Math.sin(angle) };
  });
  const high = band.high_hz === null ? null : warp(band.high_hz);
  const low = band.low_hz === null ? null : warp(band.low_hz);
  let poles: Complex[];
  if (low === null) poles = prototype.map((pole) => scale(pole, high!));
  else if (high === null) poles = prototype.map((pole) => div({ re: low, im: 0 }, pole));
  else {
    const centre = low * high;
    poles = prototype.flatMap((pole) => {
      const half = scale(pole, (high - low) / 2);
      const spread = root(sub(mul(half, half), { re: centre, im: 0 }));
      return [add(half, spread), sub(half, spread)];
    });
  }
  const digital = poles.map((pole) => div(add({ re: 2 * rateHz, im: 0 }, pole), sub({ re: 2 * rateHz, im: 0 }, pole)));
  // Zeros: z = −1 for a low-pass, +1 for a high-pass, one of each a section for a band-pass.
  const zeros: [number, number, number] = low === null ? [1, 2, 1] : high === null ? [1, -2, 1] : [1, 0, -1];
  const single: [number, number, number] = low === null ? [1, 1, 0] : [1, -1, 0];
  const reference = low === null ? 0 : high === null ? Math.PI : 2 * Math.atan(Math.sqrt(low * high!) / (2 * rateHz));
  return pairUp(digital).map((pair) => {
    const [a1, a2] = pair.length === 2 ? [-(pair[0]!.re + pair[1]!.re), mul(pair[0]!, pair[1]!).re] : [-pair[0]!.re, 0];
    const b = pair.length === 2 ? zeros : single;
    const gain = magnitude([b[0], b[1], b[2], a1, a2], reference);
    return [b[0] / gain, b[1] / gain, b[2] / gain, a1, a2];
  });
}

/** Conjugate pairs together, real poles two by two, at most one left over. */
function pairUp(poles: Complex[]): Complex[][] {
  const tiny = 1e-12;
  const upper = poles.filter((pole) => pole.im > tiny);
  const real = poles.filter((pole) => Math.abs(pole.im) <= tiny).sort((a, b) => a.re - b.re);
  const groups: Complex[][] = upper.map((pole) => [pole, { re: pole.re, im: -pole.im }]);
  for (let i = 0; i < real.length; i += 2) groups.push(real.slice(i, i + 2));
  return groups;
}

/** |H| of a section at an angle in radians per sample. */
export function magnitude(section: Section, angle: number): number {
  const z1 = { re: Math.cos(angle), im: -Math.sin(angle) };
  const z2 = mul(z1, z1);
  const top = { re: section[0] + section[1] * z1.re + section[2] * z2.re, im: section[1] * z1.im + section[2] * z2.im };
  const bottom = { re: 1 + section[3] * z1.re + section[4] * z2.re, im: section[3] * z1.im + section[4] * z2.im };
  return Math.hypot(top.re, top.im) / Math.hypot(bottom.re, bottom.im);
}

/** Filters in place, starting from the state that a constant input equal to the first sample would have left. */
function run(samples: Float64Array, sections: readonly Section[]): void {
  let level = samples[0]!;
  for (const [b0, b1, b2, a1, a2] of sections) {
    const gain = (b0 + b1 + b2) / (1 + a1 + a2);
    let s2 = (b2 - a2 * gain) * level;
    let s1 = (b1 - a1 * gain) * level + s2;
    level *= gain;
    for (let i = 0; i < samples.length; i++) {
      const input = samples[i]!;
      const output = b0 * input + s1;
      s1 = b1 * input - a1 * output + s2;
      s2 = b2 * input - a2 * output;
      samples[i] = output;
    }
  }
}

/**
 * Filters forwards and backwards: no phase shift, |H|² in all. Ends are continued by odd reflection over the same
 * length as SciPy's `sosfiltfilt` takes. Each stretch between unreadable samples is filtered by itself; stretches
 * too short for the reflection, and unreadable samples, give NaN.
 */
export function zeroPhase(samples: Float64Array, sections: readonly Section[]): Float64Array {
  const out = new Float64Array(samples.length).fill(Number.NaN);
  const zerosAtOrigin = sections.filter((section) => section[2] === 0).length;
  const polesAtOrigin = sections.filter((section) => section[4] === 0).length;
  const pad = 3 * (2 * sections.length + 1 - Math.min(zerosAtOrigin, polesAtOrigin));
  for (const [from, to] of finiteStretches(samples)) {
    const n = to - from;
    if (n <= pad) continue;
    const padded = new Float64Array(n + 2 * pad);
    padded.set(samples.subarray(from, to), pad);
    const first = samples[from]!;
    const last = samples[to - 1]!;
    for (let i = 0; i < pad; i++) {
      padded[i] = 2 * first - samples[from + pad - i]!;
      padded[pad + n + i] = 2 * last - samples[to - 2 - i]!;
    }
    run(padded, sections);
    padded.reverse();
    run(padded, sections);
    padded.reverse();
    out.set(padded.subarray(pad, pad + n), from);
  }
  return out;
}

/** Half-open index ranges [from, to) of consecutive finite samples. */
export function finiteStretches(samples: Float64Array): [number, number][] {
  const found: [number, number][] = [];
  let start = -1;
  for (let i = 0; i <= samples.length; i++) {
    const finite = i < samples.length && Number.isFinite(samples[i]!);
    if (finite && start < 0) start = i;
    if (!finite && start >= 0) {
      found.push([start, i]);
      start = -1;
    }
  }
  return found;
}

/** Zero-phase Butterworth low-pass. @param order of one pass; corner attenuated by 6 dB over both. */
export const lowPass = (samples: Float64Array, rateHz: number, cornerHz: number, order = 4): Float64Array =>
  zeroPhase(samples, butterworth(order, { low_hz: null, high_hz: cornerHz }, rateHz));

/** Zero-phase Butterworth high-pass, otherwise as `lowPass`. */
export const highPass = (samples: Float64Array, rateHz: number, cornerHz: number, order = 4): Float64Array =>
  zeroPhase(samples, butterworth(order, { low_hz: cornerHz, high_hz: null }, rateHz));

/** Zero-phase Butterworth band-pass, otherwise as `lowPass`. */
export const bandPass = (
  samples: Float64Array,
  rateHz: number,
  lowHz: number,
  highHz: number,
  order = 4,
): Float64Array => zeroPhase(samples, butterworth(order, { low_hz: lowHz, high_hz: highHz }, rateHz));
