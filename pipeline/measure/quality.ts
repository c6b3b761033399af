import { bandPass } from '../signal/butterworth.ts';
import { clippedRuns, quantum } from '../signal/runs.ts';
import {
  keptByMeans,
  noiseBeside,
  type Piece,
  type PiecesFit,
  sineInPieces,
  sineInPiecesNear,
  withoutSine,
} from '../signal/sine-pieces.ts';
import { countFinite, meanWithin, median } from '../signal/statistics.ts';
import { absent, measured } from './reading.ts';
import { type Stretch, timeAt } from './stretches.ts';
import type { Reading, Readings, Signal } from './types.ts';

const total = (stretches: readonly Stretch[]): number => stretches.reduce((sum, one) => sum + one.to - one.from, 0);

/** Share of samples that could not be read. */
export function missingFraction(signal: Signal): Reading {
  const n = signal.samples.length;
  return n === 0 ? absent('sweep-too-short') : measured(1 - countFinite(signal.samples) / n, { n });
}

/** So many equal samples in a row away from the limits mean a trace without noise. */
const restsFrom = 50;

/**
 * Stretches stuck at the recorder's upper or lower limit. Equal samples at an extreme are no proof of it: noise on a
 * coarse digitizer repeats a value now and then, and a quiet trace rests on one. They count where the trace jumps to
 * the limit and away from it, as a clipped spike does, or where they last far longer than equal samples do elsewhere;
 * and where there are at least five of them at that limit.
 */
export function stuckStretches(samples: Float64Array): Stretch[] {
  const runs = clippedRuns(samples);
  if (runs.length === 0) return [];
  const least = typicalStep(samples);
  return (['top', 'bottom'] as const).flatMap((at) => {
    const here = runs.filter((run) => run.at === at);
    if (here.length === 0) return [];
    const repeat = longestRepeat(samples, samples[here[0]!.from]!);
    // A trace that rests on one value elsewhere too has no noise, and its plateaus prove nothing.
    const ordinary = repeat < restsFrom ? repeat : Number.POSITIVE_INFINITY;
    const own = here
      .filter((run) => smallerJump(samples, run) > 5 * least || run.to - run.from > 2 * ordinary)
      .map(({ from, to }) => ({ from, to }));
    return total(own) >= 5 ? own : [];
  });
}

/** The smaller of the jumps into and out of a run; at an end of the trace the one there is. */
function smallerJump(samples: Float64Array, run: Stretch): number {
  const level = samples[run.from]!;
  const jumps = [samples[run.from - 1], samples[run.to]].flatMap((value) =>
    value === undefined || !Number.isFinite(value) ? [] : [Math.abs(value - level)],
  );
  return jumps.length === 0 ? 0 : Math.min(...jumps);
}

/** Longest run of samples at any level but one that are equal within rounding. */
function longestRepeat(samples: Float64Array, except: number): number {
  let reach = 0;
  for (const value of samples) reach = Math.max(reach, Number.isFinite(value) ? Math.abs(value - except) : 0);
  const rounding = 1e-9 * reach;
  let longest = 1;
  let length = 1;
  for (let i = 1; i < samples.length; i++) {
    const same = Math.abs(samples[i]! - samples[i - 1]!) <= rounding;
    length = same && samples[i] !== except ? length + 1 : 1;
    if (length > longest) longest = length;
  }
  return longest;
}

/** Median of the differences between neighbouring samples that differ: what the trace ordinarily moves by. */
function typicalStep(samples: Float64Array): number {
  const stride = Math.max(1, Math.floor(samples.length / 10000));
  const moves: number[] = [];
  for (let i = 1; i < samples.length; i += stride) {
    const move = Math.abs(samples[i]! - samples[i - 1]!);
    if (move > 0) moves.push(move);
  }
  return median(moves) ?? 0;
}

