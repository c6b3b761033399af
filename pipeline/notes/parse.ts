/** A Markdown note becomes sanitised HTML, searchable text, links, figures and a list of what is wrong with it. */
import type { Element, Root as HtmlRoot } from 'hast';
import type { Heading, Nodes, Paragraph, Root } from 'mdast';
import { toString as plainText } from 'mdast-util-to-string';
import rehypeSanitize, { defaultSchema, type Options as Schema } from 'rehype-sanitize';
import rehypeStringify from 'rehype-stringify';
import remarkFrontmatter from 'remark-frontmatter';
import remarkGfm from 'remark-gfm';
import remarkParse from 'remark-parse';
import remarkRehype from 'remark-rehype';
import { unified } from 'unified';
import { SKIP, visit } from 'unist-util-visit';
import type { NoteFigure, NoteRow } from '../ledger/types.ts';
import { type Address, linkAddress, pictureAddress, type Surroundings } from './addresses.ts';
import { readFigure } from './figures.ts';
import { isoDate, readFrontMatter } from './front-matter.ts';
import { type NoteProblem, nearest } from './problems.ts';

const reader = unified().use(remarkParse).use(remarkGfm).use(remarkFrontmatter, ['yaml']).freeze();

/** What may stand in a note. Raw HTML never gets this far; this holds even if it did. */
const schema: Schema = {
  ...defaultSchema,
  tagNames: [...(defaultSchema.tagNames ?? []), 'figure'],
  attributes: { ...defaultSchema.attributes, figure: ['dataFigure'] },
  protocols: {
    ...defaultSchema.protocols,
    href: ['http', 'https', 'mailto', 'cell', 'note', 'quantity', 'file'],
    src: ['file'],
  },
  // remark-rehype owns the prefix: twice would break footnotes.
  clobberPrefix: '',
};
const sanitizer = unified().use(rehypeSanitize, schema).freeze();
const printer = unified().use(rehypeStringify).freeze();

/** Ids of footnotes are made unique across notes, since a page may hold several. */
const prefixOf = (id: string): string => `${id.replace(/[^A-Za-z0-9]+/g, '-').replace(/^-|-$/g, '') || 'note'}-`;

const lineOf = (node: { position?: { start: { line: number } } | undefined }): number | null =>
  node.position?.start.line ?? null;

export interface NoteInput {
  /** Path inside the archive: 'notes/2026/week-05.md'. */
  path: string;
  text: string;
  cellIds: ReadonlySet<string>;
  /** Ids of all notes: paths below notes/ without '.md'. */
  noteIds: ReadonlySet<string>;
  fileExists: (archivePath: string) => boolean;
}

/** Blocks in reading order, one a line, for search and excerpts. */
function searchText(root: Root): string {
  const lines: string[] = [];
  visit(root, (node: Nodes) => {
    if (node.type === 'html' || node.type === 'yaml') return SKIP;
    if (node.type === 'paragraph' || node.type === 'heading' || node.type === 'tableCell' || node.type === 'code') {
      const line = plainText(node, { includeHtml: false }).replace(/\s+/g, ' ').trim();
      if (line) lines.push(line);
      return SKIP;
    }
    return undefined;
  });
  return lines.join('\n');
}

/** Takes the title out of the body and lets the body's headings begin at the second level, below the page's own. */
function settleHeadings(root: Root, stated: string | null): string | null {
  const headings: Heading[] = [];
  visit(root, 'heading', (node) => void headings.push(node));
  const first = root.children.findIndex((node) => node.type !== 'yaml');
  const opening = root.children[first];
  let title = stated;
  if (opening?.type === 'heading' && opening.depth === 1) {
    const text = plainText(opening).trim();
    if (title === null || title === text) {
      title = text || null;
      root.children.splice(first, 1);
      headings.shift();
    }
  }
  if (headings.some((heading) => heading.depth === 1))
    for (const heading of headings) heading.depth = Math.min(6, heading.depth + 1) as Heading['depth'];
  return title;
}

