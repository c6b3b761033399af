/**
 * Opens tables of text. What the sidecar's `table:` states is taken; what it leaves open is found out where the file
 * decides it alone, and each guess is a problem that says so. In a table of rows (`sweeps: rows`) a column list names
 * where the samples begin and, if it has two entries, where they end; `time.column` is then the number of the row that
 * holds the times. Times keep the file's own zero, and so does a stated stimulus; `time.offset` is added in the unit
 * of the times.
 */
import { labelledAmplitude } from './labels.ts';
import { count, FormatError, firstFew, plain, warning } from './problems.ts';
import { readColumns } from './text-columns.ts';
import { type Dialect, findDialect } from './text-dialect.ts';
import { type Head, readHead } from './text-lines.ts';
import type { Precision } from './text-numbers.ts';
import { type ColumnRole, planTable, sampleRows, sidecarFor, type TablePlan } from './text-plan.ts';
import { readRowTable } from './text-rows.ts';
import { currentFactor, potentialUnit, restingUnit, type Size, sizeOf } from './text-scale.ts';
import {
  clampOf,
  floatNoise,
  printRounding,
  rateMissing,
  type Signal,
  type Sweep,
  separatorNames,
  type Table,
  tallyProblems,
} from './text-table.ts';
import { spread, type TimeBase, timeBase } from './time-base.ts';
import type {
  FileDescription,
  OpenRecording,
  Problem,
  ReadingHints,
  Samples,
  SweepSamples,
  TableMapping,
} from './types.ts';

/** Fewer rows than this are a list of results and no recording, unless a sidecar says otherwise. */
const fewestRows = 20;

const labelOf = ({ columns, separator, decimal }: Dialect): string =>
  [
    'text',
    count(columns, 'column'),
    ...(columns > 1 ? [separatorNames[separator]] : []),
    ...(decimal === 'comma' ? ['decimal comma'] : []),
  ].join(', ');

const scaled = ({ values, factor }: Signal, sweep: Sweep): Float64Array => {
  const samples = new Float64Array(values.length);
  for (let index = 0; index < values.length; index++) samples[index] = values[index]! * factor;
  return spread(samples, sweep.places, sweep.gridLength);
};

/** Behind a unit that is only an example. */
const orElse = (roles: readonly ColumnRole[], others: string): string =>
  roles[0]?.unit ? '' : `   # or ${others}: put the true unit here`;

const tooFewRows = (rows: number): FormatError =>
  new FormatError({
    code: 'NOT_A_RECORDING',
    place: '',
    message: `The table has only ${count(rows, 'row')} of numbers.`,
    remedy: 'Nothing to do if this is no recording. If it is, say in a sidecar which column is what.',
    sidecar: sidecarFor({ time: '{ column: 1, unit: s }', voltage: '{ columns: [2], unit: mV }' }),
  });

const columnList = (roles: readonly ColumnRole[]): string => `[${roles.map(({ column }) => column + 1).join(', ')}]`;

const unitName = (roles: readonly ColumnRole[], otherwise: string): string => roles[0]?.unit?.name ?? otherwise;

const ratePlease = (dialect: Dialect, { voltage, current }: TablePlan): FormatError =>
  rateMissing(
    dialect,
    voltage.length > 0
      ? `{ columns: ${columnList(voltage)}, unit: ${unitName(voltage, 'mV')} }${orElse(voltage, 'V, uV')}`
      : null,
    current.length > 0
      ? `{ columns: ${columnList(current)}, unit: ${unitName(current, 'pA')} }${orElse(current, 'nA, pA/pF')}`
      : null,
  );

/** Where a column of times falls back: the file holds one sweep after another. */
function restarts(times: Float64Array): number[] {
  const starts = [0];
  let before = times[0] ?? Number.NaN;
  for (let index = 1; index < times.length; index++) {
    const time = times[index]!;
    if (Number.isNaN(time)) continue;
    if (time < before) starts.push(index);
    before = time;
  }
  return starts;
}

interface Part {
  from: number;
  to: number;
  base: Extract<TimeBase, { ok: true }>;
}

