/**
 * Brief stimulus pulses seen in the voltage itself: the jump that the electrode and an unbalanced bridge add while a
 * pulse lasts. Where no stimulus was recorded the pulses are found by these jumps.
 */
import { linearFit } from '../signal/line.ts';
import { median } from '../signal/statistics.ts';
import { absent, measured } from './reading.ts';
import { join } from './spike-trace.ts';
import { timeAt } from './stretches.ts';
import type { Reading, Signal, Spike, Stimulus } from './types.ts';

export interface Pulse {
  on_s: number;
  off_s: number;
  /** How far the potential jumps at the edges, mV, up positive at onset; null where the two edges tell two stories. */
  jump_mv: number | null;
  /** 95 % half-width of the jump, mV. */
  u95_mv: number | null;
  /** Whether it was seen in the voltage alone. */
  inferred: boolean;
}

export interface Cleaned {
  /** The voltage less what the pulses added, their edges bridged by straight lines. */
  voltage: Signal;
  pulses: Pulse[];
  /** Samples before and after an edge that its artefact spreads over; null where nothing was taken out. */
  guard: { before: number; after: number } | null;
  remarks: string[];
}

/** Pacing pulses are at most this long, s; longer ones are steps, whose response belongs to the cell. */
export const longestPulse_s = 0.02;
/** No membrane repolarizes faster than this within a tenth of a millisecond and then stops, V/s. */
const fastestFall_v_per_s = 25;
/** An electrode and its filter settle within this, s, where nothing else is known. */
const settle_s = 0.00025;

/**
 * Takes the artefacts of brief pulses out of the recording of a slow spike. Each pulse's jump is read at both edges: the
 * line through 0.5 ms after the edge minus the line through 0.5 ms before it, both at the edge. Where the two agree
 * their mean is subtracted while the pulse lasts; an edge hidden by the upstroke leaves the word to the other.
 * @param noise_mv standard deviation of the potential's fast noise, mV
 */
export function withoutArtefacts(
  voltage: Signal,
  stimulus: Stimulus,
  current: Signal | null,
  noise_mv: number,
): Cleaned {
  const remarks: string[] = [];
  const edges =
    stimulus.kind === 'unknown' && stimulus.from === 'absent'
      ? jumpPairs(voltage, noise_mv).map((pair) => ({ ...pair, inferred: true, spread_s: settle_s }))
      : briefPulses(stimulus).map((pair) => ({
          ...pair,
          inferred: false,
          spread_s: spreadOf_s(current, pair.on_s),
        }));
  if (edges.length === 0) return { voltage, pulses: [], guard: null, remarks };
  const samples = voltage.samples.slice();
  let guard: Cleaned['guard'] = null;
  const seenAll = edges.map(({ on_s, off_s, inferred, spread_s }): Pulse => {
    const jump = jumpOf(voltage, on_s, off_s, spread_s, noise_mv);
    const resolved = jump !== null && isResolved(jump.mv, jump.u95, noise_mv);
    if (resolved) {
      const own = guardOf(voltage, spread_s);
      lower(samples, voltage, on_s, off_s, own, jump.mv);
      guard = { before: Math.max(own.before, guard?.before ?? 0), after: Math.max(own.after, guard?.after ?? 0) };
    }
    return { on_s, off_s, jump_mv: jump === null ? null : jump.mv, u95_mv: jump?.u95 ?? null, inferred };
  });
  const pulses = seenAll.filter(
    (pulse) => !pulse.inferred || isResolved(pulse.jump_mv ?? 0, pulse.u95_mv ?? 0, noise_mv),
  );
  const seen = pulses.filter((pulse) => pulse.inferred);
  if (seen.length > 0) {
    const length = median(seen.map((pulse) => (pulse.off_s - pulse.on_s) * 1000))!;
    remarks.push(
      `No stimulus was recorded; jumps of the potential show ${seen.length === 1 ? 'one brief pulse' : `${seen.length} brief pulses`} of ${Number(length.toPrecision(2))} ms. What they add is taken out of the numbers.`,
    );
  } else if (guard !== null) remarks.push('The artefact of the brief stimulus pulse is taken out of the numbers.');
  return { voltage: { ...voltage, samples }, pulses, guard, remarks };
}

