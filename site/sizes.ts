/** Counting cells and subjects: the one is never said without the other. Used by pages and by their scripts. */

export interface Sizes {
  cells: number;
  subjects: number;
  /** Cells whose subject is not stated. */
  withoutSubject: number;
}

/** A whole number, thousands set apart by a narrow space from 10,000 on. */
export const whole = (n: number): string => (n < 10_000 ? String(n) : String(n).replace(/\B(?=(\d{3})+$)/g, '\u202f'));

/** '1 cell', '12 cells'. */
export const counted = (n: number, one: string, many = `${one}s`): string => `${whole(n)} ${n === 1 ? one : many}`;

/** '12 cells from 5 subjects (1 cell without a stated subject)'. */
export function sizesText({ cells, subjects, withoutSubject }: Sizes): string {
  if (cells === 0) return 'No cell';
  if (subjects === 0) return `${counted(cells, 'cell')} (no subject stated)`;
  const without = withoutSubject > 0 ? ` (${counted(withoutSubject, 'cell')} without a stated subject)` : '';
  return `${counted(cells, 'cell')} from ${counted(subjects, 'subject')}${without}`;
}
