import type {
  CellContext,
  MeasureContext,
  NumberedSweep,
  Readings,
  Signal,
  SweepInput,
  SweepMeasure,
} from '../../pipeline/measure/types.ts';

/** A signal made from a formula of time in seconds; the first sample is at 0. */
export function signalOf(seconds: number, rateHz: number, formula: (t: number) => number): Signal {
  const samples = Float64Array.from({ length: Math.round(seconds * rateHz) }, (_, i) => formula(i / rateHz));
  return { samples, rate_hz: rateHz, start_s: 0 };
}

/** Uniform numbers in (0, 1) that are the same in every run. */
export function uniform(seed: number): () => number {
  let state = seed >>> 0;
  return () => {
    state = (state + 0x6d2b79f5) >>> 0;
    let t = state;
    t = Math.imul(t ^ (t >>> 15), t | 1);
    t ^= t + Math.imul(t ^ (t >>> 7), t | 61);
    return (((t ^ (t >>> 14)) >>> 0) + 0.5) / 4294967296;
  };
}

/** Standard normal numbers, the same in every run. */
export function normalNoise(seed: number): () => number {
  const next = uniform(seed);
  return () => Math.sqrt(-2 * Math.log(next())) * Math.cos(2 * Math.PI * next());
}

export const neuron: MeasureContext = {
  rise_criterion_v_per_s: 20,
  prominence_mv: 20,
  ahp_window_ms: 60,
  slow: false,
  filter_khz: null,
  mains_hz: 50,
  capacitance_pf: null,
};

export const heart: MeasureContext = {
  ...neuron,
  rise_criterion_v_per_s: null,
  ahp_window_ms: 1000,
  slow: true,
};

export interface Circuit {
  rest_mv: number;
  resistance_mohm: number;
  tau_ms: number;
  /** Resistance that the bridge has not taken off; negative when it took too much. */
  bridge_left_mohm?: number;
  /** Time constant of the pipette's own charging, ms. */
  pipette_tau_ms?: number;
  noise_mv?: number;
  seed?: number;
  hum?: { mv: number; hz: number };
  drift_mv_per_s?: number;
}

/** A passive cell that answers a step: exact solution of the RC circuit behind an electrode. */
export function passiveSweep(
  circuit: Circuit,
  step: { pa: number; from_s: number; to_s: number; holding_pa?: number },
  seconds = 1,
  rateHz = 20000,
): { voltage: Signal; current: Signal } {
  const holding = step.holding_pa ?? 0;
  const noise = normalNoise(circuit.seed ?? 1);
  const charged = (ms: number, tau: number): number => (ms <= 0 ? 0 : 1 - Math.exp(-ms / tau));
  // The small allowance keeps a sample that lies on an edge on the right side of it.
  const after = (t: number, edge: number): number => (t - edge + 1e-9) * 1000;
  const voltage = signalOf(seconds, rateHz, (t) => {
    const [on, off] = [after(t, step.from_s), after(t, step.to_s)];
    const membrane =
      (step.pa * circuit.resistance_mohm * (charged(on, circuit.tau_ms) - charged(off, circuit.tau_ms))) / 1000;
    const electrode = (ms: number): number =>
      ms < 0 ? 0 : circuit.pipette_tau_ms ? charged(ms, circuit.pipette_tau_ms) : 1;
    const left = (step.pa * (circuit.bridge_left_mohm ?? 0) * (electrode(on) - electrode(off))) / 1000;
    return (
      circuit.rest_mv +
      (holding * circuit.resistance_mohm) / 1000 +
      membrane +
      left +
      (circuit.noise_mv ?? 0) * noise() +
      (circuit.hum ? circuit.hum.mv * Math.sin(2 * Math.PI * circuit.hum.hz * t + 0.7) : 0) +
      (circuit.drift_mv_per_s ?? 0) * t
    );
  });
  const current = signalOf(
    seconds,
    rateHz,
    (t) => holding + (after(t, step.from_s) >= 0 && after(t, step.to_s) < 0 ? step.pa : 0),
  );
  return { voltage, current };
}

