/**
 * What measuring takes in and gives out. Plain data only: everything here crosses worker threads and is stored
 * in the ledger as JSON, so no class, no NaN, no undefined inside arrays.
 */

/** Why a number is missing. The sentence a person reads stands in `absence.ts`, one for each code. */
export type AbsenceCode =
  | 'no-spikes'
  | 'no-voltage'
  | 'no-current'
  | 'no-stimulus'
  | 'stimulus-not-a-step'
  | 'sweep-too-short'
  | 'no-baseline'
  | 'never-crosses'
  | 'clipped'
  | 'cut-off-by-sweep-end'
  | 'too-few-points'
  | 'too-few-spikes'
  | 'too-few-sweeps'
  | 'no-hyperpolarizing-steps'
  | 'sag-or-resonance'
  | 'fit-failed'
  | 'unresolved'
  | 'holding-not-zero'
  | 'holding-unknown'
  | 'not-spontaneous'
  | 'fact-missing'
  | 'unit-unknown'
  | 'not-this-clamp'
  | 'no-spike-free-stretch'
  | 'no-test-pulse'
  | 'no-electrode-transient'
  | 'no-membrane-transient'
  | 'membrane-charged'
  | 'compensated'
  | 'filter-unknown'
  | 'rate-too-low'
  | 'never-fired'
  | 'under-stimulus'
  | 'not-this-class'
  | 'not-blocked'
  | 'unreadable';

/** A measured number, or the reason there is none. `value` is finite whenever it is not null. */
export interface Reading {
  value: number | null;
  /** Set exactly when `value` is null. */
  why?: AbsenceCode;
  /** For `fact-missing`: the fact keys a person could state. */
  missing?: string[];
  /** How many observations went in. */
  n?: number;
  /** Standard deviation of those observations, in the quantity's unit. */
  sd?: number;
  /** Standard uncertainty of `value` (GUM, JCGM 100:2008), in the quantity's unit. */
  se?: number;
  /** Degrees of freedom behind `se`; left out where it is known well enough to be taken as normal. */
  freedom?: number;
  /**
   * 95 % half-width: the truth lies within value ± u95 in 95 of 100 recordings like this one. Student's t times `se`
   * (`measured` in `reading.ts` does it), unless the quantity has a better way. The truth bench holds it to 92–98 %.
   */
  u95?: number;
  /** Where in the data this was read. `sweep` is the cell's own sweep number, filled in once sweeps are numbered. */
  at?: { sweep?: number; spike?: number; from_s?: number; to_s?: number };
  /** A remark that belongs beside the number, e.g. the band a noise figure was taken over. */
  note?: string;
}

/** Readings by quantity id (see `quantities.ts`). A quantity that does not apply to this level is left out. */
export type Readings = Record<string, Reading>;

export type Clamp = 'current' | 'voltage';

/** One regularly sampled signal. A sample that could not be read is NaN here and nowhere else. */
export interface Signal {
  samples: Float64Array;
  rate_hz: number;
  /** Time of the first sample relative to the start of the sweep, s. */
  start_s: number;
}

/** A stimulus that is known from a statement (sidecar, file attribute) and not from a recorded channel. */
export type StatedStimulus =
  | { kind: 'step'; start_s: number; end_s: number; pa: number }
  /** Voltage clamp: the command holds each level, mV, from its time, s from the start of the sweep, to the next. */
  | { kind: 'levels'; at_s: number[]; mv: number[] }
  | { kind: 'none' };

/** What the amplifier is said to have done to a voltage-clamp recording. Null: not said. */
export interface Compensation {
  /** Capacitance of the cell whose transient was taken away, pF. */
  whole_cell_pf: number | null;
  /** Share of the access resistance that was corrected, and of the step that was predicted, %. */
  correction_percent: number | null;
  prediction_percent: number | null;
}

/** One sweep as a format reader delivered it, in mV and pA. */
export interface SweepInput {
  clamp: Clamp;
  /** Recorded membrane potential (current clamp) or the command (voltage clamp), mV. */
  voltage: Signal | null;
  /** Injected current (current clamp) or the recorded current (voltage clamp), pA, positive into the cell. */
  current: Signal | null;
  stated_stimulus: StatedStimulus | null;
  /** Bridge balance and capacitance the amplifier is said to have compensated, where the file says so. */
  bridge_mohm: number | null;
  /** Constant current injected beside the recorded one, pA, where the file says so; absent or null: not known. */
  bias_pa?: number | null;
  /** Voltage clamp, where the file says so. */
  compensation?: Compensation | null;
}

/** What measuring must know besides the samples. Every number may be null: it then says so in its readings. */
export interface MeasureContext {
  /** dV/dt criterion for threshold, V/s; for slow classes null: 5 % of the spike's own maximum rise is used. */
  rise_criterion_v_per_s: number | null;
  /** Smallest prominence that counts as a spike, mV. */
  prominence_mv: number;
  /** How long after a peak the afterhyperpolarization minimum may lie, ms. */
  ahp_window_ms: number;
  /** Heart and calcium spikes: relative criterion, APD, diastolic levels. */
  slow: boolean;
  filter_khz: number | null;
  mains_hz: number | null;
  /** Whole-cell or stated capacitance, pF, used for I/C edges, ionic current and charge before it is measured. */
  capacitance_pf: number | null;
}

export type StimulusKind = 'step' | 'ramp' | 'pulse train' | 'noise' | 'none' | 'unknown';

