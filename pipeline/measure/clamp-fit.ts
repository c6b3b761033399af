/**
 * The current that answers small steps of the command, fitted as a whole by the circuit it flows through: an access
 * resistance into a membrane (resistance and capacitance in parallel), what is left of the pipette’s own capacitance, the
 * recorder’s filter, and the moment within a sample at which the command changed.
 */
import { type BesselLowPass, besselLowPass } from '../signal/bessel.ts';
import { type LeastSquares, leastSquares, type Prior } from '../signal/least-squares.ts';
import { mean } from '../signal/statistics.ts';
import { indexAt } from './stretches.ts';
import type { Signal } from './types.ts';

/** A step of the command. */
export interface CommandEdge {
  at_s: number;
  mv: number;
  /** Small and long enough to be measured at; others only leave their tail in what follows. */
  used: boolean;
}

/** The circuit as one mV sees it. Conductances in nS (pA/mV), charge per mV in pF. */
export interface ClampFit {
  /** [steady conductance nS, transient conductance nS, ln tau (ms), delay of the edge (ms), fast charge pF, ln corner (kHz)] */
  parameters: number[];
  /** Of those six, scaled so that the residuals have the size they have. */
  covariance: number[][];
  edges: number;
  /** Root-mean-square of the current about the fit, pA, and how many samples make one independent one. */
  noise_pa: number;
  correlated: number;
  /** χ² over its degrees of freedom: 1 where the circuit explains the current. */
  misfit: number;
  /** Root-mean-square of what the circuit leaves of the first milliseconds, as a share of the largest current there. */
  left_over: number;
  /** Corner used or found, kHz; null where the current looks unfiltered. */
  corner_khz: number | null;
  hum_pa: number | null;
  from_s: number;
  to_s: number;
}

/** Priors, all ours. The edge lies between the sample that shows it and the one before, give or take 5 µs. */
const corner_sd = 0.05;
const unknownCorner_sd = 0.8;
/** Pipette capacitance left after neutralization, pF. */
const fast_sd = 4;
/** What filter and command are allowed to differ from the model while the edge passes, as a share of the peak. */
const edgeError = 0.003;

/** How much of a level is looked at before and after an edge, s. */
const longestAfter_s = 0.1;
const longestBefore_s = 0.05;
/** Earlier steps are still felt for this long, s. */
const memory_s = 0.08;

interface Bin {
  /** Time of its samples’ mean, ms, and their length. */
  ms: number;
  width_ms: number;
  value: number;
  count: number;
  episode: number;
  /** ms since the last edge, for weights; negative before the first of the episode. */
  since_ms: number;
  /** Edges that are felt, as a half-open range. */
  first: number;
  last: number;
}

const noFilter: BesselLowPass = {
  impulse: () => 0,
  step: (ms) => (ms >= -1e-7 ? 1 : 0),
  decay: (ms, tau) => (ms >= -1e-7 ? Math.exp(-Math.max(0, ms) / tau) : 0),
  gainOfDecay: () => 1,
  settled_ms: 0,
};

/**
 * @param current pA; unreadable samples are left out, and so are those stuck at the recorder’s limits
 * @param edges in order of time
 * @param filterKhz declared corner of the recorder’s low-pass; null: found from the edge itself
 * @param mainsHz where hum is looked for; null: 50 and 60 Hz
 * @returns null where there is nothing to fit
 */
