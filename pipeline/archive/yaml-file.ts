/**
 * YAML 1.2 as a tree that remembers where everything stands and how it was written. `cell: 007` is the text "007"
 * for whoever asks for text and the number 7 for whoever asks for a number; no date is ever made of a text.
 */
import {
  type Alias,
  isAlias,
  isMap,
  isScalar,
  isSeq,
  LineCounter,
  type Node,
  parseDocument,
  type YAMLError,
} from 'yaml';
import type { Problem } from '../formats/types.ts';

/** `id` stays with a block while parts of it are taken out. */
export type Tree =
  | { kind: 'map'; id: number; line: number; entries: Map<string, { line: number; node: Tree }> }
  | { kind: 'list'; id: number; line: number; items: Tree[] }
  | { kind: 'scalar'; line: number; value: unknown; source: string };

/** Something wrong with one of the archive's own files. */
export type ArchiveProblem = Problem & { path: string; line: number | null };

/** A problem that leaves the rest of the file in force. */
export const remark = (
  path: string,
  line: number | null,
  code: string,
  place: string,
  message: string,
  remedy: string,
): ArchiveProblem => ({ code, weight: 'warns', place, message, remedy, path, line });

/** A problem that costs the whole file. */
export const loss = (
  path: string,
  line: number | null,
  code: string,
  message: string,
  remedy: string,
): ArchiveProblem => ({ code, weight: 'blocks', place: '', message, remedy, path, line });

/** Larger files are not YAML a person wrote. */
const largestBytes = 8 * 1024 * 1024;
/** Aliases may unfold into at most this many nodes: a few lines can otherwise stand for billions. */
const mostBorrowed = 20_000;
const deepest = 64;

class TooMuch extends Error {}
class Nameless extends Error {
  readonly line: number;
  constructor(message: string, line: number) {
    super(message);
    this.line = line;
  }
}

/**
 * Reads the text of one YAML file.
 *
 * @param path shown in problems
 * @returns `tree` null for a file without contents, and for one that could not be read, which has a `blocks` problem
 */
export function readYaml(path: string, bytes: Uint8Array): { tree: Tree | null; problems: ArchiveProblem[] } {
  const repair = 'Nothing in this file was used. Repair the line and build again.';
  if (bytes.length > largestBytes)
    return failed(
      loss(
        path,
        null,
        'YAML_TOO_LARGE',
        `The file is larger than 8 MiB.`,
        'Nothing in this file was used. Split it, or check that it is the right file.',
      ),
    );
  let text: string;
  try {
    text = decodeUtf(bytes);
  } catch {
    return failed(
      loss(
        path,
        null,
        'YAML_NOT_UTF8',
        'The file is not UTF-8 text.',
        'Nothing in this file was used. Save it as UTF-8.',
      ),
    );
  }
  const lines = new LineCounter();
  try {
    if (nesting(text) > deepest * 4) throw new TooMuch('brackets');
    const document = parseDocument(text, {
      lineCounter: lines,
      prettyErrors: false,
      uniqueKeys: true,
      strict: true,
      version: '1.2',
      schema: 'core',
      // With 'silent' a second document would go unnoticed.
      logLevel: 'error',
    });
    const [first] = document.errors;
    if (first) {
      const { line } = lines.linePos(first.pos[0]);
      return failed(
        loss(
          path,
          line || null,
          first.code === 'DUPLICATE_KEY' ? 'YAML_KEY_TWICE' : 'YAML_UNREADABLE',
          inWords(first, text),
          repair,
        ),
      );
    }
    const problems = document.warnings.map((warning) =>
      remark(
        path,
        lines.linePos(warning.pos[0]).line || null,
        'YAML_TAG',
        '',
        `${firstSentence(warning.message)}.`,
        'Remove the tag that begins with "!".',
      ),
    );
    if (document.contents === null) return { tree: null, problems };
    let nodes = 0;
    let unfolded = 0;
    const targets = new Map<Node, Node | undefined>();
    const lineOf = (node: Node): number => (node.range ? lines.linePos(node.range[0]).line || 1 : 1);
    const grow = (node: Node | null | undefined, depth: number, fallback: number, borrowed: boolean): Tree => {
      nodes++;
      if (borrowed) unfolded++;
      if (unfolded > mostBorrowed || depth > deepest) throw new TooMuch('nodes');
      if (!node) return { kind: 'scalar', line: fallback, value: null, source: '' };
      if (isAlias(node)) {
        if (!targets.has(node)) targets.set(node, (node as Alias).resolve(document) as Node | undefined);
        const target = targets.get(node);
        if (!target) throw new Nameless(`"*${node.source}" refers to an anchor that is not there`, lineOf(node));
        return grow(target, depth + 1, lineOf(node), true);
      }
      const line = lineOf(node);
      const id = nodes;
      if (isMap(node)) {
        const entries = new Map<string, { line: number; node: Tree }>();
        for (const pair of node.items) {
          const key = pair.key as Node | null;
          const name = key && isScalar(key) ? (key.source ?? String(key.value)) : '(a key that is not one word)';
          const at = key ? lineOf(key) : line;
          entries.set(name, { line: at, node: grow(pair.value as Node | null, depth + 1, at, borrowed) });
        }
        return { kind: 'map', id, line, entries };
      }
      if (isSeq(node))
        return {
          kind: 'list',
          id,
          line,
          items: node.items.map((item) => grow(item as Node, depth + 1, line, borrowed)),
        };
      if (isScalar(node))
        return { kind: 'scalar', line, value: node.value, source: node.source ?? String(node.value ?? '') };
      return { kind: 'scalar', line, value: null, source: '' };
    };
    const tree = grow(document.contents as Node, 0, 1, false);
    if (tree.kind === 'scalar' && tree.value === null) return { tree: null, problems };
    return { tree, problems };
  } catch (error) {
    if (error instanceof Nameless)
      return failed(loss(path, error.line, 'YAML_UNREADABLE', `${error.message}.`, repair));
    // Whatever else the parser throws on (its own recursion included) is about this text and nothing else.
    const what =
      error instanceof TooMuch || error instanceof RangeError
        ? 'The file is nested too deeply or its aliases unfold into too much.'
        : `The file cannot be parsed as YAML (${error instanceof Error ? firstSentence(error.message) : 'no reason given'}).`;
    return failed(loss(path, null, 'YAML_UNREADABLE', what, repair));
  }
}

