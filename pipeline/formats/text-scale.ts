/** From the numbers of a column to mV or pA: the unit where it is stated, a guess that is said where it is not. */
import { FormatError, plain, warning } from './problems.ts';
import { type ColumnRole, sidecarFor } from './text-plan.ts';
import type { Problem } from './types.ts';
import { parseUnit, potentialUnitBySize, type Unit } from './units.ts';

export interface Size {
  largest: number;
  median: number;
  /** Nothing but zeros, or nothing at all. */
  zero: boolean;
}

/** Largest absolute value and the median of at most a thousand values spread over the column. */
export function sizeOf(values: Float64Array): Size {
  let largest = 0;
  for (const value of values) if (Math.abs(value) > largest) largest = Math.abs(value);
  const stride = Math.max(1, Math.floor(values.length / 1000));
  const some: number[] = [];
  for (let index = 0; index < values.length; index += stride)
    if (!Number.isNaN(values[index]!)) some.push(values[index]!);
  some.sort((a, b) => a - b);
  return { largest, median: some[some.length >> 1] ?? 0, zero: largest === 0 };
}

const ask = (role: ColumnRole, kind: 'voltage' | 'current', unit: string): string =>
  sidecarFor({ [kind]: `{ columns: [${role.column + 1}], unit: ${unit} }` });

/** The unit in which the numbers of an unnamed column stand where cells rest; null where there is none. */
export function restingUnit(size: Size): string | null {
  const guess = potentialUnitBySize(size.largest);
  const mv = guess === null ? 0 : size.median * parseUnit(guess)!.factor;
  return mv >= -130 && mv <= -15 ? guess : null;
}

/** Unit of a column of potentials. */
export function potentialUnit(role: ColumnRole, size: Size, problems: Problem[]): Unit {
  if (role.unit) return role.unit;
  const guess = potentialUnitBySize(size.largest);
  // A column nobody named is taken for a potential only where it mostly stands where cells rest.
  if (guess === null || (role.guessed && restingUnit(size) === null))
    throw new FormatError({
      code: role.guessed ? 'COLUMN_MEANING_UNKNOWN' : 'UNIT_UNKNOWN',
      place: role.name,
      message: role.guessed
        ? `Nothing says what ${role.name} is, and its numbers (median ${plain(size.median)}, up to ${plain(size.largest)} from zero) do not tell.`
        : `No unit is stated for ${role.name}, and its numbers (up to ${plain(size.largest)} from zero) do not tell.`,
      remedy: role.guessed ? 'Say in the sidecar which column is what.' : 'State the unit in the sidecar.',
      sidecar: role.guessed
        ? `${ask(role, 'voltage', 'mV')}   # or\n${ask(role, 'current', 'pA').replace(/^table:\n/, '# ')}`
        : ask(role, 'voltage', 'mV'),
    });
  problems.push(
    warning({
      code: role.guessed ? 'COLUMN_GUESSED' : 'UNIT_GUESSED',
      place: role.name,
      message: role.guessed
        ? `Nothing says what ${role.name} is. Its numbers (median ${plain(size.median)}, up to ${plain(size.largest)} from zero) are those of a membrane potential in ${guess}, and it is read as one.`
        : `No unit is stated for ${role.name}. Its numbers reach ${plain(size.largest)}, and only ${guess} makes that a membrane potential, so ${guess} is taken.`,
      remedy: 'State the column and its unit in the sidecar.',
      sidecar: ask(role, 'voltage', guess),
    }),
  );
  return parseUnit(guess)!;
}

/**
 * Factor to pA for a column of currents, or null where a person must say something first; a problem says what. Nothing
 * but zeros are zero in any unit.
 */
export function currentFactor(
  role: ColumnRole,
  size: Size,
  capacitance_pf: number | undefined,
  problems: Problem[],
): number | null {
  if (size.zero) return 1;
  if (!role.unit) {
    problems.push(
      warning({
        code: 'UNIT_UNKNOWN',
        place: role.name,
        message: `No unit is stated for ${role.name}, and the size of a current (here up to ${plain(size.largest)}) tells none. It is left out.`,
        remedy: 'State the unit in the sidecar.',
        sidecar: ask(role, 'current', 'pA'),
      }),
    );
    return null;
  }
  if (role.unit.dimension !== 'current per capacitance') return role.unit.factor;
  if (capacitance_pf !== undefined) return role.unit.factor * capacitance_pf;
  problems.push(
    warning({
      code: 'CAPACITANCE_MISSING',
      place: role.name,
      message: `${role.name} is a current per capacitance; without the cell's capacitance it is no current and is left out.`,
      remedy: 'State the capacitance in the sidecar.',
      sidecar: 'facts: { capacitance_pf: 30 }   # the cell’s own, pF',
    }),
  );
  return null;
}
