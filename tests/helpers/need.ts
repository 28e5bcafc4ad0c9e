import { execFileSync } from 'node:child_process';
import { existsSync } from 'node:fs';

/** External things a test may need, and how to look for each. */
const LOOK: Record<string, () => boolean> = {
  chromium: () => existsSync('/usr/bin/chromium'),
  python3: () => runs('/usr/bin/python3', ['-c', 'import zipfile']),
  'python3-netcdf4': () => runs('/usr/bin/python3', ['-c', 'import netCDF4']),
  'python3-h5py': () => runs('/usr/bin/python3', ['-c', 'import h5py']),
  'hdf5-tools': () => runs('h5dump', ['--version']),
  'netcdf-bin': () => runs('ncdump', ['-h'], true),
  'mount namespaces': () => runs('unshare', ['-rm', 'true']),
};

function runs(command: string, args: string[], anyExit = false): boolean {
  try {
    execFileSync(command, args, { stdio: 'ignore' });
    return true;
  } catch (error) {
    return anyExit && (error as NodeJS.ErrnoException).code !== 'ENOENT';
  }
}

/**
 * True when `thing` is there. Use as `it.skipIf(!needs('chromium'))`. With REQUIRE_ALL=1 a missing thing throws,
 * so that the suite fails instead of skipping.
 */
export function needs(thing: keyof typeof LOOK & string): boolean {
  const look = LOOK[thing];
  if (look === undefined) throw new Error(`tests/helpers/need.ts does not know "${thing}"`);
  if (look()) return true;
  if (process.env['REQUIRE_ALL'] === '1')
    throw new Error(`${thing} is missing and REQUIRE_ALL=1; install it (see .ci/run)`);
  console.warn(`skipped: ${thing} is not installed (see .ci/run for what the tests need)`);
  return false;
}
