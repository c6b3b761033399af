/**
 * Four-pole Bessel low-pass, the usual filter of a recorder, in closed form: what comes out of it for an impulse, a step
 * and a step that decays.
 */

/**
 * Poles of the filter at a group delay of 1: roots of s⁴ + 10s³ + 45s² + 105s + 105, one of each conjugate pair, and the
 * frequency of −3 dB in that scaling (Thomson 1949, Proc IEE 96:487–490; from memory). Equal to SciPy
 * `signal.bessel(4, …, norm='mag')`.
 */
const poles = [
  { re: -2.896210602820372, im: 0.8672341289345038 },
  { re: -2.103789397179628, im: 2.6574180418567526 },
] as const;
const corner = 2.11391767490422;

interface Complex {
  re: number;
  im: number;
}
const times = (a: Complex, b: Complex): Complex => ({ re: a.re * b.re - a.im * b.im, im: a.re * b.im + a.im * b.re });
const over = (a: Complex, b: Complex): Complex => {
  const size = b.re * b.re + b.im * b.im;
  return { re: (a.re * b.re + a.im * b.im) / size, im: (a.im * b.re - a.re * b.im) / size };
};
const minus = (a: Complex, b: Complex): Complex => ({ re: a.re - b.re, im: a.im - b.im });
const conjugate = (a: Complex): Complex => ({ re: a.re, im: -a.im });

/** Residues of 105/(s⁴ + …) at the two poles above: H(s) = Σ r/(s − p) over all four. */
const residues = poles.map((pole, k) => {
  const other = poles[1 - k]!;
  const product = [conjugate(pole), other, conjugate(other)]
    .map((one) => minus(pole, one))
    .reduce(times);
  return over({ re: 105, im: 0 }, product);
});

export interface BesselLowPass {
  /** Output at a time after a unit impulse (1/ms), a unit step, and a step that decays as exp(−t/tau). 0 before it. */
  impulse(ms: number): number;
  step(ms: number): number;
  decay(ms: number, tau_ms: number): number;
  /** From here on, ms, the filter’s own response is below 10⁻⁷ of a step. */
  settled_ms: number;
  /** Gain for a decaying exponential: what `decay` tends to is this times exp(−t/tau). */
  gainOfDecay(tau_ms: number): number;
}

/** @param cornerKhz frequency of −3 dB, kHz, above 0 */
export function besselLowPass(cornerKhz: number): BesselLowPass {
  if (!(cornerKhz > 0 && Number.isFinite(cornerKhz)))
    throw new RangeError(`cornerKhz must be a finite frequency above 0 kHz, got ${cornerKhz}`);
  const rate = (2 * Math.PI * cornerKhz) / corner;
  const p = poles.map(({ re, im }) => ({ re: re * rate, im: im * rate }));
  const r = residues.map(({ re, im }) => ({ re: re * rate, im: im * rate }));
  const stepWeights = p.map((pole, k) => over(r[k]!, pole));
  /** Twice the real part of Σ w·exp(p·t): both of each conjugate pair. */
  const sum = (weights: readonly Complex[], ms: number): number => {
    let total = 0;
    for (let k = 0; k < 2; k++) {
      const size = Math.exp(p[k]!.re * ms);
      const angle = p[k]!.im * ms;
      total += 2 * size * (weights[k]!.re * Math.cos(angle) - weights[k]!.im * Math.sin(angle));
    }
    return total;
  };
  let heldTau = Number.NaN;
  let decayWeights: Complex[] = [];
  let gain = 1;
  const prepare = (tau: number): void => {
    if (tau === heldTau) return;
    heldTau = tau;
    decayWeights = p.map((pole, k) => over(r[k]!, { re: pole.re + 1 / tau, im: pole.im }));
    gain = -2 * (decayWeights[0]!.re + decayWeights[1]!.re);
  };
  return {
    impulse: (ms) => (ms <= 0 ? 0 : sum(r, ms)),
    step: (ms) => (ms <= 0 ? 0 : 1 + sum(stepWeights, ms)),
    decay(ms, tau) {
      if (ms <= 0) return 0;
      prepare(tau);
      return sum(decayWeights, ms) + gain * Math.exp(-ms / tau);
    },
    settled_ms: 18 / -p[1]!.re,
    gainOfDecay(tau) {
      prepare(tau);
      return gain;
    },
  };
}
