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
import { countLanes, dealMarks, LANES } from './lanes.js';
import type { PermutationPlan } from './permutations.js';

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
  const holders = householdsWith(frustrated);
  const longHolders = householdsWith(long);
  const frustratedWord = new Int32Array(n);
  const longWord = new Int32Array(n);
  const coreWord = new Int32Array(n);
  const coreCount = new Uint32Array(LANES);
  const limits = new Uint32Array(LANES);
  const search = new LargestComponent(ties, coreWord);

  const ascending = Float64Array.from(sizes).sort();
  const reached = new Uint32Array(sizes.length);
  let coreReached = 0;
  const enough = Math.ceil(0.1 * (count + 1));
  let drawn = 0;
  while (drawn < count) {
    const lanes = Math.min(LANES, count - drawn);
    frustratedWord.fill(0);
    longWord.fill(0);
    for (let lane = 0; lane < lanes; lane++) {
      const order = plan.list(drawn + lane);
      dealMarks(frustratedWord, order, holders, 1 << lane);
      dealMarks(longWord, order, longHolders, 1 << lane);
    }
    coreWords(ties, frustratedWord, longWord, needed, coreWord);
    countLanes(coreWord, n, coreCount);
    let flooded = 0;
    for (let lane = 0; lane < lanes; lane++) {
      if (coreCount[lane] >= cores) coreReached++;
      // no pocket can be larger than the number of core households: sizes beyond it need no search
      limits[lane] = 0;
      for (const size of ascending) if (size <= coreCount[lane]) limits[lane] = size;
      if (limits[lane] >= WORTH_A_FLOOD) flooded |= 1 << lane;
    }
    search.flood(flooded);
    for (let lane = 0; lane < lanes; lane++) {
      if (limits[lane] === 0) continue;
      const size = search.upTo(lane, limits[lane], coreCount[lane]);
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

function householdsWith(mark: Uint8Array): Uint32Array {
  const list = new Uint32Array(mark.length);
  let count = 0;
  for (let i = 0; i < mark.length; i++) if (mark[i] === 1) list[count++] = i;
  return list.subarray(0, count);
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

/** Sizes from which flooding 32 permutations at once beats searching each until a set of that size is found. */
const WORTH_A_FLOOD = 40;

/**
 * Largest connected sets of core households, searched no further than asked.
 *
 * Where core households are many they percolate, and one search would walk nearly all of them in every permutation. So
 * one component of each permutation (most likely the giant one) is flooded in all 32 together first.
 */
class LargestComponent {
  readonly #ties: Ties;
  readonly #words: Int32Array;
  /** Households the flood reached, by permutation. */
  readonly #reach: Int32Array;
  readonly #reachCount = new Uint32Array(LANES);
  readonly #seen: Int32Array;
  readonly #stack: Uint32Array;
  #stamp = 0;

  constructor(ties: Ties, words: Int32Array) {
    this.#ties = ties;
    this.#words = words;
    this.#reach = new Int32Array(ties.n);
    this.#seen = new Int32Array(ties.n);
    this.#stack = new Uint32Array(ties.n);
  }

  /** Floods one component of each permutation in `mask`; forgets earlier floods. */
  flood(mask: number): void {
    const { n, start, target } = this.#ties;
    const words = this.#words;
    const reach = this.#reach;
    reach.fill(0);
    this.#reachCount.fill(0);
    if (mask === 0) return;
    // start from the first core household of each permutation past the middle: any will do
    let unseeded = mask;
    for (let k = 0, i = n >>> 1; k < n && unseeded !== 0; k++, i = i + 1 === n ? 0 : i + 1) {
      const seed = words[i] & unseeded;
      reach[i] |= seed;
      unseeded &= ~seed;
    }
    // sweep up and down until nothing changes
    for (let changed = true, up = true; changed; up = !up) {
      changed = false;
      for (let k = 0; k < n; k++) {
        const i = up ? k : n - 1 - k;
        const open = words[i] & mask & ~reach[i];
        if (open === 0) continue;
        let near = 0;
        for (let e = start[i], end = start[i + 1]; e < end; e++) near |= reach[target[e]];
        if ((near & open) === 0) continue;
        reach[i] |= near & open;
        changed = true;
      }
    }
    countLanes(reach, n, this.#reachCount);
  }

  /**
   * Largest size, or `limit` as soon as a set of that size is certain.
   *
   * @param cores - core households in this permutation
   */
  upTo(lane: number, limit: number, cores: number): number {
    const { n, start, target } = this.#ties;
    const words = this.#words;
    const reach = this.#reach;
    const seen = this.#seen;
    const stack = this.#stack;
    const stamp = ++this.#stamp;
    const bit = 1 << lane;
    let largest = this.#reachCount[lane];
    let left = cores - largest;
    for (let i = 0; i < n && largest < limit && left > largest; i++) {
      if ((words[i] & ~reach[i] & bit) === 0 || seen[i] === stamp) continue;
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
      left -= size;
      if (size > largest) largest = size;
    }
    return Math.min(largest, limit);
  }
}
