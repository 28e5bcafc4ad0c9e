import { existsSync, readdirSync, rmSync, statSync } from 'node:fs';
import { join } from 'node:path';

/** Room that cached truth may take, bytes: about twice what the full set needs. */
const MOST = 4e9;

/** Removes the files of a folder that were written longest ago until the rest takes no more than its room. */
export function prune(folder) {
  if (!existsSync(folder)) return;
  const files = readdirSync(folder).map((name) => ({ path: join(folder, name), ...statSync(join(folder, name)) }));
  files.sort((a, b) => b.mtimeMs - a.mtimeMs);
  let sum = 0;
  for (const { path, size } of files) {
    sum += size;
    if (sum > MOST) rmSync(path, { force: true });
  }
}
