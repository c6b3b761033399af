/** What a table holds: sweeps in columns, rows or runs, currents, clamps, stated stimuli, holes. */
import { describe, expect, test } from 'vitest';
import type { TableMapping } from '../../pipeline/formats/types.ts';
import { open, refusal, temporaryFolder, textFile } from './helpers.ts';

const folder = temporaryFolder();
const rows = 60;
const range = Array.from({ length: rows }, (_, row) => row);
const ms = (row: number): number => row / 20;
const mv = (row: number, sweep = 0): number => -70 + ((row * 5 + sweep * 3) % 17) / 4;
const pa = (row: number, sweep = 0): number => (row >= 20 && row < 40 ? (sweep - 1) * 50 : 0);
const lines = (of: (row: number) => (number | string)[]): string =>
  `${range.map((row) => of(row).join(',')).join('\n')}\n`;

describe('sweeps in columns', () => {
  const content = `Time (ms),Vm 1 (mV),Vm 2 (mV),Vm 3 (mV),I 1 (nA),I 2 (nA),I 3 (nA)\n${lines((row) => [
    ms(row),
    ...[0, 1, 2].map((sweep) => mv(row, sweep)),
    ...[0, 1, 2].map((sweep) => pa(row, sweep) / 1000),
  ])}`;

  test('each potential with its current, numbered as headed', async () => {
    const file = await open(textFile(folder, content), { clamp: 'current' });
    expect(file.codes).toEqual([]);
    expect(file.description.format_label).toBe('text, 7 columns, comma');
    expect(file.description.sweeps.map(({ key, source_sweep }) => [key, source_sweep])).toEqual([
      ['column 2', 1],
      ['column 3', 2],
      ['column 4', 3],
    ]);
    for (const [sweep, { key }] of file.description.sweeps.entries()) {
      const { voltage, current } = file.read(key);
      expect([...voltage!.samples]).toEqual(range.map((row) => mv(row, sweep)));
      expect([...current!.samples].map((value) => Math.round(value * 1e6) / 1e6 + 0)).toEqual(
        range.map((row) => pa(row, sweep)),
      );
      expect(voltage!.rate_hz).toBe(20000);
    }
  });

  test('one current for all potentials', async () => {
    const shared = `Time (ms),A (mV),B (mV),Stimulus (pA)\n${lines((row) => [ms(row), mv(row, 0), mv(row, 1), pa(row, 2)])}`;
    const file = await open(textFile(folder, shared), { clamp: 'current' });
    for (const { key } of file.description.sweeps)
      expect([...file.read(key).current!.samples]).toEqual(range.map((row) => pa(row, 2)));
    expect(file.description.sweeps.map(({ series }) => series)).toEqual(['A (mV)', 'B (mV)']);
  });

  test('headings that name the stimulus of each column are labels, not units', async () => {
    const labelled = `Time (ms),-50 pA,0 pA,50 pA\n${lines((row) => [ms(row), mv(row, 0), mv(row, 1), mv(row, 2)])}`;
    const file = await open(textFile(folder, labelled));
    expect(file.description.sweeps.map(({ labelled_amplitude }) => labelled_amplitude)).toEqual([-50, 0, 50]);
    expect([...file.read('column 3').voltage!.samples]).toEqual(range.map((row) => mv(row, 1)));
    expect(file.codes).toContain('COLUMN_GUESSED');
  });

  test('columns that nothing is read from are named', async () => {
    const extra = `Time (ms),Voltage (mV),Temperature\n${lines((row) => [ms(row), mv(row), 33])}`;
    const file = await open(textFile(folder, extra));
    expect(file.codes).toEqual(['COLUMNS_UNUSED']);
    expect(file.problem('COLUMNS_UNUSED').message).toContain('"Temperature"');
  });

  test('a heading whose name and unit disagree', async () => {
    const odd = `Time (ms),Voltage (pA),Current (mV)\n${lines((row) => [ms(row), pa(row, 2), mv(row)])}`;
    const file = await open(textFile(folder, odd), { clamp: 'current' });
    expect(file.codes).toEqual(['HEADER_CONTRADICTS', 'HEADER_CONTRADICTS']);
    expect([...file.read('column 3').voltage!.samples]).toEqual(range.map((row) => mv(row)));
  });
});

