/**
 * Spikes from published membrane models, integrated here by the classical Runge–Kutta method, so that tests know what
 * the trace is made of. Currents are per µF of membrane: 1 µA/µF = 1 pA/pF = 1 V/s, so a model of 1 µF/cm² driven by
 * 10 µA/cm² is a cell of 1 pF driven by 10 pA.
 */

/** x/(exp(x/y) − 1), continued through x = 0. */
const vtrap = (x: number, y: number): number => (Math.abs(x / y) < 1e-6 ? y * (1 - x / y / 2) : x / Math.expm1(x / y));

export interface Model {
  /** Membrane potential first, then gates. */
  start: number[];
  /** Time derivatives per ms for a current in V/s. */
  slope(state: number[], current: number, into: number[]): void;
}

const gate = (alpha: number, beta: number): number => alpha / (alpha + beta);

/** Hodgkin & Huxley 1952, J Physiol 117:500–544, eqs 7–26 and Table 3 (constants from memory), at a temperature in °C. */
export function hodgkinHuxley(celsius = 6.3): Model {
  const phi = 3 ** ((celsius - 6.3) / 10);
  const rates = (u: number): [number, number, number, number, number, number] => [
    0.1 * vtrap(25 - u, 10),
    4 * Math.exp(-u / 18),
    0.07 * Math.exp(-u / 20),
    1 / (Math.exp((30 - u) / 10) + 1),
    0.01 * vtrap(10 - u, 10),
    0.125 * Math.exp(-u / 80),
  ];
  const rest = -64.99637933119206;
  const r = rates(rest + 65);
  return {
    start: [rest, gate(r[0], r[1]), gate(r[2], r[3]), gate(r[4], r[5])],
    slope(state, current, into) {
      const [v, m, h, n] = state as [number, number, number, number];
      const [am, bm, ah, bh, an, bn] = rates(v + 65);
      into[0] = current - 120 * m ** 3 * h * (v - 50) - 36 * n ** 4 * (v + 77) - 0.3 * (v + 54.387);
      into[1] = phi * (am * (1 - m) - bm * m);
      into[2] = phi * (ah * (1 - h) - bh * h);
      into[3] = phi * (an * (1 - n) - bn * n);
    },
  };
}

/** Wang & Buzsáki 1996, J Neurosci 16:6402–6413. */
export function wangBuzsaki(): Model {
  const rates = (v: number): [number, number, number, number, number, number] => [
    0.1 * vtrap(-(v + 35), 10),
    4 * Math.exp(-(v + 60) / 18),
    0.07 * Math.exp(-(v + 58) / 20),
    1 / (Math.exp(-0.1 * (v + 28)) + 1),
    0.01 * vtrap(-(v + 34), 10),
    0.125 * Math.exp(-(v + 44) / 80),
  ];
  const rest = -64.0175649096368;
  const r = rates(rest);
  return {
    start: [rest, gate(r[2], r[3]), gate(r[4], r[5])],
    slope(state, current, into) {
      const [v, h, n] = state as [number, number, number];
      const [am, bm, ah, bh, an, bn] = rates(v);
      into[0] = current - 35 * gate(am, bm) ** 3 * h * (v - 55) - 9 * n ** 4 * (v + 90) - 0.1 * (v + 65);
      into[1] = 5 * (ah * (1 - h) - bh * h);
      into[2] = 5 * (an * (1 - n) - bn * n);
    },
  };
}

/** Pospischil et al. 2008, Biol Cybern 99:427–441: regular spiking ('RS') and fast spiking ('FS') cell, 36 °C. */
export function pospischil(kind: 'RS' | 'FS'): Model & { capacitance_pf: number } {
  const { gK, gM, gL } = kind === 'RS' ? { gK: 5, gM: 0.07, gL: 0.1 } : { gK: 10, gM: 0, gL: 0.15 };
  const rates = (v: number): [number, number, number, number, number, number] => {
    const u = v + 55;
    return [
      0.32 * vtrap(13 - u, 4),
      0.28 * vtrap(u - 40, 5),
      0.128 * Math.exp((17 - u) / 18),
      4 / (1 + Math.exp((40 - u) / 5)),
      0.032 * vtrap(15 - u, 5),
      0.5 * Math.exp((10 - u) / 40),
    ];
  };
  const slow = (v: number): { pInf: number; tau: number } => ({
    pInf: 1 / (1 + Math.exp(-(v + 35) / 10)),
    tau: 1000 / (3.3 * Math.exp((v + 35) / 20) + Math.exp(-(v + 35) / 20)),
  });
  const rest = kind === 'RS' ? -70.57123320960252 : -69.99999410454198;
  const r = rates(rest);
  return {
    capacitance_pf: kind === 'RS' ? 289.5291789548354 : 141.0260942196458,
    start: [rest, gate(r[0], r[1]), gate(r[2], r[3]), gate(r[4], r[5]), slow(rest).pInf],
    slope(state, current, into) {
      const [v, m, h, n, p] = state as [number, number, number, number, number];
      const [am, bm, ah, bh, an, bn] = rates(v);
      // gNa 50, ENa 50, EK −100, EL −70.
      into[0] = current - 50 * m ** 3 * h * (v - 50) - (gK * n ** 4 + gM * p) * (v + 100) - gL * (v + 70);
      into[1] = am * (1 - m) - bm * m;
      into[2] = ah * (1 - h) - bh * h;
      into[3] = an * (1 - n) - bn * n;
      const { pInf, tau } = slow(v);
      into[4] = (pInf - p) / tau;
    },
  };
}

