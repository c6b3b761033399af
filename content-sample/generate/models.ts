/**
 * Published conductance models of a patch of membrane. Potentials are inside minus outside in mV, time in ms, current
 * density in µA/cm² (ionic: outward positive; injected: positive depolarizes), conductances in mS/cm², C in µF/cm².
 */

/** State 0 is the membrane potential; the others are gates and concentrations. */
export interface Model {
  name: string;
  capacitance_uf_cm2: number;
  /** Steady gates at a potential, mV. */
  stateAt(mv: number): Float64Array;
  /**
   * Rates of change per ms into `out`, for an injected density `i0 + clamp·(command − V)`; `clamp` in mS/cm² is 0 in
   * current clamp.
   */
  derive(state: Float64Array, out: Float64Array, i0: number, clamp: number, command: number): void;
  /** Multiplies the sodium (`na`), potassium (`k`) or calcium (`ca`) conductances from now on: drugs and rundown. */
  scale(channel: 'na' | 'k' | 'ca' | 'leak', factor: number): void;
  /** Moves the leak reversal by so many mV from where it began: a cell that depolarizes. */
  shiftLeak(mv: number): void;
}

const lowestMv = -200;
const highestMv = 150;
// Fine enough for the published spike times (test), small enough for the processor's cache.
const gridMv = 0.05;
const gridPoints = Math.round((highestMv - lowestMv) / gridMv) + 1;

/** Functions of the potential, tabulated side by side: row i holds all columns at lowest + i·grid. */
function tabulate(columns: ((mv: number) => number)[]): Float64Array {
  const table = new Float64Array(gridPoints * columns.length);
  for (let i = 0; i < gridPoints; i++) {
    // One grid point is nudged off the removable singularities (x/(exp x − 1) at 0) by 1e-9 mV.
    const mv = lowestMv + i * gridMv + 1e-9;
    for (let c = 0; c < columns.length; c++) table[i * columns.length + c] = columns[c]!(mv);
  }
  return table;
}

const clampMv = (mv: number): number => Math.max(lowestMv, Math.min(highestMv - 1, mv));

/** x/(exp(x/y) − 1), y at 0. */
const linoid = (x: number, y: number): number => (Math.abs(x / y) < 1e-7 ? y - x / 2 : x / Math.expm1(x / y));

interface Scales {
  na: number;
  k: number;
  ca: number;
  leak: number;
}
const unscaled = (): Scales => ({ na: 1, k: 1, ca: 1, leak: 1 });

export interface SquidParameters {
  g_na: number;
  g_k: number;
  g_leak: number;
  e_na_mv: number;
  e_k_mv: number;
  e_leak_mv: number;
  temperature_c: number;
}

export const squid1952: SquidParameters = {
  g_na: 120,
  g_k: 36,
  g_leak: 0.3,
  e_na_mv: 50,
  e_k_mv: -77,
  e_leak_mv: -54.387,
  temperature_c: 6.3,
};

/**
 * Squid giant axon. Rates times 3^((T − 6.3)/10).
 * @see Hodgkin & Huxley 1952, J Physiol 117:500–544, eqs 7–26, table 3, in today's sign with rest near −65 mV
 */
