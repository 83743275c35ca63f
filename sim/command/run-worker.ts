/**
 * A worker of the pool: runs whole replicates and writes their parts.
 */
import { workerData } from 'piscina';
import { InputError, type Problem, RunError } from '../../network/errors.js';
import type { Facts } from '../results/facts.js';
import { folderStore } from '../results/folder.js';
import { runReplicate } from '../results/run-replicate.js';
import type { Prepared } from '../study/replicate.js';

/** Set once a worker. */
export interface WorkerSetup {
  readonly prepared: Prepared;
  readonly facts: Facts;
  readonly folder: string;
  /** One counter, shared by all workers: generations of an arm simulated so far. */
  readonly done: Int32Array;
}

/** How a replicate ended. Errors of ours travel as data: classes do not survive the way between threads. */
export type Outcome =
  | { readonly ok: true; readonly replicate: number }
  | { readonly ok: false; readonly replicate: number; readonly problems: readonly Problem[] }
  | { readonly ok: false; readonly replicate: number; readonly failed: string };

export default function runOne(replicate: number): Outcome {
  const { prepared, facts, folder, done } = workerData as WorkerSetup;
  try {
    runReplicate(prepared, facts, folderStore(folder), replicate, () => Atomics.add(done, 0, 1));
    return { ok: true, replicate };
  } catch (error) {
    if (error instanceof InputError) return { ok: false, replicate, problems: error.problems };
    if (error instanceof RunError) return { ok: false, replicate, failed: error.message };
    throw error;
  }
}
