/** What a train of fast spikes is made of: doublets and bursts, its highest rate, block and recovery. */
import { median, standardDeviation } from '../signal/statistics.ts';
import { absent, measured } from './reading.ts';
import type { Reading, Readings, Signal, Spike, Stimulus } from './types.ts';

/** Intervals within a burst are at most this long, s. */
const longestWithin_s = 0.02;
/** And shorter than this share of the pauses on either side. */
const shareOfPause = 1 / 3;
/** A spike of this share of the first spike's height has recovered. */
const recovered = 0.8;
/** Uncertainty of a peak time, in sample intervals: that of a place anywhere within one. */
const peakTime_samples = 1 / Math.sqrt(12);

export interface Group {
  /** Index of the first spike and number of spikes. */
  first: number;
  count: number;
}

/**
 * Runs of two or more spikes that follow each other within 20 ms and in less than a third of the pause before the run
 * and of the one after it; where the train begins or ends with the run only the other pause is asked, and a train that
 * is one run is no group. Of runs within each other the longest counts.
 * @param times_s spike times in order
 */
export function groupsOf(times_s: readonly number[]): Group[] {
  const intervals = times_s.slice(1).map((time, k) => time - times_s[k]!);
  const groups: Group[] = [];
  let k = 0;
  while (k < intervals.length) {
    const before = k === 0 ? Number.POSITIVE_INFINITY : intervals[k - 1]!;
    let longest = 0;
    let kept = -1;
    for (let end = k; end < intervals.length && intervals[end]! <= longestWithin_s; end++) {
      longest = Math.max(longest, intervals[end]!);
      if (longest >= shareOfPause * before) break;
      const after = end + 1 < intervals.length ? intervals[end + 1]! : Number.POSITIVE_INFINITY;
      const alone = k === 0 && end === intervals.length - 1;
      if (!alone && longest < shareOfPause * after) kept = end;
    }
    if (kept < 0) k++;
    else {
      groups.push({ first: k, count: kept - k + 2 });
      k = kept + 1;
    }
  }
  return groups;
}

/** Largest instantaneous rate, doublets, bursts, block and recovery of a current-clamp sweep. */
export function measureTrains(
  spikes: readonly Spike[],
  stimulus: Stimulus,
  voltage: Signal,
  blocked: boolean,
  slow: boolean,
): Readings {
  const times = spikes.map((spike) => spike.values['peak_at_s'] ?? Number.NaN);
  const ids = ['largest_instantaneous_rate_hz', 'doublets', 'bursts', 'block_onset_ms', 'block_recovery_ms'];
  if (slow) return Object.fromEntries(ids.map((id) => [id, absent('not-this-class')]));
  const groups = groupsOf(times);
  const count = (wanted: (group: Group) => boolean): Reading => {
    if (spikes.length < 2) return absent(spikes.length === 0 ? 'no-spikes' : 'too-few-spikes');
    const own = groups.filter(wanted);
    const first = own[0];
    return measured(own.length, {
      n: spikes.length,
      ...(first ? { at: { spike: first.first, from_s: times[first.first]! } } : {}),
    });
  };
  return {
    largest_instantaneous_rate_hz: largestRate(times, voltage),
    doublets: count((group) => group.count === 2),
    bursts: count((group) => group.count > 2),
    ...blockReadings(spikes, times, stimulus, blocked, voltage.rate_hz),
  };
}

function largestRate(times: readonly number[], voltage: Signal): Reading {
  if (times.length < 2) return absent(times.length === 0 ? 'no-spikes' : 'too-few-spikes');
  let shortest = 0;
  const intervals = times.slice(1).map((time, k) => time - times[k]!);
  intervals.forEach((interval, k) => {
    if (interval < intervals[shortest]!) shortest = k;
  });
  const rate = 1 / intervals[shortest]!;
  return measured(rate, {
    n: intervals.length,
    se: (rate * rate * Math.SQRT2 * peakTime_samples) / voltage.rate_hz,
    at: { spike: shortest, from_s: times[shortest]!, to_s: times[shortest + 1]! },
  });
}

