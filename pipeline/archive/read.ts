/** Reads what an archive folder says before any recording is opened. Writes nothing, ever. */
import { closeSync, openSync, readFileSync, readSync, realpathSync, statSync } from 'node:fs';
import path from 'node:path';
import type { FormatId, Problem, ReadingHints, TableMapping } from '../formats/types.ts';
import { bareSettings, readAlmanac, readCriteria, readDecisions, readEvents, readRecipe } from './almanac.ts';
import { endingOf, natureOf, notOpen, reasonByName, recordingEndings, strayHdf5 } from './endings.ts';
import { factKey, nearestOf, shippedClasses } from './fact-keys.ts';
import { type FactsTable, readFactsTable } from './facts-table.ts';
import { derivedIds, stemOf } from './ids.ts';
import { hold, partsSchema, tableSchema } from './schemas.ts';
import { recipeFor, sharedNames } from './solutions.ts';
import { readConditions, readFacts } from './statements.ts';
import type { Archive, ConditionStatement, FoundFile, Recipe, Settings, Statement } from './types.ts';
import { byText, type Disk, type Met, nodeDisk, walk } from './walk.ts';
import { type ArchiveProblem, loss, nodeAt, readYaml, remark, type Tree } from './yaml-file.ts';

export { recordingEndings } from './endings.ts';

/** What one folder.yaml or sidecar says. */
interface Parts {
  path: string;
  statements: Statement[];
  conditions: ConditionStatement[];
  table: TableMapping | null;
  /** Why a table that stands there cannot be used, null where none stands or it can. */
  tableLost: ArchiveProblem | null;
  /** Whether a table stands there at all, usable or not. */
  tableStated: boolean;
  electrodes: Record<string, Statement[]>;
  /** Why the file or folder holds no recording, '' where nobody says so. */
  other: string;
}

const ownNames = ['almanac.yaml', 'decisions.yaml', 'events.yaml', 'facts.csv', 'folder.yaml'];
const ownFolders = ['solutions', 'criteria', 'notes'];

/**
 * Reads an archive folder: its own files, and what recordings and other files lie in it.
 *
 * A bad file of its own costs that file only, a bad line that line only: each is among `problems` with path and line.
 *
 * @throws Error with a sentence for people when the folder is not there or is no folder
 */
