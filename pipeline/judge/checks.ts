/**
 * The vocabulary of checks. Findings, the methods page, the data dictionary and the tables take their words from here.
 * Ground `lab` has no entries yet: control limits need a history of at least 20 cells and come with a later stage.
 */
import { isQuantity, quantities, quantity } from '../measure/quantities.ts';
import * as constants from '../membrane/constants.ts';
import { computedJunctionUncertaintyMv, usualCelsiusUncertainty } from '../membrane/junction.ts';
import { classRanges } from './class-ranges.ts';
import { largestJunctionMv, offsetUncertaintyMv, physicsFloorMv, statedJunctionUncertaintyMv } from './compare.ts';
import type { CheckEntry, Contradiction } from './types.ts';

const practice = 'common practice, no source';
const nernst = 'Nernst equation; Hodgkin & Katz 1949, J Physiol 108:37–77';
const computed =
  'computed for this project: three published model spikes through a 4-pole Bessel filter of 1 to 20 kHz, sampled at 5 to 200 kHz';

const potentialLimit = (formula: string): string =>
  `${formula} of the stated solutions at the stated temperature; outside only beyond the 95 % uncertainty of offset (±2 mV), junction potential (±1 mV stated, ±3.5 mV computed), concentrations, temperature and measurement together, at least 3 mV; where the junction state is unstated, only when outside both as recorded and as corrected`;

const offsetBench = [
  'Was the liquid junction potential removed once, in the right direction?',
  'What did the electrode read in the bath at the end?',
  'Do the recipes in force name the solutions that were used?',
].join(' ');

