import fc from 'fast-check';
import { expect, test } from 'vitest';
import { build, NETWORK_KINDS } from '../../../network/build/build.js';
import { NAMED_GRAPHS, namedSize } from '../../../network/build/named.js';
import { reached } from '../../../network/build/reached.js';
import type { NetworkSpec } from '../../../network/build/spec.js';
import { InputError } from '../../../network/errors.js';
import { degrees, hasTie, type Labels, type Ties, tieCount } from '../../../network/graph.js';
import { rankAssortativity } from '../../../network/measure/assortativity.js';
import { households, stream } from '../stream.js';

/** Fails unless rows ascend, nobody is tied to itself, and every tie stands at both ends. */
function expectSimple(ties: Ties): void {
  expect(ties.start.length).toBe(ties.n + 1);
  expect(ties.start[ties.n]).toBe(ties.target.length);
  for (let i = 0; i < ties.n; i++) {
    for (let e = ties.start[i]; e < ties.start[i + 1]; e++) {
      const j = ties.target[e];
      if (j === i || j >= ties.n) throw new Error(`tie of ${i} and ${j}`);
      if (e > ties.start[i] && ties.target[e - 1] >= j) throw new Error(`row ${i} does not ascend`);
      if (!hasTie(ties, j, i)) throw new Error(`tie ${i}-${j} stands at one end only`);
    }
  }
}

const SPECS: NetworkSpec[] = [
  { kind: 'blocks', mean_degree: 9, within_place: 0.9, within_group: 0.8 },
  { kind: 'similarity', mean_degree: 9, strength: 0.7 },
  { kind: 'ring', degree: 8, rewire: 0.2, order: 'place' },
  { kind: 'random', mean_degree: 9 },
  { kind: 'preferential', ties: 4 },
  { kind: 'spatial', mean_degree: 9, spread: 0.1 },
  { kind: 'configuration', degrees: { kind: 'lognormal', mean: 9, sd_log: 0.6 }, within_place: 0.8 },
];

test.each(SPECS)('$kind: simple ties, the same for the same seed, other for another', (spec) => {
  const labels = households(800, 10);
  const a = build(spec, labels, stream('a'));
  expectSimple(a);
  expect(build(spec, labels, stream('a')).target).toEqual(a.target);
  expect(build(spec, labels, stream('b')).target).not.toEqual(a.target);
});

test.each(SPECS)('$kind: reaches its mean degree', (spec) => {
  const labels = households(4000, 40);
  const ties = build(spec, labels, stream('degree'));
  const asked = 'mean_degree' in spec ? spec.mean_degree : spec.kind === 'configuration' ? 9 : 8;
  // sd of a mean degree of independent ties is √(2 · 9 / 4000) = 0.07; lognormal degrees: 6.5 / √4000 = 0.1; four of these
  expect(Math.abs(reached(ties, labels).mean_degree - asked)).toBeLessThan(0.4);
});

test('any small population: simple ties, or a refusal that says so', () => {
  fc.assert(
    fc.property(
      fc.integer({ min: 1, max: 40 }),
      fc.integer({ min: 1, max: 6 }),
      fc.constantFrom(...SPECS),
      fc.integer(),
      (n, places, spec, seed) => {
        const labels = households(n, Math.min(places, n), String(seed));
        try {
          expectSimple(build(spec, labels, stream(String(seed))));
        } catch (error) {
          if (!(error instanceof InputError)) throw error;
          expect(error.problems[0].code).toBe('network-infeasible');
          expect(error.problems[0].place).toMatch(/^network\./);
        }
      },
    ),
    { numRuns: 300 },
  );
});

test.each([
  [0.97, 0.8],
  [0.9, 0.6],
  [0.6, 0.95],
  [0.3, undefined],
  [undefined, undefined],
])('blocks: shares %s in place and %s in group are reached in unequal villages', (within_place, within_group) => {
  // villages of 40 to 115 households, groups at random, so that some have few of one
  const labels = households(4000, 55);
  const ties = build({ kind: 'blocks', mean_degree: 10, within_place, within_group }, labels, stream('shares'));
  const got = reached(ties, labels);
  // sd of a share over 20,000 ties (12,000 inside places) is at most 0.0045; four of these
  if (within_place !== undefined) expect(Math.abs(got.within_place - within_place)).toBeLessThan(0.018);
  else expect(got.within_place).toBeLessThan(0.03);
  if (within_group !== undefined) expect(Math.abs(got.within_group - within_group)).toBeLessThan(0.018);
});

