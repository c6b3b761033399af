/** What the page of methods says about this archive: limits, classes and solutions in force. */

import { judgingConstants, physicalConstants } from '../pipeline/judge/checks.ts';
import { type ClassInfo, classRanges, type ShippedClass } from '../pipeline/judge/class-ranges.ts';
import type { CheckEntry, Ground } from '../pipeline/judge/types.ts';
import { type Level, type Quantity, quantities } from '../pipeline/measure/quantities.ts';
import { type Almanac, type CellSummary, groupBy, type Sizes, type Solutions, sizesOf } from './almanac.ts';

const { avogadroPerMol, boltzmannJPerK, elementaryChargeC, faradayCPerMol, gasConstantJPerMolK, zeroCelsiusK } =
  physicalConstants;

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

/** Checks that hold a quantity against something, in the registry's order. */
export const checksOf = (checks: readonly CheckEntry[], quantityId: string): CheckEntry[] =>
  checks.filter((check) => check.quantity === quantityId);

/** '1.602176634 × 10⁻¹⁹' for numbers far from one, else as it stands. */
export function scientific(value: number): string {
  const size = value === 0 ? 0 : Math.floor(Math.log10(Math.abs(value)));
  if (size > -4 && size < 7) return String(Number(value.toPrecision(10))).replace('-', '−');
  const raised = [...String(size)].map((digit) => '⁻⁰¹²³⁴⁵⁶⁷⁸⁹'['-0123456789'.indexOf(digit)]).join('');
  return `${Number((value / 10 ** size).toPrecision(10))} × 10${raised}`;
}

export interface Constant {
  label: string;
  value: string;
  unit: string;
  source: string;
}

const si = 'exact in the 2019 SI';

/** Constants of nature, and those that judging brings along. */
export const constants = (): Constant[] => [
  { label: 'Molar gas constant R', value: scientific(gasConstantJPerMolK), unit: 'J/(mol·K)', source: si },
  { label: 'Faraday constant F', value: scientific(faradayCPerMol), unit: 'C/mol', source: si },
  { label: 'Elementary charge e', value: scientific(elementaryChargeC), unit: 'C', source: si },
  { label: 'Boltzmann constant k', value: scientific(boltzmannJPerK), unit: 'J/K', source: si },
  { label: 'Avogadro constant N_A', value: scientific(avogadroPerMol), unit: '1/mol', source: si },
  { label: '0 °C', value: scientific(zeroCelsiusK), unit: 'K', source: 'definition of the degree Celsius' },
  ...judgingConstants.map(({ label, value, unit, source }) => ({ label, value: scientific(value), unit, source })),
];
