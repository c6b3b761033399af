import { describe, expect, test } from 'vitest';
import { measuredCapacitance, withDerived } from '../../pipeline/measure/derive.ts';
import { ionicNumbers } from '../../pipeline/measure/ionic.ts';
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import type { Phase, Reading, Spike } from '../../pipeline/measure/types.ts';
import { normalNoise } from '../helpers/models.ts';
import { input, neuron } from './made.ts';

const phase = (name: Phase['name'], pa: number, se = 0): Phase => ({
  name,
  from_s: 0.1,
  to_s: 0.1005,
  net_ionic_sign: 0,
  basis: { mv: name === 'depolarization' ? 100 : -100, noise_mv: 0.1, pa, se },
});
const made = (pa: number, se = 0): Spike => ({
  spike: 0,
  values: {
    max_rise_v_per_s: 300,
    max_fall_v_per_s: -100,
    spike_height_mv: 100,
    depolarization_ms: 0.5,
    repolarization_ms: 1,
  },
  why: {},
  u95: { max_rise_v_per_s: 6, max_fall_v_per_s: 2, spike_height_mv: 1 },
  phases: [phase('depolarization', pa, se), phase('repolarization', pa, se)],
});

describe('ionic numbers of a spike, by hand', () => {
  // 100 pF: 300 V/s take 30 nA, of which the stimulus gives 200 pA; 100 mV take 10 pC, of it 200 pA · 0.5 ms = 0.1 pC.
  const { values, u95 } = ionicNumbers(made(200, 5), { capacitance_pf: 100, capacitance_u95_pf: 4 });
  test('I − C·dV/dt at the steepest rise and fall', () => {
    expect(values['peak_inward_current_pa']).toBeCloseTo(200 - 30_000, 9);
    expect(values['peak_outward_current_pa']).toBeCloseTo(200 + 10_000, 9);
    expect(values['peak_inward_current_pa_per_pf']).toBeCloseTo(2 - 300, 9);
    expect(values['peak_outward_current_pa_per_pf']).toBeCloseTo(2 + 100, 9);
  });
  test('the charge of the membrane less what was injected meanwhile', () => {
    expect(values['depolarization_charge_pc']).toBeCloseTo(0.1 - 10, 9);
    expect(values['repolarization_charge_pc']).toBeCloseTo(0.2 + 10, 9);
  });
  test('half-widths of dV/dt, current and capacitance in squares', () => {
    expect(u95['peak_inward_current_pa']).toBeCloseTo(Math.hypot(600, 9.8, 1200), 9);
    expect(u95['peak_inward_current_pa_per_pf']).toBeCloseTo(Math.hypot(6, 0.098, 0.08), 9);
    expect(u95['depolarization_charge_pc']).toBeCloseTo(Math.hypot(100, 400, 4.9) / 1000, 9);
  });
  test('without a capacitance only the current per pF where nothing is injected', () => {
    const unstimulated = ionicNumbers(made(0), { capacitance_pf: null });
    expect(unstimulated.values['peak_inward_current_pa_per_pf']).toBe(-300);
    expect(unstimulated.values['peak_inward_current_pa']).toBeNull();
    expect(unstimulated.why['peak_inward_current_pa']).toBe('fact-missing');
    const driven = ionicNumbers(made(200), { capacitance_pf: null });
    expect(driven.why).toMatchObject({
      peak_inward_current_pa_per_pf: 'fact-missing',
      depolarization_charge_pc: 'fact-missing',
    });
  });
  test('what was not found hands on its reason; an unknown current is said so', () => {
    const spike = made(200);
    const clipped = ionicNumbers(
      { ...spike, values: { ...spike.values, max_rise_v_per_s: null }, why: { max_rise_v_per_s: 'clipped' } },
      { capacitance_pf: 100 },
    );
    expect(clipped.why['peak_inward_current_pa']).toBe('clipped');
    expect(clipped.values['peak_outward_current_pa']).not.toBeNull();
    const { basis: _, ...bare } = phase('depolarization', 0);
    expect(ionicNumbers({ ...spike, phases: [bare] }, { capacitance_pf: 100 }).why).toMatchObject({
      peak_inward_current_pa: 'no-current',
      peak_outward_current_pa: 'unresolved',
    });
  });
  test('a current that its half-width does not tell from 0 is not given', () => {
    const spike = { ...made(29_900), u95: { max_rise_v_per_s: 6 } };
    expect(ionicNumbers(spike, { capacitance_pf: 100 }).why['peak_inward_current_pa']).toBe('unresolved');
  });
});

