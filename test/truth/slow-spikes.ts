/**
 * Heart and calcium spikes of known truth: a ventricular cell paced through an electrode whose bridge is off, a
 * pacemaking Purkinje fibre, and a calcium oscillator. Truth is read from the membrane at 200 kHz, before electrode,
 * filter, noise and sampling, by the plain reading of each definition: no smoothing, no fits.
 */
import { heart1991, ventricularMyocyte } from '../../content-sample/generate/models.ts';
import { spikeCriteria } from '../../pipeline/measure/spike-criteria.ts';
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import type { MeasureContext, Spike } from '../../pipeline/measure/types.ts';
import type { Model } from '../helpers/models.ts';
import { input } from '../measure/made.ts';
import { ownSeed } from './current-clamp.ts';
import { type Clean, type Conditions, type Electrode, fineHz, type Piece, record, run } from './recorder.ts';
import { isWanted, type Trial, type TrialOptions } from './score.ts';

const family = 'slow spikes';

/** Luo & Rudy 1991, Circ Res 68:1501–1526, as the sample archive holds it, from its computed rest. */
export function luoRudy(): Model {
  const model = ventricularMyocyte(heart1991);
  const held = new Float64Array(8);
  const rates = new Float64Array(8);
  return {
    // Rest and its gates from luo_rudy_1991_computed.json of the reference values (LSODA).
    start: [
      -84.54743905829099, 0.0016663613650533256, 0.9833038155325643, 0.989522855469475, 0.0029773342801997183,
      0.999981241300503, 0.005643227238090155, 0.0001783605158508494,
    ],
    slope(state, current, into) {
      for (let k = 0; k < 8; k++) held[k] = state[k]!;
      model.derive(held, rates, current, 0, 0);
      for (let k = 0; k < 8; k++) into[k] = rates[k]!;
    },
  };
}

const linoid = (x: number, y: number): number => (Math.abs(x / y) < 1e-6 ? y - x / 2 : x / Math.expm1(x / y));

/**
 * Pacemaking Purkinje fibre: Noble 1962, J Physiol 160:317–352 (equations from memory; cycle, peak and diastolic
 * potential are held against noble_1962_computed.json of the reference values). 12 µF/cm².
 */
export function noble(): Model {
  return {
    start: [-75, 0.06, 0.75, 0.6],
    slope(state, current, into) {
      const [v, m, h, n] = state as [number, number, number, number];
      const sodium = (400 * m ** 3 * h + 0.14) * (v - 40);
      const rectifier = 1.2 * Math.exp((-v - 90) / 50) + 0.015 * Math.exp((v + 90) / 60);
      into[0] = current - (sodium + (rectifier + 1.2 * n ** 4) * (v + 100)) / 12;
      into[1] = 0.1 * linoid(-v - 48, 15) * (1 - m) - 0.12 * linoid(v + 8, 5) * m;
      into[2] = 0.17 * Math.exp((-v - 90) / 20) * (1 - h) - h / (Math.exp((-v - 42) / 10) + 1);
      into[3] = 0.0001 * linoid(-v - 50, 10) * (1 - n) - 0.002 * Math.exp((-v - 90) / 80) * n;
    },
  };
}

/**
 * Barnacle muscle: Morris & Lecar 1981, Biophys J 35:193–213, with the constants of Rinzel & Ermentrout 1989 for
 * repetitive firing (from memory). 20 µF/cm².
 */
export function morrisLecar(): Model {
  const open = (v: number): number => 0.5 * (1 + Math.tanh((v - 2) / 30));
  return {
    start: [-60.9, open(-60.9)],
    slope(state, current, into) {
      const [v, w] = state as [number, number];
      const calcium = 4.4 * 0.5 * (1 + Math.tanh((v + 1.2) / 18)) * (v - 120);
      into[0] = current - (calcium + 8 * w * (v + 84) + 2 * (v + 60)) / 20;
      into[1] = 0.04 * Math.cosh((v - 2) / 60) * (open(v) - w);
    },
  };
}

