/** Runs studies in the page, for the tests; results stay here and are told of by their digests. */
import type { Problem } from '../../../network/errors.js';
import { panelCsv } from '../../../viewer/data/panel-csv.js';
import type { Source } from '../../../viewer/data/source.js';
import type { Files } from '../../../viewer/run/engine.worker.js';
import { startRun } from '../../../viewer/run/run.js';

export interface Told {
  readonly progress: readonly [done: number, doing: string][];
  /** Replicates of each source that arrived, and whether it was whole. */
  readonly arrived: readonly [replicates: number, whole: boolean][];
  /** SHA-256 of each file of the whole results, by name. */
  readonly digests: Readonly<Record<string, string>>;
  readonly problems: readonly Problem[];
  readonly failed: string | null;
}

export interface RunPage {
  run(yaml: string, files: Readonly<Record<string, string>>, workers: number, cancelAt?: number): Promise<Told>;
  /** Frustrated households of an arm and generation, from the last source that arrived. */
  frustrated(arm: number, replicate: number, generation: number): Promise<number>;
  /** A file of the last results, as text. */
  text(name: string): Promise<string>;
  /** Digest of the panel as it would be saved as CSV. */
  savedCsv(): Promise<string>;
}

let last: Source | null = null;

async function digest(bytes: BufferSource): Promise<string> {
  const hash = new Uint8Array(await crypto.subtle.digest('SHA-256', bytes));
  return Array.from(hash, (byte) => byte.toString(16).padStart(2, '0')).join('');
}

function lastSource(): Source {
  if (last === null) throw new Error('nothing has run');
  return last;
}

const page: RunPage = {
  run: (yaml, files, workers, cancelAt) =>
    new Promise((done) => {
      const progress: [number, string][] = [];
      const arrived: [number, boolean][] = [];
      const encoder = new TextEncoder();
      const over = (rest: Partial<Told>): void =>
        done({ progress, arrived, digests: {}, problems: [], failed: null, ...rest });
      const run = startRun(
        { yaml, workers, files: new Map(Object.entries(files).map(([name, text]) => [name, encoder.encode(text)])) },
        {
          progress: (share, doing) => {
            progress.push([share, doing]);
            if (cancelAt === undefined || share < cancelAt) return;
            run.cancel();
            // long enough for a word that should not come
            setTimeout(() => over({}), 1500);
          },
          arrived: (source: Source, made: Files, whole: boolean) => {
            arrived.push([source.info.replicates, whole]);
            last = source;
            if (!whole) return;
            void Promise.all([...made].map(async ([name, bytes]) => [name, await digest(bytes)] as const)).then(
              (pairs) => over({ digests: Object.fromEntries(pairs) }),
            );
          },
          problems: (problems) => over({ problems }),
          failed: (failed) => over({ failed }),
        },
      );
    }),
  async frustrated(arm, replicate, generation) {
    const { met } = await lastSource().snapshot(arm, replicate, generation);
    return met.reduce((sum, count) => sum + (count === 0 ? 1 : 0), 0);
  },
  async text(name) {
    return new TextDecoder().decode(await lastSource().file(name));
  },
  async savedCsv() {
    return digest(await (await panelCsv(lastSource())).arrayBuffer());
  },
};
(window as unknown as { page: RunPage }).page = page;
