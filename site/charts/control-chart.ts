/** One quantity on one rig over time: every point leads to its cell, events are marked, limits come with enough points. */

import type { Standing } from '../../pipeline/judge/types.ts';
import { quantity } from '../../pipeline/measure/quantities.ts';
import { counted, inFull, longDate, number, withUnit } from '../format.ts';
import { type ControlLimits, fewestForLimits, individualsLimits } from './control-limits.ts';
import {
  type Chart,
  domainOf,
  element,
  escapeText,
  type Frame,
  halfWidthRules,
  label,
  line,
  path,
  picture,
  px,
  type Scale,
  xScale,
  yAxis,
  yScale,
} from './frame.ts';

export interface ControlPoint {
  cell: string;
  /** ISO date, with a clock time where known. */
  date: string;
  value: number;
  /** 95 % half-width, where it is known. */
  u95?: number | undefined;
  standing: Standing;
  /** Link to the cell's page. */
  href: string;
}

export interface ControlChartInput {
  quantity: string;
  /** What the chart is about: 'Rig A'. */
  title: string;
  points: readonly ControlPoint[];
  /** Without a letter they are lettered in their order. */
  events: readonly { date: string; text: string; letter?: string }[];
  /** Dates that the axis spans, so that neighbours share it. */
  span: readonly [string, string];
  /** Values that the axis spans, so that neighbours share it; found from the points where absent. */
  values?: readonly [number, number];
  width?: number;
}

const days = (iso: string): number => Date.parse(iso.length > 10 ? iso : `${iso}T12:00:00Z`) / 86_400_000;

export interface DrawnControl extends Chart {
  limits: ControlLimits | null;
  beyond: ControlPoint[];
}

/**
 * Whether a cell's number speaks for its rig: one that physics or the lab's rules reject, and one that could not be
 * read, would only stretch the limits.
 */
export const speaksForRig = (point: { standing: Standing }): boolean =>
  point.standing !== 'unsound' && point.standing !== 'unread';

/** @returns null without points */
export function controlChart(input: ControlChartInput): DrawnControl | null {
  const points = [...input.points].sort((a, b) => days(a.date) - days(b.date) || (a.cell < b.cell ? -1 : 1));
  if (points.length === 0) return null;
  const entry = quantity(input.quantity);
  const values = points.map((point) => point.value);
  const telling = points.filter(speaksForRig);
  const limits = telling.length >= fewestForLimits ? individualsLimits(telling.map((point) => point.value)) : null;
  const frame: Frame = {
    width: input.width ?? 520,
    height: 210,
    margins: { top: 26, right: 14, bottom: 34, left: 54 },
  };
  const domain = input.values
    ? ([...input.values] as [number, number])
    : domainOf(values, limits ? [limits.low, limits.high] : [], 0.08)!;
  const span: [number, number] = [days(input.span[0]) - 1, days(input.span[1]) + 1];
  const x = xScale(frame, span);
  const y = yScale(frame, domain);
  const right = frame.width - frame.margins.right;
  const beyond = limits ? points.filter((point) => point.value < limits.low || point.value > limits.high) : [];
  const rules = halfWidthRules(
    // Of a number beyond the axis the arrow speaks.
    points
      .filter((point) => point.value === clamped(point.value, domain))
      .map((point) => ({ at: days(point.date), value: point.value, u95: point.u95 })),
    x,
    y,
    3.4,
  );
  const parts = [
    yAxis(y, frame.margins.left, `${input.title}: ${entry.label}`, entry.unit, right, 4),
    ...events(input.events, x, frame),
    ...(limits
      ? limitLines(limits, input.quantity, y, frame)
      : [
          medianLine(
            (telling.length > 0 ? telling : points).map((point) => point.value),
            input.quantity,
            y,
            frame,
          ),
        ]),
    element('path', {
      d: path(
        telling.map((point) => [days(point.date), clamped(point.value, domain)] as const),
        x,
        y,
      ),
      class: 'thread',
    }),
    rules.svg,
    ...points.map((point) => dot(point, input.quantity, x, y, beyond.includes(point), domain)),
    monthAxis(x, span, frame),
  ];
  const alt = [
    `${entry.label} on ${input.title}, ${counted(points.length, 'cell')} from ${longDate(points[0]!.date)} to ${longDate(points.at(-1)!.date)}.`,
    limits
      ? `Mean ${withUnit(input.quantity, limits.centre)}, limits ${withUnit(input.quantity, limits.low)} and ${withUnit(input.quantity, limits.high)}; ${beyond.length === 0 ? 'no cell lies' : `${counted(beyond.length, 'cell')} ${beyond.length === 1 ? 'lies' : 'lie'}`} beyond them.`
      : `Limits need ${fewestForLimits} cells that are not unsound. Lowest ${withUnit(input.quantity, Math.min(...values))}, highest ${withUnit(input.quantity, Math.max(...values))}.`,
  ].join(' ');
  return { ...picture(frame, alt, parts.join(''), 'group'), limits, beyond, ruled: rules.ruled };
}

