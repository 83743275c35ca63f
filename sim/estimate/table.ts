/**
 * A plain table, CSV or Parquet, as a source of rows. Works on text and byte ranges: who opens the file is elsewhere.
 *
 * CSV: RFC 4180 with a header row; a column is a number when every cell is one or empty (`NA` and `NaN` count as empty
 * there), else text, where empty is missing.
 */
import { type AsyncBuffer, parquetMetadataAsync, parquetRead, parquetSchema } from 'hyparquet';
import Papa from 'papaparse';
import { InputError } from '../../network/errors.js';
import { type Column, type Frame, type FrameSource, frameSource, numberColumn, textColumn } from './frame.js';

const EMPTY = new Set(['', 'NA', 'NaN', 'nan']);

/** Characters parsed at a time: cells of one piece are let go before the next. */
const PIECE = 4 << 20;

/**
 * Reads a CSV text.
 *
 * Goes over the text twice, to know the kinds and the number of rows before columns are allocated.
 *
 * @throws {InputError} empty-table, duplicate-column, ragged-row, bad-csv
 */
export function csvFrame(text: string, file: string): Frame {
  let header: string[] | undefined;
  let isNumber: boolean[] = [];
  let rows = 0;
  const wrong = (code: string, row: number, problem: string, remedy: string): never => {
    throw new InputError({ code, place: `${file} row ${row}`, problem, remedy });
  };
  eachRow(text, file, (cells, row) => {
    if (header === undefined) {
      header = cells.map((name) => name.trim());
      isNumber = header.map(() => true);
      header.forEach((name, c) => {
        if (name === '') wrong('bad-csv', 1, `column ${c + 1} has no name`, 'name every column in the first row');
        if (header?.indexOf(name) !== c) wrong('duplicate-column', 1, `the column ${name} stands twice`, 'rename one');
      });
      return;
    }
    if (cells.length !== header.length) {
      wrong(
        'ragged-row',
        row,
        `it has ${cells.length} cells, the header ${header.length}`,
        'give every row one cell a column; quote cells that hold commas',
      );
    }
    for (let c = 0; c < cells.length; c++) {
      if (isNumber[c] && Number.isNaN(numeric(cells[c])) && !isEmpty(cells[c])) isNumber[c] = false;
    }
    rows++;
  });
  if (header === undefined || rows === 0) {
    throw new InputError({
      code: 'empty-table',
      place: file,
      problem: 'it has no rows',
      remedy: 'give a table with a header and rows',
    });
  }
  const names: readonly string[] = header;
  const numbers = names.map((_, c) => (isNumber[c] ? new Float64Array(rows) : null));
  const codes = names.map((_, c) => (isNumber[c] ? null : new Int32Array(rows)));
  const known = names.map(() => new Map<string, number>());
  let at = -1;
  eachRow(text, file, (cells) => {
    if (at >= 0) {
      for (let c = 0; c < names.length; c++) {
        const cell = cells[c];
        const number = numbers[c];
        const code = codes[c];
        if (number) number[at] = numeric(cell);
        else if (code) {
          if (cell === '') code[at] = -1;
          else {
            let value = known[c].get(cell);
            if (value === undefined) known[c].set(cell, (value = known[c].size));
            code[at] = value;
          }
        }
      }
    }
    at++;
  });
  const columns = new Map<string, Column>();
  names.forEach((name, c) => {
    const number = numbers[c];
    columns.set(
      name,
      number ? numberColumn(number) : { kind: 'text', codes: codes[c] as Int32Array, levels: [...known[c].keys()] },
    );
  });
  return { rows, columns };
}

// the library's types give pieces to files only; texts have them as well
interface PiecewiseConfig extends Papa.ParseConfig<string[]> {
  readonly chunkSize: number;
  chunk(results: Papa.ParseResult<string[]>): void;
}

function eachRow(text: string, file: string, onRow: (cells: string[], row: number) => void): void {
  let row = 0;
  const config: PiecewiseConfig = {
    delimiter: ',',
    skipEmptyLines: true,
    chunkSize: PIECE,
    chunk({ data, errors }) {
      if (errors.length > 0) {
        throw new InputError({
          code: 'bad-csv',
          place: `${file} row ${row + (errors[0].row ?? 0) + 1}`,
          problem: errors[0].message,
          remedy: 'check the quotes of this row',
        });
      }
      for (const cells of data) onRow(cells, ++row);
    },
  };
  Papa.parse<string[]>(text.charCodeAt(0) === 0xfeff ? text.slice(1) : text, config);
}

