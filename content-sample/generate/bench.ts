/** From a cell of the roster to its membrane, its electrode and what the amplifier is told to do. */
import type { CellSpec, DaySpec, DrugSpec } from './cells.ts';
import { integrator, settle } from './integrate.ts';
import {
  corticalCell,
  cylinderCm2,
  fastSpikingInterneuron,
  heart1991,
  interneuron1996,
  leakOnly,
  type Model,
  regularSpiking2008,
  squid1952,
  squidAxon,
  ventricularMyocyte,
} from './models.ts';
import { pulseTrain, quiet, ramp, type SweepPlan, step, testPulse } from './protocol.ts';
import { type Random, randomFrom } from './random.ts';
import type { Bench } from './recorder.ts';
import { equilibriumMv, junctionMv, solutions } from './solutions.ts';

export interface Membrane {
  build(drug?: DrugSpec): Model;
  area_cm2: number;
  start_mv: number;
  slow: boolean;
  /** Numbers that make this cell this cell, for the truth. */
  parameters: Record<string, number>;
}

/** Bath, pipette and temperature as they really were, whatever the sheet says. */
export function conditionsOf(day: DaySpec, cell: CellSpec) {
  const bath = cell.true_bath ?? day.bath;
  const pipette = cell.true_pipette ?? day.pipette;
  const celsius = cell.true_temperature_c ?? day.temperature_c;
  return {
    bath,
    pipette,
    celsius,
    e_na_mv: equilibriumMv('Na', bath, pipette, celsius),
    e_k_mv: equilibriumMv('K', bath, pipette, celsius),
    ljp_mv: junctionMv(bath, pipette, celsius),
  };
}

/** The membrane of a cell: a published model with the reversal potentials of its solutions and conductances of its own. */
export function membraneOf(day: DaySpec, cell: CellSpec): Membrane {
  const random = randomFrom(`${cell.copy_of ?? cell.id}|membrane`);
  const { e_na_mv, e_k_mv, celsius } = conditionsOf(day, cell);
  const size = cell.size ?? 1;
  const spread = (share: number): number => 1 + share * Math.max(-2, Math.min(2, random.normal()));
  if (cell.kind === 'nothing') {
    const area = 2e-5;
    const g = 0.35;
    return {
      build: () => leakOnly(g, -2),
      area_cm2: area,
      start_mv: -2,
      slow: false,
      parameters: { area_cm2: area, g_leak: g },
    };
  }
  if (cell.kind === 'pyramidal') {
    const p = {
      ...regularSpiking2008,
      g_na: (cell.g_na ?? 17) * spread(0.06),
      g_k: 3.6 * spread(0.12),
      g_m: 0.11 * spread(0.2),
      g_leak: 0.055 * spread(0.15) * (cell.leak_factor ?? 1),
      e_na_mv,
      e_k_mv,
      e_leak_mv: -71 + 1.6 * random.normal() + (cell.leak_shift_mv ?? 0),
      gate_shift_mv: -62 + 1.2 * random.normal(),
      phi: (cell.phi ?? 1) * 2.3 ** ((celsius - 36) / 10),
      temperature_c: celsius,
    };
    const area = cylinderCm2(74) * size * spread(0.12);
    return {
      build: () => corticalCell(p),
      area_cm2: area,
      start_mv: -72,
      slow: false,
      parameters: { ...p, area_cm2: area },
    };
  }
  if (cell.kind === 'interneuron') {
    const p = {
      ...interneuron1996,
      g_na: (cell.g_na ?? 28) * spread(0.06),
      g_k: (cell.g_k ?? 5.5) * spread(0.1),
      g_leak: 0.15 * spread(0.12),
      e_na_mv,
      e_k_mv,
      e_leak_mv: (cell.spontaneous ? -60 : -69) + 1.2 * random.normal(),
      phi: (cell.phi ?? 1) * 5 * 2.3 ** ((celsius - 34) / 10),
    };
    const area = 9e-5 * size * spread(0.13);
    return {
      build: () => fastSpikingInterneuron(p),
      area_cm2: area,
      start_mv: -69,
      slow: false,
      parameters: { ...p, area_cm2: area },
    };
  }
  if (cell.kind === 'squid') {
    const p = {
      ...squid1952,
      g_na: 120 * spread(0.05),
      g_k: 36 * spread(0.05),
      g_leak: 0.3 * spread(0.1),
      e_na_mv,
      e_k_mv,
      temperature_c: celsius,
    };
    const area = 4e-3 * size * spread(0.15);
    return {
      build: () => squidAxon(p),
      area_cm2: area,
      start_mv: -65,
      slow: false,
      parameters: { ...p, area_cm2: area },
    };
  }
  const inside = solutions[cell.true_pipette ?? day.pipette]!;
  const outside = solutions[cell.true_bath ?? day.bath]!;
  const p = {
    ...heart1991,
    g_na: 20 * spread(0.08),
    g_si: 0.075 * spread(0.1),
    k_factor: spread(0.06),
    phi: 2.3 ** ((celsius - 36.85) / 10),
    temperature_c: celsius,
    na_out_mm: outside['Na']!.mm,
    na_in_mm: inside['Na']!.mm,
    k_out_mm: outside['K']!.mm,
    k_in_mm: inside['K']!.mm,
  };
  const area = 1.45e-4 * size * spread(0.12);
  return {
    build: (drug) => ventricularMyocyte(drug?.k_out_mm ? { ...p, k_out_mm: drug.k_out_mm } : p),
    area_cm2: area,
    start_mv: -84,
    slow: true,
    parameters: { ...p, area_cm2: area },
  };
}

