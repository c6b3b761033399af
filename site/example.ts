/**
 * The worked example of the methods page: from numbers that can be downloaded to those of the tables, in plain
 * arithmetic that a person can follow. Nothing here is taken from measuring: each step is done anew from the samples.
 */
import { physicalConstants } from '../pipeline/judge/checks.ts';
import { classRanges, type ShippedClass } from '../pipeline/judge/class-ranges.ts';
import type { SolutionIons } from '../pipeline/judge/types.ts';
import type { CellRow, SweepRow } from '../pipeline/ledger/types.ts';
import { quantity } from '../pipeline/measure/quantities.ts';
import type { Excerpt, Spike } from '../pipeline/measure/types.ts';
import type { Almanac, CellSummary } from './almanac.ts';
import { shownSpike } from './cell/view.ts';
import { knownHalfWidth, number, printed, withHalfWidth } from './format.ts';

const { elementaryChargeC, faradayCPerMol, gasConstantJPerMolK, zeroCelsiusK } = physicalConstants;

/** One number: how it is had, with the figures in it, and what the tables say. */
export interface Step {
  quantity: string;
  /** The sentence before the arithmetic. */
  how: string;
  /** Lines of arithmetic, figures put in. */
  lines: string[];
  value: number;
  /** As measured, and its half-width. */
  reported: number;
  u95: number | null;
}

export interface ExamplePart {
  title: string;
  /** Where the figures come from; `file` from the site's root. */
  inputs: { file: string; what: string }[];
  /** Figures that several steps share. */
  table: { head: string[]; rows: string[][]; caption: string } | null;
  steps: Step[];
}

export interface Example {
  cell: CellSummary;
  parts: ExamplePart[];
}

/** Nothing is told with more figures than arithmetic by hand needs. */
const told = (value: number, decimals: number): string => number(value, decimals);

/** In brackets where a sign would else follow a sign. */
const term = (value: number, decimals: number): string =>
  value < 0 ? `(${told(value, decimals)})` : told(value, decimals);

/** dV/dt at every sample but the first and last, V/s: (V_{k+1} − V_{k−1})/(2·Δt). */
export const centralSlopes = (mv: readonly number[], rateHz: number): number[] =>
  mv.map((_, k) => (k === 0 || k === mv.length - 1 ? Number.NaN : ((mv[k + 1]! - mv[k - 1]!) * rateHz) / 2000));

/** Fraction of a step from `a` to `b` at which `level` lies. */
const share = (level: number, a: number, b: number): number => (level - a) / (b - a);

export interface SpikeByHand {
  /** Sample before the crossing of the criterion, dV/dt there and at the next one, V/s. */
  k: number;
  slopes: [number, number];
  threshold: { s: number; mv: number };
  top: number;
  peak: { s: number; mv: number };
  steepest: number;
  /** Samples before the crossings of half height. */
  up: number;
  down: number;
  halfLevel: number;
  halfWidthMs: number;
}

/**
 * Threshold, peak and half-width of one spike from its samples alone.
 * @param criterion dV/dt at threshold, V/s
 * @returns null where a crossing is missing
 */
