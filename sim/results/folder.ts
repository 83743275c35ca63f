/**
 * A results folder on disk while a study runs: made beside its final place, resumed after a stop, renamed when whole.
 *
 * `DIR.partial` holds the parts of the replicates that are done; `finish` renames it to `DIR`. Every file is written
 * under another name and renamed once it is on the disk, so a run killed at any moment leaves nothing that looks
 * whole and is not. Node only; what is inside the files is the business of the other modules here.
 */
import { createHash } from 'node:crypto';
import {
  closeSync,
  createReadStream,
  existsSync,
  fsyncSync,
  mkdirSync,
  openSync,
  readdirSync,
  readFileSync,
  readSync,
  renameSync,
  rmdirSync,
  rmSync,
  statSync,
  writeSync,
} from 'node:fs';
import { dirname, join, resolve } from 'node:path';
import { InputError } from '../../network/errors.js';
import { assemble, keptBytes } from './assemble.js';
import { codebook } from './codebook.js';
import { writeCsvTable } from './csv.js';
import type { Facts } from './facts.js';
import type { Row } from './field.js';
import {
  completeManifest,
  type Manifest,
  type ManifestEnd,
  type ManifestHead,
  manifestText,
  parseManifest,
  partialManifest,
} from './manifest.js';
import { completeReplicates } from './parts.js';
import { type Store, writeAll } from './store.js';
import { type Format, type TableName, tableNamed, tablesOf } from './tables.js';

/** Ending of a file that is being written. */
const WRITING = '.writing';
const PARTIAL = '.partial';
const PARTS = 'parts';
const MANIFEST = 'manifest.json';

/** SHA-256 of a study's canonical text, hexadecimal. */
export function studyHash(canonicalStudy: string): string {
  return createHash('sha256').update(canonicalStudy, 'utf8').digest('hex');
}

/** Files in a folder, made if it is not there. Several workers may use the same folder for different files. */
export function folderStore(folder: string): Store {
  const root = resolve(folder);
  const path = (name: string): string => join(root, name);
  mkdirSync(root, { recursive: true });
  return {
    create(name) {
      const temporary = path(name + WRITING);
      mkdirSync(dirname(temporary), { recursive: true });
      const file = openSync(temporary, 'w');
      return {
        write(bytes) {
          for (let at = 0; at < bytes.length; ) at += writeSync(file, bytes, at, bytes.length - at);
        },
        close() {
          // on the disk before it takes its name: a power cut must not leave the name with nothing behind it
          fsyncSync(file);
          closeSync(file);
          renameSync(temporary, path(name));
        },
      };
    },
    size(name) {
      const stat = statSync(path(name), { throwIfNoEntry: false });
      return stat?.isFile() ? stat.size : null;
    },
    read(name, start, end) {
      const bytes = new Uint8Array(end - start);
      const file = openSync(path(name), 'r');
      try {
        for (let at = 0; at < bytes.length; ) {
          const got = readSync(file, bytes, at, bytes.length - at, start + at);
          if (got === 0) throw new Error(`${name} ends before byte ${end}`);
          at += got;
        }
      } finally {
        closeSync(file);
      }
      return bytes;
    },
    list(prefix) {
      return readdirSync(root, { recursive: true, withFileTypes: true })
        .filter((entry) => entry.isFile())
        .map((entry) =>
          join(entry.parentPath, entry.name)
            .slice(folder.length + 1)
            .replaceAll('\\', '/'),
        )
        .filter((name) => name.startsWith(prefix) && !name.endsWith(WRITING))
        .sort();
    },
    remove(name) {
      rmSync(path(name), { force: true });
    },
  };
}

/** A results folder being made. */
export class RunFolder {
  /** Where it is being made, `DIR.partial`. */
  readonly partial: string;
  /** Where it will be, `DIR`. */
  readonly out: string;
  readonly store: Store;
  /** True when a run was stopped after its last file was written: nothing is left to do. */
  readonly finished: boolean;
  #manifest: Manifest;