function blockReadings(
  spikes: readonly Spike[],
  times: readonly number[],
  stimulus: Stimulus,
  blocked: boolean,
  rateHz: number,
): Readings {
  const { onset_s, end_s } = stimulus;
  // The peak's own half-width and half a sample of the stimulus edge.
  const width = (spike: Spike): Pick<Reading, 'u95'> => {
    const own = spike.u95?.['peak_at_s'];
    return own === undefined ? {} : { u95: 1000 * Math.hypot(own, 0.5 / rateHz) };
  };
  if (!blocked || onset_s === null || end_s === null)
    return { block_onset_ms: absent('not-blocked'), block_recovery_ms: absent('not-blocked') };
  const last = times.findLastIndex((time) => time < end_s);
  const height = (spike: Spike): number => spike.values['spike_height_mv'] ?? Number.NaN;
  const full = height(spikes.find((_, k) => times[k]! >= onset_s) ?? spikes[0]!);
  const back = spikes.findIndex((spike, k) => times[k]! > end_s && height(spike) >= recovered * full);
  return {
    block_onset_ms: measured((times[last]! - onset_s) * 1000, {
      ...width(spikes[last]!),
      at: { spike: last, from_s: times[last]!, to_s: end_s },
    }),
    block_recovery_ms:
      back < 0
        ? absent('no-spikes', { note: 'no spike of 80 % of the first one’s height after the step' })
        : measured((times[back]! - end_s) * 1000, {
            ...width(spikes[back]!),
            at: { spike: back, from_s: end_s, to_s: times[back]! },
          }),
  };
}

/** Least height of a spikelet, mV, and in standard deviations of fast noise. */
const leastSpikelet_mv = 3;
const clearOfNoise = 8;
/** A spikelet rises from its foot within 2 ms and has fallen by half within 3 ms: synaptic potentials last longer. */
const risesWithin_s = 0.002;
const fallsWithin_s = 0.003;
/** Around a stimulus edge, and after a spike's peak, the electrode and the spike have the word, s. */
const nearEdge_s = 0.003;
const afterSpike_s = 0.005;

/**
 * Small brief depolarizations that are no spikes: tops that stand 3 mV or eight standard deviations of fast noise above
 * the lowest potential of the 2 ms before, fall by half of that within 3 ms, and stay below the class's prominence.
 * Spikes, stimulus edges and a depolarization block are left out.
 */
export function countSpikelets(
  voltage: Signal,
  spikes: readonly Spike[],
  stimulus: Stimulus,
  noise_mv: number,
  prominence_mv: number,
  blockFrom_s: number | null,
): Reading {
  const { samples, rate_hz, start_s } = voltage;
  const before = Math.max(2, Math.round(risesWithin_s * rate_hz));
  const after = Math.max(2, Math.round(fallsWithin_s * rate_hz));
  const least = Math.max(leastSpikelet_mv, clearOfNoise * noise_mv);
  const closed = [
    ...spikes.map((spike) => [
      (spike.values['threshold_at_s'] ?? spike.values['peak_at_s'] ?? 0) - risesWithin_s,
      (spike.values['peak_at_s'] ?? 0) + afterSpike_s,
    ]),
    ...stimulus.edges_s.map((edge) => [edge - nearEdge_s, edge + nearEdge_s]),
    ...(blockFrom_s === null || stimulus.end_s === null ? [] : [[blockFrom_s, stimulus.end_s]]),
  ].sort((a, b) => a[0]! - b[0]!) as [number, number][];
  const found: { at_s: number; height: number }[] = [];
  let next = 0;
  for (let i = before; i + after < samples.length; i++) {
    const top = samples[i]!;
    if (!(top > samples[i - 1]! && top >= samples[i + 1]!)) continue;
    // The quick look first: most samples are no tops.
    if (!(top - samples[i - before]! > 0.5 * least)) continue;
    const at_s = start_s + i / rate_hz;
    while (next < closed.length && closed[next]![1] < at_s) next++;
    if (closed.slice(next, next + 3).some(([from, to]) => at_s >= from && at_s <= to)) continue;
    let [foot, highest] = [top, top];
    for (let k = i - before; k < i; k++) foot = Math.min(foot, samples[k]!);
    for (let k = i - before; k <= i + after; k++) highest = Math.max(highest, samples[k]!);
    const height = top - foot;
    if (!(height >= least && height < prominence_mv && highest <= top)) continue;
    let lowest = top;
    for (let k = i; k <= i + after; k++) lowest = Math.min(lowest, samples[k]!);
    if (!(top - lowest >= height / 2)) continue;
    found.push({ at_s, height });
    i += before;
  }
  const heights = found.map((one) => one.height);
  const spread = standardDeviation(heights);
  const first = found[0];
  return measured(found.length, {
    ...(first
      ? {
          at: { from_s: first.at_s },
          note: `height ${median(heights)!.toFixed(1)} mV${spread === null ? '' : ` ± ${spread.toFixed(1)} mV`}`,
        }
      : {}),
  });
}
