import type { ByteSource, Hasher } from '../core/bytes.js';
import type { RunContext } from '../core/context.js';
import { WakeloomError } from '../core/errors.js';
import type { DumpSettings } from '../run/settings.js';
import type { ColumnPlan } from './column-plan.js';
import type { DumpTools } from './dump-tools.js';
import type { FileFormat } from './file-kind.js';
import { createRowBatch, ROLE, ROLES } from './row-batch.js';
import { RowLedger } from './row-ledger.js';
import type { TextLayout } from './text-layout.js';

export interface PassOptions {
  /** In reading order. */
  readonly files: readonly ByteSource[];
  readonly settings: DumpSettings;
  readonly tools: DumpTools;
  readonly context: RunContext;
  /** Whether SHA-256 of the files is taken on the way. */
  readonly hashing: boolean;
  /** Distinct times of the dump, ascending: what frames are numbered by where there is no frame column. Borrowed. */
  readonly times?: Float64Array | null;
}

/** One reading of the whole dump from the first file to the last: what is carried from file to file, and the books. */
export class DumpPass {
  readonly files: readonly ByteSource[];
  readonly settings: DumpSettings;
  readonly tools: DumpTools;
  readonly context: RunContext;
  readonly hashing: boolean;
  readonly times: Float64Array | null;
  readonly ledger = new RowLedger();
  readonly batch = createRowBatch();
  readonly oddities = { pathlineNumbers: 0 };
  /** Plain sentences, each once. */
  readonly remarks = new Set<string>();
  /** SHA-256 of each file, hex; empty unless `hashing`. */
  readonly hashes: string[] = [];
  /** Files with nothing in them, and files with a header but no row. */
  readonly emptyFiles: string[] = [];
  readonly headerOnlyFiles: string[] = [];
  /** Whether frames are numbered by times; known once the first file's columns are. */
  framesFromTimes = false;
  format: FileFormat | null = null;
  /** Layout of the first text file that holds something. */
  layout: TextLayout | null = null;
  /** How the columns of the first file were found. */
  columns: Readonly<Record<string, string>> | null = null;
  readonly #starts: number[] = [];
  #shapeFile = '';
  #done = 0;
  #total: number;

  constructor(options: PassOptions) {
    this.files = options.files;
    this.settings = options.settings;
    this.tools = options.tools;
    this.context = options.context;
    this.hashing = options.hashing;
    this.times = options.times ?? null;
    this.#total = options.files.reduce((sum, file) => sum + file.size, 0);
  }

  /** Books the start of the next file. */
  beginFile(): void {
    this.#starts.push(this.ledger.rowsPresent);
  }

  /** Name of the file that holds a data row. */
  readonly fileOf = (row: number): string => {
    let low = 0;
    let high = this.#starts.length;
    while (high - low > 1) {
      const middle = (low + high) >> 1;
      if (this.#starts[middle] <= row) low = middle;
      else high = middle;
    }
    return this.files[low]?.name ?? '';
  };

  /** Books bytes read from disk and tells the listener. */
  readonly advance = (bytes: number): void => {
    this.#done += bytes;
    this.context.progress('read', Math.min(this.#done, this.#total), this.#total, 'bytes');
  };

  /** More to read than the files' sizes: formats that are hashed apart from being read. */
  expect(bytes: number): void {
    this.#total += bytes;
  }

  /** The hasher for a file read in one stream, or null in a pass without hashing. */
  startHash(): Hasher | null {
    return this.hashing ? this.tools.hasher() : null;
  }

  endHash(hasher: Hasher | null): void {
    if (hasher !== null) this.hashes.push(hasher.hex());
  }

  /**
   * Takes the columns of the next file; all files of a dump carry the same ones.
   * Throws `dump/files-differ`.
   */
  agreeColumns(file: string, plan: ColumnPlan): void {
    const used = this.batch.used;
    const framed = this.settings.layout !== 'one-file-a-run' || plan.framesFromTimes;
    const now = ROLES.map((_, role) => (plan.index[role] >= 0 || (framed && role === ROLE.frame) ? 1 : 0));
    if (this.columns === null) {
      this.columns = plan.described;
      this.framesFromTimes = plan.framesFromTimes;
      this.#shapeFile = file;
      used.set(now);
      return;
    }
    const differs = ROLES.find((_, role) => now[role] !== used[role]);
    if (differs === undefined) return;
    const has = used[ROLES.indexOf(differs)] === 1;
    throw new WakeloomError(
      'dump/files-differ',
      `files of one dump differ: got ${has ? 'no' : 'a'} column for ${differs} in ${file}, expected the columns of ${this.#shapeFile}; name the columns, or give null for one that only some files have`,
      { file, other: this.#shapeFile, role: differs },
    );
  }

  /** Takes the format of the next file. Throws `dump/files-differ`. */
  agreeFormat(file: string, format: FileFormat): void {
    this.format ??= format;
    if (this.format === format) return;
    throw new WakeloomError(
      'dump/files-differ',
      `files of one dump differ: got ${format} in ${file}, expected ${this.format} as in ${this.files[0].name}`,
      { file, format },
    );
  }
}
