/** One time series of an NWB file as its attributes describe it. No sample is read here. */
import type { Dataset, Group } from 'h5wasm/node';
import {
  attribute,
  damaged,
  datasetAt,
  type Hdf5,
  identity,
  look,
  missingFilter,
  names,
  numberAttribute,
  scalarDataset,
  textAttribute,
  textDataset,
  textsAttribute,
} from './hdf5.ts';
import { blocker, plain, warning } from './problems.ts';
import type { Problem, SweepSamples } from './types.ts';
import { parseUnit, type Unit } from './units.ts';

const responseTypes = ['CurrentClampSeries', 'VoltageClampSeries', 'IZeroClampSeries', 'PatchClampSeries'];
const stimulusTypes = ['CurrentClampStimulusSeries', 'VoltageClampStimulusSeries'];

export interface Series {
  path: string;
  /** Path without the folder it stands in. */
  name: string;
  type: string;
  stimulus: boolean;
  data: Dataset;
  /** Samples along time. */
  length: number;
  /** Traces side by side in one array, 1 for a plain series. */
  columns: number;
  /** Which axis of the array is time. */
  timeAxis: number;
  dimensions: number;
  unitText: string;
  unit: Unit | null;
  conversion: number;
  offset: number;
  /** Null where timestamps stand instead, or nothing. */
  rate_hz: number | null;
  start_s: number | null;
  timestamps: Dataset | null;
  /** Name of the electrode linked; '' for none. */
  electrode: string;
  sweep_number: number | null;
  label: string;
  bridge_mohm: number | null;
  bias_pa: number | null;
  compensation: NonNullable<SweepSamples['compensation']> | null;
  gain: number | null;
}

/** The class of a series; files of the first version of the standard list its ancestry instead. */
export function seriesType(group: Group, { module }: Hdf5): string {
  const ancestry = textsAttribute(group, 'ancestry', module);
  return ancestry.at(-1) ?? textAttribute(group, 'neurodata_type', module);
}

export const isIntracellular = (type: string): boolean => responseTypes.includes(type) || stimulusTypes.includes(type);

export const isStimulusType = (type: string): boolean => stimulusTypes.includes(type);

/** Name of the electrode a series links to. */
function electrodeName(group: Group, { module, file }: Hdf5): string {
  const found = look(group, 'electrode');
  if (found.kind === 'nothing' || found.kind === 'damaged') return textDataset(group, 'electrode_name');
  const path = `${group.path}/electrode`;
  const lastPart = (target: string): string => target.split('/').filter(Boolean).at(-1) ?? '';
  try {
    const target = module.get_symbolic_link(file.file_id, path);
    if (target) return lastPart(target);
  } catch {
    // A hard link names no target: the object says where else it stands.
  }
  try {
    const target = module.get_referenced_name(file.file_id, module.create_object_reference(file.file_id, path), true);
    if (target.startsWith('/general/')) return lastPart(target);
  } catch {
    // Left without a name.
  }
  return '';
}

/** A value of an amplifier setting in SI units, where it stands as a dataset with a unit or bare. */
function setting(group: Group, name: string): number | null {
  const value = scalarDataset(group, name);
  return typeof value === 'number' && Number.isFinite(value) ? value : null;
}

/** Bridge balance in MΩ. The standard stores ohms; a value below 1000 Ω can only be meant in megohms. */
function bridge(group: Group, problems: Problem[]): number | null {
  const ohms = setting(group, 'bridge_balance');
  if (ohms === null || ohms === 0) return ohms;
  if (Math.abs(ohms) >= 1000) return ohms / 1e6;
  problems.push(
    warning({
      code: 'BRIDGE_IMPLAUSIBLE',
      place: `${group.path}/bridge_balance`,
      message: `The bridge balance is ${plain(ohms)} Ω, which is next to nothing; megohms may be meant. It is not used.`,
      remedy: 'State the bridge balance in the sidecar.',
      sidecar: `facts: { bridge_mohm: ${plain(ohms)} }`,
    }),
  );
  return null;
}

/** Bias current in pA. The standard stores amperes; a value above 1 µA cannot be. */
function bias(group: Group, problems: Problem[]): number | null {
  const amperes = setting(group, 'bias_current');
  if (amperes === null) return null;
  if (Math.abs(amperes) <= 1e-6) return amperes * 1e12;
  problems.push(
    warning({
      code: 'BIAS_IMPLAUSIBLE',
      place: `${group.path}/bias_current`,
      message: `The bias current is ${plain(amperes)} A, which no cell survives; picoamperes may be meant. It is not used.`,
      remedy: 'State the bias current in the sidecar.',
      sidecar: `facts: { bias_pa: ${plain(amperes)} }`,
    }),
  );
  return null;
}

