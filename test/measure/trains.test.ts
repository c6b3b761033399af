import { describe, expect, test } from 'vitest';
import { spikeCriteria } from '../../pipeline/measure/spike-criteria.ts';
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import { groupsOf } from '../../pipeline/measure/trains.ts';
import type { MeasureContext, Signal } from '../../pipeline/measure/types.ts';
import { simulate, wangBuzsaki, withNoise } from '../helpers/models.ts';
import { addSpike, input, neuron, numberIn, signalOf } from './made.ts';

const context: MeasureContext = { ...neuron, ...spikeCriteria('fast-spiking-interneuron') };
const sweepOf = (voltage: Signal, current: Signal | null = null) => measureSweep(input({ voltage, current }), context);

const silent: Signal['samples'] = new Float64Array(20_000).fill(-70);
const trainAt = (times_s: number[], noise = 0.05): Signal => {
  const mv = withNoise(silent, noise, 5);
  for (const at of times_s) addSpike(mv, 20_000, at, 90, 6);
  return { samples: mv, rate_hz: 20_000, start_s: 0 };
};

describe('doublets and bursts', () => {
  // Times in ms; groups by hand from the definition.
  test.each([
    ['regular train', [100, 150, 200, 250], []],
    ['fast regular train, no pause', [100, 102, 104, 106], []],
    ['doublet in a train', [100, 200, 205, 300], [[1, 2]]],
    ['doublet at the start', [100, 105, 200, 300], [[0, 2]]],
    ['doublet at the end', [100, 200, 204], [[1, 2]]],
    [
      'two bursts',
      [100, 105, 111, 300, 306, 312, 319],
      [
        [0, 3],
        [3, 4],
      ],
    ],
    ['a pair alone', [100, 105], []],
    ['a pair 25 ms apart is none', [100, 300, 325, 600], []],
    ['a pause of less than three intervals is none', [100, 115, 150, 165, 200], []],
  ] as const)('%s', (_, ms, groups) =>
    expect(groupsOf(ms.map((t) => t / 1000)).map(({ first, count }) => [first, count])).toEqual(groups),
  );

  test('shifting, stretching below the limit and reversing time keep their number', () => {
    const times = [0.1, 0.104, 0.3, 0.305, 0.311, 0.6, 0.8, 0.804];
    const kinds = (at: number[]): number[] => groupsOf(at).map((group) => group.count);
    expect(kinds(times)).toEqual([2, 3, 2]);
    expect(kinds(times.map((t) => t + 7))).toEqual([2, 3, 2]);
    expect(kinds(times.map((t) => 2 * t))).toEqual([2, 3, 2]);
    expect(kinds(times.map((t) => 1 - t).reverse())).toEqual([2, 3, 2]);
  });

  test('counted on a trace', () => {
    const { readings } = sweepOf(trainAt([0.1, 0.105, 0.3, 0.305, 0.31, 0.6, 0.8]));
    expect(numberIn(readings, 'spikes')).toBe(7);
    expect([numberIn(readings, 'doublets'), numberIn(readings, 'bursts')]).toEqual([1, 1]);
    expect(numberIn(readings, 'largest_instantaneous_rate_hz')).toBeCloseTo(200, 0);
  });
});

