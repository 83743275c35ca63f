/**
 * Where result files live while they are made: a folder on disk (folder.ts) or memory (here, for the browser).
 *
 * A file being written is not there until it is closed: a store never shows half a file under its name.
 */

/** Takes the bytes of one file in order; consumes them at once, so that the caller may reuse its buffer. */
export interface ByteSink {
  write(bytes: Uint8Array): void;
  /** The file is whole and takes its name, replacing what had it. */
  close(): void;
}

/** Named files. Names may contain `/`. */
export interface Store {
  create(name: string): ByteSink;
  /** Size in bytes, or null when there is no such file. */
  size(name: string): number | null;
  /** Bytes [start, end) of a file that is there. */
  read(name: string, start: number, end: number): Uint8Array<ArrayBuffer>;
  /** Names, sorted, that start with `prefix`. */
  list(prefix: string): string[];
  remove(name: string): void;
}

/** A store whose files can all be handed over at once. */
export interface MemoryStore extends Store {
  readonly files: ReadonlyMap<string, Uint8Array<ArrayBuffer>>;
}

/** Files in memory. */
export function memoryStore(): MemoryStore {
  const files = new Map<string, Uint8Array<ArrayBuffer>>();
  const file = (name: string): Uint8Array<ArrayBuffer> => {
    const bytes = files.get(name);
    if (bytes === undefined) throw new Error(`no file ${name} in this store`);
    return bytes;
  };
  return {
    files,
    create(name) {
      const chunks: Uint8Array[] = [];
      let size = 0;
      return {
        write(bytes) {
          chunks.push(bytes.slice());
          size += bytes.length;
        },
        close() {
          const all = new Uint8Array(size);
          let at = 0;
          for (const chunk of chunks) {
            all.set(chunk, at);
            at += chunk.length;
          }
          files.set(name, all);
        },
      };
    },
    size: (name) => files.get(name)?.length ?? null,
    read: (name, start, end) => file(name).slice(start, end),
    list: (prefix) => [...files.keys()].filter((name) => name.startsWith(prefix)).sort(),
    remove(name) {
      files.delete(name);
    },
  };
}

/** The whole of a file, or null when there is none. */
export function readAll(store: Store, name: string): Uint8Array<ArrayBuffer> | null {
  const size = store.size(name);
  return size === null ? null : store.read(name, 0, size);
}

/** Writes a file at one go. */
export function writeAll(store: Store, name: string, content: Uint8Array | string): void {
  const sink = store.create(name);
  sink.write(typeof content === 'string' ? new TextEncoder().encode(content) : content);
  sink.close();
}

/** Copies bytes [start, end) of a file into a sink, a few megabytes at a time. */
export function copyRange(store: Store, name: string, start: number, end: number, sink: ByteSink): void {
  const step = 4 << 20;
  for (let at = start; at < end; at += step) sink.write(store.read(name, at, Math.min(at + step, end)));
}
