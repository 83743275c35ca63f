/**
 * Laws that whole runs obey, from study text and data files to columns.
 *
 * That the number of threads leaves every byte alone is tested on written folders (audit.test.ts); laws of single
 * generations and choices are in model/.
 */
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { stream } from '../../sim/random/stream.js';
import { type Kept, type KeptArm, prepare, runOne, runReplicate } from './real-run.js';

interface Member {
  readonly id: string;
  readonly wealth: number;
  readonly place: string;
  readonly group: string;
}

const N = 120;
const uniform = stream('properties', 0, 'survey');
/** Whole numbers as wealth: their sums are exact in any order. */
const MEMBERS: readonly Member[] = Array.from({ length: N }, (_, i) => ({
  id: `h${i}`,
  wealth: 20 + Math.floor(600 * uniform() ** 3),
  place: `p${i % 6}`,
  group: uniform() < 0.4 ? 'west' : 'east',
}));
/** Three of four ties stay in the place; the last ten households have none. */
const TIES: readonly (readonly [string, string])[] = (() => {
  const pairs = new Map<string, readonly [string, string]>();
  const among = N - 10;
  while (pairs.size < 330) {
    const i = Math.floor(uniform() * among);
    const j = uniform() < 0.75 ? (i + 6 * Math.floor(uniform() * 20)) % N : Math.floor(uniform() * among);
    if (i !== j && j < among) pairs.set(`${Math.min(i, j)} ${Math.max(i, j)}`, [`h${i}`, `h${j}`]);
  }
  return [...pairs.values()];
})();

const householdsCsv = (members: readonly Member[]): string =>
  `household,wealth,place,group\n${members.map((m) => `${m.id},${m.wealth},${m.place},${m.group}`).join('\n')}\n`;
const tiesCsv = (ties: readonly (readonly [string, string])[]): string =>
  `source,target\n${ties.map((pair) => pair.join(',')).join('\n')}\n`;
const files = (members = MEMBERS, ties = TIES): Record<string, string> => ({
  'households.csv': householdsCsv(members),
  'ties.csv': tiesCsv(ties),
});

const LOCAL = `    - weight: 0.6
      mix:
        - {from: neighbours, statistic: upward_mean, weight: 0.4}
        - {from: second_circle, weight: 0.2}
        - {from: place, statistic: quantile, q: 0.8, weight: 0.2}
        - {from: group, statistic: median, weight: 0.1}
        - {from: society, weight: 0.1}`;
const SECOND = `    - weight: 0.4
      scale: 1.3
      mix:
        - {from: neighbours, statistic: similarity_mean, window: 0.6, weight: 0.7}
        - {from: self, weight: 0.1}
        - {from: place, statistic: max, weight: 0.2}`;

const surveyed = (milestones: string, shock = 0, spread = 0): string => `study: Laws
seed: laws
generations: 6
population: {households_file: households.csv}
technology: {kind: linear, gross_return: 2.5}
shock: {sd_log: ${shock}, shared_by_place: 0.3}
preferences: {curvature: 0.6, child_weight: 0.35, child_weight_spread: ${spread}}
reference:
  persistence: 0.3
  milestones:
${milestones}
arms: [{name: surveyed, network: {kind: file, path: ties.csv}}]
`;

const money = (g: Kept): Float64Array[] => [
  g.wealth,
  ...g.aspirations,
  g.investment,
  g.consumption,
  g.planned,
  g.childWealth,
];

/** Largest relative difference between `factor` times the money columns of one run and those of another. */
function worst(one: Kept, other: Kept, factor: number, at: (i: number) => number = (i) => i): number {
  let difference = 0;
  const theirs = money(other);
  money(one).forEach((column, c) => {
    for (let i = 0; i < column.length; i++) {
      difference = Math.max(difference, Math.abs(theirs[c]![at(i)]! / (factor * column[i]) - 1));
    }
  });
  return difference;
}

