import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { afterAll } from 'vitest';
import { FormatError, openRecording } from '../../pipeline/formats/open.ts';
import type { FileDescription, Problem, ReadingHints, SweepSamples } from '../../pipeline/formats/types.ts';

/** A folder that is gone after the test file. */
export function temporaryFolder(): string {
  const folder = mkdtempSync(path.join(tmpdir(), 'almanac-formats-'));
  afterAll(() => rmSync(folder, { recursive: true, force: true }));
  return folder;
}

export interface Opened {
  description: FileDescription;
  /** Sweeps by key. */
  read: (key: string) => SweepSamples;
  codes: string[];
  problem: (code: string) => Problem;
  close: () => void;
}

export async function open(file: string, hints: ReadingHints = {}): Promise<Opened> {
  const recording = await openRecording(file, file.endsWith('.nwb') ? 'nwb' : 'text', hints);
  const description = recording.describe();
  return {
    description,
    read: (key) => recording.read(key),
    codes: description.problems.map(({ code }) => code),
    problem: (code) => {
      const found = description.problems.find((problem) => problem.code === code);
      if (!found) throw new Error(`no ${code} among ${description.problems.map((problem) => problem.code).join(', ')}`);
      return found;
    },
    close: () => recording.close(),
  };
}

/** The problem with which opening or reading fails. */
export async function refusal(attempt: () => Promise<unknown> | unknown): Promise<Problem> {
  try {
    await attempt();
  } catch (error) {
    if (error instanceof FormatError) return error.problem;
    throw error;
  }
  throw new Error('it was read without complaint');
}

let files = 0;

/** Writes a text file and returns its path. */
export function textFile(folder: string, content: string | Uint8Array, ending = 'csv'): string {
  const file = path.join(folder, `t${files++}.${ending}`);
  writeFileSync(file, content);
  return file;
}

/** The potential that the generator of the NWB files writes, mV. */
export const potentialMv = (index: number, k: number): number =>
  (-0.0703125 + ((index * 7 + k * 13) % 64) / 32768) * 1000;

/** The current that it writes, pA. */
export const commandPa = (index: number, k: number): number => (index >= 500 && index < 1500 ? (k - 2) * 50 : 0);

/** Largest distance between samples and a formula; Infinity where one is NaN. */
export function farthest(samples: Float64Array, expected: (index: number) => number): number {
  let largest = 0;
  for (let index = 0; index < samples.length; index++) {
    const distance = Math.abs(samples[index]! - expected(index));
    largest = Number.isNaN(distance) ? Number.POSITIVE_INFINITY : Math.max(largest, distance);
  }
  return largest;
}
