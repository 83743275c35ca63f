/**
 * Betweenness centrality: on how many shortest paths between others a household lies.
 *
 * Brandes 2001, "A faster algorithm for betweenness centrality", for unweighted undirected graphs: a breadth-first
 * search from every household, then dependencies summed backwards. Instead of predecessor lists the steps of the
 * search are kept in the order they were found and gone through in reverse, which needs no branch on the way back.
 * Tie weights are not lengths and play no part.
 */
import type { Ties } from '../graph.js';

/**
 * Sum over pairs {s, t} of other households of the share of their shortest paths that go through each household; not
 * normalised. 0 for isolates and leaves, (n−1)(n−2)/2 for the centre of a star.
 *
 * @returns length n. Cost O(n × (n + ties)) time, O(n + ties) memory.
 */
export function betweenness(ties: Ties): Float64Array<ArrayBuffer> {
  const { n, start, target } = ties;
  const out = new Float64Array(n);
  const distance = new Int32Array(n).fill(-1);
  const paths = new Float64Array(n);
  const dependency = new Float64Array(n);
  const queue = new Uint32Array(n);
  // steps of shortest paths away from s, nearest first; a tie is a step in at most one direction
  const nearer = new Uint32Array(target.length / 2);
  const farther = new Uint32Array(target.length / 2);
  for (let s = 0; s < n; s++) {
    let end = 1;
    let steps = 0;
    queue[0] = s;
    distance[s] = 0;
    paths[s] = 1;
    for (let at = 0; at < end; at++) {
      const v = queue[at];
      const next = distance[v] + 1;
      const through = paths[v];
      for (let e = start[v]; e < start[v + 1]; e++) {
        const w = target[e];
        const d = distance[w];
        if (d === next) paths[w] += through;
        else if (d < 0) {
          distance[w] = next;
          paths[w] = through;
          queue[end++] = w;
        } else continue;
        nearer[steps] = v;
        farther[steps] = w;
        steps++;
      }
    }
    // steps onward from w were found after every step to w: in reverse, w's dependency is whole when it is used
    for (let k = steps - 1; k >= 0; k--) {
      const w = farther[k];
      dependency[nearer[k]] += paths[nearer[k]] * ((1 + dependency[w]) / paths[w]);
    }
    for (let at = 0; at < end; at++) {
      const v = queue[at];
      if (at > 0) out[v] += dependency[v];
      distance[v] = -1;
      dependency[v] = 0;
    }
  }
  // every pair was counted from both of its ends
  for (let i = 0; i < n; i++) out[i] /= 2;
  return out;
}
