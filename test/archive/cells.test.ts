import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { cascade, conditionOf, saysTheSame } from '../../pipeline/archive/cells.ts';
import type { OriginLevel, Statement } from '../../pipeline/archive/types.ts';
import { type Contents, cellsOf, type Descriptions, described, sweep, told } from './in-folder.ts';

const ids = (contents: Contents, descriptions = {}): string[] =>
  cellsOf(contents, descriptions).cells.map((cell) => cell.id);
const refs = (contents: Contents, descriptions = {}): string[] =>
  cellsOf(contents, descriptions).cells.flatMap((cell) =>
    cell.sweeps.map((ref) => `${cell.id}: ${ref.path} ${ref.key}`),
  );

describe('the facts in force', () => {
  const levels: OriginLevel[] = ['defaults', 'folder', 'file', 'facts.csv', 'sidecar'];
  const said = (
    level: OriginLevel,
    value: string | number,
    path: string = level,
    line: number | null = 1,
  ): Statement => ({
    key: 'rig',
    value,
    origin: { level, path, line },
  });

  test('no statements, no facts', () => expect(cascade([])).toEqual({}));
  test('the nearest wins and the others that say something else are kept, nearest first, defaults excepted', () => {
    const fact = cascade([
      said('defaults', 'x'),
      said('folder', 'a'),
      said('file', 'b'),
      said('facts.csv', 'A '),
      said('sidecar', 'a'),
    ])['rig']!;
    expect(fact.value).toBe('a');
    expect(fact.origin.level).toBe('sidecar');
    expect(fact.disagrees.map((one) => [one.value, one.origin.level])).toEqual([['b', 'file']]);
  });
  test('an inner folder wins over an outer one, and both are heard', () => {
    const fact = cascade([said('folder', 'a', 'folder.yaml'), said('folder', 'b', 'x/folder.yaml')])['rig']!;
    expect([fact.value, fact.disagrees.map((one) => one.origin.path)]).toEqual(['b', ['folder.yaml']]);
  });
  test('what says the same', () => {
    expect(saysTheSame('Rig  A', 'rig a ')).toBe(true);
    expect(saysTheSame('rig a', 'rig b')).toBe(false);
    expect(saysTheSame(0.1 + 0.2, 0.3)).toBe(true);
    expect(saysTheSame(33, 33.1)).toBe(false);
    expect(saysTheSame(0, 1e-9)).toBe(false);
    expect(saysTheSame('33', 33)).toBe(true);
  });
  test('law: the order in which levels are handed over does not matter', () => {
    const statement = fc.record({ level: fc.constantFrom(...levels), value: fc.constantFrom('a', 'b', 'c') });
    fc.assert(
      fc.property(
        fc
          .uniqueArray(statement, { selector: (one) => one.level, maxLength: 5 })
          .chain((list) => fc.tuple(fc.constant(list), fc.shuffledSubarray(list, { minLength: list.length }))),
        ([list, shuffled]) => {
          const one = cascade(list.map(({ level, value }) => said(level, value)));
          expect(cascade(shuffled.map(({ level, value }) => said(level, value)))).toEqual(one);
        },
      ),
      { seed: 21 },
    );
  });
  test('law: the winner is of the highest level stated, and every loser that differs is named exactly once', () => {
    const statement = fc.record({
      level: fc.constantFrom(...levels),
      value: fc.constantFrom('a', 'b', 'c'),
      line: fc.nat(1000),
    });
    fc.assert(
      fc.property(fc.uniqueArray(statement, { selector: (one) => one.line, minLength: 1, maxLength: 8 }), (list) => {
        const fact = cascade(list.map(({ level, value, line }) => said(level, value, level, line)))['rig']!;
        const highest = Math.max(...list.map((one) => levels.indexOf(one.level)));
        expect(levels.indexOf(fact.origin.level)).toBe(highest);
        const differing = list
          .filter((one) => one.level !== 'defaults' && one.value !== fact.value)
          .map((one) => one.line);
        expect(fact.disagrees.map((one) => one.origin.line).sort()).toEqual(differing.sort());
      }),
      { seed: 22 },
    );
  });
});

