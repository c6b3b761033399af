import { exponentialFit } from '../signal/exponential.ts';
import { mean, median, standardDeviation } from '../signal/statistics.ts';
import { absent, measured } from './reading.ts';
import type { Level } from './stimulus.ts';
import { filterDelayMs, gathered, indexAt, type Stretch, timeAt } from './stretches.ts';
import type { Reading, Readings, Signal, Stimulus } from './types.ts';

/** Command steps up to this size, mV, count as test pulses: larger ones open channels. */
const largestTestPulse_mv = 20;
const shortestTestPulse_s = 0.002;
/** As many edges as a sweep is measured at; more say nothing new. */
const mostEdges = 24;

/** One command edge and the current that answered it. */
interface Answer {
  /** All by linear circuit theory; null where the transient could not be resolved. */
  access_mohm: number | null;
  total_mohm: number;
  capacitance_pf: number | null;
  from_s: number;
  to_s: number;
}

/**
 * Readings of a voltage-clamp sweep: command and holding current, and from the edges of small command steps (test
 * pulses, at most 20 mV) the access resistance ΔV/I extrapolated to the edge, the membrane resistance ΔV/ΔI − R_a
 * and the capacitance Q/ΔV·((R_a + R_m)/R_m)². Medians over the edges with n and spread. Where no transient stands
 * out of the noise (no cell, or a command too slow) the resistance is the total one, and says so.
 *
 * @param current recorded current, pA
 * @param levels the command's levels, mV, in the time of the sweep
 * @param filterKhz corner of the recorder's low-pass; it delays the current, and with it the edge it is carried back to
 */
export function measureVoltageClamp(
  current: Signal | null,
  command: Signal | null,
  stimulus: Stimulus,
  levels: readonly Level[],
  filterKhz: number | null,
): Readings {
  const ids = ['access_resistance_mohm', 'membrane_resistance_mohm', 'cell_capacitance_pf'];
  const all = (reading: Reading): Readings => Object.fromEntries(ids.map((id) => [id, reading]));
  const readings: Readings = { command_mv: commandReading(command, stimulus) };
  if (!current || current.samples.length < 3) {
    const why = absent(current ? 'sweep-too-short' : 'no-current');
    return { ...readings, holding_current_pa: why, ...all(why) };
  }
  readings['holding_current_pa'] = holdingCurrent(current, command, levels);
  if (!command) return { ...readings, ...all(absent('no-voltage')) };
  const answers = testPulseEdges(levels)
    .slice(0, mostEdges)
    .map((edge) => answerAt(current, edge, filterDelayMs(filterKhz)))
    .filter((answer) => answer !== null);
  if (answers.length === 0) return { ...readings, ...all(absent('no-test-pulse')) };
  return { ...readings, ...summary(answers) };
}

/** A transient with less than this share of the stated capacitance is what compensation left over. Ours. */
const leastShareOfStated = 0.5;

/**
 * Sets aside an access resistance and a capacitance read off a transient that holds too little of the stated
 * capacitance: the amplifier has taken the rest away, and what is left over says nothing of the electrode. The
 * membrane resistance is then the total again.
 *
 * @param stated_pf capacitance stated for the cell, pF; null where none is
 */
export function setAsideCompensated(readings: Readings, stated_pf: number | null): Readings {
  const found = readings['cell_capacitance_pf']?.value ?? null;
  if (stated_pf === null || found === null || found >= leastShareOfStated * stated_pf) return readings;
  const note = `the transient holds ${found.toFixed(1)} of the ${stated_pf.toFixed(1)} pF stated: the rest is compensated, or the statement is wrong`;
  const access = readings['access_resistance_mohm']?.value ?? 0;
  const membrane = readings['membrane_resistance_mohm'];
  return {
    ...readings,
    access_resistance_mohm: absent('unresolved', { note }),
    cell_capacitance_pf: absent('unresolved', { note }),
    ...(membrane?.value == null
      ? {}
      : {
          membrane_resistance_mohm: {
            ...membrane,
            value: membrane.value + access,
            note: 'total resistance: the access could not be told apart',
          },
        }),
  };
}

