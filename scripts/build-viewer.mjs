// Builds the web viewer into packages/web-viewer/dist and says how much a browser has to fetch.
// Run after `tsc -b`, which checks the types; this step only bundles, from the tracker's sources.
import { readdirSync, readFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { gzipSync } from 'node:zlib';
import { build, defaultClientConditions } from 'vite';

const house = dirname(dirname(fileURLToPath(import.meta.url)));
const root = join(house, 'packages', 'web-viewer');
const outDir = join(root, 'dist', 'page');
const { version } = JSON.parse(readFileSync(join(house, 'package.json'), 'utf8'));

await build({
  root,
  configFile: false,
  logLevel: 'warn',
  // The page is served from any folder, so that no address in it may start at the root.
  base: './',
  define: { __WAKELOOM_VERSION__: JSON.stringify(version) },
  resolve: { conditions: ['source', ...defaultClientConditions] },
  oxc: { jsx: { runtime: 'automatic', importSource: 'preact' } },
  worker: { format: 'es' },
  build: {
    outDir,
    emptyOutDir: true,
    target: 'es2022',
    // Inlined files would need `data:` addresses in the page's content policy.
    assetsInlineLimit: 0,
    modulePreload: { polyfill: false },
    // HDF5 is one chunk of 4 MB, fetched by the worker when it is needed.
    chunkSizeWarningLimit: 5000,
  },
});

const sizes = readdirSync(outDir, { recursive: true, withFileTypes: true })
  .filter((entry) => entry.isFile())
  .map((entry) => readFileSync(join(entry.parentPath, entry.name)))
  .map((bytes) => [bytes.length, gzipSync(bytes).length]);
const [all, zipped] = [0, 1].map((k) => sizes.reduce((sum, size) => sum + size[k], 0) / 1e6);
console.log(`page built: ${sizes.length} files, ${all.toFixed(1)} MB, ${zipped.toFixed(1)} MB gzipped`);
