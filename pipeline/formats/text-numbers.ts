/** Numbers out of bytes, exact to the last bit, and cells out of lines. */

const exactPowers = Array.from({ length: 23 }, (_, power) => Number(`1e${power}`));

const isBlank = (byte: number): boolean => byte === 0x20 || byte === 0x09;

/** Written for 'no value'; they count as unreadable, and as cells of a numeric column. */
const absent = /^(?:[+-]?(?:nan|inf|infinity)(?:\([^)]*\))?|n\/?a|null|none|-+|\.|#n\/a|#num!|1\.#(?:ind|inf|qnan))$/i;
export const isAbsentNumber = (text: string): boolean => absent.test(text.trim());

/** How many digits a number was written with, from the first that is not zero; and behind the decimal sign. */
export interface Precision {
  significant: number;
  decimals: number;
}

/**
 * The number written in `bytes[from, to)`, blanks and one pair of quotes around it allowed; exponents with e or d.
 *
 * @param decimal byte of the decimal sign: 0x2e or 0x2c
 * @param precision widened by this number's digits, if given
 * @returns NaN where these bytes are no finite number
 */
export function parseNumber(
  bytes: Uint8Array,
  from: number,
  to: number,
  decimal: number,
  precision?: Precision,
): number {
  let at = from;
  let end = to;
  while (at < end && isBlank(bytes[at]!)) at++;
  while (end > at && isBlank(bytes[end - 1]!)) end--;
  if (end - at >= 2 && bytes[at] === 0x22 && bytes[end - 1] === 0x22) {
    at++;
    end--;
    while (at < end && isBlank(bytes[at]!)) at++;
    while (end > at && isBlank(bytes[end - 1]!)) end--;
  }
  const first = at;
  let negative = false;
  if (bytes[at] === 0x2d || bytes[at] === 0x2b) {
    negative = bytes[at] === 0x2d;
    at++;
  } else if (bytes[at] === 0xe2 && bytes[at + 1] === 0x88 && bytes[at + 2] === 0x92) {
    negative = true;
    at += 3;
  }
  const digitsFrom = at;
  let mantissa = 0;
  let significant = 0;
  let digits = 0;
  let decimals = 0;
  let seenDecimal = false;
  for (; at < end; at++) {
    const byte = bytes[at]!;
    if (byte >= 0x30 && byte <= 0x39) {
      digits++;
      if (seenDecimal) decimals++;
      if (significant > 0 || byte !== 0x30) significant++;
      mantissa = mantissa * 10 + (byte - 0x30);
    } else if (byte === decimal && !seenDecimal) seenDecimal = true;
    else break;
  }
  if (digits === 0) return Number.NaN;
  let exponent = 0;
  const marker = bytes[at]!;
  if (at < end && (marker === 0x65 || marker === 0x45 || marker === 0x64 || marker === 0x44)) {
    at++;
    let sign = 1;
    if (bytes[at] === 0x2d || bytes[at] === 0x2b) {
      sign = bytes[at] === 0x2d ? -1 : 1;
      at++;
    }
    const exponentFrom = at;
    for (; at < end && bytes[at]! >= 0x30 && bytes[at]! <= 0x39; at++) exponent = exponent * 10 + (bytes[at]! - 0x30);
    if (at === exponentFrom) return Number.NaN;
    exponent *= sign;
  }
  if (at !== end) return Number.NaN;
  if (precision) {
    if (significant > precision.significant) precision.significant = significant;
    if (decimals - exponent > precision.decimals) precision.decimals = decimals - exponent;
  }
  const power = exponent - decimals;
  // Up to 15 digits and 22 powers of ten one rounding is exact; beyond, the language's own reader is.
  if (significant <= 15 && power >= -22 && power <= 22) {
    const value = power < 0 ? mantissa / exactPowers[-power]! : mantissa * exactPowers[power]!;
    return negative ? -value : value;
  }
  let text = '';
  for (let index = digitsFrom; index < end; index++) {
    const byte = bytes[index]!;
    text += byte === decimal ? '.' : byte === 0x64 || byte === 0x44 ? 'e' : String.fromCharCode(byte);
  }
  const value = Number(text);
  if (!Number.isFinite(value) || first === end) return Number.NaN;
  return negative ? -value : value;
}

/** Separators as bytes; blanks fold into one another and do not count at the ends of a line. */
export type Separator = ',' | ';' | 'tab' | 'space';

const separatorBytes: Record<Separator, number> = { ',': 0x2c, ';': 0x3b, tab: 0x09, space: 0x20 };

/** Beginnings and ends of the cells of a line, in pairs. A separator between quotes parts nothing. */
export function cellBounds(
  bytes: Uint8Array,
  from: number,
  to: number,
  separator: Separator,
  bounds: number[],
): number {
  let cells = 0;
  let at = from;
  if (separator === 'space') {
    while (at < to) {
      while (at < to && isBlank(bytes[at]!)) at++;
      if (at >= to) break;
      const begin = at;
      const quoted = bytes[at] === 0x22;
      if (quoted) {
        at++;
        while (at < to && bytes[at] !== 0x22) at++;
        at++;
      }
      while (at < to && !isBlank(bytes[at]!)) at++;
      bounds[2 * cells] = begin;
      bounds[2 * cells + 1] = Math.min(at, to);
      cells++;
    }
    return cells;
  }
  const part = separatorBytes[separator];
  let begin = from;
  let quoted = false;
  for (; at <= to; at++) {
    const byte = at === to ? part : bytes[at]!;
    if (byte === 0x22) quoted = !quoted;
    if (at < to && (byte !== part || quoted)) continue;
    bounds[2 * cells] = begin;
    bounds[2 * cells + 1] = at;
    cells++;
    begin = at + 1;
  }
  return cells;
}

const encoder = new TextEncoder();

/** Cells of a line of text, quotes taken off. */
export function cellsOf(line: string, separator: Separator): string[] {
  const bytes = encoder.encode(line);
  const bounds: number[] = [];
  const cells = cellBounds(bytes, 0, bytes.length, separator, bounds);
  const decoder = new TextDecoder();
  return Array.from({ length: cells }, (_, cell) => {
    const text = decoder.decode(bytes.subarray(bounds[2 * cell]!, bounds[2 * cell + 1]!)).trim();
    return text.length >= 2 && text.startsWith('"') && text.endsWith('"')
      ? text.slice(1, -1).replaceAll('""', '"').trim()
      : text;
  });
}

/** The number a text stands for, NaN where it is none. */
export function numberOf(text: string, decimal: 'point' | 'comma'): number {
  const bytes = encoder.encode(text);
  return parseNumber(bytes, 0, bytes.length, decimal === 'comma' ? 0x2c : 0x2e);
}
