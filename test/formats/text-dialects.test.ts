/** Tables of text in every dress: what is found out, what is asked, and that no number changes on the way. */
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import type { ReadingHints, TableMapping } from '../../pipeline/formats/types.ts';
import { open, refusal, temporaryFolder, textFile } from './helpers.ts';

const folder = temporaryFolder();
const rows = 40;
const time = (row: number): number => row * 0.05;
const volt = (row: number): number => -70.5 + ((row * 7) % 32) / 8;
const range = Array.from({ length: rows }, (_, row) => row);

/** A table of times in ms and potentials in mV, written with these signs. */
const table = (separator: string, decimal = '.', end = '\n', before = '', quote = ''): string =>
  before +
  range
    .map((row) =>
      [time(row).toFixed(2), volt(row).toFixed(3)]
        .map((cell) => `${quote}${cell.replace('.', decimal)}${quote}`)
        .join(separator),
    )
    .join(end) +
  end;

const header = 'Time (ms),Voltage (mV)\n';

const utf16 = (text: string, littleEndian: boolean, mark: boolean): Uint8Array => {
  const marked = mark ? `\ufeff${text}` : text;
  const bytes = new Uint8Array(marked.length * 2);
  const view = new DataView(bytes.buffer);
  for (let index = 0; index < marked.length; index++) view.setUint16(2 * index, marked.charCodeAt(index), littleEndian);
  return bytes;
};