interface Subject {
  name: string;
  model: () => Model;
  capacitance_pf: number;
  pieces: Piece[];
  seconds: number;
  context: ReturnType<typeof spikeCriteria>;
  /** The first spike's diastole lies before the sweep or under another current. */
  skipFirst: boolean;
}

const electrode: Electrode = { access_mohm: 12, pipette_pf: 1.5 };

const pulses = (times_s: number[], length_s: number, pa: number): Piece[] => [
  { from_s: 0, pa: 0 },
  ...times_s.flatMap((from_s) => [
    { from_s, pa },
    { from_s: from_s + length_s, pa: 0 },
  ]),
];

export const subjects = (): Subject[] => [
  {
    name: 'ventricular cell, upstroke after the pulse',
    model: luoRudy,
    capacitance_pf: 100,
    pieces: pulses([0.3, 1.3], 0.002, 1700),
    seconds: 2,
    context: spikeCriteria('ventricular-myocyte'),
    skipFirst: false,
  },
  {
    name: 'ventricular cell, upstroke under the pulse’s end',
    model: luoRudy,
    capacitance_pf: 100,
    pieces: pulses([0.3, 1.3], 0.002, 2400),
    seconds: 2,
    context: spikeCriteria('ventricular-myocyte'),
    skipFirst: false,
  },
  {
    name: 'pacemaking Purkinje fibre',
    model: noble,
    capacitance_pf: 100,
    pieces: [{ from_s: 0, pa: 0 }],
    seconds: 3,
    context: spikeCriteria('ventricular-myocyte'),
    skipFirst: true,
  },
  {
    name: 'calcium oscillator',
    model: morrisLecar,
    capacitance_pf: 100,
    pieces: [
      { from_s: 0, pa: 0 },
      { from_s: 0.3, pa: 500 },
    ],
    seconds: 1.5,
    context: spikeCriteria('any', 'calcium'),
    skipFirst: true,
  },
];

const base: Conditions = {
  name: '10 kHz, filter 5 kHz, 0.1 mV',
  rate_hz: 10_000,
  filter_khz: 5,
  filter_stated: true,
  noise_mv: 0.1,
  wander_mv: 0,
  hum_mv: 0,
  hum_hz: 50,
  drift_mv_per_s: 0,
  quantum_mv: 0.03,
  bridge_left_mohm: 0,
};

export interface SlowConditions extends Conditions {
  /** Whether the file holds the stimulus. */
  stimulus: boolean;
}

export const slowConditions: readonly SlowConditions[] = [
  { ...base, stimulus: true },
  { ...base, stimulus: true, name: '25 kHz, filter 10 kHz, 0.3 mV', rate_hz: 25_000, filter_khz: 10, noise_mv: 0.3 },
  { ...base, stimulus: true, name: '5 kHz, filter 2 kHz, 0.05 mV', rate_hz: 5_000, filter_khz: 2, noise_mv: 0.05 },
  { ...base, stimulus: true, name: 'noise 0.5 mV', noise_mv: 0.5 },
  { ...base, stimulus: true, name: 'hum 0.2 mV', hum_mv: 0.2 },
  { ...base, stimulus: true, name: 'drift 0.5 mV/s', drift_mv_per_s: 0.5 },
  { ...base, stimulus: true, name: 'wander 0.1 mV', wander_mv: 0.1 },
  { ...base, stimulus: true, name: 'bridge 4 MΩ short', bridge_left_mohm: 4 },
  {
    ...base,
    stimulus: false,
    name: 'bridge 4 MΩ short, stimulus not recorded, 25 kHz',
    rate_hz: 25_000,
    filter_khz: 10,
    noise_mv: 0.2,
    bridge_left_mohm: 4,
  },
];

export interface TrueBeat {
  upstroke_s: number;
  values: Record<string, number>;
}

