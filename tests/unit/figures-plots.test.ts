import { crc32, inflateSync } from 'node:zlib';
import { COLOURS, SEQUENTIAL } from '@wakeloom/tracker/figures/colour-map';
import { colourRange, fieldMapSvg } from '@wakeloom/tracker/figures/field-map';
import { gatherCounts, histogramSvg } from '@wakeloom/tracker/figures/histogram';
import { linePlotSvg } from '@wakeloom/tracker/figures/line-plot';
import { palettePng } from '@wakeloom/tracker/figures/palette-png';
import { escapeText, standaloneSvg } from '@wakeloom/tracker/figures/svg';
import { describe, expect, it } from 'vitest';
import { sampleGrid } from '../helpers/sample-run.js';

/** Chunks of a PNG, each with its check sum held against zlib's. */
function chunksOf(png: Buffer): Map<string, Buffer> {
  const found = new Map<string, Buffer>();
  for (let at = 8; at < png.length; ) {
    const length = png.readUInt32BE(at);
    const type = png.toString('latin1', at + 4, at + 8);
    expect(png.readUInt32BE(at + 8 + length)).toBe(crc32(png.subarray(at + 4, at + 8 + length)));
    found.set(type, png.subarray(at + 8, at + 8 + length));
    at += 12 + length;
  }
  return found;
}

/** Palette indices of an embedded picture, without the filter bytes. */
function pixelsOf(png: Buffer): { width: number; height: number; rows: number[][] } {
  const chunks = chunksOf(png);
  const header = chunks.get('IHDR')!;
  const [width, height] = [header.readUInt32BE(0), header.readUInt32BE(4)];
  const raw = inflateSync(chunks.get('IDAT')!);
  expect(raw.length).toBe((width + 1) * height);
  const rows = Array.from({ length: height }, (_, j) => [...raw.subarray(j * (width + 1) + 1, (j + 1) * (width + 1))]);
  return { width, height, rows };
}

const pictureIn = (svg: string) => Buffer.from(/href="data:image\/png;base64,([^"]+)"/.exec(svg)![1]!, 'base64');