describe('which files are one cell', () => {
  test('no files, no cells', () => expect(ids({})).toEqual([]));
  test('each file by itself, named after it', () =>
    expect(ids({ 'recordings/2026/s1 c1.nwb': '', 'recordings/2026/s1 c2.csv': '1\n' })).toEqual(['s1-c1', 's1-c2']));
  test('a name that stands in two folders takes its folders along', () => {
    const { cells, problems } = cellsOf({
      'recordings/mon/c1.csv': '1\n',
      'recordings/tue/c1.csv': '1\n',
      'recordings/tue/c2.csv': '1\n',
    });
    expect(cells.map((cell) => cell.id)).toEqual(['c2', 'mon-c1', 'tue-c1']);
    expect(problems).toEqual([]);
  });
  test('an equal fact in a folder, in sidecars or in facts.csv makes one cell', () => {
    expect(ids({ 'r/c1/folder.yaml': 'facts: { cell: c1 }\n', 'r/c1/a.csv': '1\n', 'r/c1/b.csv': '1\n' })).toEqual([
      'c1',
    ]);
    expect(
      ids({
        'r/a.csv': '1\n',
        'r/a.csv.yaml': 'facts: { cell: c1 }\n',
        'r/b.csv': '1\n',
        'r/b.csv.yaml': 'facts: { cell: c1 }\n',
      }),
    ).toEqual(['c1']);
    expect(ids({ 'r/a.csv': '1\n', 'r/b.csv': '1\n', 'facts.csv': 'cell,file\nc1,r/a.csv\nc1,b.csv\n' })).toEqual([
      'c1',
    ]);
  });
  test('007 stays 007', () =>
    expect(ids({ 'r/a.csv': '1\n', 'r/a.csv.yaml': 'facts: { cell: 007 }\n', 'r/7.csv': '1\n' })).toEqual([
      '007',
      '7',
    ]));
  test('an id that only the files themselves state is told and kept apart', () => {
    const own = described([sweep('0')], { facts: [{ key: 'cell', value: 'c1', place: '/general' }] });
    const { cells } = cellsOf({ 'r/a.nwb': '', 'r/b.nwb': '' }, { 'r/a.nwb': own, 'r/b.nwb': own });
    expect(cells.map((cell) => cell.id)).toEqual(['c1', 'c1~2']);
    expect(told(cells[1]!.problems)).toBe(
      'r/b.nwb CELL_ID_TWICE\n' +
        '  The id "c1" was met twice, in r/a.nwb and r/b.nwb, and nobody stated that they are one cell.\n' +
        '  They are kept apart, as c1 and c1~2. If they are one cell, state "cell: c1" in both sidecars or in their folder; if not, give one another id.',
    );
    expect(cells[0]!.problems.map((one) => one.path)).toEqual(['r/a.nwb']);
    expect(cells.map((cell) => cell.facts['cell']!.value)).toEqual(['c1', 'c1~2']);
  });
  test('a name that a person gave is not taken by a file called the same', () => {
    const { cells } = cellsOf({ 'r/x.csv': '1\n', 'r/x.csv.yaml': 'facts: { cell: c1 }\n', 'r/c1.csv': '1\n' });
    expect(cells.map((cell) => [cell.id, cell.sweeps[0]!.path])).toEqual([
      ['c1', 'r/x.csv'],
      ['c1~2', 'r/c1.csv'],
    ]);
  });
  test('ids that differ in capitals alone would be one page', () => {
    const { cells } = cellsOf({
      'r/a.csv': '1\n',
      'r/a.csv.yaml': 'facts: { cell: C1 }\n',
      'r/b.csv': '1\n',
      'r/b.csv.yaml': 'facts: { cell: c1 }\n',
    });
    expect(cells.map((cell) => cell.id)).toEqual(['C1', 'c1~2']);
    expect(cells[1]!.problems[0]!.message).toBe('The ids "C1" (r/a.csv) and "c1" (r/b.csv) differ only in capitals.');
  });
  test('several electrodes are several cells, named by the sidecar or after the electrode', () => {
    const two = described([
      sweep('0', { electrode: 'electrode_0' }),
      sweep('1', { electrode: 'electrode 1' }),
      sweep('2', { electrode: 'electrode_0' }),
    ]);
    expect(refs({ 'r/pair.nwb': '' }, { 'r/pair.nwb': two })).toEqual([
      'pair-electrode-1: r/pair.nwb 1',
      'pair-electrode_0: r/pair.nwb 0',
      'pair-electrode_0: r/pair.nwb 2',
    ]);
    const sidecar = 'facts: { class: any }\ncells: { electrode_0: { cell: c1, class: purkinje } }\n';
    const { cells } = cellsOf({ 'r/pair.nwb': '', 'r/pair.nwb.yaml': sidecar }, { 'r/pair.nwb': two });
    expect(cells.map((cell) => [cell.id, cell.facts['class']!.value, cell.facts['class']!.disagrees])).toEqual([
      ['c1', 'purkinje', []],
      ['pair-electrode-1', 'any', []],
    ]);
  });
  test('two electrodes in one cell, when both are given its id', () => {
    const two = described([sweep('0', { electrode: 'soma' }), sweep('1', { electrode: 'dendrite' })]);
    const sidecar = 'cells: { soma: { cell: c1 }, dendrite: { cell: c1 } }\n';
    expect(refs({ 'r/a.nwb': '', 'r/a.nwb.yaml': sidecar }, { 'r/a.nwb': two })).toEqual([
      'c1: r/a.nwb 0',
      'c1: r/a.nwb 1',
    ]);
  });
  test('one id for a file of two electrodes names neither, and the sidecar to write is given', () => {
    const two = described([sweep('0', { electrode: 'e0' }), sweep('1', { electrode: 'e1' })]);
    const { cells, problems } = cellsOf({ 'r/a.nwb': '', 'r/a.nwb.yaml': 'facts: { cell: c1 }\n' }, { 'r/a.nwb': two });
    expect(cells.map((cell) => cell.id)).toEqual(['c1-e0', 'c1-e1']);
    expect(problems[0]!.sidecar).toBe('cells:\n  "e0": { cell: c1-e0 }\n  "e1": { cell: c1-e1 }');
  });
  test('an electrode that the file does not have', () => {
    const one = described([sweep('0', { electrode: 'electrode_0' })]);
    const { cells, problems } = cellsOf(
      { 'r/a.nwb': '', 'r/a.nwb.yaml': 'cells: { electrode_1: { cell: c1 } }\n' },
      { 'r/a.nwb': one },
    );
    expect(cells.map((cell) => cell.id)).toEqual(['a']);
    expect(told(problems)).toBe(
      'r/a.nwb.yaml ELECTRODE_UNKNOWN\n  "electrode_1" is not an electrode of r/a.nwb; the nearest is "electrode_0".\n  What is stated for it was not used. Correct the name.',
    );
  });
  test('a file that could not be read is a cell only where somebody says so', () => {
    expect(ids({ 'r/a.nwb': '' }, { 'r/a.nwb': null })).toEqual([]);
    const { cells } = cellsOf({ 'r/a.nwb': '', 'r/folder.yaml': 'facts: { cell: c1 }\n' }, { 'r/a.nwb': null });
    expect(cells.map((cell) => [cell.id, cell.sweeps.length, cell.problems[0]!.code])).toEqual([
      ['c1', 0, 'CELL_FILE_UNREAD'],
    ]);
    expect(ids({ 'r/a.nwb': '', 'facts.csv': 'cell,rig\na,x\n' }, { 'r/a.nwb': null })).toEqual(['a']);
    expect(
      ids({ 'r/a.nwb': '', 'r/a.nwb.yaml': 'cells: { e0: { cell: p }, e1: { cell: q } }\n' }, { 'r/a.nwb': null }),
    ).toEqual(['p', 'q']);
  });
  test('law: every sweep of every file belongs to exactly one cell, and no two cells share an id', () => {
    const name = fc.constantFrom('a', 'b', 'A', 'c 1');
    const stated = fc.option(fc.constantFrom('x', 'X', 'a', 'c-1'));
    const file = fc.record({
      folder: name,
      name,
      stated,
      own: stated,
      sweeps: fc.integer({ min: 1, max: 3 }),
      electrodes: fc.integer({ min: 1, max: 2 }),
    });
    fc.assert(
      fc.property(
        fc.uniqueArray(file, { selector: (one) => `${one.folder}/${one.name}`, minLength: 1, maxLength: 6 }),
        (files) => {
          const contents: Contents = {};
          const descriptions: Record<string, ReturnType<typeof described>> = {};
          for (const one of files) {
            const path = `r/${one.folder}/${one.name}.nwb`;
            contents[path] = '';
            if (one.stated !== null) contents[`${path}.yaml`] = `facts: { cell: ${one.stated} }\n`;
            descriptions[path] = described(
              Array.from({ length: one.sweeps }, (_, index) =>
                sweep(String(index), { electrode: one.electrodes === 1 ? '' : `e${index % 2}` }),
              ),
              { facts: one.own === null ? [] : [{ key: 'cell', value: one.own, place: '/' }] },
            );
          }
          const { cells } = cellsOf(contents, descriptions);
          const all = cells.flatMap((cell) => cell.sweeps.map((ref) => `${ref.path} ${ref.key}`));
          expect(all.length).toBe(files.reduce((sum, one) => sum + one.sweeps, 0));
          expect(new Set(all).size).toBe(all.length);
          const folded = cells.map((cell) => cell.id.toLowerCase());
          expect(new Set(folded).size).toBe(folded.length);
        },
      ),
      { seed: 23, numRuns: 60 },
    );
  });
});