export function squidAxon(p: SquidParameters): Model {
  const phi = 3 ** ((p.temperature_c - 6.3) / 10);
  const rates: ((mv: number) => number)[] = [
    (v) => 0.1 * linoid(25 - (v + 65), 10),
    (v) => 4 * Math.exp(-(v + 65) / 18),
    (v) => 0.07 * Math.exp(-(v + 65) / 20),
    (v) => 1 / (Math.exp((30 - (v + 65)) / 10) + 1),
    (v) => 0.01 * linoid(10 - (v + 65), 10),
    (v) => 0.125 * Math.exp(-(v + 65) / 80),
  ];
  const table = tabulate(rates);
  const by = unscaled();
  let leakShift = 0;
  return {
    name: 'Hodgkin–Huxley 1952',
    capacitance_uf_cm2: 1,
    stateAt(mv) {
      const r = rates.map((rate) => rate(mv + 1e-9));
      return Float64Array.of(mv, r[0]! / (r[0]! + r[1]!), r[2]! / (r[2]! + r[3]!), r[4]! / (r[4]! + r[5]!));
    },
    derive(s, out, i0, clamp, command) {
      const v = s[0]!;
      const m = s[1]!;
      const h = s[2]!;
      const n = s[3]!;
      const x = (clampMv(v) - lowestMv) / gridMv;
      const i = x | 0;
      const w = x - i;
      const a = i * 6;
      const b = a + 6;
      const am = table[a]! + w * (table[b]! - table[a]!);
      const bm = table[a + 1]! + w * (table[b + 1]! - table[a + 1]!);
      const ah = table[a + 2]! + w * (table[b + 2]! - table[a + 2]!);
      const bh = table[a + 3]! + w * (table[b + 3]! - table[a + 3]!);
      const an = table[a + 4]! + w * (table[b + 4]! - table[a + 4]!);
      const bn = table[a + 5]! + w * (table[b + 5]! - table[a + 5]!);
      const n2 = n * n;
      out[0] =
        i0 +
        clamp * (command - v) -
        by.na * p.g_na * m * m * m * h * (v - p.e_na_mv) -
        by.k * p.g_k * n2 * n2 * (v - p.e_k_mv) -
        by.leak * p.g_leak * (v - p.e_leak_mv - leakShift);
      out[1] = phi * (am * (1 - m) - bm * m);
      out[2] = phi * (ah * (1 - h) - bh * h);
      out[3] = phi * (an * (1 - n) - bn * n);
    },
    scale(channel, factor) {
      by[channel] = factor;
    },
    shiftLeak(mv) {
      leakShift = mv;
    },
  };
}

export interface InterneuronParameters {
  g_na: number;
  g_k: number;
  g_leak: number;
  e_na_mv: number;
  e_k_mv: number;
  e_leak_mv: number;
  /** 5 in the paper; lower for a colder cell. */
  phi: number;
}

export const interneuron1996: InterneuronParameters = {
  g_na: 35,
  g_k: 9,
  g_leak: 0.1,
  e_na_mv: 55,
  e_k_mv: -90,
  e_leak_mv: -65,
  phi: 5,
};

/**
 * Fast-spiking interneuron with instantaneous sodium activation.
 * @see Wang & Buzsáki 1996, J Neurosci 16:6402–6413
 */
export function fastSpikingInterneuron(p: InterneuronParameters): Model {
  const rates: ((mv: number) => number)[] = [
    (v) => {
      const a = 0.1 * linoid(-(v + 35), 10);
      const m = a / (a + 4 * Math.exp(-(v + 60) / 18));
      return m * m * m;
    },
    (v) => 0.07 * Math.exp(-(v + 58) / 20),
    (v) => 1 / (Math.exp(-0.1 * (v + 28)) + 1),
    (v) => 0.01 * linoid(-(v + 34), 10),
    (v) => 0.125 * Math.exp(-(v + 44) / 80),
  ];
  const table = tabulate(rates);
  const by = unscaled();
  let leakShift = 0;
  return {
    name: 'Wang–Buzsáki 1996',
    capacitance_uf_cm2: 1,
    stateAt(mv) {
      const r = rates.map((rate) => rate(mv + 1e-9));
      return Float64Array.of(mv, r[1]! / (r[1]! + r[2]!), r[3]! / (r[3]! + r[4]!));
    },
    derive(s, out, i0, clamp, command) {
      const v = s[0]!;
      const h = s[1]!;
      const n = s[2]!;
      const x = (clampMv(v) - lowestMv) / gridMv;
      const i = x | 0;
      const w = x - i;
      const a = i * 5;
      const b = a + 5;
      const m3 = table[a]! + w * (table[b]! - table[a]!);
      const ah = table[a + 1]! + w * (table[b + 1]! - table[a + 1]!);
      const bh = table[a + 2]! + w * (table[b + 2]! - table[a + 2]!);
      const an = table[a + 3]! + w * (table[b + 3]! - table[a + 3]!);
      const bn = table[a + 4]! + w * (table[b + 4]! - table[a + 4]!);
      const n2 = n * n;
      out[0] =
        i0 +
        clamp * (command - v) -
        by.na * p.g_na * m3 * h * (v - p.e_na_mv) -
        by.k * p.g_k * n2 * n2 * (v - p.e_k_mv) -
        by.leak * p.g_leak * (v - p.e_leak_mv - leakShift);
      out[1] = p.phi * (ah * (1 - h) - bh * h);
      out[2] = p.phi * (an * (1 - n) - bn * n);
    },
    scale(channel, factor) {
      by[channel] = factor;
    },
    shiftLeak(mv) {
      leakShift = mv;
    },
  };
}