interface Drawn {
  figures: NoteFigure[];
  problems: NoteProblem[];
}

/** Sweep blocks become placeholders; raw HTML, which is never printed, is said to be left out. */
function placeFigures(root: Root, cellIds: ReadonlySet<string>): Drawn {
  const drawn: Drawn = { figures: [], problems: [] };
  visit(root, (node: Nodes, index, parent) => {
    // A comment is no loss, and a closing tag was announced by its opening one.
    if (node.type === 'html' && !/^(?:<!--[\s\S]*-->|<\/[a-z][\w-]*\s*>)$/i.test(node.value.trim()))
      drawn.problems.push({
        line: lineOf(node),
        message: `Raw HTML is left out: "${node.value.trim().slice(0, 40)}".`,
        remedy: 'Write it in Markdown; between backticks it is shown as text.',
      });
    if (node.type !== 'code' || node.lang?.toLowerCase() !== 'sweep' || !parent || index === undefined) return;
    const { figure, caption, problems } = readFigure(node.value, (lineOf(node) ?? 1) + 1, cellIds);
    drawn.problems.push(...problems);
    const words = figure ? caption : `Figure left out. ${caption}`.trim();
    const replacement: Paragraph = { type: 'paragraph', children: [{ type: 'text', value: words }] };
    if (node.position) replacement.position = node.position;
    if (figure) {
      // The caption stays in the tree for the search text; the element itself is empty.
      replacement.data = {
        hName: 'figure',
        hProperties: { dataFigure: String(drawn.figures.length) },
        hChildren: [],
      };
      drawn.figures.push(figure);
    }
    parent.children[index] = replacement;
  });
  return drawn;
}

interface Followed {
  cells: string[];
  links: string[];
  images: string[];
  problems: NoteProblem[];
}

/** Every link and picture is followed; what leads nowhere keeps its words and loses its address. */
function follow(root: HtmlRoot, around: Surroundings): Followed {
  const followed: Followed = { cells: [], links: [], images: [], problems: [] };
  const take = (address: Address, node: Element): boolean => {
    if (address.kind === 'broken') {
      followed.problems.push({ line: lineOf(node), message: address.message, remedy: address.remedy });
      return false;
    }
    if (address.kind === 'cell') followed.cells.push(address.id);
    if (address.kind === 'note') followed.links.push(address.id);
    if (address.kind === 'file') followed.images.push(address.id);
    return true;
  };
  visit(root, 'element', (node: Element, index, parent) => {
    if (!parent || index === undefined) return undefined;
    if (node.tagName === 'a' && typeof node.properties['href'] === 'string') {
      const written = node.properties['href'];
      const address = linkAddress(written, around);
      if (!take(address, node)) {
        parent.children.splice(index, 1, ...node.children);
        return index; // what stood inside is visited in its new place
      }
      if (address.kind !== 'broken') node.properties['href'] = address.href;
      const only = node.children[0];
      // '<cell:ID>' shows the id, not the scheme.
      if ((address.kind === 'cell' || address.kind === 'note') && node.children.length === 1 && only?.type === 'text')
        if (only.value === written || only.value === `${address.kind}:${address.id}`) only.value = address.id;
    }
    if (node.tagName === 'img') {
      const written = String(node.properties['src'] ?? '');
      const alt = String(node.properties['alt'] ?? '');
      const address = pictureAddress(written, around);
      if (!take(address, node)) {
        parent.children[index] = { type: 'text', value: alt ? `[${alt}]` : '[picture left out]' };
        return undefined;
      }
      if (address.kind === 'file') node.properties['src'] = address.href;
      if (alt.trim() === '')
        followed.problems.push({
          line: lineOf(node),
          message: `The picture "${written}" has no description for those who cannot see it.`,
          remedy: 'Write what it shows between the square brackets: ![two spikes](file.png).',
        });
    }
    return undefined;
  });
  return followed;
}

