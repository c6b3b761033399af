/** Writes one NWB 2.x file. Samples are stored as chunked, gzip-compressed int16 with a conversion to SI units. */
import h5wasm, { type Dataset, type Group, type File as HdfFile } from 'h5wasm/node';
import { hashOf } from './random.ts';
import type { RecordedSweep } from './recorder.ts';

export interface NwbElectrode {
  name: string;
  description: string;
  /** Free text as a person would type it; left out where empty. */
  slice: string;
  location: string;
  filtering: string;
  resistance: string;
  seal: string;
  initial_access_resistance: string;
}

export interface NwbSweep {
  /** Which electrode, by its name. */
  electrode: string;
  sweep: RecordedSweep;
  /** Seconds since the session started. */
  start_s: number;
  number: number;
  /** What the file claims the stimulus was. */
  stimulus_description: string;
  bridge_mohm: number | null;
  bias_pa: number | null;
}

export interface NwbContent {
  identifier: string;
  session_description: string;
  /** ISO 8601 with offset. */
  session_start_time: string;
  lab: string;
  institution: string;
  experimenter: string | null;
  subject: {
    subject_id: string;
    species: string;
    age: string;
    sex: string;
    genotype: string;
    description: string;
  } | null;
  device: { name: string; description: string };
  electrodes: NwbElectrode[];
  sweeps: NwbSweep[];
  pharmacology: string | null;
  protocol: string | null;
  /** `numbers`: sweep_number alone. `tables`: the intracellular-recording tables. `sweep-table`: the older one. */
  pairing: 'numbers' | 'tables' | 'sweep-table';
  /** Written instead of the true unit of the voltage, to plant a fault. */
  voltage_unit?: string;
  /** Multiplies the stored conversion of the voltage channel, and of all currents, to plant a fault. */
  voltage_factor?: number;
  current_factor?: number;
  /** The sampling rate the file claims over the true one, to plant a fault. */
  rate_factor?: number;
  /** `timestamps` instead of a starting time and a rate. */
  timestamps?: boolean;
  /** Leaves the stimulus series out. */
  without_stimulus?: boolean;
}

/** HDF5 stamps its objects with the time of day; a fixed one keeps equal input equal output. */
function withFixedClock<T>(milliseconds: number, work: () => T): T {
  const real = Date.now;
  Date.now = () => milliseconds;
  try {
    return work();
  } finally {
    Date.now = real;
  }
}

/** A UUID made from a text. */
export function uuidOf(text: string): string {
  const part = (salt: string): string => hashOf(`${text}#${salt}`).toString(16).padStart(8, '0');
  const hex = `${part('1')}${part('2')}${part('3')}${part('4')}`;
  return `${hex.slice(0, 8)}-${hex.slice(8, 12)}-4${hex.slice(13, 16)}-a${hex.slice(17, 20)}-${hex.slice(20, 32)}`;
}

/**
 * @param path where the file is written; an existing one is replaced
 * @throws Error from HDF5 when the place cannot be written
 */
export async function writeNwb(path: string, content: NwbContent): Promise<void> {
  const module = await h5wasm.ready;
  module.activate_throwing_error_handler();
  withFixedClock(Date.parse(content.session_start_time), () => {
    const file = new h5wasm.File(path, 'w');
    try {
      fill(file, content);
    } finally {
      file.close();
    }
  });
}

function typed(group: Group | Dataset, identity: string, namespace: string, type: string): void {
  group.create_attribute('namespace', namespace);
  group.create_attribute('neurodata_type', type);
  group.create_attribute('object_id', uuidOf(`${identity}:${type}`));
}

const describe = (group: Group | Dataset, text: string): void => group.create_attribute('description', text);

function text(group: Group, name: string, value: string): Dataset {
  return group.create_dataset({ name, data: value });
}

function scalar(group: Group, name: string, value: number): void {
  group.create_dataset({ name, data: Float32Array.of(value), shape: [], dtype: '<f' });
}

