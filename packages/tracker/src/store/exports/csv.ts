import { type CountedSink, type ExportSettings, type ExportTable, type ExportType, pieces } from './table.js';

/**
 * Shortest decimal text that reads back as the same 32-bit number: six to nine digits (nine always do, IEEE 754
 * section 5.12.2).
 */
export function float32Text(value: number): string {
  for (let digits = 6; digits < 9; digits++) {
    const short = Number(value.toPrecision(digits));
    if (Math.fround(short) === value) return String(short);
  }
  return String(Number(value.toPrecision(9)));
}

function cell(value: number, type: ExportType): string {
  if (Number.isNaN(value)) return '';
  return type === 'f32' ? float32Text(value) : String(value);
}

/**
 * CSV after RFC 4180 but with a single line feed: header, comma, decimal point, no quotes needed, an empty cell where
 * there is no figure. 64-bit figures as their shortest exact text, 32-bit ones as theirs.
 */
export async function writeCsv(table: ExportTable, sink: CountedSink, settings: ExportSettings): Promise<void> {
  const encoder = new TextEncoder();
  await sink.write(encoder.encode(`${table.columns.map((column) => column.name).join(',')}\n`));
  for await (const { start, end, values } of pieces(table, settings)) {
    const lines: string[] = [];
    for (let row = 0; row < end - start; row++) {
      let line = '';
      for (let c = 0; c < values.length; c++) {
        line += (c === 0 ? '' : ',') + cell(values[c]![row]!, table.columns[c]!.type);
      }
      lines.push(line);
    }
    await sink.write(encoder.encode(`${lines.join('\n')}\n`));
  }
}
