import { type ExponentialSum, type ExponentialTerm, exponentialSum, sumAt, tauError } from '../signal/exponentials.ts';
import { serialLine } from '../signal/serial.ts';

/** The response after an edge of the stimulus, carried back to the edge. */
export interface EdgeValue {
  mv: number;
  se: number;
  freedom: number;
  /** How far the response goes on from there, in the unit of the response. */
  rise: number;
  /** What was fitted: 0 a line, else the number of exponentials. */
  terms: number;
  /** Time constant of the electrode's own charging, where the response shows it. */
  electrode_ms: number | null;
  /** The part of `se` that all edges of a cell share: what the delays of filter and electrode may do. */
  lag_se: number;
  /** A fast part may be the electrode's or the cell's; half of it counts as uncertainty. */
  doubtful: boolean;
}

export interface EdgeOptions {
  /** Delay of the recorder's filter and its standard uncertainty, ms. */
  delay_ms: number;
  delay_se_ms: number;
  /** Nothing before this is looked at: the filter is still on its way, ms. */
  from_ms: number;
  /** Lengths of the fitted stretch, the longest first: a response that is no sum of exponentials fits only a short one. */
  windows_ms: readonly number[];
}

/** A charging faster than this is the electrode's (100 MΩ and 6 pF), ms; a membrane with its nearest dendrites takes longer. */
export const electrodeLimit_ms = 0.6;
/** Time constants within this factor of the limit may be either's: the fast part then counts as uncertainty. */
const doubtfulFactor = 1.2;
/**
 * The electrode's own charging with τ_e = R_a·C_p makes the slow part of the response late by 2 τ_e: the membrane's
 * current begins τ_e late, and the drop over R_a lacks the current that goes on charging C_p, I·C_p/C, which is as much
 * again (linear circuit theory, to first order in τ_e/τ_m).
 */
const lateBy = 2;
/** Where it is too fast to be seen: 1 pF behind 12 MΩ, common values, ms. */
const unseenElectrode_ms = 0.012 * lateBy;
/** A second exponential is taken where F exceeds this: about 1 in 1000 by chance. */
export const secondTermF = 7;

/**
 * Value at the edge of the response that follows it: one exponential with an offset, or two where the second makes the
 * fit better (F > 7 on slow-noise terms), or a straight line where no time constant can be told. The longest of the
 * windows in which the residuals look like noise is taken. An exponential faster than 0.6 ms is the electrode's own
 * charging: it is left out, and the rest carried back to the edge plus twice that time. Null where none of this fits.
 * @param ms times from the edge, ascending. @param mv the response there (mV, or mV/pA)
 */
export function backToEdge(ms: ArrayLike<number>, mv: ArrayLike<number>, options: EdgeOptions): EdgeValue | null {
  for (const [k, window] of options.windows_ms.entries()) {
    const x: number[] = [];
    const y: number[] = [];
    for (let i = 0; i < ms.length; i++) {
      const time = ms[i]! - options.delay_ms;
      if (ms[i]! >= options.from_ms && time <= window && Number.isFinite(mv[i]!)) {
        x.push(time);
        y.push(mv[i]!);
      }
    }
    // The response is shorter than the next window: that one sees the same.
    if (k + 1 < options.windows_ms.length && (x.at(-1) ?? 0) <= options.windows_ms[k + 1]!) continue;
    const found = fitted(x, y, Math.hypot(options.delay_se_ms, unseenElectrode_ms));
    if (found) return found;
  }
  return null;
}