/** The stimulus as found in its own trace. Times are s from the start of the sweep. */
export interface Stimulus {
  kind: StimulusKind;
  /** Where it was read: the recorded current channel, a statement, or nothing at all. */
  from: 'channel' | 'stated' | 'absent';
  onset_s: number | null;
  end_s: number | null;
  /** Step, ramp end or pulse amplitude relative to holding, pA (current clamp) or mV (voltage clamp). */
  amplitude: number | null;
  /** Level before onset, pA or mV. */
  holding: number | null;
  /** Every edge of the stimulus (onset, end, each pulse), s: where dV/dt is the stimulus's and not the cell's. */
  edges_s: number[];
}

export type PhaseName = 'depolarization' | 'repolarization' | 'afterhyperpolarization' | 'recovery';

export interface Phase {
  name: PhaseName;
  from_s: number;
  to_s: number;
  /** Sign of the mean net ionic current I − C·dV/dt over the phase: +1 outward, −1 inward, 0 not resolved. */
  net_ionic_sign: -1 | 0 | 1;
  /**
   * What the sign was read from, so that it can be read again once the cell's capacitance is known: change of
   * potential over the phase, SD of one reading of it, mean injected current and its standard error.
   */
  basis?: { mv: number; noise_mv: number; pa: number; se: number };
}

export interface Spike {
  /** 0-based within its sweep. */
  spike: number;
  /** Per-spike quantities; null values have their reason in `why`. */
  values: Record<string, number | null>;
  why: Record<string, AbsenceCode>;
  /** 95 % half-widths of `values`, by the same ids, where they are known. */
  u95?: Record<string, number>;
  phases: Phase[];
}

/** Lowest and highest sample in each of `low.length` equal columns over the sweep: nothing narrow is lost. */
export interface Envelope {
  start_s: number;
  end_s: number;
  low: number[];
  high: number[];
  /** Half-open column ranges without a readable sample: the bounds there only join their neighbours. Absent: none. */
  gaps?: [number, number][];
}

/** A full-resolution excerpt around one spike. */
export interface Excerpt {
  spike: number;
  start_s: number;
  rate_hz: number;
  mv: number[];
}

export interface SweepMeasure {
  clamp: Clamp;
  duration_s: number;
  stimulus: Stimulus;
  readings: Readings;
  spikes: Spike[];
  /** True when firing stopped inside a strong step although the step went on. */
  depolarization_block: boolean;
  /** What a reader of the number must know, e.g. 'stimulus cut to the length of the voltage'. */
  remarks: string[];
  /** Drawn on pages; mV. Null where there is no voltage. */
  voltage_envelope: Envelope | null;
  /** pA. */
  current_envelope: Envelope | null;
  /** The sweep's first spike from 5 ms before threshold to the end of its afterhyperpolarization. */
  first_spike: Excerpt | null;
  /** Mean response in equal bins, for cell-level fits that need the waveform of small hyperpolarizing steps. */
  step_response: { start_s: number; rate_hz: number; mv: number[] } | null;
  /** Firing outside any stimulus: spikes, the time they were counted over, the lowest potential of each cycle. */
  spontaneous?: { spikes: number; seconds: number; minima_mv: number[] } | null;
  /** Bridge balance in force, MΩ, and bias already counted in `holding_pa`, pA, where the file says so. */
  bridge_mohm?: number | null;
  bias_pa?: number | null;
}

/** One measured sweep in its cell, potentials already in the stated reading (see `junction.ts`). */
export interface NumberedSweep extends SweepMeasure {
  /** 0-based within the cell. */
  sweep: number;
  condition: string;
  /** Seconds since the first sweep of the cell; null where the file has no times. */
  since_start_s: number | null;
}

/** What the cell-level quantities need besides the sweeps. */
export interface CellContext extends MeasureContext {
  e_na_mv: number | null;
  e_k_mv: number | null;
  /** Bias current stated for the whole recording, pA. */
  bias_pa: number | null;
  stated_capacitance_pf: number | null;
  stated_access_mohm: number | null;
  /** Bridge balance stated as a fact, MΩ; used where the sweeps themselves do not say. */
  stated_bridge_mohm?: number | null;
  /** Seconds from break-in to the first sweep, where both clock times are known. */
  break_in_to_start_s: number | null;
  /** Quantities that depend on a missing fact name it here: fact keys by need. */
  missing_for_e_na: string[];
  missing_for_e_k: string[];
  /** What the loss of gradients by firing is computed from. Ions are those of a dialysed cell, null elsewhere. */
  gradients?: {
    /** Volume of the cell as stated, pL. */
    volume_pl: number | null;
    celsius: number | null;
    sodium: { inside_mm: number; outside_mm: number } | null;
    potassium: { inside_mm: number; outside_mm: number } | null;
    /** Ions of the pipette solution. */
    pipette: { ion: string; valence: number; millimolar: number }[] | null;
  };
}

export interface VIPoint {
  sweep: number;
  pa: number;
  mv: number;
}
export interface RatePoint {
  sweep: number;
  pa: number;
  hz: number;
}

/** One stretch of a cell recorded under one condition. */
export interface ConditionMeasure {
  condition: string;
  sweeps: number[];
  readings: Readings;
  vi: VIPoint[];
  fi: RatePoint[];
  /** Sweep and spike from which the cell's first spike at rheobase was taken. */
  reference_spike: { sweep: number; spike: number } | null;
}

export interface CellMeasure {
  /** In order of time; the first is the one that stands for the cell. */
  conditions: ConditionMeasure[];
}
