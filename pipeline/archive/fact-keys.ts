/** The closed list of fact keys: what can be stated about a recording, and what a possible value looks like. */
import { distance } from 'fastest-levenshtein';

export type FactKind = 'text' | 'number' | 'choice' | 'date' | 'time';

export interface FactKey {
  key: string;
  label: string;
  kind: FactKind;
  /** As shown to people; empty unless the fact is a number. */
  unit: string;
  /** Smallest and largest possible value of a number, both possible themselves; null otherwise. */
  range: readonly [number, number] | null;
  /** The words a choice may take; empty otherwise. */
  choices: readonly string[];
  definition: string;
}

const text = (key: string, label: string, definition: string): FactKey => ({
  key,
  label,
  kind: 'text',
  unit: '',
  range: null,
  choices: [],
  definition,
});
const number = (
  key: string,
  label: string,
  unit: string,
  range: readonly [number, number],
  definition: string,
): FactKey => ({ key, label, kind: 'number', unit, range, choices: [], definition });
const choice = (key: string, label: string, choices: readonly string[], definition: string): FactKey => ({
  key,
  label,
  kind: 'choice',
  unit: '',
  range: null,
  choices,
  definition,
});
const clock = (key: string, label: string, kind: 'date' | 'time', definition: string): FactKey => ({
  key,
  label,
  kind,
  unit: '',
  range: null,
  choices: [],
  definition,
});

/** Every fact key, in the order in which tables and pages show them. */
export const factKeys: readonly FactKey[] = [
  text('cell', 'Cell', 'Id of the cell; files with an equal id are one cell, and spaces in it become hyphens.'),
  text('subject', 'Subject', 'Id of the animal, donor or culture the cell came from.'),
  text('species', 'Species', 'Species of the subject.'),
  text('age', 'Age', 'Age of the subject or culture, with its unit.'),
  text('sex', 'Sex', 'Sex of the subject.'),
  text('genotype', 'Genotype', 'Genotype or line of the subject or culture.'),
  text('region', 'Region', 'Brain region or tissue.'),
  text('slice', 'Slice', 'Id of the slice, dish or fibre bundle.'),
  text('preparation', 'Preparation', 'Kind of preparation, such as acute slice, culture or isolated cell.'),
  text('class', 'Cell class', 'Class whose expected ranges hold: a shipped one or one of almanac.yaml.'),
  text('group', 'Group', 'Experimental group of the subject.'),
  text('protocol', 'Protocol', 'Name of the stimulus protocol.'),
  text('rig', 'Rig', 'Code of the rig.'),
  text('person', 'Person', 'Code of the person who recorded.'),
  clock('date', 'Date', 'date', 'Calendar date of the recording where it was made.'),
  clock('time', 'Time', 'time', 'Clock time at which the recording started, where it was made.'),
  choice(
    'configuration',
    'Configuration',
    ['whole-cell', 'perforated', 'sharp', 'loose', 'other'],
    'How the electrode reached the inside of the cell.',
  ),
  text('bath', 'Bath solution', 'The recipe in solutions/ that bathed the cell.'),
  text('pipette', 'Pipette solution', 'The recipe in solutions/ that filled the pipette.'),
  number('temperature_c', 'Temperature', '°C', [-5, 60], 'Temperature of the bath at the cell.'),
  choice(
    'junction',
    'Junction potential',
    ['corrected', 'uncorrected', 'unstated'],
    'Whether the liquid junction potential was already removed from the stored potentials.',
  ),
  number('ljp_mv', 'Liquid junction potential', 'mV', [-60, 60], 'Liquid junction potential, bath minus pipette.'),
  choice(
    'spike_ion',
    'Spike ion',
    ['sodium', 'calcium', 'mixed'],
    'The ion that carries the upstroke of the action potential.',
  ),
  number('filter_khz', 'Filter corner', 'kHz', [0.001, 1000], 'Low-pass corner of the amplifier.'),
  number('rate_hz', 'Sampling rate', 'Hz', [1, 20_000_000], 'Samples a second, where the file does not say so itself.'),
  number('mains_hz', 'Mains frequency', 'Hz', [45, 65], 'Nominal frequency of the mains where the recording was made.'),
  number('bridge_mohm', 'Bridge balance', 'MΩ', [0, 2000], 'Resistance that the bridge balance compensated.'),
  number('pipette_mohm', 'Pipette resistance', 'MΩ', [0.01, 2000], 'Resistance of the pipette in the bath.'),
  number('seal_gohm', 'Seal resistance', 'GΩ', [0, 1000], 'Resistance of the seal before break-in.'),
  clock('break_in', 'Break-in', 'time', 'Clock time at which the membrane under the pipette was opened.'),
  number('bias_pa', 'Bias current', 'pA', [-10_000_000, 10_000_000], 'Constant current injected besides the stimulus.'),
  number('capacitance_pf', 'Capacitance', 'pF', [0.05, 10_000_000], 'Membrane capacitance as noted on the bench.'),
  number(
    'volume_pl',
    'Cell volume',
    'pL',
    [0.001, 10_000_000],
    'Volume that firing loads with sodium: soma and what exchanges freely with it, from its outline.',
  ),
  number('access_mohm', 'Access resistance', 'MΩ', [0, 2000], 'Access resistance as noted on the bench.'),
  number(
    'end_offset_mv',
    'Offset at the end',
    'mV',
    [-200, 200],
    'Potential read in the bath after the electrode left.',
  ),
  choice('clamp', 'Clamp', ['current', 'voltage'], 'What the amplifier held, where the file does not say so itself.'),
  text('batch_bath', 'Bath batch', 'Batch of the bath solution.'),
  text('batch_pipette', 'Pipette batch', 'Batch of the pipette solution.'),
  choice('audience', 'Audience', ['private', 'public'], 'Who may see the cell on a published site.'),
  text('figure', 'Figure', 'Figure or panel of a publication that shows the cell.'),
  text('doi', 'DOI', 'Digital object identifier of the publication that the cell belongs to.'),
  text('note', 'Note', 'Free remark.'),
];

