import type { Problem } from './types.ts';

/**
 * Thrown where a file, or one sweep of it, cannot be read. Carries the problem as a person must see it; the message
 * of the error is the problem's message.
 */
export class FormatError extends Error {
  readonly problem: Problem;

  constructor(problem: Omit<Problem, 'weight'>) {
    super(problem.message);
    this.name = 'FormatError';
    this.problem = { weight: 'blocks', ...problem };
  }
}

/** A problem that leaves the data usable. */
export const warning = (problem: Omit<Problem, 'weight'>): Problem => ({ weight: 'warns', ...problem });

/** A problem that costs the file or the sweep. */
export const blocker = (problem: Omit<Problem, 'weight'>): Problem => ({ weight: 'blocks', ...problem });

/** `n thing` or `n things`. */
export const count = (n: number, thing: string): string => `${n} ${thing}${n === 1 ? '' : 's'}`;

/** The first few of a list, and how many more there are: 'a, b, c and 12 more'. */
export function firstFew(items: readonly (string | number)[], few = 5): string {
  const shown = items.slice(0, few).join(', ');
  return items.length > few ? `${shown} and ${items.length - few} more` : shown;
}

/** A number as a person reads it: at most four significant digits, no exponent where it can be helped. */
export function plain(value: number): string {
  const magnitude = Math.abs(value);
  if (magnitude !== 0 && (magnitude < 1e-4 || magnitude >= 1e7)) return value.toExponential(2);
  return String(Number(value.toPrecision(4)));
}
