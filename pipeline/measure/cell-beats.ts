/** How alike the beats of a heart cell are: variability from beat to beat and alternans. */
import { invert } from '../signal/least-squares.ts';
import { mean } from '../signal/statistics.ts';
import { absent, measured } from './reading.ts';
import type { NumberedSweep, Reading, Readings } from './types.ts';

/** Fewest beats in a row that can show a pattern. */
const fewestBeats = 5;

/** Unbroken rows of beats with a duration, sweep by sweep. */
function rowsOf(sweeps: readonly NumberedSweep[], id: string): { sweep: NumberedSweep; values: number[] }[] {
  return sweeps.flatMap((sweep) => {
    const rows: { sweep: NumberedSweep; values: number[] }[] = [{ sweep, values: [] }];
    for (const spike of sweep.spikes) {
      const value = spike.values[id] ?? null;
      if (value !== null) rows.at(-1)!.values.push(value);
      else rows.push({ sweep, values: [] });
    }
    return rows.filter((row) => row.values.length >= 2);
  });
}

/**
 * `apd90_variability_ms` (Σ|D_{k+1} − D_k| / (n·√2)) and `apd90_alternation_ms` (2|c| of the least-squares fit
 * D_k = a + b·k + c·(−1)^k over the longest row of beats).
 */
export function beatReadings(sweeps: readonly NumberedSweep[]): Readings {
  const rows = rowsOf(sweeps, 'apd90_ms');
  const beats = sweeps.some((sweep) => sweep.spikes.some((spike) => 'diastolic_potential_mv' in spike.values));
  if (!beats) {
    const none = absent(sweeps.some((sweep) => sweep.spikes.length > 0) ? 'not-this-class' : 'no-spikes');
    return { apd90_variability_ms: none, apd90_alternation_ms: none };
  }
  return { apd90_variability_ms: variability(rows), apd90_alternation_ms: alternation(rows) };
}

function variability(rows: ReturnType<typeof rowsOf>): Reading {
  const steps = rows.flatMap(({ values }) => values.slice(1).map((value, k) => Math.abs(value - values[k]!)));
  if (steps.length < fewestBeats - 1) return absent('too-few-spikes');
  const value = mean(steps)! / Math.SQRT2;
  const spread = Math.sqrt(steps.reduce((sum, step) => sum + (step / Math.SQRT2 - value) ** 2, 0) / (steps.length - 1));
  // Neighbouring steps share a beat: as if there were two thirds as many.
  const independent = (2 / 3) * steps.length;
  return measured(value, { n: steps.length, se: spread / Math.sqrt(independent), freedom: independent - 1 });
}

function alternation(rows: ReturnType<typeof rowsOf>): Reading {
  const longest = rows.reduce<(typeof rows)[number] | null>(
    (best, row) => (!best || row.values.length > best.values.length ? row : best),
    null,
  );
  if (!longest || longest.values.length < fewestBeats) return absent('too-few-spikes');
  const fit = alternating(longest.values);
  return measured(2 * Math.abs(fit.c), {
    n: longest.values.length,
    se: 2 * fit.se,
    freedom: longest.values.length - 3,
    at: { sweep: longest.sweep.sweep },
  });
}

/** Least squares of y_k on 1, k and (−1)^k: the coefficient of the last, and its standard error. */
export function alternating(y: readonly number[]): { c: number; se: number } {
  const n = y.length;
  const rows = y.map((_, k) => [1, k - (n - 1) / 2, k % 2 === 0 ? 1 : -1]);
  const normal = [0, 1, 2].map((i) => [0, 1, 2].map((j) => rows.reduce((sum, row) => sum + row[i]! * row[j]!, 0)));
  const right = [0, 1, 2].map((i) => rows.reduce((sum, row, k) => sum + row[i]! * y[k]!, 0));
  // Three terms of which none is made of the others: it has an inverse from three beats on.
  const inverse = invert(normal)!;
  const solution = inverse.map((row) => row.reduce((sum, value, j) => sum + value * right[j]!, 0));
  const left = y.reduce(
    (sum, value, k) => sum + (value - rows[k]!.reduce((s, x, j) => s + x * solution[j]!, 0)) ** 2,
    0,
  );
  return { c: solution[2]!, se: Math.sqrt((left / Math.max(1, n - 3)) * inverse[2]![2]!) };
}
