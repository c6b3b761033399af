/** Which sweeps of which files form which cell, and which facts hold for it. Pure: opens nothing, reads no clock. */
import type { FileDescription, Problem, SweepEntry } from '../formats/types.ts';
import { clockOf } from './clock.ts';
import { placeConditions } from './conditions.ts';
import { checkFact, factKey, factKeys, isCalendarDate, nearestOf, urlSafeId } from './fact-keys.ts';
import { derivedIds, sameId } from './ids.ts';
import { orderSweeps } from './order.ts';
import { recipeFor } from './solutions.ts';
import type { Archive, CellRecord, Fact, Facts, FoundFile, OriginLevel, Statement } from './types.ts';
import { byText } from './walk.ts';

export { conditionOf } from './conditions.ts';

export type PlacedProblem = Problem & { path: string };

const levels: readonly OriginLevel[] = ['defaults', 'folder', 'file', 'facts.csv', 'sidecar'];
const rank = (statement: Statement): number => levels.indexOf(statement.origin.level);

/** Facts that belong to one file of a cell, so that two files may differ in them without contradiction. */
const ofOneFile = new Set([
  'time',
  'protocol',
  'note',
  'rate_hz',
  'filter_khz',
  'bridge_mohm',
  'bias_pa',
  'access_mohm',
  'capacitance_pf',
  'end_offset_mv',
  'clamp',
  'figure',
]);

const problem = (
  path: string,
  code: string,
  place: string,
  message: string,
  remedy: string,
  sidecar?: string,
): PlacedProblem => ({
  code,
  weight: 'warns',
  place,
  message,
  remedy,
  path,
  ...(sidecar === undefined ? {} : { sidecar }),
});

/** Whether two statements say the same: text by its words, numbers within rounding. */
export function saysTheSame(a: string | number, b: string | number): boolean {
  if (typeof a === 'number' && typeof b === 'number')
    return Math.abs(a - b) <= 1e-6 * Math.max(Math.abs(a), Math.abs(b)) + 1e-12;
  const words = (value: string | number): string =>
    String(value).normalize('NFC').trim().toLowerCase().replace(/\s+/g, ' ');
  return words(a) === words(b);
}

/**
 * The facts in force from statements in any order: the nearest level wins, within a level the later statement (inner
 * folders come after outer ones). Every other statement that says something else is kept in `disagrees`, nearest
 * first, `defaults` excepted.
 */
export function cascade(statements: readonly Statement[]): Facts {
  const byKey = new Map<string, Statement[]>();
  for (const statement of statements) byKey.set(statement.key, [...(byKey.get(statement.key) ?? []), statement]);
  const facts: Facts = {};
  for (const [key, stated] of byKey) {
    const nearestFirst = stated
      .map((statement, index) => ({ statement, index }))
      .sort((a, b) => rank(b.statement) - rank(a.statement) || b.index - a.index)
      .map(({ statement }) => statement);
    const [winner, ...others] = nearestFirst as [Statement, ...Statement[]];
    const disagrees: Fact['disagrees'] = [];
    for (const { value, origin } of others) {
      if (origin.level === 'defaults' || saysTheSame(value, winner.value)) continue;
      const told = disagrees.some(
        (one) => one.origin.path === origin.path && one.origin.line === origin.line && saysTheSame(one.value, value),
      );
      if (!told) disagrees.push({ value, origin });
    }
    facts[key] = { key, value: winner.value, origin: winner.origin, disagrees };
  }
  return facts;
}

/** One file's share of one cell: all its sweeps, or those of one electrode. */
interface Part {
  file: FoundFile;
  path: string;
  description: FileDescription | null;
  electrode: string;
  /** All but facts.csv, which is found by the cell's id. */
  statements: Statement[];
  id: string;
  /** Whether a person stated the id, so that equal ids mean one cell. */
  stated: boolean;
  sweeps: { entry: SweepEntry; column: number }[];
}

/**
 * Works out the cells of an archive from what is stated and what the files hold.
 *
 * @param surveyed every recording with its description, null for one that could not be opened; files that are missing
 * from the list are left out
 * @returns cells sorted by id, and problems with the files' own statements
 */
