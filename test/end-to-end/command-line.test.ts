/** The command line as a newcomer meets it. */
import { mkdirSync, mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { almanac, filesBelow, table } from './almanac.ts';

let folder: string;
const at = (...parts: string[]): string => path.join(folder, ...parts);
beforeAll(() => {
  folder = mkdtempSync(path.join(os.tmpdir(), 'almanac-line-'));
});
afterAll(() => rmSync(folder, { recursive: true, force: true }));

describe('help and wrong usage', () => {
  test('help names the commands, the exit statuses and a first almanac', () => {
    const { status, stdout } = almanac('--help');
    expect(status).toBe(0);
    for (const words of ['build', 'list', 'new', 'preview', 'Exit status', 'A first almanac'])
      expect(stdout).toContain(words);
  });
  test.each([
    [[], /Usage/],
    [['biuld', 'x'], /build/],
    [['build'], /required option|missing required argument/],
    [['build', 'x'], /--out/],
    [['build', 'x', '--out', 'y', '--jobs', 'many'], /whole number/],
    [['list', 'x', '--fast'], /--fast/],
  ])('%j exits with 2', (args, said) => {
    const { status, stderr } = almanac(...args);
    expect(status).toBe(2);
    expect(stderr).toMatch(said);
  });
  test('an archive that is not there exits with 1 and says how to start one', () => {
    const { status, stderr } = almanac('list', at('nowhere'));
    expect(status).toBe(1);
    expect(stderr).toMatch(/There is no folder .*nowhere.*sweep-almanac new DIR/);
    expect(stderr).not.toMatch(/at .*\.ts:/);
  });
  test('a file in the place of an archive', () => {
    writeFileSync(at('file.csv'), '1,2\n');
    expect(almanac('list', at('file.csv')).stderr).toMatch(/is a file\. Give the folder/);
  });
});

describe('a new archive', () => {
  test('is written, listed without remarks and built empty', () => {
    expect(almanac('new', at('fresh')).status).toBe(0);
    const listed = almanac('list', at('fresh'));
    expect(listed.status).toBe(0);
    expect(listed.stdout).toContain('No remarks on the archive’s own files.');
    const built = almanac('build', at('fresh'), '--out', at('fresh-site'), '--work', at('fresh-work'), '--quiet');
    expect(built.stderr).toBe('');
    expect(built.status).toBe(0);
    expect(built.stdout).toBe('');
    expect(table(at('fresh-site'), 'cells')).toEqual([]);
  });
  test('is not written over what is there', () => {
    const { status, stderr } = almanac('new', folder);
    expect(status).toBe(1);
    expect(stderr).toMatch(/empty|holds/);
  });
});

describe('a folder of files without a word about them', () => {
  test('builds; a file without a time base says what to paste, and pasting it makes it readable', () => {
    const archive = at('bare');
    mkdirSync(archive);
    // A made-up membrane: a 10 MΩ, 10 ms response to −100 pA from 0.2 to 0.6 s, at 10 kHz.
    const rows = Array.from({ length: 8000 }, (_, i) => {
      const t = i / 10_000;
      const on =
        t < 0.2 ? 0 : t < 0.6 ? 1 - Math.exp(-(t - 0.2) / 0.01) : Math.exp(-(t - 0.6) / 0.01) * (1 - Math.exp(-40));
      return { t, mv: -70 - on + 0.02 * Math.sin(i * 12.9898), pa: t >= 0.2 && t < 0.6 ? -100 : 0 };
    });
    writeFileSync(
      path.join(archive, 'good.csv'),
      `Time (s),Voltage (mV),Current (pA)\n${rows.map((r) => `${r.t},${r.mv.toFixed(4)},${r.pa}`).join('\n')}\n`,
    );
    writeFileSync(path.join(archive, 'bare.txt'), `${rows.map((r) => r.mv.toFixed(4)).join('\n')}\n`);
    writeFileSync(path.join(archive, 'broken.nwb'), 'not a recording');
    writeFileSync(path.join(archive, 'photo.png'), 'x');
    const before = filesBelow(archive);
    const listing = JSON.parse(almanac('list', archive, '--json').stdout) as {
      files: { path: string; state: string; problems: { sidecar?: string }[] }[];
    };
    const states = Object.fromEntries(listing.files.map((file) => [file.path, file.state]));
    expect(states).toEqual({ 'good.csv': 'read', 'bare.txt': 'unread', 'broken.nwb': 'unread', 'photo.png': 'other' });
    const lines = listing.files
      .find((file) => file.path === 'bare.txt')!
      .problems.map((problem) => problem.sidecar)
      .find((one) => one)!;
    const build = () => almanac('build', archive, '--out', at('bare-site'), '--work', at('bare-work'), '--json');
    expect(build().status).toBe(0);
    expect(filesBelow(archive)).toEqual(before);
    writeFileSync(path.join(archive, 'bare.txt.yaml'), `${lines}\n`);
    expect(build().status).toBe(0);
    const files = table(at('bare-site'), 'files');
    expect(files.find((file) => file['path'] === 'bare.txt')!['state'], lines).toBe('read');
    const good = table(at('bare-site'), 'cells').find((cell) => cell['cell'] === 'good')!;
    expect(Number(good['input_resistance_mohm'])).toBeCloseTo(10, 1);
    expect(Number(good['membrane_time_constant_ms'])).toBeGreaterThan(9);
    expect(Number(good['membrane_time_constant_ms'])).toBeLessThan(11);
    expect(readFileSync(at('bare-site', 'index.html'), 'utf8')).toContain('Not a medical device');
  });
});
