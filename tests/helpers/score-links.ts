/** How good links are against known truth. */
export interface LinkScore {
  /** Right links over links made; 1 when none was made. */
  readonly precision: number;
  /** Right links over true links; 1 when there are none. */
  readonly recall: number;
  readonly made: number;
  readonly right: number;
  readonly true: number;
}

/** Fewest detections that make a pathline worth scoring, true or made; image pairs have two. */
export const FEWEST = 3;

/**
 * Scores pathline numbers (one a detection, negative: left out) against true particles (negative: false
 * detection). A true link joins two successive detections of one particle at most `bridge` + 1 frames apart, in a
 * run of at least three detections so joined. A made link joins two successive detections of one pathline of at
 * least three; it is right when it is a true link. All arrays have one entry a detection, in any order. `fewest` is
 * two for image pairs, where nothing has three.
 */
export function scoreLinks(
  pathline: ArrayLike<number>,
  particle: ArrayLike<number>,
  frame: ArrayLike<number>,
  bridge: number,
  fewest = FEWEST,
): LinkScore {
  const truth = joinedBefore(particle, frame, fewest, bridge + 1);
  const links = joinedBefore(pathline, frame, fewest);
  let made = 0;
  let right = 0;
  let all = 0;
  for (let row = 0; row < links.length; row++) {
    if (truth[row] >= 0) all++;
    if (links[row] < 0) continue;
    made++;
    if (links[row] === truth[row]) right++;
  }
  return {
    precision: made === 0 ? 1 : right / made,
    recall: all === 0 ? 1 : right / all,
    made,
    right,
    true: all,
  };
}

/**
 * For each row the row before it under the same label, -1 where there is none or where the link does not count: it is
 * longer than `farthest` frames, or fewer than `fewest` rows are so joined. Negative labels take no part.
 */
export function joinedBefore(
  label: ArrayLike<number>,
  frame: ArrayLike<number>,
  fewest: number,
  farthest = Number.POSITIVE_INFINITY,
): Int32Array {
  const rows = label.length;
  const before = new Int32Array(rows).fill(-1);
  // Rows joined so far up to this one; then, read backwards along the links, in the whole.
  const joined = new Int32Array(rows).fill(1);
  const last = new Map<number, number>();
  const order = inFrameOrder(frame);
  for (let n = 0; n < rows; n++) {
    const row = order[n];
    if (label[row] < 0) continue;
    const earlier = last.get(label[row]);
    last.set(label[row], row);
    if (earlier === undefined || frame[row] - frame[earlier] > farthest) continue;
    before[row] = earlier;
    joined[row] = joined[earlier] + 1;
  }
  for (let n = rows - 1; n >= 0; n--) {
    const row = order[n];
    if (before[row] >= 0) joined[before[row]] = joined[row];
  }
  for (let row = 0; row < rows; row++) if (joined[row] < fewest) before[row] = -1;
  return before;
}

function inFrameOrder(frame: ArrayLike<number>): Uint32Array {
  const order = new Uint32Array(frame.length);
  let sorted = true;
  for (let row = 0; row < order.length; row++) {
    order[row] = row;
    if (row > 0 && frame[row] < frame[row - 1]) sorted = false;
  }
  return sorted ? order : order.sort((a, b) => frame[a] - frame[b] || a - b);
}
