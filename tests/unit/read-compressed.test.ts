import { gzipSync } from 'node:zlib';
import { describe, expect, it } from 'vitest';
import { flatRows, memorySource, readDump, readText } from '../helpers/dump-sources.js';
import { npySample } from '../helpers/npy-samples.js';

/** The text that the zstd sample below holds. */
const TEXT = `frame,x,y\n${Array.from({ length: 400 }, (_, i) => `${i >> 3},${i * 0.5},${(i * 37) % 101}\n`).join('')}`;

/** TEXT by `zstd -19` 1.5.4 (with content checksum), base64. */
const ZSTD =
  'KLUv/WTqDtUmAPqC8A4WkKUgzQHF8ePWubuQpU1CS9qe3JmYC+wA5gDnAN/dkNuKbmBesRs1Vy0SEG9Ip5IbeI/UjVAL2g2hgzqQ0LyBPedGcawbIl/vBtJGZ5AbtTs3Jq/2Bso0eKP10BjwxtxSupF5QGM3Omfijek4X6jcyPvqRje7MXQtb2Sv2cLMDcOpbow8dyNpmRtmB3NDzg3KszdSRrxh9eUNuk2uYHQjCOTaDZsrb1AnkxsBPjIFqhu2BHeD6ECecHkjnxDY+QSaG/iEw/EJQW/cEki+JdzdsCUEtS2BbnQJZ3cJAd2oJVReS7jeoIMQzHQQCm/MQbh6DkIgN+Qg1C0H4ehGcHAQCkxgAAIGBgQIIThW3Qj3yd0o2vKagHlD7NbcQLykN0omvBtST04T6gbaInSjeZDYGzJn8QbWiM8EkRu9D+lGkK12A+dO3mgvXCag3BicWjcCPnM3SkvmjbEDPJjQuZF4Tm9UxrwbU19vpG13Shi6YXmzN2YuwxtZ08gNu+dGCUk3wixmN3IOjvKG9Uy5QTjaJ8HqRsjvbhhtgdwguzY3grxsk0C9YTIFeIPqsRvBLUQ3Lg/sSgjsBs15eCPoSHLj7gvqBm29JJzdCOhW3rhewdwonK5uBPJ0klB342gJbpQd9OaG5Fm9cTLWI0HwRlVyCt6oGks+CndD7iu6gbmJ3ai5iDekV8lGoeQG3iR1I9SDdkNoad7AHpRcCjI3iifWDZGxdwPpkxu1jeSigHNj8rY3UK7BG60Jb8w9JBOF0o3MZexG54ASb0zPyo28ceShMHUj9Eu7MbRZ3sjemRuG18hCIevGyGR3I+mZG2ZLzg3Kg5EDCtYbKSfhDasxb9B9RjeCQDaRcwLZDZsb5A3qZXIjwInqhj0iI9FyeSOwA6G5cXgGvUEyBvJNuLsR1Ec3zraAblTe641grkC2CYU3rqZAbtQ9RzdCsJTduDkI5E6QvFE9T27h5IbgWXUj3Ch3o+jDvCG2pZwVam4gXumNkgvvhtRUN9CelLGC0I3mgr0hc5DFG1inyI3eiPJVQLoR5KvdwNkmb7QX5cbghbJVaN0IOM3dKD2ZN8aWzo3EA5RbYXqjcubdmBp7I+0bumG5nVwVsjdmruGNrGvkht2UdGOek6mC2Y2chfKG9eBSbhCeVjdyNHnuhtEXyA2yzeZGkJd6w+QyWSoEeINqshvBPUQ3LpfAbtAcmBxUOLwR9CS5cTcGdSPQd3YjoK1yUqi8cb3B3Ci8rm4EMtXdOHoqI4XgRtlyc0PyoNUbF4FPqCEECVsOkpFYewdx1IG1GSEQkvYBpbnRdmwidzDvnqTMxHhcajT3DE+thcPBEe09dQ2A6S4vQKJScRhSCrgwnpDEPm6XCbE9Wr8H4mLQXmA3DrW0lgsQ28g8Zci1CD1uvUo+wtTXxXqGlRmRCHKiAdHZat4KPknl7vKRJ9v3lh/j9ONnF1ZnMOIQHUmO50GYnXj2EtKXQTkgY7UaDymUkBQuMhVgLg/cpwaYTHkxmgbcPWp4DmQJlYXvALkNANfFk7ghdIwU6pidpVSqeD3cqEYJG9Q0YoxH6+2rA6aKhAHXt0P+m8AsoWOyYogIdfFhPvxxxV9sqVgOforgIZi4N9i+ivDB0huQBIX/TO6jJMqFDGduFUtKA8hSnPE=';

