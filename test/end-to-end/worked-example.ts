/**
 * The worked example done again from its downloads, by code that shares nothing with the site: other loops, other
 * formulas for the same things (times instead of indices, centred sums, Newton's form of the parabola).
 */
import { readFileSync } from 'node:fs';
import path from 'node:path';
import { parse } from 'csv-parse/sync';
import { classRanges, type ShippedClass } from '../../pipeline/judge/class-ranges.ts';
import { quantity } from '../../pipeline/measure/quantities.ts';
import { table } from './almanac.ts';

interface Redone {
  /** Redone here, unrounded and as printed; and as the page prints it. */
  byFiles: number;
  again: string;
  onPage: string;
  inTables: number;
  u95: number | null;
}

type Numbers = Record<string, number>;

const rowsOf = (file: string): Numbers[] =>
  (parse(readFileSync(file, 'utf8'), { columns: true }) as Record<string, string>[]).map((row) =>
    Object.fromEntries(Object.entries(row).map(([key, text]) => [key, text === '' ? Number.NaN : Number(text)])),
  );

const mean = (list: number[]): number => list.reduce((sum, one) => sum + one, 0) / list.length;

/** Slope through centred sums. */
function slopeOf(x: number[], y: number[]): number {
  const [mx, my] = [mean(x), mean(y)];
  const xy = x.reduce((sum, one, i) => sum + (one - mx) * (y[i]! - my), 0);
  return xy / x.reduce((sum, one) => sum + (one - mx) ** 2, 0);
}

/** Time at which a straight line between two samples is at a level. */
const reaches = (level: number, [t0, v0]: [number, number], [t1, v1]: [number, number]): number =>
  t0 + ((level - v0) * (t1 - t0)) / (v1 - v0);

function spikeFrom(file: string, criterion: number): Numbers {
  const samples = rowsOf(file).map((row): [number, number] => [row['time_s']!, row['membrane_potential_mv']!]);
  const top = samples.findIndex(([, mv]) => mv === Math.max(...samples.map((one) => one[1])));
  const slope = (i: number): number =>
    (samples[i + 1]![1] - samples[i - 1]![1]) / (samples[i + 1]![0] - samples[i - 1]![0]) / 1000;
  const rising = samples.map((_, i) => (i > 0 && i <= top ? slope(i) : Number.NEGATIVE_INFINITY));
  let after = rising.indexOf(Math.max(...rising));
  while (rising[after - 1]! >= criterion) after--;
  const at = reaches(criterion, [samples[after - 1]![0], slope(after - 1)], [samples[after]![0], slope(after)]);
  const [[t0, v0], [t1, v1]] = [samples[after - 1]!, samples[after]!];
  const threshold = v0 + ((at - t0) / (t1 - t0)) * (v1 - v0);
  // Newton's form through three samples, its maximum by setting the derivative to zero.
  const [a, b, c] = [samples[top - 1]![1], samples[top]![1], samples[top + 1]![1]];
  const [first, second] = [b - a, (c - 2 * b + a) / 2];
  const x = 0.5 - first / (2 * second);
  const peak = a + first * x + second * x * (x - 1);
  const half = threshold + (peak - threshold) / 2;
  const below = samples.slice(0, top).findLastIndex(([, mv]) => mv <= half);
  const down = samples.findIndex(([, mv], i) => i > top && mv <= half);
  return {
    threshold_mv: threshold,
    peak_mv: peak,
    spike_height_mv: peak - threshold,
    half_width_ms:
      1000 * (reaches(half, samples[down - 1]!, samples[down]!) - reaches(half, samples[below]!, samples[below + 1]!)),
  };
}

function stepsFrom(folder: string, sagSweep: number | null): Numbers {
  const steps = rowsOf(path.join(folder, 'steps.csv'));
  const down = steps.filter((one) => one['stimulus_pa']! < 0 && Number.isFinite(one['steady_deflection_mv']));
  const numbers: Numbers = {
    input_resistance_mohm:
      1000 *
      slopeOf([0, ...down.map((one) => one['stimulus_pa']!)], [0, ...down.map((one) => one['steady_deflection_mv']!)]),
  };
  const response = rowsOf(path.join(folder, 'response.csv'));
  const step = steps.find((one) => one['sweep'] === response[0]!['sweep'])!;
  const from = response.filter((one) => one['time_s']! < step['onset_s']!).map((one) => one['membrane_potential_mv']!);
  const before = mean(from);
  const way = response
    .map((one) => ({ s: one['time_s']! - step['onset_s']!, mv: one['membrane_potential_mv']! }))
    .filter(({ s }) => s >= 0.0005)
    .map((one) => ({ ...one, share: (one.mv - before) / step['steady_deflection_mv']! }));
  const start = way.findIndex((one) => one.share >= 0.1);
  const stop = way.findIndex((one, i) => i >= start && one.share >= 0.9);
  const onset = way.slice(start, stop);
  const lag = Math.trunc(onset.length / 3);
  const now = onset.filter((_, i) => i + lag < onset.length);
  const decay = slopeOf(
    now.map((one) => one.mv),
    now.map((_, i) => onset[i + lag]!.mv),
  );
  numbers['membrane_time_constant_ms'] = (1000 * (onset[lag]!.s - onset[0]!.s)) / Math.log(1 / decay);
  const sagging = steps.find((one) => one['sweep'] === sagSweep);
  if (sagging) numbers['sag_fraction'] = 1 - sagging['steady_deflection_mv']! / sagging['largest_deflection_mv']!;
  return numbers;
}