export function spikeByHand({ mv, rate_hz, start_s }: Excerpt, criterion: number): SpikeByHand | null {
  const slopes = centralSlopes(mv, rate_hz);
  let top = 1;
  for (let i = 1; i < mv.length - 1; i++) if (mv[i]! > mv[top]!) top = i;
  let steepest = 1;
  for (let i = 1; i <= top; i++) if (slopes[i]! > slopes[steepest]!) steepest = i;
  let k = steepest;
  while (k > 1 && slopes[k]! >= criterion) k--;
  if (!(slopes[k]! < criterion) || k === steepest) return null;
  const part = share(criterion, slopes[k]!, slopes[k + 1]!);
  const threshold = { s: start_s + (k + part) / rate_hz, mv: mv[k]! + part * (mv[k + 1]! - mv[k]!) };
  // Vertex of the parabola through three samples one step apart.
  const [a, b, c] = [mv[top - 1]!, mv[top]!, mv[top + 1]!];
  const bend = a - 2 * b + c;
  const offset = bend === 0 ? 0 : (a - c) / (2 * bend);
  const peak = { s: start_s + (top + offset) / rate_hz, mv: b - ((a - c) * offset) / 4 };
  const halfLevel = (threshold.mv + peak.mv) / 2;
  let up = top;
  while (up > k && mv[up]! > halfLevel) up--;
  let down = top;
  while (down < mv.length - 1 && mv[down + 1]! > halfLevel) down++;
  if (down === mv.length - 1) return null;
  const width = down + share(halfLevel, mv[down]!, mv[down + 1]!) - up - share(halfLevel, mv[up]!, mv[up + 1]!);
  return {
    k,
    slopes: [slopes[k]!, slopes[k + 1]!],
    threshold,
    top,
    peak,
    steepest,
    up,
    down,
    halfLevel,
    halfWidthMs: (1000 * width) / rate_hz,
  };
}

/** Least-squares slope and intercept. */
export function lineByHand(points: readonly (readonly [x: number, y: number])[]): {
  n: number;
  sx: number;
  sy: number;
  sxx: number;
  sxy: number;
  slope: number;
  intercept: number;
} {
  const n = points.length;
  const sum = (of: (x: number, y: number) => number): number => points.reduce((all, [x, y]) => all + of(x, y), 0);
  const sx = sum((x) => x);
  const sy = sum((_, y) => y);
  const sxx = sum((x) => x * x);
  const sxy = sum((x, y) => x * y);
  const slope = (n * sxy - sx * sy) / (n * sxx - sx * sx);
  return { n, sx, sy, sxx, sxy, slope, intercept: (sy - slope * sx) / n };
}

/** The response to one small step: ms after onset and mV below the level before it, from `response.csv`. */
export function responseOf(sweep: SweepRow): { ms: number; mv: number }[] {
  const { start_s, rate_hz, mv } = sweep.step_response!;
  const onset = sweep.stimulus.onset_s!;
  return mv.map((value, k) => ({ ms: 1000 * (start_s + k / rate_hz - onset), mv: value }));
}

/**
 * Time constant of a response without knowing where it heads: an exponential's value a lag later is a straight line on
 * its value now, of slope exp(−lag/τ). From the first sample at 10 % (0.5 ms after onset at the earliest) to the last
 * before 90 % of the steady deflection, lagged by a third of that stretch.
 * @see Mangelsdorf 1959, J Appl Phys 30:442–443 (from memory)
 */
export function timeConstantByHand(
  response: readonly { ms: number; mv: number }[],
  steadyMv: number,
): { before: number; from: number; to: number; n: number; lag: number; slope: number; ms: number } | null {
  const early = response.filter((one) => one.ms < 0);
  if (early.length === 0) return null;
  const before = early.reduce((sum, one) => sum + one.mv, 0) / early.length;
  const late = response.filter((one) => one.ms >= 0.5);
  const part = (one: { mv: number }): number => (one.mv - before) / steadyMv;
  const first = late.findIndex((one) => part(one) >= 0.1);
  const end = late.findIndex((one, index) => index >= first && part(one) >= 0.9);
  const used = first < 0 || end < 0 ? [] : late.slice(first, end);
  const shift = Math.floor(used.length / 3);
  if (shift < 3) return null;
  const pairs = used.slice(0, -shift).map((one, k) => [one.mv, used[k + shift]!.mv] as const);
  const { slope, n } = lineByHand(pairs);
  const lag = used[shift]!.ms - used[0]!.ms;
  return slope > 0 && slope < 1
    ? { before, from: used[0]!.ms, to: used.at(-1)!.ms, n, lag, slope, ms: -lag / Math.log(slope) }
    : null;
}

/** RT/F, mV. */
export const thermalMv = (celsius: number): number =>
  (1000 * gasConstantJPerMolK * (celsius + zeroCelsiusK)) / faradayCPerMol;

