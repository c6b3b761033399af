/** Made-up cells for the tests of judging: sound unless a test changes something. */

import { judgeCell } from '../../pipeline/judge/judge.ts';
import type { Circumstances, Finding, JudgeInput, Judgement } from '../../pipeline/judge/types.ts';
import type { NumberedSweep, Reading, Readings, Spike } from '../../pipeline/measure/types.ts';
import { coverage95 } from '../../pipeline/signal/coverage.ts';

/** A reading as measuring would give it: its 95 % half-width from the standard error, else from the spread of n values. */
export function read(value: number, more: Partial<Reading> = {}): Reading {
  const n = more.n ?? 1;
  const se = more.se ?? (more.sd !== undefined && n > 1 ? more.sd / Math.sqrt(n) : undefined);
  const u95 = se === undefined ? {} : { u95: coverage95(n > 1 ? n - 1 : undefined) * se };
  return { value, n: 1, ...u95, ...more };
}

export const circumstances = (changes: Partial<Circumstances> = {}): Circumstances => ({
  condition: 'baseline',
  class_id: 'deep-pyramidal',
  class_label: 'Layer 5 pyramidal neuron',
  like: 'cortical-pyramidal',
  temperature_c: 33,
  configuration: 'whole-cell',
  spike_ion: 'sodium',
  junction: 'uncorrected',
  ljp_mv: 14.2,
  ljp_from: 'stated',
  ljp_applied_mv: 14.2,
  reading: 'corrected',
  e_na: { mv: 60.5, uncertainty_mv: 1, inside_mm: 15, outside_mm: 150 },
  e_k: { mv: -104, uncertainty_mv: 1, inside_mm: 135, outside_mm: 2.6 },
  missing_e_na: [],
  missing_e_k: [],
  pipette_sodium_mm: 15,
  filter_khz: 8,
  mains_hz: 50,
  rate_hz: 50_000,
  bridge_mohm: 14,
  bias_pa: 0,
  ...changes,
});

export const spike = (number: number, values: Record<string, number | null> = {}): Spike => ({
  spike: number,
  values: { peak_at_s: 0.31 + number * 0.02, peak_mv: 32, spike_height_mv: 84, ahp_minimum_mv: -72, ...values },
  why: {},
  phases: [],
});

/** A step of 150 pA from 0.2 to 0.7 s at zero holding, with one spike. */
export const sweep = (number: number, changes: Partial<NumberedSweep> = {}): NumberedSweep => ({
  clamp: 'current',
  duration_s: 1,
  stimulus: {
    kind: 'step',
    from: 'channel',
    onset_s: 0.2,
    end_s: 0.7,
    amplitude: 150,
    holding: 0,
    edges_s: [0.2, 0.7],
  },
  spikes: [spike(0)],
  depolarization_block: false,
  remarks: [],
  voltage_envelope: null,
  current_envelope: null,
  first_spike: null,
  step_response: null,
  sweep: number,
  condition: 'baseline',
  since_start_s: number * 12,
  ...changes,
  readings: {
    holding_pa: read(0),
    stimulus_pa: read(150),
    baseline_mv: read(-79),
    baseline_drift_mv_per_s: read(0.2),
    clipped_fraction: read(0),
    missing_fraction: read(0),
    noise_rms_mv: read(0.1),
    mains_hum_mv: read(0.08),
    ...changes.readings,
  },
});

export const soundReadings: Readings = {
  threshold_mv: read(-52),
  peak_mv: read(32),
  spike_height_mv: read(84),
  height_from_rest_mv: read(111),
  half_width_ms: read(0.9),
  max_rise_v_per_s: read(380),
  ahp_minimum_mv: read(-72),
  rise_samples: read(14),
  resting_potential_mv: read(-79, { n: 12, sd: 0.6 }),
  baseline_mv: read(-79, { n: 12, sd: 0.6 }),
  input_resistance_mohm: read(90, { se: 1 }),
  membrane_time_constant_ms: read(14, { se: 0.5 }),
  membrane_capacitance_pf: read(155, { se: 6 }),
  sag_fraction: read(0.1),
  max_rate_hz: read(42),
  rate_gain_hz_per_na: read(70),
  access_resistance_mohm: read(14),
  access_change_percent: read(8),
  bridge_error_mohm: read(0.4, { se: 0.1 }),
  drift_mv_per_min: read(0.1, { se: 0.05 }),
  noise_rms_mv: read(0.1),
  mains_hum_mv: read(0.08),
  mains_hum_hz: read(50),
  clipped_fraction: read(0),
  missing_fraction: read(0),
  quantum_mv: read(0.03),
  sample_interval_us: read(20),
};

export interface Made {
  readings?: Readings;
  sweeps?: NumberedSweep[];
  circumstances?: Partial<Circumstances>;
  input?: Partial<JudgeInput>;
  /** Quantities to take away. */
  without?: string[];
}

/** A cell with one condition of six sweeps. */
export function made({ readings, sweeps, circumstances: changed, input, without = [] }: Made = {}): JudgeInput {
  const all = sweeps ?? [0, 1, 2, 3, 4, 5].map((number) => sweep(number));
  const kept = Object.fromEntries(
    Object.entries({ ...soundReadings, ...readings }).filter(([id]) => !without.includes(id)),
  );
  return {
    cell: 'c1',
    measure: {
      conditions: [
        {
          condition: 'baseline',
          sweeps: all.map((one) => one.sweep),
          readings: kept,
          vi: [],
          fi: [],
          reference_spike: all.some((one) => one.spikes.length > 0) ? { sweep: all[0]!.sweep, spike: 0 } : null,
        },
      ],
    },
    sweeps: all,
    circumstances: [circumstances(changed)],
    policy: [],
    contradictions: [],
    unread: [],
    ...input,
  };
}

export const judged = (cell: Made = {}): Judgement => judgeCell(made(cell));

/** The summary finding of one check. @throws Error when the check said nothing */
export function finding(check: string, cell: Made = {}): Finding {
  const found = judged(cell).findings.find((one) => one.check === check && one.sweep === null);
  if (!found) throw new Error(`${check} said nothing`);
  return found;
}

export const outcome = (check: string, cell: Made = {}): string =>
  judged(cell).findings.find((one) => one.check === check && one.sweep === null)?.outcome ?? 'silent';
