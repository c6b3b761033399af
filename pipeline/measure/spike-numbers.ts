/**
 * How well the numbers of one spike are known, and what the filter took from them: the same measurements are made on the
 * trace as recorded and on the trace restored from its filter, and their difference is what is expected to be lost.
 */
import { coverage95Biased } from '../signal/coverage.ts';
import { electrodeShare, type KnownFilter } from './filter.ts';
import { type Fine, fineCrossing, finePeak, fineSlope, fineThreshold, type Trace } from './spike-shape.ts';
import type { AbsenceCode, Spike } from './types.ts';

/** What was placed between the samples; null where it was not found. Values mV, slopes mV per sample. */
export interface Places {
  threshold: Fine | null;
  peak: Fine | null;
  up: Fine | null;
  down: Fine | null;
  back: Fine | null;
  rise: Fine | null;
  fall: Fine | null;
  lowest: Fine | null;
}

/** Expected error and its standard deviation, in the quantity's unit. */
export interface Uncertain {
  bias: number;
  sd: number;
}
export type Errors = Record<string, Uncertain>;

/** Slope that makes the threshold, mV per sample, and samples per ms. */
export interface Scale {
  slope: number;
  perMs: number;
}

/** Share of what the next smoother would change that a number is expected to be off by. */
const shiftShare = 0.6;
const error = (fine: Fine): number => Math.hypot(fine.sd, shiftShare * fine.shift);
const errorAt = (fine: Fine): number => Math.hypot(fine.sdAt, shiftShare * fine.shiftAt);

/** Numbers of the places, in the registry's units. */
function numbersOf(places: Places, { perMs }: Scale): Record<string, number> {
  const { threshold, peak, up, down, back, rise, fall, lowest } = places;
  const out: Record<string, number> = {};
  if (threshold) out['threshold_mv'] = threshold.value;
  if (threshold) out['threshold_at_s'] = threshold.at / perMs / 1000;
  if (peak) out['peak_mv'] = peak.value;
  if (peak) out['peak_at_s'] = peak.at / perMs / 1000;
  if (peak && threshold) out['spike_height_mv'] = peak.value - threshold.value;
  if (peak && threshold) out['depolarization_ms'] = (peak.at - threshold.at) / perMs;
  if (peak && back) out['repolarization_ms'] = (back.at - peak.at) / perMs;
  if (up && down) out['half_width_ms'] = (down.at - up.at) / perMs;
  if (rise) out['max_rise_v_per_s'] = rise.value * perMs;
  if (fall) out['max_fall_v_per_s'] = fall.value * perMs;
  if (lowest) out['ahp_minimum_mv'] = lowest.value;
  if (lowest && threshold) out['ahp_below_threshold_mv'] = threshold.value - lowest.value;
  return out;
}

/** Standard deviations of those numbers from noise and interpolation. */
function spreadsOf(places: Places, { perMs }: Scale): Record<string, number> {
  const { threshold, peak, up, down, back, rise, fall, lowest } = places;
  const out: Record<string, number> = {};
  if (threshold) out['threshold_mv'] = error(threshold);
  if (threshold) out['threshold_at_s'] = errorAt(threshold) / perMs / 1000;
  if (peak) out['peak_mv'] = error(peak);
  if (peak) out['peak_at_s'] = errorAt(peak) / perMs / 1000;
  if (peak && threshold) {
    out['spike_height_mv'] = Math.hypot(error(peak), error(threshold));
    out['depolarization_ms'] = Math.hypot(errorAt(peak), errorAt(threshold)) / perMs;
  }
  if (peak && back) {
    const level = threshold ? error(threshold) / Math.abs(back.value) : 0;
    out['repolarization_ms'] = Math.hypot(errorAt(peak), errorAt(back), level) / perMs;
  }
  if (up && down) {
    // An error of the level at half height widens or narrows both flanks.
    const level = threshold && peak ? Math.hypot(error(threshold), error(peak)) / 2 : 0;
    const flanks = 1 / Math.abs(up.value) + 1 / Math.abs(down.value);
    out['half_width_ms'] = Math.hypot(errorAt(up), errorAt(down), level * flanks) / perMs;
  }
  if (rise) out['max_rise_v_per_s'] = rise.sd * perMs;
  if (fall) out['max_fall_v_per_s'] = fall.sd * perMs;
  if (lowest) out['ahp_minimum_mv'] = error(lowest);
  if (lowest && threshold) out['ahp_below_threshold_mv'] = Math.hypot(error(threshold), error(lowest));
  return out;
}

