/**
 * Builds the site of an invented archive in a process of its own, as the command does, so that nothing of the test
 * runner leaks into it: `node test/helpers/made-up-site.ts KIND FOLDER` leaves the site in FOLDER/site.
 */
import { spawnSync } from 'node:child_process';
import { mkdirSync } from 'node:fs';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import { openLedgerReader } from '../../pipeline/ledger/read.ts';
import { buildSite } from '../../pipeline/publish/site.ts';
import { writeTables } from '../../pipeline/publish/tables.ts';
import { type MadeUpKind, makeUpLedger } from './made-up-ledger.ts';

/** @returns the folder of the built site */
export function buildMadeUpSite(kind: MadeUpKind, folder: string): string {
  const env = { ...process.env };
  for (const name of ['NODE_ENV', 'VITEST', 'TEST', 'DEV', 'PROD', 'MODE']) delete env[name];
  const cwd = path.join(folder, 'started-here');
  mkdirSync(cwd, { recursive: true });
  const script = fileURLToPath(import.meta.url);
  const run = spawnSync(process.execPath, [script, kind, folder], { encoding: 'utf8', env, cwd });
  if (run.status !== 0) throw new Error(`the site of the invented archive "${kind}" was not built:\n${run.stderr}`);
  if (run.stdout !== '') throw new Error(`building the site printed:\n${run.stdout}`);
  return path.join(folder, 'site');
}

if (import.meta.main) {
  const [kind, folder] = process.argv.slice(2);
  mkdirSync(folder!, { recursive: true });
  const made = await makeUpLedger(folder!, kind as MadeUpKind);
  const outDir = path.join(folder!, 'site');
  await buildSite({ ledgerFile: made.ledgerFile, archiveRoot: made.archiveRoot, outDir });
  const reader = openLedgerReader(made.ledgerFile);
  writeTables(reader, path.join(outDir, 'data'));
  reader.close();
}
