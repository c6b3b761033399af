/**
 * Places and sizes of one spike between the samples: threshold, peak, flanks and steepest slopes from the band-limited
 * interpolation of the trace, low-passed as far as each number bears it, with the noise carried through the weights.
 */
import {
  type BandLimited,
  bandLimited,
  bandLimitedOf,
  localCubic,
  localCubicOf,
  varianceOf,
  type Weights,
  weighed,
} from '../signal/band-limited.ts';

/** A number at a place; standard deviations are those of the noise. Places in samples, slopes per sample. */
export interface Fine {
  at: number;
  value: number;
  sd: number;
  sdAt: number;
  /** What the next smoother would change: a share of it is taken for the error of the interpolation. */
  shift: number;
  shiftAt: number;
  smoother: Smoother;
}

/** How the trace is read between its samples: everything below a cutoff, or the local cubic over so many samples. */
export type Smoother = { cutoff: number } | { half: number };

const smoothers: Smoother[] = [{ cutoff: 1 }, ...Array.from({ length: 24 }, (_, k) => ({ half: 3 * 1.25 ** k }))];
const read = (trace: Trace, x: number, by: Smoother): BandLimited | null =>
  'half' in by ? localCubic(x, by.half, trace.first, trace.last) : bandLimited(x, by.cutoff, trace.first, trace.last);
/** Time, samples, over which a smoother answers. */
const spanOf = (by: Smoother): number => ('half' in by ? by.half / 2 : 1 / by.cutoff);

/** Held against the full band where no other smoother fits the feature. */
const slack: Smoother = { cutoff: 0.71 };

/** How many standard deviations of their difference two smoothers may be apart. */
const bearable = 3;

export interface Trace {
  samples: Float64Array;
  covariance: Float64Array;
  /** Samples that may take part, inclusive. */
  first: number;
  last: number;
}

/** The same by one smoother. */
type One = Omit<Fine, 'shift' | 'shiftAt' | 'smoother'>;

/** Difference of what two smoothers read at one place, in standard deviations of the noise in it. */
function apart(trace: Trace, a: Weights, b: Weights): number {
  const first = Math.min(a.first, b.first);
  const last = Math.max(a.first + a.weights.length, b.first + b.weights.length);
  const weights = new Float64Array(last - first);
  for (let j = 0; j < a.weights.length; j++) weights[a.first - first + j]! += a.weights[j]!;
  for (let j = 0; j < b.weights.length; j++) weights[b.first - first + j]! -= b.weights[j]!;
  const difference = Math.abs(weighed(trace.samples, { first, weights }));
  return difference / Math.max(1e-12, Math.sqrt(varianceOf(weights, trace.covariance)));
}

/**
 * The number by the widest smoother that reads the trace at its own place as all narrower ones do, within the noise of
 * their differences (Lepski 1991, Theory Probab Appl 35:454–466; from memory).
 * @param what has to agree: values, slopes or both
 * @param widest samples on either side that the widest may take in
 */
function steadiest(
  trace: Trace,
  at: (by: Smoother) => One | null,
  what: readonly ('value' | 'slope')[],
  widest: number,
  among: readonly Smoother[] = smoothers,
): Fine | null {
  const allowed = among.filter((by) => !('half' in by) || by.half <= widest);
  let refused: One | null = null;
  for (let k = allowed.length - 1; k >= 0; k--) {
    const smoother = allowed[k]!;
    const one = at(smoother);
    if (one === null) continue;
    const narrower = allowed.slice(0, k);
    const own = read(trace, one.at, smoother);
    const agrees = narrower.every((narrow) => {
      const other = read(trace, one.at, narrow);
      return !own || !other || what.every((which) => apart(trace, own[which], other[which]) <= bearable);
    });
    if (!agrees) {
      refused = one;
      continue;
    }
    let other: One | null = null;
    for (let j = k - 1; j >= 0 && !other; j--) other = at(allowed[j]!);
    other ??= refused ?? at(slack);
    return {
      ...one,
      smoother,
      shift: other ? Math.abs(one.value - other.value) : 0,
      shiftAt: other ? Math.abs(one.at - other.at) : 0,
    };
  }
  return null;
}

const readOff = ({ samples, first, last }: Trace, x: number, by: Smoother, what: 'value' | 'slope'): number =>
  'half' in by
    ? localCubicOf(samples, x, by.half, first, last, what)
    : bandLimitedOf(samples, x, by.cutoff, first, last, what);
