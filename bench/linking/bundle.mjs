import { mkdirSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath, pathToFileURL } from 'node:url';
import { build } from 'vite';

const here = fileURLToPath(new URL('.', import.meta.url));

/** Root of the repository, and the folder for what can be made again. */
export const ROOT = join(here, '..', '..');
export const SCRATCH = join(here, '..', 'scratch', 'linking');

/**
 * Bundles the harness with the TypeScript sources of the library, so that a change of them shows without a build and
 * runs at its full speed. Gives the address of the bundle, one of its own for each process. About 1 s.
 */
export async function bundleHarness() {
  const folder = join(SCRATCH, 'bundles', `${process.pid}`);
  mkdirSync(folder, { recursive: true });
  await build({
    configFile: false,
    root: ROOT,
    logLevel: 'error',
    resolve: { conditions: ['source'] },
    ssr: { noExternal: true, resolve: { conditions: ['source'] } },
    build: {
      ssr: join(here, 'index.ts'),
      outDir: folder,
      emptyOutDir: true,
      minify: false,
      sourcemap: 'inline',
      target: 'node20',
      rolldownOptions: { output: { entryFileNames: 'harness.mjs' } },
    },
  });
  return { folder, address: pathToFileURL(join(folder, 'harness.mjs')).href };
}
