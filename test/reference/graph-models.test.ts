/**
 * The builders against exact expectations of graph models, and against bands simulated with R igraph 1.3.5 and networkx
 * 2.8.8 (set `graph-models`; see SOURCES.md). Simulated means are accepted within five combined standard errors.
 */
import { expect, test } from 'vitest';
import { build } from '../../network/build/build.js';
import type { NetworkSpec } from '../../network/build/spec.js';
import { degrees, type Labels, type Ties, tieCount } from '../../network/graph.js';
import { degreeAssortativity } from '../../network/measure/assortativity.js';
import { components, degreeCounts } from '../../network/measure/components.js';
import { coleman, groupAssortativity, groupTies, modularity, sameShare } from '../../network/measure/mixing-by-group.js';
import { clustering } from '../../network/measure/triangles.js';
import { stream } from '../network/stream.js';
import { checksOf, expectMatch } from './expected.js';

const checks = checksOf('graph-models');

/** n households in `places` equal places, all of one group. */
function equal(n: number, places: number): Labels {
  return {
    n,
    place: Uint32Array.from({ length: n }, (_, i) => Math.floor((i * places) / n)),
    group: new Uint32Array(n),
    wealth: Float64Array.from({ length: n }, (_, i) => i + 1),
  };
}

/** Mean and standard error of measures over draws of one network. */
function simulate(
  spec: NetworkSpec,
  labels: Labels,
  draws: number,
  measures: Record<string, (ties: Ties) => number>,
): Record<string, { mean: number; se: number }> {
  const uniform = stream(JSON.stringify(spec));
  const values: Record<string, number[]> = {};
  for (let r = 0; r < draws; r++) {
    const ties = build(spec, labels, uniform);
    for (const [name, measure] of Object.entries(measures)) (values[name] ??= []).push(measure(ties));
  }
  return Object.fromEntries(
    Object.entries(values).map(([name, list]) => {
      const mean = list.reduce((a, b) => a + b, 0) / draws;
      const variance = list.reduce((a, b) => a + (b - mean) ** 2, 0) / (draws - 1);
      return [name, { mean, se: Math.sqrt(variance / draws) }];
    }),
  );
}

/** Our simulated mean within five combined standard errors of theirs. */
function expectBand(ours: { mean: number; se: number }, id: string): void {
  const theirs = checks[id].value as { mean: number; se: number };
  const allowed = 5 * Math.sqrt(ours.se ** 2 + theirs.se ** 2);
  expect(Math.abs(ours.mean - theirs.mean), `${id}: ${ours.mean} against ${theirs.mean}`).toBeLessThanOrEqual(allowed);
}

/** Our simulated mean within five standard errors of an exact expectation, with the given slack for finite n. */
function expectExact(ours: { mean: number; se: number }, id: string, slack = 0): void {
  const value = checks[id].value as number;
  expect(Math.abs(ours.mean - value), `${id}: ${ours.mean} against ${value}`).toBeLessThanOrEqual(5 * ours.se + slack);
}

/** Mean length of shortest paths of a connected network, by breadth-first search. */
function pathMean(ties: Ties): number {
  let total = 0;
  for (let s = 0; s < ties.n; s++) {
    const distance = new Int32Array(ties.n).fill(-1);
    distance[s] = 0;
    const queue = [s];
    for (const i of queue) {
      for (const j of ties.target.subarray(ties.start[i], ties.start[i + 1])) {
        if (distance[j] >= 0) continue;
        distance[j] = distance[i] + 1;
        total += distance[j];
        queue.push(j);
      }
    }
  }
  return total / (ties.n * (ties.n - 1));
}

test.each([4, 6, 8, 10, 20])('ring of degree %i: clustering and path length', (degree) => {
  const ties = build({ kind: 'ring', degree, rewire: 0, order: 'wealth' }, equal(200, 1), stream('ring'));
  const closed = clustering(ties);
  expectMatch(closed.average, checks[`ring_K${degree}.clustering`], `ring_K${degree}.clustering`);
  expectMatch(closed.transitivity, checks[`ring_K${degree}.clustering`], `ring_K${degree}.clustering`);
  expectMatch(pathMean(ties), checks[`ring_K${degree}.path_mean_n200`], `ring_K${degree}.path_mean_n200`);
});

test.each([0.01, 0.1, 0.3])('small world, one end moved with probability %s', (rewire) => {
  const ours = simulate({ kind: 'ring', degree: 10, rewire }, equal(1000, 1), 40, {
    clustering: (t) => clustering(t).average,
    degree_var: (t) => degreeCounts(t).variance,
  });
  expectBand(ours['clustering'], `smallworld_p${rewire}.mc_clustering`);
  expectBand(ours['degree_var'], `smallworld_p${rewire}.mc_degree_var`);
  for (const id of ['clustering_approx', 'degree_var_approx']) {
    const key = id === 'clustering_approx' ? 'clustering' : 'degree_var';
    const check = checks[`smallworld_p${rewire}.${id}`];
    // a large-n formula at n = 1000: the set's own relative tolerance, and five standard errors of ours
    const slack = check.rtol * (check.value as number);
    expectExact(ours[key], `smallworld_p${rewire}.${id}`, slack);
  }
});

test('random ties: moments of G(n, p)', () => {
  const id = 'er_n500_p0.02';
  const ours = simulate({ kind: 'random', mean_degree: 499 * 0.02 }, equal(500, 1), 200, {
    mean_degree: (t) => degreeCounts(t).mean,
    var_degree: (t) => degreeCounts(t).variance,
    edges: tieCount,
    triangles: (t) => clustering(t).triangles,
    transitivity: (t) => clustering(t).transitivity,
    assort: degreeAssortativity,
  });
  for (const key of ['mean_degree', 'var_degree', 'triangles', 'transitivity', 'assort']) {
    expectBand(ours[key], `${id}.mc_${key}`);
  }
  for (const key of ['mean_degree', 'var_degree', 'triangles', 'edges']) expectExact(ours[key], `${id}.expected_${key}`);
  // exact up to order 1/n
  for (const key of ['transitivity', 'assort']) expectExact(ours[key], `${id}.expected_${key}`, 1 / 500);
});

