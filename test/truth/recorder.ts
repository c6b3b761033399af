/**
 * An electrode, an amplifier and a digitizer of our own for the truth bench: independent of the code under test and of
 * the sample's generator. The membrane runs at 200 kHz with its electrode attached; what the file would hold is made
 * from that trace by filter, noise, hum, drift, sampling and quantization, all of known size.
 */
import { type Model, normalNoise } from '../helpers/models.ts';

/** Everything runs on this grid, Hz; sampling rates divide it. */
export const fineHz = 200_000;

export interface Subject {
  name: string;
  model: Model;
  capacitance_pf: number;
}

export interface Electrode {
  access_mohm: number;
  /** Pipette capacitance that the amplifier has not neutralized. */
  pipette_pf: number;
}

/** Current, pA, from a time on, s; the first piece begins at 0. */
export interface Piece {
  from_s: number;
  pa: number;
}

/** What the membrane and the pipette did, on the fine grid; sample 0 is at time 0. */
export interface Clean {
  membrane_mv: Float64Array;
  pipette_mv: Float64Array;
  pa: Float64Array;
  edges_s: number[];
}

/**
 * Membrane and electrode integrated together by the classical Runge–Kutta method, 5 µs a step:
 * C_p·dV_p/dt = I − (V_p − V_m)/R_a, and the model driven by (V_p − V_m)/R_a.
 */
export function run(subject: Subject, electrode: Electrode, pieces: readonly Piece[], seconds: number): Clean {
  const n = Math.round(seconds * fineHz);
  const dt = 1000 / fineHz;
  const { model, capacitance_pf } = subject;
  const { access_mohm, pipette_pf } = electrode;
  const membrane_mv = new Float64Array(n);
  const pipette_mv = new Float64Array(n);
  const pa = new Float64Array(n);
  const size = model.start.length;
  // The pipette's potential stands last. Buffers are kept: this loop is most of the bench's time.
  const state = [...model.start, model.start[0]! + access_mohm * pieces[0]!.pa * 1e-3];
  const buffers = Array.from({ length: 5 }, () => new Array<number>(size + 1).fill(0));
  const [k1, k2, k3, k4, between] = buffers as [number[], number[], number[], number[], number[]];
  const rate = (from: number[], injected: number, into: number[]): void => {
    const intoCell = ((from[size]! - from[0]!) * 1000) / access_mohm;
    model.slope(from, intoCell / capacitance_pf, into);
    into[size] = (injected - intoCell) / pipette_pf;
  };
  const moved = (k: number[], by: number): number[] => {
    for (let j = 0; j <= size; j++) between[j] = state[j]! + by * k[j]!;
    return between;
  };
  const starts = pieces.map((piece) => Math.round(piece.from_s * fineHz));
  let piece = 0;
  for (let i = 0; i < n; i++) {
    while (piece + 1 < pieces.length && i >= starts[piece + 1]!) piece++;
    const injected = pieces[piece]!.pa;
    membrane_mv[i] = state[0]!;
    pipette_mv[i] = state[size]!;
    pa[i] = injected;
    rate(state, injected, k1);
    rate(moved(k1, dt / 2), injected, k2);
    rate(moved(k2, dt / 2), injected, k3);
    rate(moved(k3, dt), injected, k4);
    for (let j = 0; j <= size; j++) state[j]! += (dt / 6) * (k1[j]! + 2 * k2[j]! + 2 * k3[j]! + k4[j]!);
  }
  return { membrane_mv, pipette_mv, pa, edges_s: pieces.slice(1).map((one) => one.from_s) };
}

export interface Conditions {
  name: string;
  rate_hz: number;
  /** Corner of the four-pole Bessel filter. */
  filter_khz: number;
  /** Whether the file states the filter. */
  filter_stated: boolean;
  /** Root-mean-square of the white noise behind the filter. */
  noise_mv: number;
  /** Root-mean-square of slow noise, correlation times 10 ms, 100 ms and 1 s in equal shares. */
  wander_mv: number;
  hum_mv: number;
  hum_hz: number;
  drift_mv_per_s: number;
  quantum_mv: number;
  /** Access resistance that the bridge leaves; negative: it takes too much. */
  bridge_left_mohm: number;
}

/**
 * Poles of the four-pole Bessel low-pass, 1/s at a group delay of 1 s: roots of s⁴ + 10s³ + 45s² + 105s + 105 (Thomson
 * 1949, Proc IEE 96:487–490; from memory), and the frequency of its −3 dB point in that scaling.
 */
const besselPoles = [
  [-2.8962106028, 0.8672341289],
  [-2.1037893972, 2.6574180418],
] as const;
const besselCorner = 2.11391767490422;

