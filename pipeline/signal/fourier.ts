/** The discrete Fourier transform of short pieces. */

interface Plan {
  /** Where each sample goes first: its index with the bits reversed. */
  order: Uint32Array;
  /** cos and −sin of 2πk/n for k below n/2. */
  cosines: Float64Array;
  sines: Float64Array;
}

const plans = new Map<number, Plan>();

function planFor(n: number): Plan {
  const held = plans.get(n);
  if (held) return held;
  if (!(Number.isInteger(n) && n >= 2 && (n & (n - 1)) === 0))
    throw new RangeError(`the number of samples must be a power of two from 2 on, got ${n}`);
  const order = new Uint32Array(n);
  for (let i = 0, reversed = 0; i < n; i++) {
    order[i] = reversed;
    let bit = n >> 1;
    for (; reversed & bit; bit >>= 1) reversed ^= bit;
    reversed |= bit;
  }
  const turn = (k: number): number => (-2 * Math.PI * k) / n;
  const plan = {
    order,
    cosines: Float64Array.from({ length: n / 2 }, (_, k) => Math.cos(turn(k))),
    sines: Float64Array.from({ length: n / 2 }, (_, k) => Math.sin(turn(k))),
  };
  plans.set(n, plan);
  return plan;
}

/**
 * X_k = Σ x_i·exp(−2πi·ik/n) of complex samples, in place, not scaled.
 * @param re,im real and imaginary parts, of one length that is a power of two
 * @throws RangeError for another length
 * @see Cooley & Tukey 1965, Math Comput 19:297–301 (from memory)
 */
export function fourier(re: Float64Array, im: Float64Array): void {
  const n = re.length;
  const { order, cosines, sines } = planFor(n);
  for (let i = 0; i < n; i++) {
    const j = order[i]!;
    if (j <= i) continue;
    const heldRe = re[i]!;
    const heldIm = im[i]!;
    re[i] = re[j]!;
    im[i] = im[j]!;
    re[j] = heldRe;
    im[j] = heldIm;
  }
  for (let half = 1; half < n; half *= 2) {
    const stride = n / (2 * half);
    for (let start = 0; start < n; start += 2 * half)
      for (let k = 0; k < half; k++) {
        const a = start + k;
        const b = a + half;
        const c = cosines[k * stride]!;
        const s = sines[k * stride]!;
        const turnedRe = re[b]! * c - im[b]! * s;
        const turnedIm = re[b]! * s + im[b]! * c;
        re[b] = re[a]! - turnedRe;
        im[b] = im[a]! - turnedIm;
        re[a]! += turnedRe;
        im[a]! += turnedIm;
      }
  }
}
