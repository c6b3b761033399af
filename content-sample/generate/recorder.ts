/**
 * The electrode and everything behind it: access resistance, bridge, pipette capacitance, junction potential, filter,
 * noise, hum, drift, gain, digitizer. Takes a model and a plan, gives what a file would hold, and keeps the truth.
 */
import { integrator, settle } from './integrate.ts';
import type { Model } from './models.ts';
import { levels, type SweepPlan } from './protocol.ts';
import type { Random } from './random.ts';

/** The grid of all simulation: 10 µs. Sampling rates must divide it. */
export const fineHz = 100_000;
const dtMs = 1000 / fineHz;

export interface Bench {
  /** Membrane area, cm². */
  area_cm2: number;
  /** Resistance between the amplifier and the cell's inside. */
  access_mohm: number;
  /** What the bridge takes away. */
  bridge_mohm: number;
  /** Pipette capacitance that the amplifier leaves. */
  pipette_pf: number;
  /** What stands on the reading besides the membrane: junction potential still in it and electrode offset, mV. */
  reading_offset_mv: number;
  /** Slow change of that offset within the sweep, mV/s. */
  drift_mv_per_s: number;
  /** Root-mean-square of the wide-band noise after the filter, mV. */
  noise_mv: number;
  /** Root-mean-square of the slow (1/f-like) part, mV. */
  wander_mv: number;
  hum_mv: number;
  hum_hz: number;
  filter_khz: number;
  rate_hz: number;
  /** Size of one step of the digitizer, mV and pA. */
  quantum_mv: number;
  quantum_pa: number;
  /** What the digitizer can hold, mV. */
  low_mv: number;
  high_mv: number;
  /** Fluctuating membrane current (channels, synapses), µA/cm², correlation time 3 ms. */
  membrane_noise: number;
  /** Current channel: a clean copy of the command, or measured, with noise (pA) and an offset (pA). */
  current_noise_pa: number;
  current_offset_pa: number;
  /** Voltage clamp: noise of the measured current after the filter, and its digitizer's step, pA. */
  clamp_noise_pa: number;
  clamp_quantum_pa: number;
}

export interface RecordedSweep {
  plan: SweepPlan;
  rate_hz: number;
  /** Voltage (current clamp: measured; voltage clamp: command) and current, in steps of the digitizer. */
  voltage: Int16Array;
  current: Int16Array;
  quantum_mv: number;
  quantum_pa: number;
  /** Truth: spikes of the membrane itself, and its potential before the stimulus. */
  spikes: number;
  baseline_mv: number;
  peak_mv: number;
  trough_mv: number;
  access_mohm: number;
}

/** A causal filter that is fed sample by sample. */
export type Filter = (x: number) => number;

/**
 * Four-pole Bessel low-pass with its −3 dB point at the corner, started as if its first sample had stood there for ever.
 * Sections at 1.4302 (Q 0.5219) and 1.6034 (Q 0.8055) times the corner, by the bilinear transform: the tabulated
 * normalized Bessel poles (from memory; the test measures the corner).
 */
export function bessel4(corner_hz: number, rate_hz: number): Filter {
  const section = (corner: number, q: number): [number, number, number] => {
    const w = Math.tan((Math.PI * Math.min(corner, 0.49 * rate_hz)) / rate_hz);
    const norm = 1 / (1 + w / q + w * w);
    return [w * w * norm, 2 * (w * w - 1) * norm, (1 - w / q + w * w) * norm];
  };
  const [b0, a1, a2] = section(1.4302 * corner_hz, 0.5219);
  const [c0, d1, d2] = section(1.6034 * corner_hz, 0.8055);
  // Delays in a typed array: updated in place.
  const z = new Float64Array(4);
  let started = false;
  return (x) => {
    if (!started) {
      started = true;
      z[0] = x * (1 - b0);
      z[1] = x * (b0 - a2);
      z[2] = x * (1 - c0);
      z[3] = x * (c0 - d2);
    }
    const y = b0 * x + z[0]!;
    z[0] = 2 * b0 * x - a1 * y + z[1]!;
    z[1] = b0 * x - a2 * y;
    const out = c0 * y + z[2]!;
    z[2] = 2 * c0 * y - d1 * out + z[3]!;
    z[3] = c0 * y - d2 * out;
    return out;
  };
}

/** Counts spikes: prominence of at least `prominence_mv` and a rise faster than `rise` V/s, on the membrane itself. */
export function spikeCounter(prominence_mv: number, rise_v_per_s: number) {
  // low, high, steepest, previous sample.
  const s = Float64Array.of(Infinity, -Infinity, 0, 0);
  let rising = true;
  let begun = false;
  let count = 0;
  return {
    add(mv: number): void {
      const slope = begun ? (mv - s[3]!) / dtMs : 0;
      begun = true;
      s[3] = mv;
      if (rising) {
        if (mv < s[0]!) {
          s[0] = mv;
          s[1] = mv;
          s[2] = 0;
        } else {
          if (slope > s[2]!) s[2] = slope;
          if (mv > s[1]!) s[1] = mv;
          if (s[1]! - s[0]! >= prominence_mv && mv < s[1]! - prominence_mv / 2) {
            if (s[2]! >= rise_v_per_s) count++;
            rising = false;
            s[0] = mv;
          }
        }
      } else if (mv < s[0]!) s[0] = mv;
      else if (mv > s[0]! + 2) {
        rising = true;
        s[1] = mv;
        s[2] = Math.max(0, slope);
      }
    },
    count: () => count,
  };
}

