/**
 * The engine's inner loops as a WebAssembly module: draws, shocks and planned choices by columns.
 *
 * Same bits as the TypeScript they mirror (assembly/kernel.ts says which; tested), two to five times as fast. Where a
 * host forbids WebAssembly (a content security policy without 'wasm-unsafe-eval'), `kernel()` is null and callers use
 * the TypeScript. The one instance of a thread keeps nothing between calls but tables: every call sets what it reads.
 */
import { TABLES } from '../../network/elementary.js';
import { KERNEL_BYTES } from './bytes.js';
import { instantiate } from './host.js';

/** Households a column of the kernel holds. */
export const CHUNK = 1024;

/** Columns of length CHUNK that live in the kernel's memory. */
export interface Kernel {
  /** In and out of draws and shocks. */
  readonly draws: Float64Array;
  /** The shared part of shocks. */
  readonly common: Float64Array;
  readonly wealth: Float64Array;
  readonly childWeight: Float64Array;
  readonly aspirations: readonly Float64Array[];
  readonly planned: Float64Array;
  readonly investment: Float64Array;
  readonly consumption: Float64Array;
  readonly childWealth: Float64Array;
  readonly met: Uint8Array;
  readonly reached: Uint8Array;
  /** Growth table: 6 coefficients a cell, at most 1024 cells. */
  readonly growth: Float64Array;
  /** Milestone weights, length 4. */
  readonly weights: Float64Array;
  readonly call: Calls;
}

/** The module's functions; the source documents them. Booleans are 0 and 1. */
export interface Calls {
  exp(x: number): number;
  log(x: number): number;
  draw(
    normals: number,
    first: number,
    count: number,
    generation: number,
    replicate: number,
    purpose: number,
    low: number,
    high: number,
  ): void;
  shocks(count: number, own: number, shift: number): void;
  sharedShocks(count: number, own: number, shared: number, shift: number): void;
  setProblem(
    linear: number,
    threshold: number,
    scale: number,
    alpha: number,
    kept: number,
    sigma: number,
    eta: number,
    lambda: number,
    milestones: number,
  ): void;
  choose(count: number): void;
  chooseByTable(count: number, cells: number, threshold: number, low: number, grossReturn: number): void;
  outcome(count: number, milestones: number): void;
}

interface Exports extends Calls {
  readonly memory: { readonly buffer: ArrayBuffer };
  setConstants(ln2High: number, ln2Low: number, stepHigh: number, stepLow: number, perStep: number): void;
}

let instance: Kernel | null | undefined;

/** This thread's kernel, made at the first call; null where the host does not allow it. */
export function kernel(): Kernel | null {
  if (instance === undefined) instance = makeKernel();
  return instance;
}

function makeKernel(): Kernel | null {
  const exports = instantiate<Exports>(KERNEL_BYTES);
  if (exports === null) return null;
  const memory = exports.memory.buffer;
  // addresses of assembly/kernel.ts
  const column = (index: number): Float64Array => new Float64Array(memory, 24576 + index * CHUNK * 8, CHUNK);
  new Float64Array(memory, 1024, TABLES.log.length).set(TABLES.log);
  new Float64Array(memory, 5184, TABLES.exp.length).set(TABLES.exp);
  new Float64Array(memory, 7232, TABLES.powerOfTwo.length).set(TABLES.powerOfTwo);
  exports.setConstants(TABLES.ln2High, TABLES.ln2Low, TABLES.stepHigh, TABLES.stepLow, TABLES.perStep);
  return {
    draws: column(8),
    common: column(9),
    consumption: column(10),
    childWealth: column(11),
    wealth: column(0),
    childWeight: column(1),
    planned: column(2),
    investment: column(3),
    aspirations: [column(4), column(5), column(6), column(7)],
    met: new Uint8Array(memory, 24576 + 12 * CHUNK * 8, CHUNK),
    reached: new Uint8Array(memory, 24576 + 12 * CHUNK * 8 + CHUNK, CHUNK),
    growth: new Float64Array(memory, 131072, 6 * 1024),
    weights: new Float64Array(memory, 23616, 4),
    call: exports,
  };
}
