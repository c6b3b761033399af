/** Finding, choosing and sorting on the page of cells. State lives in the address; without this script all rows show. */
import MiniSearch from 'minisearch';
import type { CellsData } from '../cells-data.ts';
import { sizesText, whole } from '../sizes.ts';
import { readState, type TableState, writeState } from '../table-state.ts';

declare global {
  interface Window {
    sweepAlmanacCells?: CellsData;
  }
}

const data = window.sweepAlmanacCells;
const table = document.getElementById('cells') as HTMLTableElement | null;
const finder = document.getElementById('finder');

/** 'Ünité' and 'unite' are one word. */
const folded = (text: string): string =>
  text
    .normalize('NFKD')
    .replace(/\p{Mark}/gu, '')
    .toLowerCase();

/** Words, and the parts of words that change between letters and digits: 's2c1' also gives 's2', 'c1', '2c1'. */
function tokens(text: string): string[] {
  return folded(text)
    .split(/[^\p{L}\p{N}.µΩ]+/u)
    .flatMap((word) => {
      const parts = word.match(/\p{L}+|[\p{N}.]+/gu) ?? [];
      return parts.length > 1 ? [word, ...parts.slice(1).map((_, index) => parts.slice(index + 1).join(''))] : [word];
    })
    .filter((word) => word !== '' && word !== '.');
}

