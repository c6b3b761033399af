import { readFileSync } from 'node:fs';

/** Version of the tool as its package states it. */
export function toolVersion(): string {
  const text = readFileSync(new URL('../../package.json', import.meta.url), 'utf8');
  return (JSON.parse(text) as { version: string }).version;
}
