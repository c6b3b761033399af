/** Writes NWB files with the library that reads them, for tests that must run where h5py is not. */
import h5wasm, { type Group } from 'h5wasm/node';

export interface WrittenSeries {
  path: string;
  type: string;
  unit: string;
  data: Float64Array | Float32Array | Int16Array;
  rate_hz?: number;
  start_s?: number;
  conversion?: number;
  /** Samples in a chunk; compressed then. */
  chunk?: number;
  sweep?: number;
}

function groupFor(root: Group, path: string): Group {
  let group = root;
  for (const part of path.split('/').filter(Boolean)) {
    const below = group.keys().includes(part) ? (group.get(part) as Group) : group.create_group(part);
    group = below;
  }
  return group;
}

/** Writes series under their paths into a new file that says it is NWB. */
export async function writeNwb(
  file: string,
  series: readonly WrittenSeries[],
  start = '2026-03-12T09:30:00Z',
): Promise<void> {
  const module = await h5wasm.ready;
  module.activate_throwing_error_handler();
  const out = new h5wasm.File(file, 'w');
  try {
    out.create_attribute('neurodata_type', 'NWBFile');
    out.create_attribute('nwb_version', '2.7.0');
    out.create_dataset({ name: 'session_start_time', data: start });
    for (const { path, type, unit, data, rate_hz, start_s, conversion, chunk, sweep } of series) {
      const group = groupFor(out, path);
      group.create_attribute('neurodata_type', type);
      if (sweep !== undefined) group.create_attribute('sweep_number', sweep, [], '<I');
      const stored = group.create_dataset({
        name: 'data',
        data,
        shape: [data.length],
        ...(chunk ? { chunks: [chunk], compression: 'gzip' as const, compression_opts: [4] } : {}),
      });
      stored.create_attribute('unit', unit);
      stored.create_attribute('conversion', conversion ?? 1, [], '<d');
      const time = group.create_dataset({ name: 'starting_time', data: start_s ?? 0, dtype: '<d', shape: [] });
      time.create_attribute('rate', rate_hz ?? 20000, [], '<d');
      time.create_attribute('unit', 'seconds');
    }
  } finally {
    out.close();
  }
}