export function readArchive(root: string, disk: Disk = nodeDisk): Archive {
  const folder = openFolder(root);
  const { met, unlisted } = walk(folder, disk);
  const problems: ArchiveProblem[] = unlisted.map((one) =>
    loss(
      one.path,
      null,
      'FOLDER_UNREADABLE',
      `It could not be listed (${one.message}); what lies in it is missing here.`,
      'Check the permission to read it, and build again.',
    ),
  );
  const sorted = sortOut(met);
  problems.push(...sorted.problems);

  const bytesOf = (below: string): Uint8Array | null => {
    try {
      return readFileSync(path.join(folder, below));
    } catch (error) {
      problems.push(
        loss(
          below,
          null,
          'FILE_UNREADABLE',
          `It could not be read (${(error as Error).message}).`,
          'Check the permission to read it, and build again.',
        ),
      );
      return null;
    }
  };
  /** Reads one of the archive's own files where it is there and can be read. */
  const withFile = <Result extends { problems: ArchiveProblem[] }>(
    below: string,
    read: (bytes: Uint8Array) => Result,
  ): Result | null => {
    if (!sorted.own.has(below)) return null;
    const bytes = bytesOf(below);
    if (!bytes) return null;
    const result = read(bytes);
    problems.push(...result.problems);
    return result;
  };

  const title = path.basename(folder);
  const almanac = withFile('almanac.yaml', (bytes) => readAlmanac('almanac.yaml', bytes, title));
  const settings = almanac?.settings ?? bareSettings(title);
  const recipes = sorted.recipes.flatMap(
    (below) => withFile(below, (bytes) => readRecipe(below, stemOf(below), bytes))?.recipe ?? [],
  );
  for (const { name, ids } of sharedNames(recipes))
    problems.push(
      remark(
        recipes.find((recipe) => recipe.id === ids[1])!.path,
        null,
        'RECIPE_NAME_TWICE',
        '',
        `The recipes ${ids[0]} and ${ids[1]} both answer to "${name}".`,
        'The first is used under that name. Rename one of them.',
      ),
    );
  const criteria = sorted.criteria.flatMap(
    (below) => withFile(below, (bytes) => readCriteria(below, stemOf(below), bytes))?.criteria ?? [],
  );
  const decisions = withFile('decisions.yaml', (bytes) => readDecisions('decisions.yaml', bytes))?.decisions ?? [];
  const events = withFile('events.yaml', (bytes) => readEvents('events.yaml', bytes))?.events ?? [];
  const sheet = withFile('facts.csv', (bytes) => readFactsTable('facts.csv', bytes));

  const parts = new Map<string, Parts>();
  const paths = new Set(sorted.data.map((one) => one.path));
  for (const below of [...sorted.folders, ...sorted.sidecars.filter((one) => paths.has(dataOf(one)))]) {
    const one = withFile(below, (bytes) => readParts(below, bytes));
    if (one) parts.set(below, one.parts);
  }
  const files = sorted.data.map((one) => foundFile(folder, one, parts, almanac?.defaults ?? []));
  problems.push(...loneSidecars(sorted.sidecars, sorted.data), ...barredProblems(sorted.data));
  if (sheet) problems.push(...placeSheetCells(sheet, files));

  const cell_statements: Archive['cell_statements'] = Object.create(null);
  for (const [cell, statements] of Object.entries(sheet?.byCell ?? {})) cell_statements[cell] = statements;
  const settle = settler(settings, recipes, new Set(sorted.recipes.map(stemOf)));
  for (const file of files) {
    file.statements = settle.all(file.statements);
    for (const [name, statements] of Object.entries(file.electrode_statements))
      file.electrode_statements[name] = settle.all(statements);
    for (const condition of file.conditions) settle.condition(condition);
  }
  for (const [cell, statements] of Object.entries(cell_statements)) cell_statements[cell] = settle.all(statements);
  for (const decision of decisions) settle.code('person', decision.by, { path: 'decisions.yaml', line: decision.line });
  for (const event of events)
    if (event.rig !== null) settle.code('rig', event.rig, { path: 'events.yaml', line: event.line });
  problems.push(...settle.problems());
  giveHints(files, cell_statements);

  return {
    root: folder,
    settings,
    recipes,
    files,
    events,
    decisions,
    criteria,
    cell_statements,
    note_paths: sorted.notes,
    problems: problems.sort(
      (a, b) => byText(a.path, b.path) || (a.line ?? 0) - (b.line ?? 0) || byText(a.place, b.place),
    ),
  };
}

function openFolder(root: string): string {
  let folder: string;
  try {
    folder = realpathSync(root);
  } catch {
    throw new Error(`There is no folder ${root}. Give the path of the archive folder.`);
  }
  if (!statSync(folder).isDirectory())
    throw new Error(`${root} is a file. Give the path of the folder that holds the archive.`);
  return folder;
}

interface SortedOut {
  /** Every one of the archive's own files that can be opened. */
  own: Set<string>;
  recipes: string[];
  criteria: string[];
  notes: string[];
  folders: string[];
  sidecars: string[];
  data: Met[];
  problems: ArchiveProblem[];
}

const nameOf = (below: string): string => below.slice(below.lastIndexOf('/') + 1);

