/** The archive's own files but folder.yaml and sidecars: almanac.yaml, recipes, decisions, events, criteria sets. */
import { isQuantity, quantities } from '../measure/quantities.ts';
import { checkCellReference, checkFact, factKey, factKeys, nearestOf, wordList } from './fact-keys.ts';
import {
  almanacSchema,
  criteriaSchema,
  decisionsSchema,
  eventsSchema,
  hold,
  recipeSchema,
  ruleSchema,
  shownValue,
} from './schemas.ts';
import { readFacts } from './statements.ts';
import type {
  ArchiveEvent,
  CriteriaSet,
  CriterionRule,
  Decision,
  PolicyLimit,
  Recipe,
  Settings,
  Statement,
} from './types.ts';
import { type ArchiveProblem, lineAt, nodeAt, readYaml, remark, type Tree } from './yaml-file.ts';

const quantityIds = quantities.map((entry) => entry.id);
const emptyMap = (line = 1): Tree => ({ kind: 'map', id: 0, line, entries: new Map() });

export const bareSettings = (title: string): Settings => ({
  title,
  lab: '',
  timezone: null,
  mains_hz: null,
  rigs: {},
  people: {},
  classes: {},
  limits: [],
  audiences: {},
});

/** almanac.yaml: settings, and the facts of `defaults`. */
export function readAlmanac(
  path: string,
  bytes: Uint8Array,
  fallbackTitle: string,
): { settings: Settings; defaults: Statement[]; problems: ArchiveProblem[] } {
  const bare = bareSettings(fallbackTitle);
  const { tree, problems } = readYaml(path, bytes);
  if (!tree) return { settings: bare, defaults: [], problems };
  const held = hold(path, tree, almanacSchema);
  problems.push(...held.problems);
  if (!held.value) return { settings: bare, defaults: [], problems };
  const { value } = held;
  const limits: PolicyLimit[] = [];
  for (const [quantity, rule] of Object.entries(value.limits ?? {})) {
    const line = lineAt(held.tree, ['limits', quantity]);
    if (!isQuantity(quantity)) {
      const message = `"${quantity}" is not a quantity; the nearest is "${nearestOf(quantity, quantityIds)}".`;
      problems.push(
        remark(
          path,
          line,
          'QUANTITY_UNKNOWN',
          `limits.${quantity}`,
          message,
          'The limit was not used. Correct the id; the methods page lists them all.',
        ),
      );
      continue;
    }
    limits.push({
      quantity,
      above: rule.above ?? rule.between?.[0] ?? null,
      below: rule.below ?? rule.between?.[1] ?? null,
      line,
    });
  }
  const defaults = readFacts(path, 'defaults', nodeAt(held.tree, ['defaults']), ['defaults'], {
    cell: 'it would make all recordings one cell',
  });
  problems.push(...defaults.problems);
  const settings: Settings = {
    title: value.title ?? fallbackTitle,
    lab: value.lab ?? '',
    timezone: value.timezone ?? null,
    mains_hz: value.mains_hz ?? null,
    rigs: { ...value.rigs },
    people: { ...value.people },
    classes: { ...value.classes },
    limits,
    audiences: { ...value.audiences },
  };
  return { settings, defaults: defaults.statements, problems };
}

/** One recipe of solutions/. @param id the file's name without its ending */
export function readRecipe(
  path: string,
  id: string,
  bytes: Uint8Array,
): { recipe: Recipe | null; problems: ArchiveProblem[] } {
  const { tree, problems } = readYaml(path, bytes);
  if (!tree) {
    if (problems.length === 0)
      problems.push(
        remark(
          path,
          null,
          'RECIPE_EMPTY',
          '',
          'The recipe is empty.',
          'State its role and millimolar, or remove the file.',
        ),
      );
    return { recipe: null, problems };
  }
  const held = hold(path, tree, recipeSchema);
  if (held.problems.length > 0 || !held.value) {
    // A recipe without one of its salts gives potentials that are wrong by tens of mV: all of it or none.
    const remedy = 'The recipe was not used, since a part of it would mislead. Correct it and build again.';
    problems.push(...held.problems.map((one) => ({ ...one, weight: 'blocks' as const, remedy })));
    return { recipe: null, problems };
  }
  const { name, alias, role, ph, titrant, gas, osmolality_mosm, millimolar } = held.value;
  return {
    recipe: {
      id,
      path,
      name: name ?? id,
      ...(alias ? { aliases: alias } : {}),
      role,
      ph: ph ?? null,
      titrant: titrant ?? null,
      gas: gas ?? 'none',
      osmolality_mosm: osmolality_mosm ?? null,
      millimolar: { ...millimolar },
    },
    problems,
  };
}

/** The spelling of a scalar in the file, so that an id 007 stays 007. */
const spelled = (tree: Tree, path: (string | number)[]): string => {
  const node = nodeAt(tree, path);
  return node?.kind === 'scalar' ? (typeof node.value === 'string' ? node.value : node.source).trim() : '';
};

/** The same for an entry of a list, or for the one word that stands in its place. */
const spelledIn = (tree: Tree, key: string, index: number): string =>
  nodeAt(tree, [key])?.kind === 'list' ? spelled(tree, [key, index]) : spelled(tree, [key]);