/** Share of samples stuck at the recorder's upper or lower limit; `at` is the longest such run. */
export function clippedFraction(signal: Signal): Reading {
  const { samples } = signal;
  if (samples.length === 0) return absent('sweep-too-short');
  if (countFinite(samples) === 0) return absent('unreadable');
  const runs = stuckStretches(samples);
  const stuck = total(runs);
  const longest = runs.toSorted((a, b) => b.to - b.from - (a.to - a.from))[0];
  return measured(stuck / samples.length, {
    n: samples.length,
    ...(longest ? { at: { from_s: timeAt(signal, longest.from), to_s: timeAt(signal, longest.to) } } : {}),
  });
}

/** Step of the digitizer from at most 60 000 samples spread over the sweep. */
export function digitizerStep(signal: Signal): Reading {
  const { samples } = signal;
  if (countFinite(samples) < 3) return absent(samples.length < 3 ? 'sweep-too-short' : 'unreadable');
  const part = 20000;
  const some =
    samples.length <= 3 * part
      ? samples
      : Float64Array.from({ length: 3 * part }, (_, i) => {
          const start = Math.floor((Math.floor(i / part) * (samples.length - part)) / 2);
          return samples[start + (i % part)]!;
        });
  const step = quantum(some);
  return step === null ? absent('unresolved', { note: 'the values lie on no common grid' }) : measured(step);
}

export const sampleInterval = (signal: Signal): Reading => measured(1e6 / signal.rate_hz);

const kilohertz = (hz: number): string => `${Number((hz / 1000).toPrecision(3))} kHz`;

/**
 * RMS of the potential between 1 kHz and the filter corner, at most 0.4 of the sampling rate, over quiet stretches
 * (at most 2 s of them). Zero-phase Butterworth band-pass of fourth order; the band stands in the note.
 */
export function noise(voltage: Signal, quiet: readonly Stretch[], filterKhz: number | null): Reading {
  const limit = 0.4 * voltage.rate_hz;
  const high = filterKhz === null ? limit : Math.min(filterKhz * 1000, limit);
  const low = 1000;
  if (limit <= 1.2 * low) return absent('rate-too-low');
  if (high <= 1.2 * low)
    return absent('unresolved', { note: `the filter corner of ${kilohertz(high)} leaves no band above 1 kHz` });
  const shortest = Math.round(0.01 * voltage.rate_hz);
  let left = 2 * voltage.rate_hz;
  let sum = 0;
  let n = 0;
  let at: Reading['at'];
  for (const one of quiet) {
    if (one.to - one.from < shortest || left <= 0) continue;
    const to = Math.min(one.to, one.from + Math.ceil(left));
    const band = bandPass(voltage.samples.subarray(one.from, to), voltage.rate_hz, low, high);
    for (const value of band) {
      if (!Number.isFinite(value)) continue;
      sum += value * value;
      n++;
    }
    left -= to - one.from;
    at = { from_s: at?.from_s ?? timeAt(voltage, one.from), to_s: timeAt(voltage, to) };
  }
  if (n < shortest) return absent('no-spike-free-stretch');
  const rms = Math.sqrt(sum / n);
  // Twice bandwidth times duration independent values.
  const freedom = (2 * (high - low) * n) / voltage.rate_hz;
  const stated = filterKhz === null ? ' (0.4 of the rate; filter corner not stated)' : '';
  return measured(rms, {
    n,
    se: rms / Math.sqrt(2 * freedom),
    // The skirts of the band and of the recorder's filter are not those of an ideal band: 1 %.
    u95: Math.hypot((1.96 * rms) / Math.sqrt(2 * freedom), 0.01 * rms),
    ...(at ? { at } : {}),
    note: `${kilohertz(low)} to ${kilohertz(high)}${stated}`,
  });
}

/** Longest stretch, s, over which hum is fitted: enough for a few hundredths of a hertz. */
const humSpan_s = 2;
/** A line stands out where its amplitude is so many times what noise alone gives one quadrature of it. */
export const standsOut = 5;

