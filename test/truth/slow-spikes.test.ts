import { describe, expect, test } from 'vitest';
import { broken, type Limit, score, type Trial } from './score.ts';
import { beatsOf, luoRudy, noble, trials } from './slow-spikes.ts';

/** A model without electrode, by Runge–Kutta steps of 10 µs, kept every step. */
function plain(model: ReturnType<typeof noble>, ms: number, currentAt: (ms: number) => number): Float64Array {
  const dt = 0.01;
  let state = [...model.start];
  const rates = (at: number[], t: number): number[] => {
    const into = new Array<number>(at.length).fill(0);
    model.slope(at, currentAt(t), into);
    return into;
  };
  const moved = (k: number[], by: number): number[] => state.map((value, j) => value + by * k[j]!);
  return Float64Array.from({ length: Math.round(ms / dt) }, (_, i) => {
    const v = state[0]!;
    const t = i * dt;
    const k1 = rates(state, t);
    const k2 = rates(moved(k1, dt / 2), t + dt / 2);
    const k3 = rates(moved(k2, dt / 2), t + dt / 2);
    const k4 = rates(moved(k3, dt), t + dt);
    state = state.map((value, j) => value + (dt / 6) * (k1[j]! + 2 * k2[j]! + 2 * k3[j]! + k4[j]!));
    return v;
  });
}

describe('the models and the plain reading of the truth', () => {
  // noble_1962_computed.json of the reference values: LSODA at 1e-9, last full cycle.
  test('pacemaking Purkinje fibre', () => {
    const beats = beatsOf(
      plain(noble(), 2600, () => 0),
      100_000,
    );
    const { values } = beats.at(-2)!;
    expect(values['cycle_length_ms']).toBeCloseTo(839.5, 0);
    expect(values['peak_mv']).toBeCloseTo(28.0956, 1);
    expect(values['diastolic_potential_mv']).toBeCloseTo(-84.6694, 1);
    expect(values['max_rise_v_per_s']).toBeCloseTo(44.55, 0);
    expect(Math.abs(values['apd90_ms']! - 345.94)).toBeLessThan(2);
  });

  // luo_rudy_1991_computed.json: LSODA at 1e-8, 80 µA/cm² for 0.5 ms from rest.
  test('ventricular cell', () => {
    const beats = beatsOf(
      plain(luoRudy(), 500, (ms) => (ms >= 20 && ms < 20.5 ? 80 : 0)),
      100_000,
    );
    expect(beats).toHaveLength(1);
    const { values } = beats[0]!;
    expect(values['peak_mv']).toBeCloseTo(42.3008, 1);
    expect(values['max_rise_v_per_s']).toBeCloseTo(407.0, -1);
    expect(Math.abs(values['apd50_ms']! - 277.38)).toBeLessThan(0.5);
    expect(Math.abs(values['apd90_ms']! - 366.74)).toBeLessThan(0.5);
  });
});

const every = /./;
const heart = /ventricular|Purkinje/;
const limits: Limit[] = [
  { quantity: 'spikes', condition: every, within: 0, measure: 'absolute' },
  { quantity: 'apd50_ms', condition: every, within: 0.01, measure: 'relative', orWithin: 0.6 },
  { quantity: 'apd90_ms', condition: every, within: 0.01, measure: 'relative', orWithin: 0.6 },
  { quantity: 'cycle_length_ms', condition: every, subject: heart, within: 0.001, measure: 'relative' },
  // The oscillator's upstroke rises over 10 ms: noise leaves its steepest point open by that much.
  { quantity: 'cycle_length_ms', condition: every, subject: /oscillator/, within: 1, measure: 'absolute' },
  { quantity: 'diastolic_potential_mv', condition: every, within: 0.3, measure: 'absolute' },
  { quantity: 'plateau_mv', condition: /0\.1 mV|short/, within: 0.5, measure: 'absolute' },
  // Where the top lies under the end of the pulse, the electrode's own settling stands on it.
  { quantity: 'peak_mv', condition: every, subject: /after|Purkinje|oscillator/, within: 1, measure: 'absolute' },
  { quantity: 'peak_mv', condition: every, subject: /under/, within: 2, measure: 'absolute' },
];

describe('slow spikes through electrode, filter, noise and sampling', () => {
  const all: Trial[] = trials({ seeds: 1, quick: true });
  for (const limit of limits)
    test(`${limit.quantity}${limit.subject ? ` of ${limit.subject.source}` : ''}`, () =>
      expect(broken(limit, all)).toEqual([]));

  test('half-widths hold the truth about as often as they say', () => {
    for (const quantity of [
      'apd50_ms',
      'apd90_ms',
      'cycle_length_ms',
      'diastolic_potential_mv',
      'plateau_mv',
      'threshold_mv',
      'spike_height_mv',
      'half_width_ms',
      'repolarization_ms',
      'max_fall_v_per_s',
    ]) {
      const { held, withWidth } = score(all.filter((trial) => trial.quantity === quantity));
      expect(withWidth).toBeGreaterThan(40);
      expect([quantity, held! >= 0.85]).toEqual([quantity, true]);
    }
  });
});
