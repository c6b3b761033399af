import { describe, expect, it } from 'vitest';
import { measureIntervals } from '../../pipeline/measure/firing.ts';
import { quantitiesOf } from '../../pipeline/measure/quantities.ts';
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import type { Signal, SweepInput, SweepMeasure } from '../../pipeline/measure/types.ts';
import { standardDeviation } from '../../pipeline/signal/statistics.ts';
import { hodgkinHuxley, pospischil, simulate } from '../helpers/models.ts';
import { addSpike, heart, input, neuron, normalNoise, numberIn, passiveSweep, signalOf } from './made.ts';

const rate = 20000;
const idsFor = (clamp: 'current' | 'voltage') =>
  quantitiesOf('sweep')
    .filter((entry) => entry.clamp === clamp || entry.clamp === 'both')
    .map((entry) => entry.id);

/** Every quantity of the clamp mode is there, finite or with a reason; nothing else is. */
function expectComplete(sweep: SweepMeasure): void {
  expect(Object.keys(sweep.readings)).toEqual(idsFor(sweep.clamp));
  for (const [id, reading] of Object.entries(sweep.readings)) {
    if (reading.value === null) expect(reading.why, id).toBeTruthy();
    else {
      expect(Number.isFinite(reading.value), id).toBe(true);
      expect(reading.why, id).toBeUndefined();
    }
    for (const part of ['n', 'sd', 'se'] as const)
      if (reading[part] !== undefined) expect(Number.isFinite(reading[part]), `${id} ${part}`).toBe(true);
  }
  // Crosses threads and is stored as JSON: nothing may be lost on the way.
  expect(JSON.parse(JSON.stringify(sweep))).toEqual(sweep);
}

const signal = (samples: number[] | Float64Array, at = rate, start = 0): Signal => ({
  samples: Float64Array.from(samples),
  rate_hz: at,
  start_s: start,
});

describe('a sweep of any kind is measured or says why not', () => {
  const noise = normalNoise(1);
  const noisy = signalOf(0.5, rate, () => -65 + noise());
  const cases: [string, Partial<SweepInput>][] = [
    ['nothing', { voltage: null, current: null }],
    ['no samples', { voltage: signal([]), current: signal([]) }],
    ['one sample', { voltage: signal([-60]), current: signal([0]) }],
    ['two samples', { voltage: signal([-60, -61]), current: signal([0, 10]) }],
    ['five samples', { voltage: signal([-60, -61, -59, -60, -60]), current: signal([0, 10, 10, 0, 0]) }],
    ['only NaN', { voltage: signal(new Float64Array(100).fill(Number.NaN)), current: signal([1]) }],
    ['infinite values', { voltage: signal([-60, Number.POSITIVE_INFINITY, -60, -61]), current: null }],
    ['a flat line', { voltage: signal(new Float64Array(5000).fill(-70)), current: signal(new Float64Array(5000)) }],
    [
      'half NaN',
      { voltage: { ...noisy, samples: noisy.samples.map((v, i) => (i % 2 ? v : Number.NaN)) }, current: null },
    ],
    ['a rate of zero', { voltage: { ...noisy, rate_hz: 0 }, current: null }],
    ['a rate of 100 Hz', { voltage: { ...noisy, rate_hz: 100 }, current: null }],
    ['a negative start', { voltage: { ...noisy, start_s: -3 }, current: { ...noisy, start_s: -3 } }],
    [
      'a stimulus beyond the voltage',
      { voltage: noisy, current: null, stated_stimulus: { kind: 'step', start_s: 2, end_s: 3, pa: 50 } },
    ],
    ['huge numbers', { voltage: signal([1e300, -1e300, 1e300, 0, 1]), current: signal([1e300, 0, 0, 0, 0]) }],
  ];
  for (const clamp of ['current', 'voltage'] as const)
    it.each(cases)(`${clamp} clamp, %s`, (_name, part) => {
      const whole = { clamp, stated_stimulus: null, bridge_mohm: null, voltage: null, current: null, ...part };
      expectComplete(measureSweep(whole, neuron));
      expectComplete(measureSweep(whole, heart));
    });
});