/** Name, content, hints: each must give the same potentials at the same times. */
const dresses: [string, string | Uint8Array, ReadingHints?][] = [
  ['comma', table(',')],
  ['semicolon', table(';')],
  ['tab', table('\t')],
  ['one blank', table(' ')],
  ['comma and blank', table(', ')],
  ['semicolon, decimal comma', table(';', ',')],
  ['tab, decimal comma', table('\t', ',')],
  ['blank, decimal comma', table(' ', ',')],
  ['comma, decimal comma in quotes', table(',', ',', '\n', '', '"')],
  ['quotes', table(',', '.', '\n', '', '"')],
  ['CRLF', table(',', '.', '\r\n')],
  ['CR alone', table(',', '.', '\r')],
  ['no line end at the end', table(',').trimEnd()],
  ['byte order mark', `\ufeff${table(',')}`],
  ['byte order mark and header', `\ufeff${header}${table(',')}`],
  ['UTF-16, little end first', utf16(header + table(','), true, true)],
  ['UTF-16, big end first', utf16(header + table(','), false, true)],
  ['UTF-16 without a mark', utf16(header + table(','), true, false)],
  ['header', table(',', '.', '\n', header)],
  ['quoted header', table(',', '.', '\n', '"Time (ms)","Voltage (mV)"\n')],
  ['header with brackets', table('\t', '.', '\n', 't [ms]\tVm [mV]\n')],
  ['header with slashes', table(';', '.', '\n', 'time/ms;potential/mV\n')],
  ['header with underscores', table(',', '.', '\n', 'time_ms,Vm_mV\n')],
  ['header of units alone', table(',', '.', '\n', 'ms,mV\n')],
  ['names over units', table('\t', '.', '\n', 'Time\tVm\nms\tmV\n')],
  ['names over units in brackets', table(',', '.', '\n', 'Time,Membrane potential\n(ms),(mV)\n')],
  ['German header, decimal comma', table(';', ',', '\r\n', 'Zeit (ms);Spannung (mV)\r\n')],
  ['comment lines', table(',', '.', '\n', '# rig A\n# 2026-03-12\nTime (ms),Voltage (mV)\n')],
  ['commented header', table(' ', '.', '\n', '% time_ms Vm_mV\n')],
  ['words above', table('\t', '.', '\n', 'Exported by hand\n\nCell\tm41\nTime (ms)\tVoltage (mV)\n')],
  ['empty lines between', table(',').replaceAll('\n', '\n\n')],
  ['empty columns at the end', table(',').replaceAll('\n', ',,,\n')],
  [
    'row numbers without a heading',
    `,Time (ms),Voltage (mV)\n${range.map((row) => `${row + 312589},${time(row).toFixed(2)},${volt(row)}`).join('\n')}\n`,
  ],
  [
    'row numbers, header one short',
    `Time (ms),Voltage (mV)\n${range.map((row) => `${row + 1},${time(row).toFixed(2)},${volt(row)}`).join('\n')}\n`,
  ],
  [
    'fixed width, blanks in front',
    range.map((row) => `${time(row).toFixed(2).padStart(9)}${volt(row).toFixed(3).padStart(12)}`).join('\n'),
  ],
  [
    'exponents, blank in front',
    range.map((row) => ` ${time(row).toExponential(17)},${volt(row).toExponential(17)}`).join('\n'),
  ],
  [
    'Fortran exponents',
    range
      .map((row) => `${time(row).toExponential(6).replace('e', 'D')} ${volt(row).toExponential(9).replace('e', 'd')}`)
      .join('\n'),
  ],
  ['plus signs', table(',').replaceAll(/^(\d)/gm, '+$1')],
  ['true minus signs', table(',').replaceAll('-', '−')],
  [
    'seconds and volts',
    `Time (s),Voltage (V)\n${range.map((row) => `${time(row) / 1000},${volt(row) / 1000}`).join('\n')}\n`,
  ],
  ['seconds and volts without a header', range.map((row) => `${time(row) / 1000}\t${volt(row) / 1000}`).join('\n')],
  [
    'microseconds',
    `Time (µs),Voltage (µV)\n${range.map((row) => `${time(row) * 1000},${volt(row) * 1000}`).join('\n')}\n`,
  ],
  [
    'time rounded to few digits',
    range.map((row) => `${(10_000 + time(row)).toPrecision(6)} ${volt(row)}`).join('\n'),
    { table: { time: { column: 1, unit: 'ms', offset: -10_000 } } },
  ],
  [
    'rate instead of times',
    range.map((row) => `${volt(row)}`).join('\r\n'),
    { table: { rate_hz: 20000, voltage: { columns: [1], unit: 'mV' } } },
  ],
  ['rate among the facts', range.map((row) => `${volt(row)}`).join('\n'), { rate_hz: 20000 }],
  ['lines to skip', `1,2\n3,4\n${table(',')}`, { table: { skip_lines: 2 } }],
  [
    'columns by heading',
    `a,b,c\n${range.map((row) => `${volt(row)},7,${time(row)}`).join('\n')}`,
    { table: { time: { column: 'c', unit: 'ms' }, voltage: { columns: ['a'], unit: 'mV' } } },
  ],
  [
    'columns by heading without its unit',
    table(',', '.', '\n', 'Time (x),Vm (y)\n'),
    { table: { time: { column: 'time', unit: 'ms' }, voltage: { columns: ['VM'], unit: 'mV' } } },
  ],
  [
    'a whole-number potential',
    range.map((row) => `${time(row)}\t${volt(row)}`).join('\n'),
    { table: { separator: 'tab', decimal: 'point' } },
  ],
];

for (const [name, content, hints] of dresses)
  test(`${name}: the same potentials at the same times`, async () => {
    const file = await open(textFile(folder, content), hints);
    expect(file.description.sweeps.length).toBe(1);
    const { voltage, current, clamp } = file.read(file.description.sweeps[0]!.key);
    expect(clamp).toBe('current');
    expect(current).toBeNull();
    expect(voltage!.rate_hz).toBeCloseTo(20000, 5);
    expect(voltage!.start_s).toBeCloseTo(0, 9);
    expect([...voltage!.samples].map((value) => value.toFixed(6))).toEqual(range.map((row) => volt(row).toFixed(6)));
    expect(file.codes.filter((code) => !['UNIT_GUESSED', 'COLUMN_GUESSED'].includes(code))).toEqual([]);
  });

