/**
 * Spikes of models that nothing in measuring was tuned on: bursting and low-threshold cells, a cold regular-spiking cell
 * with less sodium, an interneuron and an axon with other conductances. What holds on `current-clamp.ts` must hold here.
 */

import { settle } from '../../content-sample/generate/integrate.ts';
import {
  bursting2008,
  corticalCell,
  fastSpikingInterneuron,
  interneuron1996,
  lowThreshold2008,
  regularSpiking2008,
  type Model as SampleModel,
  squid1952,
  squidAxon,
} from '../../content-sample/generate/models.ts';
import type { Model } from '../helpers/models.ts';
import { type Cell, cleanSweeps, conditions, trialsOf } from './current-clamp.ts';
import { isWanted, type Trial, type TrialOptions } from './score.ts';

/** A model of the sample's generator, at its own rest, as the bench runs it. All have 1 µF/cm²: 1 µA/cm² is 1 V/s. */
function asBenchModel(model: SampleModel, from_mv: number): Model {
  const state = settle(model, from_mv, 1500);
  const own = Float64Array.from(state);
  const out = new Float64Array(state.length);
  return {
    start: Array.from(state),
    slope(given, current, into) {
      own.set(given.slice(0, own.length));
      model.derive(own, out, current, 0, 0);
      for (let k = 0; k < own.length; k++) into[k] = out[k]!;
    },
  };
}

const cell = (
  name: string,
  model: SampleModel,
  from_mv: number,
  capacitance_pf: number,
  access_mohm: number,
  steps: readonly number[],
): Cell => ({
  name,
  model: asBenchModel(model, from_mv),
  capacitance_pf,
  electrode: { access_mohm, pipette_pf: 0.9 },
  steps,
  onset_s: 0.2,
  end_s: 0.45,
  seconds: 0.55,
  spikes: true,
});

export const untunedCells = (): Cell[] => [
  cell('bursting', corticalCell(bursting2008), -85, 290, 10, [150, 400]),
  cell('low threshold', corticalCell(lowThreshold2008), -85, 290, 12, [150, 400]),
  cell(
    'cold regular spiking',
    corticalCell({ ...regularSpiking2008, g_na: 38, g_k: 6, gate_shift_mv: -60, phi: 0.45 }),
    -70,
    180,
    15,
    [400, 800],
  ),
  cell(
    'interneuron, more potassium',
    fastSpikingInterneuron({ ...interneuron1996, g_na: 45, g_k: 13 }),
    -64,
    45,
    18,
    [60, 200],
  ),
  cell('axon, 12 °C', squidAxon({ ...squid1952, g_na: 100, g_k: 30, temperature_c: 12 }), -65, 120, 5, [1500, 3000]),
];

export function trials(options: TrialOptions): Trial[] {
  const wanted = options.quick
    ? ['20 kHz, filter 8 kHz', '50 kHz, filter 20 kHz, 0.02 mV', '10 kHz, filter 4 kHz']
    : null;
  return untunedCells().flatMap((one) => {
    if (!isWanted(options, one.name)) return [];
    const clean = cleanSweeps(one);
    return conditions
      .filter(({ name }) => wanted?.includes(name) ?? true)
      .flatMap((under) =>
        Array.from({ length: options.seeds }, (_, k) => [...trialsOf(one, clean, under, k + 1)])
          .flat()
          .filter(({ family }) => family === 'spikes')
          .map((trial) => ({ ...trial, family: 'untuned spikes' })),
      );
  });
}

export const subjectNames = (): string[] => untunedCells().map(({ name }) => name);