/** Sums of the generalized Henderson equation. */
export function hendersonByHand({ ions, celsius }: Pick<SolutionIons, 'ions' | 'celsius'>): {
  drive: number;
  pipette: number;
  bath: number;
  mv: number;
} {
  const sum = (of: (ion: SolutionIons['ions'][number]) => number): number =>
    ions.reduce((all, ion) => all + of(ion), 0);
  const drive = sum((ion) => ion.valence * ion.mobility * (ion.bath_mm - ion.pipette_mm));
  const pipette = sum((ion) => ion.valence ** 2 * ion.mobility * ion.pipette_mm);
  const bath = sum((ion) => ion.valence ** 2 * ion.mobility * ion.bath_mm);
  const mv = thermalMv(celsius) * (drive / (bath - pipette)) * Math.log(pipette / bath);
  return { drive, pipette, bath, mv };
}

const stepOf = (
  id: string,
  how: string,
  lines: string[],
  value: number,
  reported: { value: number; u95?: number | null | undefined },
): Step => ({
  quantity: id,
  how,
  lines,
  value,
  reported: reported.value,
  u95: knownHalfWidth(id, reported.u95) ?? null,
});

function spikePart(cell: CellRow, folder: string, shown: { spike: Spike; excerpt: Excerpt; sweep: SweepRow }) {
  const like = cell.circumstances[0]!.like as ShippedClass;
  const criterion = classRanges[like].spikes.rise_criterion_v_per_s!;
  const hand = spikeByHand(shown.excerpt, criterion);
  if (!hand) return null;
  const { mv, rate_hz, start_s } = shown.excerpt;
  const spike = (id: string) => ({ value: shown.spike.values[id]!, u95: shown.spike.u95?.[id] });
  const at = (k: number): string => told(1000 * (start_s + k / rate_hz), 3);
  const dt = 1000 / rate_hz;
  const half = hand.halfLevel;
  const height = hand.peak.mv - hand.threshold.mv;
  const slopeLine = (k: number): string =>
    `dV/dt at ${at(k)} ms = (${told(mv[k + 1]!, 3)} − ${term(mv[k - 1]!, 3)}) mV / ${told(2 * dt, 3)} ms = ${told(((mv[k + 1]! - mv[k - 1]!) * rate_hz) / 2000, 2)} V/s`;
  const part = share(criterion, ...hand.slopes);
  const upPart = share(half, mv[hand.up]!, mv[hand.up + 1]!);
  const downPart = share(half, mv[hand.down]!, mv[hand.down + 1]!);
  const [a, b, c] = [mv[hand.top - 1]!, mv[hand.top]!, mv[hand.top + 1]!];
  const offset = (a - c) / (2 * (a - 2 * b + c));
  const steps = [
    stepOf(
      'threshold_mv',
      `Going back from the steepest sample (${at(hand.steepest)} ms), dV/dt first falls below the criterion of ${told(criterion, 0)} V/s between two samples; threshold lies in between, in proportion.`,
      [
        slopeLine(hand.k),
        slopeLine(hand.k + 1),
        `share of the way = (${told(criterion, 0)} − ${told(hand.slopes[0], 2)})/(${told(hand.slopes[1], 2)} − ${told(hand.slopes[0], 2)}) = ${told(part, 3)}`,
        `V_thr = ${told(mv[hand.k]!, 3)} + ${told(part, 3)} · (${told(mv[hand.k + 1]!, 3)} − ${term(mv[hand.k]!, 3)}) = ${told(hand.threshold.mv, 2)} mV`,
      ],
      hand.threshold.mv,
      spike('threshold_mv'),
    ),
    stepOf(
      'peak_mv',
      `The highest sample is ${told(b, 3)} mV at ${at(hand.top)} ms, its neighbours ${told(a, 3)} and ${told(c, 3)} mV; the peak is the vertex of the parabola through the three.`,
      [
        `offset = (${told(a, 3)} − ${told(c, 3)})/(2·(${told(a, 3)} − 2·${told(b, 3)} + ${told(c, 3)})) = ${told(offset, 3)} samples`,
        `V_peak = ${told(b, 3)} − (${told(a, 3)} − ${told(c, 3)}) · ${told(offset, 3)}/4 = ${told(hand.peak.mv, 2)} mV`,
      ],
      hand.peak.mv,
      spike('peak_mv'),
    ),
    stepOf(
      'spike_height_mv',
      'The height is the way from one to the other.',
      [`H = ${told(hand.peak.mv, 2)} − ${term(hand.threshold.mv, 2)} = ${told(height, 2)} mV`],
      height,
      spike('spike_height_mv'),
    ),
    stepOf(
      'half_width_ms',
      `Half the height lies at ${told(half, 2)} mV; the trace crosses it upwards after ${at(hand.up)} ms and downwards after ${at(hand.down)} ms, each in proportion between two samples.`,
      [
        `t_up = ${at(hand.up)} + ${told(dt, 3)} · (${told(half, 2)} − ${term(mv[hand.up]!, 3)})/(${told(mv[hand.up + 1]!, 3)} − ${term(mv[hand.up]!, 3)}) = ${told(1000 * start_s + (hand.up + upPart) * dt, 4)} ms`,
        `t_down = ${at(hand.down)} + ${told(dt, 3)} · (${told(half, 2)} − ${term(mv[hand.down]!, 3)})/(${told(mv[hand.down + 1]!, 3)} − ${term(mv[hand.down]!, 3)}) = ${told(1000 * start_s + (hand.down + downPart) * dt, 4)} ms`,
        `w½ = t_down − t_up = ${told(hand.halfWidthMs, 4)} ms`,
      ],
      hand.halfWidthMs,
      spike('half_width_ms'),
    ),
  ];
  const charge = spike('minimum_charge_pc');
  const ions = spike('minimum_ions_millions');
  if (charge.value != null && ions.value != null)
    steps.push(
      stepOf(
        'minimum_ions_millions',
        'The least number of ions is the least charge, as the table above gives it, over the elementary charge.',
        [
          `N_min = ${told(charge.value, 3)} × 10⁻¹² C / ${(elementaryChargeC * 1e19).toPrecision(7)} × 10⁻¹⁹ C = ${told((charge.value * 1e-18) / elementaryChargeC, 2)} million`,
        ],
        (charge.value * 1e-18) / elementaryChargeC,
        ions,
      ),
    );
  const from = Math.max(0, hand.k - 2);
  const rows = mv
    .slice(from, hand.down + 3)
    .map((value, i) => [
      at(from + i),
      told(value, 3),
      from + i === 0 ? '' : told(((mv[from + i + 1]! - mv[from + i - 1]!) * rate_hz) / 2000, 2),
    ]);
  return {
    title: 'One spike, sample by sample',
    inputs: [
      { file: `${folder}spike.csv`, what: `spike ${shown.spike.spike} of sweep ${shown.sweep.sweep}, every sample` },
    ],
    table: {
      head: ['Time (ms)', 'Potential (mV)', 'dV/dt (V/s)'],
      // A long spike is not printed whole.
      rows: rows.length <= 120 ? rows : [],
      caption: `From spike.csv: ${told(rate_hz / 1000, 1)} kHz, times from the start of the sweep; dV/dt is the difference of the two neighbours over ${told(2 * dt, 3)} ms.`,
    },
    steps,
  } satisfies ExamplePart;
}

