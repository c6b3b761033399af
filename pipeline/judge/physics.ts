/** Impossibilities under the stated conditions. Each answers with what is missing where a fact is missing. */
import type { NumberedSweep, Reading } from '../measure/types.ts';
import { classRanges, shippedClass } from './class-ranges.ts';
import { combined, junctionReadings, measuredUncertainty, offsetUncertaintyMv, physicsFloorMv } from './compare.ts';
import { amount, celsius } from './sentences.ts';
import {
  type Answer,
  type CellQuestion,
  isPresent,
  medianReading,
  type Setting,
  type Unheld,
  unheld,
  unheldReading,
} from './setting.ts';
import type { Circumstances, IonPotential } from './types.ts';

/** This many spikes in a sweep count as a train that leaves the sodium pump running (ours). */
const trainSpikes = 10;
/** How long the pump may hold the membrane below E_K after a train, s (DESIGN 7). */
const pumpSeconds = 5;

/** The reading's own 95 % half-width; where it carries none, the noise of a single sample stands in, mV. */
function potentialUncertainty(setting: Setting, reading: Reading): number {
  if (reading.u95 !== undefined) return reading.u95;
  const noise = setting.measure.readings['noise_rms_mv'];
  return isPresent(noise) ? 1.96 * noise.value : 0;
}

const noiseStandsIn = 'The number’s own uncertainty is not known; 1.96 times the noise was counted in its place.';

const standIn = (setting: Setting): { standIn?: string } =>
  isPresent(setting.measure.readings['noise_rms_mv']) ? { standIn: noiseStandsIn } : {};

function whole(setting: Setting, subject: string): Unheld | null {
  const { configuration } = setting.circumstances;
  if (configuration === null)
    return unheld(subject, 'it is not stated how the cell was recorded from', ['configuration']);
  if (configuration !== 'whole-cell')
    return unheld(
      subject,
      `the ions inside are those of the pipette only in whole-cell recordings, and this one is stated as ${configuration}`,
    );
  return null;
}

type Ion = { ok: true; ion: IonPotential; name: string } | { ok: false; answer: Unheld };

const at = (circumstances: Circumstances): string =>
  circumstances.temperature_c === null ? '' : ` at ${celsius(circumstances.temperature_c)}`;

function potassium(setting: Setting, subject: string): Ion {
  const { circumstances } = setting;
  const barred = whole(setting, subject);
  if (barred) return { ok: false, answer: barred };
  const ion = circumstances.e_k;
  if (!ion) return { ok: false, answer: unheld(subject, 'E_K is not known', circumstances.missing_e_k) };
  return { ok: true, ion, name: `E_K (${amount('peak_mv', ion.mv)}${at(circumstances)})` };
}

/** E_Na as a limit: needs a whole-cell recording with pipette sodium, and a spike that sodium carries. */
function sodium(setting: Setting, subject: string, ofSpike: boolean): Ion {
  const { circumstances } = setting;
  const barred = whole(setting, subject);
  if (barred) return { ok: false, answer: barred };
  if (ofSpike) {
    const ion = circumstances.spike_ion ?? classRanges[shippedClass(circumstances.like)].spike_ion;
    if (ion === null)
      return {
        ok: false,
        answer: unheld(subject, 'it is not stated that sodium carries the spike', ['spike_ion', 'class']),
      };
    if (ion !== 'sodium')
      return {
        ok: false,
        answer: unheld(subject, 'E_Na is no limit for a spike that calcium carries in whole or in part'),
      };
  }
  const ion = circumstances.e_na;
  if (!ion) {
    if (circumstances.missing_e_na.length === 0 && !circumstances.pipette_sodium_mm)
      return {
        ok: false,
        answer: unheld(subject, 'the pipette solution holds no sodium, so that E_Na sets no limit'),
      };
    return { ok: false, answer: unheld(subject, 'E_Na is not known', circumstances.missing_e_na) };
  }
  if (!circumstances.pipette_sodium_mm)
    return {
      ok: false,
      answer: unheld(subject, 'the pipette solution states no sodium, so that E_Na sets no limit', ['pipette']),
    };
  return { ok: true, ion, name: `E_Na (${amount('peak_mv', ion.mv)}${at(circumstances)})` };
}

