// Runs tests/long, which `npm test` leaves out because of its time. Arguments go on to vitest.
import { spawnSync } from 'node:child_process';
import { existsSync, readdirSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';

const root = dirname(dirname(fileURLToPath(import.meta.url)));
const folder = join(root, 'tests', 'long');
if (
  !existsSync(folder) ||
  !readdirSync(folder, { recursive: true }).some((name) => String(name).endsWith('.test.ts'))
) {
  console.error('tests/long holds no tests yet: nothing was run.');
  process.exit(1);
}
const { status } = spawnSync(
  process.execPath,
  [
    join(root, 'node_modules', 'vitest', 'vitest.mjs'),
    'run',
    '--config',
    join(root, 'tests', 'vitest.long.config.ts'),
    ...process.argv.slice(2),
  ],
  { cwd: root, stdio: 'inherit' },
);
process.exitCode = status ?? 1;
