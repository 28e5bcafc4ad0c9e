/**
 * Where the last sample of each pathline lies, looked up by pathline number. Open addressing, since numbers grow with
 * the run and a table by number would grow with it; entries that are too old go when it is half full. Mutable.
 */
export class LastSamples {
  private size = 1024;
  private used = 0;
  private keys = new Int32Array(this.size).fill(-1);
  private frames = new Int32Array(this.size);
  private places = new Int32Array(this.size);
  /** Found by the last `move`: the frame count and place of the sample before, frame -1 for none. */
  frame = -1;
  place = 0;

  /** Notes a sample of pathline `id` and finds the one before it in `frame` and `place`. `oldest`: frames before it are forgotten. */
  move(id: number, frame: number, place: number, oldest: number): void {
    if (2 * this.used >= this.size) this.renew(oldest);
    const { keys } = this;
    let at = hash(id) & (this.size - 1);
    while (keys[at] !== id && keys[at] !== -1) at = (at + 1) & (this.size - 1);
    if (keys[at] === -1) {
      keys[at] = id;
      this.used++;
      this.frame = -1;
    } else {
      this.frame = this.frames[at]!;
      this.place = this.places[at]!;
    }
    this.frames[at] = frame;
    this.places[at] = place;
  }

  private renew(oldest: number): void {
    const { keys, frames, places } = this;
    let kept = 0;
    for (let at = 0; at < keys.length; at++) if (keys[at] !== -1 && frames[at]! >= oldest) kept++;
    while (4 * kept >= this.size) this.size *= 2;
    this.keys = new Int32Array(this.size).fill(-1);
    this.frames = new Int32Array(this.size);
    this.places = new Int32Array(this.size);
    this.used = kept;
    for (let old = 0; old < keys.length; old++) {
      if (keys[old] === -1 || frames[old]! < oldest) continue;
      let at = hash(keys[old]!) & (this.size - 1);
      while (this.keys[at] !== -1) at = (at + 1) & (this.size - 1);
      this.keys[at] = keys[old]!;
      this.frames[at] = frames[old]!;
      this.places[at] = places[old]!;
    }
  }
}

/** Multiplicative hash: odd constant near 2^32 over the golden ratio (Knuth, TAOCP 3, section 6.4). */
function hash(id: number): number {
  const mixed = Math.imul(id, 0x9e3779b1);
  return mixed ^ (mixed >>> 15);
}