const potentialAt = (trace: Trace, x: number, by: Smoother): number => readOff(trace, x, by, 'value');
const slopeHere = (trace: Trace, x: number, by: Smoother): number => readOff(trace, x, by, 'slope');

/**
 * Place nearest to `near` where a function rises (falls) through zero, within `reach`: brackets outwards, then narrows
 * the bracket.
 */
function root(f: (x: number) => number, near: number, reach: number, step: number, rises: boolean): number | null {
  const sign = rises ? 1 : -1;
  const g = (x: number): number => sign * f(x);
  let [left, right] = [near, near];
  let [atLeft, atRight] = [g(near), g(near)];
  if (!Number.isFinite(atLeft)) return null;
  let bracket: [number, number, number, number] | null = null;
  for (let k = 1; k * step <= reach + 1e-9 && !bracket; k++) {
    const [l, r] = [near - k * step, near + k * step];
    const [gl, gr] = [g(l), g(r)];
    const down = gl < 0 && atLeft >= 0;
    const up = atRight < 0 && gr >= 0;
    if (down && (!up || Math.abs(gl) > 0)) bracket = [l, gl, left, atLeft];
    else if (up) bracket = [right, atRight, r, gr];
    [left, atLeft, right, atRight] = [l, gl, r, gr];
  }
  if (!bracket) return null;
  let [a, fa, b, fb] = bracket;
  // False position, the end that stays halved (Illinois): the function is nearly straight within the bracket.
  const enough = 1e-7 * (fb - fa);
  let stayed = 0;
  for (let k = 0; k < 20; k++) {
    const x = fb > fa ? a - (fa * (b - a)) / (fb - fa) : (a + b) / 2;
    const fx = g(x);
    if (Math.abs(fx) <= enough) return x;
    if (fx > 0) {
      [b, fb] = [x, fx];
      if (stayed === -1) fa /= 2;
      stayed = -1;
    } else {
      [a, fa] = [x, fx];
      if (stayed === 1) fb /= 2;
      stayed = 1;
    }
  }
  return (a + b) / 2;
}

/** Step of the search, samples: an eighth of what the smoother answers over. */
const stepAt = (by: Smoother): number => 0.125 * spanOf(by);

function combined(a: Float64Array, b: Float64Array, share: number): Float64Array {
  return a.map((weight, i) => weight + share * b[i]!);
}

/** Where the slope (per sample) rises through a level; its potential and the noise of both. */
function thresholdAt(trace: Trace, near: number, slope: number, reach: number, by: Smoother): One | null {
  const at = root((x) => slopeHere(trace, x, by) - slope, near, Math.max(reach, 0.5 * spanOf(by)), stepAt(by), true);
  if (at === null) return null;
  const held = read(trace, at, by);
  const step = 0.1 * spanOf(by);
  const bend = (slopeHere(trace, at + step, by) - slopeHere(trace, at - step, by)) / (2 * step);
  if (!held || !(bend > 0)) return null;
  // A slope that is too high by e crosses early by e/V'', where the potential is lower by V'·e/V''.
  const weights = combined(held.value.weights, held.slope.weights, -slope / bend);
  return {
    at,
    value: weighed(trace.samples, held.value),
    sd: Math.sqrt(varianceOf(weights, trace.covariance)),
    sdAt: Math.sqrt(varianceOf(held.slope.weights, trace.covariance)) / bend,
  };
}

/** @param widest samples on either side that the widest smoother may take in. @param only a smoother that is given */
export function fineThreshold(
  trace: Trace,
  near: number,
  slope: number,
  reach: number,
  widest: number,
  only?: Smoother,
): Fine | null {
  if (only !== undefined) return fixed(thresholdAt(trace, near, slope, reach, only), only);
  return steadiest(trace, (by) => thresholdAt(trace, near, slope, reach, by), ['slope'], widest);
}

const fixed = (one: One | null, smoother: Smoother): Fine | null => one && { ...one, shift: 0, shiftAt: 0, smoother };

function topAt(trace: Trace, near: number, by: Smoother): One | null {
  const at = root((x) => slopeHere(trace, x, by), near, Math.max(1.5, 0.5 * spanOf(by)), stepAt(by), false);
  if (at === null) return null;
  const held = read(trace, at, by);
  const step = 0.1 * spanOf(by);
  const bend = (slopeHere(trace, at + step, by) - slopeHere(trace, at - step, by)) / (2 * step);
  if (!held || !(bend < 0)) return null;
  return {
    at,
    value: weighed(trace.samples, held.value),
    sd: Math.sqrt(varianceOf(held.value.weights, trace.covariance)),
    sdAt: Math.sqrt(varianceOf(held.slope.weights, trace.covariance)) / -bend,
  };
}

