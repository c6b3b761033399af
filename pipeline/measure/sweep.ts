import { countFinite } from '../signal/statistics.ts';
import { pulseResponse } from './artefact.ts';
import { envelopeOf, excerptOf } from './envelope.ts';
import { filterCorner } from './filter.ts';
import { isBlocked, measureFiring, measureSpontaneous } from './firing.ts';
import { withoutHum } from './mains.ts';
import {
  driftUnder,
  measureBaseline,
  measureBridgeStep,
  measureDeflections,
  type PassiveInput,
  stepResponse,
  withoutStep,
} from './passive.ts';
import { clippedFraction, digitizerStep, hum, missingFraction, noise, sampleInterval } from './quality.ts';
import { quantitiesOf } from './quantities.ts';
import { absent, measured } from './reading.ts';
import { type Errors, type SlowNoise, withHalfWidths } from './spike-numbers.ts';
import { fastNoise } from './spike-trace.ts';
import { measureSpikes } from './spikes.ts';
import { type CommandReading, type Level, readCommand } from './stimulus.ts';
import { gathered, indexAt, readable, type Stretch, spikeHoles, stimulusHoles, timeAt, without } from './stretches.ts';
import { countSpikelets, measureTrains } from './trains.ts';
import type {
  AbsenceCode,
  Clamp,
  MeasureContext,
  Reading,
  Readings,
  Signal,
  Spike,
  Stimulus,
  SweepInput,
  SweepMeasure,
} from './types.ts';
import { measureVoltageClamp, setAsideCompensated } from './voltage-clamp.ts';

/** Columns of the drawn outline. */
const outlineColumns = 600;

/**
 * Measures one sweep. Data never make it throw: every quantity of a sweep in its clamp mode comes with a value or with
 * the reason why there is none.
 *
 * @param input voltage in mV and current in pA as recorded; samples that could not be read are NaN
 * @param context what measuring must know of the class and the rig
 */
export function measureSweep(input: SweepInput, context: MeasureContext): SweepMeasure {
  const voltage = usable(input.voltage);
  const current = usable(input.current);
  const measure = input.clamp === 'voltage' ? voltageClampSweep : currentClampSweep;
  const sweep = measure(input, voltage, current, context);
  return { ...sweep, readings: complete(sweep.readings, input.clamp) };
}

/** A signal with samples and a rate; others count as not recorded. */
function usable(signal: Signal | null): Signal | null {
  if (!signal || signal.samples.length === 0) return null;
  return Number.isFinite(signal.rate_hz) && signal.rate_hz > 0 && Number.isFinite(signal.start_s) ? signal : null;
}

const sweepIds: Record<Clamp, string[]> = {
  current: quantitiesOf('sweep').flatMap((entry) => (entry.clamp === 'voltage' ? [] : [entry.id])),
  voltage: quantitiesOf('sweep').flatMap((entry) => (entry.clamp === 'current' ? [] : [entry.id])),
};

/** In the registry's order; a quantity that nothing above has spoken of is not measured in this clamp mode. */
function complete(readings: Readings, clamp: Clamp): Readings {
  return Object.fromEntries(sweepIds[clamp].map((id) => [id, readings[id] ?? absent('not-this-clamp')]));
}

const durationOf = (...signals: (Signal | null)[]): number =>
  Math.max(0, ...signals.map((signal) => (signal ? signal.samples.length / signal.rate_hz : 0)));

