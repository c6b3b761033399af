/** One archive from the folder to the ledger: found, surveyed, measured, composed, judged, remembered. */
import { existsSync, readFileSync } from 'node:fs';
import path from 'node:path';
import { workOutCells } from '../archive/cells.ts';
import { readArchive } from '../archive/read.ts';
import type { Archive, CellRecord, CellSweepRef } from '../archive/types.ts';
import type { Problem } from '../formats/types.ts';
import type { Contradiction } from '../judge/types.ts';
import type { ArchiveProblem, FileRow, NoteRow, SurveyedFile } from '../ledger/types.ts';
import type { Ledger } from '../ledger/write.ts';
import { parseNote } from '../notes/parse.ts';
import { type ComposedCell, composeCell } from './compose.ts';
import { entriesByFile, type Measured, measureFiles, unreadShare } from './measure-files.ts';
import type { Progress } from './progress.ts';
import type { MeasuredSweeps } from './reading-worker.ts';
import { recipeProblems } from './recipe-problems.ts';
import { codeVersion, surveyFiles, unreadable } from './survey.ts';
import { toolVersion } from './version.ts';

/** Above this share of unreadable values a file counts as unread. */
const unreadLimit = 0.05;

export interface Gathered {
  archive: Archive;
  cells: { id: string; standing: string; sweeps: number; spikes: number; subject: string | null }[];
  files: FileRow[];
  notes: NoteRow[];
  problems: ArchiveProblem[];
  opened: number;
}

interface FileReading {
  sweeps: MeasuredSweeps;
  /** Set when nothing of the file is used. */
  failure: Problem | null;
}

const noFile: FileReading = { sweeps: {}, failure: null };

/** What measuring gave for one file, with files that are mostly unreadable turned into failures. */
function fileReading(path: string, measured: Measured, ledger: Ledger): FileReading {
  const failure = measured.failures.get(path);
  if (failure) return { sweeps: {}, failure };
  const key = measured.keys.get(path);
  const sweeps = key ? ledger.measure<MeasuredSweeps>(key) : null;
  if (!sweeps) return noFile;
  const share = unreadShare(sweeps);
  if (share <= unreadLimit) return { sweeps, failure: null };
  return {
    sweeps: {},
    failure: {
      code: 'MOSTLY_UNREADABLE',
      weight: 'blocks',
      place: '',
      message: `${(100 * share).toFixed(1)} % of its values could not be read as numbers; up to ${100 * unreadLimit} % is tolerated.`,
      remedy: 'Look at the first lines named beside it, or tell the sidecar which columns hold the data.',
    },
  };
}

/** Reads of the file last used, since the sweeps of a cell come file by file. */
function readingCache(measured: Measured, ledger: Ledger): (path: string) => FileReading {
  let last: { path: string; reading: FileReading } | null = null;
  return (path) => {
    if (last?.path !== path) last = { path, reading: fileReading(path, measured, ledger) };
    return last.reading;
  };
}

/** The same bytes under two cells. */
function sameBytes(surveyed: SurveyedFile[], cellsOf: Map<string, string[]>): Map<string, Contradiction[]> {
  const byHash = new Map<string, string[]>();
  for (const file of surveyed)
    if (file.description && file.sha256) byHash.set(file.sha256, [...(byHash.get(file.sha256) ?? []), file.found.path]);
  const found = new Map<string, Contradiction[]>();
  for (const paths of byHash.values()) {
    if (paths.length < 2) continue;
    for (const one of paths)
      for (const cell of cellsOf.get(one) ?? []) {
        const others = paths.filter((other) => other !== one);
        found.set(cell, [
          ...(found.get(cell) ?? []),
          {
            kind: 'duplicate',
            sentence: `${one} holds the same bytes as ${others.join(' and ')}: one recording is filed more than once.`,
            place: one,
            remedy: 'Find out from the notebook which cell it belongs to and remove the other copy.',
          },
        ]);
      }
  }
  return found;
}

function cellsByFile(cells: CellRecord[]): Map<string, string[]> {
  const byFile = new Map<string, string[]>();
  for (const cell of cells)
    for (const file of new Set(cell.sweeps.map((ref) => ref.path)))
      byFile.set(file, [...(byFile.get(file) ?? []), cell.id]);
  return byFile;
}

