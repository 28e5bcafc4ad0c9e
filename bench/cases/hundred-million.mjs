/**
 * A hundred million detections, 10 000 frames of 10 000, at default settings, beside the first thousand of those frames:
 * time for ten million of them, and resident memory along the run. The bars: linear in time, 400 MB resident, and the same
 * from frame 1000 on. Wants 30 GB of disk. Takes longer than all others together: `npm run bench -- hundred-million`.
 * FRAMES=3000 makes it shorter.
 */
import { mkdirSync, rmSync, statfsSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import { writeMadeCsv } from '../lib/made-csv.mjs';
import { processed, stagesOf } from '../lib/processed.mjs';
import { check, print, rate } from '../lib/timed.mjs';

const FRAMES = Number(process.env.FRAMES ?? 10_000);
const FIRST = 1000;
const PER_FRAME = 10_000;
const MEMORY_BAR = 400e6;
/** Bytes a detection on the disk at most while it runs: dump, scratch, result files. */
const DISK_BYTES = 300;
/** Growth over the run, from frame 1000 on, that still counts as none: noise of the garbage collector. */
const GROWTH_BAR = 20e6;
/** Time for ten million, over that of the short run, that still counts as linear. */
const LINEAR = 1.1;

const folder = fileURLToPath(new URL('../scratch/hundred-million/', import.meta.url));

async function runFrames(frames) {
  const csv = `${folder}made.csv`;
  rmSync(csv, { force: true });
  writeMadeCsv(csv, { frames, perFrame: PER_FRAME, ratio: 0.3, seed: 11 });
  const watched = await processed(csv, `${folder}result`, frames * PER_FRAME);
  rmSync(csv, { force: true });
  rmSync(`${folder}result`, { recursive: true, force: true });
  return watched;
}

/**
 * Resident memory while the frames stream, from frame `FIRST` on: median of the first and of the last tenth of that time,
 * and the slope of the line of least squares, bytes a thousand frames. Frames are taken to come evenly.
 */
function along({ resident, record, seconds }, frames) {
  const stages = record.clockTimes.seconds;
  // The process runs a little longer than the record's clock, at its start.
  const begin = seconds - stages.total + stages.scan + stages.look;
  const points = resident
    .map(({ seconds: at, bytes }) => ({ frame: (frames * (at - begin)) / stages.stream, bytes }))
    .filter(({ frame }) => frame >= FIRST && frame <= frames);
  const mean = (values) => values.reduce((sum, value) => sum + value, 0) / values.length;
  const middle = mean(points.map(({ frame }) => frame));
  const level = mean(points.map(({ bytes }) => bytes));
  let product = 0;
  let square = 0;
  for (const { frame, bytes } of points) {
    product += (frame - middle) * (bytes - level);
    square += (frame - middle) ** 2;
  }
  const median = (some) => some.map(({ bytes }) => bytes).sort((a, b) => a - b)[some.length >> 1];
  const tenth = Math.max(1, Math.floor(points.length / 10));
  return {
    perThousand: (1000 * product) / square,
    early: median(points.slice(0, tenth)),
    late: median(points.slice(-tenth)),
  };
}

const megabytes = (bytes) => (bytes / 1e6).toFixed(0);

export async function run() {
  rmSync(folder, { recursive: true, force: true });
  mkdirSync(folder, { recursive: true });
  const { bavail, bsize } = statfsSync(folder);
  const need = FRAMES * PER_FRAME * DISK_BYTES;
  check(bavail * bsize > need, `disk: ${megabytes(bavail * bsize)} MB free, wants ${megabytes(need)} MB`);
  try {
    const short = await runFrames(FIRST);
    const long = await runFrames(FRAMES);
    const perTenMillion = (long.seconds * FIRST) / FRAMES;
    const share = perTenMillion / short.seconds;
    const { perThousand, early, late } = along(long, FRAMES);
    const row = (name, { seconds, peakBytes, record }, frames, note) => ({
      name,
      medianSeconds: seconds,
      spread: null,
      rate: rate(frames * PER_FRAME, seconds, 'detections'),
      peakMegabytes: Number(megabytes(peakBytes)),
      note: `${note}${stagesOf(record)}`,
    });
    const notes = [
      `${perTenMillion.toFixed(1)} s for ten million, ${share.toFixed(2)} of the short run's${share <= LINEAR ? '' : ': NOT LINEAR'}`,
      `${long.peakBytes <= MEMORY_BAR ? 'within' : 'ABOVE'} 400 MB`,
      `${megabytes(early)} MB after frame ${FIRST}, ${megabytes(late)} MB at the last, ${(perThousand / 1e6).toFixed(2)} MB a thousand frames${late - early <= GROWTH_BAR ? '' : ': IT GROWS'}`,
      '',
    ].join('; ');
    return [
      row(`${(FIRST * PER_FRAME) / 1e6} million detections, default settings`, short, FIRST, ''),
      row(`${(FRAMES * PER_FRAME) / 1e6} million detections, default settings`, long, FRAMES, notes),
    ];
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
}

if (process.argv[1] === fileURLToPath(import.meta.url)) print(await run());
