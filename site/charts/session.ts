/** Quality over the session: one small strip a quantity, sweeps or minutes along the foot, the usable stretch shaded. */
import type { UsableStretch } from '../../pipeline/judge/types.ts';
import type { SweepRow } from '../../pipeline/ledger/types.ts';
import { quantity } from '../../pipeline/measure/quantities.ts';
import { counted, inFull, knownHalfWidth } from '../format.ts';
import {
  type Chart,
  domainOf,
  element,
  type Frame,
  halfWidthRules,
  halfWidthWords,
  intervalEnds,
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
  u95?: number | undefined;
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
    const reading = sweep.readings[id];
    if (reading?.value != null)
      return [{ sweep, at: axis.at(sweep), value: reading.value, u95: knownHalfWidth(id, reading.u95) }];
    const spike = sweep.spikes[0];
    const value = spike?.values[id] ?? null;
    return value === null ? [] : [{ sweep, at: axis.at(sweep), value, u95: knownHalfWidth(id, spike?.u95?.[id]) }];
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
  const tight = stretched(domainOf(values, [], 0.12)!, domainOf(intervalEnds(points), [], 0.04)!);
  // A strip never magnifies the last decimal into a drama.
  const least = 10 ** -entry.decimals * 4;
  const middle = (tight[0] + tight[1]) / 2;
  const yDomain: [number, number] = tight[1] - tight[0] < least ? [middle - least / 2, middle + least / 2] : tight;
  const x = xScale(frame, xDomain);
  const y = yScale(frame, yDomain);
  const right = frame.width - frame.margins.right;
  const bottom = frame.height - frame.margins.bottom;
  const rules = halfWidthRules(points, x, y, 2.4);
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
    rules.svg,
    ...points.map((point) => element('circle', { cx: x(point.at), cy: y(point.value), r: 2.4, class: 'point' })),
    input.withAxis ? xAxis(x, bottom, axis.name, axis.unit, 6) : '',
  ];
  const told = (point: SessionPoint): string => inFull(input.quantity, point.value, point.u95);
  const byValue = [...points].sort((a, b) => a.value - b.value);
  const alt = `${entry.label} over ${counted(points.length, 'sweep')}: from ${told(points[0]!)} to ${told(points.at(-1)!)}, lowest ${told(byValue[0]!)}, highest ${told(byValue.at(-1)!)}${prefixed('; ', halfWidthWords(input.quantity, points))}.`;
  return { ...picture(frame, alt, parts.join('')), ruled: rules.ruled };
}

const prefixed = (prefix: string, text: string): string => (text === '' ? '' : prefix + text);

/** Room for the intervals, at most the values' own span on either side: one poor sweep must not flatten the others. */
function stretched(values: [number, number], intervals: [number, number]): [number, number] {
  const room = values[1] - values[0];
  return [
    Math.max(values[0] - room, Math.min(values[0], intervals[0])),
    Math.min(values[1] + room, Math.max(values[1], intervals[1])),
  ];
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
    (input.withAxis && to - from > 84
      ? label(from + 3, frame.height - frame.margins.bottom - 4, 'usable stretch', 'usable-name')
      : '')
  );
}

/** Where one condition gives way to the next: half way between the two sweeps. */
function conditionChanges(sweeps: readonly SweepRow[], at: (sweep: SweepRow) => number): number[] {
  return sweeps.flatMap((sweep, index) => {
    const before = sweeps[index - 1];
    return before && before.condition !== sweep.condition ? [(at(before) + at(sweep)) / 2] : [];
  });
}
