import { describe, expect, test } from 'vitest';
import { check, checks, policyCheck, policyEntry } from '../../pipeline/judge/checks.ts';
import { classRanges, shippedClasses } from '../../pipeline/judge/class-ranges.ts';
import { judgeCell } from '../../pipeline/judge/judge.ts';
import type { Contradiction, JudgeInput } from '../../pipeline/judge/types.ts';
import { isQuantity, quantities } from '../../pipeline/measure/quantities.ts';
import type { NumberedSweep, Readings } from '../../pipeline/measure/types.ts';
import { circumstances, finding, judged, type Made, made, outcome, read, soundReadings, spike, sweep } from './made.ts';

const six = (change: (number: number) => Parameters<typeof sweep>[1]) =>
  [0, 1, 2, 3, 4, 5].map((number) => sweep(number, change(number)));
const silent = six(() => ({ spikes: [] }));
const inClamp = six(() => ({ clamp: 'voltage', spikes: [] }));
const heldWith = (pa: number): NumberedSweep[] =>
  six((number) => ({
    clamp: 'voltage',
    spikes: [],
    stimulus: { ...sweep(number).stimulus, holding: -80 },
    readings: { holding_current_pa: read(pa) },
  }));

const contradiction = (kind: Contradiction['kind']): Contradiction => ({
  kind,
  sentence: 'Two levels state another pipette: k-gluconate and cs-methanesulfonate',
  place: 'recordings/a/folder.yaml',
  remedy: 'Keep one of them.',
});

/** For every check, a cell that fails it. */
const failing: Record<string, Made> = {
  'peak-below-sodium': { readings: { peak_mv: read(72) } },
  'ahp-above-potassium': { readings: { ahp_minimum_mv: read(-115) } },
  'rest-above-potassium': { readings: { resting_potential_mv: read(-115) } },
  'baseline-above-potassium': {
    without: ['resting_potential_mv'],
    sweeps: six(() => ({ readings: { baseline_mv: read(-115) } })),
  },
  'diastolic-above-potassium': { readings: { maximum_diastolic_potential_mv: read(-115) } },
  'rest-below-sodium': { readings: { resting_potential_mv: read(75) } },
  'height-below-sodium-potassium': { readings: { spike_height_mv: read(840) } },
  'spike-goes-up': { readings: { height_from_rest_mv: read(8) } },
  'input-resistance-positive': { readings: { input_resistance_mohm: read(-90) } },
  'membrane-resistance-positive': { sweeps: inClamp, readings: { membrane_resistance_mohm: read(-90) } },
  'membrane-capacitance-positive': { readings: { membrane_capacitance_pf: read(-90) } },
  'cell-capacitance-positive': { sweeps: inClamp, readings: { cell_capacitance_pf: read(-90) } },
  'access-resistance-positive': { readings: { access_resistance_mohm: read(-2) } },
  'no-cell': { sweeps: silent, readings: { resting_potential_mv: read(-1) } },
  'pulse-sign': { readings: { pulse_response_mohm: read(-15) } },
  'no-membrane': { sweeps: inClamp, readings: { transient_capacitance_pf: read(0.4, { u95: 0.3 }) } },
  'holding-leak': { sweeps: heldWith(-1561), readings: {} },
  'beats-alike': {
    circumstances: { like: 'stem-cell-cardiomyocyte' },
    readings: { apd90_ms: read(190), apd90_alternation_ms: read(745, { u95: 157 }) },
  },
  'escaped-currents': { sweeps: inClamp, readings: { escaped_currents: read(3) } },
  'baseline-negative': { readings: { resting_potential_mv: read(12) } },
  'rise-samples': { readings: { rise_samples: read(3) } },
  'filter-passes-rise': { circumstances: { filter_khz: 1 } },
  'filter-below-sampling': { readings: { sample_interval_us: read(100) } },
  'filter-as-stated': { readings: { filter_corner_khz: read(3) } },
  'access-resistance': { readings: { access_resistance_mohm: read(48) } },
  'access-change': { readings: { access_change_percent: read(70) } },
  'access-times-current': {
    without: ['bridge_error_mohm'],
    circumstances: { bridge_mohm: null },
    readings: { access_resistance_mohm: read(80) },
  },
  'bridge-error': { readings: { bridge_error_mohm: read(22) } },
  clipping: { readings: { clipped_fraction: read(0.01) } },
  missing: { readings: { missing_fraction: read(0.2) } },
  'mains-hum': { readings: { mains_hum_mv: read(2) } },
  'hum-frequency': { readings: { mains_hum_hz: read(40) } },
  noise: { readings: { noise_rms_mv: read(1) } },
  quantization: { readings: { quantum_mv: read(1) } },
  drift: { readings: { drift_mv_per_min: read(9) } },
  'height-rundown': { readings: { height_rundown_percent_per_100_spikes: read(-400) } },
  'baseline-drift': { readings: { baseline_drift_mv_per_s: read(30) } },
  'facts-agree': { input: { contradictions: [contradiction('facts-disagree')] } },
  'label-agrees-with-data': { input: { contradictions: [contradiction('label-contradicts-data')] } },
  'recorded-once': { input: { contradictions: [contradiction('duplicate')] } },
  'one-id-one-cell': { input: { contradictions: [contradiction('same-id')] } },
  'unit-stated': { input: { contradictions: [contradiction('unit-guessed')] } },
  'statements-hold': { input: { contradictions: [contradiction('other')] } },
};
const classEntries = checks.filter((entry) => entry.ground === 'class');
for (const entry of classEntries) {
  const like = shippedClasses.find((id) => entry.quantity in classRanges[id].ranges)!;
  const { high, temperature_c } = classRanges[like].ranges[entry.quantity]!;
  const beyond = high! > 0 ? high! * 3 + 60 : 100;
  failing[entry.id] = {
    circumstances: { like, class_id: like, temperature_c: temperature_c[1] },
    readings: { [entry.quantity]: read(beyond) },
  };
}

