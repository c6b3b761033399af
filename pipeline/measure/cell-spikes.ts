import { coverage95 } from '../signal/coverage.ts';
import { linearFit } from '../signal/line.ts';
import { mean, median } from '../signal/statistics.ts';
import {
  chiSquareShare,
  commonReason,
  longSteps,
  medianCosts,
  medianOver,
  type Point,
  placeOf,
  pointsOf,
  spreadOf,
  stepLength_s,
  stepPa,
  stimulusReason,
  uncertaintyOver,
} from './cell-numbers.ts';
import { spikesDuring } from './firing.ts';
import { ionicIds } from './ionic.ts';
import { quantitiesOf } from './quantities.ts';
import { absent, measured } from './reading.ts';
import { slowOnly } from './slow-spikes.ts';
import type { AbsenceCode, CellContext, NumberedSweep, RatePoint, Reading, Readings, Spike } from './types.ts';

/** Rate on current for every step long enough to have a rate. */
export function rateOnI(sweeps: readonly NumberedSweep[]): RatePoint[] {
  return ratePoints(sweeps).map(({ sweep, value }) => ({ sweep: sweep.sweep, pa: stepPa(sweep)!, hz: value }));
}

const ratePoints = (sweeps: readonly NumberedSweep[]): Point[] => pointsOf(longSteps(sweeps), 'mean_rate_hz');

const fires = (sweep: NumberedSweep): boolean => spikesDuring(sweep.spikes, sweep.stimulus).length > 0;

/** Sweeps in which a depolarizing step made the cell fire, weakest step first, then in order of time. */
function firingSteps(sweeps: readonly NumberedSweep[]): NumberedSweep[] {
  return longSteps(sweeps)
    .filter((sweep) => stepPa(sweep)! > 0 && fires(sweep))
    .sort((a, b) => stepPa(a)! - stepPa(b)! || a.sweep - b.sweep);
}

/** Three spikes without a stimulus, and at least one in five seconds, make a cell that fires by itself. */
function ownFiring(sweeps: readonly NumberedSweep[]): {
  spikes: number;
  seconds: number;
  minima: number[];
  own: boolean;
} {
  const known = sweeps.flatMap((sweep) => (sweep.spontaneous ? [sweep.spontaneous] : []));
  const spikes = known.reduce((sum, one) => sum + one.spikes, 0);
  const seconds = known.reduce((sum, one) => sum + one.seconds, 0);
  const own = spikes >= 3 && seconds > 0 && spikes / seconds >= 0.2;
  return { spikes, seconds, minima: known.flatMap((one) => one.minima_mv), own };
}

/** Rheobase, gain, largest rate, latency, and firing without a stimulus. */
export function firingReadings(sweeps: readonly NumberedSweep[], fi: readonly RatePoint[]): Readings {
  const firing = firingSteps(sweeps);
  const own = ownFiring(sweeps);
  const rheobase = rheobaseOf(sweeps, firing, own.own);
  const first = firing[0];
  const steps = sweeps.filter((sweep) => stepPa(sweep) !== null);
  const whyNone: AbsenceCode = steps.length === 0 ? stimulusReason(sweeps) : 'never-fired';
  const total = sweeps.reduce((sum, sweep) => sum + sweep.spikes.length, 0);
  return {
    spikes: sweeps.length === 0 ? absent('not-this-clamp') : measured(total, { n: sweeps.length }),
    rheobase_pa: rheobase,
    rate_gain_hz_per_na: first ? gain(fi, stepPa(first)!, stepLength_s(first)) : absent(whyNone),
    max_rate_hz: largestRate(sweeps, whyNone),
    first_spike_latency_ms: first ? latencyAt(first) : absent(whyNone),
    spontaneous_rate_hz: spontaneousRate(sweeps, own),
    maximum_diastolic_potential_mv: diastolic(sweeps, own),
  };
}

