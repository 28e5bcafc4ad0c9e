/** Numbers appended one by one into a typed array that doubles when full. */
export interface Growable<T extends Int32Array | Float64Array> {
  readonly length: number;
  /** The array in use; longer than `length`, replaced when it grows. */
  readonly array: T;
  push(value: number): void;
  /** Makes at least `length` values, new ones 0. */
  extend(length: number): void;
}

/** A growable of the given array type. */
export function growable<T extends Int32Array | Float64Array>(type: new (length: number) => T): Growable<T> {
  let array = new type(1024);
  let length = 0;
  const reserve = (size: number) => {
    if (size <= array.length) return;
    const larger = new type(Math.max(size, 2 * array.length));
    larger.set(array);
    array = larger;
  };
  return {
    get length() {
      return length;
    },
    get array() {
      return array;
    },
    push(value) {
      reserve(length + 1);
      array[length++] = value;
    },
    extend(size) {
      reserve(size);
      length = Math.max(length, size);
    },
  };
}
