import { withIonic } from './ionic.ts';
import type { AbsenceCode, Reading, Readings, Spike } from './types.ts';

/** Elementary charge, C. Exact in the 2019 SI. */
const elementaryChargeC = 1.602176634e-19;

/** What is known of the solutions and the size of the cell. Null where it is not. */
export interface KnownForSpikes {
  /** Equilibrium potential of sodium at the stated solutions, mV. */
  e_na_mv: number | null;
  /** Equilibrium potential of potassium at the stated solutions, mV. */
  e_k_mv: number | null;
  /** Measured or stated capacitance, pF. */
  capacitance_pf: number | null;
  /** Its 95 % half-width where it was measured, pF. */
  capacitance_u95_pf?: number | null;
}

/**
 * The cell's measured capacitance that charges and currents are computed with: of that from current clamp (τ/R_in) and
 * that from voltage-clamp test pulses the one with the smaller half-width; one without a half-width only where it is
 * alone. Null where neither was measured.
 */
export function measuredCapacitance(readings: Readings): Reading | null {
  const found = [readings['membrane_capacitance_pf'], readings['cell_capacitance_pf']].filter(
    (one) => one !== undefined && one.value !== null,
  ) as Reading[];
  const width = (one: Reading): number => one.u95 ?? Number.POSITIVE_INFINITY;
  return found.reduce<Reading | null>((best, one) => (best === null || width(one) < width(best) ? one : best), null);
}

/**
 * Adds to each spike what needs a fact from outside the trace: how far the peak stays below E_Na
 * (`sodium_headroom_mv`), how far the minimum after the spike stays above E_K (`potassium_margin_mv`), and the least
 * charge and number of ions that the membrane capacitance needs for the spike's height (`minimum_charge_pc`,
 * `minimum_ions_millions`), and reads the sign of each phase's net ionic current, its peaks and its charges with that
 * capacitance (`ionic.ts`). The potentials must already stand in the reading they are held against (see
 * `junction.ts`). Where a fact is missing the reason is `fact-missing`; where the spike lacks the number it starts
 * from, that number's own reason is handed on.
 *
 * @param spikes measured spikes; left as they are, new ones are returned
 * @see Nernst equation; Carter & Bean 2009, Neuron 64:898–909 for charge counting
 */
export function withDerived(spikes: readonly Spike[], known: KnownForSpikes): Spike[] {
  return spikes.map((spike) => {
    const values = { ...spike.values };
    const why = { ...spike.why };
    const u95 = { ...spike.u95 };
    const derive = (id: string, from: string, fact: number | null, formula: (fact: number, own: number) => number) => {
      const own = values[from] ?? null;
      const reason: AbsenceCode | null =
        fact === null ? 'fact-missing' : own === null ? (why[from] ?? 'unresolved') : null;
      if (reason === null) {
        values[id] = formula(fact!, own!);
        delete why[id];
        // Differences carry the half-width of the measured number; products are scaled below.
        if (u95[from] !== undefined) u95[id] = u95[from];
      } else {
        values[id] = null;
        why[id] = reason;
      }
    };
    derive('sodium_headroom_mv', 'peak_mv', known.e_na_mv, (eNaMv, peakMv) => eNaMv - peakMv);
    derive('potassium_margin_mv', 'ahp_minimum_mv', known.e_k_mv, (eKMv, minimumMv) => minimumMv - eKMv);
    // pF · mV is fC.
    derive('minimum_charge_pc', 'spike_height_mv', known.capacitance_pf, (pf, heightMv) => (pf * heightMv) / 1000);
    derive(
      'minimum_ions_millions',
      'spike_height_mv',
      known.capacitance_pf,
      (pf, heightMv) => (pf * heightMv * 1e-15) / elementaryChargeC / 1e6,
    );
    const height = spike.values['spike_height_mv'];
    for (const id of ['minimum_charge_pc', 'minimum_ions_millions'])
      if (values[id] != null && u95[id] !== undefined && height && known.capacitance_pf)
        u95[id] =
          Math.abs(values[id]) * Math.hypot(u95[id] / height, (known.capacitance_u95_pf ?? 0) / known.capacitance_pf);
    return withIonic({ ...spike, values, why, u95 }, known);
  });
}
