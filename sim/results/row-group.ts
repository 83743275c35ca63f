/**
 * Gathers generations of the panel until they fill a row group.
 *
 * Holds at most one row group of rows (65,536, or one generation when that is more): the panel itself is never
 * in memory.
 */
import { type Batch, type Column, EMPTY_CODE, type Field, isCoded, isConstant } from './field.js';

/** Rows of a full row group, when generations are smaller. */
export const ROW_GROUP = 65536;

/** Copies batches one after another into columns of its own. */
export class RowGroupBuffer {
  readonly #fields: readonly Field[];
  readonly #values: (Float64Array | Int32Array | Uint32Array)[];
  /** Names of text columns so far, with their codes. */
  readonly #names: (Map<string, number> | null)[];
  readonly #capacity: number;
  #rows = 0;

  /** @param rowsPerBatch - rows of every batch; as many whole batches as fit a row group are taken, at least one */
  constructor(fields: readonly Field[], rowsPerBatch: number) {
    this.#fields = fields;
    this.#capacity = rowsPerBatch * Math.max(1, Math.floor(ROW_GROUP / Math.max(1, rowsPerBatch)));
    this.#values = fields.map((field) => {
      if (field.type === 'number') return new Float64Array(this.#capacity);
      return field.type === 'text' ? new Uint32Array(this.#capacity) : new Int32Array(this.#capacity);
    });
    this.#names = fields.map((field) => (field.type === 'text' ? new Map() : null));
  }

  get rows(): number {
    return this.#rows;
  }

  /** True when another batch would not fit. */
  get full(): boolean {
    return this.#rows >= this.#capacity;
  }

  /**
   * Appends the rows of one generation.
   *
   * @param pick - rows to take of each column, or null for all
   */
  add(columns: readonly Column[], rows: number, pick: Uint32Array | null): void {
    const at = this.#rows;
    if (at + rows > this.#capacity) throw new Error('a row group was asked to hold more than it has room for');
    for (let c = 0; c < columns.length; c++) {
      const column = columns[c];
      const to = this.#values[c];
      const names = this.#names[c];
      if (names !== null) addText(column, to as Uint32Array, at, rows, pick, names);
      else if (isConstant(column)) {
        const empty = this.#fields[c].type === 'number' ? Number.NaN : -1;
        to.fill(column.value === null ? empty : (column.value as number), at, at + rows);
      } else if (isCoded(column)) throw new Error(`${this.#fields[c].name} holds text, not numbers`);
      else if (pick === null) {
        if (column.length !== rows) throw new Error(`${this.#fields[c].name} has ${column.length} values, not ${rows}`);
        to.set(column, at);
      } else for (let i = 0; i < rows; i++) to[at + i] = column[pick[i]];
    }
    this.#rows += rows;
  }

  /** The rows gathered; the buffer is empty afterwards, and the batch valid until the next `add`. */
  take(): Batch {
    const rows = this.#rows;
    const columns = this.#values.map((values, c): Column => {
      const names = this.#names[c];
      const some = values.subarray(0, rows);
      return names === null
        ? (some as Float64Array | Int32Array)
        : { codes: some as Uint32Array, names: [...names.keys()] };
    });
    this.#rows = 0;
    return { rows, columns };
  }
}

function addText(
  column: Column,
  to: Uint32Array,
  at: number,
  rows: number,
  pick: Uint32Array | null,
  names: Map<string, number>,
): void {
  const codeOf = (name: string): number => {
    let code = names.get(name);
    if (code === undefined) names.set(name, (code = names.size));
    return code;
  };
  if (isConstant(column)) {
    to.fill(column.value === null || column.value === '' ? EMPTY_CODE : codeOf(String(column.value)), at, at + rows);
    return;
  }
  if (!isCoded(column)) throw new Error('a text column was given numbers');
  const code = column.names.map((name) => (name === '' ? EMPTY_CODE : codeOf(name)));
  for (let i = 0; i < rows; i++) to[at + i] = code[column.codes[pick === null ? i : pick[i]]] ?? EMPTY_CODE;
}
