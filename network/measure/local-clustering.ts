/**
 * Local clustering: of the pairs of a household's ties, the share that know each other.
 *
 * Watts and Strogatz 1998. Tie weights play no part.
 */
import type { Ties } from '../graph.js';

/**
 * Share of closed pairs among each household's neighbours, 0 … 1; NaN where there is no pair (degree below 2).
 *
 * @returns length n. Cost O(sum over ties of the degrees at their ends).
 */
export function localClustering(ties: Ties): Float64Array<ArrayBuffer> {
  const { n, start, target } = ties;
  const out = new Float64Array(n);
  const mark = new Uint32Array(n);
  for (let i = 0; i < n; i++) {
    const from = start[i];
    const to = start[i + 1];
    const degree = to - from;
    if (degree < 2) {
      out[i] = Number.NaN;
      continue;
    }
    for (let e = from; e < to; e++) mark[target[e]] = i + 1;
    let ends = 0;
    for (let e = from; e < to; e++) {
      const j = target[e];
      for (let f = start[j]; f < start[j + 1]; f++) if (mark[target[f]] === i + 1) ends++;
    }
    // every tie among the neighbours was met at both of its ends
    out[i] = ends / (degree * (degree - 1));
  }
  return out;
}