describe('the registry of checks', () => {
  test.each(checks.map((entry) => entry.id))('%s can be outside', (id) =>
    expect(outcome(id, failing[id])).toBe('outside'),
  );
  test('no case is left over', () =>
    expect(Object.keys(failing).sort()).toEqual(checks.map((entry) => entry.id).sort()));
  test('ids are unique', () => expect(new Set(checks.map((entry) => entry.id)).size).toBe(checks.length));
  test.each(checks.map((entry) => [entry.id, entry] as const))('%s is told in full', (_id, entry) => {
    expect(entry.quantity === '' || isQuantity(entry.quantity)).toBe(true);
    expect(entry.asks).toMatch(/^[A-Z].*\?$/);
    for (const text of [entry.limit, entry.bench, entry.source]) expect(text.length).toBeGreaterThan(3);
    expect(entry.causes.length).toBeGreaterThan(0);
    expect(check(entry.id)).toBe(entry);
  });
  test('every entry of a sweep-level check says something about single sweeps', () => {
    const bad = six((number) => ({
      readings: {
        access_resistance_mohm: read(48),
        clipped_fraction: read(number === 0 ? 0.5 : 0),
        missing_fraction: read(0.3),
        mains_hum_mv: read(3),
        noise_rms_mv: read(2),
        baseline_drift_mv_per_s: read(50),
        escaped_currents: read(2),
      },
    }));
    // Escaped currents are asked after only where something was recorded in voltage clamp.
    const found = judged({
      sweeps: [...bad, ...inClamp.map((one) => ({ ...one, sweep: 6 + one.sweep }))],
    }).findings.filter((one) => one.sweep === 0 && one.outcome === 'outside');
    expect(new Set(found.map((one) => one.check))).toEqual(
      new Set(checks.filter((entry) => entry.level === 'sweep').map((entry) => entry.id)),
    );
  });
  test('a policy check exists for every quantity and no other', () => {
    for (const entry of quantities) expect(check(policyCheck(entry.id))).toEqual(policyEntry(entry.id));
    expect(() => check('policy-nonsense')).toThrow(/no check "policy-nonsense"/);
    expect(() => check('nonsense')).toThrow(/no check "nonsense"/);
  });
});

