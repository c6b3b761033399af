/** Writes sweeps as the delimited text that other programs and older rigs leave behind, each in its own dialect. */
import type { TextDialect } from './cells.ts';
import type { RecordedSweep } from './recorder.ts';

export interface TextFile {
  content: string;
  /** Lines of the sidecar's `table:` block, or null where the file says everything itself. */
  table: string[] | null;
}

const fixed = (value: number, digits: number): string => {
  const text = value.toFixed(digits);
  return /^-0\.?0*$/.test(text) ? text.slice(1) : text;
};
const comma = (text: string): string => text.replace('.', ',');

function stepStatement(sweeps: readonly RecordedSweep[]): string {
  const piece = sweeps[0]!.plan.pieces[0]!;
  const pa = sweeps.map((sweep) => sweep.plan.pieces[0]?.start ?? 0);
  return `  stimulus: { kind: step, start_s: ${piece.from_s}, end_s: ${piece.to_s}, pa: [${pa.join(', ')}] }`;
}

/**
 * @param sweeps of one length and one rate
 * @throws RangeError when lengths differ: no dialect here can hold that
 */
export function writeText(dialect: TextDialect, sweeps: readonly RecordedSweep[]): TextFile {
  const n = sweeps[0]!.voltage.length;
  if (sweeps.some((sweep) => sweep.voltage.length !== n))
    throw new RangeError('text files hold sweeps of one length, got several');
  const rate = sweeps[0]!.rate_hz;
  const mv = (sweep: RecordedSweep, k: number): number => sweep.voltage[k]! * sweep.quantum_mv;
  const pa = (sweep: RecordedSweep, k: number): number => sweep.current[k]! * sweep.quantum_pa;
  const rows: string[] = [];
  const span = (from: number, count: number): string => Array.from({ length: count }, (_, k) => from + k).join(', ');
  switch (dialect) {
    case 'comma': {
      rows.push(['time (s)', ...sweeps.map((_, k) => `V${k} (mV)`), ...sweeps.map((_, k) => `I${k} (pA)`)].join(','));
      for (let k = 0; k < n; k++)
        rows.push(
          [
            fixed(k / rate, 5),
            ...sweeps.map((sweep) => fixed(mv(sweep, k), 2)),
            ...sweeps.map((sweep) => fixed(pa(sweep, k), 1)),
          ].join(','),
        );
      return {
        content: `${rows.join('\n')}\n`,
        table: [
          "  separator: ','",
          '  time: { column: 1, unit: s }',
          `  voltage: { columns: [${span(2, sweeps.length)}], unit: mV }`,
          `  current: { columns: [${span(2 + sweeps.length, sweeps.length)}], unit: pA }`,
        ],
      };
    }
    case 'semicolon': {
      rows.push('Myocyte, paced at 1 Hz; saved from the old recorder');
      rows.push(['t', ...sweeps.map((_, k) => `beat ${k + 1}`), ...sweeps.map((_, k) => `stim ${k + 1}`)].join(';'));
      for (let k = 0; k < n; k++)
        rows.push(
          [
            comma(fixed((1000 * k) / rate, 2)),
            ...sweeps.map((sweep) => comma(fixed(mv(sweep, k), 2))),
            ...sweeps.map((sweep) => comma(fixed(pa(sweep, k) / 1000, 4))),
          ].join(';'),
        );
      return {
        content: `${rows.join('\r\n')}\r\n`,
        table: [
          '  skip_lines: 1',
          '  header: true',
          "  separator: ';'",
          '  decimal: comma',
          '  time: { column: t, unit: ms }',
          `  voltage: { columns: [${sweeps.map((_, k) => `beat ${k + 1}`).join(', ')}], unit: mV }`,
          `  current: { columns: [${sweeps.map((_, k) => `stim ${k + 1}`).join(', ')}], unit: nA }`,
        ],
      };
    }
    case 'rows': {
      for (const sweep of sweeps) rows.push(Array.from(sweep.voltage, (_, k) => fixed(mv(sweep, k), 2)).join('\t'));
      return {
        content: `${rows.join('\n')}\n`,
        table: [
          '  header: false',
          '  separator: tab',
          '  sweeps: rows',
          `  rate_hz: ${rate}`,
          '  voltage: { columns: [1], unit: mV }',
          stepStatement(sweeps),
        ],
      };
    }
    case 'bare': {
      for (let k = 0; k < n; k++)
        rows.push(sweeps.map((sweep) => `  ${(mv(sweep, k) * 1e-3).toExponential(5)}`).join(''));
      return {
        content: `${rows.join('\n')}\n`,
        table: [
          '  header: false',
          '  separator: space',
          `  rate_hz: ${rate}`,
          `  voltage: { columns: [${span(1, sweeps.length)}], unit: V }`,
          stepStatement(sweeps),
        ],
      };
    }
    case 'one-column': {
      for (let k = 0; k < n; k++) rows.push(fixed(mv(sweeps[0]!, k) * 1e-3, 6));
      return {
        content: `${rows.join('\r\n')}\r\n`,
        table: [
          '  header: false',
          '  sweeps: one',
          `  rate_hz: ${rate}`,
          '  voltage: { columns: [1], unit: V }',
          '  stimulus: { kind: none }',
        ],
      };
    }
    case 'spaces': {
      for (let k = 0; k < n; k++)
        rows.push(`${fixed((1000 * (k + 1)) / rate, 2)} ${sweeps.map((sweep) => fixed(mv(sweep, k), 3)).join(' ')}`);
      return {
        content: `${rows.join('\n')}\n`,
        table: [
          '  header: false',
          '  separator: space',
          '  time: { column: 1, unit: ms }',
          `  voltage: { columns: [${span(2, sweeps.length)}], unit: mV }`,
          stepStatement(sweeps),
        ],
      };
    }
  }
}