/** Tells the archive's own files from the files it keeps. */
function sortOut(met: Met[]): SortedOut {
  const out: SortedOut = {
    own: new Set(),
    recipes: [],
    criteria: [],
    notes: [],
    folders: [],
    sidecars: [],
    data: [],
    problems: [],
  };
  const own = (list: string[] | null, one: Met): void => {
    if (one.barred)
      out.problems.push(
        loss(
          one.path,
          null,
          'FILE_BARRED',
          `It is ${one.barred.reason}.`,
          one.barred.remedy || 'Put the file itself there.',
        ),
      );
    else {
      out.own.add(one.path);
      list?.push(one.path);
    }
  };
  for (const one of met) {
    const name = nameOf(one.path);
    const top = one.path.includes('/') ? one.path.slice(0, one.path.indexOf('/')) : '';
    if (top === 'notes' && name.endsWith('.md')) own(out.notes, one);
    else if (top === 'solutions' && name.endsWith('.yaml')) own(out.recipes, one);
    else if (top === 'criteria' && name.endsWith('.yaml')) own(out.criteria, one);
    else if (ownFolders.includes(top)) {
      const complaint = strayIn(top, one.path, name);
      if (complaint) out.problems.push(complaint);
    } else if (one.path === name && ownNames.includes(name) && name !== 'folder.yaml') own(null, one);
    else if (name === 'folder.yaml') own(out.folders, one);
    else if (misnamed(one.path, name)) {
      const correct = misnamed(one.path, name)!;
      out.problems.push(
        loss(
          one.path,
          null,
          'FILE_MISNAMED',
          `The file looks like ${correct} under another spelling and was not used.`,
          `Rename it to ${correct}.`,
        ),
      );
    } else if (name.endsWith('.yaml')) own(out.sidecars, one);
    else out.data.push(one);
  }
  return out;
}

/** The name a file was meant to have, null where its name is its own. */
function misnamed(below: string, name: string): string | null {
  const lower = name.toLowerCase().replace(/\.yml$/, '.yaml');
  if (name.endsWith('.yaml') || name === 'facts.csv') {
    // Systems that tell capitals apart would not find these.
    const own = lower === 'folder.yaml' || (below === name && ownNames.includes(lower));
    return own && lower !== name ? lower : null;
  }
  if (below === name && ownNames.includes(lower)) return lower;
  if (lower === 'folder.yaml') return lower;
  return lower.endsWith('.yaml') ? name.replace(/\.ya?ml$/i, '.yaml') : null;
}

function strayIn(top: string, below: string, name: string): ArchiveProblem | null {
  const wanted = top === 'notes' ? '.md' : '.yaml';
  const lower = name.toLowerCase();
  if (top === 'notes' ? /\.(markdown|mdx|txt|md)$/.test(lower) : /\.ya?ml$/.test(lower))
    return remark(
      below,
      null,
      'FILE_MISNAMED',
      '',
      `Names in ${top}/ end in ${wanted}; this one was not used.`,
      `Let its name end in ${wanted}.`,
    );
  if (Object.hasOwn(recordingEndings, endingOf(lower)))
    return remark(
      below,
      null,
      'FILE_MISPLACED',
      '',
      `It looks like a recording, and none are looked for in ${top}/.`,
      'Move it to recordings/ if it is one.',
    );
  return null;
}

