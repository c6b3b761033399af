/** Time constants from the averaged onset of hyperpolarizing steps. */
import { type ExponentialSum, type ExponentialTerm, exponentialSum, tauError } from '../signal/exponentials.ts';
import { mean, median } from '../signal/statistics.ts';
import { type Point, stepPa, uncertaintyOver, withoutHyperpolarizing } from './cell-numbers.ts';
import { backToEdge, electrodeLimit_ms, secondTermF } from './edge.ts';
import { filterAtEdge } from './passive.ts';
import { absent, combinedError, errorOf, measured } from './reading.ts';
import type { NumberedSweep, Reading } from './types.ts';

/** Responses up to this deflection, mV, count as small; sag up to this share of it counts as none. */
const smallDeflection_mv = 10;
const largestSag = 0.12;
/** Sag up to this share leaves the whole of the response to be fitted; beyond it only the rise up to 90 %. */
const slightSag = 0.02;

export interface Response {
  sweep: NumberedSweep;
  /** ms after onset and change from the level before it, per pA of the step (mV/pA). */
  ms: number[];
  perPa: number[];
  /** Standard error of the level before onset, per pA. */
  beforePerPa_se: number;
  /** Steady and largest deflection per pA, and the share of the largest that is gone by the end. */
  steadyPerPa: number;
  largestPerPa: number;
  sag: number;
}

/** A sweep's response to its step, per pA; null where nothing was kept of it. */
export function responseOf(sweep: NumberedSweep): Response | null {
  if (!sweep.step_response) return null;
  const { start_s, rate_hz, mv } = sweep.step_response;
  const pa = stepPa(sweep)!;
  const ms = mv.map((_, k) => (start_s + k / rate_hz - sweep.stimulus.onset_s!) * 1000);
  const lead = mv.filter((_, k) => ms[k]! < 0);
  const baseline = sweep.readings['baseline_mv'];
  // Right before the onset the level is that of the moment; a short lead is no better than the whole baseline.
  const before = lead.length >= 10 ? mean(lead)! : (baseline?.value ?? null);
  if (before === null) return null;
  const spread =
    lead.length >= 10
      ? uncertaintyOver(
          lead,
          lead.map(() => null),
          'mean',
        ).se!
      : (baseline?.se ?? 0);
  const steady = sweep.readings['steady_deflection_mv']?.value ?? null;
  const largest = sweep.readings['largest_deflection_mv']?.value ?? null;
  const from = ms.findIndex((time) => time >= 0);
  if (from < 0) return null;
  return {
    sweep,
    ms: ms.slice(from),
    perPa: mv.slice(from).map((level) => (level - before) / pa),
    beforePerPa_se: spread / Math.abs(pa),
    steadyPerPa: (steady ?? 0) / pa,
    largestPerPa: Math.max((steady ?? 0) / pa, largest === null ? 0 : largest / pa),
    sag: steady === null || largest === null || largest >= 0 ? 0 : Math.max(0, (largest - steady) / largest),
  };
}

/**
 * Mean of responses, each counting by the square of its current (noise per pA falls with it), on the time grid of the
 * first, as far as all of them reach.
 */
export function averaged(responses: readonly Response[]): Response {
  const first = responses[0]!;
  const squares = responses.map(({ sweep }) => stepPa(sweep)! ** 2);
  const all = squares.reduce((sum, value) => sum + value, 0);
  const shares = squares.map((value) => value / all);
  const over = (pick: (one: Response) => number): number =>
    responses.reduce((sum, one, j) => sum + shares[j]! * pick(one), 0);
  const perPa: number[] = [];
  for (const time of first.ms) {
    const values = responses.map((one) => interpolated(one, time));
    if (values.some((value) => value === null)) break;
    perPa.push(values.reduce<number>((sum, value, j) => sum + shares[j]! * value!, 0));
  }
  return {
    ...first,
    perPa,
    ms: first.ms.slice(0, perPa.length),
    beforePerPa_se: Math.hypot(...responses.map((one, j) => shares[j]! * one.beforePerPa_se)),
    steadyPerPa: over((one) => one.steadyPerPa),
    largestPerPa: over((one) => one.largestPerPa),
  };
}

