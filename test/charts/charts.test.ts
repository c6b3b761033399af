import { scaleLinear } from 'd3';
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import type { SweepRow } from '../../pipeline/ledger/types.ts';
import type { ConditionMeasure, Envelope, Excerpt, Spike } from '../../pipeline/measure/types.ts';
import { controlChart, eventLetter } from '../../site/charts/control-chart.ts';
import { fewestForLimits, individualsLimits } from '../../site/charts/control-limits.ts';
import { domainOf, halfWidthRules, intervalEnds, ruledNote } from '../../site/charts/frame.ts';
import { coarser, envelopeLine, simplified, withGaps } from '../../site/charts/reduce.ts';
import { fiChart, viChart } from '../../site/charts/relations.ts';
import { sessionStrip } from '../../site/charts/session.ts';
import { phasePlane, spikeChart } from '../../site/charts/spike.ts';
import { sweepGroups, sweepsChart } from '../../site/charts/sweeps.ts';

const notNumbers = /NaN|undefined|Infinity|null/;

describe('control limits', () => {
  // NIST/SEMATECH e-Handbook of Statistical Methods, section 6.3.2.2: data, mean and limits as published there.
  const flowrate = [49.6, 47.6, 49.9, 51.3, 47.8, 51.2, 52.6, 52.4, 53.6, 52.1];
  test('the handbook’s flowrates: 50.81, limits 45.8159 and 55.8041', () => {
    const limits = individualsLimits(flowrate)!;
    expect(limits.centre).toBeCloseTo(50.81, 10);
    expect(limits.low).toBeCloseTo(45.8159, 4);
    expect(limits.high).toBeCloseTo(55.8041, 4);
  });
  test('none from fewer than two values', () => {
    expect(individualsLimits([])).toBeNull();
    expect(individualsLimits([4])).toBeNull();
  });
  test('shifting and stretching the values shifts and stretches the limits', () =>
    fc.assert(
      fc.property(
        fc.array(fc.double({ min: -100, max: 100, noNaN: true }), { minLength: 2, maxLength: 40 }),
        fc.double({ min: 0.1, max: 10, noNaN: true }),
        fc.double({ min: -50, max: 50, noNaN: true }),
        (values, scale, shift) => {
          const before = individualsLimits(values)!;
          const after = individualsLimits(values.map((value) => value * scale + shift))!;
          expect(after.low).toBeCloseTo(before.low * scale + shift, 6);
          expect(after.high).toBeCloseTo(before.high * scale + shift, 6);
        },
      ),
      { seed: 11 },
    ));
});

describe('fewer points for the same picture', () => {
  const envelope = (low: number[], high: number[]): Envelope => ({ start_s: 0, end_s: 1, low, high });
  test('a spike one column wide keeps its height', () => {
    const low = new Array<number>(600).fill(-70);
    const high = [...low];
    high[311] = 42;
    const reduced = coarser(envelope(low, high), 90);
    expect(reduced.high).toHaveLength(90);
    expect(Math.max(...reduced.high)).toBe(42);
    expect(Math.max(...[...envelopeLine(reduced, 1)].map(([, value]) => value))).toBe(42);
  });
  test('columns listed as unreadable are left open', () => {
    const open = withGaps({ ...envelope([1, 2, 3, 4], [2, 3, 4, 5]), gaps: [[1, 3]] });
    expect(open.low).toEqual([1, Number.NaN, Number.NaN, 4]);
    expect(open.high).toEqual([2, Number.NaN, Number.NaN, 5]);
  });
  test('gaps stay gaps', () => {
    const reduced = coarser(envelope([1, Number.NaN, Number.NaN, 1], [2, Number.NaN, Number.NaN, 2]), 4);
    expect([...envelopeLine(reduced, 0.1)].some(([, value]) => Number.isNaN(value))).toBe(true);
  });
  test('what is left out of a line lies within the tolerance of what is left in', () =>
    fc.assert(
      fc.property(fc.array(fc.double({ min: -9, max: 9, noNaN: true }), { minLength: 2, maxLength: 60 }), (ys) => {
        const points = ys.map((y, i) => [i, y] as [number, number]);
        const kept = simplified(points, 0.5);
        expect(kept[0]).toEqual(points[0]);
        expect(kept.at(-1)).toEqual(points.at(-1));
        for (const [x, y] of points) {
          const next = kept.findIndex(([at]) => at >= x);
          const [bx, by] = kept[next]!;
          const [ax, ay] = kept[Math.max(0, next - 1)]!;
          const onLine = bx === ax ? by : ay + ((by - ay) * (x - ax)) / (bx - ax);
          const slope = bx === ax ? 0 : (by - ay) / (bx - ax);
          expect(Math.abs(onLine - y) / Math.hypot(1, slope)).toBeLessThanOrEqual(0.5 + 1e-9);
        }
      }),
      { seed: 5 },
    ));
});

test('a domain holds its values; one value gets room around it; none gives none', () => {
  expect(domainOf([])).toBeNull();
  expect(domainOf([Number.NaN])).toBeNull();
  const [low, high] = domainOf([-70])!;
  expect(low).toBeLessThan(-70);
  expect(high).toBeGreaterThan(-70);
  expect(domainOf([1, 2], [5], 0)).toEqual([1, 5]);
});

