/**
 * A narrow door to the HDF5 library: errors throw, objects that cannot be read are told from objects that are not
 * there, attributes and references come out as plain values.
 */
import { closeSync, openSync, readSync, statSync } from 'node:fs';
import h5wasm, { type Dataset, type Entity, type File, type Group, type Metadata, Reference } from 'h5wasm/node';
import { FormatError } from './problems.ts';

type Module = Awaited<typeof h5wasm.ready>;

export interface Hdf5 {
  file: File;
  module: Module;
}

const signature = Buffer.from([0x89, 0x48, 0x44, 0x46, 0x0d, 0x0a, 0x1a, 0x0a]);

/** Where HDF5 may begin: at 0, 512 and every doubling of it. */
function hasSignature(descriptor: number, bytes: number): boolean {
  const found = Buffer.alloc(signature.length);
  for (let offset = 0; offset < bytes; offset = offset === 0 ? 512 : offset * 2) {
    if (readSync(descriptor, found, 0, found.length, offset) < found.length) return false;
    if (found.equals(signature)) return true;
  }
  return false;
}

/** Printable throughout, in UTF-8; a character that the end cuts in two is forgiven. */
function isText(bytes: Uint8Array): boolean {
  if (!bytes.every((byte) => byte >= 0x20 || (byte >= 0x09 && byte <= 0x0d))) return false;
  const text = new TextDecoder().decode(bytes);
  return !text.slice(0, Math.max(1, text.length - 3)).includes('\ufffd');
}

function refuseOtherContent(path: string): void {
  const bytes = statSync(path).size;
  const notHdf5 = (found: string, remedy: string): FormatError =>
    new FormatError({ code: 'NOT_HDF5', place: '', message: `The file is no HDF5 file: ${found}.`, remedy });
  if (bytes === 0) throw notHdf5('it is empty (0 bytes)', 'Copy it again from where it was recorded, or restore it.');
  const descriptor = openSync(path, 'r');
  try {
    if (hasSignature(descriptor, bytes)) return;
    const head = Buffer.alloc(Math.min(bytes, 4096));
    readSync(descriptor, head, 0, head.length, 0);
    if (head.every((byte) => byte === 0))
      throw notHdf5(
        `its first ${head.length} bytes are all zero, as a copy that never finished leaves it`,
        'Copy it again from where it was recorded, or restore it.',
      );
    if (head.subarray(0, 40).toString('latin1').startsWith('version https://git-lfs'))
      throw notHdf5('it is the pointer that stands for a large file in Git', 'Fetch the file itself (git lfs pull).');
    if (isText(head))
      throw notHdf5(
        `it is text, beginning "${head.toString('utf8').trim().split(/\s+/).join(' ').slice(0, 40)}"`,
        'Give it the ending it should have (.csv, .txt), or replace it by the recording.',
      );
    throw notHdf5('the signature that every HDF5 file begins with is missing', 'Restore the file from a backup.');
  } finally {
    closeSync(descriptor);
  }
}

/**
 * @throws FormatError where the file is no HDF5 file or the library cannot open it
 */
export async function openHdf5(path: string): Promise<Hdf5> {
  refuseOtherContent(path);
  const module = await h5wasm.ready;
  // Without this, damaged chunks and missing filters come back as numbers.
  module.activate_throwing_error_handler();
  try {
    return { module, file: new h5wasm.File(path, 'r') };
  } catch (error) {
    throw damaged('', error);
  }
}

/** Where in its own source the library gave up: of use to nobody who has a file to mend. */
const inTheLibrary = /^#\d+: \S+ line \d+ in \w+\(\): /;

/** The library's long message, cut to what says something. */
export function libraryMessage(error: unknown): string {
  const text = error instanceof Error ? error.message : String(error);
  const lines = text
    .split('\n')
    .map((line) => line.trim())
    .filter((line) => line !== '');
  const telling = lines.find((line) =>
    /truncated|required filter|unable to|can't|bad |wrong|corrupt|abort/i.test(line),
  );
  return (telling ?? lines[0] ?? 'no reason given')
    .replace(/\s+/g, ' ')
    .replace(inTheLibrary, '')
    .replace(/[.\s]+$/, '')
    .slice(0, 200);
}

