import { spawn } from 'node:child_process';
import { readFileSync } from 'node:fs';

/** How often the process is looked at, ms. The kernel keeps the peak itself, so that none is missed but in the last moment. */
const LOOK_MS = 25;

/** USER_HZ, 100 on every Linux that Node runs on. */
const TICKS_PER_SECOND = 100;

/**
 * Runs Node (or another program) with these words and waits. Resolves to { code, seconds, processorSeconds, peakBytes,
 * resident, said }: wall time from start to end, processor time of all its threads, the largest resident memory that the
 * kernel noted for the process, threads included (VmHWM of /proc), and resident memory along the run as
 * { seconds, bytes }. Figures from /proc are NaN or empty elsewhere than on Linux.
 */
export function runWatched(words, program = process.execPath) {
  return new Promise((resolve, reject) => {
    const started = performance.now();
    const child = spawn(program, words, { stdio: ['ignore', 'pipe', 'pipe'] });
    let said = '';
    let peakBytes = Number.NaN;
    let processorSeconds = Number.NaN;
    const resident = [];
    child.stdout.on('data', (text) => {
      said += text;
    });
    child.stderr.on('data', (text) => {
      said += text;
    });
    const timer = setInterval(() => {
      try {
        const status = readFileSync(`/proc/${child.pid}/status`, 'utf8');
        const peak = /VmHWM:\s+(\d+) kB/.exec(status);
        if (peak !== null) peakBytes = 1024 * Number(peak[1]);
        const now = /VmRSS:\s+(\d+) kB/.exec(status);
        if (now !== null)
          resident.push({ seconds: (performance.now() - started) / 1000, bytes: 1024 * Number(now[1]) });
        // After the name in brackets: fields 14 and 15 of the line are user and system time in ticks of 10 ms.
        const fields = readFileSync(`/proc/${child.pid}/stat`, 'utf8').split(') ')[1].split(' ');
        const ticks = Number(fields[11]) + Number(fields[12]);
        if (ticks > 0) processorSeconds = ticks / TICKS_PER_SECOND;
      } catch {
        // Ended, or no /proc.
      }
    }, LOOK_MS);
    child.on('error', reject);
    child.on('close', (code) => {
      clearInterval(timer);
      resolve({ code, seconds: (performance.now() - started) / 1000, processorSeconds, peakBytes, resident, said });
    });
  });
}
