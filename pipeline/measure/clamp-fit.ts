/**
 * The current that answers small steps of the command, fitted as a whole by the circuit it flows through: an access
 * resistance into a membrane (resistance and capacitance in parallel), what is left of the pipette’s own capacitance, the
 * recorder’s filter, and the moment within a sample at which the command changed.
 */
import { besselLowPass, type FilteredStep, type LowPass, noLowPass } from '../signal/bessel.ts';
import { type Evaluation, type LeastSquares, leastSquares, type Prior } from '../signal/least-squares.ts';
import { clippedRuns } from '../signal/runs.ts';
import { countFinite, mean } from '../signal/statistics.ts';
import { indexAt } from './stretches.ts';
import type { Signal } from './types.ts';

/** A step of the command. */
export interface CommandEdge {
  at_s: number;
  mv: number;
  /** Small and long enough to be measured at; others only leave their tail in what follows. */
  used: boolean;
}

export interface Estimate {
  value: number;
  /** Standard uncertainty. */
  se: number;
}

/** The circuit that explains the current best, averaged over the moments at which the command may have changed. */
export interface ClampFit {
  access_mohm: Estimate;
  membrane_mohm: Estimate;
  total_mohm: Estimate;
  membrane_pf: Estimate;
  /** 1/(R_a + R_m), nS. */
  steady_ns: Estimate;
  /** Charge of the exponential transient over the step, and with that of the pipette, pF. */
  slow_pf: Estimate;
  whole_pf: Estimate;
  tau_ms: Estimate;
  /** Edges measured at. */
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
const edgeAt = (interval_ms: number): Prior => ({
  mean: 0.008 - 0.2 * interval_ms,
  sd: Math.hypot(0.3 * interval_ms, 0.012),
});
const corner_sd = 0.1;
const unknownCorner_sd = 0.8;
/** Pipette capacitance left after neutralization, pF. */
const fast_sd = 2.5;
/** What filter and command are allowed to differ from the model while the edge passes, as a share of the peak. */
const edgeError = 0.015;
/** Later it fades, by this share per period of the corner after the first ones, to this. */
const slowestEdge = 1.5;
const edgeErrorFloor = 1e-4;

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
  const bins = spans.flatMap((span, episode) =>
    binsOf(current, samples, span, episode, edges, filterKhz ?? rate_khz / 4),
  );
  const used = edges.filter((edge) => edge.used).length;
  if (bins.length < 12) return null;

