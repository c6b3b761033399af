import { describe, expect, test } from 'vitest';
import { envelopeOf, excerptOf } from '../../pipeline/measure/envelope.ts';
import { injectedCurrent, netIonicSign, phasesOf } from '../../pipeline/measure/phases.ts';
import type { Signal, Spike, Stimulus } from '../../pipeline/measure/types.ts';

const step: Stimulus = {
  kind: 'step',
  from: 'stated',
  onset_s: 0.1,
  end_s: 0.2,
  amplitude: 100,
  holding: -20,
  edges_s: [0.1, 0.2],
};

describe('net ionic current', () => {
  const zero = { pa: 0, se: 0 };
  test('without current its sign is that of −dV/dt', () => {
    expect(netIonicSign({ mv: 90, ms: 0.5, noise_mv: 0.1 }, zero, null)).toBe(-1);
    expect(netIonicSign({ mv: -90, ms: 0.5, noise_mv: 0.1 }, zero, null)).toBe(1);
  });
  test('a change within the noise has none', () =>
    expect(netIonicSign({ mv: 0.2, ms: 0.5, noise_mv: 0.1 }, zero, null)).toBe(0));
  // 100 pA into 100 pF charge 1 V/s. Rising at 2 V/s takes 100 pA inward more, at 0.5 V/s 50 pA flow out.
  test('with a capacitance the injected current counts', () => {
    const injected = { pa: 100, se: 0 };
    expect(netIonicSign({ mv: 2, ms: 1, noise_mv: 0.01 }, injected, 100)).toBe(-1);
    expect(netIonicSign({ mv: 0.5, ms: 1, noise_mv: 0.01 }, injected, 100)).toBe(1);
    expect(netIonicSign({ mv: 1, ms: 1, noise_mv: 0.01 }, injected, 100)).toBe(0);
  });
  test('without one it is known only where both terms agree', () => {
    expect(netIonicSign({ mv: -5, ms: 1, noise_mv: 0.1 }, { pa: 100, se: 1 }, null)).toBe(1);
    expect(netIonicSign({ mv: 5, ms: 1, noise_mv: 0.1 }, { pa: 100, se: 1 }, null)).toBe(0);
    expect(netIonicSign({ mv: 5, ms: 1, noise_mv: 0.1 }, { pa: -100, se: 1 }, null)).toBe(-1);
  });
  test('an unknown current or no length leaves it open', () => {
    expect(netIonicSign({ mv: 90, ms: 0.5, noise_mv: 0 }, null, 100)).toBe(0);
    expect(netIonicSign({ mv: 90, ms: 0, noise_mv: 0 }, zero, 100)).toBe(0);
  });
});

describe('injected current', () => {
  test('a stated step counts for the share of the time it is on', () => {
    const injected = injectedCurrent(null, step);
    expect(injected.mean(0, 0.05)?.pa).toBe(-20);
    expect(injected.mean(0.12, 0.15)?.pa).toBeCloseTo(80, 9);
    expect(injected.mean(0.05, 0.15)?.pa).toBeCloseTo(30, 9);
  });
  test('a recorded channel goes before a statement, unreadable samples are left out', () => {
    const samples = Float64Array.of(1, 1, Number.NaN, 3, 3);
    const injected = injectedCurrent({ samples, rate_hz: 1000, start_s: 0 }, step);
    expect(injected.mean(0, 0.004)?.pa).toBe(2);
    expect(
      injectedCurrent({ samples: Float64Array.of(Number.NaN), rate_hz: 1000, start_s: 0 }, step).mean(0, 1),
    ).toBeNull();
  });
  test('stated to be none it is zero; not stated it is unknown', () => {
    expect(injectedCurrent(null, { ...step, kind: 'none', holding: null }).mean(0, 1)).toEqual({ pa: 0, se: 0 });
    expect(injectedCurrent(null, { ...step, from: 'absent', kind: 'unknown' }).mean(0, 1)).toBeNull();
  });
});

