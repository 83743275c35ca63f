/** Global and local autocorrelation: laws, brute force and the honesty of permutation p-values. */
import fc from 'fast-check';
import { expect, test } from 'vitest';
import { build } from '../../../network/build/build.js';
import { fromPairs, hasTie, type Ties } from '../../../network/graph.js';
import { getisOrd } from '../../../network/measure/getis-ord.js';
import { joinCountPermutation, joinCounts } from '../../../network/measure/join-counts.js';
import { localMoran } from '../../../network/measure/local-moran.js';
import { localPermutation } from '../../../network/measure/local-permutation.js';
import { moran, moranPermutation } from '../../../network/measure/moran.js';
import { shuffleValues } from '../../../network/measure/permute.js';
import { households, stream } from '../stream.js';

const labels = households(300, 5);
const ties = build({ kind: 'blocks', mean_degree: 6, within_place: 0.9 }, labels, stream('ties'));

test('Moran’s I does not change when values are scaled and shifted, and turns by itself when negated', () => {
  fc.assert(
    fc.property(
      fc.double({ min: 0.01, max: 100, noNaN: true }),
      fc.double({ min: -100, max: 100, noNaN: true }),
      (scale, shift) => {
        const a = moran(ties, labels.wealth, 'row').i;
        expect(
          moran(
            ties,
            labels.wealth.map((y) => scale * y + shift),
            'row',
          ).i,
        ).toBeCloseTo(a, 9);
        expect(
          moran(
            ties,
            labels.wealth.map((y) => -y),
            'row',
          ).i,
        ).toBeCloseTo(a, 12);
      },
    ),
  );
});

test('with equal values or no ties it is not defined', () => {
  expect(moran(ties, new Float64Array(300).fill(0.1), 'row').i).toBeNaN();
  const none = fromPairs(5, new Uint32Array(0), new Uint32Array(0), null);
  expect(moran(none, Float64Array.of(1, 2, 3, 4, 5), 'row').i).toBeNaN();
  expect(moranPermutation(none, Float64Array.of(1, 2, 3, 4, 5), 'row', 99, stream('p'))).toBeNaN();
  expect(joinCountPermutation(ties, new Uint8Array(300), 'binary', 99, stream('p'))).toBeNaN();
});

test('moments are those of all arrangements of a small network', () => {
  // five households, one of them without a tie: 4! arrangements of the tied ones
  const few = fromPairs(5, Uint32Array.of(0, 0, 1), Uint32Array.of(1, 2, 3), null);
  const value = Float64Array.of(1, 2, 4, 9, 100);
  for (const style of ['binary', 'row'] as const) {
    const all = permutations([1, 2, 4, 9]).map((p) => moran(few, Float64Array.of(...p, 100), style).i);
    const mean = all.reduce((a, b) => a + b, 0) / all.length;
    const variance = all.reduce((a, b) => a + (b - mean) ** 2, 0) / all.length;
    const m = moran(few, value, style);
    expect(m.expected).toBeCloseTo(mean, 12);
    expect(m.varianceRandom).toBeCloseTo(variance, 12);
    const marks = permutations([1, 1, 0, 0]).map((p) => joinCounts(few, [...p, 1], style).marked.count);
    const meanJoins = marks.reduce((a, b) => a + b, 0) / marks.length;
    const j = joinCounts(few, [1, 1, 0, 0, 1], style).marked;
    expect(j.expected).toBeCloseTo(meanJoins, 12);
    expect(j.variance).toBeCloseTo(marks.reduce((a, b) => a + (b - meanJoins) ** 2, 0) / marks.length, 12);
  }
});

function permutations(list: number[]): number[][] {
  if (list.length < 2) return [list];
  return list.flatMap((x, i) => permutations([...list.slice(0, i), ...list.slice(i + 1)]).map((p) => [x, ...p]));
}

test('joins of marked, unmarked and unlike households add up to all', () => {
  fc.assert(
    fc.property(fc.array(fc.nat(1), { minLength: 300, maxLength: 300 }), (mark) => {
      const { marked, unmarked, unlike } = joinCounts(ties, mark, 'binary');
      expect(marked.count + unmarked.count + unlike.count).toBe(ties.target.length / 2);
      expect(marked.expected + unmarked.expected + unlike.expected).toBeCloseTo(ties.target.length / 2, 9);
      const swapped = joinCounts(
        ties,
        mark.map((b) => 1 - b),
        'binary',
      );
      expect(swapped.unmarked).toEqual({ ...marked, p: swapped.unmarked.p });
    }),
  );
});

test('planted clusters are found, scattered values are not', () => {
  const uniform = stream('planted');
  const planted = Float64Array.from(labels.place, (p) => (p < 2 ? 1 : 0));
  expect(joinCountPermutation(ties, planted, 'binary', 199, uniform)).toBe(1 / 200);
  expect(moranPermutation(ties, planted, 'row', 199, uniform)).toBe(1 / 200);
  expect(joinCounts(ties, planted, 'binary').marked.p).toBeLessThan(1e-10);
});

