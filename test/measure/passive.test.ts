import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import { addSpike, type Circuit, heart, input, neuron, normalNoise, numberIn, passiveSweep, signalOf } from './made.ts';

// Exact solution of the RC circuit (linear circuit theory, no source needed): 100 MΩ and 20 ms, a step of −50 pA for
// 500 ms ends at −75 mV; 10 MΩ left over by the bridge jump by −0.5 mV and end at −75.5 mV.
const cell: Circuit = { rest_mv: -70, resistance_mohm: 100, tau_ms: 20 };
const step = { pa: -50, from_s: 0.2, to_s: 0.7 };
const measure = (circuit: Circuit, at = step, rateHz = 20000) =>
  measureSweep(input(passiveSweep(circuit, at, 1, rateHz)), neuron).readings;

describe('deflections', () => {
  it('are those of the circuit', () => {
    const readings = measure(cell);
    expect(numberIn(readings, 'baseline_mv')).toBeCloseTo(-70, 9);
    expect(numberIn(readings, 'steady_deflection_mv')).toBeCloseTo(-5, 6);
    expect(numberIn(readings, 'largest_deflection_mv')).toBeCloseTo(-5, 6);
    expect(numberIn(readings, 'stimulus_pa')).toBe(-50);
    expect(readings['steady_deflection_mv']!.at).toMatchObject({ to_s: 0.695 });
  });

  it('hold at a fraction of a picoampere', () => {
    const tiny = measure({ ...cell, resistance_mohm: 5000 }, { ...step, pa: -0.05 });
    expect(numberIn(tiny, 'stimulus_pa')).toBeCloseTo(-0.05, 9);
    expect(numberIn(tiny, 'steady_deflection_mv')).toBeCloseTo(-0.25, 6);
  });

  it('are taken from the level that a holding current set', () => {
    const held = measureSweep(input(passiveSweep(cell, { ...step, holding_pa: 40 })), neuron).readings;
    expect(numberIn(held, 'baseline_mv')).toBeCloseTo(-66, 6);
    expect(numberIn(held, 'holding_pa')).toBeCloseTo(40, 9);
    expect(numberIn(held, 'steady_deflection_mv')).toBeCloseTo(-5, 6);
  });

  it('find the sag where there is one', () => {
    // Rest −70, lowest −90, steady −85 mV: a sag that builds up with 60 ms.
    const voltage = signalOf(1.5, 20000, (t) => {
      const ms = (t - 0.2) * 1000;
      if (ms < 0 || t >= 1.2) return -70;
      return -70 - 15 * (1 - Math.exp(-ms / 8)) - 9.5 * (Math.exp(-ms / 60) - Math.exp(-ms / 8));
    });
    const lowest = voltage.samples.reduce((a, b) => Math.min(a, b));
    const current = signalOf(1.5, 20000, (t) => (t >= 0.2 && t < 1.2 ? -100 : 0));
    const { readings } = measureSweep(input({ voltage, current }), neuron);
    expect(numberIn(readings, 'steady_deflection_mv')).toBeCloseTo(-15, 3);
    // Averaging over one mains period flattens so sharp a trough by about 1 %.
    expect(Math.abs(numberIn(readings, 'largest_deflection_mv') / (lowest + 70) - 1)).toBeLessThan(0.012);
  });

  it('say why there are none', () => {
    const why = (readings: ReturnType<typeof measure>, id: string) => readings[id]!.why;
    expect(why(measure(cell, { ...step, pa: 0 }), 'steady_deflection_mv')).toBe('no-stimulus');
    expect(why(measure(cell, { pa: 800, from_s: 0.2, to_s: 0.202 }), 'steady_deflection_mv')).toBe('sweep-too-short');
    expect(why(measure(cell, { pa: 50, from_s: 0.2, to_s: 0.7 }), 'largest_deflection_mv')).toBe(
      'no-hyperpolarizing-steps',
    );
    expect(why(measure(cell, { pa: -50, from_s: 0, to_s: 0.5 }), 'steady_deflection_mv')).toBe('no-baseline');
    const ramp = passiveSweep(cell, { ...step, pa: 0 });
    ramp.current.samples.forEach((_, i) => {
      ramp.current.samples[i] = i > 4000 && i < 14000 ? (i - 4000) / 50 : 0;
    });
    expect(why(measureSweep(input(ramp), neuron).readings, 'steady_deflection_mv')).toBe('stimulus-not-a-step');
  });

  it('are not measured through a spike, and remain where the spike came early', () => {
    const late = passiveSweep(cell, { ...step, pa: 60 });
    addSpike(late.voltage.samples, 20000, 0.66);
    expect(measureSweep(input(late), neuron).readings['steady_deflection_mv']!.why).toBe('no-spike-free-stretch');
    const early = passiveSweep(cell, { ...step, pa: 60 });
    addSpike(early.voltage.samples, 20000, 0.25);
    const { readings } = measureSweep(input(early), neuron);
    expect(numberIn(readings, 'steady_deflection_mv')).toBeCloseTo(6, 1);
    expect(readings['steady_deflection_mv']!.note).toContain('spikes earlier');
  });

  it('are not measured where the trace is clipped', () => {
    const clipped = passiveSweep({ ...cell, noise_mv: 0.05 }, step);
    clipped.voltage.samples.forEach((value, i) => {
      clipped.voltage.samples[i] = Math.max(value, -74);
    });
    const { readings } = measureSweep(input(clipped), neuron);
    expect(readings['steady_deflection_mv']!.why).toBe('clipped');
    expect(numberIn(readings, 'clipped_fraction')).toBeGreaterThan(0.2);
  });
});

