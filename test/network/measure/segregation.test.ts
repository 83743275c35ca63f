/** Segregation measures: brute force, limits and identities. */
import fc from 'fast-check';
import { expect, test } from 'vitest';
import { build } from '../../../network/build/build.js';
import { fromPairs, hasTie, type Ties } from '../../../network/graph.js';
import { assortativity, rankAssortativity } from '../../../network/measure/assortativity.js';
import { components } from '../../../network/measure/components.js';
import { aboveMedian, economicConnectedness } from '../../../network/measure/economic-connectedness.js';
import { exposureByPlace, exposureByTies } from '../../../network/measure/isolation.js';
import {
  coleman,
  externalInternal,
  groupAssortativity,
  groupTies,
  modularity,
} from '../../../network/measure/mixing-by-group.js';
import { median, midRanks } from '../../../network/measure/ranks.js';
import { networkSummary } from '../../../network/measure/summary.js';
import { clustering, triangles } from '../../../network/measure/triangles.js';
import { households, stream } from '../stream.js';

/** Any small simple network with labels. */
const anyNet = fc
  .record({
    n: fc.integer({ min: 2, max: 25 }),
    degree: fc.double({ min: 0.5, max: 8, noNaN: true }),
    seed: fc.integer(),
  })
  .map(({ n, degree, seed }) => {
    const labels = households(n, Math.min(3, n), String(seed));
    const ties = build({ kind: 'random', mean_degree: Math.min(degree, n - 1) }, labels, stream(`n${seed}`));
    return { labels, ties };
  });

test('economic connectedness agrees with its definition, household by household', () => {
  fc.assert(
    fc.property(anyNet, ({ labels, ties }) => {
      const { wealth, place } = labels;
      const sorted = [...wealth].sort((a, b) => a - b);
      const n = wealth.length;
      const middle = (sorted[Math.floor((n - 1) / 2)] + sorted[Math.floor(n / 2)]) / 2;
      const connected: number[] = [];
      const exposed: number[] = [];
      const biased: number[] = [];
      for (let i = 0; i < n; i++) {
        if (!(wealth[i] < middle)) continue;
        const friends = Array.from({ length: n }, (_, j) => j).filter((j) => hasTie(ties, i, j));
        if (friends.length === 0) continue;
        const share = friends.filter((j) => wealth[j] > middle).length / friends.length;
        const home = Array.from({ length: n }, (_, j) => j).filter((j) => place[j] === place[i]);
        const there = home.filter((j) => wealth[j] > middle).length / home.length;
        connected.push(2 * share);
        exposed.push(2 * there);
        if (there > 0) biased.push(1 - share / there);
      }
      const mean = (list: number[]): number => list.reduce((a, b) => a + b, 0) / list.length;
      const got = economicConnectedness(ties, wealth, place);
      for (const [a, b] of [
        [got.connectedness, mean(connected)],
        [got.exposure, mean(exposed)],
        [got.friendingBias, mean(biased)],
      ]) {
        if (Number.isNaN(b)) expect(a).toBeNaN();
        else expect(a).toBeCloseTo(b, 10);
      }
    }),
  );
});

test('economic connectedness: 0 when the halves are apart, 2 when every tie crosses, 1 when anyone meets anyone', () => {
  const wealth = Float64Array.of(1, 2, 3, 4);
  const place = new Uint32Array(4);
  const of = (pairs: [number, number][]): Ties =>
    fromPairs(
      4,
      Uint32Array.from(pairs, (p) => p[0]),
      Uint32Array.from(pairs, (p) => p[1]),
      null,
    );
  expect(
    economicConnectedness(
      of([
        [0, 1],
        [2, 3],
      ]),
      wealth,
      place,
    ).connectedness,
  ).toBe(0);
  expect(
    economicConnectedness(
      of([
        [0, 2],
        [1, 3],
      ]),
      wealth,
      place,
    ).connectedness,
  ).toBe(2);
  const all = economicConnectedness(
    of([
      [0, 2],
      [1, 3],
    ]),
    wealth,
    place,
  );
  expect(all.exposure).toBe(1);
  expect(all.friendingBias).toBe(-1);
  const labels = households(4000, 1);
  const random = build({ kind: 'random', mean_degree: 10 }, labels, stream('ec'));
  // sd of a share over 20,000 tie ends of the poor, doubled: 0.007
  expect(Math.abs(economicConnectedness(random, labels.wealth, labels.place).connectedness - 1)).toBeLessThan(0.03);
});

