import { spawnSync } from 'node:child_process';
import { createHash } from 'node:crypto';
import {
  existsSync,
  mkdirSync,
  mkdtempSync,
  readdirSync,
  readFileSync,
  rmSync,
  statSync,
  writeFileSync,
} from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { parse } from 'yaml';
import { generateArchive, perform } from '../../content-sample/generate/archive.ts';
import type { Fault } from '../../content-sample/generate/cells.ts';
import { allCells, days } from '../../content-sample/generate/roster.ts';
import { equilibriumMv, junctionMv, solutions } from '../../content-sample/generate/solutions.ts';
import { junctionPotential } from '../../pipeline/membrane/junction.ts';
import { nernstPotential } from '../../pipeline/membrane/nernst.ts';
import { dissolve } from '../../pipeline/membrane/solutions.ts';
import { findPython } from '../tooling/prepare.ts';

const roster = allCells();

describe('the roster', () => {
  test('holds what the sample promises', () => {
    const count = <T>(of: (one: (typeof roster)[number]) => T): number => new Set(roster.map(of)).size;
    expect(roster.length).toBeGreaterThanOrEqual(40);
    expect(roster.filter(({ cell }) => cell.fault === 'none').length).toBeGreaterThanOrEqual(24);
    expect(count(({ cell }) => cell.id)).toBe(roster.length);
    expect(count(({ day }) => day.rig)).toBe(3);
    expect(count(({ day }) => day.person)).toBe(4);
    expect(count(({ cell }) => cell.class)).toBe(4);
    expect(count(({ day }) => day.pipette)).toBeGreaterThanOrEqual(3);
    expect(count(({ day }) => day.bath)).toBeGreaterThanOrEqual(2);
    expect(count(({ day }) => day.subject.id)).toBeGreaterThanOrEqual(14);
    expect(new Set(roster.flatMap(({ cell }) => cell.text ?? [])).size).toBeGreaterThanOrEqual(4);
    expect(roster.filter(({ cell }) => cell.drugs).length).toBeGreaterThanOrEqual(3);
  });

  test('spans at least 14 weeks of 2026, in order, before 20 November', () => {
    const dates = days.map((day) => day.date);
    expect(dates).toEqual([...dates].sort());
    expect((Date.parse(dates.at(-1)!) - Date.parse(dates[0]!)) / (7 * 86_400_000)).toBeGreaterThanOrEqual(14);
    expect(dates[0]! >= '2026-01-01' && dates.at(-1)! < '2026-11-20').toBe(true);
  });

  test('plants every fault at least once, a forgotten bridge by one person several times', () => {
    const every: Fault[] = [
      'none',
      'junction-left-in',
      'junction-removed-twice',
      'junction-wrong-sign',
      'voltage-scale',
      'current-scale',
      'sign-inverted',
      'bridge-unbalanced',
      'rate-misdeclared',
      'temperature-misstated',
      'solution-swapped',
      'same-recording-twice',
      'wrong-class',
      'clipped',
      'hum',
      'slow-sampling',
      'low-filter',
      'noisy',
      'drifting',
      'rundown',
      'access-rising',
      'no-cell',
      'depolarized',
      'depolarization-block',
      'rig-drift',
      'high-access',
      'label-contradicts',
      'facts-disagree',
      'unit-unknown',
      'cut-short',
    ];
    expect(every.filter((fault) => !roster.some(({ cell }) => cell.fault === fault))).toEqual([]);
    const bridge = roster.filter(({ cell }) => cell.fault === 'bridge-unbalanced');
    expect(new Set(bridge.map(({ day }) => day.person)).size).toBe(1);
    expect(bridge.length).toBeGreaterThanOrEqual(3);
    for (const { cell } of roster) expect(cell.expects.length > 0).toBe(cell.fault !== 'none');
  });
});

describe('the solutions', () => {
  const recipeOf = (id: string) => {
    const file = new URL(`../../content-sample/archive/solutions/${id}.yaml`, import.meta.url);
    const recipe = parse(readFileSync(file, 'utf8'));
    return { millimolar: recipe.millimolar, ph: recipe.ph, titrant: recipe.titrant ?? null, gas: recipe.gas };
  };

  test('have a recipe for every one that the generator uses', () => {
    for (const id of Object.keys(solutions)) expect(recipeOf(id).millimolar).toBeTypeOf('object');
  });

  // Two countings of the same recipes: the generator's by hand, the tool's from the recipe. Half a millivolt is the
  // acid–base state of nucleotides and chelators, which the hand count rounds.
  test.each([
    ['acsf', 'k-gluconate', 33],
    ['acsf', 'k-methanesulfonate', 33],
    ['acsf', 'k-gluconate', 23],
    ['tyrode', 'k-aspartate', 36],
    ['tyrode-k10', 'k-aspartate', 36],
    ['sea-water', 'axon-perfusate', 9],
  ])('%s against %s at %i °C: potentials as the tool computes them', (bath, pipette, celsius) => {
    const outside = dissolve(recipeOf(bath), celsius);
    const inside = dissolve(recipeOf(pipette), celsius);
    expect(outside.unknown.concat(inside.unknown)).toEqual([]);
    for (const ion of ['Na', 'K'] as const) {
      const mm = (side: typeof inside): number => side.ions.find((one) => one.ion === ion)!.millimolar;
      const tool = nernstPotential(1, mm(outside), mm(inside), celsius);
      expect(Math.abs(equilibriumMv(ion, bath, pipette, celsius) - tool)).toBeLessThan(0.5);
    }
    const junction = junctionPotential(inside, outside, celsius).mv;
    expect(Math.abs(junctionMv(bath, pipette, celsius) - junction)).toBeLessThan(0.7);
  });
});

