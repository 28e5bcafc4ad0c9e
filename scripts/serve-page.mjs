// Serves the built page (packages/web-viewer/dist/page) to browsers on this computer: `npm run page [-- PORT]`.
// Any static web server does; this one needs nothing installed. It listens on 127.0.0.1 only, and ends with Ctrl-C.
import { createReadStream, existsSync, statSync } from 'node:fs';
import { createServer } from 'node:http';
import { dirname, extname, join, normalize, sep } from 'node:path';
import { fileURLToPath } from 'node:url';

const folder = join(dirname(dirname(fileURLToPath(import.meta.url))), 'packages', 'web-viewer', 'dist', 'page');
const TYPES = {
  '.html': 'text/html; charset=utf-8',
  '.js': 'text/javascript; charset=utf-8',
  '.css': 'text/css; charset=utf-8',
  '.svg': 'image/svg+xml',
  '.wasm': 'application/wasm',
};
// Nothing but the page's own files, and WebAssembly, which HDF5 is.
const POLICY =
  "default-src 'none'; script-src 'self' 'wasm-unsafe-eval'; style-src 'self' 'unsafe-inline'; img-src 'self' blob: data:; connect-src 'self'; worker-src 'self'";

const wanted = process.argv[2] ?? '8470';
if (!/^\d{1,5}$/.test(wanted) || Number(wanted) > 65535) {
  console.error(`page: got "${wanted}", expected a port from 0 to 65535 (0: any that is free)`);
  process.exit(2);
}
if (!existsSync(join(folder, 'index.html'))) {
  console.error('page: got no built page, expected packages/web-viewer/dist/page; run "npm run build" first');
  process.exit(1);
}

/** The file for an address, or null: no such file, outside the folder, or no address at all. */
function fileFor(url) {
  try {
    const path = decodeURIComponent(new URL(url, 'http://localhost').pathname);
    const file = join(folder, normalize(path.endsWith('/') ? `${path}index.html` : path));
    return file.startsWith(folder + sep) && statSync(file).isFile() ? file : null;
  } catch {
    return null;
  }
}

const server = createServer((request, response) => {
  const file = request.method === 'GET' || request.method === 'HEAD' ? fileFor(request.url ?? '/') : null;
  if (file === null) return response.writeHead(404, { 'content-type': 'text/plain' }).end('not found\n');
  response.writeHead(200, {
    'content-type': TYPES[extname(file)] ?? 'application/octet-stream',
    'content-length': statSync(file).size,
    'content-security-policy': POLICY,
    'x-content-type-options': 'nosniff',
    'cache-control': 'no-cache',
  });
  if (request.method === 'HEAD') return response.end();
  return createReadStream(file).pipe(response);
});
server.on('error', (error) => {
  const busy = error.code === 'EADDRINUSE';
  console.error(
    `page: got ${error.code} for port ${wanted}, expected ${busy ? 'a free one; npm run page -- 0 takes any that is free' : 'to listen on it'}`,
  );
  process.exit(1);
});
server.listen(Number(wanted), '127.0.0.1', () => {
  console.log(`http://127.0.0.1:${server.address().port}/  (open it in a browser; Ctrl-C ends)`);
});
for (const signal of ['SIGINT', 'SIGTERM']) {
  process.on(signal, () => {
    server.close();
    server.closeAllConnections();
  });
}
