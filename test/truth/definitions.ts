/**
 * The definitions of the quantities, read off a clean trace at 200 kHz in the slowest and plainest way: no smoothing, no
 * noise estimate, one loop a quantity. Written apart from the code under test.
 */

export interface TrueSpike {
  threshold_mv: number;
  threshold_at_s: number;
  peak_mv: number;
  peak_at_s: number;
  spike_height_mv: number;
  half_width_ms: number | null;
  max_rise_v_per_s: number;
  max_fall_v_per_s: number;
  depolarization_ms: number;
  repolarization_ms: number | null;
  ahp_minimum_mv: number | null;
  rise_from_edge: boolean;
}

/** Slope at a sample, V/s (mV/ms), from its two neighbours. */
const slopeAt = (mv: Float64Array, i: number, hz: number): number => ((mv[i + 1]! - mv[i - 1]!) * hz) / 2000;

/**
 * Spikes of a clean trace.
 * @param edges_s stimulus edges; a threshold within 60 µs after one is the stimulus's and not the cell's
 */
export function spikesOf(
  mv: Float64Array,
  hz: number,
  edges_s: readonly number[],
  criterion_v_per_s = 20,
  prominence_mv = 20,
  window_ms = 60,
): TrueSpike[] {
  const spans = excursions(mv, prominence_mv);
  const found: TrueSpike[] = [];
  const guard = Math.round(0.00006 * hz);
  const edges = edges_s.map((edge) => Math.round(edge * hz));
  const thresholds = spans.map(({ base, peak }) => {
    let steepest = base + 1;
    for (let i = base + 1; i < peak; i++) if (slopeAt(mv, i, hz) > slopeAt(mv, steepest, hz)) steepest = i;
    const rise = slopeAt(mv, steepest, hz);
    if (rise < criterion_v_per_s) return null;
    let i = steepest;
    let edge = -1;
    while (i > base + 1 && slopeAt(mv, i - 1, hz) >= criterion_v_per_s) {
      i--;
      // The electrode brings the current in within about five of its time constants.
      if (edges.some((at) => at >= i - guard && at <= i + 1)) edge = i;
    }
    if (edge >= 0) {
      // Driven past the criterion by the stimulus: from the lowest dV/dt since the edge, by the criterion.
      let lowest = edge + 2;
      for (let k = edge + 2; k < steepest; k++) if (slopeAt(mv, k, hz) < slopeAt(mv, lowest, hz)) lowest = k;
      const raised = slopeAt(mv, lowest, hz) + criterion_v_per_s;
      i = steepest;
      while (i > lowest && slopeAt(mv, i - 1, hz) >= raised) i--;
      return { at: i, rise, edge: true };
    }
    const [before, after] = [slopeAt(mv, i - 1, hz), slopeAt(mv, i, hz)];
    return { at: i - 1 + (criterion_v_per_s - before) / (after - before), rise, edge: false };
  });
  spans.forEach(({ peak }, k) => {
    const threshold = thresholds[k];
    if (!threshold) return;
    const at = (x: number): number => {
      const i = Math.floor(x);
      return mv[i]! + (x - i) * ((mv[i + 1] ?? mv[i]!) - mv[i]!);
    };
    const thresholdMv = at(threshold.at);
    // Vertex of the parabola through the top three samples: the grid alone is 5 µs coarse.
    const [left, top, right] = [mv[peak - 1]!, mv[peak]!, mv[peak + 1] ?? mv[peak]!];
    const bend = left - 2 * top + right;
    const shift = bend < 0 ? (0.5 * (left - right)) / bend : 0;
    const peakAt = peak + shift;
    const peakMv = top - 0.25 * (left - right) * shift;
    const nextThreshold = thresholds[k + 1]?.at ?? mv.length - 1;
    const nextEdge = edges.find((edge) => edge > peak) ?? Number.POSITIVE_INFINITY;
    const down = (level: number): number | null => {
      for (let i = peak + 1; i <= nextThreshold; i++)
        if (mv[i]! <= level) return i - 1 + (level - mv[i - 1]!) / (mv[i]! - mv[i - 1]!);
      return null;
    };
    const up = (level: number): number => {
      let i = peak;
      while (mv[i]! > level) i--;
      return i + (level - mv[i]!) / (mv[i + 1]! - mv[i]!);
    };
    const half = thresholdMv + (peakMv - thresholdMv) / 2;
    const fallAt = down(half);
    const back = down(thresholdMv);
    const end = Math.floor(Math.min(nextThreshold, nextEdge - 1, peak + (window_ms / 1000) * hz, mv.length - 1));
    let lowest = peak;
    let steepestFall = 0;
    for (let i = peak; i <= end; i++) if (mv[i]! < mv[lowest]!) lowest = i;
    for (let i = peak + 1; i < Math.min(lowest, mv.length - 1); i++)
      steepestFall = Math.min(steepestFall, slopeAt(mv, i, hz));
    found.push({
      threshold_mv: thresholdMv,
      threshold_at_s: threshold.at / hz,
      peak_mv: peakMv,
      peak_at_s: peakAt / hz,
      spike_height_mv: peakMv - thresholdMv,
      half_width_ms: fallAt === null ? null : ((fallAt - up(half)) * 1000) / hz,
      max_rise_v_per_s: threshold.rise,
      max_fall_v_per_s: steepestFall,
      depolarization_ms: ((peakAt - threshold.at) * 1000) / hz,
      repolarization_ms: back === null ? null : ((back - peakAt) * 1000) / hz,
      // Where the lowest is the last sample looked at, the trace is still falling.
      ahp_minimum_mv: lowest >= end - 1 ? null : mv[lowest]!,
      rise_from_edge: threshold.edge,
    });
  });
  return found;
}

/** Rises of at least the prominence, each followed by a fall of half of it or the end. */
function excursions(mv: Float64Array, prominence: number): { base: number; peak: number }[] {
  const found: { base: number; peak: number }[] = [];
  let base = 0;
  let peak = 0;
  let rising = false;
  for (let i = 1; i < mv.length; i++) {
    if (!rising) {
      if (mv[i]! < mv[base]!) base = i;
      if (mv[i]! - mv[base]! >= prominence) {
        rising = true;
        peak = i;
      }
    } else {
      if (mv[i]! > mv[peak]!) peak = i;
      if (mv[peak]! - mv[i]! >= prominence / 2) {
        found.push({ base, peak });
        rising = false;
        base = i;
      }
    }
  }
  return found;
}

export const meanOf = (mv: Float64Array, from_s: number, to_s: number, hz: number): number => {
  let sum = 0;
  const [from, to] = [Math.round(from_s * hz), Math.round(to_s * hz)];
  for (let i = from; i < to; i++) sum += mv[i]!;
  return sum / (to - from);
};

export const lowestOf = (mv: Float64Array, from_s: number, to_s: number, hz: number): number => {
  let lowest = Number.POSITIVE_INFINITY;
  for (let i = Math.round(from_s * hz); i < Math.round(to_s * hz); i++) lowest = Math.min(lowest, mv[i]!);
  return lowest;
};

/** Slope of the least-squares line with intercept. */
export function slopeOfLine(x: readonly number[], y: readonly number[]): number {
  const [mx, my] = [x, y].map((list) => list.reduce((sum, one) => sum + one, 0) / list.length) as [number, number];
  let [sxy, sxx] = [0, 0];
  x.forEach((one, k) => {
    sxy += (one - mx) * (y[k]! - my);
    sxx += (one - mx) ** 2;
  });
  return sxy / sxx;
}
