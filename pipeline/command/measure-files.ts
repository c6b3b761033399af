/** Measures the sweeps of every file whose measurement is not in the ledger yet. */
import path from 'node:path';
import { conditionOf } from '../archive/cells.ts';
import type { Archive, CellRecord } from '../archive/types.ts';
import type { Problem, SweepEntry } from '../formats/types.ts';
import type { SurveyedFile } from '../ledger/types.ts';
import type { Ledger } from '../ledger/write.ts';
import { measureContext } from './circumstances.ts';
import { numberFact, valuesOf } from './facts.ts';
import type { Progress } from './progress.ts';
import { readAll } from './reading-pool.ts';
import type { MeasuredSweeps, MeasureTask } from './reading-worker.ts';
import { digest } from './survey.ts';

/** A file that finishes no sweep for this long is given up, ms. */
const sweepPatienceMs = 120_000;

interface Planned {
  path: string;
  key: string;
  task: MeasureTask;
}

export interface Measured {
  /** Ledger key by file path. */
  keys: Map<string, string>;
  /** Why a file gave nothing, by path. */
  failures: Map<string, Problem>;
  used: Set<string>;
  /** Files that had to be opened. */
  opened: number;
}

/** One task per file: its sweeps with what measuring must know, as the cells they belong to have it. */
function planFiles(archive: Archive, surveyed: SurveyedFile[], cells: CellRecord[], version: string): Planned[] {
  const sweepsOf = new Map<string, MeasureTask['sweeps']>();
  const entries = entriesByFile(surveyed);
  for (const cell of cells)
    cell.sweeps.forEach((ref, index) => {
      const facts = { ...valuesOf(cell.facts), ...conditionOf(cell, index).facts };
      const entry = entries.get(ref.path)?.get(ref.key);
      const list = sweepsOf.get(ref.path) ?? [];
      list.push({
        key: ref.key,
        context: measureContext(facts, archive.settings, entry?.filter_khz ?? null),
        bridge_mohm: entry?.bridge_mohm ?? numberFact(facts, 'bridge_mohm'),
        bias_pa: entry?.bias_pa ?? null,
      });
      sweepsOf.set(ref.path, list);
    });
  return surveyed
    .filter((file) => file.description !== null && sweepsOf.has(file.found.path))
    .map(({ found, sha256 }) => {
      const sweeps = sweepsOf.get(found.path)!;
      return {
        path: found.path,
        key: digest([version, sha256, found.format, found.hints, sweeps]),
        task: {
          kind: 'measure',
          file: path.join(archive.root, found.path),
          format: found.format!,
          hints: found.hints,
          sweeps,
        },
      };
    });
}

export function entriesByFile(surveyed: SurveyedFile[]): Map<string, Map<string, SweepEntry>> {
  return new Map(
    surveyed.map((file) => [
      file.found.path,
      new Map((file.description?.sweeps ?? []).map((entry) => [entry.key, entry])),
    ]),
  );
}

export async function measureFiles(
  archive: Archive,
  surveyed: SurveyedFile[],
  cells: CellRecord[],
  ledger: Ledger,
  options: { jobs: number; version: string; progress: Progress },
): Promise<Measured> {
  const plans = planFiles(archive, surveyed, cells, options.version);
  const keys = new Map(plans.map((plan) => [plan.path, plan.key]));
  const waiting = plans.filter((plan) => !ledger.hasMeasure(plan.key));
  const failures = new Map<string, Problem>();
  const bar = options.progress.start('Measuring', waiting.length);
  await readAll(
    waiting.map((plan) => plan.task),
    { jobs: options.jobs, patienceMs: sweepPatienceMs },
    (index, answer) => {
      const plan = waiting[index]!;
      if (answer.kind === 'measured') ledger.rememberMeasure(plan.key, answer.sweeps);
      else if (answer.kind === 'failed') {
        failures.set(plan.path, answer.problem);
        keys.delete(plan.path);
      }
      bar.step(plan.path);
    },
  );
  bar.done();
  return { keys, failures, used: new Set(keys.values()), opened: waiting.length };
}

/** Share of unreadable samples over all sweeps of a file, weighted by length. */
export function unreadShare(sweeps: MeasuredSweeps): number {
  let missing = 0;
  let total = 0;
  for (const { measure } of Object.values(sweeps)) {
    if (!measure) continue;
    missing += (measure.readings['missing_fraction']?.value ?? 0) * measure.duration_s;
    total += measure.duration_s;
  }
  return total > 0 ? missing / total : 0;
}