export interface CorticalParameters {
  g_na: number;
  g_k: number;
  /** Slow potassium current of adaptation. */
  g_m: number;
  tau_m_max_ms: number;
  g_leak: number;
  e_na_mv: number;
  e_k_mv: number;
  e_leak_mv: number;
  /** V_T: moves all sodium and potassium gates along the voltage axis. */
  gate_shift_mv: number;
  /** High-threshold calcium conductance of the bursting cell. */
  g_ca_high: number;
  /** Low-threshold calcium conductance of the rebounding cell, with its own calcium shell. */
  g_ca_low: number;
  /** Multiplies all rates: 1 at 36 °C. */
  phi: number;
  temperature_c: number;
}

const cortical2008: CorticalParameters = {
  g_na: 50,
  g_k: 5,
  g_m: 0.07,
  tau_m_max_ms: 1000,
  g_leak: 0.1,
  e_na_mv: 50,
  e_k_mv: -100,
  e_leak_mv: -70,
  gate_shift_mv: -55,
  g_ca_high: 0,
  g_ca_low: 0,
  phi: 1,
  temperature_c: 36,
};
export const regularSpiking2008: CorticalParameters = cortical2008;
export const fastSpiking2008: CorticalParameters = { ...cortical2008, g_k: 10, g_m: 0, g_leak: 0.15 };
export const bursting2008: CorticalParameters = {
  ...cortical2008,
  g_m: 0.03,
  g_leak: 0.01,
  e_leak_mv: -85,
  g_ca_high: 0.17,
};
export const lowThreshold2008: CorticalParameters = {
  ...cortical2008,
  g_m: 0.03,
  g_leak: 0.01,
  e_leak_mv: -85,
  g_ca_low: 0.4,
};

/** Surface of a cylinder as long as it is wide, cm²: how the paper states the size of its cells. */
export const cylinderCm2 = (diameter_um: number): number => Math.PI * diameter_um * diameter_um * 1e-8;

const faraday = 96485.33212;
const gasConstant = 8.314462618;

/**
 * Cortical and thalamic cells with Traub–Miles sodium and potassium currents: regular spiking, fast spiking,
 * intrinsically bursting and low-threshold spiking by their conductances.
 * @see Pospischil et al. 2008, Biol Cybern 99:427–441, and the authors' deposited kinetics
 */
