/** One thread of the truth bench: measures the recordings of one subject at a time and hands back its trials. */
import path from 'node:path';
import { parentPort } from 'node:worker_threads';
import type { Family, Trial, TrialOptions } from './score.ts';

/** A family's file, and which of its trials. */
export interface Part {
  file: string;
  options: TrialOptions;
}

export const familyIn = async (file: string): Promise<Partial<Family>> =>
  (await import(path.join(import.meta.dirname, file))) as Partial<Family>;

parentPort?.on('message', async ({ file, options }: Part) => {
  const family = await familyIn(file);
  const trials: Trial[] = family.trials!(options);
  parentPort!.postMessage(trials);
});