function commandReading(command: Signal | null, stimulus: Stimulus): Reading {
  if (!command) return absent('no-voltage');
  if (stimulus.holding === null) return absent('unreadable');
  if (stimulus.amplitude === null || stimulus.onset_s === null || stimulus.end_s === null)
    return measured(stimulus.holding, { note: 'no step: the holding potential' });
  return measured(stimulus.holding + stimulus.amplitude, { at: { from_s: stimulus.onset_s, to_s: stimulus.end_s } });
}

function holdingCurrent(current: Signal, command: Signal | null, levels: readonly Level[]): Reading {
  // The command's first level; without a command nothing says where holding ends.
  if (!command) return absent('no-voltage');
  const first = levels[0];
  const to = first && levels.length > 1 ? indexAt(current, first.to_s) : current.samples.length;
  // The current may still be settling at the start of a sweep: the last half second counts.
  const from = Math.max(indexAt(current, first?.from_s ?? current.start_s), to - Math.round(0.5 * current.rate_hz));
  const values = gathered(current.samples, [{ from, to }]);
  if (values.length < 3) return absent(to - from < 3 ? 'no-baseline' : 'unreadable');
  const sd = standardDeviation(values)!;
  return measured(median(values)!, {
    n: values.length,
    sd,
    at: { from_s: timeAt(current, from), to_s: timeAt(current, to) },
  });
}

interface Edge {
  at_s: number;
  step_mv: number;
  /** Step that led to the level before, 0 where the sweep began with it. */
  previous_mv: number;
  /** The level before began, the level after ends. */
  before_s: number;
  after_s: number;
}

/** Steps of the command that are small and long enough, in order of time. */
function testPulseEdges(levels: readonly Level[]): Edge[] {
  return levels.slice(1).flatMap((level, k) => {
    const previous = levels[k]!;
    const step_mv = level.level - previous.level;
    const previous_mv = k === 0 ? 0 : previous.level - levels[k - 1]!.level;
    const long = Math.min(previous.to_s - previous.from_s, level.to_s - level.from_s) >= shortestTestPulse_s;
    const small = Math.abs(step_mv) <= largestTestPulse_mv * 1.001 && Math.abs(step_mv) >= 0.2;
    return long && small
      ? [{ at_s: level.from_s, step_mv, previous_mv, before_s: previous.from_s, after_s: level.to_s }]
      : [];
  });
}

/** What the current says at one edge. Null where it cannot be read or does not answer at all. */
function answerAt(current: Signal, edge: Edge, delay_ms: number): Answer | null {
  const rate = current.rate_hz;
  const from = indexAt(current, edge.at_s);
  const to = Math.min(indexAt(current, edge.after_s), from + Math.round(0.2 * rate));
  const start = indexAt(current, edge.before_s);
  if (to - from < 8 || from - start < 4) return null;
  // The last fifth of each level, at most 20 ms, has come nearest to rest.
  const share = (length: number): number => Math.max(4, Math.min(Math.floor(length / 5), Math.round(0.02 * rate)));
  const earlier = { from: from - share(from - start), to: from };
  const later = { from: to - share(to - from), to };
  const before = current.samples.subarray(earlier.from, earlier.to);
  const late = current.samples.subarray(later.from, later.to);
  const calm = mean(before);
  const steady = mean(late);
  const noise = standardDeviation(before);
  if (calm === null || steady === null || noise === null) return null;
  const where = { from_s: edge.at_s, to_s: timeAt(current, to) };
  const part = current.samples.subarray(from, to);
  let change = steady - calm;
  let transient = transientOf(part, steady, edge.step_mv, noise, rate, delay_ms);
  if (transient) {
    // What the transient still is in the last fifth, and what the one before was when this one began, is known: out.
    const { tau_ms } = transient;
    const left = (stretch: Stretch, edgeIndex: number): number =>
      meanDecay(((stretch.from - edgeIndex) * 1000) / rate, ((stretch.to - edgeIndex) * 1000) / rate, tau_ms);
    const height = transient.height_pa;
    const settled = steady - height * left(later, from);
    const rested = calm - height * (edge.previous_mv / edge.step_mv) * left(earlier, start);
    change = settled - rested;
    transient = transientOf(part, settled, edge.step_mv, noise, rate, delay_ms) ?? transient;
  }
  // A change that is lost in noise, or against the step, is no resistance.
  const error = noise * Math.sqrt(1 / before.length + 1 / late.length);
  if (!(change * edge.step_mv > 0 && Math.abs(change) > 2 * error)) return null;
  // mV/pA is GΩ.
  const total_mohm = (edge.step_mv / change) * 1000;
  const unresolved = { access_mohm: null, total_mohm, capacitance_pf: null, ...where };
  if (!transient) return unresolved;
  const access_mohm = (edge.step_mv / (transient.height_pa + change)) * 1000;
  const membrane_mohm = total_mohm - access_mohm;
  if (!(access_mohm > 0 && membrane_mohm > 0)) return unresolved;
  // pA·ms is fC; fC/mV is pF.
  const capacitance_pf = (transient.charge_fc / edge.step_mv) * (total_mohm / membrane_mohm) ** 2;
  return { access_mohm, total_mohm, capacitance_pf, ...where };
}