function currentClampSweep(
  input: SweepInput,
  voltage: Signal | null,
  current: Signal | null,
  context: MeasureContext,
): SweepMeasure {
  const command = readCommand(current, input.stated_stimulus, 'current');
  const bias = input.bias_pa ?? null;
  const carried = { bridge_mohm: input.bridge_mohm, bias_pa: bias };
  const current_envelope = current && envelopeOf(current, outlineColumns);
  if (!voltage || countFinite(voltage.samples) === 0) {
    const why: AbsenceCode = voltage ? 'unreadable' : input.voltage ? 'sweep-too-short' : 'no-voltage';
    return {
      clamp: 'current',
      duration_s: durationOf(voltage, current),
      stimulus: command.stimulus,
      readings: {
        ...Object.fromEntries(sweepIds.current.map((id) => [id, absent(why)])),
        ...stimulusReadings(command, current, bias),
        ...(voltage ? { missing_fraction: missingFraction(voltage), sample_interval_us: sampleInterval(voltage) } : {}),
      },
      spikes: [],
      depolarization_block: false,
      remarks: command.remarks,
      voltage_envelope: null,
      current_envelope,
      first_spike: null,
      step_response: null,
      spontaneous: null,
      ...carried,
    };
  }

  const { stimulus, remarks } = alignedTo(voltage, current, command);
  const found = spikesAndBaseline(voltage, current, stimulus, command.levels, context);
  const quiet = quietStretches(found.passive);
  const quantum = digitizerStep(voltage);
  const lines = hum(voltage, quiet, context.mains_hz);
  const passive = freedOfHum({ ...found.passive, quantum_mv: quantum.value }, quiet, lines['mains_hum_hz']!);
  const baseline = steadyBaseline(measureBaseline(passive), stimulus);
  const level = baseline['baseline_mv']!;
  const riding = slowNoise(lines, baseline, found.noise_mv);
  const fast_mv = fastNoise(voltage.samples, voltage.rate_hz);
  const spikes = found.passive.spikes.map((spike, index) =>
    withHalfWidths(withHeightFromRest(spike, level.value), found.errors[index]!, riding, level.u95 ?? null),
  );
  const drift = driftUnder(passive);
  const bridgeStep = measureBridgeStep(passive);
  const blocked = isBlocked(spikes, stimulus, voltage, context.slow);
  const trains = measureTrains(spikes, stimulus, voltage, blocked, context.slow);
  const readings: Readings = {
    ...stimulusReadings({ ...command, stimulus }, current, bias),
    ...baseline,
    ...measureFiring(spikes, stimulus, voltage, context.filter_khz),
    ...trains,
    pulse_response_mohm: pulseResponse(voltage, stimulus, current, spikes, fast_mv),
    spikelets: context.slow
      ? absent('not-this-class')
      : countSpikelets(
          voltage,
          spikes,
          stimulus,
          fast_mv,
          context.prominence_mv,
          trains['block_onset_ms']?.at?.from_s ?? null,
        ),
    ...measureDeflections(passive, level, drift),
    bridge_step_mv: bridgeStep,
    access_resistance_mohm: accessFromBridge(input.bridge_mohm, bridgeStep, stimulus),
    noise_rms_mv: noise(voltage, quiet, context.filter_khz),
    ...lines,
    filter_corner_khz: filterCorner(voltage, quiet, quantum.value),
    clipped_fraction: clippedFraction(voltage),
    missing_fraction: missingFraction(voltage),
    quantum_mv: quantum,
    sample_interval_us: sampleInterval(voltage),
    rise_samples: fewestOnRise(spikes),
  };
  return {
    clamp: 'current',
    duration_s: durationOf(voltage),
    stimulus,
    readings,
    spikes,
    depolarization_block: blocked,
    remarks: [...command.remarks, ...remarks, ...found.remarks],
    voltage_envelope: envelopeOf(voltage, outlineColumns),
    current_envelope,
    first_spike: spikes[0] ? excerptOf(voltage, spikes[0]) : null,
    step_response: stepResponse(passive, drift),
    spontaneous: measureSpontaneous(spikes, stimulus, voltage, context),
    ...carried,
  };
}

/**
 * Spikes need the baseline they are counted from, and the baseline must leave the spikes out: a median that a few
 * spikes cannot move goes first, and is replaced once the spikes are known.
 */