test('a unit in the header is stated: nothing is guessed', async () => {
  const file = await open(textFile(folder, header + table(',')));
  expect(file.codes).toEqual([]);
  expect(file.description.sweeps[0]!.scaling).toBe('mV (header says "Voltage (mV)")');
});

test('without a header each guess is a problem that can be settled by pasting its lines', async () => {
  const file = await open(textFile(folder, table(',')));
  expect(file.codes).toEqual(['UNIT_GUESSED', 'COLUMN_GUESSED']);
  expect(file.description.problems.map(({ sidecar }) => sidecar)).toEqual([
    'table:\n  time:    { column: 1, unit: ms }',
    'table:\n  voltage: { columns: [2], unit: mV }',
  ]);
  const told: TableMapping = { time: { column: 1, unit: 'ms' }, voltage: { columns: [2], unit: 'mV' } };
  expect((await open(textFile(folder, table(',')), { table: told })).codes).toEqual([]);
});

describe('what must be asked', () => {
  const ask = (content: string, hints: ReadingHints = {}, ending = 'csv') =>
    refusal(() => open(textFile(folder, content, ending), hints));
  const column = (of: (row: number) => string): string => range.map(of).join('\n');

  test('no time base', async () => {
    const problem = await ask(column((row) => `${volt(row) / 1000}`));
    expect(problem).toMatchObject({ code: 'RATE_MISSING', weight: 'blocks' });
    expect(problem.sidecar).toMatch(/^table:\n {2}rate_hz: 20000 .*\n {2}voltage: \{ columns: \[1\], unit: mV \}/);
  });

  test('a header that names more columns than the rows have', async () => {
    const problem = await ask(`"times","current"\n${column((row) => `${volt(row)}`)}`);
    expect(problem.code).toBe('RATE_MISSING');
    expect(problem.message).toContain('names 2 columns (times, current), the rows have 1');
    const file = await open(textFile(folder, `"times","current"\n${column((row) => `${volt(row)}`)}`), {
      table: { rate_hz: 5000, current: { columns: [1], unit: 'pA' }, clamp: 'voltage' },
    });
    expect(file.codes).toEqual(['HEADER_MISMATCH']);
    expect(file.read('column 1').current!.samples[1]).toBe(volt(1));
  });

  test('times that fit two units', async () => {
    const problem = await ask(column((row) => `${row * 0.002},${volt(row)}`));
    expect(problem.code).toBe('TIME_UNIT_UNKNOWN');
  });

  test('a column that could be anything', async () => {
    const problem = await ask(column((row) => `${time(row)},${row % 5}`));
    expect(problem.code).toBe('COLUMN_MEANING_UNKNOWN');
    expect(problem.sidecar).toContain('voltage: { columns: [2], unit: mV }');
    expect(problem.sidecar).toContain('current: { columns: [2], unit: pA }');
  });

  test('a column that could be anything beside potentials: the lines name them all, and work when pasted', async () => {
    const text = column((row) => `${time(row)},${volt(row)},${volt(row)},${row % 5},${row % 7}`);
    const problem = await ask(text);
    expect(problem.code).toBe('COLUMN_MEANING_UNKNOWN');
    expect(problem.sidecar).toMatch(
      /^table:\n {2}voltage: \{ columns: \[2, 3\], unit: mV \}\n {2}current: \{ columns: \[4, 5\], unit: pA \}/,
    );
    const file = await open(textFile(folder, text), {
      table: { voltage: { columns: [2, 3], unit: 'mV' }, current: { columns: [4, 5], unit: 'pA' } },
    });
    expect(file.read('column 3').current!.samples[6]).toBe(6);
  });

  test('commas that may part columns or decimals', async () => {
    expect((await ask(column((row) => `${(row * 7) % 11},${10 + (row % 80)}`))).code).toBe('TABLE_AMBIGUOUS');
  });

  test('irregular times', async () => {
    const problem = await ask(`Time (s),V (mV)\n${column((row) => `${(row / 1000) ** 1.3},${volt(row)}`)}`);
    expect(problem.code).toBe('TIMES_IRREGULAR');
    expect(problem.message).toMatch(/row \d+/);
  });

  test('one sweep per row', async () => {
    const wide = Array.from({ length: 3 }, () => Array.from({ length: 300 }, (_, i) => volt(i)).join(',')).join('\n');
    const problem = await ask(wide);
    expect(problem.code).toBe('ROWS_OR_COLUMNS');
    expect(problem.sidecar).toContain('sweeps:  rows');
  });

  test('a column that is not there', async () => {
    const hints: ReadingHints = {
      table: { time: { column: 1, unit: 'ms' }, voltage: { columns: ['Vm2'], unit: 'mV' } },
    };
    const problem = await ask(header + table(','), hints);
    expect(problem.code).toBe('COLUMN_UNKNOWN');
    expect(problem.message).toContain('"Voltage (mV)"');
    expect((await ask(table(','), { table: { voltage: { columns: [7], unit: 'mV' } } })).code).toBe('COLUMN_UNKNOWN');
  });

  test('two potentials and three currents', async () => {
    const hints: ReadingHints = {
      table: { rate_hz: 1000, voltage: { columns: [1, 2], unit: 'mV' }, current: { columns: [3, 4, 5], unit: 'pA' } },
    };
    expect(
      (
        await ask(
          column((row) => `${row},${row},${row},${row},${row}`),
          hints,
        )
      ).code,
    ).toBe('COLUMNS_UNEQUAL');
  });

  test('a current whose unit nobody states, alone', async () => {
    const problem = await ask(`time (ms),current\n${column((row) => `${time(row)},${row % 7}`)}`);
    expect(problem.code).toBe('UNIT_UNKNOWN');
    expect(problem.sidecar).toContain('current: { columns: [2], unit: pA }');
  });
});

