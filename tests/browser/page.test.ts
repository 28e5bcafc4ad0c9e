import { execFileSync } from 'node:child_process';
import { existsSync, mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { createRequire } from 'node:module';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { openNodeResultPlace } from '@wakeloom/tracker/node';
import { processInWorker } from '@wakeloom/tracker/node/process-in-worker';
import { resolveRun } from '@wakeloom/tracker/run/resolve';
import { parseRunSheet } from '@wakeloom/tracker/run/run-sheet';
import { openResult } from '@wakeloom/tracker/store/read-result';
import type { RunRecord } from '@wakeloom/tracker/store/run-record';
import * as h5wasm from 'h5wasm/node';
import type { Browser, BrowserContext, Page } from 'playwright-core';
import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, it } from 'vitest';
import { startChromium } from '../helpers/browser.js';
import { needs } from '../helpers/need.js';
import { type StaticServer, serveFolder } from '../helpers/static-server.js';
import { VORTEX_OPTIONS, vortexDump } from '../helpers/vortex-dump.js';

const here = needs('chromium');
const built = fileURLToPath(new URL('../../packages/web-viewer/dist/page', import.meta.url));
const axeSource = createRequire(import.meta.url).resolve('axe-core/axe.min.js');
const folder = mkdtempSync(join(tmpdir(), 'wakeloom-page-'));
const small = join(folder, 'vortex.csv');
const large = join(folder, 'large.csv');

let server: StaticServer;
let browser: Browser;
let context: BrowserContext;
let page: Page;
let asked: string[];
let faults: string[];

/** The same run in Node's worker threads. */
async function processHere(file: string, threads: number): Promise<RunRecord> {
  const resolved = resolveRun({ options: VORTEX_OPTIONS, dumpFiles: [file] });
  const out = join(folder, `node-${threads}`);
  return processInWorker({ resolved, programVersion: 'test' }, [file], out, { threads, ramLimit: 256 * 1024 * 1024 });
}

/** Drops a file on the field as a person would with a mouse; only small ones, the bytes pass through the test. */
async function drop(name: string, bytes: Uint8Array): Promise<void> {
  const transfer = await page.evaluateHandle(
    ({ name, text }) => {
      const bytes = Uint8Array.from(atob(text), (letter) => letter.charCodeAt(0));
      const transfer = new DataTransfer();
      transfer.items.add(new File([bytes], name));
      return transfer;
    },
    { name, text: Buffer.from(bytes).toString('base64') },
  );
  await page.dispatchEvent('.drop', 'drop', { dataTransfer: transfer });
}

async function fillSettings(threads = 1): Promise<void> {
  await page.getByLabel('Frame rate').fill(VORTEX_OPTIONS.rate);
  await page.getByLabel('Scale').fill(VORTEX_OPTIONS.scale);
  await page.getByLabel('Bin of the grid').fill(VORTEX_OPTIONS.bin);
  await page.getByLabel('y axis').selectOption(VORTEX_OPTIONS['y-axis']);
  await page.getByLabel('Worker threads').fill(String(threads));
}

async function status(words: string): Promise<void> {
  await page.getByRole('status').getByText(words, { exact: true }).waitFor();
}

async function processAndWait(): Promise<void> {
  await page.getByRole('button', { name: 'Process' }).click();
  await status('Done.');
}

/** Worker scripts fetched so far; the server forbids keeping them. */
function workersStarted(): number {
  return server.paths.filter((path) => /tracker\.worker-.*\.js$/.test(path)).length;
}

async function violations(): Promise<string[]> {
  // The page's own content policy does not let it be put in as a script element.
  await page.evaluate(readFileSync(axeSource, 'utf8'));
  const found = await page.evaluate(() =>
    (globalThis as unknown as { axe: typeof import('axe-core') }).axe.run(document, { resultTypes: ['violations'] }),
  );
  return found.violations.map(({ id, nodes }) => `${id}: ${nodes.map((node) => node.html).join(' | ')}`);
}

beforeAll(async () => {
  if (!here) return;
  if (!existsSync(join(built, 'index.html'))) {
    throw new Error('packages/web-viewer/dist/page is not built; run: npm run build');
  }
  writeFileSync(small, await vortexDump(60, 400));
  writeFileSync(large, await vortexDump(200, 1000));
  server = await serveFolder(built);
  browser = await startChromium();
});

afterAll(async () => {
  await browser?.close();
  await server?.close();
  rmSync(folder, { recursive: true, force: true });
});

beforeEach(async () => {
  if (!here) return;
  asked = [];
  faults = [];
  context = await browser.newContext({ viewport: { width: 1280, height: 800 } });
  page = await context.newPage();
  page.setDefaultTimeout(120_000);
  context.on('request', (request) => asked.push(request.url()));
  page.on('pageerror', (error) => faults.push(error.message));
  page.on('console', (message) => {
    if (message.type() === 'error') faults.push(message.text());
  });
  await page.goto(server.origin);
});

afterEach(async () => {
  if (!here) return;
  await context.close();
  expect(faults).toEqual([]);
  expect(server.missing).toEqual([]);
});