function passivePart(cell: CellRow, folder: string, sweeps: readonly SweepRow[]): ExamplePart | null {
  const condition = cell.measure.conditions[0]!;
  const { readings } = condition;
  const points = condition.vi.filter((point) => point.pa < 0);
  const resistance = readings['input_resistance_mohm'];
  if (resistance?.value == null || points.length === 0) return null;
  const line = lineByHand([[0, 0], ...points.map((point) => [point.pa, point.mv] as const)]);
  const byHand = line.slope * 1000;
  const steps = [
    stepOf(
      'input_resistance_mohm',
      'The slope of the least-squares line through the hyperpolarizing steps of the table and (0, 0).',
      [
        `n = ${line.n}, ΣI = ${told(line.sx, 2)} pA, ΣΔV = ${told(line.sy, 3)} mV, ΣI² = ${told(line.sxx, 1)} pA², ΣIΔV = ${told(line.sxy, 2)} pA·mV`,
        `R_in = (n·ΣIΔV − ΣI·ΣΔV)/(n·ΣI² − (ΣI)²) = ${told(line.slope, 5)} mV/pA = ${told(byHand, 2)} MΩ`,
      ],
      byHand,
      { value: resistance.value, u95: resistance.u95 },
    ),
  ];
  const tau = readings['membrane_time_constant_ms'];
  const small = responseSweep(cell, sweeps);
  const steady = small?.readings['steady_deflection_mv']?.value ?? null;
  const fit = small && steady !== null ? timeConstantByHand(responseOf(small), steady) : null;
  if (tau?.value != null && small && fit)
    steps.push(
      stepOf(
        'membrane_time_constant_ms',
        `In sweep ${small.sweep} the step of ${told(small.stimulus.amplitude!, 1)} pA moves the potential by ΔV_ss = ${told(steady!, 3)} mV from ${told(fit.before, 3)} mV, the mean before onset. From ${told(fit.from, 2)} to ${told(fit.to, 2)} ms after onset (10 to 90 % of the way) it follows an exponential, whose value ${told(fit.lag, 2)} ms later is a straight line on its value now.`,
        [
          `least-squares slope of V(t + ${told(fit.lag, 2)} ms) on V(t) over ${fit.n} pairs = ${told(fit.slope, 5)}`,
          `τ_m = −${told(fit.lag, 2)} ms / ln(${told(fit.slope, 5)}) = ${told(fit.ms, 2)} ms`,
        ],
        fit.ms,
        { value: tau.value, u95: tau.u95 },
      ),
    );
  const capacitance = readings['membrane_capacitance_pf'];
  if (tau?.value != null && capacitance?.value != null)
    steps.push(
      stepOf(
        'membrane_capacitance_pf',
        'Time constant over input resistance, both as the tables give them.',
        [
          `C_m = ${told(tau.value, 3)} ms / ${told(resistance.value, 3)} MΩ = ${told((1000 * tau.value) / resistance.value, 2)} pF`,
        ],
        (1000 * tau.value) / resistance.value,
        { value: capacitance.value, u95: capacitance.u95 },
      ),
    );
  const sag = readings['sag_fraction'];
  const sagging = sweeps.find((sweep) => sweep.sweep === sag?.at?.sweep);
  const largest = sagging?.readings['largest_deflection_mv']?.value;
  const end = sagging?.readings['steady_deflection_mv']?.value;
  if (sag?.value != null && sagging && largest != null && end != null)
    steps.push(
      stepOf(
        'sag_fraction',
        `Of the steps, that of sweep ${sagging.sweep} deflects nearest to 15 mV.`,
        [
          `sag = (ΔV_max − ΔV_ss)/ΔV_max = (${told(largest, 3)} − ${term(end, 3)})/${term(largest, 3)} = ${told((largest - end) / largest, 4)}`,
        ],
        (largest - end) / largest,
        { value: sag.value, u95: sag.u95 },
      ),
    );
  return {
    title: 'One cell’s response to steps',
    inputs: [
      { file: `${folder}steps.csv`, what: 'every step with its current, steady and largest deflection and rate' },
      ...(small ? [{ file: `${folder}response.csv`, what: `the onset of the response in sweep ${small.sweep}` }] : []),
    ],
    table: {
      head: ['Sweep', 'I (pA)', 'ΔV_ss (mV)'],
      rows: points.map((point) => [number(point.sweep), told(point.pa, 2), told(point.mv, 3)]),
      caption: 'From steps.csv: hyperpolarizing steps without a spike.',
    },
    steps,
  };
}