function fileRow(file: SurveyedFile, reading: FileReading, cells: string[], extra: Problem[]): FileRow {
  const { found, description } = file;
  const failure = file.failure ?? reading.failure;
  const measured = Object.values(reading.sweeps);
  const unreadSweeps = measured.filter((sweep) => sweep.measure === null);
  const problems = [
    ...(failure ? [failure] : []),
    ...(description?.problems ?? []),
    ...measured.flatMap((sweep) => sweep.problems),
    ...extra,
  ];
  const base = {
    path: found.path,
    bytes: found.bytes,
    sha256: file.sha256,
    format: description?.format_label ?? found.format ?? '',
    problems: uniqueProblems(problems),
    cells,
    sweeps: measured.length - unreadSweeps.length,
  };
  if (found.kind === 'other') return { ...base, state: 'other', reason: found.reason };
  if (failure?.code === 'NOT_A_RECORDING') return { ...base, state: 'other', reason: failure.message };
  if (failure) return { ...base, state: 'unread', reason: failure.message };
  if (base.sweeps === 0) {
    const first = problems.find((problem) => problem.weight === 'blocks');
    return { ...base, state: 'unread', reason: first?.message ?? 'It holds no sweep that could be measured.' };
  }
  const reason =
    unreadSweeps.length > 0
      ? `${unreadSweeps.length} of ${measured.length} sweeps could not be read: ${unreadSweeps[0]!.problems[0]?.message ?? ''}`
      : '';
  return { ...base, state: 'read', reason };
}

function uniqueProblems(problems: Problem[]): Problem[] {
  const seen = new Set<string>();
  return problems.filter((problem) => {
    const key = `${problem.code}\n${problem.place}\n${problem.message}`;
    return !seen.has(key) && seen.add(key);
  });
}

