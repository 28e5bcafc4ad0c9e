import { createSHA256 } from 'hash-wasm';
import type { HasherFactory } from '../core/bytes.js';

/**
 * Streaming SHA-256 for browsers (`crypto.subtle` neither streams nor exists on plain http away from localhost).
 * One WebAssembly instance serves all hashers: who updates next puts its saved state in, about 110 bytes.
 */
export async function createWebHasherFactory(): Promise<HasherFactory> {
  const engine = await createSHA256();
  const blank = engine.init().save();
  /** Whose state the engine holds. */
  let current: object | null = null;
  let keep: () => void = () => {};

  return () => {
    let state = blank;
    let spent = false;
    const self = {};
    function enter(): void {
      if (current === self) return;
      keep();
      engine.load(state);
      current = self;
      keep = () => {
        state = engine.save();
      };
    }
    return {
      update(bytes) {
        if (spent) throw new TypeError('a spent hasher was updated');
        enter();
        engine.update(bytes);
      },
      hex() {
        if (spent) throw new TypeError('a spent hasher was read');
        enter();
        spent = true;
        current = null;
        keep = () => {};
        return engine.digest('hex');
      },
    };
  };
}
