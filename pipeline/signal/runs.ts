/** What a digitizer leaves in the samples: its step, and stretches stuck at its limits. */
import { countFinite, sortedFinite } from './statistics.ts';

/**
 * Smallest step between recorded values: the largest number that all differences between distinct values are whole
 * multiples of, within rounding.
 * @returns null where fewer than three distinct values occur, or where the values lie on no common grid
 */
export function quantum(samples: Float64Array): number | null {
  const count = countFinite(samples);
  if (count < 3) return null;
  const sorted = sortedFinite(onceEach(samples));
  const extent = sorted.at(-1)! - sorted[0]!;
  if (!(extent > 0)) return null;
  // Differences below this are rounding of one and the same value (decimal text, 32-bit floats, unit conversion).
  const largest = Math.max(Math.abs(sorted[0]!), Math.abs(sorted.at(-1)!));
  const rounding = Math.max(largest * 4e-7, extent * 1e-7);
  const distinct: number[] = [sorted[0]!];
  let latest = sorted[0]!;
  for (let i = 1; i < sorted.length; i++)
    if (sorted[i]! - latest > rounding) {
      latest = sorted[i]!;
      distinct.push(latest);
    }
  if (distinct.length < 3) return null;
  const gaps = distinct.slice(1).map((value, i) => value - distinct[i]!);
  const smallest = gaps.reduce((least, gap) => Math.min(least, gap), Number.POSITIVE_INFINITY);
  // The smallest gap carries two roundings; averaging all gaps of about its size sharpens it, and the larger the
  // multiples that then still fit, the sharper it becomes.
  let step = average(gaps.filter((gap) => gap < 1.5 * smallest));
  const ascending = gaps.toSorted((a, b) => a - b);
  let misfits = 0;
  let weightedGap = 0;
  let multiples = 0;
  for (const gap of ascending) {
    const multiple = Math.max(1, Math.round(gap / step));
    const error = Math.abs(gap - multiple * step);
    if (error > 0.2 * step + 2 * rounding) misfits++;
    else {
      weightedGap += gap;
      multiples += multiple;
      if (multiples > 0) step = weightedGap / multiples;
    }
  }
  const gridLike = misfits <= 0.01 * gaps.length && distinct.length < 0.98 * count && step > 2 * rounding;
  return gridLike ? step : null;
}

/**
 * Every value once, in order of appearance: a digitizer's thousands of samples are hundreds of values, which sort much
 * faster. The samples themselves where more than a quarter of them differ.
 */
function onceEach(samples: Float64Array): Float64Array {
  const n = samples.length;
  const most = n >> 2;
  const kept = new Float64Array(most + 1);
  const bits = new Uint32Array(kept.buffer);
  const own = new Uint32Array(2);
  const value = new Float64Array(own.buffer);
  // A table of places in `kept` (0: free), probed one after another.
  const size = 2 ** Math.ceil(Math.log2(2 * most + 2));
  const table = new Uint32Array(size);
  let count = 0;
  for (let i = 0; i < n; i++) {
    value[0] = samples[i]!;
    const [low, high] = [own[0]!, own[1]!];
    let place = (Math.imul(low ^ Math.imul(high, 0x85ebca6b), 0x9e3779b1) >>> 7) & (size - 1);
    for (;;) {
      const at = table[place]!;
      if (at === 0) {
        if (count === most) return samples;
        kept[count++] = samples[i]!;
        table[place] = count;
        break;
      }
      if (bits[2 * at - 2] === low && bits[2 * at - 1] === high) break;
      place = (place + 1) & (size - 1);
    }
  }
  return kept.subarray(0, count);
}

const average = (values: number[]): number => values.reduce((sum, value) => sum + value, 0) / values.length;

export interface Run {
  /** Half-open index range. */
  from: number;
  to: number;
  at: 'top' | 'bottom';
}

/**
 * Stretches stuck at the highest or lowest value of the trace: runs of at least `shortest` equal samples at an
 * extreme that the trace enters or leaves by a jump. A smooth top that a coarse digitizer renders as equal samples is
 * none: it is entered and left by a step or two of the digitizer. A trace of one single value has no runs.
 */
export function clippedRuns(samples: Float64Array, shortest = 3): Run[] {
  let top = Number.NEGATIVE_INFINITY;
  let bottom = Number.POSITIVE_INFINITY;
  for (const value of samples) {
    if (value > top) top = value;
    if (value < bottom) bottom = value;
  }
  if (!(top > bottom)) return [];
  const candidates = [...runsAt(samples, top, 'top', shortest), ...runsAt(samples, bottom, 'bottom', shortest)];
  if (candidates.length === 0) return [];
  const step = quantum(samples) ?? (top - bottom) * 1e-6;
  const jump = (run: Run): number => {
    const level = samples[run.from]!;
    const before = samples[run.from - 1] ?? Number.NaN;
    const after = samples[run.to] ?? Number.NaN;
    return Math.max(
      Number.isFinite(before) ? Math.abs(before - level) : 0,
      Number.isFinite(after) ? Math.abs(after - level) : 0,
    );
  };
  const jumping = new Set(
    (['top', 'bottom'] as const).filter((at) => candidates.some((run) => run.at === at && jump(run) > 2.5 * step)),
  );
  return candidates.filter((run) => jumping.has(run.at)).sort((a, b) => a.from - b.from);
}

function runsAt(samples: Float64Array, level: number, at: Run['at'], shortest: number): Run[] {
  const found: Run[] = [];
  let start = -1;
  for (let i = 0; i <= samples.length; i++) {
    const held = i < samples.length && samples[i] === level;
    if (held && start < 0) start = i;
    if (!held && start >= 0) {
      if (i - start >= shortest) found.push({ from: start, to: i, at });
      start = -1;
    }
  }
  return found;
}
