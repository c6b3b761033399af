import type { MeasureContext, Signal } from '../../pipeline/measure/types.ts';

/** A signal made from a formula of time in seconds; the first sample is at 0. */
export function signalOf(seconds: number, rateHz: number, formula: (t: number) => number): Signal {
  const samples = Float64Array.from({ length: Math.round(seconds * rateHz) }, (_, i) => formula(i / rateHz));
  return { samples, rate_hz: rateHz, start_s: 0 };
}

/** Uniform numbers in (0, 1) that are the same in every run. */
export function uniform(seed: number): () => number {
  let state = seed >>> 0;
  return () => {
    state = (state + 0x6d2b79f5) >>> 0;
    let t = state;
    t = Math.imul(t ^ (t >>> 15), t | 1);
    t ^= t + Math.imul(t ^ (t >>> 7), t | 61);
    return (((t ^ (t >>> 14)) >>> 0) + 0.5) / 4294967296;
  };
}

/** Standard normal numbers, the same in every run. */
export function normalNoise(seed: number): () => number {
  const next = uniform(seed);
  return () => Math.sqrt(-2 * Math.log(next())) * Math.cos(2 * Math.PI * next());
}

export const neuron: MeasureContext = {
  rise_criterion_v_per_s: 20,
  prominence_mv: 20,
  ahp_window_ms: 60,
  slow: false,
  filter_khz: null,
  mains_hz: 50,
  capacitance_pf: null,
};

export const heart: MeasureContext = {
  ...neuron,
  rise_criterion_v_per_s: null,
  ahp_window_ms: 1000,
  slow: true,
};
