import { defineConfig } from 'astro/config';

// The build command sets outDir, base and the ledger through its own inline configuration; what stands
// here is what `astro check` and an editor need.
export default defineConfig({
  srcDir: './site',
  publicDir: './site/public',
  outDir: './.sweep-almanac/site-out',
  cacheDir: './.sweep-almanac/astro-cache',
  build: { format: 'directory' },
  devToolbar: { enabled: false },
});
