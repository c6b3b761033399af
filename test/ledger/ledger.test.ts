import { mkdtempSync, writeFileSync } from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { DatabaseSync } from 'node:sqlite';
import { beforeEach, describe, expect, test } from 'vitest';
import { openLedgerReader } from '../../pipeline/ledger/read.ts';
import type { ArchiveRow, CellRow, FileRow, SweepRow } from '../../pipeline/ledger/types.ts';
import { type Contents, ledgerFile, openLedger } from '../../pipeline/ledger/write.ts';

let work: string;
beforeEach(() => {
  work = mkdtempSync(path.join(os.tmpdir(), 'almanac-ledger-'));
});

const archive = { version: '1', latest_date: null, problems: [] } as unknown as ArchiveRow;
const file = (name: string) => ({ path: name, state: 'read' }) as FileRow;
const cell = (id: string) =>
  ({
    cell: id,
    measure: {
      conditions: [
        {
          condition: 'baseline',
          readings: { rheobase_pa: { value: 50, n: 3 }, sag_fraction: { value: null, why: 'too-few-sweeps' } },
        },
      ],
    },
  }) as unknown as CellRow;
const sweep = (id: string, number: number) =>
  ({
    cell: id,
    sweep: number,
    condition: 'baseline',
    readings: { baseline_mv: { value: -70.5 } },
  }) as unknown as SweepRow;

const contents = (ids: string[]): Contents => ({
  archive,
  files: [file('b.nwb'), file('a.nwb')],
  notes: [],
  cells: ids.map((id) => ({ row: cell(id), sweeps: [sweep(id, 1), sweep(id, 0)] })),
});
const nothing = { surveys: new Set<string>(), measures: new Set<string>() };

describe('the ledger', () => {
  test('gives back what was put in, sorted', () => {
    const ledger = openLedger(work);
    ledger.replace(contents(['c2', 'c10', 'c1']), nothing);
    ledger.close();
    const reader = openLedgerReader(ledgerFile(work));
    expect(reader.cellIds()).toEqual(['c1', 'c10', 'c2']);
    expect(reader.cell('c2')).toEqual(cell('c2'));
    expect(reader.sweeps('c2').map((one) => one.sweep)).toEqual([0, 1]);
    expect(reader.files().map((one) => one.path)).toEqual(['a.nwb', 'b.nwb']);
    expect(() => reader.cell('c3')).toThrow(/no cell "c3"/);
    reader.close();
  });

  test('every reading is also a row of its own, with its reason where there is no number', () => {
    const ledger = openLedger(work);
    ledger.replace(contents(['c1']), nothing);
    ledger.close();
    const database = new DatabaseSync(ledgerFile(work), { readOnly: true });
    const rows = database.prepare('SELECT quantity, sweep, value, why FROM readings ORDER BY quantity, sweep').all();
    expect(rows.map((row) => ({ ...row }))).toEqual([
      { quantity: 'baseline_mv', sweep: 0, value: -70.5, why: null },
      { quantity: 'baseline_mv', sweep: 1, value: -70.5, why: null },
      { quantity: 'rheobase_pa', sweep: null, value: 50, why: null },
      { quantity: 'sag_fraction', sweep: null, value: null, why: 'too-few-sweeps' },
    ]);
    database.close();
  });

  test('a build that breaks off leaves the contents of the one before', () => {
    const ledger = openLedger(work);
    ledger.replace(contents(['c1']), nothing);
    const breaking = {
      ...contents([]),
      cells: (function* () {
        yield { row: cell('c7'), sweeps: [] };
        throw new Error('power cut');
      })(),
    };
    expect(() => ledger.replace(breaking, nothing)).toThrow('power cut');
    ledger.close();
    const reader = openLedgerReader(ledgerFile(work));
    expect(reader.cellIds()).toEqual(['c1']);
    reader.close();
  });

  test('remembers by content and forgets what the finished build did not use', () => {
    const ledger = openLedger(work);
    ledger.rememberMeasure('old', { a: 1 });
    ledger.rememberMeasure('new', { b: [1, 2] });
    ledger.rememberHash('gone.nwb', { bytes: 1, mtime_ms: 2.5, sha256: 'x' });
    ledger.rememberHash('a.nwb', { bytes: 1, mtime_ms: 2.5, sha256: 'y' });
    ledger.replace(contents([]), { surveys: new Set(), measures: new Set(['new']) });
    expect(ledger.measure('new')).toEqual({ b: [1, 2] });
    expect(ledger.hasMeasure('old')).toBe(false);
    expect(ledger.hash('gone.nwb')).toBeNull();
    expect(ledger.hash('a.nwb')).toEqual({ bytes: 1, mtime_ms: 2.5, sha256: 'y' });
    ledger.close();
  });

  test('one build at a time: a second is told to wait, not to delete', () => {
    const first = openLedger(work);
    expect(() => openLedger(work)).toThrow(/is in use by another build\. Wait until/);
    first.close();
    openLedger(work).close();
  });
  test('a file that is no ledger is said, with what to do', () => {
    writeFileSync(ledgerFile(work), 'this is no database, it is a text that somebody saved here'.repeat(40));
    expect(() => openLedger(work)).toThrow(/cannot be opened .*Delete it, or name another working folder with --work/s);
  });

  test('a ledger of another contract is measured anew', () => {
    const ledger = openLedger(work);
    ledger.rememberMeasure('k', 1);
    ledger.close();
    const database = new DatabaseSync(ledgerFile(work));
    database.exec('PRAGMA user_version = 99');
    database.close();
    const again = openLedger(work);
    expect(again.hasMeasure('k')).toBe(false);
    again.close();
  });

  test('reading before any build finished says so', () => {
    openLedger(work).close();
    const reader = openLedgerReader(ledgerFile(work));
    expect(() => reader.archive()).toThrow(/holds no finished build/);
    reader.close();
  });
});