const physics: CheckEntry[] = [
  {
    id: 'peak-below-sodium',
    quantity: 'peak_mv',
    ground: 'physics',
    asks: 'Does the peak of a sodium spike stay below E_Na?',
    limit: potentialLimit('E_Na = (RT/F)·ln([Na]_out/[Na]_in)'),
    causes: [
      'junction potential left in or removed the wrong way',
      'wrong gain or unit of the voltage',
      'electrode offset',
      'bridge under-compensated during the stimulus',
      'another pipette or bath solution than stated',
    ],
    bench: offsetBench,
    source: nernst,
    level: 'cell',
  },
  {
    id: 'ahp-above-potassium',
    quantity: 'ahp_minimum_mv',
    ground: 'physics',
    asks: 'Does the minimum after the spike stay above E_K while no negative current flows?',
    limit: `${potentialLimit('E_K = (RT/F)·ln([K]_out/[K]_in)')}; not judged under negative total current, within 5 s after a train, or past a stimulus edge`,
    causes: [
      'junction potential removed twice',
      'wrong gain or unit of the voltage',
      'electrode offset or drift',
      'another pipette or bath solution than stated',
    ],
    bench: offsetBench,
    source: nernst,
    level: 'cell',
  },
  {
    id: 'rest-above-potassium',
    quantity: 'resting_potential_mv',
    ground: 'physics',
    asks: 'Does the cell rest above E_K without injected current?',
    limit: `${potentialLimit('E_K = (RT/F)·ln([K]_out/[K]_in)')}; sweeps that start within 5 s after a train are left out`,
    causes: [
      'junction potential removed twice',
      'electrode offset or drift',
      'a bias current that is not stated',
      'another pipette or bath solution than stated',
    ],
    bench: `${offsetBench} Was a bias current on?`,
    source: nernst,
    level: 'cell',
  },
  {
    id: 'baseline-above-potassium',
    quantity: 'baseline_mv',
    ground: 'physics',
    asks: 'Where no rest was recorded, does the baseline under zero or positive holding current stay above E_K?',
    limit: `${potentialLimit('E_K = (RT/F)·ln([K]_out/[K]_in)')}; sweeps that start within 5 s after a train are left out`,
    causes: ['junction potential removed twice', 'electrode offset or drift', 'sign of the holding current turned'],
    bench: `${offsetBench} Which sign did the holding current have?`,
    source: nernst,
    level: 'cell',
  },
  {
    id: 'diastolic-above-potassium',
    quantity: 'maximum_diastolic_potential_mv',
    ground: 'physics',
    asks: 'Does a cell that fires by itself stay above E_K between its spikes?',
    limit: `${potentialLimit('E_K = (RT/F)·ln([K]_out/[K]_in)')}; not judged under negative current`,
    causes: ['junction potential removed twice', 'electrode offset or drift', 'wrong gain or unit of the voltage'],
    bench: offsetBench,
    source: nernst,
    level: 'cell',
  },
  {
    id: 'rest-below-sodium',
    quantity: 'resting_potential_mv',
    ground: 'physics',
    asks: 'Does the cell rest below E_Na?',
    limit: potentialLimit('E_Na = (RT/F)·ln([Na]_out/[Na]_in)'),
    causes: ['sign of the voltage inverted', 'wrong gain or unit of the voltage', 'the amplifier was saturated'],
    bench: 'Which way does the trace go when negative current is injected?',
    source: nernst,
    level: 'cell',
  },
  {
    id: 'height-below-sodium-potassium',
    quantity: 'spike_height_mv',
    ground: 'physics',
    asks: 'Is a sodium spike lower than the way from E_K to E_Na?',
    limit:
      'E_Na − E_K of the stated solutions; offset and junction potential cancel, so that only concentrations, temperature and measurement count, at least 3 mV',
    causes: [
      'wrong gain or unit of the voltage',
      'a stimulus artefact taken for a spike',
      'another solution than stated',
    ],
    bench: 'Is the voltage gain in the file the one that was set? Does the calibration pulse read what it should?',
    source: nernst,
    level: 'cell',
  },
  {
    id: 'spike-goes-up',
    quantity: 'height_from_rest_mv',
    ground: 'physics',
    asks: 'Does the spike rise from the baseline, rather than fall from it first?',
    limit: 'the peak lies above the baseline by at least half of the excursion from threshold to peak; at least 3 mV',
    causes: ['sign of the voltage inverted', 'an artefact taken for a spike'],
    bench: 'Which way does the trace go when negative current is injected?',
    source: 'definition of the action potential as a depolarization',
    level: 'cell',
  },
  ...(
    [
      ['input-resistance-positive', 'input_resistance_mohm', 'input resistance'],
      ['membrane-resistance-positive', 'membrane_resistance_mohm', 'membrane resistance'],
      ['membrane-capacitance-positive', 'membrane_capacitance_pf', 'membrane capacitance'],
      ['cell-capacitance-positive', 'cell_capacitance_pf', 'cell capacitance'],
      ['access-resistance-positive', 'access_resistance_mohm', 'access resistance'],
    ] as const
  ).map(
    ([id, of, words]): CheckEntry => ({
      id,
      quantity: of,
      ground: 'physics',
      asks: `Is the ${words} positive?`,
      limit: 'above zero; outside only beyond the 95 % uncertainty of the measurement',
      causes: [
        'sign of the current or of the voltage inverted',
        'stimulus and response belong to different sweeps',
        'over-compensation',
      ],
      bench: 'Which way does the trace go when negative current is injected?',
      source: 'passive circuits store and dissipate, they do not supply',
      level: 'cell',
    }),
  ),
];

