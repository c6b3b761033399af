/**
 * Laws that hold whatever the numbers are: what a change of a recording must change in the measured sweep and cell,
 * and that it changes nothing else. Traces: Pospischil et al. 2008, Biol Cybern 99:427–441, RS cell, in white noise.
 */
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { measureCell } from '../../pipeline/measure/cell.ts';
import { withDerived } from '../../pipeline/measure/derive.ts';
import { correctPotentials } from '../../pipeline/measure/junction.ts';
import { quantities } from '../../pipeline/measure/quantities.ts';
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import type { CellMeasure, MeasureContext, Readings, SweepMeasure } from '../../pipeline/measure/types.ts';
import { pospischil, simulate } from '../helpers/models.ts';
import { cellContext, input, neuron, normalNoise, numbered, uniform } from './made.ts';

const cell = pospischil('RS');
const pf = cell.capacitance_pf;
const rate = 20_000;

interface Raw {
  mv: Float64Array;
  pa: Float64Array;
}

/** 0.6 s of rest, so that the 0.5 s of baseline lie within it, a step of 0.4 s, 0.25 s after it. */
const kept = new Map<string, Raw>();
function recording(step_pa: number, noise_mv = 0.08, seed = 1): Raw {
  const key = `${step_pa} ${noise_mv} ${seed}`;
  const held = kept.get(key);
  if (held) return held;
  const { mv, drive } = simulate(cell, rate, [
    [600, 0],
    [400, step_pa / pf],
    [250, 0],
  ]);
  const noise = normalNoise(seed);
  const made = { mv: mv.map((v) => v + noise_mv * noise()), pa: drive.map((v) => v * pf + 0.5 * noise()) };
  kept.set(key, made);
  return made;
}

interface Options {
  context?: Partial<MeasureContext>;
  rate?: number;
  start_s?: number;
  pf?: number;
  shift_mv?: number;
}

function measureOf({ mv, pa }: Raw, options: Options = {}): SweepMeasure {
  const clock = { rate_hz: options.rate ?? rate, start_s: options.start_s ?? 0 };
  const sweep = measureSweep(input({ voltage: { samples: mv, ...clock }, current: { samples: pa, ...clock } }), {
    ...neuron,
    ...options.context,
  });
  const shift = options.shift_mv ?? 0;
  const known = { e_na_mv: 50 + shift, e_k_mv: -100 + shift, capacitance_pf: options.pf ?? pf };
  return { ...sweep, spikes: withDerived(sweep.spikes, known) };
}

const entries = new Map(quantities.map((entry) => [entry.id, entry]));
const unitOf = (id: string): string => entries.get(id)?.unit ?? '';
type Law = (id: string, value: number) => number | 'anything';
const same: Law = (_, value) => value;

interface Numbers {
  where: string;
  id: string;
  value: number | null;
  u95: number | null;
}
const numbersOf = (where: string, readings: Readings): Numbers[] =>
  Object.entries(readings).map(([id, one]) => ({ where, id, value: one.value, u95: one.u95 ?? null }));
const sweepNumbers = (sweep: SweepMeasure): Numbers[] => [
  ...numbersOf('sweep', sweep.readings),
  ...sweep.spikes.flatMap(({ values, u95, spike }) =>
    Object.entries(values).map(([id, value]) => ({ where: `spike ${spike}`, id, value, u95: u95?.[id] ?? null })),
  ),
];
const cellNumbers = (measure: CellMeasure): Numbers[] =>
  measure.conditions.flatMap(({ condition, readings }) => numbersOf(condition, readings));

