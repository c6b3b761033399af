/** What the front page counts. */
import type { CheckEntry } from '../pipeline/judge/types.ts';
import type { FileRow } from '../pipeline/ledger/types.ts';
import { type CellSummary, groupBy, type Sizes, sizesOf, standings } from './almanac.ts';

export interface CheckCount {
  check: CheckEntry;
  sizes: Sizes;
}

/** Checks with a cell outside, those with the most cells first. */
export function outsideByCheck(cells: readonly CellSummary[], checks: readonly CheckEntry[]): CheckCount[] {
  return checks
    .map((check) => ({ check, sizes: sizesOf(cells.filter((cell) => cell.outside.includes(check.id))) }))
    .filter(({ sizes }) => sizes.cells > 0)
    .sort((a, b) => b.sizes.cells - a.sizes.cells);
}

/** Counts by standing, in the order of `standings`, those without cells included. */
export const byStanding = (cells: readonly CellSummary[]) =>
  standings.map((standing) => ({ standing, sizes: sizesOf(cells.filter((cell) => cell.standing === standing)) }));

export interface Week {
  /** Its Monday, ISO. */
  monday: string;
  cells: CellSummary[];
}

/** Weeks with recordings, newest first; cells by id. */
export const weeksOf = (cells: readonly CellSummary[]): Week[] =>
  groupBy(cells, (cell) => cell.week)
    .map(([monday, members]) => ({ monday, cells: members }))
    .reverse();

export const countFiles = (files: readonly FileRow[]) => ({
  read: files.filter((file) => file.state === 'read').length,
  unread: files.filter((file) => file.state === 'unread').length,
  other: files.filter((file) => file.state === 'other').length,
});

/** Codes of a named fact among cells, each once, in order. */
export function codesOf(cells: readonly CellSummary[], key: 'rig' | 'person' | 'class'): string[] {
  return [...new Set(cells.flatMap((cell) => (cell[key] ? [cell[key].id] : [])))].sort();
}
