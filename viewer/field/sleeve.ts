/**
 * The soft hull of a pocket: its core members joined along their own ties, so that the tint covers the members and
 * not the empty space between them.
 *
 * The shape is the shortest set of the members' ties that keeps them joined (minimum spanning tree, Kruskal 1956),
 * to be stroked thickly with round ends; a member with no tie inside the pocket is a dot.
 */
import type { Ties } from '../../network/graph.js';

/** Two SVG paths: the body to stroke thickly, and long ties between parts of it, to stroke thinly. */
export interface Sleeve {
  readonly body: string;
  readonly links: string;
}

/**
 * @param members - household indices of one pocket's core
 * @param positions - x, y by household, length 2 n
 * @param long - length from which a tie is a link between parts, in the unit of the positions
 * @returns see {@link Sleeve}. Cost O(m log m) in the ties among members.
 */
export function sleeve(members: readonly number[], ties: Ties, positions: Float32Array, long: number): Sleeve {
  const slot = new Map<number, number>();
  members.forEach((i, k) => {
    slot.set(i, k);
  });
  const edges: { a: number; b: number; length: number }[] = [];
  for (const i of members) {
    for (let e = ties.start[i]; e < ties.start[i + 1]; e++) {
      const j = ties.target[e];
      if (j > i && slot.has(j)) {
        const dx = positions[2 * i] - positions[2 * j];
        const dy = positions[2 * i + 1] - positions[2 * j + 1];
        edges.push({ a: i, b: j, length: dx * dx + dy * dy });
      }
    }
  }
  edges.sort((p, q) => p.length - q.length);
  const parent = members.map((_, k) => k);
  const root = (k: number): number => {
    let r = k;
    while (parent[r] !== r) {
      parent[r] = parent[parent[r]];
      r = parent[r];
    }
    return r;
  };
  let body = '';
  let links = '';
  const at = (i: number): string => `${positions[2 * i].toFixed(1)} ${positions[2 * i + 1].toFixed(1)}`;
  const touched = new Set<number>();
  for (const { a, b, length } of edges) {
    const ra = root(slot.get(a) as number);
    const rb = root(slot.get(b) as number);
    if (ra === rb) continue;
    parent[ra] = rb;
    if (length > long * long) {
      links += `M${at(a)}L${at(b)}`;
      continue;
    }
    touched.add(a).add(b);
    body += `M${at(a)}L${at(b)}`;
  }
  for (const i of members) if (!touched.has(i)) body += `M${at(i)}h0.01`;
  return { body, links };
}
