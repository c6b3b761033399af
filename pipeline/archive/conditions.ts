/** Which condition holds for which sweep. */
import type { Problem } from '../formats/types.ts';
import { clockSeconds, daySeconds } from './clock.ts';
import type { Ordered } from './order.ts';
import type { CellRecord, ConditionStatement } from './types.ts';

const halfDay = 43_200;

const complain = (
  condition: ConditionStatement,
  code: string,
  message: string,
  remedy: string,
): Problem & { path: string } => ({
  code,
  weight: 'warns',
  place: condition.origin.line === null ? 'conditions' : `conditions, line ${condition.origin.line}`,
  message,
  remedy,
  path: condition.origin.path,
});

/** Whether a condition without a beginning speaks for a file: its sidecar's own, or any file below its folder. */
function speaksFor(condition: ConditionStatement, file: string): boolean {
  const { path } = condition.origin;
  if (path === `${file}.yaml`) return true;
  if (path === 'folder.yaml') return true;
  return path.endsWith('/folder.yaml') && file.startsWith(path.slice(0, -'folder.yaml'.length));
}

/**
 * Gives every condition with a clock time the number of the first sweep at or after it.
 *
 * @returns conditions in their order, those that can be placed nowhere left out and told
 */
export function placeConditions(
  stated: readonly ConditionStatement[],
  sweeps: readonly Ordered[],
): { conditions: ConditionStatement[]; problems: (Problem & { path: string })[] } {
  const problems: (Problem & { path: string })[] = [];
  const conditions = stated.flatMap((condition) => {
    const { label, from_sweep, from_time } = condition;
    if (
      from_sweep !== null &&
      from_sweep >= sweeps.length &&
      sweeps.length > 0 &&
      !condition.origin.path.endsWith('folder.yaml')
    )
      problems.push(
        complain(
          condition,
          'CONDITION_BEYOND',
          `The condition "${label}" begins at sweep ${from_sweep}, and the cell's last sweep is ${sweeps.length - 1}.`,
          'No sweep is under it. Correct the number; sweeps count from 0 within the cell.',
        ),
      );
    if (from_time === null) return [condition];
    if (sweeps.length === 0) return [];
    if (sweeps.some((sweep) => sweep.clock_s === null)) {
      problems.push(
        complain(
          condition,
          'CONDITION_UNPLACED',
          `The condition "${label}" begins at ${from_time}, and the sweeps have no clock times.`,
          "It was not used. State from_sweep instead, or the recording's date and time in its sidecar.",
        ),
      );
      return [];
    }
    const begins = momentOf(from_time, sweeps[0]!.clock_s!);
    const first = sweeps.findIndex((sweep) => sweep.clock_s! >= begins - 0.001);
    if (first < 0) {
      problems.push(
        complain(
          condition,
          'CONDITION_BEYOND',
          `The condition "${label}" begins at ${from_time}, after the start of the cell's last sweep.`,
          'No sweep is under it. Correct the time.',
        ),
      );
      return [];
    }
    return [{ ...condition, from_sweep: first }];
  });
  return { conditions, problems };
}

/** A clock time on the scale of the sweeps; without a date, the one nearest after noon-to-noon of the first sweep. */
function momentOf(written: string, firstSweep: number): number {
  const [left, right] = written.split(' ');
  if (right !== undefined) return daySeconds(left!) + clockSeconds(right);
  const midnight = Math.floor(firstSweep / 86_400) * 86_400;
  const moment = midnight + clockSeconds(left!);
  // Past midnight the day has changed under the recording.
  return moment < firstSweep - halfDay ? moment + 86_400 : moment;
}

/**
 * The condition of one sweep and the facts that it, or the sweep's own file, puts in the place of the cell's. Of the
 * conditions that have begun, the one that began last holds; conditions do not add up. 'baseline' before the first.
 *
 * @param sweepIndex the sweep's number within the cell
 */
export function conditionOf(
  cell: CellRecord,
  sweepIndex: number,
): { label: string; facts: Record<string, string | number> } {
  const file = cell.sweeps[sweepIndex]?.path;
  if (file === undefined) throw new RangeError(`sweepIndex must be below ${cell.sweeps.length}, got ${sweepIndex}`);
  let holding: ConditionStatement | null = null;
  let since = -1;
  for (const condition of cell.conditions) {
    if (condition.from_sweep === null && (condition.from_time !== null || !speaksFor(condition, file))) continue;
    const begins = condition.from_sweep ?? cell.sweeps.findIndex((sweep) => speaksFor(condition, sweep.path));
    if (begins > sweepIndex || begins < since) continue;
    holding = condition;
    since = begins;
  }
  return { label: holding?.label ?? 'baseline', facts: { ...cell.file_facts?.[file], ...holding?.facts } };
}
