import { linearFit, theilSen } from '../signal/line.ts';
import { mean, median } from '../signal/statistics.ts';
import {
  commonReason,
  longSteps,
  medianOver,
  type Point,
  placeOf,
  pointsOf,
  stepPa,
  stimulusReason,
} from './cell-numbers.ts';
import { spikesDuring } from './firing.ts';
import { quantizationError } from './passive.ts';
import { absent, combinedError, errorOf, measured } from './reading.ts';
import type { CellContext, NumberedSweep, Reading, Readings } from './types.ts';

/** Baseline, noise, hum and what the recorder did, over all sweeps of the condition. */
export function qualityReadings(sweeps: readonly NumberedSweep[]): Readings {
  const clamped = sweeps.filter((sweep) => sweep.clamp === 'current');
  const over = (id: string, from: readonly NumberedSweep[]): Reading =>
    medianOver(pointsOf(from, id), commonReason(from, id, 'not-this-clamp'));
  return {
    ...Object.fromEntries(
      [
        'baseline_mv',
        'baseline_sd_mv',
        'baseline_drift_mv_per_s',
        'noise_rms_mv',
        'filter_corner_khz',
        'mains_hum_mv',
        'mains_hum_hz',
        'quantum_mv',
      ].map((id) => [id, over(id, clamped)]),
    ),
    clipped_fraction: share(sweeps, 'clipped_fraction'),
    missing_fraction: share(sweeps, 'missing_fraction'),
    sample_interval_us: longestInterval(sweeps),
  };
}

/** Share over all samples of all sweeps; `at` is the sweep with the largest share. */
function share(sweeps: readonly NumberedSweep[], id: string): Reading {
  const points = pointsOf(sweeps, id);
  if (points.length === 0) return commonReason(sweeps, id, 'no-voltage');
  const samples = ({ sweep }: Point): number => sweep.duration_s / (sweep.readings['sample_interval_us']?.value ?? 1);
  const all = points.reduce((sum, point) => sum + samples(point), 0);
  const value =
    all > 0
      ? points.reduce((sum, point) => sum + point.value * samples(point), 0) / all
      : mean(points.map((point) => point.value))!;
  const worst = points.reduce((best, one) => (one.value > best.value ? one : best));
  return measured(value, { n: points.length, at: placeOf(worst) });
}

/** The longest interval of all sweeps: what the coarsest of them could resolve. */
function longestInterval(sweeps: readonly NumberedSweep[]): Reading {
  const points = pointsOf(sweeps, 'sample_interval_us');
  if (points.length === 0) return commonReason(sweeps, 'sample_interval_us', 'no-voltage');
  const longest = points.reduce((best, one) => (one.value > best.value ? one : best));
  const rates = new Set(points.map((point) => point.value.toPrecision(6))).size;
  return measured(longest.value, {
    n: points.length,
    at: placeOf(longest),
    ...(rates > 1 ? { note: `the longest of ${rates} different intervals` } : {}),
  });
}

/**
 * Current before the stimulus with the bias, pA: the sweep's own bias where the file states one, else the stated one,
 * else none.
 */
export function totalHoldingPa(sweep: NumberedSweep, context: CellContext): number | null {
  const holding = sweep.readings['holding_pa']?.value ?? null;
  if (holding === null) return null;
  return sweep.bias_pa == null ? holding + (context.bias_pa ?? 0) : holding;
}

/** Below this, pA, a command counts as zero whatever its noise. */
const zeroCurrent_pa = 1;

/** Resting potential: median baseline of the sweeps without any injected current. */
export function restingReadings(sweeps: readonly NumberedSweep[], context: CellContext): Readings {
  const points = pointsOf(sweeps, 'baseline_mv');
  const known = points.filter(({ sweep }) => totalHoldingPa(sweep, context) !== null);
  const free = known.filter(({ sweep }) => {
    // The median of a noisy current is known far better than its samples, but its zero is not.
    const noise = Math.min(sweep.readings['holding_pa']?.sd ?? 0, 10);
    return Math.abs(totalHoldingPa(sweep, context)!) <= Math.max(zeroCurrent_pa, noise);
  });
  const none =
    points.length === 0
      ? commonReason(sweeps, 'baseline_mv', 'no-voltage')
      : known.length === 0
        ? absent('holding-unknown')
        : absent('holding-not-zero');
  const notes = [
    ...(free.length > 0 && free.every(({ sweep }) => sweep.stimulus.from === 'stated')
      ? ['the stated stimulus is taken to say all current']
      : []),
    // A cell that fires by itself never rests: beside this stands its maximum diastolic potential.
    ...(free.some(({ reading }) => reading.note?.includes('between spikes')) ? ['read between spikes'] : []),
  ];
  const over = medianOver(free, none, notes.join('; ') || undefined);
  if (over.value === null || over.se === undefined) return { resting_potential_mv: over };
  // The digitizer rounds all sweeps alike: averaging does not help.
  const rounding = Math.max(
    ...free.map(({ sweep, reading }) => quantizationError(sweep.readings['quantum_mv']?.value ?? 0, reading.sd ?? 0)),
  );
  const error = combinedError([errorOf(over), { se: rounding }]);
  const { u95: _, freedom: __, ...kept } = over;
  return { resting_potential_mv: measured(over.value, { ...kept, ...error }) };
}