interface Potential {
  setting: Setting;
  quantity: string;
  subject: string;
  reading: (Reading & { value: number }) | null;
  /** Why there is no reading. */
  absent: Reading | undefined;
  side: 'above' | 'below';
  limit: Ion;
  meaning: string;
  remark?: string;
}

/** An absolute potential against an equilibrium potential, with the junction, offset, ions and measurement combined. */
function against(question: Potential): Answer {
  const { setting, subject, reading, limit } = question;
  if (!reading) return unheldReading(subject, question.absent);
  if (!limit.ok) return limit.answer;
  const junction = junctionReadings(setting.circumstances);
  const uncertainty = Math.max(
    physicsFloorMv,
    combined(
      offsetUncertaintyMv,
      junction.uncertainty_mv,
      limit.ion.uncertainty_mv,
      potentialUncertainty(setting, reading),
    ),
  );
  return {
    kind: 'held',
    reading,
    low: question.side === 'above' ? limit.ion.mv : null,
    high: question.side === 'below' ? limit.ion.mv : null,
    uncertainty,
    shifts: junction.shifts,
    subject,
    lowName: limit.name,
    highName: limit.name,
    meaning: question.meaning,
    ...standIn(setting),
    ...(question.remark === undefined ? {} : { remark: question.remark }),
  };
}

interface FirstSpike {
  reading: (Reading & { value: number }) | null;
  absent: Reading | undefined;
  sweep: NumberedSweep | null;
  at_s: number | null;
}

/** The cell's first spike at rheobase; where no step fires the cell, the first spike of its first firing sweep. */
export function firstSpike(setting: Setting, quantity: string): FirstSpike {
  const own = setting.measure.readings[quantity];
  const reference = setting.measure.reference_spike;
  const sweep = reference
    ? (setting.sweeps.find((one) => one.sweep === reference.sweep) ?? null)
    : (setting.sweeps.find((one) => one.spikes.length > 0) ?? null);
  const spike = reference && sweep ? sweep.spikes.find((one) => one.spike === reference.spike) : sweep?.spikes[0];
  const at_s = spike?.values['peak_at_s'] ?? null;
  if (isPresent(own)) return { reading: own, absent: own, sweep, at_s };
  const value = spike?.values[quantity] ?? null;
  if (value === null) {
    const why = spike?.why[quantity];
    return { reading: null, absent: own ?? (why ? { value: null, why } : undefined), sweep, at_s };
  }
  const u95 = spike?.u95?.[quantity];
  const reading = { value, n: 1, ...(u95 === undefined ? {} : { u95 }), at: { sweep: sweep!.sweep } };
  return { reading, absent: undefined, sweep, at_s };
}

/** 'the peak of the first spike', or of a median over spikes where no step fires the cell: 'the median peak of the spikes'. */
export const ofSpike = (words: string, spike: FirstSpike): string =>
  (spike.reading?.n ?? 1) > 1 ? `the median ${words} of the spikes` : `the ${words} of the first spike`;

const located = (spike: FirstSpike): (Reading & { value: number }) | null => {
  if (!spike.reading) return null;
  const place = {
    ...(spike.sweep ? { sweep: spike.sweep.sweep } : {}),
    ...(spike.at_s === null ? {} : { from_s: spike.at_s }),
  };
  return { ...spike.reading, at: { ...place, ...spike.reading.at } };
};

/** Current below zero that cannot matter: half a millivolt across the cell's resistance, else 1 pA. */
function negligiblePa(setting: Setting): number {
  const resistance = setting.measure.readings['input_resistance_mohm'];
  return isPresent(resistance) && resistance.value > 0 ? 500 / resistance.value : 1;
}