/** folder.yaml or a sidecar. */
function readParts(below: string, bytes: Uint8Array): { parts: Parts; problems: ArchiveProblem[] } {
  const parts: Parts = {
    path: below,
    statements: [],
    conditions: [],
    table: null,
    tableLost: null,
    tableStated: false,
    electrodes: {},
    other: '',
  };
  const folder = nameOf(below) === 'folder.yaml';
  const level = folder ? 'folder' : 'sidecar';
  const { tree, problems } = readYaml(below, bytes);
  if (!tree) {
    // A file that cannot be read may have said how to read the recording.
    parts.tableLost = problems.find((problem) => problem.weight === 'blocks') ?? null;
    return { parts, problems };
  }
  const held = hold(below, tree, partsSchema);
  problems.push(...held.problems.map((problem) => homeless(problem)));
  if (!held.value) {
    parts.tableLost = problems.find((problem) => problem.weight === 'blocks') ?? null;
    return { parts, problems };
  }
  const at = (key: string): Tree | undefined => nodeAt(held.tree, [key]);
  const facts = readFacts(below, level, at('facts'), ['facts']);
  const conditions = readConditions(below, level, at('conditions'));
  problems.push(...facts.problems, ...conditions.problems);
  parts.statements = facts.statements;
  parts.conditions = conditions.conditions;
  parts.other = held.value.other ?? '';
  const table = at('table');
  if (table && !(table.kind === 'scalar' && table.value === null)) {
    parts.tableStated = true;
    const read = hold(below, table, tableSchema, ['table']);
    // Half a statement on how to read numbers is worse than none: one wrong key and the whole block is out.
    problems.push(
      ...read.problems.map((problem) => ({ ...problem, weight: 'blocks' as const, remedy: tableOut(folder) })),
    );
    if (read.problems.length === 0 && read.value) parts.table = read.value as TableMapping;
    else parts.tableLost = read.problems[0] ?? null;
  }
  const cells = at('cells');
  if (cells && folder)
    problems.push(
      remark(
        below,
        cells.line,
        'KEY_MISPLACED',
        'cells',
        '"cells" names the electrodes of one file and cannot speak for a folder.',
        'It was not used. Move it to the sidecar of the file.',
      ),
    );
  else if (cells?.kind === 'map')
    for (const [electrode, { node }] of cells.entries) {
      const said = readFacts(below, 'sidecar', node, ['cells', electrode]);
      problems.push(...said.problems);
      parts.electrodes[electrode] = said.statements;
    }
  else if (cells && !(cells.kind === 'scalar' && cells.value === null))
    problems.push(
      remark(
        below,
        cells.line,
        'VALUE_IMPOSSIBLE',
        'cells',
        'cells must be a block with a key for each electrode.',
        'It was not used. Write "electrode_0: { cell: ... }" a line below it.',
      ),
    );
  return { parts, problems };
}

const tableOut = (folder: boolean): string =>
  `The whole table block was not used, and the ${folder ? 'text recordings of the folder are' : 'recording is'} not read until it is corrected.`;

/** A fact that stands beside `facts:` instead of under it. */
const homeless = (problem: ArchiveProblem): ArchiveProblem => {
  const known = problem.code === 'KEY_UNKNOWN' && factKey(problem.place) !== undefined;
  return known
    ? {
        ...problem,
        message: `"${problem.place}" is a fact and stands outside "facts:".`,
        remedy: 'It was not used. Move it under "facts:".',
      }
    : problem;
};

const folderOf = (file: string): string => (file.includes('/') ? file.slice(0, file.lastIndexOf('/')) : '');

/** One file of the archive with everything said about it, outer folders first. */
function foundFile(
  root: string,
  met: Met,
  parts: ReadonlyMap<string, Parts>,
  defaults: readonly Statement[],
): FoundFile {
  const steps = met.path.split('/').slice(0, -1);
  const said = [0, ...steps.map((_, index) => index + 1)].flatMap(
    (depth) => parts.get([...steps.slice(0, depth), 'folder.yaml'].join('/')) ?? [],
  );
  const sidecar = parts.get(`${met.path}.yaml`);
  if (sidecar) said.push(sidecar);
  const file: FoundFile = {
    path: met.path,
    bytes: met.bytes,
    mtime_ms: met.mtime_ms,
    kind: 'other',
    reason: '',
    format: null,
    hints: {},
    statements: [...defaults, ...said.flatMap((one) => one.statements)],
    electrode_statements: sidecar?.electrodes ?? {},
    // Each file settles its own conditions, so none is shared between files.
    conditions: said.flatMap((one) => one.conditions).map((one) => ({ ...one, facts: { ...one.facts } })),
  };
  const claim = claimOf(root, met, said, sidecar);
  if (met.barred) file.blocked = shut(met.barred);
  if ('reason' in claim) return { ...file, reason: claim.reason };
  file.kind = 'recording';
  file.format = claim.format;
  if (claim.format === 'text') {
    const table = mergeTables(said.flatMap((one) => one.table ?? []));
    if (table) file.hints.table = table;
    const lost = said.findLast((one) => one.tableLost)?.tableLost;
    if (lost) file.blocked = blockedBy(lost);
  }
  return file;
}

