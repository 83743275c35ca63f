/**
 * Reads a results folder back: manifest, codebook, tables, and pieces of the panel.
 *
 * Works on any source of files (a folder, the network, memory), in Node and in the browser. Types come from the
 * folder's own codebook. The panel is read row group by row group: only the groups and columns asked for.
 */
import { type AsyncBuffer, type FileMetaData, parquetMetadataAsync, parquetRead } from 'hyparquet';
import { InputError } from '../../network/errors.js';
import type { Codebook, Resource } from './codebook.js';
import { type Coded, EMPTY_CODE, type FieldType } from './field.js';
import { type Manifest, parseManifest } from './manifest.js';
import { CsvReader, parseNumber } from './read-csv.js';

/** Where the files of a results folder come from. */
export interface Source {
  /** For messages: the folder or the address. */
  readonly place: string;
  /** A file whose bytes can be fetched in ranges, or null when there is none of this name. */
  open(name: string): Promise<AsyncBuffer | null>;
}

/** Values as read: NaN, a negative integer or a code past the names are empty. */
export type ReadColumn = Float64Array | Int32Array | Coded;

export interface TableData {
  readonly rows: number;
  /** Columns in the order of the file. */
  readonly names: readonly string[];
  readonly columns: Readonly<Record<string, ReadColumn>>;
}

/** Which rows and columns of the panel to read; a part left out takes everything. */
export interface PanelQuery {
  readonly arms?: readonly string[];
  readonly replicates?: readonly number[];
  /** First and last generation, both included. */
  readonly generations?: readonly [number, number];
  readonly columns?: readonly string[];
}

/** Rows of the panel that lie together: generations of one arm and replicate. */
export interface PanelGroup {
  readonly arm: string;
  readonly replicate: number;
  readonly from: number;
  readonly to: number;
  readonly rowStart: number;
  readonly rows: number;
}

/** Bytes of a CSV file read at a time. */
const CSV_STEP = 4 << 20;

function fileProblem(source: Source, name: string, problem: string, remedy: string): InputError {
  return new InputError({ code: 'broken-results', place: `${source.place}/${name}`, problem, remedy });
}

async function textOf(source: Source, name: string): Promise<string> {
  const file = await source.open(name);
  if (file === null) {
    throw new InputError({
      code: 'no-such-results',
      place: source.place,
      problem: `there is no ${name}`,
      remedy: 'name a folder written by a run',
    });
  }
  return new TextDecoder().decode(await file.slice(0, file.byteLength));
}

/**
 * Opens a results folder.
 *
 * @throws {InputError} `no-such-results`, `broken-results`, `results-partial` (the run has not finished)
 */
export async function openSource(source: Source): Promise<Results> {
  const manifest = parseManifest(await textOf(source, 'manifest.json'));
  if (manifest === null) throw fileProblem(source, 'manifest.json', 'it is not a manifest', 'run the study again');
  if (manifest.state !== 'complete') {
    throw new InputError({
      code: 'results-partial',
      place: source.place,
      problem: 'the run has not finished',
      remedy: 'go on with it by --resume',
    });
  }
  let codebook: Codebook;
  try {
    codebook = JSON.parse(await textOf(source, 'codebook.json')) as Codebook;
  } catch (error) {
    if (error instanceof InputError) throw error;
    throw fileProblem(source, 'codebook.json', 'it is not JSON', 'run the study again');
  }
  return new Results(source, manifest, codebook);
}

/** An open results folder. */
export class Results {
  readonly manifest: Manifest;
  readonly codebook: Codebook;
  readonly #source: Source;
  readonly #pieces = new Map<string, Promise<PanelReader | null>>();

  constructor(source: Source, manifest: Manifest, codebook: Codebook) {
    this.#source = source;
    this.manifest = manifest;
    this.codebook = codebook;
  }

