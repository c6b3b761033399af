/** What people read when one of the archive's own files is wrong. Look at every change of these texts. */
import { describe, expect, test } from 'vitest';
import { complaints } from './in-folder.ts';

const recording = { 'recordings/c1.csv': '0,1\n' };

describe('YAML that cannot be read costs its file only', () => {
  test('a key twice', () =>
    expect(complaints({ 'almanac.yaml': 'title: A\nlab: B\ntitle: C\n' })).toMatchInlineSnapshot(`
    "almanac.yaml:3 YAML_KEY_TWICE (blocks)
      The same key stands twice in one block: title: C
      Nothing in this file was used. Repair the line and build again."
  `));
  test('a tab for indentation', () =>
    expect(complaints({ 'almanac.yaml': 'rigs:\n\ta: Rig A\n' })).toMatchInlineSnapshot(`
    "almanac.yaml:2 YAML_UNREADABLE (blocks)
      The line is indented with a tab; YAML wants spaces: a: Rig A
      Nothing in this file was used. Repair the line and build again."
  `));
  test('an open quotation mark', () =>
    expect(complaints({ 'almanac.yaml': 'title: "A\nlab: B\n' })).toMatchInlineSnapshot(`
      "almanac.yaml:3 YAML_UNREADABLE (blocks)
        A quotation mark is opened here or above and not closed.
        Nothing in this file was used. Repair the line and build again."
    `));
  test('an open bracket', () =>
    expect(complaints({ 'events.yaml': '- { date: 2026-01-01, text: x\n' })).toMatchInlineSnapshot(`
      "events.yaml:2 YAML_UNREADABLE (blocks)
        A "{" is opened here or above and not closed.
        Nothing in this file was used. Repair the line and build again."
    `));
  test('a colon inside plain text', () =>
    expect(complaints({ 'almanac.yaml': 'title: A: B\n' })).toMatchInlineSnapshot(`
      "almanac.yaml:1 YAML_UNREADABLE (blocks)
        A text that holds ": " needs quotation marks around it: title: A: B
        Nothing in this file was used. Repair the line and build again."
    `));
  test('two documents', () =>
    expect(complaints({ 'almanac.yaml': 'title: A\n---\nlab: B\n' })).toMatchInlineSnapshot(`
      "almanac.yaml:2 YAML_UNREADABLE (blocks)
        A second document begins with "---"; only one is expected: ---
        Nothing in this file was used. Repair the line and build again."
    `));
  test('a list where keys belong', () =>
    expect(complaints({ 'almanac.yaml': '- title: A\n' })).toMatchInlineSnapshot(`
    "almanac.yaml:1 VALUE_IMPOSSIBLE (blocks)
      The file must be a block of keys, got a list of 1.
      Nothing in this file was used. Correct it and build again."
  `));
  test('plain text', () =>
    expect(complaints({ 'almanac.yaml': 'Our archive\n' })).toMatchInlineSnapshot(`
    "almanac.yaml:1 VALUE_IMPOSSIBLE (blocks)
      The file must be a block of keys, got "Our archive".
      Nothing in this file was used. Correct it and build again."
  `));
  test('bytes that are no UTF-8', () =>
    expect(complaints({ 'almanac.yaml': new Uint8Array([0x74, 0x3a, 0x20, 0xe9, 0x0a]) })).toMatchInlineSnapshot(`
      "almanac.yaml YAML_NOT_UTF8 (blocks)
        The file is not UTF-8 text.
        Nothing in this file was used. Save it as UTF-8."
    `));
  test('aliases that unfold into billions', () => {
    const rows = ['a: &a [x, x, x, x, x, x, x, x, x, x]'];
    for (let level = 1; level < 12; level++) {
      const [name, before] = [String.fromCharCode(97 + level), String.fromCharCode(96 + level)];
      rows.push(`${name}: &${name} [${Array(10).fill(`*${before}`).join(', ')}]`);
    }
    expect(complaints({ 'almanac.yaml': rows.join('\n') })).toMatchInlineSnapshot(`
      "almanac.yaml YAML_UNREADABLE (blocks)
        The file is nested too deeply or its aliases unfold into too much.
        Nothing in this file was used. Repair the line and build again."
    `);
  });
  test('an alias inside itself', () =>
    expect(complaints({ 'almanac.yaml': 'audiences: &a { b: *a }\n' })).toMatchInlineSnapshot(`
    "almanac.yaml YAML_UNREADABLE (blocks)
      The file is nested too deeply or its aliases unfold into too much.
      Nothing in this file was used. Repair the line and build again."
  `));
  test('brackets without end', () =>
    expect(complaints({ 'almanac.yaml': '['.repeat(100_000) })).toMatchInlineSnapshot(`
    "almanac.yaml YAML_UNREADABLE (blocks)
      The file is nested too deeply or its aliases unfold into too much.
      Nothing in this file was used. Repair the line and build again."
  `));
  test('a name of an alias that nobody gave', () =>
    expect(complaints({ 'almanac.yaml': 'title: *x\n' })).toMatchInlineSnapshot(`
      "almanac.yaml:1 YAML_UNREADABLE (blocks)
        "*x" refers to an anchor that is not there.
        Nothing in this file was used. Repair the line and build again."
    `));
  test('a tag of another program', () =>
    expect(complaints({ 'almanac.yaml': 'title: !thing A\n' })).toMatchInlineSnapshot(`
    "almanac.yaml:1 YAML_TAG
      Unresolved tag: !thing.
      Remove the tag that begins with "!"."
  `));
});