/** What a failure of the library means for a person. */
export function damaged(place: string, error: unknown): FormatError {
  if (error instanceof FormatError) return error;
  const text = error instanceof Error ? error.message : String(error);
  const truncated = /truncated file: eof = (\d+).*?stored_eof = (\d+)/s.exec(text);
  if (truncated)
    return new FormatError({
      code: 'FILE_TRUNCATED',
      place,
      message: `The file is cut short: ${truncated[1]} bytes are there, it should have ${truncated[2]}.`,
      remedy: 'Copy it again from where it was recorded, or restore it from a backup.',
    });
  const filter = /required filter '?([^'\n]+?)'? is not registered/.exec(text);
  if (filter) return missingFilter(place, filter[1]!);
  return new FormatError({
    code: 'HDF5_DAMAGED',
    place,
    message: `HDF5 cannot read this: ${libraryMessage(error)}.`,
    remedy: 'Copy the file again from where it was recorded, or restore it from a backup.',
  });
}

export const missingFilter = (place: string, name: string): FormatError =>
  new FormatError({
    code: 'FILTER_MISSING',
    place,
    message: `The data are compressed with the filter "${name}", which cannot be undone here.`,
    remedy: 'Write a copy that every reader can open: h5repack -f GZIP=4 OLD.nwb NEW.nwb',
  });

/** What stands at a path. `nothing`: no link of that name; `damaged`: a link whose object cannot be read. */
export type Found =
  | { kind: 'group'; group: Group }
  | { kind: 'dataset'; dataset: Dataset }
  | { kind: 'broken link'; target: string }
  | { kind: 'nothing' }
  | { kind: 'damaged'; reason: string };

/** Names of a group's members and of an object's attributes, asked for once per handle. */
const membersOf = new WeakMap<Group, ReadonlySet<string>>();
const attributesOf = new WeakMap<Group | Dataset, ReadonlySet<string>>();

function members(group: Group): ReadonlySet<string> {
  const known = membersOf.get(group);
  if (known) return known;
  const listed = new Set(group.keys());
  membersOf.set(group, listed);
  return listed;
}

function hasAttribute(holder: Group | Dataset, name: string, module: Module): boolean {
  let known = attributesOf.get(holder);
  if (!known) {
    known = new Set(module.get_attribute_names(holder.file_id, holder.path));
    attributesOf.set(holder, known);
  }
  return known.has(name);
}

/** @param name of a member, or a path from the root */
export function look(parent: Group, name: string): Found {
  let entity: Entity | null;
  try {
    if (!name.includes('/') && !members(parent).has(name)) return { kind: 'nothing' };
    entity = parent.get(name);
  } catch (error) {
    return { kind: 'damaged', reason: libraryMessage(error) };
  }
  // The library answers null both for what is not there and for what is there and cannot be read.
  if (entity === null)
    return name.includes('/')
      ? { kind: 'nothing' }
      : { kind: 'damaged', reason: 'the object cannot be found in the file' };
  switch ((entity as unknown as { type: string }).type) {
    case 'Group':
      return { kind: 'group', group: entity as Group };
    case 'Dataset':
      return { kind: 'dataset', dataset: entity as Dataset };
    case 'BrokenSoftLink':
      return { kind: 'broken link', target: (entity as unknown as { target: string }).target };
    case 'ExternalLink': {
      const link = entity as unknown as { filename: string; obj_path: string };
      return { kind: 'broken link', target: `${link.filename}:${link.obj_path}` };
    }
    default:
      return { kind: 'nothing' };
  }
}

/**
 * What tells one object of the file from another, whatever path it is reached by; '' where it cannot be told. Links
 * give one object several paths, and can lead round in a circle.
 */
