/**
 * An audit of written results: everything is recomputed from the files alone, in a different way from the engine.
 *
 * Aspirations come from the tie table and the wealth column by plain sums over lists; choices are solved again by
 * brute force (a grid, then golden-section search on every piece); identities, shared luck and degrees are checked
 * row by row. Nothing of the engine is imported.
 */
import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { beforeAll, describe, expect, test } from 'vitest';
import { csvColumns, rungsight, temporaryFolder } from './command.js';

const PANEL = [
  'arm', 'replicate', 'generation', 'household', 'place', 'group', 'wealth', 'aspiration_1', 'aspiration_2',
  'investment', 'consumption', 'planned_child_wealth', 'shock', 'child_wealth', 'growth', 'milestones_met',
  'frustrated', 'milestones_reached', 'wealth_rank', 'neighbour_mean_wealth', 'second_circle_mean_wealth',
  'neighbour_frustrated_share', 'neighbour_mean_growth', 'aspiration_gap', 'isolated',
]; // biome-ignore format: one list

interface Preferences {
  curvature: number;
  childWeight: number;
  eta: number;
  weights: number[];
}

interface StudyCase {
  name: string;
  yaml: string;
  technology: (k: number) => number;
  preferences: (group: string) => Preferences;
  aspirations: (look: Look) => number[][];
}

/** What the audit knows of one arm, replicate and generation. */
interface Look {
  n: number;
  wealth: number[];
  place: number[];
  group: string[];
  neighbours: number[][];
}

const mean = (x: number[]): number => x.reduce((a, b) => a + b, 0) / x.length;
const quantile = (x: number[], q: number): number => {
  const s = [...x].sort((a, b) => a - b);
  const h = (s.length - 1) * q;
  const low = Math.floor(h);
  return s[low]! + (h - low) * ((s[low + 1] ?? s[low]!) - s[low]!);
};
const above = (own: number, x: number[]): number => {
  const richer = x.filter((y) => y > own);
  return richer.length > 0 ? mean(richer) : own;
};
const similar = (own: number, x: number[], h: number): number => {
  const w = x.map((y) => Math.exp(-((Math.log(y) - Math.log(own)) ** 2) / (2 * h * h)));
  return x.reduce((a, y, i) => a + y * w[i]!, 0) / w.reduce((a, b) => a + b, 0);
};
const secondCircle = (neighbours: number[][], i: number): number[] => {
  const own = new Set([i, ...neighbours[i]!]);
  return [...new Set(neighbours[i]!.flatMap((j) => neighbours[j]!))].filter((j) => !own.has(j));
};

const CASES: StudyCase[] = [
  {
    name: 'linear technology, two milestones, groups, two places',
    yaml: `study: Audit one
seed: audit-1
replicates: 2
generations: 4
population:
  households: 120
  places: 4
  groups:
    - {name: plain, share: 0.6}
    - {name: hill, share: 0.4, relative_wealth: 0.5, preferences: {child_weight: 0.5}}
  wealth: {shape: lognormal, mean: 100, gini: 0.35, between_places: 0.3}
technology: {kind: linear, gross_return: 2.5}
shock: {sd_log: 0.2, shared_by_place: 0.3}
preferences: {curvature: 0.6, child_weight: 0.35}
reference:
  milestones:
    - weight: 0.6
      mix:
        - {from: neighbours, statistic: upward_mean, weight: 0.7}
        - {from: self, weight: 0.1}
        - {from: society, weight: 0.2}
    - weight: 0.3
      scale: 1.1
      mix:
        - {from: place, statistic: quantile, q: 0.9, weight: 0.5}
        - {from: second_circle, weight: 0.5}
arms:
  - name: apart
    network: {kind: blocks, mean_degree: 6, within_place: 0.9}
  - name: mixed
    network: {from: apart, mixing: {share: 1}}
keep: {formats: [csv, parquet]}
`,
    technology: (k) => 2.5 * k,
    preferences: (group) => ({
      curvature: 0.6,
      childWeight: group === 'hill' ? 0.5 : 0.35,
      eta: 0.6,
      weights: [0.6, 0.3],
    }),
    aspirations: ({ n, wealth, place, neighbours }) => {
      const society = mean(wealth);
      return Array.from({ length: n }, (_, i) => {
        const own = wealth[i]!;
        const near = neighbours[i]!.map((j) => wealth[j]!);
        const village = wealth.filter((_, j) => place[j] === place[i]);
        const circle = secondCircle(neighbours, i).map((j) => wealth[j]!);
        return [
          0.7 * (near.length > 0 ? above(own, near) : own) + 0.1 * own + 0.2 * society,
          1.1 * (0.5 * quantile(village, 0.9) + 0.5 * (circle.length > 0 ? mean(circle) : own)),
        ];
      });
    },
  },
  {
    name: 'concave technology, one milestone looked at twice, likeness and group',
    yaml: `study: Audit two
seed: audit-2
replicates: 1
generations: 5
population:
  households: 100
  places: 5
  groups: [{name: east, share: 0.5}, {name: west, share: 0.5, relative_wealth: 0.7}]
  wealth: {shape: pareto_tail, mean: 50, sd_log: 0.5, pareto_tail: {above_quantile: 0.9, exponent: 2}}
technology: {kind: concave, scale: 8, elasticity: 0.6, depreciation: 0.9}
shock: {sd_log: 0.3}
preferences: {curvature: 0.5, child_weight: 0.5, milestone_curvature: 0.7}
reference:
  milestones:
    - weight: 1
      mix:
        - {from: neighbours, statistic: similarity_mean, window: 0.5, weight: 0.6}
        - {from: group, statistic: median, weight: 0.4}
    - weight: 0.5
      mix: [{from: neighbours, statistic: max, weight: 1}]
arms:
  - name: ring
    network: {kind: ring, degree: 6, rewire: 0.1, order: wealth}
  - name: connected
    network: {from: ring, mixing: {target: economic_connectedness, value: 0.95, best_effort: true}}
keep: {formats: [csv, parquet]}
`,
    technology: (k) => 8 * k ** 0.6 + 0.1 * k,
    preferences: () => ({ curvature: 0.5, childWeight: 0.5, eta: 0.7, weights: [1, 0.5] }),
    aspirations: ({ n, wealth, group, neighbours }) =>
      Array.from({ length: n }, (_, i) => {
        const own = wealth[i]!;
        const near = neighbours[i]!.map((j) => wealth[j]!);
        const kin = wealth.filter((_, j) => group[j] === group[i]);
        return [
          0.6 * (near.length > 0 ? similar(own, near, 0.5) : own) + 0.4 * quantile(kin, 0.5),
          near.length > 0 ? Math.max(...near) : own,
        ];
      }),
  },
];

