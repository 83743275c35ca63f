/**
 * A study run in the page: the worker that runs it, its progress, and its end.
 */
import type { Problem } from '../../network/errors.js';
import { memorySource } from '../../sim/results/bundle.js';
import { openFolder } from '../data/results.js';
import type { Source } from '../data/source.js';
import type { EngineReply, EngineRequest } from './engine.worker.js';

export interface RunEvents {
  progress(done: number, doing: string): void;
  /** The first replicate is there, or all of them (`whole`). */
  arrived(source: Source, files: ReadonlyMap<string, Uint8Array<ArrayBuffer>>, whole: boolean): void;
  problems(problems: readonly Problem[]): void;
  failed(message: string): void;
}

export interface Run {
  cancel(): void;
}

/** Starts a run; a run before it should be cancelled first. */
export function startRun(request: EngineRequest, events: RunEvents): Run {
  const worker = new Worker(new URL('./engine.worker.ts', import.meta.url), { type: 'module' });
  let over = false;
  const end = (): void => {
    over = true;
    worker.terminate();
  };
  worker.onmessage = (event: MessageEvent<EngineReply>) => {
    const reply = event.data;
    if (over) return;
    switch (reply.kind) {
      case 'progress':
        events.progress(reply.done, reply.doing);
        return;
      case 'first':
      case 'done': {
        const whole = reply.kind === 'done';
        openFolder(memorySource(reply.files), 'page').then(
          (source) => {
            if (!over || whole) events.arrived(source, reply.files, whole);
          },
          (error: unknown) => events.failed(error instanceof Error ? error.message : String(error)),
        );
        if (whole) end();
        return;
      }
      case 'problems':
        end();
        events.problems(reply.problems);
        return;
      case 'failed':
        end();
        events.failed(reply.message);
    }
  };
  worker.onerror = (event) => {
    if (over) return;
    end();
    events.failed(event.message || 'the engine could not be started');
  };
  worker.postMessage(request);
  return { cancel: end };
}