/** Cells of all four kinds and both ways of writing, cheap ones. */
const subset = [
  '2026-03-03-s2c1',
  '2026-03-17-a2c1',
  '2026-03-25-s1c2',
  '2026-03-25-s2c1',
  '2026-03-25-s2c2',
  '2026-05-12-a2c1',
  '2026-05-14-d2c1',
  '2026-06-26-s2c1',
];

function filesOf(root: string): string[] {
  return readdirSync(root, { recursive: true, withFileTypes: true })
    .filter((entry) => entry.isFile())
    .map((entry) => path.relative(root, path.join(entry.parentPath, entry.name)))
    .sort();
}
const digest = (file: string): string => createHash('sha256').update(readFileSync(file)).digest('hex');

describe('the archive', () => {
  const base = mkdtempSync(path.join(tmpdir(), 'sample-archive-'));
  const first = path.join(base, 'first');
  const second = path.join(base, 'second');
  const truthFile = path.join(base, 'truth.json');
  let truth: Awaited<ReturnType<typeof generateArchive>>;
  beforeAll(async () => {
    truth = await generateArchive({ out: first, truth: truthFile, only: subset });
    await generateArchive({ out: second, truth: null, only: subset.slice(0, 5) });
  });
  afterAll(() => rmSync(base, { recursive: true, force: true }));

  test('is the same byte for byte on every run, whichever cells are written with it', () => {
    const files = filesOf(second);
    expect(files.filter((file) => file.endsWith('.nwb'))).toHaveLength(4);
    for (const file of files)
      expect([file, digest(path.join(first, file))]).toEqual([file, digest(path.join(second, file))]);
  });

  test('keeps the truth outside, one entry a cell', () => {
    expect(filesOf(first).some((file) => file.includes('truth'))).toBe(false);
    const kept = JSON.parse(readFileSync(truthFile, 'utf8'));
    expect(kept.cells.map((cell: { cell: string }) => cell.cell)).toEqual(subset);
    expect(kept.cells).toEqual(JSON.parse(JSON.stringify(truth)));
  });

  test('every sound cell of it is possible under its solutions', () => {
    for (const cell of truth.filter((one) => one.fault === 'none'))
      for (const sweep of cell.sweeps) {
        if (sweep.clamp !== 'current') continue;
        expect(sweep.peak_mv!).toBeLessThan(cell.e_na_mv);
        if (sweep.stimulus >= 0) expect(sweep.trough_mv!).toBeGreaterThan(cell.e_k_mv);
      }
  });

  test('the cells fire, and in the drug they do not', () => {
    const spikes = (id: string): number[] => truth.find((one) => one.cell === id)!.sweeps.map((sweep) => sweep.spikes);
    for (const id of subset) expect(Math.max(...spikes(id))).toBeGreaterThan(0);
    expect(Math.max(...spikes('2026-03-17-a2c1').slice(0, 9))).toBeGreaterThan(0);
    expect(Math.max(...spikes('2026-03-17-a2c1').slice(9))).toBe(0);
    expect(new Set(spikes('2026-05-14-d2c1'))).toEqual(new Set([1]));
  });

  test('a file that is cut short is shorter than it says', () => {
    const file = path.join(first, 'recordings/2026-06-26-loft/s2c1.nwb');
    const bytes = readFileSync(file);
    // HDF5 superblock of version 2 with offsets of 8 bytes: the end-of-file address stands at byte 28.
    expect([bytes[8], bytes[9]]).toEqual([2, 8]);
    expect(Number(bytes.readBigUInt64LE(28))).toBeGreaterThan(statSync(file).size);
  });

  test('refuses an unknown cell, a truth inside the archive, and a folder that is not its own', async () => {
    const foreign = path.join(base, 'foreign');
    mkdirSync(foreign);
    writeFileSync(path.join(foreign, 'thesis.txt'), 'mine');
    await expect(generateArchive({ out: second, truth: null, only: ['nobody'] })).rejects.toThrow('no cell "nobody"');
    await expect(generateArchive({ out: second, truth: path.join(second, 'truth.json'), only: [] })).rejects.toThrow(
      'outside the archive',
    );
    await expect(generateArchive({ out: foreign, truth: null, only: [] })).rejects.toThrow('not the sample archive');
    expect(existsSync(path.join(foreign, 'thesis.txt'))).toBe(true);
  });

  const python = findPython();
  test.skipIf(!python)('NWB files hold for h5py what was simulated', () => {
    const script = `
import h5py, json, sys
out = {}
for path in sys.argv[1:]:
    with h5py.File(path) as f:
        kinds = {}
        sweeps = {}
        for name, series in f['acquisition'].items():
            kind = series.attrs['neurodata_type']
            kinds[kind] = kinds.get(kind, 0) + 1
            data = series['data']
            volts = data[()] * data.attrs['conversion'] + data.attrs['offset']
            sweeps[name] = [len(volts), float(volts.min()), float(volts.max()), float(series['starting_time'].attrs['rate']),
                data.attrs['unit'], int(series.attrs['sweep_number']), series['electrode'].name, series['electrode'].attrs['neurodata_type']]
        icephys = f['general/intracellular_ephys']
        table = None
        if 'intracellular_recordings' in icephys:
            t = icephys['intracellular_recordings']
            table = [[f[row['timeseries']].name, int(row['count'])] for row in t['responses/response'][()]]
            table += [[f[row['timeseries']].name, int(row['count'])] for row in t['stimuli/stimulus'][()]]
        if 'sweep_table' in icephys:
            t = icephys['sweep_table']
            table = [[f[ref].name, 0] for ref in t['series'][()]]
            assert f[t['series_index'].attrs['target']].name == t['series'].name
        out[path.split('/')[-1]] = {
            'version': f.attrs['nwb_version'], 'type': f.attrs['neurodata_type'], 'start': f['session_start_time'][()].decode(),
            'subject': f['general/subject/subject_id'][()].decode(), 'kinds': kinds, 'sweeps': sweeps, 'table': table,
            'stimuli': len(f['stimulus/presentation']), 'electrodes': [n for n in icephys if n.startswith('electrode')]}
print(json.dumps(out))
`;
    const paths = ['2026-03-03-quay/s2c1.nwb', '2026-03-25-loft/s1c2.nwb', '2026-03-25-loft/s2-pair.nwb'].map((file) =>
      path.join(first, 'recordings', file),
    );
    const run = spawnSync(python!, ['-c', script, ...paths], { encoding: 'utf8' });
    expect(run.stderr).toBe('');
    const read = JSON.parse(run.stdout);
    const one = read['s2c1.nwb'];
    const known = roster.find(({ cell }) => cell.id === '2026-03-03-s2c1')!;
    const performed = perform(known.day, known.cell);
    expect([one.version, one.type, one.start, one.subject]).toEqual([
      '2.7.0',
      'NWBFile',
      '2026-03-03T11:46:00+01:00',
      'm01',
    ]);
    expect(one.kinds).toEqual({ CurrentClampSeries: performed.sweeps.length - 2, VoltageClampSeries: 2 });
    expect(one.stimuli).toBe(performed.sweeps.length);
    performed.sweeps.forEach(({ sweep }, number) => {
      const name = `sweep_${String(number).padStart(3, '0')}`;
      const clamp = sweep.plan.clamp;
      const data = clamp === 'current' ? sweep.voltage : sweep.current;
      const scale = clamp === 'current' ? sweep.quantum_mv * 1e-3 : sweep.quantum_pa * 1e-12;
      const [samples, low, high, rate, unit, source, electrode, type] = one.sweeps[name];
      expect([samples, rate, source, type]).toEqual([data.length, sweep.rate_hz, number, 'IntracellularElectrode']);
      expect(unit).toBe(clamp === 'current' ? 'volts' : 'amperes');
      expect(electrode).toMatch(/electrode$|electrode_0$/);
      expect(low / scale).toBeCloseTo(Math.min(...data), 6);
      expect(high / scale).toBeCloseTo(Math.max(...data), 6);
    });
    const rows = performed.sweeps.map(
      ({ sweep }, number) =>
        [
          String(number).padStart(3, '0'),
          sweep.plan.clamp === 'current' ? sweep.voltage.length : sweep.current.length,
        ] as const,
    );
    expect(one.table).toEqual([
      ...rows.map(([number, count]) => [`/acquisition/sweep_${number}`, count]),
      ...rows.map(([number, count]) => [`/stimulus/presentation/command_${number}`, count]),
    ]);
    expect(read['s1c2.nwb'].table).toHaveLength(2 * Object.keys(read['s1c2.nwb'].sweeps).length);
    expect(read['s2-pair.nwb'].electrodes).toEqual(['electrode_0', 'electrode_1']);
  });
});
