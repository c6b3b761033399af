import { expect, test } from 'vitest';
import { integrator, settle } from '../../content-sample/generate/integrate.ts';
import {
  bursting2008,
  type CorticalParameters,
  corticalCell,
  cylinderCm2,
  fastSpiking2008,
  fastSpikingInterneuron,
  heart1991,
  interneuron1996,
  lowThreshold2008,
  type Model,
  regularSpiking2008,
  squid1952,
  squidAxon,
  ventricularMyocyte,
} from '../../content-sample/generate/models.ts';

/** Upward crossings of 0 mV, ms, under pieces of [length ms, µA/cm²]. */
function crossings(model: Model, start: Float64Array, pieces: readonly (readonly [number, number])[], dt = 0.01) {
  const run = integrator(model, start);
  const out: number[] = [];
  let t = 0;
  let before = run.state[0]!;
  for (const [length, density] of pieces)
    for (let k = 0; k < Math.round(length / dt); k++) {
      run.step(dt, density, 0, 0);
      t += dt;
      const v = run.state[0]!;
      if (before < 0 && v >= 0) out.push(t - (dt * v) / (v - before));
      before = v;
    }
  return out;
}

test('a membrane at rest stays there', () => {
  const model = squidAxon(squid1952);
  const rest = settle(model, -65, 300);
  const run = integrator(model, rest);
  for (let k = 0; k < 1000; k++) run.step(0.01, 0, 0, 0);
  expect(run.state[0]!).toBeCloseTo(rest[0]!, 6);
});

// Hodgkin & Huxley 1952, J Physiol 117:500–544 (constants from memory, corroborated); rest, peak after a displacement of
// 15 mV and its time computed apart with DOP853 at rtol 1e-10.
test('squid axon: rest, and the spike after a displacement of 15 mV', () => {
  const model = squidAxon(squid1952);
  const rest = settle(model, -65, 300);
  expect(rest[0]!).toBeCloseTo(-64.99638, 3);
  const displaced = Float64Array.from(rest);
  displaced[0]! += 15;
  const run = integrator(model, displaced);
  let peak = -Infinity;
  let at = 0;
  let steepest = 0;
  let before = displaced[0]!;
  for (let k = 1; k <= 1500; k++) {
    run.step(0.01, 0, 0, 0);
    const v = run.state[0]!;
    steepest = Math.max(steepest, (v - before) / 0.01);
    before = v;
    if (v > peak) {
      peak = v;
      at = k * 0.01;
    }
  }
  expect(peak).toBeCloseTo(40.41033, 2);
  expect(at).toBeCloseTo(1.159, 2);
  expect(steepest).toBeCloseTo(310.863, 0);
});

// Same computation: smallest displacement that fires 6.50507 mV; rheobase for one spike 2.24033 µA/cm² (step).
test('squid axon: all or none on either side of threshold and rheobase', () => {
  const model = squidAxon(squid1952);
  const rest = settle(model, -65, 300);
  const displacedBy = (mv: number): number => {
    const start = Float64Array.from(rest);
    start[0]! += mv;
    return crossings(model, start, [[25, 0]]).length;
  };
  expect([6.49, 6.52].map(displacedBy)).toEqual([0, 1]);
  expect([2.23, 2.25].map((density) => crossings(model, rest, [[60, density]]).length)).toEqual([0, 1]);
});

// Wang & Buzsáki 1996, J Neurosci 16:6402–6413; rest, rheobase (2 s) and rate at 1 µA/cm² computed apart with LSODA.
test('interneuron: rest, rheobase and rate', () => {
  const model = fastSpikingInterneuron(interneuron1996);
  const rest = settle(model, -65, 1000);
  expect(rest[0]!).toBeCloseTo(-64.01756, 3);
  expect([0.159, 0.1615].map((density) => crossings(model, rest, [[2000, density]], 0.02).length > 0)).toEqual([
    false,
    true,
  ]);
  const spikes = crossings(model, rest, [[1000, 1]]);
  expect(1000 / (spikes.at(-1)! - spikes.at(-2)!)).toBeCloseTo(59.70088, 1);
});

