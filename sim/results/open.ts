/**
 * A results folder on disk as a source for reading. Node only.
 */
import { open, stat } from 'node:fs/promises';
import { join } from 'node:path';
import { openSource, type Results, type Source } from './read.js';

/** Files of a folder, read in ranges. */
export function folderSource(dir: string): Source {
  return {
    place: dir,
    async open(name) {
      const path = join(dir, name);
      const found = await stat(path).catch(() => null);
      if (found === null || !found.isFile()) return null;
      const { size } = found;
      return {
        byteLength: size,
        async slice(start, end = size) {
          const bytes = new Uint8Array(Math.max(0, end - start));
          const file = await open(path, 'r');
          try {
            for (let at = 0; at < bytes.length; ) {
              const { bytesRead } = await file.read(bytes, at, bytes.length - at, start + at);
              if (bytesRead === 0) throw new Error(`${path} ends before byte ${end}`);
              at += bytesRead;
            }
          } finally {
            await file.close();
          }
          return bytes.buffer;
        },
      };
    },
  };
}

/**
 * Opens a results folder.
 *
 * @throws {InputError} when it is none, or the run has not finished
 */
export function openResults(dir: string): Promise<Results> {
  return openSource(folderSource(dir));
}