  constructor(partial: string, out: string, manifest: Manifest, finished: boolean) {
    this.partial = partial;
    this.out = out;
    this.store = folderStore(finished ? out : partial);
    this.finished = finished;
    this.#manifest = manifest;
  }

  get manifest(): Manifest {
    return this.#manifest;
  }

  /** Replicates that need not be run again. */
  completeReplicates(): number[] {
    return this.finished
      ? Array.from({ length: this.#manifest.replicates }, (_, r) => r)
      : completeReplicates(this.store, this.#manifest.replicates);
  }

  /** What a part writer kept under `name` for an arm and replicate, or null. */
  kept(name: string, arm: number, replicate: number): Uint8Array<ArrayBuffer> | null {
    return keptBytes(this.store, replicate, arm, name);
  }

  /**
   * Final tables out of the parts of all replicates.
   *
   * @returns names of the files written
   */
  assemble(facts: Facts, formats: readonly Format[], onProgress?: (done: number) => void): Promise<string[]> {
    return assemble({
      store: this.store,
      tables: tablesOf(facts),
      formats,
      arms: this.#manifest.arms.length,
      replicates: this.#manifest.replicates,
      ...(onProgress === undefined ? {} : { onProgress }),
    });
  }

  /** A table computed from all replicates: contrasts, incidence, transitions. */
  writeTable(facts: Facts, name: TableName, rows: readonly Row[]): void {
    writeCsvTable(this.store, `${name}.csv`, tableNamed(tablesOf(facts), name).fields, rows);
  }

  writeFile(name: string, content: Uint8Array | string): void {
    writeAll(this.store, name, content);
  }

  /** `codebook.json` and `codebook.md` for the tables that are there: call after the last table. */
  writeCodebook(facts: Facts): void {
    const files = this.store.list('').filter((name) => !name.includes('/'));
    const { json, markdown } = codebook({
      title: this.#manifest.study,
      version: this.#manifest.version,
      tables: tablesOf(facts),
      files,
    });
    this.writeFile('codebook.json', json);
    this.writeFile('codebook.md', markdown);
  }

  /** Takes everything away again: for a run that was refused before any replicate was done. */
  discard(): void {
    rmSync(this.partial, { recursive: true, force: true });
  }

  /** Hashes all files, says `complete`, removes the parts and moves the folder to its place. Last of all. */
  async finish(end: ManifestEnd): Promise<void> {
    const names = this.store.list('').filter((name) => !name.startsWith(`${PARTS}/`) && name !== MANIFEST);
    const files = [];
    for (const name of names) {
      files.push({ name, bytes: this.store.size(name) ?? 0, sha256: await fileHash(join(this.partial, name)) });
    }
    this.#manifest = completeManifest(this.#manifest, end, files);
    this.writeFile(MANIFEST, manifestText(this.#manifest));
    moveIntoPlace(this.partial, this.out);
  }
}

/** SHA-256 of a file, streamed. */
function fileHash(path: string): Promise<string> {
  return new Promise((done, fail) => {
    const hash = createHash('sha256');
    createReadStream(path)
      .on('error', fail)
      .on('data', (chunk) => hash.update(chunk))
      .on('end', () => done(hash.digest('hex')));
  });
}

/** Everything is written: the parts go, the folder takes its name. May be repeated after a stop. */
function moveIntoPlace(partial: string, out: string): void {
  rmSync(join(partial, PARTS), { recursive: true, force: true });
  for (const name of readdirSync(partial)) if (name.endsWith(WRITING)) rmSync(join(partial, name));
  if (existsSync(out)) rmdirSync(out); // empty: `startRun` and `resumeRun` saw to it
  renameSync(partial, out);
}

function isEmptyOrAbsent(folder: string): boolean {
  const stat = statSync(folder, { throwIfNoEntry: false });
  return stat === undefined || (stat.isDirectory() && readdirSync(folder).length === 0);
}

function refuse(code: string, place: string, problem: string, remedy: string): never {
  throw new InputError({ code, place, problem, remedy });
}

/**
 * Begins a results folder.
 *
 * @param dir - where it shall be; must not exist, or be empty
 * @param run - what the manifest says from the start, and the study with every default written out
 * @throws {InputError} `results-exist` when something is there; `results-unfinished` when an unfinished run is
 */
export function startRun(dir: string, run: { readonly head: ManifestHead; readonly studyYaml: string }): RunFolder {
  const out = resolve(dir);
  const partial = out + PARTIAL;
  if (!isEmptyOrAbsent(out)) {
    refuse('results-exist', dir, 'something is there already', 'name another folder with --out, or move that one away');
  }
  if (existsSync(partial)) {
    refuse(
      'results-unfinished',
      dir + PARTIAL,
      'an unfinished run is there',
      `go on with it by --resume ${dir}, or move it away`,
    );
  }
  const manifest = partialManifest(run.head);
  const folder = new RunFolder(partial, out, manifest, false);
  folder.writeFile('study.yaml', run.studyYaml);
  // last: a folder with a manifest can be resumed
  folder.writeFile(MANIFEST, manifestText(manifest));
  return folder;
}

function manifestIn(folder: string): Manifest | null {
  const path = join(folder, MANIFEST);
  return existsSync(path) ? parseManifest(readFileSync(path, 'utf8')) : null;
}

/**
 * Takes up a run that was stopped.
 *
 * @param dir - `DIR` or `DIR.partial`
 * @param expected - the study and version that go on with it; must be those that began it, or the two halves would
 *   not be one study
 * @throws {InputError} `no-such-results`, `results-complete`, `results-exist`, `other-study`, `other-version`
 */
export function resumeRun(
  dir: string,
  expected: { readonly studyHash?: string; readonly version?: string } = {},
): RunFolder {
  const given = resolve(dir);
  const out = given.endsWith(PARTIAL) ? given.slice(0, -PARTIAL.length) : given;
  const partial = out + PARTIAL;
  const manifest = manifestIn(partial);
  if (manifest === null) {
    if (manifestIn(out)?.state === 'complete') {
      refuse(
        'results-complete',
        dir,
        'this run is complete',
        'nothing is left to do; leave --resume out for a new run',
      );
    }
    refuse(
      'no-such-results',
      dir,
      `no unfinished run is there (no ${MANIFEST} in ${partial})`,
      'check the folder name',
    );
  }
  if (!isEmptyOrAbsent(out)) {
    refuse('results-exist', out, 'something is there already', 'move it away: the resumed run will take its place');
  }
  if (expected.version !== undefined && manifest.version !== expected.version) {
    refuse(
      'other-version',
      dir,
      `the run was begun by version ${manifest.version}, this is ${expected.version}`,
      'resume it with that version, or run the study anew',
    );
  }
  if (expected.studyHash !== undefined && manifest.study_hash !== expected.studyHash) {
    refuse('other-study', dir, 'the run was begun with another study', 'resume it without changes to the study');
  }
  if (manifest.state === 'complete') {
    moveIntoPlace(partial, out);
    return new RunFolder(partial, out, manifest, true);
  }
  return new RunFolder(partial, out, manifest, false);
}

/**
 * Puts files into a finished results folder, and their sizes and hashes into its manifest.
 *
 * @param files - text by name, in place of what is there under that name
 */
export function addFiles(dir: string, files: Readonly<Record<string, string>>): void {
  const manifest = manifestIn(dir);
  if (manifest === null)
    refuse('no-such-results', dir, `no results are there (no ${MANIFEST})`, 'check the folder name');
  const store = folderStore(dir);
  const entries = new Map(manifest.files.map((file) => [file.name, file]));
  for (const [name, text] of Object.entries(files)) {
    const bytes = new TextEncoder().encode(text);
    writeAll(store, name, bytes);
    entries.set(name, { name, bytes: bytes.length, sha256: createHash('sha256').update(bytes).digest('hex') });
  }
  const sorted = [...entries.values()].sort((a, b) => (a.name < b.name ? -1 : 1));
  writeAll(store, MANIFEST, manifestText({ ...manifest, files: sorted }));
}
