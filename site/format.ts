/** How numbers, dates and counts are printed, everywhere alike. */
import { cutAt, decimalsWith, leastShown, quantity } from '../pipeline/measure/quantities.ts';

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

/** A number and its 95 % half-width as printed, without their unit; `u95` is '' where it is not known. */
export interface Rounded {
  value: string;
  u95: string;
  decimals: number;
}

/**
 * The half-width to print: only of quantities whose registry entry says how it is had, so that a page never shows one
 * that nobody can account for.
 */
export const knownHalfWidth = (id: string, u95: number | null | undefined): number | undefined =>
  quantity(id).uncertainty === undefined ? undefined : (u95 ?? undefined);

/** Rounded to a place that may lie left of the point. */
const toPlace = (value: number, decimals: number): string => number(cutAt(value, decimals), Math.max(0, decimals));

/**
 * Value and half-width cut at the same place: the half-width has two significant digits at most, never more decimals
 * than `most`, and is rounded up where it would else be printed as nothing.
 *
 * @param u95 undefined where it is not known
 * @see JCGM 100:2008, 7.2.6; ISO 80000-1:2009, annex B (rounding; from memory)
 */
export function cutTogether(value: number, u95: number | undefined, most: number): Rounded {
  if (u95 === undefined || !(u95 >= 0)) return { value: toPlace(value, most), u95: '', decimals: most };
  if (u95 === 0) return { value: toPlace(value, most), u95: toPlace(0, most), decimals: most };
  const decimals = decimalsWith(u95, most);
  return { value: toPlace(value, decimals), u95: toPlace(leastShown(u95, decimals), decimals), decimals };
}

/** A quantity's number with its half-width, where the registry says how that is had. */
export const rounded = (id: string, value: number, u95?: number | null): Rounded =>
  cutTogether(value, knownHalfWidth(id, u95), quantity(id).decimals);

/** '−68.2 ± 0.4', or the number alone where its uncertainty is not known. */
export function withHalfWidth(id: string, value: number, u95?: number | null): string {
  const one = rounded(id, value, u95);
  return one.u95 === '' ? one.value : `${one.value}\u00a0±\u00a0${one.u95}`;
}

/** '−68.2 ± 0.4 mV': number, half-width and unit. */
export function inFull(id: string, value: number, u95?: number | null): string {
  const { unit } = quantity(id);
  const text = withHalfWidth(id, value, u95);
  return unit === '' ? text : `${text}\u00a0${unit}`;
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
