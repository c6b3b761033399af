import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { correctPotentials } from '../../pipeline/measure/junction.ts';
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import { clampedSweep, input, neuron, normalNoise, numberIn, signalOf } from './made.ts';

// Exact solution of an access resistance in series with a cell (linear circuit theory): 10 MΩ, 200 MΩ, 100 pF and a
// step of 5 mV give a peak of 500 pA, 23.81 pA in the end, and a charge of 0.4535 pC.
const cell = { access_mohm: 10, membrane_mohm: 200, pf: 100 };
const pulse = [{ from_s: 0.05, to_s: 0.1, mv: 5 }];
const measure = (made: ReturnType<typeof clampedSweep>) => measureSweep(input(made, { clamp: 'voltage' }), neuron);

describe('a test pulse in voltage clamp', () => {
  it('gives back the circuit', () => {
    const sweep = measure(clampedSweep(cell, pulse));
    expect(numberIn(sweep.readings, 'access_resistance_mohm')).toBeCloseTo(10, 2);
    expect(numberIn(sweep.readings, 'membrane_resistance_mohm')).toBeCloseTo(200, 1);
    expect(Math.abs(numberIn(sweep.readings, 'cell_capacitance_pf') - 100)).toBeLessThan(0.1);
    expect(numberIn(sweep.readings, 'holding_current_pa')).toBeCloseTo(0, 9);
    expect(numberIn(sweep.readings, 'command_mv')).toBeCloseTo(-65, 9);
    expect(sweep.readings['access_resistance_mohm']!.n).toBe(2);
    expect(sweep.spikes).toHaveLength(0);
    expect(sweep.stimulus).toMatchObject({ kind: 'step', holding: -70, amplitude: 5 });
  });

  it('says nothing of the electrode where most of the stated capacitance is compensated', () => {
    const sweep = (capacitance_pf: number | null) =>
      measureSweep(input(clampedSweep(cell, pulse), { clamp: 'voltage' }), { ...neuron, capacitance_pf }).readings;
    for (const id of ['access_resistance_mohm', 'cell_capacitance_pf']) {
      expect(sweep(250)[id]).toMatchObject({ value: null, why: 'compensated' });
      for (const stated of [null, 110, 190]) expect(sweep(stated)[id]!.value).not.toBeNull();
    }
    expect(numberIn(sweep(250), 'membrane_resistance_mohm')).toBeCloseTo(210, 1);
  });

  it('does so through noise, at lower rates, upside down, and for other cells', () => {
    const cells = fc.record({
      access_mohm: fc.double({ min: 6, max: 40, noNaN: true }),
      membrane_mohm: fc.double({ min: 100, max: 1500, noNaN: true }),
      pf: fc.double({ min: 30, max: 150, noNaN: true }),
      mv: fc.constantFrom(5, -5, 10, -10),
      seed: fc.integer({ min: 1, max: 1000 }),
    });
    fc.assert(
      fc.property(cells, ({ mv, ...circuit }) => {
        const steps = [0, 1, 2].map((k) => ({ from_s: 0.02 + 0.06 * k, to_s: 0.05 + 0.06 * k, mv }));
        const { readings } = measure(clampedSweep({ ...circuit, noise_pa: 2 }, steps, { rateHz: 50000 }));
        expect(Math.abs(numberIn(readings, 'access_resistance_mohm') / circuit.access_mohm - 1)).toBeLessThan(0.08);
        expect(Math.abs(numberIn(readings, 'membrane_resistance_mohm') / circuit.membrane_mohm - 1)).toBeLessThan(0.25);
        expect(Math.abs(numberIn(readings, 'cell_capacitance_pf') / circuit.pf - 1)).toBeLessThan(0.1);
      }),
      { seed: 31, numRuns: 12, endOnFailure: true },
    );
  });

  it('is looked for among larger steps and not in them', () => {
    const made = clampedSweep(cell, [
      { from_s: 0.02, to_s: 0.05, mv: -5 },
      { from_s: 0.1, to_s: 0.15, mv: 80 },
    ]);
    // A conductance that opens above −40 mV would spoil what a large step says.
    made.current.samples.forEach((value, i) => {
      if (made.voltage.samples[i]! > -40) made.current.samples[i] = value + 3000;
    });
    const { readings } = measure(made);
    expect(readings['access_resistance_mohm']!.n).toBe(2);
    expect(numberIn(readings, 'access_resistance_mohm')).toBeCloseTo(10, 1);
    expect(numberIn(readings, 'command_mv')).toBeCloseTo(10, 9);
  });

  it('is not looked for between depolarized levels, nor in the stairs of a ramp', () => {
    const depolarized = clampedSweep(cell, [
      { from_s: 0.02, to_s: 0.07, mv: 60 },
      { from_s: 0.07, to_s: 0.12, mv: 45 },
      { from_s: 0.12, to_s: 0.17, mv: 60 },
    ]);
    expect(measure(depolarized).readings['cell_capacitance_pf']).toMatchObject({ value: null, why: 'no-test-pulse' });
    const stairs = Array.from({ length: 10 }, (_, k) => ({
      from_s: 0.03 + 0.01 * k,
      to_s: 0.04 + 0.01 * k,
      mv: -40 + 4 * k,
    }));
    const ramp = clampedSweep(cell, stairs);
    expect(measure(ramp).readings['cell_capacitance_pf']).toMatchObject({ value: null, why: 'no-test-pulse' });
  });

  it('says why there is none', () => {
    const why = (readings: ReturnType<typeof measure>['readings']) =>
      ['access_resistance_mohm', 'membrane_resistance_mohm', 'cell_capacitance_pf'].map((id) => readings[id]!.why);
    expect(why(measure(clampedSweep(cell, [])).readings)).toEqual(Array(3).fill('no-test-pulse'));
    expect(why(measure(clampedSweep(cell, [{ from_s: 0.05, to_s: 0.1, mv: 60 }])).readings)).toEqual(
      Array(3).fill('no-test-pulse'),
    );
    const { voltage, current } = clampedSweep(cell, pulse);
    const noCommand = measureSweep(input({ voltage: null, current }, { clamp: 'voltage' }), neuron).readings;
    expect(why(noCommand)).toEqual(Array(3).fill('no-voltage'));
    const noCurrent = measureSweep(input({ voltage, current: null }, { clamp: 'voltage' }), neuron).readings;
    expect(why(noCurrent)).toEqual(Array(3).fill('no-current'));
    expect(numberIn(noCurrent, 'command_mv')).toBeCloseTo(-65, 9);
  });

  it('shows a leak without a cell as a resistance without a transient', () => {
    const noise = normalNoise(5);
    const { voltage } = clampedSweep(cell, pulse);
    const current = signalOf(0.2, 50000, (t) => (t >= 0.05 && t < 0.1 ? 1000 : 0) - 14000 + 20 * noise());
    const { readings } = measureSweep(input({ voltage, current }, { clamp: 'voltage' }), neuron);
    expect(readings['access_resistance_mohm']!.why).toBe('no-membrane-transient');
    expect(readings['cell_capacitance_pf']!.why).toBe('no-membrane-transient');
    expect(numberIn(readings, 'membrane_resistance_mohm')).toBeCloseTo(5, 1);
    expect(readings['membrane_resistance_mohm']!.note).toContain('total');
    expect(numberIn(readings, 'holding_current_pa')).toBeCloseTo(-14000, -1);
  });

  it('finds the steps in a command with an offset and noise of its own', () => {
    const noise = normalNoise(15);
    const made = clampedSweep({ ...cell, noise_pa: 3 }, [{ from_s: 0.05, to_s: 0.15, mv: -10 }]);
    made.voltage.samples.forEach((value, i) => {
      made.voltage.samples[i] = value + 0.7 + 0.2 * noise();
    });
    const { readings } = measure(made);
    expect(Math.abs(numberIn(readings, 'access_resistance_mohm') - 10)).toBeLessThan(0.6);
    expect(Math.abs(numberIn(readings, 'command_mv') + 79.3)).toBeLessThan(0.1);
  });
});

