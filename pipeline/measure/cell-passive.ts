import { exponentialFit, goldenMinimum } from '../signal/exponential.ts';
import { linearFit } from '../signal/line.ts';
import { mean, median, standardDeviation } from '../signal/statistics.ts';
import {
  commonReason,
  longSteps,
  medianOver,
  type Point,
  placeOf,
  pointsOf,
  spreadOf,
  stepPa,
} from './cell-numbers.ts';
import { spikesDuring } from './firing.ts';
import { absent, measured } from './reading.ts';
import type { CellContext, NumberedSweep, Reading, Readings, VIPoint } from './types.ts';

/** Steady potential change on current, for every step without a spike in it. */
export function vOnI(sweeps: readonly NumberedSweep[]): VIPoint[] {
  return steadyPoints(sweeps).map(({ sweep, value }) => ({ sweep: sweep.sweep, pa: stepPa(sweep)!, mv: value }));
}

const steadyPoints = (sweeps: readonly NumberedSweep[]): Point[] =>
  pointsOf(longSteps(sweeps), 'steady_deflection_mv').filter(
    ({ sweep }) => spikesDuring(sweep.spikes, sweep.stimulus).length === 0,
  );

/** Input resistance, time constant, capacitance, sag and bridge error of one condition. */
export function passiveReadings(sweeps: readonly NumberedSweep[]): Readings {
  const down = steadyPoints(sweeps).filter(({ sweep }) => stepPa(sweep)! < 0);
  const bridge = bridgeError(sweeps);
  const resistance = inputResistance(sweeps, down, bridge);
  const timeConstant = membraneTimeConstant(sweeps, down);
  return {
    input_resistance_mohm: resistance,
    membrane_time_constant_ms: timeConstant,
    membrane_capacitance_pf: capacitance(resistance, timeConstant),
    sag_fraction: sag(sweeps, down),
    bridge_error_mohm: bridge,
  };
}

function inputResistance(sweeps: readonly NumberedSweep[], down: readonly Point[], bridge: Reading): Reading {
  if (down.length === 0) return withoutHyperpolarizing(sweeps);
  const fit = linearFit([0, ...down.map(({ sweep }) => stepPa(sweep)!)], [0, ...down.map(({ value }) => value)]);
  if (!fit) return absent('too-few-points');
  // mV/pA is GΩ. One step alone leaves no scatter: its own error stands in.
  const alone = down[0]!;
  const se =
    fit.se_slope ?? (alone.reading.se === undefined ? null : alone.reading.se / Math.abs(stepPa(alone.sweep)!));
  const left = bridge.value;
  const included =
    left !== null && Math.abs(left) > Math.max(1, 0.05 * Math.abs(fit.slope * 1000), 2 * (bridge.se ?? 0))
      ? { note: `holds a bridge error of ${left.toFixed(1)} MΩ` }
      : {};
  return measured(fit.slope * 1000, {
    n: down.length,
    ...(se === null ? {} : { se: se * 1000 }),
    at: placeOf(down.reduce((best, one) => (stepPa(one.sweep)! < stepPa(best.sweep)! ? one : best))),
    ...included,
  });
}

/** Why no hyperpolarizing step could be used: none was made, or those made could not be measured. */
function withoutHyperpolarizing(sweeps: readonly NumberedSweep[]): Reading {
  const made = longSteps(sweeps).filter((sweep) => stepPa(sweep)! < 0);
  if (made.length > 0) return commonReason(made, 'steady_deflection_mv', 'no-hyperpolarizing-steps');
  return absent(
    sweeps.length > 0 && sweeps.every((sweep) => sweep.stimulus.kind === 'unknown')
      ? 'no-stimulus'
      : 'no-hyperpolarizing-steps',
  );
}

/** Responses up to this deflection, mV, count as small; sag up to this share of it counts as none. */
const smallDeflection_mv = 10;
const largestSag = 0.12;

interface Response {
  sweep: NumberedSweep;
  /** ms after onset and mV below the level before it, per pA of the step. */
  ms: number[];
  perPa: number[];
  /** Steady and largest deflection per pA, and the share of the largest that is gone by the end. */
  steadyPerPa: number;
  largestPerPa: number;
  sag: number;
}

/**
 * Single exponential through the averaged onset of small hyperpolarizing steps, from 10 to 90 % of the steady
 * deflection. Each response is divided by its current, so that steps of several sizes average into one.
 */