/** Opening a link would lead out of the archive, and opening a pipe would wait for ever. */
const shut = (barred: { reason: string; remedy: string }): Problem => ({
  code: 'FILE_BARRED',
  weight: 'blocks',
  place: '',
  message: `It is ${barred.reason}.`,
  remedy: barred.remedy || 'Nothing needs to be done.',
});

const blockedBy = (lost: ArchiveProblem): Problem => ({
  code: 'SIDECAR_UNUSABLE',
  weight: 'blocks',
  place: '',
  message: `How to read it is stated in ${lost.path}${lost.line === null ? '' : `, line ${lost.line}`}, and that cannot be used: ${lost.message}`,
  remedy: `Correct ${lost.path} and build again.`,
});

/** The format whose reader is to try the file, or in words why none is. */
function claimOf(
  root: string,
  met: Met,
  said: readonly Parts[],
  sidecar: Parts | undefined,
): { format: FormatId } | { reason: string } {
  if (met.barred) return { reason: met.barred.reason };
  const stated = said.findLast((one) => one.other !== '');
  if (stated) return { reason: stated.other };
  const name = nameOf(met.path);
  const format = recordingEndings[endingOf(name)];
  // A table in the sidecar is a person's word that the file is delimited text, whatever its name.
  if (sidecar?.table || sidecar?.tableStated) return { format: format ?? 'text' };
  const byName = reasonByName(name);
  if (byName !== null) return { reason: byName };
  if (format === 'nwb') return { format };
  const nature = headOf(path.join(root, met.path));
  if (nature === null) return format ? { format } : { reason: 'a file that could not be opened' };
  if (nature === 'hdf5') return { reason: strayHdf5 };
  if (nature === 'binary') return { reason: notOpen };
  if (format !== undefined)
    return nature === 'prose' ? { reason: 'text without a number in its first lines' } : { format };
  if (nature === 'empty') return { reason: 'an empty file' };
  return { reason: 'text under a name that no reader claims; a sidecar with "table:" has it read as delimited text' };
}

const headBytes = 4096;

function headOf(file: string): ReturnType<typeof natureOf> | null {
  let handle: number;
  try {
    handle = openSync(file, 'r');
  } catch {
    return null;
  }
  try {
    const head = new Uint8Array(headBytes);
    return natureOf(head.subarray(0, readSync(handle, head, 0, headBytes, 0)));
  } catch {
    return null;
  } finally {
    closeSync(handle);
  }
}

/** Tables from outer folders to the sidecar, key by key; a nearer time base or stimulus replaces its alternative. */
function mergeTables(tables: readonly TableMapping[]): TableMapping | null {
  if (tables.length === 0) return null;
  let merged: TableMapping = {};
  for (const table of tables) {
    const { time, rate_hz, current, stimulus, ...kept } = merged;
    const base =
      table.time || table.rate_hz !== undefined
        ? {}
        : { ...(time && { time }), ...(rate_hz !== undefined && { rate_hz }) };
    const drive = table.current || table.stimulus ? {} : { ...(current && { current }), ...(stimulus && { stimulus }) };
    merged = { ...kept, ...base, ...drive, ...table };
  }
  return merged;
}

/** The data file that a sidecar speaks for. */
const dataOf = (sidecar: string): string => sidecar.slice(0, -'.yaml'.length);

