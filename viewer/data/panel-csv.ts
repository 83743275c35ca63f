/**
 * The panel as CSV, for a study that kept it as Parquet: the bytes the command line
 * writes as CSV, read group by group.
 */

import { numberCell, textCell } from '../../sim/results/csv.js';
import { openTable, readRange } from './rows.js';
import type { Source } from './source.js';

/** Rows turned into text at a time. */
const STEP = 20000;

/** @returns the file. Memory: the text of the panel, in pieces. */
export async function panelCsv(source: Source): Promise<Blob> {
  const names = await source.files();
  if (names.includes('panel.csv'))
    return new Blob([(await source.file('panel.csv')) as Uint8Array<ArrayBuffer>], { type: 'text/csv' });
  const bytes = await source.file('panel.parquet');
  const table = await openTable({
    byteLength: bytes.length,
    slice: (start, end) => bytes.slice(start, end).buffer as ArrayBuffer,
  });
  const columns = table.metadata.schema.slice(1);
  const texts = new Set(columns.filter((c) => c.type === 'BYTE_ARRAY').map((c) => c.name));
  const pieces: string[] = [`${columns.map((c) => textCell(c.name)).join(',')}\r\n`];
  let from = 0;
  for (const group of table.metadata.row_groups) {
    const rows = Number(group.num_rows);
    const read = await readRange(
      table,
      from,
      rows,
      columns.map((c) => c.name),
      texts,
    );
    const list = columns.map((c) => read[c.name]);
    for (let start = 0; start < rows; start += STEP) {
      let out = '';
      for (let k = start; k < Math.min(rows, start + STEP); k++) {
        for (let c = 0; c < list.length; c++) {
          const v = list[c];
          if (c > 0) out += ',';
          if (v instanceof Float64Array) out += numberCell(v[k]);
          else out += v.codes[k] < 0 ? '' : textCell(v.names[v.codes[k]]);
        }
        out += '\r\n';
      }
      pieces.push(out);
      // the page stays alive while a large panel is written
      await new Promise((resolve) => setTimeout(resolve, 0));
    }
    from += rows;
  }
  return new Blob(pieces, { type: 'text/csv' });
}