const conditions: CheckEntry[] = [
  {
    id: 'pulse-sign',
    quantity: 'pulse_response_mohm',
    ground: 'conditions',
    asks: 'Does the membrane charge the way the brief pulse’s current flows?',
    limit: 'above zero; outside only beyond the 95 % uncertainty of the measurement',
    causes: [
      'the current is stored with the sign of a membrane current, outward positive',
      'sign of the stimulus channel inverted',
      'stimulus and response belong to different sweeps',
    ],
    bench:
      'Which way does the trace go when negative current is injected? Multiply the stored current by −1 if it is turned.',
    source: 'I = C·dV/dt: positive current into a cell depolarizes it',
    level: 'cell',
  },
  {
    id: 'no-cell',
    quantity: 'baseline_mv',
    ground: 'conditions',
    asks: 'Where nothing fires, is there a potential at all?',
    limit:
      'below −15 mV (±2 mV) at rest or at the holding current; asked only where no sweep has a spike. The youngest cells published rest near −30 mV',
    causes: ['the cell was lost or never entered', 'the pipette is blocked', 'the electrode was not in the bath'],
    bench: 'Was there a cell? Was the recording stopped when it died?',
    source: practice,
    level: 'cell',
  },
  {
    id: 'no-membrane',
    quantity: 'transient_capacitance_pf',
    ground: 'conditions',
    asks: 'Does a test pulse in voltage clamp charge a membrane?',
    limit:
      'a charge of at least 3 pF, which a neutralized pipette alone does not take up; not held where the file or a stated capacitance says that the amplifier took the transient away',
    causes: [
      'there was no cell: an open pipette, or a leak',
      'the pulse was given before break-in',
      'the amplifier took the transient away and nobody says so',
    ],
    bench: 'Was the whole-cell capacitance compensated? State capacitance_pf. Else: was there a cell?',
    source: `${practice}; the smallest cells published in whole-cell work have some 5 pF (from memory)`,
    level: 'cell',
  },
  {
    id: 'holding-leak',
    quantity: 'holding_current_pa',
    ground: 'conditions',
    asks: 'Is the current that holds the cell in voltage clamp small enough to be a cell’s?',
    limit:
      '±1000 pA, where the holding potential lies between −100 and −40 mV; not asked of muscle fibres and giant axons',
    causes: ['the seal was lost or never formed', 'there is no cell: an open pipette or a leak', 'the cell is dying'],
    bench: 'What was the seal before break-in? How much current flows at 0 mV?',
    source: `${practice}: single laboratories exclude from 50 to 200 pA, the limit here is wide enough for large cells`,
    level: 'cell',
  },
  {
    id: 'beats-alike',
    quantity: 'apd90_alternation_ms',
    ground: 'conditions',
    asks: 'Are a heart cell’s beats alike enough for one number to stand for them?',
    limit:
      'an alternation of a tenth of the median duration to 90 % repolarization; asked of heart cells with five beats or more',
    causes: [
      'the cell alternates: paced or firing faster than it recovers, or calcium handling that does',
      'the cell is failing, or a leak through the seal disturbs its repolarization',
    ],
    bench: 'Do the beats alternate at a slower pace too? Read long and short beats apart.',
    source: practice,
    level: 'cell',
  },
  {
    id: 'escaped-currents',
    quantity: 'escaped_currents',
    ground: 'conditions',
    asks: 'Did the clamp hold the cell without action currents that escape it?',
    limit: 'none: no inward peak of a millisecond and 200 pA or more at a time of its own',
    causes: [
      'parts of the cell that the clamp does not reach fire (an axon, a dendrite)',
      'access resistance too high or not compensated',
      'the cell fires before break-in or in the loose-patch configuration',
    ],
    bench: 'Lower the access resistance; block sodium channels, or step from a potential that inactivates them.',
    source: 'space clamp: Armstrong & Gilly 1992, Methods Enzymol 207:100–122 (from memory); size and width: ours',
    level: 'sweep',
  },
  {
    id: 'baseline-negative',
    quantity: 'baseline_mv',
    ground: 'conditions',
    asks: 'Is the inside negative while only the holding current flows?',
    limit: 'below 0 mV (±2 mV offset)',
    causes: ['sign of the voltage inverted', 'electrode offset', 'the cell died', 'unit or gain of the voltage'],
    bench: 'Which way does the trace go when negative current is injected? What did the electrode read in the bath?',
    source: practice,
    level: 'cell',
  },
  {
    id: 'rise-samples',
    quantity: 'rise_samples',
    ground: 'conditions',
    asks: 'Does the rise of the spike hold enough samples?',
    limit:
      'at least 5 samples from threshold to peak (±0.5); with 4, a spike of 0.5 to 0.7 ms loses 60 % and more of its maximum rise',
    causes: ['sampling rate too low for this cell', 'traces thinned out on export'],
    bench: 'Record at 20 kHz or more, at 50 kHz for fast-spiking cells.',
    source: `${practice}; size of the effect ${computed}`,
    level: 'cell',
  },
  {
    id: 'filter-passes-rise',
    quantity: 'max_rise_v_per_s',
    ground: 'conditions',
    asks: 'Does the filter pass the rise of this spike?',
    limit:
      'corner (kHz) · height (mV) / 0.66, in V/s (±10 % for the nominal corner, and the height’s own half-width; the measured rise’s half-width is left out, as it holds the loss that is asked about): a measured rise steeper than that has lost about a quarter or more to the filter',
    causes: ['filter corner set too low', 'filter stated wrongly'],
    bench:
      'Raise the corner to at least 5 kHz, to 10 kHz for fast-spiking cells, and sample at 2.5 times that or more.',
    source: computed,
    level: 'cell',
  },
  {
    id: 'filter-below-sampling',
    quantity: 'sample_interval_us',
    ground: 'conditions',
    asks: 'Is the filter corner low enough for the sampling rate?',
    limit: 'corner at most 0.4 of the rate, that is an interval of at most 400 µs/corner in kHz (±10 %)',
    causes: ['filter corner set too high for the rate', 'rate or filter stated wrongly'],
    bench: 'Sample at 2.5 times the corner or more.',
    source: practice,
    level: 'cell',
  },
  {
    id: 'filter-as-stated',
    quantity: 'filter_corner_khz',
    ground: 'conditions',
    asks: 'Is the filter the one that is stated?',
    limit:
      'the corner that the spectrum of the noise shows, at most 1.33 times the stated one and at least 1/1.33 of it; not asked where the noise shows no corner',
    causes: [
      'filter stated wrongly',
      'filter changed after the statement was written',
      'traces filtered again on export',
      'a second filter in the recorder',
    ],
    bench:
      'Read the corner off the amplifier, or record its noise with the electrode in the bath and look at the spectrum.',
    source: `${practice}; spectrum: Welch 1967, IEEE Trans Audio Electroacoust 15:70–73 (from memory)`,
    level: 'cell',
  },
  {
    id: 'access-resistance',
    quantity: 'access_resistance_mohm',
    ground: 'conditions',
    asks: 'Is the access resistance of a whole-cell recording low enough?',
    limit:
      'at most 35 MΩ; 10–35 MΩ is what published whole-cell work in slices accepts. Stricter rules are the lab’s own and go into almanac.yaml',
    causes: ['the membrane patch did not open fully', 'the pipette is clogged', 'the access closed up again'],
    bench: 'Apply brief suction; take pipettes of lower resistance.',
    source: 'Ekins et al. 2020, eLife 9:e62373 (range accepted)',
    level: 'sweep',
  },
  {
    id: 'access-change',
    quantity: 'access_change_percent',
    ground: 'conditions',
    asks: 'Did the access resistance stay what it was?',
    limit: '±30 % from the first to the last tenth of the recording',
    causes: ['the access closed up', 'the pipette moved'],
    bench: 'Check the drift of the manipulator; look at the seal before and after.',
    source: 'limit used in a methods section on striatum and cortex (eLife; identity not read)',
    level: 'cell',
  },
  {
    id: 'access-times-current',
    quantity: 'access_resistance_mohm',
    ground: 'conditions',
    asks: 'Is the voltage across the access small where nothing compensates it?',
    limit:
      '10 mV over the largest current: the holding current in voltage clamp, the largest stimulus of 20 ms or more in current clamp where no bridge is stated or measured',
    causes: ['no bridge balance', 'large leak', 'high access resistance'],
    bench: 'Balance the bridge, or state bridge_mohm if it was balanced.',
    source: 'limit used in a methods section on whole-cell currents (identity not read)',
    level: 'cell',
  },
  {
    id: 'bridge-error',
    quantity: 'bridge_error_mohm',
    ground: 'conditions',
    asks: 'Is what the bridge left over small?',
    limit: '±2 mV over the largest stimulus, or a tenth of the access resistance where that is more',
    causes: ['bridge balance forgotten or not renewed', 'access changed after the balance was set'],
    bench: 'Balance the bridge on the instantaneous step and again whenever access changes.',
    source: practice,
    level: 'cell',
  },
  {
    id: 'clipping',
    quantity: 'clipped_fraction',
    ground: 'conditions',
    asks: 'Did everything stay inside the recorder’s range?',
    limit: 'no sample in runs at the recorder’s limit',
    causes: ['gain too high', 'offset close to the limit of the range'],
    bench: 'Lower the gain or re-zero the offset.',
    source: practice,
    level: 'sweep',
  },
  {
    id: 'missing',
    quantity: 'missing_fraction',
    ground: 'conditions',
    asks: 'Could the samples be read?',
    limit: 'at most 5 % of the values unreadable; a recording with more is unread',
    causes: ['file cut short', 'text where numbers should be', 'damaged storage'],
    bench: 'Copy the file again from the acquisition computer.',
    source: 'rule of this tool',
    level: 'sweep',
  },
  {
    id: 'mains-hum',
    quantity: 'mains_hum_mv',
    ground: 'conditions',
    asks: 'Is the mains hum small?',
    limit: 'amplitude of at most 0.5 mV',
    causes: ['ground loop', 'bath electrode', 'lamp, pump or heater near the headstage'],
    bench: 'Switch devices off one by one; check the ground and the chloride of the bath electrode.',
    source: practice,
    level: 'sweep',
  },
  {
    id: 'hum-frequency',
    quantity: 'mains_hum_hz',
    ground: 'conditions',
    asks: 'Does the hum lie at the frequency of the mains?',
    limit:
      'stated mains (else the nearer of 50 and 60 Hz) ± 2 % and the resolution of the sweep; not read where the hum of the sweeps that show it is below 0.05 mV',
    causes: ['sampling rate stated wrongly', 'traces resampled on export', 'mains_hz stated wrongly'],
    bench: 'Compare a calibration pulse of known length with what the file says.',
    source: 'EN 50160 (50 Hz ± 1 % for 99.5 % of a year, ± 2 % where the supply stands alone; from memory)',
    level: 'cell',
  },
  {
    id: 'noise',
    quantity: 'noise_rms_mv',
    ground: 'conditions',
    asks: 'Is the noise low?',
    limit: 'at most 0.5 mV RMS above 1 kHz; 0.1 to 0.5 mV is usual at 10 kHz',
    causes: ['high access resistance', 'filter open too far', 'loose ground or unshielded cable', 'a seal that leaks'],
    bench: 'Compare with a model cell on the same rig.',
    source: practice,
    level: 'sweep',
  },
  {
    id: 'quantization',
    quantity: 'quantum_mv',
    ground: 'conditions',
    asks: 'Is the step of the digitizer fine enough?',
    limit:
      'at most 0.5 mV, and at most what one step within two sampling intervals may make of dV/dt: 10 V/s, half the threshold criterion',
    causes: ['gain too low', 'values rounded on export'],
    bench: 'Raise the gain, or export with more decimals.',
    source: 'step over two intervals against the dV/dt criterion; 0.5 mV: common practice, no source',
    level: 'cell',
  },
  {
    id: 'drift',
    quantity: 'drift_mv_per_min',
    ground: 'conditions',
    asks: 'Did the baseline stay where it was over the recording?',
    limit: '±5 mV over the length of the recording (at least 1 min)',
    causes: ['the cell is running down', 'electrode offset drifts', 'the bath electrode dries or bleaches'],
    bench: 'Read the offset in the bath at the end and state it as end_offset_mv.',
    source: practice,
    level: 'cell',
  },
  {
    id: 'height-rundown',
    quantity: 'height_rundown_percent_per_100_spikes',
    ground: 'conditions',
    asks: 'Did the spikes keep their height?',
    limit: '±10 % over all spikes fired in the condition, at matched stimulus',
    causes: ['the cell is running down', 'access resistance rises', 'the pipette washes the cell out'],
    bench: 'Follow the access resistance over the recording; fire the cell less.',
    source: practice,
    level: 'cell',
  },
  {
    id: 'baseline-drift',
    quantity: 'baseline_drift_mv_per_s',
    ground: 'conditions',
    asks: 'Is the baseline of a sweep settled?',
    limit: '±2 mV over the baseline (at most 500 ms); not asked where the cell fires before the stimulus',
    causes: ['sweeps follow each other too fast', 'synaptic input', 'movement'],
    bench: 'Leave more time between sweeps.',
    source: practice,
    level: 'sweep',
  },
];

