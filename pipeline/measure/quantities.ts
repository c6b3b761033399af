/**
 * The vocabulary of numbers. Table columns, CSV headers, the data dictionary, the methods page, chart axes and
 * tooltips are derived from this list and from nothing else.
 */

export type Level = 'spike' | 'sweep' | 'cell';

export interface Quantity {
  id: string;
  levels: readonly Level[];
  label: string;
  symbol: string;
  /** As shown to people. Empty for a pure number. */
  unit: string;
  /** UCUM code, case sensitive. */
  ucum: string;
  definition: string;
  formula: string;
  /** Where the definition is published, or 'common practice, no source'. */
  source: string;
  decimals: number;
  /**
   * How its 95 % half-width is had, in words that let a person repeat it. Left out where there is none to give (counts,
   * settings, what was stated): such a quantity has no `_u95` column.
   */
  uncertainty?: string;
  /** True for a potential against the bath: the junction correction shifts it. Differences are not shifted. */
  absolute_potential: boolean;
  /** Which clamp mode it belongs to. */
  clamp: 'current' | 'voltage' | 'both';
}

const mv = { unit: 'mV', ucum: 'mV' } as const;
const ms = { unit: 'ms', ucum: 'ms' } as const;
const s = { unit: 's', ucum: 's' } as const;
const pa = { unit: 'pA', ucum: 'pA' } as const;
const mohm = { unit: 'MΩ', ucum: 'MOhm' } as const;
const pf = { unit: 'pF', ucum: 'pF' } as const;
const hz = { unit: 'Hz', ucum: 'Hz' } as const;
const rise = { unit: 'V/s', ucum: 'V/s' } as const;
const one = { unit: '', ucum: '1' } as const;

const mmolar = { unit: 'mM', ucum: 'mmol/L' } as const;

const practice = 'common practice, no source';
const bean = 'Bean 2007, Nat Rev Neurosci 8:451–465 (criterion on dV/dt; from memory)';
const circuit = 'linear circuit theory';
const excess =
  'Carter & Bean 2009, Neuron 64:898–909 (κ 1.25 to 2); Hodgkin 1975, Phil Trans R Soc B 270:297 (κ 4; from memory)';
const overKappa = 'the same with κ = 1 (the least possible) and κ = 4 (squid axon), the farther of the two';
const ionic = 'Hodgkin & Huxley 1952, J Physiol 117:500–544, eq. 1: I = C·dV/dt + I_ionic';
const density = { unit: 'pA/pF', ucum: 'pA/pF' } as const;
const ionicUncertainty =
  'Half-widths of dV/dt times C, of C times dV/dt (not where C is stated) and of the mean injected current (1.96 standard errors), in squares; per pF, divided by C, with C’s own times I/C² in place of the second.';
const overSpikes =
  'For the cell, where it is a median over n spikes: w = t(0.975, n − 1)·SD; or, where narrower and SD² ≤ s²·χ²(0.95, n − 1)/(n − 1), w = t(0.975, n + 3)·√(((n − 1)·SD² + 4·s²)/(n + 3)) with the usual scatter s (4 % of a duration, 10 % of a rate of change, 2 mV; none for cycle lengths and charges); w/√n × √(1 + (π/2 − 1)(1 − 2/n)) for three or more, and in quadrature the median of the spikes’ own half-widths.';
const apdUncertainty = `Fast spikes: 1.96 times, in squares, 1.5 times the noise over the slope at the crossing and 0.3 samples at the rise. Slow classes: 1.96 times, in squares, the uncertainty of the steepest rise (see cycle length) and of the crossing; that is the level’s error over the slope there, the level’s error being the peak’s and the diastolic level’s in their shares, slow noise, and the standard error of the parabola. ${overSpikes}`;
const pulseFit =
  'The fit: to the current from 50 ms before to 100 ms after every command step of 0.2 to 20 mV (at most 16 in a sweep; not between levels more than 20 mV above holding, within 30 ms of a larger step, or in a ramp’s stairs: steps the same way less than 50 ms apart), each pulse on a straight line of its own, least squares of ΔV·(g_ss·s(t) + g_tr·e(t) + C_p·h(t)) with s, e and h the answers of a four-pole Bessel low-pass (declared corner ± 10 %, undeclared: found) to a step, to exp(−t/τ) and to an impulse; t counts from the moment of the command, known to within a sample (mean 8 µs − 0.2 of the interval, SD 0.3 of it and 12 µs combined); C_p = 0 ± 2.5 pF is what is left of the pipette; a sine at the mains frequency is added where it stands out';
const pulseError =
  '1.96 × the standard error: the fit is made at nine moments of the command across what is known of it, each weighted by its likelihood (Laplace); variance within (covariance of the fit, GUM 5.2, noise with its autocorrelation, 1.5 % of the peak for what filter and command may differ from the model while the edge passes, all × χ² over its freedom where above 1) plus variance among them. For the cell: t(0.975, n + 1)·√(SD²/n + what the sweeps’ errors have in common), the latter their mean square less SD². A half-width above half the number is not reported as a number';

/** How the trace is read between its samples, for the formulas. */
const between =
  'V between samples is that of the local cubic by least squares about the place (weights (1 − (d/h)²)² within h samples): of h = 3·1.25^k up to half the rise or width the widest whose reading all narrower ones and the band-limited interpolation share within 3 standard deviations of the noise in the difference; where there is none, the band-limited interpolation of the recorded samples (sinc under a Kaiser window, 8 zero crossings, β = 8)';
/** Half-widths of what slow spikes have like fast ones, for the entries' `uncertainty`. */
const slowPlaced =
  'slow classes: 1.96 standard errors; the threshold’s place by the slope’s noise over its change there, the shift that twice the window makes and 0.3 samples, its potential by the trace’s change over that, fast and slow noise; the maximum fall by what the next narrower window shows; a fall’s time by its level’s error and twice the fast noise over the slope there; the rest from these in squares';
const placed = `±u that holds 95 % of a normal error with the expected bias and standard deviation: noise (covariance of quiet stretches) through the weights of the samples that were used; 0.6 of what the next narrower window would change; what the filter is expected to have taken (restored − measured, by van Cittert’s restoration), known within 15 %, more of it by an electrode of 12 µs and by what restoring cannot reach (14 times the restored share of the rise); for potentials also hum and up to 0.2 mV of slow wander. ${overSpikes}`;
/** How the filter is undone, for the formulas. */
const restoration = (what: string): string =>
  `${what} on V + (V − gV) + (V − gV) − g(V − gV), where g is the trace smoothed once more by the filter’s own gain without delay: a four-pole Bessel low-pass at the corner that is stated, or else seen in the noise`;
const restorationSource =
  'van Cittert 1931, Z Phys 69:298–308; Bessel low-pass: Thomson 1949, Proc IEE 96:487–490 (both from memory). Heart and calcium spikes as the half-width and the maximum fall say';
const correctedUncertainty =
  'from noise through the restored trace’s weights, 15 % of the correction (with an estimated corner that of the corner twice besides), what restoring cannot reach (14 times the restored share of the rise), and an electrode of 12 µs (12 MΩ · 1 pF, common practice, no source) that no filter statement covers';
const lossUncertainty =
  'as for the threshold, of what was restored: expected to be short by what an electrode of 12 µs takes and restoring cannot reach, known within 15 % (with an estimated corner that of the corner twice besides), and half of the measured number’s noise';

type Draft = Omit<Quantity, 'absolute_potential' | 'clamp'> & Partial<Pick<Quantity, 'absolute_potential' | 'clamp'>>;
const list = (drafts: Draft[]): Quantity[] =>
  drafts.map((draft) => ({ absolute_potential: false, clamp: 'current', ...draft }));

