import { mkdtempSync, readdirSync, readFileSync, rmSync, truncateSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { createContext, FLAG } from '@wakeloom/tracker';
import type { Dims } from '@wakeloom/tracker/core/columns';
import type { ResultPlace } from '@wakeloom/tracker/core/result-place';
import { openNodeResultPlace } from '@wakeloom/tracker/node/result-place-node';
import { type PathlineSource, pathlineTable } from '@wakeloom/tracker/store/exports/pathline-table';
import type { PathlineRows } from '@wakeloom/tracker/store/pathline-rows';
import { isCompleteResult, openResult } from '@wakeloom/tracker/store/read-result';
import { openResultWriter } from '@wakeloom/tracker/store/result-writer';
import { sampleColumns } from '@wakeloom/tracker/store/sample-columns';
import { verifyResult } from '@wakeloom/tracker/store/verify-result';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import { MADE_OPTIONS, madeGrid, madeRecord, makeResult } from '../helpers/made-result.js';
import { madeSamples } from '../helpers/made-samples.js';
import { sampleOracle } from '../helpers/sample-oracle.js';

let folder: string;
let place: ResultPlace;

beforeEach(async () => {
  folder = mkdtempSync(join(tmpdir(), 'result-writer-'));
  place = await openNodeResultPlace(folder, { create: true });
});
afterEach(() => rmSync(folder, { recursive: true, force: true }));

const MADE = { frames: 60, particles: 40, life: 14 };
/** Small enough that batches, buckets, groups and frames cut across each other everywhere. */
const SMALL = { batchRows: 173, groupBytes: 20_000 };

describe.each([2, 3] as Dims[])('a result in %i dimensions', (dims) => {
  it('holds every sample of every kept pathline, in pathline order', async () => {
    const made = { ...MADE, dims };
    const seen: { firstPathline: number; rows: number }[] = [];
    await makeResult(place, made, { working: SMALL }, (rows) => {
      seen.push({ firstPathline: rows.firstPathline, rows: rows.flags.length });
    });
    const oracle = sampleOracle(made, MADE_OPTIONS);
    const result = await openResult(place);
    const { pathlines } = result;
    expect(seen.length).toBeGreaterThan(5);
    expect(seen.reduce((sum, each) => sum + each.rows, 0)).toBe(oracle.samples);
    expect(pathlines?.samples).toBe(oracle.samples);
    expect(pathlines?.dims).toBe(dims);
    expect([...(pathlines?.rowSize ?? [])]).toEqual(oracle.rowSize);
    for (const column of sampleColumns(dims, false)) {
      expect([...(pathlines?.rows(column.name, 0, oracle.samples) ?? [])], column.name).toEqual(
        oracle.columns[column.key],
      );
    }
    result.close();
  });

  it('shows the same samples by frame, each with its row in pathlines.nc', async () => {
    await makeResult(place, { ...MADE, dims }, { working: SMALL });
    const result = await openResult(place);
    const { frames, pathlines } = result;
    expect(frames?.number.length).toBe(MADE.frames);
    expect(frames?.samples).toBe(pathlines?.samples);
    const whole = (name: string) => pathlines?.rows(name, 0, pathlines.samples) ?? [];
    const names = dims === 2 ? ['x', 'y', 'u', 'v', 'flags'] : ['x', 'y', 'z', 'u', 'v', 'w', 'flags'];
    const inPathlines = Object.fromEntries([...names, 'frame', 'time'].map((name) => [name, whole(name)]));
    const rowsSeen = new Set<number>();
    for (let index = 0; index < MADE.frames; index++) {
      const instant = frames?.instant(index);
      const rows = [...(instant?.columns['pathlines_row'] ?? [])];
      for (const row of rows) rowsSeen.add(row);
      for (const name of names) {
        expect([...(instant?.columns[name] ?? [])]).toEqual(rows.map((row) => inPathlines[name][row]));
      }
      expect(rows.every((row) => inPathlines['frame'][row] === instant?.frame)).toBe(true);
      expect(rows.every((row) => inPathlines['time'][row] === instant?.time)).toBe(true);
    }
    expect(rowsSeen.size).toBe(pathlines?.samples);
    result.close();
  });

  it('gives the grid back bit for bit', async () => {
    await makeResult(place, { ...MADE, dims });
    const result = await openResult(place);
    expect(result.grid()).toEqual(madeGrid(dims));
    result.close();
  });
});

it('counts what an independent pass over the samples counts', async () => {
  const { finished } = await makeResult(place, MADE, { working: SMALL });
  const oracle = sampleOracle(MADE, MADE_OPTIONS);
  expect(finished.shortFragments).toBeGreaterThan(3);
  expect(finished.flagged.stuck).toBeGreaterThan(3);
  expect(finished).toMatchObject(oracle.counts);
  expect(finished.meanSpeed).toBeCloseTo(oracle.meanSpeed, 12);
  expect(finished.peakSpeed).toBe(oracle.peakSpeed);
  // The histogram's resolution, 2^-13, is all the tolerance there is.
  expect(Math.abs(finished.medianVelocitySe / oracle.medianVelocitySe - 1)).toBeLessThanOrEqual(2 ** -13);
});

it('has the same content whatever the sizes of blocks, batches and groups', async () => {
  const contents = new Set<string>();
  for (const [framesPerBlock, working] of [
    [8, undefined],
    [1, SMALL],
    [60, { batchRows: 64, groupBytes: 1 }],
  ] as const) {
    const { record } = await makeResult(place, { ...MADE, framesPerBlock }, { working });
    contents.add(record.digest.content);
  }
  expect(contents.size).toBe(1);
  const other = await makeResult(place, { ...MADE, seed: 2 });
  expect(contents.has(other.record.digest.content)).toBe(false);
});

it('keeps every tenth pathline and frame when thinned, with whole pathlines still handed out', async () => {
  const all = await makeResult(place, MADE);
  const full = await openResult(place);
  const kept = [...(full.pathlines?.number ?? [])].filter((number) => number % 10 === 0);
  const xOf = new Map(kept.map((number) => [number, full.pathlines?.pathline(number)['x']]));
  full.close();
  let rows = 0;
  const thinned = await makeResult(
    place,
    MADE,
    { keepPathlines: 'thinned', keepFrames: 'thinned', working: SMALL },
    (each) => {
      rows += each.flags.length;
    },
  );
  expect(thinned.finished).toEqual(all.finished);
  expect(rows).toBe(all.finished.samples);
  const result = await openResult(place);
  expect([...(result.pathlines?.number ?? [])]).toEqual(kept);
  kept.forEach((number, index) => {
    expect(result.pathlines?.pathline(index)['x']).toEqual(xOf.get(number));
  });
  expect([...(result.frames?.number ?? [])]).toEqual([10, 20, 30, 40, 50, 60]);
  const instant = result.frames?.instant(2);
  const x = result.pathlines?.rows('x', 0, result.pathlines.samples) ?? [];
  let linked = 0;
  instant?.columns['pathlines_row'].forEach((row, i) => {
    const wanted = instant.columns['pathline_index'][i] % 10 === 0;
    expect(row >= 0).toBe(wanted);
    if (row >= 0) expect(x[row]).toBe(instant.columns['x'][i]);
    if (row >= 0) linked++;
  });
  expect(linked).toBeGreaterThan(0);
  result.close();
});

it('writes neither file when none are kept, and leaves no scratch behind', async () => {
  await makeResult(place, MADE, { keepPathlines: 'none', keepFrames: 'none' });
  expect(readdirSync(folder).sort()).toEqual(['grid.nc', 'log.ndjson', 'report.html', 'run.json']);
  const result = await openResult(place);
  expect(result.pathlines).toBeNull();
  expect(result.frames).toBeNull();
  result.close();
});

it('leaves the acceleration of image pairs out, and calls no single sample stuck', async () => {
  const single = { frames: 4, particles: 20, life: 1 };
  const { finished } = await makeResult(place, single, { pairs: true, shortest: 1 });
  expect(finished.samples).toBe(80);
  expect(finished.flagged.stuck).toBe(0);
  const result = await openResult(place);
  expect(result.pathlines?.variables.filter((name) => /^a[xyz]/.test(name))).toEqual([]);
  expect(finished.links).toBe(finished.samples);
  result.close();
});

describe('a result that is not complete', () => {
  it('leaves an earlier one whole until it is itself, whether it is given up or fails', async () => {
    const { record } = await makeResult(place, MADE);
    const before = readdirSync(folder);
    const contentNow = async () => {
      const result = await openResult(place);
      result.close();
      await verifyResult(place, createContext());
      return result.record.digest.content;
    };
    const writer = openResultWriter(place, { ...MADE_OPTIONS, dims: 2, context: createContext() });
    for (const block of madeSamples(MADE)) await writer.add(block);
    await writer.finish(() => {});
    expect(readdirSync(folder)).toEqual(expect.arrayContaining([...before, '.partial-pathlines.nc']));
    expect(await contentNow()).toBe(record.digest.content);
    writer.abandon();
    expect(readdirSync(folder)).toEqual(before);
    const full: ResultPlace = { ...place, freeBytes: () => 3_000_000 };
    const failing = makeResult(full, { ...MADE, seed: 2 }, { expectedSamples: 1e6 });
    await expect(failing).rejects.toMatchObject({
      code: 'store/disk-full',
      message: expect.stringMatching(/earlier result in the folder takes \d\.\d MB and stays/),
    });
    expect(readdirSync(folder)).toEqual(before);
    expect(await contentNow()).toBe(record.digest.content);
  });

  it('takes the place of an earlier one by names alone: old run.json first, new one last, nothing stale left', async () => {
    await makeResult(place, MADE);
    const calls: string[] = [];
    const noting: ResultPlace = {
      ...place,
      rename(from, to) {
        calls.push(`rename ${to}`);
        place.rename(from, to);
      },
      remove(file) {
        calls.push(`remove ${file}`);
        place.remove(file);
      },
      sync(file) {
        calls.push(`sync ${file}`);
        return place.sync(file);
      },
      writeText(file, text) {
        calls.push(`write ${file}`);
        place.writeText(file, text);
      },
    };
    await makeResult(noting, { ...MADE, seed: 2 }, { keepFrames: 'none' });
    const swap = calls.slice(calls.indexOf('remove run.json'));
    expect(swap).toEqual([
      'remove run.json',
      'rename pathlines.nc',
      'remove frames.nc',
      'rename grid.nc',
      'rename report.html',
      'rename log.ndjson',
      'rename run.json',
    ]);
    expect(calls.indexOf('sync .partial-run.json')).toBeGreaterThan(0);
    expect(readdirSync(folder)).toEqual(['grid.nc', 'log.ndjson', 'pathlines.nc', 'report.html', 'run.json']);
    await verifyResult(place, createContext());
  });

  it('is none when the swap itself breaks off', async () => {
    await makeResult(place, MADE);
    const broken: ResultPlace = {
      ...place,
      rename(from, to) {
        if (to === 'grid.nc') throw new Error('the disk went away');
        place.rename(from, to);
      },
    };
    await expect(makeResult(broken, { ...MADE, seed: 2 })).rejects.toThrow('went away');
    expect(readdirSync(folder)).toEqual([]);
  });

  it.each(['pathlines.nc', 'frames.nc', 'grid.nc'])('is refused when the disk changes %s', async (file) => {
    const faulty: ResultPlace = {
      ...place,
      async sync(name) {
        await place.sync(name);
        if (name !== `.partial-${file}`) return;
        // One bit of the last value that is no NaN, somewhere in the raw data.
        const bytes = readFileSync(join(folder, name));
        const at = bytes.lastIndexOf(Buffer.from(Float64Array.of(file === 'grid.nc' ? 0.5 : -3).buffer));
        expect(at).toBeGreaterThan(0);
        bytes[at + 1] ^= 1;
        writeFileSync(join(folder, name), bytes);
      },
    };
    await expect(makeResult(faulty, MADE)).rejects.toMatchObject({ code: 'store/read-back' });
    expect(readdirSync(folder)).toEqual([]);
  });

  it('is refused when the disk drops the tail of a file', async () => {
    const faulty: ResultPlace = {
      ...place,
      async sync(name) {
        if (name.endsWith('pathlines.nc')) truncateSync(join(folder, name), Math.floor(place.size(name) * 0.7));
      },
    };
    await expect(makeResult(faulty, MADE)).rejects.toMatchObject({ code: 'store/read-back' });
    expect(await isCompleteResult(place)).toBe(false);
  });

  it('is left clean by an abort', async () => {
    const controller = new AbortController();
    const context = createContext({ signal: controller.signal });
    const pending = makeResult(place, MADE, { context, working: SMALL }, () => controller.abort());
    await expect(pending).rejects.toMatchObject({ code: 'run/aborted' });
    expect(readdirSync(folder)).toEqual([]);
  });

  it('is refused by readers with the reason', async () => {
    await expect(openResult(place)).rejects.toMatchObject({ code: 'store/not-a-result' });
    const { record } = await makeResult(place, MADE);
    const put = (text: string) => writeFileSync(join(folder, 'run.json'), text);
    for (const [text, code] of [
      ['{', 'store/not-a-result'],
      ['{"schema":"1.0"}', 'store/not-a-result'],
      [JSON.stringify({ ...record, schema: '1.2' }), 'store/newer-schema'],
      [JSON.stringify({ ...record, schema: '2.0' }), 'store/newer-schema'],
      [JSON.stringify({ ...record, schema: '0.9' }), 'store/older-schema'],
    ]) {
      put(text);
      await expect(openResult(place), text.slice(0, 20)).rejects.toMatchObject({ code });
      expect(await isCompleteResult(place)).toBe(false);
    }
    put(JSON.stringify(record));
    expect(await isCompleteResult(place)).toBe(true);
    rmSync(join(folder, 'grid.nc'));
    expect(await isCompleteResult(place)).toBe(false);
  });
});

it('hands out flags as they end up in the file', async () => {
  let stuck = 0;
  const count = (rows: PathlineRows) => {
    for (const flags of rows.flags) if ((flags & FLAG.stuck) !== 0) stuck++;
  };
  const { finished } = await makeResult(place, MADE, { working: SMALL }, count);
  expect(stuck).toBe(finished.flagged.stuck);
});

it('is read by the exporters as it stands', async () => {
  await makeResult(place, MADE);
  const result = await openResult(place);
  const source: PathlineSource | null = result.pathlines;
  const table = source === null ? null : pathlineTable(source, null);
  expect(table?.rows).toBe(result.pathlines?.samples);
  const column = table?.columns.findIndex(({ name }) => name === 'pathline') ?? -1;
  const last = result.pathlines?.number.at(-1);
  const rows = result.pathlines?.rowSize.at(-1) ?? 0;
  const numbers = await table?.read(column, (table?.rows ?? 0) - rows, table?.rows ?? 0);
  expect([...(numbers ?? [])]).toEqual(new Array(rows).fill(last));
  result.close();
});

it('refuses blocks out of frame order and rows without a pathline', async () => {
  const blocks = [...madeSamples(MADE)];
  const open = () => openResultWriter(place, { ...MADE_OPTIONS, dims: 2, context: createContext() });
  const writer = open();
  await writer.add(blocks[1]);
  await expect(writer.add(blocks[0])).rejects.toMatchObject({ code: 'store/bad-block' });
  blocks[0].pathline[3] = -1;
  await expect(open().add(blocks[0])).rejects.toMatchObject({ code: 'store/bad-block' });
});

it('makes a folder that readers open when no pathline was long enough', async () => {
  const { finished } = await makeResult(place, { frames: 5, particles: 3, life: 2 }, { shortest: 100 });
  expect(finished.samples).toBe(0);
  const result = await openResult(place);
  expect(result.pathlines?.samples).toBe(0);
  expect(result.frames?.instant(1).columns['x'].length).toBe(0);
  expect(result.record.counts).toEqual(madeRecord(finished).counts);
  expect(result.record.figures.meanSpeed).toBeNaN();
  result.close();
});