  /** The study with every default written out. */
  studyYaml(): Promise<string> {
    return textOf(this.#source, 'study.yaml');
  }

  /** A table by name, all of it, or null when the folder does not have it. For the panel, see `panel`. */
  async table(name: string): Promise<TableData | null> {
    const resource = this.codebook.resources.find((one) => one.name === name);
    if (resource === undefined) return null;
    const parquet = parquetPath(resource);
    const file = await this.#source.open(parquet ?? resource.path);
    if (file === null) {
      throw fileProblem(
        this.#source,
        parquet ?? resource.path,
        'the codebook names it but it is not there',
        'run the study again',
      );
    }
    const types = typesOf(resource);
    if (parquet !== null) {
      const metadata = await parquetMetadataAsync(file);
      const names = [...types.keys()];
      const rows = Number(metadata.num_rows);
      return readRanges(file, metadata, types, names, [{ from: 0, to: rows }]);
    }
    return readCsv(file, types, () => true, null);
  }

  /** Another text file of the folder, or null when it is not there. */
  async text(name: string): Promise<string | null> {
    return (await this.#source.open(name)) === null ? null : textOf(this.#source, name);
  }

  /** The panel, or null when the study kept none. */
  panel(): Promise<PanelReader | null> {
    return this.pieces('panel');
  }

  /** A table whose rows stand arm by arm and replicate by replicate (panel, households, ties), to read in pieces. */
  pieces(name: 'panel' | 'households' | 'ties'): Promise<PanelReader | null> {
    let found = this.#pieces.get(name);
    if (found === undefined) {
      found = openPieces(this.#source, this.codebook, name);
      this.#pieces.set(name, found);
    }
    return found;
  }
}

function parquetPath(resource: Resource): string | null {
  return [resource.path, ...(resource.alsoAs ?? [])].find((path) => path.endsWith('.parquet')) ?? null;
}

function typesOf(resource: Resource): Map<string, FieldType> {
  return new Map(
    resource.schema.fields.map((field) => [
      field.name,
      field.type === 'string' ? 'text' : field.type === 'number' ? 'number' : 'integer',
    ]),
  );
}

async function openPieces(source: Source, codebook: Codebook, name: string): Promise<PanelReader | null> {
  const resource = codebook.resources.find((one) => one.name === name);
  if (resource === undefined) return null;
  const parquet = parquetPath(resource);
  const file = await source.open(parquet ?? resource.path);
  if (file === null) {
    throw fileProblem(
      source,
      parquet ?? resource.path,
      'the codebook names it but it is not there',
      'run the study again',
    );
  }
  const types = typesOf(resource);
  return parquet === null
    ? new PanelReader(file, types, null)
    : new PanelReader(file, types, await parquetMetadataAsync(file));
}

/** Reads pieces of the panel, or of a table in the same order. From CSV every read goes through the whole file. */
export class PanelReader {
  readonly names: readonly string[];
  /** Row groups in the order of the file; null when the panel is CSV. */
  readonly groups: readonly PanelGroup[] | null;
  readonly #file: AsyncBuffer;
  readonly #types: ReadonlyMap<string, FieldType>;
  readonly #metadata: FileMetaData | null;

  constructor(file: AsyncBuffer, types: ReadonlyMap<string, FieldType>, metadata: FileMetaData | null) {
    this.#file = file;
    this.#types = types;
    this.#metadata = metadata;
    this.names = [...types.keys()];
    this.groups = metadata === null ? null : groupsOf(metadata, types);
  }

  /**
   * Rows that answer a query, in the order of the file.
   *
   * @throws {InputError} `no-such-column`
   */
  async read(query: PanelQuery = {}): Promise<TableData> {
    const names = query.columns ?? this.names;
    for (const name of names) {
      if (!this.#types.has(name)) {
        throw new InputError({
          code: 'no-such-column',
          place: 'panel',
          problem: `there is no column ${name}`,
          remedy: `choose among ${this.names.join(', ')}`,
        });
      }
    }
    const [first, last] = query.generations ?? [0, Number.POSITIVE_INFINITY];
    const arms = query.arms === undefined ? null : new Set(query.arms);
    const replicates = query.replicates === undefined ? null : new Set(query.replicates);
    if (this.#metadata === null || this.groups === null) {
      const wanted = (row: (name: string) => string): boolean => {
        const t = Number(row('generation'));
        if (t < first || t > last) return false;
        return (arms?.has(row('arm')) ?? true) && (replicates?.has(Number(row('replicate'))) ?? true);
      };
      return readCsv(this.#file, this.#types, wanted, names);
    }
    const ranges: RowRange[] = [];
    for (const group of this.groups) {
      if (group.to < first || group.from > last) continue;
      if (!(arms?.has(group.arm) ?? true) || !(replicates?.has(group.replicate) ?? true)) continue;
      const whole = { from: group.rowStart, to: group.rowStart + group.rows };
      if (group.from >= first && group.to <= last) ranges.push(whole);
      else ranges.push(...(await this.#generations(whole, first, last)));
    }
    return readRanges(this.#file, this.#metadata, this.#types, names, ranges);
  }

  /** Rows within a row group whose generation lies in [first, last]: generations stand in order, so one range. */
  async #generations(range: RowRange, first: number, last: number): Promise<RowRange[]> {
    const { columns } = await readRanges(this.#file, this.#metadata!, this.#types, ['generation'], [range]);
    const generation = columns['generation'] as Int32Array;
    let from = 0;
    while (from < generation.length && generation[from] < first) from++;
    let to = from;
    while (to < generation.length && generation[to] <= last) to++;
    return to > from ? [{ from: range.from + from, to: range.from + to }] : [];
  }
}

interface RowRange {
  readonly from: number;
  readonly to: number;
}

function groupsOf(metadata: FileMetaData, types: ReadonlyMap<string, FieldType>): PanelGroup[] {
  let rowStart = 0;
  return metadata.row_groups.map((group) => {
    const bounds = (name: string): [unknown, unknown] => {
      const at = group.columns.find((column) => column.meta_data?.path_in_schema[0] === name)?.meta_data?.statistics;
      return [at?.min_value, at?.max_value];
    };
    // a table without generations is read whole
    const [from, to] = types.has('generation') ? bounds('generation') : [0, 0];
    const rows = Number(group.num_rows);
    const out = {
      arm: String(bounds('arm')[0]),
      replicate: Number(bounds('replicate')[0]),
      from: Number(from),
      to: Number(to),
      rowStart,
      rows,
    };
    rowStart += rows;
    return out;
  });
}

/** Fills columns of known length piece by piece. */
class ColumnFill {
  readonly #values: Float64Array | Int32Array | Uint32Array;
  readonly #code: Map<string, number> | null;

  constructor(type: FieldType, rows: number) {
    this.#code = type === 'text' ? new Map() : null;
    this.#values =
      type === 'number' ? new Float64Array(rows) : type === 'text' ? new Uint32Array(rows) : new Int32Array(rows);
  }

  /** Puts `values[from…to)` at row `at`. */
  put(at: number, values: ArrayLike<unknown>, from: number, to: number): void {
    const code = this.#code;
    const out = this.#values;
    if (code === null && ArrayBuffer.isView(values)) {
      out.set((values as unknown as Float64Array).subarray(from, to), at);
      return;
    }
    for (let i = from; i < to; i++) {
      const v = values[i];
      const missing = v === null || v === undefined;
      if (code === null) out[at + i - from] = missing ? (out instanceof Float64Array ? Number.NaN : -1) : Number(v);
      else if (missing) out[at + i - from] = EMPTY_CODE;
      else {
        const text = v as string;
        let known = code.get(text);
        if (known === undefined) code.set(text, (known = code.size));
        out[at + i - from] = known;
      }
    }
  }

  column(): ReadColumn {
    return this.#code === null
      ? (this.#values as Float64Array | Int32Array)
      : { codes: this.#values as Uint32Array, names: [...this.#code.keys()] };
  }
}

/** Reads ranges of rows of some columns, one range after another. */
async function readRanges(
  file: AsyncBuffer,
  metadata: FileMetaData,
  types: ReadonlyMap<string, FieldType>,
  names: readonly string[],
  ranges: readonly RowRange[],
): Promise<TableData> {
  let rows = 0;
  for (const range of ranges) rows += range.to - range.from;
  const fills = new Map(names.map((name) => [name, new ColumnFill(types.get(name) ?? 'number', rows)]));
  let at = 0;
  for (const { from, to } of ranges) {
    if (to > from) {
      const start = at;
      await parquetRead({
        file,
        metadata,
        columns: [...names],
        rowStart: from,
        rowEnd: to,
        // chunks are whole pages and may reach beyond the range
        onChunk: ({ columnName, columnData, rowStart, rowEnd }) => {
          const first = Math.max(rowStart, from);
          const end = Math.min(rowEnd, to);
          if (end > first)
            fills.get(columnName)?.put(start + first - from, columnData, first - rowStart, end - rowStart);
        },
      });
    }
    at += to - from;
  }
  const columns: Record<string, ReadColumn> = {};
  for (const [name, fill] of fills) columns[name] = fill.column();
  return { rows, names, columns };
}

/** Reads a CSV file, keeping the rows that are wanted. */
async function readCsv(
  file: AsyncBuffer,
  types: ReadonlyMap<string, FieldType>,
  wanted: (cell: (name: string) => string) => boolean,
  names: readonly string[] | null,
): Promise<TableData> {
  let header: string[] | null = null;
  const at = new Map<string, number>();
  const kept: { name: string; index: number; values: (number | string | null)[] }[] = [];
  let rows = 0;
  const reader = new CsvReader((cells) => {
    if (header === null) {
      header = cells;
      cells.forEach((name, index) => {
        at.set(name, index);
      });
      for (const name of names ?? cells) kept.push({ name, index: at.get(name) ?? -1, values: [] });
      return;
    }
    if (!wanted((name) => cells[at.get(name) ?? -1])) return;
    rows++;
    for (const { name, index, values } of kept) {
      const cell = cells[index] ?? '';
      if (types.get(name) === 'text') values.push(cell === '' ? null : cell);
      else values.push(cell === '' ? null : parseNumber(cell));
    }
  });
  const decoder = new TextDecoder();
  for (let from = 0; from < file.byteLength; from += CSV_STEP) {
    const bytes = await file.slice(from, Math.min(from + CSV_STEP, file.byteLength));
    reader.push(decoder.decode(bytes, { stream: true }));
  }
  reader.push(decoder.decode());
  reader.end();
  const columns: Record<string, ReadColumn> = {};
  for (const { name, values } of kept) {
    const fill = new ColumnFill(types.get(name) ?? 'number', rows);
    fill.put(0, values, 0, rows);
    columns[name] = fill.column();
  }
  return { rows, names: kept.map(({ name }) => name), columns };
}
