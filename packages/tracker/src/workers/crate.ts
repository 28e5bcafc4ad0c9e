type Column = Float64Array | Float32Array | Int32Array | Uint32Array | Uint16Array | Uint8Array;

const KINDS = { Float64Array, Float32Array, Int32Array, Uint32Array, Uint16Array, Uint8Array } as const;
type Kind = keyof typeof KINDS;

/** An object of numbers and columns in one buffer, to be moved to another thread and its buffer brought back. */
export interface Crate {
  readonly buffer: ArrayBuffer;
  readonly columns: readonly { readonly name: string; readonly kind: Kind; readonly length: number }[];
  readonly numbers: readonly (readonly [string, number])[];
}

/** Columns begin at whole multiples of this. */
const ALIGNMENT = 8;

/**
 * Copies an object's typed arrays and numbers into a crate. Takes one of `spares` that is large enough, so that a stream
 * of blocks goes to and fro in a few buffers: received ones, which the garbage collector is slow to see, do not pile up.
 * Spares that are too small are dropped.
 */
export function pack(block: object, spares: ArrayBuffer[]): Crate {
  const columns: { name: string; kind: Kind; length: number }[] = [];
  const numbers: [string, number][] = [];
  const arrays: Column[] = [];
  let bytes = 0;
  for (const [name, value] of Object.entries(block) as [string, unknown][]) {
    if (typeof value === 'number') numbers.push([name, value]);
    else {
      const array = value as Column;
      arrays.push(array);
      columns.push({ name, kind: array.constructor.name as Kind, length: array.length });
      bytes += aligned(array.byteLength);
    }
  }
  let buffer = spares.pop();
  while (buffer !== undefined && buffer.byteLength < bytes) buffer = spares.pop();
  // Some room to spare: the next block is about as large.
  buffer ??= new ArrayBuffer(aligned(1.1 * bytes));
  let at = 0;
  for (const array of arrays) {
    new Uint8Array(buffer, at, array.byteLength).set(new Uint8Array(array.buffer, array.byteOffset, array.byteLength));
    at += aligned(array.byteLength);
  }
  return { buffer, columns, numbers };
}

/** What was packed, its columns views of the crate's buffer. The caller names the type that was packed. */
export function unpack<Block extends object>({ buffer, columns, numbers }: Crate): Block {
  const block: Record<string, Column | number> = Object.fromEntries(numbers);
  let at = 0;
  for (const { name, kind, length } of columns) {
    const array = new KINDS[kind](buffer, at, length);
    block[name] = array;
    at += aligned(array.byteLength);
  }
  return block as Block;
}

function aligned(bytes: number): number {
  return ALIGNMENT * Math.ceil(bytes / ALIGNMENT);
}