function membraneTimeConstant(sweeps: readonly NumberedSweep[], down: readonly Point[]): Reading {
  if (down.length === 0) return withoutHyperpolarizing(sweeps);
  const usable = down.filter(({ sweep, value }) => sweep.step_response !== null && value < -0.3);
  const small = usable.filter(({ value }) => value >= -smallDeflection_mv);
  const least = usable.reduce<Point | null>((best, one) => (!best || one.value > best.value ? one : best), null);
  const chosen = small.length > 0 ? small : least && least.value >= -2.5 * smallDeflection_mv ? [least] : [];
  if (chosen.length === 0)
    return absent(
      usable.length === 0 ? 'unresolved' : 'no-hyperpolarizing-steps',
      usable.length === 0 ? {} : { note: 'no step deflects by 25 mV or less' },
    );
  const responses = chosen.flatMap((point) => responseOf(point) ?? []);
  if (responses.length === 0) return absent('unresolved');
  // Sag is judged over all steps of 3 mV or more: slow noise makes or hides some of it in a single one.
  const large = usable.filter(({ sweep }) => (sweep.readings['largest_deflection_mv']?.value ?? 0) <= -3);
  const share = median((large.length > 0 ? large : chosen).map((point) => responseOf(point)?.sag ?? 0))!;
  if (share > largestSag)
    return absent('sag-or-resonance', { note: `${Math.round(share * 100)} % of the deflection is gone by the end` });
  const together = fitOnset(averaged(responses));
  if (!together) return absent('fit-failed');
  const alone = responses.flatMap((one) => fitOnset(one)?.tau ?? []);
  const sd = alone.length >= 2 ? standardDeviation(alone) : null;
  const first = chosen[0]!;
  return measured(together.tau, {
    n: responses.length,
    ...(sd === null ? {} : { sd }),
    se: sd !== null && alone.length >= 3 ? Math.max(together.se_tau, sd / Math.sqrt(alone.length)) : together.se_tau,
    at: {
      sweep: first.sweep.sweep,
      from_s: first.sweep.stimulus.onset_s!,
      to_s: first.sweep.stimulus.onset_s! + together.to_ms / 1000,
    },
    ...(small.length === 0 ? { note: `from the smallest step, ${(-first.value).toFixed(0)} mV` } : {}),
  });
}

function responseOf({ sweep, value }: Point): Response | null {
  const { start_s, rate_hz, mv } = sweep.step_response!;
  const pa = stepPa(sweep)!;
  const ms = mv.map((_, k) => (start_s + k / rate_hz - sweep.stimulus.onset_s!) * 1000);
  const before = mean(mv.filter((_, k) => ms[k]! < 0)) ?? sweep.readings['baseline_mv']?.value ?? null;
  if (before === null) return null;
  const largest = sweep.readings['largest_deflection_mv']?.value ?? null;
  const from = ms.findIndex((time) => time >= 0);
  if (from < 0) return null;
  return {
    sweep,
    ms: ms.slice(from),
    perPa: mv.slice(from).map((level) => (level - before) / pa),
    steadyPerPa: value / pa,
    largestPerPa: Math.max(value / pa, largest === null ? 0 : largest / pa),
    sag: largest === null || largest >= 0 ? 0 : Math.max(0, (largest - value) / largest),
  };
}