describe('bridge step', () => {
  it.each([10, -10, 3.5, 0])('is what a resistance of %d MΩ left over makes of it', (left) => {
    const readings = measure({ ...cell, bridge_left_mohm: left });
    expect(numberIn(readings, 'bridge_step_mv')).toBeCloseTo((-50 * left) / 1000, 5);
    expect(numberIn(readings, 'steady_deflection_mv')).toBeCloseTo(-5 - (50 * left) / 1000, 5);
    expect(readings['bridge_step_mv']!.n).toBe(2);
  });

  it('looks past the pipette’s own charging and through noise', () => {
    const slow = measure(
      { ...cell, bridge_left_mohm: 12, pipette_tau_ms: 0.12, noise_mv: 0.05, seed: 3 },
      { ...step, pa: -100 },
    );
    expect(Math.abs(numberIn(slow, 'bridge_step_mv') + 1.2)).toBeLessThan(0.08);
    const fast = measure(
      { rest_mv: -70, resistance_mohm: 80, tau_ms: 6, bridge_left_mohm: 5, noise_mv: 0.05 },
      { ...step, pa: -100 },
    );
    expect(Math.abs(numberIn(fast, 'bridge_step_mv') + 0.5)).toBeLessThan(0.12);
  });

  it('takes the filter’s delay for what it is', () => {
    // A four-pole Bessel filter of 2 kHz delays by 0.168 ms: on a slope of 1 pA/100 pF that looks like −1.7 MΩ.
    const delay_s = 0.000168;
    const late = passiveSweep(
      { rest_mv: -70, resistance_mohm: 70, tau_ms: 7, noise_mv: 0.01 },
      { pa: -100, from_s: 0.2 + delay_s, to_s: 0.7 + delay_s },
    );
    const { current } = passiveSweep(cell, { ...step, pa: -100 });
    const jump = (filter_khz: number | null) =>
      numberIn(measureSweep(input({ ...late, current }), { ...neuron, filter_khz }).readings, 'bridge_step_mv');
    expect(Math.abs(jump(2))).toBeLessThan(0.03);
    expect(jump(null)).toBeGreaterThan(0.1);
  });

  it('is not told from a membrane that answers within a millisecond, nor from a bare resistor', () => {
    const fast = measure({ rest_mv: -65, resistance_mohm: 10, tau_ms: 0.4, noise_mv: 0.02 }, { ...step, pa: -400 });
    expect(fast['bridge_step_mv']!.why).toBe('no-electrode-transient');
    const bare = measure({ rest_mv: 0, resistance_mohm: 0, tau_ms: 10, bridge_left_mohm: 8, noise_mv: 0.02 });
    expect(bare['bridge_step_mv']!.why).toBe('no-electrode-transient');
  });

  it('adds to a known bridge as access resistance', () => {
    const made = passiveSweep({ ...cell, bridge_left_mohm: 4 }, step);
    const { readings } = measureSweep(input(made, { bridge_mohm: 14 }), neuron);
    // Read from means over 0.1 ms.
    expect(numberIn(readings, 'access_resistance_mohm')).toBeCloseTo(18, 3);
    expect(measureSweep(input(made), neuron).readings['access_resistance_mohm']).toMatchObject({
      value: null,
      why: 'fact-missing',
      missing: ['bridge_mohm'],
    });
  });

  it('uses the edge that spikes have left alone', () => {
    const made = passiveSweep({ ...cell, bridge_left_mohm: 10 }, { ...step, pa: 200 });
    addSpike(made.voltage.samples, 20000, 0.202);
    const { readings } = measureSweep(input(made), neuron);
    expect(readings['bridge_step_mv']!.note).toBe('end only');
    expect(numberIn(readings, 'bridge_step_mv')).toBeCloseTo(2, 2);
  });
});