/** Holding current with bias of a sweep, pA; null where it is not known. */
function holdingPa(setting: Setting, sweep: NumberedSweep): number | null {
  const reading = sweep.readings['holding_pa'];
  if (isPresent(reading)) return reading.value;
  return sweep.stimulus.kind === 'none' ? setting.circumstances.bias_pa : null;
}

/** Total injected current at a time of a sweep, pA; null where the stimulus does not say. */
function totalPa(setting: Setting, sweep: NumberedSweep, at_s: number): number | null {
  const holding = holdingPa(setting, sweep);
  const { kind, onset_s, end_s, amplitude } = sweep.stimulus;
  if (holding === null) return null;
  if (kind === 'none') return holding;
  if (onset_s !== null && at_s < onset_s) return holding;
  if (end_s !== null && at_s > end_s) return holding;
  if (kind === 'step') return amplitude === null ? null : holding + amplitude;
  // On a ramp the current lies between holding and its end.
  if (kind === 'ramp') return amplitude === null ? null : holding + Math.min(0, amplitude);
  return null;
}

/** Whether a sweep starts within 5 s after a train. Without clock times the sweep right after a train counts. */
function afterTrain(setting: Setting, sweep: NumberedSweep): boolean {
  return setting.allSweeps.some((earlier) => {
    if (earlier.sweep >= sweep.sweep || earlier.spikes.length < trainSpikes) return false;
    if (earlier.since_start_s === null || sweep.since_start_s === null) return earlier.sweep === sweep.sweep - 1;
    const last = earlier.spikes.at(-1)?.values['peak_at_s'] ?? earlier.duration_s;
    return sweep.since_start_s - (earlier.since_start_s + last) < pumpSeconds;
  });
}

const peakBelowSodium: CellQuestion = (setting) => {
  const spike = firstSpike(setting, 'peak_mv');
  const subject = ofSpike('peak', spike);
  return against({
    setting,
    quantity: 'peak_mv',
    subject,
    reading: located(spike),
    absent: spike.absent,
    side: 'below',
    limit: sodium(setting, subject, true),
    meaning: 'no sodium spike can do that',
  });
};

const ahpAbovePotassium: CellQuestion = (setting) => {
  const spike = firstSpike(setting, 'ahp_minimum_mv');
  const subject =
    (spike.reading?.n ?? 1) > 1 ? 'the median minimum after the spikes' : 'the minimum after the first spike';
  const limit = potassium(setting, subject);
  if (spike.reading && limit.ok) {
    if (!spike.sweep || spike.at_s === null)
      return unheld(subject, 'the sweep it was read from is not known, and with it the injected current');
    const total = totalPa(setting, spike.sweep, spike.at_s);
    if (total === null) return unheld(subject, 'the total injected current at that time is not known', ['bias_pa']);
    if (total < -negligiblePa(setting))
      return unheld(subject, `${amount('holding_pa', total)} was injected, which may pull the membrane below E_K`);
    if (afterTrain(setting, spike.sweep))
      return unheld(subject, 'it lies within 5 s after a train, when the sodium pump may pull the membrane below E_K');
  }
  return against({
    setting,
    quantity: 'ahp_minimum_mv',
    subject,
    reading: located(spike),
    absent: spike.absent,
    side: 'above',
    limit,
    meaning: 'without negative current no potassium conductance can pull the membrane there',
  });
};

/** The median over sweeps that satisfy a rule, where some of those behind the cell's reading do not. */
function quietBaseline(setting: Setting, allowed: (holding: number) => boolean) {
  const candidates = setting.sweeps.filter((sweep) => {
    const holding = holdingPa(setting, sweep);
    return (
      sweep.clamp === 'current' && holding !== null && allowed(holding) && isPresent(sweep.readings['baseline_mv'])
    );
  });
  const rested = candidates.filter((sweep) => !afterTrain(setting, sweep));
  return { candidates, rested, reading: medianReading(rested, 'baseline_mv') };
}

