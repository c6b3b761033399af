/**
 * What each of the archive's YAML files may hold. Every message in a schema is the end of the sentence
 * "KEY must be …", so that complaints read alike; facts are checked by the registry of fact keys instead.
 */
import { z } from 'zod';
import { isCalendarDate, nearestOf, shippedClasses, wordList } from './fact-keys.ts';
import type { ArchiveProblem, Step, Tree } from './yaml-file.ts';
import { lineAt, nodeAt, plain, remark, without } from './yaml-file.ts';

const textAs = (what: string) =>
  z
    .union([z.string(), z.number(), z.boolean()], { error: what })
    .transform((value) => String(value).trim())
    .refine((value) => value !== '', { error: what });
const text = textAs('a text');

const oneOf = <const Words extends readonly [string, ...string[]]>(words: Words) =>
  z.enum(words, { error: `one of ${words.join(' | ')}` });

const numberIn = (low: number, high: number, unit: string) => {
  const error = `a number from ${low} to ${high}${unit === '' ? '' : ` ${unit}`}`;
  return z.number({ error }).min(low, { error }).max(high, { error });
};

const anyNumber = z.number({ error: 'a number' }).refine(Number.isFinite, { error: 'a finite number' });

/** A block of exactly these keys. The message on an unknown key lists them for the complaint's nearest word. */
const block = <Shape extends z.core.$ZodLooseShape>(shape: Shape) =>
  z.strictObject(shape, {
    error: (issue) => (issue.code === 'unrecognized_keys' ? Object.keys(shape).join('|') : 'a block of keys'),
  });

const named = <Value extends z.core.SomeType>(value: Value) =>
  z.record(z.string(), value, { error: 'a block of keys' });
const listOf = <Item extends z.core.SomeType>(item: Item, what: string) =>
  z.array(item, { error: `a list of ${what}` });

const day = 'a day of the calendar written YYYY-MM-DD';
const date = textAs(day).refine(isCalendarDate, { error: day });

const isTimezone = (name: string): boolean => {
  try {
    new Intl.DateTimeFormat('en', { timeZone: name });
    return /^(UTC|[A-Za-z_]+\/[A-Za-z0-9_+\-/]+)$/.test(name);
  } catch {
    return false;
  }
};

/** Time zones this runtime knows, for the nearest one. */
const timezones = (): string[] => ['UTC', ...Intl.supportedValuesOf('timeZone')];

const pair = z
  .tuple([anyNumber, anyNumber], { error: 'two numbers, the lower one first' })
  .refine(([low, high]) => low <= high, { error: 'two numbers, the lower one first' });

const limit = block({ above: anyNumber.optional(), below: anyNumber.optional(), between: pair.optional() })
  .refine((rule) => rule.above !== undefined || rule.below !== undefined || rule.between !== undefined, {
    error: 'a limit: above, below or between',
  })
  .refine((rule) => rule.between === undefined || (rule.above === undefined && rule.below === undefined), {
    error: 'either between or above and below',
  })
  .refine((rule) => rule.above === undefined || rule.below === undefined || rule.above <= rule.below, {
    error: 'a limit that some number can meet: "above" must not be higher than "below"',
  });

export const almanacSchema = block({
  title: text.optional(),
  lab: text.optional(),
  timezone: text.refine(isTimezone, { error: 'a time zone such as Europe/Lisbon' }).optional(),
  mains_hz: numberIn(45, 65, 'Hz').optional(),
  rigs: named(text).optional(),
  people: named(text).optional(),
  classes: named(
    block({
      label: text,
      like: z.enum(shippedClasses as unknown as [string, ...string[]], { error: 'a class that comes with the tool' }),
    }),
  ).optional(),
  limits: named(limit).optional(),
  audiences: named(z.unknown()).optional(),
  defaults: z.unknown().optional(),
});

export const recipeSchema = block({
  name: text.optional(),
  alias: z
    .union([text.transform((one) => [one]), listOf(text, 'names')], { error: 'a name or a list of names' })
    .optional(),
  role: oneOf(['pipette', 'bath']),
  ph: numberIn(0, 14, '').optional(),
  titrant: text.optional(),
  gas: text.optional(),
  osmolality_mosm: numberIn(1, 5000, 'mOsm/kg').optional(),
  millimolar: named(numberIn(0, 10_000, 'mM')),
});

