import { Base64Stream } from './base64.js';
import type { CountedSink } from './table.js';

/** Number types of VTK XML files that we write. */
export type VtkType = 'Int32' | 'Int64' | 'Float32' | 'Float64';

const BYTES: Readonly<Record<VtkType, number>> = { Int32: 4, Int64: 8, Float32: 4, Float64: 8 };

/** Text that may stand between quotes in XML. */
export function attribute(text: string): string {
  return text.replace(/&/g, '&amp;').replace(/</g, '&lt;').replace(/"/g, '&quot;');
}

/** Writes the pieces of a VTK XML file: text, and arrays as inline base64 behind a count of bytes in 64 bits. */
export class VtkXml {
  readonly #sink: CountedSink;
  readonly #encoder = new TextEncoder();

  constructor(sink: CountedSink) {
    this.#sink = sink;
  }

  text(text: string): Promise<void> {
    return this.#sink.write(this.#encoder.encode(text));
  }

  /** Head of a file of the given kind (`PolyData`, `ImageData`); the caller closes `</VTKFile>`. */
  head(kind: string): Promise<void> {
    return this.text(
      `<?xml version="1.0"?>\n<VTKFile type="${kind}" version="1.0" byte_order="LittleEndian" header_type="UInt64">\n`,
    );
  }

  /**
   * One DataArray of `count` numbers that `source` yields piece by piece. The count of bytes stands first and is
   * encoded in one run with the data, as files of version 1.0 have it; a source that yields another count throws.
   */
  async array(
    name: string,
    type: VtkType,
    components: number,
    count: number,
    source: AsyncIterable<ArrayLike<number>>,
  ): Promise<void> {
    const parts = components === 1 ? '' : ` NumberOfComponents="${components}"`;
    await this.text(`<DataArray type="${type}" Name="${attribute(name)}"${parts} format="binary">\n`);
    const base64 = new Base64Stream();
    const head = new DataView(new ArrayBuffer(8));
    head.setBigUint64(0, BigInt(count * BYTES[type]), true);
    await this.#sink.write(base64.push(new Uint8Array(head.buffer)));
    let written = 0;
    for await (const values of source) {
      await this.#sink.write(base64.push(littleEndian(values, type)));
      written += values.length;
    }
    if (written !== count) throw new RangeError(`VTK array ${name}: got ${written} numbers, expected ${count}`);
    await this.#sink.write(base64.finish());
    await this.text('\n</DataArray>\n');
  }
}

function littleEndian(values: ArrayLike<number>, type: VtkType): Uint8Array {
  const size = BYTES[type];
  const bytes = new Uint8Array(values.length * size);
  const view = new DataView(bytes.buffer);
  for (let i = 0; i < values.length; i++) {
    const at = i * size;
    if (type === 'Int32') view.setInt32(at, values[i]!, true);
    else if (type === 'Int64') view.setBigInt64(at, BigInt(values[i]!), true);
    else if (type === 'Float32') view.setFloat32(at, values[i]!, true);
    else view.setFloat64(at, values[i]!, true);
  }
  return bytes;
}
