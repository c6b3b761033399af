/**
 * Fills a ledger with an invented archive, for looking at pages before and without any recording: cells of every
 * standing, ragged facts, missing numbers, long and awkward ids, one cell without spikes, one unread, drugs washed
 * in. Everything comes from one seed; no number here means anything.
 */
import { mkdirSync, writeFileSync } from 'node:fs';
import path from 'node:path';
import sharp from 'sharp';
import type { Fact, Facts, Recipe, Settings } from '../../pipeline/archive/types.ts';
import { checks, policyEntry } from '../../pipeline/judge/checks.ts';
import type { CheckEntry, Circumstances, Finding, Judgement, Outcome, Standing } from '../../pipeline/judge/types.ts';
import type { ArchiveRow, CellRow, FileRow, NoteRow, SweepRow } from '../../pipeline/ledger/types.ts';
import { ledgerFile, openLedger } from '../../pipeline/ledger/write.ts';
import { isQuantity, quantitiesOf, quantity } from '../../pipeline/measure/quantities.ts';
import type { ConditionMeasure, Envelope, Reading, Readings, Spike } from '../../pipeline/measure/types.ts';

/** `some` is `many` with fewer cells, for what takes long on each page. */
export type MadeUpKind = 'many' | 'some' | 'one' | 'empty';

/** The same numbers on every machine. */
function seeded(seed: number) {
  let state = seed >>> 0;
  const next = (): number => {
    state = (state + 0x6d2b79f5) >>> 0;
    let mixed = Math.imul(state ^ (state >>> 15), state | 1);
    mixed ^= mixed + Math.imul(mixed ^ (mixed >>> 7), mixed | 61);
    return ((mixed ^ (mixed >>> 14)) >>> 0) / 2 ** 32;
  };
  return {
    next,
    between: (low: number, high: number): number => low + (high - low) * next(),
    chance: (share: number): boolean => next() < share,
    pick: <T>(list: readonly T[]): T => list[Math.floor(next() * list.length)]!,
  };
}
type Random = ReturnType<typeof seeded>;

const round = (value: number, decimals = 4): number => Number(value.toFixed(decimals));

const settings: Settings = {
  title: 'Tidewater cells',
  lab: 'Harbour field station, wet laboratory',
  timezone: 'Europe/Lisbon',
  mains_hz: 50,
  rigs: { a: 'Rig A, upright', b: 'Rig B, inverted', c: 'Rig C, in the cold room' },
  people: { k: 'K., bench 2', m: 'M., bench 1', t: 'T., visitor', w: 'W., bench 4' },
  classes: {
    'deep-pyramidal': { label: 'Layer 5 pyramidal neuron', like: 'cortical-pyramidal' },
    'fast-spiking': { label: 'Fast-spiking interneuron', like: 'fast-spiking-interneuron' },
    'giant-axon': { label: 'Giant axon', like: 'squid-axon' },
    ventricle: { label: 'Ventricular myocyte', like: 'ventricular-myocyte' },
  },
  limits: [
    { quantity: 'access_resistance_mohm', above: null, below: 25, line: 14 },
    { quantity: 'noise_rms_mv', above: null, below: 0.3, line: 15 },
  ],
  audiences: {},
};

const recipes: Recipe[] = [
  {
    id: 'acsf',
    path: 'solutions/acsf.yaml',
    name: 'Slice saline',
    role: 'bath',
    ph: 7.4,
    titrant: null,
    gas: 'carbogen',
    osmolality_mosm: 305,
    millimolar: { NaCl: 125, NaHCO3: 25, KCl: 2.5, NaH2PO4: 1.25, CaCl2: 2, MgCl2: 1, glucose: 20 },
  },
  {
    id: 'k-gluconate',
    path: 'solutions/k-gluconate.yaml',
    name: 'K-gluconate pipette solution',
    role: 'pipette',
    ph: 7.3,
    titrant: 'KOH',
    gas: 'none',
    osmolality_mosm: 290,
    millimolar: { 'K-gluconate': 130, KCl: 4, NaCl: 4, HEPES: 10, EGTA: 0.3, 'Mg-ATP': 4, 'Na3-GTP': 0.3 },
  },
  {
    id: 'tide-pool-2',
    path: 'solutions/tide-pool-2.yaml',
    name: 'Sea water, made up, batch of the second tide',
    role: 'bath',
    ph: null,
    titrant: null,
    gas: 'none',
    osmolality_mosm: null,
    millimolar: { NaCl: 440, KCl: 10, CaCl2: 10, MgCl2: 50 },
  },
];

