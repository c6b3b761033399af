/** Where a sampled trace crosses a level, between samples. */

export interface CrossingOptions {
  /** Index to start from and last index that may take part, both inclusive. `from` > `to` searches backwards. */
  from: number;
  to: number;
  /** `up`: from below to at or above the level as time runs; `down`: the reverse. Time always runs forward. */
  direction: 'up' | 'down';
}

/**
 * First crossing of a level met when walking from `from` to `to` (backwards where `from` > `to`), by linear
 * interpolation between two samples. Pairs with NaN are passed over.
 * @returns fractional sample index, or null where the level is not crossed that way
 */
export function crossing(samples: Float64Array, level: number, options: CrossingOptions): number | null {
  const from = clamp(options.from, samples.length);
  const to = clamp(options.to, samples.length);
  const step = from <= to ? 1 : -1;
  for (let i = from; i !== to; i += step) {
    const early = step === 1 ? i : i - 1;
    const before = samples[early]!;
    const after = samples[early + 1]!;
    const crosses = options.direction === 'up' ? before < level && after >= level : before > level && after <= level;
    if (crosses) return early + (level - before) / (after - before);
  }
  return null;
}

const clamp = (index: number, length: number): number => Math.max(0, Math.min(length - 1, Math.round(index)));

/** Value of the trace at a fractional index, linear between neighbours; NaN outside or next to NaN. */
export function valueAt(samples: Float64Array, position: number): number {
  const below = Math.floor(position);
  if (!(position >= 0 && position <= samples.length - 1)) return Number.NaN;
  if (below === position) return samples[below]!;
  return samples[below]! + (samples[below + 1]! - samples[below]!) * (position - below);
}