/** True when every money column is exactly `factor` times the other's, and the rest is equal. */
function exactly(one: KeptArm, other: KeptArm, factor: number): boolean {
  return one.generations.every((g, t) => {
    const h = other.generations[t]!;
    const theirs = money(h);
    return (
      money(g).every((column, c) => column.every((x, i) => theirs[c]![i] === factor * x)) &&
      g.met.every((m, i) => h.met[i] === m) &&
      g.shock.every((e, i) => h.shock[i] === e)
    );
  });
}

const bothDecisions = (arm: KeptArm): void => {
  const met = arm.generations.flatMap((g) => [...g.met]);
  expect(met.filter((m) => m === 0).length).toBeGreaterThan(N / 10);
  expect(met.filter((m) => m > 0).length).toBeGreaterThan(N / 10);
};

describe('linear technology, milestones curved like consumption: only ratios of wealth matter', () => {
  const scaled = (factor: number): Record<string, string> =>
    files(MEMBERS.map((m) => ({ ...m, wealth: m.wealth * factor })));

  test('a power of two times all wealth: as much times every aspiration and choice, to the bit', async () => {
    // one milestone at a shared child weight is solved in the ratio a/y alone, which scaling leaves as it is
    const study = surveyed(LOCAL, 0.2);
    const base = await runOne(study, files());
    bothDecisions(base);
    for (const power of [-20, -3, 1, 10]) {
      expect(exactly(base, await runOne(study, scaled(2 ** power)), 2 ** power)).toBe(true);
    }
  });

  test('any constant times all wealth: as much times every aspiration and choice, two milestones', async () => {
    const study = surveyed(`${LOCAL}\n${SECOND}`, 0.2, 0.2);
    const base = await runOne(study, files());
    bothDecisions(base);
    await fc.assert(
      fc.asyncProperty(fc.double({ min: 1e-4, max: 1e4, noNaN: true }), async (factor) => {
        const other = await runOne(study, scaled(factor));
        base.generations.forEach((g, t) => {
          // roots found to rounding from other starts, and six generations that hand their rounding on
          expect(worst(g, other.generations[t]!, factor)).toBeLessThan(1e-11);
          expect(other.generations[t]!.met).toEqual(g.met);
        });
      }),
      { numRuns: 8, seed: 1 },
    );
  });

  test('twice the mean of a drawn population: the same ties in every arm, and twice the money', async () => {
    const study = (mean: number): string => `study: Drawn
seed: drawn
generations: 5
population:
  households: 300
  places: 10
  groups: [{name: a, share: 0.6}, {name: b, share: 0.4, relative_wealth: 0.5}]
  wealth: {shape: lognormal, mean: ${mean}, gini: 0.4, between_places: 0.4}
technology: {kind: linear, gross_return: 2.5}
shock: {sd_log: 0.2}
preferences: {curvature: 0.6, child_weight: 0.35}
reference: {milestones: [{weight: 0.6, mix: [{from: neighbours, statistic: upward_mean, weight: 0.8}, {from: self, weight: 0.2}]}]}
arms:
  - {name: apart, network: {kind: blocks, mean_degree: 8, within_place: 0.9, within_group: 0.8}}
  - {name: mixed, network: {from: apart, mixing: {target: economic_connectedness, value: 0.9}}}
  - {name: alike, network: {kind: similarity, mean_degree: 8, strength: 0.8}}
`;
    const base = runReplicate(await prepare(study(100)), 1);
    const twice = runReplicate(await prepare(study(200)), 1);
    expect([...base.keys()]).toEqual(['apart', 'mixed', 'alike']);
    for (const [name, arm] of base) {
      const other = twice.get(name)!;
      expect(other.ties.target).toEqual(arm.ties.target);
      expect(other.ties.start).toEqual(arm.ties.start);
      expect(exactly(arm, other, 2)).toBe(true);
    }
  });

  test('with the concave technology a larger society is another society', async () => {
    const study = surveyed(LOCAL).replace(
      '{kind: linear, gross_return: 2.5}',
      '{kind: concave, scale: 8, elasticity: 0.6}',
    );
    const base = await runOne(study, files());
    expect(exactly(base, await runOne(study, scaled(2)), 2)).toBe(false);
  });
});

