/** Traces of models through the whole of a sweep's measuring, for the tests against values computed apart. */
import { expect } from 'vitest';
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import type { MeasureContext, Spike, SweepMeasure } from '../../pipeline/measure/types.ts';
import type { Trace } from '../helpers/models.ts';
import { input, neuron } from '../measure/made.ts';

/** pF of the cell that a density in µA/cm² (1 µF/cm²) is injected into. */
export const pf = 100;

export function measure(trace: Trace, context: Partial<MeasureContext> = {}, capacitance = pf): SweepMeasure {
  const signal = (samples: Float64Array) => ({ samples, rate_hz: trace.rateHz, start_s: 0 });
  return measureSweep(
    input({ voltage: signal(trace.mv), current: signal(trace.drive.map((density) => density * capacitance)) }),
    { ...neuron, ...context },
  );
}

export function numberOf(spike: Spike | undefined, id: string): number {
  const value = spike?.values[id] ?? null;
  if (value === null) throw new Error(`${id}: ${spike?.why[id] ?? 'no spike'}`);
  return value;
}

/** Fails with what it was, what it should be and how near. */
export function near(found: number, expected: number, within: number, what: string): void {
  if (!(Math.abs(found - expected) <= within)) expect(`${what} ${found}`).toBe(`${what} ${expected} ± ${within}`);
}
