import { openDatabase, unpack } from './schema.ts';
import type { ArchiveRow, CellRow, FileRow, LedgerReader, NoteRow, SweepRow } from './types.ts';

/**
 * The read side of a ledger. Rows come sorted: cells and notes by id, files by path, sweeps by number.
 *
 * @param file path of the ledger's database
 * @throws Error when there is no ledger there, or a build never finished in it
 */
export function openLedgerReader(file: string): LedgerReader {
  const database = openDatabase(file, 'read');
  const bodies = <T>(sql: string, ...args: (string | number)[]): T[] =>
    database
      .prepare(sql)
      .all(...args)
      .map((row) => parse<T>(row['body'] as string | Uint8Array));
  return {
    archive: () => {
      const row = database.prepare("SELECT value FROM meta WHERE key = 'archive'").get();
      if (!row) throw new Error(`The ledger ${file} holds no finished build. Run "sweep-almanac build" again.`);
      return JSON.parse(row['value'] as string) as ArchiveRow;
    },
    files: () => bodies<FileRow>('SELECT body FROM files ORDER BY path'),
    cellIds: () =>
      database
        .prepare('SELECT cell FROM cells ORDER BY cell')
        .all()
        .map((row) => row['cell'] as string),
    cells: () => bodies<CellRow>('SELECT body FROM cells ORDER BY cell'),
    cell: (id) => {
      const [row] = bodies<CellRow>('SELECT body FROM cells WHERE cell = ?', id);
      if (!row) throw new Error(`The ledger ${file} holds no cell "${id}".`);
      return row;
    },
    sweeps: (cell) => bodies<SweepRow>('SELECT body FROM sweeps WHERE cell = ? ORDER BY sweep', cell),
    notes: () => bodies<NoteRow>('SELECT body FROM notes ORDER BY id'),
    close: () => database.close(),
  };
}

const parse = <T>(body: string | Uint8Array): T =>
  typeof body === 'string' ? (JSON.parse(body) as T) : unpack<T>(body);
