/** Writes the sample archive: `node content-sample/generate/main.ts [OUTDIR] [TRUTH] [--only ID,ID]`. */
import { parseArgs } from 'node:util';
import { generateArchive } from './archive.ts';

const usage = `usage: node content-sample/generate/main.ts [OUTDIR] [TRUTH] [--only ID,ID] [--quiet]
  OUTDIR  where the archive is written (default .sweep-almanac/sample-archive)
  TRUTH   where the generator's truth is written, outside OUTDIR (default .sweep-almanac/sample-truth.json)
  --only  ids of cells, comma between them; the rest is left out`;

try {
  const { values, positionals } = parseArgs({
    allowPositionals: true,
    options: { only: { type: 'string' }, quiet: { type: 'boolean' }, help: { type: 'boolean' } },
  });
  if (values.help) console.log(usage);
  else {
    const out = positionals[0] ?? '.sweep-almanac/sample-archive';
    const truth = positionals[1] ?? '.sweep-almanac/sample-truth.json';
    const cells = await generateArchive({
      out,
      truth,
      only: values.only?.split(',').map((id) => id.trim()) ?? null,
      ...(values.quiet || !process.stdout.isTTY ? {} : { said: (line: string) => console.log(line) }),
    });
    console.log(`${cells.length} cells written to ${out}, their truth to ${truth}`);
  }
} catch (error) {
  console.error(`${(error as Error).message}\n${usage}`);
  process.exitCode = 1;
}
