/**
 * Connected components, of the whole network or of the households marked in it, and degree counts.
 */
import { ShapeError } from '../errors.js';
import type { Ties } from '../graph.js';

export interface Components {
  /** Component of each household, numbered from 0 by their lowest household; −1 for households left out. */
  readonly of: Int32Array;
  /** Households in each component. */
  readonly sizes: Uint32Array;
}

/**
 * Connected components; an isolate is one of its own.
 *
 * @param among - 1 for the households that count, length n; ties to others are not followed. Left out: everyone
 * @returns see {@link Components}. Cost O(n + m).
 */
export function components(ties: Ties, among: ArrayLike<number> | null = null): Components {
  const { n, start, target } = ties;
  if (among !== null && among.length !== n) throw new ShapeError('among', among.length, n, 'one mark per household');
  const of = new Int32Array(n).fill(-1);
  const queue = new Uint32Array(n);
  const sizes: number[] = [];
  for (let s = 0; s < n; s++) {
    if (of[s] >= 0 || (among !== null && among[s] === 0)) continue;
    const id = sizes.length;
    of[s] = id;
    queue[0] = s;
    let end = 1;
    for (let at = 0; at < end; at++) {
      const i = queue[at];
      for (let e = start[i]; e < start[i + 1]; e++) {
        const j = target[e];
        if (of[j] >= 0 || (among !== null && among[j] === 0)) continue;
        of[j] = id;
        queue[end++] = j;
      }
    }
    sizes.push(end);
  }
  return { of, sizes: Uint32Array.from(sizes) };
}

export interface DegreeCounts {
  readonly mean: number;
  readonly max: number;
  readonly min: number;
  /** Variance, denominator n. */
  readonly variance: number;
  readonly isolates: number;
  /** Mean degree of the household at a random tie end, Σk²/Σk: friends have more friends. NaN without ties. */
  readonly endMean: number;
}

/** Degrees in numbers; NaN (max, min: 0) for no households. Cost O(n). */
export function degreeCounts(ties: Ties): DegreeCounts {
  const { n, start } = ties;
  let max = 0;
  let min = n > 0 ? Infinity : 0;
  let squares = 0;
  let isolates = 0;
  for (let i = 0; i < n; i++) {
    const k = start[i + 1] - start[i];
    if (k > max) max = k;
    if (k < min) min = k;
    if (k === 0) isolates++;
    squares += k * k;
  }
  const ends = ties.target.length;
  const mean = ends / n;
  return { mean, max, min, variance: squares / n - mean * mean, isolates, endMean: ends > 0 ? squares / ends : NaN };
}