/**
 * Runs one cell through its sweeps in order; the membrane's state is carried from sweep to sweep after a rest.
 * @param slow heart-like cells: spikes are told by 40 mV of prominence and 5 V/s
 */
export function session(first: Model, from_mv: number, slow: boolean, random: Random) {
  let model = first;
  let rested = settle(model, from_mv, slow ? 1500 : 800);
  let clockS = 0;
  return {
    restingMv: () => rested[0]!,
    /** Goes on with another model of the same states: another bath. */
    use(next: Model): void {
      model = next;
    },
    /** Lets the membrane find its rest again, after a drug or another change. */
    rest(ms: number): void {
      const run = integrator(model, rested);
      for (let k = 0; k < ms / dtMs; k++) run.step(dtMs, 0, 0, 0);
      rested = Float64Array.from(run.state);
    },
    /** @param at_s when the sweep starts, s since the session began: sets the phase of the hum */
    record(plan: SweepPlan, bench: Bench, at_s: number, keepState: boolean): RecordedSweep {
      clockS = at_s;
      return plan.clamp === 'current' ? inCurrentClamp(plan, bench, keepState) : inVoltageClamp(plan, bench);
    },
  };

  function inCurrentClamp(plan: SweepPlan, bench: Bench, keepState: boolean): RecordedSweep {
    const command = levels(plan, fineHz);
    const every = stride(bench.rate_hz);
    const n = Math.floor(command.length / every);
    const voltage = new Int16Array(n);
    const current = new Int16Array(n);
    const run = integrator(model, rested);
    const state = run.state;
    const filter = bessel4(bench.filter_khz * 1000, fineHz);
    const noise = noiseSource(bench, random, clockS);
    const toDensity = 1e-6 / bench.area_cm2;
    const tau = bench.access_mohm * bench.pipette_pf * 1e-3; // MΩ·pF = µs
    const decay = tau > 0 ? Math.exp(-dtMs / tau) : 0;
    // The membrane's fluctuation is renewed every ten steps, well within its 3 ms.
    const ouDecay = Math.exp((-10 * dtMs) / 3);
    const ouKick = bench.membrane_noise * Math.sqrt(1 - ouDecay * ouDecay);
    let fluctuation = 0;
    let pipetteMv = state[0]! + bench.access_mohm * command[0]! * 1e-3;
    const counter = slow ? spikeCounter(40, 5) : spikeCounter(20, 20);
    // Bench settling: the holding current flows before the sweep is written.
    if (plan.holding !== 0) for (let k = 0; k < 0.15 * fineHz; k++) run.step(dtMs, plan.holding * toDensity, 0, 0);
    const firstPiece = plan.pieces.length > 0 ? Math.round(plan.pieces[0]!.from_s * fineHz) : command.length;
    let baselineSum = 0;
    let peak = -Infinity;
    let trough = Infinity;
    for (let k = 0; k < command.length; k++) {
      const injected = command[k]!;
      const settled = state[0]! + bench.access_mohm * injected * 1e-3;
      const next = settled + (pipetteMv - settled) * decay;
      // Charge that the pipette wall takes does not reach the cell: pF·mV/ms = pA.
      const intoCell = injected - (bench.pipette_pf * (next - pipetteMv)) / dtMs;
      pipetteMv = next;
      if (k % 10 === 0) fluctuation = fluctuation * ouDecay + ouKick * random.normal();
      run.step(dtMs, intoCell * toDensity + fluctuation, 0, 0);
      const v = state[0]!;
      counter.add(v);
      if (v > peak) peak = v;
      if (v < trough) trough = v;
      if (k < firstPiece) baselineSum += v;
      const read = filter(
        pipetteMv -
          bench.bridge_mohm * injected * 1e-3 +
          bench.reading_offset_mv +
          bench.drift_mv_per_s * (k / fineHz) +
          noise(),
      );
      if (k % every === 0) {
        const at = k / every;
        if (at < n) {
          voltage[at] = digitize(read, bench.quantum_mv, bench.low_mv, bench.high_mv);
          const measured =
            bench.current_noise_pa > 0
              ? injected + bench.current_offset_pa + bench.current_noise_pa * random.normal()
              : injected;
          current[at] = digitize(measured, bench.quantum_pa, -32767 * bench.quantum_pa, 32767 * bench.quantum_pa);
        }
      }
    }
    if (keepState) rested = Float64Array.from(state);
    return {
      plan,
      rate_hz: bench.rate_hz,
      voltage,
      current,
      quantum_mv: bench.quantum_mv,
      quantum_pa: bench.quantum_pa,
      spikes: counter.count(),
      baseline_mv: baselineSum / Math.max(1, firstPiece),
      peak_mv: peak,
      trough_mv: trough,
      access_mohm: bench.access_mohm,
    };
  }

  function inVoltageClamp(plan: SweepPlan, bench: Bench): RecordedSweep {
    const command = levels(plan, fineHz);
    const every = stride(bench.rate_hz);
    const n = Math.floor(command.length / every);
    const voltage = new Int16Array(n);
    const current = new Int16Array(n);
    const run = integrator(model, rested);
    const filter = bessel4(bench.filter_khz * 1000, fineHz);
    const toDensity = 1e-6 / bench.area_cm2;
    // 1/MΩ = 1000 pA/mV.
    const coupling = (1000 / bench.access_mohm) * toDensity;
    const white = bench.clamp_noise_pa * whiteFactor(bench.filter_khz);
    for (let k = 0; k < 0.2 * fineHz; k++) run.step(dtMs, 0, coupling, command[0]! - bench.reading_offset_mv);
    let baselineSum = 0;
    const firstPiece = plan.pieces.length > 0 ? Math.round(plan.pieces[0]!.from_s * fineHz) : command.length;
    for (let k = 0; k < command.length; k++) {
      const membraneCommand = command[k]! - bench.reading_offset_mv;
      const flowing = ((membraneCommand - run.state[0]!) * 1000) / bench.access_mohm;
      run.step(dtMs, 0, coupling, membraneCommand);
      if (k < firstPiece) baselineSum += run.state[0]!;
      const read = filter(flowing + white * random.normal());
      if (k % every === 0 && k / every < n) {
        voltage[k / every] = digitize(command[k]!, bench.quantum_mv, bench.low_mv, bench.high_mv);
        const limit = 32767 * bench.clamp_quantum_pa;
        current[k / every] = digitize(read, bench.clamp_quantum_pa, -limit, limit);
      }
    }
    return {
      plan,
      rate_hz: bench.rate_hz,
      voltage,
      current,
      quantum_mv: bench.quantum_mv,
      quantum_pa: bench.clamp_quantum_pa,
      spikes: 0,
      baseline_mv: baselineSum / Math.max(1, firstPiece),
      peak_mv: Number.NaN,
      trough_mv: Number.NaN,
      access_mohm: bench.access_mohm,
    };
  }
}