const levelPath = {
  defaults: 'almanac.yaml',
  folder: 'recordings/folder.yaml',
  file: '/general',
  'facts.csv': 'facts.csv',
  sidecar: 'recordings/one.nwb.yaml',
} as const;

function fact(key: string, value: string | number, level: keyof typeof levelPath, line: number | null = null): Fact {
  return { key, value, origin: { level, path: levelPath[level], line }, disagrees: [] };
}

function dateOf(day: number): string {
  return new Date(Date.UTC(2026, 0, 12) + day * 86_400_000).toISOString().slice(0, 10);
}

/** A trace that looks like a response to a step: no model, only a shape. */
function shape(
  random: Random,
  restMv: number,
  amplitudePa: number,
  spikeAt: number[],
  peakMv: number,
  columns: number,
) {
  const low: number[] = [];
  const high: number[] = [];
  const duration = 1;
  for (let column = 0; column < columns; column++) {
    const t = ((column + 0.5) / columns) * duration;
    const on = t > 0.2 && t < 0.7 ? 1 - Math.exp(-(t - 0.2) / 0.02) : t >= 0.7 ? Math.exp(-(t - 0.7) / 0.02) : 0;
    const level = restMv + on * Math.max(-40, Math.min(22, amplitudePa * 0.12));
    const hit = spikeAt.some((at) => Math.abs(at - t) <= duration / columns / 2);
    const after = spikeAt.some((at) => t > at && t - at < 0.02);
    low.push(round(level - random.between(0.05, 0.3) - (after ? 9 : 0), 2));
    high.push(round(hit ? peakMv : level + random.between(0.05, 0.3) - (after ? 8 : 0), 2));
  }
  return { start_s: 0, end_s: duration, low, high } satisfies Envelope;
}

function spikeExcerpt(restMv: number, thresholdMv: number, peakMv: number, widthMs: number, startS: number) {
  const mv: number[] = [];
  for (let i = 0; i < 400; i++) {
    const t = i / 20 - 5;
    const base = t < 0 ? restMv + (thresholdMv - restMv) * Math.exp(t / 2) : thresholdMv - 12 * Math.exp(-t / 12);
    mv.push(round(base + (peakMv - thresholdMv) * Math.exp(-(((t - widthMs) / widthMs) ** 2)), 2));
  }
  return { spike: 0, start_s: startS, rate_hz: 20_000, mv };
}

