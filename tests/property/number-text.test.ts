import { parseNumberInto } from '@wakeloom/tracker/detections/number-text';
import { uniformFloat64 } from 'pure-rand/distribution/uniformFloat64';
import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import { describe, expect, it } from 'vitest';
import { flatRows, readText } from '../helpers/dump-sources.js';

const encoder = new TextEncoder();
const out = new Float64Array(1);

/** The number, or null where the parser says there is none. */
function parse(token: string, decimal = '.'): number | null {
  const bytes = encoder.encode(token);
  return parseNumberInto(bytes, 0, bytes.length, decimal.charCodeAt(0), out, 0) ? out[0] : null;
}

describe('the number parser', () => {
  const random = xoroshiro128plus(7);
  const int = (from: number, to: number) => uniformInt(random, from, to);
  const digits = (count: number) => Array.from({ length: count }, () => int(0, 9)).join('');

  it('gives the bits of Number() on 200 000 tokens of every length', () => {
    const wrong: string[] = [];
    for (let i = 0; i < 200_000; i++) {
      const sign = ['', '-', '+'][int(0, 2)];
      const before = digits(int(0, 12));
      const after = digits(int(before === '' ? 1 : 0, 20));
      const exponent =
        int(0, 3) === 0 ? `${'eE'[int(0, 1)]}${['', '-', '+'][int(0, 2)]}${int(0, int(0, 1) === 0 ? 30 : 330)}` : '';
      const token = `${sign}${before}${after === '' ? '' : `.${after}`}${exponent}`;
      if (!Object.is(parse(token), Number(token))) wrong.push(token);
    }
    expect(wrong).toEqual([]);
  });

  it('gives back every Float64 from its shortest form, and from 17 to 19 digits', () => {
    const bits = new DataView(new ArrayBuffer(8));
    const wrong: string[] = [];
    for (let i = 0; i < 50_000; i++) {
      bits.setInt32(0, int(-0x80000000, 0x7fffffff));
      bits.setInt32(4, int(-0x80000000, 0x7fffffff));
      const anything = bits.getFloat64(0);
      const usual = uniformFloat64(random) * 10 ** int(-3, 4);
      if (Number.isFinite(anything) && !Object.is(parse(String(anything)), anything)) wrong.push(String(anything));
      for (const token of [String(usual), usual.toPrecision(17), usual.toExponential(18), usual.toFixed(16)]) {
        if (!Object.is(parse(token), Number(token))) wrong.push(token);
      }
    }
    expect(wrong).toEqual([]);
  });

  it('rounds halves as Number() does', () => {
    // Exact decimal expansions of the point half way between two neighbours: 53 bits and one more.
    const wrong: string[] = [];
    for (let i = 0; i < 20_000; i++) {
      const odd = 2n ** 53n + 2n * BigInt(int(0, 0x7fffffff)) * BigInt(int(1, 1_000_000)) + 1n;
      for (const token of [
        String(odd),
        `${String(odd).slice(0, 3)}.${String(odd).slice(3)}`,
        `${odd}.0`,
        `${odd}e-3`,
      ]) {
        if (!Object.is(parse(token), Number(token))) wrong.push(token);
      }
    }
    expect(wrong).toEqual([]);
  });

  it('reads decimal commas, Fortran exponents, quotes and names', () => {
    expect(parse('-1,25', ',')).toBe(-1.25);
    expect(parse('1.5D+02')).toBe(150);
    expect(parse(' "1.5" ')).toBe(1.5);
    expect(parse('NaN')).toBeNaN();
    expect(parse('-Inf')).toBe(Number.NEGATIVE_INFINITY);
    expect(parse('+infinity')).toBe(Number.POSITIVE_INFINITY);
  });

  it.each([
    '',
    ' ',
    '-',
    '.',
    '1.2.3',
    '1,5',
    '1e',
    '1e+',
    'e5',
    '0x10',
    '1_000',
    '1 2',
    '--1',
    '1-',
    'abc',
    'na',
    '"1',
    '1f',
    '1e5.0',
    '٣',
  ])('refuses "%s"', (token) => {
    expect(parse(token)).toBeNull();
  });
});

it('the inner loop of reading text gives the bits of Number() too', async () => {
  const random = xoroshiro128plus(11);
  const tokens: string[] = [];
  for (let i = 0; i < 30_000; i++) {
    const value = (uniformFloat64(random) - 0.5) * 10 ** uniformInt(random, -2, 9);
    tokens.push(i % 4 === 0 ? String(value) : value.toFixed(uniformInt(random, 0, 10)));
  }
  for (const [separator, decimal] of [',.', ';,', '\t.', ' ,']) {
    const written = tokens.map((token) => token.replace('.', decimal));
    const text = written.map((token, i) => `${i}${separator}${token}${separator}${token}`).join('\n');
    const { blocks } = await readText(text, { decimal: decimal === ',' ? 'comma' : 'point' });
    // A coordinate of -0 counts as 0.
    const wrong = flatRows(blocks).filter((row, i) => row[1] !== Number(tokens[i]) || !Object.is(row[1], row[2]));
    expect(wrong).toEqual([]);
    expect(flatRows(blocks)).toHaveLength(tokens.length);
  }
});