export function identity(path: string, { file, module }: Hdf5): string {
  try {
    return Buffer.from(module.create_object_reference(file.file_id, path)).toString('hex');
  } catch {
    return '';
  }
}

export function groupAt(parent: Group, name: string): Group | null {
  const found = look(parent, name);
  return found.kind === 'group' ? found.group : null;
}

export function datasetAt(parent: Group, name: string): Dataset | null {
  const found = look(parent, name);
  return found.kind === 'dataset' ? found.dataset : null;
}

type Scalar = string | number | null;

function scalarOf(value: unknown): Scalar {
  if (Array.isArray(value) || ArrayBuffer.isView(value)) {
    const list = value as ArrayLike<unknown>;
    return list.length === 1 ? scalarOf(list[0]) : null;
  }
  if (typeof value === 'bigint') return Number(value);
  if (typeof value === 'string') return value;
  return typeof value === 'number' ? value : null;
}

/**
 * A single string or number stored as an attribute; null where there is none or it is something else.
 *
 * @throws FormatError where it is there and cannot be read: a damaged conversion factor must not turn into 1
 */
export function attribute(holder: Group | Dataset, name: string, module: Module): Scalar {
  try {
    if (!hasAttribute(holder, name, module)) return null;
    return scalarOf(holder.get_attribute(name, false));
  } catch (error) {
    throw damaged(`${holder.path} (attribute "${name}")`, error);
  }
}

export function textAttribute(holder: Group | Dataset, name: string, module: Module): string {
  const value = attribute(holder, name, module);
  return value === null ? '' : String(value).trim();
}

export function numberAttribute(holder: Group | Dataset, name: string, module: Module): number | null {
  const value = attribute(holder, name, module);
  return typeof value === 'number' && Number.isFinite(value) ? value : null;
}

/** A list of texts stored as an attribute. */
export function textsAttribute(holder: Group | Dataset, name: string, module: Module): string[] {
  try {
    if (!hasAttribute(holder, name, module)) return [];
    const value = holder.get_attribute(name, false) as unknown;
    return (Array.isArray(value) ? value : [value]).map(String);
  } catch (error) {
    throw damaged(`${holder.path} (attribute "${name}")`, error);
  }
}

/**
 * A dataset that holds one value. Longer ones are not touched.
 *
 * @throws FormatError where it is there and cannot be read
 */
export function scalarDataset(parent: Group, name: string): Scalar {
  const found = look(parent, name);
  if (found.kind === 'damaged') throw damaged(`${parent.path}/${name}`, found.reason);
  if (found.kind !== 'dataset') return null;
  try {
    const { dataset } = found;
    const shape = dataset.shape;
    if (shape === null || shape.reduce((product, length) => product * length, 1) !== 1) return null;
    return scalarOf(dataset.value);
  } catch (error) {
    throw damaged(`${parent.path}/${name}`, error);
  }
}

export function textDataset(parent: Group, name: string): string {
  const value = scalarDataset(parent, name);
  return value === null ? '' : String(value).trim();
}

/** A list of numbers from a table's column. For columns of a table, never for samples. */
export function numberColumn(dataset: Dataset): number[] {
  const value = dataset.value as unknown;
  if (value === null) return [];
  return Array.from(value as ArrayLike<number | bigint>, Number);
}

export function textColumn(dataset: Dataset): string[] {
  const value = dataset.value as unknown;
  return Array.isArray(value) ? value.map(String) : value === null ? [] : [String(value)];
}

/** Raw bytes of a small dataset. */
function rawBytes(dataset: Dataset, module: Module): Uint8Array {
  const { size, total_size: length } = dataset.metadata;
  const pointer = module._malloc(Math.max(1, size * length));
  try {
    module.get_dataset_data(dataset.file_id, dataset.path, null, null, null, BigInt(pointer));
    return module.HEAPU8.slice(pointer, pointer + size * length);
  } finally {
    module._free(pointer);
  }
}