export function fitClamp(
  current: Signal,
  edges: readonly CommandEdge[],
  filterKhz: number | null,
  mainsHz: number | null,
): ClampFit | null {
  const { samples, spans } = prepared(current, edges);
  if (spans.length === 0) return null;
  const rate_khz = current.rate_hz / 1000;
  const bins = spans.flatMap((span, episode) => binsOf(current, samples, span, episode, edges, filterKhz ?? rate_khz / 4));
  const used = edges.filter((edge) => edge.used).length;
  if (bins.length < 12) return null;

  const calm = noiseBefore(current, samples, edges, filterKhz ?? rate_khz / 3);
  const size = peakOf(bins, edges);
  let noise = { sd: Math.max(calm.sd, 1e-6 * size), correlated: calm.correlated };
  let kept: readonly Bin[] = bins;
  let hums: number[] = [];
  let best: Candidate | null = null;
  for (let pass = 0; pass < 3; pass++) {
    const problem = problemOf(kept, edges, noise, size, filterKhz ?? rate_khz / 4, hums, spans.length);
    best = bestOf(problem, best, filterKhz, rate_khz, size / Math.max(...edges.filter((e) => e.used).map((e) => Math.abs(e.mv))));
    if (!best || pass === 2) break;
    const left = residualsAtRate(current, samples, spans, edges, best, problem);
    noise = { sd: Math.max(left.sd, 1e-6 * size), correlated: left.correlated };
    if (pass === 0) {
      const hum = humIn(left, mainsHz === null ? [50, 60] : [mainsHz]);
      if (hum !== null) hums = [hum];
      // An event that is none of the circuit’s (a synaptic current, a spike) is left out.
      const weighted = weightedResiduals(problem, best);
      const far = bins.filter((bin, k) => Math.abs(weighted[k]!) <= 6 || (bin.since_ms >= 0 && bin.since_ms < 2));
      if (hum === null && far.length >= 0.8 * bins.length) kept = far;
    }
  }
  const covariance = best?.fit.covariance;
  if (!best || !covariance) return null;
  const { fit } = best;
  const freedom = Math.max(1, kept.length - 2 * spans.length - fit.parameters.length);
  const misfit = fit.chi2 / freedom;
  const scale = Math.max(1, misfit);
  const problem = problemOf(kept, edges, noise, size, filterKhz ?? rate_khz / 4, hums, spans.length);
  const weighted = weightedResiduals(problem, best);
  const early = kept.map((bin, k) => ({ bin, left: weighted[k]! * problem.sds[k]! })).filter(({ bin }) => bin.since_ms > 0 && bin.since_ms < 3);
  const excess = early.map(({ left, bin }) => left ** 2 - (noise.sd ** 2 * Math.min(1, noise.correlated)) / bin.count);
  return {
    parameters: fit.parameters.slice(0, 6),
    covariance: covariance.slice(0, 6).map((row) => row.slice(0, 6).map((value) => value * scale)),
    edges: used,
    noise_pa: noise.sd,
    correlated: noise.correlated,
    misfit,
    left_over: size > 0 ? Math.sqrt(Math.max(0, mean(excess) ?? 0)) / size : 0,
    corner_khz: best.filtered ? Math.exp(fit.parameters[5]!) : null,
    hum_pa: hums.length > 0 ? Math.hypot(fit.parameters[6]!, fit.parameters[7]!) : null,
    from_s: spans[0]!.from_s,
    to_s: spans[0]!.to_s,
  };
}

interface Span {
  from_s: number;
  to_s: number;
}

/** Samples without those at the recorder’s limits, and the stretches of pairs of edges, neighbours meeting half-way. */
function prepared(current: Signal, edges: readonly CommandEdge[]): { samples: Float64Array; spans: Span[] } {
  const samples = withoutClipped(current.samples);
  const end = current.start_s + current.samples.length / current.rate_hz;
  const groups: number[][] = [];
  edges.forEach((edge, k) => {
    if (!edge.used) return;
    const last = groups.at(-1);
    const pair = last?.length === 1 && last[0] === k - 1 && edge.mv * edges[k - 1]!.mv < 0;
    if (pair && edge.at_s - edges[k - 1]!.at_s <= longestAfter_s) last!.push(k);
    else groups.push([k]);
  });
  const spans = groups.map((group): Span => {
    const first = group[0]!;
    const last = group.at(-1)!;
    const before = first === 0 ? current.start_s : edges[first - 1]!.at_s;
    // The level before belongs half to the pulse before it, unless that was none.
    const start = first > 0 && edges[first - 1]!.used ? (before + edges[first]!.at_s) / 2 : before + (first > 0 ? 0.003 : 0);
    const after = last + 1 < edges.length ? edges[last + 1]!.at_s : end;
    const next = edges[last + 1];
    const stop = next?.used && group.length > 1 ? (edges[last]!.at_s + after) / 2 : after;
    return {
      from_s: Math.max(start, edges[first]!.at_s - longestBefore_s),
      to_s: Math.min(stop, edges[last]!.at_s + longestAfter_s, end),
    };
  });
  return { samples, spans: spans.filter((span) => span.to_s > span.from_s) };
}