// Pospischil et al. 2008, Biol Cybern 99:427–441: spike times of the authors' deposited cells from an independent
// implementation (found); its fixed-step solver differs from ours by up to 0.33 ms late in the slowest train.
const trains: [string, CorticalParameters, number, [number, number][], number[], number, number][] = [
  [
    'regular spiking',
    regularSpiking2008,
    96,
    [
      [300, 0],
      [400, 0.75],
    ],
    [320.554, 348.522, 387.944, 456.69, 592.105],
    -70,
    0.33,
  ],
  [
    'fast spiking',
    fastSpiking2008,
    67,
    [
      [300, 0],
      [100, 0.5],
    ],
    [317.023, 337.195, 357.367, 377.539, 397.711],
    -70,
    0.03,
  ],
  [
    'bursting',
    bursting2008,
    96,
    [
      [500, 0],
      [180, 0.15],
    ],
    [617.725, 624.632, 631.101, 637.786, 644.909, 652.671, 661.42, 672.085],
    -84,
    0.06,
  ],
  [
    'low-threshold',
    lowThreshold2008,
    96,
    [
      [400, 0],
      [350, 0.15],
    ],
    [431.423, 445.189, 517.237, 720.422],
    -84,
    0.22,
  ],
];
test.each(trains)('%s cell: spike times', (_name, parameters, diameter, pieces, expected, start, tolerance) => {
  const model = corticalCell(parameters);
  const area = cylinderCm2(diameter);
  const times = crossings(
    model,
    model.stateAt(start),
    pieces.map(([length, nA]) => [length, (nA * 1e-3) / area]),
  );
  expect(times).toHaveLength(expected.length);
  times.forEach((time, k) => {
    expect(Math.abs(time - expected[k]!)).toBeLessThan(tolerance);
  });
});

// Luo & Rudy 1991, Circ Res 68:1501–1526: rest −84.547 mV, peak 42.3008 mV, dV/dt 407.0 V/s, APD90 366.74 ms after
// 80 µA/cm² for 0.5 ms, computed apart with LSODA (sodium current found, the others from memory).
test('heart cell: rest, peak, steepest rise and duration', () => {
  const model = ventricularMyocyte(heart1991);
  const rest = settle(model, -84.5, 1500);
  expect(rest[0]!).toBeCloseTo(-84.547, 1);
  const run = integrator(model, rest);
  let peak = -Infinity;
  let steepest = 0;
  let steepestAt = 0;
  let end = 0;
  let before = rest[0]!;
  for (let k = 1; k <= 45_000 && end === 0; k++) {
    run.step(0.01, k <= 50 ? 80 : 0, 0, 0);
    const v = run.state[0]!;
    const slope = (v - before) / 0.01;
    before = v;
    peak = Math.max(peak, v);
    if (slope > steepest) {
      steepest = slope;
      steepestAt = k * 0.01;
    }
    if (k > 10_000 && v < peak - 0.9 * (peak - rest[0]!)) end = k * 0.01;
  }
  expect(peak).toBeCloseTo(42.3, 1);
  expect(Math.abs(steepest - 407)).toBeLessThan(2);
  expect(Math.abs(end - steepestAt - 366.74)).toBeLessThan(0.5);
});

test('a blocked sodium conductance leaves no spike', () => {
  const model = corticalCell(regularSpiking2008);
  const density = (0.75 * 1e-3) / cylinderCm2(96);
  expect(crossings(model, model.stateAt(-70), [[100, density]]).length).toBeGreaterThan(1);
  model.scale('na', 0.01);
  expect(crossings(model, model.stateAt(-70), [[100, density]])).toEqual([]);
});
