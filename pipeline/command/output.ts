/** The output folder: never half written, never somebody else's. */
import { chmodSync, existsSync, mkdirSync, mkdtempSync, readdirSync, renameSync, rmSync, writeFileSync } from 'node:fs';
import path from 'node:path';
import { UserError } from './errors.ts';

/** Marks a folder as an almanac that a later build may replace. */
export const markName = 'almanac.json';

const isInside = (inner: string, outer: string): boolean => {
  const relative = path.relative(outer, inner);
  return relative === '' || (!relative.startsWith('..') && !path.isAbsolute(relative));
};

/**
 * @throws UserError when the output would overwrite something that no build wrote, or would lie in the archive, or
 *   the archive in it
 */
export function checkOutput(out: string, archive: string, work: string): void {
  for (const [folder, what] of [
    [out, 'The output folder'],
    [work, 'The working folder'],
  ] as const)
    if (isInside(folder, archive))
      throw new UserError(
        `${what} ${folder} lies inside the archive ${archive}, which is never written to. Name another with ${folder === out ? '--out' : '--work'}.`,
      );
  if (isInside(archive, out) || isInside(work, out))
    throw new UserError(
      `The output folder ${out} would replace ${isInside(archive, out) ? 'the archive' : 'the working folder'}. Name another with --out.`,
    );
  if (!existsSync(out)) return;
  let names: string[];
  try {
    names = readdirSync(out);
  } catch (error) {
    throw new UserError(`${out} cannot be used as the output folder: ${(error as Error).message}.`);
  }
  if (names.length > 0 && !names.includes(markName))
    throw new UserError(
      `${out} holds files that no almanac build wrote (${names.slice(0, 3).join(', ')}${names.length > 3 ? ', …' : ''}). Name an empty or new folder with --out, or empty it yourself.`,
    );
}

/** A fresh folder beside `out`, on the same file system, so that it can be moved into place at once. */
export function startOutput(out: string): string {
  mkdirSync(path.dirname(out), { recursive: true });
  removeLeftovers(out);
  return mkdtempSync(path.join(path.dirname(out), `.${path.basename(out)}-unfinished-`));
}

/** What a killed build left beside the output. */
function removeLeftovers(out: string): void {
  const prefixes = [`.${path.basename(out)}-unfinished-`, `.${path.basename(out)}-previous-`];
  for (const name of readdirSync(path.dirname(out)))
    if (prefixes.some((prefix) => name.startsWith(prefix)))
      rmSync(path.join(path.dirname(out), name), { recursive: true, force: true });
}

/** Moves a finished folder into the place of the previous output. */
export function finishOutput(fresh: string, out: string, mark: object): void {
  writeFileSync(path.join(fresh, markName), `${JSON.stringify(mark, null, 2)}\n`);
  // A temporary folder is closed to others; an almanac on a shared drive is for them.
  chmodSync(fresh, 0o777 & ~process.umask());
  const previous = path.join(path.dirname(out), `.${path.basename(out)}-previous-${process.pid}`);
  if (existsSync(out)) renameSync(out, previous);
  renameSync(fresh, out);
  rmSync(previous, { recursive: true, force: true });
}