export const decisionsSchema = listOf(
  block({ cell: text, decision: oneOf(['include', 'exclude', 'apply']), by: text, date, why: text }),
  'decisions, each beginning with "-"',
);

export const eventsSchema = listOf(
  block({ date, text, rig: text.optional(), kind: text.optional() }),
  'events, each beginning with "-"',
);

export const criteriaSchema = block({
  title: text.optional(),
  select: named(z.unknown()).optional(),
  require: named(z.unknown()).optional(),
});

/** One thing or a list of at least one of them, always given as a list. */
const someOf = <Item extends z.ZodType>(item: Item, error: string) =>
  z
    .union([item, z.array(item, { error })], { error })
    .transform((value): z.output<Item>[] => (Array.isArray(value) ? value : [value as z.output<Item>]))
    .refine((list) => list.length > 0, { error });

const scalarOf = z.union([z.string(), z.number()], { error: 'a word or a number' });
const words = someOf(scalarOf, 'a word or a list of words');

/** The long form of one rule of a criteria set. */
export const ruleSchema = block({
  above: anyNumber.optional(),
  below: anyNumber.optional(),
  between: pair.optional(),
  any: words.optional(),
  not: words.optional(),
  missing: oneOf(['keep', 'drop', 'list']).optional(),
});

const oneColumn = 'a column: its number from 1 or its heading';
const column = z
  .union([z.number(), z.string()], { error: oneColumn })
  .refine((value) => (typeof value === 'number' ? Number.isInteger(value) && value >= 1 : value.trim() !== ''), {
    error: oneColumn,
  });

const columns = someOf(column, 'a list of columns, each by its number from 1 or its heading');

export const tableSchema = block({
  skip_lines: z
    .number({ error: 'a whole number from 0' })
    .int({ error: 'a whole number from 0' })
    .min(0, { error: 'a whole number from 0' })
    .optional(),
  header: z.boolean({ error: 'true or false' }).optional(),
  separator: oneOf(['auto', ',', ';', 'tab', 'space']).optional(),
  decimal: oneOf(['point', 'comma']).optional(),
  sweeps: oneOf(['columns', 'rows', 'one']).optional(),
  time: block({ column, unit: oneOf(['s', 'ms', 'us']), offset: anyNumber.optional() }).optional(),
  rate_hz: numberIn(1, 20_000_000, 'Hz').optional(),
  voltage: block({ columns, unit: oneOf(['V', 'mV', 'uV']) }).optional(),
  current: block({ columns, unit: oneOf(['A', 'mA', 'uA', 'nA', 'pA', 'pA/pF']) }).optional(),
  stimulus: z
    .discriminatedUnion(
      'kind',
      [
        block({
          kind: z.literal('step'),
          start_s: numberIn(0, 1e6, 's'),
          end_s: numberIn(0, 1e6, 's'),
          from_pa: anyNumber.optional(),
          by_pa: anyNumber.optional(),
          pa: someOf(anyNumber, 'a list of numbers, one a sweep').optional(),
        }),
        block({
          kind: z.literal('levels'),
          at_s: someOf(numberIn(-1e6, 1e6, 's'), 'a list of times in s, from which on each level holds'),
          mv: someOf(anyNumber, 'a list of command potentials in mV, one for each time'),
        }),
        block({ kind: z.literal('none') }),
      ],
      { error: 'a block with kind: step, kind: levels or kind: none' },
    )
    .superRefine((stimulus, context) => {
      if (stimulus.kind === 'levels') {
        if (stimulus.at_s.length !== stimulus.mv.length)
          context.addIssue({
            code: 'custom',
            path: ['mv'],
            message: `As many potentials as times: ${stimulus.at_s.length} times and ${stimulus.mv.length} potentials are listed`,
          });
        if (stimulus.at_s.some((time, k) => k > 0 && !(time > stimulus.at_s[k - 1]!)))
          context.addIssue({ code: 'custom', path: ['at_s'], message: 'Times in ascending order' });
      }
      if (stimulus.kind !== 'step') return;
      const stairs = stimulus.from_pa !== undefined && stimulus.by_pa !== undefined;
      const part = stimulus.from_pa !== undefined || stimulus.by_pa !== undefined;
      if (stimulus.pa === undefined ? !stairs : part)
        context.addIssue({
          code: 'custom',
          message: 'State the height of the step: from_pa and by_pa, or pa: [one number a sweep]',
        });
      if (!(stimulus.end_s > stimulus.start_s))
        context.addIssue({ code: 'custom', path: ['end_s'], message: `later than start_s (${stimulus.start_s} s)` });
    })
    .optional(),
  clamp: oneOf(['current', 'voltage']).optional(),
  capacitance_pf: numberIn(0.05, 10_000_000, 'pF').optional(),
})
  .refine((table) => table.time === undefined || table.rate_hz === undefined, {
    error: 'State time or rate_hz, never both',
    path: ['rate_hz'],
  })
  .refine((table) => table.current === undefined || table.stimulus === undefined || table.stimulus.kind === 'levels', {
    error: 'State current or stimulus, never both',
    path: ['stimulus'],
  })
  .refine((table) => table.voltage === undefined || table.stimulus?.kind !== 'levels', {
    error: 'State voltage or the levels of the command, never both',
    path: ['stimulus'],
  });