/** Beats of a clean trace, read sample by sample. */
export function beatsOf(mv: Float64Array, hz: number): TrueBeat[] {
  let [low, high] = [Number.POSITIVE_INFINITY, Number.NEGATIVE_INFINITY];
  for (const v of mv) {
    low = Math.min(low, v);
    high = Math.max(high, v);
  }
  const middle = (low + high) / 2;
  const ups: number[] = [];
  for (let i = 1; i < mv.length; i++) if (mv[i - 1]! < middle && mv[i]! >= middle) ups.push(i);
  const peaks = ups.map((up, k) => {
    let best = up;
    for (let i = up; i < (ups[k + 1] ?? mv.length); i++) if (mv[i]! > mv[best]!) best = i;
    return best;
  });
  const steepest = ups.map((up, k) => {
    const from = Math.max(k > 0 ? peaks[k - 1]! + 1 : 1, Math.round(up - 0.03 * hz));
    let best = from;
    for (let i = from; i < peaks[k]!; i++) if (mv[i + 1]! - mv[i]! > mv[best + 1]! - mv[best]!) best = i;
    return best;
  });
  return ups.map((_, k): TrueBeat => {
    let lowest = mv[steepest[k]!]!;
    for (let i = k > 0 ? peaks[k - 1]! : 0; i < steepest[k]!; i++) lowest = Math.min(lowest, mv[i]!);
    const peak = mv[peaks[k]!]!;
    const upstroke = steepest[k]! + 0.5;
    const values: Record<string, number> = {
      peak_mv: peak,
      diastolic_potential_mv: lowest,
      max_rise_v_per_s: ((mv[steepest[k]! + 1]! - mv[steepest[k]!]!) * hz) / 1000,
    };
    if (k + 1 < ups.length) values['cycle_length_ms'] = ((steepest[k + 1]! - steepest[k]!) / hz) * 1000;
    for (const percent of [30, 50, 90]) {
      const level = peak - (percent / 100) * (peak - lowest);
      let i = peaks[k]!;
      while (i < mv.length - 1 && i < (ups[k + 1] ?? mv.length) && mv[i]! > level) i++;
      if (mv[i]! <= level)
        values[`apd${percent}_ms`] = ((i - (level - mv[i]!) / (mv[i - 1]! - mv[i]!) - upstroke) / hz) * 1000;
    }
    const [apd30, apd90] = [values['apd30_ms'], values['apd90_ms']];
    if (apd30 !== undefined && apd90 !== undefined) {
      values['triangulation_ms'] = apd90 - apd30;
      const from = Math.round(upstroke + (0.4 * apd90 * hz) / 1000);
      const to = Math.round(upstroke + (0.6 * apd90 * hz) / 1000);
      values['plateau_mv'] = mv.subarray(from, to + 1).reduce((sum, v) => sum + v, 0) / (to + 1 - from);
    }
    // Threshold: where the slope last crosses a twentieth of its largest before that; what follows from it.
    const slope = (i: number): number => mv[i + 1]! - mv[i]!;
    const criterion = 0.05 * slope(steepest[k]!);
    let foot = steepest[k]!;
    while (foot > 0 && slope(foot) >= criterion) foot--;
    const threshold = mv[foot + 1]!;
    const height = peak - threshold;
    const firstBelow = (level: number): number => {
      let i = peaks[k]!;
      while (i < mv.length && i < (ups[k + 1] ?? mv.length) && mv[i]! > level) i++;
      return i < mv.length && mv[i]! <= level ? i : Number.NaN;
    };
    let up = steepest[k]!;
    while (up > foot && mv[up]! > threshold + height / 2) up--;
    while (mv[up]! < threshold + height / 2) up++;
    Object.assign(values, { threshold_mv: threshold, spike_height_mv: height, threshold_at_s: (foot + 1) / hz });
    const down = firstBelow(threshold + height / 2);
    if (Number.isFinite(down)) values['half_width_ms'] = ((down - up) / hz) * 1000;
    const back = firstBelow(threshold);
    if (Number.isFinite(back)) {
      values['repolarization_ms'] = ((back - peaks[k]!) / hz) * 1000;
      let fall = 0;
      for (let i = peaks[k]!; i < back; i++) fall = Math.min(fall, slope(i) * hz);
      values['max_fall_v_per_s'] = fall / 1000;
    }
    return { upstroke_s: upstroke / hz, values };
  });
}

