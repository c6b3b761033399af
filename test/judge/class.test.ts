import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { junctionWidening, moveRange } from '../../pipeline/judge/class-checks.ts';
import { type ClassRange, classRanges, shippedClass, shippedClasses } from '../../pipeline/judge/class-ranges.ts';
import { practiceRanges, type StudyRow, studyRows } from '../../pipeline/judge/class-studies.ts';
import { cellSd, deriveRange, quantitiesOfClass, rangeOfRows, scaling } from '../../pipeline/judge/envelope.ts';
import { quantity } from '../../pipeline/measure/quantities.ts';
import { spikeCriteria } from '../../pipeline/measure/spike-criteria.ts';
import { finding, judged, outcome, read } from './made.ts';

const row = (values: Partial<StudyRow>): StudyRow =>
  ({
    class: 'motoneuron',
    cells: 'made up',
    source: 'made up',
    status: 'FOUND',
    temperature_c: null,
    reading: 'unknown',
    quantity: 'resting_potential_mv',
    ...values,
  }) as StudyRow;

describe('from studies to ranges', () => {
  // By hand: SE 2 of 16 cells is a deviation of 8; −60 ± 3 · 8.
  test('a standard error becomes a deviation', () => {
    expect(cellSd(row({ mean: -60, spread: 2, spread_kind: 'SE', n: 16 }))).toBe(8);
    expect(rangeOfRows([row({ mean: -60, spread: 2, spread_kind: 'SE', n: 16 })], 'potential', 3)).toEqual([-84, -36]);
  });
  test('a standard error without n is no deviation', () =>
    expect(cellSd(row({ mean: -60, spread: 2, spread_kind: 'SE' }))).toBeNull());
  test('several studies: from the lowest mean down to the highest mean up, by the median deviation', () =>
    expect(
      rangeOfRows(
        [
          row({ mean: -70, spread: 4, spread_kind: 'SD', n: 9 }),
          row({ mean: -60, spread: 6, spread_kind: 'SD', n: 9 }),
          row({ mean: -65, spread: 50, spread_kind: 'SD', n: 3 }),
        ],
        'potential',
        3,
      ),
    ).toEqual([-88, -42]));
  // By hand: a deviation as large as the mean is √ln 2 = 0.8326 on the logarithm; e^(3 · 0.83255) = 12.154.
  test('sizes spread on the logarithm and stay positive', () => {
    const [low, high] = rangeOfRows([row({ mean: 100, spread: 100, spread_kind: 'SD', n: 9 })], 'size', 3)!;
    expect(low).toBeCloseTo(100 / 12.154, 2);
    expect(high).toBeCloseTo(1215.4, 1);
  });
  test('negative rates keep their sign', () => {
    const [low, high] = rangeOfRows([row({ mean: -100, spread: 10, spread_kind: 'SD', n: 9 })], 'rate', 3)!;
    expect(low).toBeLessThan(-100);
    expect(high).toBeGreaterThan(-100);
    expect(high).toBeLessThan(0);
  });
  test('a printed range is taken in with a margin: 5 mV or a quarter of its width', () => {
    expect(rangeOfRows([row({ low: -60, high: -50 } as Partial<StudyRow>)], 'potential', 3)).toEqual([-65, -45]);
    expect(rangeOfRows([row({ low: -90, high: -50 } as Partial<StudyRow>)], 'potential', 3)).toEqual([-100, -40]);
  });
  test('no rows, no range', () => expect(rangeOfRows([], 'size', 3)).toBeNull());
});

