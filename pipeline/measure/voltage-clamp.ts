import { median, standardDeviation } from '../signal/statistics.ts';
import { type ClampFit, type CommandEdge, type Estimate, fitClamp } from './clamp-fit.ts';
import { escapedCurrents } from './escaped.ts';
import { absent, measured } from './reading.ts';
import type { Level } from './stimulus.ts';
import { gathered, indexAt, timeAt } from './stretches.ts';
import type { Compensation, Reading, Readings, Signal, Stimulus } from './types.ts';

/** Command steps up to this size, mV, count as test pulses: larger ones open channels. */
const largestTestPulse_mv = 20;
const shortestTestPulse_s = 0.002;
/** After a larger step channels may still be open for this long, s. */
const afterLargeStep_s = 0.03;
/** Steps the same way closer than this, s, are the stairs that a ramp was written down or put out as. Ours. */
const rampStair_s = 0.05;
/** As many edges as a sweep is measured at; more say nothing new. */
const mostEdges = 16;
/** A half-width above this share of the number makes it unresolved. */
const widest = 0.5;
/** A charge below this, pF per mV, is what a neutralized pipette leaves: no membrane. Ours. */
export const leastMembrane_pf = 3;
/** A charge known no better than this, pF, and than by half, is not reported. Ours. */
const widestCharge_pf = 5;
/** From here on, MΩ, a pipette without a membrane behind it counts as sealed. Ours; a good seal has ten times it. */
const leastSeal_mohm = 500;

const ids = [
  'access_resistance_mohm',
  'membrane_resistance_mohm',
  'cell_capacitance_pf',
  'transient_capacitance_pf',
  'seal_resistance_gohm',
  'escaped_currents',
] as const;

/**
 * Readings of a voltage-clamp sweep: command and holding current, and from the edges of small command steps (test
 * pulses, at most 20 mV) the access resistance, the membrane resistance and the capacitance of the circuit that explains
 * the current best (see `clamp-fit.ts`), each with its 95 % half-width. Where no membrane was charged (no cell, a leak,
 * a seal, a compensated transient) the resistance is the total one, and says so.
 *
 * @param current recorded current, pA
 * @param levels the command's levels, mV, in the time of the sweep
 * @param filterKhz corner of the recorder's low-pass; null: found from the edges
 * @param mainsHz where hum is looked for; null: 50 and 60 Hz
 */
export function measureVoltageClamp(
  current: Signal | null,
  command: Signal | null,
  stimulus: Stimulus,
  levels: readonly Level[],
  filterKhz: number | null,
  mainsHz: number | null = null,
): Readings {
  const all = (reading: Reading): Readings => Object.fromEntries(ids.map((id) => [id, reading]));
  const readings: Readings = { command_mv: commandReading(command, stimulus) };
  if (!current || current.samples.length < 3) {
    const why = absent(current ? 'sweep-too-short' : 'no-current');
    return { ...readings, holding_current_pa: why, ...all(why) };
  }
  readings['holding_current_pa'] = holdingCurrent(current, command, levels);
  if (!command) return { ...readings, ...all(absent('no-voltage')) };
  const edges = commandEdges(levels, stimulus.holding ?? levels[0]?.level ?? 0);
  const escaped = { escaped_currents: escapedCurrents(current, edges) };
  if (!edges.some((edge) => edge.used)) return { ...readings, ...all(absent('no-test-pulse')), ...escaped };
  const fit = fitClamp(current, edges, filterKhz, mainsHz);
  if (!fit) return { ...readings, ...all(absent('too-few-points')), ...escaped };
  return { ...readings, ...circuitReadings(fit), ...escaped };
}

/** A transient with less than this share of the stated capacitance is what compensation left over. Ours. */
const leastShareOfStated = 0.5;
/** Prediction below this share does not show in the transient. Ours. */
const leastPrediction_percent = 1;

