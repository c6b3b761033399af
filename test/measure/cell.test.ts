import fc from 'fast-check';
import { beforeAll, describe, expect, it } from 'vitest';
import { measureCell } from '../../pipeline/measure/cell.ts';
import { withDerived } from '../../pipeline/measure/derive.ts';
import { correctPotentials } from '../../pipeline/measure/junction.ts';
import { quantitiesOf } from '../../pipeline/measure/quantities.ts';
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import type { CellContext, NumberedSweep, Readings, Spike } from '../../pipeline/measure/types.ts';
import { pospischil, simulate } from '../helpers/models.ts';
import {
  type Circuit,
  cellContext,
  clampedSweep,
  heart,
  input,
  neuron,
  normalNoise,
  numbered,
  numberIn,
  passiveSweep,
  signalOf,
} from './made.ts';

const rate = 20000;
const step = { from_s: 0.2, to_s: 0.7 };

const ofCircuit = (circuit: Circuit, currents: number[], holding_pa = 0): NumberedSweep[] =>
  currents.map((pa, k) =>
    numbered(
      measureSweep(input(passiveSweep({ ...circuit, seed: k + 1 }, { ...step, pa, holding_pa }, 1, 10000)), neuron),
      k,
    ),
  );

const ofModel = (kind: 'RS' | 'FS', currents: number[]): NumberedSweep[] =>
  currents.map((pa, k) => {
    const model = pospischil(kind);
    const trace = simulate(model, rate, [
      [100, 0],
      [1000, pa / model.capacitance_pf],
      [50, 0],
    ]);
    const signal = (samples: Float64Array) => ({ samples, rate_hz: rate, start_s: 0 });
    const current = trace.drive.map((value) => value * model.capacitance_pf);
    return numbered(measureSweep(input({ voltage: signal(trace.mv), current: signal(current) }), neuron), k);
  });

const measure = (sweeps: NumberedSweep[], context: Partial<CellContext> = {}): Readings =>
  measureCell(sweeps, () => cellContext(context)).conditions[0]!.readings;

function expectComplete(readings: Readings): void {
  expect(Object.keys(readings)).toEqual(quantitiesOf('cell').map((entry) => entry.id));
  for (const [id, reading] of Object.entries(readings)) {
    if (reading.value === null) expect(reading.why, id).toBeTruthy();
    else expect(Number.isFinite(reading.value), id).toBe(true);
    for (const part of ['n', 'sd', 'se'] as const)
      if (reading[part] !== undefined) expect(Number.isFinite(reading[part]), `${id} ${part}`).toBe(true);
  }
  expect(JSON.parse(JSON.stringify(readings))).toEqual(readings);
}

const circuit: Circuit = { rest_mv: -70, resistance_mohm: 100, tau_ms: 20 };

