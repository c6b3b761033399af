/** What the recording could and could not have resolved: sampling, filter, electrode, noise, clipping, drift, no cell. */
import type { NumberedSweep, Reading } from '../measure/types.ts';
import { measuredUncertainty } from './compare.ts';
import { firstSpike, ofSpike } from './physics.ts';
import { amount } from './sentences.ts';
import {
  type Answer,
  type CellQuestion,
  cellReading,
  type Held,
  isPresent,
  largestStimulusPa,
  medianReading,
  type Setting,
  type SweepQuestion,
  unheld,
  unheldReading,
} from './setting.ts';

/** Limits of ground `conditions`. Where each comes from stands in `checks.ts` beside the check. */
export const conditionLimits = {
  riseSamples: 5,
  /** Least product of filter corner (kHz) and rise time (height over measured maximum rise, ms). */
  filterTimesRise: 0.66,
  filterOverRate: 0.4,
  /** How many times the stated corner, or which part of it, the noise may show. */
  filterMismatch: 1.33,
  accessMohm: 35,
  accessChangePercent: 30,
  accessErrorMv: 10,
  bridgeErrorMv: 2,
  bridgeShareOfAccess: 0.1,
  humMv: 0.5,
  /** Hum weaker than this has no frequency worth reading. */
  humReadableMv: 0.05,
  mainsToleranceShare: 0.02,
  noiseMv: 0.5,
  quantumMv: 0.5,
  quantumRiseVPerS: 10,
  missingFraction: 0.05,
  driftMv: 5,
  rundownPercent: 10,
  baselineDriftMv: 2,
  emptyPipetteMv: -15,
  leastChargePf: 3,
  /** Most current that may hold a cell at rest, pA without sign, and the command potentials that count as such, mV. */
  holdingPa: 1000,
  restfulMv: [-100, -40],
  /** Largest alternation of a heart cell's beats as a share of their middle duration. */
  alternationShare: 0.1,
} as const;
const limits = conditionLimits;

interface Simple {
  quantity: string;
  subject: string;
  low?: number | null;
  high?: number | null;
  name: string;
  meaning: string;
  /** 95 % half-width besides the measured one. */
  uncertainty?: number;
  /**
   * The number's own half-width is left out: of an extreme its spread says nothing; of a number held against what the
   * recording could have shown, it holds the very loss that is asked about.
   */
  withoutOwn?: boolean;
  shifts?: readonly number[];
  remark?: string;
}

function hold(reading: Reading | undefined, simple: Simple): Answer {
  if (!isPresent(reading)) return unheldReading(simple.subject, reading);
  const { u95: _own, ...bare } = reading;
  const held: Held = {
    kind: 'held',
    quantity: simple.quantity,
    ...(simple.withoutOwn ? { reading: bare, standIn: '' } : { reading }),
    low: simple.low ?? null,
    high: simple.high ?? null,
    uncertainty: Math.hypot(simple.withoutOwn ? 0 : measuredUncertainty(reading), simple.uncertainty ?? 0),
    shifts: simple.shifts ?? [0],
    subject: simple.subject,
    lowName: simple.name,
    highName: simple.name,
    meaning: simple.meaning,
  };
  return simple.remark === undefined ? held : { ...held, remark: simple.remark };
}

const hasVoltage = (setting: Setting): boolean => setting.sweeps.some((sweep) => sweep.clamp === 'current');

/** Potential while nothing but the holding current flows. */
function quietPotential(setting: Setting): { reading: Reading | undefined; subject: string; quantity: string } {
  const rest = setting.measure.readings['resting_potential_mv'];
  const baseline = cellReading(setting, 'baseline_mv');
  if (isPresent(rest) || !(baseline || rest === undefined))
    return { reading: rest, subject: 'the resting potential', quantity: 'resting_potential_mv' };
  return { reading: baseline, subject: 'the baseline', quantity: 'baseline_mv' };
}