describe('half-widths on charts', () => {
  const x = scaleLinear([0, 10], [0, 100]);
  const y = scaleLinear([0, 10], [100, 0]);
  test('a hairline from value − u95 to value + u95, cut at the frame', () =>
    expect(
      halfWidthRules(
        [
          { at: 1, value: 5, u95: 2 },
          { at: 2, value: 9, u95: 3 },
        ],
        x,
        y,
        3,
      ),
    ).toEqual({ svg: '<path d="M10,30V70M20,0V40" class="half-width"/>', ruled: 2 }));
  test('none where it is not known, or the mark hides it', () =>
    expect(
      halfWidthRules(
        [
          { at: 1, value: 5 },
          { at: 1, value: 5, u95: null },
          { at: 2, value: 5, u95: 0.1 },
        ],
        x,
        y,
        3,
      ),
    ).toEqual({ svg: '', ruled: 0 }));
  test('the axis holds both ends', () =>
    expect(
      intervalEnds([
        { at: 0, value: 5, u95: 2 },
        { at: 0, value: 9 },
      ]),
    ).toEqual([3, 7, 9]));
  test('the caption speaks of them only where there are any', () => {
    expect(ruledNote({ svg: '', alt: '' })).toBe('');
    expect(ruledNote({ svg: '', alt: '', ruled: 0 })).toBe('');
    expect(ruledNote({ svg: '', alt: '', ruled: 2 })).toMatch(/95 % half-widths/);
  });
});

const spike: Spike = {
  spike: 0,
  values: {
    threshold_mv: -45,
    threshold_at_s: 0.1,
    peak_mv: 35,
    peak_at_s: 0.1004,
    half_width_ms: 0.8,
    spike_height_mv: 80,
  },
  why: {},
  phases: [
    { name: 'depolarization', from_s: 0.1, to_s: 0.1004, net_ionic_sign: -1 },
    { name: 'repolarization', from_s: 0.1004, to_s: 0.1015, net_ionic_sign: 1 },
  ],
};
const excerpt: Excerpt = {
  spike: 0,
  start_s: 0.095,
  rate_hz: 20_000,
  mv: Array.from({ length: 400 }, (_, i) => -65 + 100 * Math.exp(-(((i - 108) / 8) ** 2))),
};

function sweepRow(over: Partial<SweepRow>): SweepRow {
  const low = Array.from({ length: 100 }, (_, i) => -70 + Math.sin(i / 9));
  return {
    cell: 'c1',
    sweep: 0,
    condition: 'baseline',
    since_start_s: null,
    file: 'a.nwb',
    series: 's',
    source_sweep: null,
    clamp: 'current',
    duration_s: 1,
    readings: {},
    spikes: [],
    depolarization_block: false,
    remarks: [],
    stimulus: { kind: 'none', from: 'absent', onset_s: null, end_s: null, amplitude: null, holding: null, edges_s: [] },
    voltage_envelope: { start_s: 0, end_s: 1, low, high: low.map((value) => value + 0.3) },
    current_envelope: null,
    first_spike: null,
    step_response: null,
    ...over,
  };
}

