/** A figure of one sweep, or of all sweeps of a cell, as notes embed them. */
import type { NoteFigure, SweepRow } from '../../pipeline/ledger/types.ts';
import type { Chart } from './frame.ts';
import { sweepGroups, sweepsChart } from './sweeps.ts';

/** @returns null where the sweep does not exist or has nothing to draw */
export function sweepFigure(
  figure: NoteFigure,
  sweeps: readonly SweepRow[],
  levels: { e_na_mv: number | null; e_k_mv: number | null },
): Chart | null {
  const wanted =
    figure.sweep === null ? (sweepGroups(sweeps)[0] ?? []) : sweeps.filter((one) => one.sweep === figure.sweep);
  if (wanted.length === 0) return null;
  return sweepsChart(wanted, { ...levels, from_s: figure.from_s, to_s: figure.to_s, width: 640, height: 320 });
}
