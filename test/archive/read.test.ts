import { mkdirSync, readdirSync, readFileSync, statSync, symlinkSync, writeFileSync } from 'node:fs';
import path from 'node:path';
import { describe, expect, test } from 'vitest';
import { recordingEndings } from '../../pipeline/archive/endings.ts';
import { readArchive } from '../../pipeline/archive/read.ts';
import { nodeDisk } from '../../pipeline/archive/walk.ts';
import { claimFormat } from '../../pipeline/formats/claims.ts';
import { archiveWith, type Contents, folderWith, told } from './in-folder.ts';

const kinds = (contents: Contents): string[] =>
  archiveWith(contents).files.map((file) => `${file.path}: ${file.format ?? file.reason}`);

describe('what lies in the folder', () => {
  test('an empty folder is an archive without anything', () => {
    const folder = folderWith({});
    expect(readArchive(folder)).toEqual({
      root: folder,
      settings: {
        title: path.basename(folder),
        lab: '',
        timezone: null,
        mains_hz: null,
        rigs: {},
        people: {},
        classes: {},
        limits: [],
        audiences: {},
      },
      recipes: [],
      files: [],
      events: [],
      decisions: [],
      criteria: [],
      cell_statements: Object.create(null),
      note_paths: [],
      problems: [],
    });
  });
  test('a folder that is not there, and a file', () => {
    const folder = folderWith({ file: '' });
    expect(() => readArchive(path.join(folder, 'no'))).toThrow(
      `There is no folder ${folder}/no. Give the path of the archive folder.`,
    );
    expect(() => readArchive(path.join(folder, 'file'))).toThrow(/is a file\. Give the path of the folder/);
  });
  test('recordings at any depth, in folders of any name', () =>
    expect(kinds({ 'a.nwb': '', 'x/b.CSV': '1\n', 'x/y z/c.Dat': '1\n', 'archive/notes/d.txt': '1\n' })).toEqual([
      'a.nwb: nwb',
      'archive/notes/d.txt: text',
      'x/b.CSV: text',
      'x/y z/c.Dat: text',
    ]));
  test('every other file is accounted for with its reason', () =>
    expect(
      kinds({
        LICENSE: 'MIT',
        'README.txt': 'about 1\n',
        'r/a.abc': new Uint8Array([0x41, 0x42, 0x00, 0x01]),
        'r/binary.dat': new Uint8Array([0x00, 0xff, 0x10]),
        'r/b.png': '',
        'r/c.xlsx': '',
        'r/d.pdf': '',
        'r/e.h5': '',
        'r/f.npy': '',
        'r/g.csv.gz': '',
        'r/letter.txt': 'Dear all, see you on Monday.\n',
        'r/noending': '',
        'r/list.xyz': '1 2 3\n',
        'r/empty.csv': '',
      }),
    ).toEqual([
      'LICENSE: a licence',
      'README.txt: text for people',
      'r/a.abc: not one of the open formats this tool reads',
      'r/b.png: a picture',
      'r/binary.dat: not one of the open formats this tool reads',
      'r/c.xlsx: a spreadsheet; facts that belong to the archive can be saved as facts.csv',
      'r/d.pdf: a printed page',
      'r/e.h5: HDF5 that does not call itself NWB; if it is an NWB file, let its name end in .nwb',
      // Looks like a recording, so its reader says what is wrong with it.
      'r/empty.csv: text',
      'r/f.npy: an open format that this version does not read; it reads NWB (.nwb) and delimited text (.csv, .tsv, .txt, .dat, .asc, .tab)',
      'r/g.csv.gz: a packed file; unpack it to have its contents read',
      'r/letter.txt: text without a number in its first lines',
      'r/list.xyz: text under a name that no reader claims; a sidecar with "table:" has it read as delimited text',
      'r/noending: an empty file',
    ]));
  test('UTF-16 text is text where it says so', () =>
    expect(kinds({ 'r/a.csv': new Uint8Array([0xff, 0xfe, 0x31, 0x00, 0x0a, 0x00]) })).toEqual(['r/a.csv: text']));
  test('what systems leave behind is nobody’s data', () =>
    expect(
      kinds({
        'Thumbs.db': 'x',
        '.hidden/a.nwb': '',
        'r/._a.nwb': '',
        'r/.DS_Store': '',
        'r/desktop.ini': '',
        'r/~$c.xlsx': '',
        '__MACOSX/a.nwb': '',
      }),
    ).toEqual([]));
  test('the archive’s own folders hold no recordings, and one that lies there is told', () => {
    const archive = archiveWith({
      'notes/a.md': '',
      'notes/2026/b.md': '',
      'notes/fig.png': '',
      'notes/c.nwb': '',
      'criteria/d.dat': '1\n',
      'notes/e.txt': '',
    });
    expect(archive.files).toEqual([]);
    expect(archive.note_paths).toEqual(['notes/2026/b.md', 'notes/a.md']);
    expect(told(archive.problems)).toBe(
      'criteria/d.dat FILE_MISPLACED\n  It looks like a recording, and none are looked for in criteria/.\n  Move it to recordings/ if it is one.\n' +
        'notes/c.nwb FILE_MISPLACED\n  It looks like a recording, and none are looked for in notes/.\n  Move it to recordings/ if it is one.\n' +
        'notes/e.txt FILE_MISNAMED\n  Names in notes/ end in .md; this one was not used.\n  Let its name end in .md.',
    );
  });
  test('a person can say that a file, or all of a folder, is no recording', () =>
    expect(
      kinds({
        'r/a.csv': '1\n',
        'r/a.csv.yaml': 'other: lab sheet\n',
        'r/cal/folder.yaml': 'other: calibration pulses\n',
        'r/cal/b.nwb': '',
        'r/c.nwb': '',
      }),
    ).toEqual(['r/a.csv: lab sheet', 'r/c.nwb: nwb', 'r/cal/b.nwb: calibration pulses']));
  test('size and time of change are the file’s', () => {
    const folder = folderWith({ 'r/a.csv': '12345\n' });
    const [file] = readArchive(folder).files;
    expect([file!.bytes, file!.mtime_ms]).toEqual([6, statSync(path.join(folder, 'r/a.csv')).mtimeMs]);
  });
  test('the readers claim the same endings', () => {
    for (const [ending, format] of Object.entries(recordingEndings))
      expect(claimFormat(`a${ending}`), ending).toBe(format);
    for (const ending of ['.abc', '.h5', '.yaml', '.md', '']) expect(claimFormat(`a${ending}`), ending).toBeNull();
  });
  test('reading changes nothing', () => {
    const folder = folderWith({
      'almanac.yaml': 'title: A\n',
      'r/a.csv': '1\n',
      'r/a.csv.yaml': 'facts: { cell: c }\n',
      'facts.csv': 'cell\nc\n',
    });
    const state = (): string[] =>
      readdirSync(folder, { recursive: true, encoding: 'utf8' })
        .sort()
        .map((name) => {
          const stat = statSync(path.join(folder, name));
          return `${name} ${stat.mtimeMs} ${stat.isFile() ? readFileSync(path.join(folder, name), 'utf8') : ''}`;
        });
    const before = state();
    readArchive(folder);
    expect(state()).toEqual(before);
  });
  test('the same folder reads the same twice', () => {
    const folder = folderWith({
      'r/b.csv': '1\n',
      'r/a.csv': '1\n',
      'r/folder.yaml': 'facts: { rig: q }\n',
      'almanac.yaml': 'rigs: { a: A }\n',
    });
    expect(JSON.stringify(readArchive(folder))).toBe(JSON.stringify(readArchive(folder)));
  });
});

