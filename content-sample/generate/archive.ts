/** Runs the roster and writes the archive: recordings, what stands beside them, and the truth apart. */
import { cpSync, existsSync, mkdirSync, readdirSync, rmSync, statSync, truncateSync, writeFileSync } from 'node:fs';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import { benchOf, conditionsOf, membraneOf, protocolOf, rheobaseOf, roundTo } from './bench.ts';
import type { CellSpec, DaySpec } from './cells.ts';
import { type NwbSweep, writeNwb } from './nwb.ts';
import { randomFrom } from './random.ts';
import { type RecordedSweep, session } from './recorder.ts';
import { allCells, days } from './roster.ts';
import { writeStrays } from './strays.ts';
import { writeText } from './text.ts';

/** Files of the archive that people wrote by hand; they are copied. */
const handWritten = fileURLToPath(new URL('../archive/', import.meta.url));

const timezone = '+01:00';

/** One cell as recorded: what goes to its file, and what was true. */
export interface Performed {
  day: DaySpec;
  cell: CellSpec;
  sweeps: { sweep: RecordedSweep; at_s: number }[];
  bridge_mohm: number;
  truth: CellTruth;
}

export interface CellTruth {
  cell: string;
  file: string;
  class: string;
  kind: string;
  model: string;
  fault: string;
  expects: string[];
  /** Membrane potential is recorded minus this, mV, before any planted scale. */
  reading_offset_mv: number;
  ljp_mv: number;
  ljp_in_reading_mv: number;
  e_na_mv: number;
  e_k_mv: number;
  temperature_c: number;
  bath: string;
  pipette: string;
  access_mohm: number;
  bridge_mohm: number;
  bridge_error_mohm: number;
  rest_mv: number;
  capacitance_pf: number;
  rheobase_pa: number;
  parameters: Record<string, number>;
  sweeps: {
    protocol: string;
    clamp: string;
    stimulus: number;
    spikes: number;
    baseline_mv: number;
    peak_mv: number | null;
    trough_mv: number | null;
    access_mohm: number;
  }[];
}

const rounded = (x: number, digits = 4): number => Number(x.toFixed(digits));

/** Records one cell of the roster. Depends on the cell alone, not on which others are recorded. */
export function perform(day: DaySpec, cell: CellSpec): Performed {
  if (cell.copy_of) return copyOf(day, cell);
  const membrane = membraneOf(day, cell);
  const random = randomFrom(`${cell.id}|bench`);
  const bench = benchOf(day, cell, membrane, random);
  let model = membrane.build();
  const rheobase = cell.kind === 'nothing' ? 100 : rheobaseOf(membrane);
  const plans = protocolOf(cell, rheobase);
  const run = session(model, membrane.start_mv, membrane.slow, random);
  const rest = run.restingMv();
  const sweeps: { sweep: RecordedSweep; at_s: number }[] = [];
  const last = Math.max(1, plans.length - 1);
  plans.forEach(({ plan, at_s, keepState }, k) => {
    for (const drug of cell.drugs ?? [])
      if (drug.from_sweep === k) {
        if (drug.k_out_mm) {
          model = membrane.build(drug);
          run.use(model);
        }
        for (const channel of ['na', 'k', 'ca'] as const)
          if (drug[channel] !== undefined) model.scale(channel, drug[channel]!);
        run.rest(1500);
      }
    const through = k / last;
    if (cell.g_na_end !== undefined) model.scale('na', 1 + (cell.g_na_end - 1) * through);
    const access =
      cell.access_end_mohm === undefined
        ? bench.access_mohm * (1 + 0.02 * through)
        : bench.access_mohm + (cell.access_end_mohm - bench.access_mohm) * through ** 1.5;
    const perSecond = (cell.drift_mv_per_min ?? 0.03) / 60;
    sweeps.push({
      at_s,
      sweep: run.record(
        plan,
        {
          ...bench,
          access_mohm: access,
          reading_offset_mv: bench.reading_offset_mv + perSecond * at_s,
          drift_mv_per_s: perSecond,
        },
        at_s,
        keepState,
      ),
    });
  });
  const real = conditionsOf(day, cell);
  const truth: CellTruth = {
    cell: cell.id,
    file: `recordings/${day.folder}/${cell.file}`,
    class: cell.class,
    kind: cell.kind,
    model: model.name,
    fault: cell.fault,
    expects: cell.expects,
    reading_offset_mv: rounded(bench.reading_offset_mv),
    ljp_mv: rounded(real.ljp_mv),
    ljp_in_reading_mv: rounded((cell.junction_left ?? (day.junction === 'corrected' ? 0 : 1)) * real.ljp_mv),
    e_na_mv: rounded(real.e_na_mv),
    e_k_mv: rounded(real.e_k_mv),
    temperature_c: real.celsius,
    bath: real.bath,
    pipette: real.pipette,
    access_mohm: rounded(bench.access_mohm),
    bridge_mohm: rounded(bench.bridge_mohm),
    bridge_error_mohm: rounded(bench.access_mohm - bench.bridge_mohm),
    rest_mv: rounded(rest),
    capacitance_pf: rounded(bench.area_cm2 * 1e6, 2),
    rheobase_pa: rounded(rheobase, 2),
    parameters: Object.fromEntries(
      Object.entries(membrane.parameters).map(([key, value]) => [key, Number(value.toPrecision(6))]),
    ),
    sweeps: sweeps.map(({ sweep }) => ({
      protocol: sweep.plan.protocol,
      clamp: sweep.plan.clamp,
      stimulus: strongest(sweep),
      spikes: cell.kind === 'nothing' ? 0 : sweep.spikes,
      baseline_mv: rounded(sweep.baseline_mv, 3),
      peak_mv: Number.isFinite(sweep.peak_mv) ? rounded(sweep.peak_mv, 3) : null,
      trough_mv: Number.isFinite(sweep.trough_mv) ? rounded(sweep.trough_mv, 3) : null,
      access_mohm: rounded(sweep.access_mohm),
    })),
  };
  return { day, cell, sweeps, bridge_mohm: bench.bridge_mohm, truth };
}

