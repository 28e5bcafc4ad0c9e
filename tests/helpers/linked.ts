import type { Dims, LinkedBlock } from '@wakeloom/tracker/core/columns';

/** One detection of a made-up pathline. */
export interface LinkedPoint {
  readonly frame: number;
  readonly pathline: number;
  readonly x: number;
  readonly y: number;
  readonly z?: number;
  readonly risk?: number;
}

/** A linked block from points in any order: rows sorted by frame and, within a frame, kept in the order given. */
export function linkedBlock(
  points: readonly LinkedPoint[],
  options: {
    readonly dims?: Dims;
    readonly timeOf?: (frame: number) => number;
    readonly segmentOf?: (frame: number) => number;
  } = {},
): LinkedBlock {
  const dims = options.dims ?? 2;
  const sorted = points.map((point, order) => ({ point, order }));
  sorted.sort((a, b) => a.point.frame - b.point.frame || a.order - b.order);
  const numbers = [...new Set(sorted.map(({ point }) => point.frame))];
  const offsets = new Uint32Array(numbers.length + 1);
  const column = (of: (point: LinkedPoint) => number) => Float64Array.from(sorted, ({ point }) => of(point));
  let row = 0;
  for (const [k, frame] of numbers.entries()) {
    while (row < sorted.length && sorted[row]!.point.frame === frame) row++;
    offsets[k + 1] = row;
  }
  return {
    dims,
    number: Int32Array.from(numbers),
    time: Float64Array.from(numbers, options.timeOf ?? ((frame) => frame)),
    segment: Int32Array.from(numbers, options.segmentOf ?? (() => 0)),
    offsets,
    x: column((point) => point.x),
    y: column((point) => point.y),
    z: dims === 3 ? column((point) => point.z ?? 0) : new Float64Array(0),
    brightness: new Float32Array(0),
    row: Float64Array.from(sorted, ({ order }) => order),
    given: new Int32Array(0),
    pathline: Int32Array.from(sorted, ({ point }) => point.pathline),
    linkRisk: Float32Array.from(sorted, ({ point }) => point.risk ?? 0),
  };
}

/** Frames `from .. to - 1` of a block as a block of its own. */
export function sliceFrames(block: LinkedBlock, from: number, to: number): LinkedBlock {
  const start = block.offsets[from]!;
  const end = block.offsets[to]!;
  return {
    dims: block.dims,
    number: block.number.slice(from, to),
    time: block.time.slice(from, to),
    segment: block.segment.slice(from, to),
    offsets: block.offsets.slice(from, to + 1).map((offset) => offset - start),
    x: block.x.slice(start, end),
    y: block.y.slice(start, end),
    z: block.z.slice(start, end),
    brightness: block.brightness.slice(start, end),
    row: block.row.slice(start, end),
    given: block.given.slice(start, end),
    pathline: block.pathline.slice(start, end),
    linkRisk: block.linkRisk.slice(start, end),
  };
}
