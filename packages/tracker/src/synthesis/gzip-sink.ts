import type { ByteSink } from '../core/bytes.js';

/** A sink that compresses (gzip, RFC 1952, no time stamp) what is written to it into `inner`; closing closes both. */
export function gzipSink(inner: ByteSink): ByteSink {
  const stream = new CompressionStream('gzip');
  const writer = stream.writable.getWriter();
  const drained = (async () => {
    const reader = stream.readable.getReader();
    for (;;) {
      const { done, value } = await reader.read();
      if (done) return;
      await inner.write(value);
    }
  })();
  // Its failure is handed to whoever writes or closes; without this it would also count as unhandled meanwhile.
  drained.catch(() => {});
  return {
    // `write` borrows, the stream does not: it may still hold the bytes after the promise has settled.
    write: (bytes) => Promise.race([writer.write(bytes.slice()), drained]),
    close: async () => {
      try {
        await Promise.all([writer.close(), drained]);
      } finally {
        await inner.close();
      }
    },
  };
}
