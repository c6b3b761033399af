import { linearFit } from '../signal/line.ts';
import { mean, median } from '../signal/statistics.ts';
import {
  commonReason,
  longSteps,
  medianOver,
  ownError,
  ownFreedom,
  type Point,
  placeOf,
  pointsOf,
  scatterFreedom,
  stepPa,
  uncertaintyOver,
  withoutHyperpolarizing,
} from './cell-numbers.ts';
import { averaged, responseOf, timeConstants } from './cell-onset.ts';
import { backToEdge } from './edge.ts';
import { spikesDuring } from './firing.ts';
import { filterAtEdge } from './passive.ts';
import { absent, combinedError, errorOf, measured } from './reading.ts';
import type { CellContext, NumberedSweep, Reading, Readings, VIPoint } from './types.ts';

/** Steady potential change on current, for every step without a spike in it. */
export function vOnI(sweeps: readonly NumberedSweep[]): VIPoint[] {
  return steadyPoints(sweeps).map(({ sweep, value }) => ({ sweep: sweep.sweep, pa: stepPa(sweep)!, mv: value }));
}

const steadyPoints = (sweeps: readonly NumberedSweep[]): Point[] =>
  pointsOf(longSteps(sweeps), 'steady_deflection_mv').filter(
    ({ sweep }) => spikesDuring(sweep.spikes, sweep.stimulus).length === 0,
  );

/** Input resistance, time constants, capacitance, sag, rebound, rectification and bridge error of one condition. */
export function passiveReadings(sweeps: readonly NumberedSweep[], filter_khz: number | null): Readings {
  const down = steadyPoints(sweeps).filter(({ sweep }) => stepPa(sweep)! < 0);
  const bridge = bridgeError(sweeps, filter_khz);
  const resistance = inputResistance(sweeps, down, bridge);
  const constants = timeConstants(sweeps, down, filter_khz);
  return {
    input_resistance_mohm: resistance,
    ...constants,
    membrane_capacitance_pf: capacitance(resistance, constants.membrane_time_constant_ms),
    ...sagAndRebound(sweeps, down, bridge),
    rectification_ratio: rectification(sweeps, down, bridge),
    bridge_error_mohm: bridge,
  };
}

/** mV/pA is GΩ. */
const mohmPer = 1000;

interface Slope {
  /** mV/pA. */
  value: number;
  se: number;
  freedom?: number;
}

/**
 * Least-squares line with intercept through (I, ΔV) and (0, 0). The scatter about it holds both noise and the bend of
 * the membrane's own curve: with two degrees of freedom left beside a parabola, the scatter about that is what noise
 * does. Scatter and the points' own uncertainties are pooled as over sweeps.
 */
function slopeThrough(points: readonly Point[]): Slope | null {
  const x = [0, ...points.map(({ sweep }) => stepPa(sweep)!)];
  const y = [0, ...points.map(({ value }) => value)];
  const fit = linearFit(x, y);
  if (!fit) return null;
  const n = x.length;
  const middle = mean(x)!;
  const sxx = x.reduce((sum, value) => sum + (value - middle) ** 2, 0);
  const own = points.map(({ reading }) => ownError(reading));
  // The origin is certain; each point moves the slope by (I − mean I)/Sxx of its own error.
  const within = own.every((se) => se !== null)
    ? points.reduce((sum, { sweep }, k) => sum + ((own[k]! * (stepPa(sweep)! - middle)) / sxx) ** 2, 0)
    : null;
  const bent = bendFreeScatter(x, y);
  const scatter = bent && { variance: bent.variance / sxx, freedom: bent.freedom };
  if (within === null)
    return scatter ? { value: fit.slope, se: Math.sqrt(scatter.variance), freedom: scatter.freedom } : null;
  return { value: fit.slope, ...pooled(within, scatter, n) };
}

/** Variance of the points about their parabola; null where they are too few for one. */
function bendFreeScatter(x: readonly number[], y: readonly number[]): { variance: number; freedom: number } | null {
  const line = linearFit(x, y);
  if (!line || x.length < 4) return null;
  const fromLine = (values: readonly number[], fit: { slope: number; intercept: number }): number[] =>
    values.map((value, k) => value - fit.intercept - fit.slope * x[k]!);
  // The parabola beside the line: residuals of y on those of x² (Frisch & Waugh 1933, Econometrica 1:387–401).
  const squares = x.map((value) => value * value);
  const rest = fromLine(squares, linearFit(x, squares)!);
  const left = fromLine(y, line);
  const power = rest.reduce((sum, value) => sum + value * value, 0);
  const bend = power > 0 ? rest.reduce((sum, value, k) => sum + value * left[k]!, 0) / power : 0;
  const rss = left.reduce((sum, value, k) => sum + (value - bend * rest[k]!) ** 2, 0);
  return { variance: rss / (x.length - 3), freedom: x.length - 3 };
}

