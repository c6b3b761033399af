import { expect, test } from 'vitest';
import { leakOnly } from '../../content-sample/generate/models.ts';
import { levels, quiet, step, testPulse } from '../../content-sample/generate/protocol.ts';
import { hashOf, randomFrom } from '../../content-sample/generate/random.ts';
import { type Bench, bessel4, session, spikeCounter } from '../../content-sample/generate/recorder.ts';
import { writeText } from '../../content-sample/generate/text.ts';

const silent: Bench = {
  area_cm2: 1e-4,
  access_mohm: 10,
  bridge_mohm: 10,
  pipette_pf: 0,
  reading_offset_mv: 0,
  drift_mv_per_s: 0,
  noise_mv: 0,
  wander_mv: 0,
  hum_mv: 0,
  hum_hz: 50,
  filter_khz: 10,
  rate_hz: 20_000,
  quantum_mv: 1 / 256,
  quantum_pa: 0.25,
  low_mv: -500,
  high_mv: 500,
  membrane_noise: 0,
  current_noise_pa: 0,
  current_offset_pa: 0,
  clamp_noise_pa: 0,
  clamp_quantum_pa: 0.25,
};
/** A leak of 0.1 mS/cm² on 1e-4 cm²: 100 MΩ, 100 pF, 10 ms. */
const record = (change: Partial<Bench>, plan = step(-100, 0.05, 0.25, 0.3)) =>
  session(leakOnly(0.1, -70), -70, false, randomFrom('recorder')).record(plan, { ...silent, ...change }, 0, false);
const mean = (values: Int16Array, from: number, to: number, unit: number): number => {
  let sum = 0;
  for (let k = from; k < to; k++) sum += values[k]!;
  return (unit * sum) / (to - from);
};

test('equal seeds draw alike, others do not; normals have mean 0 and deviation 1', () => {
  const draw = (seed: string): number[] => Array.from({ length: 5 }, randomFrom(seed).normal);
  expect(draw('a')).toEqual(draw('a'));
  expect(draw('a')).not.toEqual(draw('b'));
  const { normal } = randomFrom('many');
  let sum = 0;
  let squares = 0;
  for (let k = 0; k < 100_000; k++) {
    const x = normal();
    sum += x;
    squares += x * x;
  }
  expect(Math.abs(sum / 100_000)).toBeLessThan(0.015);
  expect(Math.abs(squares / 100_000 - 1)).toBeLessThan(0.02);
  // FNV-1a of the empty text is its offset basis, by definition.
  expect(hashOf('')).toBe(0x811c9dc5);
});

test('levels: holding outside the pieces, a step inside, no sample more', () => {
  expect([...levels(step(10, 0.2, 0.4, 0.5, 'steps', -3), 10)]).toEqual([-3, -3, 7, 7, -3]);
  expect([...levels(testPulse(-70, -5, 0.1, 0.2), 20)]).toEqual([-70, -75, -75, -70]);
});

// −3 dB at the corner is what a corner is; a 4-pole Bessel filter overshoots a step by 0.84 % (tabulated, from memory).
test('the filter loses 3 dB at its corner, next to nothing at a tenth of it, and hardly overshoots', () => {
  const gain = (hz: number): number => {
    const filter = bessel4(5000, 100_000);
    let largest = 0;
    for (let k = 0; k < 20_000; k++) {
      const y = filter(Math.sin((2 * Math.PI * hz * k) / 100_000));
      if (k > 10_000) largest = Math.max(largest, Math.abs(y));
    }
    return 20 * Math.log10(largest);
  };
  expect(gain(5000)).toBeCloseTo(-3.01, 1);
  expect(gain(500)).toBeGreaterThan(-0.05);
  const filter = bessel4(1000, 100_000);
  let largest = 0;
  filter(0);
  for (let k = 0; k < 1000; k++) largest = Math.max(largest, filter(1));
  expect(largest).toBeCloseTo(1.0084, 3);
  expect(filter(1)).toBeCloseTo(1, 6);
});

test('a leak answers a step with Ohm’s law when the bridge is set', () => {
  const sweep = record({});
  expect(mean(sweep.voltage, 0, 900, sweep.quantum_mv)).toBeCloseTo(-70, 2);
  expect(mean(sweep.voltage, 4000, 4900, sweep.quantum_mv)).toBeCloseTo(-80, 2);
  expect(mean(sweep.current, 2000, 4000, sweep.quantum_pa)).toBe(-100);
  expect(sweep.spikes).toBe(0);
});

test('a bridge left at zero adds current times access resistance', () => {
  const sweep = record({ bridge_mohm: 0 });
  expect(mean(sweep.voltage, 4000, 4900, sweep.quantum_mv)).toBeCloseTo(-81, 2);
});

test('the junction potential stands on the reading and not on the membrane', () => {
  const sweep = record({ reading_offset_mv: 15 });
  expect(mean(sweep.voltage, 0, 900, sweep.quantum_mv)).toBeCloseTo(-55, 2);
  expect(sweep.baseline_mv).toBeCloseTo(-70, 2);
});

