import { existsSync, mkdirSync, mkdtempSync, readdirSync, readFileSync, statSync, writeFileSync } from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { beforeEach, describe, expect, test } from 'vitest';
import { checkOutput, finishOutput, markName, startOutput } from '../../pipeline/command/output.ts';

let folder: string;
const at = (...parts: string[]): string => path.join(folder, ...parts);

beforeEach(() => {
  folder = mkdtempSync(path.join(os.tmpdir(), 'almanac-output-'));
  mkdirSync(at('archive'));
});

describe('where an almanac may be written', () => {
  const check =
    (out: string, work = at('work')) =>
    () =>
      checkOutput(out, at('archive'), work);
  test('a new or empty folder', () => {
    mkdirSync(at('empty'));
    expect(check(at('new'))).not.toThrow();
    expect(check(at('empty'))).not.toThrow();
  });
  test('never inside the archive, nor the archive inside it', () => {
    expect(check(at('archive', 'site'))).toThrow(/inside the archive/);
    expect(check(at('archive'))).toThrow(/inside the archive/);
    expect(check(folder)).toThrow(/would replace the archive/);
    expect(check(at('site'), at('archive', 'work'))).toThrow(/--work/);
  });
  test('a neighbour whose name begins like the archive’s is no part of it', () =>
    expect(check(at('archive-site'))).not.toThrow());
  test('never over files that no build wrote', () => {
    mkdirSync(at('thesis'));
    writeFileSync(at('thesis', 'chapter1.txt'), '');
    expect(check(at('thesis'))).toThrow(/no almanac build wrote \(chapter1\.txt\)/);
  });
  test('not over a file', () => {
    writeFileSync(at('file'), '');
    expect(check(at('file'))).toThrow(/cannot be used as the output folder/);
  });
});

describe('finishing', () => {
  test('the new almanac takes the place of the old one and nothing is left beside it', () => {
    for (const text of ['first', 'second']) {
      const fresh = startOutput(at('site'));
      writeFileSync(path.join(fresh, 'index.html'), text);
      expect(existsSync(at('site', 'index.html'))).toBe(text === 'second');
      finishOutput(fresh, at('site'), { version: '1' });
      expect(readFileSync(at('site', 'index.html'), 'utf8')).toBe(text);
    }
    expect(readdirSync(folder).sort()).toEqual(['archive', 'site']);
    expect(existsSync(at('site', markName))).toBe(true);
  });
  test('others may read it as they may read any new folder', () => {
    finishOutput(startOutput(at('site')), at('site'), {});
    expect(statSync(at('site')).mode & 0o777).toBe(0o777 & ~process.umask());
  });
  test('what a killed build left is cleared by the next one, which leaves the finished one alone', () => {
    finishOutput(startOutput(at('site')), at('site'), {});
    const abandoned = startOutput(at('site'));
    writeFileSync(path.join(abandoned, 'half'), '');
    const fresh = startOutput(at('site'));
    expect(existsSync(abandoned)).toBe(false);
    expect(existsSync(at('site', markName))).toBe(true);
    finishOutput(fresh, at('site'), {});
  });
});
