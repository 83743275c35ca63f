/**
 * The tables of one replicate, written while it runs: one part per arm and table, into a store.
 *
 * Listens to the run and streams the panel generation by generation. A replicate's parts count only once a
 * commit file lists them with their sizes (`commit`), so a run killed half way leaves nothing that could be taken
 * for whole. Putting parts together is assemble.ts.
 */
import { degrees } from '../../network/graph.js';
import { betweenness } from '../../network/measure/betweenness.js';
import { localClustering } from '../../network/measure/local-clustering.js';
import type { ArmRecord, GenerationRecord, Recorder } from '../study/record.js';
import { type Extras, type PanelColumn, PanelSource, panelColumns } from './columns.js';
import { writeCsvRows } from './csv.js';
import type { Facts } from './facts.js';
import { type Batch, type Column, columnsOf, EMPTY_CODE, type Field, type Row } from './field.js';
import { ParquetTable } from './parquet.js';
import { ROW_GROUP, RowGroupBuffer } from './row-group.js';
import { type ByteSink, readAll, type Store, writeAll } from './store.js';
import { type Format, formatsOf, type Table, type TableName, tableNamed, tablesOf } from './tables.js';
import { type KeepPanel, keepsGeneration, keepsReplicate, keptHouseholds } from './thin.js';
import { TieSpans } from './ties.js';

export interface PartOptions {
  readonly store: Store;
  readonly facts: Facts;
  /** Formats of the panel, the households and the ties. */
  readonly formats: readonly Format[];
  readonly keep: KeepPanel;
  readonly replicate: number;
}

/** What a commit file says: every part of the replicate with its size in bytes. */
interface Commit {
  readonly replicate: number;
  readonly arms: number;
  readonly files: Readonly<Record<string, number>>;
}

const FOLDER = 'parts/';

function stem(replicate: number): string {
  return `${FOLDER}r${String(replicate).padStart(5, '0')}`;
}

/** Name of a part in its store. `ending` is `panel.parquet`, `indicators.csv`, a kept file's name … */
export function partName(replicate: number, arm: number, ending: string): string {
  return `${stem(replicate)}-a${String(arm).padStart(3, '0')}.${ending}`;
}

/** Parts of a replicate that is there whole, or null: not committed, or a file is missing or has another size. */
export function committedParts(store: Store, replicate: number): ReadonlySet<string> | null {
  const bytes = readAll(store, `${stem(replicate)}.json`);
  if (bytes === null) return null;
  let commit: Commit;
  try {
    commit = JSON.parse(new TextDecoder().decode(bytes)) as Commit;
  } catch {
    return null;
  }
  if (commit === null || typeof commit !== 'object' || commit.replicate !== replicate || !commit.files) return null;
  const names = Object.keys(commit.files);
  for (const name of names) if (store.size(name) !== commit.files[name]) return null;
  return new Set(names);
}

/** Replicates of 0 … count − 1 whose parts are there whole, ascending. */
export function completeReplicates(store: Store, count: number): number[] {
  const out: number[] = [];
  for (let r = 0; r < count; r++) if (committedParts(store, r) !== null) out.push(r);
  return out;
}

/** What one arm of the replicate needs while it runs. */
interface ArmParts {
  readonly record: ArmRecord;
  readonly source: PanelSource;
  readonly pick: Uint32Array | null;
  readonly rows: number;
  readonly buffer: RowGroupBuffer | null;
  readonly panel: readonly TablePart[];
  readonly spans: TieSpans;
  readonly small: Map<TableName, TablePart[]>;
  lastDecided: number;
}

/** One open file of one table. */
interface TablePart {
  add(batch: Batch): void;
  close(): void;
}

function tablePart(sink: ByteSink, fields: readonly Field[], format: Format): TablePart {
  if (format === 'parquet') return new ParquetTable(sink, fields);
  return { add: (batch) => writeCsvRows(sink, fields, batch), close: () => sink.close() };
}

