/**
 * Working columns that are kept from window to window, so that a long run does not fill memory with dead ones before
 * the garbage collector looks. Mutable: one space a user, one window at a time.
 */
export class FitSpace {
  private readonly columns = new Map<string, Uint8Array | Uint32Array | Int32Array | Float32Array>();

  /** Column `name` of `length` zeros. Void once it is asked for again. */
  uint8(name: string, length: number): Uint8Array {
    return this.take(name, length, (size) => new Uint8Array(size)) as Uint8Array;
  }

  uint32(name: string, length: number): Uint32Array {
    return this.take(name, length, (size) => new Uint32Array(size)) as Uint32Array;
  }

  int32(name: string, length: number): Int32Array {
    return this.take(name, length, (size) => new Int32Array(size)) as Int32Array;
  }

  float32(name: string, length: number): Float32Array {
    return this.take(name, length, (size) => new Float32Array(size)) as Float32Array;
  }

  private take<C extends Uint8Array | Uint32Array | Int32Array | Float32Array>(
    name: string,
    length: number,
    make: (size: number) => C,
  ): C {
    const known = this.columns.get(name) as C | undefined;
    if (known !== undefined && known.length >= length) {
      const view = known.subarray(0, length) as C;
      view.fill(0);
      return view;
    }
    const made = make(known === undefined ? length : Math.ceil(1.1 * length));
    this.columns.set(name, made);
    return made.subarray(0, length) as C;
  }
}
