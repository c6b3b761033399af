import { closest, distance } from 'fastest-levenshtein';
import type { NoteRow } from '../ledger/types.ts';

export type NoteProblem = NoteRow['problems'][number];

/** ' The nearest is "x".' where a known name is near enough to be a slip of the pen, else ''. */
export function nearest(wanted: string, known: Iterable<string>): string {
  const all = [...known];
  if (all.length === 0 || wanted === '') return '';
  const near = closest(wanted, all);
  return distance(wanted, near) <= Math.max(2, wanted.length / 3) ? ` The nearest is "${near}".` : '';
}