/** Runs of three or more samples at the extreme value are the recorder’s limit, not the current. */
function withoutClipped(samples: Float64Array): Float64Array {
  let low = Number.POSITIVE_INFINITY;
  let high = Number.NEGATIVE_INFINITY;
  for (const value of samples) {
    if (value < low) low = value;
    if (value > high) high = value;
  }
  const out = samples.slice();
  if (!(high > low)) return out;
  for (const limit of [low, high])
    for (let i = 0; i < samples.length; ) {
      let to = i;
      while (to < samples.length && samples[to] === limit) to++;
      // A resting current of a coarse digitizer is an extreme too: only what stands far from the rest is cut off.
      if (to - i >= 3) out.fill(Number.NaN, i, to);
      i = Math.max(to, i + 1);
    }
  const left = out.reduce((sum, value) => sum + (Number.isFinite(value) ? 1 : 0), 0);
  return left > 0.9 * samples.length ? out : samples;
}

/** Samples one by one while the edge passes, then over lengths that grow with the time since it, at most 2 ms. */
function binsOf(
  current: Signal,
  samples: Float64Array,
  span: Span,
  episode: number,
  edges: readonly CommandEdge[],
  corner_khz: number,
): Bin[] {
  const rate = current.rate_hz;
  const from = indexAt(current, span.from_s);
  const to = indexAt(current, span.to_s);
  const starts = edges.map((edge) => indexAt(current, edge.at_s));
  const bins: Bin[] = [];
  const fine_ms = Math.max(0.3, 1.5 / corner_khz);
  const widest = Math.max(1, Math.round(0.002 * rate));
  let i = from;
  while (i < to) {
    let latest = -1;
    while (latest + 1 < starts.length && starts[latest + 1]! <= i) latest++;
    const since = latest < 0 ? Number.POSITIVE_INFINITY : ((i - starts[latest]!) * 1000) / rate;
    const next = Math.min(to, starts[latest + 1] ?? to);
    const grown = Number.isFinite(since) ? Math.floor(((since - 0.5 * fine_ms) / 14 / 1000) * rate) : widest;
    // The last samples before an edge stand alone: the command may have changed between them.
    const clear = next === to ? next - i : next - 1 - i;
    const width = since < fine_ms ? 1 : Math.max(1, Math.min(grown, widest, clear));
    let sum = 0;
    let times = 0;
    let count = 0;
    for (let k = i; k < Math.min(i + width, to); k++)
      if (Number.isFinite(samples[k]!)) {
        sum += samples[k]!;
        times += k;
        count++;
      }
    if (count > 0) {
      const time_s = current.start_s + times / count / rate;
      let first = 0;
      while (first < edges.length && edges[first]!.at_s < Math.min(span.from_s, time_s) - memory_s) first++;
      let last = first;
      while (last < edges.length && edges[last]!.at_s < time_s + 0.001) last++;
      bins.push({
        ms: time_s * 1000,
        width_ms: (width * 1000) / rate,
        value: sum / count,
        count,
        episode,
        since_ms: Number.isFinite(since) && edges[latest]!.at_s >= span.from_s ? since : -1,
        first,
        last,
      });
    }
    i += width;
  }
  return bins;
}

/** Largest change of the current within 3 ms of an edge against the level before, pA. */
function peakOf(bins: readonly Bin[], edges: readonly CommandEdge[]): number {
  let peak = 0;
  for (const edge of edges.filter(({ used }) => used)) {
    const at = edge.at_s * 1000;
    const before = mean(bins.filter((bin) => bin.ms < at - 0.05 && bin.ms > at - 3).map((bin) => bin.value));
    if (before === null) continue;
    for (const bin of bins)
      if (bin.ms >= at - 0.05 && bin.ms < at + 3) peak = Math.max(peak, Math.abs(bin.value - before));
  }
  return peak;
}

interface Noise {
  sd: number;
  /** Samples that make one independent one: 1 + 2·Σ of the autocorrelation. */
  correlated: number;
}

/** Of the level before the first step used, a straight line taken out. */
function noiseBefore(
  current: Signal,
  samples: Float64Array,
  edges: readonly CommandEdge[],
  corner_khz: number,
): Noise {
  const k = edges.findIndex((edge) => edge.used);
  const to = indexAt(current, edges[k]!.at_s) - 1;
  const start = k === 0 ? 0 : indexAt(current, (edges[k - 1]!.at_s + edges[k]!.at_s) / 2);
  const from = Math.max(start, to - Math.round(longestBefore_s * current.rate_hz));
  return noiseOf([samples.subarray(from, Math.max(from, to))], lagsOf(current.rate_hz, corner_khz));
}