describe('baseline', () => {
  it('leaves spikes out and says so', () => {
    const made = passiveSweep({ ...cell, noise_mv: 0.1 }, { ...step, from_s: 0.6, to_s: 0.9 }, 1.2);
    for (const at of [0.15, 0.3, 0.45]) addSpike(made.voltage.samples, 20000, at);
    const sweep = measureSweep(input(made), neuron);
    expect(sweep.spikes).toHaveLength(3);
    expect(Math.abs(numberIn(sweep.readings, 'baseline_mv') + 70)).toBeLessThan(0.05);
    expect(numberIn(sweep.readings, 'baseline_sd_mv')).toBeLessThan(0.15);
    expect(sweep.readings['baseline_mv']!.note).toBe('between spikes');
    for (const spike of sweep.spikes)
      expect(spike.values['height_from_rest_mv']).toBeCloseTo(
        spike.values['peak_mv']! - numberIn(sweep.readings, 'baseline_mv'),
        9,
      );
  });

  it('sees drift', () => {
    const readings = measure({ ...cell, drift_mv_per_s: -3, noise_mv: 0.05 });
    const drift = readings['baseline_drift_mv_per_s']!;
    expect(Math.abs(drift.value! + 3)).toBeLessThan(3 * drift.se!);
    expect(Math.abs(numberIn(measure(cell), 'baseline_drift_mv_per_s'))).toBeLessThan(1e-9);
  });

  it('looks back half a second and no further', () => {
    const voltage = signalOf(3, 10000, (t) => (t < 1 ? -40 : -65));
    const current = signalOf(3, 10000, (t) => (t >= 2 && t < 2.5 ? -50 : 0));
    const { readings } = measureSweep(input({ voltage, current }), neuron);
    expect(readings['baseline_mv']).toMatchObject({ value: -65, at: { from_s: 1.5, to_s: 2 }, n: 5000 });
  });

  it('does not take a test pulse into itself', () => {
    const made = passiveSweep(cell, { pa: 100, from_s: 0.4, to_s: 0.9 }, 1.2);
    const pulse = passiveSweep(cell, { pa: -100, from_s: 0.1, to_s: 0.15 }, 1.2);
    made.current.samples.forEach((value, i) => {
      made.current.samples[i] = value + pulse.current.samples[i]!;
      made.voltage.samples[i]! += pulse.voltage.samples[i]! + 70;
    });
    expect(Math.abs(numberIn(measureSweep(input(made), neuron).readings, 'baseline_mv') + 70)).toBeLessThan(0.01);
  });

  it('takes the whole sweep without a stimulus, and the beginning where nothing is known of one', () => {
    const voltage = signalOf(2, 10000, () => -64);
    const none = measureSweep(
      input({ voltage, current: null }, { stated_stimulus: { kind: 'none' } }),
      neuron,
    ).readings;
    expect(none['baseline_mv']).toMatchObject({ value: -64, n: 20000 });
    const unknown = measureSweep(input({ voltage, current: null }), neuron).readings;
    expect(unknown['baseline_mv']).toMatchObject({ value: -64, n: 5000 });
    expect(unknown['baseline_mv']!.note).toContain('not known');
    expect(unknown['holding_pa']!.why).toBe('holding-unknown');
  });

  it('is missing where the stimulus begins at once', () => {
    const voltage = signalOf(1, 10000, () => -60);
    const { readings } = measureSweep(
      input({ voltage, current: null }, { stated_stimulus: { kind: 'step', start_s: 0, end_s: 0.5, pa: -50 } }),
      neuron,
    );
    for (const id of ['baseline_mv', 'baseline_sd_mv', 'steady_deflection_mv'])
      expect(readings[id]).toMatchObject({ value: null, why: 'no-baseline' });
  });

  it('finds the level between the beats of a heart cell', () => {
    const voltage = signalOf(5, 10000, (t) => {
      const ms = (t % 1) * 1000 - 106;
      if (ms < 0 || ms > 320) return -80;
      if (ms < 2) return -80 + 60 * ms;
      return ms < 220 ? 40 - 0.18 * (ms - 2) : 0.76 - 0.808 * (ms - 220);
    });
    const current = signalOf(5, 10000, (t) => (t % 1 >= 0.098 && t % 1 < 0.1 ? 900 : 0));
    const sweep = measureSweep(input({ voltage, current }), heart);
    expect(sweep.stimulus.kind).toBe('pulse train');
    expect(sweep.spikes).toHaveLength(5);
    expect(Math.abs(numberIn(sweep.readings, 'baseline_mv') + 80)).toBeLessThan(0.1);
  });
});

