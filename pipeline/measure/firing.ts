import { mean, meanWithin, standardDeviation } from '../signal/statistics.ts';
import { absent, measured } from './reading.ts';
import { filterDelayMs, indexAt, timeAt } from './stretches.ts';
import type { MeasureContext, Reading, Readings, Signal, Spike, Stimulus, SweepMeasure } from './types.ts';

const peakOf = (spike: Spike): number => spike.values['peak_at_s'] ?? Number.NaN;
/** When a spike fired: a slow one by its steepest rise, for its top is flat. */
const firedAt = (spike: Spike): number => spike.values['upstroke_at_s'] ?? peakOf(spike);
/** 95 % half-width of that time, s; null where it is not known. */
const firedWithin = (spike: Spike): number | null =>
  spike.u95?.[spike.values['upstroke_at_s'] == null ? 'peak_at_s' : 'upstroke_at_s'] ?? null;
const startOf = (spike: Spike): number => spike.values['threshold_at_s'] ?? peakOf(spike);

/** Stimuli shorter than this have no rate, s: one spike would already count as tens of hertz. */
const shortestForRate_s = 0.05;
/** A spike may follow a brief pulse by this much and still be its answer, s. */
const afterBriefPulse_s = 0.1;

/** Spikes that begin while the stimulus lasts; all of them where there is none. */
export function spikesDuring(spikes: readonly Spike[], stimulus: Stimulus): Spike[] {
  const { onset_s, end_s } = stimulus;
  if (onset_s === null || end_s === null) return [...spikes];
  const brief = end_s - onset_s < shortestForRate_s;
  const until = brief ? end_s + afterBriefPulse_s : end_s;
  return spikes.filter((spike) => startOf(spike) >= onset_s && startOf(spike) < until);
}

/** Rate, latency and the three measures of intervals of a current-clamp sweep. */
export function measureFiring(
  spikes: readonly Spike[],
  stimulus: Stimulus,
  voltage: Signal,
  filterKhz: number | null = null,
): Readings {
  const during = spikesDuring(spikes, stimulus).filter((spike) => Number.isFinite(firedAt(spike)));
  return {
    spikes: measured(spikes.length),
    mean_rate_hz: meanRate(spikesDuring(spikes, stimulus), stimulus, voltage),
    first_spike_latency_ms: latency(spikesDuring(spikes, stimulus), stimulus, voltage, filterKhz),
    ...measureIntervals(during.map(firedAt), during.map(firedWithin)),
  };
}

function meanRate(during: readonly Spike[], stimulus: Stimulus, voltage: Signal): Reading {
  const ends_s = timeAt(voltage, voltage.samples.length);
  const from_s = stimulus.onset_s ?? voltage.start_s;
  const to_s = Math.min(stimulus.end_s ?? ends_s, ends_s);
  const note = stimulus.onset_s === null ? { note: 'over the whole sweep' } : {};
  if (!(to_s - from_s >= shortestForRate_s)) return absent('sweep-too-short');
  return measured(during.length / (to_s - from_s), { n: during.length, at: { from_s, to_s }, ...note });
}

/** Its half-width: that of the threshold's time, half a sample of the stimulus edge, and the filter's delay, which only the potential has. */
function latency(during: readonly Spike[], stimulus: Stimulus, voltage: Signal, filterKhz: number | null): Reading {
  if (stimulus.onset_s === null) return absent('no-stimulus');
  const first = during[0];
  if (!first) return absent('no-spikes');
  const threshold = first.values['threshold_at_s'] ?? null;
  if (threshold === null) return absent(first.why['threshold_at_s'] ?? 'unresolved');
  const own = first.u95?.['threshold_at_s'];
  const edge_ms = 500 / voltage.rate_hz;
  return measured((threshold - stimulus.onset_s) * 1000, {
    ...(own === undefined ? {} : { u95: Math.hypot(own * 1000, edge_ms, filterDelayMs(filterKhz)) }),
    at: { spike: first.spike, from_s: stimulus.onset_s, to_s: threshold },
  });
}

/**
 * Coefficient of variation (sample SD), local variation and mean relative lengthening of the intervals.
 * @param times_s peak times in order. Three spikes, hence two intervals, are the least for each of them
 * @param widths_s 95 % half-widths of those times; with all of them known, each measure gets the half-width that they
 * carry into it (first-order propagation, JCGM 100:2008, 5.1.2)
 * @see Shinomoto, Shima & Tanji 2003, Neural Comput 15:2823–2842 for Lv
 */
export function measureIntervals(times_s: readonly number[], widths_s: readonly (number | null)[] = []): Readings {
  if (times_s.length < 3) {
    const why = absent(times_s.length === 0 ? 'no-spikes' : 'too-few-spikes');
    return Object.fromEntries(Object.keys(intervalMeasures).map((id) => [id, why]));
  }
  const n = times_s.length - 1;
  const lengthening = lengthenings(intervalsOf(times_s));
  const spread = standardDeviation(lengthening);
  const more: Record<string, Omit<Reading, 'value' | 'why'>> = {
    interval_cv: { n },
    interval_lv: { n },
    interval_adaptation: { n: lengthening.length, ...(spread === null ? {} : { sd: spread }) },
  };
  return Object.fromEntries(
    Object.entries(intervalMeasures).map(([id, measure]) => [
      id,
      measured(measure(times_s), { ...more[id], ...carried(measure, times_s, widths_s) }),
    ]),
  );
}

