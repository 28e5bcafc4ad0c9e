import type { DetectionBlock } from '@wakeloom/tracker';
import { ActivePathlines } from '@wakeloom/tracker/linking/active-pathlines';
import { FlowGrid } from '@wakeloom/tracker/linking/flow-grid';
import { FrameLinks } from '@wakeloom/tracker/linking/frame-links';
import { beginPathline } from '@wakeloom/tracker/linking/grow-pathline';
import { NeighbourFlow } from '@wakeloom/tracker/linking/neighbour-flow';

export type Place = readonly [number, number, number];

/** Single detections at time 0 and the detections of a frame at time 1, nothing linked and no flow known. */
export interface LoneFrame {
  readonly active: ActivePathlines;
  readonly block: DetectionBlock;
  readonly links: FrameLinks;
  /** Flow of links nearby and about twice as far: empty. */
  readonly near: NeighbourFlow;
  readonly wide: NeighbourFlow;
  /** Flow of the interval before: empty. */
  readonly before: NeighbourFlow;
}

/** `radius`: of the flow nearby, length unit. */
export function loneFrame(
  dims: 2 | 3,
  first: readonly Place[],
  second: readonly Place[],
  radius: number,
  depthNoise = 1,
): LoneFrame {
  const active = new ActivePathlines();
  active.reserve(first.length);
  for (const [id, place] of first.entries()) beginPathline(active, id, ...place, 0);
  const links = new FrameLinks();
  links.begin(first.length, second.length);
  const column = (axis: number) => Float64Array.from(second, (place) => place[axis]);
  return {
    active,
    links,
    block: {
      dims,
      number: Int32Array.of(1),
      time: Float64Array.of(1),
      segment: Int32Array.of(0),
      offsets: Uint32Array.of(0, second.length),
      x: column(0),
      y: column(1),
      z: dims === 3 ? column(2) : new Float64Array(0),
      brightness: new Float32Array(0),
      row: Float64Array.from(second, (_, row) => row),
      given: new Int32Array(0),
    },
    near: new NeighbourFlow(dims, radius, depthNoise),
    wide: new NeighbourFlow(dims, 2 * radius, depthNoise),
    before: new NeighbourFlow(dims, radius, depthNoise),
  };
}

/** A picture of one velocity everywhere. */
export function uniformPicture(dims: 2 | 3, velocity: Place): FlowGrid {
  const picture = FlowGrid.empty(dims, { min: [-100, -100, -100], max: [100, 100, 100] }, 200);
  picture.learn(0, 0, 0, ...velocity);
  picture.fit();
  return picture;
}
