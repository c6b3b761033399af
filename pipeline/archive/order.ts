/** The order of a cell's sweeps: by start time, then path, then column. */
import type { FileDescription, SweepEntry } from '../formats/types.ts';
import { clockOf, clockSeconds, daySeconds } from './clock.ts';
import type { CellSweepRef, Statement } from './types.ts';
import { byText } from './walk.ts';

export interface Ordered {
  ref: CellSweepRef;
  /** Wall clock in s since 1970-01-01 (or since midnight where no date is known), null where unknown. */
  clock_s: number | null;
}

export interface Startable {
  path: string;
  description: FileDescription | null;
  statements: readonly Statement[];
  sweeps: readonly { entry: SweepEntry; column: number }[];
}

interface Start {
  day_s: number | null;
  time_s: number | null;
  /** Whether the time is this file's alone, and not one that a folder or table states for many. */
  own: boolean;
}

/**
 * When a file's session began: what its sidecar says, else its own clock, else what folders or tables say (those speak
 * for many files, so they come last here).
 */
export function startOf(part: Startable, sheet: readonly Statement[], timezone: string | null): Start {
  const own = clockOf(part.description?.session_start ?? null, timezone);
  const stated = (key: string, sidecar: boolean): string | undefined => {
    const found = [...part.statements, ...sheet].findLast(
      (one) => one.key === key && (one.origin.level === 'sidecar') === sidecar,
    );
    return found === undefined ? undefined : String(found.value);
  };
  const date = stated('date', true) ?? own?.date ?? stated('date', false);
  const ofFile = stated('time', true) ?? own?.time ?? null;
  const time = ofFile ?? stated('time', false);
  return {
    day_s: date === undefined ? null : daySeconds(date),
    time_s: time === undefined ? null : clockSeconds(time),
    own: ofFile !== null,
  };
}

/**
 * Sorts the parts of one cell and their sweeps. Times are compared across files only where every file has one; else
 * files go by path. Sweeps of a file go by their start where each has one, else in the file's own order.
 */
export function orderSweeps<Part extends Startable>(
  parts: readonly Part[],
  sheet: readonly Statement[],
  timezone: string | null,
): { parts: Part[]; sweeps: Ordered[] } {
  const starts = new Map(parts.map((part) => [part, startOf(part, sheet, timezone)]));
  const one = new Set(parts.map((part) => part.path)).size === 1;
  const known = parts.every((part) => starts.get(part)!.time_s !== null && (one || starts.get(part)!.own));
  const days = new Set(parts.map((part) => starts.get(part)!.day_s !== null));
  const comparable = known && days.size === 1;
  const keyed = parts.flatMap((part) => {
    const start = starts.get(part)!;
    const base = comparable ? (start.day_s ?? 0) + start.time_s! : 0;
    const timed = part.sweeps.every(({ entry }) => entry.start_s !== null);
    return part.sweeps.map(({ entry, column }) => ({
      part,
      column,
      at: comparable || one ? base + (timed ? entry.start_s! : 0) : 0,
      within: timed ? entry.start_s! : 0,
      clock_s: comparable && (timed || part.sweeps.length === 1) ? base + (entry.start_s ?? 0) : null,
      ref: {
        path: part.path,
        key: entry.key,
        series: entry.series,
        source_sweep: entry.source_sweep,
        start_s: entry.start_s,
      },
    }));
  });
  keyed.sort((a, b) => a.at - b.at || byText(a.part.path, b.part.path) || a.within - b.within || a.column - b.column);
  const first = (part: Part): number => {
    const index = keyed.findIndex((sweep) => sweep.part === part);
    return index < 0 ? Number.POSITIVE_INFINITY : index;
  };
  const place = new Map(parts.map((part) => [part, first(part)]));
  const ordered = [...parts].sort((a, b) => {
    const [left, right] = [place.get(a)!, place.get(b)!];
    return left === right ? byText(a.path, b.path) : left - right;
  });
  return { parts: ordered, sweeps: keyed.map(({ ref, clock_s }) => ({ ref, clock_s })) };
}
