/**
 * Structure, segregation and autocorrelation of three real networks: Zachary's karate club, Boston census tracts,
 * Florentine families. Values by R igraph 1.3.5, spdep 1.2.7 and networkx 2.8.8 or numpy, each by two routes
 * (see SOURCES.md); tolerances are the sets' own.
 */
import { expect, test } from 'vitest';
import { assortativity, degreeAssortativity } from '../../network/measure/assortativity.js';
import { betweenness } from '../../network/measure/betweenness.js';
import { components, degreeCounts } from '../../network/measure/components.js';
import { joinCounts } from '../../network/measure/join-counts.js';
import { localClustering } from '../../network/measure/local-clustering.js';
import {
  colemanByGroup,
  externalInternal,
  groupAssortativity,
  groupTies,
  homophilyByGroup,
  mixingMatrix,
  modularity,
} from '../../network/measure/mixing-by-group.js';
import { moran } from '../../network/measure/moran.js';
import { neighbourMeans, weightedNeighbourMeans } from '../../network/measure/neighbours.js';
import { median } from '../../network/measure/ranks.js';
import { secondCircleSizes, secondStepWalks } from '../../network/measure/second-circle.js';
import { networkSummary } from '../../network/measure/summary.js';
import { clustering } from '../../network/measure/triangles.js';
import { degrees, type Ties, tieCount } from '../../network/graph.js';
import { checksOf } from './expected.js';
import { codes, expectDefined, netOf } from './net.js';

const SETS = [
  { set: 'net-karate', values: ['strength'], groups: ['club'] },
  { set: 'net-boston', values: ['cmedv', 'lstat'], groups: ['river', 'rad', 'town'] },
  { set: 'net-florentine', values: ['wealth'], groups: ['rich'] },
];

const sorted = (sizes: Uint32Array): number[] => [...sizes].sort((a, b) => b - a);

/** Sizes of components among the households at or under the median. */
function lowComponents(ties: Ties, value: Float64Array): number[] {
  const middle = median(value);
  return sorted(components(ties, Uint8Array.from(value, (v) => (v <= middle ? 1 : 0))).sizes);
}

test.each(SETS)('$set: structure', ({ set }) => {
  const checks = checksOf(set);
  const { ties } = netOf(set, 'nodes.csv');
  const check = (id: string, actual: unknown): void => expectDefined(actual, checks[id], id);
  const degree = degrees(ties);
  const counts = degreeCounts(ties);
  check('n', ties.n);
  check('m', tieCount(ties));
  check('components.sizes', sorted(components(ties).sizes));
  check('components.count', components(ties).sizes.length);
  check('isolates', counts.isolates);
  check('degree', degree);
  check('degree.mean', counts.mean);
  check('degree.max', counts.max);
  check('degree.min', counts.min);
  check('degree.var_pop', counts.variance);
  check('degree.edge_mean', counts.endMean);
  check('knn', neighbourMeans(ties, degree, new Float64Array(ties.n)));
  check('fof.exact2', secondCircleSizes(ties));
  check('fof.within2', secondCircleSizes(ties).map((k, i) => k + degree[i]));
  check('fof.walks2', secondStepWalks(ties));
  const closed = clustering(ties);
  check('clustering.local', localClustering(ties));
  check('clustering.avg_defined', closed.averageDefined);
  check('clustering.avg_zero', closed.average);
  check('transitivity', closed.transitivity);
  check('triangles', closed.triangles);
  check('betweenness', betweenness(ties));
  check('assort.degree', degreeAssortativity(ties));
});

test.each(SETS.flatMap(({ set, values }) => values.map((name) => ({ set, name }))))(
  '$set: $name over ties',
  ({ set, name }) => {
    const checks = checksOf(set);
    const { ties, columns } = netOf(set, 'nodes.csv');
    const value = Float64Array.from(columns[name], Number);
    const check = (id: string, actual: unknown): void => expectDefined(actual, checks[id], id);
    check(`assort.num.${name}`, assortativity(ties, value));
    check(`nbr.mean.${name}`, neighbourMeans(ties, value, new Float64Array(ties.n)));
    for (const [letter, style] of [['B', 'binary'], ['W', 'row']] as const) {
      const m = moran(ties, value, style);
      check(`moran.${letter}.${name}`, {
        I: m.i,
        E: m.expected,
        var_rand: m.varianceRandom,
        z_rand: m.zRandom,
        p_two: m.pRandom,
      });
    }
    check(`pockets.le_median.${name}`, lowComponents(ties, value));
  },
);