describe('charts', () => {
  const drawn = () => [
    sweepsChart([sweepRow({}), sweepRow({ sweep: 1 })], { e_k_mv: -95, e_na_mv: 60, highlight: 1 }),
    spikeChart({ excerpt, spike, e_na_mv: 60, e_k_mv: null }),
    phasePlane(excerpt, spike),
    sessionStrip({
      sweeps: [0, 1, 2].map((sweep) => sweepRow({ sweep, readings: { baseline_mv: { value: -70 - sweep } } })),
      quantity: 'baseline_mv',
      usable: { from_sweep: 0, to_sweep: 1, sweeps: 2, sentence: '' },
      withAxis: true,
    }),
    viChart([
      {
        condition: 'baseline',
        sweeps: [0],
        readings: { input_resistance_mohm: { value: 100 } },
        vi: [
          { sweep: 0, pa: -50, mv: -5 },
          { sweep: 1, pa: -100, mv: -10 },
        ],
        fi: [],
        reference_spike: null,
      } as ConditionMeasure,
    ]),
    fiChart([
      {
        condition: 'baseline',
        sweeps: [0],
        readings: { rate_gain_hz_per_na: { value: 200 } },
        vi: [],
        fi: [
          { sweep: 0, pa: 50, hz: 0 },
          { sweep: 1, pa: 100, hz: 12 },
        ],
        reference_spike: null,
      } as ConditionMeasure,
    ]),
  ];
  test('each has a text alternative and no coordinate that is no number, and is the same text each time', () => {
    const first = drawn();
    for (const chart of first) {
      expect(chart).not.toBeNull();
      expect(chart!.alt.length).toBeGreaterThan(20);
      expect(chart!.svg).toContain('role="img"');
      expect(chart!.svg.match(notNumbers)).toBeNull();
      expect(chart!.svg).not.toMatch(/ style=| id=/);
    }
    expect(drawn()).toEqual(first);
  });
  test('a broad spike’s slope is taken over a stretch that the axis names', () => {
    const broad = { ...spike, values: { ...spike.values, half_width_ms: 16 } };
    expect(phasePlane(excerpt, broad)!.svg).toContain('Rate of change over 0.4 ms');
    expect(phasePlane(excerpt, spike)!.svg).toContain('Rate of change (V/s)');
  });
  test('nothing to draw gives no chart rather than an empty one', () => {
    expect(sweepsChart([])).toBeNull();
    expect(sweepsChart([sweepRow({ voltage_envelope: null })])).toBeNull();
    expect(spikeChart({ excerpt: { ...excerpt, mv: [1, 2] }, spike, e_na_mv: null, e_k_mv: null })).toBeNull();
    expect(viChart([])).toBeNull();
    expect(sessionStrip({ sweeps: [sweepRow({})], quantity: 'baseline_mv', usable: null, withAxis: false })).toBeNull();
  });
  test('samples that could not be read leave gaps', () => {
    const low = sweepRow({}).voltage_envelope!.low.map((value, i) => (i > 40 && i < 50 ? Number.NaN : value));
    const chart = sweepsChart([sweepRow({ voltage_envelope: { start_s: 0, end_s: 1, low, high: low } })])!;
    expect(chart.svg.match(notNumbers)).toBeNull();
    expect(chart.svg.match(/class="trace"/g)).toHaveLength(1);
  });
  // Forty noisy sweeps of one long recording: unbounded, their paths would weigh more than the page may.
  test('noisy sweeps that recede are drawn within a budget, with their highest points kept', () => {
    let state = 1;
    const next = (): number => {
      state = (state * 16_807) % 2_147_483_647;
      return state / 2_147_483_647;
    };
    const noisy = (sweep: number) => {
      const low = Array.from({ length: 1000 }, () => -70 - 8 * next());
      const high = low.map((value, i) => (i === 500 ? 40 : value + 8 * next()));
      return sweepRow({ sweep, voltage_envelope: { start_s: 0, end_s: 1, low, high } });
    };
    const chart = sweepsChart(
      Array.from({ length: 40 }, (_, sweep) => noisy(sweep)),
      { highlight: 3 },
    )!;
    expect(chart.svg.length).toBeLessThan(80_000);
    expect(chart.svg.match(notNumbers)).toBeNull();
    // All forty reach the same top: the smallest ordinate of each path, positions summed from its steps.
    const tops = [...chart.svg.matchAll(/<path d="([^"]*)" class="trace/g)].map(([, d = '']) => {
      const numbers = d.match(/-?\d+(?:\.\d+)?/g)!.map(Number);
      let y = 0;
      let top = Number.POSITIVE_INFINITY;
      for (let i = 1; i < numbers.length; i += 2) {
        y += numbers[i]!;
        top = Math.min(top, y);
      }
      return top;
    });
    expect(tops).toHaveLength(40);
    expect(Math.max(...tops) - Math.min(...tops)).toBeLessThan(0.6);
  });
  test('sweeps of another clamp mode or length stand on a chart of their own', () =>
    expect(
      sweepGroups([
        sweepRow({}),
        sweepRow({ duration_s: 1.02 }),
        sweepRow({ duration_s: 10 }),
        sweepRow({ clamp: 'voltage' }),
      ]).map((group) => group.length),
    ).toEqual([2, 1, 1]));
});

describe('control chart', () => {
  const points = (n: number) =>
    Array.from({ length: n }, (_, i) => ({
      cell: `c<${i}>`,
      date: `2026-03-${String(1 + (i % 28)).padStart(2, '0')}`,
      value: i === 7 ? 60 : 10 + (i % 3),
      standing: 'sound' as const,
      href: `../cells/c${i}/index.html`,
    }));
  const chart = (n: number) =>
    controlChart({
      quantity: 'access_resistance_mohm',
      title: 'Rig A',
      points: points(n),
      events: [{ date: '2026-03-09', text: 'new <pump>' }],
      span: ['2026-03-01', '2026-03-28'],
    });
  test('limits appear with enough points, and what lies beyond them is said', () => {
    expect(chart(fewestForLimits - 1)!.limits).toBeNull();
    const full = chart(28)!;
    expect(full.beyond.map((point) => point.cell)).toEqual(['c<7>']);
    expect(full.alt).toMatch(/1 cell lies beyond them/);
    expect(full.svg.match(notNumbers)).toBeNull();
  });
  test('every point is a link with a name; what people wrote cannot become markup', () => {
    const { svg } = chart(28)!;
    expect(svg.match(/<a /g)).toHaveLength(28);
    expect(svg).not.toContain('<pump>');
    expect(svg).not.toContain('c<7>');
  });
  test('no points, no chart', () => expect(chart(0)).toBeNull());
  test('events past z go on', () => expect([0, 25, 26, 51, 52].map(eventLetter)).toEqual(['a', 'z', 'aa', 'az', 'ba']));
});