/** The standing's own marks, small: filled disc, half disc, open ring, dash. Points beyond the limits get a ring around. */
function dot(
  point: ControlPoint,
  id: string,
  x: Scale,
  y: Scale,
  beyond: boolean,
  domain: readonly [number, number],
): string {
  const shown = clamped(point.value, domain);
  const at = { x: x(days(point.date)), y: y(shown) };
  const name = `${point.cell}, ${point.standing}, ${longDate(point.date)}: ${inFull(id, point.value, point.u95)}${beyond ? ', beyond the limits' : ''}`;
  return element(
    'a',
    { href: point.href, class: `dot ${point.standing}` },
    element('title', {}, escapeText(name)) +
      element('circle', { cx: at.x, cy: at.y, r: 8, class: 'reach' }) +
      (beyond ? element('circle', { cx: at.x, cy: at.y, r: 6.5, class: 'beyond' }) : '') +
      shape(point.standing, at.x, at.y) +
      (shown === point.value ? '' : offScale(at, shown < point.value, withUnit(id, point.value))),
  );
}

const clamped = (value: number, [low, high]: readonly [number, number]): number => Math.min(high, Math.max(low, value));

/** A number beyond the axis stands at its edge with an arrow and its value, so that it does not flatten the others. */
function offScale(at: { x: number; y: number }, above: boolean, text: string): string {
  const tip = above ? at.y - 9 : at.y + 9;
  const foot = above ? at.y - 5 : at.y + 5;
  const arrow = element('path', {
    d: `M${px(at.x - 3.5)},${px(foot)}L${px(at.x + 3.5)},${px(foot)}L${px(at.x)},${px(tip)}Z`,
    class: 'filled',
  });
  return arrow + label(at.x - 9, above ? at.y + 4 : at.y, text, 'level-name', 'end');
}

function shape(standing: Standing, x: number, y: number): string {
  const r = 3.4;
  const round = (value: number): number => Math.round(value * 100) / 100;
  if (standing === 'sound') return element('circle', { cx: x, cy: y, r, class: 'filled' });
  if (standing === 'unsound') return element('circle', { cx: x, cy: y, r, class: 'open' });
  if (standing === 'unread') return line(x - 4, y, x + 4, y, 'open');
  return (
    element('circle', { cx: x, cy: y, r, class: 'open' }) +
    element('path', { d: `M${round(x)},${round(y - r)}A${r},${r} 0 0 0 ${round(x)},${round(y + r)}Z`, class: 'filled' })
  );
}

function limitLines(limits: ControlLimits, id: string, y: Scale, frame: Frame): string[] {
  const left = frame.margins.left;
  const right = frame.width - frame.margins.right;
  const band = element('rect', {
    x: left,
    y: y(limits.high),
    width: right - left,
    height: Math.max(0, y(limits.low) - y(limits.high)),
    class: 'control-band',
  });
  const one = (value: number, name: string, className: string): string =>
    line(left, y(value), right, y(value), className) +
    label(right, y(value) - 4, `${name} ${withUnit(id, value)}`, 'level-name', 'end');
  return [
    band,
    one(limits.high, 'limit', 'limit'),
    line(left, y(limits.centre), right, y(limits.centre), 'centre'),
    one(limits.low, 'limit', 'limit'),
  ];
}

