/** What the page of one cell shows, worked out from its row and its sweeps. Pure. */

import type { Finding, Outcome } from '../../pipeline/judge/types.ts';
import type { CellRow, SweepRow } from '../../pipeline/ledger/types.ts';
import { absenceSentences } from '../../pipeline/measure/absence.ts';
import { quantitiesOf } from '../../pipeline/measure/quantities.ts';
import type { ConditionMeasure, Reading, Spike } from '../../pipeline/measure/types.ts';
import { number, printed, rounded } from '../format.ts';
import { factLabel } from '../words.ts';

const outcomeRank: Record<Outcome, number> = { outside: 0, 'near limit': 1, 'not measured': 2, within: 3 };

export interface FindingGroup {
  check: string;
  outcome: Outcome;
  /** The finding that speaks for the group: the worst. */
  leading: Finding;
  /** Sweeps concerned; empty for the cell as a whole. */
  sweeps: number[];
  condition: string;
}

/** Findings of one check, outcome and condition as one entry; worst outcome first, registry order kept within. */
export function groupFindings(findings: readonly Finding[], outcomes: readonly Outcome[]): FindingGroup[] {
  const groups = new Map<string, FindingGroup>();
  for (const finding of findings) {
    if (!outcomes.includes(finding.outcome)) continue;
    const key = [finding.check, finding.outcome, finding.condition].join('\n');
    const had = groups.get(key);
    if (!had) {
      groups.set(key, {
        check: finding.check,
        outcome: finding.outcome,
        leading: finding,
        sweeps: finding.sweep === null ? [] : [finding.sweep],
        condition: finding.condition,
      });
      continue;
    }
    if (finding.sweep !== null) had.sweeps.push(finding.sweep);
    if ((finding.margin ?? 0) < (had.leading.margin ?? 0)) had.leading = finding;
  }
  return [...groups.values()].sort((a, b) => outcomeRank[a.outcome] - outcomeRank[b.outcome]);
}

/** '3–5, 9': runs of sweep numbers. */
export function runs(list: readonly number[]): string {
  const sorted = [...new Set(list)].sort((a, b) => a - b);
  const parts: string[] = [];
  for (let i = 0; i < sorted.length; ) {
    let end = i;
    while (sorted[end + 1] === sorted[end]! + 1) end++;
    parts.push(end === i ? String(sorted[i]) : `${sorted[i]}–${sorted[end]}`);
    i = end + 1;
  }
  return parts.join(', ');
}

/** 'at most 60.5', '25 to 300', with the quantity's decimals; '' where there is no limit. */
export function limitText(finding: Finding): string {
  const { limit_low: low, limit_high: high, quantity: id } = finding;
  const one = (value: number): string => printed(id, value);
  if (low !== null && high !== null) return `${one(low)} to ${one(high)}`;
  if (high !== null) return `at most ${one(high)}`;
  if (low !== null) return `at least ${one(low)}`;
  return '';
}

export interface QuantityRow {
  id: string;
  label: string;
  symbol: string;
  unit: string;
  /** One for each condition of the cell. */
  readings: (Reading | null)[];
  /** Judgements of the cell's first condition on this quantity, worst first. */
  findings: Finding[];
}

/** Every cell-level quantity that any condition has, in the registry's order. */
export function quantityRows(cell: CellRow): QuantityRow[] {
  const first = cell.measure.conditions[0]?.condition;
  return quantitiesOf('cell').flatMap(({ id, label, symbol, unit }) => {
    const readings = cell.measure.conditions.map((one) => one.readings[id] ?? null);
    // What is not given for this kind of cell or in its clamp mode is no gap in its numbers.
    if (
      readings.every(
        (reading) => reading === null || reading.why === 'not-this-class' || reading.why === 'not-this-clamp',
      )
    )
      return [];
    const findings = cell.judgement.findings
      .filter(
        (one) => one.quantity === id && one.sweep === null && one.condition === first && one.outcome !== 'not measured',
      )
      .sort((a, b) => outcomeRank[a.outcome] - outcomeRank[b.outcome]);
    return [{ id, label, symbol, unit, readings, findings }];
  });
}

