/** Means over ties and over the second circle, local clustering and betweenness, against the plainest definitions. */
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { fromPairs, hasTie, type Ties } from '../../../network/graph.js';
import { betweenness } from '../../../network/measure/betweenness.js';
import { localClustering } from '../../../network/measure/local-clustering.js';
import { neighbourMeans, secondCircleMeans } from '../../../network/measure/neighbours.js';

function graph(n: number, pairs: readonly (readonly [number, number])[]): Ties {
  return fromPairs(
    n,
    Uint32Array.from(pairs, ([a]) => a),
    Uint32Array.from(pairs, ([, b]) => b),
    null,
  );
}

const anyGraph = fc.integer({ min: 1, max: 12 }).chain((n) =>
  fc
    .uniqueArray(fc.tuple(fc.nat(n - 1), fc.nat(n - 1)), {
      maxLength: 40,
      selector: ([a, b]) => Math.min(a, b) * n + Math.max(a, b),
    })
    .map((pairs) =>
      graph(
        n,
        pairs.filter(([a, b]) => a !== b),
      ),
    ),
);

/** Steps from s to everyone, Infinity where there is no path. */
function distances(ties: Ties, s: number): number[] {
  const d = new Array<number>(ties.n).fill(Number.POSITIVE_INFINITY);
  d[s] = 0;
  for (let round = 0; round < ties.n; round++) {
    for (let i = 0; i < ties.n; i++) {
      for (let j = 0; j < ties.n; j++) if (hasTie(ties, i, j)) d[j] = Math.min(d[j], d[i] + 1);
    }
  }
  return d;
}

/** All shortest paths from s to t, as lists of households. */
function shortestPaths(ties: Ties, s: number, t: number): number[][] {
  const away = distances(ties, t);
  if (!Number.isFinite(away[s])) return [];
  let paths: number[][] = [[s]];
  while (paths[0].at(-1) !== t) {
    paths = paths.flatMap((path) => {
      const last = path.at(-1)!;
      const next: number[][] = [];
      for (let j = 0; j < ties.n; j++) if (hasTie(ties, last, j) && away[j] === away[last] - 1) next.push([...path, j]);
      return next;
    });
  }
  return paths;
}

// sums of the same few terms in another order
const RTOL = 1e-12;

function expectClose(got: ArrayLike<number>, want: ArrayLike<number>): void {
  expect(got.length).toBe(want.length);
  for (let i = 0; i < want.length; i++) {
    if (Number.isNaN(want[i])) expect(got[i]).toBeNaN();
    else expect(Math.abs(got[i] - want[i])).toBeLessThanOrEqual(RTOL * (1 + Math.abs(want[i])));
  }
}

describe('means over circles', () => {
  test('of a line of four, and nothing for the one without ties', () => {
    const ties = graph(5, [
      [0, 1],
      [1, 2],
      [2, 3],
    ]);
    const wealth = Float64Array.of(1, 2, 4, 8, 16);
    expect([...neighbourMeans(ties, wealth, new Float64Array(5))]).toEqual([2, 2.5, 5, 4, NaN]);
    expect([...secondCircleMeans(ties, wealth, new Float64Array(5))]).toEqual([4, 8, 1, 2, NaN]);
  });

  test('leave out neighbours without a value', () => {
    const ties = graph(3, [
      [0, 1],
      [0, 2],
    ]);
    expect([...neighbourMeans(ties, [5, NaN, 3], new Float64Array(3))]).toEqual([3, 5, 5]);
  });

  test('are those of the definitions on any graph', () => {
    fc.assert(
      fc.property(
        anyGraph,
        fc.array(fc.double({ min: 0.1, max: 100, noNaN: true }), { minLength: 12 }),
        (ties, some) => {
          const wealth = Float64Array.from(some.slice(0, ties.n));
          const mean = (members: number[]): number =>
            members.length === 0 ? NaN : members.reduce((sum, j) => sum + wealth[j], 0) / members.length;
          const everyone = [...wealth.keys()];
          const at = (k: number): number[] =>
            everyone.map((i) => {
              const d = distances(ties, i);
              return mean(everyone.filter((j) => d[j] === k));
            });
          expectClose(neighbourMeans(ties, wealth, new Float64Array(ties.n)), at(1));
          // scratch is allowed any content
          const seen = new Uint32Array(ties.n).fill(3);
          expectClose(secondCircleMeans(ties, wealth, new Float64Array(ties.n), seen), at(2));
        },
      ),
      { numRuns: 60 },
    );
  });
});

describe('local clustering', () => {
  test('is 1 in a triangle, 1/3 where one of three pairs is closed, undefined below two ties', () => {
    const ties = graph(4, [
      [0, 1],
      [1, 2],
      [0, 2],
      [2, 3],
    ]);
    expect([...localClustering(ties)]).toEqual([1, 1, 1 / 3, NaN]);
  });
});

describe('betweenness', () => {
  test('of a star: every pair of leaves goes through the centre', () => {
    const star = graph(6, [
      [0, 1],
      [0, 2],
      [0, 3],
      [0, 4],
      [0, 5],
    ]);
    expect([...betweenness(star)]).toEqual([10, 0, 0, 0, 0, 0]);
  });

  test('is the share of shortest paths through a household, summed over pairs, on any graph', () => {
    fc.assert(
      fc.property(anyGraph, (ties) => {
        const want = new Float64Array(ties.n);
        for (let s = 0; s < ties.n; s++) {
          for (let t = s + 1; t < ties.n; t++) {
            const paths = shortestPaths(ties, s, t);
            for (const path of paths) for (const v of path.slice(1, -1)) want[v] += 1 / paths.length;
          }
        }
        expectClose(betweenness(ties), want);
      }),
      { numRuns: 60 },
    );
  });
});
