/**
 * `npm run bench:truth [-- --seeds N] [--quick] [--only FAMILY] [--jobs N]`: recordings with known truth through the
 * whole of measuring; prints bias and spread for each quantity and condition, how often the 95 % half-widths hold the
 * truth, and the worst cases by name. A report: its limits are tests. Progress goes to stderr.
 */
import { once } from 'node:events';
import { readdirSync } from 'node:fs';
import { availableParallelism } from 'node:os';
import { parseArgs } from 'node:util';
import { Worker } from 'node:worker_threads';
import { familyIn, type Part } from './bench-worker.ts';
import { by, errorOf, score, type Trial, type TrialOptions } from './score.ts';

const { values: options } = parseArgs({
  options: {
    seeds: { type: 'string', default: '6' },
    quick: { type: 'boolean', default: false },
    only: { type: 'string' },
    jobs: { type: 'string', default: String(availableParallelism()) },
    /** Every condition apart, not only all together. */
    conditions: { type: 'boolean', default: true },
  },
});

const wanted: TrialOptions = { seeds: Number(options.seeds), quick: options.quick };
const parts: Part[] = [];
for (const file of readdirSync(import.meta.dirname).sort()) {
  if (!file.endsWith('.ts') || file.endsWith('.test.ts') || file === 'main.ts') continue;
  if (options.only && !file.startsWith(options.only)) continue;
  const family = await familyIn(file);
  if (!family.trials) continue;
  const names = family.subjectNames?.();
  if (names) for (const subject of names) parts.push({ file, options: { ...wanted, subject } });
  else parts.push({ file, options: wanted });
}

/** Trials by part, so that their order does not depend on which thread is done first. */
const found: Trial[][] = parts.map(() => []);
let next = 0;
let done = 0;
const started = performance.now();

/** One thread, which takes the next part as soon as it has done one. */
async function lane(): Promise<void> {
  const worker = new Worker(new URL('./bench-worker.ts', import.meta.url));
  try {
    while (next < parts.length) {
      const index = next++;
      const { file, options: own } = parts[index]!;
      worker.postMessage(parts[index]);
      const [trials] = (await once(worker, 'message')) as [Trial[]];
      found[index] = trials;
      const seconds = ((performance.now() - started) / 1000).toFixed(0);
      const name = own.subject === undefined ? file : `${file}, ${own.subject}`;
      console.error(`${++done} of ${parts.length} parts, ${seconds} s: ${name}, ${trials.length} numbers`);
    }
  } finally {
    await worker.terminate();
  }
}
await Promise.all(Array.from({ length: Math.max(1, Math.min(Number(options.jobs), parts.length)) }, lane));
const all = found.flat();

const figure = (value: number | null): string =>
  value === null ? '–' : value === 0 ? '0' : Math.abs(value) >= 1000 ? value.toFixed(0) : value.toPrecision(2);
const percent = (value: number | null): string => (value === null ? '–' : `${(100 * value).toFixed(1)} %`);

const head = ['quantity', 'condition', 'n', 'missing', 'bias', 'spread', '95 % of errors', 'half-width', 'held'];
function row(quantity: string, condition: string, trials: readonly Trial[]): string[] {
  const s = score(trials);
  return [
    quantity,
    condition,
    String(s.trials),
    String(s.trials - s.measured),
    figure(s.bias),
    figure(s.spread),
    figure(s.p95),
    figure(s.width),
    percent(s.held),
  ];
}

function print(rows: string[][]): void {
  const widths = rows[0]!.map((_, column) => Math.max(...rows.map((one) => one[column]!.length)));
  for (const one of rows)
    console.log(
      one
        .map((cell, column) => (column < 2 ? cell.padEnd(widths[column]!) : cell.padStart(widths[column]!)))
        .join('  '),
    );
}

for (const [family, ofFamily] of by(all, (trial) => trial.family)) {
  console.log(`\n# ${family}\n`);
  const rows = [head];
  for (const [quantity, own] of by(ofFamily, (trial) => trial.quantity)) {
    rows.push(row(quantity, 'all', own));
    if (options.conditions)
      for (const [condition, under] of by(own, (trial) => trial.condition)) rows.push(row('', condition, under));
  }
  print(rows);
  console.log('\nWorst of each:');
  for (const [quantity, own] of by(ofFamily, (trial) => trial.quantity)) {
    const { worst } = score(own);
    if (worst && errorOf(worst) !== 0)
      console.log(
        `  ${quantity}: ${worst.subject}, ${worst.condition}, seed ${worst.seed}: ${figure(worst.value)} for ${figure(worst.truth)} (${figure(errorOf(worst))})`,
      );
  }
}
