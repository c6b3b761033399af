/** Opens NWB files of version 2 (and, where they say the same in other places, of version 1). */

import {
  damaged,
  groupAt,
  type Hdf5,
  identity,
  inventory,
  look,
  openHdf5,
  type SeriesPiece,
  textAttribute,
  textDataset,
} from './hdf5.ts';
import { labelledAmplitude } from './labels.ts';
import { type FileFacts, readFacts } from './nwb-facts.ts';
import { indexStimuli, matchStimulus } from './nwb-match.ts';
import { type Piece, type Placed, placePiece, readPiece, type SeriesClock, statedClock } from './nwb-samples.ts';
import { describeSeries, type Series, walkSeries } from './nwb-series.ts';
import { readTables, type Tables } from './nwb-tables.ts';
import { type Scaling, type Settled, settleUnit } from './nwb-units.ts';
import { blocker, count, FormatError, firstFew, plain, warning } from './problems.ts';
import type {
  FileDescription,
  OpenRecording,
  Problem,
  ReadingHints,
  Samples,
  SweepEntry,
  SweepSamples,
} from './types.ts';

/** A sweep and everything needed to read it. */
interface Plan {
  entry: SweepEntry;
  response: Piece;
  scaling: Scaling;
  clock: SeriesClock;
  stimulus: { piece: Piece; scaling: Scaling; clock: SeriesClock } | null;
  /** I=0: no current flowed because the amplifier was told so. */
  noCurrent: boolean;
}

interface Context {
  hdf5: Hdf5;
  hints: ReadingHints;
  problems: Problem[];
  settled: Map<string, Settled>;
}

const settle = (series: Series, context: Context): Settled => {
  const known = context.settled.get(series.path);
  if (known) return known;
  const settled = settleUnit(series, context.hints);
  context.settled.set(series.path, settled);
  context.problems.push(...settled.problems);
  return settled;
};

/** A sweep to be: which piece of which series, and what the tables say of it. */
interface Candidate {
  key: string;
  response: Piece;
  stimulus: Piece | null;
  source_sweep: number | null;
  protocol: string;
  /** Several stimuli fit, and a problem has said so. */
  ambiguous?: boolean;
}

function refuseOtherLayouts(hdf5: Hdf5): string {
  const { file, module } = hdf5;
  const type = textAttribute(file, 'neurodata_type', module);
  const version = textAttribute(file, 'nwb_version', module) || textDataset(file, 'nwb_version').replace(/^NWB-/, '');
  if (type === 'NWBFile' || version !== '') return version;
  let held: string[];
  try {
    held = inventory(hdf5);
  } catch (error) {
    throw damaged('/', error);
  }
  throw new FormatError({
    code: 'NOT_NWB',
    place: '/',
    message: `This is an HDF5 file, but no NWB file. It holds ${held.length === 0 ? 'no data' : firstFew(held, 12)}.`,
    remedy: 'Write it as NWB, or export the traces as delimited text with a sidecar that says which column is what.',
  });
}

/** Turns a row of the table into a piece, cut to what the series holds. */
function pieceOf(row: SeriesPiece, series: Series, problems: Problem[]): Piece | null {
  const from = Math.max(0, row.from);
  const wanted = row.count < 0 ? series.length - from : row.count;
  const length = Math.min(wanted, series.length - from);
  if (length < wanted)
    problems.push(
      warning({
        code: 'PIECE_TOO_LONG',
        place: series.path,
        message: `The table of recordings asks for ${wanted} samples from ${from} on, the series holds ${series.length}. What is there is read.`,
        remedy: 'Check that the recording was written to its end.',
        sweep_key: series.path,
      }),
    );
  return length > 0 ? { series, column: 0, from, length } : null;
}

function tableCandidates(
  tables: Tables,
  seriesAt: (path: string) => Series | null,
  problems: Problem[],
): { candidates: Candidate[]; covered: Set<string> } {
  const candidates: Candidate[] = [];
  const covered = new Set<string>();
  for (const { row, response, stimulus, simultaneous, protocol } of tables.rows) {
    const series = response && seriesAt(response.path!);
    if (!series) continue;
    covered.add(series.path);
    const piece = pieceOf(response, series, problems);
    if (!piece) continue;
    const partner = stimulus && seriesAt(stimulus.path!);
    const whole = piece.from === 0 && piece.length === series.length;
    const key = whole ? series.path : `${series.path}[${piece.from}:${piece.from + piece.length}]`;
    candidates.push({
      key: candidates.some((other) => other.key === key) ? `${key} row ${row}` : key,
      response: piece,
      stimulus: partner ? pieceOf(stimulus, partner, problems) : null,
      source_sweep: series.sweep_number ?? simultaneous,
      protocol: protocol || series.label,
    });
  }
  return { candidates, covered };
}