/** The same places looked up again in another version of the trace, with the same low-pass each. */
function placedAgain(places: Places, trace: Trace, { slope }: Scale): Places {
  const threshold =
    places.threshold && fineThreshold(trace, places.threshold.at, slope, 2, 0, places.threshold.smoother);
  const peak = places.peak && finePeak(trace, places.peak.at, 0, places.peak.smoother);
  const half = threshold && peak ? threshold.value + (peak.value - threshold.value) / 2 : null;
  const cross = (place: Fine | null, level: number | null, up: boolean): Fine | null =>
    place && level !== null ? fineCrossing(trace, place.at, level, up, 0, place.smoother) : null;
  return {
    threshold,
    peak,
    up: cross(places.up, half, true),
    down: cross(places.down, half, false),
    back: cross(places.back, threshold?.value ?? null, false),
    rise: places.rise && fineSlope(trace, places.rise.at, true, 0, places.rise.smoother),
    fall: places.fall && fineSlope(trace, places.fall.at, false, 0, places.fall.smoother),
    lowest: null,
  };
}

/** The lowest of a noisy stretch lies low, by about so many standard deviations of its reading. */
const lowestOfNoise = 0.6;

/**
 * What restoring cannot reach, as a share of what it restored: frequencies that the filter or the sampling has taken
 * altogether. It grows with the share of the rise that was restored; fourteen times that share is what the spikes of four
 * published membrane models show behind filters of 2 to 20 kHz (this project’s own comparison with known truth).
 */
const beyondReach = 14;
/** Standard uncertainty of that, and of what the electrode is expected to cost, as shares of them: electrodes of 4 to 20 µs are met. */
const beyondDoubt = 0.4;
const electrodeDoubt = 0.8;

export interface FilterView {
  filter: KnownFilter;
  restored: Float64Array;
  /** Covariance of the noise in the trace restored in full. */
  covariance: Float64Array;
}

/** Of its rise a filter may have taken so much before no correction is sound: of the rise itself, of height and width. */
const mostRiseLost = 0.25;
const mostRiseLostForShape = 0.4;

const corrections = [
  { from: 'max_rise_v_per_s', to: 'max_rise_corrected_v_per_s', most: mostRiseLost },
  { from: 'peak_mv', to: 'peak_corrected_mv', most: mostRiseLostForShape },
  { from: 'spike_height_mv', to: 'spike_height_corrected_mv', most: mostRiseLostForShape },
  { from: 'half_width_ms', to: 'half_width_corrected_ms', most: mostRiseLostForShape },
] as const;

/**
 * Errors of the measured numbers, and the numbers as they would be without the filter. Adds the corrected numbers and
 * what was lost to `values` and `why`.
 */
