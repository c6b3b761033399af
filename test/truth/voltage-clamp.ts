/**
 * Voltage clamp with known truth: circuits of access, membrane and capacitance under test pulses, recorded under a grid
 * of conditions and measured by the whole of `measureSweep`.
 */
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import { neuron, uniform } from '../measure/made.ts';
import { type Circuit, type Rig, recordClamp } from './clamp-recorder.ts';
import { isWanted, type Trial, type TrialOptions } from './score.ts';

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
const quickRigs = new Set([usual.name, '50 kHz, 10 kHz filter', 'filter not stated', 'hum 10 pA']);

export function trials(options: TrialOptions): Trial[] {
  const { seeds, quick } = options;
  const out: Trial[] = [];
  for (const condition of rigs.filter((one) => !quick || quickRigs.has(one.name)))
    for (const circuit of quick ? circuits.slice(0, 3) : circuits) {
      if (!isWanted(options, circuit.name)) continue;
      for (let seed = 1; seed <= seeds; seed++)
        out.push(...measuredTrials(circuit, drawn(condition, `${condition.name} ${circuit.name} ${seed}`), seed));
    }
  return out;
}

export const subjectNames = (): string[] => circuits.map(({ name }) => name);

/** A number for each text, the same in every run. */
function seedOf(text: string): number {
  let hash = 2166136261;
  for (const letter of text) hash = Math.imul(hash ^ letter.codePointAt(0)!, 16777619);
  return (hash >>> 1) + 1;
}

/**
 * The rig with what nobody states drawn anew for every recording: when within a sample the command changes (at the
 * sample itself in half of them), how slow the command is (3 to 15 µs), what is left of the pipette (SD 1 pF), and by how
 * much the filter’s corner differs from its name (SD 4 %).
 */
function drawn(condition: Rig, text: string): Rig & { named_khz: number } {
  const next = uniform(seedOf(text));
  const normal = Math.sqrt(-2 * Math.log(next())) * Math.cos(2 * Math.PI * next());
  const normal2 = Math.sqrt(-2 * Math.log(next())) * Math.cos(2 * Math.PI * next());
  const interval_us = 1e6 / condition.rate_hz;
  const special = (id: keyof Rig): boolean => condition[id] !== usual[id];
  return {
    ...condition,
    named_khz: condition.filter_khz,
    phase_us: next() < 0.5 ? 0 : Math.floor(next() * interval_us),
    command_us: special('command_us') ? condition.command_us : 3 + 12 * next(),
    pipette_pf: special('pipette_pf') ? condition.pipette_pf : normal,
    filter_khz: condition.filter_khz * (1 + 0.04 * normal2),
  };
}

/** What the definitions ask of the circuit: the access is what is left after correction. */
const truths = (circuit: Circuit, condition: Rig): Record<string, number> => ({
  access_resistance_mohm: circuit.access_mohm * (1 - condition.correction),
  membrane_resistance_mohm: circuit.membrane_mohm,
  cell_capacitance_pf: circuit.pf,
});

export function readingsOf(circuit: Circuit, condition: Rig & { named_khz?: number }, seed: number) {
  const { command, current, holding_pa, seconds } = recordClamp(circuit, condition, seed);
  const signal = (samples: Float64Array) => ({ samples, rate_hz: condition.rate_hz, start_s: 0 });
  const { readings } = measureSweep(
    { clamp: 'voltage', voltage: signal(command), current: signal(current), stated_stimulus: null, bridge_mohm: null },
    { ...neuron, filter_khz: condition.filter_stated ? (condition.named_khz ?? condition.filter_khz) : null },
  );
  return { readings, holding_pa, seconds };
}

function measuredTrials(circuit: Circuit, condition: Rig, seed: number): Trial[] {
  const { readings, holding_pa } = readingsOf(circuit, condition, seedOf(`${circuit.name} ${condition.name} ${seed}`));
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
