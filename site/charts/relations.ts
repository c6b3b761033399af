/** Deflection on current and rate on current: points, and the line whose slope is the reported number. */
import type { SweepRow } from '../../pipeline/ledger/types.ts';
import { quantity } from '../../pipeline/measure/quantities.ts';
import type { ConditionMeasure } from '../../pipeline/measure/types.ts';
import { counted, inFull, knownHalfWidth } from '../format.ts';
import {
  type Chart,
  domainOf,
  element,
  type Frame,
  halfWidthRules,
  halfWidthWords,
  intervalEnds,
  line,
  picture,
  xAxis,
  xScale,
  yAxis,
  yScale,
} from './frame.ts';

const frame: Frame = { width: 460, height: 320, margins: { top: 26, right: 14, bottom: 40, left: 50 } };
const right = frame.width - frame.margins.right;
const bottom = frame.height - frame.margins.bottom;

/** Conditions are told apart by the mark's shape as well as by ink; the first is the cell's own. */
const shapeOf = (index: number, x: number, y: number): string => {
  if (index === 0) return element('circle', { cx: x, cy: y, r: 3.2, class: 'point' });
  if (index === 1) return element('rect', { x: x - 3, y: y - 3, width: 6, height: 6, class: 'point other' });
  return element('path', { d: `M${x - 4},${y + 3}L${x + 4},${y + 3}L${x},${y - 4}Z`, class: 'point other' });
};

interface Point {
  pa: number;
  value: number;
  u95?: number | undefined;
}

interface Group {
  condition: string;
  points: Point[];
}

const plotted = (points: readonly Point[]) => points.map(({ pa, value, u95 }) => ({ at: pa, value, u95 }));

function relation(
  groups: Group[],
  id: string,
  lineThrough: { slope: number; at: Point } | null,
  alt: string,
): Chart | null {
  const { label: name, unit } = quantity(id);
  const all = groups.flatMap((group) => group.points);
  const xDomain = domainOf(
    all.map((point) => point.pa),
    [0],
  );
  const yDomain = domainOf(intervalEnds(plotted(all)), [0]);
  if (!xDomain || !yDomain || all.length < 2) return null;
  const x = xScale(frame, xDomain);
  const y = yScale(frame, yDomain);
  const rules = halfWidthRules(plotted(all), x, y, 3.2);
  const parts = [
    yAxis(y, frame.margins.left, name, unit, right),
    line(x(0), frame.margins.top, x(0), bottom, 'grid zero'),
    lineThrough ? fitLine(lineThrough, x, y, xDomain, yDomain) : '',
    rules.svg,
    ...groups.flatMap((group, index) => group.points.map((point) => shapeOf(index, x(point.pa), y(point.value)))),
    xAxis(x, bottom, 'Injected current', 'pA', 5),
  ];
  const widths = halfWidthWords(id, plotted(all));
  const words = widths === '' ? alt : `${alt.replace(/\.$/, '')}; ${widths}.`;
  return { ...picture(frame, words, parts.join('')), ruled: rules.ruled };
}

/** The part of a line that lies inside the plot. */
function fitLine(
  fit: { slope: number; at: Point },
  x: (value: number) => number,
  y: (value: number) => number,
  [x0, x1]: [number, number],
  [y0, y1]: [number, number],
): string {
  const valueAt = (pa: number): number => fit.at.value + fit.slope * (pa - fit.at.pa);
  const paAt = (value: number): number => fit.at.pa + (value - fit.at.value) / fit.slope;
  if (fit.slope === 0 || !Number.isFinite(fit.slope)) return '';
  const ends = [paAt(y0), paAt(y1)].sort((a, b) => a - b) as [number, number];
  const from = Math.max(x0, ends[0]);
  const to = Math.min(x1, ends[1]);
  return to > from ? line(x(from), y(valueAt(from)), x(to), y(valueAt(to)), 'fit') : '';
}

const meanPoint = (points: Point[]): Point => ({
  pa: points.reduce((sum, point) => sum + point.pa, 0) / points.length,
  value: points.reduce((sum, point) => sum + point.value, 0) / points.length,
});

/** The half-width that a sweep's own number carries. */
const halfWidthOf = (sweeps: readonly SweepRow[], sweep: number, id: string): number | undefined =>
  knownHalfWidth(id, sweeps.find((one) => one.sweep === sweep)?.readings[id]?.u95);

/** 'slope 77 ± 3 MΩ' of a cell's number; '' where it has none. */
function reported(condition: ConditionMeasure | undefined, id: string, words: string): string {
  const reading = condition?.readings[id];
  return reading?.value == null ? '' : `${words} ${inFull(id, reading.value, reading.u95)}`;
}

/**
 * Steady deflection on injected current; the line has the slope of the reported input resistance.
 * @param sweeps where the half-widths of the points are looked up
 */
export function viChart(conditions: readonly ConditionMeasure[], sweeps: readonly SweepRow[] = []): Chart | null {
  const id = 'steady_deflection_mv';
  const groups = conditions.map((one) => ({
    condition: one.condition,
    points: one.vi.map(({ pa, mv, sweep }) => ({ pa, value: mv, u95: halfWidthOf(sweeps, sweep, id) })),
  }));
  const resistance = conditions[0]?.readings['input_resistance_mohm']?.value ?? null;
  const fitted = groups[0]?.points.filter((point) => point.pa <= 0) ?? [];
  const through =
    resistance === null || fitted.length === 0
      ? null
      : { slope: resistance / 1000, at: meanPoint([...fitted, { pa: 0, value: 0 }]) };
  const n = groups.reduce((sum, group) => sum + group.points.length, 0);
  const told = [
    `Steady deflection on injected current, ${counted(n, 'step')}`,
    reported(conditions[0], 'input_resistance_mohm', 'slope'),
  ];
  return relation(groups, id, through, `${told.filter(Boolean).join('; ')}.`);
}

/**
 * Mean rate on injected current, with the gain's line near rheobase.
 * @param sweeps where the half-widths of the points are looked up
 */
export function fiChart(conditions: readonly ConditionMeasure[], sweeps: readonly SweepRow[] = []): Chart | null {
  const id = 'mean_rate_hz';
  const groups = conditions.map((one) => ({
    condition: one.condition,
    points: one.fi.map(({ pa, hz, sweep }) => ({ pa, value: hz, u95: halfWidthOf(sweeps, sweep, id) })),
  }));
  const gain = conditions[0]?.readings['rate_gain_hz_per_na']?.value ?? null;
  const most = Math.max(0, ...(groups[0]?.points.map((point) => point.value) ?? []));
  const near = groups[0]?.points.filter((point) => point.value > 0 && point.value <= most / 2 + 1e-9) ?? [];
  const through = gain === null || near.length === 0 ? null : { slope: gain / 1000, at: meanPoint(near) };
  const n = groups.reduce((sum, group) => sum + group.points.length, 0);
  const told = [
    `Mean rate on injected current, ${counted(n, 'step')}`,
    reported(conditions[0], 'rheobase_pa', 'rheobase'),
    reported(conditions[0], 'rate_gain_hz_per_na', 'gain'),
  ];
  return relation(groups, id, through, `${told.filter(Boolean).join('; ')}.`);
}
