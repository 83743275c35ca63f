/**
 * Triangles, transitivity and average clustering. Tie weights play no part.
 */
import type { Ties } from '../graph.js';

/**
 * Triangles that each household is part of.
 *
 * Every tie is walked from its end of lower degree, so that hubs cost no more than they must (the "forward" scheme of
 * Schank and Wagner 2005).
 *
 * @returns length n; their sum is three times the number of triangles. Cost O(m √m) at worst, O(m · degree) on
 *   networks without hubs; O(n + m) memory.
 */
export function triangles(ties: Ties): Float64Array<ArrayBuffer> {
  const { n, start, target } = ties;
  const out = new Float64Array(n);
  // each tie once, from lower to higher (degree, number)
  const upStart = new Uint32Array(n + 1);
  const up = new Uint32Array(target.length / 2);
  let at = 0;
  for (let i = 0; i < n; i++) {
    const k = start[i + 1] - start[i];
    for (let e = start[i]; e < start[i + 1]; e++) {
      const j = target[e];
      const kj = start[j + 1] - start[j];
      if (kj > k || (kj === k && j > i)) up[at++] = j;
    }
    upStart[i + 1] = at;
  }
  const mark = new Uint32Array(n);
  for (let i = 0; i < n; i++) {
    const to = upStart[i + 1];
    for (let e = upStart[i]; e < to; e++) mark[up[e]] = i + 1;
    for (let e = upStart[i]; e < to; e++) {
      const j = up[e];
      for (let f = upStart[j]; f < upStart[j + 1]; f++) {
        const k = up[f];
        if (mark[k] !== i + 1) continue;
        out[i]++;
        out[j]++;
        out[k]++;
      }
    }
  }
  return out;
}

export interface Clustering {
  /** Number of triangles. */
  readonly triangles: number;
  /** Global transitivity: 3 × triangles / connected triples; 0 when there are no triples. */
  readonly transitivity: number;
  /** Mean local clustering over all households, degree below 2 counting as 0; NaN for no households. */
  readonly average: number;
  /** Mean local clustering over households of degree 2 or more; NaN when there are none. */
  readonly averageDefined: number;
}

/**
 * Clustering of the whole network (Watts and Strogatz 1998; Newman 2003, "The structure and function of complex
 * networks", eqs. 3–6). Cost as {@link triangles}.
 */
export function clustering(ties: Ties): Clustering {
  const { n, start } = ties;
  const closed = triangles(ties);
  let ends = 0;
  let triples = 0;
  let sum = 0;
  let defined = 0;
  for (let i = 0; i < n; i++) {
    const k = start[i + 1] - start[i];
    if (k < 2) continue;
    const pairs = (k * (k - 1)) / 2;
    ends += closed[i];
    triples += pairs;
    sum += closed[i] / pairs;
    defined++;
  }
  return {
    triangles: ends / 3,
    transitivity: triples > 0 ? ends / triples : 0,
    average: sum / n,
    averageDefined: defined > 0 ? sum / defined : NaN,
  };
}
