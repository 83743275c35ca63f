/**
 * Nine tiny graphs with exact rational answers, made by formula (set `net-exact`; two routes, see SOURCES.md).
 */
import { readFileSync } from 'node:fs';
import { expect, test } from 'vitest';
import { fromPairs } from '../../network/graph.js';
import { degreeAssortativity } from '../../network/measure/assortativity.js';
import { components, degreeCounts } from '../../network/measure/components.js';
import { groupAssortativity, groupTies, modularity, sameShare } from '../../network/measure/mixing-by-group.js';
import { moran } from '../../network/measure/moran.js';
import { neighbourMeans } from '../../network/measure/neighbours.js';
import { clustering } from '../../network/measure/triangles.js';
import { checksOf } from './expected.js';
import { codes, expectDefined } from './net.js';

interface Graph {
  n: number;
  edges: [number, number][];
  group: string[];
}

const graphs = JSON.parse(readFileSync(new URL('net-exact/graphs.json', import.meta.url), 'utf8')) as Record<
  string,
  Graph
>;
const checks = checksOf('net-exact');

test.each(Object.keys(graphs))('%s', (name) => {
  const { n, edges, group } = graphs[name];
  const ties = fromPairs(n, Uint32Array.from(edges, (e) => e[0]), Uint32Array.from(edges, (e) => e[1]), null);
  const { group: g } = codes(group);
  const counts = groupTies(ties, g);
  const closed = clustering(ties);
  // the set's value of household i is i + 1
  const value = Float64Array.from({ length: n }, (_, i) => i + 1);
  const actual: Record<string, unknown> = {
    transitivity: closed.transitivity,
    clustering_avg_zero: closed.average,
    clustering_avg_defined: closed.averageDefined,
    assort_degree: degreeAssortativity(ties),
    modularity: modularity(counts),
    assort_cat: groupAssortativity(counts),
    same_share: sameShare(counts),
    degree_edge_mean: degreeCounts(ties).endMean,
    components: [...components(ties).sizes].sort((a, b) => b - a),
    moran_B: moran(ties, value, 'binary').i,
    moran_W: moran(ties, value, 'row').i,
    nbr_mean: neighbourMeans(ties, value, new Float64Array(n)),
  };
  const ids = Object.keys(checks).filter((id) => id.startsWith(`${name}.`));
  expect(ids.length).toBe(Object.keys(actual).length);
  for (const id of ids) expectDefined(actual[id.slice(name.length + 1)], checks[id], id);
});
