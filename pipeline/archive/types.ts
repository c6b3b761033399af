/** What an archive folder says, before any recording is opened. */
import type { FormatId, Problem, ReadingHints } from '../formats/types.ts';

/** Where a fact was stated, most distant first: later ones win. */
export type OriginLevel = 'defaults' | 'folder' | 'file' | 'facts.csv' | 'sidecar';

export interface Origin {
  level: OriginLevel;
  /** Path inside the archive, or place inside the data file. */
  path: string;
  line: number | null;
}

export interface Fact {
  key: string;
  value: string | number;
  origin: Origin;
  /** Statements that lost against this one and say something else, nearest first (`defaults` never listed). */
  disagrees: { value: string | number; origin: Origin }[];
}

/** Facts in force by key. */
export type Facts = Record<string, Fact>;

/** A statement of one level, before cascading. */
export interface Statement {
  key: string;
  value: string | number;
  origin: Origin;
}

/** A condition that holds from a sweep or a clock time on. Fact keys in `facts` replace the cell's. */
export interface ConditionStatement {
  from_sweep: number | null;
  from_time: string | null;
  label: string;
  facts: Record<string, string | number>;
  origin: Origin;
}

export interface Recipe {
  id: string;
  path: string;
  name: string;
  /** Other names that facts may use for it. */
  aliases?: string[];
  role: 'pipette' | 'bath';
  ph: number | null;
  titrant: string | null;
  gas: string;
  osmolality_mosm: number | null;
  millimolar: Record<string, number>;
}

export interface PolicyLimit {
  quantity: string;
  above: number | null;
  below: number | null;
  line: number | null;
}

export interface ArchiveEvent {
  date: string;
  text: string;
  rig: string | null;
  kind: string | null;
  line: number | null;
}

export interface Decision {
  cell: string;
  decision: 'include' | 'exclude' | 'apply';
  by: string;
  date: string;
  why: string;
  line: number | null;
}

/** Comparison over a quantity, fact or standing, as criteria files write it. */
export interface CriterionRule {
  key: string;
  rule: Record<string, unknown>;
  missing: 'keep' | 'drop' | 'list';
  line: number | null;
}

export interface CriteriaSet {
  id: string;
  path: string;
  title: string;
  select: CriterionRule[];
  require: CriterionRule[];
}

export interface Settings {
  title: string;
  lab: string;
  timezone: string | null;
  mains_hz: number | null;
  rigs: Record<string, string>;
  people: Record<string, string>;
  /** Lab class id → label and the shipped class whose ranges it takes. */
  classes: Record<string, { label: string; like: string }>;
  limits: PolicyLimit[];
  audiences: Record<string, unknown>;
}

/** A file met under the archive that is not one of the tool's own YAML, notes or tables. */
export interface FoundFile {
  /** Relative to the archive, with forward slashes. */
  path: string;
  bytes: number;
  mtime_ms: number;
  /** `recording`: a reader claims it. `other`: accounted for but nothing to read (pictures, licences, sheets). */
  kind: 'recording' | 'other';
  /** For `other`: why, in words. */
  reason: string;
  format: FormatId | null;
  hints: ReadingHints;
  /** Statements of almanac.yaml defaults, folder.yaml (outer to inner), the `file` column of facts.csv, the sidecar. */
  statements: Statement[];
  /** Statements for single electrodes from `cells:` in the sidecar. */
  electrode_statements: Record<string, Statement[]>;
  conditions: ConditionStatement[];
  /**
   * Set when the file must not be opened, not even to hash it: a link or pipe (`other`), or a recording whose sidecar
   * states how to read it in a way that cannot be used.
   */
  blocked?: Problem;
}

export interface Archive {
  root: string;
  settings: Settings;
  recipes: Recipe[];
  files: FoundFile[];
  events: ArchiveEvent[];
  decisions: Decision[];
  criteria: CriteriaSet[];
  /** facts.csv: statements by cell id. */
  cell_statements: Record<string, Statement[]>;
  /** Notes as found: paths inside the archive. */
  note_paths: string[];
  /** Everything wrong with the archive's own files: unknown keys, impossible values, unreadable YAML. */
  problems: (Problem & { path: string; line: number | null })[];
}

/** One sweep of a cell: where its samples are. */
export interface CellSweepRef {
  path: string;
  key: string;
  series: string;
  source_sweep: number | null;
  start_s: number | null;
}

/** A cell as worked out from facts: its sweeps in order and its facts with origins. */
export interface CellRecord {
  id: string;
  facts: Facts;
  conditions: ConditionStatement[];
  sweeps: CellSweepRef[];
  /** Facts that one file of several states for itself (bridge, protocol, filter …), by path. */
  file_facts?: Record<string, Record<string, string | number>>;
  /** Contradictions found while working it out: same id without a stated `cell`, facts that disagree. */
  problems: (Problem & { path: string })[];
}
