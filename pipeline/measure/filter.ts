/**
 * The recorder's low-pass filter: its corner as the noise shows it, and what it is expected to have cost a spike. The
 * filter is taken for a four-pole Bessel low-pass, as most amplifiers have.
 */
import { fourier } from '../signal/fourier.ts';
import { besselGain, besselKernel, besselSpread_s, unsmoothed } from '../signal/restoration.ts';
import { absent, measured } from './reading.ts';
import type { Stretch } from './stretches.ts';
import type { MeasureContext, Reading, Signal } from './types.ts';

/** Samples of one piece of the noise spectrum. */
const pieceLength = 128;
const fewestPieces = 24;
const mostPieces = 400;
/** Lines below this belong to hum and to the cell, Hz. */
const lowest_hz = 1000;

/**
 * Mean spectrum of quiet stretches (Welch 1967, IEEE Trans Audio Electroacoust 15:70–73): Hann-windowed pieces of 128
 * samples that overlap by half, each freed of its own straight line; white noise of variance v gives v in every line.
 */
function quietSpectrum(samples: Float64Array, quiet: readonly Stretch[]): { power: Float64Array; pieces: number } {
  const n = pieceLength;
  const power = new Float64Array(n / 2 + 1);
  const window = Float64Array.from({ length: n }, (_, i) => 0.5 - 0.5 * Math.cos((2 * Math.PI * (i + 0.5)) / n));
  const energy = window.reduce((sum, w) => sum + w * w, 0);
  const starts = quiet.flatMap(({ from, to }) =>
    Array.from({ length: Math.max(0, Math.floor((2 * (to - from)) / n) - 1) }, (_, k) => from + (k * n) / 2),
  );
  // Whole runs of neighbours are kept, so that overlap stays what it is.
  const used = starts.slice(0, mostPieces);
  const re = new Float64Array(n);
  const im = new Float64Array(n);
  const windowed = (start: number, into: Float64Array): void => {
    let level = 0;
    let slope = 0;
    for (let i = 0; i < n; i++) {
      level += samples[start + i]!;
      slope += (i - (n - 1) / 2) * samples[start + i]!;
    }
    level /= n;
    slope /= (n * (n * n - 1)) / 12;
    for (let i = 0; i < n; i++) into[i] = window[i]! * (samples[start + i]! - level - slope * (i - (n - 1) / 2));
  };
  // Two pieces go through one transform, as real and imaginary part: |A|² + |B|² = (|Z_k|² + |Z_−k|²)/2.
  const share = 0.5 / energy / used.length;
  for (let pair = 0; pair < used.length; pair += 2) {
    windowed(used[pair]!, re);
    if (pair + 1 < used.length) windowed(used[pair + 1]!, im);
    else im.fill(0);
    fourier(re, im);
    for (let k = 0; k <= n / 2; k++) {
      const mirror = (n - k) % n;
      power[k]! += share * (re[k]! * re[k]! + im[k]! * im[k]! + re[mirror]! * re[mirror]! + im[mirror]! * im[mirror]!);
    }
  }
  return { power, pieces: used.length };
}

/** Power that a Bessel low-pass leaves of white noise at a frequency of the sampled trace, folded lines included. */
function foldedPower(hz: number, cornerHz: number, rateHz: number): number {
  let sum = besselGain(hz, cornerHz) ** 2;
  for (let fold = 1; fold <= 3; fold++)
    sum += besselGain(fold * rateHz - hz, cornerHz) ** 2 + besselGain(fold * rateHz + hz, cornerHz) ** 2;
  return sum;
}

/** Lines that are looked at, corners that are tried and the power that each leaves in those lines. */
interface Corners {
  lines: number[];
  shapes: { corner: number; shape: Float64Array }[];
}

/** Kept for the last rate: sweeps of one rate come together. */
let lastCorners: { rate: number; corners: Corners } | null = null;