describe('a passive cell', () => {
  // Linear circuit theory: 100 MΩ and 20 ms are 200 pF.
  it('gives back resistance, time constant and capacitance', () => {
    const readings = measure(ofCircuit(circuit, [-90, -60, -30, 0, 30]));
    // The onset is kept in means over 0.2 ms, which moves what is carried back to the edge by some 10⁻⁶ of it.
    expect(numberIn(readings, 'input_resistance_mohm')).toBeCloseTo(100, 2);
    expect(readings['input_resistance_mohm']!.n).toBe(3);
    expect(numberIn(readings, 'membrane_time_constant_ms')).toBeCloseTo(20, 2);
    expect(numberIn(readings, 'membrane_capacitance_pf')).toBeCloseTo(200, 1);
    expect(Math.abs(numberIn(readings, 'sag_fraction'))).toBeLessThan(1e-6);
    expect(numberIn(readings, 'resting_potential_mv')).toBeCloseTo(-70, 6);
    expect(Math.abs(numberIn(readings, 'bridge_error_mohm'))).toBeLessThan(1e-3);
    expect(readings['rheobase_pa']!.why).toBe('never-fired');
    expectComplete(readings);
  });

  it('does so through noise and hum, within a few standard errors', () => {
    const noisy = { ...circuit, noise_mv: 0.15, hum: { mv: 0.1, hz: 50 } };
    const readings = measure(ofCircuit(noisy, [-100, -80, -60, -40, -20]));
    for (const [id, truth] of [
      ['input_resistance_mohm', 100],
      ['membrane_time_constant_ms', 20],
      ['membrane_capacitance_pf', 200],
    ] as const) {
      const { value, se } = readings[id]!;
      expect(Math.abs(value! / truth - 1), id).toBeLessThan(0.05);
      expect(se!, id).toBeGreaterThan(0);
      expect(se! / value!, id).toBeLessThan(0.1);
    }
    expect(Math.abs(numberIn(readings, 'sag_fraction'))).toBeLessThan(0.02);
  });

  it('takes a bridge error out of its resistance and says so', () => {
    const readings = measure(ofCircuit({ ...circuit, bridge_left_mohm: 10 }, [-90, -60, -30]));
    expect(numberIn(readings, 'bridge_error_mohm')).toBeCloseTo(10, 3);
    expect(numberIn(readings, 'input_resistance_mohm')).toBeCloseTo(100, 2);
    expect(readings['input_resistance_mohm']!.note).toContain('bridge error of 10.0 MΩ');
    expect(
      numberIn(measure(ofCircuit({ ...circuit, bridge_left_mohm: -7 }, [-90, -60, -30])), 'bridge_error_mohm'),
    ).toBeCloseTo(-7, 3);
  });

  it('has no time constant where it sags', () => {
    const sweeps = [-60, -40].map((pa, k) => {
      const made = passiveSweep(circuit, { ...step, pa });
      made.voltage.samples.forEach((value, i) => {
        const ms = (i / rate - 0.2) * 1000;
        if (ms > 0 && ms < 500) made.voltage.samples[i] = value - (pa / 60) * 2.5 * (1 - Math.exp(-ms / 60));
      });
      return numbered(measureSweep(input(made), neuron), k);
    });
    const readings = measure(sweeps);
    expect(readings['membrane_time_constant_ms']!.why).toBe('sag-or-resonance');
    expect(readings['membrane_capacitance_pf']!.why).toBe('sag-or-resonance');
    expect(numberIn(readings, 'sag_fraction')).toBeGreaterThan(0.12);
  });

  it('obeys Ohm’s law for any cell', () => {
    const cells = fc.record({
      rest_mv: fc.double({ min: -85, max: -50, noNaN: true }),
      resistance_mohm: fc.double({ min: 30, max: 600, noNaN: true }),
      tau_ms: fc.double({ min: 5, max: 50, noNaN: true }),
    });
    fc.assert(
      fc.property(cells, fc.double({ min: -40, max: 40, noNaN: true }), (own, holding) => {
        const pa = -8000 / own.resistance_mohm;
        const readings = measure(ofCircuit(own, [pa, pa / 2], holding));
        expect(numberIn(readings, 'input_resistance_mohm') / own.resistance_mohm).toBeCloseTo(1, 3);
        expect(numberIn(readings, 'membrane_time_constant_ms') / own.tau_ms).toBeCloseTo(1, 2);
      }),
      { seed: 41, numRuns: 10 },
    );
  });

  it('says why without hyperpolarizing steps', () => {
    const up = measure(ofCircuit(circuit, [10, 20]));
    for (const id of ['input_resistance_mohm', 'membrane_time_constant_ms', 'membrane_capacitance_pf', 'sag_fraction'])
      expect(up[id]!.why).toBe('no-hyperpolarizing-steps');
    const unknown = measure([
      numbered(measureSweep(input({ voltage: signalOf(1, rate, () => -60), current: null }), neuron), 0),
    ]);
    expect(unknown['input_resistance_mohm']!.why).toBe('no-stimulus');
    expect(unknown['resting_potential_mv']!.why).toBe('holding-unknown');
    expectComplete(unknown);
  });
});