const spikesFired = (setting: Setting): number => setting.sweeps.reduce((sum, sweep) => sum + sweep.spikes.length, 0);

const noCell: CellQuestion = (setting) => {
  // A cell that fires is there; a voltage-clamp recording shows no potential of its own.
  if (!hasVoltage(setting) || spikesFired(setting) > 0) return null;
  const { reading, subject, quantity } = quietPotential(setting);
  return hold(reading, {
    quantity,
    subject,
    high: limits.emptyPipetteMv,
    name: `the ${amount('baseline_mv', limits.emptyPipetteMv)} that an empty or lost pipette stays above`,
    meaning: 'with no spike in any sweep there is no living cell in this recording',
    uncertainty: 2,
  });
};

const noMembrane: CellQuestion = (setting) => {
  const subject = 'the charge that a test pulse moves';
  const reading = cellReading(setting, 'transient_capacitance_pf');
  const of = cellReading(setting, 'cell_capacitance_pf');
  if (of?.why === 'compensated') return unheldReading(subject, of);
  const through = setting.measure.readings['membrane_resistance_mohm'];
  const seal = setting.measure.readings['seal_resistance_gohm'];
  const remark = isPresent(seal)
    ? `The resistance is that of a seal, ${amount('seal_resistance_gohm', seal.value)}.`
    : isPresent(through)
      ? `All the current flows through ${amount('membrane_resistance_mohm', through.value)}.`
      : '';
  const empty = isPresent(reading) && reading.value < limits.leastChargePf;
  return hold(reading, {
    quantity: 'transient_capacitance_pf',
    subject,
    low: limits.leastChargePf,
    name: `the ${amount('transient_capacitance_pf', limits.leastChargePf)} that a membrane takes up at least`,
    meaning: 'there is no cell behind the pipette, or its transient is compensated and nothing says so',
    ...(empty && remark ? { remark } : {}),
  });
};

/** Cells whose membrane is so large that a nanoampere is little. */
const giants: readonly string[] = ['skeletal-muscle', 'squid-axon'];

const holdingLeak: CellQuestion = (setting) => {
  if (giants.includes(setting.circumstances.like)) return null;
  const [lowest, highest] = limits.restfulMv;
  const held = setting.sweeps.filter(
    ({ clamp, stimulus }) =>
      clamp === 'voltage' && stimulus.holding !== null && stimulus.holding >= lowest && stimulus.holding <= highest,
  );
  const reading = medianReading(held, 'holding_current_pa');
  if (reading === null) return null;
  return hold(reading, {
    quantity: 'holding_current_pa',
    subject: 'the holding current',
    low: -limits.holdingPa,
    high: limits.holdingPa,
    name: `the ±${amount('holding_current_pa', limits.holdingPa)} that hold a cell near rest at most`,
    meaning: 'most of it is a leak: the seal was lost, or there is no cell',
  });
};

const heart: readonly string[] = ['ventricular-myocyte', 'stem-cell-cardiomyocyte', 'sinoatrial-node'];

const beatsAlike: CellQuestion = (setting) => {
  const reading = cellReading(setting, 'apd90_alternation_ms');
  const duration = cellReading(setting, 'apd90_ms');
  if (!heart.includes(setting.circumstances.like) || !isPresent(reading) || !isPresent(duration)) return null;
  const high = limits.alternationShare * duration.value;
  return hold(reading, {
    quantity: 'apd90_alternation_ms',
    subject: 'the alternation of the beats’ durations',
    high,
    name: `a tenth of the middle duration (${amount('apd90_ms', high)})`,
    meaning: 'long and short beats alternate, and a median over them describes neither',
  });
};

const escapedOf = (reading: Reading | undefined, subject: string): Answer =>
  hold(reading, {
    quantity: 'escaped_currents',
    subject,
    high: 0,
    name: 'the limit of none',
    meaning: 'the clamp does not hold the whole cell, and currents near them are not at the command potential',
    ...(isPresent(reading) && reading.note ? { remark: `Peaks ${reading.note}.` } : {}),
  });

