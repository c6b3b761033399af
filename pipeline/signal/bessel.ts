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
export const besselCorner = 2.11391767490422;

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
  const product = [conjugate(pole), other, conjugate(other)].map((one) => minus(pole, one)).reduce(times);
  return over({ re: 105, im: 0 }, product);
});

/** What the filter makes of an impulse, a step and a decaying step at one time, and how it changes with its arguments. */
export interface FilteredStep {
  /** Output for a unit impulse, 1/ms, and its slope, 1/ms². */
  impulse: number;
  impulseSlope: number;
  /** Output for a unit step. */
  step: number;
  /** Output for a unit step that decays as exp(−t/tau), and its derivative by ln tau. */
  decay: number;
  decayByLogTau: number;
}

export interface LowPass {
  /** Fills `into` with the outputs at a time, ms, after the edge; all 0 before it. */
  at(ms: number, tau_ms: number, into: FilteredStep): void;
}

/** @param cornerKhz frequency of −3 dB, kHz, above 0 */
export function besselLowPass(cornerKhz: number): LowPass {
  if (!(cornerKhz > 0 && Number.isFinite(cornerKhz)))
    throw new RangeError(`cornerKhz must be a finite frequency above 0 kHz, got ${cornerKhz}`);
  const rate = (2 * Math.PI * cornerKhz) / besselCorner;
  const p = poles.map(({ re, im }) => ({ re: re * rate, im: im * rate }));
  const r = residues.map(({ re, im }) => ({ re: re * rate, im: im * rate }));
  // Flat, eight numbers a pole: fits ask for millions of values.
  const flat = Float64Array.from(
    p.flatMap((pole, k) => {
      const [stepWeight, slopeWeight] = [over(r[k]!, pole), times(r[k]!, pole)];
      const own = r[k]!;
      return [pole.re, pole.im, own.re, own.im, slopeWeight.re, slopeWeight.im, stepWeight.re, stepWeight.im];
    }),
  );
  // By partial fractions the decaying step is Σ w·(exp(pt) − exp(−t/tau)) with w = r/(p + 1/tau).
  let heldTau = Number.NaN;
  const byTau = new Float64Array(8);
  let gain = 1;
  let gainSlope = 0;
  const prepare = (tau: number): void => {
    if (tau === heldTau) return;
    heldTau = tau;
    const shifted = p.map((pole) => ({ re: pole.re + 1 / tau, im: pole.im }));
    const once = shifted.map((own, k) => over(r[k]!, own));
    const twice = shifted.map((own, k) => over(once[k]!, own));
    byTau.set(once.flatMap((own, k) => [own.re, own.im, twice[k]!.re, twice[k]!.im]));
    gain = -2 * (once[0]!.re + once[1]!.re);
    gainSlope = 2 * (twice[0]!.re + twice[1]!.re);
  };
  // Here the filter's own response is below 10⁻⁸ of a step.
  const settled = 20 / -p[1]!.re;
  return {
    at(ms, tau, into) {
      into.impulse = 0;
      into.impulseSlope = 0;
      into.step = 0;
      into.decay = 0;
      into.decayByLogTau = 0;
      if (ms <= 0) return;
      prepare(tau);
      const late = Math.exp(-ms / tau);
      into.step = 1;
      into.decay = gain * late;
      let byRate = (gainSlope - gain * ms) * late;
      if (ms < settled)
        for (let k = 0; k < 2; k++) {
          const pole = 8 * k;
          const at = 4 * k;
          const size = 2 * Math.exp(flat[pole]! * ms);
          const angle = flat[pole + 1]! * ms;
          const c = size * Math.cos(angle);
          const s = size * Math.sin(angle);
          into.impulse += flat[pole + 2]! * c - flat[pole + 3]! * s;
          into.impulseSlope += flat[pole + 4]! * c - flat[pole + 5]! * s;
          into.step += flat[pole + 6]! * c - flat[pole + 7]! * s;
          into.decay += byTau[at]! * c - byTau[at + 1]! * s;
          byRate -= byTau[at + 2]! * c - byTau[at + 3]! * s;
        }
      into.decayByLogTau = -byRate / tau;
    },
  };
}

/** No filter at all: the sample at the edge already holds the whole step. */
export const noLowPass: LowPass = {
  at(ms, tau, into) {
    const after = ms >= -1e-7;
    into.impulse = 0;
    into.impulseSlope = 0;
    into.step = after ? 1 : 0;
    into.decay = after ? Math.exp(-Math.max(0, ms) / tau) : 0;
    into.decayByLogTau = after ? (Math.max(0, ms) / tau) * into.decay : 0;
  },
};