function rheobaseOf(sweeps: readonly NumberedSweep[], firing: readonly NumberedSweep[], own: boolean): Reading {
  const first = firing[0];
  const tried = longSteps(sweeps).filter((sweep) => stepPa(sweep)! > 0);
  const answered = longSteps(sweeps).filter(
    (sweep) => stepPa(sweep)! < 0 && stepLength_s(sweep) <= 0.02 && fires(sweep),
  );
  if (!first && answered.length > 0)
    return absent('unresolved', { note: 'spikes follow brief negative pulses: the sign of the current may be turned' });
  if (!first) return absent(tried.length > 0 || longSteps(sweeps).length > 0 ? 'never-fired' : stimulusReason(sweeps));
  if (own) return absent('unresolved', { note: 'the cell fires without a stimulus' });
  const value = stepPa(first)!;
  // A recorded step is never twice the very same: within 1 % it is the same step.
  const below = Math.max(0, ...tried.map((sweep) => stepPa(sweep)!).filter((pa) => pa < 0.99 * value));
  const brief = stepLength_s(first) < 0.1 ? `, steps of ${(stepLength_s(first) * 1000).toPrecision(3)} ms` : '';
  return measured(value, {
    n: tried.length,
    // The true one lies anywhere between the last step that failed and this one.
    se: (value - below) / Math.sqrt(12),
    u95: 0.95 * (value - below),
    at: { sweep: first.sweep, from_s: first.stimulus.onset_s!, to_s: first.stimulus.end_s! },
    note: `${below > 0 ? `${Number(below.toPrecision(4))} pA did not fire it` : 'the smallest step tried'}${brief}`,
  });
}

/** Slope from rheobase to half the largest rate, repeats averaged; the next point is taken in where two are too few. */
function gain(fi: readonly RatePoint[], rheobase: number, length_s: number): Reading {
  const rounded = (pa: number): number => Number(pa.toPrecision(6));
  const levels = [...Map.groupBy(fi, (point) => rounded(point.pa))]
    .map(([pa, points]) => ({ pa, hz: mean(points.map((point) => point.hz))!, sweep: points[0]!.sweep }))
    .sort((a, b) => a.pa - b.pa);
  const largest = levels.reduce((best, one) => (one.hz > best.hz ? one : best), { pa: 0, hz: 0, sweep: -1 });
  const rising = levels.filter((one) => one.pa >= rounded(rheobase) && one.pa <= largest.pa);
  const lower = rising.filter((one) => one.hz <= largest.hz / 2);
  const chosen = lower.length >= 3 ? lower : rising.slice(0, Math.max(2, lower.length + 1));
  const fit = linearFit(
    chosen.map((one) => one.pa),
    chosen.map((one) => one.hz),
  );
  if (!fit) return absent('too-few-points');
  // A count over a step of T is a rate to within half of 1/T either way, whatever the line's scatter shows.
  const middle = mean(chosen.map((one) => one.pa))!;
  const squares = chosen.reduce((sum, one) => sum + (one.pa - middle) ** 2, 0);
  const counted = 1 / (length_s * Math.sqrt(12 * squares));
  const scattered = fit.se_slope ?? 0;
  const se = scattered > counted ? { se: scattered * 1000, freedom: fit.n - 2 } : { se: counted * 1000 };
  return measured(fit.slope * 1000, {
    n: fit.n,
    ...se,
    at: { sweep: chosen.at(-1)!.sweep },
    note: `from ${chosen[0]!.pa.toFixed(0)} to ${chosen.at(-1)!.pa.toFixed(0)} pA`,
  });
}

function largestRate(sweeps: readonly NumberedSweep[], whyNone: AbsenceCode): Reading {
  const points = ratePoints(sweeps);
  if (points.length === 0) return absent(whyNone === 'never-fired' ? 'sweep-too-short' : whyNone);
  const largest = points.reduce((best, one) => (one.value > best.value ? one : best));
  if (largest.value === 0) return absent('never-fired');
  return measured(largest.value, {
    n: points.length,
    at: placeOf(largest),
    note: `at ${stepPa(largest.sweep)!.toFixed(0)} pA`,
  });
}