export function workOutCells(
  archive: Archive,
  surveyed: readonly { path: string; description: FileDescription | null }[],
): { cells: CellRecord[]; problems: PlacedProblem[] } {
  const problems: PlacedProblem[] = [];
  const files = new Map(archive.files.map((file) => [file.path, file]));
  const listed = surveyed
    .flatMap(({ path, description }) => {
      const file = files.get(path);
      return file?.kind === 'recording' ? [{ file, description }] : [];
    })
    .sort((a, b) => byText(a.file.path, b.file.path));
  // The same set of paths as when facts.csv was looked up for reading, so that a cell has the same id in both.
  const unnamed = archive.files.filter(
    (file) => file.kind === 'recording' && !file.statements.some((one) => one.key === 'cell'),
  );
  const ids = derivedIds(unnamed.map((file) => file.path));
  const parts = listed.flatMap(({ file, description }) => partsOf(archive, file, description, ids, problems));
  const groups = groupParts(parts, archive.cell_statements);
  const cells = groups.map((group) => cellOf(archive, group)).sort((a, b) => byText(a.id, b.id));
  problems.push(...cells.flatMap((cell) => cell.problems.filter((one) => one.code !== 'CELL_FILE_UNREAD')));
  problems.push(...idleRows(archive, new Set(groups.map((group) => group.id))));
  return { cells, problems };
}

/** Rows of facts.csv that speak for no cell. */
function idleRows(archive: Archive, met: ReadonlySet<string>): PlacedProblem[] {
  return Object.keys(archive.cell_statements)
    .filter((id) => !met.has(id))
    .map((id) => {
      const nearest = nearestOf(id, met);
      const line = archive.cell_statements[id]![0]?.origin.line;
      return problem(
        'facts.csv',
        'TABLE_CELL_UNKNOWN',
        line ? `line ${line}` : '',
        `The row speaks for the cell "${id}", which this archive does not hold${nearest === undefined ? '' : `; the nearest is "${nearest}"`}.`,
        'The row was not used. Correct its id, or name its recording in a column "file".',
      );
    });
}

/** Facts that the file states itself, checked; the session's start gives date and time where nothing else does. */
function ownStatements(
  archive: Archive,
  file: FoundFile,
  description: FileDescription,
  problems: PlacedProblem[],
): { electrode: string; statement: Statement }[] {
  const found: { electrode: string; statement: Statement }[] = [];
  const state = (key: string, value: string | number, place: string, electrode: string): void => {
    const checked = checkFact(key, value);
    if (!checked.ok) {
      problems.push(
        problem(
          file.path,
          'FILE_FACT_IMPOSSIBLE',
          place,
          `The file states a fact that cannot be: ${checked.message}.`,
          `It was not used. State ${factKey(key) ? key : 'it under a known key'} in ${file.path}.yaml.`,
        ),
      );
      return;
    }
    const recipe = key === 'bath' || key === 'pipette' ? recipeFor(archive.recipes, String(checked.value)) : undefined;
    found.push({
      electrode,
      statement: {
        key,
        value: recipe?.id ?? checked.value,
        origin: { level: 'file', path: place === '' ? file.path : `${file.path}: ${place}`, line: null },
      },
    });
  };
  for (const fact of description.facts) state(fact.key, fact.value, fact.place, fact.electrode ?? '');
  const start = clockOf(description.session_start, archive.settings.timezone);
  const has = (key: string): boolean => description.facts.some((fact) => fact.key === key);
  if (start) {
    if (!has('date')) state('date', start.date, 'session start', '');
    if (!has('time') && start.time !== null && isCalendarDate(start.date))
      state('time', start.time, 'session start', '');
  }
  return found;
}

