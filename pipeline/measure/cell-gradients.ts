import {
  changePerSpikeMm,
  equilibriumShiftMv,
  excessFactor,
  exchangeTimeConstantS,
  peakShiftMv,
  type Sides,
  shareRetained,
} from '../membrane/gradients.ts';
import { measuredCapacitance } from './derive.ts';
import { absent, measured } from './reading.ts';
import type { CellContext, NumberedSweep, Reading, Readings } from './types.ts';

const spikesCounted = 100;

/** 95 % half-width of the exchange time constant as a share: what Pusch & Neher's own cells scatter by (from memory). */
const exchangeHalfWidth = 0.5;

/** A value at the usual excess factor; its half-width reaches the farther of the two ends of the factor's range. */
function overExcess(of: (excess: number) => number | null, others: readonly number[] = [], note?: string): Reading {
  const value = of(excessFactor.usual);
  if (value === null) return absent('unresolved', { note: 'nothing would be left of the gradient' });
  const ends = [excessFactor.low, excessFactor.high].map(of).filter((end) => end !== null);
  const reach = Math.max(...ends.map((end) => Math.abs(end - value)));
  return measured(value, {
    u95: Math.hypot(reach, ...others.map((share) => share * Math.abs(value))),
    ...(note ? { note } : {}),
  });
}

const shareOf = (reading: Reading | null): number =>
  reading?.value && reading.u95 !== undefined ? Math.abs(reading.u95 / reading.value) : 0;

/** Spikes per second of the recording, first sweep to the end of the last; null where the sweeps have no times. */
function paceHz(sweeps: readonly NumberedSweep[]): number | null {
  const timed = sweeps.flatMap((sweep) =>
    sweep.since_start_s === null ? [] : [{ from: sweep.since_start_s, to: sweep.since_start_s + sweep.duration_s }],
  );
  if (timed.length < sweeps.length || timed.length === 0) return null;
  const span = Math.max(...timed.map(({ to }) => to)) - Math.min(...timed.map(({ from }) => from));
  const spikes = sweeps.reduce((sum, sweep) => sum + sweep.spikes.length, 0);
  return span > 0 && spikes > 0 ? spikes / span : null;
}

/**
 * The expected loss of the sodium and potassium gradients by firing, beside which the observed rundown of the spike's
 * height can stand.
 * @param done the cell's readings so far: height, peak, capacitance, access resistance
 */
export function gradientReadings(sweeps: readonly NumberedSweep[], done: Readings, context: CellContext): Readings {
  const facts = context.gradients ?? null;
  const volume = facts?.volume_pl ?? null;
  const height = done['spike_height_mv'] ?? absent('no-spikes');
  const peak = done['peak_mv'] ?? absent('no-spikes');
  const capacitance: Reading =
    context.stated_capacitance_pf !== null
      ? { value: context.stated_capacitance_pf }
      : (measuredCapacitance(done) ??
        done['cell_capacitance_pf'] ??
        absent('fact-missing', { missing: ['capacitance_pf'] }));
  const access = done['access_resistance_mohm'] ?? absent('fact-missing', { missing: ['access_mohm'] });

  const noVolume = volume === null ? absent('fact-missing', { missing: ['volume_pl'] }) : null;
  // A plateau or a calcium spike lets in sodium by another measure than C·H: no published factor holds for it.
  const otherMeasure = context.slow
    ? absent('unresolved', { note: 'no published factor for spikes with a plateau or carried by calcium' })
    : null;
  const noSize =
    noVolume ?? otherMeasure ?? (height.value === null ? height : capacitance.value === null ? capacitance : null);
  const gain = (excess: number, spikes = spikesCounted): number =>
    spikes * changePerSpikeMm(capacitance.value!, Math.max(height.value!, 0), excess, volume!);
  const sizes = [shareOf(capacitance), shareOf(height)];
  const without = (missing: readonly string[]): Reading =>
    absent('fact-missing', missing.length > 0 ? { missing: [...missing] } : { note: 'the ions inside are not known' });

  const shift = (sides: Sides | null, sign: 1 | -1, missing: readonly string[]): Reading => {
    if (noSize) return { ...noSize };
    if (!sides || facts!.celsius === null) return without(missing);
    return overExcess((excess) => equilibriumShiftMv(sides, sign * gain(excess), facts!.celsius!), sizes);
  };
  const rundown = (retained: number, more: readonly number[], note?: string): Reading => {
    const { sodium, potassium, celsius } = facts!;
    if (!(height.value! > 0)) return absent('unresolved');
    return overExcess(
      (excess) => {
        const moved = peakShiftMv(peak.value!, sodium!, potassium!, retained * gain(excess), celsius!);
        return moved === null ? null : (100 * moved) / height.value!;
      },
      [...sizes, ...more],
      note,
    );
  };
  const noRundown: Reading | null =
    noSize ??
    (peak.value === null
      ? peak
      : !facts!.sodium || facts!.celsius === null
        ? without(context.missing_for_e_na)
        : !facts!.potassium
          ? without(context.missing_for_e_k)
          : null);

  const exchange: Reading = noVolume
    ? { ...noVolume }
    : !facts!.pipette || facts!.celsius === null
      ? without(context.missing_for_e_na)
      : access.value === null || access.value <= 0
        ? access.value === null
          ? { ...access }
          : absent('unresolved')
        : exchangeOf(access, volume!, facts!.pipette, facts!.celsius);

  const pace = paceHz(sweeps);
  const dialysed: Reading = noRundown
    ? { ...noRundown }
    : exchange.value === null
      ? { ...exchange }
      : pace === null
        ? absent('fact-missing', { missing: ['time'] })
        : dialysedOf(pace, exchange, rundown);

  return {
    sodium_gain_mm_per_100_spikes: noSize ? { ...noSize } : overExcess((excess) => gain(excess), sizes),
    e_na_change_mv_per_100_spikes: shift(facts?.sodium ?? null, 1, context.missing_for_e_na),
    e_k_change_mv_per_100_spikes: shift(facts?.potassium ?? null, -1, context.missing_for_e_k),
    expected_rundown_percent_per_100_spikes: noRundown ? { ...noRundown } : rundown(1, []),
    exchange_time_constant_s: exchange,
    dialysed_rundown_percent_per_100_spikes: dialysed,
  };
}

function exchangeOf(
  access: Reading,
  volume: number,
  pipette: readonly { ion: string; valence: number; millimolar: number }[],
  celsius: number,
): Reading {
  const value = exchangeTimeConstantS(access.value!, volume, pipette, celsius);
  return measured(value, { u95: value * Math.hypot(exchangeHalfWidth, shareOf(access)) });
}

function dialysedOf(
  pace: number,
  exchange: Reading,
  rundown: (retained: number, more: readonly number[], note?: string) => Reading,
): Reading {
  const duration = spikesCounted / pace;
  const retained = shareRetained(duration, exchange.value!);
  const slower = shareRetained(duration, exchange.value! + (exchange.u95 ?? 0));
  const quick = retained < 0.1 ? '; exchange all but removes the loss' : '';
  return rundown(
    retained,
    [(slower - retained) / retained],
    `100 spikes take ${duration.toPrecision(2)} s, and ${(100 * retained).toFixed(0)} % of what entered is left${quick}`,
  );
}