function spikesAndBaseline(
  voltage: Signal,
  current: Signal | null,
  stimulus: Stimulus,
  levels: readonly Level[],
  context: MeasureContext,
): { passive: PassiveInput & { spikes: Spike[] }; errors: Errors[]; noise_mv: number; remarks: string[] } {
  const { slow, mains_hz, filter_khz } = context;
  const input = <S extends readonly Spike[]>(spikes: S): PassiveInput & { spikes: S } => ({
    voltage,
    stimulus,
    levels,
    spikes,
    slow,
    mains_hz,
    filter_khz,
  });
  const first = measureBaseline(input([]))['baseline_mv']!.value;
  const found = measureSpikes({ voltage, current, stimulus, baseline_mv: first, context });
  const { errors, noise_mv, remarks } = found;
  return { passive: input(found.spikes), errors, noise_mv, remarks };
}

/**
 * The sweep without its mains hum where the hum is resolved: fitted to the quiet stretches and to the later half of a
 * step without spikes, so that its frequency holds over the whole of the sweep.
 */
function freedOfHum(passive: PassiveInput, quiet: readonly Stretch[], hum_hz: Reading): PassiveInput {
  // Too little quiet for the hum to be measured need not be too little for it to be seen together with the step.
  const tried: number | null = hum_hz.value ?? (hum_hz.why === 'no-spike-free-stretch' ? passive.mains_hz : null);
  if (tried === null) return passive;
  const { voltage, stimulus, spikes, slow } = passive;
  const step = stimulus.kind === 'step' && stimulus.onset_s !== null && stimulus.end_s !== null ? stimulus : null;
  const late = step
    ? without(
        { from: indexAt(voltage, (step.onset_s! + step.end_s!) / 2), to: indexAt(voltage, step.end_s!) },
        spikeHoles(voltage, spikes, slow),
      )
    : [];
  const parts = [...quiet, ...late];
  return { ...passive, voltage: withoutHum(voltage, parts, tried, hum_hz.value !== null), recorded: voltage };
}

/** A level known no better than this, mV, where no stimulus is known: common practice, no source. */
const vaguestBaseline_mv = 5;

/**
 * Where no stimulus was recorded or stated, a stretch whose potential travels (a ramp, a relaxation) is no baseline: the
 * mean of a journey is nobody's level. Its spread stays.
 */
function steadyBaseline(baseline: Readings, stimulus: Stimulus): Readings {
  const { value, u95 = 0, sd = 0 } = baseline['baseline_mv']!;
  if (stimulus.kind !== 'unknown' || value === null || u95 <= vaguestBaseline_mv) return baseline;
  const note = `the potential travels (SD ${sd.toFixed(0)} mV) and no stimulus says why`;
  return {
    ...baseline,
    baseline_mv: absent('no-baseline', { note }),
    baseline_drift_mv_per_s: absent('no-baseline', { note }),
  };
}

/** Wander of the baseline up to this counts as the recorder's, mV; what is more is the cell's own (common practice, no source). */
const mostWander_mv = 0.2;

/** Hum and wander that ride on a spike's potentials. Hum that does not stand out has no frequency and is noise. */
function slowNoise(humming: Readings, baseline: Readings, noise_mv: number): SlowNoise {
  const hum_hz = humming['mains_hum_hz']?.value ?? null;
  const hum_mv = hum_hz === null ? 0 : (humming['mains_hum_mv']?.value ?? 0);
  const spread = baseline['baseline_sd_mv']?.value ?? 0;
  const rest = Math.sqrt(Math.max(0, spread ** 2 - hum_mv ** 2 / 2 - noise_mv ** 2));
  return { hum_mv, hum_hz: hum_hz ?? 0, wander_mv: Math.min(mostWander_mv, rest) };
}

function withHeightFromRest(spike: Spike, baseline: number | null): Spike {
  const peak = spike.values['peak_mv'] ?? null;
  const why = { ...spike.why };
  const height = peak === null || baseline === null ? null : peak - baseline;
  if (height === null)
    why['height_from_rest_mv'] = baseline === null ? 'no-baseline' : (why['peak_mv'] ?? 'unresolved');
  else delete why['height_from_rest_mv'];
  return { ...spike, values: { ...spike.values, height_from_rest_mv: height }, why };
}

