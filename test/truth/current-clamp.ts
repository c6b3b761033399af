/**
 * Current clamp with known truth: published spiking models and passive cells behind an electrode, stepped, recorded
 * under a grid of conditions and measured by the whole of `measureSweep` and `measureCell`.
 */
import { measureCell } from '../../pipeline/measure/cell.ts';
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import type { CellMeasure, MeasureContext, NumberedSweep, Reading } from '../../pipeline/measure/types.ts';
import { hodgkinHuxley, type Model, passive, pospischil, wangBuzsaki } from '../helpers/models.ts';
import { cellContext, input, neuron } from '../measure/made.ts';
import { meanOf, slopeOfLine, spikesOf, type TrueSpike } from './definitions.ts';
import {
  besselDelay_s,
  besselGain,
  type Clean,
  type Conditions,
  type Electrode,
  fineHz,
  record,
  run,
  type Subject,
} from './recorder.ts';
import { isWanted, type Trial, type TrialOptions } from './score.ts';

export interface Cell extends Subject {
  electrode: Electrode;
  /** Step currents, pA. */
  steps: readonly number[];
  onset_s: number;
  end_s: number;
  seconds: number;
  /** Analytic truth of a passive cell. */
  passive?: { resistance_mohm: number; tau_ms: number };
  /** Further truths of the cell by quantity, from its clean sweeps. */
  truths?: (clean: readonly Clean[]) => Record<string, number>;
  /** Times at which a spike is added to the recording and to nothing else, s. */
  disturbed_s?: readonly number[];
  /** Spikes fast enough for the figures that are promised of them; false for a squid axon's broad ones too. */
  spikes: boolean;
}

/** Two passive compartments: a soma and a dendrite behind a coupling conductance (Rall 1969, Biophys J 9:1483–1508; from memory). */
export function twoCompartments(tau_ms: number, soma_share: number, coupling_per_ms: number): Model {
  return {
    start: [-70, -70],
    slope(state, current, into) {
      const [soma, dendrite] = state as [number, number];
      into[0] = current / soma_share - (soma + 70) / tau_ms - (coupling_per_ms / soma_share) * (soma - dendrite);
      into[1] = -(dendrite + 70) / tau_ms + (coupling_per_ms / (1 - soma_share)) * (soma - dendrite);
    },
  };
}

export const usual = { onset_s: 0.2, end_s: 0.6, seconds: 0.75, spikes: false };
export const passiveCell = (
  resistance_mohm: number,
  tau_ms: number,
  access_mohm: number,
  pipette_pf: number,
): Cell => ({
  ...usual,
  name: `passive ${resistance_mohm} MΩ ${tau_ms} ms`,
  model: passive(tau_ms),
  capacitance_pf: (tau_ms / resistance_mohm) * 1000,
  electrode: { access_mohm, pipette_pf },
  steps: [-12, -9, -6, -4, -2, 4].map((mv) => Number(((mv * 1000) / resistance_mohm).toPrecision(2))),
  // Long enough to be steady: ten time constants.
  end_s: 0.2 + Math.max(0.4, 0.01 * tau_ms),
  seconds: 0.3 + Math.max(0.4, 0.01 * tau_ms),
  passive: { resistance_mohm, tau_ms },
});

/** Cells of the bench; a fresh list, so that nobody can change another's. */
export const cells = (): Cell[] => [
  {
    ...usual,
    name: 'regular spiking',
    model: pospischil('RS'),
    capacitance_pf: pospischil('RS').capacitance_pf,
    electrode: { access_mohm: 9, pipette_pf: 1 },
    steps: [-300, -225, -150, -75, 700, 900, 1200],
    spikes: true,
  },
  {
    ...usual,
    name: 'fast spiking',
    model: wangBuzsaki(),
    capacitance_pf: 60,
    electrode: { access_mohm: 14, pipette_pf: 0.8 },
    steps: [-30, -20, -10, 40, 100, 300],
    spikes: true,
  },
  {
    ...usual,
    name: 'fast spiking, 36 °C',
    model: pospischil('FS'),
    capacitance_pf: 141.026,
    electrode: { access_mohm: 11, pipette_pf: 1 },
    steps: [-150, -100, -50, 500, 900],
    spikes: true,
  },
  {
    ...usual,
    name: 'axon, 18.5 °C',
    model: hodgkinHuxley(18.5),
    capacitance_pf: 80,
    electrode: { access_mohm: 6, pipette_pf: 1 },
    steps: [-160, -80, 1200, 2400],
    spikes: true,
  },
  passiveCell(150, 20, 14, 1),
  passiveCell(500, 60, 22, 0.6),
  passiveCell(45, 8, 8, 1.2),
  {
    ...usual,
    name: 'soma and dendrite',
    model: twoCompartments(25, 0.4, 0.15),
    capacitance_pf: 200,
    electrode: { access_mohm: 12, pipette_pf: 1 },
    steps: [-100, -75, -50, -25, 40],
  },
];

