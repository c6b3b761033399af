/**
 * Import direction, enforced. `node test/tooling/boundaries.ts` lists every import that points backwards and exits
 * with 1; no argument, no output when all is well.
 */
import { readdirSync, readFileSync } from 'node:fs';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import ts from 'typescript';

const root = fileURLToPath(new URL('../..', import.meta.url));

/** What each folder may import besides itself. `types of X` allows `import type` only. */
const allowed: Record<string, { folders: string[]; typesOf?: string[]; files?: string[] }> = {
  'pipeline/signal': { folders: [] },
  'pipeline/membrane': { folders: [] },
  'pipeline/measure': { folders: ['pipeline/signal', 'pipeline/membrane'] },
  'pipeline/judge': {
    folders: ['pipeline/membrane'],
    typesOf: ['pipeline/measure'],
    // Student's t: medians over sweeps get their half-width as measuring gives it.
    files: ['pipeline/measure/quantities.ts', 'pipeline/measure/absence.ts', 'pipeline/signal/coverage.ts'],
  },
  'pipeline/formats': { folders: [] },
  'pipeline/archive': { folders: [], typesOf: ['pipeline/formats'], files: ['pipeline/measure/quantities.ts'] },
  'pipeline/ledger': {
    folders: [],
    typesOf: ['pipeline/archive', 'pipeline/formats', 'pipeline/measure', 'pipeline/judge', 'pipeline/notes'],
  },
  'pipeline/notes': { folders: [], typesOf: ['pipeline/ledger'], files: ['pipeline/measure/quantities.ts'] },
  'pipeline/publish': {
    folders: ['pipeline/ledger'],
    typesOf: ['pipeline/archive', 'pipeline/formats', 'pipeline/measure', 'pipeline/judge'],
    files: [
      'pipeline/measure/quantities.ts',
      'pipeline/measure/absence.ts',
      'pipeline/judge/checks.ts',
      'pipeline/archive/fact-keys.ts',
    ],
  },
  'pipeline/command': {
    folders: ['archive', 'formats', 'signal', 'membrane', 'measure', 'judge', 'ledger', 'notes', 'publish'].map(
      (name) => `pipeline/${name}`,
    ),
  },
  site: {
    folders: ['pipeline/notes'],
    typesOf: ['pipeline/archive', 'pipeline/formats', 'pipeline/measure', 'pipeline/judge', 'pipeline/ledger'],
    files: [
      'pipeline/ledger/read.ts',
      'pipeline/measure/quantities.ts',
      'pipeline/measure/absence.ts',
      'pipeline/judge/checks.ts',
      'pipeline/judge/class-ranges.ts',
      'pipeline/archive/fact-keys.ts',
    ],
  },
  'content-sample': { folders: [] },
};

/** Numeric code opens no file and reads no clock. */
const numeric = ['pipeline/signal', 'pipeline/membrane', 'pipeline/measure', 'pipeline/judge'];

function sourceFiles(folder: string): string[] {
  return readdirSync(path.join(root, folder), { recursive: true, withFileTypes: true })
    .filter((entry) => entry.isFile() && /\.(ts|astro)$/.test(entry.name))
    .map((entry) => path.relative(root, path.join(entry.parentPath, entry.name)).split(path.sep).join('/'))
    .sort();
}

const folderOf = (file: string): string | undefined =>
  Object.keys(allowed).find((folder) => file === folder || file.startsWith(`${folder}/`));

interface Import {
  from: string;
  typeOnly: boolean;
}

/** Every import of a TypeScript file or of an Astro file's frontmatter and scripts. */
export function importsOf(name: string, text: string): Import[] {
  const code = name.endsWith('.astro')
    ? [...text.matchAll(/^---\n([\s\S]*?)\n---/g), ...text.matchAll(/<script[^>]*>([\s\S]*?)<\/script>/g)]
        .map((match) => match[1])
        .join('\n')
    : text;
  const parsed = ts.createSourceFile(name, code, ts.ScriptTarget.Latest, true, ts.ScriptKind.TS);
  const found: Import[] = [];
  const visit = (node: ts.Node): void => {
    if (
      (ts.isImportDeclaration(node) || ts.isExportDeclaration(node)) &&
      node.moduleSpecifier &&
      ts.isStringLiteral(node.moduleSpecifier)
    ) {
      const clauseTypeOnly = ts.isImportDeclaration(node) ? node.importClause?.isTypeOnly === true : node.isTypeOnly;
      found.push({ from: node.moduleSpecifier.text, typeOnly: clauseTypeOnly });
    }
    if (ts.isCallExpression(node) && node.expression.kind === ts.SyntaxKind.ImportKeyword) {
      const argument = node.arguments[0];
      if (argument && ts.isStringLiteral(argument)) found.push({ from: argument.text, typeOnly: false });
    }
    ts.forEachChild(node, visit);
  };
  visit(parsed);
  return found;
}

/** The sentence that says what is wrong with one import, or null. */
export function complaint(file: string, imported: Import): string | null {
  const own = folderOf(file);
  if (!own) return null;
  const rule = allowed[own]!;
  if (
    numeric.includes(own) &&
    /^(node:)?(fs|path|child_process|worker_threads|os|http|sqlite)(\/|$)/.test(imported.from)
  )
    return `${file} imports ${imported.from}: numeric code opens no file and starts nothing`;
  if (!imported.from.startsWith('.')) return null;
  const target = path.posix.normalize(path.posix.join(path.posix.dirname(file), imported.from));
  const folder = folderOf(target);
  if (!folder || folder === own) return null;
  if (rule.folders.includes(folder) || rule.files?.includes(target)) return null;
  if (imported.typeOnly && rule.typesOf?.includes(folder)) return null;
  const only = rule.typesOf?.includes(folder) ? ' (its types alone are allowed: write "import type")' : '';
  return `${file} imports ${target}: ${own} may not import ${folder}${only}`;
}

if (import.meta.main) {
  const complaints = ['pipeline', 'site', 'content-sample']
    .flatMap(sourceFiles)
    .flatMap((file) =>
      importsOf(file, readFileSync(path.join(root, file), 'utf8')).map((imported) => complaint(file, imported)),
    )
    .filter((line) => line !== null);
  for (const line of complaints) console.error(line);
  if (complaints.length > 0) process.exitCode = 1;
}