describe('sweeps in rows', () => {
  const content = [0, 1, 2].map((sweep) => range.map((row) => mv(row, sweep)).join(' ')).join('\n');
  const mapping: TableMapping = {
    sweeps: 'rows',
    rate_hz: 20000,
    voltage: { columns: [1], unit: 'mV' },
    clamp: 'current',
  };

  test('a line a sweep', async () => {
    const file = await open(textFile(folder, content, 'txt'), { table: mapping });
    expect(file.codes).toEqual([]);
    expect(file.description.sweeps.map(({ key, samples }) => [key, samples])).toEqual([
      ['line 1', rows],
      ['line 2', rows],
      ['line 3', rows],
    ]);
    for (const [sweep, { key }] of file.description.sweeps.entries())
      expect([...file.read(key).voltage!.samples]).toEqual(range.map((row) => mv(row, sweep)));
  });

  test('from a column on, to a column, potential and current in one line', async () => {
    const both = [0, 1]
      .map((sweep) => ['x', ...range.map((row) => mv(row, sweep)), ...range.map((row) => pa(row, sweep))].join(','))
      .join('\n');
    const file = await open(textFile(folder, both), {
      table: {
        ...mapping,
        voltage: { columns: [2, rows + 1], unit: 'mV' },
        current: { columns: [rows + 2], unit: 'pA' },
      },
    });
    const { voltage, current } = file.read('line 2');
    expect([...voltage!.samples]).toEqual(range.map((row) => mv(row, 1)));
    expect([...current!.samples]).toEqual(range.map((row) => pa(row, 1)));
  });

  test('a row of times, rows of unequal length', async () => {
    const { rate_hz: _, ...untimed } = mapping;
    const timed = `${range.map((row) => ms(row)).join(',')}\n${range.map((row) => mv(row)).join(',')}\n${range
      .slice(0, 41)
      .map((row) => mv(row, 1))
      .join(',')}\n`;
    const file = await open(textFile(folder, timed), { table: { ...untimed, time: { column: 1, unit: 'ms' } } });
    expect(file.description.sweeps.map(({ samples, rate_hz }) => [samples, rate_hz])).toEqual([
      [60, 20000],
      [41, 20000],
    ]);
    expect(file.codes).toEqual(['RAGGED_ROWS']);
  });
});

describe('one sweep after another', () => {
  test('times that start again begin a new sweep', async () => {
    const content = `Time (ms),Vm (mV)\n${[0, 1, 2].map((sweep) => lines((row) => [ms(row), mv(row, sweep)])).join('')}`;
    const file = await open(textFile(folder, content));
    expect(file.codes).toEqual(['TIME_RESTARTS']);
    expect(file.description.sweeps.map(({ key }) => key)).toEqual([
      'column 2 run 1',
      'column 2 run 2',
      'column 2 run 3',
    ]);
    for (const sweep of [0, 1, 2]) {
      const { voltage } = file.read(`column 2 run ${sweep + 1}`);
      expect([...voltage!.samples]).toEqual(range.map((row) => mv(row, sweep)));
      expect(voltage!.start_s).toBe(0);
    }
  });

  test('a single time that falls back is no sweep', async () => {
    const content = `Time (ms),Vm (mV)\n${lines((row) => [ms(row === 30 ? 2 : row), mv(row)])}`;
    const problem = await refusal(() => open(textFile(folder, content)));
    expect(problem.code).toBe('TIMES_IRREGULAR');
    expect(problem.message).toMatch(/at row 3[12] /);
  });
});

describe('times', () => {
  const withTimes = (time: (row: number) => number | string): string =>
    `Time (s),Vm (mV)\n${lines((row) => [time(row), mv(row)])}`;

  test('below zero: the file keeps its own zero', async () => {
    const file = await open(
      textFile(
        folder,
        withTimes((row) => (row - 20) / 10000),
      ),
    );
    const { voltage } = file.read('column 2');
    expect(voltage!.start_s).toBeCloseTo(-0.002, 12);
    expect(voltage!.rate_hz).toBe(10000);
    const moved = await open(
      textFile(
        folder,
        withTimes((row) => (row - 20) / 10000),
      ),
      {
        table: { time: { column: 1, unit: 's', offset: 0.002 } },
      },
    );
    expect(moved.read('column 2').voltage!.start_s).toBeCloseTo(0, 12);
  });

  test('left out: the samples are missing, in their places', async () => {
    const kept = range.filter((row) => row !== 11 && row !== 12);
    const content = `Time (s),Vm (mV)\n${kept.map((row) => `${row / 10000},${mv(row)}`).join('\n')}`;
    const file = await open(textFile(folder, content));
    expect(file.codes).toEqual(['TIME_GAPS']);
    const { samples } = file.read('column 2').voltage!;
    expect(samples.length).toBe(rows);
    expect([...samples.keys()].filter((index) => Number.isNaN(samples[index]!))).toEqual([11, 12]);
    expect(samples[59]).toBe(mv(59));
    expect(file.description.sweeps[0]!.samples).toBe(rows);
  });

  test('unreadable: taken to be in their places', async () => {
    const file = await open(
      textFile(
        folder,
        withTimes((row) => (row === 7 ? '?' : row / 10000)),
      ),
    );
    expect(file.codes).toEqual(['CELLS_UNREADABLE']);
    expect([...file.read('column 2').voltage!.samples]).toEqual(range.map((row) => mv(row)));
  });

  test('with the noise of floating point, and rounded to a few digits', async () => {
    const noisy = await open(
      textFile(
        folder,
        withTimes((row) => row * 0.1 * 0.001 + 4e-13),
      ),
    );
    expect(noisy.read('column 2').voltage!.rate_hz).toBe(10000);
    const rounded = await open(
      textFile(
        folder,
        withTimes((row) => (1.2 + row / 20000).toPrecision(5)),
      ),
    );
    expect(rounded.read('column 2').voltage!.rate_hz).toBeCloseTo(20000, -2);
    expect(rounded.codes).toEqual([]);
  });
});