/**
 * Uncertainty of a slope from the points' own and from their scatter (both variances of the slope): pooled where the
 * scatter is no more than chance makes of the points' own (F at 95 %), else the scatter alone, as over sweeps.
 */
function pooled(
  within: number,
  scatter: { variance: number; freedom: number } | null,
  n: number,
): { se: number; freedom?: number } {
  if (!scatter) return { se: Math.sqrt(within), freedom: ownFreedom };
  const excess = 1 + 2.2 / Math.sqrt(scatter.freedom) + 1.2 / scatter.freedom;
  if (scatter.variance > excess * within)
    return { se: Math.sqrt(scatter.variance), freedom: scatter.freedom + scatterFreedom };
  const freedom = scatter.freedom + ownFreedom;
  return {
    se: Math.sqrt((scatter.freedom * scatter.variance + ownFreedom * within) / freedom),
    freedom: Math.max(freedom, n),
  };
}

function inputResistance(sweeps: readonly NumberedSweep[], down: readonly Point[], bridge: Reading): Reading {
  if (down.length === 0) return withoutHyperpolarizing(sweeps);
  const fit = slopeThrough(down);
  if (!fit) return absent('too-few-points');
  const left = bridge.value;
  // Whatever the bridge left over stands in the slope: where it is not known, neither is the uncertainty.
  const error = left === null ? {} : combinedError([{ ...fit, se: fit.se * mohmPer }, errorOf(bridge)]);
  return measured(fit.value * mohmPer - (left ?? 0), {
    n: down.length,
    ...error,
    at: placeOf(down.reduce((best, one) => (stepPa(one.sweep)! < stepPa(best.sweep)! ? one : best))),
    note:
      left === null
        ? 'holds what the bridge left over, which could not be measured'
        : `bridge error of ${left.toFixed(1)} MΩ taken off`,
  });
}

/** ms/MΩ is nF. */
function capacitance(resistance: Reading, timeConstant: Reading): Reading {
  if (timeConstant.value === null) return { ...timeConstant };
  if (resistance.value === null) return { ...resistance };
  if (!(resistance.value > 0)) return absent('unresolved');
  const value = (timeConstant.value / resistance.value) * 1000;
  const part = (reading: Reading) => ({
    ...errorOf(reading),
    se: (value * (reading.se ?? 0)) / Math.abs(reading.value!),
  });
  return measured(value, {
    n: timeConstant.n ?? 1,
    ...combinedError([part(timeConstant), part(resistance)]),
    ...(timeConstant.at ? { at: timeConstant.at } : {}),
  });
}

const sagAt_mv = 15;

/**
 * Sag and rebound of the hyperpolarizing step whose largest deflection is nearest to 15 mV; below 3 mV noise would
 * decide. What the bridge left over is in both deflections: their difference is free of it, the largest is freed.
 */
function sagAndRebound(sweeps: readonly NumberedSweep[], down: readonly Point[], bridge: Reading): Readings {
  const points = pointsOf(
    down.map(({ sweep }) => sweep),
    'largest_deflection_mv',
  );
  const every = (reading: Reading): Readings => ({
    sag_fraction: reading,
    sag_mv: reading,
    rebound_mv: reading,
    rebound_spikes: reading,
  });
  if (points.length === 0) return every(withoutHyperpolarizing(sweeps));
  const nearest = points.reduce((best, one) =>
    Math.abs(-one.value - sagAt_mv) < Math.abs(-best.value - sagAt_mv) ? one : best,
  );
  if (-nearest.value < 3) return every(absent('unresolved', { note: 'no step deflects by 3 mV' }));
  const pa = stepPa(nearest.sweep)!;
  const steady = nearest.sweep.readings['steady_deflection_mv']!;
  const base = nearest.sweep.readings['baseline_mv']?.se ?? 0;
  const own = (reading: Reading): { se: number; freedom?: number } => ({
    ...errorOf(reading),
    // Both deflections are taken from one baseline, whose error cancels in their difference.
    se: Math.sqrt(Math.max(0, (reading.se ?? 0) ** 2 - base ** 2)),
  });
  const difference = steady.value! - nearest.value;
  const error = combinedError([own(steady), own(nearest.reading)]);
  const whole = -nearest.value + ((bridge.value ?? 0) * pa) / mohmPer;
  const wholeError = Math.hypot(nearest.reading.se ?? 0, ((bridge.se ?? 0) * pa) / mohmPer);
  const extra = { n: 1, at: placeOf(nearest), note: `step of ${pa.toFixed(0)} pA, ${(-nearest.value).toFixed(1)} mV` };
  const rebound = (id: string): Reading => {
    const reading = nearest.sweep.readings[id] ?? absent('cut-off-by-sweep-end');
    return reading.value === null
      ? reading
      : {
          ...reading,
          at: { ...reading.at, sweep: nearest.sweep.sweep },
          note: [extra.note, reading.note].filter(Boolean).join('; '),
        };
  };
  const share = difference / whole;
  return {
    sag_mv: measured(difference, { ...extra, ...error }),
    sag_fraction:
      whole > 1
        ? measured(share, {
            ...extra,
            ...combinedError([{ ...error, se: error.se / whole }, { se: (share * wholeError) / whole }]),
          })
        : absent('unresolved', { note: 'the bridge error makes most of the deflection' }),
    rebound_mv: rebound('rebound_mv'),
    rebound_spikes: rebound('rebound_spikes'),
  };
}

