import { describe, expect, test } from 'vitest';
import { fromPairs, type Ties } from '../../../network/graph.js';
import { compileChoice } from '../../../sim/model/choice.js';
import { createEngine, makeGeneration, withReference } from '../../../sim/model/generation.js';
import type { Generation, Households, Model, Part, Preferences, Technology } from '../../../sim/model/types.js';
import { Draws } from '../../../sim/random/draws.js';
import { stream } from '../../../sim/random/stream.js';

const N = 400;

function part(from: Part['from'], statistic: Part['statistic'], weight: number): Part {
  return { from, statistic, weight, q: 0.75, window: 0.5 };
}

const preferences: Preferences = {
  curvature: 0.6,
  childWeight: 0.5,
  milestoneShape: 'threshold',
  milestoneCurvature: 0.6,
  lossAversion: 2,
};
const linear: Technology = { kind: 'linear', grossReturn: 2.5 };
const concave: Technology = { kind: 'concave', scale: 8, elasticity: 0.6, depreciation: 1 };
const upward = [part('self', 'mean', 0.1), part('neighbours', 'upward_mean', 0.8), part('society', 'mean', 0.1)];

const models: [string, Model][] = [
  [
    'linear, one milestone, table',
    {
      technology: linear,
      shock: { sdLog: 0.2, sharedByPlace: 0.3, risk: 'planned' },
      preferences: [preferences, { ...preferences, childWeight: 0.33 }],
      milestones: [{ weight: 0.6, scale: 1, mix: upward }],
      persistence: 0,
    },
  ],
  [
    'concave, two milestones, persistence',
    {
      technology: concave,
      shock: { sdLog: 0.2, sharedByPlace: 0, risk: 'planned' },
      preferences: [preferences, { ...preferences, milestoneShape: 'gain-loss' }],
      milestones: [
        { weight: 1, scale: 1, mix: upward },
        { weight: 0.5, scale: 1.4, mix: [part('second_circle', 'median', 0.5), part('place', 'mean', 0.5)] },
      ],
      persistence: 0.3,
    },
  ],
  [
    'expected risk',
    {
      technology: concave,
      shock: { sdLog: 0.3, sharedByPlace: 1, risk: 'expected' },
      preferences: [preferences, { ...preferences, milestoneShape: 'gain-loss' }],
      milestones: [{ weight: 1, scale: 1, mix: [part('group', 'quantile', 1)] }],
      persistence: 0,
    },
  ],
];

// one group alike takes another way through the engine: choice, shock and outcome in one pass
for (const [name, model] of models.slice(0, 2)) {
  models.push([`${name}, one group`, { ...model, preferences: [preferences] }]);
}

interface World {
  readonly households: Households;
  readonly ties: Ties;
  readonly wealth: Float64Array;
}

function world(groups = 2): World {
  const uniform = stream('generation test', 0, 'world');
  const pairs = new Set<number>();
  while (pairs.size < 4 * N) {
    const a = Math.floor(uniform() * N);
    const b = Math.floor(uniform() * N);
    // the last ten stay without ties
    if (a < b && b < N - 10) pairs.add(a * N + b);
  }
  const list = [...pairs];
  return {
    households: {
      n: N,
      place: Uint32Array.from({ length: N }, (_, i) => i % 7),
      places: 7,
      group: Uint32Array.from({ length: N }, (_, i) => (groups === 2 && i % 3 === 0 ? 1 : 0)),
      groups,
      childWeight: Float64Array.from({ length: N }, (_, i) =>
        groups === 1 ? 0.5 : i % 3 === 0 ? 0.33 : i % 10 === 1 ? 0.45 : 0.5,
      ),
    },
    ties: fromPairs(
      N,
      Uint32Array.from(list, (key) => Math.floor(key / N)),
      Uint32Array.from(list, (key) => key % N),
      null,
    ),
    wealth: Float64Array.from({ length: N }, () => Math.exp(3 + uniform() + uniform())),
  };
}

function steps(model: Model, { households, ties, wealth }: World, count: number): Generation[] {
  const engine = createEngine(model, households, ties);
  const draws = new Draws('generation test', 1);
  const rows: Generation[] = [];
  for (let t = 0; t < count; t++) {
    const generation = makeGeneration(N, model.milestones.length);
    generation.wealth.set(t === 0 ? wealth : rows[t - 1].childWealth);
    engine.step(draws, t, generation, t === 0 ? null : rows[t - 1].aspirations);
    rows.push(generation);
  }
  return rows;
}