test.each(SETS.flatMap(({ set, groups }) => groups.map((name) => ({ set, name }))))(
  '$set: split by $name',
  ({ set, name }) => {
    const checks = checksOf(set);
    const { ties, columns } = netOf(set, 'nodes.csv');
    const { group, levels } = codes(columns[name]);
    const counts = groupTies(ties, group);
    const check = (id: string, actual: unknown): void => expectDefined(actual, checks[id], id);
    check(`assort.cat.${name}`, groupAssortativity(counts));
    check(`modularity.${name}`, modularity(counts));
    check(`ei_index.${name}`, externalInternal(counts));
    if (levels.length <= 12) {
      expect(levels).toEqual(checks[`mixing.${name}`]['levels']);
      const flat = mixingMatrix(ties, group, levels.length);
      check(`mixing.${name}`, levels.map((_, g) => flat.subarray(g * levels.length, (g + 1) * levels.length)));
      check(`homophily.${name}`, homophilyByGroup(counts));
      check(`homophily_inbreeding.${name}`, colemanByGroup(counts));
    }
    if (levels.length === 2) {
      const joins = joinCounts(ties, group, 'binary');
      check(`joincount.${name}`, {
        same1: joins.unmarked.count,
        E1: joins.unmarked.expected,
        V1: joins.unmarked.variance,
        same2: joins.marked.count,
        E2: joins.marked.expected,
        V2: joins.marked.variance,
        diff: joins.unlike.count,
        Ed: joins.unlike.expected,
        Vd: joins.unlike.variance,
      });
    }
  },
);

test('net-karate: tie weights, and the split with member 9 moved', () => {
  const checks = checksOf('net-karate');
  const { ties, columns } = netOf('net-karate', 'nodes.csv');
  const { group } = codes(columns['club']);
  const strength = new Float64Array(ties.n);
  for (let i = 0; i < ties.n; i++) {
    for (let e = ties.start[i]; e < ties.start[i + 1]; e++) strength[i] += ties.weight![e];
  }
  expectDefined(strength, checks['strength'], 'strength');
  const means = weightedNeighbourMeans(ties, strength, new Float64Array(ties.n));
  expectDefined(means, checks['nbr.wmean.strength'], 'nbr.wmean.strength');
  expectDefined(modularity(groupTies(ties, group, true)), checks['modularity_w.club'], 'modularity_w.club');
  group[8] = 1 - group[8];
  expectDefined(modularity(groupTies(ties, group)), checks['modularity.club_moved9'], 'modularity.club_moved9');
});

test('the summary gives the same numbers under its published keys', () => {
  const checks = checksOf('net-florentine');
  const { ties, columns } = netOf('net-florentine', 'nodes.csv');
  const value = Float64Array.from(columns['wealth'], Number);
  const { group } = codes(columns['rich']);
  const s = networkSummary(ties, { value, by: group, permutations: 0, uniform: () => 0 });
  const pairs: [keyof typeof s, string][] = [
    ['households', 'n'],
    ['ties', 'm'],
    ['isolates', 'isolates'],
    ['components', 'components.count'],
    ['mean_degree', 'degree.mean'],
    ['max_degree', 'degree.max'],
    ['transitivity', 'transitivity'],
    ['average_clustering', 'clustering.avg_zero'],
    ['assortativity_degree', 'assort.degree'],
    ['assortativity_value', 'assort.num.wealth'],
    ['assortativity_group', 'assort.cat.rich'],
    ['modularity', 'modularity.rich'],
    ['e_i_group', 'ei_index.rich'],
  ];
  for (const [key, id] of pairs) expectDefined(s[key], checks[id], id);
  const m = checks['moran.W.wealth'].value as Record<string, number>;
  expect(s.largest_component).toBe(15);
  expect(s.moran).toBeCloseTo(m['I'], 9);
  expect(s.moran_expected).toBeCloseTo(m['E'], 12);
  // tail probability of a z near 0.9: 1e-8 as the set allows
  expect(s.moran_p).toBeCloseTo(m['p_two'], 7);
});