describe('trains above 400 Hz', () => {
  /** Truth: upward crossings of a level that only spikes reach, on the clean trace at 20 kHz. */
  const crossings = (mv: Float64Array, level: number): number =>
    mv.reduce((n, v, i) => n + (i > 0 && mv[i - 1]! < level && v >= level ? 1 : 0), 0);
  /** Spikes of 60 mV and 0.5 ms on a floor of −55 mV, so many a second for 200 ms. */
  const made = (hz: number): Float64Array =>
    Float64Array.from({ length: 6000 }, (_, i) => {
      const t = i / 20 - 50;
      if (t < 0 || t >= 200) return -65;
      const phase = t % (1000 / hz);
      return -55 + 60 * Math.exp(-(((phase - 0.6) / 0.22) ** 2)) - 6 * Math.exp(-(((phase - 1.2) / 0.3) ** 2));
    });
  const trains: [string, Float64Array, number][] = [
    // Wang & Buzsáki 1996, J Neurosci 16:6402–6413, at 20 µA/cm²: 405 Hz.
    [
      'fast-spiking model',
      simulate(wangBuzsaki(), 20_000, [
        [50, 0],
        [200, 20],
        [50, 0],
      ]).mv,
      -20,
    ],
    ['450 Hz', made(450), -20],
    ['600 Hz', made(600), -20],
  ];
  for (const [name, clean, level] of trains)
    for (const every of [1, 2])
      for (const noise of [0.05, 0.3])
        test(`${name}: every spike counts once at ${20 / every} kHz, through ${noise} mV of noise`, () => {
          const truth = crossings(clean, level);
          expect(truth / 0.2).toBeGreaterThan(400);
          const mv = withNoise(clean, noise, 3).filter((_, i) => i % every === 0);
          const { readings } = sweepOf({ samples: mv, rate_hz: 20_000 / every, start_s: 0 });
          expect(numberIn(readings, 'spikes')).toBe(truth);
          expect(numberIn(readings, 'largest_instantaneous_rate_hz')).toBeGreaterThan(400);
          expect(numberIn(readings, 'bursts')).toBe(0);
        });
});

describe('depolarization block', () => {
  const driven = (pa: number) => {
    const clean = simulate(wangBuzsaki(), 20_000, [
      [50, 0],
      [300, pa],
      [60, 0],
      [5, 10],
      [85, 0],
    ]);
    const current = signalOf(0.5, 20_000, (t) => (t >= 0.05 && t < 0.35 ? pa : t >= 0.41 && t < 0.415 ? 10 : 0));
    return sweepOf({ samples: withNoise(clean.mv, 0.05, 9), rate_hz: 20_000, start_s: 0 }, current);
  };

  // Wang & Buzsáki's cell fires at 405 Hz at 20 µA/cm² and falls silent near −29 mV at 30, after some shrinking spikes.
  test('a cell driven beyond its range is blocked, and fires again on the pulse after it', () => {
    const sweep = driven(30);
    expect(sweep.depolarization_block).toBe(true);
    expect(numberIn(sweep.readings, 'block_onset_ms')).toBeLessThan(60);
    const recovery = numberIn(sweep.readings, 'block_recovery_ms');
    expect(recovery).toBeGreaterThan(60);
    expect(recovery).toBeLessThan(75);
    // What oscillates on in the block is no spikelet.
    expect(numberIn(sweep.readings, 'spikelets')).toBe(0);
  });
  test('one that fires throughout is not', () => {
    const sweep = driven(10);
    expect(sweep.depolarization_block).toBe(false);
    expect(sweep.readings['block_onset_ms']!.why).toBe('not-blocked');
  });
});

describe('spikelets', () => {
  const events = (height: number, decay_ms: number, noise: number): Signal => {
    const mv = withNoise(silent, noise, 11);
    for (let k = 0; k < 8; k++)
      for (let i = 0; i < 2000; i++) {
        const t = i / 20;
        mv[2000 + 2200 * k + i]! += height * (1 - Math.exp(-t / 0.3)) ** 3 * Math.exp(-t / decay_ms) * 1.6;
      }
    return { samples: mv, rate_hz: 20_000, start_s: 0 };
  };
  test.each([0.05, 0.3])('brief all-or-none events are counted, with %s mV of noise', (noise) => {
    const { readings } = sweepOf(events(8, 1.5, noise));
    expect(numberIn(readings, 'spikelets')).toBe(8);
    expect(numberIn(readings, 'spikes')).toBe(0);
  });
  test('synaptic potentials, which decay over 15 ms, are none', () =>
    expect(numberIn(sweepOf(events(8, 15, 0.05)).readings, 'spikelets')).toBe(0));
  test.each([0.1, 0.5, 1.5])('noise of %s mV is none', (noise) =>
    expect(numberIn(sweepOf({ ...trainAt([]), samples: withNoise(silent, noise, 13) }).readings, 'spikelets')).toBe(0),
  );
  test('spikes themselves are none', () =>
    expect(numberIn(sweepOf(trainAt([0.2, 0.4, 0.6])).readings, 'spikelets')).toBe(0));
});
