/**
 * Households in an order: by wealth, by place and group, or shuffled. Builders walk these lists.
 */
import type { Labels, Uniform } from '../graph.js';

/** Households from poorest to richest; equal wealth by number. Cost O(n log n). */
export function byWealth(wealth: Float64Array): Uint32Array {
  const n = wealth.length;
  const order = new Uint32Array(n);
  for (let i = 0; i < n; i++) order[i] = i;
  return order.sort((i, j) => wealth[i] - wealth[j] || i - j);
}

/** Shuffles in place (Fisher and Yates). Cost O(n). */
export function shuffle(list: Uint32Array, uniform: Uniform): Uint32Array {
  for (let i = list.length - 1; i > 0; i--) {
    const j = Math.floor(uniform() * (i + 1));
    const held = list[i];
    list[i] = list[j];
    list[j] = held;
  }
  return list;
}

/** Households 0 … n−1, shuffled. */
export function shuffled(n: number, uniform: Uniform): Uint32Array {
  const list = new Uint32Array(n);
  for (let i = 0; i < n; i++) list[i] = i;
  return shuffle(list, uniform);
}

/** Households sorted by place, then group (the smallest first), then number, and where each cell begins. */
export interface Cells {
  /** All households, length n. */
  readonly members: Uint32Array;
  /** Number of places (largest place + 1; some may be empty). */
  readonly places: number;
  /** Place p is `members[placeStart[p] … placeStart[p+1]−1]`. */
  readonly placeStart: Uint32Array;
  /** Cell c is `members[cellStart[c] … cellStart[c+1]−1]`; only cells that have members are listed. */
  readonly cellStart: Uint32Array;
  /** Place p has the cells `placeCells[p] … placeCells[p+1]−1`. */
  readonly placeCells: Uint32Array;
}

/** Sorts households into places and groups by counting. Cost O(n + places + groups). */
export function cells(labels: Labels): Cells {
  const { n, place, group } = labels;
  let places = 0;
  let groups = 0;
  for (let i = 0; i < n; i++) {
    if (place[i] >= places) places = place[i] + 1;
    if (group[i] >= groups) groups = group[i] + 1;
  }
  // two stable counting passes: by group, then by place
  const byGroup = countingSort(null, group, n, groups).list;
  const { list: byPlace, start: placeStart } = countingSort(byGroup, place, n, places);
  const members = new Uint32Array(n);
  const starts: number[] = [];
  const placeCells = new Uint32Array(places + 1);
  for (let p = 0; p < places; p++) {
    placeCells[p] = starts.length;
    const here: { from: number; to: number }[] = [];
    for (let at = placeStart[p]; at < placeStart[p + 1]; at++) {
      if (at === placeStart[p] || group[byPlace[at]] !== group[byPlace[at - 1]]) here.push({ from: at, to: at + 1 });
      else here[here.length - 1].to = at + 1;
    }
    here.sort((a, b) => a.to - a.from - (b.to - b.from) || a.from - b.from);
    let fill = placeStart[p];
    for (const { from, to } of here) {
      starts.push(fill);
      members.set(byPlace.subarray(from, to), fill);
      fill += to - from;
    }
  }
  placeCells[places] = starts.length;
  starts.push(n);
  return { members, places, placeStart, cellStart: Uint32Array.from(starts), placeCells };
}

/** Stable sort of `list` (or 0 … n−1) by a small whole-number key. */
function countingSort(
  list: Uint32Array | null,
  key: Uint32Array,
  n: number,
  kinds: number,
): { list: Uint32Array; start: Uint32Array } {
  const start = new Uint32Array(kinds + 1);
  for (let i = 0; i < n; i++) start[key[i] + 1]++;
  for (let k = 0; k < kinds; k++) start[k + 1] += start[k];
  const fill = start.slice(0, kinds);
  const out = new Uint32Array(n);
  for (let a = 0; a < n; a++) {
    const i = list === null ? a : list[a];
    out[fill[key[i]]++] = i;
  }
  return { list: out, start };
}