describe('links and folders that cannot be read', () => {
  test('a link inside the archive is read once, under its own name; a loop ends', () => {
    const folder = folderWith({ 'r/a.nwb': '' });
    symlinkSync('a.nwb', path.join(folder, 'r/b.nwb'));
    symlinkSync('..', path.join(folder, 'r/loop'));
    symlinkSync('nowhere', path.join(folder, 'r/broken.nwb'));
    const archive = readArchive(folder);
    expect(archive.files.map((file) => `${file.path}: ${file.format ?? file.reason}`)).toEqual([
      'r/a.nwb: nwb',
      'r/b.nwb: a link to r/a.nwb, which is read under its own name',
      'r/broken.nwb: a link to nowhere, which is not there',
      'r/loop: a link to the archive itself, which is read under its own name',
    ]);
    expect(told(archive.problems)).toBe(
      'r/broken.nwb LINK_NOT_FOLLOWED\n  It is a link to nowhere, which is not there.\n  Remove the link or restore what it points to.',
    );
  });
  test('no link leads out, be it a recording, a folder, or one of the archive’s own files', () => {
    const outside = folderWith({
      'secret.nwb': '',
      'almanac.yaml': 'title: stolen\n',
      'folder.yaml': 'facts: { rig: stolen }\n',
      'deep/x.csv': '1\n',
    });
    const folder = folderWith({ 'r/a.nwb': '' });
    symlinkSync(path.join(outside, 'secret.nwb'), path.join(folder, 'r/secret.nwb'));
    symlinkSync(path.join(outside, 'deep'), path.join(folder, 'r/deep'));
    symlinkSync(path.join(outside, 'almanac.yaml'), path.join(folder, 'almanac.yaml'));
    symlinkSync(path.join(outside, 'folder.yaml'), path.join(folder, 'r/folder.yaml'));
    const archive = readArchive(folder);
    expect(archive.files.map((file) => `${file.path}: ${file.format ?? file.reason}`)).toEqual([
      'r/a.nwb: nwb',
      'r/deep: a link that leads out of the archive, which is not followed',
      'r/secret.nwb: a link that leads out of the archive, which is not followed',
    ]);
    expect(JSON.stringify(archive)).not.toContain('stolen');
    expect(archive.files.map((file) => file.blocked?.code)).toEqual([undefined, 'FILE_BARRED', 'FILE_BARRED']);
    expect(archive.problems.map((one) => `${one.path} ${one.code}`)).toEqual([
      'almanac.yaml FILE_BARRED',
      'r/deep LINK_NOT_FOLLOWED',
      'r/folder.yaml FILE_BARRED',
      'r/secret.nwb LINK_NOT_FOLLOWED',
    ]);
  });
  test('a neighbour whose name begins like the archive’s is outside', () => {
    const parent = folderWith({ 'lab/r/a.nwb': '', 'lab-old/b.nwb': '' });
    symlinkSync('../../lab-old/b.nwb', path.join(parent, 'lab/r/b.nwb'));
    expect(readArchive(path.join(parent, 'lab')).files[1]!.reason).toBe(
      'a link that leads out of the archive, which is not followed',
    );
  });
  test('the archive itself may be reached by a link', () => {
    const parent = folderWith({ 'real/r/a.nwb': '' });
    symlinkSync('real', path.join(parent, 'link'));
    expect(readArchive(path.join(parent, 'link')).files.map((file) => file.path)).toEqual(['r/a.nwb']);
  });
  test('a folder that cannot be listed costs that folder, and is told', () => {
    const folder = folderWith({ 'r/shut/a.nwb': '', 'r/b.nwb': '' });
    const archive = readArchive(folder, {
      ...nodeDisk,
      names: (one) => {
        if (one.endsWith('shut')) throw new Error('EACCES: permission denied');
        return nodeDisk.names(one);
      },
    });
    expect(archive.files.map((file) => file.path)).toEqual(['r/b.nwb']);
    expect(told(archive.problems)).toBe(
      'r/shut FOLDER_UNREADABLE (blocks)\n  It could not be listed (EACCES: permission denied); what lies in it is missing here.\n  Check the permission to read it, and build again.',
    );
  });
  test('a file that vanishes between listing and reading costs that file', () => {
    const folder = folderWith({ 'r/a.nwb': '', 'r/folder.yaml': 'facts: { rig: a }\n' });
    const archive = readArchive(folder, {
      ...nodeDisk,
      names: (one) => [...nodeDisk.names(one), ...(one.endsWith('/r') ? ['gone.nwb'] : [])],
    });
    expect(archive.files.map((file) => file.path)).toEqual(['r/a.nwb']);
    expect(archive.problems.map((one) => [one.path, one.code])).toEqual([['r/gone.nwb', 'FOLDER_UNREADABLE']]);
  });
});

