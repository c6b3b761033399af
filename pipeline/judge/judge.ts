/**
 * Findings, standing and usable stretch of one cell.
 *
 * Every condition is judged by itself: a drug that blocks the spike is not a dying cell. In the cell's first condition
 * every check counts. In later ones all checks report, and those count towards the standing that a drug cannot move:
 * physics (with the solutions of that condition) and what concerns the instrument (clipping, missing samples, noise, hum,
 * sampling, filter, access, bridge). Class ranges, drift, a lost or depolarized potential and the lab's limits on what
 * the cell does are reported there and leave the standing alone.
 *
 * A check made on every sweep costs the sweep its place in the usable stretch; what counts towards the standing is the
 * summary for the condition as a whole.
 */
import { quantity } from '../measure/quantities.ts';
import { check, checks, policyEntry, statementCheck } from './checks.ts';
import { askClass } from './class-checks.ts';
import { type Comparison, compareReadings } from './compare.ts';
import { conditionLimits, conditionQuestions, sweepQuestions } from './conditions.ts';
import { physicsQuestions } from './physics.ts';
import { askPolicy, askPolicySweep } from './policy.ts';
import { count, tell, tellMissing } from './sentences.ts';
import { type Answer, type Held, isPresent, type Setting } from './setting.ts';
import type { CheckEntry, Contradiction, Finding, JudgeInput, Judgement, Standing } from './types.ts';
import { usableStretch } from './usable.ts';

interface Place {
  condition: string;
  /** The condition's name where it is not the cell's first. */
  named: string | null;
  sweep: number | null;
}

/**
 * Where a number should carry a half-width and does not, the comparison was made without it, and says so. Counts and
 * settings have none to carry.
 */
function unknownHalfWidth(quantityId: string, answer: Held): string {
  if (answer.reading.u95 !== undefined || quantity(quantityId).uncertainty === undefined) return '';
  return answer.standIn ?? 'The number’s own uncertainty is not known and was not counted.';
}

/** An answer held against its limits. */
function settle(entry: CheckEntry, answer: Answer, place: Place, remark = ''): Finding {
  const shared = {
    check: entry.id,
    ground: entry.ground,
    quantity: entry.quantity,
    condition: place.condition,
    sweep: place.sweep,
    causes: entry.causes,
    bench: entry.bench,
  };
  if (answer.kind === 'unheld')
    return {
      ...shared,
      outcome: 'not measured',
      value: null,
      value_u95: null,
      uncertainty: null,
      limit_low: null,
      limit_high: null,
      margin: null,
      at_s: null,
      sentence: tellMissing(answer.subject, answer.why, answer.missing, place.named),
      source: entry.source,
      missing: answer.missing,
    };
  const { reading, low, high, uncertainty, shifts } = answer;
  const comparison: Comparison = compareReadings(reading.value, shifts, low, high, uncertainty);
  // A median has no place of its own: `at` then names the sweep nearest to it.
  const single = (reading.n ?? 1) <= 1 || entry.quantity === 'rise_samples';
  const readAt = place.sweep === null && single ? reading.at?.sweep : undefined;
  const judged = answer.quantity ?? entry.quantity;
  return {
    ...shared,
    quantity: judged,
    outcome: comparison.outcome,
    value: reading.value,
    value_u95: reading.u95 ?? null,
    uncertainty,
    limit_low: low,
    limit_high: high,
    margin: comparison.margin,
    at_s: single ? (reading.at?.from_s ?? null) : null,
    sentence: tell({
      quantity: judged,
      subject: readAt === undefined ? answer.subject : `${answer.subject} (sweep ${readAt})`,
      value: reading.value,
      u95: reading.u95 ?? null,
      // Of a sweep, n counts samples; of an extreme, what it was picked from.
      n: place.sweep === null && entry.quantity !== 'rise_samples' ? (reading.n ?? null) : null,
      low,
      high,
      lowName: answer.lowName,
      highName: answer.highName,
      comparison,
      uncertainty,
      meaning: answer.meaning,
      condition: place.named,
      remark: [answer.remark ?? '', unknownHalfWidth(judged, answer), remark].filter(Boolean).join(' '),
    }),
    source: answer.source ?? entry.source,
    missing: [],
  };
}

/** Whether the recording holds the clamp mode that a check's number comes from. */
function applies(entry: CheckEntry, setting: Setting): boolean {
  const { clamp } = quantity(entry.quantity);
  return clamp === 'both' || setting.sweeps.some((sweep) => sweep.clamp === clamp);
}

