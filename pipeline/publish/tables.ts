/** The tables that other programs rely on. Columns come from the registries; rows from the ledger, cell by cell. */
import { closeSync, mkdirSync, openSync, writeFileSync, writeSync } from 'node:fs';
import path from 'node:path';
import { stringify } from 'csv-stringify/sync';
import { factKeys } from '../archive/fact-keys.ts';
import type { Finding } from '../judge/types.ts';
import type { CellRow, FileRow, LedgerReader, SweepRow } from '../ledger/types.ts';
import { type Level, type Quantity, quantitiesOf } from '../measure/quantities.ts';
import type { ConditionMeasure, PhaseName, Readings, Spike } from '../measure/types.ts';

export type Value = string | number | boolean | null | undefined;

export interface Column {
  name: string;
  /** What stands in it, one sentence. Quantities and facts take theirs from the registries. */
  description: string;
  type: 'string' | 'number' | 'integer' | 'boolean';
  unit?: string;
  ucum?: string;
}

export interface Table<Row> {
  name: string;
  title: string;
  columns: Column[];
  /** One value for each column. */
  values: (row: Row) => Value[];
}

const text = (name: string, description: string): Column => ({ name, description, type: 'string' });
const integer = (name: string, description: string): Column => ({ name, description, type: 'integer' });
const number = (name: string, description: string, unit?: string, ucum?: string): Column => ({
  name,
  description,
  type: 'number',
  ...(unit === undefined ? {} : { unit, ucum: ucum ?? unit }),
});

/** Quantities of a level that carry a 95 % half-width; each has a column `ID_u95` after all values. */
const uncertain = (level: Level): Quantity[] => quantitiesOf(level).filter((one) => one.uncertainty !== undefined);

const quantityColumns = (level: Level): Column[] => [
  ...quantitiesOf(level).map(
    ({ id, definition, unit, ucum, decimals }): Column => ({
      name: id,
      description: definition,
      type: decimals === 0 && unit === '' ? 'integer' : 'number',
      unit,
      ucum,
    }),
  ),
  ...uncertain(level).map(({ id, label, unit, ucum }) =>
    number(
      `${id}_u95`,
      `95 % half-width of ${id} (${label.toLowerCase()}): the truth lies within value ± this.`,
      unit,
      ucum,
    ),
  ),
];

const factColumns: Column[] = factKeys
  .filter((fact) => fact.key !== 'cell')
  .map((fact) => ({
    name: fact.key,
    description: fact.definition,
    type: fact.kind === 'number' ? 'number' : 'string',
  }));

const readingValues = (readings: Readings, level: 'sweep' | 'cell'): Value[] => [
  ...quantitiesOf(level).map(({ id }) => readings[id]?.value),
  ...uncertain(level).map(({ id }) => (readings[id]?.value == null ? null : readings[id].u95)),
];

export const filesTable: Table<FileRow> = {
  name: 'files',
  title: 'Every file met in the archive',
  columns: [
    text('path', 'Path inside the archive.'),
    integer('bytes', 'Size.'),
    text('sha256', 'SHA-256 of the bytes.'),
    text('format', 'What it was read as.'),
    text('state', 'read, unread (looks like a recording and could not be read) or other (no recording).'),
    text('reason', 'Why it is unread or no recording; remarks on a file that was read in part.'),
  ],
  values: (file) => [file.path, file.bytes, file.sha256, file.format, file.state, file.reason],
};

export const cellsTable: Table<CellRow> = {
  name: 'cells',
  title: 'One row a cell, under the condition that stands for it',
  columns: [
    text('cell', 'Id of the cell.'),
    text('standing', 'sound, caution, unsound or unread.'),
    text('reading', 'corrected: potentials have the junction potential removed; recorded: as in the file.'),
    number('ljp_applied_mv', 'Junction potential subtracted from the recorded potentials.', 'mV'),
    ...factColumns,
    ...quantityColumns('cell'),
  ],
  values: (cell) => [
    cell.cell,
    cell.judgement.standing,
    cell.reading,
    cell.ljp_applied_mv,
    ...factColumns.map(({ name }) => cell.facts[name]?.value),
    ...readingValues(cell.measure.conditions[0]?.readings ?? {}, 'cell'),
  ],
};

export interface ConditionRow {
  cell: CellRow;
  condition: ConditionMeasure;
}

export const conditionsTable: Table<ConditionRow> = {
  name: 'conditions',
  title: 'One row for each condition of each cell',
  columns: [
    text('cell', 'Id of the cell.'),
    text('condition', 'Label of the condition; the first of a cell stands for it in cells.csv.'),
    integer('sweeps', 'Number of sweeps recorded under it.'),
    ...quantityColumns('cell'),
  ],
  values: ({ cell, condition }) => [
    cell.cell,
    condition.condition,
    condition.sweeps.length,
    ...readingValues(condition.readings, 'cell'),
  ],
};