test('households at the median are on neither side', () => {
  expect([...aboveMedian(Float64Array.of(5, 1, 3))]).toEqual([1, -1, 0]);
  expect([...aboveMedian(Float64Array.of(2, 2, 2, 9))]).toEqual([0, 0, 0, 1]);
});

test('group measures: limits of full separation, full crossing, and one group', () => {
  const group = Uint32Array.of(0, 0, 1, 1);
  const apart = fromPairs(4, Uint32Array.of(0, 2), Uint32Array.of(1, 3), null);
  const cross = fromPairs(4, Uint32Array.of(0, 1), Uint32Array.of(2, 3), null);
  const a = groupTies(apart, group);
  expect([groupAssortativity(a), modularity(a), externalInternal(a), coleman(a)]).toEqual([1, 0.5, -1, 1]);
  const c = groupTies(cross, group);
  expect([groupAssortativity(c), modularity(c), externalInternal(c), coleman(c)]).toEqual([-1, -0.5, 1, -1]);
  const one = groupTies(apart, new Uint32Array(4));
  expect(groupAssortativity(one)).toBeNaN();
  expect(coleman(one)).toBeNaN();
  expect(externalInternal(one)).toBe(-1);
});

test('measures of groups do not depend on what groups are called', () => {
  fc.assert(
    fc.property(anyNet, ({ labels, ties }) => {
      const a = groupTies(ties, labels.group);
      const b = groupTies(
        ties,
        labels.group.map((g) => 3 - g),
      );
      for (const f of [groupAssortativity, modularity, externalInternal, coleman]) {
        const x = f(a);
        if (Number.isNaN(x)) expect(f(b)).toBeNaN();
        else expect(f(b)).toBeCloseTo(x, 12);
      }
    }),
  );
});

test('assortativity is the correlation over both orientations of every tie, weighted or not', () => {
  fc.assert(
    fc.property(anyNet, ({ labels, ties: plain }) => {
      const weight = Float64Array.from(plain.target, (j, e) => 1 + ((j + rowOf(plain, e)) % 3));
      const ties = { ...plain, weight };
      for (const weighted of [false, true]) {
        let w = 0;
        let x = 0;
        let xx = 0;
        let xy = 0;
        for (let e = 0; e < ties.target.length; e++) {
          const v = weighted ? weight[e] : 1;
          const a = labels.wealth[rowOf(ties, e)];
          const b = labels.wealth[ties.target[e]];
          w += v;
          x += v * a;
          xx += v * a * a;
          xy += v * a * b;
        }
        const expected = (xy / w - (x / w) ** 2) / (xx / w - (x / w) ** 2);
        const got = assortativity(ties, labels.wealth, weighted);
        if (ties.target.length === 0) expect(got).toBeNaN();
        // textbook sums lose digits where the spread is small: 1e-6 is far below any mistake
        else if (xx / w - (x / w) ** 2 > 1e-6) expect(got).toBeCloseTo(expected, 6);
      }
    }),
  );
});

function rowOf(ties: Ties, e: number): number {
  let i = 0;
  while (ties.start[i + 1] <= e) i++;
  return i;
}

test('rank assortativity does not change under rising transformations of the value', () => {
  fc.assert(
    fc.property(anyNet, ({ labels, ties }) => {
      const a = rankAssortativity(ties, labels.wealth);
      const b = rankAssortativity(
        ties,
        labels.wealth.map((y) => y ** 3 + 5),
      );
      if (Number.isNaN(a)) expect(b).toBeNaN();
      else expect(b).toBeCloseTo(a, 10);
    }),
  );
});

test('ranks average ties, and the median takes the middle', () => {
  expect([...midRanks(Float64Array.of(3, 1, 3, 9))]).toEqual([0.5, 0.125, 0.5, 0.875]);
  expect(median(Float64Array.of(4, 1, 3))).toBe(3);
  expect(median(Float64Array.of(4, 1, 3, 2))).toBe(2.5);
  expect(median(new Float64Array(0))).toBeNaN();
});

