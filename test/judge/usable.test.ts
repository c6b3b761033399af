import fc from 'fast-check';
import { expect, test } from 'vitest';
import type { NumberedSweep } from '../../pipeline/measure/types.ts';
import { judged, type Made, read, spike, sweep } from './made.ts';

const run = (length: number, change: (number: number) => Parameters<typeof sweep>[1], cell: Made = {}) => {
  const sweeps: NumberedSweep[] = Array.from({ length }, (_, number) => sweep(number, change(number)));
  return judged({ ...cell, sweeps }).usable;
};

test('all sweeps', () => expect(run(4, () => ({}))?.sentence).toBe('All 4 sweeps meet the limits for single sweeps.'));
test('a single sweep', () =>
  expect(run(1, () => ({}))).toMatchObject({
    from_sweep: 0,
    to_sweep: 0,
    sweeps: 1,
    sentence: 'The only sweep meets the limits for single sweeps.',
  }));
test('no usable sweep', () => expect(run(3, () => ({ readings: { noise_rms_mv: read(4) } }))).toBeNull());
test('the longest run, with why it ends', () =>
  expect(run(10, (number) => ({ readings: { baseline_mv: read(number < 7 ? -70 : -58) } }))).toEqual({
    from_sweep: 0,
    to_sweep: 6,
    sweeps: 7,
    sentence:
      'Sweeps 0 to 6 (7 of 10) meet the limits for single sweeps. It ends before sweep 7: its baseline, −58.0 mV, lies 12.0 mV from the −70.0 mV held otherwise.',
  }));
test('the longest run, with why it starts late', () =>
  expect(run(6, (number) => ({ readings: { clipped_fraction: read(number === 1 ? 0.2 : 0) } }))?.sentence).toBe(
    'Sweeps 2 to 5 (4 of 6) meet the limits for single sweeps. It starts after sweep 1: the share of clipped samples in sweep 1 is outside its limit.',
  ));
test('of equally long runs the earlier', () =>
  expect(run(5, (number) => ({ readings: { noise_rms_mv: read(number === 2 ? 4 : 0.1) } }))).toMatchObject({
    from_sweep: 0,
    to_sweep: 1,
  }));
test('a sweep held elsewhere on purpose is compared with its like', () =>
  expect(
    run(6, (number) => ({
      readings: { holding_pa: read(number % 2 ? -100 : 0), baseline_mv: read(number % 2 ? -88 : -79) },
    })),
  ).toMatchObject({ sweeps: 6 }));
test('a spike that shrinks below 80 % of the usual', () =>
  expect(run(6, (number) => ({ spikes: [spike(0, { spike_height_mv: number < 4 ? 84 : 60 })] }))?.sentence).toMatch(
    /Sweeps 0 to 3 .* its first spike, 60\.0 mV high, reaches less than 80 % of the usual 84\.0 mV\.$/,
  ));
test('the lab’s own limit on a sweep ends it too', () =>
  expect(
    run(4, (number) => ({ readings: { access_resistance_mohm: read(number < 2 ? 20 : 28) } }), {
      input: { policy: [{ quantity: 'access_resistance_mohm', above: null, below: 25, origin: 'almanac.yaml' }] },
    }),
  ).toMatchObject({ from_sweep: 0, to_sweep: 1 }));

test('the stretch is a run of sweeps without complaint, and no longer run exists', () =>
  fc.assert(
    fc.property(fc.array(fc.boolean(), { minLength: 1, maxLength: 30 }), (good) => {
      const found = run(good.length, (number) => ({ readings: { noise_rms_mv: read(good[number] ? 0.1 : 4) } }));
      const longest = Math.max(
        ...good.map((_, from) => {
          const end = good.findIndex((one, index) => index >= from && !one);
          return (end < 0 ? good.length : end) - from;
        }),
      );
      expect(found?.sweeps ?? 0).toBe(longest);
      if (found) {
        expect(good.slice(found.from_sweep, found.to_sweep + 1).every(Boolean)).toBe(true);
        expect(found.to_sweep - found.from_sweep + 1).toBe(found.sweeps);
      }
    }),
    { seed: 41, numRuns: 60 },
  ));