/** decisions.yaml. Ids of cells that were kept apart (`id~2`) are allowed. */
export function readDecisions(path: string, bytes: Uint8Array): { decisions: Decision[]; problems: ArchiveProblem[] } {
  const { tree, problems } = readYaml(path, bytes);
  if (!tree) return { decisions: [], problems };
  const held = hold(path, tree, decisionsSchema);
  problems.push(...held.problems);
  const decisions: Decision[] = [];
  for (const [index, entry] of (held.value ?? []).entries()) {
    const line = lineAt(held.tree, [index]);
    const written = spelled(held.tree, [index, 'cell']);
    const id = checkCellReference(written);
    if (!id.ok) {
      problems.push(
        remark(
          path,
          line,
          'VALUE_IMPOSSIBLE',
          `entry ${index + 1}: cell`,
          `${id.message}.`,
          'The decision was not used. Correct the id of the cell.',
        ),
      );
      continue;
    }
    decisions.push({ ...entry, cell: String(id.value), by: spelled(held.tree, [index, 'by']), line });
  }
  return { decisions, problems };
}

/** events.yaml, in the order in which they stand. */
export function readEvents(path: string, bytes: Uint8Array): { events: ArchiveEvent[]; problems: ArchiveProblem[] } {
  const { tree, problems } = readYaml(path, bytes);
  if (!tree) return { events: [], problems };
  const held = hold(path, tree, eventsSchema);
  problems.push(...held.problems);
  const events = (held.value ?? []).map((entry, index) => ({
    date: entry.date,
    text: entry.text,
    rig: entry.rig === undefined ? null : spelled(held.tree, [index, 'rig']),
    kind: entry.kind ?? null,
    line: lineAt(held.tree, [index]),
  }));
  return { events, problems };
}

/** What a rule may be about besides facts and quantities. */
const standings = ['sound', 'caution', 'unsound', 'unread'] as const;
const otherKeys = ['standing', 'condition'];

/**
 * One criteria set. Short forms are written out: a word or a list of words becomes `{ any: [...] }`. A rule without
 * `missing` has `list`: whatever lacks the number is listed, neither kept nor dropped unseen.
 */
export function readCriteria(
  path: string,
  id: string,
  bytes: Uint8Array,
): { criteria: CriteriaSet | null; problems: ArchiveProblem[] } {
  const { tree, problems } = readYaml(path, bytes);
  if (!tree) return { criteria: null, problems };
  const held = hold(path, tree, criteriaSchema);
  problems.push(...held.problems);
  if (!held.value) return { criteria: null, problems };
  const rulesOf = (part: 'select' | 'require'): CriterionRule[] => {
    const node = nodeAt(held.tree, [part]);
    return node?.kind === 'map'
      ? [...node.entries].flatMap(([key, entry]) => readRule(path, part, key, entry, problems) ?? [])
      : [];
  };
  return {
    criteria: { id, path, title: held.value.title ?? id, select: rulesOf('select'), require: rulesOf('require') },
    problems,
  };
}

const ruleLost = 'The rule was not used, so the set lets through more than it says. Correct it.';

function readRule(
  path: string,
  part: string,
  key: string,
  entry: { line: number; node: Tree },
  problems: ArchiveProblem[],
): CriterionRule | null {
  const { line, node } = entry;
  const place = `${part}.${key}`;
  const say = (code: string, message: string): null => {
    problems.push(remark(path, line, code, place, message, ruleLost));
    return null;
  };
  if (!factKey(key) && !isQuantity(key) && !otherKeys.includes(key)) {
    const nearest = nearestOf(key, [...otherKeys, ...factKeys.map((known) => known.key), ...quantityIds]);
    return say('CRITERION_UNKNOWN', `"${key}" is neither a quantity nor a fact; the nearest is "${nearest}".`);
  }
  if (node.kind === 'scalar' && node.value === null) return say('VALUE_IMPOSSIBLE', `${place} says nothing.`);
  const long: Tree =
    node.kind === 'map' ? node : ({ ...emptyMap(line), entries: new Map([['any', { line, node }]]) } as Tree);
  const held = hold(path, long, ruleSchema, [part, key]);
  const { missing = 'list', ...rule } = held.value ?? {};
  // Facts that are text are compared as they are spelled: 007 is no number.
  if (factKey(key)?.kind === 'text')
    for (const part of ['any', 'not'] as const)
      if (rule[part]) rule[part] = rule[part].map((_, index) => spelledIn(held.tree, part, index));
  const lost = Object.keys(rule).length === 0;
  problems.push(
    ...held.problems.map((one) => ({ ...one, remedy: lost ? ruleLost : `${one.remedy} The rest of the rule holds.` })),
  );
  if (lost) {
    if (held.problems.length === 0)
      say('VALUE_IMPOSSIBLE', `${place} must say above, below, between, any or not, got ${shownValue(node)}.`);
    return null;
  }
  const named = [...(rule.any ?? []), ...(rule.not ?? [])];
  if (key === 'standing') {
    const wrong = named.find((word) => !standings.some((standing) => standing === word));
    if (wrong !== undefined)
      return say(
        'VALUE_IMPOSSIBLE',
        `A standing is ${wordList(standings)}, got "${wrong}"; the nearest is "${nearestOf(String(wrong), standings)}".`,
      );
  } else if (factKey(key) && factKey(key)!.kind !== 'text') {
    for (const word of named) {
      const checked = checkFact(key, word);
      if (!checked.ok) return say('VALUE_IMPOSSIBLE', `${checked.message}.`);
    }
  }
  return { key, rule, missing, line };
}
