/** All sweeps of a cell over each other, the stimulus beneath on the same time. */

import type { SweepRow } from '../../pipeline/ledger/types.ts';
import type { Envelope } from '../../pipeline/measure/types.ts';
import { counted, number } from '../format.ts';
import {
  type Chart,
  domainOf,
  element,
  type Frame,
  level,
  picture,
  type Scale,
  xAxis,
  xScale,
  yAxis,
  yScale,
} from './frame.ts';
import { coarser, envelopeLine, simplified, withGaps } from './reduce.ts';

export interface SweepsChartOptions {
  width?: number;
  height?: number;
  e_na_mv?: number | null;
  e_k_mv?: number | null;
  /** The sweep that is drawn in full ink; the others recede. */
  highlight?: number | null;
  /** Window in s from the start of the sweep; the whole sweep where absent. */
  from_s?: number | null;
  to_s?: number | null;
}

const columns = 440;
/** Fewest columns that still show where a sweep fires. */
const fewestColumns = 60;
/** What the paths of one chart may weigh, characters: noisy sweeps compress badly, and many of them lie over each other. */
const pathBudget = 48_000;

const open = (envelope: Envelope | null): Envelope | null => envelope && withGaps(envelope);

function windowed(envelope: Envelope, from: number, to: number): Envelope {
  const n = envelope.low.length;
  const width = (envelope.end_s - envelope.start_s) / n;
  if (!(width > 0)) return envelope;
  const first = Math.max(0, Math.floor((from - envelope.start_s) / width));
  const last = Math.min(n, Math.ceil((to - envelope.start_s) / width));
  return {
    start_s: envelope.start_s + first * width,
    end_s: envelope.start_s + Math.max(first, last) * width,
    low: envelope.low.slice(first, last),
    high: envelope.high.slice(first, last),
  };
}

/** Steps from point to point in tenths of a pixel, which take half the room of positions. */
function steps(points: readonly (readonly [number, number])[]): string {
  const tenth = (value: number): string => String(value / 10);
  let text = '';
  let [beforeX, beforeY] = [0, 0];
  points.forEach(([a, b], index) => {
    const [atX, atY] = [Math.round(a * 10), Math.round(b * 10)];
    const [byX, byY] = [tenth(atX - beforeX), tenth(atY - beforeY)];
    text += `${index === 0 ? 'M' : index === 1 ? 'l' : byX.startsWith('-') ? '' : ' '}${byX}${byY.startsWith('-') ? '' : ' '}${byY}`;
    [beforeX, beforeY] = [atX, atY];
  });
  return text;
}

/** @param most columns that the envelope is joined to. */
function trace(envelope: Envelope, x: Scale, y: Scale, className: string, most = columns): string {
  const reduced = coarser(envelope, most);
  const points = [...envelopeLine(reduced, Math.abs(y.invert(0) - y.invert(0.8)))].map(
    ([t, value]) => [x(t), y(value)] as [number, number],
  );
  const parts: string[] = [];
  let run: [number, number][] = [];
  const flush = (): void => {
    if (run.length > 1) parts.push(steps(simplified(run, 0.35)));
    run = [];
  };
  for (const point of points) {
    if (Number.isFinite(point[1])) run.push(point);
    else flush();
  }
  flush();
  return parts.length === 0 ? '' : element('path', { d: parts.join(''), class: className });
}

const finite = (list: readonly (number | null)[]): number[] =>
  list.filter((value): value is number => value !== null && Number.isFinite(value));

function valuesIn(envelopes: (Envelope | null)[], from: number, to: number): number[] {
  return envelopes.flatMap((envelope) => {
    if (!envelope) return [];
    const part = windowed(envelope, from, to);
    return [...finite(part.low), ...finite(part.high)];
  });
}

/** All traces; those that recede are drawn in as many columns as the budget allows, the one in full ink in all. */
function traces(drawn: readonly { envelope: Envelope; className: string }[], x: Scale, y: Scale): string[] {
  const drawnIn = (most: number): string[] =>
    drawn.map(({ envelope, className }) =>
      trace(envelope, x, y, className, className.includes('receding') || drawn.length > 24 ? most : columns),
    );
  let most = columns;
  let svg = drawnIn(most);
  for (let turn = 0; turn < 3; turn++) {
    const weight = svg.reduce((sum, one) => sum + one.length, 0);
    if (weight <= pathBudget || most === fewestColumns) break;
    most = Math.max(fewestColumns, Math.floor((0.95 * most * pathBudget) / weight));
    svg = drawnIn(most);
  }
  return svg;
}

/** Sweeps that share a clamp mode and a length belong on one chart; others would not share its axes. */
export function sweepGroups(sweeps: readonly SweepRow[]): SweepRow[][] {
  const groups = new Map<string, SweepRow[]>();
  for (const sweep of sweeps) {
    // Lengths within a tenth of each other share an axis well enough.
    const key = `${sweep.clamp} ${Math.round(Math.log(Math.max(sweep.duration_s, 1e-3)) / Math.log(1.35))}`;
    groups.set(key, [...(groups.get(key) ?? []), sweep]);
  }
  // What the archive is about comes first.
  return [...groups.values()].sort((a, b) => Number(a[0]!.clamp === 'voltage') - Number(b[0]!.clamp === 'voltage'));
}