export const partsSchema = block({
  facts: z.unknown().optional(),
  conditions: z.unknown().optional(),
  table: z.unknown().optional(),
  cells: z.unknown().optional(),
  other: text.optional(),
});

/** A place inside a file for people: `limits.peak_mv.below`, `entry 3: date`. */
export function placeOf(path: readonly Step[]): string {
  const [first, ...rest] = path;
  if (typeof first !== 'number') return path.join('.');
  return rest.length === 0 ? `entry ${first + 1}` : `entry ${first + 1}: ${rest.join('.')}`;
}

export const shownValue = (node: Tree | undefined): string => {
  if (!node) return 'nothing';
  if (node.kind === 'map') return 'a block of keys';
  if (node.kind === 'list') return `a list of ${node.items.length}`;
  if (node.value === null) return 'nothing';
  const written = typeof node.value === 'string' ? JSON.stringify(node.value) : node.source;
  return written.length > 60 ? `${written.slice(0, 59)}…` : written;
};

const knownTo = (message: string): readonly string[] => {
  if (message.startsWith('a time zone')) return timezones();
  if (message.startsWith('a class that')) return shippedClasses;
  return /^one of (.+)$/.exec(message)?.[1]?.split(' | ') ?? [];
};

function sentence(tree: Tree, issue: z.core.$ZodIssue, path: readonly Step[], prefix: readonly Step[]): string {
  const node = nodeAt(tree, path);
  const where = placeOf([...prefix, ...path]);
  const place = where === '' ? 'The file' : where;
  // A message that begins with a capital is about several keys at once and a sentence of its own.
  if (/^[A-Z]/.test(issue.message)) return `${place}: ${issue.message}.`;
  const known = knownTo(issue.message);
  const expected = issue.message.startsWith('one of ') ? wordList(known) : issue.message;
  if (node === undefined) return `${place} is missing; it must be ${expected}.`;
  const got = issue.code === 'custom' && node.kind !== 'scalar' ? '' : `, got ${shownValue(node)}`;
  const written = node.kind === 'scalar' ? String(node.value ?? '') : '';
  const nearest = known.length > 0 && written !== '' ? `; the nearest is "${nearestOf(written, known)}"` : '';
  return `${place} must be ${expected}${got}${nearest}.`;
}

/** What a complaint costs, in words. */
const costs = {
  key: 'The key was not used. Correct its spelling or remove it.',
  value: 'The value was not used. Correct it and build again.',
  entry: 'The entry was not used. Correct it and build again.',
  file: 'Nothing in this file was used. Correct it and build again.',
} as const;

/** Block and key that a complaint was about, so that what follows from taking it out is not told a second time. */
const owner = (tree: Tree, path: readonly Step[]): string => {
  const parent = nodeAt(tree, path.slice(0, -1));
  return parent && parent.kind !== 'scalar' ? `${parent.id}/${path.at(-1)}` : '';
};

