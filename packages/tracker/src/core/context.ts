import { abortedError } from './errors.js';

/** Something worth a line in log.ndjson and perhaps a word to the user. */
export interface RunEvent {
  /** `stage/what`, such as `dump/row-set-aside` or `linking/reach-chosen`. */
  readonly code: string;
  readonly level: 'info' | 'note' | 'warning';
  /** One plain sentence with figures and units. */
  readonly message: string;
  readonly details: Readonly<Record<string, unknown>>;
}

/** Stage name, work done, work in all (null where unknown), and the unit of both (`frames`, `bytes`, `samples`). */
export type ProgressListener = (stage: string, done: number, total: number | null, unit: string) => void;

/** What every long-running step is handed. It carries no settings and no data. */
export interface RunContext {
  readonly signal: AbortSignal;
  /** Limits the step must keep: working memory in bytes, threads that may run beside it. */
  readonly budget: { readonly bytes: number; readonly threads: number };
  progress(stage: string, done: number, total: number | null, unit: string): void;
  event(event: RunEvent): void;
  /** A 32-bit seed that depends on the run's seed setting and the label only. */
  seed(label: string): number;
  /**
   * To be awaited in loops at least every 50 ms of work: lets messages in, throws `run/aborted` when the
   * signal has fired. Cheap when called often (it looks at the clock and mostly returns at once).
   */
  breathe(): Promise<void> | void;
}

export interface ContextOptions {
  signal?: AbortSignal;
  bytes?: number;
  threads?: number;
  seed?: number;
  onProgress?: ProgressListener;
  onEvent?: (event: RunEvent) => void;
  /** Lets the event loop turn once; the default suits Node and browsers. */
  yieldTurn?: () => Promise<void>;
  /** Monotonic milliseconds, used only to decide when to yield, never in a result. */
  now?: () => number;
}

/** FNV-1a (Fowler, Noll, Vo; 32 bit) over the label, started from the seed: one setting gives every seed of a run. */
export function seedFor(seed: number, label: string): number {
  let hash = (0x811c9dc5 ^ (seed | 0)) >>> 0;
  for (let i = 0; i < label.length; i++) {
    hash = Math.imul(hash ^ label.charCodeAt(i), 0x01000193) >>> 0;
  }
  return hash;
}

/** Longest stretch of work between two looks at messages, ms (design: abort within 0.2 s, progress flows). */
const BREATH_MS = 25;

function defaultYield(): Promise<void> {
  const { setImmediate: immediate } = globalThis as { setImmediate?: (call: () => void) => void };
  if (immediate !== undefined) return new Promise((resolve) => immediate(resolve));
  // A message port turns the event loop without the 4 ms clamp that browsers put on nested timers.
  return new Promise((resolve) => {
    const { port1, port2 } = new MessageChannel();
    port1.onmessage = () => {
      port1.close();
      resolve();
    };
    port2.postMessage(null);
  });
}

/** A context from a few options; what is not given is silent, unlimited, and seeded with 1. */
export function createContext(options: ContextOptions = {}): RunContext {
  const signal = options.signal ?? new AbortController().signal;
  const now = options.now ?? (() => performance.now());
  const yieldTurn = options.yieldTurn ?? defaultYield;
  const seed = options.seed ?? 1;
  let last = now();
  return {
    signal,
    budget: { bytes: options.bytes ?? 256 * 1024 * 1024, threads: options.threads ?? 1 },
    progress: options.onProgress ?? (() => {}),
    event: options.onEvent ?? (() => {}),
    seed: (label) => seedFor(seed, label),
    breathe() {
      if (signal.aborted) throw abortedError();
      const time = now();
      if (time - last < BREATH_MS) return;
      return yieldTurn().then(() => {
        last = now();
        if (signal.aborted) throw abortedError();
      });
    },
  };
}