const typical: Record<string, [number, number]> = {
  threshold_mv: [-52, -40],
  peak_mv: [18, 44],
  overshoot_mv: [18, 44],
  spike_height_mv: [62, 96],
  height_from_rest_mv: [85, 112],
  half_width_ms: [0.3, 1.4],
  max_rise_v_per_s: [180, 520],
  max_fall_v_per_s: [-260, -60],
  depolarization_ms: [0.2, 0.5],
  repolarization_ms: [0.6, 2],
  ahp_minimum_mv: [-70, -58],
  ahp_below_threshold_mv: [9, 22],
  cycle_length_ms: [12, 120],
  sodium_headroom_mv: [8, 60],
  potassium_margin_mv: [12, 40],
  minimum_charge_pc: [2, 9],
  minimum_ions_millions: [12, 60],
  peak_inward_current_pa: [-60000, -15000],
  peak_inward_current_pa_per_pf: [-520, -180],
  peak_outward_current_pa: [6000, 30000],
  peak_outward_current_pa_per_pf: [60, 260],
  depolarization_charge_pc: [-9, -2],
  repolarization_charge_pc: [2, 9],
  rise_samples: [5, 14],
  stimulus_pa: [-100, 300],
  holding_pa: [-30, 10],
  baseline_mv: [-78, -62],
  baseline_sd_mv: [0.1, 0.5],
  baseline_drift_mv_per_s: [-0.4, 0.4],
  mean_rate_hz: [0, 60],
  first_spike_latency_ms: [6, 90],
  interval_cv: [0.05, 0.4],
  interval_lv: [0.01, 0.5],
  interval_adaptation: [-0.02, 0.1],
  steady_deflection_mv: [-18, 12],
  largest_deflection_mv: [-20, 14],
  bridge_step_mv: [-0.6, 0.6],
  noise_rms_mv: [0.05, 0.32],
  mains_hum_mv: [0.005, 0.2],
  mains_hum_hz: [49.98, 50.02],
  clipped_fraction: [0, 0],
  missing_fraction: [0, 0.0004],
  quantum_mv: [0.0305, 0.0305],
  sample_interval_us: [50, 50],
  access_resistance_mohm: [8, 28],
  access_change_percent: [-10, 35],
  resting_potential_mv: [-79, -60],
  input_resistance_mohm: [60, 420],
  membrane_time_constant_ms: [8, 32],
  membrane_capacitance_pf: [40, 220],
  sag_fraction: [0, 0.3],
  rheobase_pa: [40, 320],
  rate_gain_hz_per_na: [80, 420],
  max_rate_hz: [18, 160],
  bridge_error_mohm: [-2, 5],
  drift_mv_per_min: [-0.4, 0.3],
  height_rundown_percent_per_100_spikes: [-3, 0.5],
  height_stimulus_slope_mv_per_na: [-14, 4],
  minutes_since_break_in: [2, 22],
};

function readingsFor(random: Random, level: 'cell' | 'sweep', fires: boolean): Readings {
  const readings: Readings = {};
  const ofSpike = new Set(quantitiesOf('spike').map((entry) => entry.id));
  for (const entry of quantitiesOf(level)) {
    if (entry.clamp === 'voltage') continue;
    const range = typical[entry.id];
    if (ofSpike.has(entry.id) && !fires && level === 'cell') {
      readings[entry.id] = { value: null, why: 'never-fired' };
      continue;
    }
    if (!range) {
      if (entry.id === 'apd50_ms' || entry.id === 'apd90_ms')
        readings[entry.id] = { value: null, why: 'not-spontaneous' };
      continue;
    }
    if (random.chance(0.05)) {
      readings[entry.id] = random.chance(0.5)
        ? { value: null, why: 'unresolved' }
        : { value: null, why: 'fact-missing', missing: ['pipette', 'temperature_c'] };
      continue;
    }
    const value = round(random.between(...range));
    const n = 3 + Math.floor(random.between(0, 30));
    const sd = round(Math.abs(range[1] - range[0]) * random.between(0.02, 0.1));
    const reading: Reading = { value, n, sd, se: round(sd / Math.sqrt(n)) };
    if (entry.uncertainty !== undefined && n % 5 !== 0) reading.u95 = round((2.1 * sd) / Math.sqrt(n));
    if (entry.id === 'noise_rms_mv') reading.note = '1 to 8 kHz';
    readings[entry.id] = reading;
  }
  return readings;
}

function spikesOf(random: Random, count: number): Spike[] {
  return Array.from({ length: count }, (_, spike): Spike => {
    const at = 0.21 + (spike * 0.48) / Math.max(1, count);
    const values: Record<string, number | null> = { threshold_at_s: round(at, 5), peak_at_s: round(at + 0.0004, 5) };
    for (const entry of quantitiesOf('spike')) {
      const range = typical[entry.id];
      if (range) values[entry.id] = round(random.between(...range));
    }
    values['cycle_length_ms'] = spike + 1 < count ? round(480 / count, 2) : null;
    return {
      spike,
      values,
      why: spike + 1 < count ? {} : { cycle_length_ms: 'cut-off-by-sweep-end' as const },
      phases: [
        { name: 'depolarization', from_s: at, to_s: at + 0.0004, net_ionic_sign: -1 },
        { name: 'repolarization', from_s: at + 0.0004, to_s: at + 0.0015, net_ionic_sign: 1 },
        { name: 'afterhyperpolarization', from_s: at + 0.0015, to_s: at + 0.006, net_ionic_sign: 0 },
        { name: 'recovery', from_s: at + 0.006, to_s: at + 0.02, net_ionic_sign: -1 },
      ],
    };
  });
}