function interpolated({ ms, perPa }: Response, time: number): number | null {
  const spacing = ms[1]! - ms[0]!;
  const position = (time - ms[0]!) / spacing;
  const below = Math.floor(position + 1e-9);
  if (below < 0) return perPa[0]!;
  if (below >= perPa.length - 1) return below === perPa.length - 1 ? perPa[below]! : null;
  return perPa[below]! + (perPa[below + 1]! - perPa[below]!) * (position - below);
}

type Constants = Record<'membrane_time_constant_ms' | 'slow_time_constant_ms' | 'fast_time_constant_ms', Reading>;

/**
 * Time constants of the averaged onset of small hyperpolarizing steps: one exponential, or, where two describe it
 * better, the slow one of two as the membrane's (Rall 1969) and both beside it.
 */
export function timeConstants(
  sweeps: readonly NumberedSweep[],
  down: readonly Point[],
  filter_khz: number | null,
): Constants {
  const every = (reading: Reading): Constants => ({
    membrane_time_constant_ms: reading,
    slow_time_constant_ms: reading,
    fast_time_constant_ms: reading,
  });
  if (down.length === 0) return every(withoutHyperpolarizing(sweeps));
  const usable = down.filter(({ sweep, value }) => sweep.step_response !== null && value < -0.3);
  const small = usable.filter(({ value }) => value >= -smallDeflection_mv);
  const least = usable.reduce<Point | null>((best, one) => (!best || one.value > best.value ? one : best), null);
  const chosen = small.length > 0 ? small : least && least.value >= -2.5 * smallDeflection_mv ? [least] : [];
  if (chosen.length === 0)
    return every(
      absent(
        usable.length === 0 ? 'unresolved' : 'no-hyperpolarizing-steps',
        usable.length === 0 ? {} : { note: 'no step deflects by 25 mV or less' },
      ),
    );
  const responses = chosen.flatMap((point) => responseOf(point.sweep) ?? []);
  if (responses.length === 0) return every(absent('unresolved'));
  // Sag is judged over all steps of 3 mV or more: slow noise makes or hides some of it in a single one.
  const large = usable.filter(({ sweep }) => (sweep.readings['largest_deflection_mv']?.value ?? 0) <= -3);
  const share = median((large.length > 0 ? large : chosen).map((point) => responseOf(point.sweep)?.sag ?? 0))!;
  if (share > largestSag)
    return every(
      absent('sag-or-resonance', { note: `${Math.round(share * 100)} % of the deflection is gone by the end` }),
    );
  const together = averaged(responses);
  const whole = share <= slightSag;
  const filter = filterAtEdge(filter_khz);
  const electrode_ms = backToEdge(together.ms, together.perPa, { ...filter, windows_ms: [100, 30] })?.electrode_ms ?? 0;
  const from_ms = Math.max(0.7, filter.from_ms, 6 * electrode_ms);
  const one = single(together, from_ms, whole);
  const two = whole ? double(together, from_ms) : null;
  if (!one && !two) return every(absent('fit-failed'));
  const place = {
    n: responses.length,
    at: {
      sweep: chosen[0]!.sweep.sweep,
      from_s: chosen[0]!.sweep.stimulus.onset_s!,
      to_s: chosen[0]!.sweep.stimulus.onset_s! + (two ? together.ms.at(-1)! : one!.to_ms) / 1000,
    },
  };
  const notes = small.length === 0 ? [`from the smallest step, ${(-chosen[0]!.value).toFixed(0)} mV`] : [];
  if (two) {
    const [slow, fast] = two.terms as [ExponentialTerm, ExponentialTerm];
    const reading = (term: number, tau: number, note: string[]): Reading =>
      measured(tau, {
        ...place,
        se: tauError(two, term),
        freedom: two.freedom,
        ...(note.length > 0 ? { note: note.join('; ') } : {}),
      });
    const parts = `${Math.round((100 * fast.amplitude) / (slow.amplitude + fast.amplitude))} % of the response is fast, ${fast.tau.toFixed(1)} ms`;
    return {
      membrane_time_constant_ms: reading(0, slow.tau, [...notes, `the slow one of two: ${parts}`]),
      slow_time_constant_ms: reading(0, slow.tau, notes),
      fast_time_constant_ms: reading(1, fast.tau, notes),
    };
  }
  const alone = responses.flatMap((response) => single(response, from_ms, whole) ?? []);
  // Sag that the rise up to 90 % already holds shortens or lengthens it by up to its own share.
  const bent = whole ? 0 : (share / 2) * one!.tau;
  const scatter =
    alone.length >= 3
      ? uncertaintyOver(
          alone.map((fit) => fit.tau),
          // Each alone is as uncertain as its own fit says.
          alone.map((fit) => fit.se),
          'mean',
        )
      : null;
  const spread =
    scatter?.se !== undefined && scatter.se > 1.5 * one!.se ? errorOf(scatter) : { se: one!.se, freedom: one!.freedom };
  const none = absent('unresolved', { note: 'one exponential describes the onset as well' });
  return {
    membrane_time_constant_ms: measured(one!.tau, {
      ...place,
      ...(scatter?.sd === undefined ? {} : { sd: scatter.sd }),
      ...combinedError([spread, { se: bent }]),
      ...(notes.length > 0 ? { note: notes.join('; ') } : {}),
    }),
    slow_time_constant_ms: none,
    fast_time_constant_ms: none,
  };
}