test('isolation and exposure: rows sum to one, and full separation isolates', () => {
  const labels = households(500, 8);
  const ties = build({ kind: 'blocks', mean_degree: 6, within_group: 0.8 }, labels, stream('iso'));
  for (const e of [exposureByPlace(labels.group, 2, labels.place), exposureByTies(ties, labels.group, 2)]) {
    expect(e[0] + e[1]).toBeCloseTo(1, 12);
    expect(e[2] + e[3]).toBeCloseTo(1, 12);
  }
  // by hand: place 0 holds a a b, place 1 holds b; a meets ⅔ a, b meets ½(⅓ + 1) b
  const byPlace = exposureByPlace(Uint32Array.of(0, 0, 1, 1), 2, Uint32Array.of(0, 0, 0, 1));
  [2 / 3, 1 / 3, 1 / 3, 2 / 3].forEach((x, k) => {
    expect(byPlace[k]).toBeCloseTo(x, 12);
  });
  expect([...exposureByPlace(labels.group, 2, labels.group)]).toEqual([1, 0, 0, 1]);
});

test('triangles agree with counting all triples', () => {
  fc.assert(
    fc.property(anyNet, ({ ties }) => {
      const count = new Float64Array(ties.n);
      for (let i = 0; i < ties.n; i++) {
        for (let j = i + 1; j < ties.n; j++) {
          for (let k = j + 1; k < ties.n; k++) {
            if (hasTie(ties, i, j) && hasTie(ties, j, k) && hasTie(ties, i, k)) {
              count[i]++;
              count[j]++;
              count[k]++;
            }
          }
        }
      }
      expect(triangles(ties)).toEqual(count);
    }),
  );
});

test('components of marked households only follow ties among them', () => {
  const path = fromPairs(5, Uint32Array.of(0, 1, 2, 3), Uint32Array.of(1, 2, 3, 4), null);
  const marked = components(path, [1, 1, 0, 1, 1]);
  expect([...marked.of]).toEqual([0, 0, -1, 1, 1]);
  expect([...marked.sizes]).toEqual([2, 2]);
  expect([...components(path).sizes]).toEqual([5]);
});

test('the summary has exactly the published keys, and null for what is not defined', () => {
  const ring = build({ kind: 'named', name: 'cycle' }, households(6, 1), stream('x'));
  const plain = networkSummary(ring, { permutations: 0, uniform: stream('s') });
  expect(Object.keys(plain)).toEqual([
    'households',
    'ties',
    'isolates',
    'components',
    'largest_component',
    'mean_degree',
    'max_degree',
    'transitivity',
    'average_clustering',
    'assortativity_degree',
  ]);
  expect(plain.assortativity_degree).toBeNull();
  const full = networkSummary(ring, {
    value: Float64Array.of(1, 2, 3, 3, 2, 1),
    by: Uint32Array.of(0, 0, 0, 1, 1, 1),
    permutations: 99,
    uniform: stream('s'),
  });
  expect(Object.keys(full).slice(10)).toEqual([
    'assortativity_value',
    'moran',
    'moran_expected',
    'moran_p',
    'assortativity_group',
    'modularity',
    'e_i_group',
    'coleman_group',
  ]);
  expect(full.moran_expected).toBe(-0.2);
  expect(full.moran_p).toBeGreaterThanOrEqual(0.01);
});

test('the summary leaves households without a value out with their ties', () => {
  const path = fromPairs(4, Uint32Array.of(0, 1, 2), Uint32Array.of(1, 2, 3), null);
  const options = { permutations: 0, uniform: stream('s') };
  const holed = networkSummary(path, { ...options, value: Float64Array.of(1, 5, 2, NaN) });
  const short = fromPairs(3, Uint32Array.of(0, 1), Uint32Array.of(1, 2), null);
  const whole = networkSummary(short, { ...options, value: Float64Array.of(1, 5, 2) });
  expect(holed.moran).toBeCloseTo(whole.moran as number, 12);
  expect(holed.assortativity_value).toBeCloseTo(whole.assortativity_value as number, 12);
});

test('empty and tieless networks have a summary', () => {
  for (const n of [0, 1, 3]) {
    const none = fromPairs(n, new Uint32Array(0), new Uint32Array(0), null);
    const s = networkSummary(none, {
      value: new Float64Array(n),
      by: new Uint32Array(n),
      permutations: 9,
      uniform: stream('s'),
    });
    expect(s).toMatchObject({ households: n, ties: 0, isolates: n, components: n, transitivity: 0, moran: null });
  }
  expect(clustering(fromPairs(0, new Uint32Array(0), new Uint32Array(0), null)).average).toBeNaN();
});