const float = (group: Group | Dataset, name: string, value: number): void =>
  group.create_attribute(name, value, null, '<d');

function dataset(group: Group, name: string): Dataset {
  return group.get(name) as Dataset;
}

function fill(file: HdfFile, content: NwbContent): void {
  const id = content.identifier;
  const root = file as unknown as Group;
  root.create_attribute('nwb_version', '2.7.0');
  typed(root, id, 'core', 'NWBFile');
  text(root, 'identifier', id);
  text(root, 'session_description', content.session_description);
  text(root, 'session_start_time', content.session_start_time);
  text(root, 'timestamps_reference_time', content.session_start_time);
  root.create_dataset({ name: 'file_create_date', data: [content.session_start_time], shape: [1] });
  const acquisition = root.create_group('acquisition');
  root.create_group('analysis');
  root.create_group('processing');
  const stimulus = root.create_group('stimulus');
  const presentation = stimulus.create_group('presentation');
  stimulus.create_group('templates');
  const general = root.create_group('general');
  text(general, 'lab', content.lab);
  text(general, 'institution', content.institution);
  if (content.experimenter !== null)
    general.create_dataset({ name: 'experimenter', data: [content.experimenter], shape: [1] });
  if (content.pharmacology) text(general, 'pharmacology', content.pharmacology);
  if (content.protocol) text(general, 'protocol', content.protocol);
  if (content.subject) {
    const subject = general.create_group('subject');
    typed(subject, `${id}/subject`, 'core', 'Subject');
    for (const [key, value] of Object.entries(content.subject)) if (value !== '') text(subject, key, value);
  }
  const devices = general.create_group('devices');
  const device = devices.create_group(content.device.name);
  typed(device, `${id}/device`, 'core', 'Device');
  describe(device, content.device.description);
  const icephys = general.create_group('intracellular_ephys');
  for (const e of content.electrodes) {
    const electrode = icephys.create_group(e.name);
    typed(electrode, `${id}/${e.name}`, 'core', 'IntracellularElectrode');
    text(electrode, 'description', e.description);
    for (const key of ['slice', 'location', 'filtering', 'resistance', 'seal', 'initial_access_resistance'] as const)
      if (e[key] !== '') text(electrode, key, e[key]);
    root.create_soft_link(`/general/devices/${content.device.name}`, `/general/intracellular_ephys/${e.name}/device`);
  }
  const paths: { response: string; stimulus: string | null; samples: number; electrode: string; number: number }[] = [];
  for (const item of content.sweeps) paths.push(writeSweep(root, acquisition, presentation, content, item));
  if (content.pairing === 'tables') writeTables(file, icephys, id, paths);
  if (content.pairing === 'sweep-table') writeSweepTable(file, icephys, id, paths);
}