const wholeOf = (series: Series, column = 0): Piece => ({ series, column, from: 0, length: series.length });

function looseCandidates(
  all: readonly Series[],
  covered: ReadonlySet<string>,
  tables: Tables,
  problems: Problem[],
): Candidate[] {
  const stimuli = all.filter((series) => series.stimulus);
  const responses = all.filter((series) => !series.stimulus);
  const numberOf = (series: Series): number | null =>
    series.sweep_number ?? tables.sweepNumbers.get(series.path) ?? null;
  const index = indexStimuli(stimuli, numberOf);
  return responses
    .filter((series) => !covered.has(series.path))
    .flatMap((series) => {
      const match = matchStimulus(series, index, responses.length === 1);
      if (match && 'candidates' in match)
        problems.push(
          warning({
            code: 'STIMULUS_AMBIGUOUS',
            place: series.path,
            message: `Several stimuli could belong to this sweep: ${firstFew(match.candidates.map(({ path }) => path))}. None is used.`,
            remedy: 'Give each sweep its own sweep number, or name the stimulus as the response is named.',
            sweep_key: series.path,
          }),
        );
      const stimulus = match && 'stimulus' in match ? match.stimulus : null;
      const ambiguous = match !== null && stimulus === null;
      return Array.from(
        { length: series.columns },
        (_, column): Candidate => ({
          key: series.columns === 1 ? series.path : `${series.path}#${column + 1}`,
          response: wholeOf(series, column),
          stimulus: stimulus && wholeOf(stimulus, stimulus.columns === series.columns ? column : 0),
          source_sweep: numberOf(series),
          protocol: series.label || (stimulus?.label ?? ''),
          ambiguous,
        }),
      );
    });
}

/** The clock of a series; where the file states none, the rate of the sidecar. */
function clockOf(series: Series, hints: ReadingHints): SeriesClock {
  const stated = statedClock(series);
  if (stated) return stated;
  const rate = hints.table?.rate_hz ?? hints.rate_hz;
  if (rate) return { rate_hz: rate, start_s: series.start_s };
  throw new FormatError({
    code: 'RATE_MISSING',
    place: series.path,
    message:
      series.rate_hz === null
        ? 'The series states neither a sampling rate nor usable timestamps.'
        : `The sampling rate is ${plain(series.rate_hz)} Hz.`,
    remedy: 'State the sampling rate in the sidecar.',
    sidecar: 'facts: { rate_hz: 20000 }   # the true rate, Hz',
  });
}

function planSweep(candidate: Candidate, context: Context, filters: Map<string, number>): Plan | null {
  const { hints, problems } = context;
  const { series } = candidate.response;
  const { scaling } = settle(series, context);
  if (!scaling) return null;
  let clock: SeriesClock;
  try {
    clock = clockOf(series, hints);
  } catch (error) {
    problems.push({ ...damaged(series.path, error).problem, sweep_key: candidate.key });
    return null;
  }
  const clamp = scaling.dimension === 'voltage' ? 'current' : 'voltage';
  const stimulus = planStimulus(candidate, scaling, context);
  const label = candidate.protocol;
  const bridge = clamp === 'current' ? series.bridge_mohm : null;
  return {
    response: candidate.response,
    scaling,
    clock,
    stimulus,
    noCurrent: series.type === 'IZeroClampSeries' && !stimulus,
    entry: {
      key: candidate.key,
      series: candidate.key.replace(series.path, series.name),
      electrode: series.electrode,
      clamp,
      source_sweep: candidate.source_sweep,
      start_s: clock.start_s === null ? null : clock.start_s + candidate.response.from / clock.rate_hz,
      samples: candidate.response.length,
      rate_hz: clock.rate_hz,
      protocol: label,
      has_voltage: clamp === 'current' || stimulus !== null,
      has_current: clamp === 'voltage' || stimulus !== null,
      bridge_mohm: bridge,
      bias_pa: clamp === 'current' ? series.bias_pa : null,
      filter_khz: filters.get(series.electrode) ?? null,
      scaling: scaling.text,
      labelled_amplitude:
        labelledAmplitude(label, clamp) ??
        (candidate.stimulus ? labelledAmplitude(candidate.stimulus.series.name, clamp) : null),
    },
  };
}

