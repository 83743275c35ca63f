/**
 * Drawn households against the distributions asked for. Tolerances are five standard errors of the sample
 * size used, stated beside each; means are exact by construction.
 */
import { describe, expect, test } from 'vitest';
import { Draws } from '../../../sim/random/draws.js';
import { type Inputs, readSample } from '../../../sim/study/inputs.js';
import { parseStudy } from '../../../sim/study/parse.js';
import { apportion, drawPopulation, splitHistogram } from '../../../sim/study/population.js';

const NO_FILES: Inputs = { households: null, sample: null, ties: {}, degrees: {}, texts: {} };

function population(text: string, inputs: Inputs = NO_FILES, replicate = 0) {
  const study = parseStudy(
    `study: t
seed: households
generations: 1
population:
${text
  .trim()
  .split('\n')
  .map((line) => `  ${line}`)
  .join('\n')}
technology: {kind: linear, gross_return: 2}
preferences: {curvature: 0.6, child_weight: 0.3}
reference: {milestones: [{weight: 1, mix: [{from: self, weight: 1}]}]}
arms: [{name: a, network: {kind: random, mean_degree: 4}}]
`,
    's.yaml',
  ).study;
  return drawPopulation(study, inputs, new Draws(study.seed, replicate));
}

const mean = (x: ArrayLike<number>): number => Array.from(x).reduce((a, b) => a + b, 0) / x.length;
const variance = (x: readonly number[]): number => {
  const m = mean(x);
  return mean(x.map((v) => (v - m) ** 2));
};
/** Gini by its definition over ranks. */
const gini = (x: Float64Array): number => {
  const s = x.slice().sort();
  let sum = 0;
  s.forEach((v, i) => {
    sum += (2 * (i + 1) - s.length - 1) * v;
  });
  return sum / (s.length * s.length * mean(s));
};

describe('wealth', () => {
  test('a lognormal reaches the Gini and the mean asked for', () => {
    const { labels } = population('households: 40000\nwealth: {shape: lognormal, mean: 100, gini: 0.42}');
    expect(mean(labels.wealth)).toBeCloseTo(100, 9);
    // standard error of a Gini of 0.42 at n = 40,000 is about 0.002
    expect(Math.abs(gini(labels.wealth) - 0.42)).toBeLessThan(0.01);
  });

  test('the share of log variance between places is the one asked for', () => {
    const { labels } = population(
      'households: 30000\nplaces: 30\nwealth: {shape: lognormal, mean: 100, sd_log: 0.8, between_places: 0.4}',
    );
    const logs = Array.from(labels.wealth, Math.log);
    const total = variance(logs);
    const byPlace = Array.from({ length: 30 }, (_, p) => mean(logs.filter((_, i) => labels.place[i] === p)));
    const between = variance(logs.map((_, i) => byPlace[labels.place[i]]!));
    // place effects are standardised: what is left is the noise within places, about 1 / √30,000 of the total
    expect(between / total).toBeCloseTo(0.4, 2);
    expect(total).toBeCloseTo(0.64, 1);
  });

  test('a Pareto tail has the exponent asked for above its quantile', () => {
    const { labels } = population(
      'households: 40000\nwealth: {shape: pareto_tail, mean: 10, gini: 0.3, pareto_tail: {above_quantile: 0.9, exponent: 1.8}}',
    );
    const top = labels.wealth.slice().sort().slice(-4000);
    // Hill 1975: the mean log excess is 1 / exponent, with standard error 1/(exponent·√4000) = 0.009
    const hill = mean(Array.from(top, (y) => Math.log(y / top[0]!)));
    expect(Math.abs(hill - 1 / 1.8)).toBeLessThan(0.045);
  });

  test('quantile shares come out as asked', () => {
    const shares = [0.04, 0.09, 0.14, 0.22, 0.51];
    const { labels } = population(
      `households: 100000\nwealth: {shape: quantile_shares, mean: 10, quantile_shares: [${shares.join(', ')}]}`,
    );
    const sorted = labels.wealth.slice().sort();
    const total = mean(sorted) * sorted.length;
    shares.forEach((share, g) => {
      const part = sorted.slice(g * 20000, (g + 1) * 20000);
      // the Pareto top (exponent 3.6) has a standard error of about 0.004 at this size
      expect(Math.abs((mean(part) * 20000) / total - share)).toBeLessThan(0.015);
    });
  });

  test('a split histogram keeps each group’s mean (integrated on a fine grid)', () => {
    const shares = [0.05, 0.15, 0.25, 0.55];
    const quantile = splitHistogram(shares);
    for (let g = 0; g < 3; g++) {
      let sum = 0;
      const steps = 20_000;
      for (let k = 0; k < steps; k++) {
        const u = (g + (k + 0.5) / steps) / 4;
        sum += quantile(u, 1 - u);
      }
      expect(sum / steps).toBeCloseTo(shares[g]! * 4, 6);
    }
  });

  test('a survey column is resampled with its weights', () => {
    const sample = readSample('assets,w\n10,1\n20,2\n40,1\n', 'survey.csv', 'assets', 'w');
    const { labels } = population(
      'households: 40000\nwealth: {shape: sample, sample: {file: survey.csv, column: assets, weight: w}}',
      { ...NO_FILES, sample },
    );
    const share = (value: number): number => labels.wealth.filter((y) => y === value).length / 40000;
    // binomial standard error at most 0.0025
    expect(Math.abs(share(10) - 0.25)).toBeLessThan(0.0125);
    expect(Math.abs(share(20) - 0.5)).toBeLessThan(0.0125);
    expect(share(10) + share(20) + share(40)).toBe(1);
  });
});

