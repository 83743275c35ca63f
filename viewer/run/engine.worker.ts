/**
 * The engine in a worker of the page: reads a study, runs its replicates one after another, and hands over the same
 * files a run on disk would write. The first replicate is handed over as soon as it is there.
 */
import { InputError, type Problem } from '../../network/errors.js';
import { bundle } from '../../sim/results/bundle.js';
import { finishTables } from '../../sim/results/finish.js';
import { canonicalText, factsOf, householdsOf, runReplicate } from '../../sim/results/run-replicate.js';
import { type MemoryStore, memoryStore, writeAll } from '../../sim/results/store.js';
import { loadInputs } from '../../sim/study/inputs.js';
import { parseStudy, studyText } from '../../sim/study/parse.js';
import { portable } from '../../sim/study/portable.js';
import type { Prepared } from '../../sim/study/replicate.js';
import { VERSION } from '../../sim/version.js';

/** What the page asks. */
export interface EngineRequest {
  readonly yaml: string;
  readonly files: ReadonlyMap<string, Uint8Array>;
}

/** What the worker says. */
export type EngineReply =
  | { readonly kind: 'progress'; readonly done: number; readonly doing: string }
  | {
      readonly kind: 'first' | 'done';
      readonly files: ReadonlyMap<string, Uint8Array<ArrayBuffer>>;
      readonly replicates: number;
    }
  | { readonly kind: 'problems'; readonly problems: readonly Problem[] }
  | { readonly kind: 'failed'; readonly message: string };

/** The worker's own scope, as far as it is used here. */
const scope = self as unknown as {
  onmessage: ((event: MessageEvent<EngineRequest>) => void) | null;
  postMessage(message: EngineReply, transfer?: Transferable[]): void;
};

scope.onmessage = (event) => {
  run(event.data).catch((error: unknown) => {
    if (error instanceof InputError) scope.postMessage({ kind: 'problems', problems: error.problems });
    else scope.postMessage({ kind: 'failed', message: error instanceof Error ? error.message : String(error) });
  });
};

async function run({ yaml, files }: EngineRequest): Promise<void> {
  const parsed = parseStudy(yaml, 'study');
  const read = async (path: string): Promise<string | null> => {
    const bytes = files.get(path) ?? files.get(path.split(/[\\/]/).at(-1) ?? path);
    return bytes === undefined ? null : new TextDecoder().decode(bytes);
  };
  const prepared = portable({ study: parsed.study, inputs: await loadInputs(parsed, read) });
  const { study } = prepared;
  const facts = factsOf(prepared);
  const store = memoryStore();
  const steps = study.replicates * study.arms.length * study.generations;
  const began = performance.now();
  let done = 0;
  let told = 0;
  for (let r = 0; r < study.replicates; r++) {
    runReplicate(prepared, facts, store, r, () => {
      done++;
      const now = performance.now();
      if (now - told < 80) return;
      told = now;
      scope.postMessage({
        kind: 'progress',
        done: (0.97 * done) / steps,
        doing: `replicate ${r + 1} of ${study.replicates}`,
      });
    });
    if (r === 0 && study.replicates > 1) await hand('first', prepared, copyOf(store), 1, began);
  }
  scope.postMessage({ kind: 'progress', done: 0.97, doing: 'writing the tables' });
  await hand('done', prepared, store, study.replicates, began);
}

async function hand(
  kind: 'first' | 'done',
  prepared: Prepared,
  store: MemoryStore,
  replicates: number,
  began: number,
): Promise<void> {
  const { study, inputs } = prepared;
  const facts = factsOf(prepared);
  const { tables, notes } = await finishTables(store, facts, { ...study, replicates });
  const head = {
    version: VERSION,
    study: study.study,
    studyHash: await hashed(canonicalText(prepared)),
    seed: study.seed,
    arms: study.arms.map((arm) => arm.name),
    replicates,
    generations: study.generations,
    households: householdsOf(prepared),
    started: new Date().toISOString(),
  };
  for (const [path, text] of Object.entries(inputs.texts)) writeAll(store, path, text);
  const made = await bundle(store, {
    head,
    studyYaml: studyText(study),
    facts,
    formats: study.keep.formats,
    tables,
    end: { seconds: (performance.now() - began) / 1000, peakMemory: 0, notes },
  });
  const out = new Map([...made].map(([name, bytes]) => [name, bytes] as const));
  scope.postMessage({ kind, files: out, replicates }, [...new Set([...out.values()].map((bytes) => bytes.buffer))]);
}

function copyOf(store: MemoryStore): MemoryStore {
  const copy = memoryStore();
  for (const [name, bytes] of store.files) writeAll(copy, name, bytes);
  return copy;
}

async function hashed(text: string): Promise<string> {
  const digest = new Uint8Array(await crypto.subtle.digest('SHA-256', new TextEncoder().encode(text)));
  return Array.from(digest, (byte) => byte.toString(16).padStart(2, '0')).join('');
}