describe('how to read a text file', () => {
  const hints = (contents: Contents) => archiveWith(contents).files[0]!.hints;
  test('from its folders and its sidecar, key by key, nearer ones in the place of farther ones', () =>
    expect(
      hints({
        'r/folder.yaml':
          'table: { separator: space, time: { column: 1, unit: ms }, current: { columns: [3], unit: pA } }\n',
        'r/x/folder.yaml': 'table: { voltage: { columns: [2], unit: mV } }\n',
        'r/x/a.csv': '1\n',
        'r/x/a.csv.yaml': 'table: { rate_hz: 5000, stimulus: { kind: step, start_s: 0, end_s: 1, pa: 30 } }\n',
      }),
    ).toEqual({
      table: {
        separator: 'space',
        rate_hz: 5000,
        voltage: { columns: [2], unit: 'mV' },
        stimulus: { kind: 'step', start_s: 0, end_s: 1, pa: [30] },
      },
    }));
  test('capacitance, rate and clamp from the facts in force, facts.csv included', () =>
    expect(
      hints({
        'almanac.yaml': 'defaults: { capacitance_pf: 10, rate_hz: 1000 }\n',
        'r/folder.yaml': 'facts: { capacitance_pf: 11 }\n',
        'r/a.csv': '1\n',
        'facts.csv': 'cell;capacitance_pf;clamp\na;12,5;Voltage\n',
        'r/a.csv.yaml': 'facts: { rate_hz: 5000 }\n',
      }),
    ).toEqual({ capacitance_pf: 12.5, rate_hz: 5000, clamp: 'voltage' }));
  test('a table in the sidecar makes any file delimited text', () =>
    expect(
      kinds({ 'r/a.xyz': '1 2\n', 'r/a.xyz.yaml': 'table: { rate_hz: 5000, voltage: { columns: 1, unit: mV } }\n' }),
    ).toEqual(['r/a.xyz: text']));
  test('a table that cannot be used keeps the file shut, and says why; NWB needs none', () => {
    const wrong = 'table: { rate_hz: -1 }\n';
    const { files } = archiveWith({ 'r/folder.yaml': wrong, 'r/a.csv': '1\n', 'r/b.nwb': '' });
    expect(files[0]!.blocked!.message).toBe(
      'How to read it is stated in r/folder.yaml, line 1, and that cannot be used: table.rate_hz must be a number from 1 to 20000000 Hz, got -1.',
    );
    expect(files[1]!.blocked).toBeUndefined();
    expect(archiveWith({ 'r/a.csv': '1\n', 'r/a.csv.yaml': 'table: [\n' }).files[0]!.blocked!.code).toBe(
      'SIDECAR_UNUSABLE',
    );
    expect(
      archiveWith({ 'r/a.csv': '1\n', 'r/a.csv.yaml': 'facts: { tempo: 1 }\n' }).files[0]!.blocked,
    ).toBeUndefined();
  });
});

