/** Archives written into a temporary folder for the length of one test. */
import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { afterAll } from 'vitest';
import { type PlacedProblem, workOutCells } from '../../pipeline/archive/cells.ts';
import { readArchive } from '../../pipeline/archive/read.ts';
import type { Archive, CellRecord } from '../../pipeline/archive/types.ts';
import type { FileDescription, Problem, SweepEntry } from '../../pipeline/formats/types.ts';

const made: string[] = [];
afterAll(() => {
  for (const folder of made) rmSync(folder, { recursive: true, force: true });
});

export type Contents = Record<string, string | Uint8Array>;

/** Path of a new folder that holds these files. */
export function folderWith(contents: Contents): string {
  const folder = mkdtempSync(path.join(tmpdir(), 'archive-test-'));
  made.push(folder);
  for (const [below, text] of Object.entries(contents)) {
    mkdirSync(path.dirname(path.join(folder, below)), { recursive: true });
    writeFileSync(path.join(folder, below), text);
  }
  return folder;
}

export const archiveWith = (contents: Contents): Archive => readArchive(folderWith(contents));

/** Problems as a person reads them. */
export const told = (problems: readonly (Problem & { path: string; line?: number | null })[]): string =>
  problems
    .map(
      (one) =>
        `${one.path}${one.line ? `:${one.line}` : ''} ${one.code}${one.weight === 'blocks' ? ' (blocks)' : ''}\n  ${one.message}\n  ${one.remedy}`,
    )
    .join('\n');

/** What reading an archive of these files complains about. */
export const complaints = (contents: Contents): string => told(archiveWith(contents).problems);

export const sweep = (key: string, rest: Partial<SweepEntry> = {}): SweepEntry => ({
  key,
  series: `series ${key}`,
  electrode: '',
  clamp: 'current',
  source_sweep: null,
  start_s: null,
  samples: 100,
  rate_hz: 20_000,
  protocol: '',
  has_voltage: true,
  has_current: true,
  bridge_mohm: null,
  bias_pa: null,
  filter_khz: null,
  scaling: '',
  labelled_amplitude: null,
  ...rest,
});

export const described = (sweeps: SweepEntry[], rest: Partial<FileDescription> = {}): FileDescription => ({
  format: 'nwb',
  format_label: 'NWB 2.7.0',
  session_start: null,
  facts: [],
  sweeps,
  problems: [],
  ...rest,
});

export type Descriptions = Record<string, FileDescription | null>;

/** Cells of an archive whose recordings are said to hold these descriptions; one sweep each where nothing is said. */
export function cellsOf(
  contents: Contents,
  descriptions: Descriptions = {},
): { cells: CellRecord[]; problems: PlacedProblem[]; archive: Archive } {
  const archive = archiveWith(contents);
  const surveyed = archive.files
    .filter((file) => file.kind === 'recording')
    .map(({ path }) => ({
      path,
      description: Object.hasOwn(descriptions, path) ? descriptions[path]! : described([sweep('0')]),
    }));
  return { ...workOutCells(archive, surveyed), archive };
}
