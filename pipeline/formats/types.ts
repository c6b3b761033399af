/**
 * What a format reader gives: a description of everything in one file without its samples, then samples sweep by
 * sweep. Readers convert to mV and pA and compute nothing else.
 */

export type FormatId = 'nwb' | 'text';

/** Something a person must know about a file. Codes never change, wording may. */
export interface Problem {
  code: string;
  /** `blocks` costs the file or the sweep; `warns` leaves the data usable. */
  weight: 'blocks' | 'warns';
  /** Where in the file: an HDF5 path, a line number, a column. Empty for the file as a whole. */
  place: string;
  /** What was expected, what was found. One or two sentences. */
  message: string;
  /** What to do. */
  remedy: string;
  /** Sidecar lines that would settle it, ready to paste into NAME.EXT.yaml. */
  sidecar?: string;
  /** Set when the problem concerns one sweep only. */
  sweep_key?: string;
}

/** A statement found inside the file. Keys are the closed list of fact keys. */
export interface FileFact {
  key: string;
  value: string | number;
  /** HDF5 path or line it was read from. */
  place: string;
  /** Facts of one electrode of several; absent: of the whole file. */
  electrode?: string;
}

/** One sweep in a file, known without reading its samples. */
export interface SweepEntry {
  /** Unique and stable within the file; handed back to `read`. */
  key: string;
  /** Path or column name of the response series, shown to people. */
  series: string;
  /** The electrode's name in the file; '' where the file knows none. */
  electrode: string;
  clamp: 'current' | 'voltage';
  /** The file's own number for this sweep, null where it has none. */
  source_sweep: number | null;
  /** Seconds since the session started, null where unknown. */
  start_s: number | null;
  samples: number;
  rate_hz: number;
  /** Protocol or stimulus label the file gives, '' where none. */
  protocol: string;
  has_voltage: boolean;
  has_current: boolean;
  /** Bridge balance compensation in force, MΩ, where the file says so. */
  bridge_mohm: number | null;
  /** Constant bias current, pA, where the file says so. */
  bias_pa: number | null;
  /** Amplifier low-pass corner, kHz, where the file says so. */
  filter_khz: number | null;
  /** Unit, gain and offset as found, for the page of the file: 'volts × 1 (file says volts)'. */
  scaling: string;
  /** Stimulus amplitude that a label in the file claims, pA or mV; held against the data later. */
  labelled_amplitude: number | null;
}

export interface FileDescription {
  format: FormatId;
  /** Readable name and version: 'NWB 2.7.0', 'text, 3 columns, comma'. */
  format_label: string;
  /** ISO 8601 as in the file, null where it has none. */
  session_start: string | null;
  facts: FileFact[];
  sweeps: SweepEntry[];
  problems: Problem[];
}

export interface Samples {
  samples: Float64Array;
  rate_hz: number;
  start_s: number;
}

/** Samples of one sweep in mV and pA. Unreadable samples are NaN. */
export interface SweepSamples {
  clamp: 'current' | 'voltage';
  voltage: Samples | null;
  current: Samples | null;
  stated_stimulus:
    | { kind: 'step'; start_s: number; end_s: number; pa: number }
    | { kind: 'levels'; at_s: number[]; mv: number[] }
    | { kind: 'none' }
    | null;
  bridge_mohm: number | null;
  /** Voltage clamp: what the file says the amplifier compensated. */
  compensation?: {
    whole_cell_pf: number | null;
    correction_percent: number | null;
    prediction_percent: number | null;
  } | null;
  problems: Problem[];
}

/** An open file. `read` may throw: the caller runs it in a worker and takes the message as the reason. */
export interface OpenRecording {
  describe(): FileDescription;
  read(key: string): SweepSamples;
  close(): void;
}

/** The `table:` block of a sidecar, after its schema. Column references are 1-based numbers or header names. */
export interface TableMapping {
  skip_lines?: number;
  header?: boolean;
  separator?: 'auto' | ',' | ';' | 'tab' | 'space';
  decimal?: 'point' | 'comma';
  sweeps?: 'columns' | 'rows' | 'one';
  time?: { column: number | string; unit: 's' | 'ms' | 'us'; offset?: number };
  rate_hz?: number;
  voltage?: { columns: (number | string)[]; unit: 'V' | 'mV' | 'uV' };
  current?: { columns: (number | string)[]; unit: 'A' | 'mA' | 'uA' | 'nA' | 'pA' | 'pA/pF' };
  stimulus?:
    | { kind: 'step'; start_s: number; end_s: number; from_pa: number; by_pa: number }
    | { kind: 'step'; start_s: number; end_s: number; pa: number[] }
    | { kind: 'levels'; at_s: number[]; mv: number[] }
    | { kind: 'none' };
  clamp?: 'current' | 'voltage';
  capacitance_pf?: number;
}

/** What the sidecar or folder.yaml says about reading this file (facts travel separately). */
export interface ReadingHints {
  table?: TableMapping;
  /** From the facts: needed for pA/pF. */
  capacitance_pf?: number;
  /** From the facts; overrides what the file says about its sampling rate only where the file says nothing. */
  rate_hz?: number;
  clamp?: 'current' | 'voltage';
}