export const sweepsTable: Table<SweepRow> = {
  name: 'sweeps',
  title: 'One row a sweep',
  columns: [
    text('cell', 'Id of the cell.'),
    integer('sweep', 'Number within the cell, from 0, by time.'),
    integer('source_sweep', 'The file’s own number.'),
    text('file', 'Path inside the archive.'),
    text('series', 'Series or column inside the file.'),
    text('condition', 'Label of the condition.'),
    text('clamp', 'current or voltage.'),
    number('since_start_s', 'Time since the cell’s first sweep.', 's'),
    number('duration_s', 'Length.', 's'),
    text('stimulus_kind', 'step, ramp, pulse train, noise, none or unknown.'),
    text('stimulus_from', 'channel: read from a recorded channel; stated: from a statement; absent.'),
    number('stimulus_onset_s', 'Onset from the start of the sweep.', 's'),
    number('stimulus_end_s', 'End from the start of the sweep.', 's'),
    { ...text('depolarization_block', 'Whether firing stopped within a strong step.'), type: 'boolean' },
    ...quantityColumns('sweep'),
  ],
  values: (sweep) => [
    sweep.cell,
    sweep.sweep,
    sweep.source_sweep,
    sweep.file,
    sweep.series,
    sweep.condition,
    sweep.clamp,
    sweep.since_start_s,
    sweep.duration_s,
    sweep.stimulus.kind,
    sweep.stimulus.from,
    sweep.stimulus.onset_s,
    sweep.stimulus.end_s,
    sweep.depolarization_block,
    ...readingValues(sweep.readings, 'sweep'),
  ],
};

const phaseNames: PhaseName[] = ['depolarization', 'repolarization', 'afterhyperpolarization', 'recovery'];

export const spikesTable: Table<{ sweep: SweepRow; spike: Spike }> = {
  name: 'spikes',
  title: 'One row a spike',
  columns: [
    text('cell', 'Id of the cell.'),
    integer('sweep', 'Number of the sweep within the cell.'),
    integer('spike', 'Number of the spike within the sweep, from 0.'),
    text('condition', 'Label of the condition.'),
    ...quantityColumns('spike'),
    ...phaseNames.flatMap((name) => [
      number(`${name}_from_s`, `Start of the phase ${name} from the start of the sweep.`, 's'),
      number(`${name}_to_s`, `End of the phase ${name}.`, 's'),
      integer(`${name}_net_ionic_sign`, 'Sign of the mean net ionic current, outward positive; 0 not resolved.'),
    ]),
  ],
  values: ({ sweep, spike }) => [
    sweep.cell,
    sweep.sweep,
    spike.spike,
    sweep.condition,
    ...quantitiesOf('spike').map(({ id }) => spike.values[id]),
    ...uncertain('spike').map(({ id }) => (spike.values[id] == null ? null : spike.u95?.[id])),
    ...phaseNames.flatMap((name) => {
      const phase = spike.phases.find((one) => one.name === name);
      return [phase?.from_s, phase?.to_s, phase?.net_ionic_sign];
    }),
  ],
};

export const findingsTable: Table<{ cell: string; finding: Finding }> = {
  name: 'findings',
  title: 'Every outcome that is not within',
  columns: [
    text('cell', 'Id of the cell.'),
    integer('sweep', 'Number of the sweep; empty for the cell as a whole.'),
    text('check', 'Id of the check; see the methods page.'),
    text('outcome', 'near limit, outside or not measured.'),
    text('quantity', 'Id of the quantity.'),
    number('value', 'The number that was held against the limit, in the quantity’s unit.'),
    number('limit_low', 'Lower limit, in the quantity’s unit.'),
    number('limit_high', 'Upper limit, in the quantity’s unit.'),
    text('ground', 'physics, conditions, class, lab or policy.'),
    text('sentence', 'What it means.'),
    text('condition', 'Label of the condition.'),
    number('uncertainty', '95 % uncertainty of the comparison, in the quantity’s unit.'),
    number('margin', 'Distance to the nearest limit, negative beyond it.'),
    number('at_s', 'Where in the sweep to look.', 's'),
    number('value_u95', '95 % half-width of the number itself; empty where it is not known.'),
  ],
  values: ({ cell, finding }) => [
    cell,
    finding.sweep,
    finding.check,
    finding.outcome,
    finding.quantity,
    finding.value,
    finding.limit_low,
    finding.limit_high,
    finding.ground,
    finding.sentence,
    finding.condition,
    finding.uncertainty,
    finding.margin,
    finding.at_s,
    finding.value_u95,
  ],
};