const base: Conditions = {
  name: '20 kHz, filter 8 kHz',
  rate_hz: 20_000,
  filter_khz: 8,
  filter_stated: true,
  noise_mv: 0.1,
  wander_mv: 0,
  hum_mv: 0,
  hum_hz: 50,
  drift_mv_per_s: 0,
  quantum_mv: 0.03,
  bridge_left_mohm: 0,
};

export const conditions: readonly Conditions[] = [
  base,
  { ...base, name: '20 kHz, filter 10 kHz', filter_khz: 10 },
  {
    ...base,
    name: '50 kHz, filter 20 kHz, 0.02 mV',
    rate_hz: 50_000,
    filter_khz: 20,
    noise_mv: 0.02,
    quantum_mv: 0.01,
  },
  { ...base, name: '100 kHz, filter 20 kHz', rate_hz: 100_000, filter_khz: 20 },
  { ...base, name: '10 kHz, filter 4 kHz', rate_hz: 10_000, filter_khz: 4 },
  { ...base, name: '10 kHz, filter 2 kHz', rate_hz: 10_000, filter_khz: 2 },
  { ...base, name: '5 kHz, filter 2 kHz', rate_hz: 5_000, filter_khz: 2 },
  { ...base, name: '20 kHz, filter 8 kHz unstated', filter_stated: false },
  { ...base, name: 'noise 0.3 mV', noise_mv: 0.3 },
  { ...base, name: 'hum 0.5 mV', hum_mv: 0.5 },
  { ...base, name: 'hum 1.5 mV', hum_mv: 1.5 },
  { ...base, name: 'wander 0.15 mV', wander_mv: 0.15 },
  { ...base, name: 'drift 2 mV/s', drift_mv_per_s: 2 },
  { ...base, name: 'bridge 6 MΩ short', bridge_left_mohm: 6 },
  { ...base, name: 'bridge 4 MΩ over', bridge_left_mohm: -4 },
  { ...base, name: 'coarse digitizer, 0.3 mV', quantum_mv: 0.3 },
];

/** The conditions that a test looks at; the bench looks at all. */
const quickConditions = [
  '20 kHz, filter 8 kHz',
  '20 kHz, filter 10 kHz',
  '50 kHz, filter 20 kHz, 0.02 mV',
  '10 kHz, filter 4 kHz',
  'hum 0.5 mV',
  'bridge 6 MΩ short',
];

/** A spike for the recording alone: 80 mV high, 0.9 ms wide at half of it. */
function disturbed(clean: Clean, times_s: readonly number[]): Clean {
  const pipette_mv = clean.pipette_mv.slice();
  for (const at of times_s) {
    const [from, to] = [Math.round((at - 0.003) * fineHz), Math.round((at + 0.003) * fineHz)];
    for (let i = from; i < to; i++) pipette_mv[i]! += 80 * Math.exp(-(((i / fineHz - at) / 0.00054) ** 2));
  }
  return { ...clean, pipette_mv };
}

export function cleanSweeps(cell: Cell): Clean[] {
  return cell.steps.map((pa) =>
    disturbed(
      run(
        cell,
        cell.electrode,
        [
          { from_s: 0, pa: 0 },
          { from_s: cell.onset_s, pa },
          { from_s: cell.end_s, pa: 0 },
        ],
        cell.seconds,
      ),
      cell.disturbed_s ?? [],
    ),
  );
}

/** A seed of its own for every recording: shared noise would make many trials speak as one. */
export function ownSeed(...names: readonly (string | number)[]): number {
  let hash = 2166136261;
  for (const letter of names.join('|')) hash = Math.imul(hash ^ letter.charCodeAt(0), 16777619);
  return hash >>> 8;
}