describe('almanac.yaml', () => {
  test('everything a person can get wrong, and the rest is used', () =>
    expect(
      complaints({
        'almanac.yaml': `titel: A
timezone: Europe/Lisbonn
mains_hz: 5
rigs: [a, b]
classes:
  deep: { label: Deep, like: cortical-pyramidall }
  odd: { label: Odd }
limits:
  acces_resistance_mohm: { below: 20 }
  noise_rms_mv: { under: 1 }
  peak_mv: { above: 10, below: 5 }
  baseline_mv: { between: [-50, -80] }
defaults:
  cell: c1
  temprature_c: 33
  temperature_c: 33 degrees
  bath: { a: 1 }
  rig: [a]
`,
      }),
    ).toMatchInlineSnapshot(`
      "almanac.yaml:1 KEY_UNKNOWN
        "titel" is not a key that belongs here; the nearest is "title".
        The key was not used. Correct its spelling or remove it.
      almanac.yaml:2 VALUE_IMPOSSIBLE
        timezone must be a time zone such as Europe/Lisbon, got "Europe/Lisbonn"; the nearest is "Europe/Lisbon".
        The value was not used. Correct it and build again.
      almanac.yaml:3 VALUE_IMPOSSIBLE
        mains_hz must be a number from 45 to 65 Hz, got 5.
        The value was not used. Correct it and build again.
      almanac.yaml:4 VALUE_IMPOSSIBLE
        rigs must be a block of keys, got a list of 2.
        The value was not used. Correct it and build again.
      almanac.yaml:6 VALUE_IMPOSSIBLE
        classes.deep.like must be a class that comes with the tool, got "cortical-pyramidall"; the nearest is "cortical-pyramidal".
        The entry was not used. Correct it and build again.
      almanac.yaml:7 VALUE_IMPOSSIBLE
        classes.odd.like is missing; it must be a class that comes with the tool.
        The entry was not used. Correct it and build again.
      almanac.yaml:9 QUANTITY_UNKNOWN
        "acces_resistance_mohm" is not a quantity; the nearest is "access_resistance_mohm".
        The limit was not used. Correct the id; the methods page lists them all.
      almanac.yaml:10 KEY_UNKNOWN
        "under" is not a key that belongs here; the nearest is "above".
        The entry was not used. Correct it and build again.
      almanac.yaml:11 VALUE_IMPOSSIBLE
        limits.peak_mv must be a limit that some number can meet: "above" must not be higher than "below".
        The value was not used. Correct it and build again.
      almanac.yaml:12 VALUE_IMPOSSIBLE
        limits.baseline_mv.between must be two numbers, the lower one first.
        The entry was not used. Correct it and build again.
      almanac.yaml:14 FACT_MISPLACED
        cell cannot be stated here: it would make all recordings one cell.
        The fact was not used. Correct it and build again.
      almanac.yaml:15 FACT_UNKNOWN
        "temprature_c" is not a fact key; the nearest is "temperature_c".
        The line was not used. Correct its spelling; what fits no key goes under "note".
      almanac.yaml:16 FACT_IMPOSSIBLE
        temperature_c must be a number in °C, got "33 degrees"; write the number alone, in °C.
        The fact was not used. Correct it and build again.
      almanac.yaml:17 FACT_IMPOSSIBLE
        bath must be one value, got a block of keys.
        The fact was not used. Correct it and build again.
      almanac.yaml:18 FACT_IMPOSSIBLE
        rig must be one value, got a list.
        The fact was not used. Correct it and build again."
    `));
});

