import type { Dims, LinkedBlock, SampleBlock } from '../core/columns.js';

/** Empty sample columns for `rows` rows over the given frames; the caller fills them. Columns along z are empty in the plane. */
export function sampleColumns(
  dims: Dims,
  rows: number,
  frames: Pick<SampleBlock, 'number' | 'time' | 'segment' | 'offsets'>,
): SampleBlock {
  const deep = dims === 3 ? rows : 0;
  return {
    dims,
    ...frames,
    pathline: new Int32Array(rows),
    x: new Float64Array(rows),
    y: new Float64Array(rows),
    z: new Float64Array(deep),
    u: new Float32Array(rows),
    v: new Float32Array(rows),
    w: new Float32Array(deep),
    ax: new Float32Array(rows),
    ay: new Float32Array(rows),
    az: new Float32Array(deep),
    xSe: new Float32Array(rows),
    ySe: new Float32Array(rows),
    zSe: new Float32Array(deep),
    uSe: new Float32Array(rows),
    vSe: new Float32Array(rows),
    wSe: new Float32Array(deep),
    axSe: new Float32Array(rows),
    aySe: new Float32Array(rows),
    azSe: new Float32Array(deep),
    measuredX: new Float64Array(rows),
    measuredY: new Float64Array(rows),
    measuredZ: new Float64Array(deep),
    linkRisk: new Float32Array(rows),
    detection: new Float64Array(rows),
    flags: new Uint16Array(rows),
  };
}

/** Where the samples of the core go: empty columns, and the sample row of each window row from `firstRow` on. */
export interface CoreRows {
  readonly samples: SampleBlock;
  /** First and one past the last window row of the core. */
  readonly firstRow: number;
  readonly lastRow: number;
  /** Sample row of window row firstRow + i, -1 for a detection without pathline. */
  readonly sampleOf: Int32Array;
}

/**
 * Makes room for the samples of frames `from .. to - 1` and fills what comes straight from the detections:
 * pathline, measured position, link risk, detection. Rows keep their order within the frame.
 */
export function coreRows(window: LinkedBlock, from: number, to: number): CoreRows {
  const firstRow = window.offsets[from]!;
  const lastRow = window.offsets[to]!;
  const sampleOf = new Int32Array(lastRow - firstRow);
  const offsets = new Uint32Array(to - from + 1);
  let rows = 0;
  for (let k = from; k < to; k++) {
    for (let r = window.offsets[k]!; r < window.offsets[k + 1]!; r++) {
      sampleOf[r - firstRow] = window.pathline[r]! >= 0 ? rows++ : -1;
    }
    offsets[k - from + 1] = rows;
  }
  const samples = sampleColumns(window.dims, rows, {
    number: window.number.slice(from, to),
    time: window.time.slice(from, to),
    segment: window.segment.slice(from, to),
    offsets,
  });
  for (let r = firstRow; r < lastRow; r++) {
    const s = sampleOf[r - firstRow]!;
    if (s < 0) continue;
    samples.pathline[s] = window.pathline[r]!;
    samples.measuredX[s] = window.x[r]!;
    samples.measuredY[s] = window.y[r]!;
    if (window.dims === 3) samples.measuredZ[s] = window.z[r]!;
    samples.linkRisk[s] = window.linkRisk[r]!;
    samples.detection[s] = window.row[r]!;
  }
  return { samples, firstRow, lastRow, sampleOf };
}
