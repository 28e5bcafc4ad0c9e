import { cpSync, mkdtempSync, readdirSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { createContext, FLAG, SCHEMA_VERSION } from '@wakeloom/tracker';
import { openNodeResultPlace } from '@wakeloom/tracker/node/result-place-node';
import { folderDigest } from '@wakeloom/tracker/store/digest';
import { readBackDigest } from '@wakeloom/tracker/store/read-back';
import { isCompleteResult, openResult } from '@wakeloom/tracker/store/read-result';
import { sampleColumns } from '@wakeloom/tracker/store/sample-columns';
import { afterAll, describe, expect, it } from 'vitest';
import { FINAL, FRAMES, goldenGrid, goldenSample, PATHLINES } from '../helpers/golden-values.mjs';

const helpers = join(import.meta.dirname, '../helpers');
const folders = readdirSync(helpers).filter((name) => /^golden-\d+\.\d+$/.test(name));
const work = mkdtempSync(join(tmpdir(), 'golden-'));
afterAll(() => rmSync(work, { recursive: true, force: true }));

/** Samples of one final pathline in closed form, flags as the writer leaves them. */
function expected(provisional: number) {
  const rows = Array.from({ length: FRAMES }, (_, k) => goldenSample(provisional, k)).filter((row) => row !== null);
  return rows.map((row) => ({ ...row, flags: row.flags | (provisional === 5 ? FLAG.stuck : 0) }));
}

it('there is a golden folder of the first version and of this one', () => {
  expect(folders).toContain('golden-1.0');
  expect(folders).toContain(`golden-${SCHEMA_VERSION}`);
});

describe.each(folders)('%s', (name) => {
  const open = async () => {
    // A copy, so that nothing can write into the golden folder.
    cpSync(join(helpers, name), join(work, name), { recursive: true });
    return openNodeResultPlace(join(work, name), { create: false });
  };

  it('is a complete result with its version', async () => {
    const place = await open();
    expect(await isCompleteResult(place)).toBe(true);
    const result = await openResult(place);
    expect(result.record.schema).toBe(name.slice('golden-'.length));
    expect(result.record.notes['operator']).toBe('nobody: invented data');
    result.close();
  });

  it('holds the samples of the closed form', async () => {
    const result = await openResult(await open());
    const { pathlines } = result;
    expect([...(pathlines?.number ?? [])]).toEqual(FINAL.filter((number) => number !== null));
    for (let p = 0; p < PATHLINES; p++) {
      const final = FINAL[p];
      if (final === null) continue;
      const rows = expected(p);
      const read = pathlines?.pathline(final);
      for (const column of sampleColumns(2, false)) {
        expect([...(read?.[column.name] ?? [])], column.name).toEqual(rows.map((row) => row[column.key]));
      }
    }
    result.close();
  });

  it('shows each instant', async () => {
    const result = await openResult(await open());
    for (let k = 0; k < FRAMES; k++) {
      const instant = result.frames?.instant(k);
      const rows = FINAL.flatMap((final, p) => {
        const sample = goldenSample(p, k);
        return final === null || sample === null ? [] : [{ final, sample }];
      });
      expect(instant?.frame).toBe(100 + 2 * k);
      expect([...(instant?.columns['x'] ?? [])]).toEqual(rows.map(({ sample }) => sample.x));
      expect([...(instant?.columns['pathline_index'] ?? [])]).toEqual(rows.map(({ final }) => final));
    }
    // Few samples: the overview has them all.
    expect(result.frames?.overview()['x'].length).toBe(result.pathlines?.samples);
    result.close();
  });

  it('holds the grid', async () => {
    const result = await openResult(await open());
    expect(result.grid()).toEqual(goldenGrid());
    result.close();
  });

  it('still has the content its digest says', async () => {
    const place = await open();
    const result = await openResult(place);
    result.close();
    const { files, content } = result.record.digest;
    for (const [file, digest] of Object.entries(files)) {
      expect(await readBackDigest(place, file, createContext()), file).toBe(digest);
    }
    expect(folderDigest(place.hasher, files)).toBe(content);
  });
});
