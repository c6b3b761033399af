/** What tables by columns and tables by rows have in common: sweeps to be, precision of times, clamp, complaints. */
import { count, FormatError, firstFew, warning } from './problems.ts';
import type { Tally } from './text-columns.ts';
import type { Dialect } from './text-dialect.ts';
import type { Precision } from './text-numbers.ts';
import { sidecarFor } from './text-plan.ts';
import type { Problem, ReadingHints, SweepEntry } from './types.ts';

/** A signal as the file holds it, and how it becomes mV or pA. */
export interface Signal {
  values: Float64Array;
  factor: number;
}

export interface Sweep {
  entry: SweepEntry;
  voltage: Signal | null;
  current: Signal | null;
  start_s: number;
  places: Uint32Array | null;
  gridLength: number;
}

export interface Table {
  label: string;
  sweeps: Sweep[];
  problems: Problem[];
}

export const separatorNames = { ',': 'comma', ';': 'semicolon', tab: 'tab', space: 'blank' };

export const floatNoise = (time: number): number => Math.abs(time) * 2 ** -49;

/** By how much a printed time may be off: half a unit of its last digit, whether digits or decimals were limited. */
export const printRounding =
  ({ significant, decimals }: Precision) =>
  (time: number): number => {
    const digits = Math.min(17, Math.max(1, significant));
    const bySize = time === 0 ? 0 : 10 ** (Math.floor(Math.log10(Math.abs(time))) + 1 - digits);
    return Math.max(0.5 * bySize, 0.5 * 10 ** -Math.max(0, decimals), floatNoise(time));
  };

export function tallyProblems(tally: Tally): Problem[] {
  const problems: Problem[] = [];
  const lines = (of: number[], n: number): string =>
    `line${n === 1 ? '' : 's'} ${firstFew([...of, ...Array<string>(Math.max(0, n - of.length)).fill('…')], of.length)}`;
  if (tally.unreadable > 0)
    problems.push(
      warning({
        code: 'CELLS_UNREADABLE',
        place: lines(tally.unreadableLines, tally.unreadableLines.length),
        message: `${tally.unreadable} of ${count(tally.cells, 'cell')} hold no number${tally.unreadable > tally.unreadableLines.length ? '; the place names the first of them' : ''}. They count as unreadable samples.`,
        remedy: 'Look at these lines in the file; a wrong separator or decimal sign can be stated in the sidecar.',
      }),
    );
  if (tally.ragged > 0)
    problems.push(
      warning({
        code: 'RAGGED_ROWS',
        place: lines(tally.raggedLines, tally.raggedLines.length),
        message: `${count(tally.ragged, 'row')} ${tally.ragged === 1 ? 'has' : 'have'} more or fewer cells than the others.`,
        remedy: 'Look at these lines in the file: cells may be missing, or the export was interrupted.',
      }),
    );
  if (tally.words > 0)
    problems.push(
      warning({
        code: 'LINES_LEFT_OUT',
        place: lines(tally.wordLines, tally.wordLines.length),
        message: `${count(tally.words, 'line')} among the numbers ${tally.words === 1 ? 'holds' : 'hold'} none and ${tally.words === 1 ? 'is' : 'are'} left out; the times show whether samples are missing there.`,
        remedy: 'Look at these lines in the file.',
      }),
    );
  return problems;
}

export const rateMissing = (dialect: Dialect, voltage: string | null, current: string | null): FormatError =>
  new FormatError({
    code: 'RATE_MISSING',
    place: '',
    message: [
      `The table has ${count(dialect.columns, 'column')} and none of times, so its sampling rate is not known.`,
      ...dialect.problems.map(({ message }) => message),
    ].join(' '),
    remedy: 'State the sampling rate in the sidecar, and the unit of each column.',
    sidecar: sidecarFor({
      rate: '20000   # samples per second: put the true rate here',
      ...(voltage ? { voltage } : {}),
      ...(current ? { current } : {}),
    }),
  });

/** Share of samples that repeat the one before: a command holds its level, a measured signal does not. */
function repeating(values: Float64Array): number {
  let same = 0;
  for (let index = 1; index < values.length; index++) if (values[index] === values[index - 1]) same++;
  return values.length > 1 ? same / (values.length - 1) : 1;
}

export function clampOf(
  hints: ReadingHints,
  voltage: Float64Array | null,
  current: Float64Array | null,
  problems: Problem[],
): 'current' | 'voltage' {
  const stated = hints.table?.clamp ?? hints.clamp;
  if (stated) return stated;
  if (!current) return 'current';
  const voltageHeld = !voltage || repeating(voltage) > 0.5;
  const currentHeld = repeating(current) > 0.5;
  const clamp = voltageHeld && !currentHeld ? 'voltage' : 'current';
  problems.push(
    warning({
      code: 'CLAMP_GUESSED',
      place: '',
      message: `Nothing says whether current or voltage was clamped. ${
        voltage
          ? `The ${clamp === 'voltage' ? 'potential holds its levels and the current does not' : 'potential moves freely'}, so ${clamp} clamp is taken.`
          : `Only a current was recorded, so ${clamp} clamp is taken.`
      }`,
      remedy: 'State the clamp in the sidecar.',
      sidecar: `table:\n  clamp: ${clamp}`,
    }),
  );
  return clamp;
}
