/** Finds the stimulus of a response where no table of recordings says it. */
import type { Series } from './nwb-series.ts';

/** Words that tell a stimulus from a response, or the kind of a series, and nothing about which sweep it is. */
const roleWords = new Set(
  (
    'acquisition acq recording rec response resp stimulus stim presentation series timeseries current voltage clamp ' +
    'izero cc vc ic command cmd ccs vcs ccss vcss ad da adc dac data input output in out trace'
  ).split(' '),
);

/** What is left of a series' name without words for its role: 'data_00004_AD0' and 'data_00004_DA0' are one. */
export function sweepToken(name: string): string {
  const words = name
    .replace(/([a-z])([A-Z])/g, '$1 $2')
    .replace(/([A-Za-z])(\d)/g, '$1 $2')
    .replace(/(\d)([A-Za-z])/g, '$1 $2')
    .toLowerCase()
    .split(/[^a-z0-9]+/)
    .filter((word) => word !== '' && !roleWords.has(word));
  return words.map((word) => (/^\d+$/.test(word) ? String(Number(word)) : word)).join(' ');
}

export type Match = { stimulus: Series; by: 'sweep number' | 'name' | 'only pair' } | { candidates: Series[] } | null;

/** Series by what they can be found by, so that a file of thousands is gone through once. */
export interface StimulusIndex {
  all: readonly Series[];
  byNumber: Map<number, Series[]>;
  byName: Map<string, Series[]>;
  byToken: Map<string, Series[]>;
  /** Sweep number of a series, from the sweep table or its own attribute. */
  numberOf: (series: Series) => number | null;
}

function grouped<Key>(stimuli: readonly Series[], keyOf: (series: Series) => Key | null): Map<Key, Series[]> {
  const groups = new Map<Key, Series[]>();
  for (const stimulus of stimuli) {
    const key = keyOf(stimulus);
    if (key === null) continue;
    const group = groups.get(key);
    if (group) group.push(stimulus);
    else groups.set(key, [stimulus]);
  }
  return groups;
}

export const indexStimuli = (
  stimuli: readonly Series[],
  numberOf: (series: Series) => number | null,
): StimulusIndex => ({
  all: stimuli,
  byNumber: grouped(stimuli, numberOf),
  byName: grouped(stimuli, ({ name }) => name),
  byToken: grouped(stimuli, ({ name }) => sweepToken(name) || null),
  numberOf,
});

/** Narrows several candidates by the electrode they name, then by the name. */
function narrow(response: Series, candidates: readonly Series[]): Series[] {
  const token = sweepToken(response.name);
  const steps: ((candidate: Series) => boolean)[] = [
    (candidate) => candidate.electrode !== '' && candidate.electrode === response.electrode,
    (candidate) => candidate.name === response.name,
    (candidate) => sweepToken(candidate.name) === token,
  ];
  let left = [...candidates];
  for (const step of steps) {
    if (left.length < 2) break;
    const kept = left.filter(step);
    if (kept.length > 0) left = kept;
  }
  return left;
}

/**
 * @param alone whether this is the only response of its file
 * @returns a match and how it was found; the candidates where several fit; null where none does
 */
export function matchStimulus(response: Series, index: StimulusIndex, alone: boolean): Match {
  const sweep = index.numberOf(response);
  const own = (stimuli: readonly Series[] | undefined): Series[] =>
    (stimuli ?? []).filter(
      ({ electrode }) => electrode === '' || response.electrode === '' || electrode === response.electrode,
    );
  if (sweep !== null) {
    const left = narrow(response, own(index.byNumber.get(sweep)));
    if (left.length === 1) return { stimulus: left[0]!, by: 'sweep number' };
    if (left.length > 1) return { candidates: left };
  }
  // A stimulus that carries another sweep's number is not this one's, whatever it is called.
  const free = (stimuli: readonly Series[] | undefined): Series[] =>
    own(stimuli).filter((stimulus) => sweep === null || index.numberOf(stimulus) === null);
  const exact = free(index.byName.get(response.name));
  if (exact.length === 1) return { stimulus: exact[0]!, by: 'name' };
  const token = sweepToken(response.name);
  const left = token === '' ? [] : narrow(response, free(index.byToken.get(token)));
  if (left.length === 1) return { stimulus: left[0]!, by: 'name' };
  if (left.length > 1) return { candidates: left };
  if (alone && index.all.length === 1) {
    const [only] = free(index.all);
    if (only) return { stimulus: only, by: 'only pair' };
  }
  return null;
}
