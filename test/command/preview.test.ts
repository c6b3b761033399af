import { mkdirSync, mkdtempSync, writeFileSync } from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { markName } from '../../pipeline/command/output.ts';
import { fileFor, preview, requireBuilt } from '../../pipeline/command/preview.ts';

let root: string;
let url: string;
let stop: () => void;

beforeAll(async () => {
  const folder = mkdtempSync(path.join(os.tmpdir(), 'almanac-preview-'));
  root = path.join(folder, 'site');
  mkdirSync(path.join(root, 'cells', 'a b'), { recursive: true });
  writeFileSync(path.join(folder, 'secret.txt'), 'secret');
  writeFileSync(path.join(root, markName), '{}');
  writeFileSync(path.join(root, 'index.html'), 'front');
  writeFileSync(path.join(root, 'cells', 'a b', 'index.html'), 'cell');
  const started = await preview(root, 0);
  url = started.url;
  stop = () => started.server.close();
});
afterAll(() => stop());

describe('serving a built site', () => {
  test('pages by folder and by name, with blanks in them', async () => {
    expect(await (await fetch(url)).text()).toBe('front');
    expect(await (await fetch(`${url}cells/a%20b/`)).text()).toBe('cell');
    expect((await fetch(`${url}cells/a%20b/index.html`)).headers.get('content-type')).toBe('text/html; charset=utf-8');
  });
  test('what is not there, and what would change it', async () => {
    expect((await fetch(`${url}nowhere`)).status).toBe(404);
    expect((await fetch(url, { method: 'POST' })).status).toBe(405);
  });
  test.each(['/../secret.txt', '/%2e%2e/secret.txt', '/..%2fsecret.txt', '/cells/../../secret.txt', '/%00', '/%'])(
    'nothing outside the site: %s',
    (request) => expect(fileFor(root, request)).toBeNull(),
  );
  test('a folder without an almanac is refused with the command that makes one', () =>
    expect(() => requireBuilt(path.dirname(root))).toThrow(/sweep-almanac build ARCHIVE --out/));
});