function loneSidecars(sidecars: readonly string[], data: readonly Met[]): ArchiveProblem[] {
  const paths = new Set(data.map((one) => one.path));
  return sidecars
    .filter((sidecar) => !paths.has(dataOf(sidecar)))
    .map((sidecar) => {
      const name = nameOf(sidecar);
      if (!sidecar.includes('/')) {
        const own = nearestOf(name, ownNames);
        return remark(
          sidecar,
          null,
          'FILE_UNKNOWN',
          '',
          `"${name}" is none of the files that stand at the top of an archive; the nearest is "${own}".`,
          'It was not used. Correct its name.',
        );
      }
      const beside = data.filter((one) => folderOf(one.path) === folderOf(sidecar)).map((one) => nameOf(one.path));
      const nearest = nearestOf(dataOf(name), beside);
      const hint =
        nearest === undefined ? 'No data file lies beside it.' : `The nearest name beside it is "${nearest}".`;
      return remark(
        sidecar,
        null,
        'SIDECAR_ALONE',
        '',
        `It speaks for "${dataOf(name)}", which is not there. ${hint}`,
        'It was not used. Give it the full name of its data file, ending included, followed by .yaml.',
      );
    });
}

const barredProblems = (data: readonly Met[]): ArchiveProblem[] =>
  data
    .filter((one) => one.barred && one.barred.remedy !== '')
    .map((one) => remark(one.path, null, 'LINK_NOT_FOLLOWED', '', `It is ${one.barred!.reason}.`, one.barred!.remedy));

/** The column `file` of facts.csv, as statements of the files it names. */
function placeSheetCells(sheet: FactsTable, files: readonly FoundFile[]): ArchiveProblem[] {
  const byPath = new Map(files.map((file) => [file.path, file]));
  const problems: ArchiveProblem[] = [];
  for (const [named, { cell, line }] of sheet.byFile) {
    const file = byPath.get(named) ?? onlyOne(files.filter((one) => nameOf(one.path) === named));
    if (!file) {
      const nearest = nearestOf(named, byPath.keys());
      const hint = nearest === undefined ? '' : `; the nearest is "${nearest}"`;
      problems.push(
        remark(
          'facts.csv',
          line,
          'TABLE_FILE_UNKNOWN',
          'file',
          `"${named}" is not the path of one file of the archive${hint}.`,
          'The row speaks for its cell alone. Correct the path.',
        ),
      );
      continue;
    }
    const at = file.statements.findIndex((statement) => statement.origin.level === 'sidecar');
    file.statements.splice(at < 0 ? file.statements.length : at, 0, {
      key: 'cell',
      value: cell,
      origin: { level: 'facts.csv', path: 'facts.csv', line },
    });
  }
  return problems;
}

const onlyOne = <Item>(items: Item[]): Item | undefined => (items.length === 1 ? items[0] : undefined);

interface Place {
  path: string;
  line: number | null;
}

/**
 * Holds stated codes against the archive's own lists: classes, rigs, people, recipes. One problem for each file and
 * value, however many recordings it speaks for.
 */