/** Holding and stimulus as readings, the bias that the file states added to what was held. */
function stimulusReadings(command: CommandReading, current: Signal | null, bias: number | null): Readings {
  const { stimulus, holding_sd } = command;
  const at =
    stimulus.onset_s === null || stimulus.end_s === null
      ? {}
      : { at: { from_s: stimulus.onset_s, to_s: stimulus.end_s } };
  const stated = stimulus.from === 'stated' ? { note: 'as stated; no current was recorded' } : {};
  const amplitude: Reading =
    stimulus.amplitude !== null
      ? measured(stimulus.amplitude, { ...at, ...stated })
      : stimulus.kind === 'none'
        ? measured(0, { note: 'no stimulus' })
        : withoutStep(stimulus);
  const holding: Reading =
    stimulus.holding === null
      ? absent('holding-unknown')
      : measured(stimulus.holding + (bias ?? 0), {
          ...(holding_sd === null ? {} : { sd: holding_sd }),
          ...(bias ? { note: `of it ${bias} pA bias` } : stated),
        });
  return {
    stimulus_pa: current || stimulus.from !== 'absent' ? amplitude : absent('no-stimulus'),
    holding_pa: holding,
  };
}

/** Access as the bridge saw it: what it took off, and what it left over at the edges of this step. */
function accessFromBridge(bridge: number | null, step: Reading, stimulus: Stimulus): Reading {
  if (bridge === null) return absent('fact-missing', { missing: ['bridge_mohm'] });
  if (step.value === null) return absent(step.why ?? 'no-electrode-transient');
  const pa = stimulus.amplitude!;
  const left = (step.value / pa) * 1000;
  const error = step.se === undefined ? {} : { se: Math.abs((step.se / pa) * 1000) };
  return measured(bridge + left, {
    ...error,
    note: `bridge ${bridge} MΩ and what it left over, ${left.toFixed(1)} MΩ`,
  });
}

function fewestOnRise(spikes: readonly Spike[]): Reading {
  const counts = spikes.flatMap((spike) => {
    const value = spike.values['rise_samples'] ?? null;
    return value === null ? [] : [{ value, spike: spike.spike }];
  });
  if (counts.length === 0) return absent(spikes.length === 0 ? 'no-spikes' : 'unresolved');
  const fewest = counts.reduce((least, one) => (one.value < least.value ? one : least));
  return measured(fewest.value, { n: counts.length, at: { spike: fewest.spike } });
}

/** After a stimulus the membrane is not quiet for this long, s. */
const afterStimulus_s = 0.1;

/**
 * Where the trace shows the recording and not the cell: outside stimuli and spikes. Where that is less than 50 ms, the
 * later half of a step without spikes counts too.
 */
function quietStretches(input: PassiveInput): Stretch[] {
  const { voltage, stimulus, levels, spikes, slow } = input;
  const whole = { from: 0, to: voltage.samples.length };
  const fromSpikes = spikeHoles(voltage, spikes, slow);
  const clear = (holes: readonly Stretch[]): Stretch[] =>
    without(whole, [...fromSpikes, ...holes]).flatMap((one) => readable(voltage.samples, one));
  const outside = clear(stimulusHoles(voltage, stimulus, levels, afterStimulus_s));
  const enough = gathered(voltage.samples, outside).length >= 0.05 * voltage.rate_hz;
  if (enough || stimulus.kind !== 'step') return outside;
  const settled = (stimulus.onset_s! + stimulus.end_s!) / 2;
  return clear([
    { from: indexAt(voltage, stimulus.onset_s!), to: indexAt(voltage, settled) },
    { from: indexAt(voltage, stimulus.end_s!), to: indexAt(voltage, stimulus.end_s! + afterStimulus_s) },
  ]);
}

/**
 * The stimulus within the time of the voltage. Both are placed by their own clocks; a current of another length or
 * rate is said so, and what lies beyond the voltage is cut.
 */