/**
 * Holds a tree against a schema. Whatever fails is reported with its line and taken out, and the rest is held again:
 * an unknown key costs that key, a bad entry of a list that entry, a missing key the block that needs it.
 *
 * @param prefix where the tree stands in its file
 * @returns the value, null when nothing of it stands; the tree without what was taken out, in step with the value
 */
export function hold<Schema extends z.ZodType>(
  file: string,
  whole: Tree,
  schema: Schema,
  prefix: readonly Step[] = [],
): { value: z.output<Schema> | null; tree: Tree; problems: ArchiveProblem[] } {
  const problems: ArchiveProblem[] = [];
  const told = new Map<string, ArchiveProblem[]>();
  let tree = whole;
  for (;;) {
    const result = schema.safeParse(plain(tree));
    if (result.success) return { value: result.data, tree, problems };
    const removals: Step[][] = [];
    for (const issue of result.error.issues) {
      const path = issue.path.map((step) => (typeof step === 'number' ? step : String(step)));
      if (issue.code === 'unrecognized_keys') {
        for (const key of issue.keys) {
          const place = [...path, key];
          const message = `"${key}" is not a key that belongs here; the nearest is "${nearestOf(key, issue.message.split('|'))}".`;
          tell(
            remark(file, lineAt(tree, place), 'KEY_UNKNOWN', placeOf([...prefix, ...place]), message, costs.key),
            place,
          );
          removals.push(place);
        }
        continue;
      }
      const node = nodeAt(tree, path);
      if (typeof path.at(-1) === 'string' && node?.kind === 'scalar' && node.value === null) {
        // A key with nothing behind it says nothing; where something is needed, the next round says it is missing.
        removals.push(path);
        continue;
      }
      const removal = node === undefined ? path.slice(0, -1) : path;
      const cost =
        removal.length === 0 ? (prefix.length === 0 ? 'file' : 'entry') : node === undefined ? 'entry' : 'value';
      const causes =
        node === undefined ? told.get(owner(tree, path)) : node.kind !== 'scalar' ? told.get(`${node.id}`) : undefined;
      if (causes) {
        for (const cause of causes) raise(cause, cost === 'value' ? 'entry' : cost);
        note(causes, path);
      } else {
        const place = placeOf([...prefix, ...path]);
        const problem = remark(
          file,
          lineAt(tree, path),
          'VALUE_IMPOSSIBLE',
          place,
          sentence(tree, issue, path, prefix),
          '',
        );
        raise(problem, cost);
        tell(problem, path);
      }
      removals.push(removal);
    }
    if (removals.some((removal) => removal.length === 0)) return { value: null, tree, problems };
    const before = tree;
    for (const removal of inSafeOrder(removals)) tree = without(tree, removal);
    // Nothing could be taken out, so another round would say the same again.
    if (tree === before) return { value: null, tree, problems };
  }

  function tell(problem: ArchiveProblem, path: readonly Step[]): void {
    problems.push(problem);
    note([problem], path);
  }

  function note(causes: readonly ArchiveProblem[], path: readonly Step[]): void {
    const parent = nodeAt(tree, path.slice(0, -1));
    const block = parent && parent.kind !== 'scalar' ? `${parent.id}` : '';
    for (const key of [owner(tree, path), block]) told.set(key, [...(told.get(key) ?? []), ...causes]);
  }
}

function raise(problem: ArchiveProblem, cost: keyof typeof costs): void {
  problem.remedy = costs[cost];
  if (cost === 'file') problem.weight = 'blocks';
}

/** Each once, deeper ones first and later entries of a list first, so that the places of the others still hold. */
function inSafeOrder(removals: readonly Step[][]): Step[][] {
  const unique = [...new Map(removals.map((removal) => [JSON.stringify(removal), removal])).values()];
  return unique.sort((a, b) => {
    const [last, other] = [a.at(-1)!, b.at(-1)!];
    if (a.length !== b.length) return b.length - a.length;
    return typeof last === 'number' && typeof other === 'number' ? other - last : 0;
  });
}
