/**
 * Published values that the class ranges are built from: what was printed, how it was spread, and where. `envelope.ts`
 * turns them into ranges; a test does so again and compares with `class-ranges.ts`.
 *
 * `FOUND`: read in the named source or a reprint of it. `FROM MEMORY`: recalled, not seen. `temperature_c: null`: the
 * temperature was not visible in the table read. Potentials of tissue impaled with sharp electrodes carry no junction
 * correction and count as corrected; whether others were corrected was mostly not printed.
 */
import type { ShippedClass } from './class-ranges.ts';

export type StudyReading = 'corrected' | 'recorded' | 'unknown';

interface Source {
  class: ShippedClass;
  /** Cells and preparation as the source names them. */
  cells: string;
  source: string;
  status: 'FOUND' | 'FROM MEMORY';
  temperature_c: readonly [number, number] | null;
  reading: StudyReading;
}

/** A mean with its spread as printed, or a range as printed. Units are those of the quantity. */
type Value = { quantity: string; note?: string } & (
  | { mean: number; spread?: number; spread_kind?: 'SD' | 'SE'; n?: number }
  | { low: number; high: number }
);

export type StudyRow = Source & Value;

const study = (source: Source, values: readonly Value[]): StudyRow[] =>
  values.map((value) => ({ ...source, ...value }));

