/** What counts as a spike, by cell class. */
import type { MeasureContext } from './types.ts';

export type SpikeCriteria = Pick<MeasureContext, 'rise_criterion_v_per_s' | 'prominence_mv' | 'ahp_window_ms' | 'slow'>;

/** 20 V/s, 20 mV, 60 ms: DESIGN 5, after Bean 2007, Nat Rev Neurosci 8:451–465 (from memory). */
const neuron: SpikeCriteria = { rise_criterion_v_per_s: 20, prominence_mv: 20, ahp_window_ms: 60, slow: false };

/**
 * Slow classes: threshold at 5 % of the spike's own maximum rise. All numbers: common practice, no source, chosen so
 * that the afterhyperpolarization window (here: where the diastolic minimum may lie) spans a whole cycle.
 */
const slow = (prominence_mv: number, ahp_window_ms: number): SpikeCriteria => ({
  rise_criterion_v_per_s: null,
  prominence_mv,
  ahp_window_ms,
  slow: true,
});

const byClass: Readonly<Record<string, SpikeCriteria>> = {
  'cortical-pyramidal': neuron,
  'hippocampal-pyramidal': neuron,
  'fast-spiking-interneuron': neuron,
  'somatostatin-interneuron': neuron,
  purkinje: neuron,
  // Broad spikes from a slow approach; afterhyperpolarizations of 100 ms and more between paced spikes.
  'midbrain-dopaminergic': { ...neuron, rise_criterion_v_per_s: 10, ahp_window_ms: 200 },
  'sensory-neuron-small': { ...neuron, rise_criterion_v_per_s: 10, ahp_window_ms: 200 },
  'sensory-neuron-large': neuron,
  // Afterhyperpolarization of motoneurons: 25 to 200 ms.
  motoneuron: { ...neuron, ahp_window_ms: 200 },
  // Immature sodium channel density: spikes that rise at 10 to 50 V/s are common.
  'stem-cell-neuron': { ...neuron, rise_criterion_v_per_s: 10, ahp_window_ms: 100 },
  'ventricular-myocyte': slow(40, 2000),
  'stem-cell-cardiomyocyte': slow(30, 3000),
  'sinoatrial-node': slow(20, 1000),
  'skeletal-muscle': neuron,
  'squid-axon': neuron,
  chromaffin: { ...neuron, rise_criterion_v_per_s: 10, ahp_window_ms: 200 },
  any: neuron,
};

/** Class ids that bring criteria of their own. */
export const classesWithCriteria: readonly string[] = Object.keys(byClass);

/** Calcium spikes of non-spiking muscle and neurons: tens of milliseconds wide, often below 20 mV high. */
const calcium: SpikeCriteria = slow(8, 200);

/**
 * Criteria of a shipped class; those of `any` for a class that is not shipped. Where the spikes are stated to be
 * carried by calcium and the class is not a slow one already, those of calcium spikes.
 * @param like shipped class id. @param spikeIon the fact `spike_ion`, where stated
 */
export function spikeCriteria(like: string, spikeIon: 'sodium' | 'calcium' | 'mixed' | null = null): SpikeCriteria {
  const held = Object.hasOwn(byClass, like) ? byClass[like]! : neuron;
  return spikeIon === 'calcium' && !held.slow ? calcium : held;
}
