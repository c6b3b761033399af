import { workOutCells } from '../archive/cells.ts';
import { readArchive } from '../archive/read.ts';
import type { Archive, CellRecord } from '../archive/types.ts';
import { count } from '../formats/problems.ts';
import type { Problem } from '../formats/types.ts';
import type { SurveyedFile } from '../ledger/types.ts';
import { defaultJobs, requireArchive } from './arguments.ts';
import type { Progress } from './progress.ts';
import { oneTable } from './sidecar-lines.ts';
import { codeVersion, surveyFiles } from './survey.ts';

export interface Listing {
  archive: Archive;
  files: SurveyedFile[];
  cells: CellRecord[];
  problems: (Problem & { path: string; line: number | null })[];
}

/** Facts without which physics and class cannot be judged, most telling first. */
const wantedFacts = [
  'class',
  'temperature_c',
  'bath',
  'pipette',
  'configuration',
  'junction',
  'subject',
  'date',
  'rig',
  'person',
  'filter_khz',
];

/** What is in the archive and how it is understood. Measures nothing and remembers nothing. */
export async function list(
  archiveFolder: string,
  options: { jobs?: number | undefined; progress: Progress },
): Promise<Listing> {
  const archive = readArchive(requireArchive(archiveFolder));
  const survey = await surveyFiles(archive, null, {
    jobs: options.jobs ?? defaultJobs(),
    version: codeVersion(),
    progress: options.progress,
  });
  const worked = workOutCells(
    archive,
    survey.files.map((file) => ({ path: file.found.path, description: file.description })),
  );
  return {
    archive,
    files: survey.files,
    cells: worked.cells,
    problems: [...archive.problems, ...worked.problems.map((problem) => ({ ...problem, line: null }))],
  };
}

const stateOf = (file: SurveyedFile): 'read' | 'unread' | 'other' => {
  if (file.found.kind === 'other' || file.failure?.code === 'NOT_A_RECORDING') return 'other';
  if (file.failure || !file.description || file.description.sweeps.length === 0) return 'unread';
  return 'read';
};

/** What the archive says may hold line ends and signals to the terminal; they are shown, not obeyed. */
const shown = (text: string): string =>
  text.replace(/\p{Cc}/gu, (one) => `\\x${one.charCodeAt(0).toString(16).padStart(2, '0')}`);

const indent = (text: string, by: string): string =>
  text
    .trimEnd()
    .split('\n')
    .map((line) => `${by}${line}`)
    .join('\n');

function problemLines(problem: Problem & { line?: number | null }): string[] {
  const place = [problem.line ? `line ${problem.line}` : '', problem.place].filter((one) => one !== '').join(', ');
  return [
    `      ${problem.code}${place ? ` (${shown(place)})` : ''}: ${shown(problem.message)}`,
    `      ${shown(problem.remedy)}`,
    ...(problem.sidecar ? [indent(problem.sidecar, '        | ')] : []),
  ];
}

function fileLines(file: SurveyedFile): string[] {
  const state = stateOf(file);
  const description = file.description;
  const what =
    state === 'other'
      ? file.found.kind === 'other'
        ? file.found.reason
        : (file.failure?.message ?? '')
      : description
        ? `${description.format_label}, ${count(description.sweeps.length, 'sweep')}`
        : (file.found.format ?? '');
  const problems = [...(file.failure && state !== 'other' ? [file.failure] : []), ...(description?.problems ?? [])];
  const offered = problems.flatMap((problem) => (problem.sidecar ? [problem.sidecar] : []));
  const together = offered.length > 1 ? oneTable(offered) : null;
  return [
    `  ${state.padEnd(6)}  ${shown(file.found.path)}  ${shown(what)}`.trimEnd(),
    ...problems.flatMap((problem) => problemLines(together === null ? problem : { ...problem, sidecar: undefined })),
    ...(together === null
      ? []
      : [`      Lines for all of it, in ${shown(file.found.path)}.yaml:`, indent(together, '        | ')]),
  ];
}

function cellLines(cell: CellRecord): string[] {
  const paths = [...new Set(cell.sweeps.map((sweep) => sweep.path))];
  const missing = wantedFacts.filter((key) => cell.facts[key] === undefined);
  const known = ['class', 'date', 'rig', 'person', 'subject']
    .map((key) => cell.facts[key]?.value)
    .filter((value) => value !== undefined);
  return [
    `  ${cell.id}  ${count(cell.sweeps.length, 'sweep')} in ${count(paths.length, 'file')}${known.length > 0 ? `  (${shown(known.join(', '))})` : ''}`,
    ...(missing.length > 0 ? [`      not stated: ${missing.join(', ')}`] : []),
  ];
}

/** The listing as text for a person. */
export function listingLines(listing: Listing): string[] {
  const states = listing.files.map(stateOf);
  const inState = (state: string): number => states.filter((one) => one === state).length;
  return [
    shown(listing.archive.settings.title || listing.archive.root),
    '',
    `Files: ${listing.files.length} (${inState('read')} can be read, ${inState('unread')} cannot, ${inState('other')} are no recordings)`,
    ...listing.files.flatMap(fileLines),
    '',
    `Cells: ${listing.cells.length}`,
    ...listing.cells.flatMap(cellLines),
    '',
    ...(listing.problems.length > 0
      ? [
          `Remarks on the archive's own files: ${listing.problems.length}`,
          ...listing.problems.flatMap((problem) => [`  ${shown(problem.path)}`, ...problemLines(problem)]),
        ]
      : ['No remarks on the archive’s own files.']),
  ];
}

/** The listing for machines. */
export function listingJson(listing: Listing): object {
  return {
    title: listing.archive.settings.title,
    files: listing.files.map((file) => ({
      path: file.found.path,
      bytes: file.found.bytes,
      sha256: file.sha256,
      state: stateOf(file),
      reason: file.found.kind === 'other' ? file.found.reason : (file.failure?.message ?? ''),
      format: file.description?.format_label ?? file.found.format,
      sweeps: file.description?.sweeps.length ?? 0,
      problems: [...(file.failure ? [file.failure] : []), ...(file.description?.problems ?? [])],
    })),
    cells: listing.cells.map((cell) => ({
      cell: cell.id,
      sweeps: cell.sweeps.length,
      facts: Object.fromEntries(Object.entries(cell.facts).map(([key, fact]) => [key, fact.value])),
      missing: wantedFacts.filter((key) => cell.facts[key] === undefined),
    })),
    problems: listing.problems,
  };
}
