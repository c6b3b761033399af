/**
 * The numbers that authors published for one of their own recordings of a stem-cell heart cell: github
 * Christini-Lab/ap-vc-correlations (BSD-3-Clause), `ap_features.csv`, row 4_021921_1_alex_control. The recording itself is
 * not part of this project: the test runs where SWEEP_ALMANAC_RECORDINGS names a folder that holds it.
 */
import { existsSync, readFileSync } from 'node:fs';
import path from 'node:path';
import { describe, expect, test } from 'vitest';
import { spikeCriteria } from '../../pipeline/measure/spike-criteria.ts';
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import { input } from '../measure/made.ts';

const folder = process.env['SWEEP_ALMANAC_RECORDINGS'] ?? '';
const file = path.join(folder, 'csv-cardiomyocyte', 'cells_4_021921_1_alex_control_Pre-drug_spont.csv');

const published = {
  apd90_ms: 182.157,
  cycle_length_ms: 482.38,
  max_rise_v_per_s: 22.614,
  peak_mv: 41.996,
  mp_mv: -70.17,
};

const present = folder !== '' && existsSync(file);

describe.skipIf(!present)('21 beats of a stem-cell heart cell, as published', () => {
  // A skipped suite is still read through: without the file there is nothing to measure.
  const lines = present ? readFileSync(file, 'utf8').trim().split('\n').slice(1) : ['0,0'];
  const samples = Float64Array.from(lines, (line) => 1000 * Number(line.split(',')[1]));
  const { spikes } = measureSweep(
    input({ voltage: { samples, rate_hz: 10_000, start_s: 0 }, current: null }, { stated_stimulus: { kind: 'none' } }),
    { ...spikeCriteria('stem-cell-cardiomyocyte'), filter_khz: null, mains_hz: null, capacitance_pf: null },
  );
  const mean = (id: string): number => {
    const values = spikes.flatMap((spike) => spike.values[id] ?? []);
    return values.reduce((sum, value) => sum + value, 0) / values.length;
  };

  test('durations and cycles agree', () => {
    expect(spikes).toHaveLength(21);
    expect(Math.abs(mean('apd90_ms') / published.apd90_ms - 1)).toBeLessThan(0.01);
    expect(Math.abs(mean('cycle_length_ms') / published.cycle_length_ms - 1)).toBeLessThan(0.001);
  });

  test('theirs are extremes of all samples, ours lie inside by no more than noise allows', () => {
    expect(samples.reduce((a, b) => Math.max(a, b))).toBeCloseTo(published.peak_mv, 2);
    expect(samples.reduce((a, b) => Math.min(a, b))).toBeCloseTo(published.mp_mv, 2);
    expect(published.peak_mv - mean('peak_mv')).toBeGreaterThan(0);
    expect(published.peak_mv - mean('peak_mv')).toBeLessThan(2.5);
    expect(mean('diastolic_potential_mv') - published.mp_mv).toBeLessThan(2.5);
  });

  test('their maximum rise is a slope over 2 ms', () => {
    const wide = spikes.map((spike) => {
      const at = Math.round(spike.values['upstroke_at_s']! * 10_000);
      let best = 0;
      for (let i = at - 100; i < at + 100; i++) best = Math.max(best, (samples[i + 20]! - samples[i]!) / 2);
      return best;
    });
    expect(wide.reduce((sum, value) => sum + value, 0) / wide.length / published.max_rise_v_per_s).toBeCloseTo(1, 1);
    expect(mean('max_rise_v_per_s')).toBeGreaterThan(published.max_rise_v_per_s);
  });
});
