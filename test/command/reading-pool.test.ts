import { describe, expect, test } from 'vitest';
import { readAll } from '../../pipeline/command/reading-pool.ts';
import type { Task } from '../../pipeline/command/reading-worker.ts';

const worker = new URL('./awkward-worker.ts', import.meta.url);
const task = (file: string): Task => ({ kind: 'measure', file, format: 'nwb', hints: {}, sweeps: [] });

async function outcomes(files: string[], jobs: number): Promise<string[]> {
  const answers: string[] = files.map(() => 'none');
  await readAll(files.map(task), { jobs, patienceMs: 600, worker }, (index, answer) => {
    answers[index] = answer.kind === 'failed' ? answer.problem.code : answer.kind;
  });
  return answers;
}

describe('reading in workers', () => {
  test('nothing to read', async () => expect(await outcomes([], 2)).toEqual([]));
  test('a file that hangs, one that ends the thread and one that throws cost only themselves', async () =>
    expect(await outcomes(['good', 'hangs', 'good', 'dies', 'throws', 'good'], 2)).toEqual([
      'measured',
      'READ_STUCK',
      'measured',
      'READ_CRASHED',
      'READ_CRASHED',
      'measured',
    ]));
  test('one lane is enough to get past trouble', async () =>
    expect(await outcomes(['dies', 'hangs', 'good'], 1)).toEqual(['READ_CRASHED', 'READ_STUCK', 'measured']));
  test('a long file that shows progress is not given up', async () =>
    expect(await outcomes(['slow but alive'], 1)).toEqual(['measured']));
});
