/** Fenced blocks with the language `sweep`: a stretch of a recording that the site draws in the note. */
import { isMap, LineCounter, parseDocument } from 'yaml';
import type { NoteFigure } from '../ledger/types.ts';
import { type NoteProblem, nearest } from './problems.ts';

const keys = ['cell', 'sweep', 'from_s', 'to_s', 'caption'];
const remedy = 'Write cell: ID and, if wanted, sweep: NUMBER, from_s:, to_s: (seconds) and caption:, one on a line.';

/**
 * @param source body of the block
 * @param firstLine line of the note on which the body begins
 * @returns the figure, or null where it cannot be drawn; a problem with its line for everything that is wrong
 */
export function readFigure(
  source: string,
  firstLine: number,
  cellIds: ReadonlySet<string>,
): { figure: NoteFigure | null; caption: string; problems: NoteProblem[] } {
  const problems: NoteProblem[] = [];
  const counter = new LineCounter();
  const document = parseDocument(source, { lineCounter: counter, prettyErrors: false });
  const bad = (line: number, message: string, what = remedy): void =>
    void problems.push({ line, message, remedy: what });
  const failed = document.errors[0];
  if (failed) {
    bad(firstLine + counter.linePos(failed.pos[0]).line - 1, `The sweep block is not valid YAML: ${failed.message}.`);
    return { figure: null, caption: '', problems };
  }
  if (!isMap(document.contents)) {
    bad(firstLine, 'The sweep block holds no keys and values.');
    return { figure: null, caption: '', problems };
  }
  const values = new Map<string, { value: unknown; line: number }>();
  for (const pair of document.contents.items) {
    const key = String(pair.key);
    const range = (pair.key as { range?: [number, number, number] }).range;
    const line = range ? firstLine + counter.linePos(range[0]).line - 1 : firstLine;
    if (!keys.includes(key)) {
      bad(
        line,
        `The sweep block's key "${key}" is not known.${nearest(key, keys)}`,
        `Known keys are ${keys.join(', ')}.`,
      );
      continue;
    }
    const node = pair.value as { value?: unknown } | null;
    values.set(key, { value: node && 'value' in node ? node.value : node, line });
  }
  const lineOf = (key: string): number => values.get(key)?.line ?? firstLine;
  const text = (key: string): string | null => {
    const value = values.get(key)?.value;
    return typeof value === 'string' || typeof value === 'number' ? String(value).trim() : null;
  };
  /** A number of 0 or more; anything else is a problem and null. */
  const number = (key: string, whole: boolean): number | null => {
    const value = values.get(key)?.value;
    if (value === undefined || value === null) return null;
    if (typeof value === 'number' && Number.isFinite(value) && value >= 0 && (!whole || Number.isInteger(value)))
      return value;
    bad(lineOf(key), `The sweep block's "${key}" must be a ${whole ? 'whole ' : ''}number of 0 or more.`);
    return null;
  };
  const caption = text('caption') ?? '';
  const cell = text('cell');
  const sweep = number('sweep', true);
  const from = number('from_s', false);
  const to = number('to_s', false);
  if (cell === null || cell === '') {
    bad(firstLine, 'The sweep block names no cell.');
    return { figure: null, caption, problems };
  }
  if (!cellIds.has(cell)) {
    bad(
      lineOf('cell'),
      `The sweep block's cell "${cell}" is no cell of this archive.${nearest(cell, cellIds)}`,
      'Correct the id; "list" prints the ids in use.',
    );
    return { figure: null, caption, problems };
  }
  if (from !== null && to !== null && to <= from) {
    bad(lineOf('to_s'), `The sweep block's to_s (${to}) is not after from_s (${from}).`);
    return { figure: { cell, sweep, from_s: null, to_s: null, caption }, caption, problems };
  }
  return { figure: { cell, sweep, from_s: from, to_s: to, caption }, caption, problems };
}