/** Step of a sweep relative to holding; in voltage clamp the command's change, mV. */
function strongest(sweep: RecordedSweep): number {
  const { pieces, holding, clamp } = sweep.plan;
  const piece = pieces[0];
  if (!piece) return 0;
  return clamp === 'current' ? piece.end : piece.end - holding;
}

/** The same recording under another name, saved again with a slightly other gain and offset. */
function copyOf(day: DaySpec, cell: CellSpec): Performed {
  const source = allCells().find((one) => one.cell.id === cell.copy_of);
  if (!source) throw new RangeError(`${cell.id} copies "${cell.copy_of}", which the roster does not hold`);
  const original = perform(source.day, source.cell);
  return {
    ...original,
    day,
    cell,
    truth: {
      ...original.truth,
      cell: cell.id,
      file: `recordings/${day.folder}/${cell.file}`,
      class: cell.class,
      fault: cell.fault,
      expects: cell.expects,
    },
    sweeps: original.sweeps.map(({ sweep, at_s }) => ({
      at_s,
      sweep:
        sweep.plan.clamp === 'voltage'
          ? sweep
          : { ...sweep, voltage: sweep.voltage.map((v) => Math.round(v * 1.008 + 0.4 / sweep.quantum_mv)) },
    })),
  };
}

function clockOf(day: DaySpec, minutes: number): string {
  const [hour, minute] = day.first.split(':').map(Number);
  const total = hour! * 60 + minute! + minutes;
  const two = (x: number): string => String(x).padStart(2, '0');
  return `${day.date}T${two(Math.floor(total / 60))}:${two(total % 60)}:00${timezone}`;
}

/** What a person types as the name of a sweep's stimulus. */
function labelOf(sweep: RecordedSweep, factor: number): string {
  const { plan } = sweep;
  if (plan.pieces.length === 0) return 'no stimulus';
  const size = strongest(sweep);
  if (plan.clamp === 'voltage') return `test pulse ${roundTo(size, 1)} mV`;
  if (plan.protocol === 'ramp') return `ramp to ${size} pA`;
  if (plan.pieces.length > 1) return `${plan.pieces.length} pulses of ${size} pA`;
  return `${plan.protocol === 'paced beat' ? 'beat' : 'step'} ${roundTo(size * factor, 1)} pA`;
}

