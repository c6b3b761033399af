import { describe, expect, test } from 'vitest';
import { complaint, importsOf } from './tooling/boundaries.ts';

const say = (file: string, line: string) => importsOf(file, line).map((imported) => complaint(file, imported));

describe('import direction', () => {
  test('signal imports nothing of the project', () =>
    expect(say('pipeline/signal/a.ts', "import { b } from '../measure/b.ts';")[0]).toMatch(
      /pipeline\/signal may not import pipeline\/measure/,
    ));
  test('judge takes the types of measure and not its functions', () => {
    expect(say('pipeline/judge/a.ts', "import type { Reading } from '../measure/types.ts';")).toEqual([null]);
    expect(say('pipeline/judge/a.ts', "import { measureSweep } from '../measure/sweep.ts';")[0]).toMatch(/import type/);
  });
  test('numeric code opens no file', () =>
    expect(say('pipeline/membrane/a.ts', "import fs from 'node:fs';")[0]).toMatch(/opens no file/));
  test('nothing imports the site', () =>
    expect(say('pipeline/command/a.ts', "import { page } from '../../site/page.ts';")[0]).toMatch(
      /may not import site/,
    ));
  test('the frontmatter of a page is read too', () =>
    expect(
      say('site/pages/a.astro', "---\nimport { judge } from '../../pipeline/judge/judge.ts';\n---\n<p></p>")[0],
    ).toMatch(/site may not import pipeline\/judge/));
  test('imports within a folder and from packages pass', () =>
    expect(say('pipeline/signal/a.ts', "import { b } from './b.ts';\nimport { min } from 'd3';")).toEqual([
      null,
      null,
    ]));
});