/** Utility of a plan as the model states it. */
function utility(y: number, k: number, z: number, a: number[], p: Preferences): number {
  const s = p.curvature;
  let u = (y - k) ** (1 - s) / (1 - s) + p.childWeight * (z ** (1 - s) / (1 - s));
  a.forEach((milestone, m) => {
    if (z > milestone) u += (p.childWeight * p.weights[m]! * (z - milestone) ** (1 - p.eta)) / (1 - p.eta);
  });
  return u;
}

/** Best plan by brute force: each piece between milestones is searched on a grid, then by golden section. */
function bruteForce(y: number, a: number[], study: StudyCase, p: Preferences): { z: number; u: number; met: number } {
  const f = study.technology;
  const kOf = (z: number): number => {
    let low = 0;
    let high = y;
    for (let i = 0; i < 200; i++) {
      const middle = (low + high) / 2;
      if (f(middle) < z) low = middle;
      else high = middle;
    }
    return (low + high) / 2;
  };
  const value = (k: number): number => utility(y, k, f(k), a, p);
  const cuts = [0, ...a.map(kOf).filter((k) => k > 0 && k < y), y].sort((x, z) => x - z);
  let best = { k: 0, u: -Infinity };
  for (let c = 0; c + 1 < cuts.length; c++) {
    const [from, to] = [cuts[c]!, cuts[c + 1]!];
    const steps = 400;
    let at = 0;
    let top = -Infinity;
    for (let i = 0; i <= steps; i++) {
      // finer towards the ends, where slopes are steep
      const x = 0.5 - 0.5 * Math.cos((Math.PI * i) / steps);
      const u = value(from + (to - from) * x);
      if (u > top) {
        top = u;
        at = i;
      }
    }
    const point = (i: number): number => from + (to - from) * (0.5 - 0.5 * Math.cos((Math.PI * i) / steps));
    let low = point(Math.max(0, at - 1));
    let high = point(Math.min(steps, at + 1));
    const ratio = (Math.sqrt(5) - 1) / 2;
    for (let i = 0; i < 90; i++) {
      const left = high - ratio * (high - low);
      const right = low + ratio * (high - low);
      if (value(left) < value(right)) low = left;
      else high = right;
    }
    const k = (low + high) / 2;
    if (value(k) > best.u) best = { k, u: value(k) };
  }
  const z = f(best.k);
  return { z, u: best.u, met: a.filter((milestone) => z >= milestone).length };
}