function partsOf(
  archive: Archive,
  file: FoundFile,
  description: FileDescription | null,
  ids: ReadonlyMap<string, string>,
  problems: PlacedProblem[],
): Part[] {
  const own = description ? ownStatements(archive, file, description, problems) : [];
  const sweeps = (description?.sweeps ?? []).map((entry, column) => ({ entry, column }));
  const electrodes = [...new Set(sweeps.map(({ entry }) => entry.electrode))];
  const named = Object.keys(file.electrode_statements);
  if (description)
    for (const name of named.filter((one) => !electrodes.includes(one))) {
      const nearest = nearestOf(
        name,
        electrodes.filter((one) => one !== ''),
      );
      const hint = nearest === undefined ? 'the file names no electrode' : `the nearest is "${nearest}"`;
      problems.push(
        problem(
          `${file.path}.yaml`,
          'ELECTRODE_UNKNOWN',
          `cells.${name}`,
          `"${name}" is not an electrode of ${file.path}; ${hint}.`,
          'What is stated for it was not used. Correct the name.',
        ),
      );
    }
  const fallback = ids.get(file.path) ?? urlSafeId(file.path);
  // An unread file cannot say which electrodes it has; its sidecar can.
  if (!description) electrodes.push(...named);
  const several = electrodes.length > 1;
  if (several && named.length === 0 && file.statements.some((one) => one.key === 'cell')) {
    const stated = file.statements.findLast((one) => one.key === 'cell')!.value;
    problems.push(
      problem(
        file.path,
        'ELECTRODES_SHARE_ID',
        '',
        `The file has ${electrodes.length} electrodes (${electrodes.join(', ')}) and one stated cell, "${stated}".`,
        'Each electrode is kept as a cell of its own. State them one by one; give all of them the same id if they are in one cell.',
        `cells:\n${electrodes.map((name) => `  ${JSON.stringify(name)}: { cell: ${urlSafeId(`${stated}-${name}`)} }`).join('\n')}`,
      ),
    );
  }
  return (electrodes.length === 0 ? [''] : electrodes).map((electrode) => {
    const said = Object.hasOwn(file.electrode_statements, electrode) ? file.electrode_statements[electrode]! : [];
    // What is stated for the electrode stands in for what the same sidecar states for the file.
    const general = file.statements.filter(
      (one) => one.origin.level !== 'sidecar' || !said.some((other) => other.key === one.key),
    );
    const ofFile = own.filter((one) => one.electrode === '' || one.electrode === electrode);
    const specific = ofFile.filter(
      (one) =>
        one.electrode !== '' ||
        !ofFile.some((other) => other.electrode !== '' && other.statement.key === one.statement.key),
    );
    const statements = [...general, ...specific.map((one) => one.statement), ...said];
    const winner = cascade(statements)['cell'];
    // A fact about the file as a whole names none of several electrodes.
    const names =
      winner !== undefined &&
      (!several ||
        said.some((one) => one.key === 'cell') ||
        specific.some((one) => one.electrode !== '' && one.statement.key === 'cell'));
    const whole = winner === undefined ? fallback : String(winner.value);
    const id = names ? String(winner.value) : several && electrode !== '' ? urlSafeId(`${whole}-${electrode}`) : whole;
    const byPerson = statements.some((one) => one.key === 'cell' && one.origin.level !== 'file');
    const stated = byPerson && (!several || said.some((one) => one.key === 'cell'));
    return {
      file,
      path: file.path,
      description,
      electrode,
      statements,
      id,
      stated,
      sweeps: sweeps.filter(({ entry }) => entry.electrode === electrode),
    };
  });
}

interface Group {
  id: string;
  /** The id before it was kept apart, which facts.csv knows. */
  asked: string;
  parts: Part[];
  problems: PlacedProblem[];
}

/** Parts with the same stated id become one cell; any other meeting of ids is told, and the later is kept apart. */
function groupParts(parts: readonly Part[], rows: Archive['cell_statements']): Group[] {
  const groups: Group[] = [];
  const taken = new Map<string, Group[]>();
  // Stated ids first, so that a derived id never takes a name that a person gave.
  const ordered = [...parts.filter((part) => part.stated), ...parts.filter((part) => !part.stated)];
  for (const part of ordered) {
    // A file that gave no sweeps is a cell only where somebody says so; else it stays a row of files.
    if (part.sweeps.length === 0 && !part.stated && !Object.hasOwn(rows, part.id)) continue;
    const holders = taken.get(sameId(part.id)) ?? [];
    const same = part.stated ? holders.find((group) => group.asked === part.id && group.parts[0]!.stated) : undefined;
    if (same) {
      same.parts.push(part);
      continue;
    }
    const id = holders.length === 0 ? part.id : `${part.id}~${holders.length + 1}`;
    const group: Group = { id, asked: part.id, parts: [part], problems: [] };
    if (holders.length > 0) {
      const first = holders[0]!;
      const other = first.parts[0]!.file.path;
      const caseOnly = first.asked !== part.id;
      const message = caseOnly
        ? `The ids "${first.asked}" (${other}) and "${part.id}" (${part.file.path}) differ only in capitals.`
        : `The id "${part.id}" was met twice, in ${other} and ${part.file.path}${part.electrode === '' ? '' : ` (${part.electrode})`}, and nobody stated that they are one cell.`;
      const remedy = `They are kept apart, as ${first.id} and ${id}. If they are one cell, state "cell: ${first.asked}" in both sidecars or in their folder; if not, give one another id.`;
      group.problems.push(
        problem(part.file.path, 'CELL_ID_TWICE', part.electrode, message, remedy, `facts: { cell: ${first.asked} }`),
      );
      if (!first.problems.some((one) => one.code === 'CELL_ID_TWICE'))
        first.problems.push(
          problem(
            other,
            'CELL_ID_TWICE',
            first.parts[0]!.electrode,
            message,
            remedy,
            `facts: { cell: ${first.asked} }`,
          ),
        );
    }
    taken.set(sameId(part.id), [...holders, group]);
    groups.push(group);
  }
  return groups;
}