/** A voltage-clamp step through an access resistance into a cell, exactly (linear circuit theory). */
export function clampedSweep(
  cell: {
    access_mohm: number;
    membrane_mohm: number;
    pf: number;
    reversal_mv?: number;
    noise_pa?: number;
    seed?: number;
  },
  steps: { from_s: number; to_s: number; mv: number }[],
  options: { holding_mv?: number; seconds?: number; rateHz?: number } = {},
): { voltage: Signal; current: Signal } {
  const { holding_mv = -70, seconds = 0.2, rateHz = 50000 } = options;
  const noise = normalNoise(cell.seed ?? 1);
  const parallel = (cell.access_mohm * cell.membrane_mohm) / (cell.access_mohm + cell.membrane_mohm);
  const tau_ms = (parallel * cell.pf) / 1000;
  const total = cell.access_mohm + cell.membrane_mohm;
  const after = (t: number, edge: number): number => (t - edge + 1e-9) * 1000;
  // mV/MΩ is nA.
  const answer = (ms: number, mv: number): number =>
    ms < 0 ? 0 : 1000 * (mv / total + (mv / cell.access_mohm - mv / total) * Math.exp(-ms / tau_ms));
  const current = signalOf(seconds, rateHz, (t) =>
    steps.reduce(
      (sum, step) => sum + answer(after(t, step.from_s), step.mv) - answer(after(t, step.to_s), step.mv),
      (1000 * (holding_mv - (cell.reversal_mv ?? -70))) / total + (cell.noise_pa ?? 0) * noise(),
    ),
  );
  const voltage = signalOf(seconds, rateHz, (t) =>
    steps.reduce(
      (sum, step) => sum + (after(t, step.from_s) >= 0 && after(t, step.to_s) < 0 ? step.mv : 0),
      holding_mv,
    ),
  );
  return { voltage, current };
}

/** A spike made of a formula: baseline, a triangular upstroke and fall, an exponential afterhyperpolarization. */
export function addSpike(mv: Float64Array, rateHz: number, at_s: number, height = 100, ahp = 8): void {
  const start = Math.round(at_s * rateHz);
  const ms = 1000 / rateHz;
  for (let i = start; i < mv.length; i++) {
    const t = (i - start) * ms;
    let shape: number;
    if (t < 0.5) shape = height * Math.sin((Math.PI / 2) * (t / 0.5)) ** 2;
    else if (t < 1.5) shape = (height + ahp) * Math.cos((Math.PI / 2) * (t - 0.5)) ** 2 - ahp;
    else shape = -ahp * Math.exp(-(t - 1.5) / 8);
    mv[i]! += shape;
    if (t > 80) break;
  }
}

export const input = (
  made: { voltage: Signal | null; current: Signal | null },
  more: Partial<SweepInput> = {},
): SweepInput => ({ clamp: 'current', stated_stimulus: null, bridge_mohm: null, ...made, ...more });

export const numbered = (sweep: SweepMeasure, number: number, more: Partial<NumberedSweep> = {}): NumberedSweep => ({
  ...sweep,
  sweep: number,
  condition: 'baseline',
  since_start_s: number * 10,
  ...more,
});

export const cellContext = (more: Partial<CellContext> = {}): CellContext => ({
  ...neuron,
  e_na_mv: null,
  e_k_mv: null,
  bias_pa: null,
  stated_capacitance_pf: null,
  stated_access_mohm: null,
  break_in_to_start_s: null,
  missing_for_e_na: ['pipette'],
  missing_for_e_k: ['bath'],
  ...more,
});

/** The value of a reading; fails with the reason where there is none. */
export function numberIn(readings: Readings, id: string): number {
  const reading = readings[id];
  if (!reading) throw new Error(`no reading ${id}`);
  if (reading.value === null) throw new Error(`${id} has no value: ${reading.why} ${reading.note ?? ''}`);
  return reading.value;
}