describe('standing', () => {
  test('a sound cell has no reasons', () =>
    expect(judged()).toMatchObject({ standing: 'sound', reasons: [], explanations: [] }));
  test('near limit and not measured leave it sound', () => {
    const cell = judged({ readings: { peak_mv: read(61) }, without: ['max_rate_hz', 'access_change_percent'] });
    expect(cell.standing).toBe('sound');
    expect(cell.findings.some((one) => one.outcome === 'near limit')).toBe(true);
  });
  const expected = (id: string): string => {
    const { ground } = check(id);
    if (id === 'missing') return 'unread';
    return ground === 'physics' || id === 'no-cell' ? 'unsound' : 'caution';
  };
  test.each(checks.filter((entry) => entry.ground !== 'class').map((entry) => entry.id))('%s outside', (id) => {
    const cell = judged(failing[id]);
    const also = cell.findings.filter((one) => one.outcome === 'outside' && one.sweep === null);
    // Some slips fail more than one check; the worst decides.
    const worst = also.some((one) => one.ground === 'physics') ? 'unsound' : expected(id);
    expect(cell.standing).toBe(id === 'missing' ? 'unread' : worst);
    expect(cell.reasons.length).toBeGreaterThan(0);
  });
  test('a class check outside is caution', () =>
    expect(judged({ readings: { half_width_ms: read(5) } }).standing).toBe('caution'));
  test('a recorder saturated most of the time leaves nothing to measure', () =>
    expect(judged({ readings: { clipped_fraction: read(0.7) } }).standing).toBe('unsound'));
  test('the worst reason comes first: physics, then policy, conditions, class', () => {
    const cell = judged({
      readings: {
        half_width_ms: read(5),
        peak_mv: read(90),
        noise_rms_mv: read(0.9),
        access_resistance_mohm: read(28),
      },
      input: {
        policy: [{ quantity: 'access_resistance_mohm', above: null, below: 25, origin: 'almanac.yaml, line 12' }],
      },
    });
    expect(cell.standing).toBe('unsound');
    expect(cell.reasons.map((text) => text.split(',')[0])).toEqual([
      'The peak of the first spike (sweep 0)',
      'The access resistance',
      'The noise',
      'The half-width',
      'The peak',
    ]);
  });
  test('a contradiction is a reason and a finding in its own words', () => {
    const cell = judged({ input: { contradictions: [contradiction('facts-disagree')] } });
    expect(cell.standing).toBe('caution');
    expect(cell.reasons).toEqual(['Two levels state another pipette: k-gluconate and cs-methanesulfonate.']);
    expect(cell.findings.find((one) => one.check === 'facts-agree')).toMatchObject({
      outcome: 'outside',
      quantity: '',
      value: null,
      bench: 'Keep one of them.',
      source: 'recordings/a/folder.yaml',
    });
  });
});

describe('the lab’s own limits', () => {
  const policy = (quantity: string, above: number | null, below: number | null): Made => ({
    input: { policy: [{ quantity, above, below, origin: 'almanac.yaml, line 12' }] },
  });
  test('a cell quantity', () => {
    const found = finding('policy-access-resistance-mohm', { ...policy('access_resistance_mohm', null, 12) });
    expect(found).toMatchObject({
      outcome: 'outside',
      ground: 'policy',
      limit_high: 12,
      source: 'almanac.yaml, line 12',
    });
    expect(found.sentence).toBe(
      'The access resistance, 14.0 MΩ, lies 2.0 MΩ above the lab’s limit of 12.0 MΩ; the lab does not accept that. The number’s own uncertainty is not known and was not counted.',
    );
  });
  test('a lower limit, inside the uncertainty', () =>
    expect(outcome('policy-input-resistance-mohm', policy('input_resistance_mohm', 91, null))).toBe('near limit'));
  test('both limits', () =>
    expect(outcome('policy-resting-potential-mv', policy('resting_potential_mv', -75, -50))).toBe('outside'));
  test('a quantity of sweeps is judged on their median, and each sweep beside it', () => {
    const sweeps = six((number) => ({ readings: { interval_cv: read(number === 3 ? 0.9 : 0.1) } }));
    const found = judged({ sweeps, ...policy('interval_cv', null, 0.5) }).findings.filter(
      (one) => one.ground === 'policy',
    );
    expect(found.map((one) => [one.sweep, one.outcome])).toEqual([
      [null, 'within'],
      [3, 'outside'],
    ]);
  });
  test('a median over sweeps has the half-width that Student’s t gives its spread', () => {
    // Values 1 to 6: SD 1.870829, t(0.975, 5) = 2.570582 (standard table): 2.570582 · 1.870829/√6 = 1.963316.
    const sweeps = six((number) => ({ readings: { interval_cv: read(number + 1) } }));
    const found = judged({ sweeps, ...policy('interval_cv', null, 5) }).findings.find(
      (one) => one.ground === 'policy' && one.sweep === null,
    );
    expect(found?.outcome).toBe('near limit');
    expect(found?.value_u95).toBeCloseTo(1.963316, 4);
    expect(found?.uncertainty).toBeCloseTo(1.963316, 4);
  });
  test('a number that is missing is not measured', () =>
    expect(outcome('policy-max-rate-hz', { ...policy('max_rate_hz', 10, null), without: ['max_rate_hz'] })).toBe(
      'not measured',
    ));
  test('an unknown quantity is refused', () => expect(() => judged(policy('nonsense', 1, null))).toThrow(/nonsense/));
});

