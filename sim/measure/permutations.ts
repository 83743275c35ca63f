/**
 * Random permutations of households for significance tests, drawn once and used for every generation.
 *
 * Each test stays valid with permutations drawn beforehand, since they know nothing of the statuses; tests of
 * different generations then share their luck, which makes life lines of p-values smoother and costs nothing.
 * Does not test anything.
 */
import type { Uniform } from '../../network/graph.js';

/** Permutations kept in memory up to this many entries (40 MB); beyond that they are drawn anew each time. */
const KEPT_ENTRIES = 20_000_000;

/**
 * R permutations of 0 … n−1, over everyone or within classes.
 *
 * Permutation r is drawn by a Fisher–Yates shuffle from a generator of its own (xoshiro128**, Blackman and Vigna
 * 2021), seeded with four words of the stream given: a named stream sets all of them, and none is a matter of memory.
 */
export class PermutationPlan {
  readonly n: number;
  readonly count: number;
  /** Classes that are kept apart, or null. */
  readonly within: ArrayLike<number> | null;
  readonly #seeds: Uint32Array;
  readonly #kept: (Uint16Array | Uint32Array | undefined)[];
  /** Reused for every permutation when they are too large to keep. */
  #buffer: Uint16Array | Uint32Array | undefined;
  readonly #keep: boolean;
  readonly #classes: { readonly member: Uint32Array; readonly start: Uint32Array } | null;

  /**
   * @param n - households
   * @param count - permutations, R
   * @param uniform - draws 4 R numbers, now
   * @param within - class of each household, 0, 1, …: households trade places inside their class only; null: all do
   */
  constructor(n: number, count: number, uniform: Uniform, within: ArrayLike<number> | null = null) {
    this.n = n;
    this.count = count;
    this.within = within;
    this.#seeds = new Uint32Array(4 * count);
    for (let k = 0; k < this.#seeds.length; k++) this.#seeds[k] = Math.floor(uniform() * 4294967296);
    this.#kept = new Array<undefined>(count).fill(undefined);
    this.#keep = n * count <= KEPT_ENTRIES;
    this.#classes = within === null ? null : classesOf(within, n);
  }

  /**
   * Permutation r as a list: what household k has goes to household `list[k]`.
   *
   * @returns length n; valid until the next call when n · count is too large to keep
   */
  list(r: number): Uint16Array | Uint32Array {
    const known = this.#kept[r];
    if (known !== undefined) return known;
    const { n } = this;
    const list = this.#buffer ?? (n <= 65536 ? new Uint16Array(n) : new Uint32Array(n));
    for (let i = 0; i < n; i++) list[i] = i;
    shuffle(list, this.#seeds, 4 * r, this.#classes);
    if (this.#keep) this.#kept[r] = list;
    else this.#buffer = list;
    return list;
  }
}

function classesOf(within: ArrayLike<number>, n: number): { member: Uint32Array; start: Uint32Array } {
  let classes = 0;
  for (let i = 0; i < n; i++) if (within[i] >= classes) classes = within[i] + 1;
  const start = new Uint32Array(classes + 1);
  for (let i = 0; i < n; i++) start[within[i] + 1]++;
  for (let c = 0; c < classes; c++) start[c + 1] += start[c];
  const fill = start.slice(0, classes);
  const member = new Uint32Array(n);
  for (let i = 0; i < n; i++) member[fill[within[i]]++] = i;
  return { member, start };
}

/** Shuffles in place, with the generator's state in local variables: this is where the time goes. */
function shuffle(
  list: Uint16Array | Uint32Array,
  seeds: Uint32Array,
  at: number,
  classes: { readonly member: Uint32Array; readonly start: Uint32Array } | null,
): void {
  let s0 = seeds[at] | 0;
  let s1 = seeds[at + 1] | 0;
  let s2 = seeds[at + 2] | 0;
  // the generator must not start from all zeros
  let s3 = seeds[at + 3] | 1;
  const parts = classes === null ? 1 : classes.start.length - 1;
  for (let c = 0; c < parts; c++) {
    const from = classes === null ? 0 : classes.start[c];
    const to = classes === null ? list.length : classes.start[c + 1];
    for (let k = to - 1; k > from; k--) {
      const five = Math.imul(s1, 5);
      const word = Math.imul((five << 7) | (five >>> 25), 9) >>> 0;
      const t = s1 << 9;
      s2 ^= s0;
      s3 ^= s1;
      s1 ^= s2;
      s0 ^= s3;
      s2 ^= t;
      s3 = (s3 << 11) | (s3 >>> 21);
      // 32 bits times the range: off from even by less than n/2³²
      const j = from + Math.floor((word / 4294967296) * (k - from + 1));
      const a = classes === null ? k : classes.member[k];
      const b = classes === null ? j : classes.member[j];
      const swap = list[a];
      list[a] = list[b];
      list[b] = swap;
    }
  }
}
