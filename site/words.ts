/** Words of pages that no registry holds, each in one place. */
import { factKeys } from '../pipeline/archive/fact-keys.ts';
import type { Ground, Outcome, Standing } from '../pipeline/judge/types.ts';

export const standingMeanings: Record<Standing, string> = {
  sound: 'Nothing is outside its limits, as far as it could be measured.',
  caution: 'A limit of conditions or class is exceeded, facts contradict each other, or the recording is a duplicate.',
  unsound: 'Physics or the lab’s own rules are broken, or the conditions leave nothing measurable.',
  unread: 'Nothing could be measured.',
};

export const groundMeanings: Record<Ground, string> = {
  physics: 'impossible under the stated solutions, temperature and current',
  conditions: 'more than this recording could resolve',
  class: 'outside what published studies of this cell class span',
  lab: 'outside what this lab’s own recordings span',
  policy: 'against a rule of this archive’s almanac.yaml',
};

export const outcomes: readonly Outcome[] = ['within', 'near limit', 'outside', 'not measured'];

export const outcomeMeanings: Record<Outcome, string> = {
  within: 'The whole 95 % interval keeps the limit.',
  'near limit': 'The 95 % interval of number and limit together straddles the limit, and so does not decide.',
  outside: 'The whole 95 % interval of number and limit together lies beyond the limit.',
  'not measured': 'There is no number, or no limit to hold it against; what is missing is said.',
};

export const outcomeClass = (outcome: Outcome): string => outcome.replace(' ', '-');

const labels = new Map(factKeys.map((fact) => [fact.key, fact]));

/** Label of a fact key, from the registry. */
export const factLabel = (key: string): string => labels.get(key)?.label ?? key;

/** A fact's value with its unit, as people read it. */
export function factText(key: string, value: string | number): string {
  const unit = labels.get(key)?.unit ?? '';
  return unit === '' ? String(value) : `${value} ${unit}`;
}

/** A stretch of text; `lowered` is set as an index. */
export interface Piece {
  text: string;
  lowered: boolean;
}

/** Splits text at the indices of its symbols, written with an underscore: 'E_Na' becomes E with a lowered Na. */
export function pieces(text: string): Piece[] {
  const found: Piece[] = [];
  let from = 0;
  for (const match of text.matchAll(
    /((?<![\p{L}\p{N}_])(?:d|Δ)?\p{L}|\])_(\p{L}+[+−-]?|\{[^}]+\}|\d+)(?![\p{L}\p{N}_])/gu,
  )) {
    const [, letter = '', index = ''] = match;
    const end = match.index + letter.length;
    found.push({ text: text.slice(from, end), lowered: false });
    found.push({ text: index.replace(/^\{|\}$/g, ''), lowered: true });
    from = match.index + match[0].length;
  }
  if (from < text.length) found.push({ text: text.slice(from), lowered: false });
  return found;
}
