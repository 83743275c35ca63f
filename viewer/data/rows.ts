/**
 * Rows of one arm and replicate out of a Parquet table, reading only the row groups that hold them.
 *
 * Row groups are found by the least and largest value their footers state. Knows Parquet, not households.
 */
import { type AsyncBuffer, type FileMetaData, parquetMetadataAsync, parquetRead, type RowGroup } from 'hyparquet';

/** A Parquet file whose footer has been read. */
export interface OpenTable {
  readonly file: AsyncBuffer;
  readonly metadata: FileMetaData;
  readonly names: ReadonlySet<string>;
}

/** A row group with its first row. */
export interface Group {
  readonly from: number;
  readonly rows: number;
  readonly group: RowGroup;
}

export async function openTable(file: AsyncBuffer): Promise<OpenTable> {
  const metadata = await parquetMetadataAsync(file);
  const names = new Set(metadata.schema.slice(1).map((field) => field.name));
  return { file, metadata, names };
}

/** Least and largest value of a column in a row group, as its footer states them, or null. */
export function bounds(group: RowGroup, name: string): readonly [unknown, unknown] | null {
  const found = group.columns.find((column) => column.meta_data?.path_in_schema[0] === name)?.meta_data?.statistics;
  const low = found?.min_value ?? found?.min;
  const high = found?.max_value ?? found?.max;
  return low === undefined || high === undefined ? null : [low, high];
}

/** Row groups that may hold rows of the arm and replicate, in file order. */
export function groupsFor(table: OpenTable, arm: string, replicate: number): Group[] {
  const out: Group[] = [];
  let from = 0;
  for (const group of table.metadata.row_groups) {
    const rows = Number(group.num_rows);
    const a = bounds(group, 'arm');
    const r = bounds(group, 'replicate');
    const holds =
      (a === null || (String(a[0]) <= arm && arm <= String(a[1]))) &&
      (r === null || (Number(r[0]) <= replicate && replicate <= Number(r[1])));
    if (holds) out.push({ from, rows, group });
    from += rows;
  }
  return out;
}

/** A column as read: numbers with NaN where empty, or text by number with −1 where empty. */
export type Values = Float64Array | { readonly codes: Int32Array; readonly names: readonly string[] };

/**
 * Columns of a range of rows. Only the pages of these columns are fetched.
 *
 * @param texts - which of the columns hold text
 */
export async function readRange(
  table: OpenTable,
  from: number,
  rows: number,
  columns: readonly string[],
  texts: ReadonlySet<string>,
): Promise<Record<string, Values>> {
  const out: Record<string, Values> = {};
  const index: Record<string, Map<string, number>> = {};
  for (const name of columns) {
    if (texts.has(name)) {
      index[name] = new Map();
      out[name] = { codes: new Int32Array(rows).fill(-1), names: [] };
    } else out[name] = new Float64Array(rows).fill(NaN);
  }
  if (rows === 0) return out;
  await parquetRead({
    file: table.file,
    metadata: table.metadata,
    columns: [...columns],
    rowStart: from,
    rowEnd: from + rows,
    onChunk: ({ columnName, columnData, rowStart }) => {
      const to = out[columnName];
      if (to === undefined) return;
      const first = Math.max(0, from - rowStart);
      const last = Math.min(columnData.length, from + rows - rowStart);
      const at = rowStart - from;
      if (to instanceof Float64Array) {
        if (
          ArrayBuffer.isView(columnData) &&
          !(columnData instanceof BigInt64Array) &&
          !(columnData instanceof BigUint64Array)
        ) {
          to.set((columnData as Float64Array).subarray(first, last), first + at);
          return;
        }
        for (let k = first; k < last; k++) {
          const v: unknown = columnData[k];
          to[k + at] = v === null || v === undefined ? NaN : Number(v);
        }
        return;
      }
      const codes = index[columnName];
      for (let k = first; k < last; k++) {
        const v: unknown = columnData[k];
        if (v === null || v === undefined) continue;
        const text = String(v);
        let code = codes.get(text);
        if (code === undefined) codes.set(text, (code = codes.size));
        to.codes[k + at] = code;
      }
    },
  });
  for (const name of columns) {
    const values = out[name];
    if (!(values instanceof Float64Array)) out[name] = { codes: values.codes, names: [...index[name].keys()] };
  }
  return out;
}

/** Columns of all rows of an arm and replicate, whatever the row groups they share with others. */
export async function readRows(
  table: OpenTable,
  arm: string,
  replicate: number,
  columns: readonly string[],
  texts: ReadonlySet<string>,
): Promise<{ rows: number; columns: Record<string, Values> }> {
  const groups = groupsFor(table, arm, replicate);
  const pieces: { keep: Uint32Array; columns: Record<string, Values> }[] = [];
  let rows = 0;
  for (const { from, rows: count, group } of groups) {
    const a = bounds(group, 'arm');
    const r = bounds(group, 'replicate');
    const pure = a !== null && r !== null && a[0] === a[1] && Number(r[0]) === Number(r[1]);
    const wanted = pure ? columns : [...new Set([...columns, 'arm', 'replicate'])];
    const read = await readRange(table, from, count, wanted, new Set([...texts, 'arm']));
    let keep: Uint32Array;
    if (pure) keep = Uint32Array.from({ length: count }, (_, k) => k);
    else {
      const armColumn = read.arm as { codes: Int32Array; names: readonly string[] };
      const code = armColumn.names.indexOf(arm);
      const rep = read.replicate as Float64Array;
      const list: number[] = [];
      for (let k = 0; k < count; k++) if (armColumn.codes[k] === code && rep[k] === replicate) list.push(k);
      keep = Uint32Array.from(list);
    }
    pieces.push({ keep, columns: read });
    rows += keep.length;
  }
  const out: Record<string, Values> = {};
  for (const name of columns) {
    if (texts.has(name)) {
      const codes = new Int32Array(rows);
      const index = new Map<string, number>();
      let at = 0;
      for (const { keep, columns: read } of pieces) {
        const part = read[name] as { codes: Int32Array; names: readonly string[] };
        for (const k of keep) {
          const text = part.names[part.codes[k]];
          if (text === undefined) codes[at++] = -1;
          else {
            let code = index.get(text);
            if (code === undefined) index.set(text, (code = index.size));
            codes[at++] = code;
          }
        }
      }
      out[name] = { codes, names: [...index.keys()] };
    } else {
      const values = new Float64Array(rows);
      let at = 0;
      for (const { keep, columns: read } of pieces) {
        const part = read[name] as Float64Array;
        for (const k of keep) values[at++] = part[k];
      }
      out[name] = values;
    }
  }
  return { rows, columns: out };
}