describe('voltage and current on different clocks', () => {
  const made = passiveSweep({ rest_mv: -70, resistance_mohm: 100, tau_ms: 20 }, { pa: -50, from_s: 0.2, to_s: 0.7 });
  const slow = signalOf(1, 5000, (t) => (t >= 0.2 && t < 0.7 ? -50 : 0));

  it('a current at another rate is aligned by time and remarked', () => {
    const sweep = measureSweep(input({ voltage: made.voltage, current: slow }), neuron);
    expect(numberIn(sweep.readings, 'steady_deflection_mv')).toBeCloseTo(-5, 5);
    expect(sweep.remarks.join()).toContain('5000 Hz');
  });

  it('a current that is longer, shorter or starts elsewhere is remarked', () => {
    const longer = signalOf(2, rate, (t) => (t >= 0.2 && t < 0.7 ? -50 : 0));
    const sweep = measureSweep(input({ voltage: made.voltage, current: longer }), neuron);
    expect(numberIn(sweep.readings, 'steady_deflection_mv')).toBeCloseTo(-5, 5);
    expect(sweep.remarks.join()).toContain('aligned by time');
    const early = { ...longer, start_s: -0.1 };
    expect(measureSweep(input({ voltage: made.voltage, current: early }), neuron).stimulus.onset_s).toBeCloseTo(0.1, 6);
  });

  it('a step that outlasts the voltage is cut to it', () => {
    const cut = { ...made.voltage, samples: made.voltage.samples.slice(0, 0.5 * rate) };
    const sweep = measureSweep(input({ voltage: cut, current: made.current }), neuron);
    expect(sweep.stimulus.end_s).toBeCloseTo(0.5, 6);
    expect(sweep.remarks.join()).toContain('ends before the stimulus');
    expect(numberIn(sweep.readings, 'baseline_mv')).toBeCloseTo(-70, 6);
  });
});

describe('firing', () => {
  // Spike times 10, 20, 40, 50, 70 ms: intervals 10, 20, 10, 20 ms; Lv = 1/3 since ((10−20)/30)² = 1/9 for every
  // pair; CV 0.3849 with the sample SD; mean relative lengthening 1/9 (Shinomoto, Shima & Tanji 2003 for Lv).
  it('measures intervals as published', () => {
    const readings = measureIntervals([0.01, 0.02, 0.04, 0.05, 0.07]);
    expect(numberIn(readings, 'interval_cv')).toBeCloseTo(0.3849001794597505, 12);
    expect(numberIn(readings, 'interval_lv')).toBeCloseTo(1 / 3, 12);
    expect(numberIn(readings, 'interval_adaptation')).toBeCloseTo(0.1111111111, 9);
    expect(measureIntervals([])['interval_cv']!.why).toBe('no-spikes');
    expect(measureIntervals([1, 2])['interval_lv']!.why).toBe('too-few-spikes');
  });

  it('carries the half-widths of the times into the measures of intervals', () => {
    const times = [0.011, 0.024, 0.041, 0.059, 0.083, 0.104, 0.131, 0.15];
    const sd = 0.0002;
    const ids = ['interval_cv', 'interval_lv', 'interval_adaptation'];
    const stated = measureIntervals(
      times,
      times.map(() => 1.96 * sd),
    );
    const next = normalNoise(11);
    const seen = Array.from({ length: 2000 }, () => measureIntervals(times.map((time) => time + sd * next())));
    for (const id of ids) {
      const spread = standardDeviation(seen.map((readings) => numberIn(readings, id)))!;
      expect(stated[id]!.u95! / (1.96 * spread)).toBeGreaterThan(0.9);
      expect(stated[id]!.u95! / (1.96 * spread)).toBeLessThan(1.1);
    }
    expect(measureIntervals(times)['interval_cv']).not.toHaveProperty('u95');
  });

  it('counts spikes of the step for the rate and all for the sweep', () => {
    const made = passiveSweep(
      { rest_mv: -70, resistance_mohm: 50, tau_ms: 10, noise_mv: 0.05 },
      { pa: 200, from_s: 0.2, to_s: 0.7 },
    );
    for (const at of [0.1, 0.25, 0.35, 0.45, 0.55, 0.9]) addSpike(made.voltage.samples, rate, at);
    const sweep = measureSweep(input(made), neuron);
    expect(numberIn(sweep.readings, 'spikes')).toBe(6);
    expect(numberIn(sweep.readings, 'mean_rate_hz')).toBeCloseTo(8, 9);
    expect(Math.abs(numberIn(sweep.readings, 'first_spike_latency_ms') - 50)).toBeLessThan(0.3);
    expect(sweep.depolarization_block).toBe(false);
    expect(sweep.spontaneous).toMatchObject({ spikes: 1 });
    expect(sweep.first_spike).not.toBeNull();
  });

  it('has no rate over a pulse of 2 ms, but a latency', () => {
    const made = passiveSweep(
      { rest_mv: -70, resistance_mohm: 50, tau_ms: 10 },
      { pa: 1500, from_s: 0.2, to_s: 0.202 },
    );
    addSpike(made.voltage.samples, rate, 0.206);
    const { readings } = measureSweep(input(made), neuron);
    expect(readings['mean_rate_hz']!.why).toBe('sweep-too-short');
    expect(Math.abs(numberIn(readings, 'first_spike_latency_ms') - 6)).toBeLessThan(0.3);
  });

  // Hodgkin–Huxley at 6.3 °C (1952, J Physiol 117:500–544): above about 100 µA/cm² a few spikes, then silence at a
  // depolarized level; at 10 µA/cm² it fires on (computed with DOP853; see the reference values of the models).
  it.each([
    [10, false],
    [120, true],
  ])('tells depolarization block at %d µA/cm²: %s', (drive, blocked) => {
    const trace = simulate(hodgkinHuxley(), rate, [
      [50, 0],
      [300, drive],
      [50, 0],
    ]);
    const sweep = measureSweep(input({ voltage: signal(trace.mv), current: signal(trace.drive) }), {
      ...neuron,
      capacitance_pf: 1,
    });
    expect(sweep.depolarization_block).toBe(blocked);
    expect(sweep.spikes.length).toBeGreaterThan(1);
  });

  it('a cell that adapts to silence is not blocked', () => {
    const made = passiveSweep({ rest_mv: -70, resistance_mohm: 50, tau_ms: 10 }, { pa: 200, from_s: 0.2, to_s: 0.7 });
    // A slow outward current takes the potential down by 8 mV after the second spike.
    made.voltage.samples.forEach((value, i) => {
      const s = i / rate;
      if (s > 0.25 && s < 0.7) made.voltage.samples[i] = value - 8 * (1 - Math.exp(-(s - 0.25) / 0.03));
    });
    for (const at of [0.22, 0.25]) addSpike(made.voltage.samples, rate, at);
    const sweep = measureSweep(input(made), neuron);
    expect(sweep.spikes).toHaveLength(2);
    expect(sweep.depolarization_block).toBe(false);
  });

  // Pospischil et al. 2008, Biol Cybern 99:427–441, FS cell at 36 °C, step of 0.5 nA for 1 s: 49.58 Hz, 49 peaks
  // (computed with LSODA).
  it('fires as the published model does', () => {
    const model = pospischil('FS');
    const pa = 500;
    const trace = simulate(model, rate, [
      [100, 0],
      [1000, pa / model.capacitance_pf],
      [50, 0],
    ]);
    const current = signal(trace.drive.map((value) => value * model.capacitance_pf));
    const { readings } = measureSweep(input({ voltage: signal(trace.mv), current }), neuron);
    expect(numberIn(readings, 'spikes')).toBe(49);
    expect(numberIn(readings, 'mean_rate_hz')).toBeCloseTo(49, 6);
    expect(numberIn(readings, 'interval_cv')).toBeLessThan(0.001);
    expect(numberIn(readings, 'stimulus_pa')).toBeCloseTo(500, 6);
  });

  it('finds the diastolic potential of a cell that fires by itself', () => {
    const noise = normalNoise(4);
    const voltage = signalOf(6, 10000, (t) => {
      const phase = (t % 0.5) / 0.5;
      // From −65 mV up to a spike and back.
      return -65 + 15 * phase + (phase > 0.9 ? 80 * Math.sin(((phase - 0.9) / 0.1) * Math.PI) : 0) + 0.05 * noise();
    });
    const sweep = measureSweep(input({ voltage, current: signalOf(6, 10000, () => 0) }), heart);
    expect(sweep.spikes.length).toBeGreaterThanOrEqual(11);
    expect(sweep.spontaneous!.spikes).toBe(sweep.spikes.length);
    expect(sweep.spontaneous!.seconds).toBeCloseTo(6, 6);
    for (const minimum of sweep.spontaneous!.minima_mv) expect(Math.abs(minimum + 65)).toBeLessThan(0.4);
    expect(measureSweep(input({ voltage, current: null }), heart).spontaneous).toBeNull();
  });
});

