import { describe, expect, test } from 'vitest';
import { parse } from 'yaml';
import { oneTable } from '../../pipeline/command/sidecar-lines.ts';

describe('the lines of several problems as one block', () => {
  test('no problem offers lines', () => expect(oneTable([])).toBe('table:'));
  test('different keys stand under one table', () =>
    expect(parse(oneTable(['table:\n  clamp: current', 'table:\n  time: { column: 1, unit: s }\n'])!)).toEqual({
      table: { clamp: 'current', time: { column: 1, unit: 's' } },
    }));
  test('equal statements stand once, columns of one unit together and in order', () =>
    expect(
      parse(
        oneTable([
          'table:\n  clamp: current\n  voltage: { columns: [3], unit: mV }',
          'table:\n  clamp: current\n  voltage: { columns: [2], unit: mV }',
        ])!,
      ),
    ).toEqual({ table: { clamp: 'current', voltage: { columns: [2, 3], unit: 'mV' } } }));
  test('statements that disagree, and lines that are no table, are left apart', () => {
    expect(oneTable(['table:\n  clamp: current', 'table:\n  clamp: voltage'])).toBeNull();
    expect(
      oneTable(['table:\n  voltage: { columns: [2], unit: mV }', 'table:\n  voltage: { columns: [2], unit: V }']),
    ).toBeNull();
    expect(oneTable(['facts: { cell: a }', 'table:\n  clamp: current'])).toBeNull();
  });
});
