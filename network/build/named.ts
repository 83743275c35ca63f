/**
 * Small graphs of the literature and plain shapes, by name.
 *
 * Those the graph library generates come from it (karate club, Florentine families, kite, complete, path, ladder,
 * cavemen); star, cycle and empty are shapes it lacks or that need no library. A shape takes as many households as
 * there are; a published graph has its own number, and asking for another is refused.
 */
import { UndirectedGraph } from 'graphology';
import * as generators from 'graphology-generators';
import { InputError, nearest } from '../errors.js';
import { fromGraphology } from '../exchange/graphology.js';
import type { Labels, Ties } from '../graph.js';
import { infeasible } from './refuse.js';
import type { NamedSpec } from './spec.js';

type Generator = (GraphClass: typeof UndirectedGraph, ...rest: number[]) => UndirectedGraph;

// the library exports its generators in groups at run time, under `default` when a bundler or Node wraps it
const library = ((generators as unknown as { default?: unknown }).default ?? generators) as Record<
  string,
  Record<string, Generator>
>;

/** A graph with a number of its own, or a shape for any number from `least` on. */
type Named =
  | { readonly size: number; readonly make: () => UndirectedGraph }
  | { readonly least: number; readonly fits?: (n: number) => boolean; readonly shape: (n: number) => UndirectedGraph };

function undirected(n: number, pairs: Iterable<readonly [number, number]>): UndirectedGraph {
  const graph = new UndirectedGraph();
  for (let i = 0; i < n; i++) graph.addNode(i);
  for (const [i, j] of pairs) graph.mergeUndirectedEdge(i, j);
  return graph;
}

const NAMED: Readonly<Record<string, Named>> = {
  karate_club: { size: 34, make: () => library['social']['karateClub'](UndirectedGraph) },
  florentine_families: { size: 15, make: () => library['social']['florentineFamilies'](UndirectedGraph) },
  krackhardt_kite: { size: 10, make: () => library['small']['krackhardtKite'](UndirectedGraph) },
  complete: { least: 1, shape: (n) => library['classic']['complete'](UndirectedGraph, n) },
  path: { least: 1, shape: (n) => library['classic']['path'](UndirectedGraph, n) },
  ladder: { least: 2, fits: (n) => n % 2 === 0, shape: (n) => library['classic']['ladder'](UndirectedGraph, n / 2) },
  empty: { least: 0, shape: (n) => undirected(n, []) },
  star: {
    least: 2,
    shape: (n) =>
      undirected(
        n,
        Array.from({ length: n - 1 }, (_, k) => [0, k + 1] as const),
      ),
  },
  cycle: {
    least: 3,
    shape: (n) =>
      undirected(
        n,
        Array.from({ length: n }, (_, k) => [k, (k + 1) % n] as const),
      ),
  },
};

/** Names that `named` knows. */
export const NAMED_GRAPHS: readonly string[] = Object.keys(NAMED);

/** Number of households a named graph has, or null when it takes any. */
export function namedSize(name: string): number | null {
  const entry = lookUp(name);
  return 'size' in entry ? entry.size : null;
}

/**
 * @param spec - one of {@link NAMED_GRAPHS}
 * @param labels - only the number of households is used
 * @throws InputError `network-name` for an unknown name, `network-infeasible` for a number of households it cannot have
 */
export function named(spec: NamedSpec, labels: Labels): Ties {
  const entry = lookUp(spec.name);
  const { n } = labels;
  if ('size' in entry) {
    if (n !== entry.size) {
      throw infeasible(
        'name',
        `${spec.name} has ${entry.size} households, the population ${n}`,
        `use ${entry.size} households`,
      );
    }
    return fromGraphology(entry.make()).ties;
  }
  if (n < entry.least || entry.fits?.(n) === false) {
    throw infeasible(
      'name',
      `there is no ${spec.name} of ${n} households`,
      n < entry.least ? `use ${entry.least} households or more` : 'use an even number of households',
    );
  }
  return fromGraphology(entry.shape(n)).ties;
}

function lookUp(name: string): Named {
  if (Object.hasOwn(NAMED, name)) return NAMED[name];
  const close = nearest(name, NAMED_GRAPHS);
  throw new InputError({
    code: 'network-name',
    place: 'network.name',
    problem: `no graph is called ${JSON.stringify(name)}`,
    remedy: close === undefined ? `use one of ${NAMED_GRAPHS.join(', ')}` : `did you mean ${close}?`,
  });
}