function latencyAt(sweep: NumberedSweep): Reading {
  const reading = sweep.readings['first_spike_latency_ms'];
  if (!reading || reading.value === null) return absent(reading?.why ?? 'unresolved');
  return measured(reading.value, {
    n: 1,
    ...(reading.u95 === undefined ? {} : { u95: reading.u95 }),
    at: placeOf({ sweep, reading }),
  });
}

function spontaneousRate(sweeps: readonly NumberedSweep[], own: ReturnType<typeof ownFiring>): Reading {
  if (own.seconds === 0)
    return absent(sweeps.some((sweep) => sweep.stimulus.kind === 'unknown') ? 'no-stimulus' : 'sweep-too-short');
  if (!own.own) return withoutOwnFiring(own);
  const value = own.spikes / own.seconds;
  return measured(value, { n: own.spikes, se: Math.sqrt(own.spikes) / own.seconds });
}

/** One or two spikes in a recording that is only so long do not say that a cell rests, nor how often it fires. */
function withoutOwnFiring(own: ReturnType<typeof ownFiring>): Reading {
  const few = own.spikes > 0 && own.spikes < 3 && own.spikes / own.seconds >= 0.2;
  return absent(few ? 'too-few-spikes' : 'not-spontaneous', {
    note: `${own.spikes} spikes in ${own.seconds.toFixed(1)} s`,
  });
}

function diastolic(sweeps: readonly NumberedSweep[], own: ReturnType<typeof ownFiring>): Reading {
  if (own.seconds === 0) return spontaneousRate(sweeps, own);
  if (!own.own) return withoutOwnFiring(own);
  const value = median(own.minima);
  if (value === null) return absent('too-few-spikes');
  const where = sweeps.find((sweep) => (sweep.spontaneous?.minima_mv.length ?? 0) > 0);
  return measured(value, {
    ...uncertaintyOver(
      own.minima,
      own.minima.map(() => null),
    ),
    ...(where ? { at: { sweep: where.sweep } } : {}),
  });
}

export interface Reference {
  sweep: number;
  spike: Spike;
  /** Spikes whose median stands for the cell where no step made it fire; just the one at rheobase otherwise. */
  pool: { sweep: NumberedSweep; spike: Spike }[];
  atRheobase: boolean;
}

/** A spike is complete when it has a threshold, a peak and a width. */
const completeness = (spike: Spike): number =>
  ['threshold_mv', 'peak_mv', 'half_width_ms', 'ahp_minimum_mv', 'apd90_ms'].filter(
    (id) => (spike.values[id] ?? null) !== null,
  ).length;

/**
 * The spike that stands for the cell: the first in the weakest step that fired it. Where no step did, spikes that
 * came by themselves or were paced all count, and of those on ramps and other stimuli the first of each sweep: their
 * medians stand for the cell, and the most complete spike nearest the median height is the one shown.
 */
export function referenceSpikeOf(sweeps: readonly NumberedSweep[]): Reference | null {
  const first = firingSteps(sweeps)[0];
  if (first) {
    const spike = spikesDuring(first.spikes, first.stimulus)[0]!;
    return { sweep: first.sweep, spike, pool: [{ sweep: first, spike }], atRheobase: true };
  }
  const pool = sweeps.flatMap((sweep) => {
    const every = ['none', 'pulse train'].includes(sweep.stimulus.kind) || sweep.stimulus.from === 'absent';
    const own = every || stepPa(sweep) !== null ? sweep.spikes : spikesDuring(sweep.spikes, sweep.stimulus).slice(0, 1);
    return own.map((spike) => ({ sweep, spike }));
  });
  if (pool.length === 0) return null;
  const best = Math.max(...pool.map(({ spike }) => completeness(spike)));
  const complete = pool.filter(({ spike }) => completeness(spike) === best);
  const peaks = complete.map(({ spike }) => spike.values['peak_mv'] ?? Number.NaN);
  const middle = median(peaks) ?? 0;
  const shown = complete.reduce((nearest, one) =>
    Math.abs((one.spike.values['peak_mv'] ?? 1e9) - middle) <
    Math.abs((nearest.spike.values['peak_mv'] ?? 1e9) - middle)
      ? one
      : nearest,
  );
  return { sweep: shown.sweep.sweep, spike: shown.spike, pool, atRheobase: false };
}

