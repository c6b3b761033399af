/** Reads the numbers of a table into columns, or each line into a row of its own. */
import type { Dialect } from './text-dialect.ts';
import { eachLine } from './text-lines.ts';
import { cellBounds, type Precision, parseNumber } from './text-numbers.ts';

/** What went wrong in reading, with the lines where it first did. */
export interface Tally {
  cells: number;
  /** Cells that hold something that is no number, or nothing where a number should be. */
  unreadable: number;
  unreadableLines: number[];
  /** Rows with another number of cells than most. */
  ragged: number;
  raggedLines: number[];
  /** Lines of words among the numbers, left out. */
  words: number;
  wordLines: number[];
}

const remembered = 8;

const note = (lines: number[], line: number): void => {
  if (lines.length < remembered) lines.push(line);
};

const newTally = (): Tally => ({
  cells: 0,
  unreadable: 0,
  unreadableLines: [],
  ragged: 0,
  raggedLines: [],
  words: 0,
  wordLines: [],
});

/** Numbers that arrive one by one, in a typed array that grows by a quarter. */
class Growing {
  values: Float64Array;
  length = 0;

  constructor(capacity: number) {
    this.values = new Float64Array(Math.max(16, capacity));
  }

  push(value: number): void {
    if (this.length === this.values.length) {
      const larger = new Float64Array(Math.ceil(this.length * 1.25) + 16);
      larger.set(this.values);
      this.values = larger;
    }
    this.values[this.length++] = value;
  }

  done(): Float64Array {
    // Copied only where much would be wasted.
    return this.length > 0.8 * this.values.length
      ? this.values.subarray(0, this.length)
      : this.values.slice(0, this.length);
  }
}

const isCommentByte = (bytes: Uint8Array, from: number, to: number): boolean => {
  let at = from;
  while (at < to && (bytes[at] === 0x20 || bytes[at] === 0x09)) at++;
  const byte = bytes[at];
  return at < to && (byte === 0x23 || byte === 0x25 || byte === 0x21 || (byte === 0x2f && bytes[at + 1] === 0x2f));
};

const isBlankLine = (bytes: Uint8Array, from: number, to: number): boolean => {
  for (let at = from; at < to; at++) if (bytes[at] !== 0x20 && bytes[at] !== 0x09) return false;
  return true;
};

const decimalByte = (dialect: Dialect): number => (dialect.decimal === 'comma' ? 0x2c : 0x2e);

export interface Columns {
  columns: Float64Array[];
  /** Digits of the column of times, which limit how exactly they can lie on a grid. */
  precision: Precision;
  tally: Tally;
  rows: number;
}

/**
 * Reads some columns of a table.
 *
 * @param wanted columns, from 0
 * @param time which of the wanted ones is time, as a place in `wanted`; −1 for none
 * @param expectedRows room to begin with
 */
export function readColumns(
  path: string,
  dialect: Dialect,
  wanted: readonly number[],
  time: number,
  expectedRows: number,
): Columns {
  const decimal = decimalByte(dialect);
  const growing = wanted.map(() => new Growing(expectedRows));
  const precision: Precision = { significant: 0, decimals: 0 };
  const tally = newTally();
  const bounds: number[] = [];
  const values = new Float64Array(wanted.length);
  eachLine(path, (bytes, from, to, line) => {
    if (line < dialect.firstLine || isBlankLine(bytes, from, to) || isCommentByte(bytes, from, to)) return true;
    const cells = cellBounds(bytes, from, to, dialect.separator, bounds);
    let readable = 0;
    for (let place = 0; place < wanted.length; place++) {
      const column = wanted[place]!;
      const value =
        column < cells
          ? parseNumber(
              bytes,
              bounds[2 * column]!,
              bounds[2 * column + 1]!,
              decimal,
              place === time ? precision : undefined,
            )
          : Number.NaN;
      values[place] = value;
      if (!Number.isNaN(value)) readable++;
    }
    // With a time base a line of words leaves no hole that would go unseen; without one it must keep its place.
    if (readable === 0 && time >= 0) {
      tally.words++;
      note(tally.wordLines, line);
      return true;
    }
    tally.cells += wanted.length;
    if (readable < wanted.length) {
      tally.unreadable += wanted.length - readable;
      note(tally.unreadableLines, line);
    }
    if (cells < dialect.columns || (cells > dialect.columns && hasMore(bytes, bounds, cells, dialect.columns))) {
      tally.ragged++;
      note(tally.raggedLines, line);
    }
    for (let place = 0; place < wanted.length; place++) growing[place]!.push(values[place]!);
    return true;
  });
  return { columns: growing.map((column) => column.done()), precision, tally, rows: growing[0]?.length ?? 0 };
}

/** Cells beyond the usual ones that are not empty. */
function hasMore(bytes: Uint8Array, bounds: readonly number[], cells: number, columns: number): boolean {
  for (let cell = columns; cell < cells; cell++)
    if (!isBlankLine(bytes, bounds[2 * cell]!, bounds[2 * cell + 1]!)) return true;
  return false;
}

export interface Rows {
  rows: Float64Array[];
  /** Line of each row. */
  lines: number[];
  precision: Precision;
  tally: Tally;
}

/** Reads every line into a row of numbers; empty cells at the end of a line are none. */
export function readRows(path: string, dialect: Dialect): Rows {
  const decimal = decimalByte(dialect);
  const precision: Precision = { significant: 0, decimals: 0 };
  const tally = newTally();
  const bounds: number[] = [];
  const rows: Float64Array[] = [];
  const lines: number[] = [];
  eachLine(path, (bytes, from, to, line) => {
    if (line < dialect.firstLine || isBlankLine(bytes, from, to) || isCommentByte(bytes, from, to)) return true;
    let cells = cellBounds(bytes, from, to, dialect.separator, bounds);
    while (cells > 0 && isBlankLine(bytes, bounds[2 * cells - 2]!, bounds[2 * cells - 1]!)) cells--;
    const row = new Float64Array(cells);
    let unreadable = 0;
    for (let cell = 0; cell < cells; cell++) {
      row[cell] = parseNumber(bytes, bounds[2 * cell]!, bounds[2 * cell + 1]!, decimal, precision);
      if (Number.isNaN(row[cell]!)) unreadable++;
    }
    tally.cells += cells;
    tally.unreadable += unreadable;
    if (unreadable > 0) note(tally.unreadableLines, line);
    rows.push(row);
    lines.push(line);
    return true;
  });
  return { rows, lines, precision, tally };
}
