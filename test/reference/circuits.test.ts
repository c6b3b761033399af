/** Circuits, digitizers and filters whose answers are known exactly (linear circuit theory), through the pipeline. */
import { describe, expect, test } from 'vitest';
import { measureCell } from '../../pipeline/measure/cell.ts';
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import { crossing, robustSpread } from '../../pipeline/signal/index.ts';
import {
  cellContext,
  input,
  neuron,
  normalNoise,
  numbered,
  numberIn,
  passiveSweep,
  signalOf,
} from '../measure/made.ts';
import { bessel, fineHz } from '../truth/recorder.ts';
import { near } from './traces.ts';

const step = { pa: -50, from_s: 0.3, to_s: 0.8 };
const rc = { rest_mv: -70, resistance_mohm: 100, tau_ms: 20 };
const cellOf = (circuit: typeof rc & { bridge_left_mohm?: number }) =>
  measureCell(
    [-50, -30, -10].map((pa, k) =>
      numbered(
        measureSweep(input(passiveSweep({ ...circuit, noise_mv: 0.02, seed: k + 1 }, { ...step, pa }, 1.2)), neuron),
        k,
      ),
    ),
    () => cellContext(),
  ).conditions[0]!.readings;

describe('100 MΩ beside 200 pF, −50 pA for 500 ms from −70 mV', () => {
  const sweep = measureSweep(input(passiveSweep(rc, step, 1.2)), neuron);
  test('settles at −75 mV', () => {
    near(numberIn(sweep.readings, 'baseline_mv'), -70, 1e-9, 'baseline');
    near(numberIn(sweep.readings, 'steady_deflection_mv'), -5, 1e-6, 'deflection');
  });
  test('stands at −73.16060 mV after one time constant', () => {
    const { samples, rate_hz } = passiveSweep(rc, step, 1.2).voltage;
    const at = crossing(samples, -73.16060279414279, { from: 0.3 * rate_hz, to: 0.8 * rate_hz, direction: 'down' })!;
    near((at / rate_hz - 0.3) * 1000, 20, 0.001, 'time constant');
  });
  test('resistance 100 MΩ, time constant 20 ms, capacitance 200 pF, within their own half-widths', () => {
    const readings = cellOf(rc);
    for (const [id, truth, within] of [
      ['input_resistance_mohm', 100, 0.5],
      ['membrane_time_constant_ms', 20, 0.3],
      ['membrane_capacitance_pf', 200, 4],
    ] as const)
      near(numberIn(readings, id), truth, within, id);
  });
  test('10 MΩ left over by the bridge: a jump of −0.5 mV, −75.5 mV in the end, and 100 MΩ once I·R is taken off', () => {
    const left = measureSweep(input(passiveSweep({ ...rc, bridge_left_mohm: 10 }, step, 1.2)), neuron);
    near(numberIn(left.readings, 'bridge_step_mv'), -0.5, 0.005, 'jump');
    near(numberIn(left.readings, 'steady_deflection_mv'), -5.5, 1e-6, 'deflection');
    const readings = cellOf({ ...rc, bridge_left_mohm: 10 });
    near(numberIn(readings, 'bridge_error_mohm'), 10, 0.5, 'bridge error');
    // Whether the line through the deflections holds the electrode or not, it must be one of the two.
    const resistance = numberIn(readings, 'input_resistance_mohm');
    near(resistance - numberIn(readings, 'bridge_error_mohm') * (resistance > 105 ? 1 : 0), 100, 1, 'resistance');
  });
});