describe('the table of ranges', () => {
  test('holds every shipped class', () =>
    expect(shippedClasses).toEqual([
      'cortical-pyramidal',
      'hippocampal-pyramidal',
      'fast-spiking-interneuron',
      'somatostatin-interneuron',
      'purkinje',
      'midbrain-dopaminergic',
      'sensory-neuron-small',
      'sensory-neuron-large',
      'motoneuron',
      'stem-cell-neuron',
      'ventricular-myocyte',
      'stem-cell-cardiomyocyte',
      'sinoatrial-node',
      'skeletal-muscle',
      'squid-axon',
      'chromaffin',
      'any',
    ]));
  test.each(shippedClasses)('%s: derived again from the studies, it is the same', (id) => {
    expect(Object.keys(classRanges[id].ranges)).toEqual(quantitiesOfClass(id));
    for (const [of, range] of Object.entries(classRanges[id].ranges))
      expect({ of, ...range }).toEqual({ of, ...deriveRange(id, of) });
  });
  test.each(shippedClasses.filter((id) => id !== 'any'))(
    '%s has ranges, each with a source and known to the registry',
    (id) => {
      const ranges = Object.entries(classRanges[id].ranges);
      expect(ranges.length).toBeGreaterThanOrEqual(3);
      for (const [of, range] of ranges) {
        expect(quantity(of).levels).toContain('cell');
        expect(range.source).toMatch(/\S{4}/);
        expect(range.low ?? Number.NEGATIVE_INFINITY).toBeLessThan(range.high!);
        expect(range.temperature_c[0]).toBeLessThanOrEqual(range.temperature_c[1]);
      }
    },
  );
  test.each(shippedClasses)('%s: spikes are told as measuring finds them', (id) =>
    expect(classRanges[id].spikes).toEqual(spikeCriteria(id)),
  );
  test('“any” has none: physics only', () => expect(classRanges.any.ranges).toEqual({}));
  test('an unknown class is judged by physics only', () => expect(shippedClass('toString')).toBe('any'));
  test('every row belongs to a shipped class and a scaled quantity, and names its source', () => {
    for (const one of studyRows) {
      expect(shippedClasses).toContain(one.class);
      expect(Object.keys(scaling)).toContain(one.quantity);
      expect(one.source.length).toBeGreaterThan(5);
    }
  });
  test('no mammal’s range comes from squid and the other way round', () => {
    for (const one of studyRows)
      expect([one.cells, /squid|axon/.test(one.cells)]).toEqual([one.cells, one.class === 'squid-axon']);
  });
});

describe('published cells are within their own class', () => {
  test.each(studyRows.map((one, index) => ({ ...one, name: `${index} ${one.class} ${one.quantity}` })))(
    '$name',
    (one) => {
      const values = 'mean' in one ? [one.mean] : [one.low, one.high];
      const range = classRanges[one.class].ranges[one.quantity]!;
      for (const value of values)
        for (const at of one.temperature_c ?? [35]) {
          const answer = outcome(`class-${one.quantity.replaceAll('_', '-')}`, {
            readings: { [one.quantity]: read(value) },
            circumstances: {
              like: one.class,
              class_id: one.class,
              temperature_c: at,
              reading: range.reading === 'corrected' ? 'corrected' : 'recorded',
              junction: range.reading === 'corrected' ? 'corrected' : 'unstated',
            },
          });
          expect(answer).toBe('within');
        }
    },
  );
  test('and so are the middles of the practice ranges', () => {
    for (const [id, ranges] of Object.entries(practiceRanges))
      for (const [of, [low, high]] of Object.entries(ranges)) {
        const range = classRanges[id as keyof typeof classRanges].ranges[of]!;
        const middle = (low + high) / 2;
        expect([id, of, (range.low ?? low) <= middle && middle <= range.high!]).toEqual([id, of, true]);
      }
  });
});

const width: ClassRange = {
  low: 0.5,
  high: 1,
  temperature_c: [37, 37],
  q10: 'time',
  q10_range: [2, 3],
  reading: 'unknown',
  source: 'made up',
};

describe('temperature', () => {
  // By hand: from 37 to 27 °C a time grows by a factor of 2 (Q10 2) to 3 (Q10 3).
  test('ten degrees colder', () => expect(moveRange(width, 27)).toEqual({ ok: true, low: 1, high: 3 }));
  test('at the source’s temperature nothing moves', () =>
    expect(moveRange(width, 37)).toEqual({ ok: true, low: 0.5, high: 1 }));
  test('a rate moves the other way', () => {
    const moved = moveRange({ ...width, q10: 'rate', low: 90, high: 600 }, 27);
    expect(moved).toMatchObject({ ok: true, high: 300 });
    expect((moved as { low: number }).low).toBeCloseTo(30, 9);
  });
  test('the fall, a negative rate, grows away from zero', () => {
    const moved = moveRange({ ...width, q10: 'rate', low: -300, high: -60 }, 47) as { low: number; high: number };
    expect(moved.low).toBeCloseTo(-900, 9);
    expect(moved.high).toBeCloseTo(-120, 9);
  });
  test('sources at several temperatures widen the range', () =>
    expect(moveRange({ ...width, temperature_c: [27, 37] }, 27)).toEqual({ ok: true, low: 0.5, high: 3 }));
  test('a potential is not moved and needs no temperature', () =>
    expect(moveRange({ ...width, q10: 'none' }, null)).toEqual({ ok: true, low: 0.5, high: 1 }));
  test('fifteen degrees and no more', () => {
    expect(moveRange(width, 22).ok).toBe(true);
    expect(moveRange(width, 21.9)).toMatchObject({ ok: false, missing: [] });
  });
  test('an unstated temperature is asked for', () =>
    expect(moveRange(width, null)).toMatchObject({ ok: false, missing: ['temperature_c'] }));
  test('moving away from the sources never narrows a range in ratio', () =>
    fc.assert(
      fc.property(fc.double({ min: 22, max: 52, noNaN: true }), (at) => {
        const moved = moveRange(width, at) as { low: number; high: number };
        expect(moved.high / moved.low).toBeGreaterThanOrEqual(2 - 1e-9);
      }),
      { seed: 31 },
    ));
});