/**
 * Sets aside an access resistance and a capacitance read off a transient that is not the cell's: the file says that the
 * amplifier took it away or speeded it up, or the transient holds too little of the capacitance stated. What is left over
 * says nothing of the electrode. The membrane resistance is then the total again.
 *
 * @param stated_pf capacitance stated for the cell, pF; null where none is
 */
export function setAsideCompensated(
  readings: Readings,
  stated_pf: number | null,
  compensation: Compensation | null = null,
): Readings {
  const note = compensated(readings, stated_pf, compensation);
  if (note === null) return corrected(readings, compensation);
  const gone = (id: string): Reading =>
    readings[id]?.why === 'no-test-pulse' ? readings[id]! : absent('compensated', { note });
  return {
    ...readings,
    access_resistance_mohm: gone('access_resistance_mohm'),
    cell_capacitance_pf: gone('cell_capacitance_pf'),
    seal_resistance_gohm: gone('seal_resistance_gohm'),
    membrane_resistance_mohm: totalOf(readings),
  };
}

/** In words, what the amplifier did to the transient; null where nothing says that it did. */
function compensated(readings: Readings, stated_pf: number | null, compensation: Compensation | null): string | null {
  const taken = compensation?.whole_cell_pf ?? 0;
  const prediction = compensation?.prediction_percent ?? 0;
  if (!('transient_capacitance_pf' in readings) || readings['transient_capacitance_pf']!.why === 'no-test-pulse')
    return null;
  if (taken > 0) return `the file says that the amplifier took a cell of ${taken.toFixed(1)} pF off the transient`;
  if (prediction >= leastPrediction_percent)
    return `the file says that the amplifier predicted ${prediction.toFixed(0)} % of the step`;
  const found = readings['cell_capacitance_pf']?.value ?? readings['transient_capacitance_pf']?.value ?? null;
  if (stated_pf === null || found === null || found >= leastShareOfStated * stated_pf) return null;
  return `the transient holds ${Math.max(0, found).toFixed(1)} of the ${stated_pf.toFixed(1)} pF stated: the rest is compensated, or the statement is wrong`;
}

/** An access resistance of which the amplifier corrects a share is told with what it would be without. */
function corrected(readings: Readings, compensation: Compensation | null): Readings {
  const share = (compensation?.correction_percent ?? 0) / 100;
  const reading = readings['access_resistance_mohm'];
  if (reading?.value == null || !(share > 0 && share < 1)) return readings;
  const before = reading.value / (1 - share);
  const note = `what is left after ${(100 * share).toFixed(0)} % correction; about ${before.toPrecision(2)} MΩ without it`;
  return { ...readings, access_resistance_mohm: { ...reading, note } };
}

const totalNote = 'total resistance: the access could not be told apart';

function totalOf(readings: Readings): Reading {
  const seal = readings['seal_resistance_gohm'];
  const membrane = readings['membrane_resistance_mohm'];
  const access = readings['access_resistance_mohm']?.value ?? 0;
  if (seal?.value != null) {
    const { value, se, u95: _u95, ...rest } = seal;
    return measured(1000 * value, { ...rest, ...(se === undefined ? {} : { se: 1000 * se }), note: totalNote });
  }
  return membrane?.value == null
    ? (membrane ?? absent('unresolved'))
    : { ...membrane, value: membrane.value + access, note: totalNote };
}

function commandReading(command: Signal | null, stimulus: Stimulus): Reading {
  if (!command) return absent('no-voltage');
  if (stimulus.holding === null) return absent('unreadable');
  if (stimulus.amplitude === null || stimulus.onset_s === null || stimulus.end_s === null)
    return measured(stimulus.holding, { note: 'no step: the holding potential' });
  return measured(stimulus.holding + stimulus.amplitude, { at: { from_s: stimulus.onset_s, to_s: stimulus.end_s } });
}

/**
 * Median over the command's first level, at most its last half second. Its standard error is that of a median of ten
 * blocks, so that slow noise, hum and drift count.
 */
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
    ...blockError(values),
    at: { from_s: timeAt(current, from), to_s: timeAt(current, to) },
  });
}

