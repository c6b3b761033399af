/** Numbers over time, by rig: what the page of trends draws and tabulates. */
import { quantile } from 'd3';
import type { ArchiveEvent } from '../pipeline/archive/types.ts';
import { type Quantity, quantity } from '../pipeline/measure/quantities.ts';
import { type CellSummary, groupBy, type Sizes, sizesOf } from './almanac.ts';
import { controlChart, type DrawnControl, eventLetter, speaksForRig } from './charts/control-chart.ts';
import { fewestForLimits, individualsLimits } from './charts/control-limits.ts';
import { domainOf } from './charts/frame.ts';
import { knownHalfWidth } from './format.ts';
import type { Link } from './links.ts';

/** What drifts when a rig, a solution or a hand does. */
export const trendQuantities = [
  'resting_potential_mv',
  'access_resistance_mohm',
  'bridge_error_mohm',
  'noise_rms_mv',
  'mains_hum_mv',
  'drift_mv_per_min',
  'input_resistance_mohm',
  'threshold_mv',
  'spike_height_mv',
] as const;

export interface TrendPoint {
  cell: string;
  /** Page of the cell, from the site's root. */
  page: string;
  date: string;
  value: number;
  /** 95 % half-width, where it is known. */
  u95?: number | undefined;
  standing: CellSummary['standing'];
}

export interface TrendSeries {
  /** Id of the rig; '' for cells whose rig is not stated. */
  rig: string;
  label: string;
  /** By date, then cell. */
  points: TrendPoint[];
  sizes: Sizes;
  median: number;
  quartiles: [number, number];
}

export interface Trend {
  quantity: Quantity;
  series: TrendSeries[];
  /** First and last date over all rigs, so that small multiples share one axis. */
  span: [string, string];
  /** Values that every picture of the quantity spans, control limits included. */
  domain: [number, number];
}

/** Trends with at least one dated number; the condition that stands for the cell is taken. */
export function trendsOf(cells: readonly CellSummary[]): Trend[] {
  return trendQuantities.flatMap((id) => {
    const measured = cells.filter((cell) => cell.date !== null && (cell.readings[id]?.value ?? null) !== null);
    if (measured.length === 0) return [];
    const series = rigsOf(measured).map(([rig, members]) => seriesOf(id, rig, members));
    const dates = measured.map((cell) => cell.date!).sort();
    return [{ quantity: quantity(id), series, span: [dates[0]!, dates.at(-1)!], domain: sharedDomain(series) }];
  });
}

/** Whether any number of a trend carries its half-width. */
export const hasHalfWidths = (trend: Trend): boolean =>
  trend.series.some((series) => series.points.some((point) => point.u95 !== undefined));

/** Cells by rig; those whose rig is not stated come last. */
function rigsOf(cells: readonly CellSummary[]): [string, CellSummary[]][] {
  const groups = groupBy(cells, (cell) => cell.rig?.id ?? '');
  return [...groups.filter(([rig]) => rig !== ''), ...groups.filter(([rig]) => rig === '')];
}

function seriesOf(id: string, rig: string, members: CellSummary[]): TrendSeries {
  const points = members.map((cell) => ({
    cell: cell.id,
    page: cell.page,
    date: cell.date!,
    value: cell.readings[id]!.value!,
    u95: knownHalfWidth(id, cell.readings[id]!.u95),
    standing: cell.standing,
  }));
  const plain = (a: string, b: string): number => (a < b ? -1 : a > b ? 1 : 0);
  points.sort((a, b) => plain(a.date, b.date) || plain(a.cell, b.cell));
  const values = points.map((point) => point.value);
  return {
    rig,
    label: rig === '' ? 'Rig not stated' : (members[0]!.rig?.label ?? rig),
    points,
    sizes: sizesOf(members),
    median: quantile(values, 0.5)!,
    quartiles: [quantile(values, 0.25)!, quantile(values, 0.75)!],
  };
}

function sharedDomain(series: readonly TrendSeries[]): [number, number] {
  // Cells that do not speak for their rig may lie beyond the axis: the picture says so at its edge.
  const values = series.map((one) => {
    const telling = one.points.filter(speaksForRig);
    return (telling.length > 0 ? telling : one.points).map((point) => point.value);
  });
  const limits = values.flatMap((one) => {
    const limit = one.length >= fewestForLimits ? individualsLimits(one) : null;
    return limit ? [limit.low, limit.high] : [];
  });
  return domainOf(values.flat(), limits, 0.08)!;
}

/** An event with the letter it has on every picture of the page. */
export interface LetteredEvent extends ArchiveEvent {
  letter: string;
}

export const lettered = (events: readonly ArchiveEvent[]): LetteredEvent[] =>
  events.map((event, index) => ({ ...event, letter: eventLetter(index) }));

/**
 * The picture of one rig with the events that concern it.
 *
 * @param link of the page that holds the picture
 */
export function trendPicture(
  trend: Trend,
  series: TrendSeries,
  events: readonly LetteredEvent[],
  link: Link,
): DrawnControl {
  return controlChart({
    quantity: trend.quantity.id,
    title: series.label,
    points: series.points.map((point) => ({ ...point, href: link(point.page) })),
    events: events.filter((event) => event.rig === null || event.rig === series.rig),
    span: trend.span,
    values: trend.domain,
  })!;
}
