/** Plain sentences with the numbers in them. Every finding's wording is put together here. */
import { cutAt, decimalsWith, leastShown, quantity } from '../measure/quantities.ts';
import type { Comparison } from './compare.ts';

/** A minus sign, never a hyphen, and no sign before a zero. */
function digits(value: number, decimals: number): string {
  const text = Math.abs(value).toFixed(decimals);
  // A difference that would round away is shown with two figures: '0.0 mV above' says nothing.
  const shown = value !== 0 && Number(text) === 0 ? Number(Math.abs(value).toPrecision(2)).toString() : text;
  return (value < 0 && Number(shown) !== 0 ? '−' : '') + shown;
}

const withUnit = (text: string, unit: string): string =>
  unit === '' ? text : unit === '%' ? `${text} %` : `${text} ${unit}`;

/** Shares are told in percent: '0.03 %' reads where '0.0003' does not. */
function written(quantityId: string, value: number): string {
  const { decimals, unit } = quantity(quantityId);
  if (quantityId.endsWith('_fraction')) return `${Number(digits(100 * Math.abs(value), decimals - 2))} %`;
  return withUnit(digits(value, decimals), unit);
}

/**
 * A number of one quantity with its unit: '+72.4 mV', '0.84 ms'. Potentials against the bath carry their sign.
 * @throws RangeError for an id that the registry does not hold
 */
export function amount(quantityId: string, value: number): string {
  const text = written(quantityId, value);
  return quantity(quantityId).absolute_potential && value > 0 ? `+${text}` : text;
}

/** Rounded at a place that may lie left of the point. */
const cut = (value: number, decimals: number): string => cutAt(value, decimals).toFixed(Math.max(0, decimals));

/**
 * A number with its own 95 % half-width: '+61.5 ± 0.4 mV'; as `amount` where that is not known or nil. Cut at the same
 * place, as pages cut them; a half-width that would be printed as nothing is rounded up.
 */
export function amountWithin(quantityId: string, value: number, u95: number | null | undefined): string {
  if (u95 === null || u95 === undefined || !(u95 > 0)) return amount(quantityId, value);
  const { decimals, unit, absolute_potential } = quantity(quantityId);
  const percent = quantityId.endsWith('_fraction');
  const scale = percent ? 100 : 1;
  const places = decimalsWith(scale * u95, decimals - (percent ? 2 : 0));
  const half = cut(leastShown(scale * u95, places), places);
  const size = cut(scale * Math.abs(value), places);
  const sign = Number(size) === 0 ? '' : value < 0 ? '−' : absolute_potential ? '+' : '';
  return withUnit(`${sign}${size} ± ${half}`, percent ? '%' : unit);
}

/** An interval with as many decimals as it takes to see on which side of a limit its ends lie. */
function interval(quantityId: string, low: number, high: number, limit: number): string {
  const { decimals, unit, absolute_potential } = quantity(quantityId);
  const percent = quantityId.endsWith('_fraction');
  const scale = percent ? 100 : 1;
  const least = Math.max(0, decimals - (percent ? 2 : 0));
  const seen = (places: number): boolean =>
    [low, high].every((end) => (scale * end).toFixed(places) !== (scale * limit).toFixed(places));
  const places = [least, least + 1, least + 2].find(seen) ?? least + 3;
  const one = (value: number): string => {
    const size = Math.abs(scale * value).toFixed(places);
    return `${Number(size) === 0 ? '' : value < 0 ? '−' : absolute_potential ? '+' : ''}${size}`;
  };
  return withUnit(`${one(low)} to ${one(high)}`, percent ? '%' : unit);
}

/** A difference of two numbers of one quantity, without sign: '11.9 mV'. */
export const difference = (quantityId: string, value: number): string => written(quantityId, Math.abs(value));

/** A range of one quantity: '0.31 to 1.60 ms', 'at most 0.35', 'at least 60.0 mV'. */
export function span(quantityId: string, low: number | null, high: number | null): string {
  if (low === null) return high === null ? 'any value' : `at most ${amount(quantityId, high)}`;
  if (high === null) return `at least ${amount(quantityId, low)}`;
  // The unit is said once.
  return `${amount(quantityId, low).replace(/ \S+$/, '')} to ${amount(quantityId, high)}`;
}

/** Mean temperature as people write it: '33 °C', '32.5 °C'. */
export const celsius = (value: number): string => `${digits(value, Number.isInteger(value) ? 0 : 1)} °C`;

