/** The ledger as the pages need it: read once, with one short row for each cell. */
import type { CheckEntry, IonPotential, SolutionIons, Standing } from '../pipeline/judge/types.ts';
import { openLedgerReader } from '../pipeline/ledger/read.ts';
import type { ArchiveRow, CellRow, FileRow, LedgerReader, NoteRow, SweepRow } from '../pipeline/ledger/types.ts';
import type { Readings } from '../pipeline/measure/types.ts';
import { checksInForce } from './checks.ts';
import { mondayOf } from './format.ts';
import { pageNames } from './names.ts';
import type { Sizes } from './sizes.ts';
import { type Thumbnail, thumbnailOf } from './thumbnail.ts';

/** Worst last, as every list of standings is ordered. */
export const standings: readonly Standing[] = ['sound', 'caution', 'unsound', 'unread'];

/** A code and what the archive's settings call it. */
export interface Named {
  id: string;
  label: string;
}

/** Solutions as stated, and the potentials that follow. */
export interface Solutions {
  pipette: string | null;
  bath: string | null;
  temperature_c: number | null;
  ljp_mv: number | null;
  ljp_from: 'stated' | 'computed' | null;
  e_k: IonPotential | null;
  e_na: IonPotential | null;
  /** Ion by ion; null where a recipe or the temperature is not known. */
  solution: SolutionIons | null;
}

/** What lists and tables say about a cell. */
export interface CellSummary {
  id: string;
  /** Its page, from the site's root. */
  page: string;
  standing: Standing;
  /** The worst reason for the standing; '' for none. */
  reason: string;
  decision: string | null;
  date: string | null;
  /** Monday of the week of recording. */
  week: string | null;
  subject: string | null;
  class: Named | null;
  rig: Named | null;
  person: Named | null;
  facts: Record<string, string | number>;
  sweeps: number;
  spikes: number;
  conditions: string[];
  /** The shipped class whose ranges judge it. */
  like: string;
  /** What the potentials were computed from, under the first condition; null where nothing was recorded. */
  solutions: Solutions | null;
  /** Of the condition that stands for the cell. */
  readings: Readings;
  /** Ids of checks that are outside under any condition, in the registry's order. */
  outside: string[];
  notes: string[];
  thumbnail: Thumbnail | null;
}

export interface NotePage extends NoteRow {
  /** From the site's root. */
  page: string;
}

export type { Sizes };

export interface Almanac {
  archive: ArchiveRow;
  cells: CellSummary[];
  files: FileRow[];
  notes: NotePage[];
  cellById: Map<string, CellSummary>;
  noteById: Map<string, NotePage>;
  cellNames: Map<string, string>;
  noteNames: Map<string, string>;
  /** Every check in force, the archive's own limits included. */
  checks: CheckEntry[];
  /** Everything about one cell, read when asked for. */
  cell: (id: string) => CellRow;
  sweeps: (cell: string) => SweepRow[];
}

const variable = 'SWEEP_ALMANAC_LEDGER';
const open = new Map<string, Almanac>();

/** @throws Error when SWEEP_ALMANAC_LEDGER names no ledger */
export function almanac(): Almanac {
  const file = process.env[variable];
  if (!file) throw new Error(`${variable} names no ledger: build the site with "sweep-almanac build"`);
  const had = open.get(file);
  if (had) return had;
  const made = readAlmanac(openLedgerReader(file));
  open.set(file, made);
  return made;
}

function readAlmanac(reader: LedgerReader): Almanac {
  const archive = reader.archive();
  const ids = reader.cellIds();
  const cellNames = pageNames(ids);
  const checks = checksInForce(archive);
  const order = new Map(checks.map((check, index) => [check.id, index]));
  const cells = ids.map((id) => summaryOf(reader.cell(id), cellNames.get(id)!, archive, reader.sweeps(id), order));
  const rows = reader.notes();
  const noteNames = pageNames(rows.map((note) => note.id));
  const notes = rows.map((note) => ({ ...note, page: `notes/${noteNames.get(note.id)}/index.html` }));
  return {
    archive,
    cells,
    files: reader.files(),
    notes,
    cellById: new Map(cells.map((cell) => [cell.id, cell])),
    noteById: new Map(notes.map((note) => [note.id, note])),
    cellNames,
    noteNames,
    checks,
    cell: (id) => reader.cell(id),
    sweeps: (id) => reader.sweeps(id),
  };
}

function summaryOf(
  cell: CellRow,
  name: string,
  archive: ArchiveRow,
  sweeps: SweepRow[],
  checkOrder: ReadonlyMap<string, number>,
): CellSummary {
  const orderOf = (id: string): number => checkOrder.get(id) ?? checkOrder.size;
  const facts: Record<string, string | number> = {};
  for (const [key, fact] of Object.entries(cell.facts)) facts[key] = fact.value;
  const text = (key: string): string | null => (facts[key] === undefined ? null : String(facts[key]));
  const { rigs, people, classes } = archive.settings;
  const named = (key: string, labelOf: (id: string) => string | undefined): Named | null => {
    const id = text(key);
    return id === null ? null : { id, label: labelOf(id) ?? id };
  };
  const first = cell.measure.conditions[0];
  const circumstances = cell.circumstances[0];
  const outside = new Set(
    cell.judgement.findings.filter((finding) => finding.outcome === 'outside').map((finding) => finding.check),
  );
  return {
    id: cell.cell,
    page: `cells/${name}/index.html`,
    standing: cell.judgement.standing,
    reason: cell.judgement.reasons[0] ?? '',
    decision: cell.decisions.at(-1)?.decision ?? null,
    date: cell.date,
    week: cell.date === null ? null : mondayOf(cell.date),
    subject: text('subject'),
    class: named('class', (id) => classes[id]?.label ?? circumstances?.class_label ?? undefined),
    rig: named('rig', (id) => rigs[id]),
    person: named('person', (id) => people[id]),
    facts,
    sweeps: cell.sweeps,
    spikes: cell.spikes,
    conditions: cell.measure.conditions.map((condition) => condition.condition),
    like: circumstances?.like ?? 'any',
    solutions: circumstances
      ? {
          pipette: text('pipette'),
          bath: text('bath'),
          temperature_c: circumstances.temperature_c,
          ljp_mv: circumstances.ljp_mv,
          ljp_from: circumstances.ljp_from,
          e_k: circumstances.e_k,
          e_na: circumstances.e_na,
          solution: circumstances.solution ?? null,
        }
      : null,
    readings: first?.readings ?? {},
    outside: [...outside].sort((a, b) => orderOf(a) - orderOf(b)),
    notes: cell.notes,
    thumbnail: thumbnailOf(first?.reference_spike ?? null, sweeps),
  };
}

/** How many cells, and how many subjects they come from. */
export function sizesOf(cells: readonly CellSummary[]): Sizes {
  const subjects = new Set(cells.flatMap((cell) => (cell.subject === null ? [] : [cell.subject])));
  return {
    cells: cells.length,
    subjects: subjects.size,
    withoutSubject: cells.filter((cell) => cell.subject === null).length,
  };
}

/** Groups in order of their keys (plain comparison); those without a key are left out. */
export function groupBy<T>(list: readonly T[], keyOf: (item: T) => string | null): [string, T[]][] {
  const groups = new Map<string, T[]>();
  for (const item of list) {
    const key = keyOf(item);
    if (key === null) continue;
    const group = groups.get(key);
    if (group) group.push(item);
    else groups.set(key, [item]);
  }
  return [...groups].sort(([a], [b]) => (a < b ? -1 : a > b ? 1 : 0));
}