it('the junction moves the command of a voltage-clamp sweep and no resistance', () => {
  const sweep = measure(clampedSweep(cell, pulse));
  const corrected = correctPotentials(sweep, 14);
  expect(numberIn(corrected.readings, 'command_mv')).toBeCloseTo(-79, 9);
  expect(corrected.stimulus).toMatchObject({ holding: -84, amplitude: 5 });
  expect(corrected.readings['access_resistance_mohm']).toEqual(sweep.readings['access_resistance_mohm']);
});

describe('what the pulse ran into', () => {
  const at = (ohms: (t: number) => number, noise_pa: number, seed: number) => {
    const noise = normalNoise(seed);
    const { voltage } = clampedSweep(cell, pulse);
    const current = signalOf(0.2, 50000, (t) => (t >= 0.05 && t < 0.1 ? 5000 / ohms(t) : 0) + noise_pa * noise());
    return measureSweep(input({ voltage, current }, { clamp: 'voltage' }), neuron).readings;
  };

  it('is a seal from half a gigaohm on', () => {
    const readings = at(() => 2500, 1, 3);
    expect(Math.abs(numberIn(readings, 'seal_resistance_gohm') - 2.5)).toBeLessThan(
      readings['seal_resistance_gohm']!.u95!,
    );
    expect(readings['seal_resistance_gohm']!.u95!).toBeLessThan(0.5);
    expect(readings['membrane_resistance_mohm']).toMatchObject({ value: null, why: 'no-membrane-transient' });
    expect(Math.abs(numberIn(readings, 'transient_capacitance_pf'))).toBeLessThan(1);
    expect(at(() => 50_000, 5, 4)['seal_resistance_gohm']!).toMatchObject({ value: null, why: 'unresolved' });
    expect(at(() => 50_000, 5, 4)['seal_resistance_gohm']!.note).toMatch(/^at least [\d.]+ GΩ/);
  });

  it('is a leak, or an open pipette, in plain words', () => {
    expect(at(() => 150, 2, 5)['membrane_resistance_mohm']!.note).toContain('a leak without a cell');
    expect(
      Math.abs(
        numberIn(
          at(() => 150, 2, 5),
          'membrane_resistance_mohm',
        ) - 150,
      ),
    ).toBeLessThan(3);
    expect(at(() => 4, 10, 6)['membrane_resistance_mohm']!.note).toContain('an open pipette in the bath');
    expect(at(() => 150, 2, 5)['seal_resistance_gohm']!.value).toBeNull();
  });

  it('is a cell, of which no seal is told', () =>
    expect(measure(clampedSweep(cell, pulse)).readings['seal_resistance_gohm']!.why).toBe('membrane-charged'));
});