interface Layout {
  length: number;
  columns: number;
  timeAxis: number;
  dimensions: number;
}

/** Which axis is time: the longer one of two, as no one records more channels than samples. */
function layoutOf(shape: readonly number[]): Layout | null {
  const [first = 0, second = 1] = shape;
  if (shape.length === 0) return null;
  if (shape.length === 1) return { length: first, columns: 1, timeAxis: 0, dimensions: 1 };
  if (shape.length > 2 || Math.min(first, second) > 1024) return null;
  return second > first
    ? { length: second, columns: first, timeAxis: 1, dimensions: 2 }
    : { length: first, columns: second, timeAxis: 0, dimensions: 2 };
}

/** Ids of the filters that the library holds: deflate, shuffle, fletcher32, szip, nbit, scaleoffset. */
const builtInFilters = 6;

const refusal = (group: Group, code: string, message: string, remedy: string): Problem =>
  blocker({ code, place: group.path, message, remedy, sweep_key: group.path });

/**
 * Describes one series.
 *
 * @returns the series, or null where a problem says why it cannot be read; problems are added to `problems`
 */
export function describeSeries(group: Group, hdf5: Hdf5, problems: Problem[]): Series | null {
  try {
    return seriesOf(group, hdf5, problems);
  } catch (error) {
    problems.push({ ...damaged(group.path, error).problem, sweep_key: group.path });
    return null;
  }
}