async function writeRecording(root: string, group: Performed[]): Promise<void> {
  const { day, cell } = group[0]!;
  const folder = path.join(root, 'recordings', day.folder);
  mkdirSync(folder, { recursive: true });
  const file = path.join(folder, cell.file);
  if (cell.text) {
    const text = writeText(
      cell.text,
      group[0]!.sweeps.map((one) => one.sweep),
    );
    writeFileSync(file, text.content);
    writeFileSync(`${file}.yaml`, sidecar(day, group, text.table));
    return;
  }
  const electrodes = group.map((one, k) => ({
    name: one.cell.electrode ?? `electrode_${k}`,
    description: 'borosilicate pipette',
    slice: one.cell.slice.startsWith('s') ? one.cell.slice : '',
    location: '',
    filtering: `${filterOf(one)} kHz low-pass, 4 poles`,
    resistance: '',
    seal: '',
    initial_access_resistance: '',
  }));
  const sweeps: NwbSweep[] = group
    .flatMap((one, e) =>
      one.sweeps.map(({ sweep, at_s }, number) => ({
        electrode: electrodes[e]!.name,
        sweep,
        start_s: at_s,
        number,
        stimulus_description: labelOf(sweep, one.cell.label_factor ?? 1),
        bridge_mohm: one.bridge_mohm,
        bias_pa: null,
      })),
    )
    .sort((a, b) => a.number - b.number || (a.electrode < b.electrode ? -1 : 1));
  await writeNwb(file, {
    identifier: `${day.folder}/${cell.file}`,
    session_description: `${day.subject.preparation}, ${day.rig} rig`,
    session_start_time: clockOf(day, cell.at_min),
    lab: 'Cell physiology',
    institution: 'Lantern Skerry Field Station',
    experimenter: day.person,
    subject: {
      subject_id: cell.file_subject ?? day.subject.id,
      species: day.subject.species,
      age: day.subject.age,
      sex: day.subject.sex,
      genotype: day.subject.genotype,
      description: '',
    },
    device: { name: 'amplifier', description: 'Patch amplifier with bridge' },
    electrodes,
    sweeps,
    pharmacology: null,
    protocol: null,
    pairing: cell.pairing ?? 'numbers',
    voltage_unit: cell.voltage_unit,
    voltage_factor: cell.voltage_factor,
    current_factor: cell.current_factor,
    rate_factor: cell.rate_factor,
    timestamps: cell.timestamps,
    without_stimulus: cell.without_stimulus,
  });
  if (cell.cut_to !== undefined) truncateSync(file, Math.floor(statSync(file).size * cell.cut_to));
  writeFileSync(`${file}.yaml`, sidecar(day, group, null));
}

const filterOf = ({ day, cell }: Performed): number => {
  const membrane = membraneOf(day, cell);
  return benchOf(day, cell, membrane, randomFrom(`${cell.id}|bench`)).filter_khz;
};

const scalar = (value: string | number): string =>
  typeof value === 'number' || /^[A-Za-z][A-Za-z0-9 .+-]*$/.test(value) ? String(value) : JSON.stringify(value);

const inline = (facts: Record<string, string | number>): string =>
  `{ ${Object.entries(facts)
    .map(([key, value]) => `${key}: ${scalar(value)}`)
    .join(', ')} }`;

function sidecar(day: DaySpec, group: Performed[], table: string[] | null): string {
  const lines: string[] = [];
  const factsOf = ({ cell }: Performed): Record<string, string | number> => ({
    cell: cell.id,
    class: cell.class,
    slice: cell.slice,
    ...(cell.text ? textFacts(day, cell) : {}),
    ...cell.facts,
  });
  if (table) lines.push('table:', ...table);
  if (group.length === 1) lines.push(`facts: ${inline(factsOf(group[0]!))}`);
  else {
    lines.push('cells:');
    for (const one of group) lines.push(`  ${one.cell.electrode}: ${inline(factsOf(one))}`);
  }
  const drugs = group[0]!.cell.drugs ?? [];
  if (drugs.length > 0) {
    lines.push('conditions:');
    for (const drug of drugs)
      lines.push(`  - { from_sweep: ${drug.from_sweep}, label: ${scalar(drug.label)}, bath: ${drug.bath} }`);
  }
  return `${lines.join('\n')}\n`;
}