describe('currents', () => {
  const perCapacitance = `Time (s),Voltage (V),Current (pA/pF)\n${lines((row) => [row / 10000, mv(row) / 1000, pa(row, 2) / 25])}`;

  test('per capacitance, with the capacitance', async () => {
    for (const hints of [{ capacitance_pf: 25 }, { table: { capacitance_pf: 25 } as TableMapping }]) {
      const file = await open(textFile(folder, perCapacitance), { ...hints, clamp: 'current' });
      expect(file.codes).toEqual([]);
      expect([...file.read('column 2').current!.samples]).toEqual(range.map((row) => pa(row, 2)));
    }
  });

  test('per capacitance, without: left out and asked for', async () => {
    const file = await open(textFile(folder, perCapacitance), { clamp: 'current' });
    expect(file.problem('CAPACITANCE_MISSING')).toMatchObject({ weight: 'warns' });
    expect(file.problem('CAPACITANCE_MISSING').sidecar).toContain('capacitance_pf');
    expect(file.description.sweeps[0]).toMatchObject({ has_voltage: true, has_current: false });
    expect(file.read('column 2').current).toBeNull();
  });

  test('nothing but zeros are zero in any unit', async () => {
    const zeros = `Time (s),Voltage (V),Current (pA/pF)\n${lines((row) => [row / 10000, mv(row) / 1000, '-0.0'])}`;
    const file = await open(textFile(folder, zeros), { clamp: 'current' });
    expect(file.codes).toEqual([]);
    expect(file.read('column 2').current!.samples.every((value) => value === 0)).toBe(true);
  });

  test('a unit nobody states: the potential is read, the current asked for', async () => {
    const content = `time (s),voltage (mV),current\n${lines((row) => [row / 10000, mv(row), pa(row, 2)])}`;
    const file = await open(textFile(folder, content), { clamp: 'current' });
    expect(file.codes).toEqual(['UNIT_UNKNOWN']);
    expect(file.read('column 2').current).toBeNull();
  });
});

describe('clamp', () => {
  const both = (v: (row: number) => number, i: (row: number) => number): string =>
    `Time (s),Voltage (mV),Current (pA)\n${lines((row) => [row / 10000, v(row), i(row)])}`;
  const held = (row: number): number => (row >= 20 && row < 40 ? -60 : -80);

  test('the channel that holds its levels is the command; a guess is said', async () => {
    const current = await open(
      textFile(
        folder,
        both(
          (row) => mv(row),
          (row) => pa(row, 2),
        ),
      ),
    );
    expect(current.description.sweeps[0]!.clamp).toBe('current');
    expect(current.codes).toEqual(['CLAMP_GUESSED']);
    const voltage = await open(
      textFile(
        folder,
        both(held, (row) => mv(row)),
      ),
    );
    expect(voltage.description.sweeps[0]!.clamp).toBe('voltage');
    expect(voltage.problem('CLAMP_GUESSED').sidecar).toBe('table:\n  clamp: voltage');
  });

  test('a statement ends the guessing', async () => {
    const file = await open(
      textFile(
        folder,
        both(held, (row) => mv(row)),
      ),
      { table: { clamp: 'current' } },
    );
    expect(file.description.sweeps[0]!.clamp).toBe('current');
    expect(file.codes).toEqual([]);
  });

  test('a current alone is voltage clamp', async () => {
    const content = `Time (s),Current (pA)\n${lines((row) => [row / 10000, mv(row)])}`;
    const file = await open(textFile(folder, content));
    expect(file.description.sweeps[0]).toMatchObject({ clamp: 'voltage', has_voltage: false, has_current: true });
  });
});