function alignedTo(
  voltage: Signal,
  current: Signal | null,
  command: CommandReading,
): { stimulus: Stimulus; remarks: string[] } {
  const remarks: string[] = [];
  let stimulus = command.stimulus;
  const starts = voltage.start_s;
  const ends = timeAt(voltage, voltage.samples.length);
  if (current && stimulus.from === 'channel') {
    if (Math.abs(current.rate_hz / voltage.rate_hz - 1) > 1e-6)
      remarks.push(
        `the current is sampled at ${current.rate_hz} Hz and the voltage at ${voltage.rate_hz} Hz; aligned by time`,
      );
    const currentEnds = timeAt(current, current.samples.length);
    const slack = 1.5 / Math.min(current.rate_hz, voltage.rate_hz);
    if (Math.abs(currentEnds - ends) > slack || Math.abs(current.start_s - starts) > slack)
      remarks.push(
        `the current runs from ${seconds(current.start_s)} to ${seconds(currentEnds)}, the voltage from ${seconds(starts)} to ${seconds(ends)}; aligned by time`,
      );
  }
  if (stimulus.onset_s !== null && stimulus.end_s !== null) {
    if (stimulus.onset_s >= ends || stimulus.end_s <= starts) {
      remarks.push('the stimulus lies outside the recorded voltage');
      stimulus = { ...stimulus, kind: 'none', onset_s: null, end_s: null, amplitude: null, edges_s: [] };
    } else if (stimulus.end_s > ends + 1e-9) {
      remarks.push('the voltage ends before the stimulus; the stimulus is cut to it');
      stimulus = { ...stimulus, end_s: ends, edges_s: stimulus.edges_s.filter((edge) => edge < ends) };
    }
  }
  return { stimulus, remarks };
}

const seconds = (value: number): string => `${Number(value.toPrecision(6))} s`;

/** A stated command on the samples of the current, mV; null where none is stated. Before its first time: that level. */
function statedCommand(stated: SweepInput['stated_stimulus'], current: Signal | null): Signal | null {
  if (stated?.kind !== 'levels' || stated.mv.length === 0 || !current) return null;
  const samples = new Float64Array(current.samples.length).fill(stated.mv[0]!);
  for (const [k, time] of stated.at_s.entries()) samples.fill(stated.mv[k]!, indexAt(current, time));
  return { samples, rate_hz: current.rate_hz, start_s: current.start_s };
}

function voltageClampSweep(
  input: SweepInput,
  voltage: Signal | null,
  current: Signal | null,
  context: MeasureContext,
): SweepMeasure {
  const said = voltage ? null : statedCommand(input.stated_stimulus, current);
  const command = readCommand(voltage ?? said, null, 'voltage');
  const { levels } = command;
  const stimulus: Stimulus = said ? { ...command.stimulus, from: 'stated' } : command.stimulus;
  const recorded: Readings = current
    ? {
        clipped_fraction: clippedFraction(current),
        missing_fraction: missingFraction(current),
        sample_interval_us: sampleInterval(current),
      }
    : Object.fromEntries(
        ['clipped_fraction', 'missing_fraction', 'sample_interval_us'].map((id) => [id, absent('no-current')]),
      );
  return {
    clamp: 'voltage',
    duration_s: durationOf(current, voltage),
    stimulus,
    readings: {
      ...recorded,
      ...setAsideCompensated(
        measureVoltageClamp(current, voltage ?? said, stimulus, levels, context.filter_khz, context.mains_hz),
        context.capacitance_pf,
        input.compensation ?? null,
      ),
    },
    spikes: [],
    depolarization_block: false,
    remarks: said ? [...command.remarks, 'the command is the one stated; none was recorded'] : command.remarks,
    voltage_envelope: voltage && envelopeOf(voltage, outlineColumns),
    current_envelope: current && envelopeOf(current, outlineColumns),
    first_spike: null,
    step_response: null,
    spontaneous: null,
    bridge_mohm: input.bridge_mohm,
    bias_pa: null,
  };
}