describe('folder.yaml and sidecars', () => {
  test('facts', () =>
    expect(
      complaints({
        ...recording,
        'recordings/folder.yaml':
          'facts:\n  datum: 2026-03-12\n  date: 12.03.2026\n  configuration: wholecel\n  junction:\n  temperature_c: 310\n',
      }),
    ).toMatchInlineSnapshot(`
      "recordings/folder.yaml:2 FACT_UNKNOWN
        "datum" is not a fact key; the nearest is "date".
        The line was not used. Correct its spelling; what fits no key goes under "note".
      recordings/folder.yaml:3 FACT_IMPOSSIBLE
        date must be written YYYY-MM-DD, got "12.03.2026".
        The fact was not used. Correct it and build again.
      recordings/folder.yaml:4 FACT_IMPOSSIBLE
        configuration must be whole-cell, perforated, sharp, loose or other, got "wholecel"; the nearest is "whole-cell".
        The fact was not used. Correct it and build again.
      recordings/folder.yaml:6 FACT_IMPOSSIBLE
        temperature_c must be between -5 and 60 °C, got 310.
        The fact was not used. Correct it and build again."
    `));
  test('facts that stand outside "facts"', () =>
    expect(
      complaints({ ...recording, 'recordings/c1.csv.yaml': 'temperature_c: 33\nfact: { cell: c1 }\n' }),
    ).toMatchInlineSnapshot(`
      "recordings/c1.csv.yaml:1 KEY_UNKNOWN
        "temperature_c" is a fact and stands outside "facts:".
        It was not used. Move it under "facts:".
      recordings/c1.csv.yaml:2 KEY_UNKNOWN
        "fact" is not a key that belongs here; the nearest is "facts".
        The key was not used. Correct its spelling or remove it."
    `));
  test('facts that are a list', () =>
    expect(complaints({ ...recording, 'recordings/c1.csv.yaml': 'facts:\n  - cell: c1\n' })).toMatchInlineSnapshot(`
      "recordings/c1.csv.yaml:2 VALUE_IMPOSSIBLE
        facts must be a block of facts, got a list of 1.
        No fact of it was used. Write one "key: value" a line below it."
    `));
  test('conditions', () =>
    expect(
      complaints({
        ...recording,
        'recordings/c1.csv.yaml': `conditions:
  - { from_sweep: 20 }
  - { from_sweep: -1, label: A }
  - { from_sweep: 2, from_time: "14:00", label: B }
  - { from_time: 2 pm, label: C }
  - { from_sweep: 3, label: D, cell: c2, temp: 3 }
  - washed
`,
      }),
    ).toMatchInlineSnapshot(`
      "recordings/c1.csv.yaml:2 VALUE_IMPOSSIBLE
        A condition must have a label, such as "label: TTX".
        The condition was not used. Correct it and build again.
      recordings/c1.csv.yaml:3 VALUE_IMPOSSIBLE
        from_sweep must be a whole number from 0, got -1.
        The condition was not used. Correct it and build again.
      recordings/c1.csv.yaml:4 VALUE_IMPOSSIBLE
        A condition begins at from_sweep or at from_time, never both.
        The condition was not used. Correct it and build again.
      recordings/c1.csv.yaml:5 VALUE_IMPOSSIBLE
        from_time must be a clock time written HH:MM, HH:MM:SS or YYYY-MM-DD HH:MM:SS, got "2 pm".
        The condition was not used. Correct it and build again.
      recordings/c1.csv.yaml:6 FACT_MISPLACED
        cell cannot be stated here: a condition belongs to its cell.
        The fact was not used. Correct it and build again.
      recordings/c1.csv.yaml:6 FACT_UNKNOWN
        "temp" is not a fact key; the nearest is "temperature_c".
        The line was not used. Correct its spelling; what fits no key goes under "note".
      recordings/c1.csv.yaml:7 VALUE_IMPOSSIBLE
        A condition must be a block of keys, got "washed".
        The condition was not used. Correct it and build again."
    `));
  test('a table with one wrong key is out as a whole', () =>
    expect(
      complaints({
        ...recording,
        'recordings/c1.csv.yaml':
          'table:\n  time: { column: 1, unit: sec }\n  rate: 20000\n  voltage: { columns: [0], unit: mV }\n',
      }),
    ).toMatchInlineSnapshot(`
      "recordings/c1.csv.yaml:2 VALUE_IMPOSSIBLE (blocks)
        table.time.unit must be s, ms or us, got "sec"; the nearest is "s".
        The whole table block was not used, and the recording is not read until it is corrected.
      recordings/c1.csv.yaml:3 KEY_UNKNOWN (blocks)
        "rate" is not a key that belongs here; the nearest is "rate_hz".
        The whole table block was not used, and the recording is not read until it is corrected.
      recordings/c1.csv.yaml:4 VALUE_IMPOSSIBLE (blocks)
        table.voltage.columns.0 must be a column: its number from 1 or its heading, got 0.
        The whole table block was not used, and the recording is not read until it is corrected."
    `));
  test('a table that says two things', () =>
    expect(
      complaints({
        ...recording,
        'recordings/c1.csv.yaml': `table:
  time: { column: 1, unit: s }
  rate_hz: 20000
  current: { columns: [2], unit: pA }
  stimulus: { kind: step, start_s: 1, end_s: 0.5, from_pa: 3 }
`,
      }),
    ).toMatchInlineSnapshot(`
      "recordings/c1.csv.yaml:3 VALUE_IMPOSSIBLE (blocks)
        table.rate_hz: State time or rate_hz, never both.
        The whole table block was not used, and the recording is not read until it is corrected.
      recordings/c1.csv.yaml:5 VALUE_IMPOSSIBLE (blocks)
        table.stimulus: State the height of the step: from_pa and by_pa, or pa: [one number a sweep].
        The whole table block was not used, and the recording is not read until it is corrected.
      recordings/c1.csv.yaml:5 VALUE_IMPOSSIBLE (blocks)
        table.stimulus.end_s must be later than start_s (1 s), got 0.5.
        The whole table block was not used, and the recording is not read until it is corrected."
    `));
  test('a command of as many potentials as times, or none', () =>
    expect(
      complaints({
        ...recording,
        'recordings/c1.csv.yaml':
          'table:\n  clamp: voltage\n  stimulus: { kind: levels, at_s: [0, 0.2, 0.1], mv: [-70, -65] }\n',
      }),
    ).toMatchInlineSnapshot(`
      "recordings/c1.csv.yaml:3 VALUE_IMPOSSIBLE (blocks)
        table.stimulus.at_s: Times in ascending order.
        The whole table block was not used, and the recording is not read until it is corrected.
      recordings/c1.csv.yaml:3 VALUE_IMPOSSIBLE (blocks)
        table.stimulus.mv: As many potentials as times: 3 times and 2 potentials are listed.
        The whole table block was not used, and the recording is not read until it is corrected."
    `));
  test('a sidecar alone, one under another spelling, electrodes in a folder', () =>
    expect(
      complaints({
        ...recording,
        'recordings/c1.yaml': 'facts: { cell: c1 }\n',
        'recordings/c1.csv.yml': 'facts: { cell: c1 }\n',
        'recordings/Folder.yaml': 'facts: { rig: a }\n',
        'recordings/folder.yaml': 'cells: { electrode_0: { cell: c1 } }\n',
        'empty/x.csv.yaml': '',
        'almanack.yaml': 'title: A\n',
      }),
    ).toMatchInlineSnapshot(`
      "almanack.yaml FILE_UNKNOWN
        "almanack.yaml" is none of the files that stand at the top of an archive; the nearest is "almanac.yaml".
        It was not used. Correct its name.
      empty/x.csv.yaml SIDECAR_ALONE
        It speaks for "x.csv", which is not there. No data file lies beside it.
        It was not used. Give it the full name of its data file, ending included, followed by .yaml.
      recordings/Folder.yaml FILE_MISNAMED (blocks)
        The file looks like folder.yaml under another spelling and was not used.
        Rename it to folder.yaml.
      recordings/c1.csv.yml FILE_MISNAMED (blocks)
        The file looks like c1.csv.yaml under another spelling and was not used.
        Rename it to c1.csv.yaml.
      recordings/c1.yaml SIDECAR_ALONE
        It speaks for "c1", which is not there. The nearest name beside it is "c1.csv".
        It was not used. Give it the full name of its data file, ending included, followed by .yaml.
      recordings/folder.yaml:1 KEY_MISPLACED
        "cells" names the electrodes of one file and cannot speak for a folder.
        It was not used. Move it to the sidecar of the file."
    `));
});