interface Draft {
  id: string;
  day: number | null;
  standing: Standing;
  fires: boolean;
  bare: boolean;
  drug: boolean;
  sweeps: number;
}

function drafts(random: Random): Draft[] {
  const list: Draft[] = [];
  let day = 0;
  let cellOfDay = 1;
  for (let index = 0; index < 54; index++) {
    if (index > 0 && random.chance(0.35)) {
      day += random.pick([1, 2, 3, 7]);
      cellOfDay = 1;
    }
    const slice = 1 + Math.floor(cellOfDay / 3);
    const roll = random.next();
    list.push({
      id: `${dateOf(day)}-s${slice}c${cellOfDay}`,
      day,
      standing: roll < 0.58 ? 'sound' : roll < 0.82 ? 'caution' : 'unsound',
      fires: index !== 7,
      bare: index % 19 === 5,
      drug: index % 9 === 4,
      sweeps: 6 + Math.floor(random.between(0, 9)),
    });
    cellOfDay++;
  }
  const odd: [string, Partial<Draft>][] = [
    ['old-07', { day: null, bare: true }],
    ['old-07~2', { day: null, bare: true, standing: 'caution' }],
    ['2026-02-03-slice-3-cell-12-after-the-move-to-rig-c-patched-again-from-the-same-electrode', { day: 22 }],
    ['Unité 4 / essai nº 2', { day: 30, standing: 'unsound' }],
    ['2026-02-10-S1C1', { day: 29, standing: 'caution' }],
    ['2026-03-01-s1c9', { day: 48, standing: 'unread', sweeps: 0, fires: false }],
  ];
  for (const [id, over] of odd)
    list.push({ id, day: 10, standing: 'sound', fires: true, bare: false, drug: false, sweeps: 8, ...over });
  return list;
}

function factsOf(draft: Draft, random: Random): Facts {
  const facts: Facts = { cell: fact('cell', draft.id, 'sidecar', 1) };
  const add = (key: string, value: string | number, level: keyof typeof levelPath, line: number | null = null) => {
    facts[key] = fact(key, value, level, line);
  };
  if (draft.day !== null) add('date', dateOf(draft.day), 'file');
  if (draft.bare) {
    if (random.chance(0.5)) add('note', 'from the old disk; nothing else is known', 'sidecar', 4);
    return facts;
  }
  const day = draft.day ?? 0;
  const classId = random.pick(['deep-pyramidal', 'deep-pyramidal', 'fast-spiking', 'giant-axon', 'ventricle']);
  add('subject', `m${40 + Math.floor(day / 3)}`, 'folder', 3);
  add('class', classId, 'sidecar', 2);
  add('rig', random.pick(['a', 'a', 'b', 'c']), 'folder', 4);
  add('person', random.pick(['k', 'm', 't', 'w']), 'folder', 5);
  add('temperature_c', random.pick([22, 32.5, 33, 34]), 'defaults', 20);
  add('bath', 'acsf', 'defaults', 21);
  add('pipette', 'k-gluconate', 'defaults', 22);
  add('configuration', 'whole-cell', 'defaults', 23);
  add('junction', 'uncorrected', 'defaults', 24);
  if (random.chance(0.7)) add('slice', `s${1 + Math.floor(random.next() * 4)}`, 'folder', 6);
  if (random.chance(0.4)) add('group', random.pick(['control', 'cold-stored']), 'facts.csv', 12);
  if (random.chance(0.15))
    facts['rig']!.disagrees = [{ value: 'b', origin: { level: 'folder', path: 'recordings/folder.yaml', line: 4 } }];
  return facts;
}