function settler(settings: Settings, recipes: readonly Recipe[], recipeFiles: ReadonlySet<string>) {
  const classes = [...Object.keys(settings.classes), ...shippedClasses];
  const said = new Map<string, ArchiveProblem & { lines: Set<number | null> }>();
  const say = (at: Place, code: string, key: string, message: string, remedy: string): void => {
    const id = JSON.stringify([at.path, code, message]);
    const known = said.get(id);
    if (known) known.lines.add(at.line);
    else said.set(id, { ...remark(at.path, at.line, code, key, message, remedy), lines: new Set([at.line]) });
  };
  const nearestTo = (word: string, known: readonly string[]): string => {
    const nearest = nearestOf(word, known);
    return nearest === undefined ? '' : `; the nearest is "${nearest}"`;
  };
  /** A code of a rig or person that almanac.yaml does not list. Where it lists none, any code will do. */
  const code = (key: 'rig' | 'person', value: string, at: Place): void => {
    const list = key === 'rig' ? settings.rigs : settings.people;
    if (Object.keys(list).length === 0 || Object.hasOwn(list, value)) return;
    const where = key === 'rig' ? 'rigs' : 'people';
    say(
      at,
      'CODE_UNKNOWN',
      key,
      `"${value}" is not among the ${where} of almanac.yaml (${Object.keys(list).slice(0, 12).join(', ')})${nearestTo(value, Object.keys(list))}.`,
      `It was used as it stands. Correct it, or add it to ${where}.`,
    );
  };
  /** The value in force, null where it is impossible. */
  const value = (key: string, stated: string | number, at: Place): string | number | null => {
    if (typeof stated === 'number') return stated;
    if (key === 'class') {
      const found =
        classes.find((id) => id === stated) ??
        classes.find((id) => id.toLowerCase() === stated.toLowerCase().replace(/[\s_]+/g, '-'));
      if (found) return found;
      say(
        at,
        'CLASS_UNKNOWN',
        key,
        `"${stated}" is not a cell class${nearestTo(stated, classes)}.`,
        'The fact was not used. Correct it, or describe the class in almanac.yaml under classes.',
      );
      return null;
    }
    if (key === 'bath' || key === 'pipette') {
      const recipe = recipeFor(recipes, stated);
      // A recipe that could not be used has its own complaint already.
      if (!recipe && !recipeFiles.has(stated))
        say(
          at,
          'RECIPE_UNKNOWN',
          key,
          `There is no recipe "${stated}" in solutions/${nearestTo(
            stated,
            recipes.map((one) => one.id),
          )}.`,
          `Nothing that depends on the ${key} solution can be worked out. Add solutions/${stated.replace(/[^\p{L}\p{N}._-]+/gu, '-')}.yaml or correct the name.`,
        );
      if (recipe && recipe.role !== key)
        say(
          at,
          'RECIPE_ROLE',
          key,
          `The recipe "${recipe.id}" has the role ${recipe.role} and is stated as ${key}.`,
          'It was used as stated. Correct one of them.',
        );
      return recipe?.id ?? stated;
    }
    if (key === 'rig' || key === 'person') code(key, stated, at);
    return stated;
  };
  return {
    code,
    all: (statements: readonly Statement[]): Statement[] =>
      statements.flatMap((statement) => {
        const settled = value(statement.key, statement.value, statement.origin);
        return settled === null ? [] : [{ ...statement, value: settled }];
      }),
    condition: (condition: ConditionStatement): void => {
      for (const [key, stated] of Object.entries(condition.facts)) {
        const settled = value(key, stated, condition.origin);
        if (settled === null) delete condition.facts[key];
        else condition.facts[key] = settled;
      }
    },
    problems: (): ArchiveProblem[] =>
      [...said.values()].map(({ lines, ...problem }) =>
        lines.size > 1
          ? { ...problem, message: `${problem.message.replace(/\.$/, '')} (and ${lines.size - 1} more lines).` }
          : problem,
      ),
  };
}

/** What a reader must know before it opens the file, from the facts in force. */
function giveHints(files: readonly FoundFile[], byCell: Archive['cell_statements']): void {
  const unnamed = files.filter(
    (file) => file.kind === 'recording' && !file.statements.some((one) => one.key === 'cell'),
  );
  const ids = derivedIds(unnamed.map((file) => file.path));
  for (const file of files) {
    if (file.kind !== 'recording') continue;
    const stated = file.statements.findLast((one) => one.key === 'cell')?.value;
    const cell = stated === undefined ? ids.get(file.path)! : String(stated);
    const sheet = Object.hasOwn(byCell, cell) ? byCell[cell]! : [];
    const farther = file.statements.filter((one) => one.origin.level !== 'sidecar');
    const sidecar = file.statements.filter((one) => one.origin.level === 'sidecar');
    const inForce = new Map([...farther, ...sheet, ...sidecar].map((one) => [one.key, one.value]));
    const hints: ReadingHints = file.hints;
    const [capacitance, rate, clamp] = [inForce.get('capacitance_pf'), inForce.get('rate_hz'), inForce.get('clamp')];
    if (typeof capacitance === 'number') hints.capacitance_pf = capacitance;
    if (typeof rate === 'number') hints.rate_hz = rate;
    if (clamp === 'current' || clamp === 'voltage') hints.clamp = clamp;
  }
}