function writeSweep(root: Group, acquisition: Group, presentation: Group, content: NwbContent, item: NwbSweep) {
  const { sweep } = item;
  const id = content.identifier;
  const clamp = sweep.plan.clamp;
  const suffix = content.electrodes.length > 1 ? `_${item.electrode}` : '';
  const number = String(item.number).padStart(3, '0');
  const name = `sweep_${number}${suffix}`;
  const stimulusName = `command_${number}${suffix}`;
  const kind = clamp === 'current' ? 'CurrentClamp' : 'VoltageClamp';
  const series = (parent: Group, label: string, type: string, what: string): Group => {
    const group = parent.create_group(label);
    typed(group, `${id}/${label}`, 'core', type);
    describe(group, what);
    group.create_attribute('comments', '');
    group.create_attribute('stimulus_description', item.stimulus_description);
    group.create_attribute('sweep_number', item.number, null, '<I');
    root.create_soft_link(
      `/general/intracellular_ephys/${item.electrode}`,
      `${parent === acquisition ? '/acquisition' : '/stimulus/presentation'}/${label}/electrode`,
    );
    return group;
  };
  const samples = (group: Group, data: Int16Array, conversion: number, unit: string): void => {
    group.create_dataset({
      name: 'data',
      data,
      shape: [data.length],
      dtype: '<h',
      chunks: [Math.min(data.length, 16384)],
      compression: 'gzip',
      compression_opts: 4,
    });
    const stored = dataset(group, 'data');
    float(stored, 'conversion', conversion);
    float(stored, 'offset', 0);
    float(stored, 'resolution', conversion);
    stored.create_attribute('unit', unit);
    const rate = sweep.rate_hz * (content.rate_factor ?? 1);
    if (content.timestamps) {
      const times = Float64Array.from(data, (_, k) => item.start_s + k / rate);
      group.create_dataset({
        name: 'timestamps',
        data: times,
        shape: [times.length],
        chunks: [Math.min(times.length, 16384)],
        compression: 'gzip',
        compression_opts: 4,
      });
      const stamped = dataset(group, 'timestamps');
      stamped.create_attribute('interval', 1, null, '<i');
      stamped.create_attribute('unit', 'seconds');
    } else {
      group.create_dataset({ name: 'starting_time', data: Float64Array.of(item.start_s), shape: [], dtype: '<d' });
      const start = dataset(group, 'starting_time');
      start.create_attribute('rate', rate, null, '<f');
      start.create_attribute('unit', 'seconds');
    }
  };
  const volts = sweep.quantum_mv * 1e-3;
  const amperes = sweep.quantum_pa * 1e-12 * (content.current_factor ?? 1);
  const response = series(acquisition, name, `${kind}Series`, `${sweep.plan.protocol}, response`);
  if (clamp === 'current') {
    samples(response, sweep.voltage, volts * (content.voltage_factor ?? 1), content.voltage_unit ?? 'volts');
    if (item.bridge_mohm !== null) scalar(response, 'bridge_balance', item.bridge_mohm * 1e6);
    if (item.bias_pa !== null) scalar(response, 'bias_current', item.bias_pa * 1e-12);
  } else samples(response, sweep.current, amperes, 'amperes');
  if (!content.without_stimulus) {
    const command = series(presentation, stimulusName, `${kind}StimulusSeries`, `${sweep.plan.protocol}, command`);
    if (clamp === 'current') samples(command, sweep.current, amperes, 'amperes');
    else samples(command, sweep.voltage, volts, 'volts');
  }
  return {
    response: `/acquisition/${name}`,
    stimulus: content.without_stimulus ? null : `/stimulus/presentation/${stimulusName}`,
    samples: clamp === 'current' ? sweep.voltage.length : sweep.current.length,
    electrode: `/general/intracellular_ephys/${item.electrode}`,
    number: item.number,
  };
}

type Paths = ReturnType<typeof writeSweep>[];

function references(file: HdfFile, group: Group, name: string, targets: string[], about: string): Dataset {
  group.create_dataset({
    name,
    data: targets.map((target) => (file.get(target) as Group).create_reference()),
    shape: [targets.length],
    dtype: 'Reference',
  });
  const column = dataset(group, name);
  describe(column, about);
  return column;
}

function ids(group: Group, count: number, identity: string): void {
  group.create_dataset({ name: 'id', data: Int32Array.from({ length: count }, (_, k) => k), shape: [count] });
  typed(dataset(group, 'id'), `${identity}/id`, 'hdmf-common', 'ElementIdentifiers');
}