describe('resting potential', () => {
  const at = (holding_pa: number, rest_mv = -70) => ofCircuit({ ...circuit, rest_mv }, [-20], holding_pa)[0]!;
  it('is the median baseline without current, bias included', () => {
    const sweeps = [at(0, -70), at(0, -69), at(0, -65), at(150, -70)].map((sweep, k) => ({ ...sweep, sweep: k }));
    const reading = measure(sweeps)['resting_potential_mv']!;
    expect(reading.value!).toBeCloseTo(-69, 6);
    expect(reading).toMatchObject({ n: 3, at: { sweep: 1 } });
    expect(reading.sd!).toBeCloseTo(Math.sqrt(7), 6);
    expect(numberIn(measure(sweeps), 'baseline_mv')).toBeCloseTo(-67, 6);
  });

  it('is not measured under current, nor under a bias the trace does not show', () => {
    expect(measure([at(150)])['resting_potential_mv']!.why).toBe('holding-not-zero');
    expect(measure([at(0)], { bias_pa: -40 })['resting_potential_mv']!.why).toBe('holding-not-zero');
    expect(numberIn(measure([at(40)], { bias_pa: -40 }), 'resting_potential_mv')).toBeCloseTo(-66, 6);
  });

  it('does not count the same bias twice', () => {
    const made = passiveSweep(circuit, { ...step, pa: -20 });
    const sweep = numbered(measureSweep(input(made, { bias_pa: 0 }), neuron), 0);
    expect(numberIn(measure([sweep], { bias_pa: -40 }), 'resting_potential_mv')).toBeCloseTo(-70, 6);
  });
});

// Pospischil et al. 2008, Biol Cybern 99:427–441; numbers computed for the published equations with LSODA (rtol 1e-9).
describe('the fast-spiking model cell', () => {
  let sweeps: NumberedSweep[];
  let readings: Readings;
  beforeAll(() => {
    sweeps = ofModel('FS', [-100, -50, 300, 500, 750, 1000]);
    readings = measure(sweeps);
  });

  it('has its input resistance, time constant and rest', () => {
    expect(numberIn(readings, 'resting_potential_mv')).toBeCloseTo(-70, 3);
    expect(Math.abs(numberIn(readings, 'input_resistance_mohm') - 47.27)).toBeLessThan(0.05);
    expect(Math.abs(numberIn(readings, 'membrane_time_constant_ms') - 6.667)).toBeLessThan(0.02);
    // 141.026 pF: 1 µF/cm² over a cylinder of 67 µm.
    expect(Math.abs(numberIn(readings, 'membrane_capacitance_pf') - 141.03)).toBeLessThan(0.6);
    expect(Math.abs(numberIn(readings, 'bridge_error_mohm'))).toBeLessThan(1);
  });

  it('fires from 500 pA on, at the published rates', () => {
    expect(readings['rheobase_pa']).toMatchObject({ value: 500, n: 4 });
    expect(readings['rheobase_pa']!.note).toContain('300 pA did not fire it');
    expect(readings['rheobase_pa']!.se!).toBeCloseTo(200 / Math.sqrt(12), 6);
    const { fi, vi, reference_spike } = measureCell(sweeps, () => cellContext()).conditions[0]!;
    expect(fi.map((point) => point.hz)).toEqual([0, 0, 0, 49, 94, 128]);
    expect(vi.map((point) => Math.round(point.pa))).toEqual([-100, -50, 300]);
    expect(vi[0]!.mv).toBeCloseTo(-4.72726, 3);
    expect(reference_spike).toEqual({ sweep: 3, spike: 0 });
    expect(numberIn(readings, 'max_rate_hz')).toBeCloseTo(128, 6);
    // Rates 49 and 94 Hz at 500 and 750 pA: one point lies below half the largest, the next is taken in.
    expect(numberIn(readings, 'rate_gain_hz_per_na')).toBeCloseTo(180, 3);
  });

  it('has the first spike of the step at rheobase', () => {
    // Peak 45.775 mV, half-width 0.565 ms, minimum after it −74.64 mV at 500 pA.
    expect(Math.abs(numberIn(readings, 'peak_mv') - 45.775)).toBeLessThan(0.1);
    expect(Math.abs(numberIn(readings, 'ahp_minimum_mv') + 74.638)).toBeLessThan(0.2);
    expect(readings['peak_mv']!.at).toMatchObject({ sweep: 3, spike: 0 });
    expect(Math.abs(numberIn(readings, 'first_spike_latency_ms') - 16.7)).toBeLessThan(0.6);
    expect(Math.abs(numberIn(readings, 'cycle_length_ms') - 10)).toBeLessThan(3);
    expect(numberIn(readings, 'spikes')).toBe(271);
  });

  it('names the facts that margins need, and uses them when they are there', () => {
    expect(readings['sodium_headroom_mv']).toMatchObject({ value: null, why: 'fact-missing', missing: ['pipette'] });
    expect(readings['potassium_margin_mv']).toMatchObject({ value: null, why: 'fact-missing', missing: ['bath'] });
    expect(readings['minimum_charge_pc']).toMatchObject({
      value: null,
      why: 'fact-missing',
      missing: ['capacitance_pf'],
    });
    const known = { e_na_mv: 50, e_k_mv: -100, capacitance_pf: 141 };
    const derived = measure(sweeps.map((sweep) => ({ ...sweep, spikes: withDerived(sweep.spikes, known) })));
    expect(numberIn(derived, 'sodium_headroom_mv')).toBeCloseTo(50 - numberIn(readings, 'peak_mv'), 9);
    expect(numberIn(derived, 'minimum_charge_pc')).toBeCloseTo(0.141 * numberIn(readings, 'spike_height_mv'), 9);
  });

  it('moves with the junction in its absolute potentials only', () => {
    const shifted = measure(sweeps.map((sweep) => ({ ...sweep, ...correctPotentials(sweep, 14) })));
    for (const { id, absolute_potential } of quantitiesOf('cell')) {
      const [before, after] = [readings[id]!.value, shifted[id]!.value];
      if (before === null) expect(after, id).toBeNull();
      else expect(after!, id).toBeCloseTo(absolute_potential ? before - 14 : before, 6);
    }
  });
});