function fitted(x: number[], y: number[], delay_se_ms: number): EdgeValue | null {
  if (x.length < 10) return null;
  const span = x.at(-1)! - x[0]!;
  const slow = [1.2, 6 * span] as const;
  const one = exponentialSum(x, y, { slow });
  // A membrane this fast has answered most of the way before anything can be seen of it.
  const seen = (fit: ExponentialSum): boolean => {
    const own = fit.terms.filter((term) => term.tau >= electrodeLimit_ms);
    return Math.min(...own.map((term) => term.tau)) >= 1.6 * x[0]!;
  };
  const two = exponentialSum(x, y, { slow: [1.2, 3 * span], fast: [0.08, Math.min(12, span / 2)] });
  if (two?.converged && isSecondTermReal(one, two) && looksLikeNoise(x, two.residuals))
    return seen(two) ? ofTwo(two, delay_se_ms) : null;
  if (one?.converged && looksLikeNoise(x, one.residuals)) {
    if (!seen(one)) return null;
    const { value, se } = sumAt(one, 0);
    const { amplitude, tau } = one.terms[0]!;
    const lag_se = Math.abs(amplitude / tau) * delay_se_ms;
    return {
      mv: value,
      se: Math.hypot(se, lag_se),
      lag_se,
      freedom: one.freedom,
      rise: -amplitude,
      terms: 1,
      electrode_ms: null,
      doubtful: false,
    };
  }
  const line = serialLine(x, y);
  if (!line || line.se_intercept === null) return null;
  const residuals = Float64Array.from(x, (time, i) => y[i]! - line.intercept - line.slope * time);
  if (!looksLikeNoise(x, residuals)) return null;
  return {
    mv: line.intercept,
    se: Math.hypot(line.se_intercept, line.slope * delay_se_ms),
    lag_se: Math.abs(line.slope * delay_se_ms),
    freedom: line.freedom,
    rise: line.slope * x.at(-1)!,
    terms: 0,
    electrode_ms: null,
    doubtful: false,
  };
}

function isSecondTermReal(one: ExponentialSum | null, two: ExponentialSum): boolean {
  if (!one) return true;
  const [slow, fast] = two.terms as [ExponentialTerm, ExponentialTerm];
  if (slow.tau < 1.8 * fast.tau) return false;
  // What one exponential leaves of a clean trace is rounding.
  if (Math.sqrt(one.rss / one.n) < 1e-6 * Math.abs(one.terms[0]!.amplitude)) return false;
  const f = (one.rss - two.rss) / 2 / ((two.rss / (two.n - 5)) * two.correlation);
  return f > secondTermF;
}

function ofTwo(fit: ExponentialSum, delay_se_ms: number): EdgeValue {
  const [slow, fast] = fit.terms as [ExponentialTerm, ExponentialTerm];
  const electrodes = fast.tau < electrodeLimit_ms;
  const { value, se } = electrodes ? sumAt(fit, lateBy * fast.tau, 1) : sumAt(fit, 0);
  const slope = slow.amplitude / slow.tau + (electrodes ? 0 : fast.amplitude / fast.tau);
  const apart = Math.abs(Math.log(fast.tau / electrodeLimit_ms));
  const doubtful = apart < Math.log(doubtfulFactor) || apart < (2 * tauError(fit, 1)) / fast.tau;
  const doubt = doubtful ? fast.amplitude / 2 : 0;
  return {
    mv: value,
    se: Math.hypot(se, slope * delay_se_ms, doubt),
    lag_se: Math.abs(slope * delay_se_ms),
    freedom: fit.freedom,
    rise: -slow.amplitude - (electrodes ? 0 : fast.amplitude),
    terms: 2,
    electrode_ms: electrodes ? fast.tau : null,
    doubtful,
  };
}

/**
 * Whether residuals show no shape that the fit has missed: their variance against that of their differences two samples
 * apart (von Neumann 1941, Ann Math Stat 12:367–395; from memory), and their means over the first 2 and 6 ms.
 */
function looksLikeNoise(x: readonly number[], residuals: Float64Array): boolean {
  const n = residuals.length;
  let power = 0;
  let differences = 0;
  for (let i = 0; i < n; i++) power += residuals[i]! ** 2;
  for (let i = 2; i < n; i++) differences += (residuals[i]! - residuals[i - 2]!) ** 2;
  const fast = differences / (2 * (n - 2));
  const size = Math.sqrt(power / n);
  // Rounding to ten-thousandths of a millivolt is no shape.
  if (size < 2e-4) return true;
  if (power / n > fast * (1 + 4 / Math.sqrt(n)) * 1.5) return false;
  return [2, 6].every((reach) => {
    const count = x.filter((time) => time - x[0]! < reach).length;
    if (count < 3 || count > n / 2) return true;
    let sum = 0;
    for (let i = 0; i < count; i++) sum += residuals[i]!;
    return Math.abs(sum / count) <= (3.5 * size) / Math.sqrt(count);
  });
}