describe('the archive’s own files, well written', () => {
  test('almanac.yaml, a recipe, decisions, events and a criteria set', () => {
    const archive = archiveWith({
      'almanac.yaml': `title: 2026
lab: Room 214
timezone: Europe/Lisbon
mains_hz: 50
rigs: { 1: "Rig 1" }
people: { k: K. }
classes: { deep: { label: Deep, like: cortical-pyramidal } }
limits:
  access_resistance_mohm: { below: 25 }
  baseline_mv: { between: [-80, -55] }
audiences: { collaborators: { hide: [person] } }
`,
      'solutions/acsf.yaml': 'name: aCSF\nrole: bath\nph: 7.4\ngas: carbogen\nmillimolar: { NaCl: 125, NaHCO3: 25 }\n',
      'decisions.yaml':
        '- { cell: 007, decision: exclude, by: k, date: 2026-03-20, why: "pale" }\n- { cell: c1~2, decision: include, by: k, date: 2026-03-20, why: checked }\n',
      'events.yaml': '- { date: 2026-02-02, text: New pump, rig: 1, kind: pump }\n',
      'criteria/x.yaml':
        'require:\n  peak_mv: { above: 10, below: 60, missing: keep }\n  class: deep\n  group: [007, 2b]\n',
    });
    expect(archive.problems).toEqual([]);
    expect(archive.settings).toMatchObject({
      title: '2026',
      rigs: { 1: 'Rig 1' },
      audiences: { collaborators: { hide: ['person'] } },
    });
    expect(archive.settings.limits).toEqual([
      { quantity: 'access_resistance_mohm', above: null, below: 25, line: 9 },
      { quantity: 'baseline_mv', above: -80, below: -55, line: 10 },
    ]);
    expect(archive.recipes[0]).toEqual({
      id: 'acsf',
      path: 'solutions/acsf.yaml',
      name: 'aCSF',
      role: 'bath',
      ph: 7.4,
      titrant: null,
      gas: 'carbogen',
      osmolality_mosm: null,
      millimolar: { NaCl: 125, NaHCO3: 25 },
    });
    expect(archive.decisions.map((one) => [one.cell, one.line])).toEqual([
      ['007', 1],
      ['c1~2', 2],
    ]);
    expect(archive.events).toEqual([{ date: '2026-02-02', text: 'New pump', rig: '1', kind: 'pump', line: 1 }]);
    expect(archive.criteria).toEqual([
      {
        id: 'x',
        path: 'criteria/x.yaml',
        title: 'x',
        select: [],
        require: [
          { key: 'peak_mv', rule: { above: 10, below: 60 }, missing: 'keep', line: 2 },
          { key: 'class', rule: { any: ['deep'] }, missing: 'list', line: 3 },
          { key: 'group', rule: { any: ['007', '2b'] }, missing: 'list', line: 4 },
        ],
      },
    ]);
  });
  test('files without contents, or of comments alone, say nothing', () =>
    expect(
      archiveWith({
        'almanac.yaml': '',
        'decisions.yaml': '# none yet\n',
        'events.yaml': '---\n',
        'facts.csv': '',
        'r/folder.yaml': 'facts:\nconditions:\ntable:\n',
        'criteria/a.yaml': '# later\n',
      }).problems,
    ).toEqual([]));
  test('a mark at the beginning, CRLF, and UTF-16 as spreadsheets and editors save it', () => {
    expect(archiveWith({ 'almanac.yaml': '\ufefftitle: A\r\nlab: B\r\n' }).settings).toMatchObject({
      title: 'A',
      lab: 'B',
    });
    const utf16 = Buffer.concat([Buffer.from([0xff, 0xfe]), Buffer.from('title: Ä\n', 'utf16le')]);
    expect(archiveWith({ 'almanac.yaml': utf16 }).settings.title).toBe('Ä');
  });
  test('an anchor and its alias', () => {
    const archive = archiveWith({
      'r/a.nwb': '',
      'r/a.nwb.yaml': 'facts:\n  batch_bath: &b B7\n  batch_pipette: *b\n',
    });
    expect(archive.files[0]!.statements.map((one) => one.value)).toEqual(['B7', 'B7']);
  });
  test('keys of the language itself', () => {
    const archive = archiveWith({
      'almanac.yaml': 'rigs: { __proto__: X, constructor: Y }\nconstructor: 1\n',
      'r/a.nwb': '',
      'r/a.nwb.yaml': 'facts: { __proto__: 1 }\n',
    });
    expect(archive.problems.map((one) => one.code)).toEqual(['KEY_UNKNOWN', 'FACT_UNKNOWN']);
    expect(({} as Record<string, unknown>)['X']).toBeUndefined();
  });
});