// Pospischil et al. 2008, RS cell: 32.53 MΩ from the last 100 ms of −0.1 nA; sag 2.8 % of 3.34 mV.
it('the regular-spiking model cell has its input resistance', () => {
  const readings = measure(ofModel('RS', [-100]));
  expect(Math.abs(numberIn(readings, 'input_resistance_mohm') - 32.53)).toBeLessThan(0.05);
  expect(Math.abs(numberIn(readings, 'resting_potential_mv') + 70.571)).toBeLessThan(0.002);
  expect(Math.abs(numberIn(readings, 'membrane_time_constant_ms') / 9.31 - 1)).toBeLessThan(0.05);
  expect(Math.abs(numberIn(readings, 'sag_fraction') - 0.0275)).toBeLessThan(0.004);
});

/** A sweep put together by hand: one step, spikes of given heights at given times. */
function firingSweep(number: number, pa: number, heights: number[], more: Partial<NumberedSweep> = {}): NumberedSweep {
  const base = ofCircuit(circuit, [pa])[0]!;
  const spikes = heights.map(
    (height, k): Spike => ({
      spike: k,
      values: {
        threshold_mv: -45,
        threshold_at_s: 0.25 + 0.05 * k,
        peak_at_s: 0.2505 + 0.05 * k,
        peak_mv: height - 45,
        spike_height_mv: height,
        rise_samples: 12 - k,
      },
      why: {},
      phases: [],
    }),
  );
  const rateReading = { value: heights.length / 0.5, n: heights.length };
  return {
    ...base,
    spikes,
    readings: { ...base.readings, mean_rate_hz: rateReading },
    sweep: number,
    since_start_s: number * 10,
    ...more,
  };
}

