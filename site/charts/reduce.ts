/** Fewer points for the same picture: nothing narrow is lost, nothing flat is drawn twice. */
import type { Envelope } from '../../pipeline/measure/types.ts';

/** The envelope with its unreadable columns left open: NaN, so that no line is drawn across them. */
export function withGaps(envelope: Envelope): Envelope {
  if (!envelope.gaps || envelope.gaps.length === 0) return envelope;
  const low = [...envelope.low];
  const high = [...envelope.high];
  for (const [first, end] of envelope.gaps)
    for (let column = first; column < end; column++) {
      low[column] = Number.NaN;
      high[column] = Number.NaN;
    }
  return { ...envelope, low, high };
}

/** Joins neighbouring columns until there are at most `columns`; each keeps the lowest and highest of its part. */
export function coarser(envelope: Envelope, columns: number): Envelope {
  const n = envelope.low.length;
  if (n <= columns) return envelope;
  const low: number[] = [];
  const high: number[] = [];
  for (let column = 0; column < columns; column++) {
    const from = Math.floor((column * n) / columns);
    const to = Math.max(from + 1, Math.floor(((column + 1) * n) / columns));
    let least = Number.POSITIVE_INFINITY;
    let most = Number.NEGATIVE_INFINITY;
    for (let i = from; i < to; i++) {
      least = Math.min(least, envelope.low[i] ?? Number.POSITIVE_INFINITY);
      most = Math.max(most, envelope.high[i] ?? Number.NEGATIVE_INFINITY);
    }
    low.push(least <= most ? least : Number.NaN);
    high.push(least <= most ? most : Number.NaN);
  }
  return { start_s: envelope.start_s, end_s: envelope.end_s, low, high };
}

/**
 * A line through an envelope: one point a column where it is narrower than `narrow`, else lowest and highest in the
 * order that continues the line. NaN marks gaps.
 */
export function* envelopeLine(envelope: Envelope, narrow: number): Generator<[number, number]> {
  const n = envelope.low.length;
  const width = (envelope.end_s - envelope.start_s) / n;
  let last = Number.NaN;
  for (let i = 0; i < n; i++) {
    const t = envelope.start_s + (i + 0.5) * width;
    const low = envelope.low[i] ?? Number.NaN;
    const high = envelope.high[i] ?? Number.NaN;
    if (!(high - low > narrow)) {
      last = (low + high) / 2;
      yield [t, last];
      continue;
    }
    const upward = !(Math.abs(last - low) > Math.abs(last - high));
    // A quarter of a column apart from its middle, so that a steady slope is drawn as one and not as a stair.
    yield [t - width / 4, upward ? low : high];
    last = upward ? high : low;
    yield [t + width / 4, last];
  }
}

/** Drops points that lie within `tolerance` of the line through their neighbours (Douglas–Peucker, in plot units). */
export function simplified(points: readonly (readonly [number, number])[], tolerance: number): [number, number][] {
  if (points.length < 3) return points.map(([x, y]) => [x, y]);
  const keep = new Uint8Array(points.length);
  keep[0] = 1;
  keep[points.length - 1] = 1;
  const open: [number, number][] = [[0, points.length - 1]];
  while (open.length > 0) {
    const [from, to] = open.pop()!;
    const farthest = farthestFrom(points, from, to);
    if (farthest.distance <= tolerance) continue;
    keep[farthest.index] = 1;
    open.push([from, farthest.index], [farthest.index, to]);
  }
  return points.filter((_, index) => keep[index] === 1).map(([x, y]) => [x, y]);
}

function farthestFrom(points: readonly (readonly [number, number])[], from: number, to: number) {
  const [ax, ay] = points[from]!;
  const [bx, by] = points[to]!;
  const length = Math.hypot(bx - ax, by - ay) || 1;
  let index = from;
  let distance = 0;
  for (let i = from + 1; i < to; i++) {
    const [x, y] = points[i]!;
    const off = Math.abs((bx - ax) * (ay - y) - (ax - x) * (by - ay)) / length;
    if (off > distance) {
      distance = off;
      index = i;
    }
  }
  return { index, distance };
}
