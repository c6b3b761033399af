/** Where a link or picture of a note leads: decided here, once, before anything is printed. */
import { isQuantity, quantities } from '../measure/quantities.ts';
import { nearest } from './problems.ts';

export interface Surroundings {
  /** Path of the note inside the archive. */
  path: string;
  cellIds: ReadonlySet<string>;
  noteIds: ReadonlySet<string>;
  fileExists: (archivePath: string) => boolean;
}

export type Address =
  | { kind: 'cell' | 'note' | 'file'; href: string; id: string }
  | { kind: 'plain'; href: string }
  | { kind: 'broken'; message: string; remedy: string };

const picture = /\.(?:png|jpe?g|gif|webp|avif|svg)$/i;

export function decoded(text: string): string {
  try {
    return decodeURIComponent(text);
  } catch {
    return text; // a lone percent sign: the name as it stands
  }
}

/** Path inside the archive for a path written in a note; null where it leads out of the archive. */
export function archivePath(from: string, written: string): string | null {
  const parts = written.startsWith('/') ? [] : from.split('/').slice(0, -1);
  for (const part of written.replaceAll('\\', '/').split('/')) {
    if (part === '' || part === '.') continue;
    if (part === '..') {
      if (parts.pop() === undefined) return null;
    } else parts.push(part);
  }
  return parts.join('/');
}

const noteId = (archive: string): string => archive.replace(/^notes\//, '').replace(/\.md$/i, '');
const encodedPath = (path: string): string => path.split('/').map(encodeURIComponent).join('/');

/** Control characters and spaces, which browsers ignore inside a scheme: 'java\tscript:'. */
// biome-ignore lint/suspicious/noControlCharactersInRegex: they are what must go
const ignored = /[\u0000-\u0020\u007f-\u00a0\u200b-\u200f\u2028-\u202f\ufeff]/g;

/** What a link leads to. */
export function linkAddress(written: string, around: Surroundings): Address {
  const bare = written.replace(ignored, '');
  const scheme = /^([a-z][a-z0-9+.-]*):/i.exec(bare)?.[1]?.toLowerCase();
  if (written.startsWith('#')) return { kind: 'plain', href: written };
  if (scheme === 'http' || scheme === 'https' || scheme === 'mailto') return { kind: 'plain', href: written };
  if (scheme === 'cell' || scheme === 'note') {
    const [name = '', fragment] = written.slice(written.indexOf(':') + 1).split('#');
    const id = decoded(name).trim();
    const known = scheme === 'cell' ? around.cellIds : around.noteIds;
    if (!known.has(id))
      return {
        kind: 'broken',
        message: `The link "${scheme}:${id}" leads to no ${scheme} of this archive.${nearest(id, known)}`,
        remedy: 'Correct the id, or delete the link.',
      };
    const tail = fragment && /^[\w-]+$/.test(fragment) ? `#${fragment}` : '';
    return { kind: scheme, href: `${scheme}:${encodeURIComponent(id)}${tail}`, id };
  }
  if (scheme === 'quantity') {
    const id = decoded(written.slice(written.indexOf(':') + 1)).trim();
    if (isQuantity(id)) return { kind: 'plain', href: `quantity:${id}` };
    return {
      kind: 'broken',
      message: `The link "quantity:${id}" names no quantity.${nearest(
        id,
        quantities.map((one) => one.id),
      )}`,
      remedy: 'Correct the id; the methods page lists them.',
    };
  }
  if (scheme !== undefined || bare.startsWith('//'))
    return {
      kind: 'broken',
      message: `The link "${written.slice(0, 60)}" begins with what is not followed here; its text stays.`,
      remedy: 'Link to cell:ID, note:ID, quantity:ID, another note’s file, a picture, or an https: address.',
    };
  const path = archivePath(around.path, decoded(written.replace(/[?#].*$/s, '')));
  if (path !== null && /\.md$/i.test(path) && around.noteIds.has(noteId(path)))
    return { kind: 'note', href: `note:${encodeURIComponent(noteId(path))}`, id: noteId(path) };
  if (path !== null && picture.test(path) && around.fileExists(path))
    return { kind: 'file', href: `file:${encodedPath(path)}`, id: path };
  const exists = path !== null && path !== '' && around.fileExists(path);
  return {
    kind: 'broken',
    message: exists
      ? `The link "${written}" leads to a file that the site does not carry.`
      : `The link "${written}" leads to no note or picture of this archive.`,
    remedy: 'Paths count from the note’s own folder. Link to cell:ID, note:ID, another note’s file or a picture.',
  };
}

/** What a picture shows: a file of the archive, never an address elsewhere. */
export function pictureAddress(written: string, around: Surroundings): Address {
  const bare = written.replace(ignored, '');
  if (/^(?:[a-z][a-z0-9+.-]*:|\/\/)/i.test(bare))
    return {
      kind: 'broken',
      message: `The picture "${written.slice(0, 60)}" is not a file of the archive and is left out.`,
      remedy: 'Save it beside the note and write its file name.',
    };
  const path = archivePath(around.path, decoded(written.replace(/[?#].*$/s, '')));
  if (path === null || path === '')
    return {
      kind: 'broken',
      message: `The picture "${written}" lies outside the archive and is left out.`,
      remedy: 'Save it beside the note and write its file name.',
    };
  if (!picture.test(path))
    return {
      kind: 'broken',
      message: `"${written}" is no picture (png, jpg, gif, webp, avif, svg) and is left out.`,
      remedy: 'Save it as one of these, or link to it instead.',
    };
  if (!around.fileExists(path))
    return {
      kind: 'broken',
      message: `The picture "${path}" is not in the archive.`,
      remedy: 'Paths count from the note’s own folder. Correct the name, or put the file there.',
    };
  return { kind: 'file', href: `file:${encodedPath(path)}`, id: path };
}