const baselineNegative: CellQuestion = (setting) => {
  if (!hasVoltage(setting)) return null;
  const { reading, subject, quantity } = quietPotential(setting);
  return hold(reading, {
    quantity,
    subject,
    high: 0,
    name: '0 mV',
    meaning: 'a living cell is negative inside, so that a turned sign, an offset or a lost cell is likely',
    uncertainty: 2,
  });
};

const pulseSign: CellQuestion = (setting) => {
  const reading = cellReading(setting, 'pulse_response_mohm');
  if (!isPresent(reading)) return null;
  return hold(reading, {
    quantity: 'pulse_response_mohm',
    subject: 'the response to the brief pulses',
    low: 0,
    name: 'zero',
    meaning: 'the cell charges against the stored current, so that the sign of the current or of the voltage is turned',
  });
};

const riseSamples: CellQuestion = (setting) =>
  hold(cellReading(setting, 'rise_samples'), {
    quantity: 'rise_samples',
    subject: 'the smallest number of samples from threshold to peak',
    low: limits.riseSamples,
    name: `the ${limits.riseSamples} samples that a rise needs`,
    meaning: 'threshold, peak and maximum rise cannot be read off so few points',
    // Threshold lies between two samples.
    uncertainty: 0.5,
    withoutOwn: true,
  });

const filterPassesRise: CellQuestion = (setting) => {
  const rise = firstSpike(setting, 'max_rise_v_per_s');
  const subject = ofSpike('maximum rise', rise);
  const height = firstSpike(setting, 'spike_height_mv').reading;
  if (!rise.reading || !height || height.value <= 0)
    return unheldReading(subject, rise.absent ?? { value: null, why: 'no-spikes' });
  const corner = setting.circumstances.filter_khz;
  if (corner === null) return unheld(subject, 'the filter corner is not known', ['filter_khz']);
  const high = (corner * height.value) / limits.filterTimesRise;
  const cost = costOfFilter(setting);
  return hold(rise.reading, {
    quantity: 'max_rise_v_per_s',
    subject,
    high,
    name: `the ${amount('max_rise_v_per_s', high)} that a filter at ${corner} kHz passes with less than a quarter lost`,
    meaning: 'the true rise was steeper, and the peak higher, than this recording shows',
    // Corners are nominal, to about a tenth; the limit is as well known as the height it is taken from.
    uncertainty: high * Math.hypot(0.1, measuredUncertainty(height) / height.value),
    withoutOwn: true,
    ...(cost ? { remark: cost } : {}),
  });
};

const filterBelowSampling: CellQuestion = (setting) => {
  const subject = 'the sampling interval';
  const reading = cellReading(setting, 'sample_interval_us');
  const corner = setting.circumstances.filter_khz;
  if (!isPresent(reading)) return unheldReading(subject, reading);
  if (corner === null) return unheld(subject, 'the filter corner is not known', ['filter_khz']);
  const high = (limits.filterOverRate * 1000) / corner;
  return hold(reading, {
    quantity: 'sample_interval_us',
    subject,
    high,
    name: `the ${amount('sample_interval_us', high)} that a filter at ${corner} kHz asks for`,
    meaning: 'what the filter lets through folds back into the trace as noise',
    // Corners are nominal: about a tenth.
    uncertainty: 0.1 * high,
  });
};

/** What the filter is expected to have taken, in words; empty where it is not known. */
function costOfFilter(setting: Setting): string {
  const of = (id: string): number | null => firstSpike(setting, id).reading?.value ?? null;
  const [rise, height, width] = [of('rise_lost_percent'), of('height_lost_mv'), of('width_gained_percent')];
  if (rise === null || height === null || width === null) return '';
  const least = rise > 25 ? 'at least ' : '';
  return `The filter is expected to have taken ${least}${amount('rise_lost_percent', rise)} of the rise and ${amount('height_lost_mv', height)} of the height, and to have added ${amount('width_gained_percent', width)} to the width.`;
}

