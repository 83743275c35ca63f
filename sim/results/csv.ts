/**
 * CSV (RFC 4180): batches of columns to bytes.
 *
 * UTF-8, lines end in CR LF, cells are quoted only where they must be, an empty cell is nothing. Numbers are
 * written with the fewest digits that read back to the same double (ECMAScript number to string), −0 as `-0`,
 * infinities as `INF` and `-INF` (the spelling of Table Schema). Reading is read-csv.ts.
 */
import { type Batch, type Column, checkBatch, columnsOf, type Field, isCoded, isConstant, type Row } from './field.js';
import type { ByteSink, Store } from './store.js';

const encoder = new TextEncoder();

/** Rows turned into one string before it is encoded: long enough to amortise, short enough to stay in cache. */
const BLOCK = 2048;

/** A text cell, quoted when it holds a comma, a quote or a line break. */
export function textCell(text: string): string {
  return /[",\r\n]/.test(text) ? `"${text.replaceAll('"', '""')}"` : text;
}

/** A number cell; NaN is empty. */
export function numberCell(v: number): string {
  if (v === 0) return 1 / v < 0 ? '-0' : '0';
  if (Number.isNaN(v)) return '';
  if (v === Number.POSITIVE_INFINITY) return 'INF';
  if (v === Number.NEGATIVE_INFINITY) return '-INF';
  return String(v);
}

/** The header line. */
export function csvHeader(fields: readonly Field[]): Uint8Array<ArrayBuffer> {
  return encoder.encode(`${fields.map((field) => textCell(field.name)).join(',')}\r\n`);
}

type CellOf = (i: number) => string;

function cellWriter(column: Column): CellOf {
  if (isConstant(column)) {
    const { value } = column;
    const cell = value === null ? '' : typeof value === 'number' ? numberCell(value) : textCell(value);
    return () => cell;
  }
  if (isCoded(column)) {
    const { codes } = column;
    const cells = column.names.map(textCell);
    return (i) => cells[codes[i]] ?? '';
  }
  if (column instanceof Float64Array) return (i) => numberCell(column[i]);
  return (i) => (column[i] < 0 ? '' : String(column[i]));
}

/**
 * Writes rows, without a header, to a sink.
 *
 * @throws Error when a batch does not fit its fields (a bug)
 */
export function writeCsvRows(sink: ByteSink, fields: readonly Field[], batch: Batch): void {
  checkBatch(fields, batch);
  const cells = batch.columns.map(cellWriter);
  const last = cells.length - 1;
  for (let from = 0; from < batch.rows; from += BLOCK) {
    const to = Math.min(from + BLOCK, batch.rows);
    let text = '';
    for (let i = from; i < to; i++) {
      for (let c = 0; c < last; c++) text += cells[c](i) + ',';
      text += cells[last](i) + '\r\n';
    }
    sink.write(encoder.encode(text));
  }
}

/** Writes a whole table, header and rows. */
export function writeCsvTable(store: Store, file: string, fields: readonly Field[], rows: readonly Row[]): void {
  const batch = columnsOf(fields, rows);
  const sink = store.create(file);
  sink.write(csvHeader(fields));
  writeCsvRows(sink, fields, batch);
  sink.close();
}