  const calm = noiseBefore(current, samples, edges, filterKhz ?? rate_khz / 3);
  const size = peakOf(bins, edges);
  let noise = { sd: Math.max(calm.sd, 1e-6 * size), correlated: calm.correlated };
  let kept: readonly Bin[] = bins;
  let hums: number[] = [];
  let best: Candidate | null = null;
  const cornerOf = (found: Candidate | null): number => {
    const first = filterKhz ?? rate_khz / 4;
    return found?.filtered ? Math.min(first, Math.exp(found.fit.parameters[5]!)) : first;
  };
  for (let pass = 0; pass < 3; pass++) {
    const problem = problemOf(kept, edges, noise, size, cornerOf(best), hums, spans.length);
    best = bestOf(
      problem,
      best,
      filterKhz,
      rate_khz,
      size / Math.max(...edges.filter((e) => e.used).map((e) => Math.abs(e.mv))),
    );
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
  if (!best) return null;
  const problem = problemOf(kept, edges, noise, size, cornerOf(best), hums, spans.length);
  const nodes = best.filtered ? acrossMoments(problem, best, filterKhz, rate_khz) : [{ fit: best.fit, weight: 1 }];
  const solid = nodes.filter(({ fit }) => fit.covariance !== null);
  if (solid.length === 0) return null;
  const top = solid.reduce((a, b) => (b.weight > a.weight ? b : a)).fit;
  const freedom = Math.max(1, kept.length - 2 * problem.lines.length - top.parameters.length);
  const misfit = top.chi2 / freedom;
  const scale = Math.max(1, misfit);
  const weighted = evaluated(problem, top.parameters, best.filtered, false).residuals;
  // What noise alone leaves there, and three standard errors of it, are taken off.
  let [early, squares, byNoise, spread] = [0, 0, 0, 0];
  kept.forEach((bin, k) => {
    if (!(bin.since_ms > 0 && bin.since_ms < 3)) return;
    const own = (noise.sd ** 2 * Math.max(1, noise.correlated)) / bin.count;
    early++;
    squares += (weighted[k]! * problem.sds[k]!) ** 2;
    byNoise += own;
    spread += 2 * own ** 2;
  });
  const excess = early === 0 ? 0 : (squares - byNoise - 3 * Math.sqrt(spread)) / early;
  const over = (f: (p: readonly number[]) => number): Estimate => averaged(solid, f, scale);
  return {
    access_mohm: over(access),
    membrane_mohm: over((p) => total(p) - access(p)),
    total_mohm: over(total),
    membrane_pf: over(membranePf),
    steady_ns: over((p) => p[0]!),
    slow_pf: over((p) => p[1]! * Math.exp(p[2]!)),
    whole_pf: over((p) => p[1]! * Math.exp(p[2]!) + p[4]!),
    tau_ms: over((p) => Math.exp(p[2]!)),
    edges: used,
    noise_pa: noise.sd,
    correlated: noise.correlated,
    misfit,
    left_over: size > 0 ? Math.sqrt(Math.max(0, excess)) / size : 0,
    corner_khz: best.filtered ? Math.exp(top.parameters[5]!) : null,
    hum_pa: hums.length > 0 ? Math.hypot(top.parameters[6]!, top.parameters[7]!) : null,
    from_s: spans[0]!.from_s,
    to_s: spans[0]!.to_s,
  };
}

/** The circuit's elements as functions of [steady nS, transient nS, ln tau, …]: MΩ and pF. */
const access = (p: readonly number[]): number => 1000 / (p[0]! + p[1]!);
const total = (p: readonly number[]): number => 1000 / p[0]!;
/** tau = C·R_a·R_m/(R_a + R_m); ms/MΩ is nF. Where no steady current flows the membrane is closed. */
const membranePf = (p: readonly number[]): number => {
  const closed = p[0]! > 0 ? (total(p) - access(p)) / total(p) : 1;
  return (1000 * Math.exp(p[2]!)) / (access(p) * closed);
};

interface Node {
  fit: LeastSquares;
  weight: number;
}

/**
 * A function of the parameters over all nodes: its mean, and the root of the mean variance within them (law of
 * propagation, GUM, JCGM 100:2008, 5.2) and the variance among them.
 */
function averaged(nodes: readonly Node[], f: (p: readonly number[]) => number, scale: number): Estimate {
  const parts = nodes.map(({ fit, weight }) => {
    const p = fit.parameters;
    const gradient = p.map((one, k) => {
      const step = 1e-5 * Math.max(Math.abs(one), 1e-3);
      return (f(p.with(k, one + step)) - f(p.with(k, one - step))) / (2 * step);
    });
    let variance = 0;
    for (let j = 0; j < p.length; j++)
      for (let k = 0; k < p.length; k++) variance += gradient[j]! * gradient[k]! * fit.covariance![j]![k]!;
    return { value: f(p), variance: scale * Math.max(0, variance), weight };
  });
  const all = parts.reduce((sum, part) => sum + part.weight, 0);
  const value = parts.reduce((sum, part) => sum + part.weight * part.value, 0) / all;
  const variance =
    parts.reduce((sum, part) => sum + part.weight * (part.variance + (part.value - value) ** 2), 0) / all;
  return { value, se: Math.sqrt(variance) };
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
    const start =
      first > 0 && edges[first - 1]!.used ? (before + edges[first]!.at_s) / 2 : before + (first > 0 ? 0.003 : 0);
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

/** Without the runs at the recorder's limits; as it is where these would be a tenth of it. */
function withoutClipped(samples: Float64Array): Float64Array {
  const out = samples.slice();
  for (const { from, to } of clippedRuns(samples)) out.fill(Number.NaN, from, to);
  return countFinite(out) > 0.9 * samples.length ? out : samples;
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
function noiseBefore(current: Signal, samples: Float64Array, edges: readonly CommandEdge[], corner_khz: number): Noise {
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

/** Share of the peak by which the model may be wrong, at a time after the edge in periods of the corner. */
const modelError = (periods: number, edges: number): number =>
  edgeErrorFloor + (periods < 0 ? 0 : edgeError * Math.sqrt(edges) * Math.exp(-Math.max(0, periods - slowestEdge) * 2));

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
  // An error of the model repeats at every edge: more edges do not average it away.
  const used = edges.filter((edge) => edge.used).length;
  const sds = Float64Array.from(bins, (bin) =>
    Math.sqrt(
      (noise.sd ** 2 * noise.correlated) / bin.count + (size * modelError(bin.since_ms * corner_khz, used)) ** 2,
    ),
  );
  const lines = Array.from({ length: episodes }, (_, episode) => {
    const from = bins.findIndex((bin) => bin.episode === episode);
    if (from < 0) return { from: 0, to: 0, a: new Float64Array(0), b: new Float64Array(0) };
    let to = from;
    while (to < bins.length && bins[to]!.episode === episode) to++;
    const a = sds.slice(from, to).map((sd) => 1 / sd);
    normalize(a);
    const b = Float64Array.from(
      { length: to - from },
      (__, k) => (bins[from + k]!.ms - bins[from]!.ms) / sds[from + k]!,
    );
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

/**
 * What the circuit makes of the command at one time, pA, without the level it stands on, and its derivatives by the
 * parameters (`into`, where given).
 */
function modelAt(
  at: Pick<Bin, 'ms' | 'width_ms' | 'first' | 'last'>,
  edges: readonly CommandEdge[],
  p: readonly number[],
  filter: LowPass,
  hums: readonly number[],
  into?: Float64Array,
): number {
  const tau = Math.exp(p[2]!);
  let sum = 0;
  into?.fill(0);
  for (let e = at.first; e < at.last; e++) {
    const t = at.ms - edges[e]!.at_s * 1000 - p[3]!;
    filter.at(t, tau, response);
    if (response.step === 0) continue;
    const { mv } = edges[e]!;
    const { step, decay, impulse, impulseSlope, decayByLogTau } = response;
    sum += (p[0]! * step + p[1]! * decay + p[4]! * impulse) * mv;
    if (!into) continue;
    const decaySlope = impulse - decay / tau;
    into[0]! += step * mv;
    into[1]! += decay * mv;
    into[2]! += p[1]! * decayByLogTau * mv;
    into[3]! -= (p[0]! * impulse + p[1]! * decaySlope + p[4]! * impulseSlope) * mv;
    into[4]! += impulse * mv;
    // All depend on corner · t and corner · tau alone, the impulse on a factor of the corner besides.
    into[5]! +=
      (p[0]! * t * impulse + p[1]! * (t * decaySlope + decayByLogTau) + p[4]! * (impulse + t * impulseSlope)) * mv;
  }
  hums.forEach((hz, k) => {
    const half = (Math.PI * hz * at.width_ms) / 1000;
    const loss = half > 1e-6 ? Math.sin(half) / half : 1;
    const angle = (2 * Math.PI * hz * at.ms) / 1000;
    const [s, c] = [loss * Math.sin(angle), loss * Math.cos(angle)];
    sum += p[6 + 2 * k]! * s + p[7 + 2 * k]! * c;
    if (into) {
      into[6 + 2 * k] = s;
      into[7 + 2 * k] = c;
    }
  });
  return sum;
}
const response: FilteredStep = { impulse: 0, impulseSlope: 0, step: 0, decay: 0, decayByLogTau: 0 };

interface Candidate {
  fit: LeastSquares;
  filtered: boolean;
}

const filterOf = (p: readonly number[], filtered: boolean): LowPass =>
  filtered ? besselLowPass(Math.exp(p[5]!)) : noLowPass;

function weightedResiduals(problem: Problem, { fit, filtered }: Candidate): Float64Array {
  return evaluated(problem, fit.parameters, filtered, false).residuals;
}

/** Weighted residuals with each episode's offset and slope projected out, and likewise their derivatives. */
function evaluated(problem: Problem, p: readonly number[], filtered: boolean, derivatives: boolean): Evaluation {
  const { bins, edges, sds, lines, hums } = problem;
  const filter = filterOf(p, filtered);
  const residuals = new Float64Array(bins.length);
  const columns = derivatives ? p.map(() => new Float64Array(bins.length)) : null;
  const own = derivatives ? new Float64Array(p.length) : undefined;
  for (let k = 0; k < bins.length; k++) {
    residuals[k] = (modelAt(bins[k]!, edges, p, filter, hums, own) - bins[k]!.value) / sds[k]!;
    if (own && columns) for (let j = 0; j < own.length; j++) columns[j]![k] = own[j]! / sds[k]!;
  }
  for (const { from, to, a, b } of lines)
    for (const vector of [residuals, ...(columns ?? [])]) {
      const part = vector.subarray(from, to);
      takeOut(part, a);
      takeOut(part, b);
    }
  return { residuals, columns };
}

/** One fit from one first guess; `moment`, ms, holds the edge where it is said to be. */
function fitFrom(
  problem: Problem,
  start: readonly number[],
  filterKhz: number | null,
  rate_khz: number,
  filtered: boolean,
  most: number,
  moment?: number,
): LeastSquares {
  const interval = 1 / rate_khz;
  const hums = problem.hums.flatMap(() => [0, 0]);
  const free: Prior = { mean: 0, sd: Number.POSITIVE_INFINITY };
  const corner: Prior =
    filterKhz === null
      ? { mean: Math.log(rate_khz / 4), sd: unknownCorner_sd }
      : { mean: Math.log(filterKhz), sd: corner_sd };
  const edge = filtered ? edgeAt(interval) : { ...edgeAt(interval), mean: 0 };
  const priors: Prior[] = [
    free,
    free,
    { mean: 0, sd: 2 },
    moment === undefined ? edge : { mean: moment, sd: 1e-7 },
    { mean: 0, sd: filtered ? fast_sd : 1e-6 },
    corner,
    ...hums.map(() => free),
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
  return leastSquares((p, derivatives) => evaluated(problem, p, filtered, derivatives), start, priors, bounds, most);
}

/** From several first guesses the fit of least cost; from the pass before, where there is one. */
function bestOf(
  problem: Problem,
  before: Candidate | null,
  filterKhz: number | null,
  rate_khz: number,
  peak_ns: number,
): Candidate | null {
  const hums = problem.hums.flatMap(() => [0, 0]);
  const scale = Math.max(peak_ns, 1e-3);
  const run = (start: readonly number[], filtered: boolean, most: number): Candidate => ({
    fit: fitFrom(problem, start, filterKhz, rate_khz, filtered, most),
    filtered,
  });
  const cheapest = (candidates: Candidate[]): Candidate =>
    candidates.reduce((best, one) => (one.fit.cost < best.fit.cost ? one : best));
  if (before) return run([...before.fit.parameters.slice(0, 6), ...hums], before.filtered, 20);
  const corners = filterKhz === null ? [rate_khz / 8, rate_khz / 3] : [filterKhz];
  const at = edgeAt(1 / rate_khz).mean;
  const guess = (tau: number, corner: number, moment: number, fast: number): number[] => [
    0.1 * scale,
    0.9 * scale,
    Math.log(tau),
    moment,
    fast,
    Math.log(corner),
    ...hums,
  ];
  const taus = [0.15, 0.6, 2.5];
  const filtered = taus.flatMap((tau) => corners.map((corner) => run(guess(tau, corner, at, 0), true, 10)));
  const unfiltered = filterKhz === null ? taus.map((tau) => run(guess(tau, rate_khz / 4, 0, 0), false, 10)) : [];
  const first = cheapest([...filtered, ...unfiltered]);
  return run(first.fit.parameters, first.filtered, 20);
}

/**
 * When within a sample the command changed, and how much fast charge the pipette took, look alike: a later edge is a
 * smaller charge. The fit is therefore made at nine moments across what is known of it, each weighted by how well it
 * explains the current (Laplace’s approximation to the marginal likelihood), with moments between them interpolated.
 */
function acrossMoments(problem: Problem, best: Candidate, filterKhz: number | null, rate_khz: number): Node[] {
  const { mean: centre, sd } = edgeAt(1 / rate_khz);
  const spread = [-2.4, -1.8, -1.2, -0.6, 0, 0.6, 1.2, 1.8, 2.4];
  const logs: { fit: LeastSquares; log: number; moment: number }[] = [];
  // From the middle outwards, each from its neighbour.
  const middle = 4;
  const order = [4, 3, 2, 1, 0, 5, 6, 7, 8];
  const fits = new Map<number, LeastSquares>();
  for (const k of order) {
    const moment = centre + spread[k]! * sd;
    const neighbour = k === middle ? best.fit : fits.get(k < middle ? k + 1 : k - 1)!;
    const start = neighbour.parameters.with(3, moment);
    // A later edge leaves more of the charge to the pipette.
    if (k === middle) start[4] = Math.max(-5, Math.min(10, start[4]!));
    start[4] = start[4]! + (moment - neighbour.parameters[3]!) * (start[0]! + start[1]!);
    const fit = fitFrom(problem, start, filterKhz, rate_khz, true, 30, moment);
    fits.set(k, fit);
  }
  spread.forEach((z, k) => {
    const fit = fits.get(k)!;
    const determinant = fit.covariance ? logDeterminant(fit.covariance) : Number.NaN;
    if (Number.isFinite(determinant))
      logs.push({ fit, log: -0.5 * (fit.cost + z * z) + 0.5 * determinant, moment: centre + z * sd });
  });
  if (logs.length === 0) return [];
  const highest = Math.max(...logs.map(({ log }) => log));
  return logs.map(({ fit, log }) => ({ fit, weight: Math.exp(log - highest) }));
}

function logDeterminant(covariance: readonly (readonly number[])[]): number {
  // By elimination, rows scaled to a unit diagonal first.
  const n = covariance.length;
  const scale = covariance.map((row, k) => Math.sqrt(row[k]!));
  const m = covariance.map((row, j) => row.map((value, k) => value / (scale[j]! * scale[k]!)));
  let log = 0;
  for (let k = 0; k < n; k++) {
    if (!(m[k]![k]! > 0)) return Number.NaN;
    log += Math.log(m[k]![k]!) + 2 * Math.log(scale[k]!);
    for (let j = k + 1; j < n; j++) {
      const factor = m[j]![k]! / m[k]![k]!;
      for (let i = k; i < n; i++) m[j]![i]! -= factor * m[k]![i]!;
    }
  }
  return log;
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
      const ms = Float64Array.from(
        { length: to - from },
        (_, i) => (current.start_s + (from + i) / current.rate_hz) * 1000,
      );
      let first = 0;
      while (first < edges.length && edges[first]!.at_s < Math.min(span.from_s, bounds[k]!) - memory_s) first++;
      let last = first;
      while (last < edges.length && edges[last]!.at_s < bounds[k + 1]!) last++;
      const values = ms.map(
        (time, i) =>
          samples[from + i]! - modelAt({ ms: time, width_ms: 0, first, last }, edges, p, filter, problem.hums),
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