const filterAsStated: CellQuestion = (setting) => {
  const reading = cellReading(setting, 'filter_corner_khz');
  const corner = setting.circumstances.filter_khz;
  const subject = 'the filter corner that the noise shows';
  if (corner === null || !hasVoltage(setting)) return null;
  // Noise that shows no corner contradicts none.
  if (!isPresent(reading)) return unheldReading(subject, reading);
  return hold(reading, {
    quantity: 'filter_corner_khz',
    subject,
    low: corner / limits.filterMismatch,
    high: corner * limits.filterMismatch,
    name: `a third away from the stated ${corner} kHz`,
    meaning: 'the stated filter is not the one the trace went through, and what is said of its cost is wrong',
  });
};

const accessSubject = 'the access resistance';
const accessLimit = {
  quantity: 'access_resistance_mohm',
  subject: accessSubject,
  high: limits.accessMohm,
  name: `the ${limits.accessMohm} MΩ up to which published work accepts whole-cell recordings`,
  meaning: 'the pipette filters and shifts what the cell does',
} as const;

const accessResistance: CellQuestion = (setting) => {
  const { configuration } = setting.circumstances;
  const reading = cellReading(setting, 'access_resistance_mohm');
  if (configuration === null && isPresent(reading) && reading.value > limits.accessMohm)
    return unheld(
      accessSubject,
      `${amount('access_resistance_mohm', reading.value)} is much for a whole-cell recording and usual for a sharp electrode, and which it was is not stated`,
      ['configuration'],
    );
  if (configuration !== null && configuration !== 'whole-cell') return null;
  return hold(reading, accessLimit);
};

const accessResistanceSweep: SweepQuestion = (setting, sweep) => {
  if (setting.circumstances.configuration !== 'whole-cell' || !isPresent(sweep.readings['access_resistance_mohm']))
    return null;
  return hold(sweep.readings['access_resistance_mohm'], accessLimit);
};

const accessChange: CellQuestion = (setting) => {
  const reading = setting.measure.readings['access_change_percent'];
  if (reading === undefined) return null;
  return hold(reading, {
    quantity: 'access_change_percent',
    subject: 'the change of the access resistance',
    low: -limits.accessChangePercent,
    high: limits.accessChangePercent,
    name: `±${limits.accessChangePercent} %`,
    meaning: 'spikes early and late in the recording passed through different pipettes',
  });
};

const accessTimesCurrent: CellQuestion = (setting) => {
  const reading = cellReading(setting, 'access_resistance_mohm');
  const inClamp = cellReading(setting, 'holding_current_pa');
  const compensated =
    setting.circumstances.bridge_mohm !== null || isPresent(setting.measure.readings['bridge_error_mohm']);
  // A pulse of a few milliseconds is over before the spike that it starts.
  const step = hasVoltage(setting) && !compensated ? largestStimulusPa(setting, 0.02) : null;
  // What flowed is known well within a sweep; that it differs from sweep to sweep is no doubt about it.
  const current = Math.max(isPresent(inClamp) ? Math.abs(inClamp.value) : 0, step ?? 0);
  // Nothing flows, or the bridge is accounted for by its own check.
  if (current === 0) return null;
  const high = (limits.accessErrorMv * 1000) / current;
  return hold(reading, {
    quantity: 'access_resistance_mohm',
    subject: accessSubject,
    high,
    name: `the ${amount('access_resistance_mohm', high)} across which ${amount('holding_pa', current)} drops ${limits.accessErrorMv} mV`,
    meaning: 'the potential read at the amplifier is not the potential of the cell',
  });
};

