import { computed, signal } from '@preact/signals';
import { toPlainError } from '@wakeloom/tracker/core/errors';
import { naturalOrder } from '@wakeloom/tracker/detections/file-order';
import type { RunRecord } from '@wakeloom/tracker/store/run-record';
import type { PathlinePreview } from '@wakeloom/tracker/workers/operation-table';
import { filledOptions, SETTING_FIELDS } from './setting-fields.js';
import { StoreZip } from './store-zip.js';
import type { TrackerService } from './tracker-service.js';

/** What the page is at. */
export type Phase = 'ready' | 'working' | 'stopping' | 'done' | 'failed' | 'stopped';

/** Where the run is: `total` null where it cannot be known. */
export interface Progress {
  readonly stage: string;
  readonly done: number;
  readonly total: number | null;
  readonly unit: string;
}

/** A finished run as the page shows it. */
export interface ShownResult {
  readonly record: RunRecord;
  /** Null when the run kept no pathlines. */
  readonly preview: PathlinePreview | null;
  readonly files: readonly { readonly name: string; readonly bytes: number }[];
}

/** Samples drawn at most; a software renderer draws this many in about a second. */
const PREVIEW_SAMPLES = 200_000;

/** Working memory given to a run in the page, bytes. */
const RUN_BYTES = 256 * 1024 * 1024;

/** What tells a run sheet from a dump. */
const SHEET_NAME = /\.ya?ml$/i;

/** No run sheet is longer; a dump under a wrong name would be read whole. */
const MOST_SHEET_BYTES = 1_000_000;

/** All state of the page as signals, and what may be done to it. */
export function createAppState(tracker: TrackerService) {
  const files = signal<readonly File[]>([]);
  const sheet = signal<File | null>(null);
  const options = signal<Readonly<Record<string, string>>>(
    Object.fromEntries(SETTING_FIELDS.map((field) => [field.option, field.start])),
  );
  const threads = signal(Math.max(1, Math.min(4, (navigator.hardwareConcurrency || 2) - 1)));
  const phase = signal<Phase>('ready');
  const progress = signal<Progress | null>(null);
  const failure = signal<string | null>(null);
  const result = signal<ShownResult | null>(null);
  const busy = computed(() => phase.value === 'working' || phase.value === 'stopping');
  let stop = new AbortController();

  function chooseFiles(chosen: Iterable<File>): void {
    if (busy.value) return;
    // What is picked or dropped comes in no order of its own; the tracker reads files in the order given.
    const list = [...chosen].sort((a, b) => naturalOrder(a.name, b.name));
    if (list.length === 0) return;
    const sheets = list.filter((file) => SHEET_NAME.test(file.name));
    const dump = list.filter((file) => !SHEET_NAME.test(file.name));
    if (sheets.length > 1) {
      failure.value = `run sheet: got ${sheets.map((file) => file.name).join(', ')}, expected one`;
      return;
    }
    // A sheet alone joins the dump that is there, and a new dump keeps the sheet that is shown beside it.
    if (dump.length > 0) files.value = dump;
    if (sheets.length === 1) sheet.value = sheets[0];
    phase.value = 'ready';
    failure.value = null;
  }

  async function process(): Promise<void> {
    if (busy.value || files.value.length === 0) return;
    phase.value = 'working';
    failure.value = null;
    result.value = null;
    progress.value = null;
    stop = new AbortController();
    const { signal } = stop;
    try {
      const client = tracker();
      const dump = files.value;
      const resolved = await client.run(
        'resolve',
        {
          options: filledOptions(options.value),
          dumpFiles: dump.map((file) => file.name),
          sheet: sheet.value === null ? null : { name: sheet.value.name, text: await sheetText(sheet.value) },
        },
        { signal },
      );
      const record = await client.run(
        'process',
        {
          request: { resolved, programVersion: __WAKELOOM_VERSION__ },
          sources: dump.map((file) => ({ kind: 'blob', blob: file, name: file.name })),
          out: 'result',
        },
        {
          signal,
          threads: threads.value,
          bytes: RUN_BYTES,
          seed: resolved.settings.seed,
          onProgress: (stage, done, total, unit) => {
            progress.value = { stage, done, total, unit };
          },
        },
      );
      const kept = resolved.settings.results.keepPathlines !== 'none';
      const preview = kept ? await client.run('preview', { most: PREVIEW_SAMPLES }, { signal }) : null;
      result.value = { record, preview, files: await client.run('files', null, { signal }) };
      phase.value = 'done';
    } catch (error) {
      const plain = toPlainError(error);
      if (plain.code === 'run/aborted') {
        phase.value = 'stopped';
        return;
      }
      failure.value = plain.message;
      phase.value = 'failed';
    }
  }

  function abort(): void {
    if (phase.value !== 'working') return;
    phase.value = 'stopping';
    stop.abort();
  }

  /** Hands a file of the result to the browser's downloads. */
  async function save(name: string): Promise<void> {
    try {
      hand(name, [await tracker().run('file', { name })]);
    } catch (error) {
      failure.value = toPlainError(error).message;
    }
  }

  /** Hands all files of the result to the browser's downloads as one archive. */
  async function saveAll({ record, files }: ShownResult): Promise<void> {
    try {
      const zip = new StoreZip(new Date(record.clockTimes.finished));
      for (const { name } of files) zip.add(name, await tracker().run('file', { name }));
      hand(`${fileName(record.run)}.zip`, zip.finish());
    } catch (error) {
      failure.value = toPlainError(error).message;
    }
  }

  function dropSheet(): void {
    if (!busy.value) sheet.value = null;
  }

  return {
    files,
    sheet,
    dropSheet,
    saveAll,
    options,
    threads,
    phase,
    progress,
    failure,
    result,
    busy,
    chooseFiles,
    process,
    abort,
    save,
  };
}

/** Gives bytes to the browser's downloads. */
function hand(name: string, parts: readonly Uint8Array<ArrayBuffer>[]): void {
  const address = URL.createObjectURL(new Blob([...parts]));
  const link = document.createElement('a');
  link.href = address;
  link.download = name;
  link.click();
  // The download has been handed over once the click has returned; a moment's grace costs nothing.
  setTimeout(() => URL.revokeObjectURL(address), 10_000);
}

async function sheetText(sheet: File): Promise<string> {
  if (sheet.size <= MOST_SHEET_BYTES) return sheet.text();
  throw new Error(`run sheet ${sheet.name}: got ${sheet.size} bytes, expected at most ${MOST_SHEET_BYTES}`);
}

/** The name of a run as a file's name: letters and digits, else a dash. */
function fileName(run: string): string {
  return run.replace(/[^\p{L}\p{N}._-]+/gu, '-').replace(/^[-.]+|[-.]+$/g, '') || 'result';
}

export type AppState = ReturnType<typeof createAppState>;
