import { expect, test } from 'vitest';
import { drawnSameGroupShare, tiedSameGroupShare } from '../../../network/arrange/drawn-share.js';
import { ladder } from '../../../network/arrange/ladder.js';
import { map } from '../../../network/arrange/map.js';
import { build } from '../../../network/build/build.js';
import { fromPairs } from '../../../network/graph.js';
import { households, stream } from '../stream.js';

// two equal groups in one place each: the case in which a drawing by label would lie most
const n = 2000;
const halves = {
  n,
  place: new Uint32Array(n),
  group: Uint32Array.from({ length: n }, (_, i) => i % 2),
  wealth: Float64Array.from({ length: n }, (_, i) => i + 1),
};

test.each([
  ['a fully mixed network', { kind: 'random', mean_degree: 10 } as const],
  ['a separated network', { kind: 'blocks', mean_degree: 10, within_group: 0.95 } as const],
])('the map of %s shows its separation to within 10 points', (_, spec) => {
  const ties = build(spec, halves, stream('map'));
  const drawn = drawnSameGroupShare(map(ties, stream('start')), halves.group);
  // 10 points: what the viewer promises under the map
  expect(Math.abs(drawn - tiedSameGroupShare(ties, halves.group))).toBeLessThan(0.1);
});

test('the map is the same for the same seed, reports its progress and puts isolates outside', () => {
  const labels = households(200, 4);
  const some = build({ kind: 'random', mean_degree: 6 }, { ...labels, n: 190 }, stream('ties'));
  const start = new Uint32Array(201).fill(some.target.length);
  start.set(some.start);
  const ties = { ...some, n: 200, start };
  const shares: number[] = [];
  const a = map(ties, stream('s'), { steps: 10, onProgress: (s) => shares.push(s) });
  const b = map(ties, stream('s'), { steps: 10 });
  expect(a).toEqual(b);
  expect(shares.length).toBe(10);
  expect(shares.at(-1)).toBe(1);
  const radius = (i: number): number => Math.hypot(a[2 * i], a[2 * i + 1]);
  const tied = Math.max(...Array.from({ length: 190 }, (_, i) => (ties.start[i + 1] > ties.start[i] ? radius(i) : 0)));
  for (let i = 190; i < 200; i++) expect(radius(i)).toBeGreaterThan(tied);
  expect(a.every(Number.isFinite)).toBe(true);
});

test('the drawn share counts nearest neighbours, itself left out', () => {
  // two pairs far apart, each of one group
  const positions = [0, 0, 0, 1, 100, 0, 100, 1];
  expect(drawnSameGroupShare(positions, [0, 0, 1, 1], 1)).toBe(1);
  expect(drawnSameGroupShare(positions, [0, 1, 0, 1], 1)).toBe(0);
  expect(drawnSameGroupShare(positions, [0, 0, 1, 1], 3)).toBeCloseTo(1 / 3, 12);
});

test('the drawn share agrees with looking at everyone', () => {
  const uniform = stream('points');
  const m = 300;
  // uneven on purpose: most points in one corner
  const positions = Float64Array.from({ length: 2 * m }, () => uniform() ** 3);
  const group = Array.from({ length: m }, () => (uniform() < 0.4 ? 1 : 0));
  let sum = 0;
  for (let i = 0; i < m; i++) {
    const nearest = Array.from({ length: m }, (_, j) => j)
      .filter((j) => j !== i)
      .sort(
        (a, b) =>
          Math.hypot(positions[2 * a] - positions[2 * i], positions[2 * a + 1] - positions[2 * i + 1]) -
          Math.hypot(positions[2 * b] - positions[2 * i], positions[2 * b + 1] - positions[2 * i + 1]),
      )
      .slice(0, 8);
    sum += nearest.filter((j) => group[j] === group[i]).length / 8;
  }
  expect(drawnSameGroupShare(positions, group)).toBeCloseTo(sum / m, 12);
});

test('the ladder stands places side by side, poorer to richer, everyone inside its column', () => {
  const labels = households(600, 8);
  const ties = build({ kind: 'blocks', mean_degree: 8, within_place: 0.9 }, labels, stream('ties'));
  const { sideways, columns } = ladder(ties, labels);
  expect(columns.length).toBe(8);
  for (let c = 1; c < columns.length; c++) {
    expect(columns[c].median).toBeGreaterThanOrEqual(columns[c - 1].median);
    expect(columns[c].from).toBeGreaterThan(columns[c - 1].to);
  }
  const of = new Map(columns.map((c) => [c.place, c]));
  const seen = new Set<number>();
  for (let i = 0; i < labels.n; i++) {
    const column = of.get(labels.place[i])!;
    // 1e-6: positions are single precision
    expect(sideways[i]).toBeGreaterThan(column.from - 1e-6);
    expect(sideways[i]).toBeLessThan(column.to + 1e-6);
    seen.add(sideways[i]);
  }
  expect(seen.size).toBe(labels.n);
});

test('in the ladder tied households of a cell stand nearer than chance', () => {
  // forty pairs in one place: with only pairs tied, each pair is pulled together
  const m = 80;
  const ties = fromPairs(
    m,
    Uint32Array.from({ length: 40 }, (_, e) => e),
    Uint32Array.from({ length: 40 }, (_, e) => e + 40),
    null,
  );
  const labels = { n: m, place: new Uint32Array(m), group: new Uint32Array(m), wealth: new Float64Array(m).fill(1) };
  const { sideways } = ladder(ties, labels);
  let apart = 0;
  for (let e = 0; e < 40; e++) apart += Math.abs(sideways[e] - sideways[e + 40]);
  // pairs side by side are 1/80 apart; strangers a third of the width
  expect(apart / 40).toBeLessThan(0.05);
});
