/** Runs the real command on the real sample, and reads what it wrote. */
import { spawn, spawnSync } from 'node:child_process';
import { createHash } from 'node:crypto';
import { readdirSync, readFileSync } from 'node:fs';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import { parse } from 'csv-parse/sync';

const root = fileURLToPath(new URL('../..', import.meta.url));
const command = path.join(root, 'pipeline/command/sweep-almanac.mjs');
export const generator = path.join(root, 'content-sample/generate/main.ts');

export interface Ran {
  status: number | null;
  stdout: string;
  stderr: string;
}

export function run(script: string, ...args: string[]): Ran {
  const { status, stdout, stderr } = spawnSync(process.execPath, [script, ...args], {
    encoding: 'utf8',
    maxBuffer: 1e9,
  });
  return { status, stdout, stderr };
}

export const almanac = (...args: string[]): Ran => run(command, ...args);

/** Starts the command and kills it as soon as its output says so. */
export function killWhen(said: RegExp, ...args: string[]): Promise<void> {
  return new Promise((resolve) => {
    const child = spawn(process.execPath, [command, ...args], { stdio: ['ignore', 'ignore', 'pipe'] });
    child.stderr.setEncoding('utf8');
    child.stderr.on('data', (text: string) => {
      if (said.test(text)) child.kill('SIGKILL');
    });
    child.on('exit', () => resolve());
  });
}

export type Row = Record<string, string>;

export const table = (folder: string, name: string): Row[] =>
  parse(readFileSync(path.join(folder, 'data', `${name}.csv`)), { columns: true, bom: true }) as Row[];

/** Every file below a folder, forward slashes, sorted. */
export const filesBelow = (folder: string): string[] =>
  readdirSync(folder, { recursive: true, withFileTypes: true })
    .filter((entry) => entry.isFile())
    .map((entry) => path.relative(folder, path.join(entry.parentPath, entry.name)).split(path.sep).join('/'))
    .sort();

/** One hash over names and bytes of everything below a folder. */
export function hashOf(folder: string): string {
  const hash = createHash('sha256');
  for (const file of filesBelow(folder))
    hash
      .update(file)
      .update('\0')
      .update(readFileSync(path.join(folder, file)));
  return hash.digest('hex');
}
