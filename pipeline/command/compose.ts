/** From one cell's facts and measured sweeps to its row of the ledger. Pure: everything it needs is handed in. */
import { conditionOf } from '../archive/cells.ts';
import type { Archive, CellRecord, CellSweepRef, Recipe } from '../archive/types.ts';
import type { Problem, SweepEntry } from '../formats/types.ts';
import { judgeCell } from '../judge/judge.ts';
import type { Circumstances, Contradiction, PolicyRule } from '../judge/types.ts';
import type { CellRow, SweepRow } from '../ledger/types.ts';
import { measureCell } from '../measure/cell.ts';
import { measuredCapacitance, withDerived } from '../measure/derive.ts';
import { correctPotentials } from '../measure/junction.ts';
import type { CellContext, NumberedSweep, SweepMeasure } from '../measure/types.ts';
import { cellContext, circumstancesOf } from './circumstances.ts';
import { type FactValues, textFact, valuesOf } from './facts.ts';

export interface CellParts {
  record: CellRecord;
  archive: Archive;
  recipes: ReadonlyMap<string, Recipe>;
  /** The measured sweep and what reading it had to say; null measure: it could not be read. */
  measured: (ref: CellSweepRef) => { measure: SweepMeasure | null; problems: Problem[] };
  entry: (ref: CellSweepRef) => SweepEntry | undefined;
  /** What describing a file had to say about all of it or about single sweeps. */
  fileProblems: (path: string) => Problem[];
  /** Start of the file's session in ms since 1970, null where unknown. */
  sessionStartMs: (path: string) => number | null;
  /** Why files of this cell could not be read. */
  unread: string[];
  /** Contradictions found across the archive: the same bytes filed twice and the like. */
  contradictions: Contradiction[];
  notes: string[];
}

export interface ComposedCell {
  row: CellRow;
  sweeps: SweepRow[];
}

interface Stretch {
  condition: string;
  facts: FactValues;
}

/** Facts in force for each sweep; the same label always means the same condition. */
function stretchesOf(record: CellRecord): Stretch[] {
  const base = valuesOf(record.facts);
  return record.sweeps.map((_, index) => {
    const { label, facts } = conditionOf(record, index);
    return { condition: label, facts: { ...base, ...facts } };
  });
}

/** Labels with the facts of their first sweep, in order of appearance. */
function conditionFacts(stretches: Stretch[], record: CellRecord): Map<string, FactValues> {
  const byLabel = new Map<string, FactValues>();
  for (const { condition, facts } of stretches) if (!byLabel.has(condition)) byLabel.set(condition, facts);
  if (byLabel.size === 0) byLabel.set('baseline', valuesOf(record.facts));
  return byLabel;
}

/** The value that most sweeps share, null where none states one. */
function commonest(values: (number | null | undefined)[]): number | null {
  const counts = new Map<number, number>();
  for (const value of values) if (typeof value === 'number') counts.set(value, (counts.get(value) ?? 0) + 1);
  let best: number | null = null;
  for (const [value, count] of counts) if (best === null || count > counts.get(best)!) best = value;
  return best;
}

/** Seconds since the cell's first sweep: by the clock where every file has one, else within one file. */
function sinceStart(parts: CellParts): (ref: CellSweepRef) => number | null {
  const paths = new Set(parts.record.sweeps.map((ref) => ref.path));
  const absolute = (ref: CellSweepRef): number | null => {
    if (ref.start_s === null) return null;
    if (paths.size === 1) return ref.start_s;
    const session = parts.sessionStartMs(ref.path);
    return session === null ? null : session / 1000 + ref.start_s;
  };
  const times = parts.record.sweeps.map(absolute).filter((time) => time !== null);
  const first = times.length > 0 ? Math.min(...times) : null;
  return (ref) => {
    const time = absolute(ref);
    return time === null || first === null ? null : time - first;
  };
}

