/**
 * Columns of result tables: what a column is (its field) and what it holds (its values).
 *
 * One convention for an empty cell in memory: NaN in numbers, a negative integer in integers and flags, a code
 * past the names or of an empty name in text. In files an empty cell is a null (Parquet) or nothing between commas (CSV). Knows
 * nothing of households or files.
 */

/** `flag` is an integer 0 or 1. */
export type FieldType = 'integer' | 'number' | 'text' | 'flag';

/** A column as it is described to readers. */
export interface Field {
  readonly name: string;
  readonly type: FieldType;
  /** Unit of measurement, or '' for labels, shares and indices. */
  readonly unit: string;
  /** What it says, in a sentence. */
  readonly meaning: string;
  /** How it is computed, or where it comes from. */
  readonly formula: string;
  /** When it is empty, or null when it never is. */
  readonly missing: string | null;
}

/** Text by number: row i reads `names[codes[i]]`; a code past the names, or of an empty name, is an empty cell. */
export interface Coded {
  readonly codes: Uint8Array | Uint16Array | Uint32Array;
  readonly names: readonly string[];
}

/** The same value in every row; null = empty in every row. */
export interface Constant {
  readonly value: number | string | null;
}

/** Values of a column: numbers (Float64Array), integers and flags (the others), text, or one value throughout. */
export type Column = Float64Array | Int32Array | Uint32Array | Uint8Array | Coded | Constant;

/** A cell as read or as handed in for a small table; undefined, null and NaN are empty. */
export type Cell = number | string | null | undefined;

/** A row of a small table, by column name; a column left out is empty. */
export type Row = Readonly<Record<string, Cell>>;

/** Columns of a table, or of a piece of one, in the order of its fields. */
export interface Batch {
  readonly rows: number;
  readonly columns: readonly Column[];
}

export function isCoded(column: Column): column is Coded {
  return 'codes' in column;
}

export function isConstant(column: Column): column is Constant {
  return !ArrayBuffer.isView(column) && 'value' in column;
}

/** Value of row i, null when empty. For reading a few cells: encoders have their own loops. */
export function cellAt(column: Column, i: number): number | string | null {
  if (isConstant(column)) return column.value === '' ? null : column.value;
  // an empty text is an empty cell: CSV could not tell them apart
  if (isCoded(column)) return column.names[column.codes[i]] || null;
  const v = column[i];
  if (column instanceof Float64Array) return Number.isNaN(v) ? null : v;
  return v < 0 ? null : v;
}

/**
 * Columns of a small table from its rows.
 *
 * @param fields - columns, in order
 * @param rows - cells by column name
 * @returns typed columns. Cost O(rows × fields).
 * @throws Error when a row has a column the fields do not, an integer is not one, or a cell is of the wrong type (a bug)
 */
export function columnsOf(fields: readonly Field[], rows: readonly Row[]): Batch {
  const known = new Set(fields.map((field) => field.name));
  for (const row of rows) {
    for (const name of Object.keys(row)) {
      if (!known.has(name)) throw new Error(`no column ${name} in the table (${[...known].join(', ')})`);
    }
  }
  return { rows: rows.length, columns: fields.map((field) => columnOf(field, rows)) };
}

function columnOf(field: Field, rows: readonly Row[]): Column {
  const { name } = field;
  if (field.type === 'text') {
    const names: string[] = [];
    const code = new Map<string, number>();
    const codes = new Uint32Array(rows.length).fill(EMPTY_CODE);
    rows.forEach((row, i) => {
      const cell = row[name];
      if (cell === null || cell === undefined || cell === '') return;
      const text = String(cell);
      let at = code.get(text);
      if (at === undefined) {
        at = names.length;
        names.push(text);
        code.set(text, at);
      }
      codes[i] = at;
    });
    return { codes, names };
  }
  const out = field.type === 'number' ? new Float64Array(rows.length) : new Int32Array(rows.length);
  const empty = field.type === 'number' ? Number.NaN : -1;
  for (let i = 0; i < rows.length; i++) {
    const cell = rows[i][name];
    if (cell === null || cell === undefined || Number.isNaN(cell)) out[i] = empty;
    else if (typeof cell !== 'number') throw new Error(`${name} must be a number, got ${JSON.stringify(cell)}`);
    else if (field.type !== 'number' && !(Number.isInteger(cell) && cell >= 0 && cell <= 0x7fffffff)) {
      throw new Error(`${name} must be an integer from 0 to 2147483647, got ${cell}`);
    } else out[i] = cell;
  }
  return out;
}

/** Code of an empty cell in text columns made here. */
export const EMPTY_CODE = 0xffffffff;

/**
 * Row of the first empty cell in a column, or −1: a column whose field says it is never empty must have none.
 */
export function firstEmpty(column: Column, rows: number): number {
  if (isConstant(column)) return (column.value === null || column.value === '') && rows > 0 ? 0 : -1;
  if (isCoded(column)) {
    const { codes, names } = column;
    for (let i = 0; i < rows; i++) if (!names[codes[i]]) return i;
    return -1;
  }
  if (column instanceof Float64Array) {
    for (let i = 0; i < rows; i++) if (Number.isNaN(column[i])) return i;
    return -1;
  }
  if (column instanceof Int32Array) {
    for (let i = 0; i < rows; i++) if (column[i] < 0) return i;
  }
  return -1;
}

/** Checks a batch against its fields: lengths, and no empty cell where a field says there is none (a bug if so). */
export function checkBatch(fields: readonly Field[], batch: Batch): void {
  if (batch.columns.length !== fields.length) {
    throw new Error(`a batch of ${batch.columns.length} columns for a table of ${fields.length}`);
  }
  for (let c = 0; c < fields.length; c++) {
    const column = batch.columns[c];
    const length = isConstant(column) ? batch.rows : isCoded(column) ? column.codes.length : column.length;
    if (length !== batch.rows)
      throw new Error(`${fields[c].name} has ${length} values in a batch of ${batch.rows} rows`);
    if (fields[c].missing === null) {
      const at = firstEmpty(column, batch.rows);
      if (at >= 0) throw new Error(`${fields[c].name} is never empty, yet has no value in row ${at} of its batch`);
    }
  }
}