function cornersAt(rate: number): Corners {
  if (lastCorners?.rate === rate) return lastCorners.corners;
  const lines = Array.from({ length: pieceLength / 2 - 2 }, (_, k) => k + 2).filter(
    (k) => (k * rate) / pieceLength >= lowest_hz,
  );
  const shapes: Corners['shapes'] = [];
  for (let corner = 0.04 * rate; corner <= 0.9 * rate; corner *= 1.04)
    shapes.push({
      corner,
      shape: Float64Array.from(lines, (k) => foldedPower((k * rate) / pieceLength, corner, rate)),
    });
  lastCorners = { rate, corners: { lines, shapes } };
  return lastCorners.corners;
}

interface Fit {
  /** Twice the negative logarithm of the likelihood but for a constant. */
  misfit: number;
  white: number;
  floor: number;
  /** Mean square of the relative residuals, in units of what pieces of this number give by chance. */
  scatter: number;
}

/** Best amounts of filtered white noise and of a floor that is not filtered, for one corner. */
function fitAt(power: Float64Array, shape: Float64Array, pieces: number, leastFloor: number): Fit {
  const n = power.length;
  let white = power.reduce((sum, p) => sum + p, 0) / shape.reduce((sum, g) => sum + g, 0);
  let floor = leastFloor;
  for (let round = 0; round < 12; round++) {
    let [gg, g1, one, gp, p1] = [0, 0, 0, 0, 0];
    for (let k = 0; k < n; k++) {
      const p = power[k]!;
      const g = shape[k]!;
      const expected = white * g + floor;
      const weight = 1 / (expected * expected);
      gg += weight * g * g;
      g1 += weight * g;
      one += weight;
      gp += weight * g * p;
      p1 += weight * p;
    }
    const det = gg * one - g1 * g1;
    floor = det > 1e-9 * gg * one ? (gg * p1 - g1 * gp) / det : leastFloor;
    if (!(floor > leastFloor)) floor = leastFloor;
    white = Math.max(1e-12, (gp - g1 * floor) / gg);
  }
  let [misfit, scatter] = [0, 0];
  for (let k = 0; k < n; k++) {
    const expected = white * shape[k]! + floor;
    const relative = power[k]! / expected;
    misfit += 2 * pieces * (relative + Math.log(expected));
    scatter += (pieces * (relative - 1) ** 2) / n;
  }
  return { misfit, white, floor, scatter };
}

/** Neighbouring lines of Hann-windowed pieces share power, and overlapping pieces share samples. */
const shared = 1.5;
/** A corner stated by its nominal value, or a filter of another kind, is off by about so much (two standard deviations). */
const cornerShare = 0.05;

/**
 * Corner of the low-pass filter from the spectrum of the noise in quiet stretches, kHz: the Bessel filter that best
 * explains, by Whittle's likelihood (Whittle 1953, Ark Mat 2:423–434; from memory), the spectrum from 1 kHz to half the
 * rate as filtered white noise over an unfiltered floor. Given only where that explains it: another shape, a floor that
 * hides the roll-off or a corner beyond the spectrum gives `unresolved`. Half-width: where twice the logarithm of the
 * likelihood ratio reaches 3.84, with a twentieth of the corner for what corners are stated to.
 */
