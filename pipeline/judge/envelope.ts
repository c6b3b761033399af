/** From study rows to one wide range per class and quantity. Pure; used by the test that keeps the table honest. */
import type { ClassRange, ShippedClass } from './class-ranges.ts';
import { practiceRanges, practiceSource, type StudyRow, studyRows } from './class-studies.ts';

type Kind = 'potential' | 'ratio' | 'time' | 'rate' | 'size';

/**
 * How each quantity scales. `time` and `rate` are moved by Q10 within the range given: 2–3 for what gating sets;
 * firing rates also wait for the membrane and less steeply follow. The membrane time constant is passive and is not moved.
 */
export const scaling: Record<string, { kind: Kind; q10: ClassRange['q10']; q10_range: readonly [number, number] }> = {
  resting_potential_mv: { kind: 'potential', q10: 'none', q10_range: [1, 1] },
  maximum_diastolic_potential_mv: { kind: 'potential', q10: 'none', q10_range: [1, 1] },
  threshold_mv: { kind: 'potential', q10: 'none', q10_range: [1, 1] },
  peak_mv: { kind: 'potential', q10: 'none', q10_range: [1, 1] },
  spike_height_mv: { kind: 'potential', q10: 'none', q10_range: [1, 1] },
  height_from_rest_mv: { kind: 'potential', q10: 'none', q10_range: [1, 1] },
  ahp_below_threshold_mv: { kind: 'potential', q10: 'none', q10_range: [1, 1] },
  sag_fraction: { kind: 'ratio', q10: 'none', q10_range: [1, 1] },
  half_width_ms: { kind: 'time', q10: 'time', q10_range: [2, 3] },
  apd90_ms: { kind: 'time', q10: 'time', q10_range: [2, 3] },
  cycle_length_ms: { kind: 'time', q10: 'time', q10_range: [2, 3] },
  max_rise_v_per_s: { kind: 'rate', q10: 'rate', q10_range: [1.4, 3] },
  max_fall_v_per_s: { kind: 'rate', q10: 'rate', q10_range: [2, 3] },
  spontaneous_rate_hz: { kind: 'rate', q10: 'rate', q10_range: [2, 3] },
  max_rate_hz: { kind: 'rate', q10: 'rate', q10_range: [1.4, 3] },
  membrane_time_constant_ms: { kind: 'size', q10: 'none', q10_range: [1, 1] },
  input_resistance_mohm: { kind: 'size', q10: 'none', q10_range: [1, 1] },
  membrane_capacitance_pf: { kind: 'size', q10: 'none', q10_range: [1, 1] },
  rheobase_pa: { kind: 'size', q10: 'none', q10_range: [1, 1] },
  rate_gain_hz_per_na: { kind: 'size', q10: 'none', q10_range: [1, 1] },
};

/** Where a table does not show its temperature: what such preparations are usually recorded at, °C. */
const usualTemperature: Partial<Record<ShippedClass, readonly [number, number]>> = {
  'squid-axon': [18, 20],
  // Dissociated and cultured cells are as often recorded at room temperature.
  'sensory-neuron-small': [22, 37],
  'sensory-neuron-large': [22, 37],
  'stem-cell-neuron': [22, 37],
  'stem-cell-cardiomyocyte': [22, 37],
  chromaffin: [22, 37],
  'skeletal-muscle': [20, 37],
};
const usual = (shipped: ShippedClass): readonly [number, number] => usualTemperature[shipped] ?? [32, 37];

/** Deviations that a range reaches beyond the studies' means; fewer where a wide practice range stands beneath. */
const reach = 3;
const reachWithPractice = 2;
/** Spread among cells where no row prints a usable one: 8 mV for potentials, about 30 % for the rest. */
const defaultSd = { linear: 8, logarithmic: 0.3 };
/** No spread among cells is taken to be smaller than this, however alike a few cells were. */
const leastSd = { linear: 4, logarithmic: 0.15 };
/** Printed ranges are typical rather than extreme: each end is moved out by a quarter of the width, at least by these. */
const rangeMargin = { share: 0.25, linear: 5, logarithmic: 0.3 };

const median = (values: readonly number[]): number => {
  const sorted = [...values].sort((a, b) => a - b);
  return (sorted[(sorted.length - 1) >> 1]! + sorted[sorted.length >> 1]!) / 2;
};

/** Standard deviation among cells: as printed, or the standard error times √n. Null where the row does not give it. */
export function cellSd(row: StudyRow): number | null {
  if (!('mean' in row) || row.spread === undefined) return null;
  if (row.spread_kind === 'SD') return row.spread;
  return row.n === undefined ? null : row.spread * Math.sqrt(row.n);
}