/** One stretch of the table for each sweep in it, on a regular time base. */
function partsOf(times: Float64Array, plan: TablePlan, precision: Precision, problems: Problem[]): Part[] {
  const rounding = printRounding(precision);
  const starts = restarts(times);
  // Times that fall for a sample or two are no sweeps.
  const short = starts.findIndex((from, part) => (starts[part + 1] ?? times.length) - from < fewestRows);
  const irregular = (row: number, why: string): FormatError =>
    new FormatError({
      code: 'TIMES_IRREGULAR',
      place: plan.time!.name,
      message: `The times are no fixed step: at row ${row + 1} of the numbers ${why}.`,
      remedy:
        'Resample the trace to a fixed step, or leave the times out and state rate_hz if they are known to be wrong.',
      sidecar: sidecarFor({
        rate: '20000   # samples per second: put the true rate here',
        ...(plan.voltage.length > 0
          ? { voltage: `{ columns: ${columnList(plan.voltage)}, unit: ${unitName(plan.voltage, 'mV')} }` }
          : {}),
        ...(plan.current.length > 0
          ? { current: `{ columns: ${columnList(plan.current)}, unit: ${unitName(plan.current, 'pA')} }` }
          : {}),
      }),
    });
  if (starts.length > 1 && short >= 0) {
    const at = starts[Math.max(1, short)]!;
    throw irregular(at, `they fall from ${plain(times[at - 1]!)} to ${plain(times[at]!)}`);
  }
  const parts = starts.map((from, part): Part => {
    const to = starts[part + 1] ?? times.length;
    const base = timeBase(times.subarray(from, to), floatNoise, rounding);
    if (!base.ok) throw irregular(from + base.at, base.why);
    return { from, to, base };
  });
  if (parts.length > 1)
    problems.push(
      warning({
        code: 'TIME_RESTARTS',
        place: plan.time!.name,
        message: `The times start again ${count(parts.length - 1, 'time')}; each run of them is read as a sweep of its own.`,
        remedy: 'Nothing to do if the file holds one sweep after another.',
      }),
    );
  const gaps = parts.reduce((sum, { base, from, to }) => sum + base.samples - (to - from), 0);
  if (gaps > 0)
    problems.push(
      warning({
        code: 'TIME_GAPS',
        place: plan.time!.name,
        message: `The times leave out ${count(gaps, 'sample')}; they count as unreadable.`,
        remedy: 'Nothing is interpolated. Check what interrupted the recording or the export.',
      }),
    );
  return parts;
}

function statedStimulus(mapping: TableMapping | undefined, sweep: number): SweepSamples['stated_stimulus'] {
  const stimulus = mapping?.stimulus;
  if (!stimulus) return null;
  if (stimulus.kind === 'none') return { kind: 'none' };
  if (stimulus.kind === 'levels') return { kind: 'levels', at_s: stimulus.at_s, mv: stimulus.mv };
  const { start_s, end_s } = stimulus;
  if ('pa' in stimulus) {
    const pa = stimulus.pa[sweep];
    return pa === undefined ? null : { kind: 'step', start_s, end_s, pa };
  }
  return { kind: 'step', start_s, end_s, pa: stimulus.from_pa + sweep * stimulus.by_pa };
}