export function filterCorner(voltage: Signal, quiet: readonly Stretch[], quantum_mv: number | null): Reading {
  const rate = voltage.rate_hz;
  const { power, pieces } = quietSpectrum(voltage.samples, quiet);
  if (pieces < fewestPieces) return absent('no-spike-free-stretch');
  const { lines, shapes } = cornersAt(rate);
  if (lines.length < 12) return absent('rate-too-low');
  const own = Float64Array.from(lines, (k) => power[k]!);
  if (!(Math.min(...own) > 0)) return absent('unresolved');
  const least = Math.max((quantum_mv ?? 0) ** 2 / 12, 1e-6 * Math.min(...own));
  const count = pieces / 1.06;
  const grid = shapes.map(({ corner, shape }) => ({ corner, fit: fitAt(own, shape, count, least) }));
  const flat = fitAt(own, new Float64Array(own.length).fill(1), count, least);
  const best = grid.reduce((least_, one) => (one.fit.misfit < least_.fit.misfit ? one : least_));
  if (best.fit.scatter / shared > 2.5)
    return absent('unresolved', { note: 'the noise is not white before the filter' });
  const allowed = best.fit.misfit + 3.84 * shared;
  const within = grid.filter(({ fit }) => fit.misfit <= allowed);
  const [low, high] = [within[0]!.corner / 1.02, within.at(-1)!.corner * 1.02];
  if (flat.misfit <= allowed || within.at(-1) === grid.at(-1) || within[0] === grid[0])
    return absent('unresolved', { note: 'the noise shows no roll-off below half the sampling rate' });
  if (best.fit.floor > best.fit.white) return absent('unresolved', { note: 'unfiltered noise hides the roll-off' });
  const k = grid.indexOf(best);
  const [left, right] = [grid[k - 1]!.fit.misfit, grid[k + 1]!.fit.misfit];
  const bend = left - 2 * best.fit.misfit + right;
  const corner = best.corner * 1.04 ** (bend > 0 ? Math.max(-0.5, Math.min(0.5, (0.5 * (left - right)) / bend)) : 0);
  const statistical = Math.max(high - corner, corner - low);
  return measured(corner / 1000, {
    n: pieces,
    u95: Math.hypot(statistical, cornerShare * corner) / 1000,
    note: `spectrum from ${(lines[0]! * rate) / pieceLength / 1000} to ${(lines.at(-1)! * rate) / pieceLength / 1000} kHz`,
  });
}

/** The filter a spike went through, as far as it is known. */
export interface KnownFilter {
  corner_hz: number;
  /** `assumed`: neither stated nor seen in the noise; good for an uncertainty, not for a correction. */
  from: 'stated' | 'estimated' | 'assumed';
  /** Relative standard uncertainty of what it costs. */
  share: number;
}

/** Where nothing is known: 0.4 of the rate, the highest that goes with it, but no more than amplifiers offer by custom. */
const assumedHighest_hz = 10_000;

/**
 * What the filter costs goes with the inverse square of the corner. A stated corner counts as known within 5 %, the
 * kind of filter adds as much; relative standard uncertainty of the cost 15 %, with an estimated corner that of the
 * corner twice besides, and 60 % where the corner is assumed.
 */
export function knownFilter(context: MeasureContext, estimated: () => Reading, rateHz: number): KnownFilter {
  if (context.filter_khz !== null) return { corner_hz: context.filter_khz * 1000, from: 'stated', share: 0.15 };
  const reading = estimated();
  if (reading.value !== null)
    return {
      corner_hz: reading.value * 1000,
      from: 'estimated',
      share: Math.hypot(0.15, reading.u95! / reading.value),
    };
  return { corner_hz: Math.min(assumedHighest_hz, 0.4 * rateHz), from: 'assumed', share: 0.6 };
}

/**
 * Pipette capacitance left beside the access resistance makes one more low-pass that nobody states. Its time constant,
 * 12 MΩ · 1 pF = 12 µs, is common practice, no source.
 */
const electrode_s = 12e-6;

/** What the electrode is expected to cost beside the filter, as a share of the filter's own cost: both go with the variance of the impulse response. */
export const electrodeShare = (filter: KnownFilter): number => (electrode_s / besselSpread_s(filter.corner_hz)) ** 2;

/** How often smoothing is undone; see `unsmoothed`. */
const passes = 2;

/** Van Cittert's restoration of a whole trace. Samples are mV without gaps. */
export const restored = (samples: Float64Array, rateHz: number, filter: KnownFilter): Float64Array =>
  unsmoothed(samples, besselKernel(filter.corner_hz, rateHz), passes);
