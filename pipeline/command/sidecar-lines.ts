/** The lines that several problems of one file would have pasted, as one block. */

const tableLine = /^ {2}(\w+): +(.*)$/;
const columnList = /^\{ columns: \[([\d, ]+)\], unit: (\S+) \}$/;

/** Two statements of one key as one: equal ones once, columns of one unit together; null where they cannot be. */
function joined(one: string, other: string): string | null {
  if (one === other) return one;
  const [a, b] = [columnList.exec(one), columnList.exec(other)];
  if (!a || !b || a[2] !== b[2]) return null;
  const columns = [...new Set(`${a[1]},${b[1]}`.split(',').map((text) => Number(text)))].sort((x, y) => x - y);
  return `{ columns: [${columns.join(', ')}], unit: ${a[2]} }`;
}

/**
 * YAML allows a key once in a block, so that two blocks of `table:` pasted below each other are refused.
 *
 * @param blocks what each problem offers, such as 'table:\n  clamp: current'
 * @returns one block under one `table:`, or null where a block holds more than plain lines of `table:` or two disagree
 */
export function oneTable(blocks: readonly string[]): string | null {
  const stated = new Map<string, string>();
  for (const block of blocks) {
    const [head, ...lines] = block.trimEnd().split('\n');
    if (head !== 'table:') return null;
    for (const line of lines) {
      const found = tableLine.exec(line);
      if (!found) return null;
      const [key, value] = [found[1]!, found[2]!];
      const had = stated.get(key);
      const now = had === undefined ? value : joined(had, value);
      if (now === null) return null;
      stated.set(key, now);
    }
  }
  return ['table:', ...[...stated].map(([key, value]) => `  ${`${key}:`.padEnd(8)} ${value}`)].join('\n');
}