describe('what is no recording', () => {
  const cases: [string, string][] = [
    [
      'a licence',
      `Licence of things\n\nCopyright (c) 2017, someone.\n${'All rights are as they are, and so on.\n'.repeat(20)}`,
    ],
    [
      'a lab sheet',
      `Pre-drug,Trial,T_Range,,Cm,Ra\n${'spont,2,"[12, 22]",,72.2,65.0\nproto_B,,,,,\n,,,,,\n'.repeat(12)}`,
    ],
    [
      'a list of results',
      `cell,drug,MP,APD90\n${Array.from({ length: 40 }, (_, i) => `c${i},none,${-50 - i},${i % 3 ? 120 + i : ''}`).join('\n')}`,
    ],
    [
      'a list of results in numbers',
      `cell,rheobase,Ra\n${Array.from({ length: 60 }, (_, i) => `${(i * 7) % 60},${50 + ((i * 3) % 11)},${10 + (i % 4)}`).join('\n')}`,
    ],
    ['a short table', 'Time (s),Voltage (mV)\n0,-70\n0.1,-71\n0.2,-70\n'],
    ['a bench sheet with clock times', 'dish;cell;time;pipette MOhm\nd1;1;13:40;2,4\nd1;2;14:16;2,6\nd2;1;14:55;2,5\n'],
    ['times alone', `"time"\n${range.map((row) => (row * 2e-4).toExponential(18)).join('\n')}\n`],
    ['only comments', '# nothing\n# here\n'],
    ['only empty lines', '\n\n\r\n'],
  ];
  for (const [name, content] of cases)
    test(name, async () => {
      const problem = await refusal(() => open(textFile(folder, content)));
      expect(problem.code).toBe('NOT_A_RECORDING');
      expect(problem.message.length).toBeGreaterThan(20);
      expect(problem.message).not.toMatch(/NaN|undefined|\[object/);
    });

  test('an empty file, and one of bytes', async () => {
    expect((await refusal(() => open(textFile(folder, '')))).code).toBe('FILE_EMPTY');
    expect((await refusal(() => open(textFile(folder, new Uint8Array(5000))))).code).toBe('NOT_TEXT');
    expect((await refusal(() => open(textFile(folder, Uint8Array.of(1, 0, 0, 7, 0, 0, 0, 65, 66))))).code).toBe(
      'NOT_TEXT',
    );
  });
});

/** Numbers as programs write them: short decimals, full doubles, tiny and huge ones. */
const written = fc.oneof(
  fc.integer({ min: -99_999_999, max: 99_999_999 }).map((value) => value / 1000),
  fc.double({ noNaN: true, noDefaultInfinity: true }),
  fc.double({ noNaN: true, noDefaultInfinity: true, min: -200, max: 200 }),
);

const dialect = fc.record({
  separator: fc.constantFrom(',' as const, ';' as const, 'tab' as const, 'space' as const),
  decimal: fc.constantFrom('point' as const, 'comma' as const),
  quoted: fc.boolean(),
  end: fc.constantFrom('\n', '\r\n', '\r'),
  exponent: fc.boolean(),
  padded: fc.boolean(),
  mark: fc.boolean(),
  finalEnd: fc.boolean(),
});

test('any matrix, written in any way and read with the way stated, is the same to the last bit', async () => {
  await fc.assert(
    fc.asyncProperty(
      fc
        .integer({ min: 1, max: 5 })
        .chain((width) =>
          fc.array(fc.array(written, { minLength: width, maxLength: width }), { minLength: 2, maxLength: 30 }),
        ),
      dialect,
      async (matrix, { separator, decimal, quoted, end, exponent, padded, mark, finalEnd }) => {
        const sign = { ',': ',', ';': ';', tab: '\t', space: ' ' }[separator];
        const mustQuote = quoted || sign === (decimal === 'comma' ? ',' : '.');
        const cell = (value: number): string => {
          const text = (exponent ? value.toExponential() : String(value)).replace('.', decimal === 'comma' ? ',' : '.');
          return `${padded ? '  ' : ''}${mustQuote ? `"${text}"` : text}`;
        };
        const content =
          (mark ? '\ufeff' : '') + matrix.map((row) => row.map(cell).join(sign)).join(end) + (finalEnd ? end : '');
        const columns = matrix[0]!.map((_, column) => column + 1);
        const file = await open(textFile(folder, content, 'txt'), {
          table: { header: false, separator, decimal, rate_hz: 1000, voltage: { columns, unit: 'mV' } },
        });
        const read = columns.map((column) => [...file.read(`column ${column}`).voltage!.samples]);
        expect(read).toEqual(columns.map((column) => matrix.map((row) => row[column - 1]! || 0)));
      },
    ),
    { seed: 20260312, numRuns: 150 },
  );
});

test('a matrix of times and potentials is found out whatever its separator and decimal sign', async () => {
  await fc.assert(
    fc.asyncProperty(
      fc.array(fc.integer({ min: -120_000, max: -20_001 }), { minLength: 25, maxLength: 60 }),
      fc.constantFrom(',', ';', '\t', ' '),
      fc.constantFrom('.', ','),
      fc.constantFrom('\n', '\r\n', '\r'),
      async (values, separator, decimal, end) => {
        fc.pre(!(separator === ',' && decimal === ','));
        const content = values
          .map((value, row) =>
            [(row * 0.05).toFixed(3), (value / 1000).toFixed(3)].join(separator).replaceAll('.', decimal),
          )
          .join(end);
        const file = await open(textFile(folder, content, 'dat'));
        const { voltage } = file.read(file.description.sweeps[0]!.key);
        expect([...voltage!.samples]).toEqual(values.map((value) => value / 1000));
        expect(voltage!.rate_hz).toBe(20000);
      },
    ),
    { seed: 41, numRuns: 80 },
  );
});