test('p-values of scattered values are uniform: 5 % are below 5 %', () => {
  const uniform = stream('size');
  const few = households(60, 3);
  const net = build({ kind: 'random', mean_degree: 5 }, few, stream('net'));
  const mark = Float64Array.from({ length: 60 }, (_, i) => (i < 20 ? 1 : 0));
  const value = Float64Array.from(few.wealth);
  const draws = 400;
  const low = { joins: 0, moran: 0, local: 0 };
  for (let r = 0; r < draws; r++) {
    shuffleValues(mark, uniform);
    shuffleValues(value, uniform);
    if (joinCountPermutation(net, mark, 'binary', 39, uniform) <= 0.05) low.joins++;
    if (moranPermutation(net, value, 'row', 39, uniform) <= 0.05) low.moran++;
    if (localPermutation(net, value, 39, uniform).p[7] <= 0.05) low.local++;
  }
  // binomial(400, 0.05): sd 4.4, four of these; joins are whole numbers, and ties of them count against rejection
  expect(low.moran).toBeGreaterThan(2);
  expect(low.moran).toBeLessThan(38);
  expect(low.joins).toBeLessThan(38);
  expect(low.joins).toBeGreaterThan(0);
  expect(low.local).toBeGreaterThan(2);
  expect(low.local).toBeLessThan(38);
});

test('local Moran sums to the global one', () => {
  for (const style of ['binary', 'row'] as const) {
    const local = localMoran(ties, labels.wealth, style).i;
    let sum = 0;
    let s0 = 0;
    for (let i = 0; i < 300; i++) {
      const k = ties.start[i + 1] - ties.start[i];
      if (k === 0) {
        expect(local[i]).toBeNaN();
        continue;
      }
      sum += local[i];
      s0 += style === 'row' ? 1 : k;
    }
    expect(sum / s0).toBeCloseTo(moran(ties, labels.wealth, style).i, 10);
  }
});

test('Getis–Ord agrees with its moments over all draws of neighbours', () => {
  // a path of five: household 1 has two ties; over draws of two from the other four (G), or three from five (G*)
  const path = fromPairs(5, Uint32Array.of(0, 1, 2, 3), Uint32Array.of(1, 2, 3, 4), null);
  const value = Float64Array.of(3, 1, 4, 1.5, 9);
  const z = (draws: number[][], seen: number[]): number => {
    const sums = draws.map((d) => d.reduce((a, i) => a + value[i], 0));
    const mean = sums.reduce((a, b) => a + b, 0) / sums.length;
    const sd = Math.sqrt(sums.reduce((a, b) => a + (b - mean) ** 2, 0) / sums.length);
    return (seen.reduce((a, i) => a + value[i], 0) - mean) / sd;
  };
  expect(getisOrd(path, value, false)[1]).toBeCloseTo(z(subsets([0, 2, 3, 4], 2), [0, 2]), 12);
  expect(getisOrd(path, value, true)[1]).toBeCloseTo(z(subsets([0, 1, 2, 3, 4], 3), [0, 1, 2]), 12);
});

function subsets(list: number[], k: number): number[][] {
  if (k === 0) return [[]];
  return list.flatMap((x, i) => subsets(list.slice(i + 1), k - 1).map((rest) => [x, ...rest]));
}

test('local permutation p-values agree with drawing neighbours anew for every household', () => {
  const few = households(40, 2);
  const net = build({ kind: 'random', mean_degree: 4 }, few, stream('net'));
  const R = 1999;
  const uniform = stream('local');
  const { p, side } = localPermutation(net, few.wealth, R, uniform);
  for (let i = 0; i < 40; i++) {
    const k = net.start[i + 1] - net.start[i];
    if (k === 0) {
      expect(p[i]).toBeNaN();
      continue;
    }
    // everyone with ties but i itself
    const others = Array.from({ length: 40 }, (_, j) => j).filter((j) => j !== i && net.start[j + 1] > net.start[j]);
    let observed = 0;
    for (const j of others) if (hasTie(net, i, j)) observed += few.wealth[j];
    let above = 0;
    let below = 0;
    for (let r = 0; r < R; r++) {
      let sum = 0;
      for (let a = 0; a < k; a++) {
        const b = a + Math.floor(uniform() * (others.length - a));
        [others[a], others[b]] = [others[b], others[a]];
        sum += few.wealth[others[a]];
      }
      if (sum >= observed - 1e-12) above++;
      if (sum <= observed + 1e-12) below++;
    }
    const direct = Math.min(1, (2 * (Math.min(above, below) + 1)) / (R + 1));
    // two independent samples of 1,999: sd of the difference at most 2 · √(2 · ¼ / 1999) = 0.032; four of these
    expect(Math.abs(p[i] - direct)).toBeLessThan(0.13);
    if (direct < 0.5) expect(side[i]).toBe(above < below ? 1 : -1);
  }
});

test('a household that is tied to everyone has no reference set but its own', () => {
  const star = build({ kind: 'named', name: 'star' }, households(6, 1), stream('x'));
  const { p } = localPermutation(star, Float64Array.of(1, 2, 3, 4, 5, 6), 99, stream('p'));
  expect(p[0]).toBe(1);
});

test('renumbering households permutes local results and leaves global ones', () => {
  const order = Uint32Array.from({ length: 300 }, (_, i) => (i * 7 + 3) % 300);
  const source: number[] = [];
  const target: number[] = [];
  for (let i = 0; i < 300; i++) {
    for (let e = ties.start[i]; e < ties.start[i + 1]; e++) {
      if (ties.target[e] > i) {
        source.push(order[i]);
        target.push(order[ties.target[e]]);
      }
    }
  }
  const moved: Ties = fromPairs(300, Uint32Array.from(source), Uint32Array.from(target), null);
  const value = new Float64Array(300);
  for (let i = 0; i < 300; i++) value[order[i]] = labels.wealth[i];
  expect(moran(moved, value, 'row').i).toBeCloseTo(moran(ties, labels.wealth, 'row').i, 12);
  const a = localMoran(ties, labels.wealth, 'row').i;
  const b = localMoran(moved, value, 'row').i;
  for (let i = 0; i < 300; i++) if (!Number.isNaN(a[i])) expect(b[order[i]]).toBeCloseTo(a[i], 10);
});
