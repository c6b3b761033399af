import { describe, expect, it } from 'vitest';
import { gradientReadings } from '../../pipeline/measure/cell-gradients.ts';
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import type { CellContext, NumberedSweep, Readings, Spike } from '../../pipeline/measure/types.ts';
import { cellContext, input, neuron, numbered, numberIn, signalOf } from './made.ts';

const gradients: NonNullable<CellContext['gradients']> = {
  volume_pl: 5,
  celsius: 32,
  sodium: { inside_mm: 10, outside_mm: 150 },
  potassium: { inside_mm: 140, outside_mm: 3 },
  pipette: [
    { ion: 'K', valence: 1, millimolar: 140 },
    { ion: 'gluconate', valence: -1, millimolar: 130 },
    { ion: 'Na', valence: 1, millimolar: 10 },
    { ion: 'Cl', valence: -1, millimolar: 20 },
  ],
};
const known: Readings = {
  spike_height_mv: { value: 80, u95: 1 },
  peak_mv: { value: 35, u95: 1 },
  membrane_capacitance_pf: { value: 50, u95: 5 },
  access_resistance_mohm: { value: 15, u95: 1.5 },
};
const quiet = measureSweep(input({ voltage: signalOf(1, 10000, () => -70), current: null }), neuron);
const spike = (at_s: number): Spike => ({ spike: 0, values: { peak_at_s: at_s }, why: {}, phases: [] });
/** Sweeps of one second, `spikes` in each, one every `every_s`. */
const sweepsOf = (count: number, spikes: number, every_s: number | null): NumberedSweep[] =>
  Array.from({ length: count }, (_, k) => ({
    ...numbered(quiet, k),
    since_start_s: every_s === null ? null : k * every_s,
    spikes: Array.from({ length: spikes }, (_unused, one) => spike(one / 20)),
  }));
const read = (sweeps: NumberedSweep[], readings = known, more: Partial<CellContext> = {}): Readings =>
  gradientReadings(sweeps, readings, cellContext({ gradients, ...more }));