/** Classes whose ranges come with the tool, for `like:` in almanac.yaml and for the fact `class`. */
export const shippedClasses: readonly string[] = [
  'cortical-pyramidal',
  'hippocampal-pyramidal',
  'fast-spiking-interneuron',
  'somatostatin-interneuron',
  'purkinje',
  'midbrain-dopaminergic',
  'sensory-neuron-small',
  'sensory-neuron-large',
  'motoneuron',
  'stem-cell-neuron',
  'ventricular-myocyte',
  'stem-cell-cardiomyocyte',
  'sinoatrial-node',
  'skeletal-muscle',
  'squid-axon',
  'chromaffin',
  'any',
];

const byKey = new Map(factKeys.map((entry) => [entry.key, entry]));

/** Registry entry of a key, undefined for a key that is not on the list. */
export const factKey = (key: string): FactKey | undefined => byKey.get(key);

const plainWord = (word: string): string =>
  word
    .trim()
    .toLowerCase()
    .replace(/[\s-]+/g, '_');

/**
 * The known word most like a given one: one that begins with the other or holds all of it first, then the fewest changed
 * letters, then the earlier in the list. Undefined only when `known` is empty.
 */
export function nearestOf(word: string, known: Iterable<string>): string | undefined {
  const wanted = plainWord(word);
  let best: string | undefined;
  let bestScore = Number.POSITIVE_INFINITY;
  for (const candidate of known) {
    const plain = plainWord(candidate);
    const begins = wanted.length >= 3 && plain.length >= 3 && (plain.startsWith(wanted) || wanted.startsWith(plain));
    const shares = begins || (wanted.length >= 5 && plain.includes(wanted));
    const score = distance(wanted, plain) + (shares ? -1000 : 0);
    if (score < bestScore) {
      best = candidate;
      bestScore = score;
    }
  }
  return best;
}