/** The condition as a whole, and each of its sweeps that is not within. */
function withSweeps(
  entry: CheckEntry,
  setting: Setting,
  place: Place,
  whole: Answer | null,
  each: ((sweep: Setting['sweeps'][number]) => Answer | null) | null,
): Finding[] {
  const asked = setting.sweeps.flatMap((sweep) => {
    const answer = each?.(sweep) ?? null;
    return answer ? [settle(entry, answer, { ...place, sweep: sweep.sweep })] : [];
  });
  const outside = asked.filter((finding) => finding.outcome === 'outside').length;
  const remark = outside > 0 ? `Outside in ${outside} of ${count(asked.length, 'sweep')}.` : '';
  return [
    ...(whole ? [settle(entry, whole, place, remark)] : []),
    ...asked.filter((finding) => finding.outcome === 'near limit' || finding.outcome === 'outside'),
  ];
}

function judgeCondition(setting: Setting, place: Place, input: JudgeInput): Finding[] {
  const held = checks.filter((entry) => entry.quantity !== '' && applies(entry, setting));
  const findings = held.flatMap((entry) => {
    if (entry.ground === 'class') {
      const answer = askClass(setting, entry.quantity);
      return answer ? [settle(entry, answer, place)] : [];
    }
    const question = entry.ground === 'physics' ? physicsQuestions[entry.id] : conditionQuestions[entry.id];
    const each = entry.ground === 'conditions' ? sweepQuestions[entry.id] : undefined;
    return withSweeps(
      entry,
      setting,
      place,
      question?.(setting) ?? null,
      each ? (sweep) => each(setting, sweep) : null,
    );
  });
  const policy = input.policy.flatMap((rule) => {
    const entry = policyEntry(rule.quantity);
    if (!applies(entry, setting)) return [];
    return withSweeps(entry, setting, place, askPolicy(setting, rule), (sweep) => askPolicySweep(rule, sweep));
  });
  return [...findings, ...policy];
}

/** A contradiction found outside judging, as a finding. */
function contradictionFinding(contradiction: Contradiction, condition: string): Finding {
  const entry = check(statementCheck(contradiction.kind));
  const sentence = contradiction.sentence.trim();
  return {
    check: entry.id,
    ground: entry.ground,
    quantity: entry.quantity,
    outcome: 'outside',
    condition,
    sweep: null,
    value: null,
    uncertainty: null,
    limit_low: null,
    limit_high: null,
    margin: null,
    at_s: null,
    sentence: /[.!?]$/.test(sentence) ? sentence : `${sentence}.`,
    causes: entry.causes,
    bench: contradiction.remedy || entry.bench,
    source: contradiction.place || entry.source,
    missing: [],
  };
}

/** Quantities of the instrument: no drug moves them. */
const instrument: ReadonlySet<string> = new Set([
  'rise_samples',
  'sample_interval_us',
  'access_resistance_mohm',
  'access_change_percent',
  'bridge_error_mohm',
  'clipped_fraction',
  'missing_fraction',
  'mains_hum_mv',
  'mains_hum_hz',
  'noise_rms_mv',
  'quantum_mv',
]);

/** Whether a finding counts towards the standing; see the head of this file. */
function counts(finding: Finding, firstCondition: string): boolean {
  if (finding.outcome !== 'outside' || finding.sweep !== null) return false;
  return (
    finding.condition === firstCondition ||
    finding.ground === 'physics' ||
    finding.check === 'filter-passes-rise' ||
    instrument.has(finding.quantity)
  );
}

/** Conditions that leave nothing measurable: no cell, or an amplifier that was saturated for most of the time. */
const leavesNothing = (finding: Finding): boolean =>
  finding.check === 'no-cell' || (finding.check === 'clipping' && (finding.value ?? 0) > 0.5);

const grave = (finding: Finding): boolean =>
  finding.ground === 'physics' || finding.ground === 'policy' || leavesNothing(finding);

const groundOrder: readonly Finding['ground'][] = ['physics', 'policy', 'conditions', 'class', 'lab'];

/** Excess in units of its uncertainty (and a twentieth of the limit, where the uncertainty is nil). */
function excess(finding: Finding): number {
  if (finding.margin === null) return 0;
  const scale = Math.max(Math.abs(finding.limit_low ?? 0), Math.abs(finding.limit_high ?? 0)) / 20;
  return -finding.margin / ((finding.uncertainty ?? 0) + scale + 1e-9);
}

const worstFirst = (a: Finding, b: Finding): number =>
  Number(grave(b)) - Number(grave(a)) ||
  groundOrder.indexOf(a.ground) - groundOrder.indexOf(b.ground) ||
  excess(b) - excess(a) ||
  (a.check < b.check ? -1 : a.check > b.check ? 1 : 0);