/** Group delay of that filter at low frequencies, s. */
export const besselDelay_s = (corner_hz: number): number => besselCorner / (2 * Math.PI * corner_hz);

/** Its gain at a frequency. */
export function besselGain(hz: number, corner_hz: number): number {
  const w = (besselCorner * hz) / corner_hz;
  const magnitude2 = besselPoles.reduce((product, [re, im]) => {
    const own = re * re + im * im;
    return (product * (own * own)) / ((own - w * w) ** 2 + (2 * re * w) ** 2);
  }, 1);
  return Math.sqrt(magnitude2);
}

/** The filter by the bilinear transform, each pair of poles warped to its own place, settled at the first sample. */
export function bessel(samples: Float64Array, corner_hz: number): Float64Array {
  const warp = Math.tan((Math.PI * corner_hz) / fineHz) / besselCorner;
  let through = samples;
  for (const [re, im] of besselPoles) {
    const own = (re * re + im * im) * warp * warp;
    const damping = -2 * re * warp;
    const norm = 1 + damping + own;
    const [b, a1, a2] = [own / norm, (2 * (own - 1)) / norm, (1 - damping + own) / norm];
    const out = new Float64Array(through.length);
    let [x1, x2, y1, y2] = [through[0]!, through[0]!, through[0]!, through[0]!];
    for (let i = 0; i < through.length; i++) {
      const x = through[i]!;
      const y = b * (x + 2 * x1 + x2) - a1 * y1 - a2 * y2;
      x2 = x1;
      x1 = x;
      y2 = y1;
      y1 = y;
      out[i] = y;
    }
    through = out;
  }
  return through;
}

/** How much of white noise on the fine grid, in amplitude, the filter lets through; cached by corner. */
const throughputs = new Map<number, number>();
function throughput(corner_hz: number): number {
  const held = throughputs.get(corner_hz);
  if (held !== undefined) return held;
  const impulse = new Float64Array(Math.ceil((20 * fineHz) / corner_hz)).fill(0);
  impulse[1] = 1;
  const answer = bessel(impulse, corner_hz);
  const value = Math.sqrt(answer.reduce((sum, one) => sum + one * one, 0));
  throughputs.set(corner_hz, value);
  return value;
}

export interface Recorded {
  mv: Float64Array;
  /** The slow noise in it: the potential itself wanders so. */
  wander_mv: Float64Array;
  pa: Float64Array;
  rate_hz: number;
}

/** What the file holds. @param seed two recordings with one seed have one noise */
export function record(clean: Clean, conditions: Conditions, electrode: Electrode, seed: number): Recorded {
  const { rate_hz, filter_khz, noise_mv, wander_mv, hum_mv, hum_hz, drift_mv_per_s, quantum_mv } = conditions;
  const next = normalNoise(seed | 0);
  // The first numbers of neighbouring seeds are alike.
  for (let k = 0; k < 50; k++) next();
  const corner = filter_khz * 1000;
  const n = clean.pipette_mv.length;
  const bridge_mohm = electrode.access_mohm - conditions.bridge_left_mohm;
  const white = noise_mv / throughput(corner);
  const phase = 2 * Math.PI * ((seed % 10007) / 10007);
  const raw = Float64Array.from({ length: n }, (_, i) => {
    const t = i / fineHz;
    return (
      clean.pipette_mv[i]! -
      bridge_mohm * clean.pa[i]! * 1e-3 +
      white * next() +
      hum_mv * Math.sin(2 * Math.PI * hum_hz * t + phase) +
      drift_mv_per_s * t
    );
  });
  const filtered = bessel(raw, corner);
  const every = fineHz / rate_hz;
  const slow = [0.01, 0.1, 1].map((tau) => Math.exp(-1 / (rate_hz * tau)));
  const levels = slow.map(() => (wander_mv / Math.sqrt(3)) * next());
  const count = Math.floor(n / every);
  const mv = new Float64Array(count);
  const pa = new Float64Array(count);
  const wander = new Float64Array(count);
  for (let k = 0; k < count; k++) {
    slow.forEach((decay, j) => {
      levels[j] = decay * levels[j]! + (wander_mv / Math.sqrt(3)) * Math.sqrt(1 - decay * decay) * next();
    });
    wander[k] = wander_mv > 0 ? levels.reduce((sum, one) => sum + one, 0) : 0;
    const value = filtered[k * every]! + wander[k]!;
    mv[k] = Math.round(value / quantum_mv) * quantum_mv;
    pa[k] = clean.pa[k * every]!;
  }
  return { mv, wander_mv: wander, pa, rate_hz };
}
