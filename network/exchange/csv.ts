/**
 * CSV text (RFC 4180) to rows with their line numbers.
 *
 * Parsing is papaparse's; this file adds what users need to mend a file: the line each row began on, and refusals with
 * a place for ragged rows, broken quotes and headers that name a column twice. Takes text, opens no file. Values stay
 * text: what they mean is the caller's.
 */
import Papa from 'papaparse';
import { InputError } from '../errors.js';
import { Faults, shown } from './faults.js';

/** A whole CSV file. */
export interface CsvTable {
  /** Column names, spaces around them removed. */
  readonly header: readonly string[];
  /** Rows of as many fields as the header; blank lines left out. */
  readonly rows: readonly (readonly string[])[];
  /** Line of the file (from 1) on which each row begins, length of `rows`. */
  readonly lines: ArrayLike<number>;
}

/** Characters parsed at a time, so that a file of ten million rows never stands in memory as objects. */
const CHUNK = 1 << 20;

/**
 * Reads a CSV text whole.
 *
 * @param text - UTF-8 text with a header row; a byte order mark and any of the three line endings are accepted
 * @param place - name for messages (`ties.csv`)
 * @returns header, rows and lines. Cost about a second for a million rows of four fields.
 * @throws InputError `empty-file`, `wrong-header`, `ragged-row`, `bad-quotes`, each at `place:line`
 */
export function readCsv(text: string, place: string): CsvTable {
  let header: readonly string[] = [];
  const rows: string[][] = [];
  const lines: number[] = [];
  eachCsvRow(
    text,
    place,
    (names) => {
      header = names;
    },
    (fields, line) => {
      rows.push(fields);
      lines.push(line);
    },
  );
  return { header, rows, lines };
}

/**
 * Reads a CSV text row by row: for files too long to hold as rows.
 *
 * @param onHeader - called once, before any row
 * @param onRow - fields (as many as the header has) and the line they begin on
 * @throws as {@link readCsv}
 */
export function eachCsvRow(
  text: string,
  place: string,
  onHeader: (names: readonly string[]) => void,
  onRow: (fields: string[], line: number) => void,
): void {
  let clean = text.charCodeAt(0) === 0xfeff ? text.slice(1) : text;
  if (clean.includes('\r')) clean = clean.replace(/\r\n?/g, '\n');
  const faults = new Faults();
  let width = -1;
  let line = 1;
  const onFields = (fields: string[], broken: string | undefined): void => {
    const at = line;
    line++;
    for (const field of fields) line += newlines(field);
    if (broken !== undefined) {
      faults.add(
        'bad-quotes',
        `${place}:${at}`,
        broken === 'MissingQuotes' ? 'a quoted field is never closed' : 'text follows the closing quote of a field',
        'close quoted fields with ", and write a quote inside them twice',
      );
      return;
    }
    if (fields.length === 1 && fields[0].trim() === '') return;
    if (width < 0) {
      const names = fields.map((name) => name.trim());
      checkHeader(names, `${place}:${at}`);
      width = names.length;
      onHeader(names);
      return;
    }
    if (fields.length !== width) {
      faults.add(
        'ragged-row',
        `${place}:${at}`,
        `${fields.length} ${fields.length === 1 ? 'field' : 'fields'}, the header has ${width}`,
        fields.length > width
          ? 'put values that contain a comma in quotes'
          : 'give every column a value, or leave it empty between commas',
      );
      return;
    }
    onRow(fields, at);
  };
  // by chunk, not by row: the library's per-row results cost more than the rows. `chunkSize` applies to text too, but the
  // types speak of files only
  const settings = {
    delimiter: ',',
    newline: '\n' as const,
    chunkSize: CHUNK,
    chunk: (result: Papa.ParseResult<string[]>): void => {
      const broken = new Map<number, string>();
      for (const { type, row, code } of result.errors) {
        if (type === 'Quotes' && row !== undefined && !broken.has(row)) broken.set(row, code);
      }
      result.data.forEach((fields, row) => {
        onFields(fields, broken.get(row));
      });
    },
  };
  Papa.parse<string[]>(clean, settings as unknown as Papa.ParseConfig<string[]>);
  faults.check();
  if (width < 0) {
    throw new InputError({
      code: 'empty-file',
      place: `${place}:1`,
      problem: 'the file is empty',
      remedy: 'give a header row with column names, then one row each',
    });
  }
}

function newlines(field: string): number {
  let count = 0;
  for (let at = field.indexOf('\n'); at >= 0; at = field.indexOf('\n', at + 1)) count++;
  return count;
}

function checkHeader(names: readonly string[], place: string): void {
  const seen = new Set<string>();
  for (const name of names) {
    const problem =
      name === '' ? 'a column has no name' : seen.has(name) ? `column ${shown(name)} appears twice` : undefined;
    if (problem !== undefined) {
      throw new InputError({ code: 'wrong-header', place, problem, remedy: 'give every column a name of its own' });
    }
    seen.add(name);
  }
}

/** A field as CSV writes it: quoted when it holds a comma, a quote, a line break, or spaces at an end. */
export function csvField(text: string): string {
  return /[",\n\r]|^\s|\s$/.test(text) ? `"${text.replaceAll('"', '""')}"` : text;
}
