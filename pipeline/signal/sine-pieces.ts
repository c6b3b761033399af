/**
 * A sine in pieces of one recording, each piece with a level and a slope of its own: mains hum between spikes and
 * stimuli. The pieces lie on one grid, so that the sine keeps its phase across the gaps.
 */
import { requireRate } from './derivative.ts';
import { goldenMinimum } from './exponential.ts';

/** Consecutive finite samples; `from` is the index of the first on the common grid. */
export interface Piece {
  from: number;
  samples: Float64Array;
}

export interface PiecesFit {
  frequency_hz: number;
  amplitude: number;
  /** Phase at index 0 of the grid, rad: amplitude·sin(2πft + phase). */
  phase_rad: number;
  /** Sum of squared residuals. */
  rss: number;
  n: number;
}

/**
 * Least-squares sine of a given frequency, fitted together with a straight line in each piece (Frisch & Waugh 1933,
 * Econometrica 1:387–401: sine and cosine are freed of each piece's line as the samples are).
 * @param frequencyHz between 0 and half the rate
 * @returns null where the pieces hold fewer than six samples or cannot tell the sine from their lines
 */
export function sineInPieces(pieces: readonly Piece[], rateHz: number, frequencyHz: number): PiecesFit | null {
  requireRate(rateHz);
  if (!(frequencyHz > 0 && frequencyHz < rateHz / 2))
    throw new RangeError(`frequencyHz must lie between 0 and ${rateHz / 2} Hz, half the rate, got ${frequencyHz}`);
  const omega = (2 * Math.PI * frequencyHz) / rateHz;
  const [turnSin, turnCos] = [Math.sin(omega), Math.cos(omega)];
  let [ss, cc, sc, sy, cy, yy, n] = [0, 0, 0, 0, 0, 0, 0];
  for (const { from, samples } of pieces) {
    const count = samples.length;
    if (count < 3) continue;
    const middle = (count - 1) / 2;
    let s = Math.sin(omega * from);
    let c = Math.cos(omega * from);
    let [S, C, Y, uS, uC, uY, uu] = [0, 0, 0, 0, 0, 0, 0];
    let [SS, CC, SC, SY, CY, YY] = [0, 0, 0, 0, 0, 0];
    const first = samples[0]!;
    for (let i = 0; i < count; i++) {
      const y = samples[i]! - first;
      const u = i - middle;
      S += s;
      C += c;
      Y += y;
      uS += u * s;
      uC += u * c;
      uY += u * y;
      uu += u * u;
      SS += s * s;
      CC += c * c;
      SC += s * c;
      SY += s * y;
      CY += c * y;
      YY += y * y;
      const next = s * turnCos + c * turnSin;
      c = c * turnCos - s * turnSin;
      s = next;
    }
    const free = (product: number, a: number, b: number, ua: number, ub: number): number =>
      product - (a * b) / count - (ua * ub) / uu;
    ss += free(SS, S, S, uS, uS);
    cc += free(CC, C, C, uC, uC);
    sc += free(SC, S, C, uS, uC);
    sy += free(SY, S, Y, uS, uY);
    cy += free(CY, C, Y, uC, uY);
    yy += free(YY, Y, Y, uY, uY);
    n += count;
  }
  const determinant = ss * cc - sc * sc;
  if (n < 6 || !(determinant > 1e-9 * n * n)) return null;
  const sine = (sy * cc - cy * sc) / determinant;
  const cosine = (cy * ss - sy * sc) / determinant;
  return {
    frequency_hz: frequencyHz,
    amplitude: Math.hypot(sine, cosine),
    phase_rad: Math.atan2(cosine, sine),
    rss: Math.max(0, yy - sine * sy - cosine * cy),
    n,
  };
}

/**
 * The sine within ± `rangeHz` of `aroundHz` that leaves the smallest residual: a grid a quarter of the resolution
 * 1/duration apart, then golden section.
 * @returns null as `sineInPieces` does
 */
export function sineInPiecesNear(
  pieces: readonly Piece[],
  rateHz: number,
  aroundHz: number,
  rangeHz: number,
): PiecesFit | null {
  const low = Math.max(aroundHz - rangeHz, aroundHz / 10);
  const high = Math.min(aroundHz + rangeHz, rateHz * 0.49);
  if (!(high > low) || pieces.length === 0) return null;
  const residual = (hz: number): number => sineInPieces(pieces, rateHz, hz)?.rss ?? Number.POSITIVE_INFINITY;
  const last = pieces.at(-1)!;
  const span = last.from + last.samples.length - pieces[0]!.from;
  const steps = Math.max(4, Math.min(400, Math.ceil(((high - low) * span * 4) / rateHz)));
  const at = (k: number): number => low + ((high - low) * k) / steps;
  let best = 0;
  let least = Number.POSITIVE_INFINITY;
  for (let k = 0; k <= steps; k++) {
    const found = residual(at(k));
    if (found < least) {
      least = found;
      best = k;
    }
  }
  if (!Number.isFinite(least)) return null;
  const frequency = goldenMinimum(residual, at(Math.max(0, best - 1)), at(Math.min(steps, best + 1)), 1e-7);
  return sineInPieces(pieces, rateHz, frequency);
}

/** The pieces less a fitted sine. */
export function withoutSine(pieces: readonly Piece[], rateHz: number, fit: PiecesFit): Piece[] {
  const omega = (2 * Math.PI * fit.frequency_hz) / rateHz;
  return pieces.map(({ from, samples }) => ({
    from,
    samples: samples.map((value, i) => value - fit.amplitude * Math.sin(omega * (from + i) + fit.phase_rad)),
  }));
}