/** Checks of statements rather than numbers: they have no quantity. */
const statementIds: Record<Contradiction['kind'], string> = {
  'facts-disagree': 'facts-agree',
  'label-contradicts-data': 'label-agrees-with-data',
  duplicate: 'recorded-once',
  'same-id': 'one-id-one-cell',
  'unit-guessed': 'unit-stated',
  other: 'statements-hold',
};
export const statementCheck = (kind: Contradiction['kind']): string => statementIds[kind];

const statements: CheckEntry[] = (
  [
    [
      'facts-agree',
      'Do all statements about this cell agree?',
      'no two levels of the archive say different things (defaults excepted)',
      ['a sidecar copied from another cell', 'a table that was not updated'],
      'Compare with the bench notes of that day.',
    ],
    [
      'label-agrees-with-data',
      'Do labels in the file agree with the data?',
      'the stimulus named by a label is the stimulus recorded',
      ['a protocol edited after it was named', 'series mislabelled on export'],
      'Trust the recorded trace; correct the label.',
    ],
    [
      'recorded-once',
      'Is this recording filed once?',
      'no other recording shares its noise',
      ['a file copied under a second name', 'one cell entered twice'],
      'Keep one of the two.',
    ],
    [
      'one-id-one-cell',
      'Does the cell’s id belong to one cell?',
      'files become one cell only by an equal “cell” fact',
      ['a counter that was not advanced', 'two rigs numbering alike'],
      'Give one of the cells another id, or state the same “cell” for both files.',
    ],
    [
      'unit-stated',
      'Are the units stated?',
      'units come from the file or the sidecar',
      ['an export without units', 'series declared with the wrong unit'],
      'State the unit in the sidecar.',
    ],
    [
      'statements-hold',
      'Does everything said about this cell hold?',
      'no contradiction found elsewhere',
      ['see the sentence'],
      'See the sentence.',
    ],
  ] as const
).map(([id, asks, limit, causes, bench]) => ({
  id,
  quantity: '',
  ground: 'conditions',
  asks,
  limit,
  causes: [...causes],
  bench,
  source: 'rule of this tool',
  level: 'cell',
}));

