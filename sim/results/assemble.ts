/**
 * The final tables out of the parts of all replicates, in the order arm × replicate.
 *
 * Rows are copied, not decoded, so that memory does not grow with the panel. May be stopped and started again at
 * any point: a table takes its name only when it is whole, and parts stay until everything is.
 */
import { csvHeader } from './csv.js';
import { mergeParquet } from './merge.js';
import { committedParts, partName } from './parts.js';
import { copyRange, readAll, type Store } from './store.js';
import { type Format, formatsOf, type Table } from './tables.js';

export interface AssembleOptions {
  readonly store: Store;
  readonly tables: readonly Table[];
  readonly formats: readonly Format[];
  readonly arms: number;
  readonly replicates: number;
  /** Called after each table with the share done, 0 … 1. */
  readonly onProgress?: (done: number) => void;
}

/**
 * Writes every table that is made from parts.
 *
 * @returns names of the files written
 * @throws Error when a replicate is not there whole (a bug: ask `completeReplicates` first)
 */
export async function assemble(options: AssembleOptions): Promise<string[]> {
  const { store, arms, replicates } = options;
  const there: ReadonlySet<string>[] = [];
  for (let r = 0; r < replicates; r++) {
    const parts = committedParts(store, r);
    if (parts === null) throw new Error(`replicate ${r} is not there whole`);
    there.push(parts);
  }
  const jobs: { table: Table; format: Format; parts: string[] }[] = [];
  for (const table of options.tables) {
    if (table.made !== 'parts') continue;
    for (const format of formatsOf(table, options.formats)) {
      const parts: string[] = [];
      for (let arm = 0; arm < arms; arm++) {
        for (let r = 0; r < replicates; r++) {
          const name = partName(r, arm, `${table.name}.${format}`);
          if (there[r].has(name)) parts.push(name);
        }
      }
      // a panel nobody wants kept has no part anywhere, and no file
      if (parts.length > 0) jobs.push({ table, format, parts });
    }
  }
  const written: string[] = [];
  for (const { table, format, parts } of jobs) {
    const name = `${table.name}.${format}`;
    const sink = store.create(name);
    if (format === 'parquet') mergeParquet(store, parts, table.fields, sink);
    else {
      sink.write(csvHeader(table.fields));
      for (const part of parts) copyRange(store, part, 0, store.size(part) ?? 0, sink);
      sink.close();
    }
    written.push(name);
    options.onProgress?.(written.length / jobs.length);
    // let the caller's screen and signals have their turn
    await new Promise((resolve) => setTimeout(resolve, 0));
  }
  return written;
}

/** What a part writer kept under `name` for an arm and replicate, or null. */
export function keptBytes(store: Store, replicate: number, arm: number, name: string): Uint8Array<ArrayBuffer> | null {
  return readAll(store, partName(replicate, arm, `keep.${name}`));
}