/** The sweep whose onset `response.csv` holds: the one the time constant names, else the smallest response. */
export function responseSweep(cell: CellRow, sweeps: readonly SweepRow[]): SweepRow | null {
  const condition = cell.measure.conditions[0];
  if (!condition) return null;
  const own = new Set(condition.sweeps);
  const usable = sweeps.filter(
    (sweep) =>
      own.has(sweep.sweep) && sweep.step_response !== null && sweep.readings['steady_deflection_mv']?.value != null,
  );
  const named = condition.readings['membrane_time_constant_ms']?.at?.sweep;
  const size = (sweep: SweepRow): number => Math.abs(sweep.readings['steady_deflection_mv']!.value!);
  return (
    usable.find((sweep) => sweep.sweep === named) ??
    usable.reduce<SweepRow | null>((best, one) => (best === null || size(one) < size(best) ? one : best), null)
  );
}

function potentialsPart(cell: CellRow): ExamplePart | null {
  const circumstances = cell.circumstances[0]!;
  const { solution, e_k, e_na } = circumstances;
  if (!solution || !e_k) return null;
  const rt = thermalMv(solution.celsius);
  const nernst = (ion: NonNullable<typeof e_k>): number => rt * Math.log(ion.outside_mm / ion.inside_mm);
  const line = (symbol: string, ion: NonNullable<typeof e_k>): string =>
    `${symbol} = ${told(rt, 4)} · ln(${told(ion.outside_mm, 3)}/${told(ion.inside_mm, 3)}) = ${told(nernst(ion), 2)} mV`;
  const kelvin = solution.celsius + zeroCelsiusK;
  const heat = `RT/F = 1000 · ${gasConstantJPerMolK.toPrecision(7)} · ${told(kelvin, 2)} / ${faradayCPerMol.toPrecision(8)} = ${told(rt, 4)} mV`;
  const { drive, pipette, bath, mv } = hendersonByHand(solution);
  const at = (id: string, how: string, lines: string[], value: number, reported: number, u95: number): Step => ({
    quantity: id,
    how,
    lines,
    value,
    reported,
    u95,
  });
  return {
    title: 'The potentials of its solutions',
    inputs: [{ file: 'methods/example/ions.csv', what: 'ions of pipette and bath with valence and mobility' }],
    table: {
      head: ['Ion', 'z', 'u/u_K', 'Pipette (mM)', 'Bath (mM)', 'z·u·(B − P)', 'z²·u·P', 'z²·u·B'],
      rows: solution.ions.map((ion) => [
        ion.ion,
        ion.valence > 0 ? `+${ion.valence}` : number(ion.valence),
        told(ion.mobility, 3),
        told(ion.pipette_mm, 3),
        told(ion.bath_mm, 3),
        told(ion.valence * ion.mobility * (ion.bath_mm - ion.pipette_mm), 3),
        told(ion.valence ** 2 * ion.mobility * ion.pipette_mm, 3),
        told(ion.valence ** 2 * ion.mobility * ion.bath_mm, 3),
      ]),
      caption: `Free ions of pipette (P) and bath (B) at ${told(solution.celsius, 1)} °C, after dissociation at the stated pH; u is the mobility relative to potassium.`,
    },
    steps: [
      at(
        'e_k',
        `Nernst’s equation at ${told(solution.celsius, 1)} °C.`,
        [heat, line('E_K', e_k)],
        nernst(e_k),
        e_k.mv,
        e_k.uncertainty_mv,
      ),
      ...(e_na
        ? [at('e_na', 'The same for sodium.', [line('E_Na', e_na)], nernst(e_na), e_na.mv, e_na.uncertainty_mv)]
        : []),
      at(
        'ljp',
        'Henderson’s equation with the sums of the table’s last three columns.',
        [
          `S = ${told(drive, 3)}, G_P = ${told(pipette, 3)}, G_B = ${told(bath, 3)}`,
          `V_junction = (RT/F) · S/(G_B − G_P) · ln(G_P/G_B) = ${told(rt, 4)} · ${term(drive, 3)}/${term(bath - pipette, 3)} · ln(${told(pipette / bath, 5)}) = ${told(mv, 2)} mV`,
        ],
        mv,
        solution.ljp_mv,
        solution.ljp_uncertainty_mv,
      ),
    ],
  };
}

