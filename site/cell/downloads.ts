/** Small tables that belong to one cell and lie beside its page. */
import { stringify } from 'csv-stringify/sync';
import type { CellRow, SweepRow } from '../../pipeline/ledger/types.ts';
import { quantitiesOf } from '../../pipeline/measure/quantities.ts';
import type { Excerpt } from '../../pipeline/measure/types.ts';

const csv = (rows: (string | number | null | undefined)[][]): string => stringify(rows, { record_delimiter: '\r\n' });

const cut = (value: number | null | undefined): number | null =>
  value === null || value === undefined ? null : Number(value.toPrecision(9));

/** Every cell-level number under every condition, with spread, n, unit and the reason where it is missing. */
export function numbersCsv(cell: CellRow): string {
  const head = ['cell', 'condition', 'quantity', 'value', 'unit', 'u95', 'sd', 'se', 'n', 'why_missing'];
  const rows = cell.measure.conditions.flatMap(({ condition, readings }) =>
    quantitiesOf('cell').flatMap(({ id, unit }) => {
      const one = readings[id];
      return one
        ? [[cell.cell, condition, id, cut(one.value), unit, cut(one.u95), cut(one.sd), cut(one.se), one.n, one.why]]
        : [];
    }),
  );
  return csv([head, ...rows]);
}

/** The spike that the page shows, sample by sample, time from the start of its sweep. */
export function spikeCsv(excerpt: Excerpt): string {
  const rows = excerpt.mv.map((mv, i) => [cut(excerpt.start_s + i / excerpt.rate_hz), cut(mv)]);
  return csv([['time_s', 'membrane_potential_mv'], ...rows]);
}

/** Every step of the first condition: its current and what the potential and the cell made of it. */
export function stepsCsv(cell: CellRow, sweeps: readonly SweepRow[]): string {
  const ids = ['steady_deflection_mv', 'largest_deflection_mv', 'mean_rate_hz'];
  const own = new Set(cell.measure.conditions[0]?.sweeps ?? []);
  const rows = sweeps
    .filter((sweep) => own.has(sweep.sweep) && sweep.clamp === 'current' && sweep.stimulus.kind === 'step')
    .map((sweep) => [
      sweep.sweep,
      cut(sweep.stimulus.onset_s),
      cut(sweep.stimulus.end_s),
      cut(sweep.stimulus.amplitude),
      sweep.spikes.length,
      ...ids.flatMap((id) => [cut(sweep.readings[id]?.value), cut(sweep.readings[id]?.u95)]),
    ]);
  const head = ['sweep', 'onset_s', 'end_s', 'stimulus_pa', 'spikes', ...ids.flatMap((id) => [id, `${id}_u95`])];
  return csv([head, ...rows]);
}

/** The onset of one response to a small hyperpolarizing step, time from the start of its sweep. */
export function responseCsv(sweep: SweepRow): string {
  const { start_s, rate_hz, mv } = sweep.step_response!;
  const rows = mv.map((value, k) => [sweep.sweep, cut(start_s + k / rate_hz), cut(value)]);
  return csv([['sweep', 'time_s', 'membrane_potential_mv'], ...rows]);
}