/**
 * Amplitude and frequency of the mains hum: the least-squares sine near the mains frequency (50 and 60 Hz where it is
 * not known), fitted in quiet stretches together with a straight line in each. A line five standard uncertainties high
 * counts as hum and its own frequency is reported; otherwise the amplitude at the nominal frequency is, and the
 * frequency is `unresolved`. Where nothing stands out near the mains, a very clear line elsewhere between 20 and 150 Hz
 * is reported instead, with a remark: a misdeclared sampling rate moves the hum.
 *
 * Noise always adds to an amplitude: √(A² − 2u²) takes that off again (Gudbjartsson & Patz 1995, Magn Reson Med
 * 34:910–914, for the same distribution; from memory).
 */
export function hum(voltage: Signal, quiet: readonly Stretch[], mainsHz: number | null): Readings {
  const both = (reading: Reading): Readings => ({ mains_hum_mv: reading, mains_hum_hz: reading });
  if (voltage.rate_hz < 400) return both(absent('rate-too-low'));
  const trace = humTrace(voltage, quiet);
  if (!trace) return both(absent('no-spike-free-stretch'));
  const { pieces, rate_hz: rate } = trace;
  const candidates = (mainsHz === null ? [50, 60] : [mainsHz])
    .filter((hz) => hz < rate * 0.4)
    .map((hz) => lineNear(trace, hz, Math.max(0.1 * hz, 1 / trace.seconds)))
    .filter((line) => line !== null);
  if (candidates.length === 0) return both(absent('sweep-too-short'));
  const nearest = candidates.reduce((best, line) => (line.fit.amplitude > best.fit.amplitude ? line : best));
  const amplitude = (line: Line, note?: string): Reading => {
    const kept = keptByMeans((2 * Math.PI * line.fit.frequency_hz) / (rate * trace.block), trace.block);
    return measured(Math.sqrt(Math.max(0, line.fit.amplitude ** 2 - 2 * line.se ** 2)) / kept, {
      n: line.fit.n * trace.block,
      at: { from_s: trace.from_s, to_s: trace.from_s + trace.seconds },
      se: line.se / kept,
      freedom: line.freedom,
      ...(note ? { note } : {}),
    });
  };
  const report = (line: Line, note?: string): Readings => ({
    mains_hum_mv: amplitude(line, note),
    mains_hum_hz: measured(line.fit.frequency_hz, {
      n: line.fit.n * trace.block,
      at: { from_s: trace.from_s, to_s: trace.from_s + trace.seconds },
      // Cramér–Rao bound for the frequency of a sine in white noise (Rife & Boorstyn 1974, IEEE Trans Inf Theory
      // 20:591–598; from memory), written with the spread of the sampled times and the error of one quadrature.
      se: line.se / (2 * Math.PI * line.fit.amplitude * timeSpread_s(trace)),
      freedom: line.freedom,
      ...(note ? { note } : {}),
    }),
  });
  if (nearest.fit.amplitude > standsOut * nearest.se) return report(nearest);
  const elsewhere = strayLine(trace);
  if (elsewhere) return report(elsewhere, 'no line near the mains frequency; this one stands out instead');
  const nominal = sineInPieces(pieces, rate, nearest.nominal_hz);
  return {
    mains_hum_mv: nominal
      ? amplitude({ ...nearest, fit: nominal }, `at ${nearest.nominal_hz} Hz`)
      : absent('sweep-too-short'),
    mains_hum_hz: absent('unresolved'),
  };
}

interface Line {
  fit: PiecesFit;
  /** Standard uncertainty of one quadrature of the amplitude, and its degrees of freedom. */
  se: number;
  freedom: number;
  nominal_hz: number;
}

/** Standard deviation of the times that were sampled, s. */
function timeSpread_s({ pieces, rate_hz }: HumTrace): number {
  let [n, sum, squares] = [0, 0, 0];
  for (const { from, samples } of pieces) {
    const count = samples.length;
    const middle = from + (count - 1) / 2;
    n += count;
    sum += count * middle;
    squares += count * middle * middle + (count * (count * count - 1)) / 12;
  }
  return Math.sqrt(squares / n - (sum / n) ** 2) / rate_hz;
}

