/**
 * Inequality of two survey samples against R (package laeken 0.5.2 and base R) and numpy.
 *
 * ineq-cps1985: hourly wages of 534 persons, unweighted. ineq-eusilc: 14,827 household incomes with survey
 * weights, zeros and negatives left out of the logarithmic measures as the set states.
 */
import { describe, test } from 'vitest';
import { duclosEstebanRay } from '../../sim/measure/duclos-esteban-ray.js';
import { atkinson, generalisedEntropy2, theilL, theilLSplit, theilT, theilTSplit } from '../../sim/measure/entropy.js';
import { estebanRay } from '../../sim/measure/esteban-ray.js';
import { gini, giniSmallSample, giniSplit } from '../../sim/measure/gini.js';
import { lorenz, palma, quantileShares, quintileShareRatio, shareTop } from '../../sim/measure/lorenz.js';
import { poverty } from '../../sim/measure/poverty.js';
import { median, p90p10, quantile } from '../../sim/measure/quantile.js';
import { hoover, mean, variance, varianceBetween, varianceOfLogs } from '../../sim/measure/spread.js';
import { wolfson } from '../../sim/measure/wolfson.js';
import { type Check, checksOf, columnsOf, expectMatch } from './expected.js';

const QUANTILES = [0.1, 0.25, 0.5, 0.75, 0.9];
const ALPHAS = [0, 0.5, 1, 1.3, 1.6];

/** Esteban–Ray over labelled groups at their mean incomes, in units of the overall mean. */
function estebanRayOfGroups(x: number[], labels: string[], weights: number[] | undefined): number[] {
  const levels = [...new Set(labels)].sort();
  const w = weights ?? x.map(() => 1);
  const size = levels.map((g) => w.reduce((s, v, i) => (labels[i] === g ? s + v : s), 0));
  const held = levels.map((g) => w.reduce((s, v, i) => (labels[i] === g ? s + v * x[i] : s), 0));
  const total = size.reduce((s, v) => s + v, 0);
  const mu = held.reduce((s, v) => s + v, 0) / total;
  const shares = size.map((s) => s / total);
  const means = held.map((h, g) => h / size[g] / mu);
  return ALPHAS.map((alpha) => estebanRay(shares, means, alpha));
}

function suite(set: string, prefix: string, x: number[], labels: string[], weights?: number[]): void {
  const checks = checksOf(set);
  const w = { weights };
  const positive = { weights, positiveOnly: true };
  const measures: Record<string, (check: Check) => unknown> = {
    n: () => x.length,
    nonpositive: () => x.filter((v) => v <= 0).length,
    n_positive: () => x.filter((v) => v > 0).length,
    mean: () => mean(x, w),
    median: () => median(x, w),
    var_pop: () => variance(x, w),
    gini: () => gini(x, w),
    gini_unbiased: () => giniSmallSample(x),
    theil_T: () => theilT(x, positive),
    theil_L: () => theilL(x, positive),
    ge2: () => generalisedEntropy2(x, positive),
    var_log: () => varianceOfLogs(x, positive),
    atkinson: () => [0.5, 1, 2].map((aversion) => atkinson(x, aversion, positive)),
    lorenz: (check) => lorenz(x, check.at as number[], w),
    decile_shares: () => quantileShares(x, 10, w),
    top_shares: () => [0.1, 0.05, 0.01].map((p) => shareTop(x, p, w)),
    palma: () => palma(x, w),
    hoover: () => hoover(x, w),
    quantiles_type7: () => QUANTILES.map((p) => quantile(x, p)),
    quantiles_type2: () => QUANTILES.map((p) => quantile(x, p, undefined, 2)),
    quantiles_weighted: () => QUANTILES.map((p) => quantile(x, p, w)),
    p90p10_type7: () => p90p10(x),
    qsr: () => quintileShareRatio(x, w),
    poverty60: () => poverty(x, 0.6 * median(x, w), w),
    wolfson: () => wolfson(x, w),
    theil_T_groups: () => renamed(theilTSplit(x, labels, positive)),
    theil_L_groups: () => renamed(theilLSplit(x, labels, positive)),
    gini_groups: () => renamed(giniSplit(x, labels, w)),
    esteban_ray_groups: () => estebanRayOfGroups(x, labels, weights),
    anova_r2: () => varianceBetween(x, labels, w),
    der: (check) =>
      (check.alphas as number[]).map((alpha) => duclosEstebanRay(x, alpha, { bandwidth: check.bandwidth as number })),
  };
  for (const [id, check] of Object.entries(checks)) {
    const [start, name] = id.split('.');
    if (start !== prefix) continue;
    test(id, () => expectMatch(measures[name](check), check, id));
  }
}

function renamed<T extends { byGroup: unknown }>(split: T): Record<string, unknown> {
  return { ...split, by_group: split.byGroup };
}

describe('ineq-cps1985', () => {
  const { wage, sector } = columnsOf('ineq-cps1985', 'data.csv');
  suite('ineq-cps1985', 'wage', wage.map(Number), sector);
});

describe('ineq-eusilc', () => {
  const { income, weight, region } = columnsOf('ineq-eusilc', 'data.csv');
  suite('ineq-eusilc', 'w', income.map(Number), region, weight.map(Number));
  suite('ineq-eusilc', 'u', income.map(Number), region);
});