describe('facts of a cell', () => {
  test('all five levels, with origin and line', () => {
    const contents = {
      'almanac.yaml': 'defaults:\n  temperature_c: 30\n  species: mouse\n',
      'r/folder.yaml': 'facts:\n  temperature_c: 31\n  rig: a\n',
      'r/c1.nwb': '',
      'facts.csv': 'cell,temperature_c,group\nc1,33,control\n',
      'r/c1.nwb.yaml': 'facts:\n\n  temperature_c: 34\n',
    };
    const own = described([sweep('0')], { facts: [{ key: 'temperature_c', value: 32, place: '/general/session' }] });
    const { facts, problems } = cellsOf(contents, { 'r/c1.nwb': own }).cells[0]!;
    expect(facts['temperature_c']).toEqual({
      key: 'temperature_c',
      value: 34,
      origin: { level: 'sidecar', path: 'r/c1.nwb.yaml', line: 3 },
      disagrees: [
        { value: 33, origin: { level: 'facts.csv', path: 'facts.csv', line: 2 } },
        { value: 32, origin: { level: 'file', path: 'r/c1.nwb: /general/session', line: null } },
        { value: 31, origin: { level: 'folder', path: 'r/folder.yaml', line: 2 } },
      ],
    });
    expect(Object.keys(facts)).toEqual(['cell', 'species', 'group', 'rig', 'temperature_c']);
    expect(problems.map((one) => one.code)).toEqual(['FACTS_DISAGREE', 'FACTS_DISAGREE', 'FACTS_DISAGREE']);
    expect(problems[0]!.message).toBe('temperature_c is "34" in r/c1.nwb.yaml, line 3 and "33" in facts.csv, line 2.');
  });
  test('what a file states that cannot be is told and not used', () => {
    const own = described([sweep('0')], {
      session_start: '1871-01-01T00:00:00',
      facts: [
        { key: 'temperature_c', value: 306, place: '/a' },
        { key: 'tempo', value: 1, place: '/b' },
      ],
    });
    const { cells, problems } = cellsOf({ 'r/c1.nwb': '' }, { 'r/c1.nwb': own });
    expect(Object.keys(cells[0]!.facts)).toEqual(['cell']);
    expect(problems.map((one) => one.message)).toEqual([
      'The file states a fact that cannot be: temperature_c must be between -5 and 60 °C, got 306.',
      'The file states a fact that cannot be: "tempo" is not a fact key; the nearest is "time".',
      'The file states a fact that cannot be: date must be a day of the calendar between 1900 and 2100, got "1871-01-01".',
    ]);
  });
  test('date and time come from the start of the session where the file states none', () => {
    const own = described([sweep('0')], { session_start: '2026-03-12T23:30:00.500-05:00' });
    const facts = (almanac: string) =>
      cellsOf({ 'almanac.yaml': almanac, 'r/c1.nwb': '' }, { 'r/c1.nwb': own }).cells[0]!.facts;
    expect([facts('')['date']!.value, facts('')['time']!.value]).toEqual(['2026-03-12', '23:30:00.5']);
    const lisbon = facts('timezone: Europe/Lisbon\n');
    expect([lisbon['date']!.value, lisbon['time']!.value]).toEqual(['2026-03-13', '04:30:00.5']);
  });
  test('a recipe is found by its id, another name or its title, and the fact holds the id', () => {
    const contents = {
      'solutions/k-glu.yaml':
        'name: Potassium gluconate\nalias: [KGlu, internal 3]\nrole: pipette\nmillimolar: { KCl: 130 }\n',
      'r/a.nwb': '',
    };
    for (const name of ['k-glu', 'K Glu', 'kglu', 'Internal 3', 'potassium gluconate']) {
      const { cells, archive } = cellsOf({ ...contents, 'r/a.nwb.yaml': `facts: { pipette: ${name} }\n` });
      expect(cells[0]!.facts['pipette']!.value, name).toBe('k-glu');
      expect(archive.problems, name).toEqual([]);
    }
    const own = described([sweep('0')], { facts: [{ key: 'pipette', value: 'INTERNAL 3', place: '/' }] });
    expect(cellsOf(contents, { 'r/a.nwb': own }).cells[0]!.facts['pipette']!.value).toBe('k-glu');
  });
  test('facts of one electrode are not the other’s', () => {
    const two = described([sweep('0', { electrode: 'e0' }), sweep('1', { electrode: 'e1' })], {
      facts: [
        { key: 'bridge_mohm', value: 10, place: '/' },
        { key: 'bridge_mohm', value: 12, place: '/e1', electrode: 'e1' },
      ],
    });
    const { cells } = cellsOf({ 'r/a.nwb': '' }, { 'r/a.nwb': two });
    expect(cells.map((cell) => [cell.id, cell.facts['bridge_mohm']!.value, cell.problems])).toEqual([
      ['a-e0', 10, []],
      ['a-e1', 12, []],
    ]);
  });
  test('what belongs to one file may differ between the files of a cell, and each sweep has its own', () => {
    const contents = {
      'r/folder.yaml': 'facts: { cell: c1, person: k }\n',
      'r/a.nwb': '',
      'r/a.nwb.yaml': 'facts: { protocol: steps, bridge_mohm: 12, temperature_c: 33 }\n',
      'r/b.nwb': '',
      'r/b.nwb.yaml': 'facts: { protocol: ramp, bridge_mohm: 15, temperature_c: 24, person: m }\n',
    };
    const [cell] = cellsOf(contents).cells;
    expect(cell!.facts['bridge_mohm']).toMatchObject({ value: 12, disagrees: [] });
    expect(cell!.facts['protocol']).toMatchObject({ value: 'steps', disagrees: [] });
    expect(conditionOf(cell!, 0).facts).toMatchObject({ protocol: 'steps', bridge_mohm: 12 });
    expect(conditionOf(cell!, 1).facts).toMatchObject({ protocol: 'ramp', bridge_mohm: 15 });
    // One cell has one temperature unless a condition says otherwise.
    expect(cell!.facts['temperature_c']!.disagrees.map((one) => one.value)).toEqual([24]);
    expect(cell!.facts['person']!.disagrees.map((one) => one.value)).toEqual(['k']);
  });
  test('a row for a cell that is not there names the nearest', () =>
    expect(told(cellsOf({ 'r/c1.csv': '1\n', 'facts.csv': 'cell,rig\nc2,a\n' }).problems)).toBe(
      'facts.csv TABLE_CELL_UNKNOWN\n  The row speaks for the cell "c2", which this archive does not hold; the nearest is "c1".\n  The row was not used. Correct its id, or name its recording in a column "file".',
    ));
  test('a row can speak for a cell that was kept apart', () => {
    const own = described([sweep('0')], { facts: [{ key: 'cell', value: 'c1', place: '/general' }] });
    const { cells, problems } = cellsOf(
      { 'r/a.nwb': '', 'r/b.nwb': '', 'facts.csv': 'cell,rig\nc1,a\nc1~2,b\n' },
      { 'r/a.nwb': own, 'r/b.nwb': own },
    );
    expect(cells.map((cell) => cell.facts['rig']!.value)).toEqual(['a', 'b']);
    expect(problems.every((one) => one.code === 'CELL_ID_TWICE')).toBe(true);
  });
});

