/** Reads samples of NWB series, block by block, into mV, pA and seconds. */
import { damaged, type Hdf5 } from './hdf5.ts';
import type { Series } from './nwb-series.ts';
import { FormatError } from './problems.ts';
import { spread, timeBase } from './time-base.ts';

/** Samples read at once: large enough to be quick, small beside a worker's memory. */
const block = 1 << 20;

type Numbers = ArrayLike<number | bigint>;

function rawBlock(series: Series, column: number, from: number, to: number): Numbers {
  const time: [number, number] = [from, to];
  const across: [number, number] = [column, column + 1];
  const ranges = series.dimensions === 1 ? [time] : series.timeAxis === 0 ? [time, across] : [across, time];
  return series.data.slice(ranges) as unknown as Numbers;
}

/** A piece of a series: one trace, from a sample on. */
export interface Piece {
  series: Series;
  column: number;
  from: number;
  length: number;
}

/**
 * Samples × scale + shift. What is not a finite number comes out as NaN.
 *
 * @throws FormatError where a block cannot be read
 */
export function readPiece({ series, column, from, length }: Piece, scale: number, shift: number): Float64Array {
  const samples = new Float64Array(length);
  try {
    for (let done = 0; done < length; done += block) {
      const end = Math.min(length, done + block);
      const raw = rawBlock(series, column, from + done, from + end);
      if (raw.length !== end - done)
        throw new Error(`${end - done} samples were asked for and ${raw.length} came back`);
      for (let index = done; index < end; index++) {
        const value = Number(raw[index - done]) * scale + shift;
        samples[index] = Number.isFinite(value) ? value : Number.NaN;
      }
    }
  } catch (error) {
    throw damaged(series.data.path, error);
  }
  return samples;
}

/**
 * Largest absolute value, conversion applied, in a few short stretches spread over the series: enough to tell volts
 * from amperes where the labels contradict one another. Null where it cannot be read or holds nothing but zeros.
 */
export function glance(series: Series): number | null {
  const stretch = 512;
  let largest = 0;
  try {
    for (let part = 0; part < 8; part++) {
      const from = Math.floor((Math.max(0, series.length - stretch) * part) / 7);
      const raw = rawBlock(series, 0, from, Math.min(series.length, from + stretch));
      for (let index = 0; index < raw.length; index++) {
        const value = Math.abs(Number(raw[index]) * series.conversion + series.offset);
        if (Number.isFinite(value) && value > largest) largest = value;
      }
    }
  } catch {
    return null;
  }
  return largest === 0 ? null : largest;
}

export interface SeriesClock {
  rate_hz: number;
  /** Time of the first sample of the series, s from the file's reference time; null where not stated. */
  start_s: number | null;
}

const timesAt = (series: Series, from: number, to: number): number[] =>
  Array.from(series.timestamps!.slice([[from, to]]) as unknown as Numbers, Number);

/**
 * Rate and start as stated, or from the first and last timestamp; whether these are regular is found out on reading.
 *
 * @returns null where the series states neither
 */
export function statedClock(series: Series): SeriesClock | null {
  if (series.rate_hz !== null && series.rate_hz > 0) return { rate_hz: series.rate_hz, start_s: series.start_s };
  if (!series.timestamps) return null;
  const length = Math.min(series.length, series.timestamps.shape?.[0] ?? 0);
  if (length < 2) return null;
  try {
    const near = timesAt(series, 0, Math.min(length, 257));
    const [first] = near as [number];
    const overall = (length - 1) / (timesAt(series, length - 1, length)[0]! - first);
    const steps = near.slice(1).map((time, index) => time - near[index]!);
    const local = 1 / steps.sort((a, b) => a - b)[steps.length >> 1]!;
    // Missing samples make the whole look slower than its usual step; the step is nearer the truth then.
    const rate = Math.abs(overall - local) <= 1e-3 * local ? overall : local;
    if (!(rate > 0) || !Number.isFinite(rate)) return null;
    const whole = Math.round(rate);
    return { rate_hz: whole > 0 && Math.abs(rate - whole) < 1e-6 * rate ? whole : rate, start_s: first };
  } catch (error) {
    throw damaged(series.timestamps.path, error);
  }
}

export interface Placed {
  samples: Float64Array;
  rate_hz: number;
  start_s: number | null;
  /** Samples that the timestamps say are missing. */
  gaps: number;
}

/**
 * Samples of a piece on a regular time base.
 *
 * @throws FormatError where timestamps are no fixed step
 */
export function placePiece(piece: Piece, samples: Float64Array, clock: SeriesClock, hdf5: Hdf5): Placed {
  const { series, from, length } = piece;
  if (!series.timestamps || series.rate_hz !== null)
    return {
      samples,
      rate_hz: clock.rate_hz,
      start_s: clock.start_s === null ? null : clock.start_s + from / clock.rate_hz,
      gaps: 0,
    };
  const { path, metadata, shape } = series.timestamps;
  if ((shape?.[0] ?? 0) < from + length)
    throw new FormatError({
      code: 'TIMES_TOO_FEW',
      place: path,
      message: `There are ${shape?.[0] ?? 0} timestamps for ${series.length} samples.`,
      remedy: 'Write the series with as many timestamps as samples, or with a starting time and a rate.',
    });
  const times = new Float64Array(length);
  try {
    for (let done = 0; done < length; done += block) {
      const end = Math.min(length, done + block);
      const raw = series.timestamps.slice([[from + done, from + end]]) as unknown as Numbers;
      for (let index = done; index < end; index++) times[index] = Number(raw[index - done]);
    }
  } catch (error) {
    throw damaged(path, error);
  }
  const isSingle = metadata.type === hdf5.module.H5T_class_t.H5T_FLOAT.value && metadata.size === 4;
  const relative = isSingle ? 2 ** -23 : 2 ** -51;
  const base = timeBase(times, (time) => Math.abs(time) * relative);
  if (!base.ok)
    throw new FormatError({
      code: 'TIMES_IRREGULAR',
      place: path,
      message: `The samples are not equally spaced: at sample ${from + base.at} ${base.why} (s).`,
      remedy: 'Resample the trace to a fixed step and store it with a rate; nothing is interpolated here.',
    });
  return {
    samples: spread(samples, base.places, base.samples),
    rate_hz: base.rate,
    start_s: base.start,
    gaps: base.samples - length,
  };
}