it('takes a command that is stated, where none was recorded', () => {
  const made = clampedSweep(cell, pulse);
  const stated_stimulus = { kind: 'levels' as const, at_s: [0, 0.05, 0.1], mv: [-70, -65, -70] };
  const stated = measureSweep(
    input({ voltage: null, current: made.current }, { clamp: 'voltage', stated_stimulus }),
    neuron,
  );
  expect(stated.readings).toEqual(measure(made).readings);
  expect(stated.stimulus.from).toBe('stated');
  expect(stated.remarks).toContain('the command is the one stated; none was recorded');
  // In current clamp it says nothing of the current.
  const elsewhere = measureSweep(input({ voltage: made.voltage, current: null }, { stated_stimulus }), neuron);
  expect(elsewhere.stimulus).toMatchObject({ kind: 'unknown', from: 'absent' });
});

describe('what the file says of the amplifier', () => {
  const with_ = (compensation: NonNullable<Parameters<typeof measureSweep>[0]['compensation']>) =>
    measureSweep(input(clampedSweep(cell, pulse), { clamp: 'voltage', compensation }), neuron).readings;
  const nothing = { whole_cell_pf: null, correction_percent: null, prediction_percent: null };

  it('sets aside a transient that was taken away or predicted', () => {
    for (const readings of [with_({ ...nothing, whole_cell_pf: 80 }), with_({ ...nothing, prediction_percent: 70 })]) {
      for (const id of ['access_resistance_mohm', 'cell_capacitance_pf'])
        expect(readings[id]).toMatchObject({ value: null, why: 'compensated' });
      expect(numberIn(readings, 'membrane_resistance_mohm')).toBeCloseTo(210, 1);
    }
  });

  it('tells an access that was partly corrected with what it was before', () => {
    const reading = with_({ ...nothing, correction_percent: 50 })['access_resistance_mohm']!;
    expect(reading.value).toBeCloseTo(10, 2);
    expect(reading.note).toContain('about 20 MΩ without it');
    expect(with_(nothing)['access_resistance_mohm']!.note).toBeUndefined();
  });
});