const dashed = (quantityId: string): string => quantityId.replaceAll('_', '-');

/** Id of the class check of a quantity. */
export const classCheck = (quantityId: string): string => `class-${dashed(quantityId)}`;
/** Id of the policy check of a quantity. */
export const policyCheck = (quantityId: string): string => `policy-${dashed(quantityId)}`;

const shippedIn = (quantityId: string): number =>
  Object.values(classRanges).filter((info) => quantityId in info.ranges).length;

/** What commonly moves a quantity out of its class, most common first. */
const classCauses: Record<string, string[]> = {
  resting_potential_mv: [
    'the cell is leaky or dying',
    'junction potential',
    'electrode offset',
    'another cell class than stated',
  ],
  maximum_diastolic_potential_mv: ['junction potential', 'leak through the seal', 'another cell class than stated'],
  threshold_mv: [
    'bridge error',
    'junction potential',
    'the cell was held depolarized',
    'another cell class than stated',
  ],
  peak_mv: ['the cell is running down', 'junction potential', 'filter corner too low', 'clipping'],
  spike_height_mv: [
    'the cell is running down',
    'filter corner too low',
    'voltage gain',
    'another cell class than stated',
  ],
  height_from_rest_mv: [
    'the cell is running down',
    'filter corner too low',
    'voltage gain',
    'another cell class than stated',
  ],
  half_width_ms: [
    'another cell class than stated',
    'temperature misstated',
    'access resistance filters the spike',
    'sampling rate misstated',
  ],
  max_rise_v_per_s: [
    'filter corner too low',
    'the cell is running down',
    'temperature misstated',
    'another cell class than stated',
  ],
  max_fall_v_per_s: ['another cell class than stated', 'temperature misstated', 'filter corner too low'],
  input_resistance_mohm: [
    'leak through the seal',
    'bridge error',
    'current gain or unit',
    'another cell class than stated',
  ],
  membrane_capacitance_pf: ['current gain or unit', 'bridge error', 'another cell class than stated'],
  rheobase_pa: ['current gain or unit', 'the cell was held away from rest', 'another cell class than stated'],
  max_rate_hz: ['steps too small to reach the largest rate', 'another cell class than stated', 'temperature misstated'],
};

