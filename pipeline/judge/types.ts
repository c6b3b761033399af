/** What judging takes in and gives out. Plain data; no file, no clock. */
import type { CellMeasure, NumberedSweep, Reading } from '../measure/types.ts';
import type { JunctionTerm, UncertaintyPart } from '../membrane/junction.ts';

export type Ground = 'physics' | 'conditions' | 'class' | 'lab' | 'policy';
export type Outcome = 'within' | 'near limit' | 'outside' | 'not measured';
export type Standing = 'sound' | 'caution' | 'unsound' | 'unread';

/** One entry of the registry `checks.ts`. */
export interface CheckEntry {
  id: string;
  /** Quantity id the number comes from; '' for a check of statements, which has no number. */
  quantity: string;
  ground: Ground;
  /** The question it asks, as a sentence: 'Does the peak stay below E_Na?' */
  asks: string;
  /** How the limit is derived, in words with the formula. */
  limit: string;
  /** Likely causes when it is outside, most common first. */
  causes: string[];
  /** What to check on the bench. */
  bench: string;
  source: string;
  /** One number for the cell and condition, or one for each sweep. */
  level: 'cell' | 'sweep';
}

/** One check held against one number. */
export interface Finding {
  check: string;
  ground: Ground;
  quantity: string;
  outcome: Outcome;
  condition: string;
  /** Null for the cell as a whole. */
  sweep: number | null;
  value: number | null;
  /** The number's own 95 % half-width, as measured; null where it is not known or there is no number. */
  value_u95?: number | null;
  /** 95 % uncertainty of the comparison (value and limit combined), in the quantity's unit. */
  uncertainty: number | null;
  limit_low: number | null;
  limit_high: number | null;
  /** Distance to the nearest limit in the quantity's unit: negative when beyond it. */
  margin: number | null;
  /** Seconds from the sweep's start, where to look. */
  at_s: number | null;
  /** One plain sentence with the numbers in it. */
  sentence: string;
  causes: string[];
  bench: string;
  /** Where the limit comes from: a paper, a rule, a line of the archive's almanac.yaml. */
  source: string;
  /** For `not measured`: fact keys that would make it measurable. */
  missing: string[];
}

export interface IonPotential {
  mv: number;
  /** 95 % half-width from concentrations and temperature, mV. */
  uncertainty_mv: number;
  inside_mm: number;
  outside_mm: number;
  /** What the half-width is made of, mV each, largest first; in quadrature. */
  parts?: UncertaintyPart[];
  valence?: number;
}

/** Everything a person needs to do the potentials of a pair of solutions by hand. */
export interface SolutionIons {
  celsius: number;
  /** RT/F, mV. */
  thermal_mv: number;
  pipette_ph: number;
  bath_ph: number;
  ions: JunctionTerm[];
  /** Computed from these ions, whatever is stated. */
  ljp_mv: number;
  ljp_uncertainty_mv: number;
  ljp_parts: UncertaintyPart[];
  /** What had to be assumed. */
  notes: string[];
}

/** What is known of the conditions under which one stretch of a cell was recorded. */
export interface Circumstances {
  condition: string;
  /** The lab's class id and label, and the shipped class whose ranges hold; 'any' where none is stated. */
  class_id: string | null;
  class_label: string | null;
  like: string;
  temperature_c: number | null;
  configuration: 'whole-cell' | 'perforated' | 'sharp' | 'loose' | 'other' | null;
  spike_ion: 'sodium' | 'calcium' | 'mixed' | null;
  junction: 'corrected' | 'uncorrected' | 'unstated';
  /** V_membrane = V_recorded − ljp; null where neither stated nor computable. */
  ljp_mv: number | null;
  ljp_from: 'stated' | 'computed' | null;
  /** 95 % half-width of `ljp_mv`: 1 mV where stated, at least 3.5 mV where computed. */
  ljp_uncertainty_mv?: number | null;
  /** What the recipes give, also where another value is stated: the difference is reported. */
  ljp_computed_mv?: number | null;
  /** The stretch's own solutions, ion by ion; null where a recipe or the temperature is not known. */
  solution?: SolutionIons | null;
  /** What was subtracted from the recorded potentials to get the readings judged here, mV. */
  ljp_applied_mv: number;
  reading: 'corrected' | 'recorded';
  e_na: IonPotential | null;
  e_k: IonPotential | null;
  /** Fact keys that are missing for E_Na, E_K and the junction potential. */
  missing_e_na: string[];
  missing_e_k: string[];
  /** Whether the pipette recipe states sodium at all. */
  pipette_sodium_mm: number | null;
  filter_khz: number | null;
  mains_hz: number | null;
  rate_hz: number | null;
  bridge_mohm: number | null;
  bias_pa: number | null;
}

export interface PolicyRule {
  quantity: string;
  above: number | null;
  below: number | null;
  origin: string;
}

/** A contradiction or duplicate established outside judging (archive, integrity). */
export interface Contradiction {
  kind: 'facts-disagree' | 'label-contradicts-data' | 'duplicate' | 'same-id' | 'unit-guessed' | 'other';
  sentence: string;
  place: string;
  remedy: string;
}

export interface JudgeInput {
  cell: string;
  measure: CellMeasure;
  sweeps: NumberedSweep[];
  /** One for each condition of `measure`, same order. */
  circumstances: Circumstances[];
  policy: PolicyRule[];
  contradictions: Contradiction[];
  /** Reasons why files of this cell could not be read, if any. */
  unread: string[];
}

/** The longest run of sweeps that meets the limits. */
export interface UsableStretch {
  from_sweep: number;
  to_sweep: number;
  sweeps: number;
  /** Sentence with why it ends where it ends. */
  sentence: string;
}

export interface Explanation {
  rank: number;
  slip: string;
  parameter: string;
  cleared: number;
  introduced: number;
  sentence: string;
}

export interface Judgement {
  standing: Standing;
  /** The reasons, worst first, each one sentence; empty for sound. */
  reasons: string[];
  /** Every outcome, `within` included. */
  findings: Finding[];
  usable: UsableStretch | null;
  /** Filled by a later stage of the work; empty until then. */
  explanations: Explanation[];
}

/** Readings used by a check, exposed for pages that draw limits. */
export type JudgedReading = Reading & { quantity: string };
