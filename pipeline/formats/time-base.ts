/** Is a column of times a fixed step? Rounding and clock jitter are forgiven, missing samples are found. */

export type TimeBase =
  | {
      ok: true;
      /** In one over the unit of the times. */
      rate: number;
      /** Time of the first sample, in the unit of the times. */
      start: number;
      /** Samples on the grid, the missing ones included. */
      samples: number;
      /** Place on the grid for each time; null where every time is in its place. */
      places: Uint32Array | null;
    }
  | { ok: false; at: number; why: string };

/** By how much a time of this size may be off, either way. */
export type Uncertainty = (time: number) => number;

type Regular = Extract<TimeBase, { ok: true }>;

/** The stretch of times that can be read. */
interface Stretch {
  times: Float64Array;
  first: number;
  last: number;
}

const rounded = (value: number): string => String(Number(value.toPrecision(6)));

/** Where missing samples are more than one in ten, rounding explains uneven times better; above one in two, nothing. */
const fewMissing = 0.1;
const mostMissing = 0.5;

/**
 * @param times in any unit; a time that could not be read is NaN and is taken to be in its place
 * @param noise error of a time as it is stored: floating point
 * @param rounding error of a time as it was printed, where it was; larger than the noise
 */
export function timeBase(times: Float64Array, noise: Uncertainty, rounding: Uncertainty = noise): TimeBase {
  let first = 0;
  while (first < times.length && Number.isNaN(times[first]!)) first++;
  let last = times.length - 1;
  while (last > first && Number.isNaN(times[last]!)) last--;
  if (last <= first) return { ok: false, at: Math.min(first, times.length), why: 'fewer than two times can be read' };
  const stretch: Stretch = { times, first, last };
  if (!(times[last]! > times[first]!)) return { ok: false, at: last, why: 'the times do not increase' };
  const even = evenly(stretch, noise);
  if (typeof even !== 'number') return even;
  const gaps = withGaps(stretch, noise);
  const missing = gaps === null ? 1 : (gaps.samples - times.length) / times.length;
  if (gaps && missing <= fewMissing) return gaps;
  const roundedEven = rounding === noise ? even : evenly(stretch, rounding);
  if (typeof roundedEven !== 'number') return roundedEven;
  if (gaps && missing <= mostMissing) return gaps;
  return { ok: false, at: roundedEven, why: misfit(times, roundedEven) };
}

function misfit(times: Float64Array, at: number): string {
  const steps: number[] = [];
  for (let index = 1; index < times.length && steps.length < 1001; index++) {
    const step = times[index]! - times[index - 1]!;
    if (!Number.isNaN(step)) steps.push(step);
  }
  const usual = steps.sort((a, b) => a - b)[steps.length >> 1]!;
  const here = times[at]! - times[at - 1]!;
  return `the step to it is ${rounded(here)} where ${rounded(usual)} is usual`;
}

interface Line {
  start: number;
  step: number;
}

/** Least-squares line of the times on their places. */
function fitLine({ times, first, last }: Stretch, placeOf: (index: number) => number): Line {
  const origin = times[first]!;
  let n = 0;
  let meanPlace = 0;
  let meanTime = 0;
  for (let index = first; index <= last; index++) {
    const time = times[index]!;
    if (Number.isNaN(time)) continue;
    n++;
    meanPlace += (placeOf(index) - meanPlace) / n;
    meanTime += (time - origin - meanTime) / n;
  }
  let together = 0;
  let alone = 0;
  for (let index = first; index <= last; index++) {
    const time = times[index]!;
    if (Number.isNaN(time)) continue;
    const place = placeOf(index) - meanPlace;
    together += place * (time - origin - meanTime);
    alone += place * place;
  }
  const step = together / alone;
  return { start: origin + meanTime - step * meanPlace, step };
}

/** Half the spread of the times about a line of this step: the least error that every time would have to have. */
function misplacement({ times, first, last }: Stretch, step: number, placeOf: (index: number) => number): number {
  let low = Number.POSITIVE_INFINITY;
  let high = Number.NEGATIVE_INFINITY;
  for (let index = first; index <= last; index++) {
    const off = times[index]! - times[first]! - placeOf(index) * step;
    if (off < low) low = off;
    if (off > high) high = off;
  }
  return (high - low) / 2;
}

