/**
 * The engine in a worker of the page: reads a study, runs the replicates it is given, and makes the same files out
 * of them that a run on disk would write.
 *
 * Several such workers share a study's replicates (run.ts); each hands over the parts of a replicate when it is done.
 */
import { InputError, type Problem } from '../../network/errors.js';
import { checkStudyEstimates, studyEstimates } from '../../sim/estimate/of-study.js';
import { bundle } from '../../sim/results/bundle.js';
import { finishTables } from '../../sim/results/finish.js';
import { reportHtml } from '../../sim/results/report/report.js';
import { canonicalText, factsOf, householdsOf, runReplicate } from '../../sim/results/run-replicate.js';
import { sha256 } from '../../sim/results/sha256.js';
import { memoryStore, writeAll } from '../../sim/results/store.js';
import { loadInputs } from '../../sim/study/inputs.js';
import { parseStudy, studyText } from '../../sim/study/parse.js';
import { portable } from '../../sim/study/portable.js';
import type { Prepared } from '../../sim/study/replicate.js';
import { VERSION } from '../../sim/version.js';
import { MOST_BYTES, memoryWords, needs } from './needs.js';

/** Files by name. */
export type Files = ReadonlyMap<string, Uint8Array<ArrayBuffer>>;

/** What the page asks. */
export type EngineRequest =
  /** First: the study and the files it names. */
  | { readonly kind: 'read'; readonly yaml: string; readonly files: ReadonlyMap<string, Uint8Array> }
  | { readonly kind: 'run'; readonly replicate: number }
  /** Makes the folder of the first `replicates` replicates out of their parts. */
  | { readonly kind: 'assemble'; readonly parts: Files; readonly replicates: number; readonly seconds: number };

/** What the worker says. */
export type EngineReply =
  | {
      readonly kind: 'ready';
      readonly replicates: number;
      /** Steps of a replicate: generations of an arm. */
      readonly steps: number;
      readonly households: number;
      /** Bytes one replicate at work needs. */
      readonly work: number;
    }
  /** Steps done since the last such message. */
  | { readonly kind: 'steps'; readonly steps: number }
  | { readonly kind: 'ran'; readonly replicate: number; readonly parts: Files }
  | { readonly kind: 'assembled'; readonly files: Files; readonly replicates: number }
  | { readonly kind: 'problems'; readonly problems: readonly Problem[] }
  | { readonly kind: 'failed'; readonly message: string };

/** Milliseconds between two words on progress. */
const TELL = 80;

/** The worker's own scope, as far as it is used here. */
const scope = self as unknown as {
  onmessage: ((event: MessageEvent<EngineRequest>) => void) | null;
  postMessage(message: EngineReply, transfer?: Transferable[]): void;
};

let prepared: Prepared | null = null;

scope.onmessage = (event) => {
  answer(event.data).catch((error: unknown) => {
    if (error instanceof InputError) scope.postMessage({ kind: 'problems', problems: error.problems });
    else scope.postMessage({ kind: 'failed', message: error instanceof Error ? error.message : String(error) });
  });
};

async function answer(request: EngineRequest): Promise<void> {
  if (request.kind === 'read') return read(request.yaml, request.files);
  if (prepared === null) throw new Error('no study was read');
  return request.kind === 'run'
    ? run(prepared, request.replicate)
    : assembleParts(prepared, request.parts, request.replicates, request.seconds);
}

async function read(yaml: string, files: ReadonlyMap<string, Uint8Array>): Promise<void> {
  const parsed = parseStudy(yaml, 'study');
  const inputs = await loadInputs(parsed, async (path) => {
    const bytes = files.get(path) ?? files.get(path.split(/[\\/]/).at(-1) ?? path);
    return bytes === undefined ? null : new TextDecoder().decode(bytes);
  });
  prepared = portable({ study: parsed.study, inputs });
  await checkStudyEstimates(prepared, parsed.place);
  const { study } = prepared;
  const households = householdsOf(prepared);
  const needed = needs(study, households);
  if (needed.bytes > MOST_BYTES) {
    throw new InputError({
      code: 'too-large',
      place: parsed.place(['population']),
      problem: `this study ${memoryWords(needed)}, more than a page can hold`,
      remedy: 'keep a part of the panel (keep.panel), or run it by the command line and look at the results folder',
    });
  }
  scope.postMessage({
    kind: 'ready',
    replicates: study.replicates,
    steps: study.arms.length * study.generations,
    households,
    work: needed.work,
  });
}

async function run(study: Prepared, replicate: number): Promise<void> {
  const store = memoryStore();
  let steps = 0;
  let told = performance.now();
  runReplicate(study, factsOf(study), store, replicate, () => {
    steps++;
    const now = performance.now();
    if (now - told < TELL) return;
    told = now;
    scope.postMessage({ kind: 'steps', steps });
    steps = 0;
  });
  scope.postMessage({ kind: 'steps', steps });
  scope.postMessage({ kind: 'ran', replicate, parts: new Map(store.files) }, buffersOf(store.files));
}

async function assembleParts(whole: Prepared, parts: Files, replicates: number, seconds: number): Promise<void> {
  const store = memoryStore();
  for (const [name, bytes] of parts) writeAll(store, name, bytes);
  // only so many replicates are there yet
  const study = { ...whole.study, replicates };
  const facts = factsOf(whole);
  const { tables, notes } = finishTables(store, facts, study);
  for (const [path, text] of Object.entries(whole.inputs.texts)) writeAll(store, path, text);
  const files = await bundle(store, {
    head: {
      version: VERSION,
      study: study.study,
      studyHash: await sha256(new TextEncoder().encode(canonicalText(whole))),
      seed: study.seed,
      arms: study.arms.map((arm) => arm.name),
      replicates,
      generations: study.generations,
      households: householdsOf(whole),
      started: new Date().toISOString(),
    },
    studyYaml: studyText(whole.study),
    facts,
    formats: study.keep.formats,
    tables,
    // a page cannot tell its memory
    end: { seconds, peakMemory: 0, notes },
    // estimates and report tell of the whole study, not of the first replicate
    ...(replicates === whole.study.replicates
      ? {
          add: async (results, write) => {
            const { files: estimates } = await studyEstimates(study, results, 'the results', () => 'study');
            for (const [name, text] of Object.entries(estimates)) write(name, text);
            write('report.html', await reportHtml(results, notes));
          },
        }
      : {}),
  });
  scope.postMessage({ kind: 'assembled', files: new Map(files), replicates }, buffersOf(files));
}

function buffersOf(files: Files): ArrayBuffer[] {
  return [...new Set([...files.values()].map((bytes) => bytes.buffer))];
}
