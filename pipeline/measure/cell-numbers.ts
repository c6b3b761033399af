import { median, standardDeviation } from '../signal/statistics.ts';
import { absent, measured } from './reading.ts';
import type { AbsenceCode, NumberedSweep, Reading } from './types.ts';

/** A number of one sweep. */
export interface Point {
  sweep: NumberedSweep;
  value: number;
  reading: Reading;
}

/** The sweeps' values of one quantity; sweeps without one are left out. */
export function pointsOf(sweeps: readonly NumberedSweep[], id: string): Point[] {
  return sweeps.flatMap((sweep) => {
    const reading = sweep.readings[id];
    return reading && reading.value !== null ? [{ sweep, value: reading.value, reading }] : [];
  });
}

/** The reason most sweeps give for not having a quantity. */
export function commonReason(sweeps: readonly NumberedSweep[], id: string, otherwise: AbsenceCode): Reading {
  const counts = new Map<string, { count: number; reading: Reading }>();
  for (const sweep of sweeps) {
    const reading = sweep.readings[id];
    if (!reading || reading.value !== null || !reading.why) continue;
    const known = counts.get(reading.why) ?? { count: 0, reading };
    known.count++;
    counts.set(reading.why, known);
  }
  const most = [...counts.values()].sort((a, b) => b.count - a.count)[0];
  return most
    ? absent(most.reading.why!, {
        ...(most.reading.missing ? { missing: most.reading.missing } : {}),
        ...(most.reading.note ? { note: most.reading.note } : {}),
      })
    : absent(otherwise);
}

export const spreadOf = (values: readonly number[]): Pick<Reading, 'n' | 'sd' | 'se'> => {
  const sd = standardDeviation(values);
  return { n: values.length, ...(sd === null ? {} : { sd, se: sd / Math.sqrt(values.length) }) };
};

/** Median over sweeps with n, spread and the standard error of a mean; `at` is the sweep nearest the median. */
export function medianOver(points: readonly Point[], whenNone: Reading, note?: string): Reading {
  if (points.length === 0) return whenNone;
  const value = median(points.map((point) => point.value))!;
  const nearest = points.reduce((best, one) =>
    Math.abs(one.value - value) < Math.abs(best.value - value) ? one : best,
  );
  return measured(value, {
    ...spreadOf(points.map((point) => point.value)),
    // One sweep alone still has the error it was measured with.
    ...(points.length === 1 && nearest.reading.se !== undefined ? { se: nearest.reading.se } : {}),
    at: placeOf(nearest),
    ...(note ? { note } : {}),
  });
}

export const placeOf = ({ sweep, reading }: Pick<Point, 'sweep' | 'reading'>): NonNullable<Reading['at']> => ({
  sweep: sweep.sweep,
  ...(reading.at?.spike === undefined ? {} : { spike: reading.at.spike }),
  ...(reading.at?.from_s === undefined ? {} : { from_s: reading.at.from_s }),
  ...(reading.at?.to_s === undefined ? {} : { to_s: reading.at.to_s }),
});

/** The step of a sweep, pA; null where its stimulus is not a step of known size. */
export const stepPa = (sweep: NumberedSweep): number | null =>
  sweep.stimulus.kind === 'step' ? sweep.stimulus.amplitude : null;

export const stepLength_s = (sweep: NumberedSweep): number =>
  (sweep.stimulus.end_s ?? 0) - (sweep.stimulus.onset_s ?? 0);

/** Steps at least half as long as the longest: a test pulse is not a step of the protocol. */
export function longSteps(sweeps: readonly NumberedSweep[]): NumberedSweep[] {
  const steps = sweeps.filter((sweep) => stepPa(sweep) !== null);
  const longest = Math.max(0, ...steps.map(stepLength_s));
  return steps.filter((sweep) => stepLength_s(sweep) >= 0.5 * longest);
}

/** Why a cell has no steps to speak of. */
export const stimulusReason = (sweeps: readonly NumberedSweep[]): AbsenceCode =>
  sweeps.some((sweep) => !['none', 'unknown'].includes(sweep.stimulus.kind)) ? 'stimulus-not-a-step' : 'no-stimulus';
