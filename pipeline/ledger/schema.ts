import { DatabaseSync } from 'node:sqlite';
import { deflateRawSync, inflateRawSync } from 'node:zlib';
import { ledgerContract } from './types.ts';

/** Large JSON is stored deflated: envelopes and excerpts shrink to about a quarter. */
export const pack = (value: unknown): Uint8Array => deflateRawSync(JSON.stringify(value), { level: 3 });
export const unpack = <T>(bytes: Uint8Array): T => JSON.parse(inflateRawSync(bytes).toString('utf8')) as T;

const tables = `
  CREATE TABLE IF NOT EXISTS meta (key TEXT PRIMARY KEY, value TEXT NOT NULL) STRICT;
  CREATE TABLE IF NOT EXISTS hashes (path TEXT PRIMARY KEY, bytes INTEGER NOT NULL, mtime_ms REAL NOT NULL, sha256 TEXT NOT NULL) STRICT;
  CREATE TABLE IF NOT EXISTS surveys (key TEXT PRIMARY KEY, body BLOB NOT NULL) STRICT;
  CREATE TABLE IF NOT EXISTS measures (key TEXT PRIMARY KEY, body BLOB NOT NULL) STRICT;
  CREATE TABLE IF NOT EXISTS files (path TEXT PRIMARY KEY, body TEXT NOT NULL) STRICT;
  CREATE TABLE IF NOT EXISTS cells (cell TEXT PRIMARY KEY, body BLOB NOT NULL) STRICT;
  CREATE TABLE IF NOT EXISTS sweeps (cell TEXT NOT NULL, sweep INTEGER NOT NULL, body BLOB NOT NULL, PRIMARY KEY (cell, sweep)) STRICT, WITHOUT ROWID;
  CREATE TABLE IF NOT EXISTS readings (
    cell TEXT NOT NULL, condition TEXT NOT NULL, sweep INTEGER, quantity TEXT NOT NULL, value REAL, why TEXT, n INTEGER, sd REAL, se REAL, u95 REAL
  ) STRICT;
  CREATE INDEX IF NOT EXISTS readings_by_quantity ON readings (quantity, cell);
  CREATE TABLE IF NOT EXISTS notes (id TEXT PRIMARY KEY, body TEXT NOT NULL) STRICT;
`;

const allTables = ['meta', 'hashes', 'surveys', 'measures', 'files', 'cells', 'sweeps', 'readings', 'notes'];

/** SQLite's own code, SQLITE_BUSY. */
const lockedByAnother = 5;

/**
 * Opens the ledger's database, making it where there is none. One that another version of the contract wrote is
 * emptied: everything in it can be measured again.
 *
 * One writer at a time: two builds that shared a ledger would each replace what the other is about to print.
 *
 * @throws Error when the file is no database, cannot be written or is in use; the message names the file.
 */
export function openDatabase(file: string, mode: 'write' | 'read'): DatabaseSync {
  try {
    const database = new DatabaseSync(file, { readOnly: mode === 'read' });
    if (mode === 'read') return database;
    // The first writing takes the lock, and the system gives it back even where the build is killed.
    database.exec(
      'PRAGMA locking_mode = EXCLUSIVE; PRAGMA journal_mode = WAL; PRAGMA synchronous = NORMAL; PRAGMA temp_store = MEMORY;',
    );
    const version = database.prepare('PRAGMA user_version').get() as { user_version: number };
    if (version.user_version !== ledgerContract)
      for (const table of allTables) database.exec(`DROP TABLE IF EXISTS ${table}`);
    database.exec(tables);
    database.exec(`PRAGMA user_version = ${ledgerContract}`);
    return database;
  } catch (error) {
    if ((error as { errcode?: number }).errcode === lockedByAnother)
      throw new Error(
        `The ledger ${file} is in use by another build. Wait until that one has ended, or name another working folder with --work.`,
      );
    throw new Error(
      `The ledger ${file} cannot be opened (${(error as Error).message}). Delete it, or name another working folder with --work; the build then measures everything anew.`,
    );
  }
}
