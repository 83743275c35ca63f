import { describe, expect, test } from 'vitest';
import { fromPairs } from '../../../network/graph.js';
import { causesOf } from '../../../sim/measure/cause.js';
import { gini } from '../../../sim/measure/gini.js';
import { INDICATORS, IndicatorContext, type IndicatorInput, indicatorRow } from '../../../sim/measure/indicators.js';
import { elasticity, rankRankSlope } from '../../../sim/measure/mobility.js';
import { PocketTracker, pocketPlan } from '../../../sim/measure/pocket-tracker.js';
import { POCKET_RULE } from '../../../sim/measure/pockets.js';
import { tieFacts } from '../../../sim/measure/tie-facts.js';
import { stream } from '../../../sim/random/stream.js';

/** The columns of indicators.csv, in their order, as the files contract names them. */
const COLUMNS = (
  'mean_wealth median_wealth gini theil_t theil_l theil_t_between_places theil_t_between_groups atkinson_half ' +
  'atkinson_1 atkinson_2 share_bottom_40 share_top_10 p90_p10 palma esteban_ray der_half wolfson dip dip_p modes ' +
  'elasticity rank_rank_slope upward_mobility share_frustrated mean_aspiration_gap join_count join_count_expected ' +
  'join_count_z join_count_p moran moran_expected moran_p assortativity_wealth assortativity_rank ' +
  'assortativity_group assortativity_place coleman_group e_i_group economic_connectedness exposure friending_bias ' +
  'pockets pocket_share pocket_p sheltered_share complacent_share'
).split(' ');

const n = 60;
const draw = stream('indicators', 0, 'test');
const wealth = Float64Array.from({ length: n }, () => 1 + 99 * draw());
const parent = Float64Array.from({ length: n }, (_, i) => wealth[i] * (0.5 + draw()));
const place = Uint32Array.from({ length: n }, (_, i) => i % 6);
const group = Uint32Array.from({ length: n }, (_, i) => i % 2);
const ring = fromPairs(
  n,
  Uint32Array.from({ length: n }, (_, i) => i),
  Uint32Array.from({ length: n }, (_, i) => (i + 1) % n),
  null,
);

function input(change: Partial<IndicatorInput> = {}): IndicatorInput {
  return {
    wealth,
    place,
    places: 6,
    group,
    groups: 2,
    ties: ring,
    decision: {
      frustrated: Uint8Array.from({ length: n }, (_, i) => (i < 20 ? 1 : 0)),
      aspiration: Float64Array.from(wealth, (y) => 1.5 * y),
    },
    parent: { wealth: parent },
    permutations: 19,
    uniform: stream('indicators', 0, 'permutations'),
    ...change,
  };
}

/** The generation's pockets and causes, made up. */
function withPockets(): Partial<IndicatorInput> {
  const rule = { ...POCKET_RULE, permutations: 19 };
  const tracker = new PocketTracker(rule, pocketPlan(rule, place, stream('indicators', 0, 'pockets')));
  const { decision } = input();
  const frustrated = decision!.frustrated;
  tracker.generation({ frustrated, wealth, place, ties: ring });
  const pockets = tracker.generation({ frustrated, wealth, place, ties: ring });
  const met = Uint8Array.from({ length: n }, (_, i) => (i < 10 || i >= 30 ? 1 : 0));
  const slow = Float64Array.from({ length: n }, (_, i) => (i >= 40 ? 1.1 : 1.2));
  return { pockets, causes: causesOf(frustrated, met, slow, new Float64Array(n).fill(1.2)) };
}

function named(row: Float64Array): Record<string, number> {
  return Object.fromEntries(INDICATORS.map(({ name }, k) => [name, row[k]]));
}

describe('the registry', () => {
  test('has the columns of the contract in their order, then more', () => {
    const names = INDICATORS.map(({ name }) => name);
    expect(names.slice(0, COLUMNS.length)).toEqual(COLUMNS);
    expect(new Set(names).size).toBe(names.length);
  });

  test('describes every column', () => {
    for (const { name, meaning, formula, source } of INDICATORS) {
      for (const text of [meaning, formula, source]) expect(text.length, name).toBeGreaterThan(2);
    }
  });
});

describe('a row', () => {
  test('agrees with the measures it is made of', () => {
    const row = named(indicatorRow(new IndicatorContext(input(withPockets()))));
    expect(row['gini']).toBe(gini(wealth));
    expect(row['share_frustrated']).toBeCloseTo(1 / 3, 12);
    expect(row['mean_aspiration_gap']).toBeCloseTo(1 / 3, 12);
    expect(row['elasticity']).toBeCloseTo(elasticity(parent, wealth).slope, 12);
    expect(row['rank_rank_slope']).toBeCloseTo(rankRankSlope(parent, wealth).slope, 12);
    expect(row['theil_t_between_places']).toBeLessThan(row['theil_t']);
    // twenty frustrated in a row on a ring: 19 ties between them, the expected number 60 · 20 · 19 / (60 · 59)
    expect(row['join_count']).toBe(19);
    expect(row['join_count_expected']).toBeCloseTo((20 * 19) / 59, 12);
    expect(row['join_count_p']).toBe(1 / 20);
    expect(row['pockets']).toBe(1);
    // the ends of the row have one of two ties frustrated, which is half: all twenty are core
    expect(row['pocket_share']).toBeCloseTo(1 / 3, 12);
    expect(row['core_share']).toBeCloseTo(1 / 3, 12);
    expect(row['pocket_p']).toBe(1 / 20);
    expect(row['significant_pockets']).toBe(1);
    expect(row['sheltered_share']).toBeCloseTo(10 / 60, 12);
    expect(row['complacent_share']).toBeCloseTo(20 / 60, 12);
    expect(row['local_share']).toBeCloseTo(10 / 60, 12);
    expect(row['e_i_group']).toBe(1);
    for (const { name, needs } of INDICATORS) {
      // fates follow households across generations and arms, which this one row has not
      if (!needs.includes('fates')) expect(Number.isFinite(row[name]), name).toBe(true);
    }
  });

  test('leaves cells empty where there is no decision or no parent', () => {
    const last = named(indicatorRow(new IndicatorContext(input({ decision: null }))));
    const first = named(indicatorRow(new IndicatorContext(input({ parent: null }))));
    for (const { name, needs } of INDICATORS) {
      if (needs.includes('decision')) expect(last[name], name).toBeNaN();
      if (needs.includes('parent')) expect(first[name], name).toBeNaN();
    }
    expect(last['gini']).toBe(gini(wealth));
  });

  test('facts of the ties handed in once give the same row', () => {
    const uniform = stream('indicators', 0, 'permutations');
    const facts = tieFacts(ring, place, group, 19, uniform);
    expect(indicatorRow(new IndicatorContext(input({ tieFacts: facts })))).toEqual(
      indicatorRow(new IndicatorContext(input())),
    );
  });

  test('ranks and logs handed on from the generation before give the same row', () => {
    const before = new IndicatorContext(input({ wealth: parent, parent: null }));
    const handed = { wealth: parent, rank: before.rank, logWealth: before.logWealth };
    const row = named(indicatorRow(new IndicatorContext(input({ parent: handed }))));
    const fresh = named(indicatorRow(new IndicatorContext(input())));
    for (const name of ['elasticity', 'rank_rank_slope', 'upward_mobility']) expect(row[name]).toBe(fresh[name]);
  });
});
