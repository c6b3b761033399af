/** Holding a number against limits. Pure arithmetic; every check goes through here. */
import type { Reading } from '../measure/types.ts';
import { computedJunctionUncertaintyMv } from '../membrane/junction.ts';
import type { Circumstances, Outcome } from './types.ts';

export interface Comparison {
  outcome: Exclude<Outcome, 'not measured'>;
  /** Distance to the nearest limit, negative when beyond it. */
  margin: number;
  /** Which limit is the nearest. */
  side: 'low' | 'high';
  /** mV added to the number in the reading compared; 0 as given. */
  shift: number;
  /** Several readings were compared and did not agree. */
  disagree: boolean;
}

/**
 * One number against one or two limits. `outside` when it lies beyond a limit by more than the uncertainty, `near
 * limit` when it lies nearer to a limit than the uncertainty, on either side of it, else `within`.
 * @param value in the quantity's unit, finite
 * @param low lower limit or null; @param high upper limit or null; at least one is a number
 * @param uncertainty 95 % half-width of value and limit combined, not negative
 * @throws RangeError when there is no limit at all: such a check could not fail
 */
export function compare(value: number, low: number | null, high: number | null, uncertainty: number): Comparison {
  if (low === null && high === null) throw new RangeError('a comparison needs a lower or an upper limit, got neither');
  const aboveLow = low === null ? Number.POSITIVE_INFINITY : value - low;
  const belowHigh = high === null ? Number.POSITIVE_INFINITY : high - value;
  const side = aboveLow <= belowHigh ? 'low' : 'high';
  const margin = Math.min(aboveLow, belowHigh);
  const outcome = margin < -uncertainty ? 'outside' : margin < uncertainty ? 'near limit' : 'within';
  return { outcome, margin, side, shift: 0, disagree: false };
}

/**
 * The same number under several readings of the junction potential: outside only when outside under every reading,
 * within only when within under every one. The comparison returned is that of the reading that speaks most for the cell.
 * @param shifts mV added to the value for each reading, 0 among them
 */
export function compareReadings(
  value: number,
  shifts: readonly number[],
  low: number | null,
  high: number | null,
  uncertainty: number,
): Comparison {
  const all = shifts.map((shift) => ({ ...compare(value + shift, low, high, uncertainty), shift }));
  const kindest = all.reduce((best, one) => (one.margin > best.margin ? one : best));
  if (all.every((one) => one.outcome === kindest.outcome)) return kindest;
  return { ...kindest, outcome: 'near limit', disagree: true };
}

/** 95 % half-width of a measured number, in its unit, as measuring gave it; 0 where the reading carries none. */
export const measuredUncertainty = (reading: Reading): number => reading.u95 ?? 0;

/** Root of the sum of squares: independent half-widths combined. */
export const combined = (...halfWidths: number[]): number => Math.hypot(...halfWidths);

/** Electrode and amplifier offset left after zeroing in the bath, mV (DESIGN: ±2 mV). */
export const offsetUncertaintyMv = 2;
/** 95 % half-width of a junction potential that is stated, mV (DESIGN: ±1 mV). */
export const statedJunctionUncertaintyMv = 1;
/** Largest junction potential of the pipette solutions in common use, mV: K-gluconate in saline, +12 to +16 mV. */
export const largestJunctionMv = 16;
/** No physical limit is held tighter than this, mV. */
export const physicsFloorMv = 3;

/** Readings of an absolute potential that the facts allow, and how well the junction potential is known. */
export interface JunctionReadings {
  /** mV to add to the number as given for each reading. */
  shifts: readonly number[];
  uncertainty_mv: number;
}

/**
 * Where the numbers are corrected there is one reading. Where they stand as recorded (junction unstated, or left in by
 * an amount nobody stated and no recipe gives) both the recorded and the corrected one are possible.
 */
export function junctionReadings(
  circumstances: Pick<Circumstances, 'reading' | 'ljp_mv' | 'ljp_from' | 'ljp_uncertainty_mv'>,
): JunctionReadings {
  const uncertainty_mv =
    circumstances.ljp_uncertainty_mv ??
    (circumstances.ljp_from === 'stated' ? statedJunctionUncertaintyMv : computedJunctionUncertaintyMv);
  if (circumstances.reading === 'corrected') return { shifts: [0], uncertainty_mv };
  return { shifts: [0, -(circumstances.ljp_mv ?? largestJunctionMv)], uncertainty_mv };
}
