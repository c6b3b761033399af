import { describe, expect, it } from 'vitest';
import { fourier } from '../../pipeline/signal/fourier.ts';

/** The sum of the definition, term by term. */
function slowly(re: Float64Array, im: Float64Array, k: number): [number, number] {
  const n = re.length;
  let [a, b] = [0, 0];
  for (let i = 0; i < n; i++) {
    const angle = (-2 * Math.PI * ((i * k) % n)) / n;
    a += re[i]! * Math.cos(angle) - im[i]! * Math.sin(angle);
    b += re[i]! * Math.sin(angle) + im[i]! * Math.cos(angle);
  }
  return [a, b];
}

describe('fourier', () => {
  it.each([2, 8, 128])('equals the sum of its definition for %i samples', (n) => {
    const re = Float64Array.from({ length: n }, (_, i) => Math.sin(0.7 * i * i) + 0.2 * i);
    const im = Float64Array.from({ length: n }, (_, i) => Math.cos(1.3 * i * i) - 1);
    const [ownRe, ownIm] = [re.slice(), im.slice()];
    fourier(ownRe, ownIm);
    for (let k = 0; k < n; k++) {
      const [a, b] = slowly(re, im, k);
      expect(ownRe[k]).toBeCloseTo(a, 9);
      expect(ownIm[k]).toBeCloseTo(b, 9);
    }
  });

  it('equals NumPy for four samples', () => {
    // numpy.fft.fft([1, 2-1j, -1j, -1+2j]), the example of NumPy's own documentation of the inverse: 2, -2-2j, -2j, 4+4j.
    const re = Float64Array.of(1, 2, 0, -1);
    const im = Float64Array.of(0, -1, -1, 2);
    fourier(re, im);
    expect([...re]).toEqual([2, expect.closeTo(-2), expect.closeTo(0), expect.closeTo(4)]);
    expect([...im]).toEqual([0, expect.closeTo(-2), expect.closeTo(-2), expect.closeTo(4)]);
  });

  it('refuses a number of samples that is no power of two', () => {
    expect(() => fourier(new Float64Array(12), new Float64Array(12))).toThrow('power of two');
  });
});