describe('laws', () => {
  const circuits = fc.record({
    rest_mv: fc.double({ min: -90, max: -40, noNaN: true }),
    resistance_mohm: fc.double({ min: 20, max: 800, noNaN: true }),
    tau_ms: fc.double({ min: 4, max: 60, noNaN: true }),
    bridge_left_mohm: fc.double({ min: -20, max: 20, noNaN: true }),
  });

  it('a shift of the potential shifts levels and leaves differences', () => {
    fc.assert(
      fc.property(circuits, fc.double({ min: -30, max: 30, noNaN: true }), (circuit, by) => {
        const before = measure({ ...circuit, noise_mv: 0.1 }, step, 10000);
        const after = measure({ ...circuit, noise_mv: 0.1, rest_mv: circuit.rest_mv + by }, step, 10000);
        expect(numberIn(after, 'baseline_mv') - numberIn(before, 'baseline_mv')).toBeCloseTo(by, 6);
        for (const id of [
          'steady_deflection_mv',
          'largest_deflection_mv',
          'bridge_step_mv',
          'noise_rms_mv',
          'baseline_sd_mv',
        ])
          expect(numberIn(after, id)).toBeCloseTo(numberIn(before, id), 6);
      }),
      { seed: 11, numRuns: 8 },
    );
  });

  it('twice the current makes twice the deflection and twice the jump', () => {
    fc.assert(
      fc.property(circuits, (circuit) => {
        const once = measure(circuit, { ...step, pa: -20 }, 10000);
        const twice = measure(circuit, { ...step, pa: -40 }, 10000);
        for (const id of ['stimulus_pa', 'steady_deflection_mv', 'largest_deflection_mv', 'bridge_step_mv'])
          expect(numberIn(twice, id)).toBeCloseTo(2 * numberIn(once, id), 5);
      }),
      { seed: 12, numRuns: 8 },
    );
  });

  it('a constant current added to the command changes the holding level and nothing else', () => {
    fc.assert(
      fc.property(circuits, fc.double({ min: -300, max: 300, noNaN: true }), (circuit, pa) => {
        const made = passiveSweep(circuit, step, 1, 10000);
        const moved = { ...made.current, samples: made.current.samples.map((value) => value + pa) };
        const before = measureSweep(input(made), neuron).readings;
        const after = measureSweep(input({ voltage: made.voltage, current: moved }), neuron).readings;
        expect(numberIn(after, 'holding_pa')).toBeCloseTo(pa, 9);
        for (const id of ['stimulus_pa', 'baseline_mv', 'steady_deflection_mv', 'bridge_step_mv'])
          expect(numberIn(after, id)).toBeCloseTo(numberIn(before, id), 6);
      }),
      { seed: 13, numRuns: 8 },
    );
  });
});

it('keeps the onset of the response in bins that begin at the edge', () => {
  const noise = normalNoise(2);
  const made = passiveSweep(cell, step);
  made.voltage.samples.forEach((value, i) => {
    made.voltage.samples[i] = value + 0.01 * noise();
  });
  const response = measureSweep(input(made), neuron).step_response!;
  const at = (s: number) => response.mv[Math.round((s - response.start_s) * response.rate_hz)]!;
  expect(response.mv.length).toBeLessThan(1700);
  expect(at(0.195)).toBeCloseTo(-70, 1);
  expect(Math.abs(at(0.22) + 70 + 5 * (1 - Math.exp(-1)))).toBeLessThan(0.03);
  expect(measureSweep(input(passiveSweep(cell, { ...step, pa: 50 })), neuron).step_response).toBeNull();
});