test('sag of −90 mV that ends at −85 from −70 is a fraction of 0.25 (index 0.75, ratio 1.333)', () => {
  const ease = (t: number): number => (1 - Math.cos(Math.PI * Math.max(0, Math.min(1, t)))) / 2;
  const course = (t: number): number => -20 * ease((t - 0.3) / 0.08) + 5 * ease((t - 0.42) / 0.2);
  const voltage = signalOf(1.4, 20_000, (t) => -70 + (t < 0.8 ? course(t) : -15 * Math.exp((0.8 - t) / 0.02)));
  const current = signalOf(1.4, 20_000, (t) => (t >= 0.3 && t < 0.8 ? -200 : 0));
  const sweep = measureSweep(input({ voltage, current }), neuron);
  near(numberIn(sweep.readings, 'largest_deflection_mv'), -20, 0.02, 'largest');
  near(numberIn(sweep.readings, 'steady_deflection_mv'), -15, 0.01, 'steady');
  const readings = measureCell([numbered(sweep, 0)], () => cellContext()).conditions[0]!.readings;
  const fraction = numberIn(readings, 'sag_fraction');
  near(fraction, 0.25, 0.001, 'fraction');
  near(1 - fraction, 0.75, 0.001, 'index');
  near(1 / (1 - fraction), 4 / 3, 0.002, 'ratio of deflections');
});

describe('digitizers', () => {
  // Span over 2^bits over the gain; rounding adds noise of a step over √12 (Bennett 1948, from memory).
  test.each([
    [12, 10, 10, 244.140625, 70.47732778],
    [12, 20, 10, 488.28125, 140.95465556],
    [16, 20, 1, 305.17578125, 88.09665973],
    [16, 20, 10, 30.517578125, 8.809665973],
    [16, 20, 50, 6.103515625, 1.761933195],
    [18, 20, 10, 7.62939453125, 2.202416493],
  ])('%d bits over %d V at a gain of %d', (bits, span, gain, step_uv, rms_uv) => {
    const noise = normalNoise(bits + gain);
    const codeMv = (1000 * span) / 2 ** bits / gain;
    const raw = signalOf(1, 20_000, () => -65 + 0.3 * noise());
    const samples = raw.samples.map((v) => Math.round(v / codeMv) * codeMv);
    const { readings } = measureSweep(input({ voltage: { ...raw, samples }, current: null }), neuron);
    near(numberIn(readings, 'quantum_mv') / (step_uv / 1000), 1, 1e-3, 'step');
    const off = samples.map((v, i) => v - raw.samples[i]!);
    const rms = Math.sqrt(off.reduce((sum, v) => sum + v * v, 0) / off.length);
    near(rms / (rms_uv / 1000), 1, 0.02, 'rounding');
  });
});

// √(4kTRB), Johnson 1928, Nyquist 1928 (from memory), at 22 °C (the last at 34 °C): white up to B, half the rate.
test.each([
  [10e6, 10_000, 40.373186763],
  [100e6, 10_000, 127.671226671],
  [50e6, 5000, 63.835613285],
  [500e6, 10_000, 285.481541382],
  [20e6, 10_000, 58.24543521],
])('the thermal noise of %d Ω over %d Hz, in its share of the band', (_, band, rms_uv) => {
  const noise = normalNoise(band);
  const rate = 2 * band;
  const voltage = signalOf(2, rate, () => -70 + (rms_uv / 1000) * noise());
  const { readings } = measureSweep(input({ voltage, current: signalOf(2, rate, () => 0) }), neuron);
  // From 1 kHz to 0.4 of the rate; the corners of the filter take a little of it.
  const share = Math.sqrt((0.4 * rate - 1000) / band);
  near(numberIn(readings, 'noise_rms_mv') / ((rms_uv / 1000) * share), 0.98, 0.04, 'noise');
});

test('a 4-pole Bessel filter rises from 10 to 90 % in 0.35013 over its corner and overshoots by 0.835 %', () => {
  const corner = 500;
  const stepped = Float64Array.from({ length: 20000 }, (_, i) => (i < 1000 ? 0 : 1));
  const filtered = bessel(stepped, corner);
  const at = (level: number): number => crossing(filtered, level, { from: 990, to: 19000, direction: 'up' })!;
  near(((at(0.9) - at(0.1)) / fineHz) * corner, 0.35013, 0.0005, 'rise time');
  near(100 * (Math.max(...filtered) - 1), 0.83542, 0.005, 'overshoot');
});

test('1, 2, 3, 4, 100 has a robust standard deviation of 1.4826', () =>
  expect(robustSpread([1, 2, 3, 4, 100])).toBeCloseTo(1.482602218505602, 12));