/**
 * Hodgkin & Huxley 1952 (eqs 7–26, Table 3) by the midpoint method at 2 µs, with the ionic current from the gates
 * themselves: −ΣgᵢΔV is never taken from dV/dt. Per µF/cm² of membrane, so 1 µA/cm² is 1 pA/pF.
 */
function axon(
  celsius: number,
  rateHz: number,
  ms: number,
  drive: (ms: number) => number,
): { mv: Float64Array; ionic: Float64Array } {
  const phi = 3 ** ((celsius - 6.3) / 10);
  const ratio = (x: number, y: number): number => (Math.abs(x) < 1e-7 ? y : x / (Math.exp(x / y) - 1));
  const rates = (v: number): number[] => {
    const u = v + 65;
    return [
      0.1 * ratio(25 - u, 10), 4 * Math.exp(-u / 18),
      0.07 * Math.exp(-u / 20), 1 / (Math.exp((30 - u) / 10) + 1),
      0.01 * ratio(10 - u, 10), 0.125 * Math.exp(-u / 80),
    ]; // biome-ignore format: rates in pairs
  };
  const ionicOf = ([v, m, h, n]: number[]): number =>
    120 * m! ** 3 * h! * (v! - 50) + 36 * n! ** 4 * (v! + 77) + 0.3 * (v! + 54.387);
  const slope = (state: number[], current: number): number[] => {
    const r = rates(state[0]!);
    return [
      current - ionicOf(state),
      ...[0, 1, 2].map((k) => phi * (r[2 * k]! * (1 - state[k + 1]!) - r[2 * k + 1]! * state[k + 1]!)),
    ];
  };
  const start = rates(-64.99638);
  let state = [-64.99638, ...[0, 1, 2].map((k) => start[2 * k]! / (start[2 * k]! + start[2 * k + 1]!))];
  const n = Math.round((ms / 1000) * rateHz);
  const per = Math.max(1, Math.round(1e6 / rateHz / 2));
  const dt = 1000 / rateHz / per;
  const mv = new Float64Array(n);
  const ionic = new Float64Array(n);
  for (let i = 0; i < n; i++) {
    mv[i] = state[0]!;
    ionic[i] = ionicOf(state);
    const current = drive((i * 1000) / rateHz);
    for (let k = 0; k < per; k++) {
      const first = slope(state, current);
      const middle = slope(
        state.map((value, j) => value + (dt / 2) * first[j]!),
        current,
      );
      state = state.map((value, j) => value + dt * middle[j]!);
    }
  }
  return { mv, ionic };
}

const pf = 120;
const rateHz = 50_000;
const onset_ms = 30;
/** A step that fires at rest's own temperature, and one on a warmer, faster membrane. */
const axons = (
  [
    [6.3, 9],
    [18.5, 25],
  ] as const
).map(([celsius, density]) => ({
  celsius,
  density,
  ...axon(celsius, rateHz, 130, (ms) => (ms >= onset_ms ? density : 0)),
}));

function measuredWith(one: (typeof axons)[number], noise_mv: number, seed: number) {
  const next = normalNoise(seed);
  const signal = (samples: Float64Array) => ({ samples, rate_hz: rateHz, start_s: 0 });
  const current = one.mv.map((_, i) => (i >= (onset_ms / 1000) * rateHz ? one.density * pf : 0) + 2 * next());
  const voltage = one.mv.map((v) => v + noise_mv * next());
  const sweep = measureSweep(input({ voltage: signal(voltage), current: signal(current) }), {
    ...neuron,
    rise_criterion_v_per_s: 10,
  });
  return withDerived(sweep.spikes, { e_na_mv: null, e_k_mv: null, capacitance_pf: pf });
}

