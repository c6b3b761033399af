import { quantities } from './quantities.ts';
import type { Readings, Spike, SweepMeasure } from './types.ts';

const absolutePotentials = new Set(quantities.filter((entry) => entry.absolute_potential).map((entry) => entry.id));

/**
 * Differences against a potential of the solutions, which the junction does not move: they change by the opposite of,
 * or as much as, the potential they were taken from.
 */
const againstSolutions: Record<string, 1 | -1> = { sodium_headroom_mv: -1, potassium_margin_mv: 1 };

const shiftOf = (id: string): 0 | 1 | -1 => (absolutePotentials.has(id) ? 1 : (againstSolutions[id] ?? 0));

function shiftedReadings(readings: Readings, byMv: number): Readings {
  return Object.fromEntries(
    Object.entries(readings).map(([id, reading]) => {
      const times = shiftOf(id);
      return [id, times && reading.value !== null ? { ...reading, value: reading.value + times * byMv } : reading];
    }),
  );
}

function shiftedSpike(spike: Spike, byMv: number): Spike {
  const values = Object.fromEntries(
    Object.entries(spike.values).map(([id, value]) => [id, value === null ? null : value + shiftOf(id) * byMv]),
  );
  return { ...spike, values };
}

/**
 * Takes the liquid junction potential out of a sweep: every absolute potential against the bath (marked so in the
 * registry), the drawn envelope, the excerpt of the first spike and the response to the step are lowered by `ljpMv`.
 * Differences between two potentials of the same sweep stay as they are.
 *
 * @param ljpMv bath minus pipette, mV, so that V_membrane = V_recorded − ljp; 0 gives the sweep back unchanged
 * @throws RangeError when `ljpMv` is not a finite number
 * @see Neher 1992, Methods Enzymol 207:123–131 (sign convention; from memory)
 */
export function correctPotentials(sweep: SweepMeasure, ljpMv: number): SweepMeasure {
  if (!Number.isFinite(ljpMv)) throw new RangeError(`ljpMv must be a finite potential in mV, got ${ljpMv}`);
  if (ljpMv === 0) return sweep;
  const down = (mv: number[]): number[] => mv.map((value) => value - ljpMv);
  const { voltage_envelope, first_spike, step_response, spontaneous, stimulus } = sweep;
  return {
    ...sweep,
    // In voltage clamp the command itself is a potential against the bath.
    stimulus:
      sweep.clamp === 'voltage' && stimulus.holding !== null
        ? { ...stimulus, holding: stimulus.holding - ljpMv }
        : stimulus,
    readings: shiftedReadings(sweep.readings, -ljpMv),
    spikes: sweep.spikes.map((spike) => shiftedSpike(spike, -ljpMv)),
    voltage_envelope: voltage_envelope && {
      ...voltage_envelope,
      low: down(voltage_envelope.low),
      high: down(voltage_envelope.high),
    },
    first_spike: first_spike && { ...first_spike, mv: down(first_spike.mv) },
    step_response: step_response && { ...step_response, mv: down(step_response.mv) },
    ...(spontaneous ? { spontaneous: { ...spontaneous, minima_mv: down(spontaneous.minima_mv) } } : {}),
  };
}