/** '1 sweep', '12 sweeps'. */
export const count = (n: number, noun: string): string => `${n} ${noun}${n === 1 ? '' : 's'}`;

/** 'a', 'a and b', 'a, b and c'. */
export function listed(words: readonly string[], last = 'and'): string {
  if (words.length < 2) return words.join('');
  return `${words.slice(0, -1).join(', ')} ${last} ${words.at(-1)}`;
}

const capital = (text: string): string => text.charAt(0).toUpperCase() + text.slice(1);

/** What a check found, in pieces. */
export interface Telling {
  quantity: string;
  /** 'the peak of the first spike'; may name the sweep. */
  subject: string;
  value: number;
  /** The number's own 95 % half-width; null where it is not known. */
  u95: number | null;
  n: number | null;
  low: number | null;
  high: number | null;
  /** What the limits are, as a noun: 'E_Na (+60.5 mV at 33 °C)'. */
  lowName: string;
  highName: string;
  comparison: Comparison;
  uncertainty: number;
  /** What it means when outside: 'no sodium spike can do that'. */
  meaning: string;
  /** The condition when it is not the cell's first, else null. */
  condition: string | null;
  /** Further sentence, full stop included; '' for none. */
  remark: string;
}

const opening = (subject: string, condition: string | null): string =>
  condition === null ? capital(subject) : `In the condition “${condition}”, ${subject}`;

/** One plain sentence (and a remark, where there is one) that tells an outcome with its numbers. */
export function tell(telling: Telling): string {
  const { quantity: id, comparison, value, uncertainty, low, high } = telling;
  const n = telling.n !== null && telling.n > 1 ? ` (n = ${telling.n})` : '';
  const moved =
    comparison.shift === 0 || comparison.disagree
      ? ''
      : `, read as ${amount(id, value + comparison.shift)} with the junction potential removed`;
  const head = `${opening(telling.subject, telling.condition)}, ${amountWithin(id, value, telling.u95)}${n}${moved},`;
  const name = comparison.side === 'low' ? telling.lowName : telling.highName;
  const beyond = comparison.margin < 0;
  const direction = (comparison.side === 'low') === beyond ? 'below' : 'above';
  const away = difference(id, comparison.margin);
  const range = low !== null && high !== null && telling.lowName === telling.highName;
  const lies =
    comparison.margin === 0
      ? `lies exactly at ${range ? 'an end of ' : ''}${name}`
      : `lies ${away} ${direction} ${name}`;
  const sentence = (() => {
    if (comparison.outcome === 'outside') return `${head} ${lies}; ${telling.meaning}.`;
    if (comparison.outcome === 'near limit') {
      if (comparison.disagree)
        return `${head} comes out differently against ${name} with and without the junction potential; state “junction” to settle it.`;
      const limit = (comparison.side === 'low' ? low : high)!;
      const read = value + comparison.shift;
      const ends = interval(id, read - uncertainty, read + uncertainty, limit);
      const alone = telling.u95 !== null && Math.abs(uncertainty - telling.u95) < 1e-9 * Math.max(1, uncertainty);
      const known = alone
        ? 'its 95 % interval'
        : `number and limit together are known to ±${difference(id, uncertainty)}, and the 95 % interval`;
      const both = low !== null && high !== null && read - uncertainty < low && read + uncertainty > high;
      const end = comparison.side === 'low' ? 'the lower end' : 'the upper end';
      const which = both ? 'both ends' : range ? end : 'the limit';
      // Both ends have one name: what is above the lower end is inside, and "above the range" would say the reverse.
      const where = range && comparison.margin > 0 ? `lies ${away} inside ${name}` : lies;
      return `${head} ${where}: ${known}, ${ends}, straddles ${which}.`;
    }
    if (range) return `${head} lies within ${name}.`;
    if (comparison.margin === 0) return `${head} meets ${name}.`;
    return `${head} stays ${away} ${direction} ${name}.`;
  })();
  return telling.remark === '' ? sentence : `${sentence} ${telling.remark}`;
}

/** The sentence of a check that could not be held: what is missing, and the facts that would settle it. */
export function tellMissing(
  subject: string,
  why: string,
  missing: readonly string[],
  condition: string | null,
): string {
  const facts = missing.length === 0 ? '' : ` State ${listed(missing.map((key) => `“${key}”`))} to have it judged.`;
  return `${opening(subject, condition)} was not judged: ${why}.${facts}`;
}
