/**
 * Closed forms of growth theory that the engine nests: CRRA bequests (no milestone that counts), and dynasties with log
 * utility and full depreciation, who save a constant share (warm glow; the log-utility stochastic growth model; the
 * discrete Solow model with full depreciation). Values by two routes each (R; mpmath or scipy).
 *
 * Not checked, since the model has nothing like them: continuous-time Solow, its golden rule and speed, partial
 * depreciation out of output alone, shocks that persist over generations, and the tails of Kesten processes.
 */
import { describe, expect, test } from 'vitest';
import { fromPairs } from '../../network/graph.js';
import { compileChoice } from '../../sim/model/choice.js';
import { createEngine, makeGeneration } from '../../sim/model/generation.js';
import type { Model, Preferences } from '../../sim/model/types.js';
import { Draws } from '../../sim/random/draws.js';
import { checksOf, columnsOf, expectMatch } from './expected.js';

const checks = checksOf('theory-growth');

function preferencesOf(curvature: number, childWeight: number): Preferences {
  return { curvature, childWeight, milestoneShape: 'threshold', milestoneCurvature: 0.5, lossAversion: 1 };
}

test('CRRA bequests: growth and saving', () => {
  const { s, d, rho } = checks['crra.growth']['grid'] as Record<string, number[]>;
  const growth: number[] = [];
  const saving: number[] = [];
  for (const sigma of s) {
    for (const delta of d) {
      for (const R of rho) {
        const choice = compileChoice(
          { kind: 'linear', grossReturn: R },
          { sdLog: 0, sharedByPlace: 0, risk: 'planned' },
          preferencesOf(sigma, delta),
          [0],
        );
        choice.solve(13, [1], delta);
        growth.push(choice.planned / 13);
        saving.push(choice.investment / 13);
      }
    }
  }
  expectMatch(growth, checks['crra.growth'], 'crra.growth');
  expectMatch(saving, checks['crra.saving'], 'crra.saving');
  // the table beside it is the same numbers laid out by row
  expect(columnsOf('theory-growth', 'crra.csv')['growth_z_over_y'].map(Number)).toHaveLength(growth.length);
});

/** A dynasty that invests `share` of its wealth: log utility, z = A k^α, δ = share/(α(1 − share)). */
function dynasty(alpha: number, share: number, scale: number, sdLog: number): Model {
  const delta = share / (alpha * (1 - share));
  return {
    technology: { kind: 'concave', scale, elasticity: alpha, depreciation: 1 },
    shock: { sdLog, sharedByPlace: 0, risk: 'planned' },
    preferences: [preferencesOf(1, delta)],
    milestones: [
      { weight: 0, scale: 1, mix: [{ from: 'self', statistic: 'mean', weight: 1, q: 0.5, window: 1 }] },
    ],
    persistence: 0,
  };
}

function run(model: Model, n: number, generations: number): { wealth: Float64Array; parent: Float64Array; k: number } {
  const households = {
    n,
    place: new Uint32Array(n),
    places: 1,
    group: new Uint32Array(n),
    groups: 1,
    childWeight: new Float64Array(n).fill(model.preferences[0].childWeight),
  };
  const none = new Uint32Array(0);
  const engine = createEngine(model, households, fromPairs(n, none, none, null));
  const generation = makeGeneration(n, 1);
  const draws = new Draws('growth theory', 0);
  generation.wealth.fill(1);
  const parent = new Float64Array(n);
  for (let t = 0; t < generations; t++) {
    if (t > 0) generation.wealth.set(generation.childWealth);
    engine.step(draws, t, generation, null);
    parent.set(generation.wealth);
  }
  return { wealth: generation.childWealth, parent, k: generation.investment[0] };
}