export function corticalCell(p: CorticalParameters): Model {
  const shift = p.gate_shift_mv;
  const q10Low = 3 ** ((36 - 24) / 10);
  const everyRate: ((mv: number) => number)[] = [
    (v) => 0.32 * linoid(13 - (v - shift), 4),
    (v) => 0.28 * linoid(v - shift - 40, 5),
    (v) => 0.128 * Math.exp((17 - (v - shift)) / 18),
    (v) => 4 / (1 + Math.exp((40 - (v - shift)) / 5)),
    (v) => 0.032 * linoid(15 - (v - shift), 5),
    (v) => 0.5 * Math.exp((10 - (v - shift)) / 40),
    (v) => 1 / (1 + Math.exp(-(v + 35) / 10)),
    (v) => (3.3 * Math.exp((v + 35) / 20) + Math.exp(-(v + 35) / 20)) / p.tau_m_max_ms,
    (v) => 0.055 * linoid(-27 - v, 3.8),
    (v) => 0.94 * Math.exp((-75 - v) / 17),
    (v) => 0.000457 * Math.exp((-13 - v) / 50),
    (v) => 0.0065 / (Math.exp((-15 - v) / 28) + 1),
    (v) => (1 / (1 + Math.exp(-(v + 2 + 57) / 6.2))) ** 2,
    (v) => 1 / (1 + Math.exp((v + 2 + 81) / 4)),
    (v) => 1 / ((30.8 + (211.4 + Math.exp((v + 2 + 113.2) / 5)) / (1 + Math.exp((v + 2 + 84) / 3.2))) / q10Low),
  ];
  const withCalcium = p.g_ca_high > 0 || p.g_ca_low > 0;
  const rates = withCalcium ? everyRate : everyRate.slice(0, 8);
  const columns = rates.length;
  const table = tabulate(rates);
  const by = unscaled();
  let leakShift = 0;
  const calciumScale = (1000 * gasConstant * (273.15 + p.temperature_c)) / (2 * faraday);
  const outsideCa = 2;
  const restCa = 2.4e-4;
  const fixedCalcium = calciumScale * Math.log(outsideCa / restCa);
  const shellUm = 1;
  return {
    name: 'Pospischil et al. 2008',
    capacitance_uf_cm2: 1,
    stateAt(mv) {
      const r = everyRate.map((rate) => rate(mv + 1e-9));
      const steady = (k: number): number => r[k]! / (r[k]! + r[k + 1]!);
      const plain = [mv, steady(0), steady(2), steady(4), r[6]!];
      return Float64Array.from(withCalcium ? [...plain, steady(8), steady(10), r[13]!, restCa] : plain);
    },
    derive(s, out, i0, clamp, command) {
      const v = s[0]!;
      const m = s[1]!;
      const h = s[2]!;
      const n = s[3]!;
      const slow = s[4]!;
      const x = (clampMv(v) - lowestMv) / gridMv;
      const i = x | 0;
      const w = x - i;
      const a = i * columns;
      const b = a + columns;
      const am = table[a]! + w * (table[b]! - table[a]!);
      const bm = table[a + 1]! + w * (table[b + 1]! - table[a + 1]!);
      const ah = table[a + 2]! + w * (table[b + 2]! - table[a + 2]!);
      const bh = table[a + 3]! + w * (table[b + 3]! - table[a + 3]!);
      const an = table[a + 4]! + w * (table[b + 4]! - table[a + 4]!);
      const bn = table[a + 5]! + w * (table[b + 5]! - table[a + 5]!);
      const slowInf = table[a + 6]! + w * (table[b + 6]! - table[a + 6]!);
      const slowRate = table[a + 7]! + w * (table[b + 7]! - table[a + 7]!);
      const n2 = n * n;
      let inward =
        i0 +
        clamp * (command - v) -
        by.na * p.g_na * m * m * m * h * (v - p.e_na_mv) -
        by.k * (p.g_k * n2 * n2 + p.g_m * slow) * (v - p.e_k_mv) -
        by.leak * p.g_leak * (v - p.e_leak_mv - leakShift);
      out[1] = p.phi * (am * (1 - m) - bm * m);
      out[2] = p.phi * (ah * (1 - h) - bh * h);
      out[3] = p.phi * (an * (1 - n) - bn * n);
      out[4] = p.phi * (slowInf - slow) * slowRate;
      if (p.g_ca_high > 0) {
        const q = s[5]!;
        const r = s[6]!;
        const aq = table[a + 8]! + w * (table[b + 8]! - table[a + 8]!);
        const bq = table[a + 9]! + w * (table[b + 9]! - table[a + 9]!);
        const ar = table[a + 10]! + w * (table[b + 10]! - table[a + 10]!);
        const br = table[a + 11]! + w * (table[b + 11]! - table[a + 11]!);
        inward -= by.ca * p.g_ca_high * q * q * r * (v - fixedCalcium);
        out[5] = p.phi * (aq * (1 - q) - bq * q);
        out[6] = p.phi * (ar * (1 - r) - br * r);
      }
      if (p.g_ca_low > 0) {
        const u = s[7]!;
        const ca = s[8]!;
        const sInf2 = table[a + 12]! + w * (table[b + 12]! - table[a + 12]!);
        const uInf = table[a + 13]! + w * (table[b + 13]! - table[a + 13]!);
        const uRate = table[a + 14]! + w * (table[b + 14]! - table[a + 14]!);
        const current = by.ca * p.g_ca_low * sInf2 * u * (v - calciumScale * Math.log(outsideCa / ca));
        inward -= current;
        out[7] = p.phi * (uInf - u) * uRate;
        // current µA/cm² = 1e-3 mA/cm²; influx into a shell of shellUm.
        out[8] = Math.max(0, (-current * 1e-3 * 1e4) / (2 * faraday * shellUm)) + (restCa - ca) / 5;
      }
      out[0] = inward;
    },
    scale(channel, factor) {
      by[channel] = factor;
    },
    shiftLeak(mv) {
      leakShift = mv;
    },
  };
}

