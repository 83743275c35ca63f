/**
 * Sideways positions for the ladder drawing, where height is log wealth: every place a column, poorer to richer.
 *
 * A labelled axis, so it may use places and groups; the map (map.ts) may not. Inside a column groups stand side by side,
 * and inside a group households are spread evenly, in an order that ties pull: starting from a fixed scatter, everyone
 * moves toward the mean of its ties in the cell a few times. Pure arithmetic: the same in every engine.
 */
import { cells } from '../build/order.js';
import type { Labels, Ties } from '../graph.js';
import { median } from '../measure/ranks.js';

/** Share of the width left free between columns. */
const GAP = 0.18;
/** Rounds of pulling: enough to bring tied households together, few enough to keep the scatter of a crowd. */
const ROUNDS = 8;

/** The column of a place on the ladder's sideways axis. */
export interface LadderColumn {
  readonly place: number;
  /** Left and right edge, 0 … 1. */
  readonly from: number;
  readonly to: number;
  /** Median wealth, by which columns are ordered. */
  readonly median: number;
}

export interface Ladder {
  /** Sideways position of each household, 0 … 1, length n. */
  readonly sideways: Float32Array<ArrayBuffer>;
  /** Columns from left to right, poorest place first; places without households have none. */
  readonly columns: readonly LadderColumn[];
}

/**
 * @param ties - who pulls whom; only ties within one place and group do
 * @param labels - places, groups, and the wealth that orders columns
 * @returns see {@link Ladder}; widths in proportion to the square root of a place's households, so that small places
 *   stay visible. Cost O(n log n + m).
 */
export function ladder(ties: Ties, labels: Labels): Ladder {
  const { n, wealth } = labels;
  const { members, places, placeStart, cellStart, placeCells } = cells(labels);
  const medianOf = (from: number, to: number): number =>
    median(Float64Array.from(members.subarray(from, to), (i) => wealth[i]));
  const columns: { place: number; median: number; width: number }[] = [];
  let total = 0;
  for (let p = 0; p < places; p++) {
    const size = placeStart[p + 1] - placeStart[p];
    if (size === 0) continue;
    const width = Math.sqrt(size);
    columns.push({ place: p, median: medianOf(placeStart[p], placeStart[p + 1]), width });
    total += width;
  }
  columns.sort((a, b) => a.median - b.median || a.place - b.place);
  const pulled = pull(ties, labels);
  const sideways = new Float32Array(n);
  const out: LadderColumn[] = [];
  let left = 0;
  for (const { place, median: middle, width } of columns) {
    const share = width / total;
    const from = left + (share * GAP) / 2;
    const to = left + share - (share * GAP) / 2;
    left += share;
    out.push({ place, from, to, median: middle });
    const groups: { from: number; to: number; median: number }[] = [];
    for (let c = placeCells[place]; c < placeCells[place + 1]; c++) {
      groups.push({ from: cellStart[c], to: cellStart[c + 1], median: medianOf(cellStart[c], cellStart[c + 1]) });
    }
    groups.sort((a, b) => a.median - b.median || a.from - b.from);
    const size = placeStart[place + 1] - placeStart[place];
    let rank = 0;
    for (const group of groups) {
      const order = members.slice(group.from, group.to).sort((i, j) => pulled[i] - pulled[j] || i - j);
      for (const i of order) sideways[i] = from + ((rank++ + 0.5) / size) * (to - from);
    }
  }
  return { sideways, columns: out };
}

/** A place on 0 … 1 in its cell for each household: a fixed scatter, drawn together by ties inside the cell. */
function pull(ties: Ties, labels: Labels): Float64Array {
  const { n, place, group } = labels;
  const { start, target } = ties;
  let at = new Float64Array(n);
  for (let i = 0; i < n; i++) at[i] = scatter(i);
  let next = new Float64Array(n);
  for (let round = 0; round < ROUNDS; round++) {
    for (let i = 0; i < n; i++) {
      let sum = at[i];
      let count = 1;
      for (let e = start[i]; e < start[i + 1]; e++) {
        const j = target[e];
        if (place[j] !== place[i] || group[j] !== group[i]) continue;
        sum += at[j];
        count++;
      }
      next[i] = sum / count;
    }
    const held = at;
    at = next;
    next = held;
  }
  return at;
}

/** A number in [0, 1) from a household's number: the finaliser of MurmurHash3 (Appleby, public domain). */
function scatter(i: number): number {
  let h = Math.imul(i + 1, 0x9e3779b1);
  h = Math.imul(h ^ (h >>> 16), 0x85ebca6b);
  h = Math.imul(h ^ (h >>> 13), 0xc2b2ae35);
  return ((h ^ (h >>> 16)) >>> 0) / 4294967296;
}