/** Path of the object a stored reference points at; null for the reference to nothing. */
function referenced(file: File, bytes: Uint8Array, module: Module): string | null {
  if (bytes.every((byte) => byte === 0)) return null;
  try {
    return module.get_referenced_name(file.file_id, bytes, true) || null;
  } catch {
    return null;
  }
}

/** Paths that a column of object references points at. */
export function referenceColumn(dataset: Dataset, { file, module }: Hdf5): (string | null)[] {
  if (dataset.metadata.type !== module.H5T_class_t.H5T_REFERENCE.value) return [];
  const value = dataset.value as unknown;
  const references = (Array.isArray(value) ? value : [value]).filter((item) => item instanceof Reference);
  return references.map((reference) => referenced(file, reference.ref_data, module));
}

/** One row of a reference into a time series. */
export interface SeriesPiece {
  from: number;
  count: number;
  path: string | null;
}

/**
 * Rows of a compound (idx_start, count, timeseries). References inside compounds come out empty from the library
 * (0.10.3), so the bytes are cut here.
 */
export function pieceColumn(dataset: Dataset, { file, module }: Hdf5): SeriesPiece[] {
  const metadata: Metadata = dataset.metadata;
  const members = metadata.compound_type?.members ?? [];
  const start = members.find((member) => member.name === 'idx_start');
  const length = members.find((member) => member.name === 'count');
  const series = members.find((member) => member.type === module.H5T_class_t.H5T_REFERENCE.value);
  if (!start || !length || !series) return [];
  const bytes = rawBytes(dataset, module);
  const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
  return Array.from({ length: metadata.total_size }, (_, row) => {
    const base = row * metadata.size;
    const whole = (member: typeof start): number => readInteger(view, base + member.offset, member);
    const reference = bytes.slice(base + series.offset, base + series.offset + series.size);
    return { from: whole(start), count: whole(length), path: referenced(file, reference, module) };
  });
}

function readInteger(view: DataView, offset: number, type: Metadata): number {
  const little = type.littleEndian;
  switch (type.size) {
    case 1:
      return type.signed ? view.getInt8(offset) : view.getUint8(offset);
    case 2:
      return type.signed ? view.getInt16(offset, little) : view.getUint16(offset, little);
    case 4:
      return type.signed ? view.getInt32(offset, little) : view.getUint32(offset, little);
    default:
      return Number(type.signed ? view.getBigInt64(offset, little) : view.getBigUint64(offset, little));
  }
}

/** Names in a group, in an order that does not depend on how they are stored. */
export function names(group: Group): string[] {
  return [...members(group)].sort((a, b) => (a < b ? -1 : a > b ? 1 : 0));
}

/** What a file holds, one line for each dataset: '/a/b float64 [100 × 3]'. At most `limit` lines. */
export function inventory({ file, module }: Hdf5, limit = 20): string[] {
  const lines: string[] = [];
  const typeName = (metadata: Metadata): string => {
    const classes = module.H5T_class_t;
    if (metadata.type === classes.H5T_INTEGER.value) return `${metadata.signed ? '' : 'u'}int${metadata.size * 8}`;
    if (metadata.type === classes.H5T_FLOAT.value) return `float${metadata.size * 8}`;
    if (metadata.type === classes.H5T_STRING.value) return 'text';
    return metadata.type === classes.H5T_COMPOUND.value ? 'compound' : 'other';
  };
  const walk = (group: Group, depth: number): void => {
    for (const name of names(group)) {
      if (lines.length >= limit) return;
      const found = look(group, name);
      if (found.kind === 'group' && depth < 8) walk(found.group, depth + 1);
      if (found.kind === 'dataset') {
        const { metadata, path } = found.dataset;
        lines.push(`${path} ${typeName(metadata)} [${(metadata.shape ?? []).join(' × ')}]`);
      }
    }
  };
  walk(file, 0);
  return lines;
}