/** Slope of the baseline on time, among the sweeps held at the same current as most. */
export function driftReading(sweeps: readonly NumberedSweep[], context: CellContext): Reading {
  const all = pointsOf(sweeps, 'baseline_mv');
  if (all.length === 0) return commonReason(sweeps, 'baseline_mv', 'no-voltage');
  if (all.every(({ sweep }) => sweep.since_start_s === null)) return absent('fact-missing', { missing: ['time'] });
  const timed = all.filter(({ sweep }) => sweep.since_start_s !== null);
  const holding = timed.map(({ sweep }) => totalHoldingPa(sweep, context));
  const usual = median(holding.filter((pa) => pa !== null));
  const same = timed.filter((_, k) =>
    usual === null ? true : holding[k] !== null && Math.abs(holding[k]! - usual) <= Math.max(2, 0.05 * Math.abs(usual)),
  );
  const minutes = same.map(({ sweep }) => sweep.since_start_s! / 60);
  const span = Math.max(...minutes) - Math.min(...minutes);
  if (same.length < 4) return absent('too-few-sweeps');
  if (span < 0.25) return absent('sweep-too-short', { note: `the sweeps span ${(span * 60).toFixed(0)} s` });
  const fit = theilSen(
    minutes,
    same.map((point) => point.value),
  );
  if (!fit) return absent('too-few-sweeps');
  return measured(fit.slope, {
    n: fit.n,
    ...(fit.se_slope === null ? {} : { se: fit.se_slope }),
    at: placeOf(same.at(-1)!),
    note: `over ${span.toPrecision(2)} min`,
  });
}

/** Brief pulses drive a cell whichever sign their current was stored with, s. */
const briefest_s = 0.02;

/** Sweeps with a stimulus to fire on: depolarizing steps, trains of pulses, and brief pulses of either sign. */
function drivenSweeps(sweeps: readonly NumberedSweep[]): { sweep: NumberedSweep; pa: number }[] {
  const steps = longSteps(sweeps).flatMap((sweep) => {
    const pa = stepPa(sweep)!;
    const brief = (sweep.stimulus.end_s ?? 0) - (sweep.stimulus.onset_s ?? 0) <= briefest_s;
    return pa > 0 || brief ? [{ sweep, pa: Math.abs(pa) }] : [];
  });
  const trains = sweeps.flatMap((sweep) => {
    const { kind, amplitude } = sweep.stimulus;
    return kind === 'pulse train' && amplitude !== null ? [{ sweep, pa: Math.abs(amplitude) }] : [];
  });
  return [...steps, ...trains].sort((a, b) => a.sweep.sweep - b.sweep.sweep);
}

/** Height of the first spike of each step or train of pulses: against spikes fired before, and against the stimulus. */
export function rundownReadings(sweeps: readonly NumberedSweep[]): Readings {
  let fired = 0;
  const before = new Map(
    sweeps.map((sweep) => {
      const count = fired;
      fired += sweep.spikes.length;
      return [sweep, count] as const;
    }),
  );
  const stimulated = drivenSweeps(sweeps);
  const firsts = stimulated.flatMap(({ sweep, pa }) => {
    const height = spikesDuring(sweep.spikes, sweep.stimulus)[0]?.values['spike_height_mv'] ?? null;
    return height !== null ? [{ pa, height, sweep, fired: before.get(sweep)! }] : [];
  });
  if (firsts.length === 0) {
    const none = absent(
      stimulated.length === 0 && longSteps(sweeps).length === 0 ? stimulusReason(sweeps) : 'never-fired',
    );
    return { height_rundown_percent_per_100_spikes: none, height_stimulus_slope_mv_per_na: none };
  }
  return {
    height_rundown_percent_per_100_spikes: rundown(firsts),
    height_stimulus_slope_mv_per_na: slopeOnStimulus(firsts),
  };
}

interface First {
  pa: number;
  height: number;
  sweep: NumberedSweep;
  fired: number;
}

/** Steps within 1 pA or 2 % of each other are the same step. */
function matched(firsts: readonly First[]): First[][] {
  const groups: First[][] = [];
  for (const one of firsts.toSorted((a, b) => a.pa - b.pa || a.sweep.sweep - b.sweep.sweep)) {
    const last = groups.at(-1);
    if (last && one.pa - last[0]!.pa <= Math.max(1, 0.02 * last[0]!.pa)) last.push(one);
    else groups.push([one]);
  }
  return groups;
}

function rundown(firsts: readonly First[]): Reading {
  const groups = matched(firsts).filter((group) => group.length >= 2);
  const within = groups.flatMap((group) => {
    const fired = mean(group.map((one) => one.fired))!;
    const height = mean(group.map((one) => one.height))!;
    return group.map((one) => ({ x: one.fired - fired, y: one.height - height, one }));
  });
  const freedom = within.length - groups.length - 1;
  const squares = within.reduce((sum, { x }) => sum + x * x, 0);
  if (freedom < 1 || !(squares > 0)) return absent('too-few-sweeps', { note: 'no stimulus was repeated often enough' });
  const slope = within.reduce((sum, { x, y }) => sum + x * y, 0) / squares;
  const residual = Math.sqrt(within.reduce((sum, { x, y }) => sum + (y - slope * x) ** 2, 0) / freedom);
  const percent = (10000 / mean(within.map(({ one }) => one.height))!) as number;
  return measured(slope * percent, {
    n: within.length,
    se: Math.abs((residual / Math.sqrt(squares)) * percent),
    freedom,
    at: { sweep: within.at(-1)!.one.sweep.sweep },
  });
}

function slopeOnStimulus(firsts: readonly First[]): Reading {
  if (matched(firsts).length < 3) return absent('too-few-points');
  const fit = linearFit(
    firsts.map((one) => one.pa),
    firsts.map((one) => one.height),
  );
  if (!fit) return absent('too-few-points');
  return measured(fit.slope * 1000, {
    n: fit.n,
    ...(fit.se_slope === null ? {} : { se: fit.se_slope * 1000, freedom: fit.n - 2 }),
  });
}