/** A folder.yaml or almanac.yaml speaks through every file of the cell; its statement counts once. */
function unique(statements: readonly Statement[]): Statement[] {
  const last = new Map<string, Statement>();
  for (const statement of statements) {
    const { origin, key, value } = statement;
    const id = JSON.stringify([origin.level, origin.path, origin.line, key, value]);
    last.delete(id);
    last.set(id, statement);
  }
  return [...last.values()];
}

function factsOfCell(
  group: Group,
  parts: readonly Part[],
  sheet: readonly Statement[],
): Pick<CellRecord, 'facts' | 'file_facts'> {
  // Within a level the later statement wins, so the first file comes last.
  const facts = cascade([...unique(parts.toReversed().flatMap((part) => part.statements)), ...sheet]);
  const stated = facts['cell'];
  facts['cell'] = stated
    ? { ...stated, value: group.id }
    : { key: 'cell', value: group.id, origin: { level: 'file', path: parts[0]!.path, line: null }, disagrees: [] };
  const inOrder = (all: Facts): Facts =>
    Object.fromEntries(factKeys.flatMap(({ key }) => (Object.hasOwn(all, key) ? [[key, all[key]!]] : [])));
  if (new Set(parts.map((part) => part.path)).size === 1) return { facts: inOrder(facts) };
  const file_facts: Record<string, Record<string, string | number>> = {};
  const alone = parts.map((part) => ({ path: part.path, facts: cascade([...part.statements, ...sheet]) }));
  for (const part of alone)
    for (const fact of Object.values(part.facts))
      if (ofOneFile.has(fact.key)) file_facts[part.path] = { ...file_facts[part.path], [fact.key]: fact.value };
  for (const key of ofOneFile) {
    const first = alone.find((part) => part.facts[key])?.facts[key];
    // Only what one and the same file is said to be twice is a contradiction here.
    if (first) facts[key] = { ...first, disagrees: alone.flatMap((part) => part.facts[key]?.disagrees ?? []) };
  }
  return { facts: inOrder(facts), file_facts };
}

const placed = (origin: Fact['origin']): string =>
  `${origin.path}${origin.line === null ? '' : `, line ${origin.line}`}`;

const disagreement = (fact: Fact, other: Fact['disagrees'][number]): PlacedProblem =>
  problem(
    other.origin.path,
    'FACTS_DISAGREE',
    other.origin.line === null ? fact.key : `${fact.key}, line ${other.origin.line}`,
    `${fact.key} is "${fact.value}" in ${placed(fact.origin)} and "${other.value}" in ${placed(other.origin)}.`,
    'The nearer statement is used. Correct the one that is wrong, or remove it.',
  );

function cellOf(archive: Archive, group: Group): CellRecord {
  // The row's own id found it; it is no second word on what the cell is called.
  const row = Object.hasOwn(archive.cell_statements, group.id) ? archive.cell_statements[group.id]! : [];
  const sheet = row.filter((one) => one.key !== 'cell');
  const { parts, sweeps } = orderSweeps(group.parts, sheet, archive.settings.timezone);
  const { facts, file_facts } = factsOfCell(group, parts, sheet);
  const stated = new Map<string, FoundFile['conditions'][number]>();
  for (const part of parts)
    for (const condition of part.file.conditions)
      stated.set(JSON.stringify([condition.origin, condition.label]), condition);
  const conditions = placeConditions([...stated.values()], sweeps);
  const contradictions = Object.values(facts).flatMap((fact) =>
    fact.disagrees.map((other) => disagreement(fact, other)),
  );
  const unread = [...new Set(parts.filter((part) => part.description === null).map((part) => part.path))].map(
    (path): PlacedProblem => ({
      ...problem(
        path,
        'CELL_FILE_UNREAD',
        '',
        `${path} belongs to this cell and could not be read.`,
        'What is wrong stands with the file.',
      ),
      weight: 'blocks',
    }),
  );
  return {
    id: group.id,
    facts,
    conditions: conditions.conditions,
    sweeps: sweeps.map(({ ref }) => ref),
    ...(file_facts ? { file_facts } : {}),
    problems: [...group.problems, ...contradictions, ...conditions.problems, ...unread],
  };
}
