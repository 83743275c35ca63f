/**
 * A results folder in memory, for the browser: the same files as on disk, and as one ZIP to save.
 */
import { type Zippable, zipSync } from 'fflate';
import { assemble } from './assemble.js';
import { type Codebook, codebook } from './codebook.js';
import { writeCsvTable } from './csv.js';
import type { Facts } from './facts.js';
import type { Row } from './field.js';
import { completeManifest, type ManifestEnd, type ManifestHead, manifestText, partialManifest } from './manifest.js';
import { Results, type Source } from './read.js';
import { sha256 } from './sha256.js';
import { type MemoryStore, writeAll } from './store.js';
import { type Format, type TableName, tableNamed, tablesOf } from './tables.js';

export interface BundleOptions {
  readonly head: ManifestHead;
  readonly studyYaml: string;
  readonly facts: Facts;
  readonly formats: readonly Format[];
  /** Tables computed from all replicates. */
  readonly tables: readonly { readonly name: TableName; readonly rows: readonly Row[] }[];
  /** Other files, by name. */
  readonly files?: Readonly<Record<string, string>>;
  /** Files made from the tables once they and the codebook are there, such as estimates and the report. */
  readonly add?: (results: Results, write: (name: string, text: string) => void) => Promise<void>;
  readonly end: ManifestEnd;
}

/**
 * Makes the folder out of the parts of all replicates; the parts are removed.
 *
 * @param store - holds the committed parts
 * @returns files by name
 */
export async function bundle(
  store: MemoryStore,
  options: BundleOptions,
): Promise<ReadonlyMap<string, Uint8Array<ArrayBuffer>>> {
  const { head, facts } = options;
  const tables = tablesOf(facts);
  const { formats } = options;
  await assemble({ store, tables, formats, arms: head.arms.length, replicates: head.replicates });
  for (const name of store.list('parts/')) store.remove(name);
  for (const { name, rows } of options.tables) {
    writeCsvTable(store, `${name}.csv`, tableNamed(tables, name).fields, rows);
  }
  const book = codebook({ title: head.study, version: head.version, tables, files: store.list('') });
  writeAll(store, 'codebook.json', book.json);
  writeAll(store, 'codebook.md', book.markdown);
  writeAll(store, 'study.yaml', options.studyYaml);
  for (const [name, text] of Object.entries(options.files ?? {})) writeAll(store, name, text);
  if (options.add !== undefined) {
    const results = new Results(memorySource(store.files), partialManifest(head), JSON.parse(book.json) as Codebook);
    await options.add(results, (name, text) => writeAll(store, name, text));
  }
  const files = [];
  for (const [name, bytes] of store.files) files.push({ name, bytes: bytes.length, sha256: await sha256(bytes) });
  const manifest = completeManifest(partialManifest(head), options.end, files);
  writeAll(store, 'manifest.json', manifestText(manifest));
  return store.files;
}

/** Files in memory as a source for reading. */
export function memorySource(files: ReadonlyMap<string, Uint8Array<ArrayBuffer>>): Source {
  return {
    place: 'memory',
    async open(name) {
      const bytes = files.get(name);
      if (bytes === undefined) return null;
      return { byteLength: bytes.length, slice: (start, end) => bytes.slice(start, end).buffer };
    },
  };
}

/** Earliest time a ZIP can name: the same files give the same archive. */
const ZIP_TIME = '1980-01-01T00:00';

/**
 * One ZIP archive with the files in a folder `name`. Parquet is compressed already and only stored.
 *
 * @returns the archive. Memory: all files at once.
 */
export function zipFiles(name: string, files: ReadonlyMap<string, Uint8Array>): Uint8Array<ArrayBuffer> {
  const entries: Zippable = {};
  for (const [file, bytes] of files) {
    entries[`${name}/${file}`] = [bytes, { level: file.endsWith('.parquet') ? 0 : 6, mtime: ZIP_TIME }];
  }
  return zipSync(entries);
}
