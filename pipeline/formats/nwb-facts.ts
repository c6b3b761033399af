/** Facts that stand in an NWB file itself: session, subject, electrodes. Names of people are left where they are. */
import type { Group } from 'h5wasm/node';
import { damaged, datasetAt, groupAt, type Hdf5, look, textAttribute, textColumn, textDataset } from './hdf5.ts';
import { warning } from './problems.ts';
import type { FileFact, Problem } from './types.ts';

export interface FileFacts {
  /** As in the file, null where there is none. */
  session_start: string | null;
  facts: FileFact[];
  problems: Problem[];
  filter_khz: Map<string, number>;
}

/** Corner of a low-pass filter in kHz out of free text, e.g. 'Bessel 10 kHz'; null where it names none or several. */
export function filterKhz(text: string): number | null {
  const found = [...text.matchAll(/(low[\s-]*pass\D{0,20}|high[\s-]*pass\D{0,20})?(\d+(?:\.\d+)?)\s*(k?)\s*hz/gi)]
    .map((match) => ({
      khz: Number(match[2]) * (match[3] ? 1 : 1e-3),
      side: (match[1] ?? '').slice(0, 1).toLowerCase(),
    }))
    .filter(({ khz, side }) => khz > 0 && side !== 'h');
  const low = found.filter(({ side }) => side === 'l');
  const left = [...new Set((low.length > 0 ? low : found).map(({ khz }) => khz))];
  return left.length === 1 ? left[0]! : null;
}

/** A resistance in MΩ out of free text with a unit ('4.5 MOhm', '2 GΩ', '5e6 ohms'); null where it is no one number. */
export function resistanceMohm(text: string): number | null {
  const match = /^\s*~?\s*([+-]?\d+(?:\.\d+)?(?:e[+-]?\d+)?)\s*(.*)$/i.exec(text);
  if (!match) return null;
  const value = Number(match[1]);
  const unit = match[2]!.trim();
  // A bare number is in ohms, as everything in the standard is in SI units; a few ohms cannot be meant.
  if (unit === '') return value >= 1e4 ? value / 1e6 : null;
  const scale = /^(g|giga|m|mega|k|kilo)?[\s-]*(?:ohms?|Ω|Ω)\s*$/i.exec(unit);
  if (!scale) return null;
  const prefix = (scale[1] ?? '').toLowerCase();
  return value * (prefix.startsWith('g') ? 1e3 : prefix.startsWith('m') ? 1 : prefix.startsWith('k') ? 1e-3 : 1e-6);
}

/** Years in which no digital recording was made are marks of an unset clock or of removed dates. */
const unbelievable = (year: number): boolean => year < 1950 || year === 1970 || year > 2100;

function sessionFacts({ file }: Hdf5): Pick<FileFacts, 'session_start' | 'facts' | 'problems'> {
  const place = '/session_start_time';
  const written = textDataset(file, 'session_start_time');
  if (written === '') return { session_start: null, facts: [], problems: [] };
  const match = /^(\d{4})-(\d{2})-(\d{2})(?:[T ](\d{2}):(\d{2})(?::(\d{2}))?)?/.exec(written);
  const unusable = (why: string): Problem =>
    warning({
      code: 'DATE_UNUSABLE',
      place,
      message: `The session is said to have started at "${written}": ${why}. The date is not used.`,
      remedy: 'State the date in the sidecar.',
      sidecar: 'facts: { date: YYYY-MM-DD }',
    });
  if (!match)
    return {
      session_start: written,
      facts: [],
      problems: [unusable('this is no date of the form 2026-03-12T14:05:00')],
    };
  const [, year, month, day, hour, minute, second] = match;
  const date = new Date(Date.UTC(Number(year), Number(month) - 1, Number(day)));
  if (date.getUTCMonth() !== Number(month) - 1 || Number(hour ?? 0) > 23 || Number(minute ?? 0) > 59)
    return { session_start: written, facts: [], problems: [unusable('there is no such day or hour')] };
  if (unbelievable(Number(year)))
    return {
      session_start: written,
      facts: [],
      problems: [unusable(`no such recording was made in ${year}; the clock was not set, or the date was taken out`)],
    };
  const facts: FileFact[] = [{ key: 'date', value: `${year}-${month}-${day}`, place }];
  if (hour !== undefined) facts.push({ key: 'time', value: `${hour}:${minute}:${second ?? '00'}`, place });
  return { session_start: written, facts, problems: [] };
}

/** Words that stand in a field to say that nothing is known. */
const nothingSaid = /^(?:|na|n\/a|none|null|nan|unknown|unspecified|not (?:recorded|specified|available)|-+|\?+)$/i;

const subjectKeys: [string, string][] = [
  ['subject_id', 'subject'],
  ['species', 'species'],
  ['age', 'age'],
  ['sex', 'sex'],
  ['genotype', 'genotype'],
];