function seriesOf(group: Group, hdf5: Hdf5, problems: Problem[]): Series | null {
  const { module } = hdf5;
  const type = seriesType(group, hdf5);
  const refuse = (code: string, message: string, remedy: string): null => {
    problems.push(refusal(group, code, message, remedy));
    return null;
  };
  const found = look(group, 'data');
  if (found.kind === 'damaged')
    return refuse('HDF5_DAMAGED', `The samples cannot be read: ${found.reason}.`, 'Restore the file from a backup.');
  if (found.kind === 'broken link')
    return refuse(
      'LINK_BROKEN',
      `The samples are a link to ${found.target}, and nothing is there.`,
      'Put the file it points to where the link expects it, or write a copy that holds its own data.',
    );
  if (found.kind !== 'dataset')
    return refuse('NO_DATA', 'The series holds no samples.', 'Write the file again, or remove the empty series.');
  const data = found.dataset;
  const { shape, type: storage } = data.metadata;
  const classes = module.H5T_class_t;
  if (storage !== classes.H5T_INTEGER.value && storage !== classes.H5T_FLOAT.value)
    return refuse(
      'DATA_NOT_NUMBERS',
      'The samples are stored as something else than numbers.',
      'Store them as numbers.',
    );
  const filter = data.filters.find(({ id }) => id > builtInFilters);
  if (filter) {
    problems.push({ ...missingFilter(data.path, filter.name).problem, sweep_key: group.path });
    return null;
  }
  const layout = layoutOf(shape ?? []);
  if (layout === null || layout.length === 0 || layout.columns === 0)
    return refuse(
      shape?.some((length) => length === 0) || !shape?.length ? 'SERIES_EMPTY' : 'SHAPE_UNKNOWN',
      `The samples have the shape [${(shape ?? []).join(' × ')}]; one row of samples, or samples by traces, is expected.`,
      'Write one series for each trace.',
    );
  const scaled = scalingOf(data, hdf5);
  if (scaled === null)
    return refuse(
      'CONVERSION_UNUSABLE',
      'The attribute "conversion" is 0 or not a number, so that every sample would be lost.',
      'Correct the attribute "conversion" of the data (1 if they are stored in the unit they name).',
    );
  const startingTime = datasetAt(group, 'starting_time');
  return {
    path: group.path,
    name: group.path.replace(/^\/(?:acquisition(?:\/timeseries)?|stimulus\/presentation)\//, ''),
    type,
    stimulus: isStimulusType(type) || group.path.startsWith('/stimulus/'),
    data,
    ...layout,
    ...scaled,
    rate_hz: startingTime ? numberAttribute(startingTime, 'rate', module) : null,
    start_s: startingTime ? finite(scalarDataset(group, 'starting_time')) : null,
    timestamps: datasetAt(group, 'timestamps'),
    electrode: electrodeName(group, hdf5),
    sweep_number: finite(attribute(group, 'sweep_number', module) ?? scalarDataset(group, 'sweep_number')),
    label: textAttribute(group, 'stimulus_description', module),
    bridge_mohm: type === 'IZeroClampSeries' ? null : bridge(group, problems),
    bias_pa: type === 'IZeroClampSeries' ? 0 : bias(group, problems),
    compensation: compensation(group),
    gain: setting(group, 'gain'),
  };
}

/** What the amplifier took away in voltage clamp. The standard stores farads and percent. */
function compensation(group: Group): Series['compensation'] {
  const farads = setting(group, 'whole_cell_capacitance_comp');
  const said = {
    whole_cell_pf: farads === null ? null : farads * 1e12,
    correction_percent: setting(group, 'resistance_comp_correction'),
    prediction_percent: setting(group, 'resistance_comp_prediction'),
  };
  return Object.values(said).some((value) => value !== null) ? said : null;
}

const finite = (value: unknown): number | null => (typeof value === 'number' && Number.isFinite(value) ? value : null);

function scalingOf(
  data: Dataset,
  { module }: Hdf5,
): Pick<Series, 'unitText' | 'unit' | 'conversion' | 'offset'> | null {
  const conversion = attribute(data, 'conversion', module) ?? 1;
  const offset = attribute(data, 'offset', module) ?? 0;
  if (typeof conversion !== 'number' || !Number.isFinite(conversion) || conversion === 0) return null;
  const unitText = textAttribute(data, 'unit', module);
  return { unitText, unit: parseUnit(unitText), conversion, offset: finite(offset) ?? 0 };
}

export interface Walk {
  series: Series[];
  problems: Problem[];
  /** Paths of series of other kinds, which are not read. */
  others: string[];
  /** Path under which each object was met first, by its identity. */
  met: Map<string, string>;
}

/** Every series under acquisition and stimulus, sub-groups included, by path. */
export function walkSeries(hdf5: Hdf5): Walk {
  const walk: Walk = { series: [], problems: [], others: [], met: new Map() };
  for (const place of ['/acquisition', '/stimulus/presentation']) {
    const top = look(hdf5.file, place);
    if (top.kind === 'damaged') walk.problems.push(damaged(place, top.reason).problem);
    if (top.kind !== 'group') continue;
    walk.met.set(identity(place, hdf5), place);
    try {
      walkGroup(top.group, hdf5, walk, 0);
    } catch (error) {
      walk.problems.push(damaged(place, error).problem);
    }
  }
  return walk;
}

function walkGroup(group: Group, hdf5: Hdf5, walk: Walk, depth: number): void {
  for (const name of names(group)) {
    const path = `${group.path === '/' ? '' : group.path}/${name}`;
    try {
      visit(group, name, path, hdf5, walk, depth);
    } catch (error) {
      walk.problems.push({ ...damaged(path, error).problem, sweep_key: path });
    }
  }
}

function visit(parent: Group, name: string, path: string, hdf5: Hdf5, walk: Walk, depth: number): void {
  const found = look(parent, name);
  if (found.kind === 'damaged') throw damaged(path, found.reason);
  if (found.kind === 'broken link')
    walk.problems.push(
      blocker({
        code: 'LINK_BROKEN',
        place: path,
        message: `This is a link to ${found.target}, and nothing is there.`,
        remedy: 'Put what it points to where the link expects it, or write a copy that holds its own data.',
        sweep_key: path,
      }),
    );
  if (found.kind !== 'group') return;
  const type = seriesType(found.group, hdf5);
  const self = identity(path, hdf5);
  const before = walk.met.get(self);
  if (self !== '' && before !== undefined) {
    if (isIntracellular(type))
      walk.problems.push(
        warning({
          code: 'LINK_REPEATED',
          place: path,
          message: `This is a link to ${before}, which is read once, under that name.`,
          remedy: 'Nothing to do.',
        }),
      );
    return;
  }
  walk.met.set(self, path);
  if (isIntracellular(type)) {
    const series = describeSeries(found.group, hdf5, walk.problems);
    if (series) walk.series.push(series);
  } else if (look(found.group, 'data').kind === 'dataset') walk.others.push(path);
  else if (depth < 8) walkGroup(found.group, hdf5, walk, depth + 1);
}