test('blocks: every household expects the same degree, in small villages and of either group', () => {
  const labels = households(1200, 20);
  const sum = new Float64Array(labels.n);
  const draws = 60;
  const uniform = stream('draws');
  for (let r = 0; r < draws; r++) {
    const spec = { kind: 'blocks', mean_degree: 10, within_place: 0.9, within_group: 0.8 } as const;
    degrees(build(spec, labels, uniform)).forEach((k, i) => {
      sum[i] += k;
    });
  }
  for (const key of ['place', 'group'] as const) {
    const by = new Map<number, number[]>();
    sum.forEach((s, i) => {
      const list = by.get(labels[key][i]) ?? [];
      list.push(s / draws);
      by.set(labels[key][i], list);
    });
    for (const list of by.values()) {
      const mean = list.reduce((a, b) => a + b, 0) / list.length;
      // villages have 30 households or more: sd of their mean over 60 draws is √(2 · 10 / 1800) = 0.1 at most
      expect(Math.abs(mean - 10)).toBeLessThan(0.5);
    }
  }
});

test('blocks: a lone member of a group in its village keeps its ties', () => {
  const labels = households(300, 5, 'lone');
  for (let i = 0; i < 300; i++) if (labels.place[i] === 0) labels.group[i] = i === 0 ? 1 : 0;
  const spec = { kind: 'blocks', mean_degree: 10, within_place: 1, within_group: 0.8 } as const;
  let sum = 0;
  const uniform = stream('lone');
  for (let r = 0; r < 200; r++) sum += degrees(build(spec, labels, uniform))[0];
  // sd √(10 / 200) = 0.22; all its ties cross, whatever the share
  expect(Math.abs(sum / 200 - 10)).toBeLessThan(0.9);
});

test.each([
  [{ kind: 'blocks', mean_degree: 30, within_place: 1 }, 'mean_degree', /place \d+ has \d+ households, too few/],
  [{ kind: 'blocks', mean_degree: 600 }, 'mean_degree', /600 ties for each of 400 households/],
  [{ kind: 'ring', degree: 7, rewire: 0 }, 'degree', /7 ties/],
  [{ kind: 'ring', degree: 400, rewire: 0 }, 'degree', /400 ties/],
  [{ kind: 'preferential', ties: 0 }, 'ties', /0 ties a newcomer/],
  [{ kind: 'preferential', ties: 400 }, 'ties', /400 ties a newcomer/],
  [{ kind: 'random', mean_degree: 400 }, 'mean_degree', /only 399 others/],
  [{ kind: 'configuration', degrees: { kind: 'poisson', mean: 8 }, within_place: 0.001 }, 'within_place', /chance/],
  [{ kind: 'named', name: 'karate_club' }, 'name', /34 households, the population 400/],
] as [NetworkSpec, string, RegExp][])('refuses %j', (spec, key, problem) => {
  try {
    build(spec, households(400, 20), stream('x'));
    expect.unreachable('should be refused');
  } catch (error) {
    expect(error).toBeInstanceOf(InputError);
    const [first] = (error as InputError).problems;
    expect(first.code).toBe('network-infeasible');
    expect(first.place).toBe(`network.${key}`);
    expect(first.problem).toMatch(problem);
    expect(first.remedy).not.toBe('');
  }
});

test('blocks: one place cannot send ties away, and a group that is everybody cannot cross', () => {
  const one = households(100, 1);
  expect(() => build({ kind: 'blocks', mean_degree: 5, within_place: 0.9 }, one, stream('x'))).toThrow(/one place/);
  const alike = { ...one, group: new Uint32Array(100) };
  expect(() => build({ kind: 'blocks', mean_degree: 5, within_group: 0.5 }, alike, stream('x'))).toThrow(
    /give a share from 1 to 1/,
  );
});

test('similarity: assortativity of wealth rank comes out close to the strength, and degrees stay even', () => {
  const labels = households(5000, 1);
  for (const strength of [0, 0.3, 0.7, 1]) {
    const ties = build({ kind: 'similarity', mean_degree: 10, strength }, labels, stream('sim'));
    // sd of a correlation over 25,000 ties is 0.006
    expect(Math.abs(rankAssortativity(ties, labels.wealth) - strength)).toBeLessThan(0.025);
    const order = Array.from({ length: 5000 }, (_, i) => i).sort((i, j) => labels.wealth[i] - labels.wealth[j]);
    const degree = degrees(ties);
    const poorest = order.slice(0, 100).reduce((s, i) => s + degree[i], 0) / 100;
    // sd √(10 / 100) = 0.3
    expect(Math.abs(poorest - 10)).toBeLessThan(1.3);
  }
});

