// What `npm start` does after the build: makes the demo dump from its seed, processes it as anyone would with the
// command line, and ends. Everything it shows is what the commands themselves say.
import { spawnSync } from 'node:child_process';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';

const root = dirname(dirname(fileURLToPath(import.meta.url)));
const bin = join(root, 'packages', 'cli', 'bin', 'wakeloom.mjs');
const folder = join('results', 'demo');

for (const words of [
  ['demo', 'cylinder-wake', '--out', folder, '--seed', '1', '--replace'],
  ['process', join(folder, 'cylinder-wake.yaml'), '--out', join(folder, 'result'), '--replace'],
]) {
  console.log(`\n> npx wakeloom ${words.join(' ')}\n`);
  const { status, signal, error } = spawnSync(process.execPath, [bin, ...words], { cwd: root, stdio: 'inherit' });
  if (error !== undefined) console.error(`error ${error.message}`);
  if (status !== 0) process.exit(signal === 'SIGINT' ? 130 : (status ?? 1));
}
console.log('\nAll commands from here on: npx wakeloom --help');