/** Two significant figures, outwards; whole millivolts for potentials. */
function outward(value: number, way: -1 | 1, step?: number): number {
  const unit = step ?? (value === 0 ? 1 : 10 ** (Math.floor(Math.log10(Math.abs(value))) - 1));
  const rounded = (way < 0 ? Math.floor(value / unit + 1e-9) : Math.ceil(value / unit - 1e-9)) * unit;
  return Number(rounded.toPrecision(6)) + 0;
}

/**
 * Range from rows of one quantity: from the lowest study's mean − k deviations to the highest one's + k, where the
 * deviation is the median of those among cells (single tables of three to five cells give poor ones); on the logarithm
 * for everything that is a size, a time or a rate; widened to take in printed ranges with a margin.
 * @param k 3, or 2 where the practice range is taken in as well. Null for no rows.
 */
export function rangeOfRows(rows: readonly StudyRow[], kind: Kind, k: number): [number, number] | null {
  const negative = rows.some((row) => ('mean' in row ? row.mean : row.high) < 0);
  const scaled = kind === 'time' || kind === 'rate' || kind === 'size' ? 'logarithmic' : 'linear';
  const sign = scaled === 'logarithmic' && negative ? -1 : 1;
  const scale = (value: number): number => (scaled === 'logarithmic' ? Math.log(sign * value) : value);
  const unscale = (value: number): number => (scaled === 'logarithmic' ? sign * Math.exp(value) : value);
  const ends: number[] = [];
  const means = rows.flatMap((row) => ('mean' in row ? [row] : []));
  if (means.length > 0) {
    const sds = means.flatMap((row) => {
      const sd = cellSd(row);
      if (sd === null) return [];
      return [scaled === 'logarithmic' ? Math.sqrt(Math.log(1 + (sd / row.mean) ** 2)) : sd];
    });
    const sd = Math.max(sds.length > 0 ? median(sds) : defaultSd[scaled], leastSd[scaled]);
    const centres = means.map((row) => scale(row.mean));
    ends.push(Math.min(...centres) - k * sd, Math.max(...centres) + k * sd);
  }
  for (const row of rows) {
    if (!('low' in row)) continue;
    const [from, to] = [scale(row.low), scale(row.high)].sort((a, b) => a - b) as [number, number];
    const margin = Math.max(rangeMargin.share * (to - from), rangeMargin[scaled]);
    ends.push(from - margin, to + margin);
  }
  const values = ends.map(unscale);
  return values.length === 0 ? null : [Math.min(...values), Math.max(...values)];
}

/** The range of one class and quantity with its temperature, reading and sources; null where nothing is known. */
export function deriveRange(shipped: ShippedClass, quantity: string): ClassRange | null {
  const scale = scaling[quantity];
  if (!scale) return null;
  const rows = studyRows.filter((row) => row.class === shipped && row.quantity === quantity);
  const practice = practiceRanges[shipped]?.[quantity];
  const fromRows = rangeOfRows(rows, scale.kind, practice ? reachWithPractice : reach);
  const ends = [...(fromRows ?? []), ...(practice ?? [])];
  if (ends.length === 0) return null;
  const step = scale.kind === 'potential' ? 1 : scale.kind === 'ratio' ? 0.01 : undefined;
  const temperatures = [
    ...rows.flatMap((row) => row.temperature_c ?? usual(shipped)),
    ...(practice ? (shipped === 'squid-axon' ? [18, 20] : [32, 37]) : []),
  ];
  const readings = new Set([...rows.map((row) => row.reading), ...(practice ? ['unknown' as const] : [])]);
  const alwaysImpaled = new Set<ShippedClass>(['motoneuron', 'ventricular-myocyte', 'skeletal-muscle', 'squid-axon']);
  const low = Math.min(...ends);
  return {
    // A share cannot be negative: no lower limit then.
    low: scale.kind === 'ratio' && low <= 0 ? null : outward(low, -1, step),
    high: outward(Math.max(...ends), 1, step),
    temperature_c: [Math.min(...temperatures), Math.max(...temperatures)],
    q10: scale.q10,
    q10_range: scale.q10_range,
    reading: readings.size === 1 ? [...readings][0]! : alwaysImpaled.has(shipped) ? 'corrected' : 'unknown',
    source: [
      ...new Set([
        ...rows.map((row) => (row.status === 'FROM MEMORY' ? `${row.source} (from memory)` : row.source)),
        ...(practice ? [practiceSource] : []),
      ]),
    ].join('; '),
  };
}

/** Quantities for which a class has rows or a practice range, in the order of `scaling`. */
export const quantitiesOfClass = (shipped: ShippedClass): string[] =>
  Object.keys(scaling).filter((quantity) => deriveRange(shipped, quantity) !== null);
