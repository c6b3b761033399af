import {
  keptByMeans,
  noiseBeside,
  type Piece,
  type PiecesFit,
  sineInPieces,
  sineInPiecesNear,
  withoutSine,
} from '../signal/sine-pieces.ts';
import { meanWithin } from '../signal/statistics.ts';
import { standsOut } from './quality.ts';
import { readable, type Stretch } from './stretches.ts';
import type { Signal } from './types.ts';

/** Multiples of the mains frequency that transformers and rectifiers make. */
const harmonics = [2, 3, 4, 5];

/** Rate of the means that the hum is fitted to, Hz: plenty for its fifth harmonic. */
const fitRate_hz = 3000;

/** Longest part of the sweep looked at, s: by then the hum's frequency is known to some thousandths of a hertz. */
const longest_s = 4;

/**
 * The potential without the mains hum: the sine near `hum_hz`, fitted to quiet pieces of three periods beside a straight
 * line in each, and those of its harmonics that stand out five times above the noise at frequencies round about, are
 * taken off everywhere. The signal itself where the quiet stretches are shorter than three periods together.
 * @param quiet stretches without spikes and without edges of the stimulus; the cell may still be on its way in them
 * @param proven whether the hum is known to be there; otherwise it must stand out itself
 */
export function withoutHum(voltage: Signal, quiet: readonly Stretch[], hum_hz: number, proven = true): Signal {
  const { samples, rate_hz } = voltage;
  const block = Math.max(1, Math.floor(rate_hz / fitRate_hz));
  const rate = rate_hz / block;
  let pieces = piecesOf(voltage, quiet, block, Math.round((3 * rate) / hum_hz));
  if (pieces.length === 0) return voltage;
  const fundamental = sineInPiecesNear(pieces, rate, hum_hz, 0.02 * hum_hz);
  if (!fundamental || (!proven && !standingOut(pieces, rate, fundamental.frequency_hz))) return voltage;
  pieces = withoutSine(pieces, rate, fundamental);
  const sines = [fundamental];
  for (const multiple of harmonics) {
    const found = standingOut(pieces, rate, multiple * fundamental.frequency_hz);
    if (found) sines.push(found);
  }
  const out = samples.slice();
  for (const sine of sines) takeOff(out, ofSamples(sine, rate_hz, block));
  return { ...voltage, samples: out };
}

/** A sine is turned on from sample to sample for so many, then begun anew, so that rounding does not build up. */
const turned = 64;

function takeOff(samples: Float64Array, { omega, amplitude, phase }: ReturnType<typeof ofSamples>): void {
  const [turnSin, turnCos] = [Math.sin(omega), Math.cos(omega)];
  for (let from = 0; from < samples.length; from += turned) {
    let s = amplitude * Math.sin(omega * from + phase);
    let c = amplitude * Math.cos(omega * from + phase);
    const to = Math.min(samples.length, from + turned);
    for (let i = from; i < to; i++) {
      samples[i]! -= s;
      const next = s * turnCos + c * turnSin;
      c = c * turnCos - s * turnSin;
      s = next;
    }
  }
}

/** Means over `block` samples on one grid, in pieces of `length` means; what is left at the end of a stretch goes. */
function piecesOf({ samples, rate_hz }: Signal, quiet: readonly Stretch[], block: number, length: number): Piece[] {
  const limit = Math.round(longest_s * rate_hz);
  let taken = 0;
  return quiet
    .toSorted((a, b) => a.from - b.from)
    .map((one) => {
      const own = { from: Math.max(one.from, taken), to: one.to };
      taken = Math.max(taken, one.to);
      return own;
    })
    .filter((one) => one.to > one.from)
    .flatMap((one) => readable(samples, { from: one.from, to: Math.min(one.to, limit) }))
    .flatMap((one) => {
      const first = Math.ceil(one.from / block);
      const count = Math.max(0, Math.floor((Math.floor(one.to / block) - first) / length));
      return Array.from({ length: count }, (_, k): Piece => {
        const from = first + k * length;
        return {
          from,
          samples: Float64Array.from(
            { length },
            (_, j) => meanWithin(samples, (from + j) * block, (from + j + 1) * block)!,
          ),
        };
      });
    });
}

function standingOut(pieces: readonly Piece[], rate: number, hz: number): PiecesFit | null {
  if (hz >= 0.45 * rate) return null;
  const fit = sineInPieces(pieces, rate, hz);
  if (!fit) return null;
  const last = pieces.at(-1)!;
  const duration = (last.from + last.samples.length - pieces[0]!.from) / rate;
  const beside = noiseBeside(withoutSine(pieces, rate, fit), rate, hz, 1 / duration, { above: 0, below: 0.49 * rate });
  return beside && fit.amplitude > standsOut * beside.se ? fit : null;
}

/** A sine fitted to means over `block` samples as it stands in the samples: larger, and half a block earlier. */
function ofSamples({ frequency_hz, amplitude, phase_rad }: PiecesFit, rate_hz: number, block: number) {
  const omega = (2 * Math.PI * frequency_hz) / rate_hz;
  return { omega, amplitude: amplitude / keptByMeans(omega, block), phase: phase_rad - (omega * (block - 1)) / 2 };
}