const bridgeError: CellQuestion = (setting) => {
  const reading = setting.measure.readings['bridge_error_mohm'];
  if (!hasVoltage(setting)) return null;
  const subject = 'the bridge error';
  const largest = largestStimulusPa(setting);
  if (!isPresent(reading)) return unheldReading(subject, reading);
  if (largest === null || largest === 0) return unheld(subject, 'no stimulus was recorded or stated');
  const access = cellReading(setting, 'access_resistance_mohm');
  const bySize = (limits.bridgeErrorMv * 1000) / largest;
  const byAccess = isPresent(access) ? limits.bridgeShareOfAccess * access.value : 0;
  const high = Math.max(bySize, byAccess);
  return hold(reading, {
    quantity: 'bridge_error_mohm',
    subject,
    low: -high,
    high,
    name:
      high === bySize
        ? `the ±${amount('bridge_error_mohm', high)} across which ${amount('holding_pa', largest)} drops ${limits.bridgeErrorMv} mV`
        : `a tenth of the access resistance (±${amount('bridge_error_mohm', high)})`,
    meaning: `at the largest stimulus every potential is off by ${amount('steady_deflection_mv', (reading.value * largest) / 1000)}`,
    uncertainty: high !== bySize && isPresent(access) ? limits.bridgeShareOfAccess * measuredUncertainty(access) : 0,
  });
};

const clippedMeaning = 'what lay beyond the recorder’s range is lost, peaks first';
const clipping = (reading: Reading | undefined, subject: string): Answer =>
  hold(reading, { quantity: 'clipped_fraction', subject, high: 0, name: 'the limit of zero', meaning: clippedMeaning });

const missing = (reading: Reading | undefined, subject: string): Answer =>
  hold(reading, {
    quantity: 'missing_fraction',
    subject,
    high: limits.missingFraction,
    name: 'one value in twenty',
    meaning: 'too much is unreadable for the rest to be trusted',
  });

const hum = (reading: Reading | undefined, subject: string): Answer =>
  hold(reading, {
    quantity: 'mains_hum_mv',
    subject,
    high: limits.humMv,
    name: `${limits.humMv} mV`,
    meaning: 'thresholds, rests and rates carry the mains',
  });

const noise = (reading: Reading | undefined, subject: string): Answer =>
  hold(reading, {
    quantity: 'noise_rms_mv',
    subject,
    high: limits.noiseMv,
    name: `${limits.noiseMv} mV`,
    meaning: 'maximum rise and threshold are read off noise',
    ...(reading?.note ? { remark: `Band: ${reading.note}.` } : {}),
  });

const humFrequency: CellQuestion = (setting) => {
  const subject = 'the frequency of the hum';
  const reading = cellReading(setting, 'mains_hum_hz');
  // Of the sweeps whose hum stands out enough to have a frequency; the rest says nothing of it.
  const carriers = setting.sweeps.filter((sweep) => isPresent(sweep.readings['mains_hum_hz']));
  const size = medianReading(carriers, 'mains_hum_mv') ?? cellReading(setting, 'mains_hum_mv');
  if (!isPresent(reading)) return unheldReading(subject, reading);
  if (isPresent(size) && size.value < limits.humReadableMv)
    return unheld(subject, `the hum of ${amount('mains_hum_mv', size.value)} is too weak to have a frequency`);
  const stated = setting.circumstances.mains_hz;
  const nearest = stated ?? (Math.abs(reading.value - 50) <= Math.abs(reading.value - 60) ? 50 : 60);
  // A sine over T seconds has its frequency to about a quarter of 1/T.
  const seconds = Math.max(0.1, ...setting.sweeps.map((sweep) => sweep.duration_s));
  return hold(reading, {
    quantity: 'mains_hum_hz',
    subject,
    low: nearest * (1 - limits.mainsToleranceShare),
    high: nearest * (1 + limits.mainsToleranceShare),
    name: `the mains’ own ${nearest} Hz (±2 %)`,
    meaning: 'no mains runs at that frequency, so that the stated sampling rate is likely wrong',
    uncertainty: measuredUncertainty(reading) > 0 ? 0 : 0.25 / seconds,
  });
};