describe('escaped action currents', () => {
  // A current of the shape of an action current’s derivative, ms wide, on a clamped step to −10 mV.
  const escaping = (sizes: readonly number[], times: readonly number[], width_ms = 0.6) => {
    const made = clampedSweep({ ...cell, noise_pa: 8 }, [{ from_s: 0.05, to_s: 0.15, mv: 60 }]);
    made.current.samples.forEach((_, i) => {
      times.forEach((time, k) => {
        const t = (i / 50000 - time) * 1000;
        made.current.samples[i]! -= sizes[k]! * Math.exp(-0.5 * (t / (width_ms / 2.355)) ** 2);
      });
    });
    return measure(made).readings['escaped_currents']!;
  };

  it('are counted where they come at times of their own', () => {
    const two = escaping([900, 870], [0.0712, 0.1034]);
    expect(two.value).toBe(2);
    expect(Math.abs(two.at!.from_s! - 0.0712)).toBeLessThan(1e-4);
    expect(escaping([1500], [0.17]).value).toBe(1);
    expect(escaping([], []).value).toBe(0);
  });

  it('are not synaptic currents, held sodium currents, slow currents or glitches', () => {
    expect(escaping([60, 45, 80], [0.02, 0.09, 0.17]).value).toBe(0);
    expect(escaping([2000], [0.0512]).value).toBe(0);
    expect(escaping([2000], [0.0006]).value).toBe(0);
    expect(escaping([600], [0.1], 12).value).toBe(0);
    expect(escaping([3000], [0.1], 0.04).value).toBe(0);
  });

  it('are not what a current does that settles slowly after a large step', () => {
    const made = clampedSweep({ ...cell, noise_pa: 8 }, [{ from_s: 0.05, to_s: 0.15, mv: -60 }]);
    made.current.samples.forEach((_, i) => {
      const t = i / 50000 - 0.05;
      if (t >= 0 && t < 0.1) made.current.samples[i]! -= 1500 * Math.exp(-t / 0.008);
    });
    expect(measure(made).readings['escaped_currents']!.value).toBe(0);
  });

  it('cannot be told from the command’s own answer without a command', () => {
    const { current } = clampedSweep(cell, pulse);
    const { readings } = measureSweep(input({ voltage: null, current }, { clamp: 'voltage' }), neuron);
    expect(readings['escaped_currents']!.why).toBe('no-voltage');
  });
});

// The worked example of the reference collection (passive_oracles), exact by linear circuit theory: 10 MΩ, 200 MΩ ∥ 100 pF, 5 mV: 500 pA at the edge,
// 23.8095 pA in the end, tau 0.95238 ms, charge 0.45351 pC, 210 MΩ in all; Cm = Q/dV·((Rs + Rm)/Rm)².
it('agrees with the worked example of a voltage-clamp step', () => {
  const { readings } = measure(clampedSweep(cell, pulse));
  expect(5000 / numberIn(readings, 'access_resistance_mohm')).toBeCloseTo(500, 0);
  const total = numberIn(readings, 'access_resistance_mohm') + numberIn(readings, 'membrane_resistance_mohm');
  expect(total).toBeCloseTo(210, 1);
  expect(5000 / total).toBeCloseTo(23.8095, 2);
  expect(numberIn(readings, 'transient_capacitance_pf')).toBeCloseTo(90.70294784580499, 1);
  expect(numberIn(readings, 'cell_capacitance_pf')).toBeCloseTo(90.70294784580499 * (210 / 200) ** 2, 1);
});
