import { describe, expect, test } from 'vitest';
import { fromPairs, type Ties } from '../../../network/graph.js';
import { joinCounts } from '../../../network/measure/join-counts.js';
import { moran } from '../../../network/measure/moran.js';
import { joinCountNull, moranNull, tieList, tiePlan } from '../../../sim/measure/tie-null.js';
import { stream } from '../../../sim/random/stream.js';

/** A random graph in which the last three households have no ties. */
function graph(seed: number): Ties {
  const draw = stream('tie-null', seed, 'graph');
  const n = 43;
  const pairs = new Map<number, [number, number]>();
  while (pairs.size < 90) {
    const a = Math.floor(40 * draw());
    const b = Math.floor(40 * draw());
    if (a !== b) pairs.set(Math.min(a, b) * n + Math.max(a, b), [a, b]);
  }
  const list = [...pairs.values()];
  return fromPairs(
    n,
    Uint32Array.from(list, ([a]) => a),
    Uint32Array.from(list, ([, b]) => b),
    null,
  );
}

describe('p-values over fixed ties', () => {
  test('Moran’s I: the same as working each permutation out by itself', () => {
    for (let seed = 0; seed < 8; seed++) {
      const ties = graph(seed);
      const draw = stream('tie-null', seed, 'values');
      // neighbours by number are alike in half of the cases
      const value = Float64Array.from({ length: ties.n }, (_, i) => (seed % 2) * 0.05 * i + draw());
      const list = tieList(ties);
      const plan = tiePlan(list, 99, stream('tie-null', seed, 'plan'));
      const { i, expected } = moran(ties, value, 'row');
      const distances = Array.from({ length: 99 }, (_, r) => {
        const order = plan.list(r);
        const permuted = new Float64Array(ties.n);
        for (let h = 0; h < ties.n; h++) permuted[h] = value[order[h]];
        return Math.abs(moran(ties, permuted, 'row').i - expected);
      });
      const { p, drawn } = moranNull(list, value, i, plan);
      const used = distances.slice(0, drawn);
      const extreme = used.filter((d) => d >= Math.abs(i - expected) - 1e-12).length;
      expect(p).toBe((1 + extreme) / (1 + drawn));
      if (drawn < 99) expect(p).toBeGreaterThan(0.1);
    }
  });

  test('join counts: the same as working each permutation out by itself', () => {
    for (let seed = 0; seed < 8; seed++) {
      const ties = graph(seed);
      const draw = stream('tie-null', seed, 'marks');
      const mark = Uint8Array.from({ length: ties.n }, (_, i) =>
        draw() < (seed % 2 === 0 ? 0.4 : i < 15 ? 0.9 : 0.1) ? 1 : 0,
      );
      const list = tieList(ties);
      const plan = tiePlan(list, 99, stream('tie-null', seed, 'plan'));
      const observed = joinCounts(ties, mark, 'binary').marked.count;
      const counts = Array.from({ length: 99 }, (_, r) => {
        const order = plan.list(r);
        const permuted = new Uint8Array(ties.n);
        mark.forEach((m, h) => {
          permuted[order[h]] = m;
        });
        return joinCounts(ties, permuted, 'binary').marked.count;
      });
      const { p, drawn } = joinCountNull(list, mark, plan);
      const reached = counts.slice(0, drawn).filter((c) => c >= observed).length;
      expect(p).toBe((1 + reached) / (1 + drawn));
      if (drawn < 99) expect(p).toBeGreaterThan(0.1);
    }
  });

  test('nothing to test when marks or values cannot vary', () => {
    const ties = graph(1);
    const list = tieList(ties);
    const plan = tiePlan(list, 19, stream('tie-null', 0, 'plan'));
    expect(joinCountNull(list, new Uint8Array(ties.n), plan).p).toBeNaN();
    expect(joinCountNull(list, new Uint8Array(ties.n).fill(1), plan).p).toBeNaN();
    expect(moranNull(list, new Float64Array(ties.n).fill(2), NaN, plan).p).toBeNaN();
  });
});