/** The half of the steps that deflects more must reach this, mV, and deflect this much more than the other half. */
const rectifies = { from_mv: 10, apart: 1.5 };

/**
 * Slope resistance over the larger hyperpolarizations against that over the smaller: line with intercept through the
 * steps of more than half the largest deflection, over the line through (0, 0) and the others, each without the bridge.
 */
function rectification(sweeps: readonly NumberedSweep[], down: readonly Point[], bridge: Reading): Reading {
  if (down.length === 0) return withoutHyperpolarizing(sweeps);
  const deepest = Math.min(...down.map(({ value }) => value));
  if (-deepest < rectifies.from_mv)
    return absent('unresolved', { note: `no step deflects by ${rectifies.from_mv} mV` });
  const small = down.filter(({ value }) => value > 0.5 * deepest);
  const large = down.filter(({ value }) => value <= 0.5 * deepest);
  const currents = large.map(({ sweep }) => stepPa(sweep)!);
  if (
    small.length < 1 ||
    large.length < 2 ||
    Math.max(...currents) - Math.min(...currents) < 0.1 * -Math.min(...currents)
  )
    return absent('too-few-sweeps');
  const left = bridge.value ?? 0;
  const inner = smallSlope(small);
  const outer = largeSlope(large);
  const [r, R] = [inner.value * mohmPer - left, outer.value * mohmPer - left];
  if (!(r > 0)) return absent('unresolved');
  const ratio = R / r;
  const bridged = ((bridge.se ?? 0) * Math.abs(1 - ratio)) / r;
  return measured(ratio, {
    n: down.length,
    ...combinedError([
      { ...outer, se: (outer.se * mohmPer) / r },
      { ...inner, se: (inner.se * mohmPer * ratio) / r },
      { se: bridged },
    ]),
    at: placeOf(large.reduce((best, one) => (one.value < best.value ? one : best))),
    note: `${small.length} steps to ${(-Math.min(...small.map((one) => one.value))).toFixed(0)} mV, ${large.length} to ${(-deepest).toFixed(0)} mV`,
  });
}

/** Slope of the line through the origin: Σ I·ΔV / Σ I². */
function smallSlope(points: readonly Point[]): Slope {
  const squares = points.reduce((sum, { sweep }) => sum + stepPa(sweep)! ** 2, 0);
  const value = points.reduce((sum, one) => sum + one.value * stepPa(one.sweep)!, 0) / squares;
  const se =
    Math.sqrt(points.reduce((sum, { sweep, reading }) => sum + ((ownError(reading) ?? 0) * stepPa(sweep)!) ** 2, 0)) /
    squares;
  return { value, se, freedom: ownFreedom };
}

function largeSlope(points: readonly Point[]): Slope {
  const x = points.map(({ sweep }) => stepPa(sweep)!);
  const fit = linearFit(
    x,
    points.map(({ value }) => value),
  )!;
  const middle = mean(x)!;
  const sxx = x.reduce((sum, value) => sum + (value - middle) ** 2, 0);
  const within =
    points.reduce((sum, { reading }, k) => sum + ((ownError(reading) ?? 0) * (x[k]! - middle)) ** 2, 0) / sxx ** 2;
  return { value: fit.slope, se: Math.sqrt(within), freedom: ownFreedom };
}

/** Windows of the averaged response that the bridge error is read from, ms, the longest first. */
const bridgeWindows_ms = [300, 100, 30, 12];

/**
 * From the averaged onset of all hyperpolarizing steps without spikes, where the sweeps kept it; else from the jumps of
 * the single sweeps.
 */