// Whole runs in the page and in Node: on a machine that does other work besides they take their time.
describe.skipIf(!here)('the page', { timeout: 240_000 }, () => {
  it('works a dropped dump to the same bits as Node does, and asks nobody else', async () => {
    await drop('vortex.csv', readFileSync(small));
    await page.getByText('vortex.csv').waitFor();
    await fillSettings();
    await processAndWait();
    const shown = await page.locator('#digest').textContent();
    const record = await processHere(small, 1);
    expect(shown).toBe(record.digest.content);

    await page.locator('canvas[data-pieces]').waitFor();
    // Every pathline of n samples is n - 1 pieces of line.
    const pieces = await page.locator('canvas').getAttribute('data-pieces');
    expect(Number(pieces)).toBe(record.counts.samples - record.counts.pathlines);
    const painted = await page.locator('canvas').evaluate((canvas: HTMLCanvasElement) => {
      const { data } = canvas.getContext('2d')!.getImageData(0, 0, canvas.width, canvas.height);
      let count = 0;
      for (let i = 3; i < data.length; i += 4) if (data[i] > 0) count++;
      return count / (canvas.width * canvas.height);
    });
    expect(painted).toBeGreaterThan(0.05);
    expect(asked.length).toBeGreaterThan(5);
    expect(asked.filter((address) => !address.startsWith(`${server.origin}/`))).toEqual([]);
  });

  it('gives the same with two workers, from an HDF5 dump, and from a gzipped one', async () => {
    const rows = readFileSync(small, 'utf8').trim().split('\n').slice(1);
    const columns = rows.map((row) => row.split(',').map(Number));
    const hdf5 = join(folder, 'vortex.h5');
    await h5wasm.ready;
    const file = new h5wasm.File(hdf5, 'w');
    const names = readFileSync(small, 'utf8').split('\n', 1)[0].split(',');
    names.forEach((name, k) => {
      const data = Float64Array.from(columns, (row) => row[k]);
      file.create_dataset({ name, data: name === 'frame' ? Int32Array.from(data) : data });
    });
    file.close();
    const { gzipSync } = await import('node:zlib');
    const gzipped = join(folder, 'vortex.csv.gz');
    writeFileSync(gzipped, gzipSync(readFileSync(small)));

    await fillSettings(2);
    const workersBefore = workersStarted();
    const digests: (string | null)[] = [];
    for (const path of [small, hdf5, gzipped]) {
      await page.setInputFiles('input[type=file]', path);
      await status('Ready to process.');
      await processAndWait();
      digests.push(await page.locator('#digest').textContent());
    }
    const { content } = (await processHere(small, 2)).digest;
    expect(digests).toEqual([content, content, content]);
    // One coordinator for the page, one helper for each run.
    expect(workersStarted() - workersBefore).toBe(4);
  });

  it('works 200 000 detections with two workers to the same bits as Node does', async () => {
    await page.setInputFiles('input[type=file]', large);
    await fillSettings(2);
    const started = performance.now();
    await processAndWait();
    console.log(`200 000 detections in the page: ${((performance.now() - started) / 1000).toFixed(1)} s`);
    const record = await processHere(large, 2);
    expect(record.counts.rowsRead).toBeGreaterThan(190_000);
    expect(await page.locator('#digest').textContent()).toBe(record.digest.content);
  });

  it('saves the result files whole', async () => {
    await page.setInputFiles('input[type=file]', small);
    await fillSettings();
    await processAndWait();
    const record = await processHere(small, 1);
    for (const name of ['run.json', 'pathlines.nc']) {
      const [download] = await Promise.all([
        page.waitForEvent('download'),
        page.getByRole('button', { name: `Save ${name}` }).click(),
      ]);
      expect(download.suggestedFilename()).toBe(name);
      await download.saveAs(join(folder, name));
    }
    const saved = JSON.parse(readFileSync(join(folder, 'run.json'), 'utf8')) as RunRecord;
    expect(saved.digest).toEqual(record.digest);
    expect(saved.counts).toEqual(record.counts);
    await h5wasm.ready;
    const file = new h5wasm.File(join(folder, 'pathlines.nc'), 'r');
    expect((file.get('x') as h5wasm.Dataset).shape).toEqual([record.counts.samples]);
    file.close();
  });

  it('saves all files at once as an archive', async () => {
    await page.setInputFiles('input[type=file]', small);
    await fillSettings();
    await processAndWait();
    const digest = await page.locator('#digest').textContent();
    const [download] = await Promise.all([
      page.waitForEvent('download'),
      page.getByRole('button', { name: 'Save all as one archive' }).click(),
    ]);
    expect(download.suggestedFilename()).toBe('vortex.zip');
    const archive = join(folder, 'vortex.zip');
    await download.saveAs(archive);
    if (!needs('python3')) return;
    const script =
      'import sys, zipfile; z = zipfile.ZipFile(sys.argv[1]); assert z.testzip() is None; z.extractall(sys.argv[2])';
    execFileSync('/usr/bin/python3', ['-c', script, archive, join(folder, 'unpacked')]);
    const result = await openResult(await openNodeResultPlace(join(folder, 'unpacked'), { create: false }));
    expect(result.record.digest.content).toBe(digest);
    expect(result.pathlines!.samples).toBe(result.record.counts.samples);
    result.close();
  });

  it('takes a run sheet dropped beside the dump; fields overrule it, what nobody said is assumed aloud', async () => {
    const sheet = 'run: vortex, again\nclock: { rate: 50 Hz }\ngeometry: { scale: 0.05 mm/px }\ngrid: { bin: 4 mm }\n';
    await drop('vortex.csv', readFileSync(small));
    await drop('vortex.yaml', Buffer.from(sheet));
    await page.getByText('run sheet; what is filled in below overrules it').waitFor();
    await page.getByLabel('Frame rate').fill('100 Hz');
    await processAndWait();
    await page.getByText('y as written in the dump counts as up.').waitFor();
    const parsed = parseRunSheet(sheet, 'vortex.yaml');
    const resolved = resolveRun({ sheet: parsed, options: { rate: '100 Hz' }, dumpFiles: [small] });
    const out = join(folder, 'node-sheet');
    const limits = { threads: 1, ramLimit: 256 * 1024 * 1024 };
    const record = await processInWorker({ resolved, programVersion: 'test' }, [small], out, limits);
    expect(await page.locator('#digest').textContent()).toBe(record.digest.content);

    await drop('vortex.yml', Buffer.from('clock: { rat: 50 Hz }\n'));
    await page.getByRole('button', { name: 'Process' }).click();
    await status('The run failed.');
    expect(await page.getByRole('alert').textContent()).toMatch(/vortex\.yml:1:10: .*rat.*nearest is "rate"/s);
    await page.getByRole('button', { name: 'Leave out vortex.yml' }).click();
    await page.getByLabel('y axis').selectOption('down');
    await processAndWait();
    expect(await page.getByText('y as written in the dump counts as up.').count()).toBe(0);
  });

  it('stops on request and works again afterwards', async () => {
    await page.setInputFiles('input[type=file]', large);
    await fillSettings();
    await page.getByRole('button', { name: 'Process' }).click();
    await page
      .locator('.run .hint')
      .getByText(/^(read|link|fit)/)
      .waitFor();
    const started = performance.now();
    await page.getByRole('button', { name: 'Stop' }).click();
    await status('Stopped. Nothing was kept.');
    console.log(`stop to "Stopped" in the page: ${(performance.now() - started).toFixed(0)} ms`);
    expect(await page.locator('#digest').count()).toBe(0);
    await page.setInputFiles('input[type=file]', small);
    await processAndWait();
  });

  it('says what is wrong in plain words', async () => {
    await page.setInputFiles('input[type=file]', small);
    await page.getByLabel('Frame rate').fill('fast');
    await page.getByRole('button', { name: 'Process' }).click();
    await status('The run failed.');
    expect(await page.getByRole('alert').textContent()).toMatch(/rate.*got.*fast.*expected/s);
    await page.setInputFiles('input[type=file]', { name: 'empty.csv', mimeType: 'text/csv', buffer: Buffer.alloc(0) });
    await page.getByLabel('Frame rate').fill('');
    await page.getByRole('button', { name: 'Process' }).click();
    await status('The run failed.');
    expect(await page.getByRole('alert').textContent()).toMatch(/empty\.csv/);
  });

  it('can be used with the keyboard alone', async () => {
    await page.setInputFiles('input[type=file]', small);
    await page.locator('body').press('Tab');
    const reached: string[] = [];
    for (let i = 0; i < 7; i++) {
      reached.push(
        await page.evaluate(() => document.activeElement?.id || document.activeElement?.textContent || 'file'),
      );
      await page.keyboard.press('Tab');
    }
    expect(reached).toEqual([
      'file',
      'field-rate',
      'field-scale',
      'field-bin',
      'field-y-axis',
      'field-threads',
      'Process',
    ]);
    await page.getByLabel('Frame rate').focus();
    await page.keyboard.type('100 Hz');
    await page.keyboard.press('Enter');
    await status('Done.');
  });

  it.each([
    ['light', 1280, 800],
    ['dark', 390, 844],
  ] as const)(
    'has no accessibility fault axe-core knows, and fits (%s, %i x %i)',
    async (colorScheme, width, height) => {
      await page.emulateMedia({ colorScheme });
      await page.setViewportSize({ width, height });
      expect(await violations()).toEqual([]);
      await page.setInputFiles('input[type=file]', small);
      await fillSettings();
      await processAndWait();
      await page.locator('canvas[data-pieces]').waitFor();
      expect(await violations()).toEqual([]);
      await page.getByLabel('Scale').fill('wide');
      await page.getByRole('button', { name: 'Process' }).click();
      await page.getByRole('alert').waitFor();
      expect(await violations()).toEqual([]);
      expect(await page.evaluate(() => document.documentElement.scrollWidth)).toBe(width);
    },
  );
});