interface Single {
  tau: number;
  se: number;
  freedom: number;
  to_ms: number;
}

/** From 10 % of the steady deflection, to its end or to 90 %. */
function single(response: Response, from_ms: number, whole: boolean): Single | null {
  const { ms, perPa, steadyPerPa } = response;
  const reached = (share: number, start: number): number => {
    for (let k = start; k < perPa.length; k++) if (perPa[k]! >= share * steadyPerPa) return k;
    return -1;
  };
  const settled = ms.findIndex((time) => time >= from_ms);
  const from = settled < 0 ? -1 : reached(0.1, settled);
  const to = from < 0 ? -1 : whole ? perPa.length - 1 : reached(0.9, from);
  if (from < 0 || to - from < 6) return null;
  const x = ms.slice(from, to + 1);
  const y = perPa.slice(from, to + 1);
  const span = x.at(-1)! - x[0]!;
  const fit = exponentialSum(x, y, { slow: [0.3, 20 * span] });
  if (!fit?.converged) return null;
  const se = tauError(fit, 0);
  return Number.isFinite(se) && se < fit.terms[0]!.tau
    ? { tau: fit.terms[0]!.tau, se, freedom: fit.freedom, to_ms: x.at(-1)! }
    : null;
}

/** A fast part below this share of the response is not told from noise. */
const leastShare = 0.03;

/** Two exponentials of one sign over the whole of the response, where they describe it better than one. */
function double(response: Response, from_ms: number): ExponentialSum | null {
  const start = response.ms.findIndex((time) => time >= from_ms);
  if (start < 0) return null;
  const x = response.ms.slice(start);
  const y = response.perPa.slice(start);
  const span = x.at(-1)! - x[0]!;
  const one = exponentialSum(x, y, { slow: [0.3, 5 * span] });
  const two = exponentialSum(x, y, { slow: [2, 2 * span], fast: [0.3, span / 3] });
  if (!one || !two?.converged) return null;
  const [slow, fast] = two.terms as [ExponentialTerm, ExponentialTerm];
  const f = (one.rss - two.rss) / 2 / ((two.rss / (two.n - 5)) * two.correlation);
  const share = fast.amplitude / (slow.amplitude + fast.amplitude);
  const resolved = tauError(two, 0) < 0.3 * slow.tau && tauError(two, 1) < 0.5 * fast.tau;
  return f > secondTermF &&
    fast.tau > electrodeLimit_ms &&
    slow.tau > 2 * fast.tau &&
    share > leastShare &&
    share < 1 &&
    resolved
    ? two
    : null;
}