const overshoots = (labelled: number, measured: number): boolean =>
  Math.abs(labelled - measured) > 0.1 * Math.max(Math.abs(labelled), Math.abs(measured));

/** Labels in the file that say another amplitude than the stimulus that was recorded. */
function labelContradictions(parts: CellParts, sweeps: SweepRow[]): Contradiction[] {
  const wrong = sweeps.filter((sweep) => {
    const labelled = parts.entry(parts.record.sweeps[sweep.sweep]!)?.labelled_amplitude;
    return (
      typeof labelled === 'number' &&
      sweep.stimulus.from === 'channel' &&
      sweep.stimulus.amplitude !== null &&
      overshoots(labelled, sweep.stimulus.amplitude)
    );
  });
  if (wrong.length === 0) return [];
  const names = wrong.map((sweep) => sweep.sweep).join(', ');
  return [
    {
      kind: 'label-contradicts-data',
      sentence: `The stimulus label of ${wrong.length} ${wrong.length === 1 ? 'sweep' : 'sweeps'} (${names}) gives another amplitude than the current that was recorded; the recorded current is used.`,
      place: wrong[0]!.file,
      remedy: 'Compare the protocol with the recorded stimulus; correct the label where the file is made.',
    },
  ];
}

function factContradictions(record: CellRecord): Contradiction[] {
  return Object.values(record.facts)
    .filter((fact) => fact.disagrees.length > 0)
    .map((fact) => {
      const others = fact.disagrees
        .map(
          (other) => `“${other.value}” (${other.origin.path}${other.origin.line ? `, line ${other.origin.line}` : ''})`,
        )
        .join(' and ');
      return {
        kind: 'facts-disagree',
        sentence: `${fact.key} is “${fact.value}” (${fact.origin.path}${fact.origin.line ? `, line ${fact.origin.line}` : ''}) but also ${others}; the nearer statement is used.`,
        place: fact.origin.path,
        remedy: 'Correct the statement that is wrong, or remove it.',
      };
    });
}

const contradictionKinds: Record<string, Contradiction['kind']> = {
  CELL_ID_TWICE: 'same-id',
  UNIT_GUESSED: 'unit-guessed',
  COLUMN_GUESSED: 'unit-guessed',
};

const problemContradictions = (problems: (Problem & { path: string })[]): Contradiction[] =>
  problems
    .filter((problem) => contradictionKinds[problem.code] !== undefined)
    .map((problem) => ({
      kind: contradictionKinds[problem.code]!,
      sentence: problem.message,
      place: problem.path,
      remedy: problem.remedy,
    }));

const policyOf = (archive: Archive): PolicyRule[] =>
  archive.settings.limits.map((limit) => ({
    quantity: limit.quantity,
    above: limit.above,
    below: limit.below,
    origin: `almanac.yaml${limit.line === null ? '' : `, line ${limit.line}`}`,
  }));

/** Sweeps with numbers, conditions and corrected potentials; unread ones are left out and stay in the problems. */
function numberSweeps(
  parts: CellParts,
  stretches: Stretch[],
  circumstances: ReadonlyMap<string, Circumstances>,
  problems: (Problem & { path: string })[],
): SweepRow[] {
  const since = sinceStart(parts);
  const rows: SweepRow[] = [];
  parts.record.sweeps.forEach((ref, sweep) => {
    const { measure, problems: found } = parts.measured(ref);
    problems.push(...found.map((problem) => ({ ...problem, path: ref.path })));
    if (!measure) return;
    const condition = stretches[sweep]!.condition;
    rows.push({
      ...correctPotentials(measure, circumstances.get(condition)!.ljp_applied_mv),
      sweep,
      condition,
      since_start_s: since(ref),
      cell: parts.record.id,
      file: ref.path,
      series: ref.series,
      source_sweep: ref.source_sweep,
    });
  });
  return rows;
}

