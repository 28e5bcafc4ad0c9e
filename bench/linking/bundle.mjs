import { existsSync, mkdirSync, readdirSync, rmSync } from 'node:fs';
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
  const bundles = join(SCRATCH, 'bundles');
  removeOrphans(bundles);
  const folder = join(bundles, `${process.pid}`);
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

/** Removes what processes that were killed have left: each folder has its process' number. */
function removeOrphans(bundles) {
  if (!existsSync(bundles)) return;
  for (const name of readdirSync(bundles)) {
    if (!isRunning(Number(name))) rmSync(join(bundles, name), { recursive: true, force: true });
  }
}

function isRunning(number) {
  try {
    return process.kill(number, 0);
  } catch (error) {
    return error.code === 'EPERM';
  }
}
