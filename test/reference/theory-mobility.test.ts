/**
 * Mobility of a bivariate normal: closed forms for the rank–rank slope and Kendall's tau, quadrature for the
 * transitions, by two routes (R integrate, 400-point Gauss–Legendre). The measures of a sample are checked against
 * the same values on an even grid of normal quantiles, which has the stated correlation up to its coarseness.
 */
import normalDistribution from '@stdlib/stats-base-dists-normal';
import { describe, expect, test } from 'vitest';
import { gaussianKendall, gaussianRankRankSlope, gaussianTransitions } from '../../sim/measure/gaussian-mobility.js';
import { rankRankSlope } from '../../sim/measure/mobility.js';
import { rowShares, transitionCounts, transitionMeasures } from '../../sim/measure/transitions.js';
import { checksOf, expectMatch } from './expected.js';

const checks = checksOf('theory-mobility');
const rhos = checks['rho'].value as number[];

function rows(table: ArrayLike<number>): number[][] {
  return Array.from({ length: 5 }, (_, r) => Array.from({ length: 5 }, (_, c) => table[r * 5 + c]));
}

describe('theory-mobility', () => {
  test('rank–rank slope and Kendall', () => {
    expectMatch(rhos.map(gaussianRankRankSlope), checks['spearman'], 'spearman');
    expectMatch(rhos.map(gaussianKendall), checks['kendall'], 'kendall');
  });

  for (const rho of rhos) {
    test(`transitions at correlation ${rho}`, () => {
      const matrix = gaussianTransitions(rho);
      expectMatch(rows(matrix), checks[`transition_r${rho}`], `transition_r${rho}`);
      expectMatch(transitionMeasures(matrix).shorrocks, checks[`shorrocks_r${rho}`], `shorrocks_r${rho}`);
    });
  }

  test.each([0.341, 0.7])('the measures of a sample with correlation %d', (rho) => {
    // 300 × 300 equally likely pairs of quantiles; a cell boundary may fall half a row off, 1/600 of a class of 1/5
    const m = 300;
    const z = Float64Array.from({ length: m }, (_, i) => normalDistribution.quantile((i + 0.5) / m, 0, 1));
    const parent = new Float64Array(m * m);
    const child = new Float64Array(m * m);
    for (let i = 0; i < m; i++) {
      for (let j = 0; j < m; j++) {
        parent[i * m + j] = Math.exp(z[i]);
        child[i * m + j] = Math.exp(rho * z[i] + Math.sqrt(1 - rho * rho) * z[j]);
      }
    }
    const slope = (checks['spearman'].value as number[])[rhos.indexOf(rho)];
    // the grid trims the tails beyond 1/600, which costs the rank correlation less than that share
    expect(Math.abs(rankRankSlope(parent, child).slope - slope)).toBeLessThan(1 / 600);
    const shares = rowShares(transitionCounts(parent, child));
    (checks[`transition_r${rho}`].value as number[][]).flat().forEach((p, k) => {
      expect(Math.abs(shares[k] - p)).toBeLessThan(5 / 600);
    });
  });
});
