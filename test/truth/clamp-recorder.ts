/**
 * A voltage clamp of our own for the truth bench, independent of the code under test: amplifier, electrode, cell and
 * filter integrated together by the classical Runge–Kutta method at 1 MHz, then noise, hum, drift and sampling.
 */
import { normalNoise } from '../helpers/models.ts';
import { bessel, fineHz } from './recorder.ts';

export interface Circuit {
  name: string;
  access_mohm: number;
  /** 0: nothing behind the access, an open pipette or a seal whose resistance `membrane_mohm` is. */
  pf: number;
  membrane_mohm: number;
}

export interface Rig {
  name: string;
  rate_hz: number;
  filter_khz: number;
  filter_stated: boolean;
  noise_pa: number;
  pulse_mv: number;
  pulse_ms: number;
  pulses: number;
  /** Pipette capacitance that was not neutralized, pF. */
  pipette_pf: number;
  /** Time constant of the command itself, µs; the file holds the command as it was asked for. */
  command_us: number;
  /** The command changes this long before the first sample that shows it, µs. */
  phase_us: number;
  hum_pa: number;
  drift_pa_per_s: number;
  /** Share of the access that the amplifier corrects, with its lag of 10 µs. */
  correction: number;
  /** Share of the cell's capacitive transient that the amplifier takes away, and how far its time constant is off. */
  transient_taken: number;
  taken_tau: number;
}

const stepHz = 1_000_000;

/** Current of the clamped circuit behind the filter, pA, on the fine grid, for steps of the command of `mv`. */
export function clampCurrent(
  circuit: Circuit,
  rig: Rig,
  edges: readonly { at_s: number; mv: number }[],
  seconds: number,
): Float64Array {
  const n = Math.round(seconds * stepHz);
  const dt = 1000 / stepHz; // ms
  const { access_mohm: ra, membrane_mohm: rm, pf } = circuit;
  const lag = Math.max(rig.command_us, 2) / 1000;
  const total = pf === 0 ? rm : 0;
  // Taken away: a share of the transient of the uncorrected circuit, through an exponential of its own.
  const trueTau = (pf / 1000) * ((ra * rm) / (ra + rm));
  const takenTau = Math.max(trueTau * rig.taken_tau, 0.01);
  // State: command, membrane, corrected feedback, taken transient, four of the filter. mV, pA, ms.
  const w = (2 * Math.PI * rig.filter_khz) / 2.11391767490422;
  const sections = [
    [2.8962106028, 0.8672341289],
    [2.1037893972, 2.6574180418],
  ].map(([re, im]) => ({ b: 2 * re! * w, c: (re! * re! + im! * im!) * w * w }));
  const size = 8;
  const y = new Float64Array(size);
  const k = Array.from({ length: 4 }, () => new Float64Array(size));
  const mid = new Float64Array(size);
  let target = 0;
  const slope = (s: Float64Array, into: Float64Array): void => {
    const vc = s[0]! + s[2]!;
    const dvc = (target - s[0]!) / lag;
    const cell = (1000 * (vc - (pf === 0 ? 0 : s[1]!))) / (pf === 0 ? total : ra);
    const current = cell + rig.pipette_pf * dvc - rig.transient_taken * s[3]!;
    into[0] = dvc;
    into[1] = pf === 0 ? 0 : (cell - (1000 * s[1]!) / rm) / pf;
    into[2] = (rig.correction * ra * cell * 1e-3 - s[2]!) / 0.01;
    const height = pf === 0 ? 0 : (1000 * rm) / (ra * (ra + rm));
    into[3] = height * dvc - s[3]! / takenTau;
    into[4] = s[5]!;
    into[5] = sections[0]!.c * (current - s[4]!) - sections[0]!.b * s[5]!;
    into[6] = s[7]!;
    into[7] = sections[1]!.c * (s[4]! - s[6]!) - sections[1]!.b * s[7]!;
  };
  const out = new Float64Array(n);
  let next = 0;
  for (let i = 0; i < n; i++) {
    out[i] = y[6]!;
    while (next < edges.length && i >= Math.round(edges[next]!.at_s * stepHz)) target += edges[next++]!.mv;
    slope(y, k[0]!);
    for (let stage = 1; stage < 4; stage++) {
      const by = stage === 3 ? dt : dt / 2;
      for (let j = 0; j < size; j++) mid[j] = y[j]! + by * k[stage - 1]![j]!;
      slope(mid, k[stage]!);
    }
    for (let j = 0; j < size; j++) y[j]! += (dt / 6) * (k[0]![j]! + 2 * k[1]![j]! + 2 * k[2]![j]! + k[3]![j]!);
  }
  return out;
}

/** What the file would hold: the command as asked for and the recorded current. */
export function recordClamp(
  circuit: Circuit,
  rig: Rig,
  seed: number,
): { command: Float64Array; current: Float64Array; seconds: number; holding_pa: number } {
  const { edges, seconds } = protocol(rig);
  const fine = clampCurrent(circuit, rig, edges, seconds);
  const n = Math.round(seconds * rig.rate_hz);
  const noise = colouredNoise(rig, n, seed);
  const phase = 3 * (noise[0]! / (rig.noise_pa || 1));
  const holding_pa = -40;
  const command = new Float64Array(n).fill(-70);
  const current = new Float64Array(n);
  const each = stepHz / rig.rate_hz;
  for (let i = 0; i < n; i++) {
    const t = i / rig.rate_hz;
    current[i] =
      holding_pa +
      fine[Math.round(i * each)]! +
      noise[i]! +
      rig.hum_pa * Math.sin(2 * Math.PI * 50 * t + phase) +
      rig.drift_pa_per_s * t;
    for (const { at_s, mv } of edges) if (t >= at_s - 1e-9) command[i]! += mv;
  }
  return { command, current, seconds, holding_pa };
}

/** Pulses at a distance of three lengths, at least 30 ms; the command moves `phase_us` before a sample. */
export function protocol(rig: Rig): { edges: { at_s: number; mv: number }[]; seconds: number } {
  const length = rig.pulse_ms / 1000;
  const gap = Math.max(0.03, 2 * length);
  // Whole samples, so that the file’s command is what was asked for at the sample that shows it.
  const shift = rig.phase_us * 1e-6;
  const edges = Array.from({ length: rig.pulses }, (_, p) => {
    const from = 0.05 + p * (length + gap);
    return [
      { at_s: from - shift, mv: rig.pulse_mv },
      { at_s: from + length - shift, mv: -rig.pulse_mv },
    ];
  }).flat();
  return { edges, seconds: 0.05 + rig.pulses * (length + gap) };
}

/** White noise through the recorder's filter, scaled to its root-mean-square. */
function colouredNoise(rig: Rig, n: number, seed: number): Float64Array {
  const each = fineHz / rig.rate_hz;
  const random = normalNoise(seed);
  const lead = 2000;
  const through = bessel(Float64Array.from({ length: n * each + lead }, random), rig.filter_khz * 1000);
  let squares = 0;
  for (let i = lead; i < through.length; i++) squares += through[i]! ** 2;
  const scale = rig.noise_pa / Math.sqrt(squares / (through.length - lead));
  return Float64Array.from({ length: n }, (_, i) => through[lead + i * each]! * scale);
}