const plain = async () => flatRows((await readText(TEXT)).blocks);

describe('gzip', () => {
  it('reads the same rows as the text, and hashes the file as it lies on disk', async () => {
    const { createHash } = await import('node:crypto');
    const packed = gzipSync(TEXT);
    const { scan, blocks } = await readDump([memorySource('run.csv.gz', packed, 100)]);
    expect(flatRows(blocks)).toEqual(await plain());
    expect(scan.files[0].sha256).toBe(createHash('sha256').update(packed).digest('hex'));
    expect(scan.files[0].bytes).toBe(packed.length);
  });

  it('reads several members in one file', async () => {
    const cut = TEXT.indexOf('\n', 1000) - 3;
    const packed = Buffer.concat([gzipSync(TEXT.slice(0, cut)), gzipSync(TEXT.slice(cut))]);
    expect(flatRows((await readDump([memorySource('run.csv.gz', packed)])).blocks)).toEqual(await plain());
  });

  it('recognises gzip by its bytes, not its name', async () => {
    expect((await readDump([memorySource('run.csv', gzipSync(TEXT))])).scan.rowsRead).toBe(400);
  });

  it('refuses a file cut short anywhere, and damaged ones', async () => {
    const packed = gzipSync(TEXT);
    for (const length of [3, 9, 15, packed.length >> 1, packed.length - 8, packed.length - 1]) {
      await expect(readDump([memorySource('run.csv.gz', packed.subarray(0, length))])).rejects.toMatchObject({
        code: 'dump/truncated-gzip',
        message: expect.stringContaining('run.csv.gz'),
      });
    }
    const damaged = Uint8Array.from(packed);
    damaged[packed.length - 6] ^= 1;
    await expect(readDump([memorySource('run.csv.gz', damaged)])).rejects.toMatchObject({ code: 'dump/corrupt-gzip' });
    const longer = Buffer.concat([packed, Buffer.from('more')]);
    await expect(readDump([memorySource('run.csv.gz', longer)])).rejects.toMatchObject({ code: 'dump/corrupt-gzip' });
  });

  it('refuses packed binary formats and packed nothing', async () => {
    await expect(readDump([memorySource('run.npy.gz', gzipSync(npySample('rows')))])).rejects.toMatchObject({
      code: 'dump/packed-binary',
    });
    await expect(readDump([memorySource('run.csv.gz', gzipSync(''))])).rejects.toMatchObject({ code: 'dump/empty' });
  });
});

describe('zstd', () => {
  const packed = new Uint8Array(Buffer.from(ZSTD, 'base64'));

  it('reads the same rows as the text, in one frame or two', async () => {
    expect(flatRows((await readDump([memorySource('run.csv.zst', packed, 50)])).blocks)).toEqual(await plain());
    const twice = await readDump([memorySource('run.csv.zst', new Uint8Array([...packed, ...packed]))], {
      badRowsLimit: 0.6,
    });
    // The second header is a row of words, every second place is taken.
    expect(twice.scan).toMatchObject({ rowsPresent: 801, rowsRead: 400 });
  });

  it('refuses a file cut short anywhere, and damaged ones', async () => {
    for (const length of [5, 20, packed.length >> 1, packed.length - 1]) {
      await expect(readDump([memorySource('run.csv.zst', packed.subarray(0, length))])).rejects.toMatchObject({
        code: 'dump/truncated-zstd',
      });
    }
    const damaged = Uint8Array.from(packed);
    damaged[50] ^= 0x10;
    await expect(readDump([memorySource('run.csv.zst', damaged)])).rejects.toMatchObject({ code: 'dump/corrupt-zstd' });
  });
});