/** Words and decimals for what is no quantity of the registry. */
const potentials: Record<string, { label: string; unit: string }> = {
  e_k: { label: 'Equilibrium potential of potassium', unit: 'mV' },
  e_na: { label: 'Equilibrium potential of sodium', unit: 'mV' },
  ljp: { label: 'Liquid junction potential', unit: 'mV' },
};

export interface StepWords {
  label: string;
  unit: string;
  byHand: string;
  reported: string;
  /** Anchor on the methods page. */
  anchor: string | null;
  agrees: string;
}

/** How a step reads beside the tables. */
export function stepWords(step: Step): StepWords {
  const own = potentials[step.quantity];
  const away = Math.abs(step.value - step.reported);
  const decimals = own ? 1 : quantity(step.quantity).decimals;
  const agrees =
    away < 0.5 * 10 ** -decimals * 1.0001
      ? 'the same'
      : step.u95 !== null && away <= step.u95
        ? 'within ±'
        : `differs by ${number(away, decimals + 1)}`;
  if (own)
    return {
      ...own,
      byHand: number(step.value, 1),
      reported: `${number(step.reported, 1)}${step.u95 === null ? '' : ` ± ${number(step.u95, 1)}`}`,
      anchor: null,
      agrees,
    };
  const { label, unit } = quantity(step.quantity);
  return {
    label,
    unit,
    byHand: printed(step.quantity, step.value),
    reported: withHalfWidth(step.quantity, step.reported, step.u95),
    anchor: `quantity-${step.quantity}`,
    agrees,
  };
}