function circumstancesOf(facts: Facts, condition: string): Circumstances {
  const classId = facts['class'] ? String(facts['class'].value) : null;
  const known = facts['pipette'] !== undefined;
  return {
    condition,
    class_id: classId,
    class_label: classId ? (settings.classes[classId]?.label ?? null) : null,
    like: classId ? (settings.classes[classId]?.like ?? 'any') : 'any',
    temperature_c: facts['temperature_c'] ? Number(facts['temperature_c'].value) : null,
    configuration: known ? 'whole-cell' : null,
    spike_ion: classId ? 'sodium' : null,
    junction: known ? 'uncorrected' : 'unstated',
    ljp_mv: known ? 14.6 : null,
    ljp_from: known ? 'computed' : null,
    ljp_applied_mv: known ? 14.6 : 0,
    reading: known ? 'corrected' : 'recorded',
    e_na: known ? { mv: 61.2, uncertainty_mv: 2.8, inside_mm: 15.1, outside_mm: 151.3 } : null,
    e_k: known ? { mv: -105.4, uncertainty_mv: 1.9, inside_mm: 141, outside_mm: 2.5 } : null,
    missing_e_na: known ? [] : ['pipette', 'bath', 'temperature_c'],
    missing_e_k: known ? [] : ['pipette', 'bath', 'temperature_c'],
    pipette_sodium_mm: known ? 15.1 : null,
    filter_khz: known ? 8 : null,
    mains_hz: 50,
    rate_hz: 20_000,
    bridge_mohm: known ? 14 : null,
    bias_pa: null,
  };
}

function findingFor(check: CheckEntry, outcome: Outcome, condition: string, random: Random): Finding {
  const entry = isQuantity(check.quantity) ? quantity(check.quantity) : { label: check.asks, decimals: 0, unit: '' };
  const value =
    outcome === 'not measured' || check.quantity === '' ? null : round(random.between(10, 90), entry.decimals);
  const limit = value === null ? null : round(value * (outcome === 'outside' ? 0.7 : 1.02), entry.decimals);
  const number = value === null ? '' : `${value} ${entry.unit}`.trim();
  return {
    check: check.id,
    ground: check.ground,
    quantity: check.quantity,
    outcome,
    condition,
    sweep: check.level === 'sweep' ? 2 : null,
    value,
    uncertainty: value === null ? null : 3,
    limit_low: null,
    limit_high: limit,
    margin: value === null || limit === null ? null : round(limit - value, entry.decimals),
    at_s: check.level === 'sweep' ? 0.2312 : null,
    sentence:
      outcome !== 'not measured' && value === null
        ? 'The rig is "a" in the sidecar and "b" in recordings/folder.yaml.'
        : value === null
          ? `${entry.label} could not be held against its limit: the pipette solution is not stated.`
          : `${entry.label} is ${number}; up to ${limit} ${entry.unit} would be expected.`,
    causes: check.causes,
    bench: check.bench,
    source: check.source,
    missing: value === null ? ['pipette'] : [],
  };
}

function judgementOf(draft: Draft, conditions: string[], random: Random): Judgement {
  const every = [...checks, ...settings.limits.map((limit) => policyEntry(limit.quantity))];
  const wrong = every.filter((check) =>
    draft.standing === 'unsound'
      ? check.ground === 'physics' || check.ground === 'policy'
      : check.ground === 'class' || check.ground === 'conditions',
  );
  const findings = conditions.flatMap((condition) =>
    every.slice(0, 40).map((check) => {
      const roll = random.next();
      return findingFor(check, roll < 0.85 ? 'within' : roll < 0.93 ? 'near limit' : 'not measured', condition, random);
    }),
  );
  if (draft.standing === 'caution' || draft.standing === 'unsound') {
    const count = 1 + Math.floor(random.between(0, 3));
    for (let i = 0; i < count && wrong.length > 0; i++)
      findings.push(findingFor(random.pick(wrong), 'outside', conditions[0] ?? '', random));
  }
  const outside = findings.filter((finding) => finding.outcome === 'outside');
  return {
    standing: draft.standing,
    reasons:
      draft.standing === 'unread'
        ? ['The only file of this cell is cut short: 812 of 60,416 bytes are there.']
        : outside.map((finding) => finding.sentence),
    findings: draft.standing === 'unread' ? [] : findings,
    usable:
      draft.sweeps < 4
        ? null
        : {
            from_sweep: 1,
            to_sweep: draft.sweeps - 2,
            sweeps: draft.sweeps - 2,
            sentence: `Sweeps 1 to ${draft.sweeps - 2}: after them the access resistance exceeds 25 MΩ.`,
          },
    explanations: [],
  };
}