describe('renumbering households', () => {
  const order = Array.from({ length: N }, (_, i) => (i * 77 + 13) % N);
  const renumbered = order.map((i) => MEMBERS[i]!);
  /** New number of an old household. */
  const now = new Int32Array(N);
  order.forEach((old, i) => {
    now[old] = i;
  });
  const shuffledTies = TIES.map(([a, b], e) => (e % 2 === 0 ? ([b, a] as const) : ([a, b] as const))).reverse();

  test('permutes the panel where there is no luck', async () => {
    const study = surveyed(`${LOCAL}\n${SECOND}`);
    const base = await runOne(study, files());
    const other = await runOne(study, files(renumbered, shuffledTies));
    bothDecisions(base);
    expect(other.start.householdIds).toEqual(renumbered.map((m) => m.id));
    base.generations.forEach((g, t) => {
      const h = other.generations[t]!;
      // sums over neighbours run in another order, and generations hand their rounding on
      expect(worst(g, h, 1, (i) => now[i])).toBeLessThan(1e-12);
      for (let i = 0; i < N; i++) {
        expect(h.met[now[i]]).toBe(g.met[i]);
        expect(h.isolated[now[i]]).toBe(g.isolated[i]);
      }
    });
    // whole numbers sum exactly: the first aspirations and their choices agree to the bit
    const single = await runOne(surveyed(LOCAL), files());
    const [g] = single.generations;
    const [h] = (await runOne(surveyed(LOCAL), files(renumbered, shuffledTies))).generations;
    for (let i = 0; i < N; i++) {
      expect(h!.aspirations[0]![now[i]]).toBe(g!.aspirations[0]![i]);
      expect(h!.planned[now[i]]).toBe(g!.planned[i]);
    }
  });

  test('leaves luck with the numbers', async () => {
    const base = await runOne(surveyed(LOCAL, 0.2).replace('shared_by_place: 0.3', 'shared_by_place: 0'), files());
    const other = await runOne(
      surveyed(LOCAL, 0.2).replace('shared_by_place: 0.3', 'shared_by_place: 0'),
      files(renumbered, TIES),
    );
    base.generations.forEach((g, t) => {
      expect(other.generations[t]!.shock).toEqual(g.shock);
    });
  });

  test('the order in which a file lists ties, and their ends, changes nothing', async () => {
    const study = surveyed(`${LOCAL}\n${SECOND}`, 0.2, 0.2);
    expect(exactly(await runOne(study, files()), await runOne(study, files(MEMBERS, shuffledTies)), 1)).toBe(true);
  });
});

describe('households without ties', () => {
  test('use their own wealth for what they cannot see, and are marked', async () => {
    const mix = `    - {weight: 0.6, mix: [{from: neighbours, statistic: upward_mean, weight: 1}]}
    - {weight: 0.3, scale: 1.5, mix: [{from: second_circle, weight: 0.5}, {from: self, weight: 0.5}]}`;
    const { generations } = await runOne(surveyed(mix, 0.2).replace('persistence: 0.3', 'persistence: 0'), files());
    const tied = new Set(TIES.flat());
    for (const { wealth, aspirations, isolated } of generations) {
      for (let i = 0; i < N; i++) {
        if (!tied.has(`h${i}`)) {
          expect(isolated[i]).toBe(1);
          expect(aspirations[0]![i]).toBe(wealth[i]);
          expect(aspirations[1]![i]).toBe(1.5 * wealth[i]);
        } else if (isolated[i] === 1) {
          // has ties, but nobody beyond them
          expect(TIES.filter((pair) => pair.includes(`h${i}`)).length).toBeLessThan(3);
        }
      }
      expect(isolated.reduce((a, b) => a + b, 0)).toBeGreaterThanOrEqual(10);
    }
  });

  test('never mark anyone where nobody looks at ties', async () => {
    const mix = `    - {weight: 0.6, mix: [{from: place, weight: 1}]}`;
    const { generations } = await runOne(surveyed(mix), files());
    for (const { isolated } of generations) expect(isolated.every((flag) => flag === 0)).toBe(true);
  });
});