/** Numbers that do not obey the law, in words. Half-widths scale as the numbers do and are never shifted. */
function broken(before: Numbers[], after: Numbers[], law: Law, tolerance = 2e-5): string[] {
  const found: string[] = [];
  const others = new Map(after.map((one) => [`${one.where} ${one.id}`, one]));
  if (before.length !== after.length) found.push(`${before.length} numbers became ${after.length}`);
  for (const { where, id, value, u95 } of before) {
    const other = others.get(`${where} ${id}`);
    const wanted = law(id, value ?? 1);
    if (wanted === 'anything') continue;
    const off = (own: number, theirs: number): boolean =>
      Math.abs(theirs - own) > tolerance * Math.max(0.01, Math.abs(own));
    if (!other || (value === null) !== (other.value === null))
      found.push(`${where} ${id}: ${value} became ${other?.value}`);
    else if (value !== null && off(wanted, other.value!))
      found.push(`${where} ${id}: ${wanted} wanted, ${other.value} found`);
    const scaled = u95 === null ? null : Math.abs((law(id, u95) as number) - (law(id, 0) as number));
    if (other && (scaled === null ? other.u95 !== null : other.u95 === null || off(scaled, other.u95)))
      found.push(`${where} ${id}: half-width ${scaled} wanted, ${other.u95} found`);
  }
  return found;
}

const shifted =
  (by: number): Law =>
  (id, value) =>
    entries.get(id)?.absolute_potential ? value + by : value;

const steps = [-100, 900] as const;
const runs = { seed: 61, numRuns: 2 };
const anyStep = fc.constantFrom(...steps);