interface MadeUpCell {
  row: CellRow;
  sweeps: SweepRow[];
}

function cellFrom(draft: Draft, seed: number): MadeUpCell {
  const random = seeded(seed);
  const facts = factsOf(draft, random);
  const conditions = draft.sweeps === 0 ? [] : draft.drug ? ['baseline', 'TTX 0.5 µM', 'wash'] : ['baseline'];
  const restMv = random.between(-78, -62);
  const peakMv = random.between(20, 45);
  const file =
    draft.standing === 'unread'
      ? 'recordings/2026-03-01/cut-short.nwb'
      : `recordings/${draft.id.slice(0, 10)}/${draft.id.replaceAll('/', '-')}.nwb`;
  const sweeps: SweepRow[] = [];
  for (let sweep = 0; sweep < draft.sweeps; sweep++) {
    const condition =
      conditions[Math.min(conditions.length - 1, Math.floor((sweep * conditions.length) / draft.sweeps))]!;
    const amplitude = -100 + 50 * sweep;
    const blocked = condition.startsWith('TTX');
    const count = !draft.fires || blocked || amplitude < 100 ? 0 : Math.min(24, Math.round((amplitude - 50) / 25));
    const spikes = spikesOf(random, count);
    const at = spikes.map((spike) => spike.values['peak_at_s']!);
    sweeps.push({
      cell: draft.id,
      file,
      series: `/acquisition/vm_${sweep}`,
      source_sweep: sweep * 2 + 1,
      sweep,
      condition,
      since_start_s: sweep * 4,
      clamp: 'current',
      duration_s: 1,
      stimulus: {
        kind: 'step',
        from: 'channel',
        onset_s: 0.2,
        end_s: 0.7,
        amplitude,
        holding: -5,
        edges_s: [0.2, 0.7],
      },
      readings: {
        ...readingsFor(random, 'sweep', count > 0),
        stimulus_pa: { value: amplitude },
        spikes: { value: count },
        mean_rate_hz: { value: count / 0.5 },
      },
      spikes,
      depolarization_block: false,
      remarks: sweep === 3 ? ['The stimulus was cut to the length of the voltage.'] : [],
      voltage_envelope: shape(random, restMv, amplitude, at, peakMv, 300),
      current_envelope: {
        start_s: 0,
        end_s: 1,
        low: Array.from({ length: 300 }, (_, i) => (i >= 60 && i < 210 ? amplitude - 5 : -5)),
        high: Array.from({ length: 300 }, (_, i) => (i >= 60 && i < 210 ? amplitude - 4 : -4)),
      },
      first_spike: count > 0 ? spikeExcerpt(restMv, -45, peakMv, random.between(0.3, 0.8), at[0]! - 0.005) : null,
      step_response: null,
    });
  }
  const measured: ConditionMeasure[] = conditions.map((condition) => {
    const mine = sweeps.filter((one) => one.condition === condition);
    const firing = mine.filter((one) => one.spikes.length > 0);
    return {
      condition,
      sweeps: mine.map((one) => one.sweep),
      readings: {
        ...readingsFor(random, 'cell', firing.length > 0),
        spikes: { value: mine.reduce((sum, one) => sum + one.spikes.length, 0) },
      },
      vi: mine
        .filter((one) => one.spikes.length === 0)
        .map((one) => ({
          sweep: one.sweep,
          pa: one.stimulus.amplitude!,
          mv: round(one.stimulus.amplitude! * 0.12, 2),
        })),
      fi: mine.map((one) => ({ sweep: one.sweep, pa: one.stimulus.amplitude!, hz: one.spikes.length / 0.5 })),
      reference_spike: firing[0] ? { sweep: firing[0].sweep, spike: 0 } : null,
    };
  });
  const circumstances = conditions.map((condition) => circumstancesOf(facts, condition));
  const known = facts['pipette'] !== undefined;
  return {
    sweeps,
    row: {
      cell: draft.id,
      facts,
      circumstances,
      reading: known ? 'corrected' : 'recorded',
      ljp_applied_mv: known ? 14.6 : 0,
      measure: { conditions: measured },
      judgement: judgementOf(draft, conditions, random),
      decisions: [],
      files: [file],
      sweeps: draft.sweeps,
      spikes: sweeps.reduce((sum, one) => sum + one.spikes.length, 0),
      date: draft.day === null ? null : dateOf(draft.day),
      e_na_mv: known ? 61.2 : null,
      e_k_mv: known ? -105.4 : null,
      problems:
        draft.standing === 'unread'
          ? [
              {
                path: file,
                code: 'FILE_CUT_SHORT',
                weight: 'blocks',
                place: '',
                message: 'The file ends after 812 bytes; its own header says 60,416.',
                remedy: 'Copy it again from the acquisition computer, or move it out of the archive.',
              },
            ]
          : [],
      notes: [],
    },
  };
}