function subjectFacts({ file }: Hdf5): FileFact[] {
  const subject = groupAt(file, '/general/subject');
  if (!subject) return [];
  return subjectKeys.flatMap(([name, key]) => {
    const value = textDataset(subject, name);
    return nothingSaid.test(value) ? [] : [{ key, value, place: `/general/subject/${name}` }];
  });
}

/** A text of an electrode: a dataset by the standard, an attribute in some files. */
const electrodeText = (electrode: Group, name: string, { module }: Hdf5): string =>
  textDataset(electrode, name) || textAttribute(electrode, name, module);

function electrodeFacts(
  name: string,
  hdf5: Hdf5,
  several: boolean,
  filters: Map<string, number>,
  problems: Problem[],
): FileFact[] {
  const folder = groupAt(hdf5.file, '/general/intracellular_ephys');
  const found = folder && look(folder, name);
  if (found?.kind !== 'group') return [];
  const facts: FileFact[] = [];
  const electrode = found.group;
  const path = `/general/intracellular_ephys/${name}`;
  const add = (key: string, value: string | number, from: string): void => {
    facts.push({ key, value, place: `${path}/${from}`, ...(several ? { electrode: name } : {}) });
  };
  const unclear = (from: string, text: string, key: string, wanted: string): void => {
    problems.push(
      warning({
        code: 'FACT_UNCLEAR',
        place: `${path}/${from}`,
        message: `"${text}" does not give one number; ${wanted} was expected. It is not used.`,
        remedy: 'State it in the sidecar.',
        sidecar: `facts: { ${key}: … }`,
      }),
    );
  };
  for (const [from, key] of [
    ['location', 'region'],
    ['slice', 'slice'],
    ['cell_id', 'cell'],
  ] as const) {
    const text = electrodeText(electrode, from, hdf5);
    if (!nothingSaid.test(text)) add(key, text, from);
  }
  for (const [from, key, perMohm] of [
    ['resistance', 'pipette_mohm', 1],
    ['seal', 'seal_gohm', 1e-3],
    ['initial_access_resistance', 'access_mohm', 1],
  ] as const) {
    const text = electrodeText(electrode, from, hdf5);
    if (nothingSaid.test(text)) continue;
    const mohm = resistanceMohm(text);
    if (mohm === null) unclear(from, text, key, 'a resistance with its unit, such as "5 MOhm",');
    else add(key, Number((mohm * perMohm).toPrecision(12)), from);
  }
  const filtering = electrodeText(electrode, 'filtering', hdf5);
  if (!nothingSaid.test(filtering)) {
    const khz = filterKhz(filtering);
    if (khz !== null) {
      filters.set(name, khz);
      add('filter_khz', khz, 'filtering');
    } else if (/hz/i.test(filtering)) unclear('filtering', filtering, 'filter_khz', 'one low-pass corner');
  }
  return facts;
}

function publicationFacts({ file }: Hdf5): FileFact[] {
  const general = groupAt(file, '/general');
  const dataset = general && datasetAt(general, 'related_publications');
  if (!dataset) return [];
  let texts: string[] = [];
  try {
    texts = textColumn(dataset);
  } catch {
    return [];
  }
  const dois = new Set(texts.flatMap((text) => /10\.\d{4,9}\/[^\s"<>]+/.exec(text)?.[0] ?? []));
  return dois.size === 1 ? [{ key: 'doi', value: [...dois][0]!, place: '/general/related_publications' }] : [];
}

/**
 * @param electrodes names of the electrodes that sweeps were recorded with
 */
export function readFacts(hdf5: Hdf5, electrodes: readonly string[]): FileFacts {
  const problems: Problem[] = [];
  // A damaged fact costs that fact.
  const guarded = <Value>(place: string, read: () => Value, otherwise: Value): Value => {
    try {
      return read();
    } catch (error) {
      problems.push({ ...damaged(place, error).problem, weight: 'warns' });
      return otherwise;
    }
  };
  const session = guarded('/session_start_time', () => sessionFacts(hdf5), {
    session_start: null,
    facts: [],
    problems: [],
  });
  problems.push(...session.problems);
  const filter_khz = new Map<string, number>();
  const facts = [
    ...session.facts,
    ...guarded('/general/subject', () => subjectFacts(hdf5), []),
    ...publicationFacts(hdf5),
  ];
  const home = '/general/intracellular_ephys';
  for (const name of electrodes)
    if (name !== '')
      facts.push(
        ...guarded(
          `${home}/${name}`,
          () => electrodeFacts(name, hdf5, electrodes.length > 1, filter_khz, problems),
          [],
        ),
      );
  const general = groupAt(hdf5.file, home);
  const shared = guarded(`${home}/filtering`, () => general && filterKhz(textDataset(general, 'filtering')), null);
  if (shared !== null && filter_khz.size === 0) {
    facts.push({ key: 'filter_khz', value: shared, place: '/general/intracellular_ephys/filtering' });
    for (const name of electrodes) filter_khz.set(name, shared);
  }
  return { session_start: session.session_start, facts, problems, filter_khz };
}
