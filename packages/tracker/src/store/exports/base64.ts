const ALPHABET = new TextEncoder().encode('ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/');
const PAD = 0x3d;

/** Base64 (RFC 4648 section 4) of bytes that arrive in pieces, without line breaks. */
export class Base64Stream {
  /** Bytes of an unfinished group of three. */
  readonly #rest = new Uint8Array(3);
  #held = 0;

  /** Text of all whole groups so far, as ASCII bytes; borrows its argument. */
  push(bytes: Uint8Array): Uint8Array {
    const total = this.#held + bytes.length;
    const out = new Uint8Array(4 * Math.floor(total / 3));
    let at = 0;
    for (let i = 0; i < bytes.length; i++) {
      this.#rest[this.#held++] = bytes[i]!;
      if (this.#held === 3) {
        encodeInto(this.#rest, out, at);
        at += 4;
        this.#held = 0;
      }
    }
    return out;
  }

  /** The last group with its padding; the stream starts anew afterwards. */
  finish(): Uint8Array {
    if (this.#held === 0) return new Uint8Array(0);
    const out = new Uint8Array(4);
    this.#rest.fill(0, this.#held);
    encodeInto(this.#rest, out, 0);
    out.fill(PAD, this.#held + 1);
    this.#held = 0;
    return out;
  }
}

function encodeInto(three: Uint8Array, out: Uint8Array, at: number): void {
  const [a, b, c] = three as unknown as [number, number, number];
  out[at] = ALPHABET[a >> 2]!;
  out[at + 1] = ALPHABET[((a & 3) << 4) | (b >> 4)]!;
  out[at + 2] = ALPHABET[((b & 15) << 2) | (c >> 6)]!;
  out[at + 3] = ALPHABET[c & 63]!;
}
