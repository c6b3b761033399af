/** The longest run of sweeps that meets the limits, and why it ends where it ends. */
import type { NumberedSweep } from '../measure/types.ts';
import { compare, measuredUncertainty } from './compare.ts';
import { conditionLimits, sweepQuestions } from './conditions.ts';
import { askPolicySweep } from './policy.ts';
import { amount, count, difference } from './sentences.ts';
import { type Answer, isPresent, medianOf, type Setting } from './setting.ts';
import type { PolicyRule, UsableStretch } from './types.ts';

/** How far the baseline may lie from the condition's median at the same holding current, mV (common practice, no source). */
export const baselineToleranceMv = conditionLimits.driftMv;
/** Least height of a sweep's first spike, as a share of the condition's median (common practice, no source). */
export const leastHeightShare = 0.8;

const first = (sweep: NumberedSweep): number | null => sweep.spikes[0]?.values['spike_height_mv'] ?? null;

/** Holding current to the nearest pA; null where it is not known. */
const holdingOf = (sweep: NumberedSweep): number | null => {
  const reading = sweep.readings['holding_pa'];
  return isPresent(reading) ? Math.round(reading.value) : null;
};

/** Held alike: within 10 pA or a tenth of each other, or both with unknown holding. */
function heldAlike(a: number | null, b: number | null): boolean {
  if (a === null || b === null) return a === b;
  return Math.abs(a - b) <= Math.max(10, 0.1 * Math.max(Math.abs(a), Math.abs(b)));
}

/** What is usual in one condition, worked out once for all its sweeps. */
export interface Usual {
  setting: Setting;
  /** Median baseline of the sweeps held alike, by holding current. */
  baselines: ReadonlyMap<number | null, number>;
  /** Median height of the sweeps' first spikes; null where none fires. */
  height: number | null;
}

export function usualOf(setting: Setting): Usual {
  const held = setting.sweeps.flatMap((sweep) => {
    const baseline = sweep.readings['baseline_mv'];
    return sweep.clamp === 'current' && isPresent(baseline) ? [{ pa: holdingOf(sweep), mv: baseline.value }] : [];
  });
  const baselines = new Map(
    [...new Set(held.map((one) => one.pa))].map((pa) => [
      pa,
      medianOf(held.filter((one) => heldAlike(one.pa, pa)).map((one) => one.mv)),
    ]),
  );
  const heights = setting.sweeps.flatMap((sweep) => first(sweep) ?? []);
  return { setting, baselines, height: heights.length === 0 ? null : medianOf(heights) };
}

function beyond(answer: Answer | null): string | null {
  if (answer?.kind !== 'held') return null;
  const { reading, low, high, uncertainty } = answer;
  if (compare(reading.value, low, high, uncertainty).outcome !== 'outside') return null;
  return `${answer.subject} is outside its limit`;
}

/** Why a sweep is not usable, as half a sentence; null when it is. */
export function complaintOf(usual: Usual, sweep: NumberedSweep, policy: readonly PolicyRule[]): string | null {
  const asked = [
    ...Object.values(sweepQuestions).map((question) => beyond(question(usual.setting, sweep))),
    ...policy.map((rule) => beyond(askPolicySweep(rule, sweep))),
  ].find((complaint) => complaint !== null);
  if (asked) return asked;
  if (sweep.clamp !== 'current') return null;
  const baseline = sweep.readings['baseline_mv'];
  if (isPresent(baseline)) {
    const middle = usual.baselines.get(holdingOf(sweep))!;
    const away = baseline.value - middle;
    if (Math.abs(away) > baselineToleranceMv + measuredUncertainty(baseline))
      return `its baseline, ${amount('baseline_mv', baseline.value)}, lies ${difference('baseline_mv', away)} from the ${amount('baseline_mv', middle)} held otherwise`;
  } else if (baseline?.why === 'unreadable') return 'its samples could not be read';
  const height = first(sweep);
  if (height !== null && usual.height !== null) {
    const middle = usual.height;
    if (height + (sweep.spikes[0]?.u95?.['spike_height_mv'] ?? 0) < leastHeightShare * middle)
      return `its first spike, ${amount('spike_height_mv', height)} high, reaches less than ${leastHeightShare * 100} % of the usual ${amount('spike_height_mv', middle)}`;
  }
  return null;
}

/**
 * The longest run of consecutive sweeps (by number, over all conditions: a drug is no damage) without a complaint; the
 * earliest of equally long ones. A sweep is held against the limits of its own condition: clipping, missing samples,
 * hum, noise, access, drift, the lab's own limits; its baseline within 5 mV of the median at the same holding current;
 * its first spike at least 80 % of the median height.
 * @param settings one for each condition; @returns null where there is no sweep, or no usable one
 */
export function usableStretch(settings: readonly Setting[], policy: readonly PolicyRule[]): UsableStretch | null {
  const judged = settings
    .map(usualOf)
    .flatMap((usual) => usual.setting.sweeps.map((sweep) => ({ sweep, complaint: complaintOf(usual, sweep, policy) })))
    .sort((a, b) => a.sweep.sweep - b.sweep.sweep);
  let best: { from: number; length: number } | null = null;
  let from = 0;
  judged.forEach((one, index) => {
    if (one.complaint !== null) from = index + 1;
    else if (index - from + 1 > (best?.length ?? 0)) best = { from, length: index - from + 1 };
  });
  const found = best as { from: number; length: number } | null;
  if (!found) return null;
  const start = judged[found.from]!;
  const end = judged[found.from + found.length - 1]!;
  const before = judged[found.from - 1];
  const after = judged[found.from + found.length];
  const run =
    found.length === 1
      ? `Sweep ${start.sweep.sweep} (1 of ${judged.length}) meets the limits for single sweeps`
      : `Sweeps ${start.sweep.sweep} to ${end.sweep.sweep} (${found.length} of ${judged.length}) meet the limits for single sweeps`;
  const why = (one: (typeof judged)[number]): string => `sweep ${one.sweep.sweep}: ${one.complaint}`;
  const edges = [before ? `It starts after ${why(before)}.` : '', after ? `It ends before ${why(after)}.` : ''].filter(
    Boolean,
  );
  const sentence =
    found.length === judged.length
      ? `${judged.length === 1 ? 'The only sweep meets' : `All ${count(judged.length, 'sweep')} meet`} the limits for single sweeps.`
      : `${run}. ${edges.join(' ')}`;
  return {
    from_sweep: start.sweep.sweep,
    to_sweep: end.sweep.sweep,
    sweeps: found.length,
    sentence,
  };
}
