import { describe, expect, test } from 'vitest';
import {
  centralSlopes,
  hendersonByHand,
  lineByHand,
  spikeByHand,
  stepWords,
  thermalMv,
  timeConstantByHand,
} from '../../site/example.ts';

describe('a spike by hand', () => {
  // Straight flanks, known without any arithmetic: rest −60 mV; from sample 10 on 10 mV a sample up to +40, then −5 mV
  // a sample. At 10 kHz the rise is 100 V/s; central slopes are 0, 50, 100 V/s at samples 9, 10, 11.
  const mv = [
    ...Array.from({ length: 10 }, () => -60),
    ...Array.from({ length: 11 }, (_, i) => -60 + 10 * i),
    ...Array.from({ length: 25 }, (_, i) => 35 - 5 * i),
  ];
  const hand = spikeByHand({ spike: 0, start_s: 1, rate_hz: 10_000, mv }, 25)!;
  test('slopes are differences of neighbours', () => {
    const slopes = centralSlopes(mv, 10_000);
    expect(slopes[0]).toBeNaN();
    expect(slopes.slice(9, 12)).toEqual([0, 50, 100]);
  });
  test('threshold lies where the criterion is crossed, in proportion', () => {
    expect(hand.k).toBe(9);
    expect(hand.threshold.s).toBeCloseTo(1 + 9.5 / 10_000, 12);
    expect(hand.threshold.mv).toBeCloseTo(-60, 12);
  });
  // Through 30, 40, 35: bend −15, offset (30 − 35)/(2·−15) = 1/6, top 40 − (−5)(1/6)/4 = 40.2083.
  test('peak is the vertex through three samples', () => {
    expect(hand.peak.mv).toBeCloseTo(40.208333, 6);
    expect(hand.peak.s).toBeCloseTo(1 + (20 + 1 / 6) / 10_000, 12);
  });
  // Half way: −9.8958 mV; up at sample 15.01042, down at 20 + (40 + 9.8958)/5 = 29.97917: 14.96875 samples of 0.1 ms.
  test('half-width', () => expect(hand.halfWidthMs).toBeCloseTo(1.496875, 6));
  test('nothing where the criterion is never left', () =>
    expect(spikeByHand({ spike: 0, start_s: 0, rate_hz: 10_000, mv: mv.slice(11) }, 25)).toBeNull());
});

test('a line through points on a line', () =>
  expect(
    lineByHand([
      [0, 1],
      [2, 5],
      [5, 11],
    ]),
  ).toMatchObject({ n: 3, slope: 2, intercept: 1 }));

test.each([3, 12, 40])('an exponential of %d ms, whatever it is said to head for', (tau) => {
  const response = Array.from({ length: 1000 }, (_, k) => {
    const ms = k * 0.2 - 10;
    return { ms, mv: ms < 0 ? -70 : -70 - 8 * (1 - Math.exp(-ms / tau)) };
  });
  for (const steady of [-8, -7.7]) expect(timeConstantByHand(response, steady)!.ms).toBeCloseTo(tau, 6);
});

// CODATA 2018: R = 8.314462618 J/(mol K), F = 96485.33212 C/mol; 25 °C: 25.6926 mV.
test('RT/F', () => expect(thermalMv(25)).toBeCloseTo(25.6926, 4));

// Two solutions of one salt: (RT/F)·(u₊ − u₋)/(u₊ + u₋)·ln(c_P/c_B), bath minus pipette: −25.6926 · 0.2 · ln 10 · −1.
test('Henderson’s equation becomes Planck’s for one salt at two strengths', () => {
  const ion = (valence: number, mobility: number) => ({ valence, mobility, pipette_mm: 100, bath_mm: 10 }) as never;
  const { mv } = hendersonByHand({ celsius: 25, ions: [ion(1, 0.6), ion(-1, 0.4)] });
  expect(mv).toBeCloseTo(25.6926 * 0.2 * Math.log(10), 3);
});

test('what is said of the two numbers', () => {
  const words = (value: number, reported: number, u95: number | null) =>
    stepWords({ quantity: 'peak_mv', how: '', lines: [], value, reported, u95 }).agrees;
  expect(words(31.24, 31.26, null)).toBe('the same');
  expect(words(31.24, 31.5, 0.4)).toBe('within ±');
  expect(words(31.24, 31.5, 0.2)).toBe('differs by 0.26');
  expect(words(31.24, 31.5, null)).toBe('differs by 0.26');
});
