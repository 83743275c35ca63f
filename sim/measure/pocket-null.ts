/**
 * Are pockets more than chance? The same statuses dealt out at random over the same ties.
 *
 * With ten ties each and three in ten frustrated, the frustrated form one giant connected set even when frustration
 * falls at random, so size alone proves nothing. The null deals each household's whole status (frustrated, and
 * frustrated for long enough) to another household, both parts together: every permutation keeps the number of
 * frustrated and of long-frustrated households, over everyone or within each place, and recomputes the cores.
 *
 * Thirty-two permutations are worked at once, one to a bit: neighbours are counted in bit planes. Sampling stops early
 * once every statistic has been reached by a tenth of the permutations asked for: no p-value of 0.1 or less is touched
 * by that, and a larger one keeps a relative standard error below √(10/R) (22 % at R = 199).
 */
import type { Ties } from '../../network/graph.js';
import type { PermutationPlan } from './permutations.js';

/** Permutations to a word. */
const LANES = 32;

/** p-values of pockets and of the arm. */
export interface PocketTest {
  /**
   * For each size asked: (1 + permutations whose largest pocket is at least as large) / (1 + permutations drawn).
   * The observed arrangement counts as one of them, so the smallest p is 1/(R + 1).
   */
  readonly sizeP: Float64Array;
  /** The same for the number of core households of the whole arm. */
  readonly coreP: number;
  /** Permutations drawn. */
  readonly drawn: number;
}

/**
 * Permutation test of pocket sizes and of the total number of core households.
 *
 * @param frustrated - 0 or 1 by household
 * @param long - 1 where frustrated for long enough (only where frustrated)
 * @param needed - frustrated ties that make a household core, from `frustratedTiesNeeded`
 * @param sizes - observed pocket sizes, any order
 * @param cores - observed number of core households
 * @param plan - permutations of n households
 * @returns p-values. Cost O((n + ties) R / 32 + R · frustrated + core ties of the permutations).
 */
export function pocketTest(
  ties: Ties,
  frustrated: Uint8Array,
  long: Uint8Array,
  needed: Uint32Array,
  sizes: ArrayLike<number>,
  cores: number,
  plan: PermutationPlan,
): PocketTest {
  const { n } = ties;
  const { count } = plan;
  const holders: number[] = [];
  for (let i = 0; i < n; i++) if (frustrated[i] === 1) holders.push(i);
  const holder = Uint32Array.from(holders);
  const frustratedWord = new Int32Array(n);
  const longWord = new Int32Array(n);
  const coreWord = new Int32Array(n);
  const coreCount = new Uint32Array(LANES);
  const search = new LargestComponent(ties, coreWord);

  let smallest = Infinity;
  let largest = 0;
  for (let k = 0; k < sizes.length; k++) {
    smallest = Math.min(smallest, sizes[k]);
    largest = Math.max(largest, sizes[k]);
  }
  const reached = new Uint32Array(sizes.length);
  let coreReached = 0;
  const enough = Math.ceil(0.1 * (count + 1));
  let drawn = 0;
  while (drawn < count) {
    const lanes = Math.min(LANES, count - drawn);
    frustratedWord.fill(0);
    longWord.fill(0);
    for (let lane = 0; lane < lanes; lane++) {
      const list = plan.list(drawn + lane);
      const bit = 1 << lane;
      for (let h = 0; h < holder.length; h++) {
        const from = holder[h];
        const to = list[from];
        frustratedWord[to] |= bit;
        if (long[from] === 1) longWord[to] |= bit;
      }
    }
    coreWords(ties, frustratedWord, longWord, needed, coreWord);
    countLanes(coreWord, coreCount);
    for (let lane = 0; lane < lanes; lane++) {
      if (coreCount[lane] >= cores) coreReached++;
      // too few core households for any pocket observed: no search needed
      if (coreCount[lane] < smallest) continue;
      const size = search.upTo(lane, largest);
      for (let k = 0; k < reached.length; k++) if (size >= sizes[k]) reached[k]++;
    }
    drawn += lanes;
    if (coreReached >= enough && reached.every((r) => r >= enough)) break;
  }
  return {
    sizeP: Float64Array.from(reached, (r) => (1 + r) / (1 + drawn)),
    coreP: (1 + coreReached) / (1 + drawn),
    drawn,
  };
}

