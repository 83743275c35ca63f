/**
 * Every draw of a study: a function of (study seed, replicate, purpose, household, generation) and of nothing else.
 *
 * Arms share each household's luck (common random numbers), results do not depend on the order of households or the
 * number of threads, and one household's history can be drawn again alone. One call of the generator gives 128 bits
 * and serves the two households 2h and 2h + 1. Sequential work (drawing a graph) uses stream.ts instead.
 */
import { CHUNK, type Kernel, kernel } from '../kernel/kernel.js';
import { normalQuantile } from './normal.js';
import { philox } from './philox.js';

/** What a draw is for. Numbers are part of the counter: never reuse one, add at the end. */
export const PURPOSES = {
  householdShock: 1,
  placeShock: 2,
  initialWealth: 3,
  initialPlaceWealth: 4,
  childWeight: 5,
  groupLabel: 6,
  placeLabel: 7,
  resample: 8,
  treatment: 9,
  tieChange: 10,
} as const;

export type Purpose = keyof typeof PURPOSES;

const MASK = (1n << 64n) - 1n;

/**
 * 64-bit key of a seed string: FNV-1a over its UTF-16 code units (low byte, high byte), then the 64-bit finaliser of
 * MurmurHash3 (Appleby), so that seeds which differ in one character share no more bits than chance.
 *
 * @returns low and high word as unsigned 32-bit integers
 */
export function seedKey(seed: string): [low: number, high: number] {
  let h = 0xcbf29ce484222325n;
  for (let i = 0; i < seed.length; i++) {
    const unit = seed.charCodeAt(i);
    h = ((h ^ BigInt(unit & 0xff)) * 0x100000001b3n) & MASK;
    h = ((h ^ BigInt(unit >>> 8)) * 0x100000001b3n) & MASK;
  }
  h ^= h >> 33n;
  h = (h * 0xff51afd7ed558ccdn) & MASK;
  h ^= h >> 33n;
  h = (h * 0xc4ceb9fe1a85ec53n) & MASK;
  h ^= h >> 33n;
  return [Number(h & 0xffffffffn), Number(h >> 32n)];
}

/** 52 bits of two words to the middle of one of 2^52 equal cells of (0, 1): never 0, never 1, symmetric about ½. */
function toUniform(high: number, low: number): number {
  return ((high >>> 6) * 67108864 + (low >>> 6) + 0.5) * 2.220446049250313e-16;
}

/** The draws of one replicate. */
export class Draws {
  private readonly low: number;
  private readonly high: number;
  private readonly replicate: number;
  private readonly words: Int32Array;

  /**
   * @param seed - the study's seed, any string
   * @param replicate - 0 … 2^32 − 1
   */
  constructor(seed: string, replicate: number) {
    const [low, high] = seedKey(seed);
    this.low = low | 0;
    this.high = high | 0;
    this.replicate = replicate | 0;
    this.words = new Int32Array(4);
  }

  /** Fills out[i] with household i's uniform on (0, 1). Cost O(n), no allocation. */
  uniforms(purpose: Purpose, generation: number, out: Float64Array): void {
    this.fill(false, purpose, generation, out);
  }

  /** Fills out[i] with household i's standard normal: the quantile of the uniform of the same arguments. */
  normals(purpose: Purpose, generation: number, out: Float64Array): void {
    this.fill(true, purpose, generation, out);
  }

  private fill(normals: boolean, purpose: Purpose, generation: number, out: Float64Array): void {
    const compiled = kernel();
    const n = out.length;
    if (compiled === null) {
      this.fillPlainly(normals, purpose, generation, out);
      return;
    }
    for (let first = 0; first < n; first += CHUNK) {
      const count = Math.min(CHUNK, n - first);
      this.chunk(compiled, normals, purpose, generation, first, count);
      out.set(count === CHUNK ? compiled.draws : compiled.draws.subarray(0, count), first);
    }
  }

  /** Leaves the draws of households first … first + count − 1 in the kernel's `draws`; `first` even, count ≤ CHUNK. */
  chunk(compiled: Kernel, normals: boolean, purpose: Purpose, generation: number, first: number, count: number): void {
    const { low, high, replicate } = this;
    compiled.call.draw(normals ? 1 : 0, first, count, generation, replicate, PURPOSES[purpose], low, high);
  }

  /** The same draws without the kernel. */
  fillPlainly(normals: boolean, purpose: Purpose, generation: number, out: Float64Array): void {
    const { low, high, replicate, words } = this;
    const use = PURPOSES[purpose];
    const n = out.length;
    for (let i = 0; i < n; i += 2) {
      philox(i >>> 1, generation, replicate, use, low, high, words);
      out[i] = toUniform(words[0], words[1]);
      if (i + 1 < n) out[i + 1] = toUniform(words[2], words[3]);
    }
    if (normals) for (let i = 0; i < n; i++) out[i] = normalQuantile(out[i]);
  }

  /** One household's uniform, the same bits as `uniforms` gives it. */
  uniform(purpose: Purpose, generation: number, household: number): number {
    const words = this.words;
    philox(household >>> 1, generation, this.replicate, PURPOSES[purpose], this.low, this.high, words);
    return household & 1 ? toUniform(words[2], words[3]) : toUniform(words[0], words[1]);
  }

  /** One household's standard normal, the same bits as `normals` gives it. */
  normal(purpose: Purpose, generation: number, household: number): number {
    return normalQuantile(this.uniform(purpose, generation, household));
  }
}
