import { Decompress } from 'fzstd';
import type { ByteSource, Hasher } from '../core/bytes.js';
import { isWakeloomError, WakeloomError } from '../core/errors.js';
import { FILE_MAGIC, hasMagic } from './file-kind.js';

/** Bytes read from a compressed file at a time. */
const COMPRESSED_CHUNK = 256 * 1024;

/** Bytes in order, uncompressed, into the caller's memory. */
export interface ByteStream {
  /** Fills `into` from its start; fewer bytes than fit only at the end, 0 after it. */
  read(into: Uint8Array): Promise<number>;
  /** Lets go of what decompression holds. The source stays open. */
  close(): Promise<void>;
}

/** Sees the bytes of the file on disk as they go by. */
export interface StreamWatcher {
  readonly hasher: Hasher | null;
  /** Called with the bytes read from disk since the last call. */
  advance(bytes: number): void;
}

/**
 * Opens a file for one reading from start to end; gzip (of several members too, where the platform's decompressor
 * takes them: Node does) and zstd are recognised by their first bytes.
 *
 * gzip's checksum is checked, zstd's is not (fzstd does not look at it): a zstd file with flipped bytes may give wrong
 * digits without an error, so keep the SHA-256 of the scan beside it.
 *
 * Reading throws `dump/truncated-gzip`, `dump/corrupt-gzip`, `dump/truncated-zstd`, `dump/corrupt-zstd`,
 * `dump/read-failed`. Memory: one chunk, for zstd its window too.
 */
export async function openStream(source: ByteSource, watcher: StreamWatcher): Promise<ByteStream> {
  const raw = new RawBytes(source, watcher);
  const head = await readHead(source, 4);
  if (hasMagic(head, FILE_MAGIC.gzip)) return new GzipBytes(raw, source.name);
  if (hasMagic(head, FILE_MAGIC.zstd)) return new ZstdBytes(raw, source.name);
  return raw;
}

class RawBytes implements ByteStream {
  readonly #source: ByteSource;
  readonly #watcher: StreamWatcher;
  #position = 0;

  constructor(source: ByteSource, watcher: StreamWatcher) {
    this.#source = source;
    this.#watcher = watcher;
  }

  async read(into: Uint8Array): Promise<number> {
    const got = await readFrom(this.#source, this.#position, into);
    this.#position += got;
    if (got > 0) {
      this.#watcher.hasher?.update(into.subarray(0, got));
      this.#watcher.advance(got);
    }
    return got;
  }

  async close(): Promise<void> {}
}

/** The first bytes of a file, fewer than asked when it is shorter. */
export async function readHead(source: ByteSource, bytes: number): Promise<Uint8Array> {
  const head = new Uint8Array(bytes);
  return head.subarray(0, await readFrom(source, 0, head));
}

/** Fills `into` from `position`, however short the single reads of the source are. */
export async function readFrom(source: ByteSource, position: number, into: Uint8Array): Promise<number> {
  let filled = 0;
  try {
    while (filled < into.length) {
      const got = await source.read(position + filled, filled === 0 ? into : into.subarray(filled));
      if (got === 0) break;
      filled += got;
    }
  } catch (error) {
    if (isWakeloomError(error)) throw error;
    const what = error instanceof Error ? error.message : String(error);
    throw new WakeloomError(
      'dump/read-failed',
      `reading failed: got "${what}" at byte ${position + filled}, expected ${source.size} readable bytes (${source.name})`,
      { file: source.name, position: position + filled },
      error,
    );
  }
  return filled;
}

/** Hands out what a decompressor gives, chunk by chunk. */
abstract class Unpacked implements ByteStream {
  #chunk: Uint8Array = new Uint8Array(0);
  #at = 0;

  /** The next piece of uncompressed bytes, or null at the end. */
  protected abstract next(): Promise<Uint8Array | null>;
  abstract close(): Promise<void>;

  async read(into: Uint8Array): Promise<number> {
    let filled = 0;
    while (filled < into.length) {
      if (this.#at === this.#chunk.length) {
        const next = await this.next();
        if (next === null) break;
        this.#chunk = next;
        this.#at = 0;
        continue;
      }
      const take = Math.min(into.length - filled, this.#chunk.length - this.#at);
      into.set(this.#chunk.subarray(this.#at, this.#at + take), filled);
      this.#at += take;
      filled += take;
    }
    return filled;
  }
}

class GzipBytes extends Unpacked {
  readonly #reader: ReadableStreamDefaultReader<Uint8Array>;
  readonly #name: string;
  #out = 0;

  constructor(raw: RawBytes, name: string) {
    super();
    this.#name = name;
    const compressed = new ReadableStream<Uint8Array<ArrayBuffer>>({
      async pull(controller) {
        const chunk = new Uint8Array(COMPRESSED_CHUNK);
        const got = await raw.read(chunk);
        if (got > 0) controller.enqueue(chunk.subarray(0, got));
        else controller.close();
      },
    });
    this.#reader = compressed.pipeThrough(new DecompressionStream('gzip')).getReader();
  }

  protected override async next(): Promise<Uint8Array | null> {
    try {
      const { done, value } = await this.#reader.read();
      if (done) return null;
      this.#out += value.length;
      return value;
    } catch (error) {
      throw unpackError('gzip', error, this.#name, this.#out);
    }
  }

  override async close(): Promise<void> {
    // After an error the stream is closed already and cancelling only repeats that error.
    await this.#reader.cancel().catch(() => {});
  }
}

class ZstdBytes extends Unpacked {
  readonly #raw: RawBytes;
  readonly #name: string;
  readonly #decompress: Decompress;
  #queue: Uint8Array[] = [];
  #ended = false;
  #out = 0;

  constructor(raw: RawBytes, name: string) {
    super();
    this.#raw = raw;
    this.#name = name;
    // The decompressor may reuse the memory of what it hands over once the call is back: keep a copy.
    this.#decompress = new Decompress((data) => this.#queue.push(data.slice()));
  }

  protected override async next(): Promise<Uint8Array | null> {
    while (this.#queue.length === 0 && !this.#ended) {
      const chunk = new Uint8Array(COMPRESSED_CHUNK);
      const got = await this.#raw.read(chunk);
      this.#ended = got === 0;
      try {
        this.#decompress.push(chunk.subarray(0, got), this.#ended);
      } catch (error) {
        throw unpackError('zstd', error, this.#name, this.#out);
      }
    }
    const next = this.#queue.shift() ?? null;
    if (next !== null) this.#out += next.length;
    return next;
  }

  override async close(): Promise<void> {
    this.#queue = [];
  }
}

function unpackError(kind: 'gzip' | 'zstd', error: unknown, file: string, out: number): Error {
  if (isWakeloomError(error)) return error;
  const what = error instanceof Error ? error.message : String(error);
  // Node: "unexpected end of file" (Z_BUF_ERROR); browsers: "Compressed input was truncated."; fzstd: "unexpected EOF".
  const cut = /unexpected end|unexpected eof|truncated/i.test(what);
  const message = cut
    ? `${kind} file cut short: got an end after ${out} uncompressed bytes, expected the end mark of the ${kind} stream; copy the file again (${file})`
    : `${kind} file corrupt: got "${what}" after ${out} uncompressed bytes, expected a whole ${kind} stream; copy the file again (${file})`;
  return new WakeloomError(`dump/${cut ? 'truncated' : 'corrupt'}-${kind}`, message, { file, bytes: out }, error);
}
