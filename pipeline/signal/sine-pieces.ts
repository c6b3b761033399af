/**
 * A sine in pieces of one recording, each piece with a level and a slope of its own: mains hum between spikes and
 * stimuli. The pieces lie on one grid, so that the sine keeps its phase across the gaps.
 */
import { requireRate } from './derivative.ts';
import { goldenMinimum } from './golden.ts';

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
  const [halfSin, halfCos] = [Math.sin(omega / 2), Math.cos(omega / 2)];
  let [ss, cc, sc, sy, cy, yy, n] = [0, 0, 0, 0, 0, 0, 0];
  for (const piece of pieces) {
    const count = piece.samples.length;
    if (count < 3) continue;
    const { even, odd, squares } = freedOf(piece);
    // Sums over u = −middle … middle: cos ωu, u·sin ωu and cos 2ωu (a geometric series and its derivative).
    const [endSin, endCos] = [Math.sin((count * omega) / 2), Math.cos((count * omega) / 2)];
    const ofCos = endSin / halfSin;
    const ofSin = (0.5 * (endSin * halfCos - count * endCos * halfSin)) / (halfSin * halfSin);
    const ofDouble = (endSin * endCos) / (halfSin * halfCos);
    const uu = (count * (count * count - 1)) / 12;
    // The sine and cosine about the piece's middle; u begins at ½ where it has no middle sample.
    const whole = count % 2 === 1;
    let [s, c] = whole ? [0, 1] : [halfSin, halfCos];
    let [withCos, withSin] = [0, 0];
    for (let k = 0; k < even.length; k++) {
      withCos += c * even[k]!;
      withSin += s * odd[k]!;
      const next = s * turnCos + c * turnSin;
      c = c * turnCos - s * turnSin;
      s = next;
    }
    const phase = omega * (piece.from + (count - 1) / 2);
    const [p, q] = [Math.sin(phase), Math.cos(phase)];
    const [even2, odd2] = [(ofCos * ofCos) / count, (ofSin * ofSin) / uu];
    // Products of sine and cosine, less what the piece's own line takes of them.
    ss += count / 2 - 0.5 * (q * q - p * p) * ofDouble - p * p * even2 - q * q * odd2;
    cc += count / 2 + 0.5 * (q * q - p * p) * ofDouble - q * q * even2 - p * p * odd2;
    sc += p * q * (ofDouble - even2 + odd2);
    sy += p * withCos + q * withSin;
    cy += q * withCos - p * withSin;
    yy += squares;
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

/** A piece freed of its own line, folded about its middle: sums and differences of the samples u before and after it. */
interface Freed {
  even: Float64Array;
  odd: Float64Array;
  /** Sum of squares. */
  squares: number;
}

/** Kept as long as the piece is: a search looks at hundreds of frequencies in the same pieces, which nobody changes. */
const freed = new WeakMap<Piece, Freed>();

function freedOf(piece: Piece): Freed {
  const held = freed.get(piece);
  if (held) return held;
  const { samples } = piece;
  const count = samples.length;
  const middle = (count - 1) / 2;
  const first = samples[0]!;
  let [level, slope] = [0, 0];
  for (let i = 0; i < count; i++) {
    level += samples[i]! - first;
    slope += (i - middle) * (samples[i]! - first);
  }
  level /= count;
  slope /= (count * (count * count - 1)) / 12;
  const own = samples.map((value, i) => value - first - level - slope * (i - middle));
  const half = Math.ceil(count / 2);
  const even = new Float64Array(half);
  const odd = new Float64Array(half);
  for (let k = 0; k < half; k++) {
    const [before, after] = [own[half - 1 - k]!, own[count - half + k]!];
    even[k] = count % 2 === 1 && k === 0 ? before : after + before;
    odd[k] = after - before;
  }
  const found = { even, odd, squares: own.reduce((sum, value) => sum + value * value, 0) };
  freed.set(piece, found);
  return found;
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

/**
 * What noise does to one quadrature of a sine's amplitude, from the amplitudes at ±3, ±4 and ±5 times `spacingHz` beside
 * it: slow noise is not white. The sine itself must be taken out first, since pieces with gaps let it leak far.
 * @param rest the pieces without the sine (`withoutSine`)
 * @param above,below frequencies outside these, Hz, are left out
 * @returns standard uncertainty and degrees of freedom; null where no frequency is left
 */
export function noiseBeside(
  rest: readonly Piece[],
  rateHz: number,
  frequencyHz: number,
  spacingHz: number,
  { above, below }: { above: number; below: number },
): { se: number; freedom: number } | null {
  const beside = [-5, -4, -3, 3, 4, 5]
    .map((steps) => frequencyHz + steps * spacingHz)
    .filter((hz) => hz > above && hz < below)
    .flatMap((hz) => sineInPieces(rest, rateHz, hz)?.amplitude ?? []);
  if (beside.length === 0) return null;
  const squares = beside.reduce((sum, amplitude) => sum + amplitude ** 2, 0);
  return { se: Math.sqrt(squares / (2 * beside.length)), freedom: 2 * beside.length };
}

/** Share of a sine's amplitude that means over `block` samples leave. @param omega rad a sample */
export const keptByMeans = (omega: number, block: number): number =>
  block === 1 ? 1 : Math.sin((block * omega) / 2) / (block * Math.sin(omega / 2));
