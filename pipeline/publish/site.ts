import { createHash } from 'node:crypto';
import { mkdirSync, mkdtempSync, readFileSync, rmSync, symlinkSync, writeFileSync } from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import { build as buildPages } from 'astro';
import { build as bundle } from 'esbuild';
import sharp from 'sharp';
import { openLedgerReader } from '../ledger/read.ts';
import { tables } from './tables.ts';

export interface SiteInput {
  /** The ledger's database. */
  ledgerFile: string;
  /** The archive's folder: pictures of notes are read from it, nothing is written to it. */
  archiveRoot: string;
  /** Emptied first. */
  outDir: string;
}

const toolRoot = fileURLToPath(new URL('../../', import.meta.url));
const siteRoot = path.join(toolRoot, 'site');

/** Scripts of the site, each bundled into one classic script that works from a folder. */
const scripts = ['theme', 'cells', 'cell', 'charts'];
const widestPicture = 1440;

/**
 * Writes the whole site. Links between its files are relative and name their file, so it opens from a folder, from
 * any server and under any path; nothing it loads lies elsewhere. The same ledger gives the same bytes.
 *
 * One call at a time in a process: the pages learn of their ledger through the environment, and it works from `outDir`.
 *
 * @throws Error when a page cannot be drawn; `outDir` is then incomplete
 */
export async function buildSite(input: SiteInput): Promise<void> {
  const scratch = mkdtempSync(path.join(os.tmpdir(), 'sweep-almanac-site-'));
  try {
    const publicDir = path.join(scratch, 'public');
    const manifest = path.join(scratch, 'prepared.json');
    const assets = await writeAssets(path.join(publicDir, 'assets'));
    const images = await writeImages(imagesOf(input.ledgerFile), input.archiveRoot, path.join(publicDir, 'assets'));
    const described = tables.map(({ name, title, columns }) => ({ name, title, columns }));
    writeFileSync(manifest, JSON.stringify({ ...assets, images, tables: described }));
    // The page builder looks for its own parts from its root, and writes there: the root is the scratch folder.
    const modules = path.dirname(path.dirname(fileURLToPath(import.meta.resolve('astro/package.json'))));
    symlinkSync(modules, path.join(scratch, 'node_modules'), 'junction');
    const outDir = path.resolve(input.outDir);
    mkdirSync(outDir, { recursive: true });
    await inPlace(
      outDir,
      {
        SWEEP_ALMANAC_LEDGER: path.resolve(input.ledgerFile),
        SWEEP_ALMANAC_ARCHIVE: path.resolve(input.archiveRoot),
        SWEEP_ALMANAC_PREPARED: manifest,
        ASTRO_TELEMETRY_DISABLED: '1',
      },
      () =>
        buildPages({
          root: scratch,
          configFile: false,
          srcDir: siteRoot,
          publicDir,
          outDir,
          cacheDir: path.join(scratch, 'cache'),
          build: { format: 'directory' },
          compressHTML: true,
          devToolbar: { enabled: false },
          logLevel: 'error',
          vite: {
            cacheDir: path.join(scratch, 'vite'),
            logLevel: 'error',
            // Pages are drawn from a folder that has no node_modules above it: everything they use is bundled.
            environments: {
              prerender: { resolve: { noExternal: true } },
              ssr: { resolve: { noExternal: true } },
            },
          },
        }),
    );
  } finally {
    rmSync(scratch, { recursive: true, force: true });
  }
}

/**
 * Runs with these variables and from this folder: from another one the page builder would keep its own working files
 * in whatever folder the command was started in, which may be the archive.
 */
async function inPlace<T>(folder: string, values: Record<string, string>, work: () => Promise<T>): Promise<T> {
  const started = process.cwd();
  const before = Object.keys(values).map((name) => [name, process.env[name]] as const);
  Object.assign(process.env, values);
  process.chdir(folder);
  try {
    return await work();
  } finally {
    process.chdir(started);
    for (const [name, value] of before) {
      if (value === undefined) delete process.env[name];
      else process.env[name] = value;
    }
  }
}

interface Assets {
  icon: string;
  style: string;
  scripts: Record<string, string>;
}

/** Style sheet with its fonts, and scripts; named by content, so that a new build is never read from an old cache. */
async function writeAssets(folder: string): Promise<Assets> {
  mkdirSync(folder, { recursive: true });
  const result = await bundle({
    absWorkingDir: toolRoot,
    entryPoints: {
      almanac: path.join(siteRoot, 'styles/almanac.css'),
      ...Object.fromEntries(scripts.map((name) => [name, path.join(siteRoot, `scripts/${name}.ts`)])),
    },
    bundle: true,
    minify: true,
    charset: 'utf8',
    format: 'iife',
    target: ['es2022'],
    loader: { '.woff2': 'file' },
    entryNames: '[name]-[hash]',
    assetNames: '[name]-[hash]',
    outdir: folder,
    metafile: true,
    logLevel: 'silent',
  });
  const names = new Map<string, string>();
  for (const [file, output] of Object.entries(result.metafile.outputs))
    if (output.entryPoint) names.set(path.basename(output.entryPoint), `assets/${path.basename(file)}`);
  const named = (source: string): string => {
    const file = names.get(source);
    if (!file) throw new Error(`the bundle holds no ${source}`);
    return file;
  };
  const icon = readFileSync(path.join(siteRoot, 'styles/icon.svg'));
  const iconName = `icon-${createHash('sha256').update(icon).digest('hex').slice(0, 8)}.svg`;
  writeFileSync(path.join(folder, iconName), icon);
  return {
    icon: `assets/${iconName}`,
    style: named('almanac.css'),
    scripts: Object.fromEntries(scripts.map((name) => [name, named(`${name}.ts`)])),
  };
}

function imagesOf(ledgerFile: string): string[] {
  const reader = openLedgerReader(ledgerFile);
  try {
    return [...new Set(reader.notes().flatMap((note) => note.images))].sort();
  } finally {
    reader.close();
  }
}

type Picture = { file: string; width: number; height: number } | { failure: string };

/** Pictures of the notes, turned upright, no wider than a page needs, without what a camera wrote into them. */
async function writeImages(images: string[], archiveRoot: string, folder: string): Promise<Record<string, Picture>> {
  const pictures: Record<string, Picture> = {};
  for (const image of images) pictures[image] = await writeImage(image, archiveRoot, folder);
  return pictures;
}

async function writeImage(image: string, archiveRoot: string, folder: string): Promise<Picture> {
  const source = path.resolve(archiveRoot, image);
  if (!source.startsWith(path.resolve(archiveRoot) + path.sep)) return { failure: 'it lies outside the archive' };
  try {
    const { data, info } = await sharp(readFileSync(source))
      .rotate()
      .resize({ width: widestPicture, withoutEnlargement: true })
      .webp({ quality: 82 })
      .toBuffer({ resolveWithObject: true });
    const name = `picture-${createHash('sha256').update(data).digest('hex').slice(0, 16)}.webp`;
    writeFileSync(path.join(folder, name), data);
    return { file: `assets/${name}`, width: info.width, height: info.height };
  } catch (error) {
    return { failure: (error as Error).message };
  }
}
