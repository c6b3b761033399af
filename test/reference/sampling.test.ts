/** Spikes through a filter and a sampler against the same spikes computed apart. */
import { describe, test } from 'vitest';
import { hodgkinHuxley, pospischil, simulate, type Trace, wangBuzsaki } from '../helpers/models.ts';
import { bessel, fineHz } from '../truth/recorder.ts';
import { measure, near, numberOf, pf } from './traces.ts';

const rs = pospischil('RS');
const wb = wangBuzsaki();

/**
 * Through an analogue 4-pole Bessel filter and then sampled. The values are of the same filtered spikes at 200 kHz: what
 * there is left to measure. Slopes of a few samples and single highest samples lose more, the more the slower the rate;
 * measuring must come close to the filtered spike itself.
 */
describe('filter and sampling', () => {
  const spikes = {
    'squid axon': {
      model: hodgkinHuxley(),
      capacitance: pf,
      pieces: [
        [5, 0],
        [1, 20],
        [24, 0],
      ] as [number, number][],
      pick: 0,
    },
    RS: {
      model: rs,
      capacitance: rs.capacitance_pf,
      pieces: [
        [100, 0],
        [24, 750 / rs.capacitance_pf],
      ] as [number, number][],
      pick: 0,
    },
    'Wang & Buzsáki': {
      model: wb,
      capacitance: pf,
      pieces: [
        [100, 0],
        [29, 2],
      ] as [number, number][],
      pick: 2,
    },
  };
  const fine = new Map<string, Trace>();
  // [spike, filter kHz, peak, rise, half-width from the threshold at 10 V/s (that of the axon lies on the pulse)].
  test.each([
    ['squid axon', 3, 40.0834, 282.3625, null],
    ['squid axon', 10, 40.4621, 308.2722, null],
    ['RS', 2, 45.6248, 352.1533, 0.7204],
    ['RS', 5, 46.8891, 500.9927, 0.7062],
    ['RS', 10, 47.058, 547.8545, 0.7039],
    ['Wang & Buzsáki', 2, 27.4239, 305.0173, 0.517],
    ['Wang & Buzsáki', 5, 29.8571, 436.1941, 0.4997],
    ['Wang & Buzsáki', 10, 30.205, 487.6736, 0.4978],
  ] as const)('%s through %d kHz', (name, filter_khz, peak, rise, width) => {
    const { model, capacitance, pieces, pick } = spikes[name];
    const whole = fine.get(name) ?? simulate(model, fineHz, pieces);
    fine.set(name, whole);
    const filtered = bessel(whole.mv, filter_khz * 1000);
    for (const [rateHz, peakOff, riseOff, widthOff] of [
      [100_000, 0.03, 0.02, 0.002],
      [50_000, 0.05, 0.05, 0.003],
      [20_000, 0.45, 0.25, 0.01],
    ] as const) {
      const every = fineHz / rateHz;
      const take = (samples: Float64Array) =>
        Float64Array.from({ length: Math.floor(samples.length / every) }, (_, i) => samples[i * every]!);
      const trace: Trace = { mv: take(filtered), drive: take(whole.drive), rateHz, edges_s: [] };
      const spike = measure(trace, { rise_criterion_v_per_s: 10, filter_khz }, capacitance).spikes[pick];
      near(numberOf(spike, 'peak_mv'), peak, peakOff, `peak at ${rateHz}`);
      near(numberOf(spike, 'max_rise_v_per_s') / rise, 1, riseOff, `rise at ${rateHz}`);
      if (width !== null) near(numberOf(spike, 'half_width_ms') / width, 1, widthOff, `half-width at ${rateHz}`);
    }
  });
});
