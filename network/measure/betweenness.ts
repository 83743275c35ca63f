/**
 * Betweenness centrality: on how many shortest paths between others a household lies.
 *
 * Brandes 2001, "A faster algorithm for betweenness centrality", for unweighted undirected graphs: a breadth-first
 * search from every household, then dependencies summed backwards. Tie weights are not lengths and play no part.
 */
import type { Ties } from '../graph.js';

/**
 * Number of pairs {s, t} of other households times the share of their shortest paths that go through each
 * household; not normalised. 0 for isolates and leaves, (n−1)(n−2)/2 for the centre of a star.
 *
 * @returns length n. Cost O(n × (n + ties)) time, O(n) memory.
 */
export function betweenness(ties: Ties): Float64Array<ArrayBuffer> {
  const { n, start, target } = ties;
  const out = new Float64Array(n);
  const distance = new Int32Array(n).fill(-1);
  const paths = new Float64Array(n);
  const dependency = new Float64Array(n);
  const queue = new Uint32Array(n);
  for (let s = 0; s < n; s++) {
    let end = 1;
    queue[0] = s;
    distance[s] = 0;
    paths[s] = 1;
    for (let at = 0; at < end; at++) {
      const v = queue[at];
      const next = distance[v] + 1;
      const through = paths[v];
      for (let e = start[v]; e < start[v + 1]; e++) {
        const w = target[e];
        if (distance[w] < 0) {
          distance[w] = next;
          queue[end++] = w;
        }
        if (distance[w] === next) paths[w] += through;
      }
    }
    // farthest first: a household's dependency is whole before it is handed to those one step nearer
    for (let at = end - 1; at > 0; at--) {
      const w = queue[at];
      const share = (1 + dependency[w]) / paths[w];
      const nearer = distance[w] - 1;
      for (let e = start[w]; e < start[w + 1]; e++) {
        const v = target[e];
        if (distance[v] === nearer) dependency[v] += paths[v] * share;
      }
      out[w] += dependency[w];
    }
    for (let at = 0; at < end; at++) {
      const v = queue[at];
      distance[v] = -1;
      paths[v] = 0;
      dependency[v] = 0;
    }
  }
  // every pair was counted from both of its ends
  for (let i = 0; i < n; i++) out[i] /= 2;
  return out;
}
