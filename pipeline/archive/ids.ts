/** Ids of cells that nobody named. */
import { urlSafeId } from './fact-keys.ts';

/** Ids that differ only in case would be one page on half of all machines. */
export const sameId = (id: string): string => id.normalize('NFC').toLowerCase();

const nameOf = (path: string): string => path.slice(path.lastIndexOf('/') + 1);

/** The name of a file without its last ending. */
export function stemOf(path: string): string {
  const name = nameOf(path);
  const dot = name.lastIndexOf('.');
  return dot > 0 ? name.slice(0, dot) : name;
}

/**
 * An id for each path: the file's name without its ending where no other of the paths has it, else the path below the
 * archive's first folder with hyphens between its parts. Depends on the set of paths alone. Two paths that differ only
 * in ending or punctuation can still share an id; whoever makes cells of them keeps them apart.
 */
export function derivedIds(paths: readonly string[]): Map<string, string> {
  const counts = new Map<string, number>();
  for (const path of paths) {
    const stem = sameId(urlSafeId(stemOf(path)));
    counts.set(stem, (counts.get(stem) ?? 0) + 1);
  }
  return new Map(
    paths.map((path) => {
      const stem = urlSafeId(stemOf(path));
      if (counts.get(sameId(stem)) === 1) return [path, stem];
      const parts = path.split('/');
      const folders = parts.length > 2 ? parts.slice(1, -1) : parts.slice(0, -1);
      return [path, urlSafeId([...folders, stemOf(path)].join('-'))];
    }),
  );
}
