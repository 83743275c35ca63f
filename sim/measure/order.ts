/**
 * Putting numbers in order: the permutation that sorts them, and average ranks.
 *
 * A stable radix sort on the bits of the doubles, so that a million values take linear time and every engine
 * gives the same order. Does not know what the numbers mean.
 */
import { ShapeError } from '../../network/errors.js';

const DIGIT_BITS = 11;
const BUCKETS = 1 << DIGIT_BITS;
const PASSES = 6;
/** Below this length insertion sort beats clearing the radix histograms. */
const SHORT = 96;

/**
 * Row numbers in ascending order of value; rows of equal value keep their order. Negative zero counts as zero.
 *
 * @param values - length n, finite
 * @returns row numbers, length n, smallest value first. Cost O(n), scratch 20 bytes a value.
 * @throws {RangeError} if a value is NaN or infinite
 */
export function orderOf(values: ArrayLike<number>): Uint32Array {
  const n = values.length;
  const order = new Uint32Array(n);
  for (let i = 0; i < n; i++) {
    const v = values[i];
    if (v - v !== 0) throw new RangeError(`value ${i} is ${v}; measures need finite numbers`);
    order[i] = i;
  }
  if (n <= SHORT) {
    for (let i = 1; i < n; i++) {
      const v = values[i];
      let j = i - 1;
      while (j >= 0 && values[order[j]] > v) {
        order[j + 1] = order[j];
        j--;
      }
      order[j + 1] = i;
    }
    return order;
  }
  // keys whose unsigned order is the order of the doubles: flip the sign bit, and all bits of negatives
  const bits = new Float64Array(n);
  for (let i = 0; i < n; i++) bits[i] = values[i] + 0;
  const key = new Uint32Array(bits.buffer);
  const histogram = new Uint32Array(PASSES * BUCKETS);
  for (let i = 0; i < n; i++) {
    let low = key[2 * i];
    let high = key[2 * i + 1];
    if (high >>> 31 === 1) {
      low = ~low >>> 0;
      high = ~high >>> 0;
    } else {
      high = (high | 0x80000000) >>> 0;
    }
    key[2 * i] = low;
    key[2 * i + 1] = high;
    for (let pass = 0; pass < PASSES; pass++) histogram[pass * BUCKETS + digit(low, high, pass)]++;
  }
  let from: Uint32Array = order;
  let to: Uint32Array = new Uint32Array(n);
  const offset = new Uint32Array(BUCKETS);
  for (let pass = 0; pass < PASSES; pass++) {
    const base = pass * BUCKETS;
    let total = 0;
    let alone = false;
    for (let b = 0; b < BUCKETS; b++) {
      const count = histogram[base + b];
      if (count === n) alone = true;
      offset[b] = total;
      total += count;
    }
    // a digit shared by every value leaves the order as it is
    if (alone) continue;
    for (let k = 0; k < n; k++) {
      const i = from[k];
      to[offset[digit(key[2 * i], key[2 * i + 1], pass)]++] = i;
    }
    const swap = from;
    from = to;
    to = swap;
  }
  return from;
}

/** The eleven-bit digit number `pass` (0 = lowest) of a 64-bit key. */
function digit(low: number, high: number, pass: number): number {
  switch (pass) {
    case 0:
      return low & 0x7ff;
    case 1:
      return (low >>> 11) & 0x7ff;
    case 2:
      return (low >>> 22) | ((high & 1) << 10);
    case 3:
      return (high >>> 1) & 0x7ff;
    case 4:
      return (high >>> 12) & 0x7ff;
    default:
      return high >>> 23;
  }
}

/**
 * Ranks 1 … n, tied values sharing the average of the ranks they take up.
 *
 * @param values - length n, finite
 * @param order - `orderOf(values)` when the caller has it already
 * @returns ranks by row, length n. Cost O(n).
 */
export function averageRanks(values: ArrayLike<number>, order: Uint32Array = orderOf(values)): Float64Array {
  const n = values.length;
  if (order.length !== n) throw new ShapeError('order', order.length, n, 'one row number per value');
  const rank = new Float64Array(n);
  for (let from = 0; from < n; ) {
    const v = values[order[from]];
    let to = from + 1;
    while (to < n && values[order[to]] === v) to++;
    const shared = (from + 1 + to) / 2;
    for (let k = from; k < to; k++) rank[order[k]] = shared;
    from = to;
  }
  return rank;
}

/**
 * Ranks on the scale 0 … 1: (average rank − 1)/(n − 1), and ½ when there is only one value.
 *
 * @returns by row, length n. This is the panel's `wealth_rank`.
 */
export function unitRanks(values: ArrayLike<number>, order?: Uint32Array): Float64Array {
  const rank = order === undefined ? averageRanks(values) : averageRanks(values, order);
  const n = rank.length;
  for (let i = 0; i < n; i++) rank[i] = n > 1 ? (rank[i] - 1) / (n - 1) : 0.5;
  return rank;
}

/**
 * Bins 0 … k−1 of equal numbers by rank, ties staying together: floor(k (average rank − ½)/n).
 *
 * @param rank - average ranks 1 … n, as `averageRanks` gives them
 * @param k - number of bins, 5 for quintiles
 * @returns bin by row, length n
 */
export function rankBins(rank: ArrayLike<number>, k: number): Uint8Array | Uint16Array {
  const n = rank.length;
  const bin = k <= 256 ? new Uint8Array(n) : new Uint16Array(n);
  for (let i = 0; i < n; i++) bin[i] = Math.min(k - 1, Math.floor((k * (rank[i] - 0.5)) / n));
  return bin;
}
