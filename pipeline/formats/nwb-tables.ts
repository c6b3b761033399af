/** The tables of an NWB file that say which series belong together. */
import type { Group } from 'h5wasm/node';
import {
  datasetAt,
  groupAt,
  type Hdf5,
  numberColumn,
  pieceColumn,
  referenceColumn,
  type SeriesPiece,
  textColumn,
} from './hdf5.ts';
import { warning } from './problems.ts';
import type { Problem } from './types.ts';

/** One row of the table of intracellular recordings. */
export interface RecordingRow {
  row: number;
  response: SeriesPiece | null;
  stimulus: SeriesPiece | null;
  /** Number of the simultaneous recording it is part of. */
  simultaneous: number | null;
  /** What the sequential recording calls its stimulus. */
  protocol: string;
}

export interface Tables {
  rows: RecordingRow[];
  /** Sweep number by path of series, from the older sweep table. */
  sweepNumbers: Map<string, number>;
  problems: Problem[];
}

const home = '/general/intracellular_ephys';

/** Cuts a ragged column: row k holds the values from the end of row k−1 to its own end. */
function ragged<Value>(values: readonly Value[], ends: readonly number[]): Value[][] {
  return ends.map((end, row) => values.slice(row === 0 ? 0 : ends[row - 1], end));
}

const numbers = (group: Group | null, name: string): number[] => {
  const dataset = group && datasetAt(group, name);
  return dataset ? numberColumn(dataset) : [];
};

const pieces = (group: Group | null, name: string, hdf5: Hdf5): SeriesPiece[] => {
  const dataset = group && datasetAt(group, name);
  return dataset ? pieceColumn(dataset, hdf5) : [];
};

/** A row's piece, or null where the row has none: the standard writes −1 for it, some files a null reference. */
const present = (piece: SeriesPiece | undefined): SeriesPiece | null =>
  piece && piece.path !== null && piece.count !== 0 && piece.from >= 0 ? piece : null;

function recordingRows(hdf5: Hdf5): RecordingRow[] {
  const table = groupAt(hdf5.file, `${home}/intracellular_recordings`);
  if (!table) return [];
  const responses = pieces(groupAt(table, 'responses'), 'response', hdf5);
  const stimuli = pieces(groupAt(table, 'stimuli'), 'stimulus', hdf5);
  const simultaneous = groupAt(hdf5.file, `${home}/simultaneous_recordings`);
  const groups = ragged(numbers(simultaneous, 'recordings'), numbers(simultaneous, 'recordings_index'));
  const sequential = groupAt(hdf5.file, `${home}/sequential_recordings`);
  const runs = ragged(
    numbers(sequential, 'simultaneous_recordings'),
    numbers(sequential, 'simultaneous_recordings_index'),
  );
  const labelColumn = sequential && datasetAt(sequential, 'stimulus_type');
  const labels = labelColumn ? textColumn(labelColumn) : [];
  const ids = numbers(simultaneous, 'id');
  const groupOfRow = new Map<number, number>();
  for (const [group, rows] of groups.entries()) for (const row of rows) groupOfRow.set(row, group);
  const runOfGroup = new Map<number, number>();
  for (const [run, members] of runs.entries()) for (const group of members) runOfGroup.set(group, run);
  return Array.from({ length: Math.max(responses.length, stimuli.length) }, (_, row) => {
    const group = groupOfRow.get(row);
    const run = group === undefined ? undefined : runOfGroup.get(group);
    return {
      row,
      response: present(responses[row]),
      stimulus: present(stimuli[row]),
      simultaneous: group === undefined ? null : (ids[group] ?? group),
      protocol: (run === undefined ? '' : (labels[run] ?? '')).trim(),
    };
  });
}

function sweepTable(hdf5: Hdf5): Map<string, number> {
  const table = groupAt(hdf5.file, `${home}/sweep_table`);
  const byPath = new Map<string, number>();
  const seriesColumn = table && datasetAt(table, 'series');
  if (!seriesColumn) return byPath;
  const sweeps = numbers(table, 'sweep_number');
  const series = referenceColumn(seriesColumn, hdf5);
  const ends = numbers(table, 'series_index');
  const rows = ends.length > 0 ? ragged(series, ends) : series.map((path) => [path]);
  for (const [row, paths] of rows.entries())
    for (const path of paths) if (path !== null && sweeps[row] !== undefined) byPath.set(path, sweeps[row]!);
  return byPath;
}

/** Reads both generations of tables. A damaged table is a problem, and the file is read without it. */
export function readTables(hdf5: Hdf5): Tables {
  const problems: Problem[] = [];
  const guarded = <Value>(name: string, read: () => Value, otherwise: Value): Value => {
    try {
      return read();
    } catch (error) {
      problems.push(
        warning({
          code: 'TABLE_DAMAGED',
          place: `${home}/${name}`,
          message: `The table cannot be read (${(error as Error).message.split('\n')[0]}); series are matched by their numbers and names instead.`,
          remedy: 'Restore the file from a backup if sweeps are missing their stimulus.',
        }),
      );
      return otherwise;
    }
  };
  return {
    rows: guarded('intracellular_recordings', () => recordingRows(hdf5), []),
    sweepNumbers: guarded('sweep_table', () => sweepTable(hdf5), new Map()),
    problems,
  };
}