/** Standard error of a median from the medians of ten blocks, not below that of independent samples. */
function blockError(values: Float64Array): { se?: number; freedom?: number } {
  const blocks = 10;
  if (values.length < 5 * blocks) return {};
  const medians = Array.from(
    { length: blocks },
    (_, k) =>
      median(
        values.subarray(Math.floor((k * values.length) / blocks), Math.floor(((k + 1) * values.length) / blocks)),
      )!,
  );
  return { se: standardDeviation(medians)! / Math.sqrt(blocks), freedom: blocks - 1 };
}

/**
 * Every step of the command, and which of them are small, long and undisturbed enough to be measured at. A small step from
 * one depolarized level to another is none of them: the current through the channels that are open there moves with it.
 * Nor is the stair of a ramp.
 */
function commandEdges(levels: readonly Level[], holding_mv: number): CommandEdge[] {
  const stepAt = (k: number): number => (levels[k] && levels[k - 1] ? levels[k]!.level - levels[k - 1]!.level : 0);
  const goesOn = (between: Level | undefined, one: number, other: number): boolean =>
    between !== undefined && one * other > 0 && between.to_s - between.from_s < rampStair_s;
  let used = 0;
  return levels.slice(1).map((level, k) => {
    const previous = levels[k]!;
    const mv = level.level - previous.level;
    const long = Math.min(previous.to_s - previous.from_s, level.to_s - level.from_s) >= shortestTestPulse_s * 0.999;
    const small = Math.abs(mv) <= largestTestPulse_mv * 1.001 && Math.abs(mv) >= 0.2;
    const disturbed = levels
      .slice(1, k + 1)
      .some(
        (one, j) =>
          Math.abs(one.level - levels[j]!.level) > largestTestPulse_mv * 1.001 &&
          level.from_s - one.from_s < afterLargeStep_s,
      );
    const open = Math.max(previous.level, level.level) > holding_mv + largestTestPulse_mv * 1.001;
    const stair = goesOn(previous, stepAt(k), mv) || goesOn(level, mv, stepAt(k + 2));
    const use = long && small && !disturbed && !open && !stair && used < mostEdges;
    if (use) used++;
    return { at_s: level.from_s, mv, used: use };
  });
}