/** A round number near x, as people choose them: 1, 2, 2.5 or 5 times a power of ten. */
export function round125(x: number): number {
  const power = 10 ** Math.floor(Math.log10(x));
  const mantissa = x / power;
  return power * (mantissa < 1.5 ? 1 : mantissa < 2.25 ? 2 : mantissa < 3.5 ? 2.5 : mantissa < 7.5 ? 5 : 10);
}

/** Smallest step of half a second (heart: 5 ms) that fires the cell, pA, within 2 %. */
export function rheobaseOf(membrane: Membrane): number {
  const model = membrane.build();
  const dt = membrane.slow ? 0.01 : 0.02;
  const rest = settle(model, membrane.start_mv, 400, dt);
  const fires = (density: number): boolean => {
    const run = integrator(model, rest);
    const width = membrane.slow ? 5 : 500;
    for (let k = 0; k * dt < width + 20; k++) {
      run.step(dt, k * dt < width ? density : 0, 0, 0);
      if (run.state[0]! > -5) return true;
    }
    return false;
  };
  let low = 0.05;
  let high = 0.1;
  while (!fires(high) && high < 200) {
    low = high;
    high *= 2;
  }
  while (high / low > 1.02) {
    const middle = Math.sqrt(low * high);
    if (fires(middle)) high = middle;
    else low = middle;
  }
  return (high * membrane.area_cm2) / 1e-6;
}

export interface PlannedSweep {
  plan: SweepPlan;
  /** Seconds since the cell's first sweep. */
  at_s: number;
  keepState: boolean;
}

/** The sweeps of one cell with their times, in order. `rheobase_pa` sets the size of the steps. */
export function protocolOf(cell: CellSpec, rheobase_pa: number): PlannedSweep[] {
  const out: PlannedSweep[] = [];
  let clock = 0;
  const add = (plan: SweepPlan, pause_s: number, keepState = false): void => {
    out.push({ plan, at_s: clock, keepState });
    clock += keepState ? plan.duration_s : plan.duration_s + pause_s;
  };
  const random = randomFrom(`${cell.copy_of ?? cell.id}|protocol`);
  const unit = cell.unit_pa ?? round125(rheobase_pa * 0.4);
  const hold = cell.holding_pa ?? 0;
  const gapFree = cell.text === 'one-column';
  const plainFamily = cell.text !== undefined;
  const pause = plainFamily ? 4 : 9 + Math.round(4 * random.uniform());
  if (gapFree) {
    add(quiet(4), 0);
    return out;
  }
  if (cell.kind === 'heart') {
    const beat = (): SweepPlan => pulseTrain(roundTo(rheobase_pa * 1.3, 50), 0.005, 1, 1, 0.1, cell.period_s ?? 1);
    if (!plainFamily) {
      add(testPulse(-80, -5), 3);
      add(quiet(0.6), 3);
      for (const pa of [-200, -100, -50]) add(step(pa, 0.1, 0.35, 0.5), 2);
    }
    const beats = plainFamily ? 5 : cell.drugs ? 10 : 7;
    for (let k = 0; k < beats; k++) add(beat(), 0, true);
    if (!plainFamily) {
      clock += 3;
      add(testPulse(-80, -5), 3);
    }
    return out;
  }
  if (cell.kind === 'squid') {
    const s = (multiple: number): SweepPlan => step(multiple * unit, 0.05, 0.2, 0.3);
    if (!plainFamily) add(quiet(0.3), 2);
    const family = cell.strong ? [-2, -1, 0, 1, 3, 10, 30, 60, 110] : [-2, -1, 0, 1, 2, 3, 4, 6];
    if (plainFamily) {
      for (const m of [-1, 0, 2, 3, 4, 6]) add(s(m), 3);
      return out;
    }
    for (const m of family) add(s(m), 5);
    if (cell.drugs) for (const m of [-1, 0, 2, 3, 6]) add(s(m), 5);
    else add(pulseTrain(round125(rheobase_pa * 12), 0.001, 0.04, 5, 0.05, 0.3), 4);
    return out;
  }
  const s = (pa: number): SweepPlan => step(pa, 0.1, 0.6, 0.8, 'steps', hold);
  const family =
    cell.kind === 'interneuron'
      ? [-3, -2, -1, 0, 1, 2, 3, 4, 6, 8].map((m) => m * unit)
      : [-3, -2, -1, 0, 1, 2, 3, 4, 5, 6].map((m) => m * unit);
  if (plainFamily) {
    for (const pa of family.filter((_, k) => [0, 2, 4, 5, 6, 8].includes(k))) add(s(pa), pause);
    return out;
  }
  add(testPulse(-70, -5), 3);
  add(quiet(0.8, hold), 3);
  if (cell.drugs) {
    const short = family.filter((_, k) => k !== 0 && k !== 9);
    for (const pa of short) add(s(pa), pause);
    for (const pa of short.filter((_, k) => k % 2 === 1 || k > 5)) add(s(pa), pause);
  } else {
    const steps = cell.repeat ? [-unit, 0, ...Array.from({ length: 12 }, () => 5 * unit)] : family;
    for (const pa of steps) add(s(pa), pause);
    if (cell.fine_rheobase)
      for (const share of [0.9, 0.96, 1.02, 1.08])
        add(step(Math.round(rheobase_pa * share), 0.1, 0.6, 0.8, 'rheobase', hold), 5);
    if (cell.kind === 'pyramidal')
      add(ramp(cell.unit_pa ? 8 * cell.unit_pa : round125(rheobase_pa * 2.2), 0.1, 0.9, 1.1), 5);
    const brief = cell.unit_pa ? 8 * cell.unit_pa : round125(rheobase_pa * (cell.kind === 'pyramidal' ? 16 : 9));
    add(pulseTrain(brief, 0.002, 0.05, 8, 0.1, 0.7), 5);
  }
  add(testPulse(-70, -5), 3);
  return out;
}