describe('junction state: like with like', () => {
  test.each([
    ['corrected cell, sources silent', 'corrected', 'uncorrected', 'unknown', 16, 0],
    ['corrected cell, corrected sources', 'corrected', 'corrected', 'corrected', 0, 0],
    ['corrected cell, sources as recorded', 'corrected', 'corrected', 'recorded', 16, 0],
    ['uncorrected cell, sources silent', 'recorded', 'uncorrected', 'unknown', 0, 16],
    ['uncorrected cell, sources as recorded', 'recorded', 'uncorrected', 'recorded', 0, 0],
    ['cell and sources silent', 'recorded', 'unstated', 'unknown', 16, 16],
    ['silent cell, corrected sources', 'recorded', 'unstated', 'corrected', 0, 16],
  ] as const)('%s', (_name, reading, junction, source, low, high) =>
    expect(junctionWidening({ reading: source }, { reading, junction })).toEqual({ low, high }),
  );
});

describe('a cell against its class', () => {
  const half = (value: number, more = {}) =>
    outcome('class-half-width-ms', { readings: { half_width_ms: read(value, more) } });
  test('half-width of a layer 5 pyramidal neuron at 33 °C', () =>
    expect([half(0.9), half(4), half(0.1)]).toEqual(['within', 'outside', 'outside']));
  test('an excess inside the uncertainty is near the limit', () => expect(half(2.6, { se: 0.2 })).toBe('near limit'));
  test('a potential as recorded has no correction that could be off: offset and measurement alone', () => {
    const of = (circumstances: object) =>
      finding('class-threshold-mv', { readings: { threshold_mv: read(-52, { u95: 1.5 }) }, circumstances }).uncertainty;
    expect(of({ reading: 'recorded', junction: 'uncorrected', ljp_mv: null, ljp_from: null })).toBeCloseTo(2.5, 9);
    expect(of({ reading: 'corrected', ljp_from: 'computed' })).toBeCloseTo(Math.hypot(2, 1.5, 3.5), 9);
  });
  test('the same number is right for another class', () =>
    expect(
      outcome('class-half-width-ms', {
        readings: { half_width_ms: read(4) },
        circumstances: { like: 'sensory-neuron-small', class_id: 'nociceptor' },
      }),
    ).toBe('within'));
  test('a class without a range for the quantity says nothing', () =>
    expect(outcome('class-sag-fraction', { circumstances: { like: 'squid-axon' } })).toBe('silent'));
  test('no class stated: numbers that were measured say so, others do not', () => {
    const cell = { circumstances: { like: 'any', class_id: null, class_label: null }, without: ['max_rate_hz'] };
    expect(finding('class-half-width-ms', cell)).toMatchObject({ outcome: 'not measured', missing: ['class'] });
    expect(outcome('class-max-rate-hz', cell)).toBe('silent');
  });
  test('“any” by choice: no class check at all', () =>
    expect(
      judged({ circumstances: { like: 'any', class_id: 'odd-cell' } }).findings.filter((one) => one.ground === 'class'),
    ).toEqual([]));
  test('a missing number is not measured, with its reason', () =>
    expect(
      finding('class-rheobase-pa', {
        circumstances: { like: 'motoneuron' },
        readings: { rheobase_pa: { value: null, why: 'never-fired' } },
      }).sentence,
    ).toMatch(/no step made the cell fire/));
});
