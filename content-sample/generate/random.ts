/** Random numbers that are the same on every machine and for every subset of the archive. */

export interface Random {
  /** Uniform in [0, 1). */
  uniform(): number;
  /** Uniform in [low, high). */
  between(low: number, high: number): number;
  /** Standard normal. */
  normal(): number;
  /** Whole number from 0 to n − 1. */
  below(n: number): number;
}

/** FNV-1a of a text, 32 bits. */
export function hashOf(text: string): number {
  let hash = 0x811c9dc5;
  for (let i = 0; i < text.length; i++) {
    hash ^= text.charCodeAt(i);
    hash = Math.imul(hash, 0x01000193);
  }
  return hash >>> 0;
}

/** Quantiles of the standard normal at (i + ½)/2¹⁴: a normal deviate is one of them, drawn evenly. */
const quantiles = normalQuantiles(1 << 14);

function normalQuantiles(count: number): Float64Array {
  const out = new Float64Array(count);
  const grid = 1e-4;
  let cumulative = 0;
  let next = 0;
  for (let z = -6; next < count && z < 6; z += grid) {
    cumulative += (grid * Math.exp(-((z + grid / 2) ** 2) / 2)) / Math.sqrt(2 * Math.PI);
    while (next < count && cumulative >= (next + 0.5) / count) out[next++] = z + grid / 2;
  }
  return out;
}

/**
 * A generator seeded by a text, so that each cell has its own stream and leaving one cell out changes no other.
 * Small fast counter generator with 128 bits of state (sfc32).
 * @param seed any text; equal texts give equal streams
 */
export function randomFrom(seed: string): Random {
  // In a typed array the state is updated in place; as plain variables each draw would allocate numbers.
  const s = Int32Array.of(hashOf(`${seed}|a`), hashOf(`${seed}|b`), hashOf(`${seed}|c`), 1);
  const next = (): number => {
    const t = (s[0]! + s[1]! + s[3]!) | 0;
    s[3] = s[3]! + 1;
    s[0] = s[1]! ^ (s[1]! >>> 9);
    s[1] = s[2]! + (s[2]! << 3);
    s[2] = ((s[2]! << 21) | (s[2]! >>> 11)) + t;
    return t;
  };
  for (let i = 0; i < 16; i++) next();
  const uniform = (): number => (next() >>> 0) / 4294967296;
  return {
    uniform,
    between: (low, high) => low + (high - low) * uniform(),
    normal: () => quantiles[next() >>> 18]!,
    below: (n) => Math.floor(n * uniform()),
  };
}
