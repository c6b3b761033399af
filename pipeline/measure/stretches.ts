import { median } from '../signal/statistics.ts';
import type { Level } from './stimulus.ts';
import type { Signal, Spike, Stimulus } from './types.ts';

/** A half-open range of sample indices. */
export interface Stretch {
  from: number;
  to: number;
}

/** Index of the first sample at or after a time, held inside the signal. Times come from rates: rounding is allowed. */
export function indexAt(signal: Signal, time_s: number): number {
  const index = Math.ceil((time_s - signal.start_s) * signal.rate_hz - 1e-6);
  return Math.max(0, Math.min(signal.samples.length, index));
}

export const timeAt = (signal: Signal, index: number): number => signal.start_s + index / signal.rate_hz;

/** What remains of `whole` when every one of `holes` is taken out. Holes may overlap and come in any order. */
export function without(whole: Stretch, holes: readonly Stretch[]): Stretch[] {
  const kept: Stretch[] = [];
  let at = whole.from;
  for (const hole of holes.toSorted((a, b) => a.from - b.from)) {
    if (hole.to <= at || hole.from >= whole.to) continue;
    if (hole.from > at) kept.push({ from: at, to: hole.from });
    at = Math.max(at, hole.to);
  }
  if (at < whole.to) kept.push({ from: at, to: whole.to });
  return kept;
}

/** Half-open ranges without unreadable samples inside a stretch. */
export function readable(samples: Float64Array, within: Stretch): Stretch[] {
  const found: Stretch[] = [];
  let start = -1;
  for (let i = within.from; i <= within.to; i++) {
    const finite = i < within.to && Number.isFinite(samples[i]!);
    if (finite && start < 0) start = i;
    if (!finite && start >= 0) {
      found.push({ from: start, to: i });
      start = -1;
    }
  }
  return found;
}

/** Readable samples of several stretches, one after the other. */
export function gathered(samples: Float64Array, stretches: readonly Stretch[]): Float64Array {
  const out = new Float64Array(stretches.reduce((sum, one) => sum + one.to - one.from, 0));
  let count = 0;
  for (const { from, to } of stretches)
    for (let i = from; i < to; i++) if (Number.isFinite(samples[i]!)) out[count++] = samples[i]!;
  return out.subarray(0, count);
}

/** Where the spike begins and where it is over for the purposes of a baseline, s. */
export function spikeSpan(
  spike: Spike,
  next: Spike | undefined,
  slow: boolean,
): { from_s: number; to_s: number } | null {
  const peak = spike.values['peak_at_s'] ?? null;
  if (peak === null) return null;
  const threshold = spike.values['threshold_at_s'] ?? peak - 0.002;
  const nextPeak = next?.values['peak_at_s'] ?? Number.POSITIVE_INFINITY;
  const apd90 = spike.values['apd90_ms'] ?? null;
  const repolarization = spike.values['repolarization_ms'] ?? null;
  // After a lone spike its afterhyperpolarization is left out too; in a train little else than that would be left.
  const tail_s = slow
    ? ((apd90 ?? 300) * 1.2) / 1000
    : nextPeak - peak < 0.12
      ? Math.min(0.4 * (nextPeak - peak), (repolarization ?? 3) / 1000 + 0.005)
      : 0.06;
  // A paced heart cell is pulled up by its stimulus for some milliseconds before threshold.
  return { from_s: threshold - (slow ? 0.01 : 0.002), to_s: peak + tail_s };
}

export function spikeHoles(voltage: Signal, spikes: readonly Spike[], slow: boolean): Stretch[] {
  return spikes.flatMap((spike, k) => {
    const span = spikeSpan(spike, spikes[k + 1], slow);
    return span ? [{ from: indexAt(voltage, span.from_s), to: indexAt(voltage, span.to_s) }] : [];
  });
}

/**
 * Where a heart or calcium cell is not in diastole: further up than three tenths of the way from the diastolic level to
 * the peak, medians of the sweep's spikes. A sweep that begins on a plateau has no spike there to be cut out.
 */
export function plateauHoles(voltage: Signal, spikes: readonly Spike[]): Stretch[] {
  const known = (id: string): number | null => median(spikes.flatMap((spike) => spike.values[id] ?? []));
  const [low, high] = [known('diastolic_potential_mv'), known('peak_mv')];
  if (low === null || high === null) return [];
  const level = low + 0.3 * (high - low);
  const holes: Stretch[] = [];
  let from = -1;
  for (let i = 0; i <= voltage.samples.length; i++) {
    const above = i < voltage.samples.length && voltage.samples[i]! > level;
    if (above && from < 0) from = i;
    if (!above && from >= 0) {
      // The foot of the fall is no diastole yet.
      holes.push({ from, to: i + Math.round(0.05 * voltage.rate_hz) });
      from = -1;
    }
  }
  return holes;
}

/**
 * Where the stimulus is not at its holding level, and `after_s` longer: the time the membrane needs to come back.
 * Nothing where no stimulus is known.
 */
export function stimulusHoles(
  voltage: Signal,
  stimulus: Stimulus,
  levels: readonly Level[],
  after_s: number,
): Stretch[] {
  if (stimulus.onset_s === null || stimulus.end_s === null) return [];
  const hole = (from_s: number, to_s: number): Stretch => ({
    from: indexAt(voltage, from_s),
    to: indexAt(voltage, to_s + after_s),
  });
  const holes = [hole(stimulus.onset_s, stimulus.end_s)];
  if (stimulus.holding === null) return holes;
  const reach = Math.max(...levels.map((one) => Math.abs(one.level - stimulus.holding!)), 0);
  for (const one of levels)
    if (Math.abs(one.level - stimulus.holding) > 0.02 * reach) holes.push(hole(one.from_s, one.to_s));
  return holes;
}

/**
 * Delay of a slow signal through the recorder's filter, ms: 0.336 over the corner for a four-pole Bessel filter (its
 * phase at low frequencies, 2.114/(2π·corner)); other common filters of that order delay by 0.3 to 0.42 over it.
 */
export const filterDelayMs = (filterKhz: number | null): number => (filterKhz === null ? 0 : 0.336 / filterKhz);