const classChecks: CheckEntry[] = quantities
  .filter((entry) => shippedIn(entry.id) > 0)
  .map((entry) => ({
    id: classCheck(entry.id),
    quantity: entry.id,
    ground: 'class',
    asks: `Does the ${entry.label.toLowerCase()} lie where published cells of the class lie?`,
    limit:
      'envelope over the class’s published studies: means ± 3 deviations among cells (standard errors turned into deviations), ± 2 where a wide practice range is taken in too; times and rates moved by Q10 from the sources’ temperature, at most 15 °C; potentials widened by 16 mV on the side of the junction potential where the sources do not say whether they removed it',
    causes: classCauses[entry.id] ?? ['another cell class than stated', 'temperature misstated', 'the cell is damaged'],
    bench: 'Look at the morphology and the pipette notes: is the class right, was the cell healthy?',
    source: 'per class, with the range',
    level: 'cell',
  }));

/** Every check that holds in every archive. Policy checks exist per limit in almanac.yaml: see `check`. */
export const checks: readonly CheckEntry[] = [...physics, ...conditions, ...statements, ...classChecks];

const byId = new Map(checks.map((entry) => [entry.id, entry]));

/** The entry of a lab’s own limit on a quantity. @throws RangeError for a quantity that the registry does not hold */
export function policyEntry(quantityId: string): CheckEntry {
  const entry = quantity(quantityId);
  return {
    id: policyCheck(quantityId),
    quantity: quantityId,
    ground: 'policy',
    asks: `Does the ${entry.label.toLowerCase()} keep the lab’s own limit?`,
    limit: 'as stated under “limits” in almanac.yaml; outside only beyond the 95 % uncertainty of the measurement',
    causes: classCauses[quantityId] ?? byId.get(conditionOf(quantityId) ?? '')?.causes ?? ['see the lab’s own rule'],
    bench: 'Ask whoever set the limit in almanac.yaml.',
    source: 'almanac.yaml',
    level: entry.levels.includes('cell') ? 'cell' : 'sweep',
  };
}

