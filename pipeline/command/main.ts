import { Command, CommanderError, InvalidArgumentError } from 'commander';
import type { BuildOptions } from './build.ts';
import { UserError } from './errors.ts';
import { progressFor } from './progress.ts';
import { toolVersion } from './version.ts';

const statuses = `
Exit status
  0  done
  1  could not; the message says what, where and what to do
  2  wrong usage
  3  done, but --strict was given and something was unread or unsound`;

const describe = `Reads a folder of intracellular recordings, measures every sweep, says which can be trusted and why, and writes a static site. The archive is never written to. For research quality control; not a medical device.`;

const wholeNumber =
  (least: number) =>
  (text: string): number => {
    const value = Number(text);
    if (!Number.isInteger(value) || value < least)
      throw new InvalidArgumentError(`It must be a whole number from ${least} on.`);
    return value;
  };

const print = (text: string): void => {
  process.stdout.write(`${text}\n`);
};

/** A path as it must be typed in a shell. */
const asTyped = (file: string): string =>
  /^[\w./~+@%:,=-]+$/.test(file) ? file : `'${file.replaceAll("'", "'\\''")}'`;

interface CommonOptions {
  quiet?: boolean;
  json?: boolean;
  jobs?: number;
}

const progressOf = (options: CommonOptions) =>
  progressFor(process.stderr, options.quiet === true || options.json === true);

async function runBuild(
  archive: string,
  options: CommonOptions & { out: string; work: string; strict?: boolean },
): Promise<void> {
  // Each command loads what it needs when it runs, so that help and errors come at once.
  const { build, summaryLines } = await import('./build.ts');
  const request: BuildOptions = {
    out: options.out,
    work: options.work,
    jobs: options.jobs,
    strict: options.strict,
    progress: progressOf(options),
  };
  const summary = await build(archive, request);
  if (options.json) print(JSON.stringify(summary, null, 2));
  else if (!options.quiet) print(summaryLines(summary).join('\n'));
  const troubled = summary.files.unread + (summary.standings['unsound'] ?? 0) + (summary.standings['unread'] ?? 0);
  if (options.strict && troubled > 0) {
    if (!options.quiet && !options.json)
      process.stderr.write(
        `--strict: ${summary.files.unread} files unread, ${summary.standings['unsound']} cells unsound, ${summary.standings['unread']} unread\n`,
      );
    process.exitCode = 3;
  }
}

async function runList(archive: string, options: CommonOptions): Promise<void> {
  const { list, listingJson, listingLines } = await import('./list.ts');
  const listing = await list(archive, { jobs: options.jobs, progress: progressOf(options) });
  print(options.json ? JSON.stringify(listingJson(listing), null, 2) : listingLines(listing).join('\n'));
}

async function runNew(folder: string): Promise<void> {
  const { writeSkeleton } = await import('../archive/skeleton.ts');
  let written: string[];
  try {
    written = writeSkeleton(folder);
  } catch (error) {
    // Its errors are sentences for people.
    throw new UserError((error as Error).message);
  }
  print(
    [
      `A new archive stands in ${folder}:`,
      ...written.map((file) => `  ${file}`),
      '',
      'Next: copy recordings into it, say in folder.yaml what holds for them, and look at how they are understood:',
      `  sweep-almanac list ${asTyped(folder)}`,
    ].join('\n'),
  );
}

async function runPreview(folder: string, options: { port: number }): Promise<void> {
  const { preview } = await import('./preview.ts');
  const { url } = await preview(folder, options.port);
  print(`${url}\nOnly this machine can read it. Stop with Ctrl+C.`);
}

function program(): Command {
  const command = new Command('sweep-almanac')
    .description(describe)
    .version(toolVersion(), '--version', 'print the version')
    .helpOption('-h, --help', 'print this help')
    .addHelpText('after', statuses)
    .addHelpText(
      'after',
      `
A first almanac
  sweep-almanac list my-recordings                what is there, what is understood, what is missing
  sweep-almanac build my-recordings --out site    measure, judge and write the site
  open site/index.html                            in a browser; no server is needed`,
    )
    .showSuggestionAfterError(true)
    .exitOverride();
  command
    .command('build')
    .description('measure and judge an archive and write its site and tables')
    .argument('<archive>', 'folder with the recordings; almanac.yaml and the rest are optional')
    .requiredOption(
      '--out <dir>',
      'folder for the site; an earlier almanac there is replaced once the new one is complete',
    )
    .option('--work <dir>', 'folder for what is remembered between builds', '.sweep-almanac')
    .option('--jobs <n>', 'files read at the same time (default: number of processors)', wholeNumber(1))
    .option('--strict', 'exit with 3 when a file is unread or a cell unsound')
    .option('--quiet', 'print errors only')
    .option('--json', 'print the summary as JSON')
    .action(runBuild);
  command
    .command('list')
    .description('say what was found and understood and what is missing; measures nothing')
    .argument('<archive>', 'folder with the recordings')
    .option('--jobs <n>', 'files read at the same time (default: number of processors)', wholeNumber(1))
    .option('--quiet', 'no progress')
    .option('--json', 'print the listing as JSON')
    .action(runList);
  command
    .command('new')
    .description('start an archive: a commented, working skeleton to fill')
    .argument('<dir>', 'a new or empty folder')
    .action(runNew);
  command
    .command('preview')
    .description('serve a built site to this machine only')
    .argument('<dir>', 'folder that "build" wrote')
    .option('--port <n>', 'port on 127.0.0.1; 0 takes a free one', wholeNumber(0), 4321)
    .action(runPreview);
  for (const one of command.commands) one.exitOverride();
  return command;
}

async function main(): Promise<void> {
  try {
    await program().parseAsync(process.argv);
  } catch (error) {
    if (error instanceof CommanderError) {
      process.exitCode = error.exitCode === 0 ? 0 : 2;
      return;
    }
    if (error instanceof UserError) {
      process.stderr.write(`${error.message}\n`);
      process.exitCode = error.status;
      return;
    }
    process.stderr.write(
      `Something went wrong inside Sweep Almanac; the output was left as it was.\n${(error as Error).stack ?? String(error)}\n`,
    );
    process.exitCode = 1;
  }
}

// Whoever reads the output may stop early, as "| head" does: that is no error.
process.stdout.on('error', (error: NodeJS.ErrnoException) => {
  if (error.code !== 'EPIPE') throw error;
  process.exit();
});

await main();