/** Why a number is missing, with the facts that would help. */
export function absenceText(reading: Reading): string {
  const sentence = reading.why ? absenceSentences[reading.why] : 'not measured';
  const missing = reading.missing ?? [];
  return missing.length === 0 ? sentence : `${sentence}: ${missing.map(factLabel).join(', ')}`;
}

/** A number with its half-width, spread and count, each as printed; '' for what is not known. */
export interface PrintedReading {
  value: string;
  u95: string;
  sd: string;
  n: string;
}

/** @returns null where there is no number */
export function printedReading(id: string, reading: Reading | null): PrintedReading | null {
  if (reading === null || reading.value === null) return null;
  const { value, u95, decimals } = rounded(id, reading.value, reading.u95);
  return {
    value,
    u95: u95 === '' ? '' : `±\u00a0${u95}`,
    // A spread is told no finer than the number it belongs to.
    sd: reading.sd === undefined ? '' : number(reading.sd, Math.max(0, decimals)),
    n: reading.n === undefined ? '' : number(reading.n),
  };
}

export interface SpikeValue {
  id: string;
  label: string;
  unit: string;
  printed: PrintedReading | null;
  /** Why there is no number; '' where there is one. */
  why: string;
}

/** Every quantity of one spike that is given for its kind of cell, in the registry's order. */
export const spikeValues = (spike: Spike): SpikeValue[] =>
  quantitiesOf('spike').flatMap(({ id, label, unit }) => {
    const value = spike.values[id];
    if (value === undefined || spike.why[id] === 'not-this-class') return [];
    const reading: Reading = value === null ? { value: null } : { value, ...halfWidth(spike.u95?.[id]) };
    const why = spike.why[id];
    return [
      {
        id,
        label,
        unit,
        printed: printedReading(id, reading),
        why: value === null && why ? absenceSentences[why] : '',
      },
    ];
  });

const halfWidth = (u95: number | undefined): Pick<Reading, 'u95'> => (u95 === undefined ? {} : { u95 });

/** The sweep whose first spike is shown, with that excerpt: rheobase's where there is one. */
export function shownSpike(condition: ConditionMeasure | undefined, sweeps: readonly SweepRow[]) {
  const wanted = condition?.reference_spike;
  const withExcerpt = sweeps.filter((sweep) => sweep.first_spike !== null && sweep.spikes.length > 0);
  const sweep =
    withExcerpt.find((one) => one.sweep === wanted?.sweep) ??
    withExcerpt.find((one) => one.condition === condition?.condition);
  if (!sweep?.first_spike) return null;
  const spike = sweep.spikes.find((one) => one.spike === sweep.first_spike!.spike) ?? sweep.spikes[0]!;
  return {
    sweep,
    spike,
    excerpt: sweep.first_spike,
    atRheobase: sweep.sweep === wanted?.sweep && condition?.readings['rheobase_pa']?.value != null,
  };
}

/** Strips of the session, in this order, where at least two sweeps have the quantity. */
export const sessionQuantities = [
  'baseline_mv',
  'access_resistance_mohm',
  'bridge_step_mv',
  'spike_height_mv',
  'half_width_ms',
  'max_rise_v_per_s',
  'noise_rms_mv',
  'mains_hum_mv',
  'holding_pa',
  'membrane_resistance_mohm',
  'cell_capacitance_pf',
  'holding_current_pa',
] as const;

/** Columns of the table of sweeps: those that any sweep fills. */
export function sweepColumns(sweeps: readonly SweepRow[]): string[] {
  return quantitiesOf('sweep')
    .map(({ id }) => id)
    .filter((id) => sweeps.some((sweep) => (sweep.readings[id]?.value ?? null) !== null));
}
