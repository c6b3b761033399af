/** The YAML at the head of a note. */
import { isMap, isScalar, LineCounter, parseDocument } from 'yaml';
import { type NoteProblem, nearest } from './problems.ts';

export interface FrontMatter {
  title: string | null;
  /** ISO date. */
  date: string | null;
  author: string | null;
  cells: { id: string; line: number }[];
  tags: string[];
}

const keys = ['title', 'date', 'author', 'cells', 'tags'];

/** @returns the date part of an ISO 8601 date or date-time that exists in the calendar, else null */
export function isoDate(text: string): string | null {
  const found = /^(\d{4})-(\d{2})-(\d{2})(?:[T ]\d{2}:\d{2}.*)?$/.exec(text.trim());
  if (!found) return null;
  const [year, month, day] = [Number(found[1]), Number(found[2]), Number(found[3])];
  const date = new Date(Date.UTC(year, month - 1, day));
  const real = date.getUTCFullYear() === year && date.getUTCMonth() === month - 1 && date.getUTCDate() === day;
  return real ? `${found[1]}-${found[2]}-${found[3]}` : null;
}

/**
 * @param source YAML between the two lines of dashes
 * @param firstLine line of the note on which `source` begins
 * @returns what could be read, and a problem with its line for everything that could not
 */
export function readFrontMatter(source: string, firstLine: number): { matter: FrontMatter; problems: NoteProblem[] } {
  const matter: FrontMatter = { title: null, date: null, author: null, cells: [], tags: [] };
  const problems: NoteProblem[] = [];
  const counter = new LineCounter();
  const document = parseDocument(source, { lineCounter: counter, prettyErrors: false });
  const lineAt = (offset: number | undefined): number =>
    offset === undefined ? firstLine : firstLine + counter.linePos(offset).line - 1;
  for (const error of document.errors)
    problems.push({
      line: lineAt(error.pos[0]),
      message: `The front matter is not valid YAML: ${error.message}.`,
      remedy: 'Put one "key: value" on a line; quote a value that holds a colon.',
    });
  if (document.errors.length > 0 || document.contents === null) return { matter, problems };
  if (!isMap(document.contents)) {
    problems.push({
      line: firstLine,
      message: 'The front matter is no list of keys and values.',
      remedy: `Write "key: value" lines; known keys are ${keys.join(', ')}.`,
    });
    return { matter, problems };
  }
  for (const pair of document.contents.items) {
    const key = isScalar(pair.key) ? String(pair.key.value) : String(pair.key);
    const node = pair.value as {
      range?: [number, number, number] | null;
      toJS?: (doc: typeof document) => unknown;
    } | null;
    const line = lineAt((pair.key as { range?: [number, number, number] }).range?.[0]);
    let value: unknown;
    try {
      value = node?.toJS?.(document) ?? null;
    } catch (error) {
      problems.push({
        line,
        message: `The front matter's "${key}" could not be read: ${error instanceof Error ? error.message : String(error)}.`,
        remedy: 'Write the value out instead of referring to another.',
      });
      continue;
    }
    const plain = typeof value === 'string' || typeof value === 'number' ? String(value).trim() : null;
    const list = (Array.isArray(value) ? value : plain === null ? [] : plain.split(','))
      .filter((one) => typeof one === 'string' || typeof one === 'number')
      .map((one) => String(one).trim())
      .filter((one) => one !== '');
    const bad = (message: string, remedy: string): void => void problems.push({ line, message, remedy });
    if (!keys.includes(key)) {
      bad(
        `The front matter's key "${key}" is not known.${nearest(key, keys)}`,
        `Known keys are ${keys.join(', ')}; put anything else into the text.`,
      );
    } else if (value === null) {
      // An empty key says nothing and costs nothing.
    } else if (key === 'cells' || key === 'tags') {
      const whole = Array.isArray(value) ? value.length === list.length : plain !== null;
      if (!whole) bad(`The front matter's "${key}" is no list of names.`, `Write ${key}: [one, two].`);
      if (key === 'tags') matter.tags = list;
      else matter.cells = list.map((id) => ({ id, line }));
    } else if (plain === null || plain === '') {
      bad(`The front matter's "${key}" is no text.`, `Write ${key}: and one line of text.`);
    } else if (key === 'date') {
      matter.date = isoDate(plain);
      if (matter.date === null)
        bad(`The date "${plain}" is no date of the calendar as YYYY-MM-DD.`, 'Write it like date: 2026-03-12.');
    } else if (key === 'title') matter.title = plain;
    else matter.author = plain;
  }
  return { matter, problems };
}
