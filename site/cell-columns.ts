/** Columns of the table of cells, and the choices above it. One list for the table, its sorting and its data script. */
import { absenceSentences } from '../pipeline/measure/absence.ts';
import { quantity } from '../pipeline/measure/quantities.ts';
import type { CellSummary, Named } from './almanac.ts';
import { printed } from './format.ts';
import { factLabel } from './words.ts';

export interface CellColumn {
  id: string;
  label: string;
  unit: string;
  kind: 'text' | 'number';
  /** What is sorted by; null stands last either way. */
  value: (cell: CellSummary) => string | number | null;
  /** What is printed; null where there is nothing to print. */
  text: (cell: CellSummary) => string | null;
  /** Why nothing is printed. */
  absence: (cell: CellSummary) => string;
  /** What a code stands for. */
  title?: (cell: CellSummary) => string | null;
}

const shownQuantities = [
  'resting_potential_mv',
  'input_resistance_mohm',
  'rheobase_pa',
  'threshold_mv',
  'spike_height_mv',
  'half_width_ms',
  'access_resistance_mohm',
];

const quantityColumn = (id: string): CellColumn => {
  const { label, unit } = quantity(id);
  return {
    id,
    label,
    unit,
    kind: 'number',
    value: (cell) => cell.readings[id]?.value ?? null,
    text: (cell) => {
      const value = cell.readings[id]?.value ?? null;
      return value === null ? null : printed(id, value);
    },
    absence: (cell) => absenceOf(cell, id),
  };
};

/** The reason why a quantity of a cell is missing, in words. */
export function absenceOf(cell: CellSummary, id: string): string {
  if (cell.standing === 'unread') return 'the cell could not be read';
  const reading = cell.readings[id];
  if (!reading?.why) return 'does not apply to this recording';
  const missing = reading.missing?.map(factLabel).join(', ');
  return missing ? `${absenceSentences[reading.why]}: ${missing}` : absenceSentences[reading.why];
}

const textColumn = (id: string, label: string, textOf: (cell: CellSummary) => string | null): CellColumn => ({
  id,
  label,
  unit: '',
  kind: 'text',
  value: textOf,
  text: textOf,
  absence: () => 'not stated',
});

const countColumn = (id: string, label: string, countOf: (cell: CellSummary) => number): CellColumn => ({
  id,
  label,
  unit: '',
  kind: 'number',
  value: countOf,
  text: (cell) => String(countOf(cell)),
  absence: () => '',
});

const labelled = (key: 'class') => textColumn(key, factLabel(key), (cell) => cell[key]?.label ?? null);

/** Codes, as the lab says them; what they stand for is the title. */
const coded = (key: 'rig' | 'person'): CellColumn => ({
  ...textColumn(key, factLabel(key), (cell) => cell[key]?.id ?? null),
  title: (cell) => cell[key]?.label ?? null,
});

/** Facts between the standing and the numbers. */
export const factColumns: readonly CellColumn[] = [
  labelled('class'),
  textColumn('date', factLabel('date'), (cell) => cell.date),
  coded('rig'),
  coded('person'),
  textColumn('subject', factLabel('subject'), (cell) => cell.subject),
];

export const numberColumns: readonly CellColumn[] = [
  countColumn('spikes', quantity('spikes').label, (cell) => cell.spikes),
  ...shownQuantities.map(quantityColumn),
];

export interface Choice {
  value: string;
  label: string;
  cells: number;
}

export interface Facet {
  id: string;
  label: string;
  /** Values a cell has: none, one or several. */
  valuesOf: (cell: CellSummary) => string[];
  choices: Choice[];
}

/** Stands for cells that state nothing; no id is empty. */
export const notStated = '';

interface FacetDraft {
  id: string;
  label: string;
  valuesOf: (cell: CellSummary) => string[];
  labelOf: (value: string) => string;
  order: 'given' | 'label' | 'newest' | 'count';
  given?: readonly string[];
}

const one = (value: string | null): string[] => [value ?? notStated];

/** Choices with a cell at least, counted over all cells. */
export function facetsOf(
  cells: readonly CellSummary[],
  standingOrder: readonly string[],
  checkLabel: (id: string) => string,
): Facet[] {
  const named = (key: 'class' | 'rig' | 'person'): FacetDraft => {
    const labels = new Map(cells.flatMap((cell) => (cell[key] ? [[cell[key].id, cell[key] satisfies Named]] : [])));
    return {
      id: key,
      label: factLabel(key),
      valuesOf: (cell) => one(cell[key]?.id ?? null),
      labelOf: (value) => labels.get(value)?.label ?? value,
      order: 'label',
    };
  };
  const drafts: FacetDraft[] = [
    {
      id: 'standing',
      label: 'Standing',
      valuesOf: (cell) => [cell.standing],
      labelOf: (value) => value,
      order: 'given',
      given: standingOrder,
    },
    named('class'),
    named('rig'),
    named('person'),
    {
      id: 'week',
      label: 'Week',
      valuesOf: (cell) => one(cell.week),
      labelOf: (value) => value,
      order: 'newest',
    },
    {
      id: 'outside',
      label: 'Outside',
      valuesOf: (cell) => cell.outside,
      labelOf: checkLabel,
      order: 'count',
    },
  ];
  return drafts.map((draft) => facetOf(cells, draft)).filter((facet) => facet.choices.length > 0);
}

function facetOf(cells: readonly CellSummary[], draft: FacetDraft): Facet {
  const counts = new Map<string, number>();
  for (const cell of cells) for (const value of draft.valuesOf(cell)) counts.set(value, (counts.get(value) ?? 0) + 1);
  const choices = [...counts].map(([value, n]) => ({
    value,
    label: value === notStated ? 'not stated' : draft.labelOf(value),
    cells: n,
  }));
  const given = (value: string): number => draft.given?.indexOf(value) ?? 0;
  const plain = (a: string, b: string): number => (a < b ? -1 : a > b ? 1 : 0);
  choices.sort((a, b) => {
    if ((a.value === notStated) !== (b.value === notStated)) return a.value === notStated ? 1 : -1;
    if (draft.order === 'given') return given(a.value) - given(b.value);
    if (draft.order === 'newest') return plain(b.value, a.value);
    if (draft.order === 'count') return b.cells - a.cells || plain(a.label, b.label);
    return plain(a.label, b.label);
  });
  return { id: draft.id, label: draft.label, valuesOf: draft.valuesOf, choices };
}
