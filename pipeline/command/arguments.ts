/** What several commands ask of their arguments. */
import { existsSync, statSync } from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { UserError } from './errors.ts';

export const defaultJobs = (): number => Math.max(1, os.availableParallelism());

/** @throws UserError when `root` is no folder */
export function requireArchive(root: string): string {
  const absolute = path.resolve(root);
  if (!existsSync(absolute))
    throw new UserError(
      `There is no folder ${absolute}. Give the path of the archive; "sweep-almanac new DIR" starts one.`,
    );
  if (!statSync(absolute).isDirectory())
    throw new UserError(`${absolute} is a file. Give the folder that holds the recordings.`);
  return absolute;
}
