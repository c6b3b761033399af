/**
 * What each of the archive's YAML files may hold. Every message in a schema is the end of the sentence
 * "KEY must be …", so that complaints read alike; facts are checked by the registry of fact keys instead.
 */
import { z } from 'zod';
import { isCalendarDate, nearestOf, shippedClasses, wordList } from './fact-keys.ts';
import type { ArchiveProblem, Step, Tree } from './yaml-file.ts';
import { lineAt, nodeAt, plain, remark, without } from './yaml-file.ts';

const text = z
  .union([z.string(), z.number(), z.boolean()], { error: 'text' })
  .transform((value) => String(value).trim())
  .refine((value) => value !== '', { error: 'text that is not empty' });

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

const date = text.refine(isCalendarDate, { error: 'a day of the calendar written YYYY-MM-DD' });

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
    block({ label: text, like: oneOf(shippedClasses as unknown as readonly [string, ...string[]]) }),
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

const scalarOf = z.union([z.string(), z.number()], { error: 'a word or a number' });
const words = z.union([scalarOf.transform((one) => [one]), listOf(scalarOf, 'words')], {
  error: 'a word or a list of words',
});

/** The long form of one rule of a criteria set. */
export const ruleSchema = block({
  above: anyNumber.optional(),
  below: anyNumber.optional(),
  between: pair.optional(),
  any: words.optional(),
  not: words.optional(),
  missing: oneOf(['keep', 'drop', 'list']).optional(),
});

const column = z.union([z.number().int().min(1), z.string().min(1)], {
  error: 'a column: its number from 1 or its heading',
});
const columns = z.union([column.transform((one) => [one]), z.array(column).min(1)], {
  error: 'a list of columns, each by its number from 1 or its heading',
});

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
          pa: z
            .union([anyNumber.transform((one) => [one]), z.array(anyNumber).min(1)], {
              error: 'a list of numbers, one a sweep',
            })
            .optional(),
        }),
        block({ kind: z.literal('none') }),
      ],
      { error: 'a block with kind: step or kind: none' },
    )
    .superRefine((stimulus, context) => {
      if (stimulus.kind !== 'step') return;
      const stairs = stimulus.from_pa !== undefined && stimulus.by_pa !== undefined;
      const part = stimulus.from_pa !== undefined || stimulus.by_pa !== undefined;
      if (stimulus.pa === undefined ? !stairs : part)
        context.addIssue({
          code: 'custom',
          message: 'a step with its height: from_pa and by_pa, or pa: [one number a sweep]',
        });
      if (!(stimulus.end_s > stimulus.start_s))
        context.addIssue({ code: 'custom', path: ['end_s'], message: `later than start_s (${stimulus.start_s} s)` });
    })
    .optional(),
  clamp: oneOf(['current', 'voltage']).optional(),
  capacitance_pf: numberIn(0.05, 10_000_000, 'pF').optional(),
})
  .refine((table) => table.time === undefined || table.rate_hz === undefined, {
    error: 'read by time or by rate_hz, never both',
    path: ['rate_hz'],
  })
  .refine((table) => table.current === undefined || table.stimulus === undefined, {
    error: 'stated by current or by stimulus, never both',
    path: ['stimulus'],
  });

export const partsSchema = block({
  facts: z.unknown().optional(),
  conditions: z.unknown().optional(),
  table: z.unknown().optional(),
  cells: z.unknown().optional(),
  other: text.optional(),
});

/** `audience.name` for people. */
export const placeOf = (path: readonly Step[]): string => path.join('.');

export const shownValue = (node: Tree | undefined): string => {
  if (!node) return 'nothing';
  if (node.kind === 'map') return 'a block of keys';
  if (node.kind === 'list') return `a list of ${node.items.length}`;
  if (node.value === null) return 'nothing';
  const written = typeof node.value === 'string' ? JSON.stringify(node.value) : node.source;
  return written.length > 60 ? `${written.slice(0, 59)}…` : written;
};

const sentence = (tree: Tree, issue: z.core.$ZodIssue, path: Step[]): string => {
  const node = nodeAt(tree, path);
  const place = placeOf(path) || 'The file';
  if (node === undefined) return `${place} is missing; it must be ${issue.message}.`;
  const got = issue.code === 'custom' && node.kind !== 'scalar' ? '' : `, got ${shownValue(node)}`;
  const choices = /^one of (.+)$/.exec(issue.message)?.[1]?.split(' | ');
  const written = node.kind === 'scalar' ? String(node.value ?? '') : '';
  const known = choices ?? (/^a time zone/.test(issue.message) ? timezones() : []);
  const nearest = known.length > 0 && written !== '' ? `; the nearest is "${nearestOf(written, known)}"` : '';
  const expected = choices ? wordList(choices) : issue.message;
  return `${place} must be ${expected}${got}${nearest}.`;
};

/**
 * Holds a tree against a schema. Whatever fails is reported with its line and taken out, and the rest is held again:
 * an unknown key costs that key, a bad entry of a list that entry, a missing key the block that needs it.
 *
 * @returns the value, null when nothing of it stands; the tree without what was taken out, in step with the value
 */
export function hold<Schema extends z.ZodType>(
  file: string,
  whole: Tree,
  schema: Schema,
  prefix: readonly Step[] = [],
): { value: z.output<Schema> | null; tree: Tree; problems: ArchiveProblem[] } {
  const problems: ArchiveProblem[] = [];
  let tree = whole;
  for (;;) {
    const result = schema.safeParse(plain(tree));
    if (result.success) return { value: result.data, tree, problems };
    const removals: Step[][] = [];
    for (const issue of result.error.issues) {
      const path = issue.path.map((step) => (typeof step === 'number' ? step : String(step)));
      const at = (below: readonly Step[]): [number, string] => [lineAt(tree, below), placeOf([...prefix, ...below])];
      if (issue.code === 'unrecognized_keys') {
        for (const key of issue.keys) {
          const [line, place] = at([...path, key]);
          const nearest = nearestOf(key, issue.message.split('|'));
          const message = `"${key}" is not a key that belongs here; the nearest is "${nearest}".`;
          problems.push(
            remark(
              file,
              line,
              'KEY_UNKNOWN',
              place,
              message,
              'The key was not used. Correct its spelling or remove it.',
            ),
          );
          removals.push([...path, key]);
        }
        continue;
      }
      const [line, place] = at(path);
      const missing = nodeAt(tree, path) === undefined;
      const removal = missing ? path.slice(0, -1) : path;
      const remedy =
        removal.length === 0 && prefix.length === 0
          ? 'Nothing in this file was used. Correct it and build again.'
          : `${removal.length === path.length ? 'The value was' : 'The entry was'} not used. Correct it and build again.`;
      const message = sentence(tree, issue, path);
      problems.push(
        removal.length === 0
          ? { ...remark(file, line, 'VALUE_IMPOSSIBLE', place, message, remedy), weight: 'blocks' }
          : remark(file, line, 'VALUE_IMPOSSIBLE', place, message, remedy),
      );
      removals.push(removal);
    }
    if (removals.some((removal) => removal.length === 0)) return { value: null, tree, problems };
    // Later list entries first, so that the places of the earlier ones still hold.
    const unique = new Map(removals.map((removal) => [JSON.stringify(removal), removal]));
    const ordered = [...unique.values()].sort((a, b) => {
      const [last, other] = [a.at(-1)!, b.at(-1)!];
      if (a.length !== b.length) return b.length - a.length;
      return typeof last === 'number' && typeof other === 'number' ? other - last : 0;
    });
    for (const removal of ordered) tree = without(tree, removal);
  }
}
