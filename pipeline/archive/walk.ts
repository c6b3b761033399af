/** What lies in the archive folder. Follows no link, opens nothing, and cannot be led out of the folder. */
import { lstatSync, readdirSync, readlinkSync, realpathSync } from 'node:fs';
import path from 'node:path';

export interface Met {
  /** Relative to the archive, with forward slashes. */
  path: string;
  bytes: number;
  mtime_ms: number;
  /** Set for what is not an ordinary file: why it is not opened, and what to do where something can be done. */
  barred: { reason: string; remedy: string } | null;
}

export interface Unlisted {
  path: string;
  message: string;
}

/** The calls that walking makes, so that a test can have a folder that cannot be read. */
export interface Disk {
  names(folder: string): string[];
  stat(file: string): { kind: 'file' | 'folder' | 'link' | 'other'; bytes: number; mtime_ms: number };
}

export const nodeDisk: Disk = {
  names: (folder) => readdirSync(folder),
  stat: (file) => {
    const stat = lstatSync(file);
    const kind = stat.isFile() ? 'file' : stat.isDirectory() ? 'folder' : stat.isSymbolicLink() ? 'link' : 'other';
    return { kind, bytes: stat.size, mtime_ms: stat.mtimeMs };
  },
};

/** Names that systems and editors leave behind; they are nobody's data. */
const leftBehind =
  /^(\.|~\$|thumbs\.db$|ehthumbs\.db$|desktop\.ini$|__macosx$|\$recycle\.bin$|system volume information$)/i;

/** Plain order of code units: the same on every machine. */
export const byText = (a: string, b: string): number => (a < b ? -1 : a > b ? 1 : 0);

/** Everything under the archive folder but what systems leave behind, sorted by path. */
export function walk(root: string, disk: Disk = nodeDisk): { met: Met[]; unlisted: Unlisted[] } {
  const met: Met[] = [];
  const unlisted: Unlisted[] = [];
  const folders = [''];
  for (let folder = folders.pop(); folder !== undefined; folder = folders.pop()) {
    let names: string[];
    try {
      names = disk.names(path.join(root, folder));
    } catch (error) {
      unlisted.push({ path: folder || '.', message: (error as Error).message });
      continue;
    }
    for (const name of names) {
      if (leftBehind.test(name)) continue;
      const below = folder === '' ? name : `${folder}/${name}`;
      try {
        const stat = disk.stat(path.join(root, below));
        if (stat.kind === 'folder') folders.push(below);
        else
          met.push({
            path: below,
            bytes: stat.bytes,
            mtime_ms: stat.mtime_ms,
            barred: barredAs(root, below, stat.kind),
          });
      } catch (error) {
        unlisted.push({ path: below, message: (error as Error).message });
      }
    }
  }
  met.sort((a, b) => byText(a.path, b.path));
  unlisted.sort((a, b) => byText(a.path, b.path));
  return { met, unlisted };
}

function barredAs(root: string, below: string, kind: 'file' | 'link' | 'other'): Met['barred'] {
  if (kind === 'file') return null;
  if (kind === 'other') return { reason: 'not an ordinary file', remedy: '' };
  let target: string;
  try {
    target = realpathSync(path.join(root, below));
  } catch {
    const wanted = readlinkSync(path.join(root, below));
    return {
      reason: `a link to ${wanted}, which is not there`,
      remedy: 'Remove the link or restore what it points to.',
    };
  }
  const inside = path.relative(root, target).split(path.sep).join('/');
  if (inside === '' || (!inside.startsWith('../') && inside !== '..' && !path.isAbsolute(inside)))
    return {
      reason: `a link to ${inside === '' ? 'the archive itself' : inside}, which is read under its own name`,
      remedy: '',
    };
  return {
    reason: 'a link that leads out of the archive, which is not followed',
    remedy: 'Put the files themselves into the archive, or build the folder that holds them.',
  };
}