describe('change over a recording', () => {
  it('finds rundown at matched stimulus, whatever other steps came between', () => {
    // 0.02 mV less for every spike fired before, and 5 mV more at the stronger step.
    let fired = 0;
    const sweeps = Array.from({ length: 12 }, (_, k) => {
      const strong = k % 2 === 1;
      const height = 100 + (strong ? 5 : 0) - 0.02 * fired;
      const count = strong ? 9 : 5;
      fired += count;
      return firingSweep(k, strong ? 200 : 100, Array(count).fill(height));
    });
    const readings = measure(sweeps);
    const rundown = readings['height_rundown_percent_per_100_spikes']!;
    expect(Math.abs(rundown.value! + 2)).toBeLessThan(0.1);
    expect(rundown).toMatchObject({ n: 12 });
    expect(measure(sweeps.slice(0, 2))['height_rundown_percent_per_100_spikes']!.why).toBe('too-few-sweeps');
  });

  it('has a slope of height on stimulus from three different steps', () => {
    const sweeps = [100, 200, 300].map((pa, k) => firingSweep(k, pa, [90 + pa / 50]));
    expect(numberIn(measure(sweeps), 'height_stimulus_slope_mv_per_na')).toBeCloseTo(20, 6);
    expect(measure(sweeps.slice(0, 2))['height_stimulus_slope_mv_per_na']!.why).toBe('too-few-points');
  });

  it('finds drift at the same holding current and does not take a change of holding for drift', () => {
    const sweeps = Array.from({ length: 10 }, (_, k) => {
      const held = k % 3 === 2;
      const own = ofCircuit({ ...circuit, rest_mv: -70 + 0.5 * k }, [-20], held ? -100 : 0)[0]!;
      return { ...own, sweep: k, since_start_s: 60 * k };
    });
    expect(numberIn(measure(sweeps), 'drift_mv_per_min')).toBeCloseTo(0.5, 6);
    expect(measure(sweeps.slice(0, 2))['drift_mv_per_min']!.why).toBe('too-few-sweeps');
    const untimed = sweeps.map((sweep) => ({ ...sweep, since_start_s: null }));
    expect(measure(untimed)['drift_mv_per_min']).toMatchObject({ why: 'fact-missing', missing: ['time'] });
  });

  it('counts minutes from break-in', () => {
    const sweeps = [firingSweep(4, 100, [90], { since_start_s: 90 })];
    expect(numberIn(measure(sweeps, { break_in_to_start_s: 150 }), 'minutes_since_break_in')).toBeCloseTo(4, 9);
    expect(measure(sweeps)['minutes_since_break_in']).toMatchObject({ why: 'fact-missing', missing: ['break_in'] });
  });
});