const spikeIds = quantitiesOf('spike').flatMap((entry) => (entry.levels.includes('cell') ? [entry.id] : []));

/** The quantities of a spike at the level of the cell; cycle length and samples on the rise over all spikes. */
export function spikeReadings(
  sweeps: readonly NumberedSweep[],
  reference: Reference | null,
  context: CellContext,
): Readings {
  const all = sweeps.flatMap((sweep) => sweep.spikes.map((spike) => ({ sweep, spike })));
  const needs: Record<string, string[]> = {
    sodium_headroom_mv: context.missing_for_e_na,
    potassium_margin_mv: context.missing_for_e_k,
    minimum_charge_pc: ['capacitance_pf'],
    minimum_ions_millions: ['capacitance_pf'],
    ...Object.fromEntries(ionicIds.map((id) => [id, ['capacitance_pf']])),
  };
  const readings = Object.fromEntries(
    spikeIds.map((id) => {
      const reading = spikeReading(id, reference, sweeps);
      if (!needs[id] || reading.value !== null) return [id, reading];
      // Spikes that have not been held against the solutions yet say nothing of these.
      const unsaid = reference !== null && !(id in reference.spike.values);
      return [id, unsaid || reading.why === 'fact-missing' ? absent('fact-missing', { missing: needs[id] }) : reading];
    }),
  );
  if (all.length === 0) return readings;
  readings['cycle_length_ms'] = over(all, 'cycle_length_ms', (values) => median(values)!);
  readings['rise_samples'] = over(all, 'rise_samples', (values) => values.reduce((least, one) => Math.min(least, one)));
  return readings;
}

function spikeReading(id: string, reference: Reference | null, sweeps: readonly NumberedSweep[]): Reading {
  if (!reference)
    return absent(
      sweeps.length > 0 && sweeps.every((one) => one.readings['spikes']?.value === null)
        ? (sweeps[0]!.readings['spikes']!.why ?? 'no-spikes')
        : 'no-spikes',
    );
  if (reference.atRheobase) {
    const value = reference.spike.values[id] ?? null;
    if (value === null) return absent(reference.spike.why[id] ?? whyLeftOut(id, reference.spike));
    return measured(value, {
      n: 1,
      ...widthOf(reference.spike, id),
      at: placeOfSpike(reference.sweep, reference.spike),
    });
  }
  return over(reference.pool, id, (values) => median(values)!, `median of spikes; no step made the cell fire`);
}

const whyLeftOut = (id: string, spike: Spike): AbsenceCode =>
  !(id in spike.values) && slowOnly.includes(id) ? 'not-this-class' : 'unresolved';

const widthOf = (spike: Spike, id: string): Pick<Reading, 'u95'> =>
  spike.u95?.[id] === undefined ? {} : { u95: spike.u95[id] };

function placeOfSpike(sweep: number, spike: Spike): NonNullable<Reading['at']> {
  const from_s = spike.values['threshold_at_s'] ?? spike.values['peak_at_s'] ?? null;
  return { sweep, spike: spike.spike, ...(from_s === null ? {} : { from_s }) };
}

function over(
  pool: readonly { sweep: NumberedSweep; spike: Spike }[],
  id: string,
  summary: (values: number[]) => number,
  note?: string,
): Reading {
  const held = pool.flatMap(({ sweep, spike }) => {
    const value = spike.values[id] ?? null;
    return value === null ? [] : [{ sweep, spike, value }];
  });
  if (held.length === 0) {
    const reasons = pool.flatMap(({ spike }) => spike.why[id] ?? []);
    return absent(reasons[0] ?? (pool[0] ? whyLeftOut(id, pool[0].spike) : 'unresolved'));
  }
  const values = held.map((one) => one.value);
  const value = summary(values);
  const nearest = held.reduce((best, one) => (Math.abs(one.value - value) < Math.abs(best.value - value) ? one : best));
  return measured(value, {
    ...spreadOf(values),
    ...pooledWidth(
      values,
      held.flatMap(({ spike }) => spike.u95?.[id] ?? []),
      usualScatter(id, value),
    ),
    at: placeOfSpike(nearest.sweep.sweep, nearest.spike),
    ...(note ? { note } : {}),
  });
}