describe('facts.csv as labs save it', () => {
  const table = (bytes: string | Uint8Array) => {
    const archive = archiveWith({ 'facts.csv': bytes });
    const rows = Object.entries(archive.cell_statements).map(
      ([cell, statements]) =>
        `${cell}: ${statements.map((one) => `${one.key}=${one.value}@${one.origin.line}`).join(' ')}`,
    );
    return [...rows, ...archive.problems.map((one) => `✗ ${one.line} ${one.message}`)];
  };
  test('commas', () => expect(table('cell,temperature_c\nc1,33.5\n')).toEqual(['c1: cell=c1@2 temperature_c=33.5@2']));
  test('a mark, semicolons, decimal commas, quotes, CRLF, blank rows, capitals in headings', () =>
    expect(table('\ufeffCell;Temperature C;Note\r\n"c1";33,5;"slow; then ""fast"""\r\n;;\r\n\r\nc2;n/a;\r\n')).toEqual([
      'c1: cell=c1@2 temperature_c=33.5@2 note=slow; then "fast"@2',
      'c2: cell=c2@5',
    ]));
  test('tabs, and CR alone', () => expect(table('cell\trig\rc1\ta\r')).toEqual(['c1: cell=c1@2 rig=a@2']));
  test('an empty column at the end of a sheet is nothing', () =>
    expect(table('cell,rig,,\nc1,a,,\n')).toEqual(['c1: cell=c1@2 rig=a@2']));
  test('Western European bytes are read and told', () =>
    expect(table(Buffer.from('cell,note\nc1,m\xfcde\n', 'latin1'))).toEqual([
      'c1: cell=c1@2 note=müde@2',
      '✗ null The table is not UTF-8; it was read as Western European text.',
    ]));
  test('a decimal comma in a sheet of commas cannot be told from two values', () =>
    expect(table('cell,temperature_c\nc1,"33,5"\n')).toEqual([
      'c1: cell=c1@2',
      '✗ 2 temperature_c must be a number in °C, got "33,5"; write 33.5 with a point.',
    ]));
  test('ids keep their zeros and lose their spaces', () =>
    expect(table('cell\n007\ns2 c1\n')).toEqual(['007: cell=007@2', 's2-c1: cell=s2-c1@3']));
});