function notesFor(cells: CellRow[]): NoteRow[] {
  const [first, second, third] = cells;
  const long = cells.find((cell) => cell.cell.length > 60);
  const notes: NoteRow[] = [
    {
      id: '2026/week-05-meeting',
      path: 'notes/2026/week-05-meeting.md',
      title: 'Meeting of week 5: the drift on rig B',
      date: '2026-01-30',
      author: 'k',
      html: [
        '<p>Rig B loses a millivolt a minute since the new pump. <a href="cell:',
        encodeURIComponent(first!.cell),
        `">${first!.cell}</a> shows it best; <a href="note:bench/pump">the bench note</a> has the picture.</p>`,
        '<figure data-figure="0"></figure>',
        '<h2>What we decided</h2><ul class="contains-task-list"><li class="task-list-item"><input type="checkbox" disabled> Warm the bath before the first cell.</li><li>Keep <a href="cell:',
        encodeURIComponent(second!.cell),
        `">${second!.cell}</a> out until the slice is looked at again.</li></ul>`,
        '<table><thead><tr><th>rig</th><th>drift (mV/min)</th></tr></thead><tbody><tr><td>a</td><td>0.1</td></tr><tr><td>b</td><td>1.1</td></tr></tbody></table>',
      ].join(''),
      text: `Rig B loses a millivolt a minute since the new pump. ${first!.cell} shows it best. Warm the bath before the first cell.`,
      cells: [first!.cell, second!.cell],
      links: ['bench/pump'],
      figures: [{ cell: first!.cell, sweep: 3, from_s: 0.15, to_s: 0.8, caption: 'Sweep 3: the rest creeps up.' }],
      images: [],
      problems: [],
    },
    {
      id: 'bench/pump',
      path: 'notes/bench/pump.md',
      title: 'The new pump',
      date: '2026-01-26',
      author: 'm',
      html: `<p>Fitted on Monday.</p><p><img src="file:notes/bench/pump.png" alt="The pump beside the rig"></p><p>Second try with <a href="cell:${encodeURIComponent(third!.cell)}">${third!.cell}</a>.</p>`,
      text: `Fitted on Monday. Second try with ${third!.cell}.`,
      cells: [third!.cell],
      links: [],
      figures: [],
      images: ['notes/bench/pump.png'],
      problems: [
        {
          line: 12,
          message: 'The link "cell:2026-01-99-s1c1" leads to no cell of this archive.',
          remedy: 'Correct the id, or delete the link.',
        },
      ],
    },
    {
      id: 'undated thoughts',
      path: 'notes/undated thoughts.md',
      title: 'Undated thoughts on names that are much longer than anybody expected when the table was drawn',
      date: null,
      author: null,
      html: `<p>Look again at <a href="cell:${encodeURIComponent((long ?? first!).cell)}">${(long ?? first!).cell}</a>, please.</p>`,
      text: 'Look again at the long one, please.',
      cells: [(long ?? first!).cell],
      links: [],
      figures: [],
      images: [],
      problems: [],
    },
  ];
  for (const note of notes) for (const id of note.cells) cells.find((cell) => cell.cell === id)?.notes.push(note.id);
  return notes.sort((a, b) => (a.id < b.id ? -1 : 1));
}

const hash = (index: number): string => String(index).padStart(4, '0').repeat(16);