function planStimulus(candidate: Candidate, response: Scaling, context: Context): Plan['stimulus'] {
  const { hints, problems } = context;
  const piece = candidate.stimulus;
  const { series } = candidate.response;
  if (!piece) {
    if (series.type !== 'IZeroClampSeries' && !candidate.ambiguous)
      problems.push(
        warning({
          code: 'STIMULUS_MISSING',
          place: series.path,
          message:
            response.dimension === 'voltage'
              ? 'No stimulus belongs to this sweep: no table, sweep number or name leads to one.'
              : 'No command belongs to this sweep: no table, sweep number or name leads to one.',
          remedy: 'What depends on the injected current is not measured. Write the stimulus into the file.',
          sweep_key: candidate.key,
        }),
      );
    return null;
  }
  const { scaling } = settle(piece.series, context);
  if (!scaling) return null;
  if (scaling.dimension === response.dimension) {
    problems.push(
      warning({
        code: 'STIMULUS_UNIT',
        place: piece.series.path,
        message: `The stimulus is a ${scaling.dimension === 'voltage' ? 'potential' : 'current'}, and so is what was recorded under it. It is left out.`,
        remedy: 'Check the unit and class of the stimulus.',
        sweep_key: candidate.key,
      }),
    );
    return null;
  }
  try {
    return { piece, scaling, clock: clockOf(piece.series, hints) };
  } catch (error) {
    problems.push({ ...damaged(piece.series.path, error).problem, weight: 'warns', sweep_key: candidate.key });
    return null;
  }
}

/** What is worth saying about samples that have been read. */
function remarks(placed: Placed, kind: 'voltage' | 'current', place: string): Problem[] {
  const problems: Problem[] = [];
  let unreadable = 0;
  let largest = 0;
  for (const value of placed.samples) {
    if (Number.isNaN(value)) unreadable++;
    else if (Math.abs(value) > largest) largest = Math.abs(value);
  }
  if (placed.gaps > 0)
    problems.push(
      warning({
        code: 'TIME_GAPS',
        place,
        message: `The timestamps leave out ${count(placed.gaps, 'sample')}; they count as unreadable.`,
        remedy: 'Nothing is interpolated. Check what interrupted the recording.',
      }),
    );
  if (unreadable > placed.gaps)
    problems.push(
      warning({
        code: 'SAMPLES_UNREADABLE',
        place,
        message: `${unreadable - placed.gaps} of ${placed.samples.length} samples are no finite numbers.`,
        remedy: 'They are left out. Check how the file was written.',
      }),
    );
  if (largest > (kind === 'voltage' ? 1000 : 1e7))
    problems.push(
      warning({
        code: 'SCALE_IMPLAUSIBLE',
        place,
        message: `The samples reach ${plain(largest)} ${kind === 'voltage' ? 'mV' : 'pA'} by the unit and conversion of the file, which no membrane does. They are read as stated.`,
        remedy: 'Check "unit" and "conversion"; the true unit may be stated in the sidecar.',
        sidecar: `table:\n  ${kind}: { columns: ["${place.replace(/\/data$/, '')}"], unit: ${kind === 'voltage' ? 'mV' : 'pA'} }`,
      }),
    );
  return problems;
}

