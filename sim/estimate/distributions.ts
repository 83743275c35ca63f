/**
 * Tail probabilities and quantiles the regressions need, from the stdlib distributions, arranged so that small
 * p-values keep their digits (no 1 − cdf where the cdf is near 1).
 */

import chiSquareDistribution from '@stdlib/stats-base-dists-chisquare';
import fDistribution from '@stdlib/stats-base-dists-f';
import normalDistribution from '@stdlib/stats-base-dists-normal';
import tDistribution from '@stdlib/stats-base-dists-t';

/** Two-sided p-value of a t statistic; `df` may be Infinity (normal). NaN in, NaN out. */
export function twoSidedP(statistic: number, df: number): number {
  if (Number.isNaN(statistic)) return NaN;
  const t = -Math.abs(statistic);
  if (t === -Infinity) return 0;
  return 2 * (df === Infinity ? normalDistribution.cdf(t, 0, 1) : tDistribution.cdf(t, df));
}

/** The t such that a share `level` lies within ±t; `df` may be Infinity (normal). */
export function twoSidedCritical(level: number, df: number): number {
  const p = (1 + level) / 2;
  return df === Infinity ? normalDistribution.quantile(p, 0, 1) : tDistribution.quantile(p, df);
}

/** P(F > x), through the reciprocal so that the small tail is computed itself. `df2` may be Infinity (χ²/df1). */
export function fTail(x: number, df1: number, df2: number): number {
  if (Number.isNaN(x) || !(df2 > 0)) return NaN;
  if (x <= 0) return 1;
  if (x === Infinity) return 0;
  if (df2 === Infinity) return chiSquareTail(x * df1, df1);
  return fDistribution.cdf(1 / x, df2, df1);
}

export function fQuantile(p: number, df1: number, df2: number): number {
  return df2 === Infinity ? chiSquareDistribution.quantile(p, df1) / df1 : fDistribution.quantile(p, df1, df2);
}

/** P(χ² > x) for whole degrees of freedom, by the finite sum (Abramowitz and Stegun 1964, 26.4.4 and 26.4.5). */
export function chiSquareTail(x: number, df: number): number {
  if (Number.isNaN(x)) return NaN;
  if (x <= 0) return 1;
  const half = x / 2;
  if (df % 2 === 0) {
    let term = Math.exp(-half);
    let sum = term;
    for (let j = 1; j < df / 2; j++) {
      term *= half / j;
      sum += term;
    }
    return Math.min(1, sum);
  }
  const root = Math.sqrt(x);
  let sum = 2 * normalDistribution.cdf(-root, 0, 1);
  let term = 2 * normalDistribution.pdf(root, 0, 1) * root;
  for (let j = 1; j <= (df - 1) / 2; j++) {
    sum += term;
    term *= x / (2 * j + 1);
  }
  return Math.min(1, sum);
}

/**
 * Quantile of the noncentral χ² for real df > 0, as a Poisson mixture of central ones, by bisection to 1e−10 relative.
 */
export function noncentralChiSquareQuantile(p: number, df: number, noncentrality: number): number {
  const half = noncentrality / 2;
  const cdf = (x: number): number => {
    let weight = Math.exp(-half);
    let sum = 0;
    let mass = 0;
    for (let j = 0; mass < 1 - 1e-14 && j < 10_000; j++) {
      sum += weight * chiSquareDistribution.cdf(x, df + 2 * j);
      mass += weight;
      weight *= half / (j + 1);
    }
    return sum;
  };
  let low = 0;
  let high = df + noncentrality + 10;
  while (cdf(high) < p) high *= 2;
  while (high - low > 1e-10 * high) {
    const middle = (low + high) / 2;
    if (cdf(middle) < p) low = middle;
    else high = middle;
  }
  return (low + high) / 2;
}