/** The circuit of the fit as readings, or why it is none. */
function circuitReadings(fit: ClampFit): Readings {
  const at = { from_s: fit.from_s, to_s: fit.to_s };
  const n = fit.edges;
  const told = (of: Estimate, note?: string): Reading =>
    measured(of.value, { n, se: of.se, at, ...(note ? { note } : {}) });
  const steady = fit.steady_ns;
  const transient = fit.slow_pf;
  const whole = fit.whole_pf;
  const flows = steady.value > 1.96 * steady.se;
  const leastTotal = 1000 / Math.max(1e-9, steady.value + 1.96 * steady.se);
  const against = steady.value < -3 * steady.se ? 'the steady current goes against the step' : null;
  const charged = transient.value > 3 * transient.se && transient.value > 1;
  const turned = transient.value < -3 * transient.se && transient.value < -1;
  const resolved = (of: Estimate, note: string): Reading =>
    1.96 * of.se <= widest * Math.abs(of.value) && of.value > 0 ? told(of) : absent('unresolved', { note });
  const transientReading =
    1.96 * whole.se <= Math.max(widestCharge_pf, widest * Math.abs(whole.value))
      ? told(whole)
      : absent('unresolved', { note: 'noise or a slow current hides the transient' });
  const without = (note: string): Readings => ({
    access_resistance_mohm: absent('no-membrane-transient', { note }),
    cell_capacitance_pf: absent('no-membrane-transient', { note }),
    transient_capacitance_pf: transientReading,
  });
  const totalReading = (note: string): Reading => {
    if (against) return absent('unresolved', { note: against });
    if (!flows) return absent('unresolved', { note: `at least ${leastTotal.toPrecision(2)} MΩ` });
    return resolved(fit.total_mohm, `at least ${leastTotal.toPrecision(2)} MΩ`).value === null
      ? absent('unresolved', { note: `at least ${leastTotal.toPrecision(2)} MΩ` })
      : told(fit.total_mohm, note);
  };
  if (turned)
    return {
      ...without('the transient runs against the step: the amplifier takes more away than there is'),
      membrane_resistance_mohm: totalReading(totalNote),
      seal_resistance_gohm: absent('no-membrane-transient'),
    };
  if (!charged) {
    const bare = whole.value - 1.96 * whole.se < leastMembrane_pf;
    const sealed = bare && (flows ? 1000 / steady.value : leastTotal) >= leastSeal_mohm;
    const seal = { value: fit.total_mohm.value / 1000, se: fit.total_mohm.se / 1000 };
    if (sealed)
      return {
        ...without('no membrane was charged: a sealed pipette before break-in, or a compensated transient'),
        membrane_resistance_mohm: absent('no-membrane-transient', { note: 'see the seal resistance' }),
        seal_resistance_gohm: resolved(seal, `at least ${(leastTotal / 1000).toPrecision(2)} GΩ`),
      };
    const what = bare ? bareWords(1000 / steady.value) : 'the transient is faster than this filter and noise resolve';
    return {
      ...without(what),
      membrane_resistance_mohm: totalReading(`total resistance: the access could not be told apart; ${what}`),
      seal_resistance_gohm: absent('unresolved', {
        note:
          steady.value * leastSeal_mohm < 1000
            ? 'whether a membrane or only the pipette was charged is not resolved'
            : `less than ${leastSeal_mohm / 1000} GΩ: no seal`,
      }),
    };
  }
  const tau_ms = fit.tau_ms.value;
  const corner = fit.corner_khz === null ? '' : ` behind a filter of ${fit.corner_khz.toPrecision(2)} kHz`;
  const fast = `the transient of ${tau_ms.toPrecision(2)} ms is not resolved${corner}`;
  const single =
    fit.left_over > mostLeftOver
      ? `${Math.round(100 * fit.left_over)} % of the transient is no single exponential: a branched cell, or partly compensated`
      : null;
  if (single !== null && fit.left_over > tooMuchLeftOver)
    return {
      access_resistance_mohm: absent('unresolved', { note: single }),
      cell_capacitance_pf: absent('unresolved', { note: single }),
      transient_capacitance_pf: transientReading,
      membrane_resistance_mohm: absent('unresolved', { note: single }),
      seal_resistance_gohm: absent('membrane-charged'),
    };
  const noted = (reading: Reading): Reading =>
    single !== null && reading.value !== null ? { ...reading, note: single } : reading;
  return {
    access_resistance_mohm: noted(resolved(fit.access_mohm, fast)),
    membrane_resistance_mohm: against
      ? absent('unresolved', { note: against })
      : flows
        ? resolved(fit.membrane_mohm, `at least ${Math.max(0, leastTotal - fit.access_mohm.value).toPrecision(2)} MΩ`)
        : absent('unresolved', {
            note: `at least ${Math.max(0, leastTotal - fit.access_mohm.value).toPrecision(2)} MΩ`,
          }),
    cell_capacitance_pf: noted(
      flows || !against ? resolved(fit.membrane_pf, fast) : absent('unresolved', { note: fast }),
    ),
    transient_capacitance_pf: transientReading,
    seal_resistance_gohm: absent('membrane-charged'),
  };
}

/** Shares of the largest current that the circuit may leave unexplained: worth a word, and too much. Ours. */
const mostLeftOver = 0.02;
const tooMuchLeftOver = 0.04;

/** What a resistance without a membrane behind it usually is. */
const bareWords = (mohm: number): string =>
  mohm < 20
    ? 'no membrane was charged: an open pipette in the bath'
    : 'no membrane was charged: a leak without a cell, or a compensated transient';