describe('gradientReadings(sweeps, readings, context)', () => {
  const readings = read(sweepsOf(20, 10, 10));
  it('by hand', () => {
    // 100·2·50·80/(96485.33·5) = 1.6583 mM; RT/F at 32 °C 26.2958 mV.
    expect(numberIn(readings, 'sodium_gain_mm_per_100_spikes')).toBeCloseTo(1.6583, 4);
    expect(numberIn(readings, 'e_na_change_mv_per_100_spikes')).toBeCloseTo(-26.2958 * Math.log(1.16583), 3);
    expect(numberIn(readings, 'e_k_change_mv_per_100_spikes')).toBeCloseTo(26.2958 * Math.log(140 / 138.3417), 3);
    // X = e^(35/26.2958) = 3.7848; α = (X·140 − 3)/(150 − X·10) = 4.7001; (3 + 705.02)/(138.342 + 4.7001·11.6583).
    const ratio = (3.78483 * 140 - 3) / (150 - 37.8483);
    const moved = 26.2958 * Math.log((3 + ratio * 150) / (138.3417 + ratio * 11.6583)) - 35;
    expect(numberIn(readings, 'expected_rundown_percent_per_100_spikes')).toBeCloseTo((100 * moved) / 80, 2);
  });
  it('reaches from the least to four times the least, capacitance and height in quadrature', () => {
    const { value, u95 } = readings['sodium_gain_mm_per_100_spikes']!;
    // The usual factor is 2; up to 4 is as much again: 100 %, 10 % and 1.25 %.
    expect(u95! / value!).toBeCloseTo(Math.hypot(1, 0.1, 0.0125), 9);
    expect(readings['expected_rundown_percent_per_100_spikes']!.u95).toBeGreaterThan(1);
  });
  it('a pipette takes back what slow firing brings in', () => {
    const seconds = numberIn(readings, 'exchange_time_constant_s');
    expect(seconds).toBeGreaterThan(50);
    expect(seconds).toBeLessThan(120);
    // 200 spikes in 191 s: 100 spikes take 95.5 s.
    const share = (1 - Math.exp(-95.5 / seconds)) / (95.5 / seconds);
    const ratio =
      numberIn(readings, 'dialysed_rundown_percent_per_100_spikes') /
      numberIn(readings, 'expected_rundown_percent_per_100_spikes');
    expect(Math.abs(ratio - share)).toBeLessThan(0.02);
    expect(readings['dialysed_rundown_percent_per_100_spikes']!.note).toMatch(
      /100 spikes take 96 s, and \d\d % .* is left$/,
    );
    const slow = read(sweepsOf(20, 1, 60));
    expect(slow['dialysed_rundown_percent_per_100_spikes']!.note).toMatch(/exchange all but removes the loss/);
    expect(Math.abs(numberIn(slow, 'dialysed_rundown_percent_per_100_spikes'))).toBeLessThan(0.2);
  });
  it('names the fact that is missing', () => {
    const without = (change: Partial<typeof gradients>, id: string, more: Partial<CellContext> = {}) =>
      read(sweepsOf(5, 5, 5), known, { gradients: { ...gradients, ...change }, ...more })[id];
    for (const id of Object.keys(readings))
      expect(without({ volume_pl: null }, id)).toEqual({ value: null, why: 'fact-missing', missing: ['volume_pl'] });
    expect(without({ sodium: null }, 'e_na_change_mv_per_100_spikes')).toMatchObject({ missing: ['pipette'] });
    expect(without({ potassium: null }, 'expected_rundown_percent_per_100_spikes')).toMatchObject({
      missing: ['bath'],
    });
    expect(without({ pipette: null }, 'exchange_time_constant_s', { missing_for_e_na: [] })).toMatchObject({
      why: 'fact-missing',
      note: 'the ions inside are not known',
    });
    expect(read(sweepsOf(5, 5, null))['dialysed_rundown_percent_per_100_spikes']).toMatchObject({ missing: ['time'] });
    expect(gradientReadings(sweepsOf(5, 5, 5), known, cellContext())['sodium_gain_mm_per_100_spikes']).toMatchObject({
      missing: ['volume_pl'],
    });
  });
  it('hands on why height or capacitance are missing, and prefers what is stated', () => {
    const none = { ...known, spike_height_mv: { value: null, why: 'no-spikes' as const } };
    expect(read(sweepsOf(5, 0, 5), none)['sodium_gain_mm_per_100_spikes']).toMatchObject({ why: 'no-spikes' });
    const { membrane_capacitance_pf: _left, ...uncharged } = known;
    expect(read(sweepsOf(5, 5, 5), uncharged)['sodium_gain_mm_per_100_spikes']).toMatchObject({
      missing: ['capacitance_pf'],
    });
    const stated = read(sweepsOf(5, 5, 5), known, { stated_capacitance_pf: 100 });
    expect(numberIn(stated, 'sodium_gain_mm_per_100_spikes')).toBeCloseTo(2 * 1.6583, 3);
  });
  it('does not count plateau spikes by a factor measured on brief ones', () => {
    const slow = read(sweepsOf(5, 5, 5), known, { slow: true });
    expect(slow['sodium_gain_mm_per_100_spikes']).toMatchObject({
      value: null,
      note: expect.stringMatching(/plateau/),
    });
    expect(slow['expected_rundown_percent_per_100_spikes']!.value).toBeNull();
    expect(numberIn(slow, 'exchange_time_constant_s')).toBeGreaterThan(50);
  });
  it('says so where nothing would be left of the gradient', () =>
    expect(
      read(sweepsOf(5, 5, 5), known, { gradients: { ...gradients, volume_pl: 0.01 } })['e_k_change_mv_per_100_spikes'],
    ).toMatchObject({ value: null, why: 'unresolved' }));
});
