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

/** Narrows several candidates by the electrode they name, then by the name. */
function narrow(response: Series, candidates: readonly Series[]): Series[] {
  const steps: ((candidate: Series) => boolean)[] = [
    (candidate) => candidate.electrode !== '' && candidate.electrode === response.electrode,
    (candidate) => candidate.name === response.name,
    (candidate) => sweepToken(candidate.name) === sweepToken(response.name),
  ];
  let left = [...candidates];
  for (const step of steps) {
    const kept = left.filter(step);
    if (kept.length > 0) left = kept;
    if (left.length === 1) break;
  }
  return left;
}

/**
 * @param numberOf sweep number of a series, from the sweep table or its own attribute
 * @returns a match and how it was found; the candidates where several fit; null where none does
 */
export function matchStimulus(
  response: Series,
  stimuli: readonly Series[],
  responses: readonly Series[],
  numberOf: (series: Series) => number | null,
): Match {
  const sweep = numberOf(response);
  const foreign = (stimulus: Series): boolean =>
    stimulus.electrode !== '' && response.electrode !== '' && stimulus.electrode !== response.electrode;
  const own = stimuli.filter((stimulus) => !foreign(stimulus));
  if (sweep !== null) {
    const left = narrow(
      response,
      own.filter((stimulus) => numberOf(stimulus) === sweep),
    );
    if (left.length === 1) return { stimulus: left[0]!, by: 'sweep number' };
    if (left.length > 1) return { candidates: left };
  }
  // A stimulus that carries another sweep's number is not this one's, whatever it is called.
  const unclaimed = own.filter((stimulus) => sweep === null || numberOf(stimulus) === null);
  const exact = unclaimed.filter((stimulus) => stimulus.name === response.name);
  if (exact.length === 1) return { stimulus: exact[0]!, by: 'name' };
  const token = sweepToken(response.name);
  if (token !== '') {
    const left = narrow(
      response,
      unclaimed.filter((stimulus) => sweepToken(stimulus.name) === token),
    );
    if (left.length === 1) return { stimulus: left[0]!, by: 'name' };
    if (left.length > 1) return { candidates: left };
  }
  if (stimuli.length === 1 && responses.length === 1 && own.length === 1 && unclaimed.length === 1)
    return { stimulus: own[0]!, by: 'only pair' };
  return null;
}