test('noise has the stated size behind the filter', () => {
  for (const filter_khz of [2, 8]) {
    const sweep = record({ noise_mv: 0.2, filter_khz }, quiet(1));
    let squares = 0;
    for (const v of sweep.voltage) squares += (v * sweep.quantum_mv + 70) ** 2;
    expect(Math.sqrt(squares / sweep.voltage.length)).toBeGreaterThan(0.19);
    expect(Math.sqrt(squares / sweep.voltage.length)).toBeLessThan(0.21);
  }
});

test('hum has its amplitude and its frequency', () => {
  const sweep = record({ hum_mv: 0.5 }, quiet(1));
  const amplitude = (hz: number): number => {
    let sine = 0;
    let cosine = 0;
    sweep.voltage.forEach((v, k) => {
      sine += v * sweep.quantum_mv * Math.sin((2 * Math.PI * hz * k) / 20_000);
      cosine += v * sweep.quantum_mv * Math.cos((2 * Math.PI * hz * k) / 20_000);
    });
    return (2 * Math.hypot(sine, cosine)) / sweep.voltage.length;
  };
  expect(amplitude(50)).toBeCloseTo(0.5, 2);
  expect(amplitude(150)).toBeCloseTo(0.125, 2);
  expect(amplitude(40)).toBeLessThan(0.01);
});

test('the digitizer clips at its range', () => {
  const sweep = record({ low_mv: -75 });
  expect(Math.min(...sweep.voltage) * sweep.quantum_mv).toBe(-75);
});

// By hand: −5 mV through 10 MΩ in series with 100 MΩ: −500 pA at first (less what the filter takes), −45.45 pA at the end.
test('a voltage-clamp test pulse charges the cell through the access resistance', () => {
  const sweep = record({ rate_hz: 100_000 }, testPulse(-70, -5));
  const pa = Array.from(sweep.current, (v) => v * sweep.quantum_pa);
  expect(pa[4000]!).toBeCloseTo(0, 0);
  expect(Math.min(...pa)).toBeLessThan(-430);
  expect(Math.min(...pa)).toBeGreaterThan(-500);
  expect(pa[9900]!).toBeCloseTo(-45.45, 0);
  expect(sweep.voltage[6000]! * sweep.quantum_mv).toBe(-75);
});

test('a sampling rate off the grid is refused with the number', () => {
  expect(() => record({ rate_hz: 30_000 })).toThrow('got 30000 Hz');
});

test('the truth counts spikes by prominence and rise, and noise on a plateau not at all', () => {
  const count = (mv: readonly number[], rise = 20): number => {
    const counter = spikeCounter(20, rise);
    for (const v of mv) counter.add(v);
    return counter.count();
  };
  const ramp = (from: number, to: number, n: number): number[] =>
    Array.from({ length: n }, (_, k) => from + ((to - from) * (k + 1)) / n);
  const spike = [...ramp(-70, 30, 100), ...ramp(30, -75, 200), ...ramp(-75, -70, 500)];
  const slow = [...ramp(-70, 30, 2000), ...ramp(30, -75, 2000)];
  const plateau = [
    ...ramp(-70, 20, 100),
    ...Array.from({ length: 400 }, (_, k) => 20 + (k % 2)),
    ...ramp(20, -70, 100),
  ];
  expect(count([])).toBe(0);
  expect(count([-70])).toBe(0);
  expect(count(spike)).toBe(1);
  expect(count([...spike, ...spike, ...spike])).toBe(3);
  expect(count(slow)).toBe(0);
  expect(count(plateau)).toBe(1);
});

test('text: each dialect says the same samples in its own way', () => {
  const sweeps = [record({}), record({ reading_offset_mv: 1 })];
  const text = (dialect: Parameters<typeof writeText>[0]) => writeText(dialect, sweeps);
  const mv = (k: number): number => sweeps[0]!.voltage[k]! * sweeps[0]!.quantum_mv;
  expect(Number(text('comma').content.split('\n')[5001]!.split(',')[1])).toBeCloseTo(mv(5000), 2);
  expect(text('semicolon').content.split('\r\n')[5002]!.split(';')[1]).toBe(mv(5000).toFixed(2).replace('.', ','));
  expect(Number(text('rows').content.split('\n')[0]!.split('\t')[5000])).toBeCloseTo(mv(5000), 2);
  expect(1000 * Number(text('bare').content.split('\n')[5000]!.trim().split(/\s+/)[0])).toBeCloseTo(mv(5000), 2);
  expect(1000 * Number(text('one-column').content.split('\r\n')[5000])).toBeCloseTo(mv(5000), 2);
  expect(Number(text('spaces').content.split('\n')[5000]!.split(' ')[1])).toBeCloseTo(mv(5000), 2);
  expect(() => writeText('rows', [sweeps[0]!, record({}, quiet(0.1))])).toThrow('one length');
});
