/**
 * Makes sure that what the tests need from the machine is there: Node 24, a Chromium, and SciPy with h5py where the
 * package manager offers them. Says what it installs; fails with a sentence where it cannot.
 */
import { spawnSync } from 'node:child_process';
import { existsSync } from 'node:fs';

const chromiumPaths = [
  '/usr/bin/chromium',
  '/usr/bin/chromium-browser',
  '/usr/bin/google-chrome',
  '/snap/bin/chromium',
];

/** Path of an installed Chromium, or null. SWEEP_ALMANAC_CHROMIUM names one that stands elsewhere. */
export function findChromium(): string | null {
  const named = process.env['SWEEP_ALMANAC_CHROMIUM'];
  if (named) return existsSync(named) ? named : null;
  return chromiumPaths.find((candidate) => existsSync(candidate)) ?? null;
}

/** A Python that can import SciPy and h5py, or null. Tests against SciPy and h5py run where there is one. */
export function findPython(): string | null {
  const candidates = ['/usr/bin/python3', 'python3'];
  return (
    candidates.find(
      (python) => spawnSync(python, ['-c', 'import numpy, scipy, h5py'], { stdio: 'ignore' }).status === 0,
    ) ?? null
  );
}

function install(packages: string[]): boolean {
  if (spawnSync('sh', ['-c', 'command -v apt-get'], { stdio: 'ignore' }).status !== 0) return false;
  const prefix = process.getuid?.() === 0 ? [] : ['sudo', '-n'];
  const run = (args: string[]): boolean => {
    const [command, ...rest] = [...prefix, ...args];
    return (
      spawnSync(command!, rest, {
        stdio: ['ignore', 'ignore', 'inherit'],
        env: { ...process.env, DEBIAN_FRONTEND: 'noninteractive' },
      }).status === 0
    );
  };
  console.log(`Installing with apt-get for the tests: ${packages.join(', ')}`);
  return (
    run(['apt-get', 'update', '-qq']) &&
    run(['apt-get', 'install', '-y', '-qq', '--no-install-recommends', ...packages])
  );
}

if (import.meta.main) {
  const major = Number(process.versions.node.split('.')[0]);
  if (major < 24) {
    console.error(
      `These tests run on Node 24, this is ${process.version}. "npm ci" brings Node 24 for Linux on x64 and arm64; on another machine install Node 24 and put it first in PATH.`,
    );
    process.exit(1);
  }
  if (!findPython()) {
    const done = install(['python3-numpy', 'python3-scipy', 'python3-h5py']);
    if (!done || !findPython())
      console.warn(
        'SciPy and h5py are not installed: the checks against them are skipped and say so. Debian: apt-get install python3-scipy python3-h5py',
      );
  }
  if (!findChromium()) {
    const done = install(['chromium', 'fonts-dejavu-core']);
    if (!done || !findChromium()) {
      console.error(
        'The browser tests need Chromium. Install it (Debian: apt-get install chromium) or set SWEEP_ALMANAC_CHROMIUM to its path.',
      );
      process.exit(1);
    }
  }
}
