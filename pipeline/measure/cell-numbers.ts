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

/**
 * Standard uncertainty of the mean or median of numbers that carry uncertainties of their own. Their scatter holds those
 * uncertainties already; where it does not exceed them by more than chance would (95 %), the two are pooled, which keeps
 * two or three sweeps from giving an absurd interval; where it does, the scatter alone speaks, with n − 1 degrees of
 * freedom and two more for uncertainties of their own: the factor of 12.7 for two sweeps stands for scatter a hundred
 * times larger than seen, which those uncertainties deny. (Where they are too small by a factor of 2 to 3, leaving the
 * two out would hold the truth in a hundredth of the cases more.) The median of many normal numbers is √(π/2) times less certain than their mean.
 * @param each standard uncertainty of each number; null where it has none
 */
export function uncertaintyOver(
  values: readonly number[],
  each: readonly (number | null)[],
  of: 'mean' | 'median' = 'median',
): Pick<Reading, 'n' | 'sd' | 'se' | 'freedom'> {
  const n = values.length;
  const own = each.filter((se) => se !== null);
  const within = own.length === n && n > 0 ? own.reduce((sum, se) => sum + se * se, 0) / n : null;
  if (n < 2) return { n, ...(within === null ? {} : { se: Math.sqrt(within) }) };
  const sd = standardDeviation(values)!;
  const costs = of === 'mean' ? 1 : medianCosts(n);
  if (within === null || sd * sd > within * chiSquareShare(n - 1))
    return { n, sd, se: (costs * sd) / Math.sqrt(n), freedom: n - 1 + (within === null ? 0 : scatterFreedom) };
  const freedom = n - 1 + ownFreedom;
  const pooled = ((n - 1) * sd * sd + ownFreedom * within) / freedom;
  return { n, sd, se: costs * Math.sqrt(pooled / n), freedom };
}

/** What the numbers' own uncertainties count for against their scatter: as much as so many degrees of freedom. */
export const ownFreedom = 10;
/** And to the size of a scatter that exceeds them. */
export const scatterFreedom = 2;

/** How many times less certain than their mean the median of n normal numbers is, near enough. */
export const medianCosts = (n: number): number => (n < 3 ? 1 : Math.sqrt(1 + (Math.PI / 2 - 1) * (1 - 2 / n)));

/** 95 % point of χ² over its degrees of freedom (Wilson & Hilferty 1931, PNAS 17:684–688; from memory). */
export const chiSquareShare = (freedom: number): number =>
  (1 - 2 / (9 * freedom) + 1.6449 * Math.sqrt(2 / (9 * freedom))) ** 3;

/** A reading's own standard uncertainty; null where it has none. */
export const ownError = (reading: Reading): number | null =>
  reading.se ?? (reading.u95 === undefined ? null : reading.u95 / 1.96);

/** Median over sweeps with n, spread and standard uncertainty; `at` is the sweep nearest the median. */
export function medianOver(points: readonly Point[], whenNone: Reading, note?: string): Reading {
  if (points.length === 0) return whenNone;
  const values = points.map((point) => point.value);
  const value = median(values)!;
  const nearest = points.reduce((best, one) =>
    Math.abs(one.value - value) < Math.abs(best.value - value) ? one : best,
  );
  return measured(value, {
    ...uncertaintyOver(
      values,
      points.map(({ reading }) => ownError(reading)),
    ),
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

/** Why no hyperpolarizing step could be used: none was made, or those made could not be measured. */
export function withoutHyperpolarizing(sweeps: readonly NumberedSweep[]): Reading {
  const made = longSteps(sweeps).filter((sweep) => stepPa(sweep)! < 0);
  if (made.length > 0) return commonReason(made, 'steady_deflection_mv', 'no-hyperpolarizing-steps');
  return absent(
    sweeps.length > 0 && sweeps.every((sweep) => sweep.stimulus.kind === 'unknown')
      ? 'no-stimulus'
      : 'no-hyperpolarizing-steps',
  );
}