/**
 * Rates are round numbers. Of the rates that explain the times as well as the fitted one, or as well as their
 * precision allows, the roundest is taken.
 */
function roundest(stretch: Stretch, step: number, error: number, placeOf: (index: number) => number): number {
  const rate = 1 / step;
  const allowed = Math.max(error, misplacement(stretch, step, placeOf)) * (1 + 1e-9);
  const span = stretch.times[stretch.last]! - stretch.times[stretch.first]!;
  const reach = (2 * allowed) / span + 1e-12;
  for (let digits = 1; digits <= 9; digits++) {
    const candidate = Number(rate.toPrecision(digits));
    if (Math.abs(candidate - rate) > reach * rate) continue;
    if (misplacement(stretch, 1 / candidate, placeOf) <= allowed) return candidate;
  }
  return rate;
}

/** A fixed step without a sample missing; else the index of the first time that is off. */
function evenly(stretch: Stretch, uncertainty: Uncertainty): Regular | number {
  const { times, first, last } = stretch;
  const placeOf = (index: number): number => index - first;
  const { start, step } = fitLine(stretch, placeOf);
  const error = Math.max(uncertainty(times[first]!), uncertainty(times[last]!));
  let worst = -1;
  let before = Number.NaN;
  let beforeAt = -1;
  for (let index = first; index <= last; index++) {
    const time = times[index]!;
    if (Number.isNaN(time)) continue;
    const own = uncertainty(time);
    const jump = time - before - step * (index - beforeAt);
    if (Math.abs(jump) > Math.max(0.5 * step, 2.01 * own)) return index;
    const off = Math.abs(time - start - (index - first) * step);
    if (worst < 0 && off > Math.max(0.25 * step, error + own)) worst = index;
    before = time;
    beforeAt = index;
  }
  if (worst >= 0 || !(step > 0)) return Math.max(worst, first + 1);
  const rate = roundest(stretch, step, error, placeOf);
  return { ok: true, rate, start: times[first]! - first / rate, samples: times.length, places: null };
}

/** Times that all lie on one grid with some places left out. */
function withGaps(stretch: Stretch, noise: Uncertainty): Regular | null {
  const { times, first, last } = stretch;
  const steps: number[] = [];
  for (let index = first + 1; index <= last && steps.length < 10_000; index++) {
    const step = times[index]! - times[index - 1]!;
    if (step > 0) steps.push(step);
  }
  if (steps.length < 2) return null;
  const origin = times[first]!;
  let step = steps.sort((a, b) => a - b)[steps.length >> 1]!;
  // The step is refined over ever longer stretches: an error of it grows with the distance.
  for (let reach = 16; ; reach *= 4) {
    const end = Math.min(last, first + reach);
    const usual = step;
    step = fitLine({ times, first, last: end }, (index) => Math.round((times[index]! - origin) / usual)).step;
    if (!(step > 0) || end === last) break;
  }
  const error = Math.max(noise(origin), noise(times[last]!));
  if (!(step > 0) || error > 0.1 * step) return null;
  const samples = Math.round((times[last]! - origin) / step) + 1 + first + (times.length - 1 - last);
  if (samples > (1 + mostMissing) * times.length) return null;
  const places = new Uint32Array(times.length);
  let before = -1;
  for (let index = 0; index < times.length; index++) {
    const exact = (times[index]! - origin) / step + first;
    const unread = Number.isNaN(exact);
    const place = unread ? before + 1 : Math.round(exact);
    if (place <= before || place >= samples) return null;
    if (!unread && Math.abs(exact - place) > 0.25) return null;
    places[index] = place;
    before = place;
  }
  const rate = roundest(stretch, step, error, (index) => places[index]! - first);
  return { ok: true, rate, start: origin - first / rate, samples, places };
}

/** Spreads samples over their places on the grid; what is missing is NaN. */
export function spread(samples: Float64Array, places: Uint32Array | null, length: number): Float64Array {
  if (!places) return samples;
  const spreadOut = new Float64Array(length).fill(Number.NaN);
  for (let index = 0; index < samples.length; index++) spreadOut[places[index]!] = samples[index]!;
  return spreadOut;
}