function bridgeError(sweeps: readonly NumberedSweep[], filter_khz: number | null): Reading {
  const single = bridgeFromSweeps(sweeps);
  const kept = longSteps(sweeps).filter((sweep) => sweep.step_response !== null && (stepPa(sweep) ?? 0) < 0);
  const responses = kept.flatMap((sweep) => responseOf(sweep) ?? []);
  if (responses.length === 0) return single;
  const together = averaged(responses);
  const after = backToEdge(together.ms, together.perPa, { ...filterAtEdge(filter_khz), windows_ms: bridgeWindows_ms });
  if (!after) return single;
  // Positive: the response goes on in the direction of the current.
  if (Math.abs(after.mv) > 3 * after.se && after.rise < 0.2 * Math.abs(after.mv)) return single;
  const own = combinedError([
    { se: after.se, freedom: after.freedom },
    { se: together.beforePerPa_se, freedom: 20 },
  ]);
  const both = measured(after.mv * mohmPer, {
    n: responses.length,
    ...errorOf(own),
    se: own.se * mohmPer,
    at: { sweep: responses[0]!.sweep.sweep, from_s: responses[0]!.sweep.stimulus.onset_s! },
    note: [
      `averaged onset of ${responses.length} steps`,
      ...(after.electrode_ms === null ? [] : [`electrode charging with ${after.electrode_ms.toFixed(2)} ms left out`]),
    ].join('; '),
  });
  // Large depolarizing steps and ends of steps may say more than small onsets; the delays are common to all of them. A
  // second exponential that the average shows is lost in the noise of single sweeps, and they would be wrong by it.
  if (after.terms > 1 || single.value === null || single.n! < 3) return both;
  const shared = combinedError([errorOf(single), { se: after.lag_se * mohmPer }]);
  const { u95: _, freedom: __, ...rest } = single;
  const other = measured(single.value, { ...rest, ...shared });
  return other.u95! < 0.7 * both.u95! ? other : both;
}

/**
 * Slope through the origin of the instantaneous step on the stimulus: without current there is no jump. A membrane on
 * its way to a spike does not rise along an exponential: sweeps without spikes speak first, where there are two.
 */
function bridgeFromSweeps(sweeps: readonly NumberedSweep[]): Reading {
  const all = pointsOf(sweeps, 'bridge_step_mv').filter(({ sweep }) => Math.abs(stepPa(sweep) ?? 0) > 0);
  const quiet = all.filter(({ sweep }) => sweep.spikes.length === 0);
  // A step that makes the cell fire curves before it fires: one such edge alone cannot be told from a jump.
  const points = quiet.length >= 2 || all.length < 2 ? quiet : all;
  if (points.length === 0)
    return all.length > 0 ? absent('too-few-sweeps') : commonReason(sweeps, 'bridge_step_mv', 'no-stimulus');
  const squares = points.reduce((sum, { sweep }) => sum + stepPa(sweep)! ** 2, 0);
  const slope = points.reduce((sum, { sweep, value }) => sum + value * stepPa(sweep)!, 0) / squares;
  const within =
    points.reduce((sum, { sweep, reading }) => sum + ((ownError(reading) ?? 0) * stepPa(sweep)!) ** 2, 0) /
    squares ** 2;
  const scatter =
    points.length < 2
      ? null
      : {
          variance:
            points.reduce((sum, { sweep, value }) => sum + (value - slope * stepPa(sweep)!) ** 2, 0) /
            (points.length - 1) /
            squares,
          freedom: points.length - 1,
        };
  const largest = points.reduce((best, one) =>
    Math.abs(stepPa(one.sweep)!) > Math.abs(stepPa(best.sweep)!) ? one : best,
  );
  const error = pooled(within, scatter, points.length);
  return measured(slope * mohmPer, {
    n: points.length,
    ...error,
    se: error.se * mohmPer,
    at: placeOf(largest),
    note: 'jumps of single sweeps',
  });
}

/**
 * Access resistance: from voltage-clamp test pulses, else as stated, else the bridge in force and what it left over;
 * its change over the recording; and the other quantities of voltage clamp.
 */