/**
 * The line near a frequency. What noise does to its amplitude is read from six frequencies round about, whole multiples
 * of 1/duration away, once the line itself is taken out: slow noise is not white.
 */
function lineNear(trace: HumTrace, hz: number, range: number): Line | null {
  const { pieces, rate_hz: rate, seconds } = trace;
  const fit = sineInPiecesNear(pieces, rate, hz, range);
  if (!fit) return null;
  const rest = withoutSine(pieces, rate, fit);
  const beside = noiseBeside(rest, rate, fit.frequency_hz, 1 / seconds, {
    above: Math.max(2 / seconds, 8),
    below: rate * 0.45,
  });
  if (!beside) return null;
  // White noise alone would leave this much.
  const white = Math.sqrt((2 * fit.rss) / Math.max(1, fit.n - 4) / fit.n);
  return { fit, se: Math.max(beside.se, 0.5 * white), freedom: beside.freedom, nominal_hz: hz };
}

function strayLine(trace: HumTrace): Line | null {
  const { pieces, rate_hz: rate, seconds } = trace;
  if (seconds < 0.4) return null;
  const spacing = 0.5 / Math.min(seconds, 1);
  let best: PiecesFit | null = null;
  for (let hz = 20; hz <= 150 && hz < rate * 0.4; hz += spacing) {
    const fit = sineInPieces(pieces, rate, hz);
    if (fit && (!best || fit.amplitude > best.amplitude)) best = fit;
  }
  if (!best) return null;
  const line = lineNear(trace, best.frequency_hz, 2 * spacing);
  return line && line.fit.amplitude > 3 * standsOut * line.se ? line : null;
}

function blockMeans(samples: Float64Array, block: number): Float64Array {
  return Float64Array.from(
    { length: Math.floor(samples.length / block) },
    (_, b) => meanWithin(samples, b * block, (b + 1) * block) ?? Number.NaN,
  );
}

interface HumTrace {
  /** Means over `block` samples of the quiet stretches, on one grid. */
  pieces: Piece[];
  rate_hz: number;
  block: number;
  from_s: number;
  /** From the first to the last sample. */
  seconds: number;
}

/** The quiet stretches at about 3 kHz, which is plenty for hum; null where they are shorter than 100 ms in all. */
function humTrace(voltage: Signal, quiet: readonly Stretch[]): HumTrace | null {
  const usable = quiet.filter((one) => one.to - one.from >= 0.06 * voltage.rate_hz);
  const longest = usable.toSorted((a, b) => b.to - b.from - (a.to - a.from))[0];
  if (!longest) return null;
  const span = Math.round(humSpan_s * voltage.rate_hz);
  const chosen =
    longest.to - longest.from >= 0.25 * voltage.rate_hz
      ? [{ from: longest.from, to: Math.min(longest.to, longest.from + span) }]
      : usable.filter((one) => one.to - usable[0]!.from <= span);
  if (total(chosen) < 0.1 * voltage.rate_hz) return null;
  const block = Math.max(1, Math.floor(voltage.rate_hz / 3000));
  const first = chosen[0]!.from;
  const pieces = chosen.map((one): Piece => {
    // Blocks lie on one grid over all stretches, so that the sine keeps its phase.
    const start = Math.ceil((one.from - first) / block);
    const count = Math.floor((one.to - first) / block) - start;
    return {
      from: start,
      samples: blockMeans(voltage.samples.subarray(first + start * block, first + (start + count) * block), block),
    };
  });
  const rate_hz = voltage.rate_hz / block;
  const last = pieces.at(-1)!;
  return {
    pieces,
    rate_hz,
    block,
    from_s: timeAt(voltage, first),
    seconds: (last.from + last.samples.length) / rate_hz,
  };
}