function potentialsFrom(file: string): Numbers {
  const ions = parse(readFileSync(file, 'utf8'), { columns: true }) as Record<string, string>[];
  const get = (ion: Record<string, string>, key: string): number => Number(ion[key]);
  const celsius = get(ions[0]!, 'celsius');
  // k/e of the 2019 SI, mV/K.
  const thermal = (1000 * 1.380649e-23 * (celsius + 273.15)) / 1.602176634e-19;
  const nernst = (name: string): number => {
    const ion = ions.find((one) => one['ion'] === name)!;
    return (thermal / get(ion, 'valence')) * (Math.log(get(ion, 'bath_mm')) - Math.log(get(ion, 'pipette_mm')));
  };
  const total = (of: (z: number, u: number, pipette: number, bath: number) => number): number =>
    ions.reduce(
      (sum, ion) =>
        sum +
        of(
          get(ion, 'valence'),
          get(ion, 'mobility_relative_to_potassium'),
          get(ion, 'pipette_mm'),
          get(ion, 'bath_mm'),
        ),
      0,
    );
  const up = total((z, u, p, b) => z * u * (b - p));
  const below = total((z, u, p, b) => z * z * u * (b - p));
  const ratio = total((z, u, p) => z * z * u * p) / total((z, u, _, b) => z * z * u * b);
  return { e_k: nernst('K'), e_na: nernst('Na'), ljp: thermal * (up / below) * Math.log(ratio) };
}

/** Every number of the example that can be had from its files alone. @throws Error when the page holds no example */
export function redone(site: string): { cell: string; numbers: Record<string, Redone> } {
  const page = readFileSync(path.join(site, 'methods/example/index.html'), 'utf8');
  const [, name] = /href="\.\.\/\.\.\/cells\/([^/"]+)\/index\.html">([^<]*)<\/a> done by hand/.exec(page) ?? [];
  if (!name) throw new Error('the page of the worked example names no cell');
  const folder = path.join(site, 'cells', name);
  const cell = table(site, 'cells').find((one) => one['cell'] === name)!;
  const classes = JSON.stringify(classRanges[cell['class'] as ShippedClass]?.spikes.rise_criterion_v_per_s ?? null);
  const criterion = classes === 'null' ? Number(/criterion of (\d+) V\/s/.exec(page)![1]) : Number(classes);
  const sagAt = /Of the steps, that of sweep (\d+) /.exec(page);
  const done: Numbers = {
    ...spikeFrom(path.join(folder, 'spike.csv'), criterion),
    ...stepsFrom(folder, sagAt ? Number(sagAt[1]) : null),
    ...potentialsFrom(path.join(site, 'methods/example/ions.csv')),
  };
  const numbers: Record<string, Redone> = {};
  for (const [, id = '', row = ''] of page.matchAll(/<tr data-quantity="([^"]+)">(.*?)<\/tr>/gs)) {
    const byFiles = done[id];
    if (byFiles === undefined) continue;
    const cells = [...row.matchAll(/<td[^>]*>(.*?)<\/td>/gs)].map((match) => match[1]!.trim());
    const plain = (text: string): string => text.replace('−', '-').replaceAll('\u202f', '').replaceAll('\u00a0', ' ');
    const [reported = '', half] = plain(cells[1]!).split(' ± ');
    const decimals = ['e_k', 'e_na', 'ljp'].includes(id) ? 1 : quantity(id).decimals;
    const inCells = cell[id];
    numbers[id] = {
      byFiles,
      again: byFiles.toFixed(decimals),
      onPage: plain(cells[0]!),
      inTables: inCells ? Number(inCells) : Number(reported),
      u95: half === undefined ? null : Number(half),
    };
  }
  return { cell: name, numbers };
}
