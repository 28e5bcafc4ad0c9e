import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { seedFor } from '@wakeloom/tracker/core/context';
import type { Flow } from '@wakeloom/tracker/synthesis/flow';
import { potentialCylinder, vortexStreet } from '@wakeloom/tracker/synthesis/flows-bodies';
import { abcFlow, taylorGreen } from '@wakeloom/tracker/synthesis/flows-cellular';
import { poiseuilleChannel } from '@wakeloom/tracker/synthesis/flows-elementary';
import { randomFlow } from '@wakeloom/tracker/synthesis/flows-random';
import { burgersVortex, lambOseen } from '@wakeloom/tracker/synthesis/flows-vortices';
import { decodeWake, type WakeData } from '@wakeloom/tracker/synthesis/wake-file';
import { wakeFlow } from '@wakeloom/tracker/synthesis/wake-flow';

/** A flow with known truth and the view it is filmed in. Lengths in mm, speeds in mm/s; water, 1 mm2/s. */
export interface FlowCase {
  readonly name: string;
  readonly dims: 2 | 3;
  /** Lower and upper bound of each axis, mm; 1280 px along the first. */
  readonly box: readonly (readonly [number, number])[];
  /** The flow for one seed: random fields differ by it, the others do not. */
  flow(seed: number, root: string): Promise<Flow>;
  /** Runs of different seeds begin somewhere within this time, s: the period of a flow that has one. */
  readonly period?: number;
  /** What the parameters are chosen by; spacings are those of 4000 particles a frame. */
  readonly why: string;
}

/**
 * The view in the plane is that of a usual camera, 1280 x 1024 px, set to 0.05 mm a px: 64 mm x 51.2 mm. At 4000
 * particles a frame their mean spacing is 0.905 mm or 18 px. Structures are chosen of 10 to 20 spacings, so that the
 * particles resolve the flow; `wake-wide` has the demo's view, where they only just do.
 */
const SHEET_X = 64;
const SHEET_Y = 51.2;

/** A view of the sheet with its lower left corner at (left, bottom). */
function sheet(left: number, bottom: number): readonly (readonly [number, number])[] {
  return [
    [left, left + SHEET_X],
    [bottom, bottom + SHEET_Y],
  ];
}

let wake: Promise<WakeData> | undefined;

async function wakeOf(root: string, diameter: number): Promise<Flow> {
  wake ??= decodeWake(new Uint8Array(readFileSync(join(root, 'data', 'wake-re150.bin.gz'))));
  return wakeFlow(await wake, { diameter, speed: 30 });
}

/** One field of modes between two wavelengths, with no mean stream: all of the displacement is eddies. */
function eddies(seed: number, longest: number, shortest: number): Flow {
  return randomFlow({ speed: 20, longest, shortest, unsteadiness: 0.5, seed: seedFor(seed, 'random field') | 0 });
}

export const FLOW_CASES: readonly FlowCase[] = [
  {
    name: 'street',
    dims: 2,
    box: sheet(-24, -25.6),
    flow: async () => vortexStreet({ spacing: 32, gap: 0.2805499 * 32, circulation: 480, speed: 30, coreRadius: 4.5 }),
    period: 1.3,
    why: 'two spacings of the street in view; rows in the stable ratio, 9 mm apart; cores grown to half the gap (10 spacings across); circulation 2.5 speeds times a body a fifth of the spacing wide, so that the street is carried at 0.84 of the stream',
  },
  {
    name: 'wake',
    dims: 2,
    box: sheet(-12, -25.6),
    flow: (_seed, root) => wakeOf(root, 10),
    period: 1.85,
    why: 'near wake at Reynolds number 150, view 6.4 diameters wide; diameter and eddies 11 spacings; the stored field reaches from 2.4 diameters before to 10.4 behind the axis',
  },
  {
    name: 'wake-wide',
    dims: 2,
    box: sheet(-12, -25.6),
    flow: (_seed, root) => wakeOf(root, 5),
    period: 0.93,
    why: 'the same wake in the view of the demo, 12.8 diameters wide: eddies of 6 to 8 spacings, shear layers thinner than one',
  },
  {
    name: 'lamb-oseen',
    dims: 2,
    box: sheet(-41, -20.6),
    flow: async () => lambOseen(1500, 6, 1),
    why: 'core 12 mm across (13 spacings), view 5 cores wide, centre 9 mm and 5 mm off the middle; Reynolds number of the circulation 1500, the core grows by viscosity during the run',
  },
  {
    name: 'cellular',
    dims: 2,
    box: sheet(-30, -27),
    flow: async () => taylorGreen(20, Math.PI / 10),
    why: 'steady cells of 10 mm (11 spacings), 6.4 x 5.1 of them in view, not in register with it; at a ratio of 1 a pathline bends by up to 0.4 spacings from frame to frame',
  },
  {
    name: 'cylinder',
    dims: 2,
    box: sheet(-24, -23),
    flow: async () => potentialCylinder(30, 8),
    why: 'cylinder 16 mm across (18 spacings), view 4 diameters wide, off the middle',
  },
  {
    name: 'random',
    dims: 2,
    box: sheet(0, 0),
    flow: async (seed) => eddies(seed, 64, 24),
    why: 'wavelengths from the width of the view down to 24 mm: eddies (half a wavelength) of 13 spacings and more; modes drift at half the root mean square speed; no mean stream',
  },
  {
    name: 'random-steep',
    dims: 2,
    box: sheet(0, 0),
    flow: async (seed) => eddies(seed, 64, 16),
    why: 'the same with wavelengths down to 16 mm: eddies from 9 spacings, gradients a sixth steeper',
  },
  {
    name: 'channel',
    dims: 2,
    box: sheet(0, 0),
    flow: async () => poiseuilleChannel(20, SHEET_Y),
    why: 'developed laminar channel, both walls at the rim of the view, fastest 1.5 times the mean',
  },
  {
    name: 'abc',
    dims: 3,
    box: [
      [0, 2 * Math.PI],
      [0, 2 * Math.PI],
      [0.5, 0.5 + Math.PI],
    ],
    flow: async () => abcFlow(),
    why: 'one wavelength in the plane and half of it in depth (depth of a volume half its width: common practice, no source); spacing 0.31, so a wavelength of 20 spacings',
  },
  {
    name: 'burgers',
    dims: 3,
    box: [
      [-5.2, 7.6],
      [-5.6, 7.2],
      [-3.2, 3.2],
    ],
    flow: async () => burgersVortex(440, 0.5, 1, 10),
    why: 'fastest swirl, 16 mm/s, at 3.2 mm from the axis, so 10 spacings of 0.64 mm across; through-flow of 10 mm/s along the axis; axis off the middle; depth half the width',
  },
];

/** The flow of that name; throws with the names there are. */
export function flowCase(name: string): FlowCase {
  const found = FLOW_CASES.find((one) => one.name === name);
  if (found === undefined)
    throw new Error(`no such flow: ${name}; there are ${FLOW_CASES.map((f) => f.name).join(', ')}`);
  return found;
}