const quantization: CellQuestion = (setting) => {
  if (!hasVoltage(setting)) return null;
  const subject = 'the step of the digitizer';
  const reading = cellReading(setting, 'quantum_mv');
  const interval = cellReading(setting, 'sample_interval_us');
  const bySlope = isPresent(interval)
    ? (limits.quantumRiseVPerS * 2 * interval.value) / 1000
    : Number.POSITIVE_INFINITY;
  const high = Math.min(limits.quantumMv, bySlope);
  return hold(reading, {
    quantity: 'quantum_mv',
    subject,
    high,
    name: `the ${amount('quantum_mv', high)} that threshold and noise can bear`,
    meaning: 'a single step of the digitizer looks like the start of a spike, and noise below it is invisible',
  });
};

const drift: CellQuestion = (setting) => {
  if (!hasVoltage(setting)) return null;
  const subject = 'the drift of the baseline over the recording';
  const reading = setting.measure.readings['drift_mv_per_min'];
  const times = setting.sweeps.flatMap((sweep) => (sweep.since_start_s === null ? [] : [sweep.since_start_s]));
  if (!isPresent(reading)) return unheldReading(subject, reading);
  if (times.length < 2) return unheld(subject, 'the times of the sweeps are not known');
  const minutes = Math.max(1, (Math.max(...times) - Math.min(...times)) / 60);
  const high = limits.driftMv / minutes;
  return hold(reading, {
    quantity: 'drift_mv_per_min',
    subject,
    low: -high,
    high,
    name: `${limits.driftMv} mV over ${minutes.toFixed(minutes < 10 ? 1 : 0)} min (±${amount('drift_mv_per_min', high)})`,
    meaning: 'early and late sweeps do not show the cell in the same state',
  });
};

/** How much of a falling height the sodium explains that firing brings in; nothing where the cell's volume is not stated. */
function gradientsExplain(setting: Setting, observed: number): string | undefined {
  const { dialysed_rundown_percent_per_100_spikes: dialysed, expected_rundown_percent_per_100_spikes: alone } =
    setting.measure.readings;
  const expected = isPresent(dialysed) ? dialysed : alone;
  if (observed >= 0 || !isPresent(expected)) return undefined;
  const between = isPresent(dialysed) ? 'with the pipette’s exchange' : 'without pump or pipette';
  const half = amount('expected_rundown_percent_per_100_spikes', measuredUncertainty(expected));
  return `The sodium that firing brings in would explain ${amount('expected_rundown_percent_per_100_spikes', expected.value)} ± ${half} of it, ${between}.`;
}

const heightRundown: CellQuestion = (setting) => {
  if (!hasVoltage(setting)) return null;
  const subject = 'the rundown of the spike height';
  const reading = setting.measure.readings['height_rundown_percent_per_100_spikes'];
  const fired = spikesFired(setting);
  if (!isPresent(reading)) return unheldReading(subject, reading);
  if (fired === 0) return unheld(subject, 'no spike was fired');
  const high = (limits.rundownPercent * 100) / fired;
  const explained = gradientsExplain(setting, reading.value);
  return hold(reading, {
    quantity: 'height_rundown_percent_per_100_spikes',
    subject: `${subject} per 100 spikes`,
    low: -high,
    high,
    name: `${limits.rundownPercent} % over the ${fired} spikes fired (±${amount('height_rundown_percent_per_100_spikes', high)})`,
    meaning: 'early and late spikes do not show the cell in the same state',
    ...(explained === undefined ? {} : { remark: explained }),
  });
};

/** A pacemaker’s baseline climbs by itself; only a cell that waits for its stimulus has a drift. */
const firesBefore = (sweep: NumberedSweep): boolean => {
  const onset = sweep.stimulus.onset_s ?? sweep.duration_s;
  return sweep.spikes.some((spike) => (spike.values['peak_at_s'] ?? Number.POSITIVE_INFINITY) < onset);
};