/** A second condition of the same cell. */
function washed(
  change: { readings?: Readings; sweeps?: NumberedSweep[] },
  policy: JudgeInput['policy'] = [],
): JudgeInput {
  const input = made();
  const sweeps = (change.sweeps ?? [6, 7, 8].map((number) => sweep(number, { spikes: [] }))).map((one) => ({
    ...one,
    condition: 'TTX',
  }));
  const readings = { ...soundReadings, ...change.readings };
  return {
    ...input,
    sweeps: [...input.sweeps, ...sweeps],
    measure: {
      conditions: [
        ...input.measure.conditions,
        { condition: 'TTX', sweeps: sweeps.map((one) => one.sweep), readings, vi: [], fi: [], reference_spike: null },
      ],
    },
    circumstances: [...input.circumstances, circumstances({ condition: 'TTX' })],
    policy,
  };
}

describe('conditions are judged apart', () => {
  test('a blocked spike is not a dying cell', () => {
    const cell = judgeCell(
      washed({
        readings: {
          peak_mv: { value: null, why: 'no-spikes' },
          spike_height_mv: { value: null, why: 'no-spikes' },
          max_rate_hz: read(0),
          half_width_ms: read(9),
        },
      }),
    );
    expect(cell.standing).toBe('sound');
    expect(
      cell.findings.filter((one) => one.condition === 'TTX' && one.outcome === 'outside').map((one) => one.check),
    ).toEqual(['class-half-width-ms', 'class-max-rate-hz']);
    expect(
      cell.findings.find((one) => one.condition === 'TTX' && one.check === 'class-half-width-ms')!.sentence,
    ).toMatch(/^In the condition “TTX”, the half-width,/);
  });
  test('a depolarizing drug does not make it no cell', () =>
    expect(judgeCell(washed({ readings: { resting_potential_mv: read(-4) } })).standing).toBe('sound'));
  test('physics counts in every condition', () =>
    expect(judgeCell(washed({ readings: { resting_potential_mv: read(-120) } })).standing).toBe('unsound'));
  test('so does clipping', () =>
    expect(judgeCell(washed({ readings: { clipped_fraction: read(0.02) } })).standing).toBe('caution'));
  test('the lab’s limits on the instrument count, those on the cell do not', () => {
    const rule = (quantity: string, above: number | null, below: number | null) => [
      { quantity, above, below, origin: 'almanac.yaml' },
    ];
    expect(
      judgeCell(washed({ readings: { access_resistance_mohm: read(30) } }, rule('access_resistance_mohm', null, 25)))
        .standing,
    ).toBe('unsound');
    expect(judgeCell(washed({ readings: { max_rate_hz: read(0) } }, rule('max_rate_hz', 5, null))).standing).toBe(
      'sound',
    );
  });
  test('circumstances that do not pair up are our own bug', () =>
    expect(() => judgeCell({ ...made(), circumstances: [] })).toThrow(/got 0 for 1 \(cell c1\)/));
});

