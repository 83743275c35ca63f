/**
 * Counting in 32 permutations at once, one to a bit of a word.
 */

/** Permutations to a word. */
export const LANES = 32;

/**
 * How many words have each bit set.
 *
 * Counts are kept in bit planes (plane p holds bit p of all 32 counts) and eight words at a time are folded into them by
 * carry-save adders (Harley and Seal; see Warren 2012, Hacker's Delight, ch. 5): about six operations a word.
 *
 * @param words - the first `length` are counted
 * @param out - counts by bit, length 32, overwritten
 */
export function countLanes(words: Int32Array, length: number, out: Uint32Array): void {
  let ones = 0;
  let twos = 0;
  let fours = 0;
  const planes = new Int32Array(32);
  let k = 0;
  for (; k + 8 <= length; k += 8) {
    let a = words[k];
    let b = words[k + 1];
    let u = ones ^ a;
    let carryA = (ones & a) | (u & b);
    ones = u ^ b;
    a = words[k + 2];
    b = words[k + 3];
    u = ones ^ a;
    let carryB = (ones & a) | (u & b);
    ones = u ^ b;
    u = twos ^ carryA;
    const fourA = (twos & carryA) | (u & carryB);
    twos = u ^ carryB;
    a = words[k + 4];
    b = words[k + 5];
    u = ones ^ a;
    carryA = (ones & a) | (u & b);
    ones = u ^ b;
    a = words[k + 6];
    b = words[k + 7];
    u = ones ^ a;
    carryB = (ones & a) | (u & b);
    ones = u ^ b;
    u = twos ^ carryA;
    const fourB = (twos & carryA) | (u & carryB);
    twos = u ^ carryB;
    u = fours ^ fourA;
    const eight = (fours & fourA) | (u & fourB);
    fours = u ^ fourB;
    if (eight !== 0) addTo(planes, eight, 3);
  }
  addTo(planes, ones, 0);
  addTo(planes, twos, 1);
  addTo(planes, fours, 2);
  for (; k < length; k++) addTo(planes, words[k], 0);
  for (let lane = 0; lane < LANES; lane++) {
    let count = 0;
    for (let p = 31; p >= 0; p--) count = 2 * count + ((planes[p] >>> lane) & 1);
    out[lane] = count;
  }
}

/** Adds a word of ones at plane p, rippling carries upwards. */
function addTo(planes: Int32Array, word: number, p: number): void {
  let carry = word;
  for (let at = p; carry !== 0; at++) {
    const next = planes[at] & carry;
    planes[at] ^= carry;
    carry = next;
  }
}

/**
 * Sets a bit in the words of the households to which a permutation sends some households.
 *
 * @param order - the permutation: what household h has goes to household `order[h]`
 * @param from - households whose mark travels
 * @param bit - `1 << lane`
 */
export function dealMarks(words: Int32Array, order: Uint16Array | Uint32Array, from: Uint32Array, bit: number): void {
  for (let k = 0; k < from.length; k++) words[order[from[k]]] |= bit;
}