export function* trialsOf(cell: Cell, clean: readonly Clean[], under: Conditions, seed: number): Generator<Trial> {
  const context: MeasureContext = { ...neuron, filter_khz: under.filter_stated ? under.filter_khz : null };
  const stated = cell.electrode.access_mohm - under.bridge_left_mohm;
  const wanders: Float64Array[] = [];
  const sweeps = clean.map((one, k): NumberedSweep => {
    const { mv, wander_mv, pa, rate_hz } = record(one, under, cell.electrode, ownSeed(cell.name, under.name, seed, k));
    wanders.push(wander_mv);
    const measure = measureSweep(
      input(
        {
          voltage: { samples: mv, rate_hz, start_s: 0 },
          current: { samples: pa, rate_hz, start_s: 0 },
        },
        { bridge_mohm: stated, bias_pa: 0 },
      ),
      context,
    );
    return { ...measure, sweep: k, condition: 'baseline', since_start_s: 10 * k };
  });
  const measure = measureCell(sweeps, () => cellContext({ ...context, bias_pa: 0 }));
  const made = (
    family: string,
    quantity: string,
    truth: number,
    value: number | null,
    u95: number | null | undefined,
    why?: string,
  ): Trial => ({
    family,
    quantity,
    subject: cell.name,
    condition: under.name,
    seed,
    truth,
    value,
    u95: u95 ?? null,
    ...(why === undefined ? {} : { why }),
  });
  const ofReading = (family: string, quantity: string, truth: number, reading: Reading | undefined): Trial =>
    made(family, quantity, truth, reading?.value ?? null, reading?.u95, reading?.why);

  if (cell.spikes)
    for (const [k, sweep] of sweeps.entries())
      yield* spikeTrials(clean[k]!, sweep, cell, under, (quantity, truth, value, u95, why) =>
        made('spikes', quantity, truth, value, u95, why),
      );
  for (const [k, sweep] of sweeps.entries()) {
    const { membrane_mv } = clean[k]!;
    const drifted = (from_s: number, to_s: number): number => (under.drift_mv_per_s * (from_s + to_s)) / 2;
    const before = meanOf(membrane_mv, 0, cell.onset_s, fineHz);
    // The potential itself wanders: its level and slope are those of this stretch. At most 500 ms are looked at.
    const from_s = Math.max(0, cell.onset_s - 0.5);
    const wander = wanders[k]!.subarray(Math.round(from_s * under.rate_hz), Math.round(cell.onset_s * under.rate_hz));
    const level = before + drifted(from_s, cell.onset_s) + wander.reduce((sum, one) => sum + one, 0) / wander.length;
    yield ofReading('sweeps', 'baseline_mv', level, sweep.readings['baseline_mv']);
    // Rounding to steps wider than twice the noise is no noise of a known size.
    if (under.quantum_mv < 2 * under.noise_mv)
      yield ofReading('sweeps', 'noise_rms_mv', noiseTruth(under), sweep.readings['noise_rms_mv']);
    yield ofReading('sweeps', 'mains_hum_mv', humTruth(under), sweep.readings['mains_hum_mv']);
    if (under.hum_mv > 0) yield ofReading('sweeps', 'mains_hum_hz', under.hum_hz, sweep.readings['mains_hum_hz']);
    yield ofReading(
      'sweeps',
      'baseline_drift_mv_per_s',
      under.drift_mv_per_s + slopeOfLine([...wander.keys()], [...wander]) * under.rate_hz,
      sweep.readings['baseline_drift_mv_per_s'],
    );
  }
  yield* cellTrials(cell, clean, under, measure, (quantity, truth, reading) =>
    ofReading('subthreshold', quantity, truth, reading),
  );
}

/** Hum behind the filter. */
const humTruth = ({ hum_mv, hum_hz, filter_khz }: Conditions): number => hum_mv * besselGain(hum_hz, filter_khz * 1000);

/**
 * White noise behind the filter, within the band that the quantity is defined over: from 1 kHz to the filter's corner,
 * at most 0.4 of the rate. What the sampling folds back into the band belongs to the recording and counts.
 */
function noiseTruth(under: Conditions): number {
  const held = noiseTruths.get(under);
  if (held !== undefined) return held;
  const value = integratedNoise(under);
  noiseTruths.set(under, value);
  return value;
}
const noiseTruths = new WeakMap<Conditions, number>();

