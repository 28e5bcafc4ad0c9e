/**
 * Where bytes come from and go to. The library itself has no file system: Node and the browser hand in
 * their own sources, sinks and scratch files (see `node/` and `workers/entry-web.ts`).
 */

/** Random-access bytes: a file, a Blob, an HTTP resource that answers range requests. */
export interface ByteSource {
  /** Name for messages: a path as the user wrote it, or a file name. */
  readonly name: string;
  /** Bytes in all. */
  readonly size: number;
  /** Last change as ISO 8601, or null where unknown. For provenance only. */
  readonly modified: string | null;
  /**
   * Reads into `into`, starting at `position`; resolves to the number of bytes read, fewer than asked
   * only at the end. Borrowed: the source does not keep `into`.
   */
  read(position: number, into: Uint8Array): Promise<number>;
  close(): Promise<void>;
}

/** Sequential bytes out. `write` borrows its argument until the promise settles. */
export interface ByteSink {
  write(bytes: Uint8Array): Promise<void>;
  close(): Promise<void>;
}

/** A temporary file that grows at its end and is read anywhere; gone after `discard`. */
export interface ScratchFile {
  readonly length: number;
  append(bytes: Uint8Array): void;
  /** Fills `into` from `position`; throws `store/scratch-short` when fewer bytes are there. */
  read(position: number, into: Uint8Array): void;
  discard(): void;
}

/** Makes scratch files. In Node they lie inside the result folder under `.partial-*`; in the browser in memory within a stated limit. */
export interface Scratch {
  create(label: string): ScratchFile;
}

/** Streaming SHA-256. In Node `node:crypto`, in the browser hash-wasm. */
export interface Hasher {
  update(bytes: Uint8Array): void;
  /** Lower-case hex; the hasher is spent afterwards. */
  hex(): string;
}

export type HasherFactory = () => Hasher;
