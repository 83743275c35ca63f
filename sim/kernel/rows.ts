/**
 * Mean and upward mean over ties as a WebAssembly module: about twice as fast as the TypeScript in row-statistic.ts, and
 * the same bits (tested). Null where the host does not allow it.
 *
 * One instance a thread holds a copy of the ties it was last asked about (4 bytes a tie end) and of wealth (8 bytes a
 * household); asking about other ties copies those. It keeps that memory until then.
 */
import { ROWS_BYTES } from './bytes.js';
import { instantiate } from './host.js';

interface Exports {
  readonly memory: { readonly buffer: ArrayBuffer; grow(pages: number): number };
  means(
    upward: number,
    count: number,
    start: number,
    target: number,
    wealth: number,
    own: number,
    out: number,
    scale: number,
    selfWeight: number,
    common: number,
    weight: number,
  ): void;
}

/** Households a call serves. */
const CHUNK = 4096;
const PAGE = 65536;
// addresses in bytes: row offsets of a chunk, its results, then targets and wealth of everyone
const START = 1024;
const OUT = START + 4 * (CHUNK + 2);
const TARGET = OUT + 8 * CHUNK;

class RowKernel {
  private readonly module: Exports;
  private owner: Uint32Array | null;
  private start: Uint32Array;
  private out: Float64Array;
  private wealth: Float64Array;

  constructor(module: Exports) {
    this.module = module;
    this.owner = null;
    this.start = new Uint32Array(0);
    this.out = new Float64Array(0);
    this.wealth = new Float64Array(0);
  }

  /** Mean, or mean of the richer, over each row; own wealth where there are none. False if memory ran out. */
  means(upward: boolean, start: Uint32Array, target: Uint32Array, wealth: Float64Array, out: Float64Array): boolean {
    return this.mixes(upward, start, target, wealth, 1, 0, 0, 1, out);
  }

  /** scale·(selfWeight·y_i + common + weight·mean_i), mean as in `means`. False if memory ran out. */
  mixes(
    upward: boolean,
    start: Uint32Array,
    target: Uint32Array,
    wealth: Float64Array,
    scale: number,
    selfWeight: number,
    common: number,
    weight: number,
    out: Float64Array,
  ): boolean {
    const n = wealth.length;
    if ((this.owner !== target || this.wealth.length !== n) && !this.load(target, n)) return false;
    this.wealth.set(wealth);
    const at = this.wealth.byteOffset;
    for (let first = 0; first < n; first += CHUNK) {
      const count = Math.min(CHUNK, n - first);
      this.start.set(start.subarray(first, first + count + 1));
      this.module.means(
        upward ? 1 : 0,
        count,
        START,
        TARGET,
        at,
        at + 8 * first,
        OUT,
        scale,
        selfWeight,
        common,
        weight,
      );
      out.set(count === CHUNK ? this.out : this.out.subarray(0, count), first);
    }
    return true;
  }

  private load(target: Uint32Array, n: number): boolean {
    const { memory } = this.module;
    const wealthAt = (TARGET + 4 * target.length + 7) & ~7;
    const missing = wealthAt + 8 * n - memory.buffer.byteLength;
    this.owner = null;
    // addresses are 32 bits, and the masks above work on 31
    if (wealthAt + 8 * n > 0x7fffffff) return false;
    try {
      if (missing > 0) memory.grow(Math.ceil(missing / PAGE));
    } catch {
      return false;
    }
    const { buffer } = memory;
    new Uint32Array(buffer, TARGET, target.length).set(target);
    this.start = new Uint32Array(buffer, START, CHUNK + 1);
    this.out = new Float64Array(buffer, OUT, CHUNK);
    this.wealth = new Float64Array(buffer, wealthAt, n);
    this.owner = target;
    return true;
  }
}

let instance: RowKernel | null | undefined;

/** This thread's row kernel, made at the first call; null where the host does not allow it. */
export function rowKernel(): RowKernel | null {
  if (instance === undefined) {
    const module = instantiate<Exports>(ROWS_BYTES);
    instance = module === null ? null : new RowKernel(module);
  }
  return instance;
}
