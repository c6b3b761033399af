/** What the amplifier is told to do in one sweep: straight pieces of current or command potential. */

export interface Piece {
  from_s: number;
  to_s: number;
  /** pA in current clamp, mV in voltage clamp; `end` differs from `start` in a ramp. */
  start: number;
  end: number;
}

export interface SweepPlan {
  clamp: 'current' | 'voltage';
  /** Short name of the protocol, as the lab calls it. */
  protocol: string;
  duration_s: number;
  /** Level outside all pieces: holding current, pA, or holding command, mV. */
  holding: number;
  pieces: Piece[];
}

/** The level at every time k/rate, holding added to the pieces in current clamp and replaced by them in voltage clamp. */
export function levels(plan: SweepPlan, rate_hz: number): Float64Array {
  const n = Math.round(plan.duration_s * rate_hz);
  const out = new Float64Array(n).fill(plan.holding);
  for (const piece of plan.pieces) {
    const from = Math.round(piece.from_s * rate_hz);
    const to = Math.min(n, Math.round(piece.to_s * rate_hz));
    const base = plan.clamp === 'current' ? plan.holding : 0;
    for (let k = from; k < to; k++)
      out[k] = base + piece.start + ((piece.end - piece.start) * (k - from)) / Math.max(1, to - from);
  }
  return out;
}

export const quiet = (duration_s: number, holding_pa = 0): SweepPlan => ({
  clamp: 'current',
  protocol: 'no stimulus',
  duration_s,
  holding: holding_pa,
  pieces: [],
});

export const step = (
  pa: number,
  from_s: number,
  to_s: number,
  duration_s: number,
  protocol = 'steps',
  holding_pa = 0,
): SweepPlan => ({
  clamp: 'current',
  protocol,
  duration_s,
  holding: holding_pa,
  pieces: [{ from_s, to_s, start: pa, end: pa }],
});

export const ramp = (to_pa: number, from_s: number, to_s: number, duration_s: number): SweepPlan => ({
  clamp: 'current',
  protocol: 'ramp',
  duration_s,
  holding: 0,
  pieces: [{ from_s, to_s, start: 0, end: to_pa }],
});

export const pulseTrain = (
  pa: number,
  width_s: number,
  every_s: number,
  count: number,
  from_s: number,
  duration_s: number,
): SweepPlan => ({
  clamp: 'current',
  protocol: count === 1 ? 'paced beat' : 'pulse train',
  duration_s,
  holding: 0,
  pieces: Array.from({ length: count }, (_, k) => ({
    from_s: from_s + k * every_s,
    to_s: from_s + k * every_s + width_s,
    start: pa,
    end: pa,
  })),
});

/** Voltage-clamp test pulse from a holding command, both in the amplifier's own reading, mV. */
export const testPulse = (holding_mv: number, by_mv: number, width_s = 0.05, duration_s = 0.15): SweepPlan => ({
  clamp: 'voltage',
  protocol: 'test pulse',
  duration_s,
  holding: holding_mv,
  pieces: [{ from_s: 0.05, to_s: 0.05 + width_s, start: holding_mv + by_mv, end: holding_mv + by_mv }],
});