/** Electrode and recorder of one cell, before what changes from sweep to sweep. */
export function benchOf(day: DaySpec, cell: CellSpec, membrane: Membrane, random: Random): Bench {
  const { ljp_mv } = conditionsOf(day, cell);
  const usual = cell.kind === 'squid' ? 0.02 : cell.kind === 'heart' ? 4 : 13;
  const access = cell.access_mohm ?? usual * (1 + 0.22 * Math.max(-1.5, Math.min(1.8, random.normal())));
  const small = cell.kind === 'squid' ? 0.0015 : 0.6;
  const left = cell.junction_left ?? (day.junction === 'corrected' ? 0 : 1);
  const bridge =
    cell.bridge === 'forgotten'
      ? 0
      : Math.max(0, roundTo(access + small * random.normal(), cell.kind === 'squid' ? 0.001 : 0.1));
  const fast = cell.kind === 'squid' || cell.kind === 'interneuron';
  const filter = cell.filter_khz ?? (fast && !cell.text ? 10 : day.rig === 'loft' && !cell.text ? 8 : 6);
  const rate = cell.rate_hz ?? (fast ? 50_000 : cell.kind === 'heart' ? 20_000 : day.rig === 'loft' ? 25_000 : 20_000);
  return {
    area_cm2: membrane.area_cm2,
    access_mohm: access,
    bridge_mohm: bridge,
    pipette_pf: cell.kind === 'squid' ? 4 : 1 + 0.8 * random.uniform(),
    reading_offset_mv: left * ljp_mv + 0.5 * random.normal() + (day.rig_offset_mv ?? 0) + (cell.offset_mv ?? 0),
    drift_mv_per_s: 0,
    noise_mv: cell.noise_mv ?? 0.05 + 0.04 * random.uniform(),
    wander_mv: cell.text === undefined ? 0.05 + 0.05 * random.uniform() : 0.06,
    hum_mv: cell.hum_mv ?? 0.02 + 0.04 * random.uniform(),
    hum_hz: 50 + 0.02 * random.normal(),
    filter_khz: filter,
    rate_hz: cell.text ? Math.min(rate, 20_000) : rate,
    quantum_mv: day.rig === 'loft' ? 1 / 64 : 1 / 32,
    quantum_pa: cell.kind === 'squid' ? 20 : cell.kind === 'heart' ? 0.5 : 0.25,
    low_mv: cell.clip_mv?.[0] ?? -500,
    high_mv: cell.clip_mv?.[1] ?? 500,
    membrane_noise: cell.kind === 'squid' ? 0.02 : cell.kind === 'heart' ? 0.01 : cell.kind === 'nothing' ? 0 : 0.015,
    current_noise_pa: day.rig === 'loft' ? 0.8 : 0,
    current_offset_pa: 0,
    clamp_noise_pa: cell.kind === 'squid' ? 60 : 3,
    clamp_quantum_pa: cell.kind === 'squid' ? 50 : 0.5,
  };
}

export const roundTo = (x: number, unit: number): number => Math.round(x / unit) * unit;
