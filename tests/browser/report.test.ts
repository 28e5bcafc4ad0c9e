import { readFileSync } from 'node:fs';
import { createRequire } from 'node:module';
import { COLOURS, colourHex, colourIndex, SEQUENTIAL } from '@wakeloom/tracker/figures/colour-map';
import { fieldMapSvg } from '@wakeloom/tracker/figures/field-map';
import { reportHtml } from '@wakeloom/tracker/figures/report';
import { standaloneSvg } from '@wakeloom/tracker/figures/svg';
import type { Browser } from 'playwright-core';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { startChromium } from '../helpers/browser.js';
import { needs } from '../helpers/need.js';
import { sampleGrid, sampleRecord, sampleReportData } from '../helpers/sample-run.js';

const AXE = readFileSync(createRequire(import.meta.url).resolve('axe-core/axe.min.js'), 'utf8');

interface AxeFault {
  readonly id: string;
  readonly nodes: readonly { readonly html: string }[];
}

describe.skipIf(!needs('chromium'))('in Chromium', () => {
  let browser: Browser;
  beforeAll(async () => {
    browser = await startChromium();
  });
  afterAll(() => browser.close());

  it.each(['light', 'dark'] as const)(
    'the report in %s asks for nothing, fits and has no accessibility fault',
    async (colorScheme) => {
      const page = await browser.newPage({ viewport: { width: 1280, height: 900 }, colorScheme });
      const asked: string[] = [];
      const complaints: string[] = [];
      page.on('request', (request) => {
        if (!request.url().startsWith('data:')) asked.push(request.url());
      });
      page.on('console', (message) => complaints.push(message.text()));
      page.on('pageerror', (error) => complaints.push(error.message));
      await page.setContent(reportHtml(sampleRecord(), sampleReportData()));
      await page.evaluate(AXE);
      const faults = await page.evaluate(async () => {
        const { axe } = globalThis as unknown as { axe: { run(): Promise<{ violations: AxeFault[] }> } };
        const { violations } = await axe.run();
        return violations.map(({ id, nodes }) => `${id}: ${nodes.map((node) => node.html).join(' ')}`);
      });
      expect(faults).toEqual([]);
      for (const width of [1280, 700, 390]) {
        await page.setViewportSize({ width, height: 900 });
        expect(await page.evaluate(() => document.documentElement.scrollWidth)).toBe(width);
      }
      expect([asked, complaints]).toEqual([[], []]);
      await page.close();
    },
  );

  it('a field map shows the colour of a bin where that bin lies, and nothing in an empty one', async () => {
    const grid = sampleGrid(8, 5, 2);
    const values = Float64Array.from({ length: 40 }, (_, i) => (i === 39 ? Number.NaN : i));
    const svg = fieldMapSvg(grid, {
      title: 'a map',
      description: 'values from 0 to 40',
      values,
      quantity: 'u',
      unit: 'mm/s',
      lengthUnit: 'mm',
      colours: 'low-to-high',
      range: [0, 40],
      bodies: [{ kind: 'circle', centre: [-8, 0], diameter: 3 }],
    });
    const page = await browser.newPage({ viewport: { width: 800, height: 600 }, colorScheme: 'light' });
    const source = `data:image/svg+xml;base64,${Buffer.from(standaloneSvg(svg)).toString('base64')}`;
    await page.setContent(`<body style="margin:0;background:#fff"><img src="${source}" style="display:block"></body>`);
    const [, left, top, width, height] = /<image x="([\d.]+)" y="([\d.]+)" width="([\d.]+)" height="([\d.]+)"/
      .exec(svg)!
      .map(Number);
    // Bins are 2 mm wide from -13 to 3 mm in x, -5 to 5 mm in y: a point in mm, and the bin it must show.
    const place = (x: number, y: number) =>
      [left! + ((x + 13) / 16) * width!, top! + ((5 - y) / 10) * height!] as const;
    const shown = await page.evaluate(
      async ([address, points]) => {
        const image = new Image();
        image.src = address;
        await image.decode();
        const canvas = document.createElement('canvas');
        canvas.width = image.naturalWidth;
        canvas.height = image.naturalHeight;
        const context = canvas.getContext('2d')!;
        context.drawImage(image, 0, 0);
        return points.map(([x, y]) => [...context.getImageData(Math.round(x), Math.round(y), 1, 1).data]);
      },
      [source, [place(-12, -4), place(0.7, 1.4), place(2, 4), place(-8, 0.3)]] as const,
    );
    const hex = (pixel: number[]) =>
      `#${pixel
        .slice(0, 3)
        .map((byte) => byte.toString(16).padStart(2, '0'))
        .join('')}`;
    const wanted = (value: number) => colourHex(SEQUENTIAL, colourIndex(value, 0, 40));
    expect(hex(shown[0]!)).toBe(wanted(0));
    // (0.7, 1.4) lies in column 6, row 3: value 30.
    expect(hex(shown[1]!)).toBe(wanted(30));
    const colours = new Set(Array.from({ length: COLOURS }, (_, i) => colourHex(SEQUENTIAL, i)));
    expect(colours.has(hex(shown[2]!))).toBe(false);
    // A body hides the bins beneath it: nothing of their colour shines through.
    expect(hex(shown[3]!)).toBe('#7d8993');
    await page.close();
  });
});
