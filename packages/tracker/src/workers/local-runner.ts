import type { RunContext } from '../core/context.js';
import { WakeloomError } from '../core/errors.js';
import type { OperationBodies } from './host.js';
import { mapOrdered } from './map-ordered.js';
import type { KernelRunner } from './pool.js';
import type { OperationName, OperationTable } from './protocol.js';

/**
 * Runs operations in the calling thread, one after the other: what a run with a single worker uses. Signal,
 * progress and limits are those of `context`; a call's own options are not looked at. Nothing is copied or moved.
 */
export function createLocalRunner<Table extends OperationTable, Platform>(
  bodies: OperationBodies<Table, Platform>,
  context: RunContext,
  platform: Platform,
): KernelRunner<Table> {
  async function run<Name extends OperationName<Table>>(
    operation: Name,
    args: Table[Name]['args'],
  ): Promise<Table[Name]['value']> {
    if (!Object.hasOwn(bodies, operation)) {
      throw new WakeloomError(
        'worker/unknown-operation',
        `kernel call: got "${operation}", expected a known operation`,
        {
          operation,
        },
      );
    }
    return (await bodies[operation](args, context, platform)).value;
  }
  return {
    width: 1,
    run,
    mapOrdered: (operation, tasks) => mapOrdered(tasks, 1, context.signal, (task) => run(operation, task.args)),
    terminate: () => Promise.resolve(),
  };
}
