/** Quality over the session: one small strip a quantity, sweeps or minutes along the foot, the usable stretch shaded. */
import type { UsableStretch } from '../../pipeline/judge/types.ts';
import type { SweepRow } from '../../pipeline/ledger/types.ts';
import { quantity } from '../../pipeline/measure/quantities.ts';
import { counted, withUnit } from '../format.ts';
import {
  type Chart,
  domainOf,
  element,
  type Frame,
  label,
  line,
  path,
  picture,
  xAxis,
  xScale,
  yAxis,
  yScale,
} from './frame.ts';

export interface SessionInput {
  sweeps: readonly SweepRow[];
  /** Quantity id; of the sweep, or of its first spike. */
  quantity: string;
  usable: UsableStretch | null;
  /** Draw the axis with its name: for the last strip of a column. */
  withAxis: boolean;
}

export interface SessionPoint {
  sweep: SweepRow;
  at: number;
  value: number;
}

/** Minutes since the first sweep where every sweep has a time, else sweep numbers. */
export function sessionAxis(sweeps: readonly SweepRow[]): {
  name: string;
  unit: string;
  at: (sweep: SweepRow) => number;
} {
  const timed =
    sweeps.length > 0 &&
    sweeps.every((sweep) => sweep.since_start_s !== null) &&
    sweeps.some((sweep) => sweep.since_start_s! > 0);
  return timed
    ? { name: 'Time since the first sweep', unit: 'min', at: (sweep) => sweep.since_start_s! / 60 }
    : { name: 'Sweep', unit: '', at: (sweep) => sweep.sweep };
}

export function sessionPoints(sweeps: readonly SweepRow[], id: string): SessionPoint[] {
  const axis = sessionAxis(sweeps);
  return sweeps.flatMap((sweep) => {
    const value = sweep.readings[id]?.value ?? sweep.spikes[0]?.values[id] ?? null;
    return value === null ? [] : [{ sweep, at: axis.at(sweep), value }];
  });
}

/** @returns null where fewer than two sweeps have the quantity */
export function sessionStrip(input: SessionInput): Chart | null {
  const points = sessionPoints(input.sweeps, input.quantity);
  if (points.length < 2) return null;
  const entry = quantity(input.quantity);
  const axis = sessionAxis(input.sweeps);
  const frame: Frame = {
    width: 360,
    height: input.withAxis ? 142 : 112,
    margins: { top: 24, right: 12, bottom: input.withAxis ? 38 : 8, left: 50 },
  };
  const xDomain = domainOf(input.sweeps.map(axis.at), [], 0.03)!;
  const values = points.map((point) => point.value);
  const tight = domainOf(values, [], 0.12)!;
  // A strip never magnifies the last decimal into a drama.
  const least = 10 ** -entry.decimals * 4;
  const middle = (tight[0] + tight[1]) / 2;
  const yDomain: [number, number] = tight[1] - tight[0] < least ? [middle - least / 2, middle + least / 2] : tight;
  const x = xScale(frame, xDomain);
  const y = yScale(frame, yDomain);
  const right = frame.width - frame.margins.right;
  const bottom = frame.height - frame.margins.bottom;
  const parts = [
    usableBand(input, x, frame),
    yAxis(y, frame.margins.left, entry.label, entry.unit, right, 3),
    ...conditionChanges(input.sweeps, axis.at).map((at) => line(x(at), frame.margins.top, x(at), bottom, 'change')),
    element('path', {
      d: path(
        points.map((point) => [point.at, point.value] as const),
        x,
        y,
      ),
      class: 'thread',
    }),
    ...points.map((point) => element('circle', { cx: x(point.at), cy: y(point.value), r: 2.4, class: 'point' })),
    input.withAxis ? xAxis(x, bottom, axis.name, axis.unit, 6) : '',
  ];
  const alt = `${entry.label} over ${counted(points.length, 'sweep')}: from ${withUnit(input.quantity, values[0]!)} to ${withUnit(input.quantity, values.at(-1)!)}, lowest ${withUnit(input.quantity, Math.min(...values))}, highest ${withUnit(input.quantity, Math.max(...values))}.`;
  return picture(frame, alt, parts.join(''));
}

function usableBand(input: SessionInput, x: (value: number) => number, frame: Frame): string {
  const { usable, sweeps } = input;
  if (!usable) return '';
  const axis = sessionAxis(sweeps);
  const inside = sweeps
    .filter((sweep) => sweep.sweep >= usable.from_sweep && sweep.sweep <= usable.to_sweep)
    .map(axis.at);
  if (inside.length === 0) return '';
  const from = x(Math.min(...inside)) - 4;
  const to = x(Math.max(...inside)) + 4;
  return (
    element('rect', {
      x: from,
      y: frame.margins.top,
      width: to - from,
      height: frame.height - frame.margins.top - frame.margins.bottom,
      class: 'usable',
    }) +
    (input.withAxis ? label(from + 3, frame.height - frame.margins.bottom - 4, 'usable stretch', 'usable-name') : '')
  );
}

/** Where one condition gives way to the next: half way between the two sweeps. */
function conditionChanges(sweeps: readonly SweepRow[], at: (sweep: SweepRow) => number): number[] {
  return sweeps.flatMap((sweep, index) => {
    const before = sweeps[index - 1];
    return before && before.condition !== sweep.condition ? [(at(before) + at(sweep)) / 2] : [];
  });
}