describe('the order of sweeps', () => {
  const folder = { 'r/folder.yaml': 'facts: { cell: c }\n', 'r/a.nwb': '', 'r/b.nwb': '' };
  const starting = (session: string | null, ...starts: (number | null)[]) =>
    described(
      starts.map((start_s, index) => sweep(String(index), { start_s })),
      { session_start: session },
    );
  const order = (descriptions: Descriptions, more: Contents = {}): string =>
    refs({ ...folder, ...more }, descriptions)
      .map((ref) => ref.replace(/c: r\/(.)\.nwb (.)/, '$1$2'))
      .join(' ');

  test('within a file by start, and by column where a start is missing', () => {
    expect(order({ 'r/a.nwb': starting(null, 5, 3, 4), 'r/b.nwb': starting(null, 1) })).toBe('a1 a2 a0 b0');
    expect(order({ 'r/a.nwb': starting(null, 5, null, 4), 'r/b.nwb': starting(null, 1) })).toBe('a0 a1 a2 b0');
  });
  test('across files by the clock, interleaved where the clock says so', () => {
    const late = starting('2026-03-12T10:00:00', 0, 10);
    expect(order({ 'r/a.nwb': late, 'r/b.nwb': starting('2026-03-12T09:59:55', 0, 10) })).toBe('b0 a0 b1 a1');
    expect(order({ 'r/a.nwb': late, 'r/b.nwb': starting('2026-03-11T23:00:00', 0) })).toBe('b0 a0 a1');
  });
  test('offsets are compared on the lab’s clock', () => {
    const files = {
      'r/a.nwb': starting('2026-03-12T10:00:00+01:00', 0),
      'r/b.nwb': starting('2026-03-12T09:30:00Z', 0),
    };
    expect(order(files, { 'almanac.yaml': 'timezone: Europe/Lisbon\n' })).toBe('a0 b0');
  });
  test('by path where one file has no clock, or only one that speaks for many', () => {
    expect(order({ 'r/a.nwb': starting(null, 0, 10), 'r/b.nwb': starting('2026-03-12T09:00:00', 0) })).toBe('a0 a1 b0');
    const shared = { 'r/folder.yaml': 'facts: { cell: c, date: 2026-03-12, time: "09:00" }\n' };
    expect(order({ 'r/a.nwb': starting(null, 0, 10), 'r/b.nwb': starting(null, 1) }, shared)).toBe('a0 a1 b0');
  });
  test('a sidecar’s clock beats the file’s own', () =>
    expect(
      order(
        { 'r/a.nwb': starting('2026-03-12T10:00:00', 0), 'r/b.nwb': starting('1871-01-01T00:00:00', 0) },
        { 'r/b.nwb.yaml': 'facts: { date: 2026-03-12, time: "11:00" }\n' },
      ),
    ).toBe('a0 b0'));
  test('equal times go by path, then column', () =>
    expect(
      order({ 'r/a.nwb': starting('2026-03-12T10:00:00', 0, 0), 'r/b.nwb': starting('2026-03-12T10:00:00', 0) }),
    ).toBe('a0 a1 b0'));
});