describe('recipes, decisions, events, criteria', () => {
  test('recipes', () =>
    expect(
      complaints({
        'solutions/a.yaml': 'role: bathing\nmillimolar: { NaCl: 125 }\n',
        'solutions/b.yaml': 'role: bath\nph: 74\nmillimolar: { NaCl: lots, KCl: -3, CaCl2: 2 }\n',
        'solutions/c.yaml': 'role: bath\n',
        'solutions/d.yaml': '',
        'solutions/e.yml': 'role: bath\n',
        'solutions/f.yaml': 'role: bath\nalias: B\nmillimolar: { NaCl: 1 }\n',
      }),
    ).toMatchInlineSnapshot(`
      "solutions/a.yaml:1 VALUE_IMPOSSIBLE (blocks)
        role must be pipette or bath, got "bathing"; the nearest is "bath".
        The recipe was not used, since a part of it would mislead. Correct it and build again.
      solutions/b.yaml:2 VALUE_IMPOSSIBLE (blocks)
        ph must be a number from 0 to 14, got 74.
        The recipe was not used, since a part of it would mislead. Correct it and build again.
      solutions/b.yaml:3 VALUE_IMPOSSIBLE (blocks)
        millimolar.KCl must be a number from 0 to 10000 mM, got -3.
        The recipe was not used, since a part of it would mislead. Correct it and build again.
      solutions/b.yaml:3 VALUE_IMPOSSIBLE (blocks)
        millimolar.NaCl must be a number from 0 to 10000 mM, got "lots".
        The recipe was not used, since a part of it would mislead. Correct it and build again.
      solutions/c.yaml:1 VALUE_IMPOSSIBLE (blocks)
        millimolar is missing; it must be a block of keys.
        The recipe was not used, since a part of it would mislead. Correct it and build again.
      solutions/d.yaml RECIPE_EMPTY
        The recipe is empty.
        State its role and millimolar, or remove the file.
      solutions/e.yml FILE_MISNAMED
        Names in solutions/ end in .yaml; this one was not used.
        Let its name end in .yaml."
    `));
  test('decisions and events', () =>
    expect(
      complaints({
        'almanac.yaml': 'people: { k: K. }\nrigs: { a: Rig A }\n',
        'decisions.yaml': `- { cell: c1, decision: exclud, by: k, date: 2026-03-20, why: x }
- { cell: c2, decision: exclude, by: k, date: 2026-03-20 }
- { cell: c 3/4, decision: exclude, by: m, date: 2026-03-20, why: x }
- { cell: 007, decision: exclude, by: m, date: 2026-03-20, why: x }
`,
        'events.yaml': '- { date: 2026-02-30, text: x }\n- { date: 2026-02-20, text: x, rig: b }\n- new pump\n',
      }),
    ).toMatchInlineSnapshot(`
      "decisions.yaml:1 VALUE_IMPOSSIBLE
        entry 1: decision must be include, exclude or apply, got "exclud"; the nearest is "exclude".
        The entry was not used. Correct it and build again.
      decisions.yaml:2 VALUE_IMPOSSIBLE
        entry 2: why is missing; it must be a text.
        The entry was not used. Correct it and build again.
      decisions.yaml:3 VALUE_IMPOSSIBLE
        cell may hold letters, digits and . _ + - only, since it names a page, got "c 3/4"; "c-3-4" would do.
        The decision was not used. Correct the id of the cell.
      decisions.yaml:4 CODE_UNKNOWN
        "m" is not among the people of almanac.yaml (k); the nearest is "k".
        It was used as it stands. Correct it, or add it to people.
      events.yaml:1 VALUE_IMPOSSIBLE
        entry 1: date must be a day of the calendar written YYYY-MM-DD, got "2026-02-30".
        The entry was not used. Correct it and build again.
      events.yaml:2 CODE_UNKNOWN
        "b" is not among the rigs of almanac.yaml (a); the nearest is "a".
        It was used as it stands. Correct it, or add it to rigs.
      events.yaml:3 VALUE_IMPOSSIBLE
        entry 3 must be a block of keys, got "new pump".
        The value was not used. Correct it and build again."
    `));
  test('decisions that are no list', () =>
    expect(complaints({ 'decisions.yaml': 'cell: c1\ndecision: exclude\n' })).toMatchInlineSnapshot(`
      "decisions.yaml:1 VALUE_IMPOSSIBLE (blocks)
        The file must be a list of decisions, each beginning with "-", got a block of keys.
        Nothing in this file was used. Correct it and build again."
    `));
  test('criteria', () =>
    expect(
      complaints({
        'criteria/a.yaml': `title: A
selekt: { class: any }
require:
  standing: { not: [unsond] }
  noise_rms: { below: 1 }
  noise_rms_mv: { below: low }
  peak_mv: { missing: drop }
  spikes:
  configuration: [whole]
`,
      }),
    ).toMatchInlineSnapshot(`
      "criteria/a.yaml:2 KEY_UNKNOWN
        "selekt" is not a key that belongs here; the nearest is "select".
        The key was not used. Correct its spelling or remove it.
      criteria/a.yaml:4 VALUE_IMPOSSIBLE
        A standing is sound, caution, unsound or unread, got "unsond"; the nearest is "unsound".
        The rule was not used, so the set lets through more than it says. Correct it.
      criteria/a.yaml:5 CRITERION_UNKNOWN
        "noise_rms" is neither a quantity nor a fact; the nearest is "noise_rms_mv".
        The rule was not used, so the set lets through more than it says. Correct it.
      criteria/a.yaml:6 VALUE_IMPOSSIBLE
        require.noise_rms_mv.below must be a number, got "low".
        The rule was not used, so the set lets through more than it says. Correct it.
      criteria/a.yaml:7 VALUE_IMPOSSIBLE
        require.peak_mv must say above, below, between, any or not, got a block of keys.
        The rule was not used, so the set lets through more than it says. Correct it.
      criteria/a.yaml:8 VALUE_IMPOSSIBLE
        require.spikes says nothing.
        The rule was not used, so the set lets through more than it says. Correct it.
      criteria/a.yaml:9 VALUE_IMPOSSIBLE
        configuration must be whole-cell, perforated, sharp, loose or other, got "whole"; the nearest is "whole-cell".
        The rule was not used, so the set lets through more than it says. Correct it."
    `));
});