export const quantities: readonly Quantity[] = list([
  // Per spike; at the level of the cell: the first spike at rheobase.
  {
    id: 'threshold_mv',
    levels: ['spike', 'cell'],
    label: 'Threshold',
    symbol: 'V_thr',
    ...mv,
    decimals: 1,
    absolute_potential: true,
    definition: 'Potential at the last upward crossing of the dV/dt criterion before the steepest point of the rise.',
    formula: `V where dV/dt = 20 V/s, or the class’s own criterion (slow classes: 5 % of the spike’s maximum rise); where the stimulus edge alone exceeds the criterion, the crossing after the edge’s own response. ${between}`,
    source: bean,
    uncertainty: placed,
  },
  {
    id: 'threshold_at_s',
    levels: ['spike'],
    label: 'Threshold time',
    symbol: 't_thr',
    ...s,
    decimals: 5,
    definition: 'Time of threshold from the start of the sweep.',
    formula:
      'time of the crossing that gives the threshold, as recorded: later than the membrane’s by the delay of the filter (0.336/corner for a four-pole Bessel filter) and by the electrode’s lag',
    source: bean,
    uncertainty: placed,
  },
  {
    id: 'peak_mv',
    levels: ['spike', 'cell'],
    label: 'Peak',
    symbol: 'V_peak',
    ...mv,
    decimals: 1,
    absolute_potential: true,
    definition: 'Highest potential of the spike.',
    formula: `V at the top, where dV/dt = 0 next to the highest sample. ${between}`,
    source: practice,
    uncertainty: placed,
  },
  {
    id: 'peak_at_s',
    levels: ['spike'],
    label: 'Peak time',
    symbol: 't_peak',
    ...s,
    decimals: 5,
    definition: 'Time of the peak from the start of the sweep.',
    formula: 'time of that top, as recorded: delays of the filter and the electrode are not taken off',
    source: practice,
    uncertainty: placed,
  },
  {
    id: 'overshoot_mv',
    levels: ['spike', 'cell'],
    label: 'Overshoot',
    symbol: 'V_os',
    ...mv,
    decimals: 1,
    absolute_potential: true,
    definition: 'How far the peak rises above 0 mV; negative where it stays below.',
    formula: 'V_peak − 0 mV',
    source: practice,
    uncertainty: placed,
  },
  {
    id: 'spike_height_mv',
    levels: ['spike', 'cell'],
    label: 'Spike height',
    symbol: 'H',
    ...mv,
    decimals: 1,
    definition: 'Height of the spike from threshold to peak.',
    formula: 'V_peak − V_thr',
    source: 'Ekins et al. 2020, eLife 9:e62373; Nagaeva et al. 2020, eLife',
    uncertainty:
      'of threshold and peak in quadrature; what the filter is expected to have taken of the height; hum as far as it changes from threshold to peak',
  },
  {
    id: 'height_from_rest_mv',
    levels: ['spike', 'cell'],
    label: 'Height from rest',
    symbol: 'H_rest',
    ...mv,
    decimals: 1,
    definition: 'Height of the spike from the sweep’s baseline to its peak.',
    formula: 'V_peak − V_baseline',
    source: practice,
    uncertainty: 'of the peak and of the baseline in quadrature',
  },
  {
    id: 'half_width_ms',
    levels: ['spike', 'cell'],
    label: 'Half-width',
    symbol: 'w½',
    ...ms,
    decimals: 3,
    definition: 'Width of the spike at half its height above threshold.',
    formula: `t_down − t_up at V_thr + H/2. ${between}`,
    source: 'Ekins et al. 2020, eLife 9:e62373; Nagaeva et al. 2020, eLife',
    uncertainty: `of both crossings (noise over slope), of the level at half height through both slopes, and what the filter is expected to have added; combined as for the threshold; ${slowPlaced}`,
  },
  {
    id: 'max_rise_v_per_s',
    levels: ['spike', 'cell'],
    label: 'Maximum rise',
    symbol: 'dV/dt max',
    ...rise,
    decimals: 1,
    definition: 'Steepest rise between threshold and peak.',
    formula: `max dV/dt between threshold and peak. ${between} Not given with fewer than 6 samples from threshold to peak.`,
    source: practice,
    uncertainty: placed,
  },
  {
    id: 'max_fall_v_per_s',
    levels: ['spike', 'cell'],
    label: 'Maximum fall',
    symbol: 'dV/dt min',
    ...rise,
    decimals: 1,
    definition: 'Steepest fall after the peak, as a negative rate.',
    formula: `min dV/dt from the peak to the afterhyperpolarization minimum, without one to the return to threshold. ${between}. Slow classes: the least-squares slope over ±4 ms where it is steepest, over ±2, 1, 0.5 or 0.25 ms where that is steeper by more than noise makes the steepest of many`,
    source: practice,
    uncertainty: `${placed}; ${slowPlaced}`,
  },
  {
    id: 'depolarization_ms',
    levels: ['spike', 'cell'],
    label: 'Depolarization',
    symbol: 't_dep',
    ...ms,
    decimals: 3,
    definition: 'Time from threshold to peak.',
    formula: 't_peak − t_thr',
    source: practice,
    uncertainty: 'of threshold time and peak time in quadrature, and what the filter changes of their distance',
  },
  {
    id: 'repolarization_ms',
    levels: ['spike', 'cell'],
    label: 'Repolarization',
    symbol: 't_rep',
    ...ms,
    decimals: 3,
    definition: 'Time from the peak back to the threshold potential.',
    formula: 't(V = V_thr, falling) − t_peak',
    source: practice,
    uncertainty:
      'of peak time, of the return’s crossing and of the threshold’s level over the slope there in quadrature, and what the filter changes',
  },
  {
    id: 'ahp_minimum_mv',
    levels: ['spike', 'cell'],
    label: 'Afterhyperpolarization minimum',
    symbol: 'V_ahp',
    ...mv,
    decimals: 1,
    absolute_potential: true,
    definition:
      'Lowest potential between the peak and the next threshold, the next stimulus edge or the end of the class’s window.',
    formula:
      'lowest point of the local cubic (weights (1 − (d/h)²)² within h samples of the place) about the lowest sample of that stretch; h the widest of 3·1.8^k, within the stretch, at most 330 samples and 20 ms, whose value all narrower ones have within 3 standard deviations of the noise in their difference. Slow classes: vertex of the parabola, as for the diastolic potential',
    source: practice,
    uncertainty: placed,
  },
  {
    id: 'ahp_below_threshold_mv',
    levels: ['spike', 'cell'],
    label: 'Afterhyperpolarization depth',
    symbol: 'D_ahp',
    ...mv,
    decimals: 1,
    definition: 'Depth of the afterhyperpolarization below threshold.',
    formula: 'V_thr − V_ahp',
    source: 'Ekins et al. 2020, eLife 9:e62373; Nagaeva et al. 2020, eLife',
    uncertainty: 'of threshold and minimum in quadrature; hum and wander as far as they change between them',
  },
  {
    id: 'cycle_length_ms',
    levels: ['spike', 'cell'],
    label: 'Cycle length',
    symbol: 'CL',
    ...ms,
    decimals: 1,
    definition:
      'Time from this spike’s peak to the next; for heart and calcium spikes, whose tops are flat, from steepest rise to steepest rise. For the cell, the median.',
    formula: 't_peak(k+1) − t_peak(k); slow classes: t(dV/dt max)(k+1) − t(dV/dt max)(k)',
    source: practice,
    uncertainty:
      'Both peak times in quadrature. Slow classes: each time of steepest rise is uncertain by w/√12, w the stretch whose slope lies within two standard deviations of slope noise of the steepest (at least 0.3 samples); the two are added in squares, times 1.96. For the cell: Student’s t times SD/√n.',
  },
  {
    id: 'upstroke_at_s',
    levels: ['spike'],
    label: 'Upstroke time',
    symbol: 't_up',
    ...s,
    decimals: 5,
    definition: 'Time of the steepest rise from the start of the sweep; for heart and calcium spikes.',
    formula: 'abscissa of the vertex through the largest dV/dt and its two neighbours',
    source: practice,
    uncertainty: 'As for one end of the cycle length.',
  },
  {
    id: 'diastolic_potential_mv',
    levels: ['spike', 'cell'],
    label: 'Diastolic potential',
    symbol: 'V_dia',
    ...mv,
    decimals: 1,
    absolute_potential: true,
    definition:
      'Lowest potential between the previous spike and this one, at most the class’s window back; where the sweep begins after that minimum, the one after this spike. For heart and calcium spikes.',
    formula:
      'lowest running mean over ±2 ms, then the vertex of the least-squares parabola there, as wide (at most ±20 ms) as its residuals stay within what fast noise explains',
    source:
      'common practice (maximum diastolic potential); the parabola: Savitzky & Golay 1964, Anal Chem 36:1627–1639',
    uncertainty:
      '1.96 times the standard error of the fitted level, half its difference from the parabola over half the window, and slow noise (spread of 4 ms means 10 ms apart between spikes, less what fast noise gives), in squares.',
  },
  {
    id: 'apd30_ms',
    levels: ['spike', 'cell'],
    label: 'Duration to 30 % repolarization',
    symbol: 'APD30',
    ...ms,
    decimals: 1,
    definition:
      'Time from the steepest rise until three tenths of the way from the peak to the preceding diastolic level are gone; for heart and calcium spikes.',
    formula:
      't(V = V_peak − 0.3·(V_peak − V_dia), first fall) − t(dV/dt max); slow classes: where the least-squares parabola over at most ±10 ms meets the level',
    source: practice,
    uncertainty: apdUncertainty,
  },
  {
    id: 'apd50_ms',
    levels: ['spike', 'cell'],
    label: 'Duration to 50 % repolarization',
    symbol: 'APD50',
    ...ms,
    decimals: 1,
    definition:
      'Time from the steepest rise until half of the way from the peak to the preceding diastolic level is gone.',
    formula:
      't(V = V_peak − 0.5·(V_peak − V_dia), first fall) − t(dV/dt max); slow classes: where the least-squares parabola over at most ±10 ms meets the level',
    source: practice,
    uncertainty: apdUncertainty,
  },
  {
    id: 'apd90_ms',
    levels: ['spike', 'cell'],
    label: 'Duration to 90 % repolarization',
    symbol: 'APD90',
    ...ms,
    decimals: 1,
    definition:
      'Time from the steepest rise until nine tenths of the way from the peak to the preceding diastolic level are gone.',
    formula:
      't(V = V_peak − 0.9·(V_peak − V_dia), first fall) − t(dV/dt max); slow classes: where the least-squares parabola over at most ±10 ms meets the level',
    source: practice,
    uncertainty: apdUncertainty,
  },
  {
    id: 'triangulation_ms',
    levels: ['spike', 'cell'],
    label: 'Triangulation',
    symbol: 'APD90 − APD30',
    ...ms,
    decimals: 1,
    definition: 'How long repolarization takes from 30 to 90 %; for heart and calcium spikes.',
    formula: 'APD90 − APD30',
    source: 'Hondeghem, Carlsson & Duker 2001, Circulation 103:2004–2013 (from memory)',
    uncertainty: 'The two crossing times’ standard uncertainties in squares, times 1.96.',
  },
  {
    id: 'plateau_mv',
    levels: ['spike', 'cell'],
    label: 'Plateau',
    symbol: 'V_plateau',
    ...mv,
    decimals: 1,
    absolute_potential: true,
    definition: 'Mean potential midway between upstroke and 90 % repolarization; for heart and calcium spikes.',
    formula: 'mean V from t_up + 0.4·APD90 to t_up + 0.6·APD90',
    source: 'ours',
    uncertainty:
      '1.96 times, in squares: fast noise over the root of the number of samples, slow noise, and the slope there times half the uncertainty of APD90.',
  },
  {
    id: 'stimulus_artefact_mv',
    levels: ['spike', 'cell'],
    label: 'Stimulus artefact',
    symbol: 'ΔV_stim',
    ...mv,
    decimals: 1,
    definition:
      'Jump that electrode and bridge add while the brief pulse before the upstroke lasts, positive upwards. It is taken out of the other numbers. For heart and calcium spikes.',
    formula:
      'line through 0.1 to 0.5 ms after an edge less the line through as much before it, both at the edge; mean of onset and −offset, weighted by their errors; the better one where they disagree',
    source: 'ours; linear circuit theory',
    uncertainty:
      '1.96 times the weighted error of the lines (residuals, and a quarter of the change of slope over the gap between them), at least half the difference between the edges.',
  },
  {
    id: 'sodium_headroom_mv',
    levels: ['spike', 'cell'],
    label: 'Sodium headroom',
    symbol: 'E_Na − V_peak',
    ...mv,
    decimals: 1,
    definition: 'How far the peak stays below the sodium equilibrium potential of the stated solutions.',
    formula: 'E_Na − V_peak',
    source: 'Nernst equation; Hodgkin & Katz 1949, J Physiol 108:37–77',
    uncertainty: 'that of the peak; what is uncertain of E_Na is weighed in judging',
  },
  {
    id: 'potassium_margin_mv',
    levels: ['spike', 'cell'],
    label: 'Potassium margin',
    symbol: 'V_ahp − E_K',
    ...mv,
    decimals: 1,
    definition:
      'How far the afterhyperpolarization minimum stays above the potassium equilibrium potential of the stated solutions.',
    formula: 'V_ahp − E_K',
    source: 'Nernst equation; Hodgkin & Katz 1949, J Physiol 108:37–77',
    uncertainty: 'that of the minimum; what is uncertain of E_K is weighed in judging',
  },
  {
    id: 'minimum_charge_pc',
    levels: ['spike', 'cell'],
    label: 'Least charge',
    symbol: 'Q_min',
    unit: 'pC',
    ucum: 'pC',
    decimals: 2,
    definition: 'The least charge that can carry the spike: what the membrane capacitance needs for its height.',
    formula:
      'C·H: C the stated capacitance, or else that one of membrane capacitance (current clamp) and cell capacitance (voltage clamp) whose half-width is smaller',
    source: 'Carter & Bean 2009, Neuron 64:898–909',
    uncertainty: 'relative half-widths of height and, where it was measured, of the capacitance in quadrature',
  },
  {
    id: 'minimum_ions_millions',
    levels: ['spike', 'cell'],
    label: 'Least number of ions',
    symbol: 'N_min',
    unit: '10⁶',
    ucum: '10*6',
    decimals: 2,
    definition: 'How many monovalent ions carry the least charge, in millions.',
    formula: 'C·H / e',
    source: 'Carter & Bean 2009, Neuron 64:898–909; elementary charge exact in the 2019 SI',
    uncertainty: 'as for the least charge',
  },
  {
    id: 'max_rise_corrected_v_per_s',
    levels: ['spike', 'cell'],
    label: 'Maximum rise without the filter',
    symbol: 'dV/dt max₀',
    ...rise,
    decimals: 1,
    definition:
      'Steepest rise with the recorder’s filter undone, where that is sound: the filter is stated or seen in the noise, and took no more than a quarter of the rise.',
    formula: restoration('max dV/dt'),
    source: restorationSource,
    uncertainty: correctedUncertainty,
  },
  {
    id: 'peak_corrected_mv',
    levels: ['spike', 'cell'],
    label: 'Peak without the filter',
    symbol: 'V_{peak,0}',
    ...mv,
    decimals: 1,
    absolute_potential: true,
    definition:
      'Highest potential with the recorder’s filter undone, where the filter took no more than two fifths of the rise.',
    formula: restoration('V_peak'),
    source: restorationSource,
    uncertainty: correctedUncertainty,
  },
  {
    id: 'spike_height_corrected_mv',
    levels: ['spike', 'cell'],
    label: 'Spike height without the filter',
    symbol: 'H₀',
    ...mv,
    decimals: 1,
    definition:
      'Height from threshold to peak with the recorder’s filter undone, where the filter took no more than two fifths of the rise.',
    formula: restoration('V_peak − V_thr'),
    source: restorationSource,
    uncertainty: correctedUncertainty,
  },
  {
    id: 'half_width_corrected_ms',
    levels: ['spike', 'cell'],
    label: 'Half-width without the filter',
    symbol: 'w½₀',
    ...ms,
    decimals: 3,
    definition:
      'Width at half height with the recorder’s filter undone, where the filter took no more than two fifths of the rise.',
    formula: restoration('t_down − t_up at half the height'),
    source: restorationSource,
    uncertainty: correctedUncertainty,
  },
  {
    id: 'rise_lost_percent',
    levels: ['spike', 'cell'],
    label: 'Rise lost to the filter',
    symbol: 'Δ(dV/dt max)',
    unit: '%',
    ucum: '%',
    decimals: 1,
    definition:
      'Share of the maximum rise that the recorder’s filter is expected to have taken; a lower bound above 25 %, where the correction stops being sound.',
    formula: '100·(1 − measured/restored maximum rise), restored as the corrected maximum rise is',
    source: restorationSource,
    uncertainty: lossUncertainty,
  },
  {
    id: 'height_lost_mv',
    levels: ['spike', 'cell'],
    label: 'Height lost to the filter',
    symbol: 'ΔH',
    ...mv,
    decimals: 2,
    definition: 'How much lower the recorder’s filter is expected to have made the spike.',
    formula: 'restored − measured spike height',
    source: restorationSource,
    uncertainty: lossUncertainty,
  },
  {
    id: 'width_gained_percent',
    levels: ['spike', 'cell'],
    label: 'Width gained by the filter',
    symbol: 'Δw½',
    unit: '%',
    ucum: '%',
    decimals: 1,
    definition: 'How much wider the recorder’s filter is expected to have made the spike at half height.',
    formula: '100·(measured/restored half-width − 1)',
    source: restorationSource,
    uncertainty: lossUncertainty,
  },
  {
    id: 'peak_inward_current_pa',
    levels: ['spike', 'cell'],
    label: 'Peak inward current',
    symbol: 'I_in',
    ...pa,
    decimals: 0,
    definition:
      'Net ionic current at the steepest rise, where it is largest inward (negative; outward is positive). Assumes an isopotential cell and a current that is steady over the phase.',
    formula: 'I − C·(dV/dt max): I the mean injected current over the depolarization, C as for the least charge',
    source: ionic,
    uncertainty: ionicUncertainty,
  },
  {
    id: 'peak_inward_current_pa_per_pf',
    levels: ['spike', 'cell'],
    label: 'Peak inward current density',
    symbol: 'I_in/C',
    ...density,
    decimals: 1,
    definition: 'The same per capacitance; known without one where nothing is injected.',
    formula: 'I/C − (dV/dt max)',
    source: ionic,
    uncertainty: ionicUncertainty,
  },
  {
    id: 'peak_outward_current_pa',
    levels: ['spike', 'cell'],
    label: 'Peak outward current',
    symbol: 'I_out',
    ...pa,
    decimals: 0,
    definition:
      'Net ionic current at the steepest fall, where it is largest outward (positive; outward is positive). Assumes an isopotential cell and a current that is steady over the phase.',
    formula: 'I − C·(dV/dt min): I the mean injected current over the repolarization, C as for the least charge',
    source: ionic,
    uncertainty: ionicUncertainty,
  },
  {
    id: 'peak_outward_current_pa_per_pf',
    levels: ['spike', 'cell'],
    label: 'Peak outward current density',
    symbol: 'I_out/C',
    ...density,
    decimals: 1,
    definition: 'The same per capacitance; known without one where nothing is injected.',
    formula: 'I/C − (dV/dt min)',
    source: ionic,
    uncertainty: ionicUncertainty,
  },
  {
    id: 'depolarization_charge_pc',
    levels: ['spike', 'cell'],
    label: 'Depolarization charge',
    symbol: 'Q_dep',
    unit: 'pC',
    ucum: 'pC',
    decimals: 2,
    definition: 'Net ionic charge that crosses the membrane from threshold to peak, outward positive.',
    formula: 'I·t_dep − C·H: I the mean injected current over the phase',
    source: ionic,
    uncertainty:
      'Half-widths of the height times C, of C times the height, of the mean current (1.96 standard errors) times the duration and of the duration times the current, in squares.',
  },
  {
    id: 'repolarization_charge_pc',
    levels: ['spike', 'cell'],
    label: 'Repolarization charge',
    symbol: 'Q_rep',
    unit: 'pC',
    ucum: 'pC',
    decimals: 2,
    definition:
      'Net ionic charge that crosses the membrane from the peak back to the threshold potential, outward positive.',
    formula: 'I·t_rep + C·H: I the mean injected current over the phase',
    source: ionic,
    uncertainty:
      'Half-widths of the height times C, of C times the height, of the mean current (1.96 standard errors) times the duration and of the duration times the current, in squares.',
  },
  {
    id: 'rise_samples',
    levels: ['spike', 'sweep', 'cell'],
    label: 'Samples on the rise',
    symbol: 'n_rise',
    ...one,
    decimals: 0,
    clamp: 'both',
    definition: 'Number of samples from threshold to peak; for a sweep or cell the smallest.',
    formula: '(t_peak − t_thr)·rate',
    source: practice,
  },

  // Per sweep, current clamp.
  {
    id: 'stimulus_pa',
    levels: ['sweep'],
    label: 'Stimulus',
    symbol: 'I_stim',
    ...pa,
    decimals: 1,
    definition: 'Injected current during the step (or at the end of the ramp) relative to holding.',
    formula: 'I_step − I_holding',
    source: practice,
  },
  {
    id: 'command_mv',
    levels: ['sweep'],
    label: 'Command',
    symbol: 'V_cmd',
    ...mv,
    decimals: 1,
    absolute_potential: true,
    clamp: 'voltage',
    definition: 'Command potential during the largest step of a voltage-clamp sweep.',
    formula: 'V_step',
    source: practice,
  },
  {
    id: 'holding_pa',
    levels: ['sweep'],
    label: 'Holding current',
    symbol: 'I_hold',
    ...pa,
    decimals: 1,
    definition: 'Injected current before the stimulus, bias included.',
    formula: 'median I before onset + bias',
    source: practice,
  },
  {
    id: 'baseline_mv',
    levels: ['sweep', 'cell'],
    label: 'Baseline',
    symbol: 'V_base',
    ...mv,
    decimals: 1,
    absolute_potential: true,
    definition:
      'Potential before the stimulus, over at most 500 ms, spikes, test pulses and mains hum excluded. Where no stimulus is known and the level is known no better than 5 mV, none is given.',
    formula:
      'median of the means over 2 ms before onset, about their line; hum: the least-squares sine and its harmonics, where resolved, are taken off first',
    source: practice,
    uncertainty:
      'Student’s t times the root of (√(π/2) times the serial standard error of the 2 ms means about their line)² and of the rounding left by the digitizer, q²/(2π²)·Σ exp(−(2πkσ/q)²)/k², q its step and σ the noise. For the cell: from the scatter over sweeps, pooled with the sweeps’ own where it does not exceed them.',
  },

  {
    id: 'baseline_sd_mv',
    levels: ['sweep', 'cell'],
    label: 'Baseline spread',
    symbol: 'σ_base',
    ...mv,
    decimals: 2,
    definition: 'Standard deviation of the potential before the stimulus, hum included.',
    formula: 'SD of V over the same stretch',
    source: practice,
    uncertainty:
      '1.96·SD/√(2n), n the number of independent values: (SD over the serial standard error of the mean)², at least 4.',
  },

  {
    id: 'baseline_drift_mv_per_s',
    levels: ['sweep', 'cell'],
    label: 'Drift within the baseline',
    symbol: 'dV_base/dt',
    unit: 'mV/s',
    ucum: 'mV/s',
    decimals: 2,
    definition: 'Slope of the potential before the stimulus.',
    formula: 'least-squares slope of the 2 ms means over the same stretch, hum taken off',
    source: practice,
    uncertainty:
      'Student’s t times the serial standard error of the slope: the residual variance is read from the slowest cosines that the residuals show beside the line.',
  },

  {
    id: 'spikes',
    levels: ['sweep', 'cell'],
    label: 'Spikes',
    symbol: 'n',
    ...one,
    decimals: 0,
    definition: 'Number of spikes in the sweep; for the cell, in all its sweeps.',
    formula: 'count',
    source: practice,
  },
  {
    id: 'mean_rate_hz',
    levels: ['sweep'],
    label: 'Mean rate',
    symbol: 'f',
    ...hz,
    decimals: 1,
    definition: 'Spikes during the stimulus over its length (without a stimulus: over the sweep).',
    formula: 'n_stim / (t_end − t_onset)',
    source: practice,
  },
  {
    id: 'first_spike_latency_ms',
    levels: ['sweep', 'cell'],
    label: 'First-spike latency',
    symbol: 't_first',
    ...ms,
    decimals: 2,
    definition: 'Time from stimulus onset to the first spike’s threshold; for the cell, at rheobase.',
    formula: 't_thr(1) − t_onset',
    uncertainty:
      '√(u² + (Δt/2)² + d²): u the half-width of the threshold’s time, Δt the sampling interval (where within it the stimulus began), d the delay of the stated filter, 0.336/f_c, which the potential has and a copied command has not',
    source: practice,
  },
  {
    id: 'interval_cv',
    levels: ['sweep'],
    label: 'Interval CV',
    symbol: 'CV',
    ...one,
    decimals: 3,
    definition: 'Coefficient of variation of the interspike intervals during the stimulus.',
    formula: 'SD(I) / mean(I), sample SD',
    uncertainty:
      'the half-widths u of the spike times carried through: √Σ((CV(t_k + u) − CV(t_k − u))/2)² over the spikes',
    source: practice,
  },
  {
    id: 'interval_lv',
    levels: ['sweep'],
    label: 'Interval Lv',
    symbol: 'Lv',
    ...one,
    decimals: 3,
    definition: 'Local variation of the interspike intervals: 0 regular, 1 for a Poisson process.',
    formula: '3/(n−1) · Σ ((I_k − I_{k+1})/(I_k + I_{k+1}))²',
    uncertainty:
      'the half-widths u of the spike times carried through: √Σ((Lv(t_k + u) − Lv(t_k − u))/2)² over the spikes',
    source: 'Shinomoto, Shima & Tanji 2003, Neural Comput 15:2823–2842',
  },
  {
    id: 'interval_adaptation',
    levels: ['sweep'],
    label: 'Interval adaptation',
    symbol: 'A',
    ...one,
    decimals: 3,
    definition: 'Mean relative lengthening from each interspike interval to the next.',
    formula: 'mean of (I_{k+1} − I_k)/(I_{k+1} + I_k)',
    uncertainty:
      'the half-widths u of the spike times carried through: √Σ((A(t_k + u) − A(t_k − u))/2)² over the spikes',
    source: practice,
  },
  {
    id: 'largest_instantaneous_rate_hz',
    levels: ['sweep', 'cell'],
    label: 'Largest instantaneous rate',
    symbol: 'f_inst',
    ...hz,
    decimals: 0,
    definition: 'Rate of the shortest interval between two peaks; for the cell, the largest of its sweeps.',
    formula: '1 / min I_k',
    source: practice,
    uncertainty:
      'f²·√2·Δt/√12 times 1.96: each peak time lies anywhere within a sample interval Δt. (An upper bound: the parabola does better.)',
  },
  {
    id: 'doublets',
    levels: ['sweep', 'cell'],
    label: 'Doublets',
    symbol: 'n_2',
    ...one,
    decimals: 0,
    definition:
      'Pairs of spikes within 20 ms of each other and less than a third of the pause before and after the pair apart; for the cell, in all its sweeps.',
    formula:
      'number of groups of two: every interval within ≤ 20 ms and < ⅓ of both bounding intervals (of the one there is at either end of the train)',
    source: practice,
  },
  {
    id: 'bursts',
    levels: ['sweep', 'cell'],
    label: 'Bursts',
    symbol: 'n_b',
    ...one,
    decimals: 0,
    definition:
      'Groups of three or more spikes that follow each other within 20 ms and in less than a third of the pause before and after the group; for the cell, in all its sweeps. A train without pauses is no burst.',
    formula: 'number of groups of three or more, as for doublets',
    source: practice,
  },
  {
    id: 'spikelets',
    levels: ['sweep', 'cell'],
    label: 'Spikelets',
    symbol: 'n_s',
    ...one,
    decimals: 0,
    definition:
      'Small brief depolarizations that are no spikes: at least 3 mV and eight standard deviations of fast noise high, below the class’s prominence; their heights stand beside the count.',
    formula:
      'tops that stand so high above the lowest potential of the 2 ms before and fall by half of it within 3 ms; not within 3 ms of a stimulus edge, 5 ms after a peak, or in a depolarization block',
    source: practice,
  },
  {
    id: 'block_onset_ms',
    levels: ['sweep'],
    label: 'Onset of block',
    symbol: 't_block',
    ...ms,
    decimals: 1,
    definition: 'Time from stimulus onset to the last spike of a step that drives the cell into depolarization block.',
    formula:
      't_peak(last spike of the step) − t_onset, where the potential then stays above the first threshold (or within 15 mV of it, the spikes having shrunk below 60 %) for the rest of the step, at least a quarter of it',
    uncertainty: '√(u² + (Δt/2)²): u the half-width of the peak’s time, Δt the sampling interval',
    source: practice,
  },
  {
    id: 'block_recovery_ms',
    levels: ['sweep'],
    label: 'Recovery from block',
    symbol: 't_rec',
    ...ms,
    decimals: 1,
    definition:
      'Time from the end of a step that blocked firing to the next spike of at least 80 % of the step’s first spike’s height.',
    formula: 't_peak − t_end',
    uncertainty: '√(u² + (Δt/2)²): u the half-width of the peak’s time, Δt the sampling interval',
    source: practice,
  },
  {
    id: 'steady_deflection_mv',
    levels: ['sweep'],
    label: 'Steady deflection',
    symbol: 'ΔV_ss',
    ...mv,
    decimals: 2,
    definition:
      'Potential late in the step relative to baseline, spikes left out where at least half of the window is free of them.',
    formula:
      'mean V of the last tenth of the step (at most 50 ms, ending 5 ms before its end) − V_base; where the baseline drifts, its line is taken off instead of its level: through the levels before the step and after it where the potential comes back to it and they differ by more than three standard errors, else the slope before, where that exceeds twice its 95 % half-width and the level after the step lies nearer to that line than to V_base',
    source: 'Nagaeva et al. 2020, eLife (last 50 ms); window: ours',
    uncertainty:
      'Student’s t times, in squares, the serial standard errors of both levels, that of the drift times the distance (a slope known from before only: a tenth of it besides), and the digitizer’s rounding.',
  },

  {
    id: 'largest_deflection_mv',
    levels: ['sweep'],
    label: 'Largest deflection',
    symbol: 'ΔV_max',
    ...mv,
    decimals: 2,
    definition:
      'Largest excursion during a hyperpolarizing step relative to baseline, noise averaged out and its push on an extreme removed.',
    formula:
      'lowest running mean over a fiftieth of the step (1 to 10 ms), from 1 ms after onset, − V_base: the samples are dealt into two halves by turns of 0.5 ms, each half is read where the other is lowest, and the two readings are averaged',
    source: 'common practice; the two halves: ours',
    uncertainty:
      'As for the steady deflection, with the serial standard error of that mean, and the push that slow noise may give an extreme: 1.25 times its standard deviation in the baseline times √ln(length of the step / width).',
  },
  {
    id: 'rebound_mv',
    levels: ['sweep', 'cell'],
    label: 'Rebound',
    symbol: 'ΔV_reb',
    ...mv,
    decimals: 2,
    definition:
      'How far the potential rises above the baseline after a hyperpolarizing step, before the first rebound spike; for the cell, after the step the sag is read from. 0 is no rebound.',
    formula:
      'highest running mean over a fiftieth of the step (1 to 10 ms), read half by half as the largest deflection, from 1 to 300 ms after the end of the step (at most to the next edge, at least 30 ms), − V_base',
    source: 'common practice, no source',
    uncertainty: 'As for the largest deflection.',
  },
  {
    id: 'rebound_spikes',
    levels: ['sweep', 'cell'],
    label: 'Rebound spikes',
    symbol: 'n_reb',
    ...one,
    decimals: 0,
    definition:
      'Spikes within 300 ms after the end of a hyperpolarizing step; for the cell, of the step the sag is read from.',
    formula: 'count of peaks from 1 to 300 ms after the end of the step',
    source: practice,
  },

  {
    id: 'bridge_step_mv',
    levels: ['sweep'],
    label: 'Instantaneous step',
    symbol: 'ΔV_0',
    ...mv,
    decimals: 2,
    definition: 'Jump of the potential at the stimulus edges that no membrane can make: what the bridge left over.',
    formula:
      'V extrapolated back to the edge − V before it, mean over onset and end with sign of the step. Before: straight line over 10 ms. After: one exponential, or two where F > 7, or a line where no time constant is determined, from 1.3 ms·kHz over the filter’s corner (at least 0.3 ms; 1 ms where the corner is not known) to 16, 9 or 5 ms, the longest whose residuals look like noise; carried back to the filter’s delay of 0.336/corner. An exponential faster than 0.6 ms is the electrode’s own charging: it is left out and the rest carried back to twice its time constant after the edge',
    source: circuit,
    uncertainty:
      'Student’s t times, in squares, the standard errors of both values from the fits’ covariance (scaled to the slow part of their residuals) and the slope there times the uncertainty of the delay: 5 % of the filter’s (80 µs where the corner is not known) and 24 µs, twice the time constant of 1 pF behind 12 MΩ, for an electrode too fast to be seen.',
  },

  {
    id: 'pulse_response_mohm',
    levels: ['sweep', 'cell'],
    label: 'Response to brief pulses',
    symbol: 'ΔV_p/I',
    ...mohm,
    decimals: 1,
    definition:
      'How far the membrane charges while a brief pulse (at most 20 ms) lasts, over the pulse’s current; the jumps at its edges are left out. Its sign is that of the current against the voltage.',
    formula:
      '(V just before the end − V once the onset has settled, at least 0.25 ms) / I; median over pulses in which no spike peaks',
    source: circuit,
    uncertainty: 'Fast noise times √2 over the current and the root of the number of pulses, times 1.96.',
  },
  {
    id: 'noise_rms_mv',
    levels: ['sweep', 'cell'],
    label: 'Noise',
    symbol: 'V_rms',
    ...mv,
    decimals: 3,
    definition:
      'Root-mean-square noise of quiet stretches from 1 kHz to the filter corner or 0.4 of the sampling rate; the band is stated beside it.',
    formula:
      '√mean(x²), x the quiet stretches (outside spikes and stimuli, at least 10 ms each, at most 2 s in all) after a fourth-order Butterworth band-pass run forwards and backwards; for a cell the median over sweeps',
    uncertainty:
      '1.96·V_rms/√(4·B·T), B the bandwidth and T the time, with 1 % for the shape of the band; for a cell: of the median over sweeps, from their scatter s and their own uncertainties w: s/√n with n + 1 degrees of freedom where s² exceeds the mean w² by more than chance (95 % point of χ²), else the two variances pooled, w counting for 10 degrees of freedom; × √(1 + (π/2 − 1)(1 − 2/n)) for a median of three or more; times Student’s t',
    source: practice,
  },
  {
    id: 'filter_corner_khz',
    levels: ['sweep', 'cell'],
    label: 'Filter corner in the noise',
    symbol: 'f_c',
    unit: 'kHz',
    ucum: 'kHz',
    decimals: 1,
    definition:
      'Corner of the recorder’s low-pass filter as the spectrum of the noise in quiet stretches shows it; for the cell, the median.',
    formula:
      'corner of the four-pole Bessel low-pass for which filtered white noise over an unfiltered floor best explains the mean spectrum (Hann-windowed pieces of 128 samples, half overlapping) from 1 kHz to half the rate, folded lines included; only where it explains it and the roll-off lies below half the rate',
    source: 'Welch 1967, IEEE Trans Audio Electroacoust 15:70–73; Whittle 1953, Ark Mat 2:423–434 (from memory)',
    uncertainty:
      'where twice the logarithm of the likelihood ratio reaches 3.84, the spread of neighbouring lines allowed for, and 5 % of the corner in quadrature',
  },
  {
    id: 'mains_hum_mv',
    levels: ['sweep', 'cell'],
    label: 'Mains hum',
    symbol: 'V_hum',
    ...mv,
    decimals: 3,
    definition: 'Amplitude of the sine at the mains frequency in quiet stretches.',
    formula:
      'A of the least-squares A·sin(2πft + φ) fitted with a straight line in each quiet stretch to means at about 3 kHz (at most 2 s); V_hum = √(A² − 2u²), u the noise of one quadrature; at the nominal frequency where A < 5u; for a cell the median over sweeps',
    uncertainty:
      't·u; u² = half the mean square of the amplitudes fitted at ±3, ±4, ±5 times 1/duration beside the line, the line taken out, with two degrees of freedom for each; for a cell: of the median over sweeps, from their scatter s and their own uncertainties w: s/√n with n + 1 degrees of freedom where s² exceeds the mean w² by more than chance (95 % point of χ²), else the two variances pooled, w counting for 10 degrees of freedom; × √(1 + (π/2 − 1)(1 − 2/n)) for a median of three or more; times Student’s t',
    source: 'least-squares sine fit; Gudbjartsson & Patz 1995, Magn Reson Med 34:910–914 for 2u² (from memory)',
  },
  {
    id: 'mains_hum_hz',
    levels: ['sweep', 'cell'],
    label: 'Hum frequency',
    symbol: 'f_hum',
    ...hz,
    decimals: 2,
    definition: 'Frequency at which the hum is strongest near the mains frequency.',
    formula:
      'f within ±10 % of the mains frequency (50 and 60 Hz where it is not known) that leaves the smallest squared residual of that fit; not given where A < 5u; a line 15u high elsewhere between 20 and 150 Hz is reported with a remark',
    uncertainty:
      't·u/(2π·A·s_t), s_t the standard deviation of the sampled times; for a cell: of the median over sweeps, from their scatter s and their own uncertainties w: s/√n with n + 1 degrees of freedom where s² exceeds the mean w² by more than chance (95 % point of χ²), else the two variances pooled, w counting for 10 degrees of freedom; × √(1 + (π/2 − 1)(1 − 2/n)) for a median of three or more; times Student’s t',
    source: 'Rife & Boorstyn 1974, IEEE Trans Inf Theory 20:591–598 (from memory)',
  },
  {
    id: 'clipped_fraction',
    levels: ['sweep', 'cell'],
    label: 'Clipped',
    symbol: 'c',
    ...one,
    decimals: 4,
    clamp: 'both',
    definition: 'Share of samples stuck at the recorder’s upper or lower limit.',
    formula: 'samples in runs of at least 3 at the extreme value / all samples',
    source: practice,
  },
  {
    id: 'missing_fraction',
    levels: ['sweep', 'cell'],
    label: 'Missing',
    symbol: 'm',
    ...one,
    decimals: 4,
    clamp: 'both',
    definition: 'Share of samples that could not be read.',
    formula: 'unreadable samples / all samples',
    source: practice,
  },
  {
    id: 'quantum_mv',
    levels: ['sweep', 'cell'],
    label: 'Step of the digitizer',
    symbol: 'q',
    ...mv,
    decimals: 4,
    definition: 'Smallest difference between two recorded potentials.',
    formula: 'largest common step of the differences between distinct values',
    source: practice,
  },
  {
    id: 'sample_interval_us',
    levels: ['sweep', 'cell'],
    label: 'Sampling interval',
    symbol: 'Δt',
    unit: 'µs',
    ucum: 'us',
    decimals: 2,
    clamp: 'both',
    definition: 'Time between two samples.',
    formula: '10⁶ / rate',
    source: practice,
  },

  // Voltage clamp.
  {
    id: 'access_resistance_mohm',
    levels: ['sweep', 'cell'],
    label: 'Access resistance',
    symbol: 'R_a',
    ...mohm,
    decimals: 1,
    clamp: 'both',
    definition:
      'Resistance between the amplifier and the cell’s interior: from voltage-clamp test pulses, else stated, else the stated bridge plus what it left over. What the amplifier corrects of it while it records is not in it.',
    formula: `1/(g_ss + g_tr) of the test-pulse fit; by hand, ΔV over the exponential transient carried back to the moment the command changed, steady current included. ${pulseFit}. In current clamp: R_bridge + bridge error`,
    source: circuit,
    uncertainty: pulseError,
  },
  {
    id: 'access_change_percent',
    levels: ['cell'],
    label: 'Change of access',
    symbol: 'ΔR_a',
    unit: '%',
    ucum: '%',
    decimals: 0,
    clamp: 'both',
    definition: 'Change of the access resistance from the first to the last tenth of the recording.',
    formula: '100·(R_last − R_first)/R_first, medians',
    uncertainty:
      'Student’s t times 100·√(u_first² + u_last²)/R_first; u of each median from the scatter of its sweeps and their own uncertainties, see noise',
    source: practice,
  },
  {
    id: 'membrane_resistance_mohm',
    levels: ['sweep', 'cell'],
    label: 'Membrane resistance',
    symbol: 'R_m',
    ...mohm,
    decimals: 0,
    clamp: 'voltage',
    definition:
      'Resistance of the membrane, its leak and its seal together, from voltage-clamp test pulses; where the access cannot be told apart the total, and the number says so.',
    formula:
      '1/g_ss − R_a of the test-pulse fit (see access resistance); by hand, ΔV over the change of the steady current, less R_a',
    source: circuit,
    uncertainty: pulseError,
  },
  {
    id: 'cell_capacitance_pf',
    levels: ['sweep', 'cell'],
    label: 'Cell capacitance',
    symbol: 'C_m',
    ...pf,
    decimals: 1,
    clamp: 'voltage',
    definition:
      'Capacitance of the cell from voltage-clamp test pulses, the pipette’s own left out. What the amplifier takes away of the transient without the file saying so is not in it.',
    formula:
      'τ·(R_a + R_m)/(R_a·R_m) of the test-pulse fit (see access resistance); the same as Q/ΔV·((R_a + R_m)/R_m)² with Q the charge of the exponential transient above the steady current',
    source: circuit,
    uncertainty: pulseError,
  },
  {
    id: 'transient_capacitance_pf',
    levels: ['sweep', 'cell'],
    label: 'Charge of the transient',
    symbol: 'Q/ΔV',
    ...pf,
    decimals: 1,
    clamp: 'voltage',
    definition:
      'Charge that a voltage-clamp test pulse moves beyond its steady current, over the size of the pulse: membrane and pipette together. Below about 3 pF nothing was charged but a neutralized pipette.',
    formula: 'g_tr·τ + C_p of the test-pulse fit (see access resistance); by hand, ∫(I − I_steady)dt/ΔV',
    source: circuit,
    uncertainty: pulseError,
  },
  {
    id: 'seal_resistance_gohm',
    levels: ['sweep', 'cell'],
    label: 'Seal resistance',
    symbol: 'R_seal',
    unit: 'GΩ',
    ucum: 'GOhm',
    decimals: 2,
    clamp: 'voltage',
    definition:
      'Resistance to a test pulse that charged no membrane, where it is at least 0.5 GΩ: a pipette sealed to a cell that it has not entered.',
    formula:
      '1/g_ss of the test-pulse fit (see access resistance), where g_tr·τ is not resolved and the charge of the transient may lie below 3 pF; by hand, ΔV over the change of the steady current',
    source: 'gigaseal: Hamill et al. 1981, Pflugers Arch 391:85–100 (from memory); limit ours',
    uncertainty: pulseError,
  },
  {
    id: 'escaped_currents',
    levels: ['sweep', 'cell'],
    label: 'Escaped action currents',
    symbol: 'n_esc',
    ...one,
    decimals: 0,
    clamp: 'voltage',
    definition:
      'Inward action currents that the clamp did not hold: all or none, a millisecond wide, at times of their own; for the cell, in all its sweeps.',
    formula:
      'inward peaks of at least 200 pA and 8 times the noise (1.4826 × median size) above the median of the 20 ms around, 0.15 to 4 ms wide at half their size, later than 3 ms after a step of the command (6 ms after one above 20 mV, and after the start of the recording)',
    source: practice,
  },
  {
    id: 'holding_current_pa',
    levels: ['sweep', 'cell'],
    label: 'Holding current in voltage clamp',
    symbol: 'I_h',
    ...pa,
    decimals: 1,
    clamp: 'voltage',
    definition: 'Current needed to hold the command potential before its first step.',
    formula: 'median I over the command’s first level, at most its last 0.5 s',
    source: practice,
    uncertainty:
      'the stretch is cut into ten equal blocks: t(0.975, 9)·SD of their medians/√10. For the cell: from the spread over the sweeps and their own errors, as with the access resistance',
  },

  // Per cell.
  {
    id: 'resting_potential_mv',
    levels: ['cell'],
    label: 'Resting potential',
    symbol: 'V_rest',
    ...mv,
    decimals: 1,
    absolute_potential: true,
    definition:
      'Potential without injected current: median over the sweeps of the baseline at zero total current, bias included.',
    formula: 'median V_base over sweeps with |I_total| ≤ noise',
    source: practice,
    uncertainty:
      'From the scatter over sweeps (√(π/2) times that of a mean, Student’s t with n + 1 degrees of freedom: two for the sweeps’ own), pooled with the sweeps’ own uncertainty where it does not exceed it.',
  },
  {
    id: 'maximum_diastolic_potential_mv',
    levels: ['cell'],
    label: 'Maximum diastolic potential',
    symbol: 'MDP',
    ...mv,
    decimals: 1,
    absolute_potential: true,
    definition: 'Most negative potential between the spikes of a cell that fires by itself; median over cycles.',
    formula: 'median of the minima between peaks',
    uncertainty: 'Student’s t times √(1 + (π/2 − 1)(1 − 2/n))·s/√n, s the spread of the n lowest potentials',
    source: practice,
  },
  {
    id: 'input_resistance_mohm',
    levels: ['cell'],
    label: 'Input resistance',
    symbol: 'R_in',
    ...mohm,
    decimals: 0,
    definition:
      'Slope of the steady deflection against injected current for hyperpolarizing steps without spikes, without what the bridge left over, where that was measured.',
    formula: 'least-squares line with intercept through (I, ΔV_ss) and (0, 0) − ΔR_b',
    source: 'Nagaeva et al. 2020, eLife; Ekins et al. 2020, eLife 9:e62373; taking I·R_s off: linear circuit theory',
    uncertainty:
      'Student’s t times, in squares, the uncertainty of the slope and of ΔR_b (none is given where ΔR_b could not be measured). The slope’s: the deflections’ own, pooled (as 10 degrees of freedom) with the scatter about the parabola through the points, where there are four or more with the origin; the scatter alone, two degrees of freedom added, where it exceeds chance.',
  },

  {
    id: 'membrane_time_constant_ms',
    levels: ['cell'],
    label: 'Membrane time constant',
    symbol: 'τ_m',
    ...ms,
    decimals: 1,
    definition:
      'Time constant of the response to small hyperpolarizing steps: of one exponential, or the slow one of two where two are warranted. It is that of the cell with what hangs on it: pipette capacitance that was not neutralized lengthens it by R_in times that capacitance.',
    formula:
      'least-squares exponential with offset through the averaged response to steps of at most 10 mV (weights I²), from 10 % of the steady deflection (at least 0.7 ms, 1.3 ms·kHz over the filter’s corner, and six times the electrode’s own charging where it is seen, after the onset) to 300 ms or the end of the step; where more than 2 % of the deflection sags away, to 90 % of it; not measured where more than 12 % does',
    source: 'Rall 1969, Biophys J 9:1483–1508 (from memory)',
    uncertainty:
      'Student’s t times the standard error from the fit’s covariance, scaled to the slow part of its residuals; the scatter of the single steps’ own time constants where that is more than half as large again. Where the fit ends at 90 %, half the sag’s share besides.',
  },
  {
    id: 'slow_time_constant_ms',
    levels: ['cell'],
    label: 'Slow time constant',
    symbol: 'τ_0',
    ...ms,
    decimals: 1,
    definition: 'Slower time constant of the same response where two exponentials describe it better than one.',
    formula:
      'A_0·exp(−t/τ_0) + A_1·exp(−t/τ_1) + offset by least squares from 0.7 ms on, where F = ((S_1 − S_2)/2)/(S_2/(n − 5)) > 7 (S_2 scaled to the slow part of the residuals), τ_0 > 2 τ_1, τ_1 > 0.6 ms (faster is the electrode’s) and A_1 more than 3 % of A_0 + A_1; sag at most 2 %',
    source: 'Rall 1969, Biophys J 9:1483–1508 (from memory)',
    uncertainty:
      'Student’s t times the standard error from the fit’s covariance, scaled to the slow part of its residuals.',
  },
  {
    id: 'fast_time_constant_ms',
    levels: ['cell'],
    label: 'Fast time constant',
    symbol: 'τ_1',
    ...ms,
    decimals: 2,
    definition:
      'Faster time constant of the same response: current spreading from the soma into the dendrites. Not measured where one exponential does as well.',
    formula: 'τ_1 of the same fit',
    source: 'Rall 1969, Biophys J 9:1483–1508 (from memory)',
    uncertainty: 'As for the slow one.',
  },

  {
    id: 'membrane_capacitance_pf',
    levels: ['cell'],
    label: 'Membrane capacitance',
    symbol: 'C_m',
    ...pf,
    decimals: 0,
    definition:
      'Capacitance of the equivalent isopotential cell, with the pipette capacitance that was not neutralized.',
    formula: 'τ_m / R_in',
    source: circuit,
    uncertainty: 'The relative uncertainties of τ_m and R_in in squares, times Student’s t.',
  },

  {
    id: 'sag_fraction',
    levels: ['cell'],
    label: 'Sag',
    symbol: 'sag',
    ...one,
    decimals: 2,
    definition:
      'Share of the largest deflection that is gone at the end of the step, on the hyperpolarizing step nearest to 15 mV: 0 is no sag. Other conventions follow from it: sag index (steady over largest deflection) = 1 − sag; ratio of largest to steady deflection = 1/(1 − sag); ratio of the potentials themselves = (V_base + ΔV_ss)/(V_base + ΔV_max).',
    formula: '(ΔV_max − ΔV_ss)/(ΔV_max − ΔR_b·I)',
    source: 'common practice; 1 − the sag index of Ekins et al. 2020, eLife 9:e62373',
    uncertainty:
      'Student’s t times, in squares, the standard errors of the two means (their common baseline cancels) over the largest deflection, and the share times that deflection’s own relative uncertainty.',
  },
  {
    id: 'sag_mv',
    levels: ['cell'],
    label: 'Sag in millivolts',
    symbol: 'ΔV_sag',
    ...mv,
    decimals: 2,
    definition: 'How far the potential comes back from its largest deflection by the end of the same step.',
    formula: 'ΔV_ss − ΔV_max',
    source: practice,
    uncertainty: 'Student’s t times the standard errors of the two means in squares; their common baseline cancels.',
  },
  {
    id: 'rectification_ratio',
    levels: ['cell'],
    label: 'Rectification',
    symbol: 'R_large/R_small',
    ...one,
    decimals: 2,
    definition:
      'Slope resistance over the larger hyperpolarizations against that over the smaller: 1 for a linear membrane, below 1 where the cell rectifies inwardly. Steps without spikes; the deepest must reach 10 mV.',
    formula:
      '(slope of the line with intercept through the steps of at least half the deepest ΔV_ss − ΔR_b) / (slope of the line through (0, 0) and the others, Σ I·ΔV/Σ I², − ΔR_b)',
    source: practice,
    uncertainty:
      'Student’s t times, in squares, what the deflections’ own uncertainties make of the two slopes, and that of ΔR_b.',
  },

  {
    id: 'rheobase_pa',
    levels: ['cell'],
    label: 'Rheobase',
    symbol: 'I_rh',
    ...pa,
    decimals: 0,
    definition: 'Smallest step that makes the cell fire.',
    formula: 'min I_stim over steps with a spike',
    uncertainty:
      '0.95 of the distance to the largest step below it that did not fire the cell, or to 0: the true one lies between the two',
    source: practice,
  },
  {
    id: 'rate_gain_hz_per_na',
    levels: ['cell'],
    label: 'Gain of rate on current',
    symbol: 'g',
    unit: 'Hz/nA',
    ucum: 'Hz/nA',
    decimals: 0,
    definition: 'Slope of the mean rate on current from rheobase to half the largest rate.',
    formula: 'least-squares slope',
    uncertainty:
      'Student’s t times the line’s standard error from its residuals, or 1.96/(T·√(12·Σ(I − mean I)²)) where that is more: a count over a step of T tells the rate to within 1/T',
    source: practice,
  },
  {
    id: 'max_rate_hz',
    levels: ['cell'],
    label: 'Largest mean rate',
    symbol: 'f_max',
    ...hz,
    decimals: 1,
    definition: 'Largest mean rate over a step.',
    formula: 'max f',
    source: practice,
  },
  {
    id: 'spontaneous_rate_hz',
    levels: ['cell'],
    label: 'Rate without stimulus',
    symbol: 'f_0',
    ...hz,
    decimals: 2,
    definition: 'Spikes outside any stimulus over the time outside any stimulus, for cells that fire by themselves.',
    formula: 'n / t',
    uncertainty: '1.96·√n/t (counts of independent events; a regular cell is known better)',
    source: practice,
  },
  {
    id: 'apd90_variability_ms',
    levels: ['cell'],
    label: 'Beat-to-beat variability',
    symbol: 'STV',
    ...ms,
    decimals: 2,
    definition: 'Short-term variability of the duration to 90 % repolarization, over successive beats.',
    formula: 'Σ|APD90(k+1) − APD90(k)| / (n·√2)',
    source: 'Thomsen et al. 2004, Circulation 110:2453–2459 (from memory)',
    uncertainty:
      'Student’s t times the standard deviation of the single terms over √(2n/3), 2n/3 − 1 degrees of freedom: neighbouring terms share a beat.',
  },
  {
    id: 'apd90_alternation_ms',
    levels: ['cell'],
    label: 'Alternans',
    symbol: 'ΔAPD',
    ...ms,
    decimals: 1,
    definition:
      'By how much long and short beats differ when they alternate: the part of the duration to 90 % repolarization that changes sign from beat to beat, in the longest unbroken row of at least five beats.',
    formula: '2|c| of the least-squares fit APD90(k) = a + b·k + c·(−1)^k',
    source: 'least squares; ours',
    uncertainty: 'Student’s t with n − 3 degrees of freedom times twice the standard error of c.',
  },
  {
    id: 'bridge_error_mohm',
    levels: ['cell'],
    label: 'Bridge error',
    symbol: 'ΔR_b',
    ...mohm,
    decimals: 1,
    definition: 'Resistance that the stated bridge left over: positive when under-compensated.',
    formula:
      'averaged onset of the hyperpolarizing steps without spikes, ΔV/I with weights I², carried back to the edge as the instantaneous step is, over 300, 100, 30 or 12 ms; where no response was kept, or where one exponential does and it is known a third better, slope through the origin of the instantaneous step on the stimulus',
    source: circuit,
    uncertainty:
      'Student’s t times the standard error at the edge from the fit’s covariance (scaled to the slow part of its residuals), in squares with those of the level before and of the delay of filter and electrode (5 % of 0.336/corner, 80 µs where the corner is not known, and 24 µs: twice 1 pF times 12 MΩ); a fast part within a factor of 1.2, or two standard errors, of 0.6 ms, which may be the electrode’s or the cell’s, counts with half its size. From single sweeps: their own and their scatter, pooled.',
  },

  {
    id: 'drift_mv_per_min',
    levels: ['cell'],
    label: 'Drift',
    symbol: 'dV/dt',
    unit: 'mV/min',
    ucum: 'mV/min',
    decimals: 2,
    definition: 'Slope of the baseline over the recording at the same holding current.',
    formula:
      'median of (V_j − V_i)/(t_j − t_i) over all pairs of sweeps held within 2 pA or 5 % of the usual current; at least 4 sweeps over at least 15 s',
    uncertainty:
      'half the distance between the pairwise slopes of ranks (N ∓ 1.96·√(n(n − 1)(2n + 5)/18))/2, N the number of pairs, n that of sweeps',
    source: 'Theil 1950; Sen 1968, J Am Stat Assoc 63:1379–1389',
  },
  {
    id: 'height_rundown_percent_per_100_spikes',
    levels: ['cell'],
    label: 'Rundown of height',
    symbol: 'r_H',
    unit: '%',
    ucum: '%',
    decimals: 2,
    definition: 'Change of the first spike’s height per 100 spikes fired, at matched stimulus; negative when it falls.',
    formula: 'least-squares slope of H on spikes fired before, pooled within stimulus, ÷ mean H · 100 · 100',
    uncertainty:
      'Student’s t times the slope’s standard error from the residuals, degrees of freedom: spikes − groups of matched steps − 1',
    source: 'ours',
  },
  {
    id: 'sodium_gain_mm_per_100_spikes',
    levels: ['cell'],
    label: 'Sodium gained by firing',
    symbol: 'ΔNa_100',
    ...mmolar,
    decimals: 2,
    definition:
      'How much sodium 100 spikes bring into the stated volume, and how much potassium they take, without pump or pipette.',
    formula:
      '100·κ·C·H/(F·V): κ = 2, sodium that enters over the least that could; C as for the least charge; H the first spike’s height; V the stated volume (volume_pl); pF·mV/(C/mol)/pL is mM',
    source: excess,
    uncertainty: `${overKappa}; the half-widths of C and H in quadrature`,
  },
  {
    id: 'e_na_change_mv_per_100_spikes',
    levels: ['cell'],
    label: 'E_Na lost by firing',
    symbol: 'ΔE_Na,100',
    ...mv,
    decimals: 2,
    definition: 'Change of the sodium equilibrium potential by 100 spikes, without pump or pipette.',
    formula: '(RT/F)·ln(Na_in/(Na_in + ΔNa_100))',
    source: `Nernst equation; ${excess}`,
    uncertainty: overKappa,
  },
  {
    id: 'e_k_change_mv_per_100_spikes',
    levels: ['cell'],
    label: 'E_K lost by firing',
    symbol: 'ΔE_K,100',
    ...mv,
    decimals: 2,
    definition: 'Change of the potassium equilibrium potential by 100 spikes, without pump or pipette.',
    formula: '(RT/F)·ln(K_in/(K_in − ΔNa_100))',
    source: `Nernst equation; ${excess}`,
    uncertainty: overKappa,
  },
  {
    id: 'expected_rundown_percent_per_100_spikes',
    levels: ['cell'],
    label: 'Expected rundown',
    symbol: 'r_exp',
    unit: '%',
    ucum: '%',
    decimals: 2,
    definition:
      'Change of the spike’s height that the loss of gradients by 100 spikes explains, without pump or pipette; stands beside the rundown of height.',
    formula:
      '100·ΔV_peak/H; ΔV_peak: change of (RT/F)·ln((K_out + α·Na_out)/(K_in + α·Na_in)) when Na_in rises and K_in falls by ΔNa_100, α such that the potential is the observed peak before; threshold held',
    source: `Hodgkin & Katz 1949, J Physiol 108:37–77; ${excess}`,
    uncertainty: overKappa,
  },
  {
    id: 'exchange_time_constant_s',
    levels: ['cell'],
    label: 'Exchange time constant',
    symbol: 'τ_ex',
    ...s,
    decimals: 0,
    definition: 'Time constant with which sodium exchanges between the pipette and the stated volume.',
    formula: 'R_a·V·(F²/RT)·Σ z²·(u/u_Na)·c over the ions of the pipette solution',
    source:
      'Oliva, Cohen & Mathias 1988, Biophys J 54:791–799, with the Nernst–Einstein relation; compare Pusch & Neher 1988, Pflügers Arch 411:204–211',
    uncertainty: '50 % and the half-width of the access resistance, in quadrature',
  },
  {
    id: 'dialysed_rundown_percent_per_100_spikes',
    levels: ['cell'],
    label: 'Expected rundown with exchange',
    symbol: 'r_dia',
    unit: '%',
    ucum: '%',
    decimals: 2,
    definition:
      'The expected rundown where the pipette takes back what entered, at the recording’s own mean rate; near 0 where exchange is quick.',
    formula:
      'as the expected rundown, with ΔNa_100·(1 − e^(−T/τ_ex))/(T/τ_ex), T the time 100 spikes took on average over the recording',
    source: `${excess}; exchange as above`,
    uncertainty: `${overKappa}; the same with τ_ex at the upper end of its own half-width, in quadrature`,
  },
  {
    id: 'height_stimulus_slope_mv_per_na',
    levels: ['cell'],
    label: 'Height on stimulus',
    symbol: 'dH/dI',
    unit: 'mV/nA',
    ucum: 'mV/nA',
    decimals: 1,
    definition: 'Slope of the first spike’s height on the stimulus current; descriptive.',
    formula: 'least-squares slope',
    uncertainty: 'Student’s t times the line’s standard error from its residuals',
    source: 'ours',
  },
  {
    id: 'minutes_since_break_in',
    levels: ['cell'],
    label: 'Minutes since break-in',
    symbol: 't_bi',
    unit: 'min',
    ucum: 'min',
    decimals: 1,
    clamp: 'both',
    definition: 'Time from break-in to the first sweep of the condition.',
    formula: 't(sweep) − t(break-in)',
    source: practice,
  },
]);

