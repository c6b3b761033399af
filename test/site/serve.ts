import { readFileSync, statSync } from 'node:fs';
import { createServer, type Server } from 'node:http';
import type { AddressInfo } from 'node:net';
import path from 'node:path';

const types: Record<string, string> = {
  '.html': 'text/html; charset=utf-8',
  '.css': 'text/css',
  '.js': 'text/javascript',
  '.woff2': 'font/woff2',
  '.webp': 'image/webp',
  '.csv': 'text/csv',
  '.json': 'application/json',
};

/** A plain web server that has one folder under one path and nothing else. */
export async function serve(folder: string, prefix: string): Promise<{ address: string; stop: () => Promise<void> }> {
  const server: Server = createServer((request, response) => {
    const { pathname } = new URL(request.url ?? '/', 'http://localhost');
    const file = path.join(folder, decodeURIComponent(pathname.slice(prefix.length)));
    if (!pathname.startsWith(prefix) || !statSync(file, { throwIfNoEntry: false })?.isFile()) {
      response.writeHead(404).end('nothing here');
      return;
    }
    response.writeHead(200, { 'content-type': types[path.extname(file)] ?? 'application/octet-stream' });
    response.end(readFileSync(file));
  });
  await new Promise<void>((done) => server.listen(0, '127.0.0.1', done));
  return {
    address: `http://127.0.0.1:${(server.address() as AddressInfo).port}${prefix}`,
    stop: () => new Promise((done) => server.close(() => done())),
  };
}
