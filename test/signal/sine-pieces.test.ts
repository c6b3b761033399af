import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { type Piece, sineInPieces, sineInPiecesNear, withoutSine } from '../../pipeline/signal/sine-pieces.ts';
import { normalNoise } from '../helpers/models.ts';

const rate = 3000;

/** Pieces of a sine with a level and a slope of their own. */
function made(ranges: [number, number][], amplitude: number, hz: number, noise = 0, seed = 3): Piece[] {
  const next = normalNoise(seed);
  return ranges.map(([from, count], k) => ({
    from,
    samples: Float64Array.from(
      { length: count },
      (_, i) =>
        -60 +
        7 * k +
        (0.002 - 0.004 * k) * i +
        amplitude * Math.sin((2 * Math.PI * hz * (from + i)) / rate + 0.4) +
        noise * next(),
    ),
  }));
}

/** The same by the normal equations of every column at once: sine, cosine, and level and slope of each piece. */
function slowly(pieces: readonly Piece[], hz: number): number {
  const rows: number[][] = [];
  const y: number[] = [];
  for (const [k, { from, samples }] of pieces.entries())
    samples.forEach((value, i) => {
      const angle = (2 * Math.PI * hz * (from + i)) / rate;
      const row = [Math.sin(angle), Math.cos(angle), ...pieces.flatMap((_, j) => (j === k ? [1, i / 100] : [0, 0]))];
      rows.push(row);
      y.push(value + 60);
    });
  const size = rows[0]!.length;
  const a = Array.from({ length: size }, (_, r) => [
    ...Array.from({ length: size }, (__, c) => rows.reduce((sum, row) => sum + row[r]! * row[c]!, 0)),
    rows.reduce((sum, row, k) => sum + row[r]! * y[k]!, 0),
  ]);
  for (let c = 0; c < size; c++)
    for (let r = 0; r < size; r++)
      if (r !== c) {
        const factor = a[r]![c]! / a[c]![c]!;
        for (let k = c; k <= size; k++) a[r]![k]! -= factor * a[c]![k]!;
      }
  return Math.hypot(a[0]![size]! / a[0]![0]!, a[1]![size]! / a[1]![1]!);
}

describe('a sine in pieces', () => {
  test('is found exactly whatever the level and slope of each piece, even over broken periods', () => {
    const pieces = made(
      [
        [0, 173],
        [400, 211],
        [900, 190],
      ],
      0.5,
      50,
    );
    expect(sineInPieces(pieces, rate, 50)!.amplitude).toBeCloseTo(0.5, 9);
    expect(sineInPieces(pieces, rate, 50)!.phase_rad).toBeCloseTo(0.4, 9);
    expect(sineInPieces(pieces, rate, 50)!.rss).toBeCloseTo(0, 9);
  });

  test('agrees with the full normal equations, noise and all', () =>
    fc.assert(
      fc.property(fc.integer({ min: 1, max: 1e6 }), fc.double({ min: 20, max: 150, noNaN: true }), (seed, hz) => {
        const pieces = made(
          [
            [0, 150],
            [333, 220],
          ],
          0.3,
          50,
          0.4,
          seed,
        );
        expect(sineInPieces(pieces, rate, hz)!.amplitude).toBeCloseTo(slowly(pieces, hz), 6);
      }),
      { numRuns: 20 },
    ));

  test('one piece alone', () => {
    const pieces = made([[0, 700]], 0.3, 49.3, 0.2);
    expect(sineInPieces(pieces, rate, 49)!.amplitude).toBeCloseTo(slowly(pieces, 49), 6);
  });

  test('its frequency is found to a small part of 1/duration', () =>
    expect(
      sineInPiecesNear(
        made(
          [
            [0, 600],
            [700, 600],
          ],
          0.5,
          50.07,
          0.05,
        ),
        rate,
        50,
        5,
      )!.frequency_hz,
    ).toBeCloseTo(50.07, 1));

  test('nothing of it is left once it is taken out', () => {
    const pieces = made(
      [
        [0, 200],
        [300, 200],
      ],
      0.5,
      50,
    );
    const fit = sineInPieces(pieces, rate, 50)!;
    expect(sineInPieces(withoutSine(pieces, rate, fit), rate, 50)!.amplitude).toBeCloseTo(0, 9);
  });

  test('too little to tell a sine from a line: null', () => {
    expect(sineInPieces([{ from: 0, samples: Float64Array.of(1, 2, 3, 4, 5) }], rate, 50)).toBeNull();
    expect(sineInPieces([], rate, 50)).toBeNull();
    expect(sineInPiecesNear([], rate, 50, 5)).toBeNull();
  });
  test('a frequency beyond half the rate is refused', () =>
    expect(() => sineInPieces(made([[0, 100]], 1, 50), rate, 1500)).toThrow(/half the rate/));
});