export const explanationsTable: Table<{ cell: string; explanation: CellRow['judgement']['explanations'][number] }> = {
  name: 'explanations',
  title: 'Single slips that would clear findings',
  columns: [
    text('cell', 'Id of the cell.'),
    integer('rank', 'Order among the possibilities, from 1.'),
    text('slip', 'Id of the slip.'),
    text('parameter', 'Its size.'),
    integer('cleared', 'Findings that vanish under it.'),
    integer('introduced', 'Findings that appear under it.'),
    text('sentence', 'What it would mean and what to check.'),
  ],
  values: ({ cell, explanation }) => [
    cell,
    explanation.rank,
    explanation.slip,
    explanation.parameter,
    explanation.cleared,
    explanation.introduced,
    explanation.sentence,
  ],
};

export const tables = [
  filesTable,
  cellsTable,
  conditionsTable,
  sweepsTable,
  spikesTable,
  findingsTable,
  explanationsTable,
] as const;

/** Nine significant digits: more than any recorder resolves, and the same text on every machine. */
function printed(value: Value): string {
  if (value === null || value === undefined) return '';
  if (typeof value === 'number') return Number.isFinite(value) ? String(Number(value.toPrecision(9))) : '';
  return String(value);
}

const csv = (rows: Value[][]): string =>
  stringify(
    rows.map((row) => row.map(printed)),
    { record_delimiter: '\r\n' },
  );

/** A CSV file that is written row by row. */
function openTable<Row>(folder: string, table: Table<Row>): { add: (rows: Row[]) => void; close: () => void } {
  const handle = openSync(path.join(folder, `${table.name}.csv`), 'w');
  writeSync(handle, csv([table.columns.map((column) => column.name)]));
  return {
    add: (rows) => {
      if (rows.length > 0) writeSync(handle, csv(rows.map(table.values)));
    },
    close: () => closeSync(handle),
  };
}

/** Writes every table and the dictionary under `folder`, holding the sweeps of one cell at a time. */
export function writeTables(ledger: LedgerReader, folder: string): void {
  mkdirSync(folder, { recursive: true });
  const files = openTable(folder, filesTable);
  files.add(ledger.files());
  files.close();
  const open = {
    cells: openTable(folder, cellsTable),
    conditions: openTable(folder, conditionsTable),
    sweeps: openTable(folder, sweepsTable),
    spikes: openTable(folder, spikesTable),
    findings: openTable(folder, findingsTable),
    explanations: openTable(folder, explanationsTable),
  };
  for (const id of ledger.cellIds()) {
    const cell = ledger.cell(id);
    const sweeps = ledger.sweeps(id);
    open.cells.add([cell]);
    open.conditions.add(cell.measure.conditions.map((condition) => ({ cell, condition })));
    open.sweeps.add(sweeps);
    for (const sweep of sweeps) open.spikes.add(sweep.spikes.map((spike) => ({ sweep, spike })));
    open.findings.add(
      cell.judgement.findings
        .filter((finding) => finding.outcome !== 'within')
        .map((finding) => ({ cell: id, finding })),
    );
    open.explanations.add(cell.judgement.explanations.map((explanation) => ({ cell: id, explanation })));
  }
  for (const table of Object.values(open)) table.close();
  writeFileSync(path.join(folder, 'dictionary.json'), `${JSON.stringify(dictionary(), null, 2)}\n`);
}

/** What every column of every table means, with units as UCUM codes. */
export function dictionary(): object {
  return {
    title: 'Dictionary of the almanac’s tables',
    conventions: {
      potentials: 'Inside minus outside. The junction potential is bath minus pipette: V_membrane = V_recorded − ljp.',
      currents: 'Positive into the cell. Net ionic current is outward positive.',
      missing: 'An empty field is a number that could not be measured; the pages give the reason.',
      encoding: 'UTF-8, RFC 4180, decimal point, one header row.',
    },
    tables: Object.fromEntries(
      tables.map((table) => [
        `${table.name}.csv`,
        { title: table.title, columns: table.columns.map((column) => ({ ...column })) },
      ]),
    ),
    quantities: Object.fromEntries(
      (['spike', 'sweep', 'cell'] as const)
        .flatMap((level) => quantitiesOf(level))
        .map(({ id, label, symbol, unit, ucum, levels, definition, formula, uncertainty, source }) => [
          id,
          { label, symbol, unit, ucum, levels, definition, formula, uncertainty, source },
        ]),
    ),
  };
}