export function parseNotes(
  archive: Archive,
  cellIds: ReadonlySet<string>,
): { notes: NoteRow[]; problems: ArchiveProblem[] } {
  const noteIds = new Set(archive.note_paths.map((one) => one.replace(/^notes\//, '').replace(/\.md$/i, '')));
  const notes: NoteRow[] = [];
  const problems: ArchiveProblem[] = [];
  for (const notePath of archive.note_paths) {
    try {
      const text = readFileSync(path.join(archive.root, notePath), 'utf8');
      const fileExists = (one: string): boolean => existsSync(path.join(archive.root, one));
      const note = parseNote({ path: notePath, text, cellIds, noteIds, fileExists });
      notes.push(note);
      problems.push(
        ...note.problems.map((problem) => ({
          code: 'NOTE',
          weight: 'warns' as const,
          place: '',
          message: problem.message,
          remedy: problem.remedy,
          path: notePath,
          line: problem.line,
        })),
      );
    } catch (error) {
      problems.push({ ...unreadable(error), path: notePath, line: null });
    }
  }
  return { notes, problems };
}

/** Decisions and criteria that name what is not there are said, not ignored. */
function danglingDecisions(archive: Archive, cellIds: ReadonlySet<string>): ArchiveProblem[] {
  return archive.decisions
    .filter((decision) => !cellIds.has(decision.cell))
    .map((decision) => ({
      code: 'DECISION_WITHOUT_CELL',
      weight: 'warns' as const,
      place: '',
      message: `A decision names the cell “${decision.cell}”, which this archive does not hold.`,
      remedy: 'Correct the id; “sweep-almanac list” shows the ids in use.',
      path: 'decisions.yaml',
      line: decision.line,
    }));
}

export interface GatherOptions {
  jobs: number;
  progress: Progress;
}

/** Fills the ledger from the archive. Never fails for a bad file; throws when the archive cannot be opened at all. */
export async function gather(root: string, ledger: Ledger, options: GatherOptions): Promise<Gathered> {
  const version = codeVersion();
  const archive = readArchive(root);
  const survey = await surveyFiles(archive, ledger, { ...options, version });
  const worked = workOutCells(
    archive,
    survey.files.map((file) => ({ path: file.found.path, description: file.description })),
  );
  const measured = await measureFiles(archive, survey.files, worked.cells, ledger, { ...options, version });
  const cellIds = new Set(worked.cells.map((cell) => cell.id));
  const { notes, problems: noteProblems } = parseNotes(archive, cellIds);
  const cellsOf = cellsByFile(worked.cells);
  const reading = readingCache(measured, ledger);
  const files = survey.files.map((file) =>
    fileRow(
      file,
      reading(file.found.path),
      cellsOf.get(file.found.path) ?? [],
      worked.problems.filter((problem) => problem.path === file.found.path),
    ),
  );
  const problems: ArchiveProblem[] = [
    ...archive.problems,
    ...recipeProblems(archive.recipes),
    ...noteProblems,
    ...danglingDecisions(archive, cellIds),
    ...worked.problems.map((problem) => ({ ...problem, line: null })),
  ];
  const summaries: Gathered['cells'] = [];
  ledger.replace(
    {
      archive: {
        settings: archive.settings,
        recipes: archive.recipes,
        events: archive.events,
        criteria: archive.criteria,
        problems,
        version: toolVersion(),
        latest_date: latestDate(worked.cells),
      },
      files,
      notes,
      cells: composeAll(archive, survey.files, worked.cells, files, notes, cellsOf, reading, (composed) =>
        summaries.push({
          id: composed.row.cell,
          standing: composed.row.judgement.standing,
          sweeps: composed.row.sweeps,
          spikes: composed.row.spikes,
          subject: (composed.row.facts['subject']?.value as string | undefined) ?? null,
        }),
      ),
    },
    { surveys: survey.used, measures: measured.used },
  );
  return { archive, cells: summaries, files, notes, problems, opened: survey.opened + measured.opened };
}

function latestDate(cells: CellRecord[]): string | null {
  const dates = cells.map((cell) => cell.facts['date']?.value).filter((date) => date !== undefined);
  return dates.length > 0 ? String(dates.sort().at(-1)) : null;
}

function* composeAll(
  archive: Archive,
  surveyed: SurveyedFile[],
  cells: CellRecord[],
  files: FileRow[],
  notes: NoteRow[],
  cellsOf: Map<string, string[]>,
  reading: (path: string) => FileReading,
  onCell: (composed: ComposedCell) => void,
): Generator<ComposedCell> {
  const recipes = new Map(archive.recipes.map((recipe) => [recipe.id, recipe]));
  const entries = entriesByFile(surveyed);
  const duplicates = sameBytes(surveyed, cellsOf);
  const descriptions = new Map(surveyed.map((file) => [file.found.path, file.description]));
  const byPath = new Map(files.map((file) => [file.path, file]));
  const sessions = new Map(
    surveyed.map((file) => {
      const time = Date.parse(file.description?.session_start ?? '');
      return [file.found.path, Number.isFinite(time) ? time : null];
    }),
  );
  for (const record of [...cells].sort((a, b) => (a.id < b.id ? -1 : a.id > b.id ? 1 : 0))) {
    const composed = composeCell({
      record,
      archive,
      recipes,
      measured: (ref: CellSweepRef) => {
        const { sweeps, failure } = reading(ref.path);
        return sweeps[ref.key] ?? { measure: null, problems: failure ? [failure] : [] };
      },
      entry: (ref) => entries.get(ref.path)?.get(ref.key),
      fileProblems: (path) => descriptions.get(path)?.problems ?? [],
      sessionStartMs: (path) => sessions.get(path) ?? null,
      unread: unreadReasons(record, byPath),
      contradictions: duplicates.get(record.id) ?? [],
      notes: notes.filter((note) => note.cells.includes(record.id)).map((note) => note.id),
    });
    onCell(composed);
    yield composed;
  }
}

function unreadReasons(record: CellRecord, files: ReadonlyMap<string, FileRow>): string[] {
  const paths = [...new Set([...record.sweeps.map((ref) => ref.path), ...record.problems.map((one) => one.path)])];
  return paths
    .map((one) => files.get(one))
    .filter((file) => file?.state === 'unread')
    .map((file) => `${file!.path}: ${file!.reason}`);
}