describe('places and groups', () => {
  test('groups have exact shares and their relative wealth', () => {
    const { labels } = population(
      `households: 20001
groups:
  - {name: a, share: 0.65}
  - {name: b, share: 0.35, relative_wealth: 0.45}
wealth: {shape: lognormal, mean: 50, sd_log: 0.5}`,
    );
    const inB = labels.wealth.filter((_, i) => labels.group[i] === 1);
    const inA = labels.wealth.filter((_, i) => labels.group[i] === 0);
    expect(inB.length).toBe(Math.round(0.35 * 20001));
    // relative standard error of the ratio is about 0.53·√(1/13000 + 1/7000) = 0.008
    expect(Math.abs(mean(inB) / mean(inA) / 0.45 - 1)).toBeLessThan(0.04);
    expect(mean(labels.wealth)).toBeCloseTo(50, 9);
  });

  test('equal places differ by one household at most; uneven ones spread as asked and none is empty', () => {
    const equal = population('households: 103\nplaces: 10\nwealth: {shape: lognormal, mean: 1, gini: 0.3}');
    const sizes = (place: Uint32Array, count: number): number[] =>
      Array.from({ length: count }, (_, p) => place.filter((q) => q === p).length);
    expect(sizes(equal.labels.place, 10).sort()).toEqual([10, 10, 10, 10, 10, 10, 10, 11, 11, 11]);
    const uneven = population(
      'households: 60000\nplaces: {count: 600, size_cv: 0.5}\nwealth: {shape: lognormal, mean: 1, gini: 0.3}',
    );
    const drawn = sizes(uneven.labels.place, 600);
    expect(Math.min(...drawn)).toBeGreaterThan(0);
    // standard error of a coefficient of variation at 600 lognormal sizes is about 0.02
    expect(Math.abs(Math.sqrt(variance(drawn)) / mean(drawn) - 0.5)).toBeLessThan(0.1);
  });

  test('apportioning gives every place at least one and sums up', () => {
    expect(Array.from(apportion(10, Float64Array.of(100, 1, 1)))).toEqual([8, 1, 1]);
    expect(Array.from(apportion(3, Float64Array.of(1, 1, 1)))).toEqual([1, 1, 1]);
    expect(Array.from(apportion(7, Float64Array.of(0.5, 0.5), 0))).toEqual([4, 3]);
  });

  test('replicates differ, and the same replicate is the same to the bit', () => {
    const text = 'households: 50\nwealth: {shape: lognormal, mean: 1, gini: 0.3}';
    expect(population(text).labels.wealth).toEqual(population(text).labels.wealth);
    expect(population(text).labels.wealth).not.toEqual(population(text, NO_FILES, 1).labels.wealth);
  });
});
