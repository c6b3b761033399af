/** What the page of cells needs for finding and sorting, in columns; written as a script, since a folder has no server. */
import { type Almanac, standings } from './almanac.ts';
import { facetsOf, factColumns, numberColumns } from './cell-columns.ts';
import { checkName } from './checks.ts';
import { factText } from './words.ts';

/** Raise on any change that an old script could misread. */
export const cellsDataContract = 1;

export interface CellsData {
  contract: number;
  ids: string[];
  /** Subject of each cell, '' where it is not stated. */
  subjects: string[];
  /** Facts with labels, in one line, for each cell. */
  facts: string[];
  /** Titles and text of the notes that mention each cell. */
  notes: string[];
  /** Values of each facet for each cell. */
  facets: Record<string, string[][]>;
  /** Values of each sortable column for each cell. */
  columns: Record<string, (string | number | null)[]>;
}

export function cellsData({ cells, noteById }: Almanac): CellsData {
  return {
    contract: cellsDataContract,
    ids: cells.map((cell) => cell.id),
    subjects: cells.map((cell) => cell.subject ?? ''),
    facts: cells.map((cell) =>
      [
        ...Object.entries(cell.facts)
          .filter(([key]) => key !== 'cell')
          .map(([key, value]) => factText(key, value)),
        ...[cell.class, cell.rig, cell.person].flatMap((named) => (named ? [named.label] : [])),
        ...cell.conditions,
        cell.reason,
      ].join(' · '),
    ),
    notes: cells.map((cell) =>
      cell.notes.map((id) => `${noteById.get(id)?.title ?? ''} ${noteById.get(id)?.text ?? ''}`).join(' · '),
    ),
    facets: Object.fromEntries(
      facetsOf(cells, standings, checkName).map((facet) => [facet.id, cells.map(facet.valuesOf)]),
    ),
    columns: Object.fromEntries(
      [
        { id: 'cell', value: (cell: { id: string }) => cell.id },
        { id: 'standing', value: (cell: { standing: string }) => standings.indexOf(cell.standing as never) },
        ...factColumns,
        ...numberColumns,
      ].map((column) => [column.id, cells.map((cell) => column.value(cell))]),
    ),
  };
}
