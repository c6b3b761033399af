/** Facts and conditions as folder.yaml, sidecars and almanac.yaml state them. */
import { checkFact, factKey } from './fact-keys.ts';
import { placeOf, shownValue } from './schemas.ts';
import type { ConditionStatement, Origin, OriginLevel, Statement } from './types.ts';
import { type ArchiveProblem, lineAt, nodeAt, remark, type Step, type Tree } from './yaml-file.ts';

/** What a scalar says to a fact of this key: its own spelling for text, so that 007 stays 007. */
function writtenValue(key: string, node: Tree): unknown {
  if (node.kind === 'list') return node.items.map(() => null);
  if (node.kind === 'map') return {};
  if (node.value === null) return '';
  if (typeof node.value === 'string') return node.value;
  return typeof node.value === 'number' && factKey(key)?.kind === 'number' ? node.value : node.source;
}

const correct = 'The fact was not used. Correct it and build again.';

/**
 * The facts of one block, each checked.
 *
 * @param banned keys that cannot be stated at this level, with the reason
 */
export function readFacts(
  file: string,
  level: OriginLevel,
  block: Tree | undefined,
  place: readonly Step[],
  banned: Readonly<Record<string, string>> = {},
): { statements: Statement[]; problems: ArchiveProblem[] } {
  const statements: Statement[] = [];
  const problems: ArchiveProblem[] = [];
  if (!block || (block.kind === 'scalar' && block.value === null)) return { statements, problems };
  if (block.kind !== 'map') {
    const message = `${placeOf(place)} must be a block of facts, got ${shownValue(block)}.`;
    problems.push(
      remark(
        file,
        block.line,
        'VALUE_IMPOSSIBLE',
        placeOf(place),
        message,
        'No fact of it was used. Write one "key: value" a line below it.',
      ),
    );
    return { statements, problems };
  }
  for (const [key, { line, node }] of block.entries) {
    // A key with nothing behind it is a form not filled in yet.
    if (node.kind === 'scalar' && node.value === null) continue;
    const where = placeOf([...place, key]);
    const ban = Object.hasOwn(banned, key) ? banned[key] : undefined;
    if (ban) {
      problems.push(remark(file, line, 'FACT_MISPLACED', where, `${key} cannot be stated here: ${ban}.`, correct));
      continue;
    }
    const checked = checkFact(key, writtenValue(key, node));
    if (checked.ok) statements.push({ key, value: checked.value, origin: { level, path: file, line } });
    else if (factKey(key)) problems.push(remark(file, line, 'FACT_IMPOSSIBLE', where, `${checked.message}.`, correct));
    else
      problems.push(
        remark(
          file,
          line,
          'FACT_UNKNOWN',
          where,
          `${checked.message}.`,
          'The line was not used. Correct its spelling; what fits no key goes under "note".',
        ),
      );
  }
  return { statements, problems };
}

const clockTime = /^(?:(\d{4}-\d{2}-\d{2})[T ])?(\d{1,2}:\d{2}(?::\d{2}(?:\.\d+)?)?)$/;

/** The conditions of one file, in the order in which they stand. */
export function readConditions(
  file: string,
  level: OriginLevel,
  list: Tree | undefined,
): { conditions: ConditionStatement[]; problems: ArchiveProblem[] } {
  const conditions: ConditionStatement[] = [];
  const problems: ArchiveProblem[] = [];
  if (!list || (list.kind === 'scalar' && list.value === null)) return { conditions, problems };
  const say = (line: number, code: string, place: string, message: string): void => {
    problems.push(remark(file, line, code, place, message, 'The condition was not used. Correct it and build again.'));
  };
  if (list.kind !== 'list') {
    say(
      list.line,
      'VALUE_IMPOSSIBLE',
      'conditions',
      `conditions must be a list, each beginning with "-", got ${shownValue(list)}.`,
    );
    return { conditions, problems };
  }
  for (const [index, item] of list.items.entries()) {
    const place = `conditions.${index}`;
    if (item.kind !== 'map') {
      say(item.line, 'VALUE_IMPOSSIBLE', place, `A condition must be a block of keys, got ${shownValue(item)}.`);
      continue;
    }
    const scalar = (key: string): Tree | undefined => nodeAt(item, [key]);
    const label = scalar('label');
    const written =
      label?.kind === 'scalar' && label.value !== null
        ? (typeof label.value === 'string' ? label.value : label.source).trim()
        : '';
    if (written === '') {
      say(
        lineAt(item, ['label']),
        'VALUE_IMPOSSIBLE',
        `${place}.label`,
        'A condition must have a label, such as "label: TTX".',
      );
      continue;
    }
    const sweep = scalar('from_sweep');
    const time = scalar('from_time');
    if (sweep && time) {
      say(
        lineAt(item, ['from_time']),
        'VALUE_IMPOSSIBLE',
        place,
        'A condition begins at from_sweep or at from_time, never both.',
      );
      continue;
    }
    if (sweep && !(sweep.kind === 'scalar' && Number.isInteger(sweep.value) && (sweep.value as number) >= 0)) {
      say(
        lineAt(item, ['from_sweep']),
        'VALUE_IMPOSSIBLE',
        `${place}.from_sweep`,
        `from_sweep must be a whole number from 0, got ${shownValue(sweep)}.`,
      );
      continue;
    }
    let fromTime: string | null = null;
    if (time) {
      const parts = time.kind === 'scalar' ? clockTime.exec(String(time.value ?? '').trim()) : null;
      const clock = parts ? checkFact('time', parts[2]) : null;
      const day = parts?.[1] === undefined ? null : checkFact('date', parts[1]);
      if (!clock?.ok || day?.ok === false) {
        say(
          lineAt(item, ['from_time']),
          'VALUE_IMPOSSIBLE',
          `${place}.from_time`,
          `from_time must be a clock time written HH:MM, HH:MM:SS or YYYY-MM-DD HH:MM:SS, got ${shownValue(time)}.`,
        );
        continue;
      }
      fromTime = day?.ok ? `${day.value} ${clock.value}` : String(clock.value);
    }
    const rest: Tree = {
      ...item,
      entries: new Map([...item.entries].filter(([key]) => !['label', 'from_sweep', 'from_time'].includes(key))),
    };
    const facts = readFacts(file, level, rest, ['conditions', index], {
      cell: 'a condition belongs to its cell',
    });
    problems.push(...facts.problems);
    const origin: Origin = { level, path: file, line: item.line };
    conditions.push({
      from_sweep: sweep?.kind === 'scalar' ? (sweep.value as number) : null,
      from_time: fromTime,
      label: written,
      facts: Object.fromEntries(facts.statements.map((statement) => [statement.key, statement.value])),
      origin,
    });
  }
  return { conditions, problems };
}
