import { createReadStream } from 'node:fs';

/** Chosen columns of an exported CSV file by name; NaN where a cell is empty. */
export interface Table {
  readonly names: readonly string[];
  readonly rows: number;
  readonly column: Readonly<Record<string, Float64Array>>;
}

/** Reads an exported CSV as a person's script would: header, then one row a line, commas between. */
export async function readTable(path: string, wanted: readonly string[]): Promise<Table> {
  let names: string[] = [];
  let places: number[] = [];
  const values = wanted.map((): number[] => []);
  const take = (line: string) => {
    const cells = line.split(',');
    if (names.length === 0) {
      names = cells;
      places = wanted.map((name) => names.indexOf(name));
      const missing = wanted.filter((_, c) => places[c] < 0);
      if (missing.length > 0) throw new Error(`${path}: no column ${missing.join(', ')} in "${line}"`);
      return;
    }
    if (cells.length !== names.length) throw new Error(`${path}: ${cells.length} cells in "${line}"`);
    for (let c = 0; c < places.length; c++) {
      const cell = cells[places[c]];
      values[c].push(cell === '' ? Number.NaN : Number(cell));
    }
  };
  let rest = '';
  for await (const text of createReadStream(path, { encoding: 'utf8', highWaterMark: 1 << 20 })) {
    const lines = (rest + text).split('\n');
    rest = lines.pop()!;
    for (const line of lines) take(line);
  }
  if (rest !== '') throw new Error(`${path}: the last line has no end: "${rest}"`);
  const column = Object.fromEntries(wanted.map((name, c) => [name, Float64Array.from(values[c])]));
  return { names, rows: values[0]?.length ?? 0, column };
}