describe('a baseline where no stimulus is known', () => {
  const noise = normalNoise(6);
  // A relaxation of 30 mV and back again, as a current ramp that nobody wrote down makes it.
  const travelling = (mv: number) =>
    measureSweep(
      input({ voltage: signalOf(1, 5000, (t) => -30 + mv * Math.cos(4 * t) + 0.05 * noise()), current: null }),
      neuron,
    ).readings;

  it('is none where the potential travels', () => {
    const readings = travelling(30);
    expect(readings['baseline_mv']).toMatchObject({ value: null, why: 'no-baseline' });
    expect(readings['baseline_mv']!.note).toContain('travels');
    expect(numberIn(readings, 'baseline_sd_mv')).toBeGreaterThan(3);
  });

  it('is the level of a potential that stays', () =>
    expect(Math.abs(numberIn(travelling(0), 'baseline_mv') + 30)).toBeLessThan(0.05));
});

describe('holding', () => {
  const voltage = signalOf(1, rate, () => -65);
  it('adds the bias that the file states', () => {
    const current = signalOf(1, rate, () => 20);
    const sweep = measureSweep(input({ voltage, current }, { bias_pa: -35 }), neuron);
    expect(numberIn(sweep.readings, 'holding_pa')).toBeCloseTo(-15, 9);
    expect(sweep.bias_pa).toBe(-35);
  });

  it('is zero where it is stated that nothing was injected, and unknown where nothing is stated', () => {
    const stated = measureSweep(input({ voltage, current: null }, { stated_stimulus: { kind: 'none' } }), neuron);
    expect(numberIn(stated.readings, 'holding_pa')).toBe(0);
    expect(numberIn(stated.readings, 'stimulus_pa')).toBe(0);
    const unstated = measureSweep(input({ voltage, current: null }), neuron);
    expect(unstated.readings['holding_pa']!.why).toBe('holding-unknown');
    expect(unstated.readings['stimulus_pa']!.why).toBe('no-stimulus');
  });
});