/** A text file says nothing of itself, so its sidecar does. */
function textFacts(day: DaySpec, cell: CellSpec): Record<string, string | number> {
  const one = benchOf(day, cell, membraneOf(day, cell), randomFrom(`${cell.id}|bench`));
  return {
    time: clockOf(day, cell.at_min).slice(11, 16),
    filter_khz: one.filter_khz,
    bridge_mohm: rounded(one.bridge_mohm, 3),
  };
}

function folderFacts(day: DaySpec): string {
  const { subject } = day;
  const facts: Record<string, string | number> = {
    date: day.date,
    rig: day.rig,
    person: day.person,
    subject: subject.id,
    species: subject.species,
  };
  for (const key of ['age', 'sex', 'genotype', 'region', 'preparation'] as const)
    if (subject[key] !== '') facts[key] = subject[key];
  facts['pipette'] = day.pipette;
  facts['bath'] = day.bath;
  facts['temperature_c'] = day.temperature_c;
  if (day.junction) facts['junction'] = day.junction;
  if (day.ljp !== null)
    facts['ljp_mv'] =
      day.ljp === 'true' ? rounded(conditionsOf(day, { ...day.cells[0]!, true_bath: undefined }).ljp_mv, 1) : day.ljp;
  facts['batch_pipette'] = day.batch_pipette;
  facts['batch_bath'] = day.batch_bath;
  Object.assign(facts, day.facts);
  return `facts:\n${Object.entries(facts)
    .map(([key, value]) => `  ${key}: ${key === 'date' ? value : scalar(value)}\n`)
    .join('')}`;
}

export interface GenerateOptions {
  out: string;
  /** Where the truth goes; never inside the archive. Null: nowhere. */
  truth: string | null;
  /** Ids of the cells to write; null for all. */
  only: string[] | null;
  /** Told once a file. */
  said?: (line: string) => void;
}

/**
 * Writes the sample archive, replacing what stood at `out`.
 * @returns what was true of each cell written
 * @throws RangeError for an id in `only` that the roster does not hold, or a truth file inside the archive
 */
export async function generateArchive(options: GenerateOptions): Promise<CellTruth[]> {
  const { out, truth, only } = options;
  const known = new Set(allCells().map((one) => one.cell.id));
  const stranger = only?.find((id) => !known.has(id));
  if (stranger !== undefined)
    throw new RangeError(`no cell "${stranger}" in the sample; the first is "${[...known][0]}"`);
  if (truth && !path.relative(path.resolve(out), path.resolve(truth)).startsWith('..'))
    throw new RangeError(`the truth must lie outside the archive, got ${truth} inside ${out}`);
  requireReplaceable(out);
  rmSync(out, { recursive: true, force: true });
  mkdirSync(out, { recursive: true });
  cpSync(handWritten, out, { recursive: true });
  const truths: CellTruth[] = [];
  for (const day of days) {
    const cells = day.cells.filter((cell) => !only || only.includes(cell.id));
    if (cells.length === 0) continue;
    const folder = path.join(out, 'recordings', day.folder);
    mkdirSync(folder, { recursive: true });
    writeFileSync(path.join(folder, 'folder.yaml'), folderFacts(day));
    const files = new Map<string, CellSpec[]>();
    for (const cell of cells) files.set(cell.file, [...(files.get(cell.file) ?? []), cell]);
    for (const group of files.values()) {
      const performed = group.map((cell) => perform(day, cell));
      await writeRecording(out, performed);
      truths.push(...performed.map((one) => one.truth));
      options.said?.(`${day.folder}/${group[0]!.file}`);
    }
  }
  if (!only) writeStrays(out);
  if (truth) {
    mkdirSync(path.dirname(path.resolve(truth)), { recursive: true });
    writeFileSync(truth, `${JSON.stringify({ cells: truths }, null, 1)}\n`);
  }
  return truths;
}

/** Only an empty place or an earlier sample may be replaced: never somebody's own folder. */
function requireReplaceable(out: string): void {
  if (!existsSync(out)) return;
  const names = readdirSync(out);
  if (names.length > 0 && !(names.includes('almanac.yaml') && names.includes('SAMPLE.txt')))
    throw new RangeError(
      `${out} holds something that is not the sample archive; name an empty folder, or remove it yourself`,
    );
}