/** Throws on what an XML parser would refuse: unbalanced tags, raw ampersands, unquoted attributes. */
function wellFormed(svg: string): void {
  const open: string[] = [];
  const rest = svg.replace(
    /<(\/?)([A-Za-z]+)((?:\s+[\w:-]+="[^"<]*")*)\s*(\/?)>/g,
    (_all, end, name, _attributes, empty) => {
      if (end === '/') expect(open.pop()).toBe(name);
      else if (empty !== '/') open.push(name);
      return '';
    },
  );
  expect(open).toEqual([]);
  expect(rest).not.toMatch(/[<>]/);
  expect(svg).not.toMatch(/&(?!(amp|lt|gt|quot|#39);)/);
  expect(svg).not.toMatch(/NaN|undefined|Infinity/);
}

describe('palettePng', () => {
  it.each([
    [3, 2],
    [400, 300],
    [1, 1],
  ])('gives back its %i x %i pixels through zlib, over more than one stored block', (width, height) => {
    const pixels = Uint8Array.from({ length: width * height }, (_, i) => (i * 37) % 256);
    const png = Buffer.from(palettePng(width, height, pixels, SEQUENTIAL));
    expect(png.subarray(0, 8).toString('latin1')).toBe('\u0089PNG\r\n\u001a\n');
    expect(pixelsOf(png).rows.flat()).toEqual([...pixels]);
    expect([...chunksOf(png).get('PLTE')!.subarray(3)]).toEqual([...SEQUENTIAL]);
    expect([...chunksOf(png).get('tRNS')!]).toEqual([0]);
  });
});

describe('fieldMapSvg', () => {
  const grid = sampleGrid(8, 5, 2);
  const texts = { title: 'a < b & "c"', description: 'what is shown', quantity: 'u', unit: 'mm/s', lengthUnit: 'mm' };
  const values = Float64Array.from({ length: 40 }, (_, i) => (i === 39 ? Number.NaN : i));
  const svg = fieldMapSvg(grid, { ...texts, values, colours: 'low-to-high', range: [0, 40] });

  it('is well-formed, says what it is, and names its units', () => {
    wellFormed(svg);
    expect(svg).toContain('role="img"');
    expect(svg).toContain('a &lt; b &amp; &quot;c&quot;</title>');
    expect(svg).toContain('>what is shown</desc>');
    expect(svg).toContain('>x / mm</text>');
    expect(svg).toContain('>u / (mm/s)</text>');
  });

  it('puts y upward: the last row of bins is the top of the picture, empty bins are transparent', () => {
    const { width, height, rows } = pixelsOf(pictureIn(svg));
    expect([width, height]).toEqual([8, 5]);
    expect(rows[4]![0]).toBe(1);
    expect(rows[0]![7]).toBe(0);
    expect(rows[0]![6]).toBe(Math.floor((38 / 40) * COLOURS) + 1);
    expect(svg).toContain('>empty</text>');
  });

  it('has equal scales on both axes', () => {
    const [, width, height] = /<image [^>]*width="([\d.]+)" height="([\d.]+)"/.exec(svg)!.map(Number);
    expect(width! / height!).toBeCloseTo(8 / 5, 2);
  });

  it('takes the asked plane of a 3-D grid', () => {
    const shape = { ...grid.shape, dims: 3 as const, count: [2, 2, 2] as const };
    const cube = fieldMapSvg(
      { shape },
      { ...texts, values: [0, 1, 2, 3, 4, 5, 6, 7], colours: 'low-to-high', range: [0, 8], plane: 1 },
    );
    const step = (value: number) => Math.floor((value / 8) * COLOURS) + 1;
    expect(pixelsOf(pictureIn(cube)).rows).toEqual([
      [step(6), step(7)],
      [step(4), step(5)],
    ]);
  });

  it('draws arrows with a reference arrow, and bodies at their place', () => {
    const [u, v] = ['u', 'v'].map((name) => grid.fields.get(name)!.values);
    const full = fieldMapSvg(grid, {
      ...texts,
      values: u!,
      colours: 'signed',
      bodies: [
        { kind: 'circle', centre: [-5, 0], diameter: 4 },
        {
          kind: 'polygon',
          points: [
            [0, 0],
            [1, 0],
            [0, 1],
          ],
        },
      ],
      arrows: { u: u!, v: v!, unit: 'mm/s' },
    });
    wellFormed(full);
    expect(full).toMatch(/>\d+(\.\d+)? mm\/s<\/text>/);
    const [, left, top, width, height] = /<image x="([\d.]+)" y="([\d.]+)" width="([\d.]+)" height="([\d.]+)"/
      .exec(full)!
      .map(Number);
    const [, cx, cy, r] = /<circle cx="([\d.]+)" cy="([\d.]+)" r="([\d.]+)"/.exec(full)!.map(Number);
    // The grid runs from -13 to 3 in x (8 bins of 2 from -12) and from -5 to 5 in y.
    expect((cx! - left!) / width!).toBeCloseTo((-5 + 13) / 16, 3);
    expect((cy! - top!) / height!).toBeCloseTo(0.5, 3);
    expect(r! / width!).toBeCloseTo(2 / 16, 3);
  });

  it('survives a grid with nothing in it', () => {
    const nothing = fieldMapSvg(grid, { ...texts, values: new Float64Array(40).fill(Number.NaN), colours: 'signed' });
    wellFormed(nothing);
    expect(new Set(pixelsOf(pictureIn(nothing)).rows.flat())).toEqual(new Set([0]));
  });
});

describe('colourRange', () => {
  it('leaves out the wildest half percent at both ends', () => {
    const values = Float64Array.from({ length: 1001 }, (_, i) => i);
    values[1000] = 1e9;
    expect(colourRange(values, 'low-to-high')).toEqual([5, 995]);
  });
  it('is even about zero for signed values, whatever the NaN', () => {
    expect(colourRange([-3, Number.NaN, 1], 'signed')).toEqual([-3, 3]);
    expect(colourRange([0, 0], 'signed')).toEqual([-1, 1]);
    expect(colourRange([], 'low-to-high')).toEqual([0, 1]);
    expect(colourRange([7, 7], 'low-to-high')[1]).toBeGreaterThan(7);
  });
});

describe('gatherCounts', () => {
  it('keeps every count, in bars of a round width', () => {
    const counts = Array.from({ length: 131 }, (_, k) => (k < 5 ? 0 : k));
    const bars = gatherCounts(counts, 40);
    expect(bars.counts.reduce((a, b) => a + b)).toBe(counts.reduce((a, b) => a + b));
    expect(new Set(bars.edges.slice(1).map((edge, i) => edge - bars.edges[i]!))).toEqual(new Set([5]));
    expect(bars.edges[0]).toBe(5);
    expect(bars.counts[0]).toBe(5 + 6 + 7 + 8 + 9);
  });
  it('is empty when nothing was counted', () => {
    expect(gatherCounts([0, 0])).toEqual({ edges: [], counts: [] });
  });
});

describe('plots', () => {
  const texts = { title: 'plot', description: 'words', xLabel: 'frame', yLabel: 'detections' };
  it('draw bars whose heights go as the counts', () => {
    const svg = histogramSvg(
      { edges: [0, 1, 2], counts: [10, 20] },
      { ...texts, mark: { value: 1.5, name: 'median' } },
    );
    wellFormed(svg);
    const [, base, low, , high] = /d="M[\d.]+ ([\d.]+)V([\d.]+)H[\d.]+V[\d.]+zM[\d.]+ ([\d.]+)V([\d.]+)H/
      .exec(svg)!
      .map(Number);
    expect((base! - high!) / (base! - low!)).toBeCloseTo(2, 2);
    expect(svg).toContain('>median</text>');
  });
  it('break the line at a gap and keep the extremes of many points', () => {
    const gap = linePlotSvg({ x: [0, 1, 2, 3], y: [1, Number.NaN, 2, 3] }, texts);
    wellFormed(gap);
    expect(/d="(M[^"]*)" fill="none" stroke="#/.exec(gap)![1]!.match(/M/g)).toHaveLength(2);
    const x = Float64Array.from({ length: 20_000 }, (_, i) => i);
    const y = x.map((i) => (i === 12_345 ? 100 : 1));
    const dense = linePlotSvg({ x, y }, texts);
    wellFormed(dense);
    expect(dense.length).toBeLessThan(60_000);
    const plain = linePlotSvg({ x, y: y.fill(1) }, texts);
    expect(plain).not.toBe(dense);
  });
  it('say so when there is nothing to show', () => {
    expect(histogramSvg({ edges: [], counts: [] }, texts)).toContain('nothing to show');
    expect(linePlotSvg({ x: [], y: [] }, texts)).toContain('nothing to show');
  });
});

describe('escapeText and standaloneSvg', () => {
  it('leave nothing that a page could run or an XML parser refuse', () => {
    expect(escapeText(`<script>alert('1' & "2")</script>\u0000`)).toBe(
      '&lt;script&gt;alert(&#39;1&#39; &amp; &quot;2&quot;)&lt;/script&gt;\ufffd',
    );
  });
  it('give a file of its own both themes', () => {
    const file = standaloneSvg(
      linePlotSvg({ x: [0, 1], y: [0, 1] }, { title: 't', description: 'd', xLabel: 'x', yLabel: 'y' }),
    );
    expect(file.startsWith('<?xml')).toBe(true);
    expect(file).toContain('prefers-color-scheme:dark');
  });
});