describe('a cell is judged on what it has', () => {
  test('nothing read: unread, with the reasons', () => {
    const input = made({ sweeps: [], input: { unread: ['cell3.nwb is cut short'] } });
    input.measure.conditions = [];
    input.circumstances = [];
    expect(judgeCell(input)).toMatchObject({
      standing: 'unread',
      reasons: ['cell3.nwb is cut short.'],
      findings: [],
      usable: null,
    });
  });
  test('sweeps without a single number: unread', () => {
    const nothing = { value: null, why: 'unreadable' } as const;
    const bare = six(() => ({ spikes: [] })).map((one) => ({
      ...one,
      // One sample long: no event can be found in it, which says nothing of the cell.
      readings: { baseline_mv: nothing, missing_fraction: read(0.03), spikelets: read(0), escaped_currents: read(0) },
    }));
    const input = made({ sweeps: bare });
    input.measure.conditions[0]!.readings = { resting_potential_mv: nothing, sample_interval_us: read(50) };
    expect(judgeCell(input)).toMatchObject({
      standing: 'unread',
      reasons: ['Nothing could be measured in this recording.'],
      usable: null,
    });
  });
  test('voltage clamp without its current is unread: the command is no answer of a cell', () => {
    const bare = [0, 1].map((number) => {
      const one = sweep(number, { clamp: 'voltage', spikes: [] });
      const none = { value: null, why: 'no-current' } as const;
      return { ...one, readings: { command_mv: read(60), holding_current_pa: none, clipped_fraction: none } };
    });
    const input = made({ sweeps: bare });
    input.measure.conditions[0]!.readings = {};
    const { standing, reasons } = judgeCell(input);
    expect(standing).toBe('unread');
    expect(reasons[0]).toMatch(/current could not be read/);
  });

  test('voltage clamp without its command is unread, and the reason says what is missing', () => {
    const bare = six(() => ({ spikes: [], clamp: 'voltage' as const })).map((one) => ({ ...one, readings: {} }));
    const input = made({ sweeps: bare });
    input.measure.conditions[0]!.readings = { sample_interval_us: read(200) };
    const { standing, reasons } = judgeCell(input);
    expect(standing).toBe('unread');
    expect(reasons[0]).toMatch(/voltage clamp without its command/);
  });
  test('a cell without spikes is sound if nothing speaks against it', () => {
    const spikeless = Object.fromEntries(
      [
        'threshold_mv',
        'peak_mv',
        'spike_height_mv',
        'height_from_rest_mv',
        'half_width_ms',
        'max_rise_v_per_s',
        'ahp_minimum_mv',
        'rise_samples',
        'max_rate_hz',
      ].map((id) => [id, { value: null, why: 'no-spikes' as const }]),
    );
    const cell = judged({ sweeps: silent, readings: spikeless });
    expect(cell.standing).toBe('sound');
    expect(cell.findings.find((one) => one.check === 'peak-below-sodium')?.outcome).toBe('not measured');
  });
  test('voltage clamp only: nothing is asked about potentials', () => {
    const input = made({ sweeps: inClamp });
    input.measure.conditions[0]!.readings = {
      access_resistance_mohm: read(14),
      membrane_resistance_mohm: read(140),
      cell_capacitance_pf: read(60),
      holding_current_pa: read(-40),
      clipped_fraction: read(0),
      missing_fraction: read(0),
      sample_interval_us: read(20),
    };
    const cell = judgeCell(input);
    expect(cell.standing).toBe('sound');
    expect(cell.findings.map((one) => one.check)).toContain('cell-capacitance-positive');
    expect(cell.findings.map((one) => one.check)).not.toContain('peak-below-sodium');
  });
  test('rubbish numbers give not measured, never an exception or a NaN', () => {
    const rubbish = Object.fromEntries(Object.keys(soundReadings).map((id) => [id, { value: Number.NaN, n: 3 }]));
    const cell = judged({
      readings: rubbish,
      sweeps: [sweep(0, { spikes: [spike(0, { peak_mv: null, spike_height_mv: null })] })],
    });
    for (const one of cell.findings)
      for (const value of [one.value, one.margin, one.uncertainty, one.limit_low, one.limit_high])
        expect(value === null || Number.isFinite(value)).toBe(true);
    expect(JSON.stringify(cell)).not.toMatch(/NaN|undefined|Infinity/);
  });
});

test('every finding is a whole sentence with its ground, and never within without a value', () => {
  const cells: Made[] = [{}, ...Object.values(failing)];
  for (const one of cells.flatMap((cell) => judged(cell).findings)) {
    expect(one.sentence).toMatch(/^[A-Z0-9].*\.$/);
    expect(one.sentence).not.toMatch(/undefined|NaN|null| {2}|\.\./);
    if (one.outcome === 'within' || one.outcome === 'near limit') expect(one.value).not.toBeNull();
    if (one.outcome === 'not measured') expect(one.value).toBeNull();
    if (one.outcome === 'outside' && one.quantity !== '') expect(one.margin).toBeLessThan(0);
  }
});

test('judging changes nothing of its input and is the same twice', () => {
  const input = made({ readings: { peak_mv: read(72) } });
  const before = JSON.stringify(input);
  const first = JSON.stringify(judgeCell(input));
  expect(JSON.stringify(judgeCell(input))).toBe(first);
  expect(JSON.stringify(input)).toBe(before);
});
