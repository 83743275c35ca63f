/**
 * Parquet files with the same columns put end to end without decoding them: row groups are copied byte for
 * byte and a new footer points at where they now are.
 *
 * Needs files as parquet.ts writes them: nothing but row groups between the magic number and the footer (no page
 * indexes or bloom filters, whose places would be lost). Format: Apache Parquet, file layout and FileMetaData.
 */
import { type FileMetaData, parquetMetadata } from 'hyparquet';
import { writeMetadata } from 'hyparquet-writer/src/metadata.js';
import type { Field } from './field.js';
import { CREATED_BY, parquetSchema, sinkWriter } from './parquet.js';
import { type ByteSink, copyRange, type Store } from './store.js';

/** `PAR1`, little endian: first and last four bytes of every Parquet file. */
const MAGIC = 0x31524150;

type WrittenMetadata = Parameters<typeof writeMetadata>[1];

/** Footer of a Parquet file and where its row groups end. */
function footerOf(store: Store, name: string): { metadata: FileMetaData; end: number } {
  const size = store.size(name);
  if (size === null || size < 12) throw new Error(`${name} is not a whole Parquet file`);
  const tail = new DataView(store.read(name, size - 8, size).buffer);
  if (tail.getUint32(4, true) !== MAGIC) throw new Error(`${name} is not a whole Parquet file`);
  const end = size - 8 - tail.getUint32(0, true);
  if (end < 4) throw new Error(`${name} is not a whole Parquet file`);
  return { metadata: parquetMetadata(store.read(name, end, size).buffer), end };
}

/**
 * Writes one Parquet file out of several.
 *
 * @param store - where the parts are
 * @param parts - names of files with exactly the columns `fields`, in the order their rows shall have
 * @param sink - takes the merged file; closed at the end
 * @returns rows. Memory: footers only, and a few megabytes of the part being copied.
 * @throws Error when a part is not whole or has other columns (a bug: parts are committed whole)
 */
export function mergeParquet(store: Store, parts: readonly string[], fields: readonly Field[], sink: ByteSink): number {
  const writer = sinkWriter(sink);
  writer.appendUint32(MAGIC);
  writer.flush();
  let offset = 4;
  let rows = 0n;
  const groups: FileMetaData['row_groups'] = [];
  for (const name of parts) {
    const { metadata, end } = footerOf(store, name);
    const names = metadata.schema.slice(1).map((element) => element.name);
    if (names.length !== fields.length || names.some((column, c) => column !== fields[c].name)) {
      throw new Error(`${name} has columns ${names.join(', ')}, not those of the table`);
    }
    const shift = BigInt(offset - 4);
    for (const group of metadata.row_groups) {
      for (const column of group.columns) {
        column.file_offset += shift;
        const at = column.meta_data;
        if (at === undefined) throw new Error(`${name} has a column without metadata`);
        at.data_page_offset += shift;
        if (at.dictionary_page_offset !== undefined) at.dictionary_page_offset += shift;
      }
      groups.push(group);
    }
    copyRange(store, name, 4, end, sink);
    offset += end - 4;
    rows += metadata.num_rows;
  }
  writer.offset = offset;
  const metadata = {
    version: 2,
    created_by: CREATED_BY,
    schema: parquetSchema(fields),
    num_rows: rows,
    row_groups: groups,
  };
  // the length is computed by the writer, and the reader's row groups are the writer's under a newer version's types
  writeMetadata(writer, metadata as unknown as WrittenMetadata, Number.POSITIVE_INFINITY);
  writer.appendUint32(MAGIC);
  writer.flush();
  sink.close();
  return Number(rows);
}