/** A jump that noise, half a millivolt or its own uncertainty could be is left alone. */
const isResolved = (jump_mv: number, u95_mv: number, noise_mv: number): boolean =>
  Math.abs(jump_mv) > Math.max(4 * noise_mv, 0.5, u95_mv);

/** The pulses of a recorded or stated stimulus that are short enough to pace with. */
function briefPulses(stimulus: Stimulus): { on_s: number; off_s: number }[] {
  const { edges_s, kind, onset_s, end_s } = stimulus;
  if (kind === 'step' && onset_s !== null && end_s !== null && end_s - onset_s <= longestPulse_s)
    return [{ on_s: onset_s, off_s: end_s }];
  if (kind !== 'pulse train') return [];
  const pulses: { on_s: number; off_s: number }[] = [];
  for (let k = 0; k + 1 < edges_s.length; k += 2) {
    const [on_s, off_s] = [edges_s[k]!, edges_s[k + 1]!];
    if (off_s - on_s > longestPulse_s) return [];
    pulses.push({ on_s, off_s });
  }
  return pulses;
}

/** How long the recorded current takes over an edge, s: half of what it needs from one level to the other. */
function edgeSpread_s(current: Signal, edge_s: number): number {
  const { samples, rate_hz, start_s } = current;
  const at = Math.round((edge_s - start_s) * rate_hz);
  const reach = Math.round(0.001 * rate_hz);
  if (at - reach < 0 || at + reach >= samples.length) return 0;
  const before = samples[at - reach]!;
  const after = median(samples.subarray(at + 1, at + reach)) ?? before;
  let [first, last] = [at, at];
  for (let i = at - reach; i <= at + reach; i++) {
    const share = (samples[i]! - before) / (after - before);
    if (share < 0.1) first = i;
    if (share < 0.9) last = i;
    else break;
  }
  return Math.max(at - first, last - at) / rate_hz;
}

/** How long an edge and what the electrode makes of it last, s. */
const spreadOf_s = (current: Signal | null, edge_s: number): number =>
  Math.max(settle_s, current ? edgeSpread_s(current, edge_s) + 0.0001 : 0);

interface Line {
  at: number;
  slope: number;
  se: number;
}

/** The straight line through a stretch of the trace, at a time; its slope per ms. */
function lineAt(voltage: Signal, from_s: number, to_s: number, at_s: number, noise: number): Line | null {
  const first = Math.ceil((from_s - voltage.start_s) * voltage.rate_hz - 1e-6);
  const last = Math.floor((to_s - voltage.start_s) * voltage.rate_hz + 1e-6);
  if (first < 0 || last >= voltage.samples.length || last - first < 2) return null;
  const x: number[] = [];
  const y: number[] = [];
  for (let i = first; i <= last; i++) {
    x.push((timeAt(voltage, i) - at_s) * 1000);
    y.push(voltage.samples[i]!);
  }
  const fit = linearFit(x, y);
  if (!fit) return null;
  return { at: fit.intercept, slope: fit.slope, se: Math.max(fit.se_intercept ?? 0, noise / Math.sqrt(x.length)) };
}

/** Widths of the lines on either side of an edge, s: the one that leaves least doubt is used. */
const lineWidths_s = [0.0001, 0.0002, 0.0005];

