/** The four phases of a spike and the sign of the net ionic current in each. */
import type { Phase, PhaseName, Signal, Stimulus } from './types.ts';

/** Moments of one spike, s from the start of the sweep; null where not found. */
export interface SpikeMoments {
  threshold_s: number | null;
  peak_s: number;
  /** Back at the threshold potential. */
  return_s: number | null;
  /** Lowest potential of the afterhyperpolarization. */
  minimum_s: number | null;
  /** Next threshold, next stimulus edge, end of the class's window or end of the samples, whichever comes first. */
  end_s: number;
}

/** The injected current as far as it is known. */
export interface Injected {
  /** Mean total injected current between two times, pA, with its standard error; null where it is not known. */
  mean(from_s: number, to_s: number): { pa: number; se: number } | null;
}

/**
 * What is known of the injected current: the recorded channel; else a stated step on zero holding; else nothing. A
 * stimulus stated as `none` is zero current.
 */
export function injectedCurrent(current: Signal | null, stimulus: Stimulus): Injected {
  if (current) {
    const { samples, rate_hz: rate, start_s: start } = current;
    return {
      mean(from_s, to_s) {
        const first = Math.max(0, Math.floor((from_s - start) * rate));
        const last = Math.min(samples.length - 1, Math.max(first, Math.ceil((to_s - start) * rate)));
        let sum = 0;
        let squares = 0;
        let count = 0;
        for (let i = first; i <= last; i++) {
          const value = samples[i]!;
          if (!Number.isFinite(value)) continue;
          sum += value;
          squares += value * value;
          count++;
        }
        if (count === 0) return null;
        const pa = sum / count;
        return { pa, se: count > 1 ? Math.sqrt(Math.max(0, squares / count - pa * pa) / count) : 0 };
      },
    };
  }
  if (stimulus.from !== 'stated') return { mean: () => null };
  const { onset_s: onset, end_s: end, kind } = stimulus;
  const holding = stimulus.holding ?? 0;
  if (kind === 'none') return { mean: () => ({ pa: holding, se: 0 }) };
  if (kind !== 'step' || onset === null || end === null || stimulus.amplitude === null) return { mean: () => null };
  const amplitude = stimulus.amplitude;
  return {
    mean(from_s, to_s) {
      const length = to_s - from_s;
      const within = Math.max(0, Math.min(to_s, end) - Math.max(from_s, onset));
      const share = length > 0 ? within / length : from_s >= onset && from_s < end ? 1 : 0;
      return { pa: holding + amplitude * share, se: 0 };
    },
  };
}

/** 99 % of a normal distribution lies within so many standard deviations. */
const clearOfNoise = 2.58;

/**
 * Sign of the mean net ionic current I − C·dV/dt between two times: outward +1, inward −1, 0 where noise or missing
 * knowledge leaves it open. The mean of dV/dt over a phase is its whole change of potential over its length, so only
 * the noise of the two end points counts, beside that of the mean current and of the capacitance: the current must
 * differ from 0 by 2.58 of their standard deviations, so that noise alone gives a sign in at most one of 100 phases that
 * have none. Without a capacitance the sign is still certain where the current is zero or where both terms have the
 * same sign.
 * @param capacitance_u95_pf 95 % half-width of the capacitance, pF
 */
export function netIonicSign(
  change: { mv: number; ms: number; noise_mv: number },
  injected: { pa: number; se: number } | null,
  capacitance_pf: number | null,
  capacitance_u95_pf = 0,
): -1 | 0 | 1 {
  if (!injected || !(change.ms > 0)) return 0;
  // Of the difference of two readings.
  const doubt = clearOfNoise * Math.SQRT2 * change.noise_mv;
  if (capacitance_pf !== null) {
    // pF · mV/ms = pA.
    const net = injected.pa - (capacitance_pf * change.mv) / change.ms;
    const fromSize = ((clearOfNoise / 1.96) * capacitance_u95_pf * change.mv) / change.ms;
    const limit = Math.hypot(clearOfNoise * injected.se, (capacitance_pf * doubt) / change.ms, fromSize);
    return Math.abs(net) > limit ? (Math.sign(net) as -1 | 1) : 0;
  }
  const fromMembrane = Math.abs(change.mv) > doubt ? -Math.sign(change.mv) : 0;
  const fromCurrent = Math.abs(injected.pa) > clearOfNoise * injected.se ? Math.sign(injected.pa) : 0;
  if (fromCurrent === 0 || fromCurrent === fromMembrane) return (fromMembrane || 0) as -1 | 0 | 1;
  return 0;
}

/**
 * Phases of one spike: depolarization (threshold to peak), repolarization (peak to back at threshold),
 * afterhyperpolarization (from there to the lowest point), recovery (from the lowest point to the end). A spike that
 * does not come back to threshold repolarizes until its lowest point and has no afterhyperpolarization; phases whose
 * limits were not found, or that have no length, are left out.
 * @param potentialAt potential, mV, at a time; null where unreadable. @param noise_mv standard deviation of one reading
 */
export function phasesOf(
  moments: SpikeMoments,
  potentialAt: (time_s: number) => number | null,
  noise_mv: number,
  injected: Injected,
  capacitance_pf: number | null,
): Phase[] {
  const { threshold_s: threshold, peak_s: peak, return_s: back, minimum_s: minimum, end_s: end } = moments;
  const spans: [PhaseName, number | null, number | null][] = [
    ['depolarization', threshold, peak],
    ['repolarization', peak, back ?? minimum],
    ['afterhyperpolarization', back, minimum],
    ['recovery', minimum, end],
  ];
  return spans.flatMap(([name, from, to]) => {
    if (from === null || to === null || !(to > from)) return [];
    const before = potentialAt(from);
    const after = potentialAt(to);
    const current = injected.mean(from, to);
    if (before === null || after === null || current === null)
      return [{ name, from_s: from, to_s: to, net_ionic_sign: 0 }];
    const phase: Phase = {
      name,
      from_s: from,
      to_s: to,
      net_ionic_sign: 0,
      basis: { mv: after - before, noise_mv, pa: current.pa, se: current.se },
    };
    return [withCapacitance(phase, capacitance_pf)];
  });
}

/** The phase with the sign of its net ionic current as this capacitance, pF, gives it; null where none is known. */
export function withCapacitance(phase: Phase, capacitance_pf: number | null, capacitance_u95_pf = 0): Phase {
  const { basis } = phase;
  if (!basis) return phase;
  const change = { mv: basis.mv, ms: (phase.to_s - phase.from_s) * 1000, noise_mv: basis.noise_mv };
  return { ...phase, net_ionic_sign: netIonicSign(change, basis, capacitance_pf, capacitance_u95_pf) };
}
