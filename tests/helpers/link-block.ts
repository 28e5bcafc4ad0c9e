import type { DetectionBlock } from '@wakeloom/tracker';
import { createContext } from '@wakeloom/tracker';
import { createFrameSorter } from '@wakeloom/tracker/detections/canonical-order';
import { createLinker } from '@wakeloom/tracker/linking/create-linker';
import { FIRST_LOOK, firstLook } from '@wakeloom/tracker/pipeline/first-look';
import { resolveRun } from '@wakeloom/tracker/run/resolve';
import type { LinkingSettings } from '@wakeloom/tracker/run/settings';

/**
 * Links one block as a run would (canonical order, first look, linker) and gives the pathline of every row of the block
 * as it came, and the risk of the link into it.
 */
export async function linkBlock(
  block: DetectionBlock,
  options: Record<string, string | number> = {},
  change: Partial<LinkingSettings> = {},
) {
  const clock: Record<string, string> = 'pair-delay' in options ? {} : { rate: '60 Hz' };
  const { settings } = resolveRun({ options: { ...clock, scale: '1 mm/px', ...options }, dumpFiles: ['x.csv'] });
  const linking = { ...settings.linking, ...change };
  const sorted = sortedCopy(block);
  const look = await firstLook([leading(sorted)], { ...settings, linking }, 1, createContext());
  const linker = createLinker(linking, look.link);
  const pathline = new Int32Array(sorted.x.length);
  const risk = new Float32Array(sorted.x.length);
  for (let k = 0; k < sorted.number.length; k++) linker.frame(sorted, k, pathline, risk);
  const byRow = new Int32Array(pathline.length);
  const riskByRow = new Float32Array(pathline.length);
  for (let row = 0; row < pathline.length; row++) {
    byRow[sorted.row[row]] = pathline[row];
    riskByRow[sorted.row[row]] = risk[row];
  }
  return { pathline: byRow, risk: riskByRow, prior: look.prior, tally: linker.tally };
}

/** Links as `row>row` pairs, whatever the numbering of the pathlines. */
export function linkSet(pathline: ArrayLike<number>, frame: ArrayLike<number>): Set<string> {
  const order = Array.from({ length: pathline.length }, (_, row) => row).sort((a, b) => frame[a] - frame[b]);
  const last = new Map<number, number>();
  const links = new Set<string>();
  for (const row of order) {
    const before = last.get(pathline[row]);
    if (before !== undefined) links.add(`${before}>${row}`);
    last.set(pathline[row], row);
  }
  return links;
}

/** The frames that the first look of a run would be given. */
function leading(block: DetectionBlock): DetectionBlock {
  const { offsets } = block;
  let frames = Math.min(block.number.length, FIRST_LOOK.frames);
  while (frames > 2 && offsets[frames - 1] >= FIRST_LOOK.rows) frames--;
  const rows = offsets[frames];
  return {
    ...block,
    number: block.number.subarray(0, frames),
    time: block.time.subarray(0, frames),
    segment: block.segment.subarray(0, frames),
    offsets: offsets.subarray(0, frames + 1),
    x: block.x.subarray(0, rows),
    y: block.y.subarray(0, rows),
    z: block.z.subarray(0, rows),
    brightness: block.brightness.subarray(0, rows),
    row: block.row.subarray(0, rows),
    given: block.given.subarray(0, rows),
  };
}

function sortedCopy(block: DetectionBlock): DetectionBlock {
  const copy: DetectionBlock = {
    ...block,
    x: block.x.slice(),
    y: block.y.slice(),
    z: block.z.slice(),
    brightness: block.brightness.slice(),
    row: block.row.slice(),
    given: block.given.slice(),
  };
  const sort = createFrameSorter();
  for (let k = 0; k < copy.number.length; k++) sort(copy, copy.offsets[k], copy.offsets[k + 1]);
  return copy;
}