/** What makes a cell fit to be the example: how much of it can be shown. */
function candidate(summary: CellSummary): number {
  const like = classRanges[summary.like as ShippedClass];
  if (!like || like.spikes.rise_criterion_v_per_s === null || summary.facts['spike_ion'] === 'calcium') return 0;
  const has = (id: string): number => Number(summary.readings[id]?.value != null);
  const spike = has('threshold_mv') * has('peak_mv') * has('half_width_ms') * has('rheobase_pa');
  return (
    4 * spike * Number(summary.spikes > 0) +
    has('input_resistance_mohm') +
    has('membrane_time_constant_ms') +
    has('sag_fraction') +
    Number(summary.solutions?.e_k != null) +
    Number(summary.standing === 'sound')
  );
}

const kept = new WeakMap<Almanac, Example | null>();

/**
 * The cell of which most can be shown, the quietest of several such, worked through.
 * @returns null where no cell has a spike with every number of it
 */
export function exampleOf(almanac: Almanac): Example | null {
  const had = kept.get(almanac);
  if (had !== undefined) return had;
  const made = workThrough(almanac);
  kept.set(almanac, made);
  return made;
}

function workThrough(almanac: Almanac): Example | null {
  const noise = (cell: CellSummary): number => cell.readings['noise_rms_mv']?.value ?? Number.POSITIVE_INFINITY;
  const ordered = almanac.cells
    .map((cell) => ({ cell, shows: candidate(cell) }))
    .filter(({ shows }) => shows >= 4)
    .sort((a, b) => b.shows - a.shows || noise(a.cell) - noise(b.cell) || (a.cell.id < b.cell.id ? -1 : 1));
  for (const { cell: summary } of ordered) {
    const cell = almanac.cell(summary.id);
    const sweeps = almanac.sweeps(summary.id);
    const shown = shownSpike(cell.measure.conditions[0], sweeps);
    const needed = ['threshold_mv', 'peak_mv', 'spike_height_mv', 'half_width_ms'];
    if (!shown || needed.some((id) => shown.spike.values[id] == null)) continue;
    const folder = summary.page.replace(/index\.html$/, '');
    const spike = spikePart(cell, folder, shown);
    if (!spike) continue;
    const parts = [spike, passivePart(cell, folder, sweeps), potentialsPart(cell)];
    return { cell: summary, parts: parts.filter((part): part is ExamplePart => part !== null) };
  }
  return null;
}
