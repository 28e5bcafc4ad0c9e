import { dumpToCsv } from '@wakeloom/tracker/synthesis/dump-to-csv';
import { lambOseen } from '@wakeloom/tracker/synthesis/flows-vortices';
import { synthesise } from '@wakeloom/tracker/synthesis/make-dump';

/** Options every run of the vortex dump is processed with, by their names on the command line. */
export const VORTEX_OPTIONS = { rate: '100 Hz', scale: '0.05 mm/px', bin: '4 mm', 'y-axis': 'down' } as const;

/**
 * A seeded dump as CSV: a Lamb-Oseen vortex of 2000 mm2/s carried at 20 mm/s through a view of 64 mm x 48 mm,
 * 5 % losses, 3 % ghosts, noise 0.1 px. About `frames * perFrame` detections.
 */
export async function vortexDump(frames: number, perFrame: number, seed = 7): Promise<Uint8Array<ArrayBuffer>> {
  const parts: Uint8Array[] = [];
  await dumpToCsv(
    synthesise({
      flow: lambOseen(2000, 6, 1, { centreX: 24, centreY: 24, driftX: 20 }),
      frames,
      rate: 100,
      perFrame,
      region: { x: [0, 64], y: [0, 48] },
      scale: 0.05,
      lossShare: 0.05,
      ghostShare: 0.03,
      noisePx: 0.1,
      seed,
    }),
    {
      write: async (bytes) => void parts.push(bytes.slice()),
      close: async () => {},
    },
  );
  return new Uint8Array(Buffer.concat(parts));
}
