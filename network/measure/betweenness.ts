/**
 * Betweenness centrality: on how many shortest paths between others a household lies.
 *
 * Brandes 2001, "A faster algorithm for betweenness centrality", for unweighted undirected graphs: a breadth-first
 * search from every household, then dependencies summed backwards. Instead of predecessor lists the steps onward
 * from each household are kept in the order of the search, so that the way back has no branches. Tie weights are
 * not lengths and play no part.
 */
import type { Ties } from '../graph.js';

/** Farther than any household is. */
const UNSEEN = 0x7ffffffe;

/**
 * Sum over pairs {s, t} of other households of the share of their shortest paths that go through each household; not
 * normalised. 0 for isolates and leaves, (n−1)(n−2)/2 for the centre of a star.
 *
 * @returns length n. Cost O(n × (n + ties)) time, O(n + ties) memory.
 */
export function betweenness(ties: Ties): Float64Array<ArrayBuffer> {
  const { n, start, target } = ties;
  const out = new Float64Array(n);
  const distance = new Int32Array(n).fill(UNSEEN);
  const paths = new Float64Array(n);
  /** (1 + dependency)/paths: what each shortest path to a household hands back to the step before. */
  const share = new Float64Array(n);
  // one more than households: an entry is written before it is known whether it counts
  const queue = new Uint32Array(n + 1);
  /** Steps of shortest paths away from s; a tie is a step in at most one direction. */
  const onward = new Uint32Array(target.length / 2);
  /** Where the steps from queue[k] begin. */
  const first = new Uint32Array(n + 1);
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
      first[at] = steps;
      for (let e = start[v]; e < start[v + 1]; e++) {
        const w = target[e];
        const d = distance[w];
        if (d < next) continue;
        // the sign bit is 1 when w was not seen before: a branch here would be a coin toss
        queue[end] = w;
        end += (next - d) >>> 31;
        distance[w] = next;
        paths[w] += through;
        onward[steps++] = w;
      }
    }
    first[end] = steps;
    for (let at = end - 1; at >= 0; at--) {
      const v = queue[at];
      let sum = 0;
      for (let k = first[at]; k < first[at + 1]; k++) sum += share[onward[k]];
      const dependency = paths[v] * sum;
      share[v] = (1 + dependency) / paths[v];
      if (at > 0) out[v] += dependency;
    }
    for (let at = 0; at < end; at++) {
      const v = queue[at];
      distance[v] = UNSEEN;
      paths[v] = 0;
    }
  }
  // every pair was counted from both of its ends
  for (let i = 0; i < n; i++) out[i] /= 2;
  return out;
}
