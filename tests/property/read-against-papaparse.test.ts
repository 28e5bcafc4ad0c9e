import papaparse from 'papaparse';
import { uniformFloat64 } from 'pure-rand/distribution/uniformFloat64';
import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import { expect, it } from 'vitest';
import { flatRows, readText } from '../helpers/dump-sources.js';

it('reads a seeded file as papaparse and Number do', async () => {
  const random = xoroshiro128plus(2024);
  const lines = ['"frame","x","note","y","intensity"'];
  for (let i = 0; i < 20_000; i++) {
    const number = () => {
      const value = (uniformFloat64(random) - 0.3) * 1000;
      const form = uniformInt(random, 0, 3);
      return form === 0
        ? String(value)
        : form === 1
          ? value.toFixed(3)
          : form === 2
            ? value.toExponential(6)
            : `"${value}"`;
    };
    const note = ['', 'plain', '"a, b"', '"line, with, commas"'][uniformInt(random, 0, 3)];
    lines.push([i >> 5, number(), note, number(), uniformInt(random, 0, 255)].join(','));
  }
  const text = `${lines.join('\r\n')}\r\n`;
  const { data } = papaparse.parse<Record<string, string>>(text, { header: true, skipEmptyLines: true });
  const expected = data.map((row, i) => [row['frame'], row['x'], row['y'], row['intensity'], i].map(Number));
  const { blocks } = await readText(text);
  expect(flatRows(blocks).map(([frame, x, y, , intensity, row]) => [frame, x, y, intensity, row])).toEqual(expected);
});