function fileRows(cells: CellRow[]): FileRow[] {
  const rows = new Map<string, FileRow>();
  cells.forEach((cell, index) => {
    for (const file of cell.files)
      rows.set(file, {
        path: file,
        bytes: 1_204_331 + index * 977,
        sha256: hash(index),
        format: 'nwb',
        state: cell.judgement.standing === 'unread' ? 'unread' : 'read',
        reason: cell.problems[0]?.message ?? '',
        problems: cell.problems,
        cells: [cell.cell],
        sweeps: cell.sweeps,
      });
  });
  const other: [string, string][] = [
    ['recordings/2026-01-12/slice.jpg', 'a picture'],
    ['recordings/2026-01-12/Thumbs.db', 'a file of the operating system'],
    ['recordings/README.txt', 'text without columns of numbers'],
  ];
  other.forEach(([file, reason], index) => {
    rows.set(file, {
      path: file,
      bytes: 4096 * (index + 1),
      sha256: hash(900 + index),
      format: '',
      state: 'other',
      reason,
      problems: [],
      cells: [],
      sweeps: 0,
    });
  });
  return [...rows.values()].sort((a, b) => (a.path < b.path ? -1 : 1));
}

/**
 * Writes the ledger of an invented archive below `folder`, and the archive's one picture beside it.
 *
 * @returns paths for SWEEP_ALMANAC_LEDGER and SWEEP_ALMANAC_ARCHIVE
 */
export async function makeUpLedger(
  folder: string,
  kind: MadeUpKind,
): Promise<{ ledgerFile: string; archiveRoot: string; cells: CellRow[] }> {
  const random = seeded(20260112);
  const every = drafts(random);
  const chosen = { many: every, some: [...every.slice(0, 8), ...every.slice(-6)], one: every.slice(0, 1), empty: [] };
  const wanted = chosen[kind];
  const full = kind === 'many' || kind === 'some';
  const cells = wanted.map((draft, index) => cellFrom(draft, 1000 + index));
  cells.sort((a, b) => (a.row.cell < b.row.cell ? -1 : 1));
  const rows = cells.map((cell) => cell.row);
  if (full) {
    rows[2]!.decisions = [
      {
        cell: rows[2]!.cell,
        decision: 'exclude',
        by: 'k',
        date: '2026-02-02',
        why: 'slice from the wrong plane',
        line: 1,
      },
    ];
  }
  const notes = full ? notesFor(rows) : [];
  const dates = rows.flatMap((row) => (row.date === null ? [] : [row.date])).sort();
  const archive: ArchiveRow = {
    settings: full
      ? settings
      : {
          ...settings,
          rigs: {},
          people: {},
          title: kind === 'one' ? 'One cell' : 'Nothing yet',
          lab: '',
        },
    recipes: full ? recipes : [],
    events: full
      ? [
          { date: '2026-01-26', text: 'New perfusion pump', rig: 'b', kind: 'pump', line: 1 },
          { date: '2026-02-16', text: 'New batch of pipette solution', rig: null, kind: 'batch', line: 2 },
        ]
      : [],
    criteria: [],
    problems: full
      ? [
          {
            path: 'recordings/2026-02-10/folder.yaml',
            line: 3,
            code: 'FACT_UNKNOWN',
            weight: 'warns',
            place: 'facts.temprature',
            message: 'No fact is called "temprature".',
            remedy: 'Did you mean "temperature_c"?',
          },
        ]
      : [],
    version: '0.1.0',
    latest_date: dates.at(-1) ?? null,
  };
  const archiveRoot = path.join(folder, 'archive');
  mkdirSync(path.join(archiveRoot, 'notes/bench'), { recursive: true });
  const picture = await sharp({ create: { width: 2400, height: 1500, channels: 3, background: '#8a9a9f' } })
    .png()
    .toBuffer();
  writeFileSync(path.join(archiveRoot, 'notes/bench/pump.png'), picture);
  const ledger = openLedger(path.join(folder, 'work'));
  try {
    ledger.replace(
      {
        archive,
        files: fileRows(rows),
        cells,
        notes,
      },
      { surveys: new Set(), measures: new Set() },
    );
  } finally {
    ledger.close();
  }
  return { ledgerFile: ledgerFile(path.join(folder, 'work')), archiveRoot, cells: rows };
}