const failed = (problem: ArchiveProblem): { tree: null; problems: ArchiveProblem[] } => ({
  tree: null,
  problems: [problem],
});

/** Text of UTF-8 or marked UTF-16 bytes, without the mark. @throws TypeError where the bytes are neither */
export function decodeUtf(bytes: Uint8Array): string {
  const label =
    bytes[0] === 0xff && bytes[1] === 0xfe ? 'utf-16le' : bytes[0] === 0xfe && bytes[1] === 0xff ? 'utf-16be' : 'utf-8';
  return new TextDecoder(label, { fatal: true }).decode(bytes);
}

/** Deepest run of opening brackets, so that no parser is handed a text made to exhaust it. */
function nesting(text: string): number {
  let depth = 0;
  let most = 0;
  for (const letter of text) {
    if (letter === '[' || letter === '{') most = Math.max(most, ++depth);
    else if ((letter === ']' || letter === '}') && depth > 0) depth--;
  }
  return most;
}

const firstSentence = (message: string): string => message.split('\n')[0]!.replace(/[.:]\s*$/, '');

function inWords(error: YAMLError, text: string): string {
  const line = text
    .slice(text.lastIndexOf('\n', error.pos[0] - 1) + 1)
    .split('\n')[0]!
    .trimEnd();
  const seen = line.trim() === '' ? '' : `: ${line.length > 80 ? `${line.slice(0, 79)}…` : line.trim()}`;
  const { code, message } = error;
  const said = ((): string => {
    if (code === 'DUPLICATE_KEY') return 'The same key stands twice in one block';
    if (code === 'TAB_AS_INDENT') return 'The line is indented with a tab; YAML wants spaces';
    if (code === 'MULTIPLE_DOCS') return 'A second document begins with "---"; only one is expected';
    if (code === 'BLOCK_AS_IMPLICIT_KEY') return 'A text that holds ": " needs quotation marks around it';
    if (code === 'MULTILINE_IMPLICIT_KEY') return 'A line is neither "key: value" nor an entry that begins with "-"';
    const open = /end with a? ?([}\]])/.exec(message)?.[1];
    if (open) return `A "${open === '}' ? '{' : '['}" is opened here or above and not closed`;
    if (code === 'MISSING_CHAR' && /quote/.test(message))
      return 'A quotation mark is opened here or above and not closed';
    if (code === 'BAD_INDENT') return 'The line is indented differently from its block';
    return firstSentence(message);
  })();
  return seen === '' ? `${said}.` : `${said}${seen}`;
}

/** The tree as plain data for a schema: scalars as YAML 1.2 reads them, blocks as objects without a prototype. */
export function plain(tree: Tree): unknown {
  if (tree.kind === 'scalar') return tree.value;
  if (tree.kind === 'list') return tree.items.map(plain);
  const block = Object.create(null) as Record<string, unknown>;
  for (const [key, { node }] of tree.entries) block[key] = plain(node);
  return block;
}

export type Step = string | number;

/** The node at a path, undefined where there is none. */
export function nodeAt(tree: Tree, path: readonly Step[]): Tree | undefined {
  let node: Tree | undefined = tree;
  for (const step of path) {
    if (node?.kind === 'map') node = node.entries.get(String(step))?.node;
    else if (node?.kind === 'list') node = node.items[Number(step)];
    else return undefined;
  }
  return node;
}

/** Line of the key (or list item) at a path, or of the nearest block above it that exists. */
export function lineAt(tree: Tree, path: readonly Step[]): number {
  for (let length = path.length; length > 0; length--) {
    const parent = nodeAt(tree, path.slice(0, length - 1));
    const step = path[length - 1]!;
    if (parent?.kind === 'map') {
      const entry = parent.entries.get(String(step));
      if (entry) return entry.line;
    }
    if (parent?.kind === 'list' && parent.items[Number(step)]) return parent.items[Number(step)]!.line;
  }
  return tree.line;
}

/** The same tree without what stands at a path. */
export function without(tree: Tree, path: readonly Step[]): Tree {
  const [step, ...rest] = path;
  if (step === undefined) return tree;
  if (tree.kind === 'map') {
    const entry = tree.entries.get(String(step));
    if (!entry) return tree;
    const entries = new Map(tree.entries);
    if (rest.length === 0) entries.delete(String(step));
    else entries.set(String(step), { line: entry.line, node: without(entry.node, rest) });
    return { ...tree, entries };
  }
  if (tree.kind === 'list') {
    const at = Number(step);
    const items =
      rest.length === 0
        ? tree.items.filter((_, index) => index !== at)
        : tree.items.map((item, index) => (index === at ? without(item, rest) : item));
    return { ...tree, items };
  }
  return tree;
}