/** Sweep table of NWB 2.0 to 2.3: series by sweep number, ragged. */
function writeSweepTable(file: HdfFile, icephys: Group, id: string, paths: Paths): void {
  const table = icephys.create_group('sweep_table');
  typed(table, `${id}/sweep_table`, 'core', 'SweepTable');
  describe(table, 'Series by sweep');
  table.create_attribute('colnames', ['series', 'sweep_number']);
  ids(table, paths.length, `${id}/sweep_table`);
  const targets: string[] = [];
  const ends: number[] = [];
  for (const path of paths) {
    targets.push(path.response);
    if (path.stimulus) targets.push(path.stimulus);
    ends.push(targets.length);
  }
  typed(
    references(file, table, 'series', targets, 'The series of the sweep'),
    `${id}/series`,
    'hdmf-common',
    'VectorData',
  );
  table.create_dataset({ name: 'series_index', data: Uint32Array.from(ends), shape: [ends.length] });
  const index = dataset(table, 'series_index');
  typed(index, `${id}/series_index`, 'hdmf-common', 'VectorIndex');
  describe(index, 'Where each sweep ends in series');
  index.create_attribute('target', dataset(table, 'series').create_reference(), [], 'Reference');
  table.create_dataset({
    name: 'sweep_number',
    data: Uint32Array.from(paths, (path) => path.number),
    shape: [paths.length],
  });
  const numbers = dataset(table, 'sweep_number');
  typed(numbers, `${id}/sweep_number`, 'hdmf-common', 'VectorData');
  describe(numbers, 'Number of the sweep');
}

/** Intracellular-recording tables of NWB 2.4 and later: electrode, stimulus and response of each recording. */
function writeTables(file: HdfFile, icephys: Group, id: string, paths: Paths): void {
  const table = icephys.create_group('intracellular_recordings');
  typed(table, `${id}/recordings`, 'core', 'IntracellularRecordingsTable');
  describe(
    table,
    'A table to group together a stimulus and response from a single electrode and a single simultaneous recording.',
  );
  table.create_attribute('colnames', [], [0], 'S1');
  table.create_attribute('categories', ['electrodes', 'stimuli', 'responses']);
  ids(table, paths.length, `${id}/recordings`);
  const category = (name: string, type: string, column: string, about: string): Group => {
    const group = table.create_group(name);
    typed(group, `${id}/${name}`, 'core', type);
    describe(group, about);
    group.create_attribute('colnames', [column]);
    ids(group, paths.length, `${id}/${name}`);
    return group;
  };
  const electrodes = category(
    'electrodes',
    'IntracellularElectrodesTable',
    'electrode',
    'Table for storing intracellular electrode related metadata.',
  );
  typed(
    references(
      file,
      electrodes,
      'electrode',
      paths.map((path) => path.electrode),
      'Column for storing the reference to the intracellular electrode',
    ),
    `${id}/electrode`,
    'hdmf-common',
    'VectorData',
  );
  const rangeColumn = (group: Group, column: string, target: (path: Paths[number]) => string | null): void => {
    // A row without a stimulus refers to its response with an empty range: the standard's way to say "none".
    const targets = paths.map((path) => target(path));
    group.create_dataset({
      name: column,
      data: new Map<string, unknown>([
        ['idx_start', Int32Array.from(targets, (place) => (place === null ? -1 : 0))],
        ['count', Int32Array.from(paths, (path, row) => (targets[row] === null ? -1 : path.samples))],
        ['timeseries', paths.map((path, row) => (file.get(targets[row] ?? path.response) as Group).create_reference())],
      ]),
      shape: [paths.length],
      dtype: [
        ['idx_start', '<i'],
        ['count', '<i'],
        ['timeseries', 'Reference'],
      ],
    });
    const stored = dataset(group, column);
    typed(stored, `${id}/${column}`, 'core', 'TimeSeriesReferenceVectorData');
    describe(stored, `Column storing the reference to the recorded ${column} for the recording`);
  };
  rangeColumn(
    category(
      'stimuli',
      'IntracellularStimuliTable',
      'stimulus',
      'Table for storing intracellular stimulus related metadata.',
    ),
    'stimulus',
    (path) => path.stimulus,
  );
  rangeColumn(
    category(
      'responses',
      'IntracellularResponsesTable',
      'response',
      'Table for storing intracellular response related metadata.',
    ),
    'response',
    (path) => path.response,
  );
}
