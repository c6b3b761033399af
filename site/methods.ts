/** What the page of methods says about this archive: limits, classes and solutions in force. */
import { type ClassInfo, classRanges, type ShippedClass } from '../pipeline/judge/class-ranges.ts';
import type { CheckEntry, Ground } from '../pipeline/judge/types.ts';
import { type Level, type Quantity, quantities } from '../pipeline/measure/quantities.ts';
import { type Almanac, type CellSummary, groupBy, type Sizes, type Solutions, sizesOf } from './almanac.ts';

export const levelTitles: Record<Level, string> = { spike: 'Of a spike', sweep: 'Of a sweep', cell: 'Of a cell' };

/** Quantities under the first level they are measured at, in the registry's order. */
export const quantitiesByLevel = (): [Level, Quantity[]][] =>
  (['spike', 'sweep', 'cell'] as const).map((level) => [
    level,
    quantities.filter((entry) => entry.levels[0] === level),
  ]);

export const grounds: readonly Ground[] = ['physics', 'conditions', 'class', 'lab', 'policy'];

export const checksByGround = (checks: readonly CheckEntry[]): [Ground, CheckEntry[]][] =>
  grounds.flatMap((ground) => {
    const members = checks.filter((check) => check.ground === ground);
    return members.length === 0 ? [] : [[ground, members] satisfies [Ground, CheckEntry[]]];
  });

export interface ClassInForce {
  id: ShippedClass;
  info: ClassInfo;
  /** The archive's own classes that take these ranges, as labels. */
  takenBy: string[];
  /** Whether a cell of this archive is judged by it. */
  used: boolean;
}

/** Shipped classes, those that judge a cell of this archive first. */
export function classesInForce(almanac: Almanac): ClassInForce[] {
  const { classes } = almanac.archive.settings;
  const judged = new Set(almanac.cells.map((cell) => cell.like));
  const all = Object.entries(classRanges).map(([id, info]) => ({
    id: id as ShippedClass,
    info,
    takenBy: Object.values(classes)
      .filter((own) => own.like === id)
      .map((own) => own.label),
    used: judged.has(id),
  }));
  return [...all.filter((one) => one.used), ...all.filter((one) => !one.used)];
}

/** Cells of this archive whose potentials follow from the same solutions at the same temperature. */
export interface SolutionPair {
  solutions: Solutions;
  sizes: Sizes;
}

/** Distinct pairs over the first conditions of all cells, in order of their names and temperatures. */
export function solutionPairs(cells: readonly CellSummary[]): SolutionPair[] {
  return groupBy(cells, (cell) => (cell.solutions === null ? null : JSON.stringify(cell.solutions))).map(
    ([, members]) => ({ solutions: members[0]!.solutions!, sizes: sizesOf(members) }),
  );
}