function edgeJump(voltage: Signal, edge_s: number, spread_s: number, room_s: number, noise: number) {
  const lead = Math.max(1 / voltage.rate_hz, spread_s - settle_s);
  let best: { mv: number; se: number } | null = null;
  for (const wanted of lineWidths_s) {
    const width = Math.max(3 / voltage.rate_hz, Math.min(wanted, room_s));
    const before = lineAt(voltage, edge_s - lead - width, edge_s - lead, edge_s, noise);
    const after = lineAt(voltage, edge_s + spread_s, edge_s + spread_s + width, edge_s, noise);
    if (!before || !after) continue;
    // What bends within the gap between the two lines is the cell's own and cannot be told from the jump.
    const bend = Math.abs(after.slope - before.slope) * (spread_s + lead) * 1000;
    const se = Math.hypot(before.se, after.se, bend / 4);
    if (!best || se < best.se) best = { mv: after.at - before.at, se };
  }
  return best;
}

function jumpOf(
  voltage: Signal,
  on_s: number,
  off_s: number,
  spread_s: number,
  noise: number,
): { mv: number; u95: number } | null {
  const room = Math.max(0, (off_s - on_s - spread_s) / 2);
  const on = edgeJump(voltage, on_s, spread_s, room, noise);
  const off = edgeJump(voltage, off_s, spread_s, room, noise);
  if (!on || !off) return null;
  const [up, down] = [
    { mv: on.mv, se: on.se },
    { mv: -off.mv, se: off.se },
  ];
  const apart = Math.abs(up.mv - down.mv);
  if (apart <= 3 * Math.hypot(up.se, down.se) + 0.1 * Math.max(Math.abs(up.mv), Math.abs(down.mv))) {
    const [a, b] = [1 / up.se ** 2, 1 / down.se ** 2];
    const mv = (a * up.mv + b * down.mv) / (a + b);
    return { mv, u95: Math.max(1.96 / Math.sqrt(a + b), apart / 2) };
  }
  const better = up.se < down.se ? up : down;
  const worse = up.se < down.se ? down : up;
  return better.se < 0.25 * worse.se ? { mv: better.mv, u95: 1.96 * better.se } : null;
}

const guardOf = (voltage: Signal, spread_s: number): { before: number; after: number } => ({
  before: Math.max(1, Math.ceil((spread_s - settle_s) * voltage.rate_hz - 1e-6)),
  after: Math.max(2, Math.ceil(spread_s * voltage.rate_hz - 1e-6)),
});

/** Takes a pulse's jump out of the samples and bridges the samples that its edges spread over. */
function lower(
  samples: Float64Array,
  voltage: Signal,
  on_s: number,
  off_s: number,
  guard: { before: number; after: number },
  jump: number,
): void {
  const index = (time_s: number): number => Math.round((time_s - voltage.start_s) * voltage.rate_hz);
  for (let i = Math.max(0, index(on_s)); i < Math.min(samples.length, index(off_s)); i++) samples[i]! -= jump;
  for (const edge of [index(on_s), index(off_s)]) {
    const [from, to] = [Math.max(0, edge - guard.before - 1), Math.min(samples.length - 1, edge + guard.after + 1)];
    join(samples, from, to);
  }
}

/**
 * Pairs of a sudden rise from quiet and a sudden fall, at most 20 ms apart. The fall tells: steeper than any membrane
 * repolarizes, over within a tenth of a millisecond, and the potential did not fall before it.
 */