/** Spike quantities that need equilibrium potentials and the cell's capacitance, condition by condition. */
function deriveSpikes(sweeps: SweepRow[], contextOf: (condition: string) => CellContext): SweepRow[] {
  const measured = measureCell(sweeps, contextOf);
  const capacitance = new Map(
    measured.conditions.map(({ condition, readings }) => [condition, measuredCapacitance(readings)]),
  );
  return sweeps.map((sweep) => {
    const context = contextOf(sweep.condition);
    const own = context.stated_capacitance_pf === null ? capacitance.get(sweep.condition) : null;
    return {
      ...sweep,
      spikes: withDerived(sweep.spikes, {
        e_na_mv: context.e_na_mv,
        e_k_mv: context.e_k_mv,
        capacitance_pf: context.stated_capacitance_pf ?? own?.value ?? null,
        capacitance_u95_pf: own?.u95 ?? null,
      }),
    };
  });
}

/** Remarks on the cell's files, those on sweeps of other cells left out. */
function problemsOfFiles({ record, fileProblems }: CellParts): (Problem & { path: string })[] {
  const keys = new Map<string, Set<string>>();
  for (const ref of record.sweeps) keys.set(ref.path, (keys.get(ref.path) ?? new Set()).add(ref.key));
  return [...keys].flatMap(([path, own]) =>
    fileProblems(path)
      .filter((problem) => problem.sweep_key === undefined || own.has(problem.sweep_key))
      .map((problem) => ({ ...problem, path })),
  );
}

export function composeCell(parts: CellParts): ComposedCell {
  const { record, archive } = parts;
  const stretches = stretchesOf(record);
  const factsOf = conditionFacts(stretches, record);
  const first = factsOf.values().next().value!;
  const entries = record.sweeps.map(parts.entry);
  const recorded = {
    rate_hz: commonest(entries.map((entry) => entry?.rate_hz)),
    filter_khz: commonest(entries.map((entry) => entry?.filter_khz)),
  };
  const circumstances = new Map(
    [...factsOf].map(([label, facts]) => [
      label,
      circumstancesOf(label, facts, first, archive.settings, parts.recipes, recorded),
    ]),
  );
  const contexts = new Map(
    [...factsOf].map(([label, facts]) => [label, cellContext(circumstances.get(label)!, facts, archive.settings)]),
  );
  const contextOf = (condition: string): CellContext => contexts.get(condition)!;
  const problems = [...record.problems, ...problemsOfFiles(parts)];
  const sweeps = deriveSpikes(numberSweeps(parts, stretches, circumstances, problems), contextOf);
  const measure = measureCell(sweeps, contextOf);
  const ordered = measure.conditions.map((one) => circumstances.get(one.condition)!);
  const judgement = judgeCell({
    cell: record.id,
    measure,
    sweeps: sweeps as NumberedSweep[],
    circumstances: ordered,
    policy: policyOf(archive),
    contradictions: [
      ...parts.contradictions,
      ...factContradictions(record),
      ...labelContradictions(parts, sweeps),
      ...problemContradictions(problems),
    ],
    unread: parts.unread,
  });
  const leading = ordered[0] ?? circumstances.values().next().value!;
  return {
    sweeps,
    row: {
      cell: record.id,
      facts: record.facts,
      circumstances: ordered,
      reading: leading.reading,
      ljp_applied_mv: leading.ljp_applied_mv,
      measure,
      judgement,
      decisions: archive.decisions.filter((decision) => decision.cell === record.id),
      files: [...new Set(record.sweeps.map((ref) => ref.path))].sort(),
      sweeps: sweeps.length,
      spikes: sweeps.reduce((sum, sweep) => sum + sweep.spikes.length, 0),
      date: textFact(first, 'date'),
      e_na_mv: leading.e_na?.mv ?? null,
      e_k_mv: leading.e_k?.mv ?? null,
      problems,
      notes: parts.notes,
    },
  };
}
