/** Which column of a table is time, voltage and current, in which unit: stated, or found out and said so. */
import { FormatError, firstFew, plain, warning } from './problems.ts';
import type { Dialect } from './text-dialect.ts';
import { type Heading, parseHeading } from './text-headings.ts';
import { cellsOf, numberOf } from './text-numbers.ts';
import type { Problem, ReadingHints, TableMapping } from './types.ts';
import { parseUnit, timeUnitByStep, type Unit } from './units.ts';

export interface ColumnRole {
  /** From 0. */
  column: number;
  /** Shown to people: the heading, or 'column 2'. */
  name: string;
  /** Null: to be settled by the size of the numbers. */
  unit: Unit | null;
  /** Neither header nor sidecar says what this column is; it is taken for a potential if its numbers say so. */
  guessed: boolean;
}

export interface TablePlan {
  time: (ColumnRole & { offset: number; unit: Unit | null }) | null;
  voltage: ColumnRole[];
  current: ColumnRole[];
  /** Stated where there is no column of times. */
  rate_hz: number | null;
  problems: Problem[];
}

/** First rows of the table as numbers, for looking at; a cell that is none is NaN. */
export function sampleRows(lines: readonly string[], dialect: Dialect, most = 400): number[][] {
  return lines
    .slice(dialect.firstLine - 1)
    .filter((text) => text.trim() !== '' && !/^\s*(?:#|%|\/\/|!)/.test(text))
    .slice(0, most)
    .map((text) => cellsOf(text, dialect.separator).map((cell) => numberOf(cell, dialect.decimal)));
}

const nameOf = (heading: Heading | undefined, column: number): string => heading?.text || `column ${column + 1}`;

/** Column that the sidecar means, from 0. */
function resolve(reference: number | string, headings: readonly Heading[], dialect: Dialect): number {
  if (typeof reference === 'number') {
    if (Number.isInteger(reference) && reference >= 1 && reference <= Math.max(dialect.columns, headings.length))
      return reference - 1;
  } else {
    const wanted = reference.trim().toLowerCase();
    const by = (same: (heading: Heading) => boolean): number => headings.findIndex(same);
    const exact = by(({ text }) => text.toLowerCase() === wanted);
    if (exact >= 0) return exact;
    const start = by(({ text }) => text.toLowerCase().replace(/\s*[([].*$/, '') === wanted);
    if (start >= 0) return start;
  }
  const named = headings.filter(({ text }) => text !== '').map(({ text }) => `"${text}"`);
  throw new FormatError({
    code: 'COLUMN_UNKNOWN',
    place: `column ${reference}`,
    message: `The sidecar asks for column ${typeof reference === 'string' ? `"${reference}"` : reference}; the table has ${dialect.columns}${named.length > 0 ? `, headed ${firstFew(named, 10)}` : ' and no header'}.`,
    remedy: 'Correct the column in the sidecar: a number from 1, or the heading as it stands in the file.',
  });
}

interface Shape {
  /** Never falls, and rises over the rows looked at. */
  rises: boolean;
  /** Whole numbers in steps of one. */
  counts: boolean;
  meanStep: number;
}

function shapeOf(rows: readonly number[][], column: number): Shape {
  const values = rows.map((row) => row[column] ?? Number.NaN).filter((value) => !Number.isNaN(value));
  let falls = 0;
  let even = 0;
  const span = (values.at(-1) ?? 0) - (values[0] ?? 0);
  const meanStep = values.length > 1 ? span / (values.length - 1) : 0;
  for (let index = 1; index < values.length; index++) {
    const step = values[index]! - values[index - 1]!;
    if (step < 0) falls++;
    if (Math.abs(step - meanStep) <= 0.51 * meanStep) even++;
  }
  const steps = values.length - 1;
  return {
    rises: values.length >= 8 && span > 0 && falls === 0 && even >= 0.5 * steps,
    counts:
      values.length >= 2 && values.every((v, at) => Number.isInteger(v) && (at === 0 || v - values[at - 1]! === 1)),
    meanStep,
  };
}

/** Sidecar lines that describe a table, questions included. */
export function sidecarFor(parts: { time?: string; rate?: string; voltage?: string; current?: string }): string {
  const lines = [
    parts.time && `  time:    ${parts.time}`,
    parts.rate && `  rate_hz: ${parts.rate}`,
    parts.voltage && `  voltage: ${parts.voltage}`,
    parts.current && `  current: ${parts.current}`,
  ].filter((line) => line !== undefined);
  return ['table:', ...lines].join('\n');
}

function columnOfTimes(
  mapping: TableMapping,
  headings: readonly Heading[],
  dialect: Dialect,
  rows: readonly number[][],
  taken: ReadonlySet<number>,
): number | null {
  if (mapping.time) return resolve(mapping.time.column, headings, dialect);
  if (mapping.rate_hz) return null;
  const named = headings.findIndex(({ kind }) => kind === 'time');
  if (named >= 0) return named;
  if (dialect.columns < 2) return null;
  // Without a header: the first column that rises evenly, row numbers passed over if something else rises too.
  const rising = Array.from({ length: Math.min(3, dialect.columns) }, (_, column) => column).filter(
    (column) =>
      !taken.has(column) && (headings[column]?.kind ?? 'unknown') !== 'voltage' && shapeOf(rows, column).rises,
  );
  const candidates = rising.filter(
    (column) => headings[column]?.kind !== 'number of row or sweep' || headings.length === 0,
  );
  const timeLike = candidates.filter((column) => !shapeOf(rows, column).counts);
  return timeLike[0] ?? candidates[0] ?? null;
}

function rolesOf(
  stated: { columns: (number | string)[]; unit: string } | undefined,
  kind: 'voltage' | 'current',
  headings: readonly Heading[],
  dialect: Dialect,
  time: number | null,
): ColumnRole[] {
  if (stated)
    return stated.columns.map((reference) => {
      const column = resolve(reference, headings, dialect);
      return { column, name: nameOf(headings[column], column), unit: parseUnit(stated.unit), guessed: false };
    });
  return headings.flatMap((heading, column) =>
    heading.kind === kind && column !== time && column < dialect.columns
      ? [{ column, name: nameOf(heading, column), unit: heading.unit, guessed: false }]
      : [],
  );
}

function timeUnit(
  mapping: TableMapping,
  heading: Heading | undefined,
  column: number,
  rows: readonly number[][],
  problems: Problem[],
): Unit {
  if (mapping.time) return parseUnit(mapping.time.unit)!;
  if (heading?.unit) return heading.unit;
  const step = shapeOf(rows, column).meanStep;
  const place = nameOf(heading, column);
  const guess = timeUnitByStep(step);
  const question = (unit: string): string =>
    sidecarFor({
      time: `{ column: ${column + 1}, unit: ${unit} }`,
      voltage: '{ columns: [2], unit: mV }   # as it is',
    });
  if (guess === null)
    throw new FormatError({
      code: 'TIME_UNIT_UNKNOWN',
      place,
      message: `The times rise by ${plain(step)} a row, and nothing says whether these are seconds, milliseconds or microseconds.`,
      remedy: 'State the unit in the sidecar.',
      sidecar: question('ms'),
    });
  problems.push(
    warning({
      code: 'UNIT_GUESSED',
      place,
      message: `No unit of time is stated. The times rise by ${plain(step)} a row; only ${guess} makes that a sampling interval, so ${guess} is taken.`,
      remedy: 'State the unit in the sidecar.',
      sidecar: sidecarFor({ time: `{ column: ${column + 1}, unit: ${guess} }` }),
    }),
  );
  return parseUnit(guess)!;
}

const contradictions = (headings: readonly Heading[]): Problem[] =>
  headings
    .filter(({ contradictory }) => contradictory)
    .map(({ text, kind }) =>
      warning({
        code: 'HEADER_CONTRADICTS',
        place: text,
        message: `The heading "${text}" names one thing and gives the unit of another; it is taken for a ${kind} by its unit.`,
        remedy: 'State the column in the sidecar.',
      }),
    );

const noRecording = (message: string): FormatError =>
  new FormatError({
    code: 'NOT_A_RECORDING',
    place: '',
    message,
    remedy: 'Nothing to do if this is no recording. If it is, say in a sidecar which column is what.',
    sidecar: sidecarFor({ time: '{ column: 1, unit: s }', voltage: '{ columns: [2], unit: mV }' }),
  });

function describeHeadings(headings: readonly Heading[]): string {
  const named = headings.filter(({ text }) => text !== '').map(({ text }) => text);
  return named.length > 0 ? `headed ${firstFew(named, 8)}` : 'without a header';
}

/**
 * @param rows first rows as numbers
 * @throws FormatError where a person must say something first; it carries the lines to paste
 */
export function planTable(dialect: Dialect, rows: readonly number[][], hints: ReadingHints): TablePlan {
  const mapping = hints.table ?? {};
  const headings = (dialect.headings ?? []).map(parseHeading);
  const problems: Problem[] = [...dialect.problems, ...contradictions(headings)];
  const stated = new Set(
    [...(mapping.voltage?.columns ?? []), ...(mapping.current?.columns ?? [])].map((reference) =>
      resolve(reference, headings, dialect),
    ),
  );
  const timeColumn = columnOfTimes(mapping, headings, dialect, rows, stated);
  let voltage = rolesOf(mapping.voltage, 'voltage', headings, dialect, timeColumn);
  let current = rolesOf(mapping.current, 'current', headings, dialect, timeColumn);
  // A column that the sidecar gives one meaning keeps it, whatever its heading says.
  if (mapping.current && !mapping.voltage) voltage = voltage.filter(({ column }) => !stated.has(column));
  if (mapping.voltage && !mapping.current) current = current.filter(({ column }) => !stated.has(column));
  const spoken = mapping.voltage !== undefined || mapping.current !== undefined;
  if (voltage.length + current.length === 0) {
    const named = headings.some(({ kind, text }) => kind === 'unknown' && text !== '');
    const left = Array.from({ length: dialect.columns }, (_, column) => column).filter(
      (column) => column !== timeColumn && headings[column]?.kind !== 'number of row or sweep',
    );
    const data = left.filter((column) => timeColumn === null || !shapeOf(rows, column).counts);
    if (data.length === 0)
      throw noRecording(
        `The table holds ${timeColumn === null ? 'row numbers' : 'times'} and nothing recorded at them (${describeHeadings(headings)}).`,
      );
    if (named && timeColumn === null)
      throw noRecording(
        `No column of this table is a time, a potential or a current (${dialect.columns} columns, ${describeHeadings(headings)}).`,
      );
    voltage = data.map((column) => ({ column, name: nameOf(headings[column], column), unit: null, guessed: true }));
  }
  const rate_hz = mapping.rate_hz ?? hints.rate_hz ?? null;
  if (timeColumn === null) return { time: null, voltage, current, rate_hz, problems };
  const time = {
    column: timeColumn,
    name: nameOf(headings[timeColumn], timeColumn),
    unit: timeUnit(mapping, headings[timeColumn], timeColumn, rows, problems),
    guessed: false,
    offset: mapping.time?.offset ?? 0,
  };
  if (!spoken)
    problems.push(...unusedColumns(headings, [timeColumn, ...[...voltage, ...current].map(({ column }) => column)]));
  return { time, voltage, current, rate_hz: null, problems };
}

/** Headed columns that nothing is read from. */
function unusedColumns(headings: readonly Heading[], used: readonly number[]): Problem[] {
  const unused = headings.filter(
    ({ kind, text }, column) => kind === 'unknown' && text !== '' && !used.includes(column),
  );
  if (unused.length === 0) return [];
  return [
    warning({
      code: 'COLUMNS_UNUSED',
      place: 'header',
      message: `Nothing is read from ${firstFew(unused.map(({ text }) => `"${text}"`))}: the heading names no time, potential or current.`,
      remedy: 'If it matters, say in the sidecar which column is what.',
    }),
  ];
}