const fromThreshold = new Set([
  'threshold_mv',
  'threshold_at_s',
  'spike_height_mv',
  'half_width_ms',
  'repolarization_ms',
  'max_fall_v_per_s',
]);

/** The spikes of a sweep against its beats; `delay_s` is what the filter holds everything back. */
function* compared(
  spikes: readonly Spike[],
  beats: readonly TrueBeat[],
  artefact_mv: number,
  subject: Subject,
  label: Pick<Trial, 'family' | 'subject' | 'condition' | 'seed'>,
): Generator<Trial> {
  yield { ...label, quantity: 'spikes', truth: beats.length, value: spikes.length, u95: null };
  for (const [k, beat] of beats.entries()) {
    if (k === 0 && subject.skipFirst) continue;
    const spike = spikes.find((one) => Math.abs((one.values['upstroke_at_s'] ?? -1) - beat.upstroke_s) < 0.02);
    const crossed_s = beat.values['threshold_at_s'] ?? -1;
    // While a pulse lasts its own charging passes the criterion: which crossing counts is then a matter of convention.
    const pulsed = subject.pieces.slice(1, -1).some(({ from_s }, j) => {
      return crossed_s >= from_s && crossed_s < subject.pieces[j + 2]!.from_s + 0.0005;
    });
    const kept = Object.entries(beat.values).filter(([id]) => !pulsed || !fromThreshold.has(id));
    const truths = { ...Object.fromEntries(kept), ...(artefact_mv === 0 ? {} : { stimulus_artefact_mv: artefact_mv }) };
    for (const [quantity, truth] of Object.entries(truths)) {
      const value = spike?.values[quantity] ?? null;
      const why = spike?.why[quantity];
      yield {
        ...label,
        quantity,
        truth,
        value,
        u95: spike?.u95?.[quantity] ?? null,
        ...(value === null ? { why: spike ? (why ?? 'left out') : 'no such spike' } : {}),
      };
    }
  }
}

const quickConditions = new Set(['10 kHz, filter 5 kHz, 0.1 mV', '25 kHz, filter 10 kHz, 0.3 mV', 'noise 0.5 mV']);

export function* generate(options: TrialOptions): Generator<Trial> {
  for (const subject of subjects()) {
    if (!isWanted(options, subject.name)) continue;
    const clean: Clean = run(
      { name: subject.name, model: subject.model(), capacitance_pf: subject.capacitance_pf },
      electrode,
      subject.pieces,
      subject.seconds,
    );
    const paced = subject.pieces.length > 2;
    for (const under of slowConditions) {
      const own = quickConditions.has(under.name) || (paced && under.bridge_left_mohm !== 0);
      if ((options.quick && !own) || (!paced && under.bridge_left_mohm !== 0)) continue;
      // The drift of an electrode cannot be told from the cell's: it belongs to what was there to be read.
      const beats = beatsOf(
        clean.membrane_mv.map((mv, i) => mv + (under.drift_mv_per_s * i) / fineHz),
        fineHz,
      );
      for (let seed = 0; seed < options.seeds; seed++) {
        const { mv, pa, rate_hz } = record(clean, under, electrode, ownSeed(subject.name, under.name, seed));
        const context: MeasureContext = {
          ...subject.context,
          filter_khz: under.filter_stated ? under.filter_khz : null,
          mains_hz: under.hum_hz,
          capacitance_pf: null,
        };
        const { spikes } = measureSweep(
          input({
            voltage: { samples: mv, rate_hz, start_s: 0 },
            current: under.stimulus ? { samples: pa, rate_hz, start_s: 0 } : null,
          }),
          context,
        );
        const artefact = paced ? (under.bridge_left_mohm * subject.pieces[1]!.pa) / 1000 : 0;
        yield* compared(spikes, beats, artefact, subject, {
          family,
          subject: subject.name,
          condition: under.name,
          seed,
        });
      }
    }
  }
}

export const trials = (options: TrialOptions): Trial[] => [...generate(options)];
export const subjectNames = (): string[] => subjects().map(({ name }) => name);
