import { fileURLToPath } from 'node:url';
import { defineConfig } from 'vitest/config';

export default defineConfig({
  root: fileURLToPath(new URL('../..', import.meta.url)),
  test: {
    include: ['test/**/*.test.ts'],
    pool: 'forks',
    testTimeout: 60_000,
    hookTimeout: 600_000,
    env: { TZ: 'UTC' },
  },
});