/** Top of the trace near a sample. */
export function finePeak(trace: Trace, near: number, widest: number, only?: Smoother): Fine | null {
  if (only !== undefined) return fixed(topAt(trace, near, only), only);
  return steadiest(trace, (by) => topAt(trace, near, by), ['value', 'slope'], widest);
}

function crossingAt(trace: Trace, near: number, level: number, up: boolean, by: Smoother): One | null {
  const at = root((x) => potentialAt(trace, x, by) - level, near, Math.max(2, spanOf(by)), stepAt(by), up);
  if (at === null) return null;
  const held = read(trace, at, by);
  if (!held) return null;
  const slope = weighed(trace.samples, held.slope);
  if (!(up ? slope > 0 : slope < 0)) return null;
  const sd = Math.sqrt(varianceOf(held.value.weights, trace.covariance));
  // The value handed on is the slope there: an error of the level moves the place by level/slope.
  return { at, value: slope, sd, sdAt: sd / Math.abs(slope) };
}

/** Where the trace passes a level upwards or downwards; `value` is its slope there, per sample. */
export function fineCrossing(
  trace: Trace,
  near: number,
  level: number,
  up: boolean,
  widest: number,
  only?: Smoother,
): Fine | null {
  if (only !== undefined) return fixed(crossingAt(trace, near, level, up, only), only);
  return steadiest(trace, (by) => crossingAt(trace, near, level, up, by), ['value'], widest);
}

function steepestAt(trace: Trace, near: number, rises: boolean, by: Smoother): One | null {
  const sign = rises ? 1 : -1;
  const step = stepAt(by);
  let at = near;
  let best = sign * slopeHere(trace, near, by);
  if (!Number.isFinite(best)) return null;
  // Uphill from the sample that was steepest, then the vertex of a parabola.
  for (let k = 0; k < 40; k++) {
    const [l, r] = [sign * slopeHere(trace, at - step, by), sign * slopeHere(trace, at + step, by)];
    if (l > best && l >= r) [at, best] = [at - step, l];
    else if (r > best) [at, best] = [at + step, r];
    else {
      const bend = l - 2 * best + r;
      if (bend < 0) at += (step * 0.5 * (l - r)) / bend;
      break;
    }
  }
  const held = read(trace, at, by);
  if (!held) return null;
  const sd = Math.sqrt(varianceOf(held.slope.weights, trace.covariance));
  return { at, value: weighed(trace.samples, held.slope), sd, sdAt: 0 };
}

/** Steepest rise or fall near a sample, per sample. */
export function fineSlope(trace: Trace, near: number, rises: boolean, widest: number, only?: Smoother): Fine | null {
  if (only !== undefined) return fixed(steepestAt(trace, near, rises, only), only);
  return steadiest(trace, (by) => steepestAt(trace, near, rises, by), ['slope'], widest);
}

/** Widest window of the local cubic for a minimum, samples on either side, and the windows that are tried. */
const widestMinimum = 330;
const forMinimum: Smoother[] = Array.from({ length: 9 }, (_, k) => ({ half: 3 * 1.8 ** k }));

function bottomAt(trace: Trace, near: number, by: Smoother): One | null {
  const step = spanOf(by) / 4;
  let [at, lowest] = [near, Number.POSITIVE_INFINITY];
  for (let k = -4; k <= 4; k++) {
    const value = potentialAt(trace, near + k * step, by);
    if (value < lowest) [at, lowest] = [near + k * step, value];
  }
  const [l, r] = [potentialAt(trace, at - step, by), potentialAt(trace, at + step, by)];
  const bend = l - 2 * lowest + r;
  const shift = bend > 0 ? (0.5 * (l - r)) / bend : 0;
  if (Math.abs(shift) <= 1) at += shift * step;
  const held = read(trace, at, by);
  if (!held) return null;
  return {
    at,
    value: weighed(trace.samples, held.value),
    sd: Math.sqrt(varianceOf(held.value.weights, trace.covariance)),
    sdAt: 0,
  };
}

/** Lowest potential near a sample. @param widest samples on either side that may be taken in */
export const fineMinimum = (trace: Trace, near: number, widest: number): Fine | null =>
  steadiest(trace, (by) => bottomAt(trace, near, by), ['value'], Math.min(widest, widestMinimum), forMinimum);