describe.each(models)('%s', (_, model) => {
  test('columns agree with each other and with a choice made alone', () => {
    const w = world(model.preferences.length);
    const weights = model.milestones.map((m) => m.weight);
    for (const g of steps(model, w, 3)) {
      for (let i = 0; i < N; i++) {
        const own = g.aspirations.map((column) => column[i]);
        // another solver object, so that nothing is left over from another household
        const choice = compileFor(model, w.households.group[i], weights);
        choice.solve(g.wealth[i], own, w.households.childWeight[i]);
        expect(g.planned[i]).toBe(choice.planned);
        expect(g.met[i]).toBe(choice.met);
        expect(g.investment[i]).toBe(choice.investment);
        expect(g.met[i]).toBe(own.filter((a) => g.planned[i] >= a).length);
        expect(g.reached[i]).toBe(own.filter((a) => g.childWealth[i] >= a).length);
        expect(g.consumption[i]).toBe(g.wealth[i] - g.investment[i]);
        expect(g.childWealth[i]).toBe(g.planned[i] * g.shock[i]);
      }
    }
  });

  test('renumbering households and ties permutes aspirations, plans and decisions', () => {
    const w = world(model.preferences.length);
    const order = Array.from({ length: N }, (_, i) => (i * 131 + 17) % N);
    const renumber = <T extends Float64Array | Uint32Array>(column: T): T => {
      const out = column.slice() as T;
      for (let i = 0; i < N; i++) out[order[i]] = column[i];
      return out;
    };
    const source: number[] = [];
    const target: number[] = [];
    for (let i = 0; i < N; i++) {
      for (let e = w.ties.start[i]; e < w.ties.start[i + 1]; e++) {
        if (w.ties.target[e] > i) {
          source.push(order[i]);
          target.push(order[w.ties.target[e]]);
        }
      }
    }
    const other: World = {
      households: {
        ...w.households,
        place: renumber(w.households.place),
        group: renumber(w.households.group),
        childWeight: renumber(w.households.childWeight),
      },
      ties: fromPairs(N, Uint32Array.from(source), Uint32Array.from(target), null),
      wealth: renumber(w.wealth),
    };
    // one generation: draws belong to numbers, so luck would differ after it
    const [a] = steps(model, w, 1);
    const [b] = steps(model, other, 1);
    for (let i = 0; i < N; i++) {
      const j = order[i];
      // neighbours are summed in another order
      for (let m = 0; m < a.aspirations.length; m++) {
        expect(Math.abs(b.aspirations[m][j] / a.aspirations[m][i] - 1)).toBeLessThan(1e-14);
      }
      expect(Math.abs(b.planned[j] / a.planned[i] - 1)).toBeLessThan(1e-12);
      expect(b.met[j]).toBe(a.met[i]);
      expect(b.isolated[j]).toBe(a.isolated[i]);
    }
  });

  test('under its own milestones a generation resolves to itself, and under others it need not', () => {
    const w = world(model.preferences.length);
    const engine = createEngine(model, w.households, w.ties);
    const g = makeGeneration(N, model.milestones.length);
    g.wealth.set(w.wealth);
    engine.step(new Draws('generation test', 1), 0, g, null);
    const same = engine.resolveUnder(model.milestones, g, null);
    expect(same.planned).toEqual(g.planned);
    expect(same.met).toEqual(g.met);
    const society = engine.resolveUnder(withReference(model, 'society', 'mean'), g, null);
    const mean = g.wealth.reduce((sum, y) => sum + y, 0) / N;
    // summed in plain order here, compensated there
    expect(Math.abs(society.aspirations[0][5] / (model.milestones[0].scale * mean) - 1)).toBeLessThan(1e-13);
    expect(society.planned).not.toEqual(g.planned);
  });
});

const compiled = new Map<string, ReturnType<typeof compileChoice>>();
function compileFor(model: Model, group: number, weights: readonly number[]): ReturnType<typeof compileChoice> {
  const key = JSON.stringify([model, group]);
  let choice = compiled.get(key);
  if (choice === undefined) {
    choice = compileChoice(model.technology, model.shock, model.preferences[group], weights);
    compiled.set(key, choice);
  }
  return choice;
}

describe('shocks', () => {
  test('are shared by arms, shared within a place as far as asked, and have mean one', () => {
    const [, model] = models[0];
    const n = 100_000;
    const places = 2000;
    const households: Households = {
      n,
      place: Uint32Array.from({ length: n }, (_, i) => i % places),
      places,
      group: new Uint32Array(n),
      groups: 1,
      childWeight: new Float64Array(n).fill(0.5),
    };
    const none = fromPairs(n, new Uint32Array(0), new Uint32Array(0), null);
    const drawn = (m: Model): Float64Array => {
      const g = makeGeneration(n, 1);
      g.wealth.fill(1);
      createEngine(m, households, none).step(new Draws('shocks', 0), 3, g, null);
      return g.shock;
    };
    const shock = drawn(model);
    expect(drawn({ ...model, technology: concave })).toEqual(shock);
    const { sdLog: s, sharedByPlace: share } = model.shock;
    const placeSum = new Float64Array(places);
    let mean = 0;
    let square = 0;
    for (let i = 0; i < n; i++) {
      const x = (Math.log(shock[i]) + 0.5 * s * s) / s;
      placeSum[i % places] += x;
      mean += shock[i] / n;
      square += (x * x) / n;
    }
    // five standard errors; places are the independent units of the shared part
    expect(Math.abs(mean - 1)).toBeLessThan(5 * s * Math.sqrt(share / places + (1 - share) / n));
    expect(Math.abs(square - 1)).toBeLessThan(5 * Math.sqrt(2 * (share ** 2 / places + 1 / n)));
    const size = n / places;
    let between = 0;
    for (const sum of placeSum) between += (sum / size) ** 2 / places;
    const expected = share + (1 - share) / size;
    expect(Math.abs(between - expected)).toBeLessThan(5 * expected * Math.sqrt(2 / places));
  });

  test('of size zero leave every plan as it is', () => {
    const w = world();
    const [, model] = models[0];
    const [g] = steps({ ...model, shock: { ...model.shock, sdLog: 0 } }, w, 1);
    expect(g.shock.every((e) => e === 1)).toBe(true);
    expect(g.childWealth).toEqual(g.planned);
  });
});

test('a household without ties falls back to its own wealth and is marked', () => {
  const w = world();
  const [, model] = models[0];
  const [g] = steps(model, w, 1);
  const mean = g.wealth.reduce((sum, y) => sum + y, 0) / N;
  for (let i = 0; i < N; i++) expect(g.isolated[i]).toBe(w.ties.start[i] === w.ties.start[i + 1] ? 1 : 0);
  const i = N - 1;
  // 0.1 + 0.8 of own wealth, 0.1 of the mean
  expect(Math.abs(g.aspirations[0][i] / (0.9 * g.wealth[i] + 0.1 * mean) - 1)).toBeLessThan(1e-13);
});
