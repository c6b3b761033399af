import { describe, expect, test } from 'vitest';
import { measureCell } from '../../pipeline/measure/cell.ts';
import { withDerived } from '../../pipeline/measure/derive.ts';
import { quantities, quantitiesOf } from '../../pipeline/measure/quantities.ts';
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import type { NumberedSweep, Reading } from '../../pipeline/measure/types.ts';
import { cellContext, input, neuron } from '../measure/made.ts';
import { cells, cleanSweeps, conditions } from './current-clamp.ts';
import { record } from './recorder.ts';

/** Settings, counts and what the file states: exact, or without a meaning for an interval. */
const exact =
  /^(spikes|spikelets|doublets|bursts|rebound_spikes|escaped_currents|mean_rate_hz|max_rate_hz|rise_samples|.*_fraction|sample_interval_us|quantum_mv|stimulus_pa|command_mv|holding_pa|baseline_sd_mv|minutes_since_break_in)$/;

describe('what the registry promises of half-widths', () => {
  const cell = cells()[0]!;
  const under = conditions[0]!;
  const context = { ...neuron, filter_khz: under.filter_khz };
  const sweeps = cleanSweeps(cell).map((clean, k): NumberedSweep => {
    const { mv, pa, rate_hz } = record(clean, under, cell.electrode, k + 1);
    const signals = {
      voltage: { samples: mv, rate_hz, start_s: 0 },
      current: { samples: pa, rate_hz, start_s: 0 },
    };
    const measure = measureSweep(input(signals, { bridge_mohm: cell.electrode.access_mohm, bias_pa: 0 }), context);
    const known = { e_na_mv: 55, e_k_mv: -95, capacitance_pf: 280 };
    return {
      ...measure,
      spikes: withDerived(measure.spikes, known),
      sweep: k,
      condition: 'baseline',
      since_start_s: 10 * k,
    };
  });
  const readings = measureCell(sweeps, () => cellContext({ ...context, bias_pa: 0, e_na_mv: 55, e_k_mv: -95 }))
    .conditions[0]!.readings;
  const bare = (of: Record<string, Reading>, level: 'sweep' | 'cell'): string[] =>
    quantitiesOf(level).flatMap(({ id, uncertainty }) => {
      const reading = of[id];
      return uncertainty !== undefined && reading?.value != null && reading.u95 === undefined ? [id] : [];
    });

  test('a sweep’s numbers that have one carry it', () => {
    for (const sweep of sweeps) expect(bare(sweep.readings, 'sweep')).toEqual([]);
  });
  test('a cell’s numbers that have one carry it', () => expect(bare(readings, 'cell')).toEqual([]));
  test('a spike’s numbers that have one carry it', () => {
    const missing = sweeps.flatMap(({ spikes }) =>
      spikes.flatMap((spike) =>
        quantitiesOf('spike').flatMap(({ id, uncertainty }) =>
          uncertainty !== undefined && spike.values[id] != null && spike.u95?.[id] === undefined ? [id] : [],
        ),
      ),
    );
    expect([...new Set(missing)]).toEqual([]);
  });
  test('none is negative or without end', () => {
    const all = [
      ...Object.values(readings).flatMap((reading) => reading.u95 ?? []),
      ...sweeps.flatMap(({ spikes }) => spikes.flatMap((spike) => Object.values(spike.u95 ?? {}))),
    ];
    expect(all.length).toBeGreaterThan(100);
    expect(all.filter((width) => !(width >= 0 && Number.isFinite(width)))).toEqual([]);
  });
  test('every quantity says how its half-width is had, or is exact', () =>
    expect(
      quantities.flatMap(({ id, uncertainty }) => (uncertainty === undefined && !exact.test(id) ? [id] : [])),
    ).toEqual([]));
});