function conditionOf(quantityId: string): string | undefined {
  return conditions.find((entry) => entry.quantity === quantityId)?.id;
}

/**
 * One entry by its id; `policy-…` ids are made for any quantity of the registry.
 * @throws RangeError naming an id that no check has
 */
export function check(id: string): CheckEntry {
  const entry = byId.get(id);
  if (entry) return entry;
  const quantityId = id.startsWith('policy-') ? id.slice('policy-'.length).replaceAll('-', '_') : '';
  if (isQuantity(quantityId)) return policyEntry(quantityId);
  throw new RangeError(`no check "${id}" in the registry`);
}

/** The physical constants of every formula, for the pages that print and use them. */
export const physicalConstants = constants;

/** A number that judging uses and no recording gives. */
export interface JudgingConstant {
  label: string;
  value: number;
  unit: string;
  source: string;
}

/** What enters a comparison besides the measured number, its half-width and the limit. */
export const judgingConstants: readonly JudgingConstant[] = [
  {
    label: 'Electrode and amplifier offset left after zeroing, 95 % half-width, on every potential against the bath',
    value: offsetUncertaintyMv,
    unit: 'mV',
    source: practice,
  },
  {
    label: 'Stated junction potential, 95 % half-width',
    value: statedJunctionUncertaintyMv,
    unit: 'mV',
    source: practice,
  },
  {
    label: 'Computed junction potential, least 95 % half-width',
    value: computedJunctionUncertaintyMv,
    unit: 'mV',
    source: `concentrations for activities, reference electrode not ideal; ${practice}`,
  },
  {
    label: 'No physical limit on a potential is held tighter than',
    value: physicsFloorMv,
    unit: 'mV',
    source: 'rule of this tool',
  },
  {
    label: 'Largest junction potential allowed for where its state is not known',
    value: largestJunctionMv,
    unit: 'mV',
    source: 'K-gluconate in saline, +12 to +16 mV; Barry & Lynch 1991, J Membr Biol 121:101–117 (from memory)',
  },
  { label: 'Stated bath temperature, 95 % half-width', value: usualCelsiusUncertainty, unit: '°C', source: practice },
];
