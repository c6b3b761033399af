/** Which names look like recordings, and what to say of the others. */
import type { FormatId } from '../formats/types.ts';

/** Endings a reader claims. The readers' own claim must agree with this list; a test of the whole holds them together. */
export const recordingEndings: Readonly<Record<string, FormatId>> = {
  '.nwb': 'nwb',
  '.csv': 'text',
  '.tsv': 'text',
  '.txt': 'text',
  '.dat': 'text',
  '.asc': 'text',
  '.tab': 'text',
};

/** Said of HDF5 under a name that is not NWB's. */
export const strayHdf5 = 'HDF5 that does not call itself NWB; if it is an NWB file, let its name end in .nwb';

const groups: readonly [string, readonly string[]][] = [
  ['a picture', ['.png', '.jpg', '.jpeg', '.gif', '.svg', '.tif', '.tiff', '.bmp', '.webp', '.eps', '.heic', '.ico']],
  ['a film or sound', ['.mp4', '.avi', '.mov', '.mkv', '.mp3']],
  ['a printed page', ['.pdf', '.ps']],
  ['a text document', ['.md', '.rst', '.doc', '.docx', '.odt', '.rtf', '.tex', '.html', '.htm', '.log', '.bib']],
  ['slides', ['.ppt', '.pptx', '.odp', '.key']],
  [
    'a spreadsheet; facts that belong to the archive can be saved as facts.csv',
    ['.xls', '.xlsx', '.xlsm', '.ods', '.numbers'],
  ],
  [
    'a packed file; unpack it to have its contents read',
    ['.zip', '.gz', '.tgz', '.tar', '.bz2', '.xz', '.7z', '.rar', '.zst'],
  ],
  ['program text', ['.py', '.m', '.r', '.jl', '.ipynb', '.js', '.ts', '.c', '.cpp', '.h', '.sh', '.bat', '.pro']],
  ['settings or metadata', ['.json', '.xml', '.ini', '.toml', '.cfg', '.yaml', '.yml', '.properties']],
  [strayHdf5, ['.h5', '.hdf5', '.hdf']],
  [
    'an open format that this version does not read; it reads NWB (.nwb) and delimited text (.csv, .tsv, .txt, .dat, .asc, .tab)',
    ['.npy', '.npz', '.edf', '.bdf', '.wav', '.mat', '.parquet'],
  ],
];
const otherEndings = new Map(groups.flatMap(([reason, endings]) => endings.map((ending) => [ending, reason] as const)));

/** The last ending of a name with its dot, lower case; '' where there is none. */
export function endingOf(name: string): string {
  const at = name.lastIndexOf('.');
  return at > 0 ? name.slice(at).toLowerCase() : '';
}

/** Why a name that no reader claims is not a recording, as far as the name tells; null where it does not. */
export function reasonByName(name: string): string | null {
  const stem = name.toLowerCase().replace(/\.(txt|md|rst|html)$/, '');
  if (/^(licen[cs]e|copying|copyright|unlicense)([-_. ].*)?$/.test(stem)) return 'a licence';
  if (/^(read[-_ ]?me|notice|authors|contributors|changelog|changes|citation|citing|index|todo)$/.test(stem))
    return 'text for people';
  return otherEndings.get(endingOf(name)) ?? null;
}

/** Said of binary files that nothing claims. */
export const notOpen = 'not one of the open formats this tool reads';

const hdf5Signature = [0x89, 0x48, 0x44, 0x46, 0x0d, 0x0a, 0x1a, 0x0a];

/**
 * What the first bytes of a file are: text, text without a single digit, HDF5, other binary, or nothing at all.
 * UTF-16 counts as text where it says so with its byte order mark.
 */
export function natureOf(head: Uint8Array): 'empty' | 'text' | 'prose' | 'hdf5' | 'binary' {
  if (head.length === 0) return 'empty';
  if (hdf5Signature.every((byte, index) => head[index] === byte)) return 'hdf5';
  const utf16 = (head[0] === 0xff && head[1] === 0xfe) || (head[0] === 0xfe && head[1] === 0xff);
  if (!utf16 && head.some((byte) => byte < 7 || (byte > 13 && byte < 27))) return 'binary';
  return head.some((byte) => byte >= 0x30 && byte <= 0x39) ? 'text' : 'prose';
}