describe('dynasties with log utility', () => {
  interface Row {
    readonly alpha: number;
    readonly beta: number;
    readonly delta: number;
    readonly A: number;
    readonly mu: number;
    readonly sigma: number;
    readonly rho: number;
  }
  const brock = checks['brock.saving_rate']['rows'] as Row[];
  const warmGlow = checks['dynasty.logy_mean']['rows'] as Row[];

  test('saving rate and steady-state capital of the log-utility growth model', () => {
    const shares = brock.map(({ alpha, beta, A }) => {
      const model = dynasty(alpha, alpha * beta, A, 0);
      const choice = compileChoice(model.technology, model.shock, model.preferences[0], [0]);
      choice.solve(3, [1], model.preferences[0].childWeight);
      return choice.investment / 3;
    });
    expectMatch(shares, checks['brock.saving_rate'], 'brock.saving_rate');
    // α^60 ≤ 0.6^60 = 5e−14: what is left of the start
    expectMatch(
      brock.map(({ alpha, beta, A }) => run(dynasty(alpha, alpha * beta, A, 0), 1, 60).k),
      checks['brock.k_det'],
      'brock.k_det',
    );
  });

  test('steady state of the discrete Solow model with full depreciation', () => {
    const rows = checks['solow.k_disc']['rows'] as { s: number; alpha: number; A: number; n: number; delta: number }[];
    const at = rows.findIndex((row) => row.delta === 1 && row.n === 0);
    const { s, alpha, A } = rows[at];
    const value = (checks['solow.k_disc'].value as number[])[at];
    expectMatch(run(dynasty(alpha, s, A, 0), 1, 60).k, { ...checks['solow.k_disc'], value }, 'solow.k_disc');
  });

  test('stationary mean and elasticity of warm-glow dynasties, exactly', () => {
    const steady = warmGlow.map(({ alpha, delta, A, mu }) =>
      Math.log(run(dynasty(alpha, delta, A * Math.exp(mu), 0), 1, 200).wealth[0]),
    );
    expectMatch(steady, checks['dynasty.logy_mean'], 'dynasty.logy_mean');
    const elasticities = warmGlow.map(({ alpha, delta, A }) => {
      const model = dynasty(alpha, delta, A, 0);
      const choice = compileChoice(model.technology, model.shock, model.preferences[0], [0]);
      choice.solve(2, [1], model.preferences[0].childWeight);
      const low = choice.planned;
      choice.solve(8, [1], model.preferences[0].childWeight);
      return Math.log(choice.planned / low) / Math.log(4);
    });
    expectMatch(elasticities, checks['dynasty.elasticity'], 'dynasty.elasticity');
  });

  test.each([0, 1, 2, 3])('stationary distribution of warm-glow dynasties, row %i, by simulation', (r) => {
    const { alpha, delta, A, mu, sigma } = warmGlow[r];
    const n = 8000;
    // a shock of mean 1 has log mean −σ²/2, so the difference goes into the scale
    const { wealth, parent } = run(dynasty(alpha, delta, A * Math.exp(mu + sigma ** 2 / 2), sigma), n, 45);
    // what is left of the equal start: 0.8^90 = 2e−9 of the variance
    const value = (id: string): number => (checks[id].value as number[])[r];
    let mean = 0;
    let parentMean = 0;
    for (let i = 0; i < n; i++) {
      mean += Math.log(wealth[i]) / n;
      parentMean += Math.log(parent[i]) / n;
    }
    let square = 0;
    let cross = 0;
    let parentSquare = 0;
    for (let i = 0; i < n; i++) {
      square += (Math.log(wealth[i]) - mean) ** 2 / n;
      parentSquare += (Math.log(parent[i]) - parentMean) ** 2 / n;
      cross += ((Math.log(wealth[i]) - mean) * (Math.log(parent[i]) - parentMean)) / n;
    }
    const variance = value('dynasty.logy_var');
    // five standard errors of n independent normal draws
    expect(Math.abs(mean - value('dynasty.logy_mean'))).toBeLessThan(5 * Math.sqrt(variance / n));
    expect(Math.abs(square - variance)).toBeLessThan(5 * variance * Math.sqrt(2 / n));
    const slopeError = Math.sqrt((1 - alpha ** 2) / n);
    expect(Math.abs(cross / parentSquare - value('dynasty.elasticity'))).toBeLessThan(5 * slopeError);
  });

  test.each([0, 1, 2])('stationary log output of the log-utility growth model, row %i, by simulation', (r) => {
    const { alpha, beta, A, mu, sigma } = brock[r];
    const n = 8000;
    const { wealth } = run(dynasty(alpha, alpha * beta, A * Math.exp(mu + sigma ** 2 / 2), sigma), n, 45);
    const mean = (checks['brock.logy_mean'].value as number[])[r];
    const variance = (checks['brock.logy_var'].value as number[])[r];
    let sum = 0;
    let square = 0;
    for (let i = 0; i < n; i++) {
      sum += Math.log(wealth[i]) - mean;
      square += (Math.log(wealth[i]) - mean) ** 2;
    }
    expect(Math.abs(sum / n)).toBeLessThan(5 * Math.sqrt(variance / n));
    expect(Math.abs(square / n - variance)).toBeLessThan(5 * variance * Math.sqrt(2 / n));
  });
});
