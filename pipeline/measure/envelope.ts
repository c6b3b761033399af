/** What pages draw of a sweep: the outline of the whole, and the first spike at full resolution. */
import { envelope } from '../signal/envelope.ts';
import type { Envelope, Excerpt, Signal, Spike } from './types.ts';

/**
 * Outline of a signal in at most `columns` equal stretches. Columns without a readable sample are listed in `gaps` as
 * half-open column ranges; between readable neighbours their bounds run straight across, so that every number is
 * finite and a drawing may break the line there.
 * @returns null where no sample is readable
 */
export function envelopeOf(signal: Signal, columns: number): Envelope | null {
  const { low, high } = envelope(signal.samples, columns);
  const readable = Array.from(low.keys()).filter((column) => Number.isFinite(low[column]!));
  if (readable.length === 0) return null;
  const gaps: [number, number][] = [];
  for (let column = 0; column < low.length; column++) {
    if (Number.isFinite(low[column]!)) continue;
    const last = gaps.at(-1);
    if (last && last[1] === column) last[1] = column + 1;
    else gaps.push([column, column + 1]);
  }
  for (const [from, to] of gaps) {
    const before = from > 0 ? from - 1 : to;
    const after = to < low.length ? to : from - 1;
    for (let column = from; column < to; column++) {
      const share = after === before ? 0 : (column - before) / (after - before);
      for (const bound of [low, high]) bound[column] = bound[before]! + (bound[after]! - bound[before]!) * share;
    }
  }
  return {
    start_s: signal.start_s,
    end_s: signal.start_s + signal.samples.length / signal.rate_hz,
    low: Array.from(low),
    high: Array.from(high),
    ...(gaps.length > 0 ? { gaps } : {}),
  };
}

/** Before threshold, s; and how many samples an excerpt may hold before neighbours are averaged. */
const lead_s = 0.005;
const mostSamples = 6000;

/**
 * The samples around one spike: from 5 ms before threshold (before the peak where threshold was not found) to the end
 * of its last phase. Cut where the samples become unreadable. Stretches above 6000 samples (slow spikes at a
 * high rate) are averaged in equal blocks, and `rate_hz` is that of the blocks.
 * @returns null where the spike has no peak in readable samples
 */
export function excerptOf(voltage: Signal, spike: Spike): Excerpt | null {
  const peak = spike.values['peak_at_s'] ?? null;
  const threshold = spike.values['threshold_at_s'] ?? null;
  if (peak === null) return null;
  const { samples, rate_hz: rate, start_s: start } = voltage;
  const index = (time_s: number): number => Math.round((time_s - start) * rate);
  const at = Math.max(0, Math.min(samples.length - 1, index(peak)));
  const ends = spike.phases.at(-1)?.to_s ?? peak + 0.01;
  let from = Math.max(0, index((threshold ?? peak) - lead_s));
  let to = Math.min(samples.length - 1, index(ends));
  for (let i = at; i >= from; i--)
    if (!Number.isFinite(samples[i]!)) {
      from = i + 1;
      break;
    }
  for (let i = at; i <= to; i++)
    if (!Number.isFinite(samples[i]!)) {
      to = i - 1;
      break;
    }
  if (!(to > from)) return null;
  const block = Math.ceil((to - from + 1) / mostSamples);
  const mv = Array.from({ length: Math.floor((to - from + 1) / block) }, (_, b) => {
    let sum = 0;
    for (let i = from + b * block; i < from + (b + 1) * block; i++) sum += samples[i]!;
    return sum / block;
  });
  return { spike: spike.spike, start_s: start + (from + (block - 1) / 2) / rate, rate_hz: rate / block, mv };
}
