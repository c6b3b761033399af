/**
 * Voltage clamp with known truth: circuits of access, membrane and capacitance under test pulses, recorded under a grid
 * of conditions and measured by the whole of `measureSweep`.
 */
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import { neuron } from '../measure/made.ts';
import { type Circuit, clampCurrent, protocol, type Rig, recordClamp } from './clamp-recorder.ts';
import type { Trial, TrialOptions } from './score.ts';

const circuits: Circuit[] = (
  [
    [10, 200, 100],
    [20, 500, 50],
    [5, 100, 200],
    [15, 50, 150],
    [30, 1000, 30],
    [8, 300, 15],
    [30, 300, 200],
    [12, 800, 10],
  ] as const
).map(([access_mohm, membrane_mohm, pf]) => ({
  name: `${access_mohm} MΩ, ${membrane_mohm} MΩ ∥ ${pf} pF`,
  access_mohm,
  membrane_mohm,
  pf,
}));

const usual: Rig = {
  name: '20 kHz, 8 kHz filter, 5 pA',
  rate_hz: 20_000,
  filter_khz: 8,
  filter_stated: true,
  noise_pa: 5,
  pulse_mv: 10,
  pulse_ms: 20,
  pulses: 8,
  pipette_pf: 0.5,
  command_us: 5,
  phase_us: 0,
  hum_pa: 0,
  drift_pa_per_s: 0,
  correction: 0,
  transient_taken: 0,
  taken_tau: 1,
};
const rig = (name: string, more: Partial<Rig>): Rig => ({ ...usual, name, ...more });

/** Conditions under which a number must be right; those of a compensated transient stand apart. */
export const rigs: Rig[] = [
  usual,
  rig('edge between samples', { phase_us: 20 }),
  rig('5 kHz filter', { filter_khz: 5 }),
  rig('50 kHz, 10 kHz filter', { rate_hz: 50_000, filter_khz: 10 }),
  rig('10 kHz, 3 kHz filter', { rate_hz: 10_000, filter_khz: 3 }),
  rig('50 kHz, 2 kHz filter', { rate_hz: 50_000, filter_khz: 2 }),
  rig('filter not stated', { filter_stated: false }),
  rig('one pulse', { pulses: 1 }),
  rig('one pulse of 5 mV, 5 ms', { pulses: 1, pulse_mv: 5, pulse_ms: 5 }),
  rig('many of 5 ms', { pulse_ms: 5 }),
  rig('one of 50 ms, -5 mV', { pulses: 1, pulse_ms: 50, pulse_mv: -5 }),
  rig('1 pA', { noise_pa: 1 }),
  rig('20 pA', { noise_pa: 20 }),
  rig('pipette 5 pF', { pipette_pf: 5 }),
  rig('slow command 50 µs', { command_us: 50 }),
  rig('hum 10 pA', { hum_pa: 10 }),
  rig('drift 100 pA/s', { drift_pa_per_s: 100 }),
  rig('access corrected by half', { correction: 0.5 }),
];
const quickRigs = new Set([usual.name, '50 kHz, 10 kHz filter', 'filter not stated', 'hum 10 pA', 'edge between samples']);

export function trials({ seeds, quick }: TrialOptions): Trial[] {
  const out: Trial[] = [];
  for (const condition of rigs.filter((one) => !quick || quickRigs.has(one.name)))
    for (const circuit of quick ? circuits.slice(0, 3) : circuits) {
      const { edges, seconds } = protocol(condition);
      const clean = clampCurrent(circuit, condition, edges, seconds);
      for (let seed = 1; seed <= seeds; seed++) out.push(...measuredTrials(circuit, condition, seed, clean));
    }
  return out;
}

/** What the definitions ask of the circuit: the access is what is left after correction. */
const truths = (circuit: Circuit, condition: Rig): Record<string, number> => ({
  access_resistance_mohm: circuit.access_mohm * (1 - condition.correction),
  membrane_resistance_mohm: circuit.membrane_mohm,
  cell_capacitance_pf: circuit.pf,
});

export function readingsOf(circuit: Circuit, condition: Rig, seed: number, clean?: Float64Array) {
  const { command, current, holding_pa, seconds } = recordClamp(circuit, condition, seed, clean);
  const signal = (samples: Float64Array) => ({ samples, rate_hz: condition.rate_hz, start_s: 0 });
  const { readings } = measureSweep(
    { clamp: 'voltage', voltage: signal(command), current: signal(current), stated_stimulus: null, bridge_mohm: null },
    { ...neuron, filter_khz: condition.filter_stated ? condition.filter_khz : null },
  );
  return { readings, holding_pa, seconds };
}

function measuredTrials(circuit: Circuit, condition: Rig, seed: number, clean: Float64Array): Trial[] {
  const { readings, holding_pa } = readingsOf(circuit, condition, seed, clean);
  // The first level lasts 50 ms.
  const truth = { ...truths(circuit, condition), holding_current_pa: holding_pa + 0.025 * condition.drift_pa_per_s };
  return Object.entries(truth).map(([quantity, value]) => {
    const reading = readings[quantity]!;
    return {
      family: 'voltage clamp',
      quantity,
      subject: circuit.name,
      condition: condition.name,
      seed,
      truth: value,
      value: reading.value,
      ...(reading.value === null ? { why: `${reading.why} ${reading.note ?? ''}` } : {}),
      u95: reading.u95 ?? null,
    };
  });
}
