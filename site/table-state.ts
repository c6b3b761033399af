/** What is shown of the table of cells, as the address holds it: `?q=drift&standing=caution&rig=a&sort=date.desc`. */

export interface TableState {
  words: string;
  /** Chosen values by facet. */
  chosen: Record<string, string[]>;
  sort: { column: string; descending: boolean };
}

/**
 * Reads an address. What it names and the table does not hold is ignored; defaults fill the rest.
 *
 * @param choices values of each facet
 * @param columns ids of the columns that sort; the first is the default
 */
export function readState(
  query: string,
  choices: Readonly<Record<string, readonly string[]>>,
  columns: readonly string[],
): TableState {
  const parameters = new URLSearchParams(query);
  const [column = '', way] = (parameters.get('sort') ?? '').split('.');
  const known = columns.includes(column);
  const chosen: Record<string, string[]> = {};
  for (const [facet, known] of Object.entries(choices)) {
    const values = [...new Set(parameters.getAll(facet))].filter((value) => known.includes(value));
    if (values.length > 0) chosen[facet] = values;
  }
  return {
    words: (parameters.get('q') ?? '').trim(),
    chosen,
    sort: { column: known ? column : columns[0]!, descending: known && way === 'desc' },
  };
}

/** Writes an address, '' or starting with '?'. Defaults are left out, so that a plain table has a plain address. */
export function writeState(state: TableState, columns: readonly string[]): string {
  const parameters = new URLSearchParams();
  if (state.words !== '') parameters.set('q', state.words);
  for (const [facet, values] of Object.entries(state.chosen))
    for (const value of values) parameters.append(facet, value);
  const { column, descending } = state.sort;
  if (column !== columns[0] || descending) parameters.set('sort', descending ? `${column}.desc` : column);
  const text = parameters.toString();
  return text === '' ? '' : `?${text}`;
}