describe('conditions', () => {
  const many = (count: number, session: string | null = null) =>
    described(
      Array.from({ length: count }, (_, index) =>
        sweep(String(index), { start_s: session === null ? null : index * 60 }),
      ),
      { session_start: session },
    );
  const labels = (contents: Contents, descriptions: Descriptions): string => {
    const [cell] = cellsOf(contents, descriptions).cells;
    return cell!.sweeps.map((_, index) => conditionOf(cell!, index).label).join(' ');
  };

  test('none stated: baseline throughout', () =>
    expect(labels({ 'r/c.nwb': '' }, { 'r/c.nwb': many(3) })).toBe('baseline baseline baseline'));
  test('from a sweep on, the one that began last, without adding up', () => {
    const sidecar =
      'conditions:\n  - { from_sweep: 1, label: TTX, note: in bath }\n  - { from_sweep: 3, label: wash, temperature_c: 30 }\n';
    const contents = { 'r/c.nwb': '', 'r/c.nwb.yaml': sidecar };
    expect(labels(contents, { 'r/c.nwb': many(4) })).toBe('baseline TTX TTX wash');
    const [cell] = cellsOf(contents, { 'r/c.nwb': many(4) }).cells;
    expect([1, 3].map((index) => conditionOf(cell!, index).facts)).toEqual([
      { note: 'in bath' },
      { temperature_c: 30 },
    ]);
    expect(() => conditionOf(cell!, 4)).toThrow('sweepIndex must be below 4, got 4');
  });
  test('the first label can be stated', () =>
    expect(
      labels(
        { 'r/c.nwb': '', 'r/c.nwb.yaml': 'conditions: [{ from_sweep: 0, label: control }]\n' },
        { 'r/c.nwb': many(2) },
      ),
    ).toBe('control control'));
  test('from a clock time on, also past midnight', () => {
    const at = (time: string) => ({
      'r/c.nwb': '',
      'r/c.nwb.yaml': `conditions: [{ from_time: "${time}", label: TTX }]\n`,
    });
    const day = { 'r/c.nwb': many(4, '2026-03-12T10:00:00') };
    expect(labels(at('10:02'), day)).toBe('baseline baseline TTX TTX');
    expect(labels(at('10:01:30'), day)).toBe('baseline baseline TTX TTX');
    expect(labels(at('09:00'), day)).toBe('TTX TTX TTX TTX');
    const night = { 'r/c.nwb': many(4, '2026-03-12T23:58:30') };
    expect(labels(at('00:00'), night)).toBe('baseline baseline TTX TTX');
    expect(labels(at('2026-03-13 00:01'), night)).toBe('baseline baseline baseline TTX');
  });
  test('a clock time in a text file whose row of facts.csv has the start', () => {
    const contents = {
      'r/c.csv': '1\n',
      'facts.csv': 'cell,date,time\nc,2026-03-12,10:00\n',
      'r/c.csv.yaml': 'conditions: [{ from_time: "10:01", label: TTX }]\n',
    };
    const timed = described([sweep('0', { start_s: 0 }), sweep('1', { start_s: 60 })]);
    expect(labels(contents, { 'r/c.csv': timed })).toBe('baseline TTX');
  });
  test('without a beginning, for the file or folder that states it, and no further', () => {
    const contents = {
      'r/folder.yaml': 'facts: { cell: c }\n',
      'r/a.csv': '1\n',
      'r/b.csv': '1\n',
      'r/b.csv.yaml': 'conditions: [{ label: drug }]\n',
      'r/c.csv': '1\n',
      'r/z/folder.yaml': 'conditions: [{ label: wash }]\n',
      'r/z/d.csv': '1\n',
    };
    expect(labels(contents, {})).toBe('baseline drug baseline wash');
  });
  test('a folder’s condition counts once, however many files it speaks for', () => {
    const contents = {
      'r/folder.yaml': 'facts: { cell: c }\nconditions: [{ from_sweep: 1, label: TTX }]\n',
      'r/a.csv': '1\n',
      'r/b.csv': '1\n',
    };
    expect(cellsOf(contents).cells[0]!.conditions).toHaveLength(1);
    expect(labels(contents, {})).toBe('baseline TTX');
  });
  test('what can be placed nowhere is told', () => {
    const sidecar = 'conditions:\n  - { from_sweep: 9, label: A }\n  - { from_time: "12:00", label: B }\n';
    const said = (session: string | null) =>
      told(cellsOf({ 'r/c.nwb': '', 'r/c.nwb.yaml': sidecar }, { 'r/c.nwb': many(2, session) }).cells[0]!.problems);
    expect(said(null)).toBe(
      'r/c.nwb.yaml CONDITION_BEYOND\n  The condition "A" begins at sweep 9, and the cell\'s last sweep is 1.\n  No sweep is under it. Correct the number; sweeps count from 0 within the cell.\n' +
        'r/c.nwb.yaml CONDITION_UNPLACED\n  The condition "B" begins at 12:00:00, and the sweeps have no clock times.\n  It was not used. State from_sweep instead, or the recording\'s date and time in its sidecar.',
    );
    expect(said('2026-03-12T10:00:00')).toContain("begins at 12:00:00, after the start of the cell's last sweep.");
  });
  test('a condition’s recipe is found like any other', () => {
    const contents = {
      'solutions/acsf-ttx.yaml': 'role: bath\nmillimolar: { NaCl: 125 }\n',
      'r/c.csv': '1\n',
      'r/c.csv.yaml': 'conditions: [{ from_sweep: 0, label: TTX, bath: ACSF TTX }]\n',
    };
    const { cells, archive } = cellsOf(contents);
    expect(conditionOf(cells[0]!, 0)).toEqual({ label: 'TTX', facts: { bath: 'acsf-ttx' } });
    expect(archive.problems).toEqual([]);
  });
});
