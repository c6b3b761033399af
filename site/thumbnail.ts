/** A cell's small trace: its first spike at rheobase, or its largest response where it has no spike. */
import type { SweepRow } from '../pipeline/ledger/types.ts';
import { simplified } from './charts/reduce.ts';

export interface Thumbnail {
  kind: 'spike' | 'trace';
  /** Path data in the box of `thumbnailBox`. */
  path: string;
}

/** Every thumbnail has the same potentials from top to bottom, so that they can be compared. */
export const thumbnailBox = { width: 88, height: 32, topMv: 60, bottomMv: -100 } as const;

const columns = 44;

const yOf = (mv: number): number => {
  const { height, topMv, bottomMv } = thumbnailBox;
  const clamped = Math.min(topMv, Math.max(bottomMv, mv));
  return ((topMv - clamped) / (topMv - bottomMv)) * height;
};

/** Where 0 mV lies in the box. */
export const zeroLineY = yOf(0);

/** @param reference sweep and spike that stand for the cell; null where it never fired */
export function thumbnailOf(
  reference: { sweep: number; spike: number } | null,
  sweeps: readonly SweepRow[],
): Thumbnail | null {
  const excerpt = sweeps.find((sweep) => sweep.sweep === reference?.sweep)?.first_spike;
  if (excerpt && excerpt.mv.length > 1) return { kind: 'spike', path: spikePath(excerpt.mv) };
  const withVoltage = sweeps.filter((sweep) => sweep.clamp === 'current' && sweep.voltage_envelope !== null);
  const largest = withVoltage.reduce<SweepRow | null>(
    (best, sweep) => (best === null || spanOf(sweep) > spanOf(best) ? sweep : best),
    null,
  );
  const envelope = largest?.voltage_envelope;
  return envelope && envelope.low.length > 1 ? { kind: 'trace', path: pathOf(envelope.low, envelope.high) } : null;
}

function spanOf(sweep: SweepRow): number {
  const { low, high } = sweep.voltage_envelope!;
  return Math.max(...high) - Math.min(...low);
}

/** Every sample of the excerpt, less those that a tenth of a pixel would not show. */
function spikePath(mv: readonly number[]): string {
  const points = mv.flatMap((value, i): [number, number][] =>
    Number.isFinite(value) ? [[(i / (mv.length - 1)) * thumbnailBox.width, yOf(value)]] : [],
  );
  return lineOf(simplified(points, 0.15));
}

const lineOf = (points: readonly (readonly [number, number])[]): string =>
  points.length > 1 ? `M${points.map(([x, y]) => `${short(x)},${short(y)}`).join('L')}` : '';

/** Lowest and highest in each column, one after the other, so that a narrow spike keeps its height. */
function pathOf(low: readonly number[], high: readonly number[]): string {
  const points: [number, number][] = [];
  const n = Math.min(columns, low.length);
  for (let column = 0; column < n; column++) {
    const from = Math.floor((column * low.length) / n);
    const to = Math.max(from + 1, Math.floor(((column + 1) * low.length) / n));
    const bottom = extreme(low, from, to, Math.min);
    const top = extreme(high, from, to, Math.max);
    if (bottom === null || top === null) continue;
    const x = ((column + 0.5) / n) * thumbnailBox.width;
    const rising = low[from]! <= low[to - 1]!;
    const pair = Math.abs(yOf(top) - yOf(bottom)) < 0.6 ? [(top + bottom) / 2] : rising ? [bottom, top] : [top, bottom];
    for (const mv of pair) points.push([x, yOf(mv)]);
  }
  return lineOf(points);
}

function extreme(list: readonly number[], from: number, to: number, better: (a: number, b: number) => number) {
  let best: number | null = null;
  for (let i = from; i < to; i++) {
    const value = list[i]!;
    if (Number.isFinite(value)) best = best === null ? value : better(best, value);
  }
  return best;
}

const short = (value: number): string => String(Math.round(value * 10) / 10);
