/** What one check sees of one condition, and what it answers before it is held against its limits. */
import { absenceSentences } from '../measure/absence.ts';
import type { ConditionMeasure, NumberedSweep, Reading } from '../measure/types.ts';
import { coverage95 } from '../signal/coverage.ts';
import type { Circumstances } from './types.ts';

/** One condition of one cell. */
export interface Setting {
  measure: ConditionMeasure;
  circumstances: Circumstances;
  /** The condition's sweeps, by number. */
  sweeps: NumberedSweep[];
  /** Every sweep of the cell, by number: what went before may still be felt. */
  allSweeps: NumberedSweep[];
}

/** A number with its limits, ready to be compared. */
export interface Held {
  kind: 'held';
  /** The quantity judged, where it is not the registry's own. */
  quantity?: string;
  reading: Reading & { value: number };
  low: number | null;
  high: number | null;
  uncertainty: number;
  /** mV to add for each possible reading of the junction potential; [0] where it does not matter. */
  shifts: readonly number[];
  subject: string;
  lowName: string;
  highName: string;
  meaning: string;
  remark?: string;
  /** What was taken where the reading carries no half-width, as a sentence. */
  standIn?: string;
  /** Replaces the registry's source where the limit has its own. */
  source?: string;
}

/** The check applies and could not be held. */
export interface Unheld {
  kind: 'unheld';
  subject: string;
  /** Half a sentence: 'no spike in this sweep'. */
  why: string;
  /** Fact keys that would settle it. */
  missing: string[];
}

export type Answer = Held | Unheld;

/** Null: the check does not apply here and says nothing. */
export type CellQuestion = (setting: Setting) => Answer | null;
export type SweepQuestion = (setting: Setting, sweep: NumberedSweep) => Answer | null;

type Present = Reading & { value: number };

export const isPresent = (reading: Reading | undefined): reading is Present =>
  reading !== undefined && reading.value !== null && Number.isFinite(reading.value);

/** Why a reading is missing, in words. */
export function whyMissing(reading: Reading | undefined): string {
  if (reading?.why) return absenceSentences[reading.why];
  return reading && reading.value !== null ? 'the number is not finite' : 'it was not measured';
}

export const unheld = (subject: string, why: string, missing: readonly string[] = []): Unheld => ({
  kind: 'unheld',
  subject,
  why,
  missing: [...missing],
});

/** Unheld because the number itself is missing. */
export const unheldReading = (subject: string, reading: Reading | undefined): Unheld =>
  unheld(subject, whyMissing(reading), reading?.missing ?? []);

/** Middle value (mean of the two middle ones for an even count). @throws RangeError for no values */
export function medianOf(values: readonly number[]): number {
  if (values.length === 0) throw new RangeError('the median needs at least one value, got none');
  const sorted = [...values].sort((a, b) => a - b);
  const half = sorted.length >> 1;
  return sorted.length % 2 === 1 ? sorted[half]! : (sorted[half - 1]! + sorted[half]!) / 2;
}

/**
 * Median of one quantity over sweeps with n, sample SD and 95 % half-width (Student's t times SD/√n; of one sweep alone
 * its own), or null where no sweep has it.
 */
export function medianReading(sweeps: readonly NumberedSweep[], quantity: string): Present | null {
  const readings = sweeps.flatMap((sweep) => {
    const reading = sweep.readings[quantity];
    return isPresent(reading) ? [reading] : [];
  });
  const values = readings.map((reading) => reading.value);
  if (values.length === 0) return null;
  const mean = values.reduce((sum, value) => sum + value, 0) / values.length;
  const sd =
    values.length > 1
      ? Math.sqrt(values.reduce((sum, value) => sum + (value - mean) ** 2, 0) / (values.length - 1))
      : undefined;
  const u95 = sd === undefined ? readings[0]!.u95 : (coverage95(values.length - 1) * sd) / Math.sqrt(values.length);
  return {
    value: medianOf(values),
    n: values.length,
    ...(sd === undefined ? {} : { sd }),
    ...(u95 === undefined ? {} : { u95 }),
  };
}

/** The cell's own reading, else the median over the condition's sweeps, else the reading that says why not. */
export function cellReading(setting: Setting, quantity: string): Reading | undefined {
  const own = setting.measure.readings[quantity];
  return isPresent(own) ? own : (medianReading(setting.sweeps, quantity) ?? own);
}

/**
 * Largest injected stimulus of the condition against holding, pA without sign; null where none is known.
 * @param least_s leaves out stimuli shorter than this, s
 */
export function largestStimulusPa(setting: Setting, least_s = 0): number | null {
  const sizes = setting.sweeps.flatMap((sweep) => {
    const reading = sweep.readings['stimulus_pa'];
    const { kind, onset_s, end_s } = sweep.stimulus;
    const brief = least_s > 0 && (kind === 'pulse train' || (end_s ?? 0) - (onset_s ?? 0) < least_s);
    return sweep.clamp === 'current' && isPresent(reading) && !brief ? [Math.abs(reading.value)] : [];
  });
  return sizes.length === 0 ? null : Math.max(...sizes);
}