export interface HeartParameters {
  g_na: number;
  g_si: number;
  /** Multiplies the delayed and the inward rectifier. */
  k_factor: number;
  /** Multiplies the rates of all gates: 1 in the paper, lower for a colder cell. */
  phi: number;
  temperature_c: number;
  na_out_mm: number;
  na_in_mm: number;
  k_out_mm: number;
  k_in_mm: number;
}

export const heart1991: HeartParameters = {
  g_na: 23,
  g_si: 0.09,
  k_factor: 1,
  phi: 1,
  temperature_c: 36.85,
  na_out_mm: 140,
  na_in_mm: 18,
  k_out_mm: 5.4,
  k_in_mm: 145,
};

/**
 * Ventricular myocyte of the guinea pig.
 * @see Luo & Rudy 1991, Circ Res 68:1501–1526 (equations from memory, held against its computed rest, peak and APD)
 */
export function ventricularMyocyte(p: HeartParameters): Model {
  const rtf = (1000 * gasConstant * (273.15 + p.temperature_c)) / faraday;
  const eNa = rtf * Math.log(p.na_out_mm / p.na_in_mm);
  const eK1 = rtf * Math.log(p.k_out_mm / p.k_in_mm);
  const sodiumPermeability = 0.01833;
  const eK =
    rtf * Math.log((p.k_out_mm + sodiumPermeability * p.na_out_mm) / (p.k_in_mm + sodiumPermeability * p.na_in_mm));
  const outsideK = Math.sqrt(p.k_out_mm / 5.4);
  const low = (v: number): boolean => v < -40;
  // Below −84 mV activation closes faster than 150/ms, too stiff for a step of 10 µs and far faster than anything
  // that depends on it: the pair is slowed to that rate, its steady state kept.
  const activation = (v: number): { open: number; close: number } => {
    const open = 0.32 * linoid(-(v + 47.13), 10);
    const close = 0.08 * Math.exp(-v / 11);
    const slowed = Math.min(1, 150 / (open + close));
    return { open: open * slowed, close: close * slowed };
  };
  const rates: ((mv: number) => number)[] = [
    (v) => activation(v).open,
    (v) => activation(v).close,
    (v) => (low(v) ? 0.135 * Math.exp((80 + v) / -6.8) : 0),
    (v) =>
      low(v)
        ? 3.56 * Math.exp(0.079 * v) + 3.1e5 * Math.exp(0.35 * v)
        : 1 / (0.13 * (1 + Math.exp((v + 10.66) / -11.1))),
    (v) =>
      low(v)
        ? ((-1.2714e5 * Math.exp(0.2444 * v) - 3.474e-5 * Math.exp(-0.04391 * v)) * (v + 37.78)) /
          (1 + Math.exp(0.311 * (v + 79.23)))
        : 0,
    (v) =>
      low(v)
        ? (0.1212 * Math.exp(-0.01052 * v)) / (1 + Math.exp(-0.1378 * (v + 40.14)))
        : (0.3 * Math.exp(-2.535e-7 * v)) / (1 + Math.exp(-0.1 * (v + 32))),
    (v) => (0.095 * Math.exp(-0.01 * (v - 5))) / (1 + Math.exp(-0.072 * (v - 5))),
    (v) => (0.07 * Math.exp(-0.017 * (v + 44))) / (1 + Math.exp(0.05 * (v + 44))),
    (v) => (0.012 * Math.exp(-0.008 * (v + 28))) / (1 + Math.exp(0.15 * (v + 28))),
    (v) => (0.0065 * Math.exp(-0.02 * (v + 30))) / (1 + Math.exp(-0.2 * (v + 30))),
    (v) => (0.0005 * Math.exp(0.083 * (v + 50))) / (1 + Math.exp(0.057 * (v + 50))),
    (v) => (0.0013 * Math.exp(-0.06 * (v + 20))) / (1 + Math.exp(-0.04 * (v + 20))),
    // Delayed rectifier without its gate, then everything time-independent.
    (v) => {
      const xi =
        v > -100 ? (2.837 * 0.04 * (Math.expm1(0.04 * (v + 77)) / (0.04 * (v + 77)))) / Math.exp(0.04 * (v + 35)) : 1;
      return 0.282 * outsideK * xi * (v - eK);
    },
    (v) => {
      const a = 1.02 / (1 + Math.exp(0.2385 * (v - eK1 - 59.215)));
      const b =
        (0.49124 * Math.exp(0.08032 * (v - eK1 + 5.476)) + Math.exp(0.06175 * (v - eK1 - 594.31))) /
        (1 + Math.exp(-0.5143 * (v - eK1 + 4.753)));
      return 0.6047 * outsideK * (a / (a + b)) * (v - eK1) + (0.0183 * (v - eK1)) / (1 + Math.exp((7.488 - v) / 5.98));
    },
    (v) => 0.03921 * (v + 59.87),
  ];
  const columns = rates.length;
  const table = tabulate(rates);
  const by = unscaled();
  let leakShift = 0;
  return {
    name: 'Luo–Rudy 1991',
    capacitance_uf_cm2: 1,
    stateAt(mv) {
      const r = rates.map((rate) => rate(mv + 1e-9));
      const steady = (k: number): number => r[k]! / (r[k]! + r[k + 1]!);
      return Float64Array.of(mv, steady(0), steady(2), steady(4), steady(6), steady(8), steady(10), 1.784e-4);
    },
    derive(s, out, i0, clamp, command) {
      const v = s[0]!;
      const m = s[1]!;
      const h = s[2]!;
      const j = s[3]!;
      const d = s[4]!;
      const f = s[5]!;
      const x = s[6]!;
      const ca = s[7]!;
      const at = (clampMv(v) - lowestMv) / gridMv;
      const i = at | 0;
      const w = at - i;
      const a = i * columns;
      const b = a + columns;
      const slowInward = by.ca * p.g_si * d * f * (v - (7.7 - 13.0287 * Math.log(ca)));
      const delayed = table[a + 12]! + w * (table[b + 12]! - table[a + 12]!);
      const rectifier = table[a + 13]! + w * (table[b + 13]! - table[a + 13]!);
      const background = table[a + 14]! + w * (table[b + 14]! - table[a + 14]!);
      out[0] =
        i0 +
        clamp * (command - v) -
        by.na * p.g_na * m * m * m * h * j * (v - eNa) -
        slowInward -
        by.k * p.k_factor * (x * delayed + rectifier) -
        by.leak * (background - 0.03921 * leakShift);
      for (let gate = 0; gate < 6; gate++) {
        const open = table[a + 2 * gate]! + w * (table[b + 2 * gate]! - table[a + 2 * gate]!);
        const close = table[a + 2 * gate + 1]! + w * (table[b + 2 * gate + 1]! - table[a + 2 * gate + 1]!);
        const value = s[gate + 1]!;
        out[gate + 1] = p.phi * (open * (1 - value) - close * value);
      }
      out[7] = -1e-4 * slowInward + 0.07 * (1e-4 - ca);
    },
    scale(channel, factor) {
      by[channel] = factor;
    },
    shiftLeak(mv) {
      leakShift = mv;
    },
  };
}

/** No cell at all: a leak between pipette and bath, as when the patch was lost. */
export function leakOnly(g_leak: number, e_leak_mv: number): Model {
  let leakScale = 1;
  let leakShift = 0;
  return {
    name: 'leak',
    capacitance_uf_cm2: 1,
    stateAt: (mv) => Float64Array.of(mv),
    derive(s, out, i0, clamp, command) {
      out[0] = i0 + clamp * (command - s[0]!) - leakScale * g_leak * (s[0]! - e_leak_mv - leakShift);
    },
    scale(channel, factor) {
      if (channel === 'leak') leakScale = factor;
    },
    shiftLeak(mv) {
      leakShift = mv;
    },
  };
}