/** A passive membrane: rest −70 mV, time constant in ms. */
export const passive = (tau_ms: number): Model => ({
  start: [-70],
  slope(state, current, into) {
    into[0] = current - (state[0]! + 70) / tau_ms;
  },
});

export interface Trace {
  mv: Float64Array;
  /** Current density, V/s (= pA for a cell of 1 pF). */
  drive: Float64Array;
  rateHz: number;
  /** Times of the current's edges, s. */
  edges_s: number[];
}

/**
 * Integrates a model through segments of constant current and samples it. The first sample is the state at time 0;
 * a segment of k ms covers the samples up to the one before its end.
 * @param segments [length ms, current V/s] @param jump mV added to the potential at time 0
 */
export function simulate(model: Model, rateHz: number, segments: readonly [number, number][], jump = 0): Trace {
  const perSample = Math.max(1, Math.ceil(1000 / rateHz / 0.0101));
  const dt = 1000 / rateHz / perSample;
  const counts = segments.map(([ms]) => Math.round((ms / 1000) * rateHz));
  const total = counts.reduce((sum, count) => sum + count, 0);
  const mv = new Float64Array(total);
  const drive = new Float64Array(total);
  const state = model.start.slice();
  state[0]! += jump;
  const size = state.length;
  const [k1, k2, k3, k4, between] = Array.from({ length: 5 }, () => new Array<number>(size).fill(0)) as [
    number[],
    number[],
    number[],
    number[],
    number[],
  ];
  const shifted = (k: number[], by: number): number[] => {
    for (let j = 0; j < size; j++) between[j] = state[j]! + by * k[j]!;
    return between;
  };
  let i = 0;
  const edges_s: number[] = [];
  segments.forEach(([, current], s) => {
    if (s > 0 && current !== segments[s - 1]![1]) edges_s.push(i / rateHz);
    for (let count = 0; count < counts[s]!; count++) {
      mv[i] = state[0]!;
      drive[i] = current;
      i++;
      for (let step = 0; step < perSample; step++) {
        model.slope(state, current, k1);
        model.slope(shifted(k1, dt / 2), current, k2);
        model.slope(shifted(k2, dt / 2), current, k3);
        model.slope(shifted(k3, dt), current, k4);
        for (let j = 0; j < size; j++) state[j]! += (dt / 6) * (k1[j]! + 2 * k2[j]! + 2 * k3[j]! + k4[j]!);
      }
    }
  });
  return { mv, drive, rateHz, edges_s };
}

/** Normal deviates from a seed (Marsaglia polar method over a 32-bit xorshift generator). */
export function normalNoise(seed: number): () => number {
  let x = seed | 0 || 1;
  const uniform = (): number => {
    x ^= x << 13;
    x ^= x >>> 17;
    x ^= x << 5;
    return (x >>> 0) / 4294967296;
  };
  let spare: number | null = null;
  return () => {
    if (spare !== null) {
      const held = spare;
      spare = null;
      return held;
    }
    for (;;) {
      const a = 2 * uniform() - 1;
      const b = 2 * uniform() - 1;
      const s = a * a + b * b;
      if (s > 0 && s < 1) {
        const factor = Math.sqrt((-2 * Math.log(s)) / s);
        spare = b * factor;
        return a * factor;
      }
    }
  };
}

/** The samples with white noise of a standard deviation added. */
export function withNoise(mv: Float64Array, sd: number, seed: number): Float64Array {
  const next = normalNoise(seed);
  return mv.map((value) => value + sd * next());
}

/** Rounded to whole steps of a digitizer. */
export const quantized = (mv: Float64Array, step: number): Float64Array =>
  mv.map((value) => Math.round(value / step) * step);
