/**
 * Ties to and from graphs of the graphology library, for its generators and for whoever wants its algorithms.
 */
import { UndirectedGraph } from 'graphology';
import type { AbstractGraph } from 'graphology-types';
import { InputError } from '../errors.js';
import { fromPairs, type Ties, toPairs } from '../graph.js';

/**
 * Reads a graph: nodes in the graph's order become households 0 … n−1.
 *
 * Undirected edges become ties. Directed edges are read without their direction, since some of the library's
 * generators make them for undirected graphs; two edges between the same two nodes become one tie.
 *
 * @returns ties, the node keys by household, and `weight` where every edge has a numeric weight attribute.
 *   A pair joined by two edges keeps the weight of the first.
 * @throws InputError `loop` when a node is tied to itself, `bad-weight` for a negative or non-finite weight
 */
export function fromGraphology(graph: AbstractGraph): { ties: Ties; ids: string[] } {
  const ids = graph.nodes();
  const index = new Map<string, number>();
  for (let i = 0; i < ids.length; i++) index.set(ids[i], i);
  const seen = new Set<number>();
  const source: number[] = [];
  const target: number[] = [];
  const weight: number[] = [];
  let weighted = true;
  graph.forEachEdge((edge, attributes, a, b) => {
    const i = index.get(a) as number;
    const j = index.get(b) as number;
    const place = `edge ${edge}`;
    if (i === j) {
      throw new InputError({ code: 'loop', place, problem: `node ${a} is tied to itself`, remedy: 'drop the edge' });
    }
    const key = Math.min(i, j) * ids.length + Math.max(i, j);
    if (seen.has(key)) return;
    seen.add(key);
    source.push(i);
    target.push(j);
    const w: unknown = attributes['weight'];
    if (typeof w !== 'number') weighted = false;
    else if (!(w >= 0 && Number.isFinite(w))) {
      throw new InputError({
        code: 'bad-weight',
        place,
        problem: `weight ${w}`,
        remedy: 'give a finite number that is 0 or more',
      });
    }
    weight.push(weighted ? (w as number) : 0);
  });
  const useWeights = weighted && source.length > 0;
  const ties = fromPairs(
    ids.length,
    Uint32Array.from(source),
    Uint32Array.from(target),
    useWeights ? Float64Array.from(weight) : null,
  );
  return { ties, ids };
}

/**
 * An undirected, simple graphology graph of the ties.
 *
 * @param ids - node keys by household; numbers when left out
 * @param attributes - columns of household attributes, each of length n
 */
export function toGraphology(
  ties: Ties,
  ids?: readonly string[],
  attributes: Readonly<Record<string, ArrayLike<number | string>>> = {},
): UndirectedGraph {
  const graph = new UndirectedGraph({ allowSelfLoops: false });
  const name = (i: number): string => (ids === undefined ? String(i) : ids[i]);
  for (let i = 0; i < ties.n; i++) {
    const of: Record<string, number | string> = {};
    for (const key of Object.keys(attributes)) of[key] = attributes[key][i];
    graph.addNode(name(i), of);
  }
  const { source, target, weight } = toPairs(ties);
  for (let e = 0; e < source.length; e++) {
    graph.addUndirectedEdge(name(source[e]), name(target[e]), weight === null ? {} : { weight: weight[e] });
  }
  return graph;
}
