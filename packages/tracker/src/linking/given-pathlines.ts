import type { DetectionBlock, LinkedBlock } from '../core/columns.js';

/** What was found in pathline numbers that came with a dump. */
export interface GivenTally {
  /** Links as numbered by the dump. */
  links: number;
  /** A number that stands twice in one frame: the second detection was left unlinked. */
  twiceInFrame: number;
  /** Links broken because they cross more missing frames than may be bridged, or two segments. */
  broken: number;
}

interface GivenState {
  readonly id: number;
  readonly frame: number;
  readonly segment: number;
}

/**
 * Takes the pathline numbers of the dump as they are, after checking what can be checked: one detection a frame
 * for each number, no gap beyond `bridge`, no link across segments. Numbers not seen for longer than `bridge`
 * are forgotten, so memory does not grow with the run. Risk is NaN: nobody has stated one.
 */
export class GivenPathlines {
  readonly tally: GivenTally = { links: 0, twiceInFrame: 0, broken: 0 };
  private readonly bridge: number;
  private known = new Map<number, GivenState>();
  private nextId = 0;

  constructor(bridge: number) {
    this.bridge = bridge;
  }

  /** Pathlines begun so far. */
  get begun(): number {
    return this.nextId;
  }

  link(block: DetectionBlock): LinkedBlock {
    const rows = block.x.length;
    const pathline = new Int32Array(rows).fill(-1);
    const linkRisk = new Float32Array(rows);
    for (let k = 0; k < block.number.length; k++) this.frame(block, k, pathline, linkRisk);
    return { ...block, pathline, linkRisk };
  }

  private frame(block: DetectionBlock, k: number, pathline: Int32Array, linkRisk: Float32Array): void {
    const frame = block.number[k];
    const segment = block.segment[k];
    const seen = new Set<number>();
    for (let row = block.offsets[k]; row < block.offsets[k + 1]; row++) {
      const given = block.given[row];
      if (given < 0) continue;
      if (seen.has(given)) {
        this.tally.twiceInFrame++;
        continue;
      }
      seen.add(given);
      const before = this.known.get(given);
      let id = -1;
      if (before !== undefined) {
        if (before.segment === segment && frame - before.frame <= this.bridge + 1) {
          id = before.id;
          this.tally.links++;
          linkRisk[row] = Number.NaN;
        } else {
          this.tally.broken++;
        }
      }
      if (id === -1) id = this.nextId++;
      pathline[row] = id;
      this.known.set(given, { id, frame, segment });
    }
    if (k % 64 === 0) this.forget(frame);
  }

  private forget(frame: number): void {
    // Broken links are counted by the reappearance of a number: keep a number for some time after its last frame.
    const keep = 1000 + this.bridge;
    for (const [given, state] of this.known) if (frame - state.frame > keep) this.known.delete(given);
  }
}
