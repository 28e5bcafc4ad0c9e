import { closeSync, openSync, writeSync } from 'node:fs';
import { madeFrames } from './made-frames.mjs';

/** Writes made frames as CSV with the header `frame,x,y[,z]` and three decimals; returns rows and bytes. */
export function writeMadeCsv(path, options) {
  const file = openSync(path, 'w');
  const counts = { rows: 0, bytes: 0 };
  let text = options.dims === 3 ? 'frame,x,y,z\n' : 'frame,x,y\n';
  for (const { number, x, y, z } of madeFrames(options)) {
    for (let i = 0; i < x.length; i++) {
      text += `${number},${x[i].toFixed(3)},${y[i].toFixed(3)}${z.length > 0 ? `,${z[i].toFixed(3)}` : ''}\n`;
    }
    counts.rows += x.length;
    counts.bytes += writeSync(file, text);
    text = '';
  }
  closeSync(file);
  return counts;
}
