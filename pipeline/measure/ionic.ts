/** Net ionic current at its largest in each direction, and the charge it carries, of one spike. */
import { withCapacitance } from './phases.ts';
import type { AbsenceCode, Phase, PhaseName, Spike } from './types.ts';

/** Capacitance of the cell, pF, and its 95 % half-width; null where unknown, the half-width also where it is stated. */
export interface KnownCapacitance {
  capacitance_pf: number | null;
  capacitance_u95_pf?: number | null;
}

/** 95 % of a normal distribution. */
const z95 = 1.96;

/** What the numbers of a spike are, by the ids of the registry; ids without a value have their reason in `why`. */
export type IonicNumbers = Pick<Spike, 'values' | 'why'> & { u95: Record<string, number> };

/**
 * Net ionic current I − C·dV/dt (outward positive) at the steepest rise and at the steepest fall, where it is largest
 * inward and outward as long as the injected current is steady over the spike, whole and per pF; and the net ionic
 * charge of the rise from threshold to peak and of the fall back to threshold. dV/dt is the spike's own
 * `max_rise_v_per_s` and `max_fall_v_per_s`, noise-aware as they are; I is the mean injected current over the phase.
 * Where nothing is injected, the currents per pF need no capacitance.
 *
 * Half-widths: those of dV/dt (or of height and duration), of the mean current (1.96 standard errors) and of the
 * capacitance, as independent. A current whose interval reaches over 0 against its own direction is `unresolved`.
 */
export function ionicNumbers(spike: Spike, known: KnownCapacitance): IonicNumbers {
  const found: IonicNumbers = { values: {}, why: {}, u95: {} };
  const put = (id: string, value: number, half: number | null): void => {
    found.values[id] = value;
    if (half !== null) found.u95[id] = half;
  };
  const leave = (ids: readonly string[], why: AbsenceCode): void => {
    for (const id of ids) {
      found.values[id] = null;
      found.why[id] = why;
    }
  };
  const { capacitance_pf: pf } = known;
  const pfHalf = known.capacitance_u95_pf ?? 0;
  for (const { way, phase: name, slope, length } of directions) {
    const ids = {
      current: `peak_${way}_current_pa`,
      density: `peak_${way}_current_pa_per_pf`,
      charge: `${name}_charge_pc`,
    };
    const phase = spike.phases.find((one) => one.name === name);
    const injected = injectedOver(phase);
    const rate = spike.values[slope] ?? null;
    const why: AbsenceCode | null =
      rate === null
        ? (spike.why[slope] ?? 'unresolved')
        : injected === null
          ? phase
            ? 'no-current'
            : 'unresolved'
          : null;
    if (why !== null || rate === null || injected === null) leave([ids.current, ids.density], why ?? 'unresolved');
    else if (pf === null && injected.pa !== 0) leave([ids.current, ids.density], 'fact-missing');
    else {
      const rateHalf = spike.u95?.[slope] ?? null;
      // pF · V/s = pA, and pA/pF = V/s.
      const density = (pf === null ? 0 : injected.pa / pf) - rate;
      const densityHalf =
        rateHalf === null
          ? null
          : Math.hypot(
              rateHalf,
              pf === null ? 0 : (z95 * injected.se) / pf,
              pf === null ? 0 : (injected.pa * pfHalf) / pf ** 2,
            );
      // Inward is negative on the rise, outward positive on the fall; anything else is not this spike's own current.
      const resolved = (way === 'inward' ? -density : density) > (densityHalf ?? 0);
      if (!resolved) leave([ids.current, ids.density], 'unresolved');
      else {
        put(ids.density, density, densityHalf);
        if (pf === null) leave([ids.current], 'fact-missing');
        else
          put(
            ids.current,
            density * pf,
            rateHalf === null ? null : Math.hypot(pf * rateHalf, z95 * injected.se, rate * pfHalf),
          );
      }
    }

    const height = spike.values['spike_height_mv'] ?? null;
    const ms = spike.values[length] ?? null;
    if (height === null) leave([ids.charge], spike.why['spike_height_mv'] ?? 'unresolved');
    else if (ms === null) leave([ids.charge], spike.why[length] ?? 'unresolved');
    else if (injected === null) leave([ids.charge], phase ? 'no-current' : 'unresolved');
    else if (pf === null) leave([ids.charge], 'fact-missing');
    else {
      const change = way === 'inward' ? height : -height;
      const heightHalf = spike.u95?.['spike_height_mv'];
      // pA · ms and pF · mV are fC.
      put(
        ids.charge,
        (injected.pa * ms - pf * change) / 1000,
        heightHalf === undefined
          ? null
          : Math.hypot(
              pf * heightHalf,
              height * pfHalf,
              z95 * injected.se * ms,
              injected.pa * (spike.u95?.[length] ?? 0),
            ) / 1000,
      );
    }
  }
  return found;
}

const directions = [
  { way: 'inward', phase: 'depolarization', slope: 'max_rise_v_per_s', length: 'depolarization_ms' },
  { way: 'outward', phase: 'repolarization', slope: 'max_fall_v_per_s', length: 'repolarization_ms' },
] as const satisfies readonly { way: string; phase: PhaseName; slope: string; length: string }[];

/** Ids that `ionicNumbers` gives. */
export const ionicIds: readonly string[] = directions.flatMap(({ way, phase }) => [
  `peak_${way}_current_pa`,
  `peak_${way}_current_pa_per_pf`,
  `${phase}_charge_pc`,
]);

const injectedOver = (phase: Phase | undefined): { pa: number; se: number } | null =>
  phase?.basis ? { pa: phase.basis.pa, se: phase.basis.se } : null;

/** The spike with its ionic numbers and the signs of its phases as this capacitance gives them. */
export function withIonic(spike: Spike, known: KnownCapacitance): Spike {
  const { values, why, u95 } = ionicNumbers(spike, known);
  const kept = <T>(record: Record<string, T>): Record<string, T> =>
    Object.fromEntries(Object.entries(record).filter(([id]) => !ionicIds.includes(id)));
  const halves = { ...kept(spike.u95 ?? {}), ...u95 };
  return {
    ...spike,
    values: { ...kept(spike.values), ...values },
    why: { ...kept(spike.why), ...why },
    ...(Object.keys(halves).length > 0 ? { u95: halves } : {}),
    phases: spike.phases.map((phase) => withCapacitance(phase, known.capacitance_pf, known.capacitance_u95_pf ?? 0)),
  };
}
