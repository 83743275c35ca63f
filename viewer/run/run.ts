/**
 * A study run in the page: workers that share its replicates, their progress, and the results as a source.
 *
 * What comes out does not depend on how many workers there are: a replicate's parts are the same wherever they were
 * made, and are put together in the order of replicates.
 */
import type { Problem } from '../../network/errors.js';
import { memorySource } from '../../sim/results/bundle.js';
import { openFolder } from '../data/results.js';
import type { Source } from '../data/source.js';
import type { EngineReply, EngineRequest, Files } from './engine.worker.js';
import { Pace } from './pace.js';

export interface RunRequest {
  readonly yaml: string;
  /** Files the study names, by name. */
  readonly files: ReadonlyMap<string, Uint8Array>;
  /** Most workers; one less than there are processors when left out, so that the page stays alive. */
  readonly workers?: number;
}

export interface RunEvents {
  /** Share done, and what to say of it: time left and rate, on two lines. */
  progress(done: number, doing: string): void;
  /** The first replicate is there, or all of them (`whole`). */
  arrived(source: Source, files: Files, whole: boolean): void;
  problems(problems: readonly Problem[]): void;
  failed(message: string): void;
}

export interface Run {
  /** Stops at once; nothing is said any more. */
  cancel(): void;
}

/** Share of the work that lies in simulating; the rest is writing the tables. */
const SIMULATING = 0.97;
/** Bytes that all workers together may have at work. */
const WORK_BYTES = 1.5e9;
/** More workers than this gain little: they wait for memory. */
const MOST_WORKERS = 8;

/** Starts a run; a run before it should be cancelled first. */
export function startRun(request: RunRequest, events: RunEvents): Run {
  const run = new RunInPage(request, events);
  return { cancel: () => run.end() };
}

class RunInPage {
  readonly #request: RunRequest;
  readonly #events: RunEvents;
  readonly #workers: Worker[] = [];
  readonly #parts = new Map<string, Uint8Array<ArrayBuffer>>();
  readonly #began = performance.now();
  #over = false;
  #replicates = 0;
  #steps = 0;
  #households = 0;
  #next = 0;
  #ran = 0;
  #done = 0;
  #pace = new Pace(0);

  constructor(request: RunRequest, events: RunEvents) {
    this.#request = request;
    this.#events = events;
    this.#start();
  }

  end(): void {
    this.#over = true;
    for (const worker of this.#workers) worker.terminate();
  }

  #start(): Worker {
    const worker = new Worker(new URL('./engine.worker.ts', import.meta.url), { type: 'module' });
    this.#workers.push(worker);
    worker.onmessage = (event: MessageEvent<EngineReply>) => {
      if (!this.#over) this.#heard(worker, event.data);
    };
    worker.onerror = (event) => this.#failed(event.message || 'the engine could not be started');
    this.#ask(worker, { kind: 'read', yaml: this.#request.yaml, files: this.#request.files });
    return worker;
  }

  #ask(worker: Worker, request: EngineRequest, transfer: Transferable[] = []): void {
    worker.postMessage(request, transfer);
  }

  #heard(worker: Worker, reply: EngineReply): void {
    switch (reply.kind) {
      case 'ready':
        if (this.#replicates === 0) this.#begin(reply);
        this.#give(worker);
        return;
      case 'steps':
        this.#done += reply.steps;
        this.#tell();
        return;
      case 'ran':
        for (const [name, bytes] of reply.parts) this.#parts.set(name, bytes);
        this.#ran++;
        this.#after(worker, reply.replicate);
        return;
      case 'assembled':
        this.#assembled(worker, reply.files, reply.replicates === this.#replicates);
        return;
      case 'problems':
        this.end();
        this.#events.problems(reply.problems);
        return;
      case 'failed':
        this.#failed(reply.message);
    }
  }

  /** The first worker has read the study: the others can start. */
  #begin(ready: Extract<EngineReply, { kind: 'ready' }>): void {
    this.#replicates = ready.replicates;
    this.#steps = ready.steps;
    this.#households = ready.households;
    this.#pace = new Pace(ready.households * ready.steps * ready.replicates);
    this.#pace.see(0, performance.now());
    const processors = this.#request.workers ?? Math.max(1, (navigator.hardwareConcurrency || 2) - 1);
    const fit = Math.max(1, Math.floor(WORK_BYTES / ready.work));
    const wanted = Math.min(processors, fit, ready.replicates, MOST_WORKERS);
    while (this.#workers.length < wanted) this.#start();
  }

  /** The next replicate for a worker that has nothing to do. */
  #give(worker: Worker): void {
    if (this.#next < this.#replicates) this.#ask(worker, { kind: 'run', replicate: this.#next++ });
  }

  #after(worker: Worker, replicate: number): void {
    if (this.#ran === this.#replicates) {
      this.#events.progress(SIMULATING, 'writing the tables');
      const parts = this.#parts;
      this.#ask(
        worker,
        { kind: 'assemble', parts, replicates: this.#replicates, seconds: this.#seconds },
        [...parts.values()].map((bytes) => bytes.buffer),
      );
      return;
    }
    if (replicate === 0) {
      // a copy: the parts are needed again at the end
      this.#ask(worker, { kind: 'assemble', parts: this.#parts0(), replicates: 1, seconds: this.#seconds });
      return;
    }
    this.#give(worker);
  }

  /** Parts of the first replicate, which another may already have joined. */
  #parts0(): Files {
    return new Map([...this.#parts].filter(([name]) => name.startsWith('parts/r00000')));
  }

  get #seconds(): number {
    return (performance.now() - this.#began) / 1000;
  }

  #tell(): void {
    this.#pace.see(this.#done * this.#households, performance.now());
    const share = this.#done / (this.#steps * this.#replicates);
    this.#events.progress(SIMULATING * share, this.#pace.words());
  }

  #assembled(worker: Worker, files: Files, whole: boolean): void {
    if (whole) this.end();
    else this.#give(worker);
    openFolder(memorySource(files), 'page').then(
      (source) => {
        // a later, whole result or a cancel has overtaken a first one
        if (whole || !this.#over) this.#events.arrived(source, files, whole);
      },
      (error: unknown) => this.#failed(error instanceof Error ? error.message : String(error)),
    );
  }

  #failed(message: string): void {
    if (this.#over && this.#ran < this.#replicates) return;
    this.end();
    this.#events.failed(message);
  }
}