export type CheckedFact = { ok: true; value: string | number } | { ok: false; message: string; nearest?: string };

const shown = (value: unknown): string => {
  const written = typeof value === 'string' ? JSON.stringify(value) : String(value);
  return written.length > 60 ? `${written.slice(0, 57)}…` : written;
};

/**
 * Holds one statement against the list.
 *
 * @param value a string or number as written; numbers may be written as text with a decimal point
 * @returns the value in its standard form (numbers as numbers, choices in the list's spelling, dates as YYYY-MM-DD,
 * times as HH:MM:SS), or a sentence fragment that says what was expected and found, with the nearest known key or word
 */
export function checkFact(key: string, value: unknown): CheckedFact {
  const entry = byKey.get(key);
  if (!entry) {
    const nearest = nearestOf(
      key,
      factKeys.map((known) => known.key),
    )!;
    return { ok: false, message: `"${key}" is not a fact key; the nearest is "${nearest}"`, nearest };
  }
  if (typeof value !== 'string' && typeof value !== 'number')
    return { ok: false, message: `${key} must be one value, got ${value === null ? 'nothing' : shownKind(value)}` };
  const written = typeof value === 'string' ? value.trim() : String(value);
  if (written === '') return { ok: false, message: `${key} has no value` };
  if (entry.kind === 'number') return checkNumber(entry, written);
  if (entry.kind === 'choice') return checkChoice(entry, written);
  if (entry.kind === 'date') return checkDate(entry, written);
  if (entry.kind === 'time') return checkTime(entry, written);
  return checkText(entry, written);
}

const shownKind = (value: unknown): string =>
  Array.isArray(value) ? 'a list' : typeof value === 'object' ? 'a block of keys' : shown(value);

const numeral = /^[+-]?(\d+\.?\d*|\.\d+)(e[+-]?\d+)?$/i;

function checkNumber(entry: FactKey, written: string): CheckedFact {
  const { key, unit, range } = entry;
  const spelled = written.replace(/^[−–]/, '-');
  if (!numeral.test(spelled)) {
    const comma = /^[+-]?\d+,\d+$/.test(spelled) ? `; write ${spelled.replace(',', '.')} with a point` : '';
    const withUnit = /^([+-]?(?:\d+\.?\d*|\.\d+))\s*[^\d\s].*$/.exec(spelled);
    const bare = withUnit && !comma ? `; write the number alone, in ${unit}` : '';
    return { ok: false, message: `${key} must be a number in ${unit}, got ${shown(written)}${comma}${bare}` };
  }
  const value = Number(spelled);
  const [low, high] = range!;
  if (!(value >= low && value <= high))
    return { ok: false, message: `${key} must be between ${low} and ${high} ${unit}, got ${written}` };
  return { ok: true, value: value === 0 ? 0 : value };
}

function checkChoice(entry: FactKey, written: string): CheckedFact {
  const found = entry.choices.find((word) => plainWord(word) === plainWord(written));
  if (found) return { ok: true, value: found };
  const nearest = nearestOf(written, entry.choices)!;
  return {
    ok: false,
    message: `${entry.key} must be ${wordList(entry.choices)}, got ${shown(written)}; the nearest is "${nearest}"`,
    nearest,
  };
}

/** `a, b or c`. */
export const wordList = (words: readonly string[]): string =>
  words.length < 2 ? (words[0] ?? '') : `${words.slice(0, -1).join(', ')} or ${words.at(-1)}`;

const daysIn = (year: number, month: number): number =>
  month === 2
    ? year % 4 === 0 && (year % 100 !== 0 || year % 400 === 0)
      ? 29
      : 28
    : [4, 6, 9, 11].includes(month)
      ? 30
      : 31;

/** Whether a text is a date of the calendar between 1900 and 2100, written YYYY-MM-DD. */
export function isCalendarDate(written: string): boolean {
  const match = /^(\d{4})-(\d{2})-(\d{2})$/.exec(written);
  if (!match) return false;
  const [year, month, day] = [Number(match[1]), Number(match[2]), Number(match[3])];
  return year >= 1900 && year <= 2100 && month >= 1 && month <= 12 && day >= 1 && day <= daysIn(year, month);
}

