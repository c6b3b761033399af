/** How numbers, dates and counts are printed, everywhere alike. */
import { quantity } from '../pipeline/measure/quantities.ts';
import type { Reading } from '../pipeline/measure/types.ts';

export { counted } from './sizes.ts';

const minus = '\u2212';
const thinSpace = '\u202f';

/** A number with fixed decimals, a true minus sign, and thousands set apart by a narrow space from 10,000 on. */
export function number(value: number, decimals = 0): string {
  const fixed = Math.abs(value).toFixed(decimals);
  const [whole = '0', fraction] = fixed.split('.');
  const grouped = whole.length > 4 ? whole.replace(/\B(?=(\d{3})+$)/g, thinSpace) : whole;
  const sign = value < 0 && Number(fixed) !== 0 ? minus : '';
  return sign + grouped + (fraction === undefined ? '' : `.${fraction}`);
}

/** A quantity's number as its registry entry wants it, without its unit. */
export const printed = (id: string, value: number): string => number(value, quantity(id).decimals);

/** Number and unit: '−68.2 mV'. The space does not break. */
export function withUnit(id: string, value: number): string {
  const { unit } = quantity(id);
  return unit === '' ? printed(id, value) : `${printed(id, value)}\u00a0${unit}`;
}

/** '±0.4 (n = 12)' for a reading that has a spread, else ''. */
export function spreadOf(id: string, reading: Reading): string {
  const { decimals } = quantity(id);
  const spread = reading.sd === undefined ? '' : `±${number(reading.sd, decimals)}`;
  const n = reading.n === undefined ? '' : `n = ${number(reading.n)}`;
  if (spread !== '' && n !== '') return `${spread} (${n})`;
  return spread !== '' ? spread : n;
}

/** Kilobytes and megabytes as powers of 1000. */
export function bytes(n: number): string {
  if (n < 1000) return `${n}\u00a0B`;
  if (n < 1e6) return `${number(n / 1e3, n < 1e4 ? 1 : 0)}\u00a0kB`;
  if (n < 1e9) return `${number(n / 1e6, n < 1e7 ? 1 : 0)}\u00a0MB`;
  return `${number(n / 1e9, 1)}\u00a0GB`;
}

const months = [
  'January',
  'February',
  'March',
  'April',
  'May',
  'June',
  'July',
  'August',
  'September',
  'October',
  'November',
  'December',
];

/** '12 March 2026' from an ISO date; anything else as it stands. */
export function longDate(iso: string): string {
  const parts = /^(\d{4})-(\d{2})-(\d{2})/.exec(iso);
  const month = parts ? months[Number(parts[2]) - 1] : undefined;
  return parts && month ? `${Number(parts[3])} ${month} ${parts[1]}` : iso;
}

/** The Monday on or before an ISO date, as an ISO date. */
export function mondayOf(iso: string): string {
  const day = new Date(`${iso.slice(0, 10)}T00:00:00Z`);
  day.setUTCDate(day.getUTCDate() - ((day.getUTCDay() + 6) % 7));
  return day.toISOString().slice(0, 10);
}