test('ring: neighbours follow the order asked for', () => {
  const labels = households(300, 6);
  const byWealth = build({ kind: 'ring', degree: 2, rewire: 0, order: 'wealth' }, labels, stream('r'));
  const order = Array.from({ length: 300 }, (_, i) => i).sort((i, j) => labels.wealth[i] - labels.wealth[j]);
  for (let a = 0; a < 300; a++) expect(hasTie(byWealth, order[a], order[(a + 1) % 300])).toBe(true);
  const byPlace = build({ kind: 'ring', degree: 2, rewire: 0, order: 'place' }, labels, stream('r'));
  // one tie leaves each place on the way to the next
  expect(reached(byPlace, labels).within_place).toBeCloseTo(1 - 6 / 300, 12);
});

test('spatial: on one spot no tie leaves a place, scattered over everything place means nothing', () => {
  const labels = households(1000, 10);
  const spot = build({ kind: 'spatial', mean_degree: 8, spread: 0 }, labels, stream('s'));
  expect(reached(spot, labels).within_place).toBe(1);
  const scattered = build({ kind: 'spatial', mean_degree: 8, spread: 1 }, labels, stream('s'));
  expect(reached(scattered, labels).within_place).toBeLessThan(0.15);
  expect(tieCount(scattered)).toBe(4000);
});

test('spatial: places too small for the degree spill over into the nearest', () => {
  const labels = { ...households(200, 20), place: Uint32Array.from({ length: 200 }, (_, i) => i % 20) };
  const ties = build({ kind: 'spatial', mean_degree: 12, spread: 0 }, labels, stream('s'));
  expect(tieCount(ties)).toBe(1200);
  // all 900 pairs inside places are nearer than any other
  expect(reached(ties, labels).within_place).toBe(900 / 1200);
});

test('configuration: given degrees are kept exactly, also hubs in small places', () => {
  const labels = households(300, 30);
  const given = Uint32Array.from({ length: 300 }, (_, i) => (i < 3 ? 80 : 4));
  const spec = { kind: 'configuration', degrees: { kind: 'file', path: 'k.csv' }, within_place: 0.7 } as const;
  const ties = build(spec, labels, stream('c'), { degrees: given });
  expectSimple(ties);
  expect(degrees(ties)).toEqual(given);
});

test('configuration: shares in place and group are reached', () => {
  const labels = households(4000, 40);
  const spec = {
    kind: 'configuration',
    degrees: { kind: 'poisson', mean: 10 },
    within_place: 0.85,
    within_group: 0.8,
  } as const;
  const got = reached(build(spec, labels, stream('c')), labels);
  // sd of a share over 20,000 ties is 0.003; repairs move a few ties more
  expect(Math.abs(got.within_place - 0.85)).toBeLessThan(0.02);
  expect(Math.abs(got.within_group - 0.8)).toBeLessThan(0.02);
});

test.each([
  [[1, 1, 1], 'degrees-odd'],
  [[3, 3, 1, 1], 'degrees-not-graphical'],
  [[4, 1, 1, 1, 1, 0.5], 'degrees-value'],
  [[1, 1], 'degrees-count'],
])('configuration: degrees %j are refused as %s', (given, code) => {
  const n = code === 'degrees-count' ? 5 : given.length;
  const spec = { kind: 'configuration', degrees: { kind: 'file', path: 'k.csv' } } as const;
  try {
    build(spec, households(n, 1), stream('c'), { degrees: given });
    expect.unreachable('no such network');
  } catch (error) {
    expect(error).toBeInstanceOf(InputError);
    expect((error as InputError).problems[0].code).toBe(code);
    expect((error as InputError).problems[0].place).toBe('k.csv');
  }
});

test('named: published graphs have their sizes, shapes take any', () => {
  const of = (n: number): Labels => households(n, 1);
  const count = (name: string, n: number): number => tieCount(build({ kind: 'named', name }, of(n), stream('n')));
  expect(count('karate_club', 34)).toBe(78);
  expect(count('florentine_families', 15)).toBe(20);
  expect(count('krackhardt_kite', 10)).toBe(18);
  expect(count('complete', 7)).toBe(21);
  expect(count('path', 7)).toBe(6);
  expect(count('ladder', 8)).toBe(10);
  expect(count('star', 7)).toBe(6);
  expect(count('cycle', 7)).toBe(7);
  expect(count('empty', 7)).toBe(0);
  expect(NAMED_GRAPHS.map(namedSize)).toContain(34);
  for (const name of NAMED_GRAPHS) expectSimple(build({ kind: 'named', name }, of(namedSize(name) ?? 8), stream('n')));
  expect(() => count('karate_clubb', 34)).toThrow(/did you mean karate_club\?/);
});

test('every kind of the specification has a builder', () => {
  expect([...NETWORK_KINDS].sort()).toEqual(
    ['blocks', 'configuration', 'file', 'named', 'preferential', 'random', 'ring', 'similarity', 'spatial'].sort(),
  );
});
