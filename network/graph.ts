/**
 * The social graph as compressed sparse rows on typed arrays: who has ties to whom.
 *
 * Households are indices 0 … n−1; ids of files live in exchange/. Ties are undirected and simple (no loop,
 * no second tie between the same two), so every tie is stored at both of its ends. Knows nothing of wealth.
 */
import { ShapeError } from './errors.js';

/** Undirected simple graph. The row of household i is `target[start[i] … start[i+1]−1]`, ascending. */
export interface Ties {
  /** Number of households. */
  readonly n: number;
  /** Row offsets, length n + 1. */
  readonly start: Uint32Array;
  /** Neighbours, ascending within each row, length 2 × ties ("tie ends"). */
  readonly target: Uint32Array;
  /** Weight of each tie end (the same at both ends), ≥ 0, or null when all ties weigh 1. */
  readonly weight: Float64Array | null;
}

/** A uniform draw on [0, 1) each call: a seeded stream passed in by the caller, never `Math.random`. */
export type Uniform = () => number;

/** What network builders and measures may know of households: labels and a value, never the model. */
export interface Labels {
  readonly n: number;
  /** Place (village, neighbourhood, school) of each household, 0 … places−1. */
  readonly place: Uint32Array;
  /** Social group of each household, 0 … groups−1. */
  readonly group: Uint32Array;
  /** Wealth, used for ranks and similarity only. */
  readonly wealth: Float64Array;
}

/** Number of ties. */
export function tieCount(ties: Ties): number {
  return ties.target.length / 2;
}

/**
 * Builds a graph from tie ends listed once each.
 *
 * @param n - households
 * @param source - one end of each tie, length m, each in 0 … n−1
 * @param target - the other end, length m; no loops, no tie listed twice (not checked: callers own that)
 * @param weight - weight of each tie, length m, or null
 * @returns ties with ascending rows. Cost O(n + m) by two counting passes.
 */
export function fromPairs(n: number, source: Uint32Array, target: Uint32Array, weight: Float64Array | null): Ties {
  const m = source.length;
  if (target.length !== m) throw new ShapeError('target', target.length, m, 'one value per tie');
  if (weight !== null && weight.length !== m) throw new ShapeError('weight', weight.length, m, 'one value per tie');
  const start = new Uint32Array(n + 1);
  for (let e = 0; e < m; e++) {
    start[source[e] + 1]++;
    start[target[e] + 1]++;
  }
  for (let i = 0; i < n; i++) start[i + 1] += start[i];
  // first pass: any order within a row
  const ends = new Uint32Array(2 * m);
  const tie = new Uint32Array(2 * m);
  const fill = start.slice(0, n);
  for (let e = 0; e < m; e++) {
    const s = source[e];
    const t = target[e];
    let at = fill[s]++;
    ends[at] = t;
    tie[at] = e;
    at = fill[t]++;
    ends[at] = s;
    tie[at] = e;
  }
  // second pass: visiting rows in ascending order fills every row ascending (a transposition)
  const out = new Uint32Array(2 * m);
  const outWeight = weight === null ? null : new Float64Array(2 * m);
  fill.set(start.subarray(0, n));
  for (let i = 0; i < n; i++) {
    for (let e = start[i]; e < start[i + 1]; e++) {
      const at = fill[ends[e]]++;
      out[at] = i;
      if (outWeight !== null) outWeight[at] = weight![tie[e]];
    }
  }
  return { n, start, target: out, weight: outWeight };
}

/** Each tie once (source < target), ordered by source then target, with its weight. */
export function toPairs(ties: Ties): { source: Uint32Array; target: Uint32Array; weight: Float64Array | null } {
  const m = tieCount(ties);
  const source = new Uint32Array(m);
  const target = new Uint32Array(m);
  const weight = ties.weight === null ? null : new Float64Array(m);
  let at = 0;
  for (let i = 0; i < ties.n; i++) {
    for (let e = ties.start[i]; e < ties.start[i + 1]; e++) {
      const j = ties.target[e];
      if (j <= i) continue;
      source[at] = i;
      target[at] = j;
      if (weight !== null) weight[at] = ties.weight![e];
      at++;
    }
  }
  return { source, target, weight };
}

/** True when i and j share a tie. Cost O(log degree). */
export function hasTie(ties: Ties, i: number, j: number): boolean {
  let low = ties.start[i];
  let high = ties.start[i + 1] - 1;
  while (low <= high) {
    const middle = (low + high) >>> 1;
    const v = ties.target[middle];
    if (v === j) return true;
    if (v < j) low = middle + 1;
    else high = middle - 1;
  }
  return false;
}

/** Degrees, length n. */
export function degrees(ties: Ties): Uint32Array {
  const out = new Uint32Array(ties.n);
  for (let i = 0; i < ties.n; i++) out[i] = ties.start[i + 1] - ties.start[i];
  return out;
}
