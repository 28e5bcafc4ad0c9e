import { spawn } from 'node:child_process';
import { readFileSync } from 'node:fs';

/** How often the process is looked at, ms. The kernel keeps the peak itself, so that none is missed but in the last moment. */
const LOOK_MS = 25;

/**
 * Runs Node with these words and waits. Resolves to { code, seconds, peakBytes, said }: wall time from start to end, and the
 * largest resident memory that the kernel noted for the process, threads included (VmHWM of /proc; NaN elsewhere than
 * on Linux).
 */
export function runWatched(words) {
  return new Promise((resolve, reject) => {
    const started = performance.now();
    const child = spawn(process.execPath, words, { stdio: ['ignore', 'pipe', 'pipe'] });
    let said = '';
    let peakBytes = Number.NaN;
    child.stdout.on('data', (text) => {
      said += text;
    });
    child.stderr.on('data', (text) => {
      said += text;
    });
    const timer = setInterval(() => {
      try {
        const found = /VmHWM:\s+(\d+) kB/.exec(readFileSync(`/proc/${child.pid}/status`, 'utf8'));
        if (found !== null) peakBytes = 1024 * Number(found[1]);
      } catch {
        // Ended, or no /proc.
      }
    }, LOOK_MS);
    child.on('error', reject);
    child.on('close', (code) => {
      clearInterval(timer);
      resolve({ code, seconds: (performance.now() - started) / 1000, peakBytes, said });
    });
  });
}
