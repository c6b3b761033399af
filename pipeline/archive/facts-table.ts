/** facts.csv as labs keep it: saved from a spreadsheet, with a byte order mark, semicolons, blank rows and quotes. */
import { type CsvError, parse } from 'csv-parse/sync';
import { checkCellReference, checkFact, factKey, factKeys, nearestOf } from './fact-keys.ts';
import type { Statement } from './types.ts';
import { type ArchiveProblem, decodeUtf, loss, remark } from './yaml-file.ts';

export interface FactsTable {
  /** Statements by cell id. */
  byCell: Record<string, Statement[]>;
  /** Cell ids by the path in the optional column `file`, with the line that states it. */
  byFile: Map<string, { cell: string; line: number }>;
  /** Line of each cell's first row. */
  lines: Record<string, number>;
  problems: ArchiveProblem[];
}

/** How many bad values of one column are told one by one before the rest is counted. */
const toldOneByOne = 5;

/** Said in a cell of the sheet by people who mean that there is nothing to say. */
const blank = /^(n\/?a|nd|n\.d\.|-|–|—|\?|none|nan|null)$/i;

/**
 * Reads the table. One row a cell; columns are fact keys, `cell` among them, and optionally `file` (a path inside the
 * archive), which says that this file's recording is that cell and may repeat a cell for each of its files.
 */
export function readFactsTable(path: string, bytes: Uint8Array): FactsTable {
  const table: FactsTable = {
    byCell: Object.create(null),
    byFile: new Map(),
    lines: Object.create(null),
    problems: [],
  };
  const { problems } = table;
  let text: string;
  try {
    text = decodeUtf(bytes);
  } catch {
    text = new TextDecoder('windows-1252').decode(bytes);
    problems.push(
      remark(
        path,
        null,
        'TABLE_NOT_UTF8',
        '',
        'The table is not UTF-8; it was read as Western European text.',
        'Save it as "CSV UTF-8" and check letters such as µ, é and ß.',
      ),
    );
  }
  const separator = separatorOf(text);
  let rows: { record: string[]; line: number }[];
  try {
    rows = parseRows(text, separator);
  } catch (error) {
    const line = (error as CsvError & { lines?: number }).lines;
    problems.push(
      loss(
        path,
        typeof line === 'number' ? line : null,
        'TABLE_UNREADABLE',
        `The table cannot be read: ${(error as Error).message.split('\n')[0]}.`,
        'Nothing in it was used. Check the quotation marks around that line.',
      ),
    );
    return table;
  }
  const heading = rows.shift();
  if (!heading) return table;
  const columns = readHeading(path, heading, rows, problems);
  const cellColumn = columns.indexOf('cell');
  if (cellColumn < 0) {
    problems.push(
      loss(
        path,
        heading.line,
        'TABLE_WITHOUT_CELL',
        'The first row names no column "cell".',
        'Nothing in the table was used. Add a column "cell" with the id of each row\'s cell.',
      ),
    );
    return table;
  }
  const counts = new Map<string, number>();
  const sayOfColumn = (column: string, problem: ArchiveProblem): void => {
    const count = (counts.get(column) ?? 0) + 1;
    counts.set(column, count);
    if (count <= toldOneByOne) problems.push(problem);
  };
  for (const { record, line } of rows) {
    if (record.every((value) => value.trim() === '')) continue;
    if (record.slice(columns.length).some((value) => value.trim() !== ''))
      sayOfColumn(
        '(too many)',
        remark(
          path,
          line,
          'TABLE_ROW_LONG',
          '',
          `The row has ${record.length} values under ${columns.length} headings.`,
          'The values beyond the headings were not used. Check for a stray separator.',
        ),
      );
    const id = checkCellReference(record[cellColumn] ?? '');
    if (!id.ok) {
      sayOfColumn(
        'cell',
        remark(
          path,
          line,
          'TABLE_ROW_WITHOUT_CELL',
          'cell',
          `${id.message}.`,
          'The row was not used. Give it the id of its cell.',
        ),
      );
      continue;
    }
    readRow(path, table, { record, line }, columns, String(id.value), separator, sayOfColumn);
  }
  for (const [column, count] of counts)
    if (count > toldOneByOne)
      problems.push(
        remark(
          path,
          null,
          'TABLE_MORE',
          column,
          `${count - toldOneByOne} more rows have the same trouble in this column.`,
          'Correct the whole column in the spreadsheet.',
        ),
      );
  return table;
}