function start(data: CellsData, table: HTMLTableElement, finder: HTMLElement): void {
  const rows = [...table.tBodies[0]!.rows];
  const words = document.getElementById('words') as HTMLInputElement;
  const status = document.getElementById('shown')!;
  const clear = document.getElementById('clear') as HTMLButtonElement;
  const order = document.getElementById('order') as HTMLSelectElement;
  const nothing = document.getElementById('nothing-found')!;
  const foldedIds = data.ids.map(folded);
  const facetIds = Object.keys(data.facets);
  const columnIds = Object.keys(data.columns);
  const choices = Object.fromEntries(facetIds.map((facet) => [facet, [...new Set(data.facets[facet]!.flat())]]));
  let state = readState(location.search, choices, columnIds);

  let index: MiniSearch | null = null;
  const search = (word: string): Set<number> => {
    index ??= indexOf(data);
    const part = folded(word);
    const byId = new Set(foldedIds.flatMap((id, row) => (id.includes(part) ? [row] : [])));
    // '2026-01-1' is a piece of an id and not three words in any order.
    if (byId.size > 0 && /[^\p{L}\p{N}]/u.test(part)) return byId;
    const byText = index.search(word, { prefix: true, combineWith: 'AND' }).map((hit) => hit.id as number);
    return new Set([...byId, ...byText]);
  };

  const matchesWords = (): ((row: number) => boolean) => {
    const sets = state.words
      .split(/\s+/)
      .filter((word) => word !== '')
      .map(search);
    return (row) => sets.every((set) => set.has(row));
  };
  const matchesFacet = (facet: string, row: number): boolean => {
    const chosen = state.chosen[facet] ?? [];
    return chosen.length === 0 || (data.facets[facet]![row] ?? []).some((value) => chosen.includes(value));
  };

  const update = (): void => {
    const inWords = matchesWords();
    const shown = rows.map((_, row) => inWords(row) && facetIds.every((facet) => matchesFacet(facet, row)));
    rows.forEach((row, at) => {
      row.hidden = !shown[at];
    });
    for (const facet of facetIds) {
      // Counts of one facet under the words and the other facets: what a further choice would show.
      const counts = new Map<string, number>();
      rows.forEach((_, row) => {
        if (!inWords(row) || !facetIds.every((other) => other === facet || matchesFacet(other, row))) return;
        for (const value of data.facets[facet]![row] ?? []) counts.set(value, (counts.get(value) ?? 0) + 1);
      });
      for (const button of choicesOf(facet)) {
        const value = button.dataset['value']!;
        const count = counts.get(value) ?? 0;
        const pressed = (state.chosen[facet] ?? []).includes(value);
        button.setAttribute('aria-pressed', String(pressed));
        button.classList.toggle('none', count === 0 && !pressed);
        if (pressed) button.closest('li')!.hidden = false;
        const place = button.querySelector('.count');
        if (place) place.textContent = whole(count);
      }
    }
    status.textContent = shownText(data, shown);
    const narrowed = state.words !== '' || facetIds.some((facet) => (state.chosen[facet] ?? []).length > 0);
    clear.hidden = !narrowed;
    nothing.hidden = shown.some((one) => one);
  };

  const sort = (): void => {
    const { column, descending } = state.sort;
    const values = data.columns[column]!;
    const sequence = rows.map((_, row) => row);
    sequence.sort((a, b) => compare(values[a]!, values[b]!, descending) || a - b);
    table.tBodies[0]!.append(...sequence.map((row) => rows[row]!));
    for (const head of table.tHead!.querySelectorAll<HTMLElement>('th[data-sort]')) {
      if (head.dataset['sort'] === column) head.setAttribute('aria-sort', descending ? 'descending' : 'ascending');
      else head.removeAttribute('aria-sort');
    }
    order.value = descending ? `${column}.desc` : column;
  };

  const choicesOf = (facet: string): HTMLButtonElement[] => [
    ...finder.querySelectorAll<HTMLButtonElement>(`[data-facet="${facet}"] button[data-value]`),
  ];

  const change = (next: TableState): void => {
    const sorted = next.sort.column !== state.sort.column || next.sort.descending !== state.sort.descending;
    state = next;
    const query = writeState(state, columnIds);
    history.replaceState(null, '', `${location.pathname}${query}${location.hash}`);
    if (sorted) sort();
    update();
  };

  for (const head of table.tHead!.querySelectorAll<HTMLElement>('th[data-sort]')) {
    const button = document.createElement('button');
    button.type = 'button';
    button.append(...head.childNodes);
    head.append(button);
    button.addEventListener('click', () => {
      const column = head.dataset['sort']!;
      const descending = state.sort.column === column && !state.sort.descending;
      change({ ...state, sort: { column, descending } });
    });
  }
  order.addEventListener('change', () => {
    const [column = '', way] = order.value.split('.');
    change({ ...state, sort: { column, descending: way === 'desc' } });
  });
  words.value = state.words;
  words.addEventListener('input', () => change({ ...state, words: words.value.trim() }));
  for (const facet of facetIds)
    for (const button of choicesOf(facet))
      button.addEventListener('click', () => {
        const value = button.dataset['value']!;
        const before = state.chosen[facet] ?? [];
        const after = before.includes(value) ? before.filter((one) => one !== value) : [...before, value];
        change({ ...state, chosen: { ...state.chosen, [facet]: after } });
      });
  for (const more of finder.querySelectorAll<HTMLButtonElement>('[data-more]')) {
    const label = more.textContent;
    more.addEventListener('click', () => {
      const open = more.getAttribute('aria-expanded') !== 'true';
      more.setAttribute('aria-expanded', String(open));
      more.textContent = open ? 'fewer' : label;
      for (const item of more.closest('ul')!.querySelectorAll<HTMLLIElement>('[data-further]'))
        item.hidden = !open && item.querySelector('[aria-pressed="true"]') === null;
    });
  }
  const further = document.getElementById('further');
  further?.addEventListener('click', () => {
    further.setAttribute('aria-expanded', String(finder.classList.toggle('open')));
  });
  clear.addEventListener('click', () => {
    words.value = '';
    change({ ...state, words: '', chosen: {} });
    words.focus();
  });

  sort();
  update();
}

function indexOf(data: CellsData): MiniSearch {
  const index = new MiniSearch({ fields: ['facts', 'notes'], tokenize: tokens, processTerm: (term) => term });
  index.addAll(
    data.ids.map((id, row) => ({ id: row, facts: `${id} ${data.facts[row] ?? ''}`, notes: data.notes[row] ?? '' })),
  );
  return index;
}

/** Numbers as numbers, text by code points, missing last either way. */
function compare(a: string | number | null, b: string | number | null, descending: boolean): number {
  if (a === null || b === null) return a === b ? 0 : a === null ? 1 : -1;
  const way = a < b ? -1 : a > b ? 1 : 0;
  return descending ? -way : way;
}

function shownText(data: CellsData, shown: boolean[]): string {
  const cells = shown.filter((one) => one).length;
  const stated = data.subjects.filter((subject, row) => shown[row] && subject !== '');
  const text = sizesText({ cells, subjects: new Set(stated).size, withoutSubject: cells - stated.length });
  return cells === shown.length ? text : `${text}, of ${whole(shown.length)} in the archive`;
}

if (data && table && finder) start(data, table, finder);
