/** Lines of a text file as bytes, whatever its encoding and line ends, without holding the file. */
import { closeSync, openSync, readSync, statSync } from 'node:fs';
import { FormatError } from './problems.ts';

export type Encoding = 'utf-8' | 'utf-16le' | 'utf-16be';

const chunkBytes = 1 << 20;

/** Encoding by its mark, or by the zero bytes that two-byte text has in every second place. */
export function findEncoding(head: Uint8Array): { encoding: Encoding; skip: number } {
  if (head[0] === 0xff && head[1] === 0xfe) return { encoding: 'utf-16le', skip: 2 };
  if (head[0] === 0xfe && head[1] === 0xff) return { encoding: 'utf-16be', skip: 2 };
  if (head[0] === 0xef && head[1] === 0xbb && head[2] === 0xbf) return { encoding: 'utf-8', skip: 3 };
  let even = 0;
  let odd = 0;
  for (let index = 0; index < head.length; index++) if (head[index] === 0) index % 2 === 0 ? even++ : odd++;
  const half = head.length / 2;
  if (head.length >= 4 && odd > 0.9 * half && even === 0) return { encoding: 'utf-16le', skip: 0 };
  if (head.length >= 4 && even > 0.9 * half && odd === 0) return { encoding: 'utf-16be', skip: 0 };
  return { encoding: 'utf-8', skip: 0 };
}

/** Chunks of the file as UTF-8 (or, where it never was, as the bytes that stand there). */
function* chunks(path: string): Generator<Uint8Array> {
  const descriptor = openSync(path, 'r');
  try {
    const buffer = Buffer.alloc(chunkBytes);
    let position = 0;
    let read = readSync(descriptor, buffer, 0, chunkBytes, position);
    const { encoding, skip } = findEncoding(buffer.subarray(0, Math.min(read, 4096)));
    const decoder = encoding === 'utf-8' ? null : new TextDecoder(encoding);
    const encoder = new TextEncoder();
    let from = skip;
    while (read > 0) {
      const bytes = buffer.subarray(from, read);
      yield decoder ? encoder.encode(decoder.decode(bytes, { stream: true })) : bytes;
      position += read;
      from = 0;
      read = readSync(descriptor, buffer, 0, chunkBytes, position);
    }
  } finally {
    closeSync(descriptor);
  }
}

const lineFeed = 0x0a;
const carriageReturn = 0x0d;

/**
 * Calls `take` with each line: the bytes it lies in, where it begins and ends, and its number from 1. The bytes are
 * only valid during the call. CR, LF and CRLF end a line. `take` returns false to stop.
 */
export function eachLine(
  path: string,
  take: (bytes: Uint8Array, from: number, to: number, line: number) => boolean | undefined,
): void {
  let rest: Uint8Array = new Uint8Array(0);
  let line = 0;
  let skipLineFeed = false;
  for (const chunk of chunks(path)) {
    let bytes = chunk;
    if (rest.length > 0) {
      bytes = new Uint8Array(rest.length + chunk.length);
      bytes.set(rest);
      bytes.set(chunk, rest.length);
    }
    // What was carried over holds no line end: the search goes on behind it.
    let at = rest.length;
    let from = 0;
    for (; at < bytes.length; at++) {
      const byte = bytes[at]!;
      if (byte !== lineFeed && byte !== carriageReturn) continue;
      if (skipLineFeed && byte === lineFeed && at === from) {
        skipLineFeed = false;
        from = at + 1;
        continue;
      }
      skipLineFeed = byte === carriageReturn;
      line++;
      if (take(bytes, from, at, line) === false) return;
      from = at + 1;
    }
    // A copy: the chunk's buffer is filled again. (A Buffer's own slice would not copy.)
    rest = Uint8Array.from(bytes.subarray(from));
    if (rest.length > 0) skipLineFeed = false;
  }
  if (rest.length > 0) take(rest, 0, rest.length, line + 1);
}

/** Text of some bytes: UTF-8, or where they are none, the Western single-byte encoding that older programs write. */
export function textOf(bytes: Uint8Array): string {
  try {
    return new TextDecoder('utf-8', { fatal: true }).decode(bytes);
  } catch {
    return new TextDecoder('windows-1252').decode(bytes);
  }
}

export interface Head {
  /** The first lines; `lines[k]` is line k + 1 of the file. */
  lines: string[];
  bytes: number;
  encoding: Encoding;
  /** False where the file goes on behind these lines. */
  whole: boolean;
}

/**
 * The beginning of a file, enough to find out how it is written.
 *
 * @throws FormatError where it is empty or no text
 */
export function readHead(path: string, most = 800, mostCharacters = 1 << 20): Head {
  const { size } = statSync(path);
  if (size === 0)
    throw new FormatError({
      code: 'FILE_EMPTY',
      place: '',
      message: 'The file is empty (0 bytes).',
      remedy: 'Copy it again from where it was recorded, or remove it.',
    });
  const descriptor = openSync(path, 'r');
  const start = Buffer.alloc(Math.min(size, 4096));
  try {
    readSync(descriptor, start, 0, start.length, 0);
  } finally {
    closeSync(descriptor);
  }
  const { encoding } = findEncoding(start);
  if (encoding === 'utf-8' && start.includes(0))
    throw new FormatError({
      code: 'NOT_TEXT',
      place: '',
      message: 'The file is no text: it holds bytes that are zero.',
      remedy: 'Give it the ending it should have, or export the traces as text or NWB.',
    });
  const lines: string[] = [];
  let characters = 0;
  let whole = true;
  eachLine(path, (bytes, from, to) => {
    if (lines.length >= most || characters > mostCharacters) {
      whole = false;
      return false;
    }
    lines.push(textOf(bytes.subarray(from, to)));
    characters += to - from;
    return true;
  });
  return { lines, bytes: size, encoding, whole };
}
