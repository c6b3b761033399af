/** What the commands say to a person, run as a person runs them. */
import { spawnSync } from 'node:child_process';
import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { afterEach, beforeEach, expect, test } from 'vitest';

const main = path.resolve(import.meta.dirname, '../../pipeline/command/main.ts');
let folder: string;

beforeEach(() => {
  folder = mkdtempSync(path.join(os.tmpdir(), 'almanac-said-'));
});
afterEach(() => rmSync(folder, { recursive: true, force: true }));

function said(...words: string[]): { status: number | null; out: string; err: string } {
  const { status, stdout, stderr } = spawnSync(process.execPath, [main, ...words], { encoding: 'utf8' });
  return { status, out: stdout, err: stderr };
}

test('"new" into a folder that holds something is a sentence, without a stack', () => {
  writeFileSync(path.join(folder, 'thesis.txt'), '');
  expect(said('new', folder)).toEqual({
    status: 1,
    out: '',
    err: `${folder} is not empty (it holds thesis.txt). Nothing was written. Name a folder that is empty or does not exist yet.\n`,
  });
});

test('the next command is offered as it must be typed', () => {
  expect(said('new', path.join(folder, 'our cells')).out).toContain(`sweep-almanac list '${folder}/our cells'`);
  expect(said('new', path.join(folder, 'cells')).out).toContain(`sweep-almanac list ${folder}/cells`);
});

test('one sweep is one sweep, and a line end in a name does not end the line', () => {
  mkdirSync(path.join(folder, 'r'));
  const rows = Array.from({ length: 400 }, (_, row) => `${row / 20000},${-70 + (row % 3) / 100}`);
  writeFileSync(path.join(folder, 'r/two\nlines.csv'), `Time (s),V (mV)\n${rows.join('\n')}\n`);
  const { status, out } = said('list', folder, '--quiet');
  expect(status).toBe(0);
  expect(out).toMatch(/^ {2}read {4}r\/two\\x0alines\.csv {2}text, 2 columns, comma, 1 sweep$/m);
  expect(out).toMatch(/^ {2}two-lines {2}1 sweep in 1 file/m);
});

test('a ledger or a working folder that cannot be used is a sentence, without a stack', () => {
  mkdirSync(path.join(folder, 'archive'));
  mkdirSync(path.join(folder, 'work'));
  writeFileSync(path.join(folder, 'work/ledger.sqlite'), 'no database at all');
  const build = (work: string) =>
    said('build', path.join(folder, 'archive'), '--out', path.join(folder, 'out'), '--work', path.join(folder, work));
  const spoiled = build('work');
  expect(spoiled.status).toBe(1);
  expect(spoiled.err).toMatch(/^The ledger .* cannot be opened \(.*\)\. Delete it, or .*\n$/);
  const barred = build('work/ledger.sqlite/below');
  expect(barred.status).toBe(1);
  expect(barred.err).toMatch(/^The working folder .* cannot be made \(.*\)\. Name another with --work.*\n$/);
});