function medianLine(values: readonly number[], id: string, y: Scale, frame: Frame): string {
  const sorted = [...values].sort((a, b) => a - b);
  const middle = sorted.length / 2;
  const median = sorted.length % 2 === 1 ? sorted[Math.floor(middle)]! : (sorted[middle - 1]! + sorted[middle]!) / 2;
  const left = frame.margins.left;
  const right = frame.width - frame.margins.right;
  return (
    line(left, y(median), right, y(median), 'centre') +
    label(right, y(median) - 4, `median ${withUnit(id, median)}`, 'level-name', 'end')
  );
}

function events(list: ControlChartInput['events'], x: Scale, frame: Frame): string[] {
  const [from, to] = x.domain() as [number, number];
  return list
    .filter((event) => days(event.date) >= from && days(event.date) <= to)
    .map((event, index) =>
      element(
        'g',
        { class: 'event' },
        element('title', {}, escapeText(`${longDate(event.date)}: ${event.text}`)) +
          line(
            x(days(event.date)),
            frame.margins.top,
            x(days(event.date)),
            frame.height - frame.margins.bottom,
            'mark',
          ) +
          label(
            x(days(event.date)) + 3,
            frame.height - frame.margins.bottom - 4,
            event.letter ?? eventLetter(index),
            'mark-name',
          ),
      ),
    );
}

/** Events are lettered on charts and spelled out in the list beside them. */
export const eventLetter = (index: number): string => {
  const letters = 'abcdefghijklmnopqrstuvwxyz';
  return index < letters.length
    ? letters[index]!
    : `${letters[Math.floor(index / letters.length) - 1] ?? ''}${letters[index % letters.length]}`;
};

const monthNames = ['Jan', 'Feb', 'Mar', 'Apr', 'May', 'Jun', 'Jul', 'Aug', 'Sep', 'Oct', 'Nov', 'Dec'];

/** Firsts of months, thinned until their names have room; the days themselves where the span is within two months. */
function monthAxis(x: Scale, [from, to]: [number, number], frame: Frame): string {
  const y = frame.height - frame.margins.bottom;
  const firsts: { at: number; name: string }[] = [];
  const cursor = new Date(from * 86_400_000);
  cursor.setUTCDate(1);
  cursor.setUTCHours(0, 0, 0, 0);
  for (; cursor.getTime() / 86_400_000 <= to; cursor.setUTCMonth(cursor.getUTCMonth() + 1)) {
    const at = cursor.getTime() / 86_400_000;
    const month = cursor.getUTCMonth();
    if (at >= from)
      firsts.push({
        at,
        name:
          month === 0 || firsts.length === 0 ? `${monthNames[month]} ${cursor.getUTCFullYear()}` : monthNames[month]!,
      });
  }
  const room = Math.max(1, Math.ceil((firsts.length * 56) / (frame.width - frame.margins.left - frame.margins.right)));
  const shown = firsts.filter((_, index) => index % room === 0);
  const days = shown.length >= 2 ? [] : dayTicks(from, to);
  return [
    line(frame.margins.left, y, frame.width - frame.margins.right, y, 'axis'),
    ...[...shown, ...days].map(
      ({ at, name }) => line(x(at), y, x(at), y + 4, 'axis') + label(x(at), y + 16, name, 'tick', 'middle'),
    ),
  ].join('');
}

function dayTicks(from: number, to: number): { at: number; name: string }[] {
  const step = Math.max(1, Math.ceil((to - from) / 5));
  const ticks: { at: number; name: string }[] = [];
  for (let at = Math.ceil(from); at <= to; at += step) {
    const date = new Date(at * 86_400_000);
    if (date.getUTCDate() === 1) continue;
    ticks.push({ at, name: `${date.getUTCDate()} ${monthNames[date.getUTCMonth()]}` });
  }
  return ticks;
}

/** For captions: 'limits from 24 cells' or what is missing. */
export const limitsNote = (n: number): string =>
  n >= fewestForLimits
    ? `limits from ${number(n)} cells that are not unsound`
    : `${number(n)} of the ${fewestForLimits} cells not unsound that limits need`;
