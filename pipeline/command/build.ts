import { rmSync } from 'node:fs';
import path from 'node:path';
import { pathToFileURL } from 'node:url';
import { count } from '../formats/problems.ts';
import { openLedgerReader } from '../ledger/read.ts';
import { type Ledger, ledgerFile, openLedger } from '../ledger/write.ts';
import { buildSite } from '../publish/site.ts';
import { writeTables } from '../publish/tables.ts';
import { defaultJobs, requireArchive } from './arguments.ts';
import { UserError } from './errors.ts';
import { type Gathered, gather } from './gather.ts';
import { checkOutput, finishOutput, startOutput } from './output.ts';
import type { Progress } from './progress.ts';
import { toolVersion } from './version.ts';

export interface BuildOptions {
  out: string;
  work: string;
  jobs?: number | undefined;
  strict?: boolean | undefined;
  progress: Progress;
}

export interface BuildSummary {
  out: string;
  files: { read: number; unread: number; other: number };
  cells: number;
  subjects: number;
  standings: Record<string, number>;
  sweeps: number;
  spikes: number;
  /** Recordings opened this time: 0 when nothing changed. */
  opened: number;
  problems: number;
  seconds: number;
  peak_memory_mb: number;
}

/** @throws UserError when the working folder cannot be made, or the ledger in it cannot be used */
function ledgerIn(work: string): Ledger {
  try {
    return openLedger(work);
  } catch (error) {
    // What the ledger says is meant for people; what the system says when it makes the folder is not.
    const { code, message } = error as NodeJS.ErrnoException;
    throw new UserError(
      code === undefined
        ? message
        : `The working folder ${work} cannot be made (${message}). Name another with --work, or check its permissions.`,
    );
  }
}

/** Builds the almanac of an archive. The previous output stays as it is until the new one is complete. */
export async function build(archiveFolder: string, options: BuildOptions): Promise<BuildSummary> {
  const started = performance.now();
  const root = requireArchive(archiveFolder);
  const out = path.resolve(options.out);
  const work = path.resolve(options.work);
  checkOutput(out, root, work);
  const ledger = ledgerIn(work);
  let gathered: Gathered;
  try {
    gathered = await gather(root, ledger, { jobs: options.jobs ?? defaultJobs(), progress: options.progress });
  } finally {
    ledger.close();
  }
  const fresh = startOutput(out);
  try {
    options.progress.say('Writing pages and tables');
    await buildSite({ ledgerFile: ledgerFile(work), archiveRoot: root, outDir: fresh });
    const reader = openLedgerReader(ledgerFile(work));
    writeTables(reader, path.join(fresh, 'data'));
    reader.close();
    finishOutput(fresh, out, { tool: 'sweep-almanac', version: toolVersion() });
  } catch (error) {
    rmSync(fresh, { recursive: true, force: true });
    throw error;
  }
  return summarize(gathered, out, (performance.now() - started) / 1000);
}

function summarize(gathered: Gathered, out: string, seconds: number): BuildSummary {
  const inState = (state: string): number => gathered.files.filter((file) => file.state === state).length;
  const standings: Record<string, number> = { sound: 0, caution: 0, unsound: 0, unread: 0 };
  for (const cell of gathered.cells) standings[cell.standing] = (standings[cell.standing] ?? 0) + 1;
  return {
    out,
    files: { read: inState('read'), unread: inState('unread'), other: inState('other') },
    cells: gathered.cells.length,
    subjects: new Set(gathered.cells.map((cell) => cell.subject).filter((subject) => subject !== null)).size,
    standings,
    sweeps: gathered.cells.reduce((sum, cell) => sum + cell.sweeps, 0),
    spikes: gathered.cells.reduce((sum, cell) => sum + cell.spikes, 0),
    opened: gathered.opened,
    problems: gathered.problems.length,
    seconds: Math.round(seconds * 10) / 10,
    peak_memory_mb: Math.round(process.resourceUsage().maxRSS / 1024),
  };
}

/** The summary as lines for a person, ending with where to open the result. */
export function summaryLines(summary: BuildSummary): string[] {
  const { files, standings } = summary;
  const page = path.join(summary.out, 'index.html');
  return [
    `${count(files.read, 'recording')} read, ${files.unread} unread, ${count(files.other, 'other file')}`,
    `${count(summary.cells, 'cell')} from ${count(summary.subjects, 'subject')}, ${count(summary.sweeps, 'sweep')}, ${count(summary.spikes, 'spike')}`,
    `standing: ${standings['sound']} sound, ${standings['caution']} caution, ${standings['unsound']} unsound, ${standings['unread']} unread`,
    ...(summary.problems > 0
      ? [
          `${count(summary.problems, 'remark')} on the archive's own files: see its files page, or run "sweep-almanac list"`,
        ]
      : []),
    `${summary.seconds} s, at most ${summary.peak_memory_mb} MB of memory, ${summary.opened === 0 ? 'no file had to be opened' : `${summary.opened} openings of files`}`,
    `Open ${pathToFileURL(page).href}`,
  ];
}
