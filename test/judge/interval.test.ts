/** What `near limit` promises, held over every check at once: the 95 % interval straddles the limit, and only then. */
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { judgeCell } from '../../pipeline/judge/judge.ts';
import type { Finding } from '../../pipeline/judge/types.ts';
import { quantity } from '../../pipeline/measure/quantities.ts';
import { finding, made, read, soundReadings } from './made.ts';

const held = (findings: readonly Finding[]): Finding[] => findings.filter((one) => one.value !== null);

/** Readings of every quantity of the made-up cell, each moved and with a half-width of its own. */
const moved = fc
  .array(fc.tuple(fc.double({ min: -1.5, max: 3, noNaN: true }), fc.double({ min: 0, max: 0.6, noNaN: true })), {
    minLength: Object.keys(soundReadings).length,
    maxLength: Object.keys(soundReadings).length,
  })
  .map((changes) =>
    Object.fromEntries(
      Object.entries(soundReadings).map(([id, reading], index) => {
        const [factor, share] = changes[index]!;
        const value = reading.value! * factor;
        return [id, read(value, { u95: share * Math.abs(value) })];
      }),
    ),
  );

test('near limit exactly where the interval straddles a limit, outside exactly where it lies beyond', () => {
  const seen = new Set<string>();
  fc.assert(
    fc.property(moved, (readings) => {
      for (const one of held(judgeCell(made({ readings })).findings)) {
        const [from, to] = [one.value! - one.uncertainty!, one.value! + one.uncertainty!];
        const limits = [one.limit_low, one.limit_high].filter((limit) => limit !== null);
        const straddles = limits.some((limit) => from < limit && limit < to);
        const beyond =
          (one.limit_low !== null && to < one.limit_low) || (one.limit_high !== null && from > one.limit_high);
        expect([one.check, one.outcome]).toEqual([one.check, beyond ? 'outside' : straddles ? 'near limit' : 'within']);
        if (one.outcome === 'near limit') expect(one.sentence).toMatch(/straddles/);
        seen.add(one.outcome);
      }
    }),
    { seed: 41, numRuns: 60 },
  );
  expect([...seen].sort()).toEqual(['near limit', 'outside', 'within']);
});

test('no comparison is surer than its number, but for those that leave its half-width out', () =>
  fc.assert(
    fc.property(moved, (readings) => {
      for (const one of held(judgeCell(made({ readings })).findings))
        expect(one.uncertainty!, one.check).toBeGreaterThanOrEqual((one.value_u95 ?? 0) * (1 - 1e-12));
    }),
    { seed: 42, numRuns: 30 },
  ));

describe('nothing is counted twice', () => {
  // By hand: corner 8 kHz, height 84 mV: 8 · 84/0.66 = 1018.18 V/s, ±10 % of the corner; what the filter took is in the
  // half-width of the rise and is what the check asks about.
  test('what the filter may have cost is not held against the check that asks for it', () => {
    const found = finding('filter-passes-rise', { readings: { max_rise_v_per_s: read(380, { u95: 300 }) } });
    expect(found).toMatchObject({ outcome: 'within', value_u95: null });
    expect(found.uncertainty).toBeCloseTo(101.818, 3);
  });
  // √(0.1² + (8.4/84)²) · 1018.18 = 143.99.
  test('a limit taken from another number is no surer than that number', () =>
    expect(
      finding('filter-passes-rise', { readings: { spike_height_mv: read(84, { u95: 8.4 }) } }).uncertainty,
    ).toBeCloseTo(143.99, 2));
  // The limit is half the height: √(4² + (6/2)²) = 5.
  test('half of a height is known twice as well as the height', () =>
    expect(
      finding('spike-goes-up', {
        readings: { height_from_rest_mv: read(111, { u95: 4 }), spike_height_mv: read(84, { u95: 6 }) },
      }).uncertainty,
    ).toBeCloseTo(5, 9));
  // A tenth of 200 MΩ: ±20 MΩ, known to a tenth of ±30; √(2² + 3²) = 3.606.
  test('a bridge held against a tenth of the access', () =>
    expect(
      finding('bridge-error', {
        readings: { bridge_error_mohm: read(4, { u95: 2 }), access_resistance_mohm: read(200, { u95: 30 }) },
      }).uncertainty,
    ).toBeCloseTo(Math.hypot(2, 3), 9));
});

test('where a number should carry a half-width and carries none, the finding says so, and only there', () => {
  const bare = Object.fromEntries(Object.entries(soundReadings).map(([id, reading]) => [id, { value: reading.value }]));
  const findings = held(judgeCell(made({ readings: bare })).findings).filter((one) => one.sweep === null);
  expect(findings.length).toBeGreaterThan(20);
  const leaveOut = new Set(['filter-passes-rise', 'rise-samples']);
  for (const one of findings) {
    // A median over sweeps has a half-width even where the cell's own reading has none.
    const owed = quantity(one.quantity).uncertainty !== undefined && one.value_u95 === null && !leaveOut.has(one.check);
    expect([one.check, /is not known/.test(one.sentence)]).toEqual([one.check, owed]);
  }
  const known = held(
    judgeCell(
      made({
        readings: Object.fromEntries(
          Object.entries(soundReadings).map(([id, reading]) => [id, { ...reading, u95: 0 }]),
        ),
      }),
    ).findings,
  );
  for (const one of known.filter((finding) => finding.sweep === null)) expect(one.sentence).not.toMatch(/is not known/);
});
