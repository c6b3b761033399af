/** Files that are cut short, overwritten or something else altogether: a reason each time, and never junk for data. */
import { readFileSync, writeFileSync } from 'node:fs';
import path from 'node:path';
import { beforeAll, describe, expect, test } from 'vitest';
import { FormatError } from '../../pipeline/formats/open.ts';
import { open, refusal, temporaryFolder } from './helpers.ts';
import { writeNwb } from './write-nwb.ts';

const folder = temporaryFolder();
const samples = 40_000;
const mv = (index: number, sweep: number): number => -70 + ((index * 7919 + sweep * 31) % 4096) / 64;
const data = (sweep: number): Float64Array =>
  Float64Array.from({ length: samples }, (_, index) => mv(index, sweep) / 1000);

let whole: Buffer;
let copies = 0;
/** A name is never used twice: the library may keep a file open that it failed to read. */
const copy = (bytes: Uint8Array): string => {
  const file = path.join(folder, `damaged${copies++}.nwb`);
  writeFileSync(file, bytes);
  return file;
};

beforeAll(async () => {
  const file = path.join(folder, 'whole.nwb');
  await writeNwb(
    file,
    [0, 1, 2].flatMap((sweep) => [
      {
        path: `acquisition/s${sweep}`,
        type: 'CurrentClampSeries',
        unit: 'volts',
        data: data(sweep),
        start_s: sweep * 3,
        chunk: 4000,
        sweep,
      },
      {
        path: `stimulus/presentation/z${9 - sweep}`,
        type: 'CurrentClampStimulusSeries',
        unit: 'amperes',
        data: Int16Array.from({ length: samples }, (_, index) => (index > 1000 ? sweep * 10 : 0)),
        conversion: 1e-12,
        start_s: sweep * 3,
        sweep,
      },
    ]),
  );
  whole = readFileSync(file);
});

test('the undamaged file reads back', async () => {
  const file = await open(copy(whole));
  expect(file.codes).toEqual([]);
  expect(file.description.sweeps.map(({ key, source_sweep }) => [key, source_sweep])).toEqual([
    ['/acquisition/s0', 0],
    ['/acquisition/s1', 1],
    ['/acquisition/s2', 2],
  ]);
  for (const [sweep, { key }] of file.description.sweeps.entries()) {
    const { voltage, current } = file.read(key);
    expect(voltage!.samples.every((value, index) => Math.abs(value - mv(index, sweep)) < 1e-10)).toBe(true);
    expect([current!.samples[0], Math.round(current!.samples[2000]!)]).toEqual([0, sweep * 10]);
  }
  file.close();
});

describe('no HDF5 at all', () => {
  const cases: [string, Uint8Array, RegExp][] = [
    ['empty', new Uint8Array(0), /0 bytes/],
    ['zeros', new Uint8Array(10_000), /all zero/],
    ['text', Buffer.from('time,voltage\n0,-70\n'), /text, beginning "time,voltage/],
    [
      'a pointer for a large file',
      Buffer.from('version https://git-lfs.github.com/spec/v1\noid sha256:0\n'),
      /pointer/,
    ],
    ['a picture', Buffer.from('\x89PNG\r\n\x1a\n\0\0\0\rIHDR', 'latin1'), /signature/],
    ['one byte', Uint8Array.of(0x89), /signature/],
  ];
  for (const [name, bytes, message] of cases)
    test(name, async () => {
      const problem = await refusal(() => open(copy(bytes)));
      expect(problem).toMatchObject({ code: 'NOT_HDF5', weight: 'blocks' });
      expect(problem.message).toMatch(message);
    });
});

/** Opens and reads everything; returns what was complained of, and fails if a sample differs without a complaint. */
async function complaints(file: string): Promise<string[]> {
  const said: string[] = [];
  try {
    const opened = await open(file);
    said.push(...opened.codes);
    for (const { key } of opened.description.sweeps) {
      const sweep = Number(key.slice(-1));
      try {
        const { voltage, problems } = opened.read(key);
        said.push(...problems.map(({ code }) => code));
        const same = voltage!.samples.every((value, index) => Math.abs(value - mv(index, sweep)) < 1e-10);
        if (!same || voltage!.samples.length !== samples) said.push('CHANGED');
      } catch (error) {
        if (!(error instanceof FormatError)) throw error;
        said.push(error.problem.code);
      }
    }
    opened.close();
  } catch (error) {
    if (!(error instanceof FormatError)) throw error;
    said.push(error.problem.code);
  }
  return said;
}

test('cut short anywhere: said, with both sizes', async () => {
  for (const share of [0.02, 0.2, 0.5, 0.9, 0.999]) {
    const length = Math.floor(whole.length * share);
    const problem = await refusal(() => open(copy(whole.subarray(0, length))));
    expect(problem.code).toBe('FILE_TRUNCATED');
    expect(problem.message).toContain(String(length));
    expect(problem.message).toContain(String(whole.length));
  }
});

test('the signature alone', async () => {
  expect((await refusal(() => open(copy(whole.subarray(0, 8))))).code).toBe('HDF5_DAMAGED');
});

test('a failure is told without the place in the library’s own source', async () => {
  const { message } = await refusal(() => open(copy(whole.subarray(0, 8))));
  expect(message).toMatch(/^HDF5 cannot read this: \w/);
  expect(message).not.toMatch(/\.c line|#\d|build\//);
});

test('a compressed piece of one sweep overwritten: that sweep is refused, the others are read', async () => {
  // The first chunk of deflated samples begins with the mark of its compressor, 78 5e.
  const at = whole.indexOf(Uint8Array.of(0x78, 0x5e));
  expect(at).toBeGreaterThan(0);
  for (const [offset, bytes] of [
    [at, Uint8Array.of(0, 0, 0, 0)],
    [at + 1500, new Uint8Array(200).fill(0xaa)],
  ] as const) {
    const broken = Buffer.from(whole);
    broken.set(bytes, offset);
    const said = await complaints(copy(broken));
    expect(said).toEqual(['HDF5_DAMAGED']);
  }
});

test('bytes flipped all over the structure: a reason or the true samples, but no crash', async () => {
  // Offsets of group headers and names, spread by a fixed rule; the samples' own bytes are tried above.
  const marks = ['TREE', 'OHDR', 'OCHK', 'GCOL', 'acquisition', 'CurrentClampSeries', 'volts', 'starting_time'];
  let tried = 0;
  for (const mark of marks) {
    const at = whole.indexOf(mark);
    expect(at).toBeGreaterThan(0);
    for (const offset of [0, 1, mark.length - 1]) {
      const broken = Buffer.from(whole);
      broken[at + offset] = broken[at + offset]! ^ 0x55;
      const said = await complaints(copy(broken));
      // A letter changed in a unit or name may go unnoticed by HDF5, but no sample may change without a word.
      if (said.includes('CHANGED')) expect(said.length).toBeGreaterThan(1);
      tried++;
    }
  }
  expect(tried).toBe(24);
});

test('a file that is not there', async () => {
  await expect(open(path.join(folder, 'absent.nwb'))).rejects.toThrow(/absent/);
});