function baselineDriftOf(reading: Reading | undefined, seconds: number, subject: string): Answer {
  const high = limits.baselineDriftMv / Math.max(0.05, seconds);
  return hold(reading, {
    quantity: 'baseline_drift_mv_per_s',
    subject,
    low: -high,
    high,
    name: `${limits.baselineDriftMv} mV over the baseline (±${amount('baseline_drift_mv_per_s', high)})`,
    meaning: 'the deflection and the resting level of such a sweep are not settled',
  });
}
const baselineSeconds = (sweep: NumberedSweep): number => Math.min(0.5, sweep.stimulus.onset_s ?? sweep.duration_s);

const baselineDrift: CellQuestion = (setting) => {
  const quiet = setting.sweeps.filter((sweep) => sweep.clamp === 'current' && !firesBefore(sweep));
  if (quiet.length === 0) return null;
  return baselineDriftOf(
    cellReading({ ...setting, sweeps: quiet }, 'baseline_drift_mv_per_s'),
    Math.max(...quiet.map(baselineSeconds)),
    'the drift within the baseline',
  );
};

export const conditionQuestions: Record<string, CellQuestion> = {
  'no-cell': noCell,
  'pulse-sign': pulseSign,
  'no-membrane': noMembrane,
  'holding-leak': holdingLeak,
  'beats-alike': beatsAlike,
  'escaped-currents': (setting) =>
    escapedOf(setting.measure.readings['escaped_currents'], 'the number of escaped action currents'),
  'baseline-negative': baselineNegative,
  'rise-samples': riseSamples,
  'filter-passes-rise': filterPassesRise,
  'filter-below-sampling': filterBelowSampling,
  'filter-as-stated': filterAsStated,
  'access-resistance': accessResistance,
  'access-change': accessChange,
  'access-times-current': accessTimesCurrent,
  'bridge-error': bridgeError,
  clipping: (setting) => clipping(cellReading(setting, 'clipped_fraction'), 'the share of clipped samples'),
  missing: (setting) => missing(cellReading(setting, 'missing_fraction'), 'the share of unreadable samples'),
  'mains-hum': (setting) => (hasVoltage(setting) ? hum(cellReading(setting, 'mains_hum_mv'), 'the mains hum') : null),
  'hum-frequency': (setting) => (hasVoltage(setting) ? humFrequency(setting) : null),
  noise: (setting) => (hasVoltage(setting) ? noise(cellReading(setting, 'noise_rms_mv'), 'the noise') : null),
  quantization,
  drift,
  'height-rundown': heightRundown,
  'baseline-drift': baselineDrift,
};

/** Sweep-level twins of the checks above. They answer only where the sweep has the number. */
const ofSweep =
  (quantity: string, ask: (reading: Reading, subject: string) => Answer, words: string): SweepQuestion =>
  (_setting, sweep) => {
    const reading = sweep.readings[quantity];
    return isPresent(reading) ? ask(reading, `${words} in sweep ${sweep.sweep}`) : null;
  };

const namedSweep = (answer: Answer | null, sweep: NumberedSweep): Answer | null =>
  answer && { ...answer, subject: `${answer.subject} in sweep ${sweep.sweep}` };

export const sweepQuestions: Record<string, SweepQuestion> = {
  clipping: ofSweep('clipped_fraction', clipping, 'the share of clipped samples'),
  missing: ofSweep('missing_fraction', missing, 'the share of unreadable samples'),
  'mains-hum': ofSweep('mains_hum_mv', hum, 'the mains hum'),
  noise: ofSweep('noise_rms_mv', noise, 'the noise'),
  'escaped-currents': ofSweep('escaped_currents', escapedOf, 'the number of escaped action currents'),
  'access-resistance': (setting, sweep) => namedSweep(accessResistanceSweep(setting, sweep), sweep),
  'baseline-drift': (_setting, sweep) => {
    const reading = sweep.readings['baseline_drift_mv_per_s'];
    if (sweep.clamp !== 'current' || firesBefore(sweep) || !isPresent(reading)) return null;
    return baselineDriftOf(reading, baselineSeconds(sweep), `the drift within the baseline of sweep ${sweep.sweep}`);
  },
};
