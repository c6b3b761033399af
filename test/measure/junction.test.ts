import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { withDerived } from '../../pipeline/measure/derive.ts';
import { correctPotentials } from '../../pipeline/measure/junction.ts';
import { quantities } from '../../pipeline/measure/quantities.ts';
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import { addSpike, input, neuron, passiveSweep } from './made.ts';

const absolute = new Set(quantities.filter((entry) => entry.absolute_potential).map((entry) => entry.id));

const made = passiveSweep(
  { rest_mv: -65, resistance_mohm: 100, tau_ms: 15, noise_mv: 0.05 },
  { pa: 120, from_s: 0.2, to_s: 0.7 },
);
for (const at of [0.25, 0.45]) addSpike(made.voltage.samples, 20000, at);
const firing = measureSweep(input(made), neuron);
const passive = measureSweep(
  input(passiveSweep({ rest_mv: -65, resistance_mohm: 100, tau_ms: 15 }, { pa: -50, from_s: 0.2, to_s: 0.7 })),
  neuron,
);
const known = { e_na_mv: 65, e_k_mv: -100, capacitance_pf: 150 };

describe('taking the junction potential out', () => {
  // V_membrane = V_recorded − ljp: −65 mV recorded and 14 mV are −79 mV.
  it('lowers a recorded −65 mV by 14 mV to −79 mV', () => {
    expect(correctPotentials(passive, 14).readings['baseline_mv']!.value!).toBeCloseTo(-79, 6);
  });

  it('lowers every absolute potential and nothing else', () => {
    fc.assert(
      fc.property(fc.double({ min: -30, max: 30, noNaN: true }), (ljp) => {
        for (const sweep of [firing, passive]) {
          const corrected = correctPotentials(sweep, ljp);
          for (const [id, reading] of Object.entries(sweep.readings)) {
            const after = corrected.readings[id]!;
            if (reading.value !== null && absolute.has(id)) expect(after.value!).toBeCloseTo(reading.value - ljp, 9);
            else expect(after.value).toBe(reading.value);
            expect({ ...after, value: 0 }).toEqual({ ...reading, value: 0 });
          }
          sweep.spikes.forEach((spike, k) => {
            for (const [id, value] of Object.entries(spike.values)) {
              const after = corrected.spikes[k]!.values[id]!;
              if (value !== null && absolute.has(id)) expect(after).toBeCloseTo(value - ljp, 9);
              else expect(after).toBe(value);
            }
          });
          expect(corrected.voltage_envelope!.low[7]!).toBeCloseTo(sweep.voltage_envelope!.low[7]! - ljp, 9);
          expect(corrected.voltage_envelope!.high[7]!).toBeCloseTo(sweep.voltage_envelope!.high[7]! - ljp, 9);
          expect(corrected.current_envelope).toEqual(sweep.current_envelope);
          expect(corrected.stimulus).toEqual(sweep.stimulus);
          if (sweep.first_spike) expect(corrected.first_spike!.mv[3]!).toBeCloseTo(sweep.first_spike.mv[3]! - ljp, 9);
          if (sweep.step_response)
            expect(corrected.step_response!.mv[3]!).toBeCloseTo(sweep.step_response.mv[3]! - ljp, 9);
        }
      }),
      { seed: 5, numRuns: 20 },
    );
  });

  it('undoes itself, leaves its input alone, and is nothing at 0', () => {
    const before = structuredClone(firing);
    const back = correctPotentials(correctPotentials(firing, 12.5), -12.5);
    expect(firing).toEqual(before);
    expect(back.spikes[0]!.values['peak_mv']!).toBeCloseTo(firing.spikes[0]!.values['peak_mv']!, 9);
    expect(correctPotentials(firing, 0)).toBe(firing);
    expect(() => correctPotentials(firing, Number.NaN)).toThrow('ljpMv');
  });

  it('commutes with what is derived from the potentials', () => {
    const first = withDerived(correctPotentials(firing, 14).spikes, known);
    const last = correctPotentials({ ...firing, spikes: withDerived(firing.spikes, known) }, 14).spikes;
    for (const id of Object.keys(first[0]!.values)) {
      const [a, b] = [first[0]!.values[id]!, last[0]!.values[id]!];
      if (a === null) expect(b).toBeNull();
      else expect(b).toBeCloseTo(a, 9);
    }
  });
});

describe('what needs facts', () => {
  it('is the distance to the equilibrium potentials', () => {
    const [spike] = withDerived(firing.spikes, known);
    expect(spike!.values['sodium_headroom_mv']).toBeCloseTo(65 - spike!.values['peak_mv']!, 9);
    expect(spike!.values['potassium_margin_mv']).toBeCloseTo(spike!.values['ahp_minimum_mv']! + 100, 9);
  });

  // Carter & Bean 2009, Neuron 64:898–909 count charge as C·ΔV: 20 pF and 100 mV are 2 pC, which is
  // 2e-12 / 1.602176634e-19 = 12.483 million elementary charges (elementary charge exact in the 2019 SI).
  it('counts charge and ions', () => {
    const spike = { ...firing.spikes[0]!, values: { ...firing.spikes[0]!.values, spike_height_mv: 100 } };
    const [counted] = withDerived([spike], { ...known, capacitance_pf: 20 });
    expect(counted!.values['minimum_charge_pc']).toBeCloseTo(2, 12);
    expect(counted!.values['minimum_ions_millions']).toBeCloseTo(12.4830181, 6);
  });

  it('says what is missing, and hands on why a spike lacks a number', () => {
    const unread = { ...firing.spikes[0]!, values: { peak_mv: null }, why: { peak_mv: 'clipped' as const } };
    const [spike] = withDerived([unread], { ...known, e_k_mv: null });
    expect(spike!.values['sodium_headroom_mv']).toBeNull();
    expect(spike!.why['sodium_headroom_mv']).toBe('clipped');
    expect(spike!.why['potassium_margin_mv']).toBe('fact-missing');
    const [later] = withDerived(
      withDerived(firing.spikes, { e_na_mv: null, e_k_mv: null, capacitance_pf: null }),
      known,
    );
    expect(later!.why['sodium_headroom_mv']).toBeUndefined();
    expect(later!.values['minimum_charge_pc']).not.toBeNull();
  });
});
