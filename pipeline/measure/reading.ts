import { coverage95 } from '../signal/coverage.ts';
import type { AbsenceCode, Reading } from './types.ts';

/**
 * A reading with a value, or `unresolved` where arithmetic did not give a finite one: NaN and infinity never leave
 * measuring. Where `se` is given and `u95` is not, u95 = t(0.975, freedom)·se.
 */
export function measured(value: number, extra: Omit<Reading, 'value' | 'why'> = {}): Reading {
  if (!Number.isFinite(value)) return absent('unresolved');
  const reading: Reading = { value };
  if (extra.n !== undefined && Number.isFinite(extra.n)) reading.n = extra.n;
  if (extra.sd !== undefined && Number.isFinite(extra.sd)) reading.sd = extra.sd;
  if (extra.se !== undefined && Number.isFinite(extra.se)) reading.se = extra.se;
  if (extra.freedom !== undefined && Number.isFinite(extra.freedom)) reading.freedom = extra.freedom;
  const u95 = extra.u95 ?? (reading.se === undefined ? undefined : coverage95(reading.freedom) * reading.se);
  if (u95 !== undefined && Number.isFinite(u95)) reading.u95 = u95;
  if (extra.at) reading.at = extra.at;
  if (extra.note) reading.note = extra.note;
  return reading;
}

/** A reading without a value, and why; `missing` names fact keys, `note` adds words to the reason. */
export function absent(why: AbsenceCode, extra: { missing?: string[]; note?: string } = {}): Reading {
  const reading: Reading = { value: null, why };
  if (extra.missing?.length) reading.missing = extra.missing;
  if (extra.note) reading.note = extra.note;
  return reading;
}

/** Standard uncertainty of a reading with its degrees of freedom, for `combinedError`; 0 where it has none. */
export const errorOf = ({ se, freedom }: Pick<Reading, 'se' | 'freedom'>): { se: number; freedom?: number } => ({
  se: se ?? 0,
  ...(freedom === undefined ? {} : { freedom }),
});

/**
 * Independent standard uncertainties added in squares, with the effective degrees of freedom of Welch and Satterthwaite
 * (JCGM 100:2008, G.4.1). A part without `freedom` is taken as known well.
 */
export function combinedError(parts: readonly { se: number; freedom?: number }[]): { se: number; freedom?: number } {
  const se = Math.hypot(...parts.map((part) => part.se));
  const spent = parts.reduce(
    (sum, part) => sum + (part.freedom === undefined ? 0 : part.se ** 4 / Math.max(1, part.freedom)),
    0,
  );
  return spent > 0 ? { se, freedom: se ** 4 / spent } : { se };
}