const lagsOf = (rate: number, corner_khz: number): number =>
  Math.max(2, Math.min(200, Math.ceil((0.8 * rate) / 1000 / corner_khz)));

/** Each stretch less its own line. */
function noiseOf(stretches: readonly Float64Array[], lags: number): Noise {
  let squares = 0;
  let n = 0;
  const products = new Float64Array(lags + 1);
  for (const stretch of stretches) {
    const flat = withoutLine(stretch);
    for (let i = 0; i < flat.length; i++) {
      if (!Number.isFinite(flat[i]!)) continue;
      squares += flat[i]! ** 2;
      n++;
      for (let lag = 1; lag <= lags && lag <= i; lag++)
        if (Number.isFinite(flat[i - lag]!)) products[lag]! += flat[i]! * flat[i - lag]!;
    }
  }
  if (n < 3 || squares === 0) return { sd: 0, correlated: 1 };
  let correlated = 1;
  for (let lag = 1; lag <= lags; lag++) correlated += (2 * products[lag]!) / squares;
  return { sd: Math.sqrt(squares / Math.max(1, n - 2 * stretches.length)), correlated: Math.max(0.7, correlated) };
}

function withoutLine(values: Float64Array): Float64Array {
  let n = 0;
  let sx = 0;
  let sy = 0;
  for (let i = 0; i < values.length; i++)
    if (Number.isFinite(values[i]!)) {
      n++;
      sx += i;
      sy += values[i]!;
    }
  if (n < 3) return new Float64Array(0);
  const [mx, my] = [sx / n, sy / n];
  let sxx = 0;
  let sxy = 0;
  for (let i = 0; i < values.length; i++)
    if (Number.isFinite(values[i]!)) {
      sxx += (i - mx) ** 2;
      sxy += (i - mx) * (values[i]! - my);
    }
  return values.map((value, i) => value - my - (sxy / sxx) * (i - mx));
}

interface Problem {
  bins: readonly Bin[];
  edges: readonly CommandEdge[];
  sds: Float64Array;
  /** Two orthonormal vectors an episode: its offset and its slope, weighted. */
  lines: { from: number; to: number; a: Float64Array; b: Float64Array }[];
  hums: readonly number[];
}

function problemOf(
  bins: readonly Bin[],
  edges: readonly CommandEdge[],
  noise: Noise,
  size: number,
  corner_khz: number,
  hums: readonly number[],
  episodes: number,
): Problem {
  const sds = Float64Array.from(bins, (bin) =>
    Math.sqrt(
      (noise.sd ** 2 * noise.correlated) / bin.count +
        (bin.since_ms >= 0 && bin.since_ms < 2.5 / corner_khz ? edgeError * size : 1e-6 * size) ** 2,
    ),
  );
  const lines = Array.from({ length: episodes }, (_, episode) => {
    const from = bins.findIndex((bin) => bin.episode === episode);
    if (from < 0) return { from: 0, to: 0, a: new Float64Array(0), b: new Float64Array(0) };
    let to = from;
    while (to < bins.length && bins[to]!.episode === episode) to++;
    const a = sds.slice(from, to).map((sd) => 1 / sd);
    normalize(a);
    const b = Float64Array.from({ length: to - from }, (__, k) => (bins[from + k]!.ms - bins[from]!.ms) / sds[from + k]!);
    takeOut(b, a);
    normalize(b);
    return { from, to, a, b };
  });
  return { bins, edges, sds, lines, hums };
}

function normalize(v: Float64Array): void {
  let sum = 0;
  for (const value of v) sum += value * value;
  const scale = sum > 1e-300 ? 1 / Math.sqrt(sum) : 0;
  for (let i = 0; i < v.length; i++) v[i]! *= scale;
}
function takeOut(v: Float64Array, unit: Float64Array): void {
  let sum = 0;
  for (let i = 0; i < v.length; i++) sum += v[i]! * unit[i]!;
  for (let i = 0; i < v.length; i++) v[i]! -= sum * unit[i]!;
}

