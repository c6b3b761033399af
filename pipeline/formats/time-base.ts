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

const rounded = (value: number): string => String(Number(value.toPrecision(6)));

/** A rate that is a whole number within the precision of the times is that whole number. */
function wholeRate(step: number, relativeError: number): number {
  const rate = 1 / step;
  const whole = Math.round(rate);
  return whole >= 1 && Math.abs(rate - whole) <= rate * Math.max(relativeError, 1e-9) ? whole : rate;
}

/**
 * @param times in any unit; a time that could not be read is NaN and is taken to be in its place
 * @param resolution by how much a time of this size may be off because of how it was stored or printed
 */
export function timeBase(times: Float64Array, resolution: (time: number) => number): TimeBase {
  let first = 0;
  while (first < times.length && Number.isNaN(times[first]!)) first++;
  let last = times.length - 1;
  while (last > first && Number.isNaN(times[last]!)) last--;
  if (last <= first) return { ok: false, at: first, why: 'fewer than two times can be read' };
  const span = times[last]! - times[first]!;
  if (!(span > 0)) return { ok: false, at: last, why: 'the times do not increase' };
  const step = span / (last - first);
  const coarsest = Math.max(resolution(times[first]!), resolution(times[last]!));
  const misplaced = firstMisplaced(times, first, last, step, resolution);
  if (misplaced < 0)
    return {
      ok: true,
      rate: wholeRate(step, (2 * coarsest) / span),
      start: times[first]! - first * step,
      samples: times.length,
      places: null,
    };
  return withGaps(times, first, last, resolution) ?? { ok: false, at: misplaced, why: misfit(times, misplaced) };
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

/** Index of the first time that is off a straight line by more than its precision and a quarter of a step; or -1. */
function firstMisplaced(
  times: Float64Array,
  first: number,
  last: number,
  step: number,
  resolution: (time: number) => number,
): number {
  const origin = times[first]!;
  const endError = Math.max(resolution(origin), resolution(times[last]!));
  let before = origin;
  let beforeAt = first;
  let worst = -1;
  for (let index = first + 1; index <= last; index++) {
    const time = times[index]!;
    if (Number.isNaN(time)) continue;
    const precision = resolution(time);
    const jump = time - before - step * (index - beforeAt);
    if (Math.abs(jump) > Math.max(0.5 * step, 2.01 * precision)) return index;
    if (worst < 0 && Math.abs(time - (origin + (index - first) * step)) > Math.max(0.25 * step, endError + precision))
      worst = index;
    before = time;
    beforeAt = index;
  }
  return worst;
}

/** Times that all lie on one grid with some places left out. */
function withGaps(
  times: Float64Array,
  first: number,
  last: number,
  resolution: (time: number) => number,
): TimeBase | null {
  const steps: number[] = [];
  for (let index = first + 1; index <= last && steps.length < 10_000; index++) {
    const step = times[index]! - times[index - 1]!;
    if (step > 0) steps.push(step);
  }
  if (steps.length < 2) return null;
  let step = steps.sort((a, b) => a - b)[steps.length >> 1]!;
  const origin = times[first]!;
  // The step is refined over ever longer stretches: an error of it grows with the distance.
  for (let reach = 16; ; reach *= 4) {
    let sumPlaceTime = 0;
    let sumPlaceSquared = 0;
    const end = Math.min(last, first + reach);
    for (let index = first + 1; index <= end; index++) {
      const elapsed = times[index]! - origin;
      if (Number.isNaN(elapsed)) continue;
      const place = Math.round(elapsed / step);
      sumPlaceTime += place * elapsed;
      sumPlaceSquared += place * place;
    }
    if (!(sumPlaceSquared > 0)) return null;
    step = sumPlaceTime / sumPlaceSquared;
    if (end === last) break;
  }
  const coarsest = Math.max(resolution(origin), resolution(times[last]!));
  if (!(step > 0) || coarsest > 0.5 * step) return null;
  const samples = Math.round((times[last]! - origin) / step) + 1 + first + (times.length - 1 - last);
  if (samples > 1.5 * times.length + 16) return null;
  const places = new Uint32Array(times.length);
  let before = -1;
  for (let index = 0; index < times.length; index++) {
    const time = times[index]!;
    const exact = (time - origin) / step + first;
    const place = Number.isNaN(time) ? before + 1 : Math.round(exact);
    if (place <= before || place >= samples) return null;
    if (!Number.isNaN(time) && Math.abs(exact - place) > 0.25 + (2 * coarsest) / step) return null;
    places[index] = place;
    before = place;
  }
  return {
    ok: true,
    rate: wholeRate(step, (2 * coarsest) / (times[last]! - origin)),
    start: origin - first * step,
    samples,
    places,
  };
}

/** Spreads samples over their places on the grid; what is missing is NaN. */
export function spread(samples: Float64Array, places: Uint32Array | null, length: number): Float64Array {
  if (!places) return samples;
  const spreadOut = new Float64Array(length).fill(Number.NaN);
  for (let index = 0; index < samples.length; index++) spreadOut[places[index]!] = samples[index]!;
  return spreadOut;
}