export function accessReadings(sweeps: readonly NumberedSweep[], bridgeLeft: Reading, context: CellContext): Readings {
  const clamped = sweeps.filter((sweep) => sweep.clamp === 'voltage');
  const over = (id: string): Reading =>
    overSweeps(
      pointsOf(clamped, id),
      clamped.length === 0 ? absent('not-this-clamp') : commonReason(clamped, id, 'no-test-pulse'),
    );
  const pulses = pointsOf(clamped, 'access_resistance_mohm');
  // Two test pulses far apart tell more than many bridges.
  const apart = pulses.length >= 2 && pulses.at(-1)!.sweep.sweep - pulses[0]!.sweep.sweep >= 0.5 * (sweeps.length - 1);
  const bridged = pointsOf(
    sweeps.filter((sweep) => sweep.clamp === 'current'),
    'access_resistance_mohm',
  );
  return {
    access_resistance_mohm: access(sweeps, pulses, bridgeLeft, context),
    access_change_percent: accessChange(apart ? pulses : bridged, apart ? 2 : 4),
    membrane_resistance_mohm: over('membrane_resistance_mohm'),
    cell_capacitance_pf: over('cell_capacitance_pf'),
    transient_capacitance_pf: over('transient_capacitance_pf'),
    seal_resistance_gohm: over('seal_resistance_gohm'),
    escaped_currents: escaped(clamped),
    holding_current_pa: over('holding_current_pa'),
  };
}

/** Escaped action currents of all sweeps; where to look is the sweep with most. */
function escaped(clamped: readonly NumberedSweep[]): Reading {
  const points = pointsOf(clamped, 'escaped_currents');
  if (points.length === 0)
    return clamped.length === 0 ? absent('not-this-clamp') : commonReason(clamped, 'escaped_currents', 'no-voltage');
  const most = points.reduce((best, one) => (one.value > best.value ? one : best));
  const count = points.reduce((sum, point) => sum + point.value, 0);
  return measured(count, count > 0 ? { at: placeOf(most) } : {});
}

/**
 * Median over sweeps whose errors are partly the same (filter, moment of the command, pipette): the scatter is divided
 * by the number of sweeps, what the errors have in common is not.
 */
function overSweeps(points: readonly Point[], whenNone: Reading, note?: string): Reading {
  const found = medianOver(points, whenNone, note);
  if (found.value === null || points.length < 2) return found;
  const own = points.flatMap(({ reading }) => (reading.se === undefined ? [] : [reading.se ** 2]));
  const { value, u95: _u95, ...rest } = found;
  const scatter = (found.sd ?? 0) ** 2;
  const common = Math.max(0, (mean(own) ?? 0) - scatter);
  return measured(value, {
    ...rest,
    se: Math.sqrt(scatter / points.length + common),
    // Scatter known from few sweeps, common errors from the fits.
    ...(common > scatter / points.length ? {} : { freedom: points.length - 1 + scatterFreedom }),
  });
}

function access(
  sweeps: readonly NumberedSweep[],
  pulses: readonly Point[],
  bridgeLeft: Reading,
  context: CellContext,
): Reading {
  if (pulses.length > 0) return overSweeps(pulses, absent('no-test-pulse'), 'from voltage-clamp test pulses');
  if (context.stated_access_mohm !== null) return measured(context.stated_access_mohm, { note: 'as stated' });
  const bridges = sweeps.flatMap((sweep) => sweep.bridge_mohm ?? []);
  const bridge = median(bridges) ?? context.stated_bridge_mohm ?? null;
  if (bridge === null) return absent('fact-missing', { missing: ['access_mohm', 'bridge_mohm'] });
  if (bridgeLeft.value === null) return { ...bridgeLeft };
  return measured(bridge + bridgeLeft.value, {
    ...(bridgeLeft.n === undefined ? {} : { n: bridgeLeft.n }),
    ...(bridgeLeft.se === undefined ? {} : { se: bridgeLeft.se }),
    ...(bridgeLeft.at ? { at: bridgeLeft.at } : {}),
    note: `bridge ${Number(bridge.toFixed(2))} MΩ and what it left over`,
  });
}

/** From the median of the first tenth of the sweeps to that of the last. */
function accessChange(points: readonly Point[], least: number): Reading {
  if (points.length < least) return absent('too-few-sweeps');
  const tenth = Math.max(1, Math.floor(points.length / 10));
  const [first, last] = [points.slice(0, tenth), points.slice(-tenth)].map((part) => part.map((point) => point.value));
  const before = median(first!)!;
  const after = median(last!)!;
  if (!(before > 0)) return absent('unresolved');
  const error = (part: readonly Point[]) =>
    errorOf(
      uncertaintyOver(
        part.map((point) => point.value),
        part.map(({ reading }) => ownError(reading)),
      ),
    );
  const both = combinedError([error(points.slice(0, tenth)), error(points.slice(-tenth))]);
  return measured((100 * (after - before)) / before, {
    n: points.length,
    ...(both.se > 0 ? { ...both, se: (100 * both.se) / before } : {}),
    at: placeOf(points.at(-1)!),
  });
}