describe('one sweep', () => {
  test('a potential added to the recording shifts absolute potentials by it and nothing else', () =>
    fc.assert(
      fc.property(anyStep, fc.double({ min: -40, max: 40, noNaN: true }), (step, by) => {
        const raw = recording(step);
        const moved = measureOf({ ...raw, mv: raw.mv.map((v) => v + by) }, { shift_mv: by });
        expect(broken(sweepNumbers(measureOf(raw)), sweepNumbers(moved), shifted(by))).toEqual([]);
      }),
      runs,
    ));
  test('the junction potential taken out of a measured sweep is the same as out of its samples', () =>
    fc.assert(
      fc.property(anyStep, fc.double({ min: -20, max: 20, noNaN: true }), (step, ljp) => {
        const raw = recording(step);
        const late = correctPotentials(measureOf(raw), ljp);
        const early = measureOf({ ...raw, mv: raw.mv.map((v) => v - ljp) });
        expect(broken(sweepNumbers(early), sweepNumbers(late), same)).toEqual([]);
      }),
      runs,
    ));
  test('current in another unit scales currents, charges and resistances', () =>
    fc.assert(
      fc.property(anyStep, fc.constantFrom(0.01, 2, 1000), (step, by) => {
        const raw = recording(step);
        const other = measureOf({ ...raw, pa: raw.pa.map((v) => v * by) }, { pf: pf * by });
        const law: Law = (id, value) => {
          const unit = unitOf(id);
          if (['pA', 'pC', '10⁶', 'fmol'].includes(unit)) return value * by;
          return unit === 'MΩ'
            ? value / by
            : unit === '' || ['mV', 'ms', 's', 'V/s', 'Hz', 'mV/s', 'µs', 'pA/pF', '%'].includes(unit)
              ? value
              : 'anything';
        };
        expect(broken(sweepNumbers(measureOf(raw)), sweepNumbers(other), law)).toEqual([]);
      }),
      runs,
    ));
  test('potential in another unit, criteria in it too, scales potentials and slopes and leaves times', () =>
    fc.assert(
      fc.property(anyStep, fc.double({ min: 0.5, max: 2, noNaN: true }), (step, by) => {
        const raw = recording(step);
        const context = { prominence_mv: 20 * by, rise_criterion_v_per_s: 20 * by };
        // The same charge on 1/by of the capacitance.
        const other = measureOf({ ...raw, mv: raw.mv.map((v) => v * by) }, { context, pf: pf / by });
        const law: Law = (id, value) => {
          if (id === 'sodium_headroom_mv' || id === 'potassium_margin_mv') return 'anything';
          if (id.startsWith('spatial')) return 'anything';
          return ['mV', 'V/s', 'mV/s', 'MΩ', 'pA/pF'].includes(unitOf(id)) ? value * by : value;
        };
        expect(broken(sweepNumbers(measureOf(raw)), sweepNumbers(other), law)).toEqual([]);
      }),
      runs,
    ));
  test('a slower clock, criteria with it, stretches the times of spikes and divides their slopes', () =>
    fc.assert(
      fc.property(fc.double({ min: 0.8, max: 1.25, noNaN: true }), (by) => {
        const raw = recording(900);
        const context = { rise_criterion_v_per_s: 20 / by, ahp_window_ms: 60 * by };
        const other = measureOf(raw, { context, rate: rate / by, pf: pf * by });
        const own = measureOf(raw);
        expect(other.spikes).toHaveLength(own.spikes.length);
        for (const [k, spike] of own.spikes.entries())
          for (const [id, value] of Object.entries(spike.values)) {
            const unit = unitOf(id);
            const wanted = ['ms', 's'].includes(unit)
              ? value! * by
              : ['V/s', 'pA/pF'].includes(unit)
                ? value! / by
                : value!;
            const stretched = ['mV', 'ms', 's', 'V/s', 'pA'].includes(unit) || id === 'rise_samples';
            // The window of the slope is chosen in whole samples by noise against the criterion, which stay in proportion;
            // the baseline is that of 0.5 s, whatever the clock.
            if (value !== null && stretched)
              expect(Math.abs(other.spikes[k]!.values[id]! / wanted - 1), id).toBeLessThan(
                id === 'height_from_rest_mv' ? 1e-4 : 1e-6,
              );
          }
      }),
      runs,
    ));
  test('the time at which a sweep starts moves its times and nothing else', () => {
    for (const step of steps) {
      const raw = recording(step);
      const law: Law = (id, value) => (id.endsWith('_at_s') ? value + 7 : value);
      expect(broken(sweepNumbers(measureOf(raw)), sweepNumbers(measureOf(raw, { start_s: 7 })), law)).toEqual([]);
    }
  });
  test('a constant current beside the stimulus changes the holding current and what flows through the membrane', () =>
    fc.assert(
      fc.property(anyStep, fc.double({ min: -300, max: 300, noNaN: true }), (step, by) => {
        const raw = recording(step);
        const other = measureOf({ ...raw, pa: raw.pa.map((v) => v + by) });
        const law: Law = (id, value) => {
          if (id === 'holding_pa' || id === 'peak_inward_current_pa' || id === 'peak_outward_current_pa')
            return value + by;
          if (id.endsWith('current_pa_per_pf')) return value + by / pf;
          return id === 'depolarization_charge_pc' || id === 'repolarization_charge_pc' ? 'anything' : value;
        };
        expect(broken(sweepNumbers(measureOf(raw)), sweepNumbers(other), law)).toEqual([]);
      }),
      runs,
    ));

  const quiet = (samples: number, seed: number): Raw => {
    const noise = normalNoise(seed);
    return {
      mv: Float64Array.from({ length: samples }, () => cell.start[0]! + 0.08 * noise()),
      pa: Float64Array.from({ length: samples }, () => 0.5 * noise()),
    };
  };
  const joined = (...parts: Raw[]): Raw => ({
    mv: Float64Array.from(parts.flatMap((part) => Array.from(part.mv))),
    pa: Float64Array.from(parts.flatMap((part) => Array.from(part.pa))),
  });
  /** Read off all quiet stretches, so that more of them sharpen it. */
  const fromQuiet = ['noise_rms_mv', 'mains_hum_mv', 'mains_hum_hz', 'mean_rate_hz', 'holding_pa', 'stimulus_pa'];
  const settled =
    (law: Law): Law =>
    (id, value) =>
      fromQuiet.includes(id) ? 'anything' : law(id, value);
  test('quiet samples before a sweep move its times, quiet samples after it nothing', () => {
    // How wide spikes are smoothed depends on the noise, and more samples tell more of it: their numbers may move, but
    // well within their own half-widths.
    const restless = (own: Numbers[], other: Numbers[], law: Law): string[] =>
      own.flatMap(({ where, id, value, u95 }) => {
        const found = other.find((one) => one.where === where && one.id === id)?.value ?? null;
        const wanted = law(id, value ?? 1);
        if (value === null || found === null || wanted === 'anything' || u95 === null) return [];
        return Math.abs(found - wanted) > 0.7 * u95 + 1e-9 ? [`${where} ${id}: ${value} became ${found}`] : [];
      });
    // Latency and intervals are read off the spikes' times.
    const timed = (id: string): boolean => id === 'first_spike_latency_ms' || id.startsWith('interval_');
    const ofSweep = (all: Numbers[]): Numbers[] => all.filter(({ where, id }) => where === 'sweep' && !timed(id));
    const ofSpikes = (all: Numbers[]): Numbers[] => all.filter(({ where, id }) => where !== 'sweep' || timed(id));
    for (const step of steps) {
      const raw = recording(step);
      const own = sweepNumbers(measureOf(raw));
      const later: Law = (id, value) => (id.endsWith('_at_s') ? value + 0.5 : value);
      for (const [padded, law] of [
        [joined(quiet(rate / 2, 8), raw), later],
        [joined(raw, quiet(rate / 2, 9)), same],
      ] as const) {
        const other = sweepNumbers(measureOf(padded));
        expect(broken(ofSweep(own), ofSweep(other), settled(law))).toEqual([]);
        expect(restless(ofSpikes(own), ofSpikes(other), law)).toEqual([]);
        expect(ofSpikes(other)).toHaveLength(ofSpikes(own).length);
      }
      const noisier = measureOf(joined(raw, quiet(rate / 2, 9))).readings['noise_rms_mv']!;
      expect(noisier.value! / measureOf(raw).readings['noise_rms_mv']!.value!).toBeCloseTo(1, 1);
    }
  });
  test('two sweeps joined between their stimuli hold the spikes of both', () => {
    const [first, second] = [recording(900, 0.08, 2), recording(700, 0.08, 3)];
    const both = measureOf(joined(first, second));
    const one = measureOf(first).spikes;
    const other = measureOf(second).spikes;
    expect(both.spikes).toHaveLength(one.length + other.length);
    const ids = ['threshold_mv', 'peak_mv', 'half_width_ms', 'max_rise_v_per_s', 'max_fall_v_per_s', 'ahp_minimum_mv'];
    [...one, ...other].forEach((spike, k) => {
      const found = both.spikes[k]!;
      const later = k < one.length ? 0 : first.mv.length / rate;
      expect(found.values['peak_at_s']! - later).toBeCloseTo(spike.values['peak_at_s']!, 9);
      for (const id of ids) expect(found.values[id]! / spike.values[id]!, `${id} of spike ${k}`).toBeCloseTo(1, 4);
    });
  });
  test('noise, hum, digitizer step, clipped and missing share do not know which way time runs', () => {
    const noise = normalNoise(12);
    const mv = Float64Array.from(
      { length: rate },
      (_, i) => Math.round((-65 + 0.1 * noise() + 0.2 * Math.sin((2 * Math.PI * 50 * i) / rate)) / 0.03) * 0.03,
    );
    mv.fill(-2133 * 0.03, 5000, 5040);
    mv.fill(Number.NaN, 12_000, 12_100);
    const pa = new Float64Array(rate);
    const own = measureOf({ mv, pa }).readings;
    const back = measureOf({ mv: mv.toReversed(), pa }).readings;
    for (const id of [
      'noise_rms_mv',
      'mains_hum_mv',
      'mains_hum_hz',
      'quantum_mv',
      'clipped_fraction',
      'missing_fraction',
      'baseline_sd_mv',
    ]) {
      expect(own[id]!.value, id).not.toBeNull();
      expect(back[id]!.value! / own[id]!.value!, id).toBeCloseTo(1, 2);
    }
  });
  test('a dither far below the noise changes nothing that matters', () => {
    const noise = normalNoise(14);
    for (const step of steps) {
      const raw = recording(step);
      const other = measureOf({ ...raw, mv: raw.mv.map((v) => v + 1e-6 * noise()) });
      expect(broken(sweepNumbers(measureOf(raw)), sweepNumbers(other), same, 1e-3)).toEqual([]);
    }
  });
  test('with twice the noise the half-widths that come of it double', () => {
    const one = measureOf(recording(-100, 0.08)).readings;
    const two = measureOf(recording(-100, 0.16)).readings;
    for (const id of ['baseline_mv', 'baseline_drift_mv_per_s', 'noise_rms_mv', 'steady_deflection_mv']) {
      if (one[id]!.u95 === undefined) continue;
      expect(two[id]!.u95! / one[id]!.u95!, id).toBeGreaterThan(1.7);
      expect(two[id]!.u95! / one[id]!.u95!, id).toBeLessThan(2.3);
    }
  });
});