const intervalsOf = (times: readonly number[]): number[] => times.slice(1).map((time, k) => time - times[k]!);
const lengthenings = (intervals: readonly number[]): number[] =>
  intervals.slice(1).map((own, k) => (own - intervals[k]!) / (own + intervals[k]!));

const intervalMeasures: Record<string, (times: readonly number[]) => number> = {
  interval_cv: (times) => standardDeviation(intervalsOf(times))! / mean(intervalsOf(times))!,
  interval_lv: (times) => 3 * mean(lengthenings(intervalsOf(times)).map((value) => value * value))!,
  interval_adaptation: (times) => mean(lengthenings(intervalsOf(times)))!,
};

/**
 * What the half-widths of the times carry into a measure of them. A time moves two intervals and so only the terms
 * around it, but a few spikes are as quickly done by moving each time by its own half-width.
 */
function carried(
  measure: (times: readonly number[]) => number,
  times: readonly number[],
  widths: readonly (number | null)[],
): Pick<Reading, 'u95'> {
  if (widths.length !== times.length || widths.includes(null)) return {};
  const moved = times.slice();
  let squares = 0;
  for (const [k, width] of widths.entries()) {
    const time = times[k]!;
    moved[k] = time + width!;
    const later = measure(moved);
    moved[k] = time - width!;
    squares += ((later - measure(moved)) / 2) ** 2;
    moved[k] = time;
  }
  return { u95: Math.sqrt(squares) };
}

/** Height of the last spike against the first, below which firing died away and did not merely pause. */
const diedAway = 0.6;

/**
 * Whether firing stopped inside a step that went on: the membrane stays depolarized beyond the first spike's
 * threshold, or the spikes shrank below 60 % and it stays within 15 mV of it (under a strong step the threshold itself
 * is read too high). Not the silence of a cell that adapts: its spikes keep their height and its potential falls back.
 */
export function isBlocked(spikes: readonly Spike[], stimulus: Stimulus, voltage: Signal, slow: boolean): boolean {
  if (slow || stimulus.kind !== 'step' || stimulus.onset_s === null || stimulus.end_s === null) return false;
  if (!((stimulus.amplitude ?? 0) > 0)) return false;
  const during = spikesDuring(spikes, stimulus);
  const last = during.at(-1);
  const threshold = during[0]?.values['threshold_mv'] ?? null;
  if (!last || threshold === null) return false;
  const times = during.map(peakOf);
  const longest = Math.max(0.01, ...times.slice(1).map((time, k) => time - times[k]!));
  const silence = stimulus.end_s - peakOf(last);
  if (silence < Math.max(3 * longest, 0.25 * (stimulus.end_s - stimulus.onset_s))) return false;
  const plateau = mean(
    voltage.samples.subarray(indexAt(voltage, stimulus.end_s - 0.5 * silence), indexAt(voltage, stimulus.end_s)),
  );
  if (plateau === null) return false;
  const heights = during.map((spike) => spike.values['spike_height_mv'] ?? 0);
  const shrank = during.length > 1 && heights.at(-1)! < diedAway * heights[0]!;
  return plateau > threshold || (shrank && plateau > threshold - 15);
}

/** After a stimulus the cell is left to settle this long before its firing counts as its own, s. */
const settling_s = 0.5;

/**
 * Firing outside any stimulus: how many spikes, over how long, and the lowest potential of each whole cycle. Null
 * where nothing is known of the stimulus.
 */
export function measureSpontaneous(
  spikes: readonly Spike[],
  stimulus: Stimulus,
  voltage: Signal,
  context: MeasureContext,
): NonNullable<SweepMeasure['spontaneous']> | null {
  if (stimulus.kind === 'unknown') return null;
  const ends_s = timeAt(voltage, voltage.samples.length);
  const windows =
    stimulus.onset_s === null || stimulus.end_s === null
      ? [{ from_s: voltage.start_s, to_s: ends_s }]
      : [
          { from_s: voltage.start_s, to_s: Math.min(stimulus.onset_s, ...stimulus.edges_s) },
          { from_s: Math.max(stimulus.end_s, ...stimulus.edges_s) + settling_s, to_s: ends_s },
        ];
  const found = { spikes: 0, seconds: 0, minima_mv: [] as number[] };
  const block = Math.max(1, Math.round((context.slow ? 0.002 : 0.0003) * voltage.rate_hz));
  for (const { from_s, to_s } of windows) {
    if (to_s <= from_s) continue;
    const inside = spikes.filter((spike) => startOf(spike) >= from_s && startOf(spike) < to_s);
    found.spikes += inside.length;
    found.seconds += to_s - from_s;
    inside.slice(1).forEach((spike, k) => {
      const own = spike.values['diastolic_potential_mv'] ?? null;
      const lowest = own ?? lowestMean(voltage, peakOf(inside[k]!), peakOf(spike), block);
      if (lowest !== null) found.minima_mv.push(lowest);
    });
  }
  return found;
}

/** Lowest of the means over blocks: one noisy sample does not set it. */
function lowestMean(voltage: Signal, from_s: number, to_s: number, block: number): number | null {
  let lowest: number | null = null;
  const to = indexAt(voltage, to_s);
  for (let i = indexAt(voltage, from_s); i + block <= to; i += block) {
    const value = meanWithin(voltage.samples, i, i + block);
    if (value !== null && (lowest === null || value < lowest)) lowest = value;
  }
  return lowest;
}
