/**
 * The grammar that every chart shares: a frame in pixels, linear scales, quiet axes with units, direct labels. Charts
 * are pure functions from data to an SVG text; colours and line weights are classes that the style sheet sets, so that
 * light, dark and print follow it. No ids, no clock, two decimals.
 */
import { type ScaleLinear, scaleLinear } from 'd3';
import { inFull, knownHalfWidth, number } from '../format.ts';

export interface Margins {
  top: number;
  right: number;
  bottom: number;
  left: number;
}

export interface Frame {
  width: number;
  height: number;
  margins: Margins;
}

export type Scale = ScaleLinear<number, number>;

/** A drawn chart: the picture and what it says in words, for those who cannot see it. */
export interface Chart {
  svg: string;
  alt: string;
  /** How many points carry a rule for their 95 % half-width; absent: none. */
  ruled?: number;
}

/** What the rules through points are, for captions; '' where no point carries one. */
export const ruledNote = (chart: Chart): string =>
  chart.ruled === undefined || chart.ruled === 0
    ? ''
    : 'Upright rules: 95 % half-widths, where they reach beyond the mark.';

export const escapeText = (text: string): string =>
  text.replace(/&/g, '&amp;').replace(/</g, '&lt;').replace(/>/g, '&gt;').replace(/"/g, '&quot;');

/** A coordinate with at most two decimals. */
export const px = (value: number): string => String(Math.round(value * 100) / 100);

export interface Attributes {
  [name: string]: string | number | undefined;
}

/** One SVG element. Numbers are cut to two decimals; undefined attributes are left out. */
export function element(name: string, attributes: Attributes, content = ''): string {
  const list = Object.entries(attributes)
    .filter(([, value]) => value !== undefined)
    .map(([key, value]) => ` ${key}="${typeof value === 'number' ? px(value) : escapeText(value!)}"`)
    .join('');
  return content === '' ? `<${name}${list}/>` : `<${name}${list}>${content}</${name}>`;
}

/** 'E_Na' with its index lowered; everything else escaped as it stands. */
const lowered = (text: string): string =>
  escapeText(text).replace(
    /\b([EV])_([A-Za-z]+)/g,
    '$1<tspan class="index" dy="3">$2</tspan><tspan dy="-3">&#8203;</tspan>',
  );

export const label = (x: number, y: number, text: string, className: string, anchor?: 'middle' | 'end'): string =>
  element('text', { x, y, class: className, 'text-anchor': anchor }, lowered(text));

export const line = (x1: number, y1: number, x2: number, y2: number, className: string): string =>
  element('line', { x1, y1, x2, y2, class: className });

/** The whole picture. `group` when it holds links, else one image. */
export function picture(frame: Frame, alt: string, content: string, role: 'img' | 'group' = 'img'): Chart {
  const svg = element(
    'svg',
    {
      viewBox: `0 0 ${frame.width} ${frame.height}`,
      width: frame.width,
      height: frame.height,
      class: 'chart',
      role,
      'aria-label': alt,
    },
    content,
  );
  return { svg, alt };
}

/** A domain that holds all finite values, with some air; `include` is held too. One value gets a domain around it. */
export function domainOf(
  values: Iterable<number>,
  include: readonly number[] = [],
  air = 0.05,
): [number, number] | null {
  let low = Number.POSITIVE_INFINITY;
  let high = Number.NEGATIVE_INFINITY;
  for (const list of [values, include])
    for (const value of list) {
      if (!Number.isFinite(value)) continue;
      if (value < low) low = value;
      if (value > high) high = value;
    }
  if (low > high) return null;
  const span = high - low || Math.abs(high) * 0.1 || 1;
  return [low - air * span, high + air * span];
}

export const xScale = (frame: Frame, domain: [number, number]): Scale =>
  scaleLinear(domain, [frame.margins.left, frame.width - frame.margins.right]);

export const yScale = (
  frame: Frame,
  domain: [number, number],
  from = frame.margins.top,
  to = frame.height - frame.margins.bottom,
): Scale => scaleLinear(domain, [to, from]);

/** Decimals that tell neighbouring ticks apart. */
function tickDecimals(ticks: readonly number[]): number {
  const step = ticks.length > 1 ? Math.abs(ticks[1]! - ticks[0]!) : Math.abs(ticks[0] ?? 1) || 1;
  return Math.max(0, Math.min(6, -Math.floor(Math.log10(step) + 1e-9)));
}

const named = (title: string, unit: string): string => (unit === '' ? title : `${title} (${unit})`);

/** Ticks, numbers and name along the bottom at `y`. */
export function xAxis(scale: Scale, y: number, title: string, unit: string, count = 5): string {
  const ticks = scale.ticks(count);
  const decimals = tickDecimals(ticks);
  const [from, to] = scale.range() as [number, number];
  return [
    line(from, y, to, y, 'axis'),
    ...ticks.map((tick) => line(scale(tick), y, scale(tick), y + 4, 'axis')),
    ...ticks.map((tick) => label(scale(tick), y + 16, number(tick, decimals), 'tick', 'middle')),
    title === '' ? '' : label(to, y + 31, named(title, unit), 'axis-name', 'end'),
  ].join('');
}

/** Ticks and numbers along the left at `x`, hairlines across to `acrossTo`, the name above the top. */
export function yAxis(scale: Scale, x: number, title: string, unit: string, acrossTo: number, count = 5): string {
  const ticks = scale.ticks(count);
  const decimals = tickDecimals(ticks);
  const [, top] = scale.range() as [number, number];
  return [
    ...ticks.map((tick) => line(x, scale(tick), acrossTo, scale(tick), tick === 0 ? 'grid zero' : 'grid')),
    ...ticks.map((tick) => label(x - 6, scale(tick) + 4, number(tick, decimals), 'tick', 'end')),
    title === '' ? '' : label(x, top - 8, named(title, unit), 'axis-name'),
  ].join('');
}

/** A level across the chart with its name and value at the right end, on the side away from the data. */
export function level(
  scale: Scale,
  value: number,
  from: number,
  to: number,
  name: string,
  side: 'above' | 'below',
): string {
  const y = scale(value);
  return line(from, y, to, y, 'level') + label(to, side === 'above' ? y - 4 : y + 12, name, 'level-name', 'end');
}

/** A plotted number; `u95` where its 95 % half-width is known. */
export interface Plotted {
  at: number;
  value: number;
  u95?: number | null | undefined;
}

/** Lower and upper end of each number's interval, as far as it is known: what a domain has to hold. */
export const intervalEnds = (points: readonly Plotted[]): number[] =>
  points.flatMap(({ value, u95 }) => (u95 ? [value - u95, value + u95] : [value]));

/**
 * One hairline through each point for its half-width, cut at the frame; none where the mark itself hides it.
 * @param mark radius of the marks, px
 */
export function halfWidthRules(
  points: readonly Plotted[],
  x: Scale,
  y: Scale,
  mark: number,
): { svg: string; ruled: number } {
  const [bottom, top] = y.range() as [number, number];
  let ruled = 0;
  let d = '';
  for (const { at, value, u95 } of points) {
    if (!u95 || !Number.isFinite(u95)) continue;
    const low = Math.min(bottom, y(value - u95));
    const high = Math.max(top, y(value + u95));
    if (low - high <= 2 * mark + 1) continue;
    ruled++;
    d += `M${px(x(at))},${px(high)}V${px(low)}`;
  }
  return { svg: d === '' ? '' : element('path', { d, class: 'half-width' }), ruled };
}

/** 'half-widths ±0.2 to ±0.5 mV' of the numbers that have one, for text alternatives; '' where none has. */
export function halfWidthWords(id: string, points: readonly Plotted[]): string {
  const known = points.flatMap(({ u95 }) => knownHalfWidth(id, u95) || []);
  if (known.length === 0) return '';
  const one = (u95: number): string => inFull(id, u95, u95).replace(/.*\u00a0±\u00a0/, '±');
  const [least, most] = [one(Math.min(...known)), one(Math.max(...known))];
  return `95 % half-widths ${least === most ? least : `${least} to ${most}`}`;
}

/** Path data through points; gaps where a value is not finite. */
export function path(points: Iterable<readonly [number, number]>, x: Scale, y: Scale): string {
  let text = '';
  let pen: 'M' | 'L' = 'M';
  for (const [a, b] of points) {
    if (!Number.isFinite(a) || !Number.isFinite(b)) {
      pen = 'M';
      continue;
    }
    text += `${pen}${px(x(a))},${px(y(b))}`;
    pen = 'L';
  }
  return text;
}
