// Plain JavaScript, so that an older Node can say what is missing instead of stumbling over TypeScript.
const [major, minor] = process.versions.node.split('.').map(Number);

export const nodeIsRecent = major > 24 || (major === 24 && minor >= 12);

if (!nodeIsRecent) {
  console.error(
    `Sweep Almanac runs on Node 24.12 or later; this is ${process.version} (${process.execPath}).\n` +
      'From a checkout, "npm ci" brings it along for Linux on x64 and arm64, and "npm run …" then uses it.\n' +
      'Elsewhere install Node 24 and put it first in PATH.',
  );
  process.exitCode = 1;
}
