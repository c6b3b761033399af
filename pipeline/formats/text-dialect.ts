/** Finds out how a table of text is written: separator, decimal sign, where its numbers begin, what its columns are called. */
import { count, FormatError, plain, warning } from './problems.ts';
import type { Head } from './text-lines.ts';
import { cellsOf, isAbsentNumber, numberOf, type Separator } from './text-numbers.ts';
import type { Problem, TableMapping } from './types.ts';
import { parseUnit } from './units.ts';

export interface Dialect {
  separator: Separator;
  decimal: 'point' | 'comma';
  /** Line of the first row of numbers, from 1. */
  firstLine: number;
  /** Columns of most rows, empty ones at the end not counted. */
  columns: number;
  /** One heading a column, null where there are none or they do not fit. */
  headings: string[] | null;
  problems: Problem[];
}

interface Row {
  line: number;
  text: string;
}

interface Trial {
  separator: Separator;
  decimal: 'point' | 'comma';
  /** Cells of each row, empty ones at the end taken off. */
  cells: string[][];
  numeric: boolean[];
  rowsOfNumbers: number;
  columns: number;
  /** Columns that hold words in most rows. */
  wordy: Set<number>;
}

const isComment = (text: string): boolean => /^\s*(?:#|%|\/\/|!)/.test(text);

function mode(values: readonly number[]): number {
  const counts = new Map<number, number>();
  for (const value of values) counts.set(value, (counts.get(value) ?? 0) + 1);
  let best = 0;
  for (const [value, n] of counts) if (n > (counts.get(best) ?? 0)) best = value;
  return best;
}

function withoutEmptyEnd(cells: string[]): string[] {
  let length = cells.length;
  while (length > 0 && cells[length - 1] === '') length--;
  return cells.slice(0, length);
}

type CellKind = 'number' | 'absent' | 'empty' | 'word';

const kindOf = (cell: string, decimal: 'point' | 'comma'): CellKind =>
  cell === '' ? 'empty' : !Number.isNaN(numberOf(cell, decimal)) ? 'number' : isAbsentNumber(cell) ? 'absent' : 'word';

function tryDialect(rows: readonly Row[], separator: Separator, decimal: 'point' | 'comma'): Trial {
  const cells = rows.map(({ text }) => withoutEmptyEnd(cellsOf(text, separator)));
  const kinds = cells.map((row) => row.map((cell) => kindOf(cell, decimal)));
  const widths = cells.map((row) => row.length).filter((length) => length > 0);
  const widest = widths.reduce((a, b) => Math.max(a, b), 0);
  // Where later columns are often empty the header is as wide as the widest row.
  const columns = widths[0] === widest && widths.filter((width) => width === widest).length > 1 ? widest : mode(widths);
  const wordy = new Set<number>();
  if (columns > 1)
    for (let column = 0; column < columns; column++) {
      const here = kinds.map((row) => row[column]).filter((kind) => kind !== undefined && kind !== 'empty');
      if (here.length >= 0.5 * rows.length && here.filter((kind) => kind === 'word').length > 0.5 * here.length)
        wordy.add(column);
    }
  if (wordy.size > columns / 2) wordy.clear();
  const numeric = kinds.map(
    (row) =>
      row.some((kind, column) => kind === 'number' && !wordy.has(column)) &&
      row.every((kind, column) => kind !== 'word' || wordy.has(column)),
  );
  return { separator, decimal, cells, numeric, rowsOfNumbers: numeric.filter(Boolean).length, columns, wordy };
}

const sidecarOf = (lines: string[]): string => ['table:', ...lines.map((line) => `  ${line}`)].join('\n');

/** '12,5' on every line: two whole numbers, or one with a decimal comma? Some digits tell, some do not. */
function commaMeaning(trial: Trial): 'separator' | 'decimal' | 'unclear' {
  const rows = trial.cells.filter((_, index) => trial.numeric[index]);
  if (!rows.every((row) => row.every((cell) => cell === '' || /^[+-]?\d+$/.test(cell)))) return 'separator';
  const second = rows.map((row) => row[1] ?? '');
  if (trial.columns === 2) {
    if (second.some((cell) => /^[+-]/.test(cell))) return 'separator';
    if (second.some((cell) => /^0\d/.test(cell)) || rows.some((row) => /^-0+$/.test(row[0]!))) return 'decimal';
    const first = rows.map((row) => Number(row[0]));
    const step = first.length > 2 ? first[1]! - first[0]! : 0;
    if (step > 0 && first.every((value, index) => index === 0 || value - first[index - 1]! === step))
      return 'separator';
    return 'unclear';
  }
  const zeroLed = rows.some((row) => row.some((cell, column) => column % 2 === 1 && /^0\d/.test(cell)));
  return trial.columns % 2 === 0 && zeroLed ? 'unclear' : 'separator';
}

function chooseTrial(rows: readonly Row[], mapping: TableMapping): Trial {
  const separators: Separator[] =
    mapping.separator && mapping.separator !== 'auto' ? [mapping.separator] : ['tab', ';', ',', 'space'];
  const decimals: ('point' | 'comma')[] = mapping.decimal ? [mapping.decimal] : ['point', 'comma'];
  const trials = decimals.flatMap((decimal) => separators.map((separator) => tryDialect(rows, separator, decimal)));
  // Columns of words speak against a reading that has them.
  const score = (trial: Trial): number => trial.rowsOfNumbers * (trial.wordy.size > 0 ? 0.6 : 1);
  const best = Math.max(...trials.map(score));
  const level = trials.filter((trial) => score(trial) >= 0.98 * best && trial.rowsOfNumbers > 0);
  if (level.length === 0) return trials[0]!;
  const single = level.find((trial) => trial.decimal === 'comma' && trial.columns < 2);
  const byComma = level.find((trial) => trial.separator === ',' && trial.decimal === 'point' && trial.columns > 1);
  if (byComma && mapping.separator !== ',' && mapping.decimal !== 'point') {
    const meaning = commaMeaning(byComma);
    if (meaning === 'unclear')
      throw new FormatError({
        code: 'TABLE_AMBIGUOUS',
        place: `line ${rows[0]!.line}`,
        message: 'The commas of this table may part columns or decimals, and nothing in it tells which.',
        remedy: 'Say in the sidecar what the comma is.',
        sidecar: sidecarOf(["separator: ','   # or 'decimal: comma' with another separator"]),
      });
    if (meaning === 'decimal' && single) return single;
    if (meaning === 'separator') return byComma;
  }
  return level.reduce((chosen, trial) => (trial.columns > chosen.columns ? trial : chosen));
}

/** First row from which on nearly all rows are numbers. */
function firstOfBlock(trial: Trial): number {
  const { numeric, cells, columns } = trial;
  for (let row = 0; row < numeric.length; row++) {
    if (!numeric[row]) continue;
    const next = numeric.slice(row, row + 6);
    const widths = cells.slice(row, row + 6).filter(({ length }) => length === columns).length;
    if (next.filter(Boolean).length >= 0.8 * next.length && widths >= 0.5 * next.length) return row;
  }
  return numeric.indexOf(true);
}

/** A row of nothing but units under the row of names. */
const isUnitsRow = (cells: readonly string[]): boolean =>
  cells.some((cell) => cell !== '') && cells.every((cell) => cell === '' || parseUnit(cell) !== null);

const withoutCommentSign = (text: string): string => text.replace(/^\s*(?:#|%|\/\/|!)+\s?/, '');

interface Headings {
  headings: string[] | null;
  problems: Problem[];
}

function fitHeadings(cells: string[], columns: number, line: number, firstRow: readonly string[]): Headings {
  if (cells.length === columns) return { headings: cells, problems: [] };
  if (cells.length < columns && cells.length === columns - 1 && /^\d+$/.test(firstRow[0] ?? ''))
    // Tables written with row numbers have no heading above them.
    return { headings: ['', ...cells], problems: [] };
  if (cells.length < columns)
    return { headings: [...cells, ...Array<string>(columns - cells.length).fill('')], problems: [] };
  return {
    headings: null,
    problems: [
      warning({
        code: 'HEADER_MISMATCH',
        place: `line ${line}`,
        message: `The header names ${count(cells.length, 'column')} (${cells.join(', ')}), the rows have ${columns}. It cannot tell which is which and is not used.`,
        remedy: 'Correct the header, or name columns by number in the sidecar.',
      }),
    ],
  };
}

function findHeadings(rows: readonly Row[], all: readonly Row[], trial: Trial, block: number): Headings {
  const none: Headings = { headings: null, problems: [] };
  const firstRow = trial.cells[block] ?? [];
  const above = all.filter(({ line }) => line < rows[block]!.line);
  let at = above.length - 1;
  if (at < 0) return none;
  // One value a line shows no separator, its header may.
  const separators: Separator[] = trial.columns > 1 ? [trial.separator] : ['tab', ';', ','];
  const cellsAt = (index: number): string[] =>
    separators
      .map((separator) => withoutEmptyEnd(cellsOf(withoutCommentSign(above[index]!.text), separator)))
      .reduce((most, cells) => (cells.length > most.length ? cells : most));
  let units: string[] | null = null;
  if (at > 0 && isUnitsRow(cellsAt(at)) && cellsAt(at).length > 1) {
    units = cellsAt(at);
    at--;
  }
  const cells = cellsAt(at);
  const words = cells.some((cell) => /[A-Za-zµΩ]/.test(cell));
  if (!words || (isComment(above[at]!.text) && cells.length !== trial.columns))
    return units ? fitHeadings(units, trial.columns, above[at + 1]!.line, firstRow) : none;
  const named = units
    ? cells.map((cell, column) => (units[column] ? `${cell} (${units[column]!.replace(/^[([]|[)\]]$/g, '')})` : cell))
    : cells;
  // A sentence above the numbers is no header.
  if (named.length === 1 && trial.columns > 1) return none;
  return fitHeadings(named, trial.columns, above[at]!.line, firstRow);
}

/** What a text without numbers begins with, for a message. */
const quoteStart = (rows: readonly Row[]): string => (rows[0]?.text ?? '').trim().replace(/\s+/g, ' ').slice(0, 60);

/**
 * @param head beginning of the file
 * @param mapping what the sidecar states; the rest is found out
 * @throws FormatError NOT_A_RECORDING where most lines are no rows of numbers
 */
export function findDialect(head: Head, mapping: TableMapping): Dialect {
  const all = head.lines
    .map((text, index): Row => ({ line: index + 1, text }))
    .filter(({ line, text }) => line > (mapping.skip_lines ?? 0) && text.trim() !== '');
  const rows = all.filter(({ text }) => !isComment(text));
  const stop = (message: string): FormatError =>
    new FormatError({
      code: 'NOT_A_RECORDING',
      place: rows[0] ? `line ${rows[0].line}` : '',
      message,
      remedy: 'Nothing to do if this is no recording. If it is, say in a sidecar how to read it.',
      sidecar: sidecarOf(['skip_lines: 0', 'time:    { column: 1, unit: s }', 'voltage: { columns: [2], unit: mV }']),
    });
  if (rows.length === 0) throw stop('The file holds no lines but empty ones and comments.');
  const trial = chooseTrial(rows, mapping);
  const share = trial.rowsOfNumbers / rows.length;
  const block = trial.rowsOfNumbers > 0 ? firstOfBlock(trial) : -1;
  const after = trial.numeric.slice(Math.max(0, block));
  const shareAfter = after.filter(Boolean).length / after.length;
  if (block < 0 || shareAfter < 0.7)
    throw stop(
      `This is no table of samples: ${trial.rowsOfNumbers} of ${count(rows.length, 'line')} are rows of numbers (${plain(100 * share)} %). It begins "${quoteStart(rows)}".`,
    );
  const found = mapping.header === false ? { headings: null, problems: [] } : findHeadings(rows, all, trial, block);
  const { headings, problems } =
    mapping.header === true && !found.headings && found.problems.length === 0
      ? { headings: trial.cells[block]!, problems: [] }
      : found;
  const firstRow = mapping.header === true && headings === trial.cells[block] ? block + 1 : block;
  if (trial.wordy.size > 0 && !headings && !mapping.voltage && !mapping.current)
    throw stop(
      `This is no table of samples: ${count(trial.wordy.size, 'column')} hold words, and no header that fits the rows names the others.`,
    );
  return {
    separator: trial.separator,
    decimal: trial.decimal,
    firstLine: rows[firstRow]?.line ?? rows[block]!.line,
    columns: trial.columns,
    headings,
    problems,
  };
}