describe('what one file says of another', () => {
  test('codes that no list holds, each told once', () =>
    expect(
      complaints({
        'almanac.yaml': 'rigs: { a: Rig A }\npeople: { k: K. }\ndefaults: { bath: acfs, class: pyramidal }\n',
        'solutions/acsf.yaml': 'role: bath\nmillimolar: { NaCl: 125 }\n',
        'recordings/folder.yaml': 'facts: { rig: A, person: q, pipette: acsf }\n',
        'recordings/c1.csv': '1\n',
        'recordings/c2.csv': '1\n',
      }),
    ).toMatchInlineSnapshot(`
      "almanac.yaml:3 RECIPE_UNKNOWN
        There is no recipe "acfs" in solutions/; the nearest is "acsf".
        Nothing that depends on the bath solution can be worked out. Add solutions/acfs.yaml or correct the name.
      almanac.yaml:3 CLASS_UNKNOWN
        "pyramidal" is not a cell class; the nearest is "cortical-pyramidal".
        The fact was not used. Correct it, or describe the class in almanac.yaml under classes.
      recordings/folder.yaml:1 CODE_UNKNOWN
        "q" is not among the people of almanac.yaml (k); the nearest is "k".
        It was used as it stands. Correct it, or add it to people.
      recordings/folder.yaml:1 RECIPE_ROLE
        The recipe "acsf" has the role bath and is stated as pipette.
        It was used as stated. Correct one of them.
      recordings/folder.yaml:1 CODE_UNKNOWN
        "A" is not among the rigs of almanac.yaml (a); the nearest is "a".
        It was used as it stands. Correct it, or add it to rigs."
    `));
});

