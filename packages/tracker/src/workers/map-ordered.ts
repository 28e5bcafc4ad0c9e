/** Arguments of one operation and the buffers in them that move. */
export interface Task<Args> {
  readonly args: Args;
  readonly transfer?: readonly ArrayBuffer[];
}

/**
 * Starts work on each item as it comes and gives the values in the order of the items, with at most `limit`
 * items taken and not yet delivered, so that memory stays bounded however long the stream is. The first
 * failure, and an early end of reading, aborts what is in flight and waits for it.
 */
export async function* mapOrdered<Item, Value>(
  items: AsyncIterable<Item>,
  limit: number,
  signal: AbortSignal | undefined,
  work: (item: Item, signal: AbortSignal) => Promise<Value>,
): AsyncGenerator<Value> {
  const controller = new AbortController();
  const abort = (): void => controller.abort();
  if (signal?.aborted) abort();
  signal?.addEventListener('abort', abort);
  const flight: Promise<Value>[] = [];
  const source = items[Symbol.asyncIterator]();
  let ended = false;
  try {
    for (;;) {
      while (!ended && flight.length < Math.max(1, limit)) {
        const next = await source.next();
        if (next.done) {
          ended = true;
          break;
        }
        const value = work(next.value, controller.signal);
        // Its turn to be awaited comes later; until then a failure must not count as unhandled.
        value.catch(() => {});
        flight.push(value);
      }
      const first = flight.shift();
      if (first === undefined) return;
      yield await first;
    }
  } finally {
    signal?.removeEventListener('abort', abort);
    abort();
    await Promise.allSettled(flight);
    if (!ended) await source.return?.();
  }
}
