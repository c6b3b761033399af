import { existsSync, mkdirSync, readdirSync, readFileSync, writeFileSync } from 'node:fs';
import path from 'node:path';
import { expect, test } from 'vitest';
import { readArchive } from '../../pipeline/archive/read.ts';
import { writeSkeleton } from '../../pipeline/archive/skeleton.ts';
import { folderWith } from './in-folder.ts';

test('a new archive reads back without a problem', () => {
  const folder = path.join(folderWith({}), 'made/here');
  const written = writeSkeleton(folder);
  expect(written.every((below) => existsSync(path.join(folder, below)))).toBe(true);
  const archive = readArchive(folder);
  expect(archive.problems).toEqual([]);
  expect(archive.recipes.map((recipe) => [recipe.id, recipe.role])).toEqual([
    ['acsf', 'bath'],
    ['k-gluconate', 'pipette'],
  ]);
  expect(archive.criteria).toHaveLength(1);
  expect(archive.note_paths).toEqual(['notes/2026-01-12-start.md']);
  expect(archive.files).toEqual([]);
});

test('every line that is commented out may be uncommented', () => {
  const folder = folderWith({});
  writeSkeleton(folder);
  const open = (below: string, from: RegExp): string =>
    readFileSync(path.join(folder, below), 'utf8')
      .split('\n')
      .map((line) => (from.test(line) ? line.replace(/# ?/, '') : line))
      .join('\n');
  writeFileSync(path.join(folder, 'almanac.yaml'), open('almanac.yaml', /^ +# \w+:/));
  writeFileSync(path.join(folder, 'decisions.yaml'), open('decisions.yaml', /^# - /));
  writeFileSync(path.join(folder, 'events.yaml'), open('events.yaml', /^# - /));
  const inner = 'recordings/2026-01-15/folder.yaml';
  writeFileSync(
    path.join(folder, inner),
    open(inner, /^ +# \w+:|^# (conditions|table):|^# {3}(?!electrode)[- \w]/).replace(/^ {2}cell, [\s\S]*?\n\n/m, '\n'),
  );
  const archive = readArchive(folder);
  // The recipe of the example drug is the reader's to write.
  expect(archive.problems.map((problem) => `${problem.path} ${problem.message}`)).toEqual([]);
  expect(archive.settings.limits).toHaveLength(1);
  expect(archive.decisions).toHaveLength(1);
  expect(archive.events).toHaveLength(1);
});

test('nothing is written into a folder that holds something, nor over a file', () => {
  const folder = folderWith({ 'b.txt': '', 'a.txt': 'mine' });
  expect(() => writeSkeleton(folder)).toThrow(
    `${folder} is not empty (it holds a.txt). Nothing was written. Name a folder that is empty or does not exist yet.`,
  );
  expect(readdirSync(folder).sort()).toEqual(['a.txt', 'b.txt']);
  expect(() => writeSkeleton(path.join(folder, 'a.txt'))).toThrow(/is a file\. Name a folder/);
});

test('a folder that cannot be made is told', () => {
  const folder = folderWith({ file: '' });
  expect(() => writeSkeleton(path.join(folder, 'file/below'))).toThrow(/could not be written to .*Check the path/);
});

test('an empty folder that exists is filled', () => {
  const folder = folderWith({});
  mkdirSync(path.join(folder, 'new'));
  expect(writeSkeleton(path.join(folder, 'new'))).toContain('almanac.yaml');
});
