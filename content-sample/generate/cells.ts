/** What a cell of the sample is: who recorded it and how, what its membrane is, and what goes wrong with it. */

export type Kind = 'pyramidal' | 'interneuron' | 'squid' | 'heart' | 'nothing';

/** Ids of what can be planted. 'none' is a sound cell. */
export type Fault =
  | 'none'
  | 'junction-left-in'
  | 'junction-removed-twice'
  | 'junction-wrong-sign'
  | 'voltage-scale'
  | 'current-scale'
  | 'sign-inverted'
  | 'bridge-unbalanced'
  | 'rate-misdeclared'
  | 'temperature-misstated'
  | 'solution-swapped'
  | 'same-recording-twice'
  | 'wrong-class'
  | 'clipped'
  | 'hum'
  | 'slow-sampling'
  | 'low-filter'
  | 'noisy'
  | 'drifting'
  | 'rundown'
  | 'access-rising'
  | 'no-cell'
  | 'depolarized'
  | 'depolarization-block'
  | 'rig-drift'
  | 'high-access'
  | 'label-contradicts'
  | 'facts-disagree'
  | 'unit-unknown'
  | 'cut-short';

/** Text dialects a lab meets; see `text.ts`. */
export type TextDialect = 'comma' | 'semicolon' | 'rows' | 'bare' | 'one-column' | 'spaces';

export interface DrugSpec {
  label: string;
  bath: string;
  /** First sweep of the cell under it. */
  from_sweep: number;
  /** What is left of a conductance. */
  na?: number;
  k?: number;
  ca?: number;
  /** Bath potassium that replaces the old, heart only. */
  k_out_mm?: number;
}

export interface CellSpec {
  id: string;
  /** File name inside the day's folder, without the folder. */
  file: string;
  kind: Kind;
  /** The class the lab states; its own id in almanac.yaml. */
  class: string;
  slice: string;
  /** Minutes after the day's first cell. */
  at_min: number;
  fault: Fault;
  /** Words that a finding about the planted fault should hold; empty for a sound cell. */
  expects: string[];
  /** Relative size; 1 is the class's usual. */
  size?: number;
  text?: TextDialect;
  drugs?: DrugSpec[];
  /** Facts written into the sidecar besides `cell`, `class` and `slice`. */
  facts?: Record<string, string | number>;
  /** Facts left out of the sidecar on purpose. */
  omit?: string[];
  /** Changes to the bench or the writing, by fault. */
  access_mohm?: number;
  access_end_mohm?: number;
  bridge?: 'set' | 'forgotten' | 'stale';
  offset_mv?: number;
  drift_mv_per_min?: number;
  noise_mv?: number;
  hum_mv?: number;
  filter_khz?: number;
  rate_hz?: number;
  rate_factor?: number;
  voltage_factor?: number;
  current_factor?: number;
  voltage_unit?: string;
  clip_mv?: [number, number];
  true_temperature_c?: number;
  true_bath?: string;
  true_pipette?: string;
  /** What the recorder leaves of the junction potential in the reading: 1 all (uncorrected), 0 none (corrected). */
  junction_left?: number;
  leak_shift_mv?: number;
  leak_factor?: number;
  g_na?: number;
  g_k?: number;
  phi?: number;
  g_na_end?: number;
  strong?: boolean;
  /** Size of one step of the family where it does not follow from the rheobase, pA. */
  unit_pa?: number;
  spontaneous?: boolean;
  /** Seconds from beat to beat, heart; 1 where it is left out. */
  period_s?: number;
  /** One step over and over in place of a family. */
  repeat?: boolean;
  holding_pa?: number;
  pairing?: 'numbers' | 'tables' | 'sweep-table';
  timestamps?: boolean;
  without_stimulus?: boolean;
  fine_rheobase?: boolean;
  label_factor?: number;
  file_subject?: string;
  cut_to?: number;
  copy_of?: string;
  /** Cells that share this name are written into one file, an electrode each. */
  shared_file?: boolean;
  /** The sweeps of the second electrode start together with the first one's. */
  electrode?: string;
}

export interface DaySpec {
  folder: string;
  date: string;
  first: string;
  rig: string;
  person: string;
  subject: SubjectSpec;
  pipette: string;
  bath: string;
  temperature_c: number;
  junction: 'corrected' | 'uncorrected' | 'unstated' | null;
  /** The junction potential the lab writes down; null leaves it to be computed; 'true' its true value. */
  ljp: number | 'true' | null;
  batch_pipette: string;
  batch_bath: string;
  /** Extra lines in folder.yaml. */
  facts?: Record<string, string | number>;
  /** Offset of the rig's reference electrode that nobody noticed, mV. */
  rig_offset_mv?: number;
  cells: CellSpec[];
}

export interface SubjectSpec {
  id: string;
  species: string;
  age: string;
  sex: string;
  genotype: string;
  region: string;
  preparation: string;
}
