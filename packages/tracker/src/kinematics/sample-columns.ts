import type { Dims, SampleBlock } from '../core/columns.js';

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