const byId = new Map(quantities.map((entry) => [entry.id, entry]));

/** @throws RangeError naming an id that the registry does not hold. */
export function quantity(id: string): Quantity {
  const entry = byId.get(id);
  if (!entry) throw new RangeError(`no quantity "${id}" in the registry`);
  return entry;
}

export const isQuantity = (id: string): boolean => byId.has(id);

export const quantitiesOf = (level: Level): Quantity[] => quantities.filter((entry) => entry.levels.includes(level));

/**
 * Decimals that a number of this quantity and its 95 % half-width are printed with: two significant digits of the
 * half-width at most, never more than the entry wants; below zero they are cut left of the point.
 * @param u95 in the quantity's unit, above zero
 * @see JCGM 100:2008, 7.2.6; ISO 80000-1:2009, annex B (rounding; from memory)
 */
export function decimalsWith(u95: number, most: number): number {
  // Decimal place of the second significant digit: 1 for 4.27, 3 for 0.0427, -1 for 427.
  const second = (width: number): number => 1 - Math.floor(Math.log10(width));
  const first = Math.min(most, second(u95));
  // 9.96 cut at the tenth would be 10.0, three digits: cut once more where rounding carried.
  return Math.min(first, second(Number(`${Math.round(u95 * 10 ** first)}e${-first}`) || u95));
}

/** A number cut at a decimal place, which may lie left of the point. Print it with that many decimals, or none. */
export const cutAt = (value: number, decimals: number): number =>
  decimals >= 0 ? value : Math.round(value * 10 ** decimals) / 10 ** decimals;

/** A half-width that would be printed as nothing at a decimal place is rounded up to one there. */
export const leastShown = (u95: number, decimals: number): number => {
  const least = 10 ** -decimals;
  return u95 < least / 2 ? least : u95;
};