function jumpPairs(voltage: Signal, noise_mv: number): { on_s: number; off_s: number }[] {
  const { samples: v, rate_hz } = voltage;
  const w = Math.max(2, Math.round(0.0001 * rate_hz));
  const least = Math.max(8 * noise_mv, (fastestFall_v_per_s * w * 1000) / rate_hz);
  const longest = Math.round(longestPulse_s * rate_hz);
  const shortest = Math.max(4 * w, Math.round(0.0003 * rate_hz));
  const found: { on: number; off: number }[] = [];
  for (let i = 4 * w; i + 4 * w < v.length; i++) {
    const fall = v[i]! - v[i + w]!;
    if (!(fall > least) || !(v[i + 1]! < v[i]!) || v[i - w]! - v[i]! > 0.3 * fall) continue;
    if (!stays(v, i + w, w, (value) => value < v[i]! - 0.5 * fall)) continue;
    const on = suddenRise(v, i - shortest, Math.max(3 * w, i - longest), w, 0.4 * fall, noise_mv);
    let off = i;
    while (off < i + w - 1 && v[off]! - v[off + 1]! < 0.3 * fall) off++;
    if (on !== null) found.push({ on, off });
    i += 4 * w;
  }
  // A pacemaker's pulses are all of one length; what is not is chance.
  const usual = median(found.map(({ on, off }) => off - on)) ?? 0;
  return found
    .filter(({ on, off }) => Math.abs(off - on - usual) <= Math.max(2, 0.1 * usual))
    .map(({ on, off }) => ({ on_s: timeAt(voltage, on + 0.5), off_s: timeAt(voltage, off + 0.5) }));
}

/** Whether a run of samples all lie on one side: a single stray sample is no edge. */
function stays(v: Float64Array, from: number, count: number, side: (value: number) => boolean): boolean {
  for (let i = from; i < Math.min(v.length, from + count); i++) if (!side(v[i]!)) return false;
  return true;
}

/** The earliest rise by `least` within w samples that comes out of a level stretch; the last sample before it. */
function suddenRise(
  v: Float64Array,
  last: number,
  first: number,
  w: number,
  least: number,
  noise: number,
): number | null {
  for (let i = first; i <= last; i++) {
    const rise = v[i + w]! - v[i]!;
    if (!(rise > least) || !stays(v, i + w, 3 * w, (value) => value > v[i]! + 0.6 * rise)) continue;
    const before = Math.max(Math.abs(v[i]! - v[i - w]!), Math.abs(v[i - w]! - v[i - 3 * w]!));
    if (before <= Math.max(4 * noise, 0.15 * rise)) {
      let at = i;
      while (at < i + w && v[at + 1]! - v[at]! < 0.2 * rise) at++;
      return at;
    }
  }
  return null;
}

/**
 * How far the membrane charges while a brief pulse lasts, over the pulse's current, MΩ: from where the edge has settled
 * to just before the end, the jumps at the edges left out; median over pulses in which no spike peaks. A membrane charges
 * the way the current flows, so that a negative value speaks of a turned sign.
 */
export function pulseResponse(
  voltage: Signal,
  stimulus: Stimulus,
  current: Signal | null,
  spikes: readonly Spike[],
  noise_mv: number,
): Reading {
  const pulses = briefPulses(stimulus);
  const pa = stimulus.amplitude;
  if (pulses.length === 0 || pa === null || pa === 0) return absent('no-stimulus', { note: 'no brief pulse' });
  const peaks = spikes.map((spike) => spike.values['peak_at_s'] ?? Number.NaN);
  const found = pulses.flatMap(({ on_s, off_s }) => {
    if (peaks.some((peak) => peak >= on_s && peak <= off_s)) return [];
    const spread_s = spreadOf_s(current, on_s);
    const from = Math.ceil((on_s + spread_s - voltage.start_s) * voltage.rate_hz);
    const to =
      Math.floor((off_s - Math.max(1 / voltage.rate_hz, spread_s - settle_s) - voltage.start_s) * voltage.rate_hz) - 1;
    if (from < 0 || to >= voltage.samples.length || to - from < 1) return [];
    const change = voltage.samples[to]! - voltage.samples[from]!;
    return Number.isFinite(change) ? [{ change, at_s: on_s }] : [];
  });
  const change = median(found.map((one) => one.change));
  if (change === null) return absent('unresolved');
  return measured((change / pa) * 1000, {
    n: found.length,
    se: Math.abs((noise_mv * Math.SQRT2 * 1000) / pa / Math.sqrt(found.length)),
    at: { from_s: found[0]!.at_s },
  });
}