describe('stated stimulus', () => {
  const content = `Time (ms),a (mV),b (mV),c (mV)\n${lines((row) => [ms(row), mv(row, 0), mv(row, 1), mv(row, 2)])}`;
  const stated = async (stimulus: TableMapping['stimulus']) => {
    const file = await open(textFile(folder, content), { table: { stimulus } });
    return { file, stimuli: file.description.sweeps.map(({ key }) => file.read(key).stated_stimulus) };
  };
  const step = { kind: 'step' as const, start_s: 0.001, end_s: 0.002 };

  test('from and by', async () => {
    const { stimuli } = await stated({ ...step, from_pa: -100, by_pa: 50 });
    expect(stimuli).toEqual([-100, -50, 0].map((amplitude) => ({ ...step, pa: amplitude })));
  });

  test('a command in voltage clamp, the same in every sweep', async () => {
    const command = { kind: 'levels' as const, at_s: [0, 0.001], mv: [-70, -65] };
    const { stimuli } = await stated(command);
    expect(stimuli).toEqual([command, command, command]);
  });

  test('a list, too short and too long', async () => {
    const short = await stated({ ...step, pa: [-100, -50] });
    expect(short.stimuli).toEqual([{ ...step, pa: -100 }, { ...step, pa: -50 }, null]);
    expect(short.file.codes).toEqual(['STIMULUS_LIST_LENGTH']);
    const long = await stated({ ...step, pa: [1, 2, 3, 4] });
    expect(long.file.codes).toEqual(['STIMULUS_LIST_LENGTH']);
    expect((await stated({ ...step, pa: [1, 2, 3] })).file.codes).toEqual([]);
  });

  test('none, and nothing stated', async () => {
    expect((await stated({ kind: 'none' })).stimuli).toEqual([{ kind: 'none' }, { kind: 'none' }, { kind: 'none' }]);
    expect((await stated(undefined)).stimuli).toEqual([null, null, null]);
  });
});

describe('holes', () => {
  const text = (cell: (row: number) => string): string =>
    `Time (ms),Vm (mV)\n${range.map((row) => `${ms(row)},${cell(row)}`).join('\n')}\n`;

  test('unreadable cells are NaN, counted, and their lines named', async () => {
    const words: Record<number, string> = { 3: 'NaN', 9: '', 10: 'n/a', 20: '#NUM!', 33: 'x-70', 34: '-7O', 50: 'inf' };
    const file = await open(
      textFile(
        folder,
        text((row) => words[row] ?? String(mv(row))),
      ),
    );
    const { samples } = file.read('column 2').voltage!;
    expect([...samples.keys()].filter((index) => Number.isNaN(samples[index]!))).toEqual(
      Object.keys(words).map(Number),
    );
    expect(samples[11]).toBe(mv(11));
    const problem = file.problem('CELLS_UNREADABLE');
    expect(problem.message).toContain('7 of 120 cells');
    // The header is line 1, so that row 3 of the numbers from 0 is line 5.
    expect(problem.place).toBe('lines 5, 11, 12, 22, 35, 36, 52');
  });

  test('rows cut short or too long are counted', async () => {
    const content = `${text((row) => String(mv(row)))}3.00\n3.05,-70,9\n`;
    const file = await open(textFile(folder, content));
    expect(file.codes).toEqual(['CELLS_UNREADABLE', 'RAGGED_ROWS']);
    expect(file.problem('RAGGED_ROWS').place).toBe('lines 62, 63');
    const { samples } = file.read('column 2').voltage!;
    expect([samples.length, Number.isNaN(samples[60]!), samples[61]]).toEqual([62, true, -70]);
  });

  test('a line of words is left out where the times show what is missing', async () => {
    const content = text((row) => String(mv(row))).replace('1.5,', 'tag added here\n1.5,');
    const file = await open(textFile(folder, content));
    expect(file.codes).toEqual(['LINES_LEFT_OUT']);
    expect([...file.read('column 2').voltage!.samples]).toEqual(range.map((row) => mv(row)));
  });

  test('without times an unreadable line keeps its place', async () => {
    const content = range.map((row) => (row === 5 ? 'oops' : String(mv(row)))).join('\r\n');
    const file = await open(textFile(folder, content), {
      table: { rate_hz: 20000, voltage: { columns: [1], unit: 'mV' } },
    });
    const { samples } = file.read('column 1').voltage!;
    expect([samples.length, Number.isNaN(samples[5]!), samples[6]]).toEqual([rows, true, mv(6)]);
  });
});

test('a table longer than what is read at once', async () => {
  const many = 200_000;
  const content = `Time (s),Vm (mV)\r\n${Array.from({ length: many }, (_, row) => `${(row / 20000).toFixed(5)},${mv(row)}`).join('\r\n')}`;
  expect(content.length).toBeGreaterThan(2 * 1024 * 1024);
  const file = await open(textFile(folder, content));
  expect(file.codes).toEqual([]);
  const { samples, rate_hz } = file.read('column 2').voltage!;
  expect(rate_hz).toBe(20000);
  expect(samples.length).toBe(many);
  expect(samples.every((value, row) => value === mv(row))).toBe(true);
});
