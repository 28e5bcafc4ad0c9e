import { fork } from 'node:child_process';
import { fileURLToPath } from 'node:url';

const WORKER = fileURLToPath(new URL('worker.mjs', import.meta.url));

/**
 * Measures the cases in `workers` processes; `onCase(index, answer)` is told each answer, `{ result }` or `{ error }`,
 * as it comes. A process that dies costs the case it was at: another takes its place.
 */
export function runCases(cases, { address, places, workers, onCase }) {
  let next = 0;
  const serve = () =>
    new Promise((resolve) => {
      if (next >= cases.length) return resolve();
      const child = fork(WORKER, [address, JSON.stringify(places)], { serialization: 'advanced' });
      let at = -1;
      child.on('message', (answer) => {
        if (at >= 0) onCase(at, answer);
        at = next < cases.length ? next++ : -1;
        if (at >= 0) child.send(cases[at]);
        else child.disconnect();
      });
      child.on('exit', (code, signal) => {
        if (at >= 0) onCase(at, { error: `the process ended with ${signal ?? code} in this case` });
        else if (code !== 0) next = cases.length;
        resolve(serve());
      });
    });
  return Promise.all(Array.from({ length: Math.min(workers, cases.length) }, serve));
}
