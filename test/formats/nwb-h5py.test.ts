/** Files written by h5py, read back: the other implementation of HDF5 is the reference here. */
import { spawnSync } from 'node:child_process';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import { beforeAll, describe, expect, test } from 'vitest';
import { findPython } from '../tooling/prepare.ts';
import { commandPa, farthest, type Opened, open, potentialMv, refusal, temporaryFolder } from './helpers.ts';

const python = findPython();
if (!python) console.warn('h5py is not installed: the NWB files of a second program are not tried.');

describe.skipIf(!python)('NWB written by h5py', () => {
  const folder = temporaryFolder();
  const at = (name: string): string => path.join(folder, name);

  beforeAll(() => {
    const script = fileURLToPath(new URL('write_nwb.py', import.meta.url));
    const done = spawnSync(python!, [script, folder], { encoding: 'utf8' });
    expect(done.stderr).toBe('');
  });

  describe('storage', () => {
    let file: Opened;
    beforeAll(async () => {
      file = await open(at('storage.nwb'));
    });

    for (const name of [
      'int16_gzip_shuffle',
      'int16_big_endian',
      'int32',
      'int64',
      'float32',
      'float64_big_endian',
      'float64_millivolts',
    ])
      test(`${name} is read back to the last digits`, () => {
        const { voltage, current, clamp, problems } = file.read(`/acquisition/${name}`);
        expect(clamp).toBe('current');
        expect(current).toBeNull();
        expect(problems).toEqual([]);
        expect(voltage!.rate_hz).toBe(20000);
        expect(voltage!.start_s).toBe(0);
        expect(voltage!.samples.length).toBe(2000);
        expect(farthest(voltage!.samples, (index) => potentialMv(index, 0))).toBeLessThan(1e-11);
      });

    test('an offset is added after the conversion', () => {
      const { voltage } = file.read('/acquisition/with_offset');
      expect(farthest(voltage!.samples, (index) => potentialMv(index, 0) - 15.625)).toBeLessThan(1e-11);
    });

    test('samples that are no finite numbers are NaN and counted', () => {
      const { voltage, problems } = file.read('/acquisition/with_holes');
      const holes = [...voltage!.samples.keys()].filter((index) => Number.isNaN(voltage!.samples[index]!));
      expect(holes).toEqual([3, 700, 1999]);
      expect(problems.map(({ code, weight }) => [code, weight])).toEqual([['SAMPLES_UNREADABLE', 'warns']]);
      expect(problems[0]!.message).toContain('3 of 2000');
    });

    test('date and time are those of the place, as written', () => {
      const facts = Object.fromEntries(file.description.facts.map(({ key, value }) => [key, value]));
      expect(facts).toEqual({ date: '2026-03-12', time: '14:05:09' });
      expect(file.description.session_start).toBe('2026-03-12T14:05:09.250000+01:00');
      expect(file.description.format_label).toBe('NWB 2.7.0');
    });

    test('sweeps come in the order of their start', () => {
      expect(file.description.sweeps.map(({ start_s }) => start_s)).toEqual([0, 1, 2, 3, 4, 5, 6, 90, 91]);
    });

    test('a key that is not there is a mistake of the caller', () => {
      expect(() => file.read('/acquisition/none')).toThrow(RangeError);
    });
  });

  describe('tables of recordings', () => {
    let file: Opened;
    beforeAll(async () => {
      file = await open(at('tables.nwb'));
    });

    test('pieces of one series are sweeps, with the stimulus their row names', () => {
      expect(file.description.sweeps.map(({ key }) => key)).toEqual([
        '/acquisition/long[0:2000]',
        '/acquisition/long[2000:4000]',
        '/acquisition/long[4000:6000]',
      ]);
      for (const [k, { key }] of file.description.sweeps.entries()) {
        const { voltage, current } = file.read(key);
        expect(farthest(voltage!.samples, (index) => potentialMv(index, k))).toBeLessThan(1e-11);
        if (k === 2) expect(current).toBeNull();
        else {
          expect(farthest(current!.samples, (index) => commandPa(index, k))).toBeLessThan(1e-9);
          expect(current!.start_s).toBe(0);
        }
      }
    });

    test('a row without a stimulus says so', () => {
      expect(file.problem('STIMULUS_MISSING').sweep_key).toBe('/acquisition/long[4000:6000]');
      expect(file.description.sweeps.map(({ has_current }) => has_current)).toEqual([true, true, false]);
    });

    test('numbers, protocols, start times and settings', () => {
      expect(file.description.sweeps.map(({ source_sweep }) => source_sweep)).toEqual([10, 11, 12]);
      expect(file.description.sweeps.map(({ protocol }) => protocol)).toEqual(['long step', 'long step', 'rest']);
      expect(file.description.sweeps.map(({ start_s }) => start_s)).toEqual([0, 0.1, 0.2]);
      const [first] = file.description.sweeps;
      expect(first).toMatchObject({ electrode: 'e0', bridge_mohm: 14, filter_khz: 10, clamp: 'current' });
      expect(first!.bias_pa).toBeCloseTo(-20, 9);
      expect(file.read(first!.key).bridge_mohm).toBe(14);
    });

    test('facts of subject and electrode', () => {
      const facts = Object.fromEntries(file.description.facts.map(({ key, value }) => [key, value]));
      expect(facts).toEqual({
        date: '2026-03-12',
        time: '14:05:09',
        subject: 'm41',
        species: 'Mus musculus',
        age: 'P30D',
        sex: 'F',
        genotype: 'wild type',
        region: 'layer 5',
        slice: 'coronal, 300 um',
        pipette_mohm: 4.5,
        seal_gohm: 2.5,
        access_mohm: 12,
        filter_khz: 10,
      });
      expect(file.description.facts.every(({ electrode }) => electrode === undefined)).toBe(true);
    });
  });

  test('the older sweep table pairs what no name would', async () => {
    const file = await open(at('sweep_table.nwb'));
    expect(file.codes).toEqual([]);
    expect(file.description.sweeps.map(({ source_sweep, electrode }) => `${source_sweep} ${electrode}`)).toEqual([
      '40 e0',
      '40 e1',
      '41 e0',
      '41 e1',
      '42 e0',
      '42 e1',
    ]);
    for (const { key, electrode, source_sweep } of file.description.sweeps) {
      const sign = electrode === 'e0' ? 1 : -1;
      const { current } = file.read(key);
      expect(farthest(current!.samples, (index) => sign * commandPa(index, source_sweep! - 40))).toBeLessThan(1e-9);
    }
    const regions = file.description.facts.filter(({ key }) => key === 'region');
    expect(regions.map(({ electrode, value }) => [electrode, value])).toEqual([
      ['e0', 'layer 0'],
      ['e1', 'layer 1'],
    ]);
    expect(file.description.sweeps[0]!.filter_khz).toBe(5);
  });

  describe('timestamps', () => {
    let file: Opened;
    beforeAll(async () => {
      file = await open(at('timestamps.nwb'));
    });

    for (const name of ['regular', 'rounded'])
      test(`${name} ones are a rate and a start`, () => {
        const entry = file.description.sweeps.find(({ key }) => key === `/acquisition/${name}`)!;
        expect(entry.rate_hz).toBeCloseTo(20000, 3);
        expect(entry.start_s).toBe(5);
        const { voltage, problems } = file.read(entry.key);
        expect(problems).toEqual([]);
        expect(voltage!.rate_hz).toBeCloseTo(20000, 3);
        expect(farthest(voltage!.samples, (index) => potentialMv(index, 0))).toBeLessThan(1e-11);
      });

    test('samples left out are NaN in their places', () => {
      const { voltage, problems } = file.read('/acquisition/gaps');
      const holes = [...voltage!.samples.keys()].filter((index) => Number.isNaN(voltage!.samples[index]!));
      expect(holes).toEqual([100, 101, 1500]);
      expect(voltage!.samples.length).toBe(2000);
      expect(voltage!.rate_hz).toBe(20000);
      expect(voltage!.samples[1999]).toBeCloseTo(potentialMv(1999, 0), 10);
      expect(problems.map(({ code }) => code)).toEqual(['TIME_GAPS']);
    });

    test('irregular and missing ones are refused with the reason', async () => {
      expect((await refusal(() => file.read('/acquisition/irregular'))).code).toBe('TIMES_IRREGULAR');
      const short = await refusal(() => file.read('/acquisition/short'));
      expect(short.code).toBe('TIMES_TOO_FEW');
      expect(short.message).toContain('1900');
    });

    test('neither rate nor timestamps: the question, and the answer from the sidecar', async () => {
      const problem = file.problem('RATE_MISSING');
      expect(problem).toMatchObject({ weight: 'blocks', sweep_key: '/acquisition/neither' });
      expect(problem.sidecar).toContain('rate_hz');
      const told = await open(at('timestamps.nwb'), { rate_hz: 20000 });
      expect(told.codes).not.toContain('RATE_MISSING');
      expect(told.read('/acquisition/neither').voltage!.rate_hz).toBe(20000);
      // The rate of the sidecar changes nothing where the file states one.
      expect((await open(at('timestamps.nwb'), { rate_hz: 5 })).read('/acquisition/regular').voltage!.rate_hz).toBe(
        20000,
      );
    });
  });

  test('links: followed inside the file, named where they lead nowhere, and no circle', async () => {
    const file = await open(at('links.nwb'));
    expect(file.description.sweeps.map(({ key }) => key)).toEqual(['/acquisition/deep/er/real', '/acquisition/linked']);
    expect(farthest(file.read('/acquisition/linked').voltage!.samples, (index) => potentialMv(index, 3))).toBeLessThan(
      1e-11,
    );
    const broken = file.description.problems.filter(({ code }) => code === 'LINK_BROKEN');
    expect(broken.map(({ place, weight }) => [place, weight])).toEqual([
      ['/acquisition/broken', 'blocks'],
      ['/acquisition/outside', 'blocks'],
    ]);
    expect(broken[1]!.message).toContain('missing_part.h5');
  });

  describe('labels against data', () => {
    let file: Opened;
    beforeAll(async () => {
      file = await open(at('mislabelled.nwb'));
    });
    const entry = (name: string) => file.description.sweeps.find(({ key }) => key === `/acquisition/${name}`);
    const codesAt = (name: string): string[] =>
      file.description.problems.filter(({ place }) => place.startsWith(`/acquisition/${name}`)).map(({ code }) => code);

    test('a potential in amperes is read as the potential it is, and said', () => {
      expect(codesAt('potential_in_amperes')).toEqual(['UNIT_CONTRADICTS_TYPE']);
      expect(entry('potential_in_amperes')).toMatchObject({ clamp: 'current', has_voltage: true });
      const { voltage } = file.read('/acquisition/potential_in_amperes');
      expect(farthest(voltage!.samples, (index) => potentialMv(index, 0))).toBeLessThan(1e-11);
    });

    test('"a.u." is guessed where one unit fits, asked for where none does', () => {
      expect(codesAt('arbitrary_millivolts')).toContain('UNIT_GUESSED');
      const { voltage } = file.read('/acquisition/arbitrary_millivolts');
      expect(farthest(voltage!.samples, (index) => potentialMv(index, 0))).toBeLessThan(1e-11);
      expect(file.problem('UNIT_UNKNOWN')).toMatchObject({
        place: '/acquisition/arbitrary_huge/data',
        weight: 'blocks',
        sidecar: 'table:\n  voltage: { columns: ["arbitrary_huge"], unit: mV }',
      });
      expect(entry('arbitrary_huge')).toBeUndefined();
    });

    test('the sidecar settles what the file leaves open', async () => {
      const told = await open(at('mislabelled.nwb'), {
        table: { voltage: { columns: ['arbitrary_huge', '/acquisition/undecided'], unit: 'uV' } },
      });
      const { voltage } = told.read('/acquisition/arbitrary_huge');
      expect(voltage!.samples[0]).toBeCloseTo(-70312.5, 6);
      expect(told.read('/acquisition/undecided').voltage!.samples[0]).toBeCloseTo(0.0499296875, 9);
    });

    test('a class that contradicts unit and data loses', () => {
      expect(codesAt('voltage_clamp_in_volts')).toContain('CLAMP_CONTRADICTS_DATA');
      expect(entry('voltage_clamp_in_volts')!.clamp).toBe('current');
      expect(entry('current_clamp_of_a_current')!.clamp).toBe('voltage');
      const { current } = file.read('/acquisition/current_clamp_of_a_current');
      expect(current!.samples[0]).toBeCloseTo(-10, 9);
      expect(current!.samples[600]).toBeCloseTo(-110, 9);
    });

    test('what the data cannot decide is asked', () => {
      expect(codesAt('undecided')).toEqual(['UNIT_CONTRADICTS_TYPE']);
      expect(entry('undecided')).toBeUndefined();
    });

    test('a stated unit is kept even where it cannot be true, and said', () => {
      const { voltage, problems } = file.read('/acquisition/millivolts_called_volts');
      expect(voltage!.samples[0]).toBeCloseTo(-70312.5, 6);
      expect(problems.map(({ code }) => code)).toEqual(['SCALE_IMPLAUSIBLE']);
    });

    test('the general class is what its unit says', () => {
      expect(entry('plain')).toMatchObject({ clamp: 'current', has_voltage: true });
    });

    test('at zero current nothing was injected', () => {
      const { stated_stimulus } = file.read('/acquisition/at_rest');
      expect(stated_stimulus).toEqual({ kind: 'none' });
      expect(entry('at_rest')!.bias_pa).toBe(0);
    });

    test('a bridge of 14 Ω is not believed', () => {
      expect(entry('bridge_in_megohms')!.bridge_mohm).toBeNull();
      expect(file.problem('BRIDGE_IMPLAUSIBLE').sidecar).toBe('facts: { bridge_mohm: 14 }');
    });

    for (const [name, code] of [
      ['zero_conversion', 'CONVERSION_UNUSABLE'],
      ['empty', 'SERIES_EMPTY'],
      ['words', 'DATA_NOT_NUMBERS'],
      ['cube', 'SHAPE_UNKNOWN'],
      ['lzf', 'FILTER_MISSING'],
    ] as const)
      test(`${name} is refused with ${code} and costs nothing else`, () => {
        expect(codesAt(name)).toEqual([code]);
        expect(entry(name)).toBeUndefined();
      });

    test('two traces in one array are two sweeps, whichever way round', () => {
      for (const name of ['two_columns', 'two_rows'])
        for (const k of [0, 1]) {
          const { voltage } = file.read(`/acquisition/${name}#${k + 1}`);
          expect(farthest(voltage!.samples, (index) => potentialMv(index, k))).toBeLessThan(1e-11);
        }
      expect(file.codes).toContain('TRACES_SPLIT');
    });

    test('1871 is no date of a recording', () => {
      expect(file.problem('DATE_UNUSABLE').message).toContain('1871');
      expect(file.description.facts).toEqual([]);
      expect(file.description.session_start).toContain('1871');
    });

    test('other series are named', () => {
      expect(file.problem('OTHER_SERIES').message).toContain('/acquisition/temperature');
    });
  });

  describe('stimuli', () => {
    let file: Opened;
    beforeAll(async () => {
      file = await open(at('stimuli.nwb'));
    });

    test('by sweep number, with the amplitude its label claims', () => {
      const entry = file.description.sweeps.find(({ key }) => key === '/acquisition/data_00000_AD0')!;
      expect(entry).toMatchObject({ labelled_amplitude: -100, protocol: 'step -100 pA', source_sweep: 0 });
      expect(farthest(file.read(entry.key).current!.samples, (index) => commandPa(index, 0))).toBeLessThan(1e-9);
    });

    test('by name, in voltage clamp', () => {
      const { clamp, voltage, current } = file.read('/acquisition/VoltageClampSeries007');
      expect(clamp).toBe('voltage');
      expect(farthest(voltage!.samples, (index) => potentialMv(index, 1))).toBeLessThan(1e-11);
      expect(farthest(current!.samples, (index) => 2 * commandPa(index, 3))).toBeLessThan(1e-9);
      const entry = file.description.sweeps.find(({ key }) => key === '/acquisition/VoltageClampSeries007')!;
      // 'to -70 mV and back' claims no amplitude relative to anything.
      expect(entry.labelled_amplitude).toBeNull();
      expect(entry.scaling).toContain('A × 1');
    });

    test('what the amplifier compensated in voltage clamp, in pF and percent', () => {
      const { compensation } = file.read('/acquisition/VoltageClampSeries007');
      expect(compensation!.whole_cell_pf).toBeCloseTo(42.5, 9);
      expect(compensation).toMatchObject({ correction_percent: 70, prediction_percent: null });
      expect(file.read('/acquisition/data_00000_AD0').compensation ?? null).toBeNull();
    });

    test('shorter than the response: both as they are, and said', () => {
      const { current, problems } = file.read('/acquisition/short_stimulus_8');
      expect(current!.samples.length).toBe(1500);
      expect(problems.map(({ code }) => code)).toEqual(['STIMULUS_LENGTH']);
    });

    test('of another rate: each keeps its own', () => {
      const { voltage, current, problems } = file.read('/acquisition/slow_stimulus_9');
      expect([voltage!.rate_hz, current!.rate_hz]).toEqual([20000, 5000]);
      expect(current!.samples.length).toBe(500);
      expect(problems).toEqual([]);
    });

    test('two that fit equally are none', () => {
      expect(file.problem('STIMULUS_AMBIGUOUS').sweep_key).toBe('/acquisition/twins');
      expect(file.read('/acquisition/twins').current).toBeNull();
    });

    test('of the wrong kind: left out and said', () => {
      expect(file.problem('STIMULUS_UNIT').place).toBe('/stimulus/presentation/wrong_kind_10');
      expect(file.read('/acquisition/wrong_kind_10').current).toBeNull();
    });

    test('late by a known time, or by an impossible one', () => {
      const late = file.read('/acquisition/late_11');
      expect(late.current!.start_s).toBeCloseTo(0.01, 12);
      const elsewhere = file.read('/acquisition/elsewhere_12');
      expect(elsewhere.current!.start_s).toBe(0);
      expect(elsewhere.problems.map(({ code }) => code)).toContain('STIMULUS_CLOCK');
    });

    test('a stimulus under a sweep filed as zero current', () => {
      const { problems, stated_stimulus, current } = file.read('/acquisition/not_zero_13');
      expect(problems.map(({ code }) => code)).toEqual(['CLAMP_CONTRADICTS_DATA']);
      expect(stated_stimulus).toBeNull();
      expect(current!.samples[600]).toBeCloseTo(50, 9);
    });

    test('none at all', () => {
      expect(file.problem('STIMULUS_MISSING').sweep_key).toBe('/acquisition/alone');
    });
  });

  test('HDF5 that is no NWB is refused with what it holds', async () => {
    const problem = await refusal(() => open(at('other.nwb')));
    expect(problem.code).toBe('NOT_NWB');
    expect(problem.message).toContain('/traces/vm float64 [3 × 100]');
  });

  test('NWB without an intracellular series says what is there', async () => {
    const file = await open(at('no_sweeps.nwb'));
    expect(file.description.sweeps).toEqual([]);
    expect(file.problem('NO_SWEEPS')).toMatchObject({ weight: 'blocks' });
  });
});