/** Numbers that any file yields, whatever is in it. */
const incidental: ReadonlySet<string> = new Set([
  'sample_interval_us',
  'missing_fraction',
  'clipped_fraction',
  'quantum_mv',
  'spikes',
  'minutes_since_break_in',
  // What was asked of the cell, not what it answered.
  'command_mv',
  'stimulus_pa',
]);

/** Counts of events: finding none in a recording too short or empty for anything else is no measurement. */
const eventCounts: ReadonlySet<string> = new Set([
  'doublets',
  'bursts',
  'spikelets',
  'rebound_spikes',
  'escaped_currents',
]);

function nothingMeasured(input: JudgeInput): boolean {
  const substantial = (readings: Setting['measure']['readings']): boolean =>
    Object.entries(readings).some(
      ([id, reading]) => !incidental.has(id) && isPresent(reading) && !(eventCounts.has(id) && reading.value === 0),
    );
  return (
    input.sweeps.length === 0 ||
    !(
      input.measure.conditions.some((condition) => substantial(condition.readings)) ||
      input.sweeps.some((sweep) => substantial(sweep.readings))
    )
  );
}

const sentenceOf = (text: string): string => (/[.!?]$/.test(text.trim()) ? text.trim() : `${text.trim()}.`);

/**
 * Judges one cell. Pure: the same input gives the same judgement, and bad numbers in it give `not measured`, never an
 * exception.
 * @param input the cell's quantities, its sweeps, one set of circumstances for each condition in the same order
 * @returns every outcome, `within` included; the standing with its reasons, worst first; the usable stretch
 * @throws RangeError when circumstances and conditions do not pair up, or a policy rule names no known quantity
 */
export function judgeCell(input: JudgeInput): Judgement {
  const { conditions } = input.measure;
  if (input.circumstances.length !== conditions.length)
    throw new RangeError(
      `circumstances must pair with the cell's conditions: got ${input.circumstances.length} for ${conditions.length} (cell ${input.cell})`,
    );
  const allSweeps = [...input.sweeps].sort((a, b) => a.sweep - b.sweep);
  const settings = conditions.map((measure, index): Setting => {
    const own = new Set(measure.sweeps);
    return {
      measure,
      circumstances: input.circumstances[index]!,
      sweeps: allSweeps.filter((sweep) => own.has(sweep.sweep)),
      allSweeps,
    };
  });
  const firstCondition = conditions[0]?.condition ?? '';
  const measured = settings.flatMap((setting, index) =>
    judgeCondition(
      setting,
      {
        condition: setting.measure.condition,
        named: index === 0 ? null : setting.measure.condition,
        sweep: null,
      },
      input,
    ),
  );
  const stated = input.contradictions.map((one) => contradictionFinding(one, firstCondition));
  const findings = [...measured, ...stated];
  const counted = findings.filter((finding) => counts(finding, firstCondition)).sort(worstFirst);
  const unreadable = counted.find((finding) => finding.check === 'missing' && finding.condition === firstCondition);
  const unreadReasons = input.unread.map(sentenceOf);
  const nothing = nothingMeasured(input);
  const standing: Standing =
    nothing || unreadable ? 'unread' : counted.some(grave) ? 'unsound' : counted.length > 0 ? 'caution' : 'sound';
  const reasons = (() => {
    const sentences = counted.map((finding) => finding.sentence);
    if (nothing) return [...(unreadReasons.length > 0 ? unreadReasons : [nothingSentence(input)]), ...sentences];
    if (unreadable)
      return [unreadable.sentence, ...unreadReasons, ...sentences.filter((text) => text !== unreadable.sentence)];
    if (standing === 'sound') return [];
    return [...sentences, ...unreadReasons];
  })();
  return {
    standing,
    reasons,
    findings,
    usable: nothing ? null : usableStretch(settings, input.policy),
    explanations: [],
  };
}

/** The share of unreadable values above which a recording is unread. */
export const unreadAbove = conditionLimits.missingFraction;

/** Why a cell whose files could be read still gave no number. */
function nothingSentence({ sweeps }: JudgeInput): string {
  const withoutCommand =
    sweeps.length > 0 && sweeps.every((sweep) => sweep.clamp === 'voltage' && sweep.voltage_envelope === null);
  const withoutCurrent =
    sweeps.length > 0 &&
    sweeps.every((sweep) => sweep.clamp === 'voltage' && sweep.readings['holding_current_pa']?.why === 'no-current');
  if (withoutCurrent)
    return 'Recorded in voltage clamp, and its current could not be read: nothing can be said of the cell. See what the file is missing.';
  return withoutCommand
    ? 'Recorded in voltage clamp without its command: nothing fires there, and no resistance or capacitance can be read. State or record the command potential.'
    : 'Nothing could be measured in this recording.';
}
