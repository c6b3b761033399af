/** How far measured numbers lie from a known truth, and whether their 95 % half-widths are worth their name. */

/** One number measured on one recording whose truth is known. */
export interface Trial {
  /** Which family of recordings: 'spikes', 'subthreshold' … */
  family: string;
  quantity: string;
  /** The model or cell that was recorded. */
  subject: string;
  /** The conditions it was recorded under. */
  condition: string;
  seed: number;
  truth: number;
  /** Null: not measured, `why` says for what reason. */
  value: number | null;
  why?: string;
  u95: number | null;
}

export interface TrialOptions {
  /** Recordings of each subject under each condition, alike but for their noise. */
  seeds: number;
  /** A subset small enough for a test. */
  quick: boolean;
  /** Only this subject; all where left out. */
  subject?: string;
}

/** Whether the trials of a subject are asked for. */
export const isWanted = (options: TrialOptions, name: string): boolean =>
  options.subject === undefined || options.subject === name;

/** What a module of this folder exports that holds recordings for the bench. */
export interface Family {
  trials: (options: TrialOptions) => Trial[];
  /** Names of its subjects, for sharing the work; where left out it is done in one piece. */
  subjectNames?: () => string[];
}

export interface Score {
  trials: number;
  /** Trials with a value. */
  measured: number;
  /** Mean, standard deviation and largest size of value − truth; null without a value. */
  bias: number | null;
  spread: number | null;
  worst: Trial | null;
  /** 95th percentile of the error's size. */
  p95: number | null;
  /** Share of the values with a half-width whose interval holds the truth, and how many those are. */
  held: number | null;
  withWidth: number;
  /** Median half-width. */
  width: number | null;
}

export const errorOf = (trial: Trial): number => trial.value! - trial.truth;

/** Error in the unit it is limited in: the number's own, or a share of the truth. */
export type Measure = 'absolute' | 'relative';

export const sized = (trial: Trial, measure: Measure): number =>
  measure === 'relative' ? errorOf(trial) / Math.abs(trial.truth) : errorOf(trial);

export function score(trials: readonly Trial[], measure: Measure = 'absolute'): Score {
  const found = trials.filter((trial) => trial.value !== null);
  const errors = found.map((trial) => sized(trial, measure));
  const bias = errors.length === 0 ? null : errors.reduce((sum, error) => sum + error, 0) / errors.length;
  const spread =
    errors.length < 2
      ? null
      : Math.sqrt(errors.reduce((sum, error) => sum + (error - bias!) ** 2, 0) / (errors.length - 1));
  const sizes = errors.map(Math.abs).sort((a, b) => a - b);
  const withWidth = found.filter((trial) => trial.u95 !== null);
  const widths = withWidth.map((trial) => trial.u95!).sort((a, b) => a - b);
  // One part in 10⁹ for rounding where truth and value are the same number.
  const holds = (trial: Trial): boolean => Math.abs(errorOf(trial)) <= trial.u95! + 1e-9 * Math.abs(trial.truth);
  return {
    trials: trials.length,
    measured: found.length,
    bias,
    spread,
    worst:
      found.length === 0
        ? null
        : found.reduce((worst, one) => (Math.abs(sized(one, measure)) > Math.abs(sized(worst, measure)) ? one : worst)),
    p95: sizes.length === 0 ? null : sizes[Math.min(sizes.length - 1, Math.floor(0.95 * sizes.length))]!,
    held: withWidth.length === 0 ? null : withWidth.filter(holds).length / withWidth.length,
    withWidth: withWidth.length,
    width: widths.length === 0 ? null : widths[Math.floor(widths.length / 2)]!,
  };
}

/** What the project promises of a quantity under some conditions. */
export interface Limit {
  quantity: string;
  /** The conditions it speaks of, as the trials name them. */
  condition: RegExp;
  /** Where left out, every subject. */
  subject?: RegExp;
  /** Largest allowed error of any trial: absolute in the quantity's unit, or as a share of the truth. */
  within: number;
  measure: Measure;
  /** An error up to this, in the quantity's unit, is allowed all the same ('0.5 MΩ or 10 %'). */
  orWithin?: number;
  /** Share of the trials that must have a value; 1 where left out. */
  found?: number;
}

/** What is wrong with the trials by a limit, one sentence each; an empty list is what a test wants. */
export function broken(limit: Limit, trials: readonly Trial[]): string[] {
  const own = trials.filter(
    (trial) =>
      trial.quantity === limit.quantity &&
      limit.condition.test(trial.condition) &&
      (limit.subject?.test(trial.subject) ?? true),
  );
  if (own.length === 0) return [`${limit.quantity}: no trial under ${limit.condition}`];
  const found = own.filter((trial) => trial.value !== null);
  const complaints = found
    .filter(
      (trial) =>
        Math.abs(sized(trial, limit.measure)) > limit.within && Math.abs(errorOf(trial)) > (limit.orWithin ?? 0),
    )
    .map(
      (trial) =>
        `${limit.quantity} of ${trial.subject}, ${trial.condition}, seed ${trial.seed}: ${trial.value!.toPrecision(6)} for ${trial.truth.toPrecision(6)}`,
    );
  if (found.length < (limit.found ?? 1) * own.length)
    complaints.push(
      `${limit.quantity}: ${own.length - found.length} of ${own.length} not measured under ${limit.condition} (${own.find((trial) => trial.value === null)?.why})`,
    );
  return complaints;
}

/** Groups trials by a key, in order of appearance. */
export const by = (trials: readonly Trial[], key: (trial: Trial) => string): [string, Trial[]][] => [
  ...Map.groupBy(trials, key),
];