const restAbovePotassium: CellQuestion = (setting) => {
  const subject = 'the resting potential';
  const own = setting.measure.readings['resting_potential_mv'];
  const limit = potassium(setting, subject);
  let reading = isPresent(own) ? own : null;
  let remark: string | undefined;
  if (reading && limit.ok) {
    const free = negligiblePa(setting);
    const quiet = quietBaseline(setting, (holding) => Math.abs(holding) <= Math.max(free, 1));
    const left = quiet.candidates.length - quiet.rested.length;
    if (left > 0) {
      if (!quiet.reading)
        return unheld(
          subject,
          'every sweep without current starts within 5 s after a train, when the sodium pump may pull the membrane below E_K',
        );
      reading = quiet.reading;
      remark = `Left out: ${left} of ${quiet.candidates.length} sweeps without current, which start within 5 s after a train.`;
    }
  }
  return against({
    setting,
    quantity: 'resting_potential_mv',
    subject,
    reading,
    absent: own,
    side: 'above',
    limit,
    meaning: 'without injected current no membrane rests there',
    ...(remark === undefined ? {} : { remark }),
  });
};

const baselineAbovePotassium: CellQuestion = (setting) => {
  // Where the cell has a resting potential that one is judged.
  if (isPresent(setting.measure.readings['resting_potential_mv'])) return null;
  if (!setting.sweeps.some((sweep) => sweep.clamp === 'current')) return null;
  const subject = 'the baseline under zero or positive holding current';
  const limit = potassium(setting, subject);
  const quiet = quietBaseline(setting, (holding) => holding >= -negligiblePa(setting));
  const recorded = isPresent(setting.measure.readings['baseline_mv']);
  if (!quiet.reading && (limit.ok || recorded))
    return quiet.candidates.length > 0
      ? unheld(subject, 'every such sweep starts within 5 s after a train')
      : unheld(subject, 'no sweep is known to have been held with zero or positive current', ['bias_pa']);
  return against({
    setting,
    quantity: 'baseline_mv',
    subject,
    reading: quiet.reading,
    absent: setting.measure.readings['baseline_mv'],
    side: 'above',
    limit,
    meaning: 'positive current cannot hold a membrane below E_K',
  });
};

const diastolicAbovePotassium: CellQuestion = (setting) => {
  const own = setting.measure.readings['maximum_diastolic_potential_mv'];
  // Most cells do not fire by themselves: nothing to say then.
  if (!isPresent(own)) return null;
  const subject = 'the maximum diastolic potential';
  const limit = potassium(setting, subject);
  if (limit.ok) {
    const firing = setting.sweeps.filter((sweep) => sweep.spikes.length > 0);
    const holding = firing.map((sweep) => holdingPa(setting, sweep));
    if (holding.includes(null)) return unheld(subject, 'the total injected current is not known', ['bias_pa']);
    if (holding.some((pa) => pa! < -negligiblePa(setting)))
      return unheld(subject, 'negative current was injected, which may pull the membrane below E_K');
  }
  return against({
    setting,
    quantity: 'maximum_diastolic_potential_mv',
    subject,
    reading: own,
    absent: own,
    side: 'above',
    limit,
    meaning: 'without negative current no potassium conductance can pull the membrane there',
  });
};

const restBelowSodium: CellQuestion = (setting) => {
  const own = setting.measure.readings['resting_potential_mv'];
  const subject = 'the resting potential';
  return against({
    setting,
    quantity: 'resting_potential_mv',
    subject,
    reading: isPresent(own) ? own : null,
    absent: own,
    side: 'below',
    limit: sodium(setting, subject, false),
    meaning: 'no membrane rests above every equilibrium potential it could reach',
  });
};

