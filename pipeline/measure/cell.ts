import { beatReadings } from './cell-beats.ts';
import { gradientReadings } from './cell-gradients.ts';
import { accessReadings, passiveReadings, vOnI } from './cell-passive.ts';
import { firingReadings, rateOnI, referenceSpikeOf, spikeReadings, trainReadings } from './cell-spikes.ts';
import { driftReading, qualityReadings, restingReadings, rundownReadings } from './cell-trends.ts';
import { quantitiesOf } from './quantities.ts';
import { absent, measured } from './reading.ts';
import type { CellContext, CellMeasure, ConditionMeasure, NumberedSweep, Reading, Readings } from './types.ts';

/**
 * The quantities of a cell, apart for each condition it was recorded under, in the order in which the conditions first
 * occur. Every quantity of a cell comes with a value (with n, spread and where to look, where it has them) or with the
 * reason why there is none.
 *
 * @param sweeps measured sweeps in order, potentials already in the reading that is to be reported
 * @param context what is known of each condition
 */
export function measureCell(
  sweeps: readonly NumberedSweep[],
  context: (condition: string) => CellContext,
): CellMeasure {
  const conditions = [...new Set(sweeps.map((sweep) => sweep.condition))];
  return {
    conditions: conditions.map((condition) =>
      measureCondition(
        condition,
        sweeps.filter((sweep) => sweep.condition === condition),
        context(condition),
      ),
    ),
  };
}

function measureCondition(condition: string, sweeps: NumberedSweep[], context: CellContext): ConditionMeasure {
  const clamped = sweeps.filter((sweep) => sweep.clamp === 'current');
  const vi = vOnI(clamped);
  const fi = rateOnI(clamped);
  const passive = passiveReadings(clamped, context.filter_khz);
  const reference = referenceSpikeOf(clamped);
  const readings: Readings = {
    ...qualityReadings(sweeps),
    ...restingReadings(clamped, context),
    ...passive,
    ...accessReadings(sweeps, passive['bridge_error_mohm']!, context),
    ...firingReadings(clamped, fi),
    ...spikeReadings(clamped, reference, context),
    ...beatReadings(clamped),
    ...trainReadings(clamped),
    drift_mv_per_min: driftReading(clamped, context),
    ...rundownReadings(clamped),
    minutes_since_break_in: minutesSinceBreakIn(sweeps, context),
  };
  return {
    condition,
    sweeps: sweeps.map((sweep) => sweep.sweep),
    readings: complete({ ...readings, ...gradientReadings(sweeps, readings, context) }, clamped.length > 0),
    vi,
    fi,
    reference_spike: reference && { sweep: reference.sweep, spike: reference.spike.spike },
  };
}

const cellQuantities = quantitiesOf('cell');

/** In the registry's order. A cell without current clamp has none of its quantities, whatever the reason above. */
function complete(readings: Readings, hasCurrentClamp: boolean): Readings {
  return Object.fromEntries(
    cellQuantities.map(({ id, clamp }): [string, Reading] => {
      const found = readings[id];
      if (!hasCurrentClamp && clamp === 'current' && (found?.value ?? null) === null)
        return [id, absent('not-this-clamp')];
      return [id, found ?? absent('not-this-clamp')];
    }),
  );
}

function minutesSinceBreakIn(sweeps: readonly NumberedSweep[], context: CellContext): Reading {
  const first = sweeps[0];
  const missing = [
    ...(context.break_in_to_start_s === null ? ['break_in'] : []),
    ...(first?.since_start_s == null ? ['time'] : []),
  ];
  if (!first || missing.length > 0) return absent('fact-missing', { missing });
  return measured((context.break_in_to_start_s! + first.since_start_s!) / 60, { at: { sweep: first.sweep } });
}