/** Response to brief pulses, doublets, bursts and spikelets of all sweeps, and the largest instantaneous rate of any. */
export function trainReadings(sweeps: readonly NumberedSweep[]): Readings {
  const total = (id: string): Reading => {
    const points = pointsOf(sweeps, id);
    if (points.length === 0) return commonReason(sweeps, id, 'not-this-clamp');
    const most = points.reduce((best, one) => (one.value > best.value ? one : best));
    return measured(
      points.reduce((sum, one) => sum + one.value, 0),
      { n: points.length, ...(most.value > 0 ? { at: placeOf(most) } : {}) },
    );
  };
  const rates = pointsOf(sweeps, 'largest_instantaneous_rate_hz');
  const fastest = rates.length === 0 ? null : rates.reduce((best, one) => (one.value > best.value ? one : best));
  return {
    pulse_response_mohm: medianOver(
      pointsOf(sweeps, 'pulse_response_mohm'),
      commonReason(sweeps, 'pulse_response_mohm', 'not-this-clamp'),
    ),
    doublets: total('doublets'),
    bursts: total('bursts'),
    spikelets: total('spikelets'),
    largest_instantaneous_rate_hz: fastest
      ? measured(fastest.value, {
          n: rates.length,
          ...(fastest.reading.se === undefined ? {} : { se: fastest.reading.se }),
          at: placeOf(fastest),
        })
      : commonReason(sweeps, 'largest_instantaneous_rate_hz', 'not-this-clamp'),
  };
}

/**
 * Scatter from spike to spike that a cell in a steady state does not usually exceed: 4 % of a duration, 10 % of a rate of
 * change, 2 mV of a potential. Published for 26 stem-cell heart cells: SD of APD90 2.7 % (eight of ten 1.7 to 5.6 %), of
 * the maximum rise 5.6 % (1.9 to 15 %); source in test/truth/published-beats.test.ts. Potentials: common practice, no
 * source. Nothing is usual of a cycle length: cells that fire by themselves differ tenfold. Null where nothing is.
 */
function usualScatter(id: string, value: number): number | null {
  if (id === 'cycle_length_ms') return null;
  if (id.endsWith('_ms')) return 0.04 * Math.abs(value);
  if (id.endsWith('_v_per_s')) return 0.1 * Math.abs(value);
  return id.endsWith('_mv') ? 2 : null;
}

/** What the usual scatter counts for against the one found: as much as so many degrees of freedom. Ours. */
const usualFreedom = 4;

/**
 * Half-width of a median over spikes: their spread over √n by Student's t; where that is narrower, and the spread is none
 * that the usual one makes unlikely, both variances pooled, so that two beats do not get a factor of 12.7; and in
 * quadrature the middle one of their own half-widths, because filter and interpolation do to all of them alike.
 * @param usual scatter that is not usually exceeded; null where nothing is known of it
 */
export function pooledWidth(
  values: readonly number[],
  own: readonly number[],
  usual: number | null,
): Pick<Reading, 'u95'> {
  const { n, sd } = spreadOf(values);
  const shared = median(own);
  if (sd === undefined || n === undefined) return shared === null ? {} : { u95: shared };
  const alone = coverage95(n - 1) * sd;
  const pooled = (scatter: number): number => {
    const freedom = n - 1 + usualFreedom;
    return coverage95(freedom) * Math.sqrt(((n - 1) * sd * sd + usualFreedom * scatter * scatter) / freedom);
  };
  const likely = usual !== null && sd * sd <= usual * usual * chiSquareShare(n - 1);
  const width = likely ? Math.min(alone, pooled(usual)) : alone;
  return { u95: Math.hypot((medianCosts(n) * width) / Math.sqrt(n), shared ?? 0) };
}
