import { isWakeloomError, WakeloomError } from '../core/errors.js';
import type { OperationBodies } from './host.js';
import type { PageOperations, PathlinePreview } from './operation-table.js';
import { type Platform, runBodies } from './operations.js';
import { buffersIn, buffersOf } from './transfer.js';
import type { MemoryResultPlace } from './web-result-place.js';

/** Platform of a page's worker: it keeps the folder of its last run, one at a time, in memory. */
export interface PagePlatform extends Platform {
  /** The folder of the last run, finished or not; null before the first. */
  lastPlace(): MemoryResultPlace | null;
}

/** Rows read at once from a result: three variables of 8 bytes make 6 MB. */
const ROWS_AT_ONCE = 262_144;

function finished(platform: PagePlatform): MemoryResultPlace {
  const place = platform.lastPlace();
  if (place !== null && place.size('run.json') >= 0) return place;
  throw new WakeloomError('store/not-a-result', 'result: got none, expected a finished run; process a dump first');
}

/** A full folder in memory is no full disk: other words and another way out. Code `store/memory-full`. */
function asMemoryFull(error: unknown): unknown {
  if (!isWakeloomError(error) || error.code !== 'store/disk-full') return error;
  const { needBytes = null, freeBytes = null } = error.details;
  return new WakeloomError(
    'store/memory-full',
    `result in the memory of the page: got ${freeBytes} bytes free, expected at least ${needBytes}; keep fewer pathlines or frames, or process this run with the wakeloom command, which writes to the disk`,
    { needBytes, freeBytes },
    error,
  );
}

/** Bodies of what a page's worker answers. */
export const pageBodies: OperationBodies<PageOperations, PagePlatform> = {
  ...runBodies,

  async process(args, context, platform) {
    try {
      return await runBodies.process(args, context, platform);
    } catch (error) {
      throw asMemoryFull(error);
    }
  },

  async resolve({ options, dumpFiles, sheet = null }) {
    const { resolveRun } = await import('../run/resolve.js');
    if (sheet === null) return { value: resolveRun({ options, dumpFiles }), transfer: [] };
    // YAML and schema are fetched by those only who have a sheet.
    const { parseRunSheet } = await import('../run/run-sheet.js');
    const parsed = parseRunSheet(sheet.text, sheet.name);
    return { value: resolveRun({ sheet: parsed, options, dumpFiles }), transfer: [] };
  },

  async preview({ most }, context, platform) {
    const { openResult } = await import('../store/read-result.js');
    const result = await openResult(finished(platform));
    try {
      const { pathlines } = result;
      if (pathlines === null) {
        throw new WakeloomError(
          'store/not-a-result',
          'preview: got a result without pathlines, expected one that keeps them; process with all pathlines kept',
        );
      }
      const count = pathlines.rowSize.length;
      const stride = Math.max(1, Math.ceil(pathlines.samples / most));
      const shown: number[] = [];
      for (let index = 0; index < count; index += stride) shown.push(index);
      const rowSize = Int32Array.from(shown, (index) => pathlines.rowSize[index]);
      const rows = rowSize.reduce((sum, size) => sum + size, 0);
      const x = new Float32Array(rows);
      const y = new Float32Array(rows);
      const speed = new Float32Array(rows);
      const components = pathlines.dims === 3 ? ['u', 'v', 'w'] : ['u', 'v'];
      let filled = 0;
      let next = 0;
      while (next < shown.length) {
        await context.breathe();
        // As many of the shown pathlines as lie within one piece of the file; at least one.
        const start = pathlines.firstRow[shown[next]];
        let last = next;
        while (last + 1 < shown.length && pathlines.firstRow[shown[last + 1] + 1] - start <= ROWS_AT_ONCE) last++;
        const end = pathlines.firstRow[shown[last] + 1];
        const piece = (name: string) => pathlines.rows(name, start, end);
        const px = piece('x');
        const py = piece('y');
        const velocity = components.map(piece);
        for (; next <= last; next++) {
          const from = pathlines.firstRow[shown[next]] - start;
          for (let row = from; row < from + rowSize[next]; row++, filled++) {
            x[filled] = px[row];
            y[filled] = py[row];
            let square = 0;
            for (const component of velocity) square += component[row] * component[row];
            speed[filled] = Math.sqrt(square);
          }
        }
      }
      const value: PathlinePreview = { rowSize, x, y, speed, stride, pathlines: count, samples: pathlines.samples };
      return { value, transfer: buffersIn(value) };
    } finally {
      result.close();
    }
  },

  files(_, __, platform) {
    const place = finished(platform);
    return { value: place.files().map((name) => ({ name, bytes: place.size(name) })), transfer: [] };
  },

  file({ name }, _, platform) {
    const bytes = finished(platform).bytes(name);
    return { value: bytes, transfer: buffersOf(bytes) };
  },
};