function integratedNoise({ noise_mv, wander_mv, filter_khz, filter_stated, rate_hz, quantum_mv }: Conditions): number {
  const corner = filter_khz * 1000;
  const high = Math.min(filter_stated ? corner : Number.POSITIVE_INFINITY, 0.4 * rate_hz);
  const low = 1000;
  let [all, inBand] = [0, 0];
  const step = 5;
  for (let hz = step / 2; hz < fineHz / 2; hz += step) {
    // The bench's filter is the bilinear transform of the analog one: its frequencies are warped.
    const analog = (corner * Math.tan((Math.PI * hz) / fineHz)) / Math.tan((Math.PI * corner) / fineHz);
    const power = besselGain(analog, corner) ** 2;
    all += power;
    const folded = Math.abs(hz - rate_hz * Math.round(hz / rate_hz));
    inBand += power * bandGain(folded, low, high, rate_hz) ** 2;
  }
  let [flat, kept] = [0, 0];
  for (let hz = step / 2; hz < rate_hz / 2; hz += step) {
    flat += 1;
    kept += bandGain(hz, low, high, rate_hz) ** 2;
  }
  // What the slow noise reaches of the band: 2/(π·2πτ)·(1/low − 1/high) of its power at each correlation time.
  const slow = [0.01, 0.1, 1].reduce(
    (sum, tau) => sum + (1 / low - 1 / Math.min(high, 0.4 * rate_hz)) / (Math.PI ** 2 * tau),
    0,
  );
  const wandering = (wander_mv ** 2 / 3) * slow;
  // Rounding to a step adds white noise of a twelfth of its square (Bennett 1948, Bell Syst Tech J 27:446–472; from memory).
  return Math.sqrt(wandering + (noise_mv ** 2 * inBand) / all + ((quantum_mv ** 2 / 12) * kept) / flat);
}

/** Butterworth band-pass of fourth order run forwards and backwards, by the bilinear transform's frequency scale. */
function bandGain(hz: number, low: number, high: number, rate_hz: number): number {
  const warp = (f: number): number => Math.tan((Math.PI * f) / rate_hz);
  const [w, wl, wh] = [warp(hz), warp(low), warp(high)] as [number, number, number];
  if (w === 0) return 0;
  const x = (w * w - wl * wh) / (w * (wh - wl));
  return 1 / (1 + x ** 8);
}

type Put = (quantity: string, truth: number, value: number | null, u95?: number | null, why?: string) => Trial;

function* spikeTrials(clean: Clean, sweep: NumberedSweep, cell: Cell, under: Conditions, put: Put): Generator<Trial> {
  const truths = spikesOf(clean.membrane_mv, fineHz, clean.edges_s);
  // Times are the recording's own: later than the membrane's by the delay of the filter and by the electrode's lag.
  const delay = besselDelay_s(under.filter_khz * 1000) + cell.electrode.access_mohm * cell.electrode.pipette_pf * 1e-6;
  yield put('spikes', truths.length, sweep.spikes.length, 0);
  const taken = new Set<number>();
  for (const truth of truths) {
    const k = sweep.spikes.findIndex(
      (spike, index) =>
        !taken.has(index) && Math.abs((spike.values['peak_at_s'] ?? 1e9) - delay - truth.peak_at_s) < 0.001,
    );
    yield put('spike found', 1, k < 0 ? 0 : 1, 0);
    if (k < 0) continue;
    taken.add(k);
    const spike = sweep.spikes[k]!;
    const own = (quantity: keyof TrueSpike & string, later = 0): Trial | null => {
      const wanted = truth[quantity];
      if (typeof wanted !== 'number') return null;
      // The bridge's remainder adds to every potential while current flows; truth is the membrane's.
      return put(
        quantity,
        wanted + later,
        spike.values[quantity] ?? null,
        spike.u95?.[quantity] ?? null,
        spike.why[quantity],
      );
    };
    const during = truth.peak_at_s > cell.onset_s && truth.peak_at_s < cell.end_s;
    const pa = during ? clean.pa[Math.round(truth.peak_at_s * fineHz)]! : 0;
    const offset = (under.bridge_left_mohm * pa) / 1000 + under.drift_mv_per_s * truth.peak_at_s;
    for (const trial of [
      truth.rise_from_edge ? null : own('threshold_mv', offset),
      truth.rise_from_edge ? null : own('threshold_at_s', delay),
      own('peak_mv', offset),
      own('peak_at_s', delay),
      truth.rise_from_edge ? null : own('spike_height_mv'),
      truth.rise_from_edge ? null : own('half_width_ms'),
      own('max_rise_v_per_s'),
      own('max_fall_v_per_s'),
      truth.rise_from_edge ? null : own('depolarization_ms'),
      truth.rise_from_edge ? null : own('repolarization_ms'),
      own('ahp_minimum_mv', offset),
    ])
      if (trial) yield trial;
    const corrected: [string, number | null][] = [
      ['peak_corrected_mv', truth.peak_mv + offset],
      ['max_rise_corrected_v_per_s', truth.max_rise_v_per_s],
      ['spike_height_corrected_mv', truth.rise_from_edge ? null : truth.spike_height_mv],
      ['half_width_corrected_ms', truth.rise_from_edge ? null : truth.half_width_ms],
    ];
    for (const [quantity, wanted] of corrected)
      if (wanted !== null && quantity in spike.values)
        yield put(quantity, wanted, spike.values[quantity] ?? null, spike.u95?.[quantity] ?? null, spike.why[quantity]);
  }
}