/** The true mean ionic current between two times, pA. */
function trueMean(one: (typeof axons)[number], from_s: number, to_s: number): number {
  const part = one.ionic.subarray(Math.ceil(from_s * rateHz), Math.floor(to_s * rateHz) + 1);
  return (pf * part.reduce((sum, value) => sum + value, 0)) / part.length;
}

describe('against the ionic current of a Hodgkin–Huxley membrane', () => {
  // A slope over a few samples misses a little of the steepest one, wider windows against noise miss more; noise picks
  // the largest of many slopes, the more the gentler the slope: the fall is a third as steep as the rise.
  test.each([
    [0.01, 0.035, 0.02],
    [0.1, 0.05, 0.11],
    [0.3, 0.14, 0.17],
  ])('peaks with %d mV of noise', (noise_mv, inwardOff, outwardOff) => {
    for (const one of axons)
      for (const seed of [1, 2, 3])
        for (const spike of measuredWith(one, noise_mv, seed)) {
          const from = Math.round(spike.values['threshold_at_s']! * rateHz);
          const near = one.ionic.subarray(from, from + Math.round(0.004 * rateHz));
          const inward = spike.values['peak_inward_current_pa']! / (pf * Math.min(...near));
          const outward = spike.values['peak_outward_current_pa']! / (pf * Math.max(...near));
          expect(Math.abs(inward - 1)).toBeLessThan(inwardOff);
          expect(Math.abs(outward - 1)).toBeLessThan(outwardOff);
        }
  });
  test('charges of the two phases, within 5 %', () => {
    for (const one of axons)
      for (const spike of measuredWith(one, 0.02, 4))
        for (const name of ['depolarization', 'repolarization'] as const) {
          const span = spike.phases.find((other) => other.name === name)!;
          const truth = (trueMean(one, span.from_s, span.to_s) * (span.to_s - span.from_s) * 1000) / 1000;
          expect(Math.abs(spike.values[`${name}_charge_pc`]! / truth - 1)).toBeLessThan(0.05);
        }
  });
  test('the sign of a phase is wrong in less than 1 % of those resolved, and most are resolved', () => {
    let resolved = 0;
    let wrong = 0;
    let phases = 0;
    for (const noise_mv of [0.02, 0.1, 0.3, 1])
      for (const one of axons)
        for (let seed = 1; seed <= 4; seed++)
          for (const spike of measuredWith(one, noise_mv, 10 * seed))
            for (const { from_s, to_s, net_ionic_sign } of spike.phases) {
              phases++;
              if (net_ionic_sign === 0) continue;
              resolved++;
              if (net_ionic_sign !== Math.sign(trueMean(one, from_s, to_s))) wrong++;
            }
    expect(phases).toBeGreaterThan(300);
    expect(resolved / phases).toBeGreaterThan(0.7);
    expect(wrong / resolved).toBeLessThan(0.01);
  });
});

describe('the capacitance that charges are computed with', () => {
  const of = (membrane: [number, number?] | null, cell: [number, number?] | null) => {
    const reading = (one: [number, number?] | null): Reading =>
      one === null ? { value: null, why: 'unresolved' } : { value: one[0], ...(one[1] ? { u95: one[1] } : {}) };
    return measuredCapacitance({ membrane_capacitance_pf: reading(membrane), cell_capacitance_pf: reading(cell) });
  };
  test('is the better known of the two', () => {
    expect(of([152, 77], [151, 1.5])!.value).toBe(151);
    expect(of([152, 2], [151, 15])!.value).toBe(152);
  });
  test('is the only one, whether its half-width is known or not', () => {
    expect(of([152], null)!.value).toBe(152);
    expect(of(null, [151])!.value).toBe(151);
    expect(of([152], [151, 15])!.value).toBe(151);
    expect(of(null, null)).toBeNull();
  });
});
