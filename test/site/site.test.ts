import { createHash } from 'node:crypto';
import { mkdtempSync, readdirSync, readFileSync, rmSync } from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { pathToFileURL } from 'node:url';
import { gzipSync } from 'node:zlib';
import { AxeBuilder } from '@axe-core/playwright';
import { type Browser, chromium, type Page } from 'playwright-core';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { buildMadeUpSite } from '../helpers/made-up-site.ts';
import { findChromium } from '../tooling/prepare.ts';
import { serve } from './serve.ts';

let folder: string;
let sites: { many: string; some: string; one: string; empty: string };
let browser: Browser;

beforeAll(async () => {
  folder = mkdtempSync(path.join(os.tmpdir(), 'almanac-site-test-'));
  sites = {
    many: buildMadeUpSite('many', path.join(folder, 'many')),
    some: buildMadeUpSite('some', path.join(folder, 'some')),
    one: buildMadeUpSite('one', path.join(folder, 'one')),
    empty: buildMadeUpSite('empty', path.join(folder, 'empty')),
  };
  browser = await chromium.launch({ executablePath: findChromium()! });
});

afterAll(async () => {
  await browser?.close();
  rmSync(folder, { recursive: true, force: true });
});

const filesOf = (site: string): string[] =>
  readdirSync(site, { recursive: true, withFileTypes: true })
    .filter((entry) => entry.isFile())
    .map((entry) => path.relative(site, path.join(entry.parentPath, entry.name)).split(path.sep).join('/'))
    .sort();

const pagesOf = (site: string): string[] => filesOf(site).filter((file) => file.endsWith('.html'));

/** One page of each kind; the cell has several conditions, the note a picture. */
const kinds = [
  'index.html',
  'cells/index.html',
  'trends/index.html',
  'notes/index.html',
  'methods/index.html',
  'data/index.html',
  'files/index.html',
];

const cellPages = (site: string): string[] => pagesOf(site).filter((page) => /^cells\/[^/]+\/index\.html$/.test(page));
const notePages = (site: string): string[] => pagesOf(site).filter((page) => /^notes\/[^/]+\/index\.html$/.test(page));
const oneOfEach = (site: string): string[] => [
  ...kinds,
  ...cellPages(site).slice(0, 2),
  ...notePages(site).slice(0, 1),
];

const at = (site: string, page: string): string => pathToFileURL(path.join(site, page)).href;