/**
 * Slow time constant of membrane and pipette together, whose capacitance hangs on the cell: roots of
 * s²·R_m·C_m·R_a·C_p + s·(R_m·C_m + R_a·C_p + R_m·C_p) + 1 (linear circuit theory).
 */
function chargingTime_ms({ passive: own, capacitance_pf, electrode }: Cell): number {
  const { access_mohm, pipette_pf } = electrode;
  const sum = own!.tau_ms + (access_mohm * pipette_pf + own!.resistance_mohm * pipette_pf) / 1000;
  const product = (own!.resistance_mohm * capacitance_pf * access_mohm * pipette_pf) / 1e6;
  return (sum + Math.sqrt(sum * sum - 4 * product)) / 2;
}

function* cellTrials(
  cell: Cell,
  clean: readonly Clean[],
  under: Conditions,
  measure: CellMeasure,
  put: (quantity: string, truth: number, reading: Reading | undefined) => Trial,
): Generator<Trial> {
  const readings = measure.conditions[0]!.readings;
  const rest = meanOf(clean[0]!.membrane_mv, 0, cell.onset_s, fineHz) + (under.drift_mv_per_s * cell.onset_s) / 2;
  yield put('resting_potential_mv', rest, readings['resting_potential_mv']);
  yield put('bridge_error_mohm', under.bridge_left_mohm, readings['bridge_error_mohm']);
  yield put('access_resistance_mohm', cell.electrode.access_mohm, readings['access_resistance_mohm']);
  if (under.quantum_mv < 2 * under.noise_mv) yield put('noise_rms_mv', noiseTruth(under), readings['noise_rms_mv']);
  yield put('mains_hum_mv', humTruth(under), readings['mains_hum_mv']);
  const down = cell.steps.flatMap((pa, k) => (pa < 0 ? [{ pa, clean: clean[k]! }] : []));
  for (const [quantity, truth] of Object.entries(cell.truths?.(clean) ?? {}))
    yield put(quantity, truth, readings[quantity]);
  if (cell.passive) {
    const { resistance_mohm } = cell.passive;
    const tau_ms = chargingTime_ms(cell);
    yield put('input_resistance_mohm', resistance_mohm, readings['input_resistance_mohm']);
    yield put('membrane_time_constant_ms', tau_ms, readings['membrane_time_constant_ms']);
    yield put('membrane_capacitance_pf', (1000 * tau_ms) / resistance_mohm, readings['membrane_capacitance_pf']);
    yield put('sag_fraction', 0, readings['sag_fraction']);
    yield put('sag_mv', 0, readings['sag_mv']);
    yield put('rectification_ratio', 1, readings['rectification_ratio']);
    return;
  }
  // The definition's line through the clean membrane: the last tenth of the step, at most 50 ms, ending 5 ms early.
  const length = cell.end_s - cell.onset_s;
  const steady = down.map(
    (one) =>
      meanOf(one.clean.membrane_mv, cell.end_s - 0.005 - Math.min(0.05, length / 10), cell.end_s - 0.005, fineHz) -
      meanOf(one.clean.membrane_mv, 0, cell.onset_s, fineHz),
  );
  yield put(
    'input_resistance_mohm',
    1000 * slopeOfLine([0, ...down.map((one) => one.pa)], [0, ...steady]),
    readings['input_resistance_mohm'],
  );
}

/** Every trial of the family. */
export function* generate(options: TrialOptions): Generator<Trial> {
  for (const cell of cells()) {
    if (!isWanted(options, cell.name)) continue;
    const clean = cleanSweeps(cell);
    for (const under of conditions) {
      if (options.quick && !quickConditions.includes(under.name)) continue;
      for (let seed = 1; seed <= options.seeds; seed++) yield* trialsOf(cell, clean, under, seed);
    }
  }
}

export const trials = (options: TrialOptions): Trial[] => [...generate(options)];
export const subjectNames = (): string[] => cells().map(({ name }) => name);