describe('one cell', () => {
  const currents = [-100, -60, -30, 500, 700, 900];
  const raws = currents.map((pa, k) => recording(pa, 0.08, 20 + k));
  const measuredCell = (
    change: (raw: Raw, k: number) => Raw = (raw) => raw,
    order = currents.map((_, k) => k),
  ): CellMeasure => {
    const sweeps = raws.map((raw, k) => numbered(measureOf(change(raw, k)), k));
    return measureCell(
      order.map((k) => sweeps[k]!),
      () => cellContext({ stated_capacitance_pf: pf }),
    );
  };
  const own = cellNumbers(measuredCell());
  test('its sweeps give every kind of number', () => {
    const ids = own.filter((one) => one.value !== null).map((one) => one.id);
    for (const id of [
      'input_resistance_mohm',
      'membrane_time_constant_ms',
      'rheobase_pa',
      'threshold_mv',
      'resting_potential_mv',
      'max_rate_hz',
    ])
      expect(ids).toContain(id);
  });
  test('the order in which they are handed over does not matter', () => {
    const next = uniform(3);
    const order = currents.map((_, k) => k).sort(() => next() - 0.5);
    expect(broken(own, cellNumbers(measuredCell(undefined, order)), same, 1e-9)).toEqual([]);
  });
  test('a potential added to all of them shifts absolute potentials', () => {
    const by = 12.5;
    const moved = cellNumbers(measuredCell((raw) => ({ ...raw, mv: raw.mv.map((v) => v + by) })));
    const law: Law = (id, value) =>
      ['sodium_headroom_mv', 'potassium_margin_mv'].includes(id) ? 'anything' : shifted(by)(id, value);
    expect(broken(own, moved, law)).toEqual([]);
  });
  test('a holding current takes away the resting potential and leaves the membrane’s numbers', () => {
    const by = 40;
    const held = cellNumbers(measuredCell((raw) => ({ ...raw, pa: raw.pa.map((v) => v + by) })));
    const resting = held.find((one) => one.id === 'resting_potential_mv')!;
    expect(resting.value).toBeNull();
    const law: Law = (id, value) => {
      if (id === 'resting_potential_mv' || /current_pa|_charge_pc|holding/.test(id)) return 'anything';
      return value;
    };
    expect(broken(own, held, law)).toEqual([]);
  });
  test('current in another unit moves resistance and capacitance in opposite ways and leaves the time constant', () => {
    const by = 1000;
    const other = cellNumbers(measuredCell((raw) => ({ ...raw, pa: raw.pa.map((v) => v * by) })));
    const value = (numbers: Numbers[], id: string): number => numbers.find((one) => one.id === id)!.value!;
    expect(value(other, 'input_resistance_mohm') / value(own, 'input_resistance_mohm')).toBeCloseTo(1 / by, 9);
    expect(value(other, 'membrane_time_constant_ms') / value(own, 'membrane_time_constant_ms')).toBeCloseTo(1, 6);
    expect(value(other, 'rheobase_pa') / value(own, 'rheobase_pa')).toBeCloseTo(by, 6);
    expect(value(other, 'rate_gain_hz_per_na') / value(own, 'rate_gain_hz_per_na')).toBeCloseTo(1 / by, 9);
    expect(value(other, 'threshold_mv')).toBeCloseTo(value(own, 'threshold_mv'), 9);
  });
});
