import type { ByteSink } from '../core/bytes.js';
import type { SyntheticFrame } from './make-dump.js';

/** What was written. */
export interface CsvCounts {
  readonly frames: number;
  readonly rows: number;
  readonly bytes: number;
}

/** Bytes gathered before they are handed on. */
const CHUNK_BYTES = 1 << 18;

/**
 * Writes frames as CSV with the header `frame,x,y[,z][,intensity]`: positions in px with three decimals (a
 * hundredth of the usual noise of 0.1 px), intensity in whole counts (left out when
 * `intensity` is false; a frame without brightness then is no error). The true particles are not written. The sink
 * is left open: its owner closes it.
 */
export async function dumpToCsv(
  frames: Iterable<SyntheticFrame> | AsyncIterable<SyntheticFrame>,
  sink: ByteSink,
  intensity = true,
): Promise<CsvCounts> {
  const encoder = new TextEncoder();
  let text = '';
  let bytes = 0;
  let rows = 0;
  let count = 0;
  const flush = async () => {
    if (text === '') return;
    const encoded = encoder.encode(text);
    bytes += encoded.length;
    text = '';
    await sink.write(encoded);
  };
  for await (const frame of frames) {
    const space = frame.dims === 3;
    if (count === 0) text += `frame,x,y${space ? ',z' : ''}${intensity ? ',intensity' : ''}\n`;
    count++;
    for (let row = 0; row < frame.x.length; row++) {
      text += `${frame.number},${frame.x[row].toFixed(3)},${frame.y[row].toFixed(3)}`;
      if (space) text += `,${frame.z[row].toFixed(3)}`;
      text += intensity ? `,${Math.round(frame.brightness[row])}\n` : '\n';
      rows++;
    }
    if (text.length >= CHUNK_BYTES) await flush();
  }
  await flush();
  return { frames: count, rows, bytes };
}