/** Numbers of sweeps that headings carry, e.g. 'Vm 12 (mV)', where each carries one of its own. */
function sourceSweeps(roles: readonly ColumnRole[]): (number | null)[] {
  const found = roles.map(({ name }) => /(\d+)\D*$/.exec(name.replace(/[([{].*$/, ''))?.[1]);
  const distinct = new Set(found).size === roles.length && roles.length > 1 && !found.includes(undefined);
  const headed = roles.every(({ name }) => !/^column \d+$/.test(name));
  return found.map((digits) => (distinct && headed ? Number(digits) : null));
}

function pairProblem(voltage: number, current: number): FormatError {
  return new FormatError({
    code: 'COLUMNS_UNEQUAL',
    place: '',
    message: `There are ${count(voltage, 'column')} of potential and ${current} of current; a sweep needs one of each, or one current for all.`,
    remedy: 'List in the sidecar which columns belong together, in the same order.',
    sidecar: sidecarFor({ voltage: '{ columns: [2, 4], unit: mV }', current: '{ columns: [3, 5], unit: pA }' }),
  });
}

const scalingText = (role: ColumnRole | undefined, unit: string, hints: ReadingHints): string => {
  if (!role) return '';
  if (hints.table?.voltage || hints.table?.current) return `${unit} (sidecar)`;
  return role.unit ? `${role.unit.name} (header says "${role.name}")` : `${unit} (guessed)`;
};

interface Scaled {
  factor: number | null;
  size: Size;
  unit: string;
}

function settleScales(
  roles: readonly ColumnRole[],
  values: readonly Float64Array[],
  settle: (role: ColumnRole, size: Size) => { factor: number | null; unit: string },
): Scaled[] {
  return roles.map((role, index) => {
    const size = sizeOf(values[index]!);
    return { size, ...settle(role, size) };
  });
}

/**
 * Where one unnamed column is no potential, the lines to paste must name the others too: naming one column alone would
 * have the rest left out.
 */
function askingForAll<Result>(
  roles: readonly ColumnRole[],
  values: readonly Float64Array[],
  settle: () => Result,
): Result {
  try {
    return settle();
  } catch (error) {
    if (!(error instanceof FormatError) || error.problem.code !== 'COLUMN_MEANING_UNKNOWN') throw error;
    const units = values.map((column) => restingUnit(sizeOf(column)));
    const stated = units.filter((unit) => unit !== null);
    const [unit] = stated;
    if (unit === undefined || stated.some((one) => one !== unit)) throw error;
    const { weight: _, ...problem } = error.problem;
    const potentials = roles.filter((_role, index) => units[index] !== null);
    const others = roles.filter((_role, index) => units[index] === null);
    throw new FormatError({
      ...problem,
      remedy: 'Say in the sidecar which columns are what: this is what their numbers suggest, to be checked.',
      sidecar: sidecarFor({
        voltage: `{ columns: ${columnList(potentials)}, unit: ${unit} }`,
        current: `{ columns: ${columnList(others)}, unit: pA }   # or nA; or leave the line out`,
      }),
    });
  }
}

/** Problems that differ only in the column they speak of, said once. */
function merged(problems: readonly Problem[]): Problem[] {
  const byCode = new Map<string, Problem[]>();
  for (const problem of problems) {
    const kind = `${problem.code}|${problem.weight}`;
    byCode.set(kind, [...(byCode.get(kind) ?? []), problem]);
  }
  return [...byCode.values()].flatMap((group) => {
    if (group.length <= 3) return group;
    const [first] = group as [Problem];
    return [
      {
        ...first,
        place: firstFew(group.map(({ place }) => place)),
        message: `${first.message} The same holds for ${group.length - 1} more columns.`,
      },
    ];
  });
}

function readTable(path: string, head: Head, dialect: Dialect, hints: ReadingHints): Table {
  const mapping = hints.table;
  const firstRows = sampleRows(head.lines, dialect);
  // Before asking what its columns mean: a short list of results is no recording whatever they are called.
  if (head.whole && !mapping && firstRows.length < fewestRows) throw tooFewRows(firstRows.length);
  const plan = planTable(dialect, firstRows, hints);
  const problems = [...plan.problems];
  if (!plan.time && plan.rate_hz === null) throw ratePlease(dialect, plan);
  const { voltage, current } = plan;
  if (voltage.length > 0 && current.length > 1 && voltage.length !== current.length)
    throw pairProblem(voltage.length, current.length);
  const wanted = [...(plan.time ? [plan.time] : []), ...voltage, ...current].map(({ column }) => column);
  const meanRow = head.lines.reduce((sum, line) => sum + line.length + 1, 0) / head.lines.length;
  const expectedRows = head.whole ? head.lines.length : Math.ceil((1.05 * head.bytes) / meanRow);
  const read = readColumns(path, dialect, wanted, plan.time ? 0 : -1, expectedRows);
  if (read.rows < fewestRows && !mapping) throw tooFewRows(read.rows);
  problems.push(...tallyProblems(read.tally));
  const [times, series] = plan.time ? [read.columns[0]!, read.columns.slice(1)] : [null, read.columns];
  const voltages = series.slice(0, voltage.length);
  const currents = series.slice(voltage.length);
  const scales: Problem[] = [];
  const voltageScales = settleScales(voltage, voltages, (role, size) => {
    const unit = askingForAll(voltage, voltages, () => potentialUnit(role, size, scales));
    return { factor: unit.factor, unit: unit.name };
  });
  const capacitance = mapping?.capacitance_pf ?? hints.capacitance_pf;
  const currentScales = settleScales(current, currents, (role, size) => ({
    factor: currentFactor(role, size, capacitance, scales),
    unit: role.unit?.name ?? 'pA',
  }));
  if (voltage.length === 0 && currentScales.every(({ factor }) => factor === null)) {
    const [reason] = scales as [Problem];
    const { weight: _, ...rest } = reason;
    throw new FormatError(rest);
  }
  problems.push(...scales);
  const parts: Part[] = times
    ? partsOf(times, plan, read.precision, problems)
    : [
        {
          from: 0,
          to: read.rows,
          base: { ok: true, rate: plan.rate_hz!, start: 0, samples: read.rows, places: null },
        },
      ];
  const seconds = plan.time?.unit?.factor ?? 1;
  const clamp = clampOf(hints, voltages[0] ?? null, currents[0] ?? null, problems);
  const own = clamp === 'current' && voltage.length > 0 ? voltage : current.length > 0 ? current : voltage;
  const shown = voltage.length >= current.length ? voltage : current;
  const numbers = sourceSweeps(shown);
  const sweeps: Sweep[] = [];
  for (const [index, role] of shown.entries())
    for (const [part, { from, to, base }] of parts.entries()) {
      const signal = (values: Float64Array | undefined, scale: Scaled | undefined): Signal | null =>
        values && scale && scale.factor !== null ? { values: values.subarray(from, to), factor: scale.factor } : null;
      const at = (list: readonly unknown[]): number => (list.length === 1 ? 0 : index);
      const v = signal(voltages[at(voltages)], voltageScales[at(voltages)]);
      const i = signal(currents[at(currents)], currentScales[at(currents)]);
      const shownRole = own.length === 1 ? own[0]! : own[index]!;
      const rate = base.rate / seconds;
      const whole = Math.round(rate);
      sweeps.push({
        voltage: v,
        current: i,
        start_s: (base.start + (plan.time?.offset ?? 0)) * seconds,
        places: base.places,
        gridLength: base.samples,
        entry: {
          key: parts.length > 1 ? `column ${role.column + 1} run ${part + 1}` : `column ${role.column + 1}`,
          series: parts.length > 1 ? `${shownRole.name}, run ${part + 1}` : shownRole.name,
          electrode: '',
          clamp,
          source_sweep: numbers[index] ?? null,
          start_s: null,
          samples: base.samples,
          rate_hz: Math.abs(rate - whole) < 1e-9 * rate ? whole : rate,
          protocol: '',
          has_voltage: v !== null,
          has_current: i !== null,
          bridge_mohm: null,
          bias_pa: null,
          filter_khz: null,
          scaling: [
            scalingText(voltage[at(voltages)], voltageScales[at(voltages)]?.unit ?? '', hints),
            i ? scalingText(current[at(currents)], currentScales[at(currents)]?.unit ?? '', hints) : '',
          ]
            .filter((text) => text !== '')
            .join('; '),
          labelled_amplitude: labelledAmplitude(shownRole.name, clamp),
        },
      });
    }
  return { label: labelOf(dialect), sweeps, problems: merged(problems) };
}

/** More columns than rows and no heading: one sweep per row, in all likelihood, which a person must say. */
function refuseWide(head: Head, dialect: Dialect, hints: ReadingHints): void {
  if (hints.table?.sweeps || hints.table?.voltage || hints.table?.current || dialect.headings) return;
  const rows = head.lines.filter((line) => line.trim() !== '').length;
  if (!(dialect.columns >= 200 && rows < dialect.columns)) return;
  throw new FormatError({
    code: 'ROWS_OR_COLUMNS',
    place: '',
    message: `The table has ${dialect.columns} columns and ${head.whole ? rows : `more than ${rows}`} rows without a header: one sweep a row, it seems, and no sampling rate.`,
    remedy: 'Say so in the sidecar, with the sampling rate and the unit.',
    sidecar:
      'table:\n  sweeps:  rows\n  rate_hz: 20000   # samples per second: put the true rate here\n  voltage: { columns: [1], unit: mV }   # from this column on',
  });
}

/**
 * Opens a table of text.
 *
 * @throws FormatError where the file is no text, no recording, or a person must say first how to read it
 */
export function openText(path: string, hints: ReadingHints): OpenRecording {
  const head = readHead(path);
  const dialect = findDialect(head, hints.table ?? {});
  refuseWide(head, dialect, hints);
  const table =
    hints.table?.sweeps === 'rows' ? readRowTable(path, dialect, hints) : readTable(path, head, dialect, hints);
  const { sweeps, problems } = table;
  const stimulus = hints.table?.stimulus;
  if (stimulus && 'pa' in stimulus && stimulus.pa.length !== sweeps.length)
    problems.push(
      warning({
        code: 'STIMULUS_LIST_LENGTH',
        place: '',
        message: `The sidecar lists ${count(stimulus.pa.length, 'stimulus amplitude')} for ${count(sweeps.length, 'sweep')}; ${stimulus.pa.length < sweeps.length ? 'the last sweeps have no stimulus stated' : 'the last amplitudes are not used'}.`,
        remedy: 'List one amplitude for each sweep, in the order of the file.',
      }),
    );
  const description: FileDescription = {
    format: 'text',
    format_label: table.label,
    session_start: null,
    facts: [],
    sweeps: sweeps.map(({ entry }) => entry),
    problems,
  };
  return {
    describe: () => description,
    read: (key): SweepSamples => {
      const at = sweeps.findIndex(({ entry }) => entry.key === key);
      const sweep = sweeps[at];
      if (!sweep) throw new RangeError(`no sweep "${key}" in this file`);
      const samples = (signal: Signal | null): Samples | null =>
        signal && { samples: scaled(signal, sweep), rate_hz: sweep.entry.rate_hz, start_s: sweep.start_s };
      return {
        clamp: sweep.entry.clamp,
        voltage: samples(sweep.voltage),
        current: samples(sweep.current),
        stated_stimulus: statedStimulus(hints.table, at),
        bridge_mohm: null,
        problems: [],
      };
    },
    close: () => {},
  };
}