/** Mean of exp(−t/tau) between two times. */
const meanDecay = (from_ms: number, to_ms: number, tau_ms: number): number =>
  (tau_ms * (Math.exp(-from_ms / tau_ms) - Math.exp(-to_ms / tau_ms))) / (to_ms - from_ms);

/**
 * The transient above the steady current: its height extrapolated to the edge and its charge. The first samples belong
 * to the pipette and the filter: the exponential is fitted from where the transient has fallen to 80 % of its top.
 */
function transientOf(
  part: Float64Array,
  steady: number,
  step_mv: number,
  noise: number,
  rate: number,
  delay_ms: number,
): { height_pa: number; charge_fc: number; tau_ms: number } | null {
  const sign = Math.sign(step_mv);
  const above = part.map((value) => (value - steady) * sign);
  const search = Math.min(above.length, Math.max(4, Math.round(0.003 * rate)));
  let top = 0;
  for (let i = 1; i < search; i++) if (above[i]! > above[top]!) top = i;
  if (!(above[top]! > 6 * noise)) return null;
  let first = top;
  while (first < above.length && above[first]! > 0.8 * above[top]!) first++;
  let last = first;
  while (last < above.length && above[last]! > Math.max(0.02 * above[top]!, noise)) last++;
  last = Math.min(above.length, first + Math.max(8, 2 * (last - first)));
  if (last - first < 6) return null;
  const ms = Float64Array.from({ length: last - first }, (_, i) => ((first + i) * 1000) / rate);
  const fit = exponentialFit(ms, above.subarray(first, last));
  if (!fit?.converged || fit.amplitude <= 0 || fit.tau < 1000 / rate) return null;
  const peak = fit.amplitude * Math.exp((fit.x0 - delay_ms) / fit.tau);
  // The charge of the samples, not of the fit: it does not depend on the shape. A trapezium from the extrapolated
  // top to the first sample beyond the pipette's, then the samples themselves.
  let charge = fit.tau * (peak - fit.amplitude);
  const until = Math.min(above.length, first + Math.round((8 * fit.tau * rate) / 1000));
  for (let i = first; i < until; i++) charge += (above[i]! * 1000) / rate;
  charge -= (0.5 * above[first]! * 1000) / rate;
  return { height_pa: peak * sign, charge_fc: charge * sign, tau_ms: fit.tau };
}

function summary(answers: Answer[]): Readings {
  const at = { from_s: answers[0]!.from_s, to_s: answers[0]!.to_s };
  const resolved = answers.filter((one) => one.access_mohm !== null);
  const over = (values: number[], note?: string): Reading => {
    const sd = standardDeviation(values);
    return measured(median(values)!, {
      n: values.length,
      at,
      ...(sd === null ? {} : { sd, se: sd / Math.sqrt(values.length) }),
      ...(note ? { note } : {}),
    });
  };
  const totals = answers.map((one) => one.total_mohm);
  if (resolved.length === 0)
    return {
      access_resistance_mohm: absent('unresolved', { note: 'no capacitive transient stands out of the noise' }),
      membrane_resistance_mohm: over(totals, 'total resistance: the access could not be told apart'),
      cell_capacitance_pf: absent('unresolved', { note: 'no capacitive transient stands out of the noise' }),
    };
  return {
    access_resistance_mohm: over(resolved.map((one) => one.access_mohm!)),
    membrane_resistance_mohm: over(resolved.map((one) => one.total_mohm - one.access_mohm!)),
    cell_capacitance_pf: over(resolved.map((one) => one.capacitance_pf!)),
  };
}