function checkDate(entry: FactKey, written: string): CheckedFact {
  // The date as written where the recording was made: a clock time or an offset behind it moves nothing.
  const day = /^(\d{4}-\d{2}-\d{2})(?:[T ]\d{1,2}:\d{2}.*)?$/.exec(written)?.[1];
  if (day === undefined)
    return { ok: false, message: `${entry.key} must be written YYYY-MM-DD, got ${shown(written)}` };
  if (!isCalendarDate(day))
    return {
      ok: false,
      message: `${entry.key} must be a day of the calendar between 1900 and 2100, got ${shown(written)}`,
    };
  return { ok: true, value: day };
}

function checkTime(entry: FactKey, written: string): CheckedFact {
  const match = /^(\d{1,2}):(\d{2})(?::(\d{2})(\.\d+)?)?$/.exec(written);
  if (!match || Number(match[1]) > 23 || Number(match[2]) > 59 || Number(match[3] ?? 0) > 59)
    return { ok: false, message: `${entry.key} must be a clock time written HH:MM or HH:MM:SS, got ${shown(written)}` };
  return { ok: true, value: `${match[1]!.padStart(2, '0')}:${match[2]}:${match[3] ?? '00'}${match[4] ?? ''}` };
}

const longest = 2000;

function checkText(entry: FactKey, written: string): CheckedFact {
  if (written.length > longest)
    return { ok: false, message: `${entry.key} must be at most ${longest} characters long, got ${written.length}` };
  if (entry.key === 'cell') return checkCellId(written);
  if (entry.key === 'doi') {
    const doi = written.replace(/^(?:https?:\/\/(?:dx\.)?doi\.org\/|doi:\s*)/i, '');
    return /^10\.\d{4,9}\/\S+$/.test(doi)
      ? { ok: true, value: doi }
      : { ok: false, message: `doi must look like 10.1234/abcd, got ${shown(written)}` };
  }
  return { ok: true, value: written.normalize('NFC') };
}

const reserved = /^(con|prn|aux|nul|com\d|lpt\d)$/i;

/** Ids stand in page addresses and file names on every system, so their characters are few. */
function checkCellId(written: string): CheckedFact {
  const id = written.normalize('NFC').replace(/\s+/g, '-');
  if (id.length > 120) return { ok: false, message: `cell must be at most 120 characters long, got ${id.length}` };
  if (!/^[\p{L}\p{N}_+](?:[\p{L}\p{M}\p{N}._+-]*[\p{L}\p{M}\p{N}_+-])?$/u.test(id) || reserved.test(id)) {
    const nearest = urlSafeId(written);
    return {
      ok: false,
      message: `cell may hold letters, digits and . _ + - only, since it names a page, got ${shown(written)}; "${nearest}" would do`,
      nearest,
    };
  }
  return { ok: true, value: id };
}

/** An id by which something speaks of a cell: like a stated one, or that of a cell kept apart (`id~2`). */
export function checkCellReference(written: string): CheckedFact {
  const apart = /~[1-9]\d*$/.exec(written.trim())?.[0] ?? '';
  const checked = checkFact('cell', written.trim().slice(0, written.trim().length - apart.length));
  return checked.ok ? { ok: true, value: `${checked.value}${apart}` } : checked;
}

/** Any text made into a cell id: other characters become hyphens, none of them doubled or at an end. */
export function urlSafeId(written: string): string {
  const id = written
    .normalize('NFC')
    .replace(/[^\p{L}\p{M}\p{N}._+-]+/gu, '-')
    .replace(/-{2,}/g, '-')
    .replace(/^[-.\p{M}]+|[-.]+$/gu, '')
    .slice(0, 120)
    .replace(/[-.]+$/, '');
  if (id === '') return 'unnamed';
  return reserved.test(id) ? `${id}_` : id;
}