describe.each(CASES)('$name', (study) => {
  const folder = temporaryFolder();
  let panel: ReturnType<typeof csvColumns>;
  let ties: ReturnType<typeof csvColumns>;
  const number = new Map<string, number[]>();
  const num = (name: string): number[] => {
    let column = number.get(name);
    if (column === undefined) {
      column = panel.column(name).map((cell) => (cell === '' ? NaN : Number(cell)));
      number.set(name, column);
    }
    return column;
  };
  /** First rows of each arm × replicate × generation, in file order. */
  const blocks: { arm: string; replicate: number; generation: number; from: number; n: number }[] = [];

  beforeAll(() => {
    writeFileSync(join(folder, 's.yaml'), study.yaml);
    const ran = rungsight(['run', 's.yaml', '--out', 'out', '--threads', '2'], folder);
    expect(ran.err + ran.out).toContain('Results are in out');
    expect(ran.status).toBe(0);
    panel = csvColumns(join(folder, 'out', 'panel.csv'));
    ties = csvColumns(join(folder, 'out', 'ties.csv'));
    const arm = panel.column('arm');
    for (let row = 0; row < panel.rows; row++) {
      const last = blocks.at(-1);
      const same =
        last !== undefined &&
        last.arm === arm[row] &&
        last.replicate === num('replicate')[row] &&
        last.generation === num('generation')[row];
      if (same) last.n++;
      else {
        blocks.push({
          arm: arm[row]!,
          replicate: num('replicate')[row]!,
          generation: num('generation')[row]!,
          from: row,
          n: 1,
        });
      }
    }
  });

  const lookAt = (block: (typeof blocks)[number]): Look => {
    const rows = <T>(column: T[]): T[] => column.slice(block.from, block.from + block.n);
    const neighbours: number[][] = Array.from({ length: block.n }, () => []);
    const [arm, replicate, source, target] = ['arm', 'replicate', 'source', 'target'].map((name) => ties.column(name));
    for (let e = 0; e < ties.rows; e++) {
      if (arm![e] !== block.arm || Number(replicate![e]) !== block.replicate) continue;
      neighbours[Number(source![e])]!.push(Number(target![e]));
      neighbours[Number(target![e])]!.push(Number(source![e]));
    }
    return {
      n: block.n,
      wealth: rows(num('wealth')),
      place: rows(num('place')),
      group: rows(panel.column('group')),
      neighbours,
    };
  };

  test('the panel has the columns of the contract, in order, and the rows in order', () => {
    expect(panel.names.slice(0, PANEL.length)).toEqual(PANEL);
    const arms = [...new Set(panel.column('arm'))];
    const expected: string[] = [];
    const replicates = Math.max(...num('replicate')) + 1;
    const generations = Math.max(...num('generation')) + 1;
    for (const arm of arms) {
      for (let r = 0; r < replicates; r++) for (let t = 0; t < generations; t++) expected.push(`${arm} ${r} ${t}`);
    }
    expect(blocks.map((b) => `${b.arm} ${b.replicate} ${b.generation}`)).toEqual(expected);
    for (const block of blocks) {
      expect(num('household').slice(block.from, block.from + block.n)).toEqual(
        Array.from({ length: block.n }, (_, i) => i),
      );
    }
  });

  test('aspirations follow from ties and wealth', () => {
    for (const block of blocks) {
      const expected = study.aspirations(lookAt(block));
      expected.forEach((own, i) => {
        own.forEach((a, m) => {
          // sums in another order: a few units in the last place
          expect(Math.abs(num(`aspiration_${m + 1}`)[block.from + i]! / a - 1)).toBeLessThan(1e-11);
        });
      });
    }
  });

  test('choices are the best there are', () => {
    const step = Math.ceil(panel.rows / 400);
    for (let row = 0; row < panel.rows; row += step) {
      const y = num('wealth')[row]!;
      const a = [num('aspiration_1')[row]!, num('aspiration_2')[row]!];
      const p = study.preferences(panel.column('group')[row]!);
      const brute = bruteForce(y, a, study, p);
      const z = num('planned_child_wealth')[row]!;
      const own = utility(y, num('investment')[row]!, z, a, p);
      // never worse than brute force; where the two plans tie, either may be chosen
      expect(own).toBeGreaterThanOrEqual(brute.u - 1e-12 * Math.abs(brute.u));
      if (Math.abs(own - brute.u) <= 1e-12 * Math.abs(own) && num('milestones_met')[row] !== brute.met) continue;
      expect(num('milestones_met')[row]).toBe(brute.met);
      // golden section finds a flat top to the square root of the precision of utility
      expect(Math.abs(z / brute.z - 1)).toBeLessThan(1e-6);
    }
  });

  test('the accounting identities hold in every row', () => {
    const [y, k, c, z, e, child] = [
      'wealth',
      'investment',
      'consumption',
      'planned_child_wealth',
      'shock',
      'child_wealth',
    ].map(num);
    for (let row = 0; row < panel.rows; row++) {
      expect(Math.abs(k![row]! + c![row]! - y![row]!)).toBeLessThan(1e-12 * y![row]!);
      expect(Math.abs(study.technology(k![row]!) / z![row]! - 1)).toBeLessThan(1e-12);
      expect(child![row]).toBe(z![row]! * e![row]!);
      expect(num('growth')[row]).toBe(child![row]! / y![row]!);
      const a = [num('aspiration_1')[row]!, num('aspiration_2')[row]!];
      expect(num('milestones_met')[row]).toBe(a.filter((m) => z![row]! >= m).length);
      expect(num('frustrated')[row]).toBe(num('milestones_met')[row] === 0 ? 1 : 0);
      expect(num('milestones_reached')[row]).toBe(a.filter((m) => child![row]! >= m).length);
      expect(num('aspiration_gap')[row]).toBeCloseTo(1 - y![row]! / a[0]!, 12);
    }
  });

  test('children inherit, and arms share starts and luck', () => {
    const byKey = new Map(blocks.map((b) => [`${b.arm} ${b.replicate} ${b.generation}`, b]));
    const first = blocks[0]!.arm;
    for (const block of blocks) {
      const next = byKey.get(`${block.arm} ${block.replicate} ${block.generation + 1}`);
      const twin = byKey.get(`${first} ${block.replicate} ${block.generation}`)!;
      for (let i = 0; i < block.n; i++) {
        if (next !== undefined) expect(num('wealth')[next.from + i]).toBe(num('child_wealth')[block.from + i]);
        expect(num('shock')[block.from + i]).toBe(num('shock')[twin.from + i]);
        if (block.generation === 0) expect(num('wealth')[block.from + i]).toBe(num('wealth')[twin.from + i]);
      }
    }
  });

  test('what households see around them is recorded', () => {
    for (const block of blocks.slice(0, 4)) {
      const { wealth, neighbours, n } = lookAt(block);
      for (let i = 0; i < n; i++) {
        const row = block.from + i;
        const near = neighbours[i]!;
        expect(num('isolated')[row]).toBe(
          near.length === 0 || (study === CASES[0] && secondCircle(neighbours, i).length === 0) ? 1 : 0,
        );
        const rank =
          wealth.filter((y) => y < wealth[i]!).length + (wealth.filter((y) => y === wealth[i]).length - 1) / 2;
        expect(num('wealth_rank')[row]).toBeCloseTo(rank / (n - 1), 12);
        if (near.length === 0) {
          expect(panel.column('neighbour_mean_wealth')[row]).toBe('');
          continue;
        }
        expect(num('neighbour_mean_wealth')[row]! / mean(near.map((j) => wealth[j]!))).toBeCloseTo(1, 11);
        expect(num('neighbour_frustrated_share')[row]).toBeCloseTo(
          mean(near.map((j) => num('frustrated')[block.from + j]!)),
          12,
        );
        expect(num('neighbour_mean_growth')[row]).toBeCloseTo(
          mean(near.map((j) => num('growth')[block.from + j]!)),
          11,
        );
        const circle = secondCircle(neighbours, i);
        if (circle.length > 0) {
          expect(num('second_circle_mean_wealth')[row]! / mean(circle.map((j) => wealth[j]!))).toBeCloseTo(1, 11);
        }
      }
    }
  });

  test('mixing keeps every household’s number of ties', () => {
    const households = csvColumns(join(folder, 'out', 'households.csv'));
    const [arm, replicate, degree] = ['arm', 'replicate', 'degree'].map((name) => households.column(name));
    const arms = [...new Set(arm)];
    const of = (name: string, r: string): string[] => degree!.filter((_, i) => arm![i] === name && replicate![i] === r);
    for (const r of new Set(replicate)) expect(of(arms[1]!, r)).toEqual(of(arms[0]!, r));
    const [source, target] = ['source', 'target'].map((name) => ties.column(name).map(Number));
    for (let e = 0; e < ties.rows; e++) expect(source![e]!).toBeLessThan(target![e]!);
  });

  test('the study written out gives the same folder again, whatever the number of threads', () => {
    const ran = rungsight(['run', join('out', 'study.yaml'), '--out', 'again', '--threads', '1'], folder);
    expect(ran.status).toBe(0);
    const manifest = (name: string): { files: { name: string; sha256: string }[] } =>
      JSON.parse(readFileSync(join(folder, name, 'manifest.json'), 'utf8'));
    expect(manifest('again').files.map((f) => [f.name, f.sha256])).toEqual(
      manifest('out').files.map((f) => [f.name, f.sha256]),
    );
  });
});
