/** Action currents that the clamp did not hold: inward, a millisecond wide, all or none, at times of their own. */
import { madToSd, median, quantile } from '../signal/statistics.ts';
import type { CommandEdge } from './clamp-fit.ts';
import { absent, measured } from './reading.ts';
import { indexAt, type Stretch, timeAt } from './stretches.ts';
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
 * the sodium current that the clamp does hold is expected, and for the start of the recording, which may follow one).
 * @param current pA, inward negative
 */
export function escapedCurrents(current: Signal, edges: readonly CommandEdge[]): Reading {
  const rate = current.rate_hz;
  // From the end of each answer to the command up to the next step: a level of its own each.
  const starts = [0, ...edges.map(({ at_s }) => indexAt(current, at_s))];
  const calm = starts.map((start, k): Stretch => {
    // A recording may begin in the answer to a step before it.
    const dead_ms = k > 0 && Math.abs(edges[k - 1]!.mv) <= small_mv * 1.001 ? afterSmall_ms : afterLarge_ms;
    const next = starts[k + 1] ?? current.samples.length + 2;
    return { from: start + Math.round((dead_ms * rate) / 1000), to: next - 2 };
  });
  const inward = aboveLocalMedian(current, calm);
  const sizes = inward.filter(Number.isFinite);
  if (sizes.length < 8) return absent('sweep-too-short');
  const noise = madToSd * (quantile(sizes.map(Math.abs), 0.5) ?? 0);
  const least = Math.max(leastEscaped_pa, timesNoise * noise);
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

/**
 * The current turned over, less the median of its surroundings in the same stretch; infinite outside the stretches, so
 * that nothing there, and no flank that comes from there, is a peak.
 */
function aboveLocalMedian({ samples, rate_hz }: Signal, stretches: readonly Stretch[]): Float64Array {
  const out = new Float64Array(samples.length).fill(Number.POSITIVE_INFINITY);
  const width = Math.max(8, Math.round((block_ms * rate_hz) / 1000));
  for (const { from, to } of stretches) {
    if (to - from < 8) continue;
    const blocks = Math.max(1, Math.round((to - from) / width));
    const edge = (k: number): number => from + Math.round((k * (to - from)) / blocks);
    const levels = Array.from({ length: blocks }, (_, k) => median(samples.subarray(edge(k), edge(k + 1))) ?? 0);
    for (let i = from; i < to; i++) {
      const place = Math.min(blocks - 1, Math.max(0, ((i - from) * blocks) / (to - from) - 0.5));
      const below = Math.max(0, Math.min(blocks - 2, Math.floor(place)));
      const level = levels[below]! + ((levels[below + 1] ?? levels[below]!) - levels[below]!) * (place - below);
      out[i] = Number.isFinite(samples[i]!) ? level - samples[i]! : 0;
    }
  }
  return out;
}
