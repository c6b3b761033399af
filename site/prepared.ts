/** What the build laid ready before the pages are drawn: names of style sheets, scripts and resized pictures. */
import { readFileSync } from 'node:fs';

export interface PreparedImage {
  /** From the site's root. */
  file: string;
  width: number;
  height: number;
}

/** A table for download, as its writer describes it. */
export interface PreparedTable {
  /** Without '.csv'. */
  name: string;
  title: string;
  columns: { name: string; description: string; unit?: string }[];
}

export interface Prepared {
  tables: PreparedTable[];
  icon: string;
  style: string;
  scripts: Record<string, string>;
  /** By path inside the archive. A picture that could not be read has the reason instead. */
  images: Record<string, PreparedImage | { failure: string }>;
}

const variable = 'SWEEP_ALMANAC_PREPARED';
const known = new Map<string, Prepared>();

/** @throws Error when the site is built without `buildSite` of pipeline/publish/site.ts */
export function prepared(): Prepared {
  const file = process.env[variable];
  if (!file) throw new Error(`${variable} names no file: build the site with "sweep-almanac build"`);
  const had = known.get(file);
  if (had) return had;
  const read = JSON.parse(readFileSync(file, 'utf8')) as Prepared;
  known.set(file, read);
  return read;
}
