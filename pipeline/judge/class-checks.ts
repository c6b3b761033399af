/** One number against the range of its cell class, moved to the cell's temperature and junction state. */
import { type ClassRange, classRanges, shippedClass } from './class-ranges.ts';
import { combined, junctionReadings, largestJunctionMv, measuredUncertainty, offsetUncertaintyMv } from './compare.ts';
import { isAbsolutePotential, labelOf } from './quantity-words.ts';
import { celsius, span } from './sentences.ts';
import { type Answer, isPresent, type Setting, unheld, unheldReading } from './setting.ts';
import type { Circumstances } from './types.ts';

/** A range is moved by no more than this, °C (DESIGN 7). */
export const farthestMoveC = 15;

type Moved = { ok: true; low: number | null; high: number | null } | { ok: false; why: string; missing: string[] };

/**
 * Range at the cell's temperature: t(T) = t₀·Q10^(−(T − T₀)/10) for times, the inverse for rates, taken over the whole
 * span of source temperatures and of Q10, so that it can only widen. Potentials and sizes stay.
 * @param celsiusNow the cell's temperature, null where not stated
 */
export function moveRange(range: ClassRange, celsiusNow: number | null): Moved {
  const { low, high, q10 } = range;
  if (q10 === 'none') return { ok: true, low, high };
  if (celsiusNow === null)
    return {
      ok: false,
      why: 'the temperature is not stated, and this quantity changes with it',
      missing: ['temperature_c'],
    };
  const [coldest, warmest] = range.temperature_c;
  if (celsiusNow < coldest - farthestMoveC || celsiusNow > warmest + farthestMoveC)
    return {
      ok: false,
      why: `published values are from ${celsius(coldest)}${warmest === coldest ? '' : ` to ${celsius(warmest)}`}, too far from ${celsius(celsiusNow)} to be moved there`,
      missing: [],
    };
  const clamped = (source: number): number =>
    Math.min(Math.max(source, celsiusNow - farthestMoveC), celsiusNow + farthestMoveC);
  const sign = q10 === 'time' ? -1 : 1;
  const factors = [clamped(coldest), clamped(warmest)].flatMap((source) =>
    range.q10_range.map((value) => value ** ((sign * (celsiusNow - source)) / 10)),
  );
  const smallest = Math.min(...factors);
  const largest = Math.max(...factors);
  // A negative rate (the fall) grows away from zero.
  const scaledLow = low === null ? null : low * (low < 0 ? largest : smallest);
  const scaledHigh = high === null ? null : high * (high < 0 ? smallest : largest);
  return { ok: true, low: scaledLow, high: scaledHigh };
}

/**
 * Widening for the junction potential, so that like is compared with like: downwards where the cell's number may be
 * corrected and the published ones not, upwards where it is the other way round.
 */
export function junctionWidening(
  range: Pick<ClassRange, 'reading'>,
  cell: Pick<Circumstances, 'reading' | 'junction'>,
): { low: number; high: number } {
  const cellMayBeCorrected = cell.reading === 'corrected' || cell.junction !== 'uncorrected';
  const cellMayBeRecorded = cell.reading === 'recorded';
  const rangeMayBeRecorded = range.reading !== 'corrected';
  const rangeMayBeCorrected = range.reading !== 'recorded';
  return {
    low: cellMayBeCorrected && rangeMayBeRecorded ? largestJunctionMv : 0,
    high: cellMayBeRecorded && rangeMayBeCorrected ? largestJunctionMv : 0,
  };
}

/**
 * The answer of a class for one quantity; null where the class has no range for it or is `any` by choice.
 * Where no class is stated at all, a number that was measured says so.
 */
export function askClass(setting: Setting, quantityId: string): Answer | null {
  const { circumstances } = setting;
  const reading = setting.measure.readings[quantityId];
  const subject = `the ${labelOf(quantityId)}`;
  const info = classRanges[shippedClass(circumstances.like)];
  const range = info.ranges[quantityId];
  if (circumstances.class_id === null && circumstances.like === 'any')
    return isPresent(reading) ? unheld(subject, 'no cell class is stated', ['class']) : null;
  if (!range) return null;
  if (!isPresent(reading)) return unheldReading(subject, reading);
  const moved = moveRange(range, circumstances.temperature_c);
  if (!moved.ok) return unheld(subject, moved.why, moved.missing);
  const absolute = isAbsolutePotential(quantityId);
  const widening = absolute ? junctionWidening(range, circumstances) : { low: 0, high: 0 };
  const low = moved.low === null ? null : moved.low - widening.low;
  const high = moved.high === null ? null : moved.high + widening.high;
  const where = range.q10 === 'none' ? '' : ` at ${celsius(circumstances.temperature_c!)}`;
  const label = circumstances.class_label ?? info.label;
  const name = `the range for the class ${label} (${span(quantityId, low, high)}${where})`;
  return {
    kind: 'held',
    reading,
    low,
    high,
    // A reading as recorded has no correction that could be off, and the range is widened for the one it lacks.
    uncertainty: absolute
      ? combined(
          measuredUncertainty(reading),
          offsetUncertaintyMv,
          circumstances.reading === 'corrected' ? junctionReadings(circumstances).uncertainty_mv : 0,
        )
      : measuredUncertainty(reading),
    shifts: [0],
    subject,
    lowName: name,
    highName: name,
    meaning: 'published cells of this class lie inside it',
    source: range.source,
  };
}