function stride(rate_hz: number): number {
  const every = fineHz / rate_hz;
  if (!Number.isInteger(every))
    throw new RangeError(`a sampling rate must divide ${fineHz} Hz evenly, got ${rate_hz} Hz`);
  return every;
}

const digitize = (value: number, quantum: number, low: number, high: number): number =>
  Math.max(-32767, Math.min(32767, Math.round(Math.max(low, Math.min(high, value)) / quantum)));

/** White noise that has the wanted size after the filter, three slow noises, hum with its third harmonic. */
function noiseSource(bench: Bench, random: Random, from_s: number): () => number {
  const white = bench.noise_mv * whiteFactor(bench.filter_khz);
  const each = bench.wander_mv / Math.sqrt(3);
  // Slow noises are renewed every 16 steps: correlation times 10 ms, 100 ms and 1 s stand for 1/f.
  const every = 16;
  const decays = [0.01, 0.1, 1].map((tau) => Math.exp(-every / (fineHz * tau)));
  const kicks = decays.map((decay) => each * Math.sqrt(1 - decay * decay));
  const slow = Float64Array.from(decays, () => each * random.normal());
  const omega = 2 * Math.PI * bench.hum_hz;
  const phase = omega * from_s + 2 * Math.PI * random.uniform();
  // Sine and cosine of the hum turned step by step, and the sum of the slow noises.
  const s = Float64Array.of(Math.sin(phase), Math.cos(phase), slow[0]! + slow[1]! + slow[2]!);
  const turnSin = Math.sin(omega / fineHz);
  const turnCos = Math.cos(omega / fineHz);
  let k = 0;
  return () => {
    if (k++ % every === 0) {
      for (let i = 0; i < 3; i++) slow[i] = slow[i]! * decays[i]! + kicks[i]! * random.normal();
      s[2] = slow[0]! + slow[1]! + slow[2]!;
    }
    const sine = s[0]!;
    s[0] = sine * turnCos + s[1]! * turnSin;
    s[1] = s[1]! * turnCos - sine * turnSin;
    return white * random.normal() + s[2]! + bench.hum_mv * (sine + 0.25 * sine * (3 - 4 * sine * sine));
  };
}

/**
 * How much larger white noise on the fine grid must be to have a wanted size behind the filter. The noise bandwidth of
 * a 4-pole Bessel filter is about 1.05 times its corner (the test measures the result).
 */
function whiteFactor(filter_khz: number): number {
  return Math.sqrt(fineHz / 2 / Math.min(fineHz / 2, 1.05 * filter_khz * 1000));
}