/** Core households of 32 permutations at once: long, and at least `needed` neighbours frustrated. */
function coreWords(
  { n, start, target }: Ties,
  frustrated: Int32Array,
  long: Int32Array,
  needed: Uint32Array,
  out: Int32Array,
): void {
  const planes = new Int32Array(32);
  for (let i = 0; i < n; i++) {
    const candidates = long[i];
    const from = start[i];
    const to = start[i + 1];
    const need = needed[i];
    if (candidates === 0 || need > to - from) {
      out[i] = 0;
      continue;
    }
    if (to - from < 16) {
      // four bit planes in local variables hold counts up to 15
      let p0 = 0;
      let p1 = 0;
      let p2 = 0;
      let p3 = 0;
      for (let e = from; e < to; e++) {
        const w = frustrated[target[e]];
        const c0 = p0 & w;
        p0 ^= w;
        const c1 = p1 & c0;
        p1 ^= c0;
        const c2 = p2 & c1;
        p2 ^= c1;
        p3 ^= c2;
      }
      let equal = -1;
      let above = 0;
      if ((need & 8) !== 0) equal &= p3;
      else {
        above |= equal & p3;
        equal &= ~p3;
      }
      if ((need & 4) !== 0) equal &= p2;
      else {
        above |= equal & p2;
        equal &= ~p2;
      }
      if ((need & 2) !== 0) equal &= p1;
      else {
        above |= equal & p1;
        equal &= ~p1;
      }
      if ((need & 1) !== 0) equal &= p0;
      else {
        above |= equal & p0;
        equal &= ~p0;
      }
      out[i] = candidates & (above | equal);
      continue;
    }
    const depth = 32 - Math.clz32(to - from);
    for (let p = 0; p < depth; p++) planes[p] = 0;
    for (let e = from; e < to; e++) {
      let carry = frustrated[target[e]];
      for (let p = 0; carry !== 0; p++) {
        const next = planes[p] & carry;
        planes[p] ^= carry;
        carry = next;
      }
    }
    let equal = -1;
    let above = 0;
    for (let p = depth - 1; p >= 0; p--) {
      if (((need >>> p) & 1) === 1) equal &= planes[p];
      else {
        above |= equal & planes[p];
        equal &= ~planes[p];
      }
    }
    out[i] = candidates & (above | equal);
  }
}

/** How many words have each bit set. Bit planes again: about three steps a word. */
function countLanes(words: Int32Array, out: Uint32Array): void {
  const planes = new Int32Array(32);
  for (let i = 0; i < words.length; i++) {
    let carry = words[i];
    for (let p = 0; carry !== 0; p++) {
      const next = planes[p] & carry;
      planes[p] ^= carry;
      carry = next;
    }
  }
  for (let lane = 0; lane < LANES; lane++) {
    let count = 0;
    for (let p = 0; p < 32; p++) count += ((planes[p] >>> lane) & 1) * 2 ** p;
    out[lane] = count;
  }
}

/** Size of the largest connected set of core households in one lane, searched no further than asked. */
class LargestComponent {
  readonly #ties: Ties;
  readonly #words: Int32Array;
  readonly #seen: Int32Array;
  readonly #stack: Uint32Array;
  #stamp = 0;

  constructor(ties: Ties, words: Int32Array) {
    this.#ties = ties;
    this.#words = words;
    this.#seen = new Int32Array(ties.n);
    this.#stack = new Uint32Array(ties.n);
  }

  /** Largest size, or `limit` as soon as a set of that size is certain. */
  upTo(lane: number, limit: number): number {
    const { n, start, target } = this.#ties;
    const words = this.#words;
    const seen = this.#seen;
    const stack = this.#stack;
    const stamp = ++this.#stamp;
    const bit = 1 << lane;
    let largest = 0;
    for (let i = 0; i < n; i++) {
      if ((words[i] & bit) === 0 || seen[i] === stamp) continue;
      let size = 0;
      let top = 0;
      stack[top++] = i;
      seen[i] = stamp;
      while (top > 0) {
        const h = stack[--top];
        size++;
        for (let e = start[h]; e < start[h + 1]; e++) {
          const j = target[e];
          if ((words[j] & bit) === 0 || seen[j] === stamp) continue;
          seen[j] = stamp;
          stack[top++] = j;
        }
        // those on the stack belong to the set as well
        if (size + top >= limit) return limit;
      }
      if (size > largest) largest = size;
    }
    return largest;
  }
}