function readSweep(plan: Plan, hdf5: Hdf5): SweepSamples {
  const read = (piece: Piece, scaling: Scaling, clock: SeriesClock): Placed =>
    placePiece(piece, readPiece(piece, scaling.scale, scaling.shift), clock, hdf5);
  const response = read(plan.response, plan.scaling, plan.clock);
  const problems = remarks(response, plan.scaling.dimension, plan.response.series.data.path);
  const own: Samples = { samples: response.samples, rate_hz: response.rate_hz, start_s: 0 };
  let other: Samples | null = null;
  if (plan.stimulus) {
    const { piece, scaling, clock } = plan.stimulus;
    try {
      const placed = read(piece, scaling, clock);
      other = { samples: placed.samples, rate_hz: placed.rate_hz, start_s: delay(response, placed, piece, problems) };
      problems.push(...remarks(placed, scaling.dimension, piece.series.data.path), ...lengths(own, other, piece));
      if (plan.response.series.type === 'IZeroClampSeries' && placed.samples.some((value) => Math.abs(value) > 0.05))
        problems.push(
          warning({
            code: 'CLAMP_CONTRADICTS_DATA',
            place: piece.series.path,
            message:
              'The sweep is filed as recorded at zero current, yet its stimulus is not zero. The stimulus is trusted.',
            remedy: 'Check the clamp mode of this sweep.',
          }),
        );
    } catch (error) {
      problems.push({ ...damaged(piece.series.path, error).problem, weight: 'warns' });
    }
  }
  const voltage = plan.scaling.dimension === 'voltage' ? own : other;
  const current = plan.scaling.dimension === 'voltage' ? other : own;
  return {
    clamp: plan.entry.clamp,
    voltage,
    current,
    stated_stimulus: plan.noCurrent ? { kind: 'none' } : null,
    bridge_mohm: plan.entry.bridge_mohm,
    compensation: plan.entry.clamp === 'voltage' ? plan.response.series.compensation : null,
    problems,
  };
}

/** Seconds from the start of the sweep to the start of its stimulus. */
function delay(response: Placed, stimulus: Placed, piece: Piece, problems: Problem[]): number {
  if (response.start_s === null || stimulus.start_s === null) return 0;
  const late = stimulus.start_s - response.start_s;
  const within =
    late < response.samples.length / response.rate_hz && -late < stimulus.samples.length / stimulus.rate_hz;
  // Less than a hundredth of a sample is rounding of the two starting times.
  if (within) return Math.abs(late) * response.rate_hz < 0.01 ? 0 : late;
  problems.push(
    warning({
      code: 'STIMULUS_CLOCK',
      place: piece.series.path,
      message: `The stimulus is said to start ${plain(late)} s after its sweep, and the two would not overlap. They are taken to start together.`,
      remedy: 'Check "starting_time" of the stimulus.',
    }),
  );
  return 0;
}

function lengths(response: Samples, stimulus: Samples, piece: Piece): Problem[] {
  const [long, short] = [response, stimulus].map(({ samples, rate_hz }) => samples.length / rate_hz) as [
    number,
    number,
  ];
  if (Math.abs(long - short) <= 1.5 / Math.min(response.rate_hz, stimulus.rate_hz)) return [];
  return [
    warning({
      code: 'STIMULUS_LENGTH',
      place: piece.series.path,
      message: `The stimulus lasts ${plain(short)} s and the sweep ${plain(long)} s. Beyond the shorter one nothing is assumed.`,
      remedy: 'Check that stimulus and response belong together.',
    }),
  ];
}

const byStart = (a: Plan, b: Plan): number => {
  const [first, second] = [a.entry.start_s, b.entry.start_s];
  if (first !== null && second !== null && first !== second) return first - second;
  return a.entry.key < b.entry.key ? -1 : a.entry.key > b.entry.key ? 1 : 0;
};

/** Sweep numbers repeat over and over in one message; one problem for many sweeps says it once. */
function gathered(problems: readonly Problem[]): Problem[] {
  const kept: Problem[] = [];
  const groups = new Map<string, Problem[]>();
  for (const problem of problems) {
    const alike = `${problem.code}|${problem.weight}|${problem.message}`;
    const group = groups.get(alike);
    if (group) group.push(problem);
    else {
      groups.set(alike, [problem]);
      kept.push(problem);
    }
  }
  return kept.map((problem) => {
    const group = groups.get(`${problem.code}|${problem.weight}|${problem.message}`)!;
    if (group.length === 1 || problem.weight === 'blocks') return problem;
    const { sweep_key: _, ...general } = problem;
    return {
      ...general,
      message: `${problem.message} The same holds for ${count(group.length - 1, 'more sweep')}.`,
    };
  });
}