const heightBelowSpan: CellQuestion = (setting) => {
  const spike = firstSpike(setting, 'spike_height_mv');
  const subject = ofSpike('height', spike);
  const reading = located(spike);
  if (!reading) return unheldReading(subject, spike.absent);
  const na = sodium(setting, subject, true);
  if (!na.ok) return na.answer;
  const k = potassium(setting, subject);
  if (!k.ok) return k.answer;
  const name = `the whole way from E_K to E_Na (${amount('spike_height_mv', na.ion.mv - k.ion.mv)}${at(setting.circumstances)})`;
  return {
    kind: 'held',
    reading,
    low: null,
    high: na.ion.mv - k.ion.mv,
    // A difference of two potentials of one trace: offset and junction cancel, the error of temperature does not.
    uncertainty: Math.max(
      physicsFloorMv,
      combined(na.ion.uncertainty_mv, k.ion.uncertainty_mv, potentialUncertainty(setting, reading)),
    ),
    shifts: [0],
    subject,
    lowName: name,
    highName: name,
    meaning: 'no sodium spike is that high, whatever the offset',
    ...standIn(setting),
  };
};

const spikeGoesUp: CellQuestion = (setting) => {
  const height = firstSpike(setting, 'spike_height_mv').reading;
  const spike = firstSpike(setting, 'height_from_rest_mv');
  const subject = `${ofSpike('height', spike)} above the baseline`;
  const reading = located(spike);
  if (!reading || !height) return unheldReading(subject, spike.absent ?? { value: null, why: 'no-spikes' });
  const name = `half the excursion itself (${amount('spike_height_mv', height.value / 2)})`;
  return {
    kind: 'held',
    reading,
    low: height.value / 2,
    high: null,
    uncertainty: Math.max(
      physicsFloorMv,
      // The limit is half the height: so is its share.
      combined(potentialUncertainty(setting, reading), potentialUncertainty(setting, height) / 2),
    ),
    shifts: [0],
    subject,
    lowName: name,
    highName: name,
    meaning: 'the excursion goes down from the baseline first, as no action potential does',
    ...standIn(setting),
  };
};

/** A resistance or capacitance of a passive membrane or electrode lies above zero. */
const positive =
  (quantity: string, subject: string, meaning: string): CellQuestion =>
  (setting) => {
    const own = setting.measure.readings[quantity];
    if (!isPresent(own)) return own === undefined ? null : unheldReading(subject, own);
    return {
      kind: 'held',
      reading: own,
      low: 0,
      high: null,
      uncertainty: measuredUncertainty(own),
      shifts: [0],
      subject,
      lowName: 'zero',
      highName: 'zero',
      meaning,
    };
  };

export const physicsQuestions: Record<string, CellQuestion> = {
  'peak-below-sodium': peakBelowSodium,
  'ahp-above-potassium': ahpAbovePotassium,
  'rest-above-potassium': restAbovePotassium,
  'baseline-above-potassium': baselineAbovePotassium,
  'diastolic-above-potassium': diastolicAbovePotassium,
  'rest-below-sodium': restBelowSodium,
  'height-below-sodium-potassium': heightBelowSpan,
  'spike-goes-up': spikeGoesUp,
  'input-resistance-positive': positive(
    'input_resistance_mohm',
    'the input resistance',
    'no membrane answers a negative current with a depolarization',
  ),
  'membrane-resistance-positive': positive(
    'membrane_resistance_mohm',
    'the membrane resistance',
    'at the holding potential no membrane passes current against the command',
  ),
  'membrane-capacitance-positive': positive(
    'membrane_capacitance_pf',
    'the membrane capacitance',
    'no membrane has a negative capacitance',
  ),
  'cell-capacitance-positive': positive(
    'cell_capacitance_pf',
    'the cell capacitance',
    'no membrane has a negative capacitance',
  ),
  'access-resistance-positive': positive(
    'access_resistance_mohm',
    'the access resistance',
    'no pipette has a negative resistance: the compensation was more than the pipette needed, or a sign is turned',
  ),
};
