import type { LinkedBlock } from '../core/columns.js';

/**
 * Compares two linkings of one run link by link: for every detection, the detection before it on its pathline.
 * Memory: two entries for each pathline seen in the last frames.
 */
export class LinkComparison {
  /** Links of the first linking, and how many of them the second made too. */
  links = 0;
  agreed = 0;
  private readonly keep: number;
  private readonly lastOfFirst = new Map<number, Last>();
  private readonly lastOfSecond = new Map<number, Last>();

  /** `bridge`: missing frames a link may cross; longer unseen pathlines are forgotten. */
  constructor(bridge: number) {
    this.keep = bridge + 1;
  }

  /** Two linkings of the same detections. */
  add(first: LinkedBlock, second: LinkedBlock): void {
    for (let k = 0; k < first.number.length; k++) {
      const frame = first.number[k];
      for (let row = first.offsets[k]; row < first.offsets[k + 1]; row++) {
        const before = step(this.lastOfFirst, first.pathline[row], first.row[row], frame, this.keep);
        const other = step(this.lastOfSecond, second.pathline[row], first.row[row], frame, this.keep);
        if (before === -1) continue;
        this.links++;
        if (before === other) this.agreed++;
      }
      if (k % 64 === 0) {
        forget(this.lastOfFirst, frame - this.keep);
        forget(this.lastOfSecond, frame - this.keep);
      }
    }
  }
}

interface Last {
  readonly row: number;
  readonly frame: number;
}

/** Row before this one on the pathline, -1 where there is none. */
function step(last: Map<number, Last>, pathline: number, row: number, frame: number, keep: number): number {
  if (pathline < 0) return -1;
  const before = last.get(pathline);
  last.set(pathline, { row, frame });
  return before !== undefined && frame - before.frame <= keep ? before.row : -1;
}

function forget(last: Map<number, Last>, oldest: number): void {
  for (const [pathline, { frame }] of last) if (frame < oldest) last.delete(pathline);
}
