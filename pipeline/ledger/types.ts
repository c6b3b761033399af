/** What the ledger holds and what its read side gives to the site and to `publish`. */
import type { ArchiveEvent, CriteriaSet, Decision, Facts, FoundFile, Recipe, Settings } from '../archive/types.ts';
import type { FileDescription, Problem } from '../formats/types.ts';
import type { Circumstances, Judgement } from '../judge/types.ts';
import type { CellMeasure, NumberedSweep } from '../measure/types.ts';

/** Raise on any change that an old reader could misread. */
export const ledgerContract = 2;

export interface FileRow {
  path: string;
  bytes: number;
  sha256: string;
  format: string;
  state: 'read' | 'unread' | 'other';
  /** In words; empty for `read` without remarks. */
  reason: string;
  problems: Problem[];
  /** Cell ids with sweeps in this file. */
  cells: string[];
  sweeps: number;
}

/** Everything about one cell except its sweeps. */
export interface CellRow {
  cell: string;
  facts: Facts;
  /** One for each condition, same order as `measure.conditions`. */
  circumstances: Circumstances[];
  reading: 'corrected' | 'recorded';
  ljp_applied_mv: number;
  measure: CellMeasure;
  judgement: Judgement;
  decisions: Decision[];
  files: string[];
  sweeps: number;
  spikes: number;
  /** ISO date of recording, null where unknown. */
  date: string | null;
  /** Potentials at the electrodes' solutions for the lines on charts, mV; null where not known. */
  e_na_mv: number | null;
  e_k_mv: number | null;
  problems: (Problem & { path: string })[];
  /** Notes that mention the cell: note ids. */
  notes: string[];
}

export interface SweepRow extends NumberedSweep {
  cell: string;
  file: string;
  series: string;
  source_sweep: number | null;
}

export interface NoteFigure {
  cell: string;
  sweep: number | null;
  from_s: number | null;
  to_s: number | null;
  caption: string;
}

/** A note after parsing. `html` holds no script and no raw HTML of the author's; figures stand as placeholders. */
export interface NoteRow {
  /** Path below notes/ without '.md', forward slashes. */
  id: string;
  path: string;
  title: string;
  date: string | null;
  author: string | null;
  /** From the front matter; absent where none are stated. */
  tags?: string[];
  /** Sanitised HTML. Links to cells are `cell:ID`, to notes `note:ID`, to images `file:PATH`; the site resolves them. */
  html: string;
  /** Text without markup, for search and excerpts. */
  text: string;
  cells: string[];
  links: string[];
  figures: NoteFigure[];
  /** Images used, paths inside the archive. */
  images: string[];
  problems: { line: number | null; message: string; remedy: string }[];
}

export interface ArchiveProblem extends Problem {
  path: string;
  line: number | null;
}

/** Things of the archive as a whole. */
export interface ArchiveRow {
  settings: Settings;
  recipes: Recipe[];
  events: ArchiveEvent[];
  criteria: CriteriaSet[];
  problems: ArchiveProblem[];
  /** Version of the tool that measured. */
  version: string;
  /** When the newest recording was made, ISO date; pages use this, never the clock. */
  latest_date: string | null;
}

/** The read side. Every list is sorted by id (plain string comparison); sweeps by number. */
export interface LedgerReader {
  archive(): ArchiveRow;
  files(): FileRow[];
  /** Ids of all cells. */
  cellIds(): string[];
  cells(): CellRow[];
  cell(id: string): CellRow;
  sweeps(cell: string): SweepRow[];
  notes(): NoteRow[];
  close(): void;
}

export interface SurveyedFile {
  found: FoundFile;
  sha256: string;
  description: FileDescription | null;
  /** Why it could not be opened, null when it could. */
  failure: Problem | null;
}