/** Writes the parts of one replicate. Everything is synchronous, as the run is. */
export class PartWriter implements Recorder {
  readonly #options: PartOptions;
  readonly #tables: readonly Table[];
  readonly #columns: readonly PanelColumn[];
  readonly #files: string[] = [];
  #arms = 0;
  #arm: ArmParts | null = null;

  constructor(options: PartOptions) {
    this.#options = options;
    this.#tables = tablesOf(options.facts);
    this.#columns = panelColumns(options.facts);
    // a commit of an earlier try no longer tells the truth once its parts are written anew
    options.store.remove(`${stem(options.replicate)}.json`);
  }

  armStarts(record: ArmRecord): void {
    if (this.#arm !== null) throw new Error(`arm ${record.arm} starts before ${this.#arm.record.arm} has ended`);
    if (record.replicate !== this.#options.replicate) {
      throw new Error(`replicate ${record.replicate} in the parts of replicate ${this.#options.replicate}`);
    }
    const { keep } = this.#options;
    const pick = keptHouseholds(keep, record.households.n);
    const rows = pick === null ? record.households.n : pick.length;
    const kept = keepsReplicate(keep, record.replicate);
    const panel = tableNamed(this.#tables, 'panel');
    const small = new Map<TableName, TablePart[]>();
    for (const table of this.#tables) {
      if (table.made === 'parts' && table.formats === 'csv') small.set(table.name, this.#open(table, record.armIndex));
    }
    this.#arm = {
      record,
      source: new PanelSource(record),
      pick,
      rows,
      buffer: kept ? new RowGroupBuffer(panel.fields, rows) : null,
      panel: kept ? this.#open(panel, record.armIndex) : [],
      spans: new TieSpans(),
      small,
      lastDecided: -1,
    };
  }

  /**
   * One generation; the one that only measures (t = T) has no rows in the panel.
   *
   * @param extras - values of the columns named in `facts.extras`, for all households
   */
  generation(record: GenerationRecord, extras: Extras = {}): void {
    const arm = this.#current();
    if (!record.decided) return;
    if (record.tiesChanged) arm.spans.see(record.generation, record.ties);
    arm.lastDecided = record.generation;
    const { buffer } = arm;
    if (buffer === null || !keepsGeneration(this.#options.keep, record.generation)) return;
    const context = arm.source.context(record, extras);
    buffer.add(
      this.#columns.map((column) => column.fill(context)),
      arm.rows,
      arm.pick,
    );
    if (buffer.full) this.#flush(arm);
  }

  /**
   * Appends rows to a small table (indicators, pockets, regimes, frustration) of the arm that is running.
   *
   * @param rows - cells by column; `arm` and `replicate` are filled in
   */
  rows(name: TableName, rows: readonly Row[]): void {
    const arm = this.#current();
    const parts = arm.small.get(name);
    if (parts === undefined) throw new Error(`${name} is not a table rows are handed to replicate by replicate`);
    const own = { arm: arm.record.arm, replicate: arm.record.replicate };
    const { fields } = tableNamed(this.#tables, name);
    const batch = columnsOf(
      fields,
      rows.map((row) => ({ ...own, ...row })),
    );
    for (const part of parts) part.add(batch);
  }

  /** Keeps bytes for tables computed at the end from all replicates, such as a growth incidence curve. */
  keep(name: string, content: Uint8Array | string): void {
    const arm = this.#current();
    const file = partName(this.#options.replicate, arm.record.armIndex, `keep.${name}`);
    writeAll(this.#options.store, file, content);
    this.#files.push(file);
  }

  armEnds(): void {
    const arm = this.#current();
    this.#flush(arm);
    for (const part of arm.panel) part.close();
    for (const parts of arm.small.values()) for (const part of parts) part.close();
    this.#whole('households', arm.record.armIndex, [householdBatch(this.#options.facts, arm.record)]);
    this.#whole('ties', arm.record.armIndex, tieBatches(arm.record, arm.spans, arm.lastDecided));
    this.#arms++;
    this.#arm = null;
  }

  /** After the last arm: from now on the replicate is there whole. */
  commit(): void {
    if (this.#arm !== null) throw new Error(`arm ${this.#arm.record.arm} has not ended`);
    const { store, replicate } = this.#options;
    const sizes: Record<string, number> = {};
    for (const name of this.#files) sizes[name] = store.size(name) ?? -1;
    const commit: Commit = { replicate, arms: this.#arms, files: sizes };
    writeAll(store, `${stem(replicate)}.json`, JSON.stringify(commit));
  }

  #current(): ArmParts {
    if (this.#arm === null) throw new Error('no arm is running');
    return this.#arm;
  }

  #open(table: Table, arm: number): TablePart[] {
    return formatsOf(table, this.#options.formats).map((format) => {
      const file = partName(this.#options.replicate, arm, `${table.name}.${format}`);
      this.#files.push(file);
      return tablePart(this.#options.store.create(file), table.fields, format);
    });
  }

  #whole(name: TableName, arm: number, batches: Iterable<Batch>): void {
    const parts = this.#open(tableNamed(this.#tables, name), arm);
    for (const batch of batches) for (const part of parts) part.add(batch);
    for (const part of parts) part.close();
  }

  #flush(arm: ArmParts): void {
    if (arm.buffer === null || arm.buffer.rows === 0) return;
    const batch = arm.buffer.take();
    for (const part of arm.panel) part.add(batch);
  }
}

/** Rows of the household table for one arm and replicate. */
function householdBatch(facts: Facts, record: ArmRecord): Batch {
  const { households, ties } = record;
  const { n } = households;
  const degree = degrees(ties);
  const strength = new Float64Array(n);
  const number = new Uint32Array(n);
  for (let i = 0; i < n; i++) {
    number[i] = i;
    let sum = 0;
    for (let e = ties.start[i]; e < ties.start[i + 1]; e++) sum += ties.weight === null ? 1 : ties.weight[e];
    strength[i] = sum;
  }
  const covariates = facts.covariates.map(({ name }): Column => {
    const found = record.covariates.find((covariate) => covariate.name === name);
    if (found === undefined) return { value: null };
    return found.values instanceof Float64Array ? found.values : coded(found.values);
  });
  const columns: Column[] = [
    { value: record.arm },
    { value: record.replicate },
    number,
    ...(facts.placeNames ? [{ codes: number, names: record.householdIds ?? placeNumbers(n) }] : []),
    households.place,
    ...(facts.placeNames
      ? [{ codes: households.place, names: record.placeNames ?? placeNumbers(households.places) }]
      : []),
    { codes: households.group, names: record.groupNames },
    degree,
    strength,
    localClustering(ties),
    ...(facts.betweenness ? [betweenness(ties)] : []),
    households.childWeight,
    record.treated ?? { value: 0 },
    ...covariates,
  ];
  return { rows: n, columns };
}

function placeNumbers(places: number): string[] {
  return Array.from({ length: places }, (_, place) => String(place));
}

function coded(texts: readonly (string | null)[]): Column {
  const names = [...new Set(texts)].filter((text) => text !== null);
  const code = new Map(names.map((name, at) => [name, at]));
  return { codes: Uint32Array.from(texts, (text) => (text === null ? EMPTY_CODE : code.get(text)!)), names };
}

/** Rows of the tie table for one arm and replicate, a row group at a time. */
function* tieBatches(record: ArmRecord, spans: TieSpans, last: number): Iterable<Batch> {
  const { source, target, weight, from, to } = spans.intervals(last);
  for (let at = 0; at < source.length; at += ROW_GROUP) {
    const end = Math.min(at + ROW_GROUP, source.length);
    const columns: Column[] = [
      { value: record.arm },
      { value: record.replicate },
      from.subarray(at, end),
      to.subarray(at, end),
      source.subarray(at, end),
      target.subarray(at, end),
      weight === null ? { value: 1 } : weight.subarray(at, end),
    ];
    yield { rows: end - at, columns };
  }
}
