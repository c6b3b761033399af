/**
 * Opens one file at a time, away from the main thread: a damaged file can make the HDF5 library loop or abort, and
 * then only this thread is lost. Answers with `progress` after every sweep, so that the other side can tell a long
 * file from a stuck one.
 */
import { parentPort } from 'node:worker_threads';
import { openRecording } from '../formats/open.ts';
import type { FileDescription, FormatId, Problem, ReadingHints, SweepSamples } from '../formats/types.ts';
import { measureSweep } from '../measure/sweep.ts';
import type { MeasureContext, SweepInput, SweepMeasure } from '../measure/types.ts';

export interface SurveyTask {
  kind: 'survey';
  file: string;
  format: FormatId;
  hints: ReadingHints;
}

export interface MeasureTask {
  kind: 'measure';
  file: string;
  format: FormatId;
  hints: ReadingHints;
  sweeps: { key: string; context: MeasureContext; bridge_mohm: number | null; bias_pa: number | null }[];
}

export type Task = SurveyTask | MeasureTask;

export type MeasuredSweeps = Record<string, { measure: SweepMeasure | null; problems: Problem[] }>;

export type Answer =
  | { kind: 'progress'; done: number; of: number }
  | { kind: 'surveyed'; description: FileDescription }
  | { kind: 'measured'; sweeps: MeasuredSweeps }
  | { kind: 'failed'; problem: Problem };

const problemOf = (error: unknown): Problem => {
  const own = (error as { problem?: Problem }).problem;
  if (own) return own;
  return {
    code: 'READ_FAILED',
    weight: 'blocks',
    place: '',
    message: `The file could not be read: ${error instanceof Error ? error.message : String(error)}.`,
    remedy: 'Open a copy with another reader of this format; if it fails there too, restore the file from a backup.',
  };
};

const inputOf = (samples: SweepSamples, bridge: number | null, bias: number | null): SweepInput => ({
  clamp: samples.clamp,
  voltage: samples.voltage,
  current: samples.current,
  stated_stimulus: samples.stated_stimulus,
  bridge_mohm: samples.bridge_mohm ?? bridge,
  bias_pa: bias,
  compensation: samples.compensation ?? null,
});

async function run(task: Task, report: (answer: Answer) => void): Promise<Answer> {
  const recording = await openRecording(task.file, task.format, task.hints);
  try {
    if (task.kind === 'survey') return { kind: 'surveyed', description: recording.describe() };
    const sweeps: MeasuredSweeps = {};
    for (const [index, { key, context, bridge_mohm, bias_pa }] of task.sweeps.entries()) {
      try {
        const samples = recording.read(key);
        sweeps[key] = {
          measure: measureSweep(inputOf(samples, bridge_mohm, bias_pa), context),
          problems: samples.problems,
        };
      } catch (error) {
        sweeps[key] = { measure: null, problems: [{ ...problemOf(error), sweep_key: key }] };
      }
      report({ kind: 'progress', done: index + 1, of: task.sweeps.length });
    }
    return { kind: 'measured', sweeps };
  } finally {
    try {
      recording.close();
    } catch {
      // A file that cannot be closed is given up with this worker, which is replaced after any trouble.
    }
  }
}

parentPort?.on('message', async (task: Task) => {
  const post = (answer: Answer): void => parentPort?.postMessage(answer);
  try {
    post(await run(task, post));
  } catch (error) {
    post({ kind: 'failed', problem: problemOf(error) });
  }
});
