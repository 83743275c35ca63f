/**
 * Permutation p-values of local statistics (local Moran, Getis–Ord), one a household.
 *
 * Given its own value, a household's statistic rises or falls with the sum over its ties, so both statistics have the
 * same conditional permutation p-value: where does that sum stand among sums over as many households drawn from the
 * others? Drawing anew for every household costs n · permutations · degree. Here the draws are shared: for each degree,
 * `permutations` sets of that many households are drawn once, their sums sorted, and every household of that degree
 * looks itself up. A household that is itself in one of the sets has it replaced there by a spare draw, which makes its
 * reference sets an exact simple random sample from the others. Households share draws, so their p-values are each
 * right but not independent of one another, as in any scheme with common draws.
 */
import { ShapeError } from '../errors.js';
import type { Ties, Uniform } from '../graph.js';
import { tiedHouseholds } from './tie-weights.js';

export interface LocalPermutation {
  /** Two-sided p: twice the smaller tail, at most 1; length n, NaN without ties. */
  readonly p: Float64Array<ArrayBuffer>;
  /** +1 where the sum over ties is in the upper half of its reference sums, −1 in the lower. */
  readonly side: Int8Array<ArrayBuffer>;
}

/**
 * @param value - length n, finite
 * @param permutations - reference sets a degree; p is never below 2 / (permutations + 1), and NaN without any
 * @returns see {@link LocalPermutation}. Cost O(different degrees · permutations · degree + n log permutations + m).
 */
export function localPermutation(
  ties: Ties,
  value: Float64Array,
  permutations: number,
  uniform: Uniform,
): LocalPermutation {
  if (value.length !== ties.n) throw new ShapeError('value', value.length, ties.n, 'one value per household');
  const { start, target } = ties;
  const households = tiedHouseholds(ties);
  const n = households.length;
  const p = new Float64Array(ties.n).fill(NaN);
  const side = new Int8Array(ties.n);
  if (permutations === 0) return { p, side };
  const byDegree = new Map<number, number[]>();
  for (const i of households) {
    const k = start[i + 1] - start[i];
    const list = byDegree.get(k);
    if (list === undefined) byDegree.set(k, [i]);
    else list.push(i);
  }
  const position = new Int32Array(ties.n).fill(-1);
  for (let a = 0; a < n; a++) position[households[a]] = a;
  const order = Uint32Array.from({ length: n }, (_, a) => a);
  // sets each household was drawn into, as linked lists
  const head = new Int32Array(n).fill(-1);
  for (const k of [...byDegree.keys()].sort((a, b) => a - b)) {
    const sums = new Float64Array(permutations);
    const spare = new Float64Array(permutations);
    const inSet: number[] = [];
    const next: number[] = [];
    for (let r = 0; r < permutations; r++) {
      // the first k of a shuffle, and one more; with everyone else tied there is no more to draw
      let sum = 0;
      for (let a = 0; a <= k && a < n; a++) {
        const b = a + Math.floor(uniform() * (n - a));
        const held = order[a];
        order[a] = order[b];
        order[b] = held;
        const v = value[households[order[a]]];
        if (a === k) spare[r] = v;
        else {
          sum += v;
          inSet.push(r);
          next.push(head[order[a]]);
          head[order[a]] = inSet.length - 1;
        }
      }
      sums[r] = sum;
    }
    const sorted = sums.slice().sort();
    for (const i of byDegree.get(k) as number[]) {
      let observed = 0;
      let size = 0;
      for (let e = start[i]; e < start[i + 1]; e++) {
        observed += value[target[e]];
        size += Math.abs(value[target[e]]);
      }
      // equal sums added up in another order
      const slack = 1e-12 * size;
      let above = permutations - lowerBound(sorted, observed - slack);
      let below = lowerBound(sorted, observed + slack);
      for (let l = head[position[i]]; l >= 0; l = next[l]) {
        const r = inSet[l];
        const mended = sums[r] - value[i] + spare[r];
        above += (mended >= observed - slack ? 1 : 0) - (sums[r] >= observed - slack ? 1 : 0);
        below += (mended < observed + slack ? 1 : 0) - (sums[r] < observed + slack ? 1 : 0);
      }
      p[i] = Math.min(1, (2 * (Math.min(above, below) + 1)) / (permutations + 1));
      side[i] = above <= below ? 1 : -1;
    }
    for (let a = 0; a < n; a++) head[a] = -1;
  }
  return { p, side };
}

/** How many of the sorted values are below x. */
function lowerBound(sorted: Float64Array, x: number): number {
  let low = 0;
  let high = sorted.length;
  while (low < high) {
    const middle = (low + high) >>> 1;
    if (sorted[middle] < x) low = middle + 1;
    else high = middle;
  }
  return low;
}
