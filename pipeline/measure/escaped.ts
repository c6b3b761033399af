/** Action currents that the clamp did not hold: inward, a millisecond wide, all or none, at times of their own. */
import { median, quantile } from '../signal/statistics.ts';
import type { CommandEdge } from './clamp-fit.ts';
import { absent, measured } from './reading.ts';
import { indexAt, timeAt } from './stretches.ts';
import type { Reading, Signal } from './types.ts';

/** Smallest action current, pA, and as a multiple of the noise: a synaptic current is smaller. Ours. */
export const leastEscaped_pa = 200;
const timesNoise = 8;
/** Width at half its size, ms: narrower is an artefact of the command, wider a current that the clamp holds. */
const narrowest_ms = 0.15;
const widest_ms = 4;
/** The answer to the command itself, ms after a small step and after one that opens channels. */
const afterSmall_ms = 3;
const afterLarge_ms = 6;
const small_mv = 20;
/** The level that a current stands out from is the median over so many ms, between them along straight lines. */
const block_ms = 20;

/**
 * Counts escaped action currents: inward peaks of at least 200 pA and eight times the noise above the median of the 20 ms
 * around, 0.15 to 4 ms wide at half their size, not within 3 ms of a step of the command (6 ms for one above 20 mV, where
 * the sodium current that the clamp does hold is expected).
 * @param current pA, inward negative
 */
export function escapedCurrents(current: Signal, edges: readonly CommandEdge[]): Reading {
  const rate = current.rate_hz;
  const inward = aboveLocalMedian(current);
  if (!inward) return absent('sweep-too-short');
  const noise = 1.4826 * (quantile(Float64Array.from(inward.filter(Number.isFinite), Math.abs), 0.5) ?? 0);
  const least = Math.max(leastEscaped_pa, timesNoise * noise);
  for (const { at_s, mv } of edges) {
    const dead_ms = Math.abs(mv) > small_mv * 1.001 ? afterLarge_ms : afterSmall_ms;
    inward.fill(0, Math.max(0, indexAt(current, at_s) - 2), indexAt(current, at_s + dead_ms / 1000));
  }
  const found: number[] = [];
  for (let i = 1; i + 1 < inward.length; i++) {
    const size = inward[i]!;
    if (!(size >= least && size >= inward[i - 1]! && size > inward[i + 1]!)) continue;
    let from = i;
    let to = i;
    while (from > 0 && inward[from]! > size / 2 && inward[from]! <= size) from--;
    while (to + 1 < inward.length && inward[to]! > size / 2 && inward[to]! <= size) to++;
    // A higher sample on the way down to the half: this is a shoulder of another peak.
    if (inward[from]! > size / 2 || inward[to]! > size / 2) continue;
    const width_ms = ((to - from - 1) * 1000) / rate;
    if (width_ms >= narrowest_ms && width_ms <= widest_ms) found.push(i);
  }
  const first = found[0];
  return measured(found.length, {
    ...(first === undefined
      ? {}
      : { at: { from_s: timeAt(current, first), to_s: timeAt(current, found.at(-1)! + 1) } }),
    ...(first === undefined
      ? {}
      : {
          note: `of about ${Math.round(median(found.map((i) => inward[i]!))!)} pA, the first at ${timeAt(current, first).toFixed(4)} s`,
        }),
  });
}

/** The current turned over, less the median of its surroundings; null where the sweep is shorter than two blocks. */
function aboveLocalMedian(current: Signal): Float64Array | null {
  const { samples, rate_hz } = current;
  const width = Math.round((block_ms * rate_hz) / 1000);
  const blocks = Math.floor(samples.length / width);
  if (blocks < 2 || width < 8) return null;
  const levels = Array.from({ length: blocks }, (_, k) => median(samples.subarray(k * width, (k + 1) * width)) ?? 0);
  return samples.map((value, i) => {
    const place = Math.min(blocks - 1, Math.max(0, i / width - 0.5));
    const below = Math.min(blocks - 2, Math.floor(place));
    const level = levels[below]! + (levels[below + 1]! - levels[below]!) * (place - below);
    return Number.isFinite(value) ? level - value : 0;
  });
}
