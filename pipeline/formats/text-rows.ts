/** Tables with one sweep a row. */
import { count, FormatError, warning } from './problems.ts';
import { readRows } from './text-columns.ts';
import type { Dialect } from './text-dialect.ts';
import type { ColumnRole } from './text-plan.ts';
import { currentFactor, potentialUnit, sizeOf } from './text-scale.ts';
import {
  clampOf,
  floatNoise,
  printRounding,
  rateMissing,
  type Sweep,
  separatorNames,
  type Table,
  tallyProblems,
} from './text-table.ts';
import { timeBase } from './time-base.ts';
import type { Problem, ReadingHints } from './types.ts';
import { parseUnit } from './units.ts';

/** Beginning and end of the samples in each row, from the sidecar's column list. */
function rowRange(columns: (number | string)[] | undefined, length: number): [number, number] {
  const [first, last] = (columns ?? []).map(Number);
  return [Math.max(0, (first || 1) - 1), Math.min(length, last || length)];
}

/**
 * Reads a table whose rows are sweeps. A column list of the sidecar names where the samples begin and, if it has two
 * entries, where they end; `time.column` is the number of the row that holds the times.
 *
 * @throws FormatError where no sampling rate is known
 */
export function readRowTable(path: string, dialect: Dialect, hints: ReadingHints): Table {
  const mapping = hints.table!;
  const { rows, lines, precision, tally } = readRows(path, dialect);
  const problems = [...dialect.problems.filter(({ code }) => code !== 'HEADER_MISMATCH'), ...tallyProblems(tally)];
  const timeRow = mapping.time ? Number(mapping.time.column) - 1 : -1;
  const data = rows.filter((_, row) => row !== timeRow);
  const dataLines = lines.filter((_, row) => row !== timeRow);
  const seconds = mapping.time ? parseUnit(mapping.time.unit)!.factor : 1;
  const role = (kind: 'voltage' | 'current'): ColumnRole => ({
    column: 0,
    name: 'the rows',
    unit: mapping[kind] ? parseUnit(mapping[kind].unit) : null,
    guessed: false,
  });
  const hasVoltage = mapping.voltage !== undefined || mapping.current === undefined;
  const range = (kind: 'voltage' | 'current', row: Float64Array): Float64Array =>
    row.subarray(...rowRange(mapping[kind]?.columns, row.length));
  let rate = mapping.rate_hz ?? hints.rate_hz ?? null;
  let start = 0;
  if (mapping.time) {
    const times = rows[timeRow];
    const base = times
      ? timeBase(range(hasVoltage ? 'voltage' : 'current', times), floatNoise, printRounding(precision))
      : ({ ok: false, at: 0, why: `there is no row ${mapping.time.column}` } as const);
    if (!base.ok || base.places)
      throw new FormatError({
        code: 'TIMES_IRREGULAR',
        place: `row ${mapping.time.column}`,
        message: `The row of times is no fixed step${base.ok ? '' : `: ${base.why}`}.`,
        remedy: 'With "sweeps: rows", time.column is the number of the row that holds the times; or state rate_hz.',
      });
    rate = base.rate / seconds;
    start = (base.start + (mapping.time.offset ?? 0)) * seconds;
  }
  if (rate === null)
    throw rateMissing(dialect, hasVoltage ? '{ columns: [1], unit: mV }\n  sweeps:  rows' : null, null);
  let largest = new Float64Array(0);
  for (const row of data) if (row.length > largest.length) largest = row as Float64Array<ArrayBuffer>;
  const longest = largest.length;
  const uneven = data.filter((row) => row.length !== longest).length;
  if (uneven > 0)
    problems.push(
      warning({
        code: 'RAGGED_ROWS',
        place: '',
        message: `${count(uneven, 'row')} of ${data.length} ${uneven === 1 ? 'is' : 'are'} shorter than the longest (${longest} cells); each sweep is as long as its row.`,
        remedy: 'Check that no row was cut short.',
      }),
    );
  const scales: Problem[] = [];
  const all = (kind: 'voltage' | 'current'): Float64Array =>
    Float64Array.from(data.slice(0, 50).flatMap((row) => [...range(kind, row)]));
  const voltageFactor = hasVoltage ? potentialUnit(role('voltage'), sizeOf(all('voltage')), scales).factor : null;
  const currentFactorOf = mapping.current
    ? currentFactor(role('current'), sizeOf(all('current')), mapping.capacitance_pf ?? hints.capacitance_pf, scales)
    : null;
  problems.push(...scales);
  const first = data[0];
  const clamp = clampOf(
    hints,
    hasVoltage && first ? range('voltage', first) : null,
    mapping.current && first ? range('current', first) : null,
    problems,
  );
  const sweeps = data.map((row, index): Sweep => {
    const voltage = voltageFactor === null ? null : { values: range('voltage', row), factor: voltageFactor };
    const current = currentFactorOf === null ? null : { values: range('current', row), factor: currentFactorOf };
    const samples = (clamp === 'current' ? voltage : current)?.values.length ?? 0;
    return {
      voltage,
      current,
      start_s: start,
      places: null,
      gridLength: samples,
      entry: {
        key: `line ${dataLines[index]}`,
        series: `line ${dataLines[index]}`,
        electrode: '',
        clamp,
        source_sweep: null,
        start_s: null,
        samples,
        rate_hz: rate,
        protocol: '',
        has_voltage: voltage !== null,
        has_current: current !== null,
        bridge_mohm: null,
        bias_pa: null,
        filter_khz: null,
        scaling:
          mapping.voltage || mapping.current
            ? `${mapping.voltage?.unit ?? mapping.current?.unit} (sidecar)`
            : 'guessed',
        labelled_amplitude: null,
      },
    };
  });
  return {
    label: `text, ${count(sweeps.length, 'row')} of up to ${longest} cells, ${separatorNames[dialect.separator]}`,
    sweeps,
    problems,
  };
}
