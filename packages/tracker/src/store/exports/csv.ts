import { type CountedSink, type ExportSettings, type ExportTable, type ExportType, pieces } from './table.js';

/** Powers of ten that a 64-bit number holds exactly. */
const TEN = Float64Array.from({ length: 23 }, (_, k) => Number(`1e${k}`));
/** Sizes for which the quick way below stays within those powers. */
const QUICK_LEAST = 1e-9;
const QUICK_MOST = 1e9;

/**
 * Short decimal text that reads back as the same 32-bit number: the first of seven, eight, nine digits that does
 * (nine always do, IEEE 754 section 5.12.2), without trailing zeros. Quick way: a whole number below 10^9 over an exact power of ten is rounded once, exactly as a
 * reader of the text rounds it. About 0.2 us a figure.
 */
export function float32Text(value: number): string {
  const size = Math.abs(value);
  if (size >= QUICK_LEAST && size < QUICK_MOST) {
    // Digits before the decimal point, or minus the zeros after it.
    let whole = 0;
    while (whole < 9 && size >= TEN[whole]!) whole++;
    while (whole > -9 && size * TEN[1 - whole]! < 1) whole--;
    for (let digits = 7; digits <= 9; digits++) {
      const power = TEN[digits - whole]!;
      const short = Math.round(value * power) / power;
      if (Math.fround(short) === value) return String(short);
    }
  }
  for (let digits = 7; digits < 9; digits++) {
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
 * there is no figure. 64-bit figures as their shortest exact text, 32-bit ones as `float32Text`.
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
