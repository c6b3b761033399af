import { existsSync, readFileSync, statSync } from 'node:fs';
import { createServer, type Server } from 'node:http';
import path from 'node:path';
import { UserError } from './errors.ts';
import { markName } from './output.ts';

const types: Record<string, string> = {
  '.html': 'text/html; charset=utf-8',
  '.css': 'text/css; charset=utf-8',
  '.js': 'text/javascript; charset=utf-8',
  '.json': 'application/json; charset=utf-8',
  '.csv': 'text/csv; charset=utf-8',
  '.svg': 'image/svg+xml',
  '.png': 'image/png',
  '.jpg': 'image/jpeg',
  '.webp': 'image/webp',
  '.avif': 'image/avif',
  '.woff2': 'font/woff2',
  '.txt': 'text/plain; charset=utf-8',
};

/** The file inside `root` that a request's path names, or null. Never leaves `root`. */
export function fileFor(root: string, requested: string): string | null {
  let decoded: string;
  try {
    decoded = decodeURIComponent(requested.split(/[?#]/)[0] ?? '/');
  } catch {
    return null;
  }
  if (decoded.includes('\0')) return null;
  const file = path.join(root, path.posix.normalize(`/${decoded}`));
  if (file !== root && !file.startsWith(root + path.sep)) return null;
  if (!existsSync(file)) return null;
  if (!statSync(file).isDirectory()) return file;
  const index = path.join(file, 'index.html');
  return existsSync(index) ? index : null;
}

/** @throws UserError when `folder` holds no built almanac */
export function requireBuilt(folder: string): string {
  const root = path.resolve(folder);
  if (!existsSync(path.join(root, markName)))
    throw new UserError(`${root} holds no built almanac. Run "sweep-almanac build ARCHIVE --out ${folder}" first.`);
  return root;
}

/** Serves a built site on the loopback address only, so that nobody else on the network can read it. */
export function preview(folder: string, port: number): Promise<{ server: Server; url: string }> {
  const root = requireBuilt(folder);
  const server = createServer((request, response) => {
    const readable = request.method === 'GET' || request.method === 'HEAD';
    const file = readable ? fileFor(root, request.url ?? '/') : null;
    if (!file) {
      response.writeHead(readable ? 404 : 405, { 'content-type': 'text/plain; charset=utf-8' });
      response.end(readable ? 'There is no such page.\n' : 'Pages can only be read.\n');
      return;
    }
    response.writeHead(200, {
      'content-type': types[path.extname(file).toLowerCase()] ?? 'application/octet-stream',
      'cache-control': 'no-store',
    });
    response.end(request.method === 'HEAD' ? undefined : readFileSync(file));
  });
  return new Promise((resolve, reject) => {
    server.once('error', (error: NodeJS.ErrnoException) =>
      reject(
        new UserError(
          error.code === 'EADDRINUSE'
            ? `Port ${port} is in use. Name another with --port, or 0 for any free one.`
            : `The site cannot be served: ${error.message}.`,
        ),
      ),
    );
    server.listen(port, '127.0.0.1', () => {
      const address = server.address();
      const at = typeof address === 'object' && address ? address.port : port;
      resolve({ server, url: `http://127.0.0.1:${at}/` });
    });
  });
}