describe('firing of a cell', () => {
  it('takes the weakest step that fires, the first of its repeats, and never a test pulse', () => {
    const sweeps = [
      firingSweep(0, 300, [80, 80]),
      firingSweep(1, 150, [91]),
      firingSweep(2, 150, [92, 90]),
      firingSweep(3, 100, []),
      firingSweep(4, 20, [70], { stimulus: { ...firingSweep(0, 20, []).stimulus, end_s: 0.22 } }),
    ];
    const { readings, reference_spike } = measureCell(sweeps, () => cellContext()).conditions[0]!;
    expect(readings['rheobase_pa']).toMatchObject({ value: 150, at: { sweep: 1 } });
    expect(reference_spike).toEqual({ sweep: 1, spike: 0 });
    expect(numberIn(readings, 'spike_height_mv')).toBe(91);
    expect(readings['rise_samples']).toMatchObject({ value: 11, n: 6 });
    expect(readings['half_width_ms']!.why).toBe('unresolved');
  });

  it('stands on all its spikes where it fires by itself', () => {
    const noise = normalNoise(3);
    const voltage = signalOf(6, 5000, (t) => {
      const phase = (t % 0.5) / 0.5;
      return -65 + 15 * phase + (phase > 0.9 ? 80 * Math.sin(((phase - 0.9) / 0.1) * Math.PI) : 0) + 0.05 * noise();
    });
    const sweep = numbered(measureSweep(input({ voltage, current: signalOf(6, 5000, () => 0) }), heart), 0);
    const { readings, reference_spike } = measureCell([sweep], () => cellContext(heart)).conditions[0]!;
    expect(Math.abs(numberIn(readings, 'maximum_diastolic_potential_mv') + 65)).toBeLessThan(0.3);
    expect(Math.abs(numberIn(readings, 'spontaneous_rate_hz') - 2)).toBeLessThan(0.2);
    expect(readings['peak_mv']!.n!).toBeGreaterThan(9);
    expect(readings['peak_mv']!.note).toContain('no step');
    expect(Math.abs(numberIn(readings, 'cycle_length_ms') - 500)).toBeLessThan(1);
    expect(readings['resting_potential_mv']!.note).toContain('between spikes');
    expect(reference_spike).not.toBeNull();
    expect(readings['rheobase_pa']!.why).toBe('no-stimulus');
    expectComplete(readings);
  });

  it('is not said to rest where one beat is all there is', () => {
    const noise = normalNoise(4);
    const voltage = signalOf(0.4, 5000, (t) => {
      const phase = t / 0.4;
      return (
        -65 +
        10 * phase +
        (phase > 0.5 && phase < 0.7 ? 85 * Math.sin(((phase - 0.5) / 0.2) * Math.PI) : 0) +
        0.05 * noise()
      );
    });
    const sweep = numbered(measureSweep(input({ voltage, current: signalOf(0.4, 5000, () => 0) }), heart), 0);
    const { readings } = measureCell([sweep], () => cellContext(heart)).conditions[0]!;
    expect(numberIn(readings, 'spikes')).toBe(1);
    // The height above a baseline is known no better than the baseline is.
    expect(readings['height_from_rest_mv']!.u95!).toBeGreaterThanOrEqual(sweep.readings['baseline_mv']!.u95!);
    for (const id of ['maximum_diastolic_potential_mv', 'spontaneous_rate_hz'])
      expect(readings[id]!.why).toBe('too-few-spikes');
  });

  it('has no diastolic potential and no rate of its own when it rests', () => {
    const readings = measure(ofCircuit(circuit, [-20, 0]));
    expect(readings['maximum_diastolic_potential_mv']!.why).toBe('not-spontaneous');
    expect(readings['spontaneous_rate_hz']!.why).toBe('not-spontaneous');
  });
});

describe('conditions', () => {
  it('split everything, in the order in which they begin', () => {
    const before = [firingSweep(0, 100, [95]), firingSweep(1, 200, [95, 95])];
    const drug = [0, 1].map((k) => firingSweep(2 + k, 100 + 100 * k, [], { condition: 'TTX' }));
    const after = [firingSweep(4, 100, [90])];
    const { conditions } = measureCell([...before, ...drug, ...after], () => cellContext());
    expect(conditions.map((one) => one.condition)).toEqual(['baseline', 'TTX']);
    expect(conditions.map((one) => one.sweeps)).toEqual([
      [0, 1, 4],
      [2, 3],
    ]);
    expect(conditions[1]!.readings['rheobase_pa']!.why).toBe('never-fired');
    expect(conditions[1]!.readings['peak_mv']!.why).toBe('no-spikes');
    expect(conditions[1]!.reference_spike).toBeNull();
    expect(numberIn(conditions[0]!.readings, 'rheobase_pa')).toBe(100);
  });

  it('have their own context, and a cell without sweeps has none', () => {
    const sweeps = [firingSweep(0, 100, [95]), firingSweep(1, 100, [95], { condition: 'washout' })];
    const { conditions } = measureCell(sweeps, (condition) =>
      cellContext({ stated_access_mohm: condition === 'washout' ? 22 : 11 }),
    );
    expect(conditions.map((one) => one.readings['access_resistance_mohm']!.value)).toEqual([11, 22]);
    expect(measureCell([], () => cellContext())).toEqual({ conditions: [] });
  });
});

