/**
 * Parquet: batches of columns to row groups.
 *
 * Numbers are DOUBLE, integers and flags INT32, text UTF8 with a dictionary; an empty cell is a null. Snappy
 * compression, with minimum and maximum of every column in every row group so that readers can skip groups.
 * Only plain and dictionary encodings are used: every reader knows them. Merging files is merge.ts.
 */
import type { DecodedArray } from 'hyparquet';
import { ByteWriter, ParquetWriter } from 'hyparquet-writer';
import { type Batch, type Column, checkBatch, type Field, isCoded, isConstant } from './field.js';
import type { ByteSink } from './store.js';

/** Recorded in the footer. */
export const CREATED_BY = 'rungsight';

/** The writing library's schema; its own copy of the reading library may be another version than ours. */
export type WriterSchema = ConstructorParameters<typeof ParquetWriter>[0]['schema'];

/** Parquet schema of a table: columns that may be empty are optional, the others required. */
export function parquetSchema(fields: readonly Field[]): WriterSchema {
  const columns = fields.map((field): WriterSchema[number] => {
    const repetition_type = field.missing === null ? 'REQUIRED' : 'OPTIONAL';
    if (field.type === 'number') return { name: field.name, type: 'DOUBLE', repetition_type };
    if (field.type === 'text') {
      return {
        name: field.name,
        type: 'BYTE_ARRAY',
        repetition_type,
        converted_type: 'UTF8',
        logical_type: { type: 'STRING' },
      };
    }
    return { name: field.name, type: 'INT32', repetition_type };
  });
  return [{ name: 'schema', num_children: columns.length }, ...columns];
}

/** A writer whose bytes go on to a sink whenever a row group is done. */
export function sinkWriter(sink: ByteSink): ByteWriter & { flush(): void } {
  const writer = new ByteWriter(1 << 16);
  return Object.assign(writer, {
    flush(): void {
      sink.write(writer.getBytes());
      writer.index = 0;
    },
  });
}

/** Values as the library wants them: typed arrays, or plain arrays with null where a cell is empty. */
function parquetValues(field: Field, column: Column, rows: number): DecodedArray {
  if (isConstant(column)) {
    if (field.type === 'text' || column.value === null)
      return new Array(rows).fill(column.value === '' ? null : column.value);
    const values = field.type === 'number' ? new Float64Array(rows) : new Int32Array(rows);
    return values.fill(column.value as number);
  }
  if (isCoded(column)) {
    const { codes, names } = column;
    const out = new Array<string | null>(rows);
    for (let i = 0; i < rows; i++) out[i] = names[codes[i]] || null;
    return out;
  }
  if (column instanceof Float64Array) {
    for (let i = 0; i < rows; i++) if (Number.isNaN(column[i])) return withNulls(column, rows);
    return column;
  }
  if (column instanceof Int32Array) {
    for (let i = 0; i < rows; i++) {
      if (column[i] < 0) {
        const out = new Array<number | null>(rows);
        for (let j = 0; j < rows; j++) out[j] = column[j] < 0 ? null : column[j];
        return out;
      }
    }
    return column;
  }
  return Int32Array.from(column);
}

/** True when a text has any value: an all-empty column has no dictionary. */
function hasText(data: DecodedArray): boolean {
  for (const value of data) if (value !== null) return true;
  return false;
}

function withNulls(column: Float64Array, rows: number): (number | null)[] {
  const out = new Array<number | null>(rows);
  for (let i = 0; i < rows; i++) {
    const v = column[i];
    out[i] = Number.isNaN(v) ? null : v;
  }
  return out;
}

/** A dictionary keyed by value takes −0 and 0 for one: columns that hold −0 must be written plainly. */
function holdsNegativeZero(column: Column, rows: number): boolean {
  if (isConstant(column)) return Object.is(column.value, -0);
  if (!(column instanceof Float64Array)) return false;
  for (let i = 0; i < rows; i++) if (column[i] === 0 && 1 / column[i] < 0) return true;
  return false;
}

/** One Parquet file, written row group by row group. */
export class ParquetTable {
  readonly #fields: readonly Field[];
  readonly #sink: ByteSink;
  readonly #parquet: ParquetWriter;

  constructor(sink: ByteSink, fields: readonly Field[]) {
    this.#fields = fields;
    this.#sink = sink;
    const writer = sinkWriter(sink);
    writer.finish = () => writer.flush();
    this.#parquet = new ParquetWriter({
      writer,
      schema: parquetSchema(fields),
      codec: 'SNAPPY',
      createdBy: CREATED_BY,
      // whole texts: a reader finds an arm's row groups by equality with its name
      statisticsTruncateLength: Number.POSITIVE_INFINITY,
    });
  }

  /**
   * Writes one row group; none when the batch has no rows.
   *
   * @throws Error when the batch does not fit the fields (a bug)
   */
  add(batch: Batch): void {
    checkBatch(this.#fields, batch);
    if (batch.rows === 0) return;
    const columnData = this.#fields.map((field, c) => {
      const data = parquetValues(field, batch.columns[c], batch.rows);
      // page offsets would live outside the row group and be lost in a raw copy; row groups are small enough
      const base = { name: field.name, data, offsetIndex: false };
      if (field.type === 'text' && hasText(data)) return { ...base, encoding: 'RLE_DICTIONARY' as const };
      return holdsNegativeZero(batch.columns[c], batch.rows) ? { ...base, encoding: 'PLAIN' as const } : base;
    });
    this.#parquet.write({ columnData, rowGroupSize: batch.rows });
  }

  /** Writes the footer; the file is whole. */
  close(): void {
    this.#parquet.finish();
    this.#sink.close();
  }
}
