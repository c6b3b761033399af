/**
 * `npm run bench`: what a build costs, as ratios within one run, since absolute times say more about the machine.
 * Not a test: nothing here fails for being slow.
 */
import { mkdtempSync, readFileSync, rmSync, utimesSync } from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { openRecording } from '../../pipeline/formats/open.ts';
import { spikeCriteria } from '../../pipeline/measure/spike-criteria.ts';
import { measureSweep } from '../../pipeline/measure/sweep.ts';
import { almanac, filesBelow, generator, run } from '../end-to-end/almanac.ts';

interface Build {
  seconds: number;
  peak_memory_mb: number;
  sweeps: number;
  spikes: number;
  opened: number;
}

const folder = mkdtempSync(path.join(os.tmpdir(), 'almanac-bench-'));
const at = (...parts: string[]): string => path.join(folder, ...parts);
const archive = at('archive');

function build(work: string, ...more: string[]): Build {
  const { status, stdout, stderr } = almanac(
    'build',
    archive,
    '--out',
    at('site'),
    '--work',
    at(work),
    '--json',
    ...more,
  );
  if (status !== 0) throw new Error(stderr);
  return JSON.parse(stdout) as Build;
}

const median = (list: number[]): number => [...list].sort((a, b) => a - b)[Math.floor(list.length / 2)]!;
const show = (name: string, value: string): void => console.log(`${name.padEnd(58)} ${value}`);
const ratio = (a: number, b: number): string => `${(a / b).toFixed(2)} ×`;

/** Seconds to read, and to read and measure, every sweep of the archive's NWB files in this thread. */
async function readAndMeasure(): Promise<{ read: number; measure: number; megasamples: number }> {
  let read = 0;
  let measure = 0;
  let samples = 0;
  const context = { ...spikeCriteria('any'), filter_khz: null, mains_hz: 50, capacitance_pf: null };
  for (const file of filesBelow(archive).filter((name) => name.endsWith('.nwb'))) {
    const recording = await openRecording(path.join(archive, file), 'nwb', {}).catch(() => null);
    if (!recording) continue;
    for (const { key } of recording.describe().sweeps) {
      const started = performance.now();
      const sweep = recording.read(key);
      const between = performance.now();
      measureSweep({ ...sweep, bridge_mohm: null }, context);
      measure += performance.now() - between;
      read += between - started;
      samples += (sweep.voltage?.samples.length ?? 0) + (sweep.current?.samples.length ?? 0);
    }
    recording.close();
  }
  return { read: read / 1000, measure: measure / 1000, megasamples: samples / 1e6 };
}

try {
  const cells = (process.argv[2] ?? '').split(',').filter((one) => one !== '');
  const made = run(
    generator,
    archive,
    at('truth.json'),
    '--quiet',
    ...(cells.length > 0 ? ['--only', cells.join(',')] : []),
  );
  if (made.status !== 0) throw new Error(made.stderr);
  const files = filesBelow(archive).filter((name) => /\.(nwb|csv|txt|dat|tsv)$/.test(name));

  const first = build('work');
  show('sweeps, spikes', `${first.sweeps}, ${first.spikes}`);
  show('a first build', `${first.seconds} s, at most ${first.peak_memory_mb} MB`);
  const again = [1, 2, 3].map(() => build('work'));
  show(
    'building again, nothing changed (median of 3), to first',
    ratio(median(again.map((one) => one.seconds)), first.seconds),
  );
  show('files opened then', String(again[0]!.opened));

  const one = path.join(archive, files.find((name) => name.endsWith('.nwb'))!);
  utimesSync(one, new Date(), new Date());
  const touched = build('work');
  show('after a file got a new date but kept its bytes, to first', ratio(touched.seconds, first.seconds));
  show('files opened then', String(touched.opened));

  const alone = build('work-one', '--jobs', '1');
  const two = build('work-two', '--jobs', '2');
  show('two readers to one, whole build', ratio(two.seconds, alone.seconds));

  const { read, measure, megasamples } = await readAndMeasure();
  show('measuring to reading, one thread, NWB', ratio(measure, read));
  show('samples a second, read and measured', `${(megasamples / (read + measure)).toFixed(1)} million`);
  const bytes = filesBelow(archive).reduce((sum, name) => sum + readFileSync(path.join(archive, name)).length, 0);
  show('archive', `${files.length} recordings, ${(bytes / 1e6).toFixed(0)} MB`);
} finally {
  rmSync(folder, { recursive: true, force: true });
}
