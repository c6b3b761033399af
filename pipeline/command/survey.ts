/** Finds out what each recording holds, opening only files that changed since the last build. */
import { createHash } from 'node:crypto';
import { createReadStream, readdirSync, readFileSync, statSync } from 'node:fs';
import path from 'node:path';
import { pipeline as streamPipeline } from 'node:stream/promises';
import { fileURLToPath } from 'node:url';
import type { Archive, FoundFile } from '../archive/types.ts';
import type { FileDescription, Problem } from '../formats/types.ts';
import type { SurveyedFile } from '../ledger/types.ts';
import type { Ledger } from '../ledger/write.ts';
import type { Progress } from './progress.ts';
import { readAll } from './reading-pool.ts';

/** A file that gives no sign of life for this long while it is described, ms. */
const surveyPatienceMs = 60_000;

export const digest = (value: unknown): string => createHash('sha256').update(JSON.stringify(value)).digest('hex');

/** Changes whenever the code that reads and measures does, so that nothing measured by older code is kept. */
export function codeVersion(): string {
  const pipelineFolder = fileURLToPath(new URL('..', import.meta.url));
  const hash = createHash('sha256');
  for (const folder of ['formats', 'membrane', 'measure', 'signal'])
    for (const name of readdirSync(path.join(pipelineFolder, folder)).sort())
      if (name.endsWith('.ts')) hash.update(name).update(readFileSync(path.join(pipelineFolder, folder, name)));
  return hash.digest('hex');
}

async function sha256(file: string): Promise<string> {
  const hash = createHash('sha256');
  await streamPipeline(createReadStream(file), hash);
  return hash.digest('hex');
}

/** The file's hash, from memory where size and time of change are as they were. */
async function knownHash(archive: Archive, file: FoundFile, ledger: Ledger | null): Promise<string> {
  const known = ledger?.hash(file.path);
  if (known && known.bytes === file.bytes && known.mtime_ms === file.mtime_ms) return known.sha256;
  const computed = await sha256(path.join(archive.root, file.path));
  ledger?.rememberHash(file.path, { bytes: file.bytes, mtime_ms: file.mtime_ms, sha256: computed });
  return computed;
}

export const unreadable = (error: unknown): Problem => ({
  code: 'FILE_UNREADABLE',
  weight: 'blocks',
  place: '',
  message: `The file cannot be opened: ${(error as Error).message}.`,
  remedy: 'Check that it exists and that you may read it.',
});

interface Cached {
  description: FileDescription | null;
  failure: Problem | null;
}

export interface Survey {
  files: SurveyedFile[];
  /** Keys of cached surveys that are still needed. */
  used: Set<string>;
  /** Recordings that had to be opened. */
  opened: number;
}

/**
 * Describes every file of the archive that looks like a recording.
 *
 * @param ledger null when nothing is to be remembered (`list`)
 */
export async function surveyFiles(
  archive: Archive,
  ledger: Ledger | null,
  options: { jobs: number; version: string; progress: Progress },
): Promise<Survey> {
  const used = new Set<string>();
  const files: SurveyedFile[] = [];
  const waiting: { at: number; key: string }[] = [];
  for (const found of archive.files) {
    const at = files.push({ found, sha256: '', description: null, failure: null }) - 1;
    if (found.blocked) {
      // Not even hashed: it may be a link out of the archive, or a pipe that never ends.
      if (found.kind === 'recording') files[at]!.failure = found.blocked;
      continue;
    }
    try {
      files[at]!.sha256 = await knownHash(archive, found, ledger);
    } catch (error) {
      files[at]!.failure = unreadable(error);
      continue;
    }
    if (found.kind !== 'recording' || !found.format) continue;
    const key = digest([options.version, files[at]!.sha256, found.format, found.hints]);
    used.add(key);
    const cached = ledger?.survey<Cached>(key);
    if (cached) Object.assign(files[at]!, cached);
    else waiting.push({ at, key });
  }
  const bar = options.progress.start('Looking into files', waiting.length);
  await readAll(
    waiting.map(({ at }) => {
      const { found } = files[at]!;
      return { kind: 'survey', file: path.join(archive.root, found.path), format: found.format!, hints: found.hints };
    }),
    { jobs: options.jobs, patienceMs: surveyPatienceMs },
    (index, answer) => {
      const { at, key } = waiting[index]!;
      const cached: Cached =
        answer.kind === 'surveyed'
          ? { description: answer.description, failure: null }
          : { description: null, failure: answer.kind === 'failed' ? answer.problem : null };
      Object.assign(files[at]!, cached);
      // What got stuck may have been a busy machine: it is tried again next time.
      if (cached.failure?.code !== 'READ_STUCK') ledger?.rememberSurvey(key, cached);
      bar.step(files[at]!.found.path);
    },
  );
  bar.done();
  return { files, used, opened: waiting.length };
}

/** True while the file on disk is still the one that was surveyed. */
export function unchangedOnDisk(archive: Archive, found: FoundFile): boolean {
  try {
    const now = statSync(path.join(archive.root, found.path));
    return now.size === found.bytes && now.mtimeMs === found.mtime_ms;
  } catch {
    return false;
  }
}
