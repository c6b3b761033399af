/** The lab's own limits from almanac.yaml, on any quantity of the registry. */
import type { NumberedSweep, Reading } from '../measure/types.ts';
import { measuredUncertainty } from './compare.ts';
import { labelOf } from './quantity-words.ts';
import { amount } from './sentences.ts';
import { type Answer, cellReading, isPresent, type Setting, unheldReading } from './setting.ts';
import type { PolicyRule } from './types.ts';

function ask(rule: PolicyRule, reading: Reading | undefined, subject: string): Answer {
  if (!isPresent(reading)) return unheldReading(subject, reading);
  const limit = (value: number | null): string =>
    value === null ? '' : `the lab’s limit of ${amount(rule.quantity, value)}`;
  return {
    kind: 'held',
    reading,
    low: rule.above,
    high: rule.below,
    uncertainty: measuredUncertainty(reading),
    shifts: [0],
    subject,
    lowName: limit(rule.above),
    highName: limit(rule.below),
    meaning: 'the lab does not accept that',
    source: rule.origin,
  };
}

/** A rule without a number limits nothing and is not asked. */
const limitsSomething = (rule: PolicyRule): boolean => rule.above !== null || rule.below !== null;

/** The condition's own number, else the median over its sweeps. */
export const askPolicy = (setting: Setting, rule: PolicyRule): Answer | null =>
  limitsSomething(rule) ? ask(rule, cellReading(setting, rule.quantity), `the ${labelOf(rule.quantity)}`) : null;

/** One sweep's number; null where the sweep has none. */
export function askPolicySweep(rule: PolicyRule, sweep: NumberedSweep): Answer | null {
  const reading = sweep.readings[rule.quantity];
  if (!limitsSomething(rule) || !isPresent(reading)) return null;
  return ask(rule, reading, `the ${labelOf(rule.quantity)} of sweep ${sweep.sweep}`);
}
