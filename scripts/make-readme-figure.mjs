// Draws docs/cylinder-wake-speed.svg, the picture of the README, from the result of `npm start`.
import { mkdirSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { fieldMapSvg } from '../packages/tracker/dist/figures/field-map.js';
import { speedOf } from '../packages/tracker/dist/figures/report-data.js';
import { standaloneSvg } from '../packages/tracker/dist/figures/svg.js';
import { openNodeResultPlace } from '../packages/tracker/dist/node/index.js';
import { openResult } from '../packages/tracker/dist/store/read-result.js';

const root = dirname(dirname(fileURLToPath(import.meta.url)));
const folder = process.argv[2] ?? join(root, 'results', 'demo', 'result');
const result = await openResult(await openNodeResultPlace(folder, { create: false }));
const grid = result.grid();
const [u, v] = ['u', 'v'].map((name) => grid?.fields.get(name));
if (grid === null || u === undefined || v === undefined) {
  console.error(`${folder}: got no grid with velocities, expected the result of npm start`);
  process.exit(1);
}
const svg = fieldMapSvg(grid, {
  title: 'Mean speed behind a cylinder',
  description: 'Demo of made-up detections in a computed wake: slow behind the cylinder, fast beside it.',
  values: speedOf(grid),
  quantity: 'speed',
  unit: u.unit,
  lengthUnit: result.record.figures.lengthUnit,
  colours: 'low-to-high',
  bodies: [{ kind: 'circle', centre: [0, 0], diameter: 5 }],
  arrows: { u: u.values, v: v.values, unit: u.unit },
  plotWidth: 620,
});
result.close();
mkdirSync(join(root, 'docs'), { recursive: true });
writeFileSync(join(root, 'docs', 'cylinder-wake-speed.svg'), standaloneSvg(svg));
