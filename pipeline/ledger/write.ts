import { mkdirSync } from 'node:fs';
import path from 'node:path';
import type { DatabaseSync } from 'node:sqlite';
import type { Readings } from '../measure/types.ts';
import { openDatabase, pack, unpack } from './schema.ts';
import type { ArchiveRow, CellRow, FileRow, NoteRow, SweepRow } from './types.ts';

/** Everything one build knows about its archive: replaces what the last build knew. */
export interface Contents {
  archive: ArchiveRow;
  files: FileRow[];
  /** Drawn one at a time, so that the sweeps of one cell only are in memory. */
  cells: Iterable<{ row: CellRow; sweeps: SweepRow[] }>;
  notes: NoteRow[];
}

export interface KnownHash {
  bytes: number;
  mtime_ms: number;
  sha256: string;
}

/** The write side: caches by content, and the contents of the last finished build. */
export interface Ledger {
  hash(path: string): KnownHash | null;
  rememberHash(path: string, known: KnownHash): void;
  survey<T>(key: string): T | null;
  rememberSurvey(key: string, value: unknown): void;
  measure<T>(key: string): T | null;
  hasMeasure(key: string): boolean;
  rememberMeasure(key: string, value: unknown): void;
  /** Replaces the contents in one transaction and forgets cached surveys and measures that are not in `used`. */
  replace(contents: Contents, used: { surveys: ReadonlySet<string>; measures: ReadonlySet<string> }): void;
  close(): void;
}

export const ledgerFile = (workFolder: string): string => path.join(workFolder, 'ledger.sqlite');

export function openLedger(workFolder: string): Ledger {
  mkdirSync(workFolder, { recursive: true });
  const database = openDatabase(ledgerFile(workFolder), 'write');
  const cached = <T>(table: 'surveys' | 'measures', key: string): T | null => {
    const row = database.prepare(`SELECT body FROM ${table} WHERE key = ?`).get(key);
    return row ? unpack<T>(row['body'] as Uint8Array) : null;
  };
  const remember = (table: 'surveys' | 'measures', key: string, value: unknown): void => {
    database.prepare(`INSERT OR REPLACE INTO ${table} (key, body) VALUES (?, ?)`).run(key, pack(value));
  };
  return {
    hash: (file) => {
      const row = database.prepare('SELECT bytes, mtime_ms, sha256 FROM hashes WHERE path = ?').get(file);
      return row ? (row as unknown as KnownHash) : null;
    },
    rememberHash: (file, known) => {
      database
        .prepare('INSERT OR REPLACE INTO hashes (path, bytes, mtime_ms, sha256) VALUES (?, ?, ?, ?)')
        .run(file, known.bytes, known.mtime_ms, known.sha256);
    },
    survey: (key) => cached('surveys', key),
    rememberSurvey: (key, value) => remember('surveys', key, value),
    measure: (key) => cached('measures', key),
    hasMeasure: (key) => database.prepare('SELECT 1 FROM measures WHERE key = ?').get(key) !== undefined,
    rememberMeasure: (key, value) => remember('measures', key, value),
    replace: (contents, used) =>
      inTransaction(database, () => {
        writeContents(database, contents);
        forgetUnused(database, 'surveys', used.surveys);
        forgetUnused(database, 'measures', used.measures);
        forgetUnused(database, 'hashes', new Set(contents.files.map((file) => file.path)));
      }),
    close: () => {
      // Leaves one plain file behind, so that a read-only reader needs no write-ahead log beside it.
      database.exec('PRAGMA wal_checkpoint(TRUNCATE); PRAGMA journal_mode = DELETE;');
      database.close();
    },
  };
}

function inTransaction(database: DatabaseSync, work: () => void): void {
  database.exec('BEGIN IMMEDIATE');
  try {
    work();
    database.exec('COMMIT');
  } catch (error) {
    database.exec('ROLLBACK');
    throw error;
  }
}

function writeContents(database: DatabaseSync, contents: Contents): void {
  for (const table of ['files', 'cells', 'sweeps', 'readings', 'notes']) database.exec(`DELETE FROM ${table}`);
  const file = database.prepare('INSERT INTO files (path, body) VALUES (?, ?)');
  for (const row of contents.files) file.run(row.path, JSON.stringify(row));
  const note = database.prepare('INSERT INTO notes (id, body) VALUES (?, ?)');
  for (const row of contents.notes) note.run(row.id, JSON.stringify(row));
  const cell = database.prepare('INSERT INTO cells (cell, body) VALUES (?, ?)');
  const sweep = database.prepare('INSERT INTO sweeps (cell, sweep, body) VALUES (?, ?, ?)');
  const reading = readingWriter(database);
  for (const { row, sweeps } of contents.cells) {
    cell.run(row.cell, pack(row));
    for (const condition of row.measure.conditions) reading(row.cell, condition.condition, null, condition.readings);
    for (const one of sweeps) {
      sweep.run(row.cell, one.sweep, pack(one));
      reading(row.cell, one.condition, one.sweep, one.readings);
    }
  }
  database
    .prepare("INSERT OR REPLACE INTO meta (key, value) VALUES ('archive', ?)")
    .run(JSON.stringify(contents.archive));
}

function readingWriter(database: DatabaseSync) {
  const statement = database.prepare(
    'INSERT INTO readings (cell, condition, sweep, quantity, value, why, n, sd, se, u95) VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?)',
  );
  return (cell: string, condition: string, sweep: number | null, readings: Readings): void => {
    for (const [id, one] of Object.entries(readings))
      statement.run(
        cell,
        condition,
        sweep,
        id,
        one.value,
        one.why ?? null,
        one.n ?? null,
        one.sd ?? null,
        one.se ?? null,
        one.u95 ?? null,
      );
  };
}

const keyColumn = { surveys: 'key', measures: 'key', hashes: 'path' } as const;

function forgetUnused(database: DatabaseSync, table: keyof typeof keyColumn, used: ReadonlySet<string>): void {
  const column = keyColumn[table];
  const remove = database.prepare(`DELETE FROM ${table} WHERE ${column} = ?`);
  for (const row of database.prepare(`SELECT ${column} AS key FROM ${table}`).all())
    if (!used.has(row['key'] as string)) remove.run(row['key'] as string);
}