/**
 * @param sweeps of one clamp mode and like length, any number from 1
 * @returns null where no sweep has anything to draw
 */
export function sweepsChart(sweeps: readonly SweepRow[], options: SweepsChartOptions = {}): Chart | null {
  const clamp = sweeps[0]?.clamp ?? 'current';
  const main = (sweep: SweepRow) => open(clamp === 'current' ? sweep.voltage_envelope : sweep.current_envelope);
  const below = (sweep: SweepRow) => open(clamp === 'current' ? sweep.current_envelope : sweep.voltage_envelope);
  const drawn = sweeps.filter((sweep) => (main(sweep)?.low.length ?? 0) > 1);
  if (drawn.length === 0) return null;
  const from = options.from_s ?? Math.min(...drawn.map((sweep) => main(sweep)!.start_s));
  const to = options.to_s ?? Math.max(...drawn.map((sweep) => main(sweep)!.end_s));
  if (!(to > from)) return null;
  const hasBelow = drawn.some((sweep) => (below(sweep)?.low.length ?? 0) > 1);
  const frame: Frame = {
    width: options.width ?? 1120,
    height: options.height ?? 430,
    margins: { top: 26, right: 14, bottom: 38, left: 54 },
  };
  const bottom = frame.height - frame.margins.bottom;
  const mainBottom = hasBelow ? frame.margins.top + (bottom - frame.margins.top) * 0.72 : bottom;
  const levels = finite([options.e_na_mv ?? null, options.e_k_mv ?? null]);
  const mainDomain = domainOf(valuesIn(drawn.map(main), from, to), clamp === 'current' ? levels : []);
  if (!mainDomain) return null;
  const x = xScale(frame, [from, to]);
  const y = yScale(frame, mainDomain, frame.margins.top, mainBottom);
  const right = frame.width - frame.margins.right;
  const highlight = options.highlight ?? null;
  const className = (sweep: SweepRow): string =>
    highlight === null || drawn.length === 1 ? 'trace' : sweep.sweep === highlight ? 'trace chosen' : 'trace receding';
  const ordered = [...drawn].sort((a, b) => Number(a.sweep === highlight) - Number(b.sweep === highlight));
  const parts = [
    yAxis(
      y,
      frame.margins.left,
      clamp === 'current' ? 'Membrane potential' : 'Current',
      clamp === 'current' ? 'mV' : 'pA',
      right,
    ),
    ...(clamp === 'current' ? equilibriumLevels(y, frame, options) : []),
    ...traces(
      ordered.map((sweep) => ({ envelope: windowed(main(sweep)!, from, to), className: className(sweep) })),
      x,
      y,
    ),
  ];
  if (hasBelow) {
    const domain = domainOf(valuesIn(drawn.map(below), from, to), [0], 0.12);
    if (domain) {
      const low = yScale(frame, domain, mainBottom + 30, bottom);
      parts.push(
        yAxis(
          low,
          frame.margins.left,
          clamp === 'current' ? 'Injected current' : 'Command',
          clamp === 'current' ? 'pA' : 'mV',
          right,
          3,
        ),
        ...traces(
          ordered
            .filter((sweep) => below(sweep))
            .map((sweep) => ({ envelope: windowed(below(sweep)!, from, to), className: className(sweep) })),
          x,
          low,
        ),
      );
    }
  }
  parts.push(xAxis(x, bottom, 'Time', 's', 8));
  return picture(frame, altOf(drawn, clamp, mainDomain, from, to, highlight), parts.join(''));
}

function equilibriumLevels(y: Scale, frame: Frame, options: SweepsChartOptions): string[] {
  const right = frame.width - frame.margins.right;
  const one = (value: number | null | undefined, name: string, side: 'above' | 'below'): string =>
    value === null || value === undefined
      ? ''
      : level(y, value, frame.margins.left, right, `${name} ${number(value, 0)} mV`, side);
  return [one(options.e_na_mv, 'E_Na', 'above'), one(options.e_k_mv, 'E_K', 'below')];
}

function altOf(
  sweeps: readonly SweepRow[],
  clamp: string,
  domain: readonly [number, number],
  from: number,
  to: number,
  highlight: number | null,
): string {
  const spikes = sweeps.reduce((sum, sweep) => sum + sweep.spikes.length, 0);
  const unit = clamp === 'current' ? 'mV' : 'pA';
  return [
    `${counted(sweeps.length, 'sweep')} in ${clamp} clamp from ${number(from, 2)} to ${number(to, 2)} s`,
    `between ${number(domain[0], 0)} and ${number(domain[1], 0)} ${unit}`,
    clamp === 'current' ? `with ${counted(spikes, 'spike')} in all` : '',
    highlight === null || sweeps.length === 1 ? '' : `sweep ${highlight} stands out`,
  ]
    .filter((part) => part !== '')
    .join(', ')
    .concat('. The numbers stand in the table of sweeps.');
}