export const studyRows: readonly StudyRow[] = [
  ...study(
    {
      class: 'cortical-pyramidal',
      cells: 'cortical pyramidal L2/3, rat cortex slice',
      source: 'J Neurosci, PMC6623880, Table 3',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'resting_potential_mv', mean: -73, spread: 2.6, spread_kind: 'SD', n: 5 },
      { quantity: 'membrane_time_constant_ms', mean: 11.5, spread: 2.6, spread_kind: 'SD', n: 5 },
      { quantity: 'input_resistance_mohm', mean: 51.1, spread: 27.5, spread_kind: 'SD', n: 5 },
      { quantity: 'threshold_mv', mean: -47.6, spread: 7.9, spread_kind: 'SD', n: 5 },
      {
        quantity: 'height_from_rest_mv',
        mean: 96.2,
        spread: 8,
        spread_kind: 'SD',
        n: 5,
        note: 'from resting potential',
      },
      { quantity: 'half_width_ms', mean: 0.85, spread: 0.24, spread_kind: 'SD', n: 5 },
    ],
  ),
  ...study(
    {
      class: 'cortical-pyramidal',
      cells: 'cortical pyramidal L5a, rat cortex slice',
      source: 'J Neurosci, PMC6623880, Table 3',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'resting_potential_mv', mean: -61.5, spread: 7.6, spread_kind: 'SD', n: 3 },
      { quantity: 'membrane_time_constant_ms', mean: 11.5, spread: 4.6, spread_kind: 'SD', n: 3 },
      { quantity: 'input_resistance_mohm', mean: 65.3, spread: 34.4, spread_kind: 'SD', n: 3 },
      { quantity: 'threshold_mv', mean: -40.2, spread: 7.2, spread_kind: 'SD', n: 3 },
      {
        quantity: 'height_from_rest_mv',
        mean: 85.9,
        spread: 10,
        spread_kind: 'SD',
        n: 3,
        note: 'from resting potential',
      },
      { quantity: 'half_width_ms', mean: 0.88, spread: 0.18, spread_kind: 'SD', n: 3 },
    ],
  ),
  ...study(
    {
      class: 'cortical-pyramidal',
      cells: 'cortical pyramidal L5b, rat cortex slice',
      source: 'J Neurosci, PMC6623880, Table 3',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'resting_potential_mv', mean: -64.8, spread: 8.7, spread_kind: 'SD', n: 5 },
      { quantity: 'membrane_time_constant_ms', mean: 11.7, spread: 5.1, spread_kind: 'SD', n: 5 },
      { quantity: 'input_resistance_mohm', mean: 48.7, spread: 29.5, spread_kind: 'SD', n: 5 },
      { quantity: 'threshold_mv', mean: -50.6, spread: 10.5, spread_kind: 'SD', n: 5 },
      {
        quantity: 'height_from_rest_mv',
        mean: 97.9,
        spread: 5.7,
        spread_kind: 'SD',
        n: 5,
        note: 'from resting potential',
      },
      { quantity: 'half_width_ms', mean: 0.72, spread: 0.29, spread_kind: 'SD', n: 5 },
    ],
  ),
  ...study(
    {
      class: 'cortical-pyramidal',
      cells: 'cortical pyramidal L6+, rat cortex slice',
      source: 'J Neurosci, PMC6623880, Table 3',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'resting_potential_mv', mean: -68.4, spread: 3.7, spread_kind: 'SD', n: 5 },
      { quantity: 'membrane_time_constant_ms', mean: 9.8, spread: 3, spread_kind: 'SD', n: 5 },
      { quantity: 'input_resistance_mohm', mean: 62.2, spread: 18.1, spread_kind: 'SD', n: 5 },
      { quantity: 'threshold_mv', mean: -41.4, spread: 5.1, spread_kind: 'SD', n: 5 },
      {
        quantity: 'height_from_rest_mv',
        mean: 89.4,
        spread: 6.4,
        spread_kind: 'SD',
        n: 5,
        note: 'from resting potential',
      },
      { quantity: 'half_width_ms', mean: 0.77, spread: 0.16, spread_kind: 'SD', n: 5 },
    ],
  ),
  ...study(
    {
      class: 'cortical-pyramidal',
      cells: 'cortical pyramidal L4, rat cortex slice',
      source: 'J Neurosci, PMC6623880, Table 3',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'resting_potential_mv', mean: -68, spread: 7.4, spread_kind: 'SD', n: 5 },
      { quantity: 'membrane_time_constant_ms', mean: 7.5, spread: 4.5, spread_kind: 'SD', n: 5 },
      { quantity: 'input_resistance_mohm', mean: 68.3, spread: 28.8, spread_kind: 'SD', n: 5 },
      { quantity: 'threshold_mv', mean: -41.3, spread: 15.6, spread_kind: 'SD', n: 5 },
      {
        quantity: 'height_from_rest_mv',
        mean: 103.8,
        spread: 10.2,
        spread_kind: 'SD',
        n: 5,
        note: 'from resting potential',
      },
      { quantity: 'half_width_ms', mean: 0.86, spread: 0.39, spread_kind: 'SD', n: 5 },
    ],
  ),
  ...study(
    {
      class: 'cortical-pyramidal',
      cells: 'cortical L5 pyramidal (IT, etv1), mouse',
      source: 'Guan, Armstrong & Foehring 2015 J Neurophysiol',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'rate_gain_hz_per_na', mean: 30, spread: 1, spread_kind: 'SE', n: 22, note: '2 s steps' },
      { quantity: 'rate_gain_hz_per_na', mean: 79, spread: 1, spread_kind: 'SE', n: 21, note: '200 ms' },
    ],
  ),
  ...study(
    {
      class: 'cortical-pyramidal',
      cells: 'cortical L5 pyramidal (PT, glt), mouse',
      source: 'Guan, Armstrong & Foehring 2015 J Neurophysiol',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [{ quantity: 'rate_gain_hz_per_na', mean: 72, spread: 1, spread_kind: 'SE', n: 30, note: '2 s' }],
  ),
  ...study(
    {
      class: 'cortical-pyramidal',
      cells: 'cortical L2/3 pyramidal, mouse',
      source: 'Guan, Armstrong & Foehring 2015 J Neurophysiol',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [{ quantity: 'rate_gain_hz_per_na', mean: 55, spread: 7, spread_kind: 'SE', n: 15, note: '2 s' }],
  ),
  ...study(
    {
      class: 'cortical-pyramidal',
      cells: 'cortical pyramidal, rat/mouse',
      source: 'Bean 2007 Nat Rev Neurosci',
      status: 'FROM MEMORY',
      temperature_c: [35, 37],
      reading: 'unknown',
    },
    [{ quantity: 'half_width_ms', low: 0.5, high: 1 }],
  ),
  ...study(
    {
      class: 'hippocampal-pyramidal',
      cells: 'hippocampal CA1 pyramidal, rat slice; 4th column of Table 2',
      source: 'Staff, Jung, Thiagarajan, Yao & Spruston 2000 J Neurophysiol',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'threshold_mv', mean: -46.3, spread: 0.6, spread_kind: 'SE', n: 20 },
      { quantity: 'rheobase_pa', mean: 213, spread: 21, spread_kind: 'SE', n: 20 },
      { quantity: 'half_width_ms', mean: 0.95, spread: 0.03, spread_kind: 'SE', n: 20, note: '1st spike' },
      {
        quantity: 'height_from_rest_mv',
        mean: 112,
        note: 'spread printed as 9.0 SE (n = 20), not used: ten times that of every other row',
      },
      { quantity: 'max_rise_v_per_s', mean: 381, spread: 18, spread_kind: 'SE', n: 20, note: 'peak rise' },
      { quantity: 'max_fall_v_per_s', mean: -94.8, spread: 4.7, spread_kind: 'SE', n: 20, note: 'peak fall' },
    ],
  ),
  ...study(
    {
      class: 'hippocampal-pyramidal',
      cells: 'hippocampal CA1 pyramidal, mouse slice',
      source: 'Chevaleyre & Siegelbaum 2010 Neuron, Table 1',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'resting_potential_mv', mean: -71.9, spread: 1.2, spread_kind: 'SE', n: 8 },
      {
        quantity: 'input_resistance_mohm',
        mean: 107,
        spread: 10.7,
        spread_kind: 'SE',
        n: 8,
        note: '-5 mV step from -70 in voltage clamp',
      },
      { quantity: 'membrane_capacitance_pf', mean: 170.1, spread: 11.4, spread_kind: 'SE', n: 8, note: '-5 mV step' },
      {
        quantity: 'height_from_rest_mv',
        mean: 95.3,
        spread: 1.8,
        spread_kind: 'SE',
        n: 8,
        note: 'from rest, as rest and peak imply',
      },
      { quantity: 'half_width_ms', mean: 0.99, spread: 0.03, spread_kind: 'SE', n: 8, note: 'printed as AP duration' },
    ],
  ),
  ...study(
    {
      class: 'hippocampal-pyramidal',
      cells: 'hippocampal CA1 pyramidal, rat, control group, sharp/whole-cell not read',
      source: 'J Neurosci table (paper identity not read; CA1 control group)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'resting_potential_mv', mean: -63, spread: 1, spread_kind: 'SE', n: 25 },
      { quantity: 'input_resistance_mohm', mean: 69, spread: 3, spread_kind: 'SE', n: 25 },
      { quantity: 'threshold_mv', mean: -53, spread: 1, spread_kind: 'SE', n: 25 },
      { quantity: 'height_from_rest_mv', mean: 92, spread: 4, spread_kind: 'SE', n: 25, note: 'from Vm' },
      { quantity: 'half_width_ms', mean: 0.8, spread: 0.02, spread_kind: 'SE', n: 25, note: 'half-maximal amplitude' },
    ],
  ),
  ...study(
    {
      class: 'fast-spiking-interneuron',
      cells: 'fast-spiking (PV) interneuron L5, mouse cortex (GAD67)',
      source: 'Front Cell Neurosci 2017;11:204 Fig. 1',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      {
        quantity: 'spike_height_mv',
        mean: 62.8,
        spread: 1.19,
        spread_kind: 'SE',
        note: 'from threshold, as threshold and peak imply',
      },
      { quantity: 'half_width_ms', mean: 0.6645, spread: 0.03196, spread_kind: 'SE' },
      { quantity: 'ahp_below_threshold_mv', mean: 15.8, spread: 0.56, spread_kind: 'SE' },
      { quantity: 'threshold_mv', mean: -37.4, spread: 0.72, spread_kind: 'SE' },
      { quantity: 'rheobase_pa', mean: 153.1, spread: 9.5, spread_kind: 'SE' },
      { quantity: 'input_resistance_mohm', mean: 155.1, spread: 10.5, spread_kind: 'SE' },
      { quantity: 'membrane_time_constant_ms', mean: 17.3, spread: 1.46, spread_kind: 'SE' },
      { quantity: 'max_rate_hz', mean: 243.8, spread: 21.5, spread_kind: 'SE', note: 'input-output value' },
    ],
  ),
  ...study(
    {
      class: 'fast-spiking-interneuron',
      cells: 'PV+ interneuron (same study), mouse',
      source: 'Brain Struct Funct 2020;225:909 doi:10.1007/s00429-020-02051-4 Table 1',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'input_resistance_mohm', mean: 250, spread: 33.6, spread_kind: 'SE', n: 9 },
      { quantity: 'threshold_mv', mean: -39.7, spread: 1.5, spread_kind: 'SE', n: 9 },
      { quantity: 'max_rate_hz', mean: 48.8, spread: 5.3, spread_kind: 'SE', n: 9 },
    ],
  ),
  ...study(
    {
      class: 'fast-spiking-interneuron',
      cells: 'fast-spiking (PV) interneuron, rat/mouse',
      source: 'Bean 2007 Nat Rev Neurosci',
      status: 'FROM MEMORY',
      temperature_c: [35, 37],
      reading: 'unknown',
    },
    [
      { quantity: 'half_width_ms', low: 0.2, high: 0.5 },
      { quantity: 'ahp_below_threshold_mv', low: 15, high: 25, note: 'from threshold' },
    ],
  ),
  ...study(
    {
      class: 'somatostatin-interneuron',
      cells: 'SOM+ interneuron (amygdala/subpallial study), mouse',
      source: 'Brain Struct Funct 2020;225:909 doi:10.1007/s00429-020-02051-4 Table 1',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'input_resistance_mohm', mean: 397.7, spread: 57.9, spread_kind: 'SE', n: 11 },
      { quantity: 'threshold_mv', mean: -44.5, spread: 2.1, spread_kind: 'SE', n: 11 },
      { quantity: 'max_rate_hz', mean: 45.4, spread: 4.2, spread_kind: 'SE', n: 11 },
    ],
  ),
  ...study(
    {
      class: 'purkinje',
      cells: 'cerebellar Purkinje, mouse slice 2-3 weeks, WT',
      source: 'J Neurosci SCA1 study, Table 1 (identity Hourez et al. 2011 from memory)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'membrane_capacitance_pf', mean: 334.14, spread: 25.17, spread_kind: 'SE', n: 18, note: 'apparent' },
      { quantity: 'resting_potential_mv', mean: -58.5, spread: 1.36, spread_kind: 'SE', n: 18 },
      { quantity: 'max_rise_v_per_s', mean: 314.31, spread: 32.7, spread_kind: 'SE', n: 18, note: '0 pA' },
      { quantity: 'max_fall_v_per_s', mean: -226.84, spread: 27.57, spread_kind: 'SE', n: 18, note: '0 pA' },
      { quantity: 'max_rise_v_per_s', mean: 368.52, spread: 26.6, spread_kind: 'SE', n: 18, note: 'step protocol' },
    ],
  ),
  ...study(
    {
      class: 'purkinje',
      cells: 'cerebellar Purkinje, mouse, dissociated',
      source: 'Carter & Bean 2011 J Neurophysiol 105:860 doi:10.1152/jn.01056.2010',
      status: 'FOUND',
      temperature_c: [37, 37],
      reading: 'unknown',
    },
    [
      { quantity: 'spontaneous_rate_hz', mean: 40 },
      { quantity: 'max_rate_hz', mean: 300, note: 'steady fast firing' },
    ],
  ),
  ...study(
    {
      class: 'purkinje',
      cells: 'cerebellar Purkinje, mouse/rat slice',
      source: 'Bean 2007 Nat Rev Neurosci 8:451 doi:10.1038/nrn2148 (review)',
      status: 'FROM MEMORY',
      temperature_c: [35, 37],
      reading: 'unknown',
    },
    [
      { quantity: 'half_width_ms', low: 0.18, high: 0.25 },
      { quantity: 'max_rise_v_per_s', low: 400, high: 700 },
    ],
  ),
  ...study(
    {
      class: 'midbrain-dopaminergic',
      cells: 'dopaminergic midbrain (SNc), rat/mouse nigra slice',
      source: 'Ding, Wei & Zhou 2011 J Neurophysiol (identity from memory)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'spontaneous_rate_hz', mean: 1.9, spread: 0.2, spread_kind: 'SE' },
      {
        quantity: 'threshold_mv',
        mean: -36.2,
        spread: 0.4,
        spread_kind: 'SE',
        note: 'sharpest inflection before the spike',
      },
      {
        quantity: 'spike_height_mv',
        mean: 59.3,
        spread: 1.4,
        spread_kind: 'SE',
        note: 'from threshold, as threshold and peak imply',
      },
    ],
  ),
  ...study(
    {
      class: 'sensory-neuron-large',
      cells: 'DRG medium, rat, dissociated, control (capacitance n=161, AP n=82)',
      source: 'J Neurosci diabetic DRG study, Table (identity Jagodic et al. 2007 from memory)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'membrane_capacitance_pf', mean: 31.5, spread: 0.5, spread_kind: 'SE', n: 161 },
      { quantity: 'input_resistance_mohm', mean: 545, spread: 33.8, spread_kind: 'SE', n: 82 },
      { quantity: 'resting_potential_mv', mean: -49, spread: 1, spread_kind: 'SE', n: 82 },
      { quantity: 'peak_mv', mean: 40.6, spread: 1.8, spread_kind: 'SE', n: 82 },
    ],
  ),
  ...study(
    {
      class: 'sensory-neuron-large',
      cells: 'DRG large, rat, dissociated, control',
      source: 'J Neurosci diabetic DRG study, Table (identity Jagodic et al. 2007 from memory)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'membrane_capacitance_pf', mean: 42.7, spread: 1.7, spread_kind: 'SE', n: 66 },
      { quantity: 'input_resistance_mohm', mean: 207, spread: 24.4, spread_kind: 'SE', n: 20 },
      { quantity: 'resting_potential_mv', mean: -53, spread: 2.9, spread_kind: 'SE', n: 20 },
      { quantity: 'peak_mv', mean: 41.2, spread: 4, spread_kind: 'SE', n: 20 },
    ],
  ),
  ...study(
    {
      class: 'sensory-neuron-large',
      cells: 'DRG large (>=26 um), mouse, control (CFA)',
      source: 'eNeuro table 3 (paper identity not read; EAE study)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'height_from_rest_mv', mean: 104.9, spread: 1.796, spread_kind: 'SE' },
      { quantity: 'half_width_ms', mean: 1.18, spread: 0.104, spread_kind: 'SE' },
      { quantity: 'max_rise_v_per_s', mean: 236.7, spread: 14.12, spread_kind: 'SE' },
      { quantity: 'rheobase_pa', mean: 469.7, spread: 28, spread_kind: 'SE' },
    ],
  ),
  ...study(
    {
      class: 'sensory-neuron-small',
      cells: 'DRG small (<26 um), mouse, control (CFA)',
      source: 'eNeuro table 3 (paper identity not read; EAE study)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'height_from_rest_mv', mean: 116.4, spread: 2.159, spread_kind: 'SE' },
      { quantity: 'half_width_ms', mean: 3.959, spread: 0.4215, spread_kind: 'SE' },
      { quantity: 'max_rise_v_per_s', mean: 175.3, spread: 22.55, spread_kind: 'SE' },
      { quantity: 'max_fall_v_per_s', mean: -62.46, spread: 6.376, spread_kind: 'SE' },
      { quantity: 'rheobase_pa', mean: 262.5, spread: 17, spread_kind: 'SE' },
    ],
  ),
  ...study(
    {
      class: 'motoneuron',
      cells: 'spinal motoneuron fast, rat in vivo, sharp electrode, weight-bearing',
      source: 'J Physiol 2005;568:841 doi:10.1113/jphysiol.2005.091835 Table 1',
      status: 'FOUND',
      temperature_c: [37, 37],
      reading: 'corrected',
    },
    [
      { quantity: 'rheobase_pa', mean: 8000, spread: 4700, spread_kind: 'SD', n: 88 },
      { quantity: 'input_resistance_mohm', mean: 1.7, spread: 1.5, spread_kind: 'SD', n: 55 },
      {
        quantity: 'height_from_rest_mv',
        mean: 77,
        spread: 12.3,
        spread_kind: 'SD',
        n: 91,
        note: 'from rest, as rest and peak imply',
      },
      { quantity: 'resting_potential_mv', mean: -61, spread: 7.4, spread_kind: 'SD', n: 87 },
      { quantity: 'threshold_mv', mean: -43, spread: 9.1, spread_kind: 'SD', n: 83 },
      { quantity: 'membrane_time_constant_ms', mean: 4.5, spread: 1.3, spread_kind: 'SD', n: 53 },
      { quantity: 'membrane_capacitance_pf', mean: 3500, spread: 1800, spread_kind: 'SD', n: 30 },
    ],
  ),
  ...study(
    {
      class: 'motoneuron',
      cells: 'spinal motoneuron slow, rat in vivo, sharp electrode, weight-bearing',
      source: 'J Physiol 2005;568:841 doi:10.1113/jphysiol.2005.091835 Table 1',
      status: 'FOUND',
      temperature_c: [37, 37],
      reading: 'corrected',
    },
    [
      { quantity: 'rheobase_pa', mean: 6000, spread: 3800, spread_kind: 'SD', n: 60 },
      { quantity: 'input_resistance_mohm', mean: 2.7, spread: 1.4, spread_kind: 'SD', n: 51 },
      {
        quantity: 'height_from_rest_mv',
        mean: 84,
        spread: 12.1,
        spread_kind: 'SD',
        n: 58,
        note: 'from rest, as rest and peak imply',
      },
      { quantity: 'resting_potential_mv', mean: -63, spread: 7.5, spread_kind: 'SD', n: 57 },
      { quantity: 'threshold_mv', mean: -42, spread: 8.8, spread_kind: 'SD', n: 55 },
      { quantity: 'membrane_time_constant_ms', mean: 5.4, spread: 1.9, spread_kind: 'SD', n: 46 },
      { quantity: 'membrane_capacitance_pf', mean: 2800, spread: 1800, spread_kind: 'SD', n: 34 },
    ],
  ),
  ...study(
    {
      class: 'motoneuron',
      cells: 'spinal motoneuron, mouse in vivo',
      source: 'Meehan et al. 2010 J Neurophysiol Table 2 (species comparison)',
      status: 'FOUND',
      temperature_c: [37, 37],
      reading: 'unknown',
    },
    [
      { quantity: 'input_resistance_mohm', mean: 2.4, note: 'mouse 2.4-3.1; rat 2.2; cat 0.9-1.2' },
      { quantity: 'rate_gain_hz_per_na', low: 12, high: 13, note: 'cat 1.2-1.9 ; rat 2.7-6.5' },
    ],
  ),
  ...study(
    {
      class: 'ventricular-myocyte',
      cells: 'ventricular (guinea pig, tissue microelectrode), 1 Hz',
      source: 'Watanabe, Rautaharju & McDonald 1985 Circ Res 57:362 doi:10.1161/01.res.57.3.362 (abstract)',
      status: 'FOUND',
      temperature_c: [37, 37],
      reading: 'corrected',
    },
    [
      { quantity: 'resting_potential_mv', mean: -87 },
      { quantity: 'height_from_rest_mv', mean: 122, note: 'from rest, as rest and peak imply' },
      { quantity: 'max_rise_v_per_s', mean: 247, note: 'epicardium 110' },
    ],
  ),
  ...study(
    {
      class: 'ventricular-myocyte',
      cells: 'ventricular (human adult)',
      source: 'review table PMC4635107 Table 1 (refs 9, 12-14 therein)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'resting_potential_mv', mean: -90, note: 'MDP -82 to -90' },
      { quantity: 'height_from_rest_mv', low: 102, high: 110, note: 'from rest, as rest and peak imply' },
      { quantity: 'max_rise_v_per_s', low: 254, high: 303 },
      { quantity: 'membrane_capacitance_pf', mean: 200 },
    ],
  ),
  ...study(
    {
      class: 'ventricular-myocyte',
      cells: 'ventricular, guinea pig endocardium, cycle 300 ms',
      source: 'Zhou, Zang & Du 2001 (abstract)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'corrected',
    },
    [{ quantity: 'apd90_ms', mean: 207, spread: 15, spread_kind: 'SD', n: 9 }],
  ),
  ...study(
    {
      class: 'ventricular-myocyte',
      cells: 'ventricular, guinea pig midmyocardium, cycle 300 ms',
      source: 'Zhou, Zang & Du 2001 (abstract)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'corrected',
    },
    [{ quantity: 'apd90_ms', mean: 215, spread: 27, spread_kind: 'SD', n: 9 }],
  ),
  ...study(
    {
      class: 'ventricular-myocyte',
      cells: 'ventricular, guinea pig epicardium, cycle 300 ms',
      source: 'Zhou, Zang & Du 2001 (abstract)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'corrected',
    },
    [{ quantity: 'apd90_ms', mean: 214, spread: 21, spread_kind: 'SD', n: 9 }],
  ),
  ...study(
    {
      class: 'ventricular-myocyte',
      cells: 'ventricular, guinea pig endocardium, cycle 3000 ms',
      source: 'Zhou, Zang & Du 2001 (abstract)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'corrected',
    },
    [{ quantity: 'apd90_ms', mean: 294, spread: 34, spread_kind: 'SD', n: 9 }],
  ),
  ...study(
    {
      class: 'ventricular-myocyte',
      cells: 'ventricular, guinea pig midmyocardium, cycle 3000 ms',
      source: 'Zhou, Zang & Du 2001 (abstract)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'corrected',
    },
    [{ quantity: 'apd90_ms', mean: 313, spread: 50, spread_kind: 'SD', n: 9 }],
  ),
  ...study(
    {
      class: 'ventricular-myocyte',
      cells: 'ventricular, guinea pig epicardium, cycle 3000 ms',
      source: 'Zhou, Zang & Du 2001 (abstract)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'corrected',
    },
    [{ quantity: 'apd90_ms', mean: 290, spread: 49, spread_kind: 'SD', n: 9 }],
  ),
  ...study(
    {
      class: 'ventricular-myocyte',
      cells: 'ventricular (human adult), human',
      source: 'review table PMC4635107 Table 1 (refs 9, 12-14 therein)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'corrected',
    },
    [{ quantity: 'apd90_ms', low: 228, high: 259, note: 'level of repolarization not stated' }],
  ),
  ...study(
    {
      class: 'stem-cell-cardiomyocyte',
      cells: 'hPSC-cardiomyocyte',
      source: 'J Neurosci diabetic DRG study, Table (identity Jagodic et al. 2007 from memory)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'resting_potential_mv', low: -71, high: -37 },
      { quantity: 'maximum_diastolic_potential_mv', low: -75, high: -57 },
      { quantity: 'height_from_rest_mv', low: 77, high: 116, note: 'from rest, as rest and peak imply' },
      { quantity: 'max_rise_v_per_s', low: 6, high: 40 },
      { quantity: 'membrane_capacitance_pf', low: 10, high: 25 },
    ],
  ),
  ...study(
    {
      class: 'stem-cell-cardiomyocyte',
      cells: 'hPSC-cardiomyocyte, human',
      source: 'review table PMC4635107 Table 1 (refs 9, 12-14 therein)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [{ quantity: 'apd90_ms', low: 200, high: 500, note: 'level of repolarization not stated' }],
  ),
  ...study(
    {
      class: 'stem-cell-cardiomyocyte',
      cells: 'hPSC-cardiomyocyte, human, long culture',
      source: 'review table PMC4635107 Table 1 (refs 9, 12-14 therein)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [{ quantity: 'max_rise_v_per_s', low: 176, high: 201 }],
  ),
  ...study(
    {
      class: 'sinoatrial-node',
      cells: 'sinoatrial node, mammal',
      source: 'textbook chapter (Taylor & Francis 9781315105208 ch 3)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [{ quantity: 'maximum_diastolic_potential_mv', low: -60, high: -50, note: 'ventricular -80 to -90' }],
  ),
  ...study(
    {
      class: 'sinoatrial-node',
      cells: 'sinoatrial node, human isolated, Verkerk et al. 2007 Eur Heart J 28:2472 ; rabbit reviews',
      source: 'Verkerk et al. 2007',
      status: 'FROM MEMORY',
      temperature_c: [36, 37],
      reading: 'unknown',
    },
    [
      { quantity: 'maximum_diastolic_potential_mv', mean: -61.7, spread: 4.3, spread_kind: 'SE', n: 3, note: 'human' },
      { quantity: 'max_rise_v_per_s', mean: 4.6, spread: 1.2, spread_kind: 'SE', n: 3, note: 'human' },
      { quantity: 'cycle_length_ms', mean: 828, spread: 15, spread_kind: 'SE', n: 3, note: 'human' },
    ],
  ),
  ...study(
    {
      class: 'sinoatrial-node',
      cells: 'sinoatrial node, rabbit, centre to periphery',
      source: 'rabbit reviews beside Verkerk et al. 2007 Eur Heart J 28:2472',
      status: 'FROM MEMORY',
      temperature_c: [36, 37],
      reading: 'unknown',
    },
    [{ quantity: 'max_rise_v_per_s', low: 2, high: 50, note: '2–12 in the centre, 50 and more at the periphery' }],
  ),
  ...study(
    {
      class: 'skeletal-muscle',
      cells: 'skeletal muscle fibre, mammal',
      source: 'textbook page (veterinary physiology)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'corrected',
    },
    [{ quantity: 'resting_potential_mv', low: -90, high: -80 }],
  ),
  ...study(
    {
      class: 'skeletal-muscle',
      cells: 'skeletal muscle fibre, mammal EDL',
      source: 'textbook values',
      status: 'FROM MEMORY',
      temperature_c: [20, 37],
      reading: 'corrected',
    },
    [
      { quantity: 'peak_mv', low: 20, high: 40 },
      { quantity: 'max_rise_v_per_s', low: 200, high: 500 },
      { quantity: 'half_width_ms', low: 0.8, high: 1.5 },
    ],
  ),
  ...study(
    {
      class: 'skeletal-muscle',
      cells: 'skeletal muscle fibre, mammal EDL',
      source: 'textbook values',
      status: 'FROM MEMORY',
      temperature_c: [37, 37],
      reading: 'corrected',
    },
    [{ quantity: 'half_width_ms', low: 0.8, high: 1.5 }],
  ),
  ...study(
    {
      class: 'squid-axon',
      cells: 'squid giant axon, intact, sea water',
      source: 'Hodgkin & Katz 1949; Hodgkin 1951/1958 reviews',
      status: 'FROM MEMORY',
      temperature_c: [18, 20],
      reading: 'corrected',
    },
    [
      { quantity: 'resting_potential_mv', low: -70, high: -60, note: '-48 uncorrected for pipette junction' },
      { quantity: 'height_from_rest_mv', low: 100, high: 110, note: 'from rest, as rest and peak imply' },
      { quantity: 'peak_mv', low: 40, high: 55 },
    ],
  ),
  ...study(
    {
      class: 'chromaffin',
      cells: 'chromaffin, mouse, in situ',
      source: 'Nassar-Gentina, Pollard & Rojas 1988 Am J Physiol 254:C675 (abstract)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [{ quantity: 'resting_potential_mv', mean: -54.3, spread: 8.8, spread_kind: 'SD' }],
  ),
  ...study(
    {
      class: 'chromaffin',
      cells: 'chromaffin, rat/mouse/bovine isolated',
      source: 'Fenwick, Marty & Neher 1982 J Physiol 331:577',
      status: 'FROM MEMORY',
      temperature_c: [22, 37],
      reading: 'unknown',
    },
    [
      { quantity: 'membrane_capacitance_pf', low: 5, high: 10 },
      { quantity: 'resting_potential_mv', low: -80, high: -50 },
    ],
  ),
  ...study(
    {
      class: 'chromaffin',
      cells: 'chromaffin, mouse, isolated resting cell',
      source: 'Nassar-Gentina, Pollard & Rojas 1988 Am J Physiol 254:C675 (abstract)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [{ quantity: 'input_resistance_mohm', mean: 5000 }],
  ),
  ...study(
    {
      class: 'chromaffin',
      cells: 'chromaffin, mouse, in situ, coupled',
      source: 'Nassar-Gentina, Pollard & Rojas 1988 Am J Physiol 254:C675 (abstract)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [{ quantity: 'input_resistance_mohm', mean: 103 }],
  ),
  ...study(
    {
      class: 'stem-cell-neuron',
      cells: 'hiPSC-derived neuron, human, 31–38 days in vitro',
      source: 'review table in Alzheimers Res Ther 2015, doi:10.1186/s13195-015-0129-y Table 2 (Prè et al. 2014)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'resting_potential_mv', mean: -35, n: 89 },
      { quantity: 'input_resistance_mohm', mean: 2500, n: 89 },
      { quantity: 'membrane_time_constant_ms', mean: 34, n: 89 },
    ],
  ),
  ...study(
    {
      class: 'stem-cell-neuron',
      cells: 'hiPSC-derived neuron, human, 41–45 days in vitro',
      source: 'review table in Alzheimers Res Ther 2015, doi:10.1186/s13195-015-0129-y Table 2 (Prè et al. 2014)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'resting_potential_mv', mean: -38, n: 75 },
      { quantity: 'input_resistance_mohm', mean: 2200, n: 75 },
      { quantity: 'membrane_time_constant_ms', mean: 29, n: 75 },
    ],
  ),
  ...study(
    {
      class: 'stem-cell-neuron',
      cells: 'hiPSC-derived neuron, human, 55 days in vitro',
      source: 'review table in Alzheimers Res Ther 2015, doi:10.1186/s13195-015-0129-y Table 2 (Prè et al. 2014)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'resting_potential_mv', mean: -49, n: 103 },
      { quantity: 'input_resistance_mohm', mean: 1700, n: 103 },
      { quantity: 'membrane_time_constant_ms', mean: 21, n: 103 },
    ],
  ),
  ...study(
    {
      class: 'stem-cell-neuron',
      cells: 'hiPSC-derived neuron, human, with astrocytes, 60 days',
      source: 'review table in Alzheimers Res Ther 2015, doi:10.1186/s13195-015-0129-y Table 2 (Tang et al. 2013)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      { quantity: 'resting_potential_mv', mean: -44 },
      { quantity: 'input_resistance_mohm', mean: 695 },
      { quantity: 'membrane_capacitance_pf', mean: 27 },
      { quantity: 'resting_potential_mv', mean: -59 },
      { quantity: 'input_resistance_mohm', mean: 302 },
      { quantity: 'membrane_capacitance_pf', mean: 119 },
    ],
  ),
  ...study(
    {
      class: 'stem-cell-neuron',
      cells: 'hiPSC-derived neuron, human, day 4',
      source: 'table of resting potentials by day in vitro (paper identity not read)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      {
        quantity: 'resting_potential_mv',
        mean: -30,
        spread: 2.3,
        spread_kind: 'SE',
        n: 25,
        note: 'spread kind not printed, read as SE; young cells rest depolarized',
      },
    ],
  ),
  ...study(
    {
      class: 'stem-cell-neuron',
      cells: 'hiPSC-derived neuron, human, day 7',
      source: 'table of resting potentials by day in vitro (paper identity not read)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      {
        quantity: 'resting_potential_mv',
        mean: -31.8,
        spread: 2,
        spread_kind: 'SE',
        n: 29,
        note: 'spread kind not printed, read as SE; young cells rest depolarized',
      },
    ],
  ),
  ...study(
    {
      class: 'stem-cell-neuron',
      cells: 'hiPSC-derived neuron, human, day 24',
      source: 'table of resting potentials by day in vitro (paper identity not read)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      {
        quantity: 'resting_potential_mv',
        mean: -34.7,
        spread: 2.5,
        spread_kind: 'SE',
        n: 21,
        note: 'spread kind not printed, read as SE; young cells rest depolarized',
      },
    ],
  ),
  ...study(
    {
      class: 'stem-cell-neuron',
      cells: 'hiPSC-derived neuron, human, day 38',
      source: 'table of resting potentials by day in vitro (paper identity not read)',
      status: 'FOUND',
      temperature_c: null,
      reading: 'unknown',
    },
    [
      {
        quantity: 'resting_potential_mv',
        mean: -36.8,
        spread: 1.6,
        spread_kind: 'SE',
        n: 26,
        note: 'spread kind not printed, read as SE; young cells rest depolarized',
      },
    ],
  ),
  ...study(
    {
      class: 'motoneuron',
      cells: 'spinal motoneuron, rat in vivo',
      source: 'Meehan et al. 2010 J Neurophysiol Table 2 (species comparison)',
      status: 'FOUND',
      temperature_c: [37, 37],
      reading: 'unknown',
    },
    [{ quantity: 'rate_gain_hz_per_na', low: 2.7, high: 6.5 }],
  ),
  ...study(
    {
      class: 'motoneuron',
      cells: 'spinal motoneuron, cat in vivo',
      source: 'Meehan et al. 2010 J Neurophysiol Table 2 (species comparison)',
      status: 'FOUND',
      temperature_c: [37, 37],
      reading: 'unknown',
    },
    [{ quantity: 'rate_gain_hz_per_na', low: 1.2, high: 1.9 }],
  ),
  ...study(
    {
      class: 'squid-axon',
      cells: 'model axon, displaced by 15 mV at 6.3 °C',
      source: 'Hodgkin & Huxley 1952 J Physiol 117:500–544 (equations; width computed from them)',
      status: 'FROM MEMORY',
      temperature_c: [6.3, 6.3],
      reading: 'corrected',
    },
    [{ quantity: 'half_width_ms', mean: 1.475, note: 'at half the height from rest' }],
  ),
];

/**
 * Wide ranges used where studies are few: derived for this project from the rows above and general knowledge of the
 * cells. Taken to hold at 32–37 °C unless the class says otherwise.
 */
export const practiceSource = 'common practice, no source; derived for this project';

export const practiceRanges: Partial<Record<ShippedClass, Record<string, readonly [number, number]>>> = {
  'cortical-pyramidal': {
    resting_potential_mv: [-85, -55],
    threshold_mv: [-60, -30],
    spike_height_mv: [60, 110],
    peak_mv: [10, 65],
    half_width_ms: [0.4, 1.6],
    max_rise_v_per_s: [150, 700],
    input_resistance_mohm: [25, 300],
    membrane_time_constant_ms: [5, 40],
    sag_fraction: [0, 0.35],
    max_rate_hz: [5, 120],
    // Published slopes span the whole f–I curve; ours is the steep first half, from rheobase.
    rate_gain_hz_per_na: [20, 600],
  },
  'hippocampal-pyramidal': {
    resting_potential_mv: [-80, -55],
    threshold_mv: [-60, -35],
    half_width_ms: [0.6, 1.6],
    max_rise_v_per_s: [150, 600],
    input_resistance_mohm: [40, 250],
    membrane_time_constant_ms: [8, 40],
  },
  'fast-spiking-interneuron': {
    resting_potential_mv: [-85, -55],
    threshold_mv: [-55, -30],
    spike_height_mv: [40, 100],
    half_width_ms: [0.18, 0.8],
    ahp_below_threshold_mv: [8, 30],
    input_resistance_mohm: [40, 300],
    membrane_time_constant_ms: [3, 25],
    max_rate_hz: [100, 500],
  },
  'somatostatin-interneuron': {
    resting_potential_mv: [-75, -45],
    threshold_mv: [-55, -30],
    half_width_ms: [0.4, 1.5],
    input_resistance_mohm: [150, 800],
    membrane_time_constant_ms: [10, 60],
    max_rate_hz: [20, 250],
  },
  purkinje: {
    half_width_ms: [0.12, 0.5],
    max_rise_v_per_s: [200, 900],
    input_resistance_mohm: [10, 150],
    membrane_capacitance_pf: [100, 1200],
    max_rate_hz: [50, 450],
  },
  'midbrain-dopaminergic': {
    spontaneous_rate_hz: [0.5, 8],
    threshold_mv: [-50, -25],
    half_width_ms: [0.8, 3],
    spike_height_mv: [40, 90],
  },
  'sensory-neuron-small': { resting_potential_mv: [-75, -40], half_width_ms: [1.5, 8], peak_mv: [20, 70] },
  'sensory-neuron-large': { resting_potential_mv: [-75, -45], half_width_ms: [0.4, 2], peak_mv: [15, 65] },
  motoneuron: {
    resting_potential_mv: [-80, -50],
    input_resistance_mohm: [0.3, 6],
    membrane_time_constant_ms: [2, 12],
  },
  'stem-cell-neuron': {
    resting_potential_mv: [-75, -25],
    input_resistance_mohm: [150, 6000],
    membrane_capacitance_pf: [5, 130],
    half_width_ms: [0.8, 8],
  },
  'ventricular-myocyte': {
    resting_potential_mv: [-95, -75],
    height_from_rest_mv: [95, 140],
    max_rise_v_per_s: [100, 500],
    apd90_ms: [100, 500],
  },
  'sinoatrial-node': {
    maximum_diastolic_potential_mv: [-75, -45],
    max_rise_v_per_s: [1, 60],
    cycle_length_ms: [100, 1500],
  },
  'skeletal-muscle': { resting_potential_mv: [-95, -65], peak_mv: [5, 50], max_rise_v_per_s: [100, 700] },
  'squid-axon': { resting_potential_mv: [-75, -50], height_from_rest_mv: [80, 125], peak_mv: [25, 60] },
  chromaffin: {
    resting_potential_mv: [-80, -35],
    input_resistance_mohm: [1000, 20000],
    membrane_capacitance_pf: [4, 15],
  },
};
