/**
 * Local clustering: of the pairs of a household's ties, the share that know each other.
 *
 * Watts and Strogatz 1998. Tie weights play no part.
 */
import type { Ties } from '../graph.js';
import { triangles } from './triangles.js';

/**
 * Share of closed pairs among each household's neighbours, 0 … 1; NaN where there is no pair (degree below 2).
 *
 * @returns length n. Cost as {@link triangles}.
 */
export function localClustering(ties: Ties): Float64Array<ArrayBuffer> {
  const closed = triangles(ties);
  const out = new Float64Array(ties.n);
  for (let i = 0; i < ties.n; i++) {
    const degree = ties.start[i + 1] - ties.start[i];
    out[i] = degree < 2 ? Number.NaN : closed[i] / ((degree * (degree - 1)) / 2);
  }
  return out;
}