/** What the circuit makes of the command at one time, pA, without the level it stands on. */
function modelAt(
  ms: number,
  width_ms: number,
  first: number,
  last: number,
  edges: readonly CommandEdge[],
  p: readonly number[],
  filter: BesselLowPass,
  hums: readonly number[],
): number {
  const tau = Math.exp(p[2]!);
  let sum = 0;
  for (let e = first; e < last; e++) {
    const t = ms - edges[e]!.at_s * 1000 - p[3]!;
    if (t < -1e-6) continue;
    const own =
      t > filter.settled_ms
        ? p[0]! + (t < 30 * tau ? p[1]! * filter.gainOfDecay(tau) * Math.exp(-Math.max(0, t) / tau) : 0)
        : p[0]! * filter.step(t) + p[1]! * filter.decay(t, tau) + p[4]! * filter.impulse(t);
    sum += own * edges[e]!.mv;
  }
  hums.forEach((hz, k) => {
    const half = (Math.PI * hz * width_ms) / 1000;
    const loss = half > 1e-6 ? Math.sin(half) / half : 1;
    const angle = (2 * Math.PI * hz * ms) / 1000;
    sum += loss * (p[6 + 2 * k]! * Math.sin(angle) + p[7 + 2 * k]! * Math.cos(angle));
  });
  return sum;
}

interface Candidate {
  fit: LeastSquares;
  filtered: boolean;
}

const filterOf = (p: readonly number[], filtered: boolean): BesselLowPass =>
  filtered ? besselLowPass(Math.exp(p[5]!)) : noFilter;

function weightedResiduals(problem: Problem, { fit, filtered }: Candidate): Float64Array {
  return residualsOf(problem, fit.parameters, filtered);
}

function residualsOf(problem: Problem, p: readonly number[], filtered: boolean): Float64Array {
  const { bins, edges, sds, lines, hums } = problem;
  const filter = filterOf(p, filtered);
  const r = new Float64Array(bins.length);
  for (let k = 0; k < bins.length; k++) {
    const bin = bins[k]!;
    r[k] = (modelAt(bin.ms, bin.width_ms, bin.first, bin.last, edges, p, filter, hums) - bin.value) / sds[k]!;
  }
  for (const { from, to, a, b } of lines) {
    const part = r.subarray(from, to);
    takeOut(part, a);
    takeOut(part, b);
  }
  return r;
}

/** From several first guesses the fit of least cost; from the pass before, where there is one. */
function bestOf(
  problem: Problem,
  before: Candidate | null,
  filterKhz: number | null,
  rate_khz: number,
  peak_ns: number,
): Candidate | null {
  const interval = 1 / rate_khz;
  const hums = problem.hums.flatMap(() => [0, 0]);
  const scale = Math.max(peak_ns, 1e-3);
  const run = (start: number[], filtered: boolean, most: number): Candidate => {
    const corner: Prior =
      filterKhz === null
        ? { mean: Math.log(rate_khz / 4), sd: unknownCorner_sd }
        : { mean: Math.log(filterKhz), sd: corner_sd };
    const priors: Prior[] = [
      { mean: 0, sd: Number.POSITIVE_INFINITY },
      { mean: 0, sd: Number.POSITIVE_INFINITY },
      { mean: 0, sd: 2 },
      { mean: filtered ? -0.25 * interval : 0, sd: Math.hypot(0.3 * interval, 0.005) },
      { mean: 0, sd: filtered ? fast_sd : 1e-6 },
      corner,
      ...hums.map(() => ({ mean: 0, sd: Number.POSITIVE_INFINITY })),
    ];
    const wide = [-1e9, 1e9] as const;
    const bounds = [
      wide,
      wide,
      [Math.log(0.01), Math.log(100)] as const,
      filtered ? ([-2 * interval - 0.1, interval + 0.2] as const) : ([-interval, 0] as const),
      wide,
      [Math.log(0.2), Math.log(Math.max(2 * rate_khz, 2 * (filterKhz ?? 0)))] as const,
      ...hums.map(() => wide),
    ];
    const steps = [1e-4 * scale, 1e-4 * scale, 1e-4, 1e-4, 1e-3, 1e-4, ...hums.map(() => 1e-2)];
    const fit = leastSquares((p) => residualsOf(problem, p, filtered), start, steps, priors, bounds, most);
    return { fit, filtered };
  };
  const cheapest = (candidates: Candidate[]): Candidate =>
    candidates.reduce((best, one) => (one.fit.cost < best.fit.cost ? one : best));
  if (before) {
    const start = [...before.fit.parameters.slice(0, 6), ...(hums.length > 0 ? hums : [])];
    return run(start, before.filtered, 40);
  }
  const corners = filterKhz === null ? [rate_khz / 8, rate_khz / 3] : [filterKhz];
  const starts = [0.15, 0.6, 2.5].flatMap((tau) =>
    corners.map((corner) => [0.1 * scale, 0.9 * scale, Math.log(tau), -0.25 * interval, 0, Math.log(corner), ...hums]),
  );
  const filtered = starts.map((start) => run(start, true, 12));
  const unfiltered =
    filterKhz === null
      ? [0.15, 0.6, 2.5].map((tau) =>
          run([0.1 * scale, 0.9 * scale, Math.log(tau), 0, 0, Math.log(rate_khz / 4), ...hums], false, 12),
        )
      : [];
  const first = cheapest([...filtered, ...unfiltered]);
  return run(first.fit.parameters, first.filtered, 40);
}