function parseRows(text: string, separator: string): { record: string[]; line: number }[] {
  const parsed = parse(text, {
    delimiter: separator,
    info: true,
    relax_column_count: true,
    relax_quotes: true,
    skip_empty_lines: true,
    record_delimiter: ['\r\n', '\n', '\r'],
    max_record_size: 1_000_000,
  }) as unknown as { record: string[]; info: { lines: number } }[];
  return parsed.map(({ record, info }) => ({ record, line: info.lines }));
}

/** The separator that the first line holds most of, quoted stretches aside; a comma where it holds none. */
function separatorOf(text: string): string {
  const first = text
    .trimStart()
    .split(/[\r\n]/, 1)[0]!
    .replace(/"[^"]*"/g, '');
  const counted = [',', ';', '\t'].map((mark) => ({ mark, count: first.split(mark).length }));
  return counted.reduce((most, one) => (one.count > most.count ? one : most)).mark;
}

function readHeading(
  path: string,
  heading: { record: string[]; line: number },
  rows: { record: string[] }[],
  problems: ArchiveProblem[],
): (string | null)[] {
  const seen = new Set<string>();
  return heading.record.map((written, index) => {
    const key = written
      .trim()
      .toLowerCase()
      .replace(/[\s-]+/g, '_');
    const say = (code: string, message: string, remedy: string): null => {
      problems.push(remark(path, heading.line, code, written.trim() || `column ${index + 1}`, message, remedy));
      return null;
    };
    if (key === '') {
      if (rows.some(({ record }) => (record[index] ?? '').trim() !== ''))
        say(
          'TABLE_COLUMN_UNNAMED',
          `Column ${index + 1} has values and no heading.`,
          'The column was not used. Head it with a fact key.',
        );
      return null;
    }
    if (key !== 'file' && !factKey(key)) {
      const nearest = nearestOf(key, ['file', ...factKeys.map((known) => known.key)]);
      return say(
        'FACT_UNKNOWN',
        `"${written.trim()}" is not a fact key; the nearest is "${nearest}".`,
        'The column was not used. Correct its heading; what fits no key goes under "note".',
      );
    }
    if (seen.has(key))
      return say(
        'TABLE_COLUMN_TWICE',
        `Two columns are headed "${key}".`,
        'The second was not used. Remove one of them.',
      );
    seen.add(key);
    return key;
  });
}

function readRow(
  path: string,
  table: FactsTable,
  row: { record: string[]; line: number },
  columns: (string | null)[],
  cell: string,
  separator: string,
  say: (column: string, problem: ArchiveProblem) => void,
): void {
  const statements: Statement[] = [];
  let file = '';
  for (const [index, key] of columns.entries()) {
    const value = (row.record[index] ?? '').trim();
    if (key === null || value === '') continue;
    if (key === 'file') {
      file = value.replaceAll('\\', '/').replace(/^\.\//, '');
      continue;
    }
    const kind = factKey(key)!.kind;
    if (kind !== 'text' && blank.test(value)) continue;
    // Sheets with a comma as decimal mark are saved with another separator.
    const spelled =
      kind === 'number' && separator !== ',' && /^[+-−–]?\d+,\d+$/.test(value) ? value.replace(',', '.') : value;
    const checked = key === 'cell' ? checkCellReference(spelled) : checkFact(key, spelled);
    if (checked.ok)
      statements.push({ key, value: checked.value, origin: { level: 'facts.csv', path, line: row.line } });
    else
      say(
        key,
        remark(
          path,
          row.line,
          'FACT_IMPOSSIBLE',
          key,
          `${checked.message}.`,
          'The value was not used. Correct it in the spreadsheet and save the table again.',
        ),
      );
  }
  const before = table.byCell[cell];
  if (file !== '') {
    const other = table.byFile.get(file);
    if (other && other.cell !== cell)
      say(
        'file',
        remark(
          path,
          row.line,
          'TABLE_FILE_TWICE',
          'file',
          `${file} is given to the cell "${cell}" here and to "${other.cell}" in line ${other.line}.`,
          'The first line was used. Correct one of them; several cells in one file are stated in its sidecar under "cells:".',
        ),
      );
    else table.byFile.set(file, { cell, line: row.line });
  } else if (before) {
    say(
      '(twice)',
      remark(
        path,
        row.line,
        'TABLE_CELL_TWICE',
        'cell',
        `The cell "${cell}" has a row already, in line ${table.lines[cell]}.`,
        'This row was not used. Keep one row a cell; a column "file" allows one row a file.',
      ),
    );
    return;
  }
  table.lines[cell] ??= row.line;
  table.byCell[cell] = [...(before ?? []), ...statements];
}
