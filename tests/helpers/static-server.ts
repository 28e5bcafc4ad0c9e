import { readFile } from 'node:fs/promises';
import { createServer, type Server } from 'node:http';
import type { AddressInfo } from 'node:net';
import { extname, join, normalize, sep } from 'node:path';

const TYPES: Record<string, string> = {
  '.html': 'text/html; charset=utf-8',
  '.js': 'text/javascript; charset=utf-8',
  '.css': 'text/css; charset=utf-8',
  '.svg': 'image/svg+xml',
};

/** Nothing but the page's own files, and WebAssembly: what a careful server sends along. */
const CONTENT_POLICY =
  "default-src 'none'; script-src 'self' 'wasm-unsafe-eval'; style-src 'self' 'unsafe-inline'; img-src 'self'; connect-src 'self'; worker-src 'self'";

export interface StaticServer {
  readonly origin: string;
  /** Every path asked for, in order; and those that were not there. */
  readonly paths: string[];
  readonly missing: string[];
  close(): Promise<void>;
}

/** Serves a folder on 127.0.0.1 at a free port, for tests of pages. */
export async function serveFolder(folder: string): Promise<StaticServer> {
  const paths: string[] = [];
  const missing: string[] = [];
  const server: Server = createServer((request, response) => {
    const path = decodeURIComponent(new URL(request.url ?? '/', 'http://x').pathname);
    const file = join(folder, normalize(path.endsWith('/') ? `${path}index.html` : path));
    paths.push(path);
    const allowed = file.startsWith(folder + sep);
    (allowed ? readFile(file) : Promise.reject(new Error('outside'))).then(
      (bytes) => {
        response.writeHead(200, {
          'content-type': TYPES[extname(file)] ?? 'application/octet-stream',
          'content-security-policy': CONTENT_POLICY,
          'cache-control': 'no-store',
        });
        response.end(bytes);
      },
      () => {
        missing.push(path);
        response.writeHead(404).end();
      },
    );
  });
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  return {
    origin: `http://127.0.0.1:${(server.address() as AddressInfo).port}`,
    paths,
    missing,
    close: () =>
      new Promise((resolve) => {
        server.close(() => resolve());
        server.closeAllConnections();
      }),
  };
}