describe('files of the site', () => {
  test('every link, picture, style and script leads to a file of the site, every fragment to its place', () => {
    for (const site of Object.values(sites)) {
      const present = new Set(filesOf(site));
      const ids = new Map(
        pagesOf(site).map((page) => [
          page,
          new Set(
            [...readFileSync(path.join(site, page), 'utf8').matchAll(/\sid="([^"]*)"/g)].map((match) => match[1]),
          ),
        ]),
      );
      for (const page of pagesOf(site)) {
        const html = readFileSync(path.join(site, page), 'utf8');
        for (const [, , address = ''] of html.matchAll(/\s(href|src)="([^"]*)"/g)) {
          const target = new URL(address.replaceAll('&amp;', '&'), `file:///site/${page}`);
          expect(address, page).not.toMatch(/^(\/|[a-z]+:)/);
          const file = decodeURIComponent(target.pathname).replace(/^\/site\//, '');
          expect(present.has(file), `${page} links to ${address}`).toBe(true);
          if (target.hash !== '')
            expect([...(ids.get(file) ?? [])], `${page} links to ${address}`).toContain(
              decodeURIComponent(target.hash.slice(1)),
            );
        }
      }
    }
  });

  test('style sheets load nothing from elsewhere', () => {
    for (const file of filesOf(sites.many).filter((name) => name.endsWith('.css'))) {
      const css = readFileSync(path.join(sites.many, file), 'utf8');
      const loaded = [...css.matchAll(/url\(\s*["']?([^"')]+)/g)].map((match) => match[1]!);
      expect(loaded.length).toBeGreaterThan(0);
      for (const address of loaded)
        expect(filesOf(sites.many)).toContain(path.posix.join(path.posix.dirname(file), address));
    }
  });

  test('pages hold no inline script, no style attribute and a strict policy', () => {
    for (const page of pagesOf(sites.many)) {
      const html = readFileSync(path.join(sites.many, page), 'utf8');
      expect(html, page).toMatch(
        /<meta http-equiv="Content-Security-Policy" content="default-src 'none'; script-src 'self';/,
      );
      expect(html, page).not.toMatch(
        /<script(?![^>]*\ssrc=)[^>]*>|<script[^>]*type="module"|<style|\sstyle="|\son[a-z]+="/,
      );
    }
  });

  test('nothing is left in the folder that the build was started in', () =>
    expect(readdirSync(path.join(folder, 'many/started-here'))).toEqual([]));

  test('a cell has its page, whatever its id', () => expect(cellPages(sites.many)).toHaveLength(60));

  test('scripts together weigh at most 80 kB compressed', () => {
    const scripts = filesOf(sites.many).filter((name) => name.startsWith('assets/') && name.endsWith('.js'));
    const weight = scripts.reduce((sum, name) => sum + gzipSync(readFileSync(path.join(sites.many, name))).length, 0);
    expect(scripts.length).toBeGreaterThan(0);
    expect(weight).toBeLessThanOrEqual(80_000);
  });

  test('the same ledger gives the same bytes', () => {
    const again = buildMadeUpSite('one', path.join(folder, 'one-again'));
    const digest = (site: string) =>
      filesOf(site).map((file) => [
        file,
        createHash('sha256')
          .update(readFileSync(path.join(site, file)))
          .digest('hex'),
      ]);
    expect(digest(again)).toEqual(digest(sites.one));
  });
});

/** Opens a page and gives everything that went wrong on it. */
async function troublesOf(page: Page, address: string): Promise<string[]> {
  const troubles: string[] = [];
  const root = new URL(address).origin;
  page.on('console', (message) => troubles.push(`${message.type()}: ${message.text()}`));
  page.on('pageerror', (error) => troubles.push(error.message));
  page.on('requestfailed', (request) => troubles.push(`failed: ${request.url()}`));
  page.on('request', (request) => {
    if (new URL(request.url()).origin !== root) troubles.push(`went elsewhere: ${request.url()}`);
  });
  page.on('response', (response) => {
    if (response.status() >= 400) troubles.push(`${response.status()}: ${response.url()}`);
  });
  await page.goto(address, { waitUntil: 'load' });
  await page.evaluate(() => document.fonts.ready);
  return troubles;
}

describe('in the browser', () => {
  const visit = async (site: string, name: string): Promise<void> => {
    const page = await browser.newPage({ viewport: { width: 390, height: 844 } });
    expect(await troublesOf(page, at(site, name)), name).toEqual([]);
    const inForce = await page.evaluate(() => ({
      scripts: document.documentElement.classList.contains('scripted'),
      fonts: [...document.fonts].filter((font) => font.status === 'loaded').length,
      ranks: [...document.querySelectorAll('h1,h2,h3,h4,h5,h6')].map((head) => Number(head.tagName[1])),
    }));
    expect(inForce.scripts).toBe(true);
    expect(inForce.fonts).toBeGreaterThan(2);
    expect(
      inForce.ranks.filter((rank) => rank === 1),
      `${name}: one first heading`,
    ).toHaveLength(1);
    inForce.ranks.forEach((rank, i) => {
      if (i > 0) expect(rank - inForce.ranks[i - 1]!, `${name}, heading ${i}`).toBeLessThanOrEqual(1);
    });
    // A phone, and a window of 1280 pixels at 200 % zoom.
    for (const width of [390, 640]) {
      await page.setViewportSize({ width, height: 844 });
      const needed = await page.evaluate(() => document.documentElement.scrollWidth);
      expect(needed, `${name} at ${width}`).toBeLessThanOrEqual(width);
    }
    await page.close();
  };

  test('every kind of page opens from a folder without trouble, headings in order, nothing wider than a phone', async () => {
    for (const name of oneOfEach(sites.some)) await visit(sites.some, name);
    await visit(sites.many, 'cells/index.html');
  });

  test('an archive of one cell and an empty one open as well', async () => {
    for (const site of [sites.one, sites.empty]) for (const name of kinds.slice(0, 4)) await visit(site, name);
  });

  test('nothing is amiss from a server under a path of its own', async () => {
    const server = await serve(sites.some, '/lab/cells/');
    try {
      for (const name of oneOfEach(sites.some)) {
        const page = await browser.newPage();
        expect(await troublesOf(page, server.address + name), name).toEqual([]);
        await page.close();
      }
    } finally {
      await server.stop();
    }
  });

  test('the policy stops a script that a page does not ship with', async () => {
    const page = await browser.newPage();
    await page.goto(at(sites.many, 'index.html'));
    const ran = await page.evaluate(async () => {
      const script = document.createElement('script');
      script.textContent = 'window.intruder = true';
      document.head.append(script);
      await new Promise((done) => setTimeout(done, 50));
      return 'intruder' in window;
    });
    expect(ran).toBe(false);
    await page.close();
  });

  const axe = async (colorScheme: 'light' | 'dark', rules?: string[]): Promise<void> => {
    const context = await browser.newContext({ colorScheme });
    for (const name of oneOfEach(sites.some)) {
      const page = await context.newPage();
      await page.goto(at(sites.some, name));
      const builder = new AxeBuilder({ page });
      const { violations } = await (rules ? builder.withRules(rules) : builder).analyze();
      const found = violations.map(
        (one) =>
          `${one.id}: ${one.nodes
            .map((node) => node.html)
            .slice(0, 3)
            .join(' ')}`,
      );
      expect(found, name).toEqual([]);
      await page.close();
    }
    await context.close();
  };
  test('axe finds nothing on any kind of page', () => axe('light'), 300_000);
  // Only colours differ in the dark.
  test('axe finds no weak contrast in the dark', () => axe('dark', ['color-contrast']), 300_000);

  test('without scripts the table of cells stands whole, and no dead control shows', async () => {
    const context = await browser.newContext({ javaScriptEnabled: false });
    const page = await context.newPage();
    await page.goto(at(sites.many, 'cells/index.html'));
    expect(await page.locator('#cells tbody tr:visible').count()).toBe(60);
    expect(await page.locator('button:visible, input:visible, select:visible').count()).toBe(0);
    await context.close();
  });

  test('the appearance is remembered from page to page', async () => {
    const context = await browser.newContext({ colorScheme: 'light' });
    const page = await context.newPage();
    const paper = () => page.evaluate(() => getComputedStyle(document.documentElement).backgroundColor);
    await page.goto(at(sites.many, 'index.html'));
    const light = await paper();
    await page.getByRole('button', { name: 'Dark page' }).click();
    const dark = await paper();
    expect(dark).not.toBe(light);
    await page.goto(at(sites.many, 'methods/index.html'));
    expect(await paper()).toBe(dark);
    await page.getByRole('button', { name: 'Light page' }).click();
    expect(await paper()).toBe(light);
    await context.close();
  });

  test('the first press of Tab offers to skip to the content', async () => {
    const page = await browser.newPage();
    await page.goto(at(sites.many, 'index.html'));
    await page.keyboard.press('Tab');
    expect(await page.evaluate(() => document.activeElement?.textContent)).toBe('Skip to the content');
    await page.keyboard.press('Enter');
    expect(await page.evaluate(() => document.activeElement?.id)).toBe('content');
    await page.close();
  });
});

describe('the page of cells', () => {
  const open = async (query = ''): Promise<Page> => {
    const page = await browser.newPage({ viewport: { width: 1280, height: 900 } });
    await page.goto(at(sites.many, 'cells/index.html') + query);
    return page;
  };
  const shown = (page: Page): Promise<string[]> => page.locator('#cells tbody tr:visible th').allInnerTexts();
  const column = (page: Page, name: string): Promise<string[]> =>
    page
      .locator(`#cells tbody tr:visible td[data-name="${name}"]`)
      .evaluateAll((cells) =>
        cells.map((cell) => (cell.querySelector('.missing') ? '' : (cell.textContent ?? '').trim())),
      );
  const asked = (page: Page): string => new URL(page.url()).search;

  test('ids are found whole, in parts, and whatever their accents', async () => {
    const page = await open();
    const all = await shown(page);
    const find = async (words: string): Promise<string[]> => {
      await page.getByRole('searchbox', { name: 'Find' }).fill(words);
      return shown(page);
    };
    const some = all[5]!;
    expect(await find(some)).toContain(some);
    expect(await find('2026-01-1')).toEqual(all.filter((id) => id.includes('2026-01-1')));
    const part = await find('s2c');
    expect(part.length).toBeGreaterThan(0);
    for (const id of part) expect(id.toLowerCase()).toContain('s2c');
    expect(await find('unite essai')).toEqual(['Unité 4 / essai nº 2']);
    expect(await find('patched electrode')).toHaveLength(1);
    expect(await find('no such thing anywhere')).toEqual([]);
    expect(await page.locator('#nothing-found').isVisible()).toBe(true);
    expect((await page.getByRole('status').textContent())?.trim()).toBe('No cell, of 60 in the archive');
    await page.close();
  });

  test('facts and notes are found', async () => {
    const page = await open('?q=pump');
    const byNote = await shown(page);
    expect(byNote.length).toBeGreaterThan(0);
    await page.getByRole('searchbox').fill('cold room');
    const rigC = await column(page, 'Rig');
    expect(rigC.length).toBeGreaterThan(0);
    expect(new Set(rigC)).toEqual(new Set(['c']));
    await page.close();
  });

  test('choices narrow the table, count what remains, and stand in the address', async () => {
    const page = await open();
    const unsound = page.getByRole('button', { name: /^unsound/ });
    const count = Number(await unsound.locator('.count').textContent());
    await unsound.click();
    expect(await shown(page)).toHaveLength(count);
    expect(asked(page)).toBe('?standing=unsound');
    const rig = page.locator('[data-facet="rig"] button[data-value="a"]');
    const both = Number(await rig.locator('.count').textContent());
    await rig.click();
    expect(await shown(page)).toHaveLength(both);
    expect(asked(page)).toBe('?standing=unsound&rig=a');
    await page.reload();
    expect(await shown(page)).toHaveLength(both);
    expect(await rig.getAttribute('aria-pressed')).toBe('true');
    expect((await page.getByRole('status').textContent())?.trim()).toMatch(
      new RegExp(`^${both} cells? from \\d+ subjects?, of 60 in the archive$`),
    );
    await page.getByRole('button', { name: 'Show all cells' }).click();
    expect(await shown(page)).toHaveLength(60);
    expect(asked(page)).toBe('');
    await page.close();
  });

  test('a column sorts as numbers, the missing last either way, by the keyboard alone', async () => {
    const page = await open();
    const name = 'Input resistance, MΩ';
    const head = page.getByRole('columnheader', { name: /^Input resistance/ });
    await head.getByRole('button').focus();
    await page.keyboard.press('Enter');
    expect(await head.getAttribute('aria-sort')).toBe('ascending');
    expect(asked(page)).toBe('?sort=input_resistance_mohm');
    const inOrder = (values: string[], descending: boolean): void => {
      const present = values.filter((value) => value !== '').map((value) => Number(value.replace('−', '-')));
      expect(present.length).toBeGreaterThan(40);
      expect(present).toEqual([...present].sort((a, b) => (descending ? b - a : a - b)));
      expect(values.slice(present.length).every((value) => value === '')).toBe(true);
      expect(values.length).toBeGreaterThan(present.length);
    };
    inOrder(await column(page, name), false);
    await page.keyboard.press('Space');
    expect(await head.getAttribute('aria-sort')).toBe('descending');
    inOrder(await column(page, name), true);
    await page.reload();
    inOrder(await column(page, name), true);
    await page.close();
  });

  test('an address that names what is not there shows the plain table', async () => {
    const page = await open('?standing=splendid&sort=nothing.desc&rig=zz');
    expect(await shown(page)).toHaveLength(60);
    await page.close();
  });

  test('on a phone the choices unfold and the order is chosen from a list', async () => {
    const page = await browser.newPage({ viewport: { width: 390, height: 844 } });
    await page.goto(at(sites.many, 'cells/index.html'));
    const rigs = page.locator('[data-facet="rig"]');
    expect(await rigs.locator('button').first().isVisible()).toBe(false);
    await page.getByRole('button', { name: /^Choose by/ }).click();
    expect(await rigs.locator('button').first().isVisible()).toBe(true);
    await page.getByLabel('Order by').selectOption('date.desc');
    const dates = (await column(page, 'Date')).filter((date) => date !== '');
    expect(dates).toEqual([...dates].sort().reverse());
    await page.close();
  });
});
