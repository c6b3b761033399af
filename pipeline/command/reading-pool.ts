import { Worker } from 'node:worker_threads';
import type { Problem } from '../formats/types.ts';
import type { Answer, Task } from './reading-worker.ts';

export interface PoolOptions {
  /** Threads that read at the same time, at least 1. */
  jobs: number;
  /** A file that gives no sign of life for this long is given up, ms. */
  patienceMs: number;
  /** The worker's code; tests put in one that hangs or dies. */
  worker?: URL;
}

const readingWorker = new URL('./reading-worker.ts', import.meta.url);

const stuck = (patienceMs: number): Problem => ({
  code: 'READ_STUCK',
  weight: 'blocks',
  place: '',
  message: `Reading did not get on for ${Math.round(patienceMs / 1000)} s and was stopped.`,
  remedy: 'The file is probably damaged: restore it from a backup, or move it out of the archive.',
});

const crashed = (reason: string): Problem => ({
  code: 'READ_CRASHED',
  weight: 'blocks',
  place: '',
  message: `Reading ended without an answer (${reason}).`,
  remedy: 'The file is probably damaged: restore it from a backup, or move it out of the archive.',
});

/**
 * Runs every task in its turn on up to `jobs` worker threads and hands each final answer to `onAnswer` in the order
 * in which they finish. Never rejects for a bad file: a stuck or crashed worker is replaced and the file's answer is
 * `failed`. A worker that met any trouble is not used again, since the HDF5 library may keep damaged state.
 *
 * @param onAnswer gets the task's index; whatever it throws ends the run
 */
export async function readAll(
  tasks: readonly Task[],
  options: PoolOptions,
  onAnswer: (index: number, answer: Exclude<Answer, { kind: 'progress' }>) => void,
): Promise<void> {
  let next = 0;
  const lane = async (): Promise<void> => {
    let worker: Worker | null = null;
    try {
      while (next < tasks.length) {
        const index = next++;
        worker ??= startWorker(options.worker ?? readingWorker);
        const answer = await ask(worker, tasks[index]!, options.patienceMs);
        if (needsFreshWorker(answer)) {
          await worker.terminate();
          worker = null;
        }
        onAnswer(index, answer);
      }
    } finally {
      await worker?.terminate();
    }
  };
  const lanes = Math.max(1, Math.min(options.jobs, tasks.length));
  await Promise.all(Array.from({ length: lanes }, lane));
}

const startWorker = (code: URL): Worker =>
  // Messages that the HDF5 library prints about damaged files would only repeat the problem in its own words.
  new Worker(code, { stdout: true, stderr: true });

function needsFreshWorker(answer: Answer): boolean {
  if (answer.kind === 'failed') return true;
  return answer.kind === 'measured' && Object.values(answer.sweeps).some((sweep) => sweep.measure === null);
}

function ask(worker: Worker, task: Task, patienceMs: number): Promise<Exclude<Answer, { kind: 'progress' }>> {
  return new Promise((resolve) => {
    let timer = setTimeout(() => finish({ kind: 'failed', problem: stuck(patienceMs) }), patienceMs);
    const finish = (answer: Exclude<Answer, { kind: 'progress' }>): void => {
      clearTimeout(timer);
      worker.off('message', onMessage);
      worker.off('error', onError);
      worker.off('exit', onExit);
      resolve(answer);
    };
    const onMessage = (answer: Answer): void => {
      if (answer.kind !== 'progress') {
        finish(answer);
        return;
      }
      clearTimeout(timer);
      timer = setTimeout(() => finish({ kind: 'failed', problem: stuck(patienceMs) }), patienceMs);
    };
    const onError = (error: Error): void => finish({ kind: 'failed', problem: crashed(error.message) });
    const onExit = (code: number): void => finish({ kind: 'failed', problem: crashed(`exit code ${code}`) });
    worker.on('message', onMessage);
    worker.on('error', onError);
    worker.on('exit', onExit);
    worker.postMessage(task);
  });
}
