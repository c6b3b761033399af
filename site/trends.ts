/** Numbers over time, by rig: what the page of trends draws and tabulates. */
import { quantile } from 'd3';
import { type Quantity, quantity } from '../pipeline/measure/quantities.ts';
import { type CellSummary, groupBy, type Sizes, sizesOf } from './almanac.ts';

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
  /** Over all rigs, so that small multiples share one axis. */
  low: number;
  high: number;
}

/** Trends with at least one dated number; the condition that stands for the cell is taken. */
export function trendsOf(cells: readonly CellSummary[]): Trend[] {
  return trendQuantities.flatMap((id) => {
    const measured = cells.filter((cell) => cell.date !== null && (cell.readings[id]?.value ?? null) !== null);
    if (measured.length === 0) return [];
    const series = groupBy(measured, (cell) => cell.rig?.id ?? '').map(([rig, members]) => seriesOf(id, rig, members));
    const values = series.flatMap((one) => one.points.map((point) => point.value));
    return [{ quantity: quantity(id), series, low: Math.min(...values), high: Math.max(...values) }];
  });
}

function seriesOf(id: string, rig: string, members: CellSummary[]): TrendSeries {
  const points = members.map((cell) => ({
    cell: cell.id,
    page: cell.page,
    date: cell.date!,
    value: cell.readings[id]!.value!,
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