/** '<' and '>' inside attributes are escaped too, so that a tag ends at its first '>'. */
const withTightTags = (html: string): string =>
  html.replace(/<[a-z][a-z0-9]*(?:\s+[\w:-]+(?:="[^"]*")?)*\s*\/?>/g, (tag) => {
    const inside = tag.slice(1, -1);
    return `<${inside.replaceAll('<', '&lt;').replaceAll('>', '&gt;')}>`;
  });

const unique = (values: string[]): string[] => [...new Set(values)];

/**
 * Reads one note.
 * @param input its path inside the archive, its text, and what it may refer to
 * @returns a row for the ledger. Its HTML holds no raw HTML of the author's, no script and no address but http(s),
 * mailto, `cell:`, `note:` and `quantity:` (names percent-encoded) and `file:` (path inside the archive, likewise);
 * figures stand as `<figure data-figure="N"></figure>`. Everything wrong is a problem with its line; nothing throws.
 */
export function parseNote(input: NoteInput): NoteRow {
  const id = input.path.replace(/^notes\//, '').replace(/\.md$/i, '');
  const fallbackTitle = id.split('/').at(-1)!;
  try {
    return read(input, id, fallbackTitle);
  } catch (error) {
    // Only nesting deeper than the call stack gets here; the words are kept, as text.
    return {
      id,
      path: input.path,
      title: fallbackTitle,
      date: isoDate(fallbackTitle.slice(0, 10)),
      author: null,
      html: '',
      text: input.text,
      cells: [],
      links: [],
      figures: [],
      images: [],
      problems: [
        {
          line: null,
          message: `The note could not be read: ${error instanceof Error ? error.message : String(error)}.`,
          remedy: 'Simplify its nesting: lists and quotations within each other.',
        },
      ],
    };
  }
}

function read(input: NoteInput, id: string, fallbackTitle: string): NoteRow {
  const text = input.text.replace(/^\uFEFF/, '');
  const root = reader.parse(text) as Root;
  const problems: NoteProblem[] = [];

  const head = root.children[0];
  const { matter, problems: headProblems } =
    head?.type === 'yaml' ? readFrontMatter(head.value, (lineOf(head) ?? 1) + 1) : readFrontMatter('', 1);
  problems.push(...headProblems);
  if (head?.type !== 'yaml' && /^---[ \t]*\r?\n[ \t]*\w+[ \t]*:/.test(text))
    problems.push({
      line: 1,
      message: 'The front matter that begins here does not end.',
      remedy: 'Close it with a line of three dashes: ---',
    });

  const title = settleHeadings(root, matter.title) ?? fallbackTitle;
  const { figures, problems: figureProblems } = placeFigures(root, input.cellIds);
  problems.push(...figureProblems);
  const searchable = searchText(root);

  const tree = unified()
    .use(remarkRehype, { clobberPrefix: prefixOf(id) })
    .runSync(root) as HtmlRoot;
  const followed = follow(tree, input);
  problems.push(...followed.problems);
  const html = withTightTags(printer.stringify(sanitizer.runSync(tree) as HtmlRoot));

  const stated: string[] = [];
  for (const { id: cell, line } of matter.cells) {
    if (input.cellIds.has(cell)) stated.push(cell);
    else
      problems.push({
        line,
        message: `"${cell}" under "cells" is no cell of this archive.${nearest(cell, input.cellIds)}`,
        remedy: 'Correct the id; "list" prints the ids in use.',
      });
  }
  return {
    id,
    path: input.path,
    title,
    date: matter.date ?? isoDate(fallbackTitle.slice(0, 10)),
    author: matter.author,
    ...(matter.tags.length > 0 ? { tags: unique(matter.tags) } : {}),
    html,
    text: searchable,
    cells: unique([...stated, ...followed.cells, ...figures.map((figure) => figure.cell)]),
    links: unique(followed.links),
    figures,
    images: unique(followed.images),
    problems: problems.sort((a, b) => (a.line ?? 0) - (b.line ?? 0)),
  };
}