describe('facts.csv', () => {
  test('without a column of cells', () =>
    expect(complaints({ 'facts.csv': 'subject,rig\nm1,a\n' })).toMatchInlineSnapshot(`
    "facts.csv:1 TABLE_WITHOUT_CELL (blocks)
      The first row names no column "cell".
      Nothing in the table was used. Add a column "cell" with the id of each row's cell."
  `));
  test('columns and values', () =>
    expect(
      complaints({
        ...recording,
        'facts.csv': `cell,Temperatur,rig,rig,temperature_c,date,
c1,33,a,b,33,2026-03-12,x
,33,a,b,33,2026-03-12
c1,33,a,b,33,2026-03-12
c2,33,a,b,hot,12/03/26,,,y
`,
      }),
    ).toMatchInlineSnapshot(`
      "facts.csv:1 FACT_UNKNOWN
        "Temperatur" is not a fact key; the nearest is "temperature_c".
        The column was not used. Correct its heading; what fits no key goes under "note".
      facts.csv:1 TABLE_COLUMN_UNNAMED
        Column 7 has values and no heading.
        The column was not used. Head it with a fact key.
      facts.csv:1 TABLE_COLUMN_TWICE
        Two columns are headed "rig".
        The second was not used. Remove one of them.
      facts.csv:3 TABLE_ROW_WITHOUT_CELL
        cell has no value.
        The row was not used. Give it the id of its cell.
      facts.csv:4 TABLE_CELL_TWICE
        The cell "c1" has a row already, in line 2.
        This row was not used. Keep one row a cell; a column "file" allows one row a file.
      facts.csv:5 TABLE_ROW_LONG
        The row has 9 values under 7 headings.
        The values beyond the headings were not used. Check for a stray separator.
      facts.csv:5 FACT_IMPOSSIBLE
        date must be written YYYY-MM-DD, got "12/03/26".
        The value was not used. Correct it in the spreadsheet and save the table again.
      facts.csv:5 FACT_IMPOSSIBLE
        temperature_c must be a number in °C, got "hot".
        The value was not used. Correct it in the spreadsheet and save the table again."
    `));
  test('the same trouble in every row is counted, not repeated', () => {
    const rows = Array.from({ length: 400 }, (_, index) => `c${index},12/03/26`);
    expect(complaints({ 'facts.csv': `cell,date\n${rows.join('\n')}\n` })).toMatchInlineSnapshot(`
      "facts.csv TABLE_MORE
        395 more rows have the same trouble in this column.
        Correct the whole column in the spreadsheet.
      facts.csv:2 FACT_IMPOSSIBLE
        date must be written YYYY-MM-DD, got "12/03/26".
        The value was not used. Correct it in the spreadsheet and save the table again.
      facts.csv:3 FACT_IMPOSSIBLE
        date must be written YYYY-MM-DD, got "12/03/26".
        The value was not used. Correct it in the spreadsheet and save the table again.
      facts.csv:4 FACT_IMPOSSIBLE
        date must be written YYYY-MM-DD, got "12/03/26".
        The value was not used. Correct it in the spreadsheet and save the table again.
      facts.csv:5 FACT_IMPOSSIBLE
        date must be written YYYY-MM-DD, got "12/03/26".
        The value was not used. Correct it in the spreadsheet and save the table again.
      facts.csv:6 FACT_IMPOSSIBLE
        date must be written YYYY-MM-DD, got "12/03/26".
        The value was not used. Correct it in the spreadsheet and save the table again."
    `);
  });
  test('files that are not there, or given twice', () =>
    expect(
      complaints({
        ...recording,
        'facts.csv': 'cell,file\nc1,recordings/c2.csv\nc2,c1.csv\nc3,../../etc/passwd\nc4,c1.csv\n',
      }),
    ).toMatchInlineSnapshot(`
      "facts.csv:2 TABLE_FILE_UNKNOWN
        "recordings/c2.csv" is not the path of one file of the archive; the nearest is "recordings/c1.csv".
        The row speaks for its cell alone. Correct the path.
      facts.csv:4 TABLE_FILE_UNKNOWN
        "../../etc/passwd" is not the path of one file of the archive; the nearest is "recordings/c1.csv".
        The row speaks for its cell alone. Correct the path.
      facts.csv:5 TABLE_FILE_TWICE
        c1.csv is given to the cell "c4" here and to "c2" in line 3.
        The first line was used. Correct one of them; several cells in one file are stated in its sidecar under "cells:"."
    `));
});