function describe(plans: Plan[], facts: FileFacts, version: string, problems: Problem[]): FileDescription {
  return {
    format: 'nwb',
    format_label: version === '' ? 'NWB' : `NWB ${version}`,
    session_start: facts.session_start,
    facts: facts.facts,
    sweeps: plans.map(({ entry }) => entry),
    problems: gathered([...problems, ...facts.problems]),
  };
}

function planFile(hdf5: Hdf5, hints: ReadingHints): { plans: Plan[]; description: FileDescription } {
  const version = refuseOtherLayouts(hdf5);
  const walk = walkSeries(hdf5);
  const problems = [...walk.problems];
  const context: Context = { hdf5, hints, problems, settled: new Map() };
  const known = new Map(walk.series.map((series) => [series.path, series]));
  // Tables may name a series by another of its paths.
  const usual = (path: string): string => walk.met.get(identity(path, hdf5)) ?? path;
  const seriesAt = (asNamed: string): Series | null => {
    const path = usual(asNamed);
    const listed = known.get(path);
    if (listed) return listed;
    const group = groupAt(hdf5.file, path);
    const described = group && describeSeries(group, hdf5, problems);
    if (described) known.set(path, described);
    return described;
  };
  const stored = readTables(hdf5);
  const tables = {
    ...stored,
    sweepNumbers: new Map([...stored.sweepNumbers].map(([path, sweep]) => [usual(path), sweep])),
  };
  problems.push(...tables.problems);
  const fromTables = tableCandidates(tables, seriesAt, problems);
  const candidates = [...fromTables.candidates, ...looseCandidates(walk.series, fromTables.covered, tables, problems)];
  const electrodes = [...new Set(candidates.map(({ response }) => response.series.electrode))].sort();
  const facts = readFacts(hdf5, electrodes);
  const plans = candidates
    .map((candidate) => planSweep(candidate, context, facts.filter_khz))
    .filter((plan) => plan !== null)
    .sort(byStart);
  const split = walk.series.filter((series) => series.columns > 1);
  for (const series of split)
    problems.push(
      warning({
        code: 'TRACES_SPLIT',
        place: series.path,
        message: `The samples are an array of ${series.columns} traces of ${series.length} samples. Each trace is read as a sweep of its own.`,
        remedy: 'Check that the traces are sweeps of one kind; write one series for each.',
      }),
    );
  if (walk.others.length > 0)
    problems.push(
      warning({
        code: 'OTHER_SERIES',
        place: '/acquisition',
        message: `Series of other classes (${walk.others.length}) were left aside: ${firstFew(walk.others)}.`,
        remedy: 'If one holds a membrane potential, write it as CurrentClampSeries.',
      }),
    );
  if (plans.length === 0 && !problems.some(({ weight }) => weight === 'blocks'))
    problems.push(
      blocker({
        code: 'NO_SWEEPS',
        place: '/acquisition',
        message: `The file holds no intracellular series. It holds ${firstFew(inventory(hdf5), 12) || 'no data'}.`,
        remedy:
          'Write the recordings as CurrentClampSeries, VoltageClampSeries or IZeroClampSeries under /acquisition.',
      }),
    );
  return { plans, description: describe(plans, facts, version, problems) };
}

/**
 * Opens an NWB file. Units of series may be stated in the sidecar as
 * `table: { voltage: { columns: [SERIES NAME], unit: mV } }`.
 *
 * @throws FormatError where the file is no HDF5 file, damaged as a whole, or no NWB file
 */
export async function openNwb(path: string, hints: ReadingHints): Promise<OpenRecording> {
  const hdf5 = await openHdf5(path);
  const close = (): void => {
    hdf5.file.close();
  };
  try {
    const acquisition = look(hdf5.file, '/acquisition');
    if (acquisition.kind === 'damaged') throw damaged('/acquisition', acquisition.reason);
    const { plans, description } = planFile(hdf5, hints);
    const byKey = new Map(plans.map((plan) => [plan.entry.key, plan]));
    return {
      describe: () => description,
      read: (key) => {
        const plan = byKey.get(key);
        if (!plan) throw new RangeError(`no sweep "${key}" in this file`);
        return readSweep(plan, hdf5);
      },
      close,
    };
  } catch (error) {
    try {
      close();
    } catch {
      // The first error is the one that says something.
    }
    throw error instanceof FormatError || error instanceof RangeError ? error : damaged('', error);
  }
}