interface Residuals extends Noise {
  stretches: { ms: Float64Array; values: Float64Array }[];
}

/** What the fit leaves of the samples themselves, edges left out. */
function residualsAtRate(
  current: Signal,
  samples: Float64Array,
  spans: readonly Span[],
  edges: readonly CommandEdge[],
  candidate: Candidate,
  problem: Problem,
): Residuals {
  const p = candidate.fit.parameters;
  const filter = filterOf(p, candidate.filtered);
  const corner = candidate.filtered ? Math.exp(p[5]!) : current.rate_hz / 1000;
  const stretches: Residuals['stretches'] = [];
  for (const span of spans) {
    const inside = edges.filter((edge) => edge.at_s >= span.from_s && edge.at_s < span.to_s).map((edge) => edge.at_s);
    const bounds = [span.from_s, ...inside.flatMap((at) => [at - 0.0002, at + 0.0005 + 2.5e-3 / corner]), span.to_s];
    for (let k = 0; k + 1 < bounds.length; k += 2) {
      const from = indexAt(current, bounds[k]!);
      const to = indexAt(current, bounds[k + 1]!);
      if (to - from < 5) continue;
      const ms = Float64Array.from({ length: to - from }, (_, i) => (current.start_s + (from + i) / current.rate_hz) * 1000);
      let first = 0;
      while (first < edges.length && edges[first]!.at_s < Math.min(span.from_s, bounds[k]!) - memory_s) first++;
      let last = first;
      while (last < edges.length && edges[last]!.at_s < bounds[k + 1]!) last++;
      const values = ms.map(
        (time, i) => samples[from + i]! - modelAt(time, 0, first, last, edges, p, filter, problem.hums),
      );
      stretches.push({ ms, values });
    }
  }
  const noise = noiseOf(
    stretches.map(({ values }) => values),
    lagsOf(current.rate_hz, Math.min(corner, current.rate_hz / 2000)),
  );
  return { ...noise, stretches };
}

/** The mains frequency whose sine stands out of the residuals by more than five standard errors; null for none. */
function humIn({ stretches, sd, correlated }: Residuals, candidates: readonly number[]): number | null {
  let best: { hz: number; ratio: number } | null = null;
  for (const hz of candidates) {
    let [ss, cc, sc, ys, yc, n] = [0, 0, 0, 0, 0, 0];
    for (const { ms, values } of stretches) {
      const level = mean(values) ?? 0;
      for (let i = 0; i < values.length; i++) {
        if (!Number.isFinite(values[i]!)) continue;
        const angle = (2 * Math.PI * hz * ms[i]!) / 1000;
        const [s, c] = [Math.sin(angle), Math.cos(angle)];
        ss += s * s;
        cc += c * c;
        sc += s * c;
        ys += (values[i]! - level) * s;
        yc += (values[i]! - level) * c;
        n++;
      }
    }
    const determinant = ss * cc - sc * sc;
    // Less than one and a half periods cannot tell hum from drift.
    const seconds = stretches.reduce((sum, { ms }) => sum + (ms.at(-1)! - ms[0]!) / 1000, 0);
    if (!(determinant > 0) || seconds * hz < 1.5) continue;
    const a = (ys * cc - yc * sc) / determinant;
    const b = (yc * ss - ys * sc) / determinant;
    const amplitude = Math.hypot(a, b);
    const white = Math.sqrt(Math.max(0, sd ** 2 - amplitude ** 2 / 2));
    const ratio = amplitude / (white * Math.sqrt((2 * Math.min(correlated, 20)) / n) + 1e-12);
    if (ratio > 5 && (!best || ratio > best.ratio)) best = { hz, ratio };
  }
  return best?.hz ?? null;
}