/** A cell that counts as missing in a column of numbers. */
function isEmpty(cell: string): boolean {
  return cell.length < 4 && EMPTY.has(cell);
}

/** Numbers as other programs write them, infinity included; NaN for anything else. */
function numeric(cell: string): number {
  const value = Number(cell);
  if (!Number.isNaN(value)) {
    // Number takes blanks for 0 and 0x1F for 31
    if (value === 0 && cell.trim() === '') return NaN;
    const second = cell.charCodeAt(1) | 32;
    return second === 120 || second === 111 || second === 98 ? NaN : value;
  }
  if (/^\s*[+-]?inf(inity)?\s*$/i.test(cell)) return cell.includes('-') ? -Infinity : Infinity;
  return NaN;
}

/**
 * A CSV table as a source.
 *
 * @throws {InputError} as csvFrame
 */
export function csvSource(text: string, file: string): FrameSource {
  return frameSource(csvFrame(text, file), file);
}

/**
 * A Parquet table as a source: only the columns an estimate names are read. Nested columns are left out.
 *
 * @throws {InputError} bad-parquet, empty-table
 */
export async function parquetSource(buffer: AsyncBuffer, file: string): Promise<FrameSource> {
  let metadata: Awaited<ReturnType<typeof parquetMetadataAsync>>;
  try {
    metadata = await parquetMetadataAsync(buffer);
  } catch (error) {
    throw new InputError({
      code: 'bad-parquet',
      place: file,
      problem: `it cannot be read as Parquet (${(error as Error).message})`,
      remedy: 'give a Parquet file, or a CSV file named .csv',
    });
  }
  const rows = Number(metadata.num_rows);
  const kinds = new Map<string, Column['kind']>();
  for (const { element, children } of parquetSchema(metadata).children) {
    if (children.length > 0 || element.repetition_type === 'REPEATED') continue;
    const text = element.type === 'BYTE_ARRAY' || element.type === 'FIXED_LEN_BYTE_ARRAY';
    kinds.set(element.name, text && element.converted_type !== 'DECIMAL' ? 'text' : 'number');
  }
  if (rows === 0 || kinds.size === 0) {
    throw new InputError({
      code: 'empty-table',
      place: file,
      problem: 'it has no rows',
      remedy: 'give a table with rows',
    });
  }
  const readFrame = async (names: readonly string[]): Promise<Frame> => {
    const numbers = new Map<string, Float64Array>();
    const texts = new Map<string, (string | null)[]>();
    for (const name of names) {
      if (kinds.get(name) === 'number') numbers.set(name, new Float64Array(rows).fill(NaN));
      else texts.set(name, new Array<string | null>(rows).fill(null));
    }
    if (names.length > 0) {
      await parquetRead({
        file: buffer,
        metadata,
        columns: [...names],
        onChunk({ columnName, columnData, rowStart }) {
          const number = numbers.get(columnName);
          const text = texts.get(columnName);
          for (let i = 0; i < columnData.length; i++) {
            const v: unknown = columnData[i];
            if (v === null || v === undefined) continue;
            if (number) number[rowStart + i] = Number(v);
            else if (text) text[rowStart + i] = String(v);
          }
        },
      });
    }
    return {
      rows,
      columns: new Map(
        names.map((name): [string, Column] => {
          const number = numbers.get(name);
          return [name, number ? numberColumn(number) : textColumn(texts.get(name) ?? [])];
        }),
      ),
    };
  };
  const dimensions = ['arm', 'replicate'].filter((name) => kinds.has(name));
  const outline = frameSource(await readFrame(dimensions), file);
  return {
    place: file,
    kinds,
    arms: outline.arms,
    replicates: outline.replicates,
    seed: outline.seed,
    async read(names, arms, replicate) {
      const needed = new Set([...names, ...(arms || replicate !== null ? dimensions : [])]);
      return frameSource(await readFrame([...needed]), file).read(names, arms, replicate);
    },
  };
}