describe('access resistance', () => {
  const clamped = (access_mohm: number, number: number): NumberedSweep =>
    numbered(
      measureSweep(
        input(clampedSweep({ access_mohm, membrane_mohm: 300, pf: 80 }, [{ from_s: 0.05, to_s: 0.1, mv: -5 }]), {
          clamp: 'voltage',
        }),
        neuron,
      ),
      number,
    );

  it('comes from test pulses, else as stated, else from the bridge and what it left', () => {
    const bridged = ofCircuit({ ...circuit, bridge_left_mohm: 4 }, [-60, -30]).map((sweep) => ({
      ...sweep,
      bridge_mohm: 14,
    }));
    const pulse = { ...clamped(12, 9), condition: 'baseline' };
    expect(numberIn(measure([...bridged, pulse], { stated_access_mohm: 30 }), 'access_resistance_mohm')).toBeCloseTo(
      12,
      1,
    );
    expect(measure(bridged, { stated_access_mohm: 30 })['access_resistance_mohm']).toMatchObject({
      value: 30,
      note: 'as stated',
    });
    expect(numberIn(measure(bridged), 'access_resistance_mohm')).toBeCloseTo(18, 3);
    const unsaid = bridged.map((sweep) => ({ ...sweep, bridge_mohm: null }));
    expect(numberIn(measure(unsaid, { stated_bridge_mohm: 10 }), 'access_resistance_mohm')).toBeCloseTo(14, 3);
    expect(measure(unsaid)['access_resistance_mohm']).toMatchObject({
      why: 'fact-missing',
      missing: ['access_mohm', 'bridge_mohm'],
    });
  });

  it('changes from the first tenth to the last', () => {
    const sweeps = [10, 11, 12, 13, 14, 15].map((mohm, k) => clamped(mohm, k));
    const readings = measure(sweeps);
    expect(Math.abs(numberIn(readings, 'access_change_percent') - 50)).toBeLessThan(0.5);
    expect(Math.abs(numberIn(measure(sweeps.slice(0, 2)), 'access_change_percent') - 10)).toBeLessThan(0.5);
    expect(measure(sweeps.slice(0, 1))['access_change_percent']!.why).toBe('too-few-sweeps');
    expectComplete(readings);
    // A cell only in voltage clamp is measured on what it has.
    expect(Math.abs(numberIn(readings, 'membrane_resistance_mohm') - 300)).toBeLessThan(1);
    expect(Math.abs(numberIn(readings, 'cell_capacitance_pf') - 80)).toBeLessThan(0.5);
    expect(readings['resting_potential_mv']!.why).toBe('not-this-clamp');
    expect(readings['peak_mv']!.why).toBe('not-this-clamp');
  });
});

it('sums up what the recorder did over all sweeps', () => {
  const sweeps = [0, 1, 2].map((k) => {
    const made = passiveSweep(
      { ...circuit, noise_mv: 0.1, seed: k + 1 },
      { ...step, pa: -20 },
      1,
      k === 2 ? 10000 : 20000,
    );
    if (k === 1) made.voltage.samples.fill(Number.NaN, 0, 2000);
    return numbered(measureSweep(input(made), neuron), k);
  });
  const readings = measure(sweeps);
  expect(readings['missing_fraction']!.value!).toBeCloseTo(2000 / 50000, 9);
  expect(readings['missing_fraction']!.at).toMatchObject({ sweep: 1 });
  expect(readings['sample_interval_us']).toMatchObject({ value: 100, at: { sweep: 2 } });
  expect(readings['sample_interval_us']!.note).toContain('2 different');
});

describe('a bridge judged from one edge only', () => {
  const edge = (spikes: number): NumberedSweep => ({
    ...firingSweep(0, 500, new Array<number>(spikes).fill(80)),
    readings: { ...firingSweep(0, 500, []).readings, bridge_step_mv: { value: 2, se: 0.1, n: 1 } },
  });
  it('is not read where that step makes the cell fire', () =>
    expect(measure([edge(1)])['bridge_error_mohm']).toMatchObject({ value: null, why: 'too-few-sweeps' }));
  it('is read where it does not', () => expect(numberIn(measure([edge(0)]), 'bridge_error_mohm')).toBeCloseTo(4, 6));
});
