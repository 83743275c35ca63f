/**
 * Reads CSV (RFC 4180) as csv.ts writes it: text in pieces, cells row by row.
 *
 * Line ends may be CR LF or LF. Does not guess types: what a column holds comes from the codebook (read.ts).
 */

/** Splits text into rows of cells, however the text is cut into pieces. */
export class CsvReader {
  readonly #onRow: (cells: string[]) => void;
  #rest = '';

  /** @param onRow - called with the cells of each row, the header first */
  constructor(onRow: (cells: string[]) => void) {
    this.#onRow = onRow;
  }

  /** The next piece of the file. */
  push(text: string): void {
    this.#rest += text;
    this.#take(false);
  }

  /** The file is at its end; a last row without a line end counts. */
  end(): void {
    this.#take(true);
    this.#rest = '';
  }

  #take(last: boolean): void {
    const text = this.#rest;
    let at = 0;
    // looked for once and carried along: a file without quotes must not be searched to its end in every row
    let quote = text.indexOf('"');
    while (at < text.length) {
      if (quote >= 0 && quote < at) quote = text.indexOf('"', at);
      const end = rowEnd(text, at, quote);
      if (end < 0 && !last) break;
      let to = end < 0 ? text.length : end;
      const next = to + 1;
      if (text[to - 1] === '\r' && end >= 0) to--;
      this.#onRow(cells(text.slice(at, to)));
      at = next;
    }
    this.#rest = text.slice(at);
  }
}

/** Index of the line feed that ends the row starting at `at`, outside quotes, or −1; `quote` is the next quote. */
function rowEnd(text: string, at: number, quote: number): number {
  let end = text.indexOf('\n', at);
  while (quote >= 0 && quote < end) {
    const close = text.indexOf('"', quote + 1);
    if (close < 0) return -1;
    if (close > end) end = text.indexOf('\n', close);
    quote = text.indexOf('"', close + 1);
  }
  return end;
}

function cells(line: string): string[] {
  if (!line.includes('"')) return line.split(',');
  const out: string[] = [];
  let at = 0;
  for (;;) {
    if (line[at] !== '"') {
      const comma = line.indexOf(',', at);
      out.push(comma < 0 ? line.slice(at) : line.slice(at, comma));
      if (comma < 0) return out;
      at = comma + 1;
      continue;
    }
    let cell = '';
    let from = at + 1;
    for (;;) {
      const close = line.indexOf('"', from);
      if (close < 0) throw new Error(`a quoted cell does not end: ${line.slice(at, at + 40)}`);
      cell += line.slice(from, close);
      if (line[close + 1] !== '"') {
        at = close + 1;
        break;
      }
      cell += '"';
      from = close + 2;
    }
    out.push(cell);
    if (at >= line.length) return out;
    at++;
  }
}

/** A number cell as csv.ts writes it; an empty cell is NaN. */
export function parseNumber(cell: string): number {
  if (cell === '') return Number.NaN;
  if (cell === 'INF') return Number.POSITIVE_INFINITY;
  if (cell === '-INF') return Number.NEGATIVE_INFINITY;
  return Number(cell);
}