/** Mean of responses on the time grid of the first, as far as all of them reach. */
function averaged(responses: readonly Response[]): Response {
  const [first, ...rest] = responses as [Response, ...Response[]];
  const perPa = first.perPa.flatMap((value, k) => {
    const time = first.ms[k]!;
    const others = rest.map((one) => interpolated(one, time));
    return others.every((other) => other !== null)
      ? [(value + others.reduce((sum, other) => sum + other!, 0)!) / responses.length]
      : [];
  });
  return {
    ...first,
    perPa,
    ms: first.ms.slice(0, perPa.length),
    steadyPerPa: mean(responses.map((one) => one.steadyPerPa))!,
    largestPerPa: mean(responses.map((one) => one.largestPerPa))!,
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

function fitOnset(response: Response): { tau: number; se_tau: number; to_ms: number } | null {
  const { ms, perPa, steadyPerPa } = response;
  const reached = (share: number, from: number): number => {
    for (let k = from; k < perPa.length; k++) if (perPa[k]! >= share * steadyPerPa) return k;
    return -1;
  };
  // Nothing before 0.5 ms: that is the electrode's.
  const electrode = ms.findIndex((time) => time >= 0.5);
  const from = reached(0.1, Math.max(0, electrode));
  const to = from < 0 ? -1 : reached(0.9, from);
  if (from < 0 || to - from < 5) return null;
  const x = ms.slice(from, to + 1);
  const y = perPa.slice(from, to + 1);
  const fit = exponentialFit(x, y);
  // The level it heads for is known: the steady one, or the largest where some of it sags away. A fit that heads
  // elsewhere has followed noise or hum, and is led back to the nearer end of that range.
  const allowed = [0.97 * response.steadyPerPa, 1.03 * response.largestPerPa] as const;
  if (fit?.converged && fit.offset >= allowed[0] && fit.offset <= allowed[1])
    return { tau: fit.tau, se_tau: fit.se_tau, to_ms: ms[to]! };
  const offset = fit && fit.offset < allowed[0] ? allowed[0] : allowed[1];
  const led = fitToLevel(x, y, offset);
  return led && { ...led, to_ms: ms[to]! };
}

/** Time constant of an exponential that heads for a known level. */
function fitToLevel(x: readonly number[], y: readonly number[], level: number): { tau: number; se_tau: number } | null {
  const span = x.at(-1)! - x[0]!;
  const fitted = (logTau: number): { amplitude: number; rss: number } => {
    const decay = x.map((time) => Math.exp(-(time - x[0]!) / Math.exp(logTau)));
    const squares = decay.reduce((sum, value) => sum + value * value, 0);
    const amplitude = decay.reduce((sum, value, k) => sum + value * (y[k]! - level), 0) / squares;
    return { amplitude, rss: decay.reduce((sum, value, k) => sum + (y[k]! - level - amplitude * value) ** 2, 0) };
  };
  const low = Math.log(span / 50);
  const high = Math.log(span * 5);
  const logTau = goldenMinimum((value) => fitted(value).rss, low, high);
  if (logTau < low + 0.01 || logTau > high - 0.01) return null;
  const tau = Math.exp(logTau);
  const { amplitude, rss } = fitted(logTau);
  const slope = x.reduce((sum, time) => {
    const t = time - x[0]!;
    return sum + ((amplitude * t * Math.exp(-t / tau)) / tau ** 2) ** 2;
  }, 0);
  return { tau, se_tau: Math.sqrt(rss / Math.max(1, x.length - 2) / slope) };
}

/** ms/MΩ is nF. */
function capacitance(resistance: Reading, timeConstant: Reading): Reading {
  if (timeConstant.value === null) return { ...timeConstant };
  if (resistance.value === null) return { ...resistance };
  if (!(resistance.value > 0)) return absent('unresolved');
  const value = (timeConstant.value / resistance.value) * 1000;
  const relative = Math.hypot((timeConstant.se ?? 0) / timeConstant.value, (resistance.se ?? 0) / resistance.value);
  return measured(value, {
    n: timeConstant.n ?? 1,
    se: value * relative,
    ...(timeConstant.at ? { at: timeConstant.at } : {}),
  });
}

const sagAt_mv = 15;

/** Sag on the hyperpolarizing step whose largest deflection is nearest to 15 mV; below 3 mV noise would decide. */
function sag(sweeps: readonly NumberedSweep[], down: readonly Point[]): Reading {
  const points = pointsOf(
    down.map(({ sweep }) => sweep),
    'largest_deflection_mv',
  );
  if (points.length === 0) return withoutHyperpolarizing(sweeps);
  const nearest = points.reduce((best, one) =>
    Math.abs(-one.value - sagAt_mv) < Math.abs(-best.value - sagAt_mv) ? one : best,
  );
  if (-nearest.value < 3) return absent('unresolved', { note: 'no step deflects by 3 mV' });
  const steady = nearest.sweep.readings['steady_deflection_mv']!;
  return measured((nearest.value - steady.value!) / nearest.value, {
    n: 1,
    se: Math.hypot(steady.se ?? 0, nearest.reading.se ?? 0) / -nearest.value,
    at: placeOf(nearest),
    note: `step of ${stepPa(nearest.sweep)!.toFixed(0)} pA, ${(-nearest.value).toFixed(1)} mV`,
  });
}

/**
 * Slope through the origin of the instantaneous step on the stimulus: without current there is no jump. A membrane on
 * its way to a spike does not rise along an exponential: sweeps without spikes speak first, where there are two.
 */
function bridgeError(sweeps: readonly NumberedSweep[]): Reading {
  const all = pointsOf(sweeps, 'bridge_step_mv').filter(({ sweep }) => Math.abs(stepPa(sweep) ?? 0) > 0);
  const quiet = all.filter(({ sweep }) => sweep.spikes.length === 0);
  // A step that makes the cell fire curves before it fires: one such edge alone cannot be told from a jump.
  const points = quiet.length >= 2 || all.length < 2 ? quiet : all;
  if (points.length === 0)
    return all.length > 0 ? absent('too-few-sweeps') : commonReason(sweeps, 'bridge_step_mv', 'no-stimulus');
  const squares = points.reduce((sum, { sweep }) => sum + stepPa(sweep)! ** 2, 0);
  const slope = points.reduce((sum, { sweep, value }) => sum + value * stepPa(sweep)!, 0) / squares;
  const residual = Math.sqrt(
    points.reduce((sum, { sweep, value }) => sum + (value - slope * stepPa(sweep)!) ** 2, 0) /
      Math.max(1, points.length - 1),
  );
  const own =
    Math.sqrt(points.reduce((sum, { sweep, reading }) => sum + ((reading.se ?? 0) * stepPa(sweep)!) ** 2, 0)) / squares;
  const largest = points.reduce((best, one) =>
    Math.abs(stepPa(one.sweep)!) > Math.abs(stepPa(best.sweep)!) ? one : best,
  );
  return measured(slope * 1000, {
    n: points.length,
    se: 1000 * Math.max(own, points.length > 1 ? residual / Math.sqrt(squares) : 0),
    at: placeOf(largest),
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
    ...(common > scatter / points.length ? {} : { freedom: points.length - 1 }),
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
  const error = (part: readonly Point[]): number =>
    spreadOf(part.map((point) => point.value)).se ?? part[0]!.reading.se ?? 0;
  return measured((100 * (after - before)) / before, {
    n: points.length,
    se: (100 * Math.hypot(error(points.slice(0, tenth)), error(points.slice(-tenth)))) / before,
    at: placeOf(points.at(-1)!),
  });
}