describe('phases', () => {
  const none = injectedCurrent(null, { ...step, kind: 'none', holding: null });
  const names = (moments: Parameters<typeof phasesOf>[0]) =>
    phasesOf(moments, () => -50, 0, none, null).map((phase) => phase.name);
  test('four where all is found', () =>
    expect(names({ threshold_s: 1, peak_s: 1.001, return_s: 1.002, minimum_s: 1.004, end_s: 1.06 })).toEqual([
      'depolarization',
      'repolarization',
      'afterhyperpolarization',
      'recovery',
    ]));
  test('what was not found is left out', () => {
    expect(names({ threshold_s: null, peak_s: 1, return_s: null, minimum_s: null, end_s: 1.06 })).toEqual([]);
    expect(names({ threshold_s: 1, peak_s: 1.001, return_s: null, minimum_s: 1.004, end_s: 1.06 })).toEqual([
      'depolarization',
      'repolarization',
      'recovery',
    ]);
  });
});

describe('outline and excerpt', () => {
  const signal = (samples: Float64Array): Signal => ({ samples, rate_hz: 1000, start_s: 2 });
  test('the outline keeps the extremes and its times', () => {
    const samples = Float64Array.from({ length: 1000 }, (_, i) => Math.sin(i / 20));
    samples[777] = 40;
    const outline = envelopeOf(signal(samples), 50)!;
    expect(Math.max(...outline.high)).toBe(40);
    expect([outline.start_s, outline.end_s, outline.low.length]).toEqual([2, 3, 50]);
    expect(outline.gaps).toBeUndefined();
  });
  test('a gap is named and bridged with finite numbers, at the ends too', () => {
    const samples = new Float64Array(100).fill(1);
    samples.fill(Number.NaN, 0, 20);
    samples.fill(Number.NaN, 50, 70);
    samples.fill(3, 70, 100);
    const outline = envelopeOf(signal(samples), 10)!;
    expect(outline.gaps).toEqual([
      [0, 2],
      [5, 7],
    ]);
    expect([...outline.low, ...outline.high].every(Number.isFinite)).toBe(true);
    expect(outline.low[0]).toBe(1);
    expect(outline.low[5]).toBeGreaterThan(1);
    expect(outline.low[6]).toBeLessThan(3);
  });
  test('nothing readable has no outline', () => {
    expect(envelopeOf(signal(new Float64Array(0)), 10)).toBeNull();
    expect(envelopeOf(signal(new Float64Array(9).fill(Number.NaN)), 10)).toBeNull();
  });

  const spike = (values: Spike['values'], to_s: number): Spike => ({
    spike: 0,
    values,
    why: {},
    phases: [{ name: 'recovery', from_s: 2.5, to_s, net_ionic_sign: 0 }],
  });
  test('an excerpt runs from 5 ms before threshold to the end of the last phase', () => {
    const samples = Float64Array.from({ length: 1000 }, (_, i) => i);
    const excerpt = excerptOf(signal(samples), spike({ threshold_at_s: 2.4, peak_at_s: 2.41 }, 2.6))!;
    expect(excerpt.mv[0]).toBe(395);
    expect(excerpt.mv.at(-1)).toBe(600);
    expect(excerpt.start_s).toBeCloseTo(2.395, 9);
    expect(excerpt.rate_hz).toBe(1000);
  });
  test('it stops at unreadable samples, and none is made without a peak', () => {
    const samples = Float64Array.from({ length: 1000 }, (_, i) => (i === 450 ? Number.NaN : i));
    expect(excerptOf(signal(samples), spike({ threshold_at_s: 2.4, peak_at_s: 2.41 }, 2.6))!.mv.at(-1)).toBe(449);
    expect(excerptOf(signal(samples), spike({ threshold_at_s: 2.4, peak_at_s: null }, 2.6))).toBeNull();
  });
  test('a long one is averaged in blocks and says its rate', () => {
    const samples = Float64Array.from({ length: 20_000 }, (_, i) => i);
    const long = excerptOf(
      { samples, rate_hz: 20_000, start_s: 0 },
      spike({ threshold_at_s: 0.1, peak_at_s: 0.11 }, 0.9),
    )!;
    expect(long.mv.length).toBeLessThanOrEqual(6000);
    expect(long.rate_hz).toBeLessThan(20_000);
    expect(long.start_s * 20_000).toBeCloseTo(long.mv[0]!, 6);
  });
});