export function uncertainties(
  places: Places,
  trace: Trace,
  scale: Scale,
  view: FilterView | null,
  values: Record<string, number | null>,
  why: Record<string, AbsenceCode>,
): Errors {
  const errors: Errors = {};
  const measured = numbersOf(places, scale);
  const spreads = spreadsOf(places, scale);
  const again = view && placedAgain(places, { ...trace, samples: view.restored, covariance: view.covariance }, scale);
  const full = again && numbersOf(again, scale);
  const fullSpreads = again && spreadsOf(again, scale);
  const electrode = view ? electrodeShare(view.filter) : 0;
  const loss = (id: string): number | null => (full && id in full && id in measured ? full[id]! - measured[id]! : null);
  const riseLoss = loss('max_rise_v_per_s');
  const restoredShare = riseLoss === null ? 0 : Math.max(0, riseLoss / full!['max_rise_v_per_s']!);
  const beyond = beyondReach * restoredShare;
  const riseShare = riseLoss === null ? null : (restoredShare * (1 + beyond)) / (1 + restoredShare * beyond);
  // A smoother makes the steepest slope less steep, never steeper.
  const flattened: Record<string, number> = {
    max_rise_v_per_s: places.rise ? places.rise.shift * scale.perMs : 0,
    max_fall_v_per_s: places.fall ? -places.fall.shift * scale.perMs : 0,
  };
  for (const [id, value] of Object.entries(measured)) {
    const lost = full && id in full ? full[id]! - value : 0;
    errors[id] = {
      bias:
        lost * (1 + electrode + beyond) +
        (flattened[id] ?? 0) +
        (id === 'ahp_minimum_mv' ? lowestOfNoise * spreads[id]! : 0),
      sd: Math.hypot(
        spreads[id]!,
        lost * Math.hypot(view ? view.filter.share : 0, electrodeDoubt * electrode, beyondDoubt * beyond),
      ),
    };
  }
  const put = (id: string, value: number | AbsenceCode): void => {
    if (typeof value === 'number' && Number.isFinite(value)) values[id] = value;
    else {
      values[id] = null;
      why[id] = typeof value === 'number' ? 'unresolved' : value;
    }
  };
  const sound = view !== null && view.filter.from !== 'assumed';
  for (const { from, to, most } of corrections) {
    const own = loss(from);
    if ((values[from] ?? null) === null) put(to, why[from] ?? 'unresolved');
    else if (!sound) put(to, 'filter-unknown');
    else if (own === null || riseShare === null || riseShare > most) put(to, 'unresolved');
    else {
      put(to, full![from]!);
      errors[to] = {
        bias: (electrode + beyond) * own + (flattened[from] ?? 0),
        sd: Math.hypot(
          Math.max(fullSpreads![from]!, spreads[from]!),
          own * Math.hypot(view.filter.share, electrodeDoubt * electrode, beyondDoubt * beyond),
        ),
      };
    }
  }
  const costs: [string, string, (own: number) => number][] = [
    ['rise_lost_percent', 'max_rise_v_per_s', (own) => (100 * own) / full!['max_rise_v_per_s']!],
    ['height_lost_mv', 'spike_height_mv', (own) => own],
    ['width_gained_percent', 'half_width_ms', (own) => (-100 * own) / full!['half_width_ms']!],
  ];
  for (const [id, from, formula] of costs) {
    const own = loss(from);
    if ((values[from] ?? null) === null) put(id, why[from] ?? 'unresolved');
    else if (!sound) put(id, 'filter-unknown');
    else if (own === null) put(id, 'unresolved');
    else {
      put(id, formula(own));
      const unit = Math.abs(formula(1));
      errors[id] = {
        bias: unit * own * (electrode + beyond),
        sd:
          unit *
          Math.hypot(
            0.5 * spreads[from]!,
            own * Math.hypot(view.filter.share, electrodeDoubt * electrode, beyondDoubt * beyond),
          ),
      };
    }
  }
  return errors;
}

/** Slow noise that rides on every potential: hum of an amplitude and frequency, and wander of a standard deviation. */
export interface SlowNoise {
  hum_mv: number;
  hum_hz: number;
  wander_mv: number;
}

const potentials = [
  'threshold_mv',
  'peak_mv',
  'peak_corrected_mv',
  'overshoot_mv',
  'ahp_minimum_mv',
  'height_from_rest_mv',
];

/**
 * The spike with its 95 % half-widths, slow noise added to what noise, interpolation and filter leave: in full to
 * potentials, and to differences between two moments Δt apart as far as hum changes meanwhile, A·√2·|sin(π·f·Δt)|.
 * @param baselineU95 half-width of the sweep's baseline, mV; null where not known
 */
export function withHalfWidths(spike: Spike, errors: Errors, slow: SlowNoise, baselineU95: number | null): Spike {
  const u95: Record<string, number> = {};
  const riding = Math.hypot(slow.hum_mv / Math.SQRT2, slow.wander_mv);
  const between = (ms: number | null | undefined): number =>
    ms == null ? 0 : slow.hum_mv * Math.SQRT2 * Math.abs(Math.sin((Math.PI * slow.hum_hz * ms) / 1000));
  const rising = between(spike.values['depolarization_ms']);
  const late = spike.values['repolarization_ms'];
  const peakError = errors['peak_mv'];
  const all: Errors = {
    ...errors,
    ...(peakError ? { overshoot_mv: peakError, height_from_rest_mv: peakError } : {}),
  };
  for (const [id, { bias, sd }] of Object.entries(all)) {
    if ((spike.values[id] ?? null) === null) continue;
    const extra = potentials.includes(id)
      ? Math.hypot(riding, id === 'height_from_rest_mv' ? (baselineU95 ?? 0) / 1.96 : 0)
      : id === 'spike_height_mv' || id === 'spike_height_corrected_mv'
        ? rising
        : id === 'ahp_below_threshold_mv'
          ? Math.hypot(between(late == null ? null : 2 * late), slow.wander_mv)
          : 0;
    u95[id] = coverage95Biased(bias, Math.hypot(sd, extra));
  }
  // A slow spike brings its peak's half-width along, slow noise included.
  const top = spike.u95?.['peak_mv'];
  const height = spike.values['height_from_rest_mv'] ?? null;
  if (peakError === undefined && top !== undefined && baselineU95 !== null && height !== null)
    u95['height_from_rest_mv'] = Math.hypot(top, baselineU95);
  return { ...spike, u95: { ...spike.u95, ...u95 } };
}