describe('shared randomness', () => {
  const study = `study: Luck
seed: luck
replicates: 2
generations: 4
population:
  households: 200
  places: 8
  wealth: {shape: lognormal, mean: 50, sd_log: 0.6, between_places: 0.4}
technology: {kind: concave, scale: 8, elasticity: 0.6}
shock: {sd_log: 0.25, shared_by_place: 0.4}
preferences: {curvature: 0.6, child_weight: 0.5, child_weight_spread: 0.1}
reference: {milestones: [{weight: 1, mix: [{from: neighbours, weight: 1}]}]}
arms:
  - {name: apart, network: {kind: blocks, mean_degree: 6, within_place: 0.95}}
  - {name: mixed, network: {from: apart, mixing: {share: 1}}}
  - {name: patient, network: {from: apart}, preferences: {child_weight: 0.6}}
`;

  test('arms share initial wealth, luck and taste; replicates do not', async () => {
    const prepared = await prepare(study);
    const [first, second] = [runReplicate(prepared, 0), runReplicate(prepared, 1)];
    const base = first.get('apart')!;
    for (const arm of first.values()) {
      expect(arm.generations[0]!.wealth).toEqual(base.generations[0]!.wealth);
      arm.generations.forEach((g, t) => void expect(g.shock).toEqual(base.generations[t]!.shock));
      const patience = arm.start.households.childWeight.map((d, i) => d / base.start.households.childWeight[i]);
      const expected = arm.start.arm === 'patient' ? 1.2 : 1;
      for (const ratio of patience) expect(Math.abs(ratio - expected)).toBeLessThan(1e-15 * 4);
    }
    expect(first.get('mixed')!.generations[0]!.planned).not.toEqual(base.generations[0]!.planned);
    expect(second.get('apart')!.generations[0]!.wealth).not.toEqual(base.generations[0]!.wealth);
    expect(second.get('apart')!.generations[0]!.shock).not.toEqual(base.generations[0]!.shock);
  });

  test('an arm, and a replicate, come out the same alone as in company', async () => {
    const prepared = await prepare(study);
    const together = runReplicate(prepared, 1);
    for (const [name, arm] of together) {
      const alone = runReplicate(await prepare(study), 1, [name]);
      expect([...alone.keys()]).toEqual([name]);
      expect(alone.get(name)!.ties.target).toEqual(arm.ties.target);
      expect(exactly(arm, alone.get(name)!, 1)).toBe(true);
    }
  });
});

test('aspirations lie within what the household sees', async () => {
  const mix = `    - {weight: 0.6, mix: [{from: neighbours, weight: 0.5}, {from: neighbours, statistic: quantile, q: 0.9, weight: 0.5}]}`;
  const { generations, ties } = await runOne(surveyed(mix, 0.3).replace('persistence: 0.3', 'persistence: 0'), files());
  for (const { wealth, aspirations } of generations) {
    for (let i = 0; i < N; i++) {
      const seen = Array.from(ties.target.slice(ties.start[i], ties.start[i + 1]), (j) => wealth[j]);
      if (seen.length === 0) continue;
      // the weighted sum of equal values may round by a unit in the last place
      expect(aspirations[0]![i]).toBeGreaterThanOrEqual(Math.min(...seen) * (1 - 1e-15));
      expect(aspirations[0]![i]).toBeLessThanOrEqual(Math.max(...seen) * (1 + 1e-15));
    }
  }
});