test('random ties: isolates and the giant component', () => {
  const sparse = simulate({ kind: 'random', mean_degree: 1.5 }, equal(2000, 1), 100, {
    isolates: (t) => degreeCounts(t).isolates,
  });
  expectBand(sparse['isolates'], 'er_n2000_c1.5.mc_isolates');
  expectExact(sparse['isolates'], 'er_n2000_c1.5.expected_isolates');
  for (const c of [1.5, 2, 3]) {
    const ours = simulate({ kind: 'random', mean_degree: c }, equal(5000, 1), 30, {
      giant: (t) => Math.max(...components(t).sizes) / 5000,
    });
    expectBand(ours['giant'], `er_giant_c${c}.mc_n5000`);
    // large n formula; at n = 5000 within a few thousandths
    expectExact(ours['giant'], `er_giant_c${c}.fraction`, 0.004);
  }
});

test.each([2, 3, 5])('preferential attachment with %i ties a newcomer: shares by degree', (ties) => {
  const n = 50_000;
  const degree = degrees(build({ kind: 'preferential', ties }, equal(n, 1), stream(`pa${ties}`)));
  const exact = checks[`pref_m${ties}.pk`];
  (exact['k'] as number[]).forEach((k, a) => {
    const share = degree.filter((d) => d === k).length / n;
    const value = (exact.value as number[])[a];
    // one graph: binomial error of the share, five of it, and its order-1/n start
    expect(Math.abs(share - value), `k = ${k}`).toBeLessThan(5 * Math.sqrt(value / n) + 1e-4);
  });
  const tail = checks[`pref_m${ties}.tail`];
  (tail['k'] as number[]).forEach((k, a) => {
    const share = degree.filter((d) => d >= k).length / n;
    const value = (tail.value as number[])[a];
    expect(Math.abs(share - value), `k ≥ ${k}`).toBeLessThan(5 * Math.sqrt(value / n) + 1e-4);
  });
  // the shifted model that one library uses by default has clearly fewer of the lowest degree: not ours
  const shifted = (checks[`pref_shift1_m${ties}.pk`].value as number[])[0];
  const lowest = degree.filter((d) => d === ties).length / n;
  expect(Math.abs(lowest - shifted)).toBeGreaterThan(0.01);
  // tail exponent by the same estimator as the set's, from kmin = 4m
  const least = 4 * ties;
  let logs = 0;
  let count = 0;
  for (const d of degree) {
    if (d < least) continue;
    logs += Math.log(d / (least - 0.5));
    count++;
  }
  const check = checks[`pref_m${ties}.mc_exponent`];
  // a single graph on either side: the set's own relative tolerance
  expect(Math.abs(1 + count / logs - (check.value as number))).toBeLessThan(check.rtol * (check.value as number));
});

test.each([
  ['sbm_n200_B2_in0.08_out0.02', 200, 2, 0.08, 0.02],
  ['sbm_n300_B3_in0.06_out0.01', 300, 3, 0.06, 0.01],
  ['sbm_n240_B4_in0.2_out0.2', 240, 4, 0.2, 0.2],
])('%s: blocks with the same probabilities', (id, n, places, inside, outside) => {
  // the set states probabilities; ours are stated as a mean degree and a share
  const within = (n / places - 1) * inside;
  const between = (n - n / places) * outside;
  const labels = equal(n, places);
  const spec = { kind: 'blocks', mean_degree: within + between, within_place: within / (within + between) } as const;
  const counts = (t: Ties): ReturnType<typeof groupTies> => groupTies(t, labels.place);
  const ours = simulate(spec, labels, 200, {
    within_degree: (t) => counts(t).totalInside / n,
    between_degree: (t) => (counts(t).totalEnds - counts(t).totalInside) / n,
    same_share: (t) => sameShare(counts(t)),
    assort: (t) => groupAssortativity(counts(t)),
    modularity: (t) => modularity(counts(t)),
    inbreeding: (t) => coleman(counts(t)),
  });
  for (const key of ['within_degree', 'between_degree', 'same_share', 'assort', 'modularity']) {
    expectBand(ours[key], `${id}.mc_${key}`);
  }
  for (const key of ['within_degree', 'between_degree']) expectExact(ours[key], `${id}.${key}`);
  // ratios of expectations, exact up to order 1/n
  for (const key of ['same_share', 'inbreeding', 'modularity']) expectExact(ours[key], `${id}.${key}`, 1 / n);
});

test('spatial, scattered over everything: transitivity of a random geometric graph', () => {
  const id = 'geometric_n1000_r0.06';
  const mean = (checks[`${id}.mean_degree`].value as number);
  const ours = simulate({ kind: 'spatial', mean_degree: mean, spread: 1 }, equal(1000, 1), 40, {
    transitivity: (t) => clustering(t).transitivity,
    mean_degree: (t) => degreeCounts(t).mean,
  });
  expectBand(ours['transitivity'], `${id}.mc_transitivity`);
  // the formula's limit of many neighbours, at eleven of them
  expectExact(ours['transitivity'], 'geometric.transitivity_limit', 0.005);
  // the number of ties is exact here, to the nearest whole tie
  expect(Math.abs(ours['mean_degree'].mean - mean)).toBeLessThanOrEqual(1 / 1000);
});