test('a pipe is never opened', () => {
  const folder = folderWith({ 'r/a.nwb': '' });
  const archive = readArchive(folder, {
    names: nodeDisk.names,
    stat: (file) => (file.endsWith('a.nwb') ? { kind: 'other', bytes: 0, mtime_ms: 0 } : nodeDisk.stat(file)),
  });
  expect(archive.files[0]).toMatchObject({
    kind: 'other',
    reason: 'not an ordinary file',
    blocked: { code: 'FILE_BARRED' },
  });
});

test('HDF5 under the name of a table is told as what it is', () => {
  const archive = archiveWith({ 'r/a.csv': '' });
  writeFileSync(path.join(archive.root, 'r/a.csv'), Buffer.from([0x89, 0x48, 0x44, 0x46, 0x0d, 0x0a, 0x1a, 0x0a, 0]));
  expect(readArchive(archive.root).files[0]).toMatchObject({
    kind: 'other',
    reason: 'HDF5 that does not call itself NWB; if it is an NWB file, let its name end in .nwb',
  });
});

test('a name that no text can hold does not stop the rest', () => {
  const folder = folderWith({ 'r/a.nwb': '' });
  mkdirSync(path.join(folder, 'q'));
  writeFileSync(Buffer.concat([Buffer.from(`${folder}/q/`), Buffer.from([0xff, 0xfe]), Buffer.from('.nwb')]), '');
  const archive = readArchive(folder);
  expect(archive.files.map((file) => file.path)).toContain('r/a.nwb');
  expect(archive.problems.map((one) => one.code)).toEqual(['FOLDER_UNREADABLE']);
});
