/**
 * Mobility when parent and child are jointly lognormal: the yardstick beside measured ranks and transitions.
 *
 * Ranks depend only on the correlation of logs, so these values hold for any pair with that Gaussian dependence.
 * For comparison only; nothing in a run depends on it.
 */
import normalDistribution from '@stdlib/stats-base-dists-normal';

/** Rank–rank slope (Spearman's correlation): (6/π) asin(ρ/2) (Pearson 1907). */
export function gaussianRankRankSlope(rho: number): number {
  return (6 / Math.PI) * Math.asin(rho / 2);
}

/** Kendall's rank correlation: (2/π) asin ρ. */
export function gaussianKendall(rho: number): number {
  return (2 / Math.PI) * Math.asin(rho);
}

/** Steps of Simpson's rule per class; enough for 1e−11 at a correlation of 0.9, where the integrand is steepest. */
const STEPS = 4000;

/**
 * Transition matrix between k quantile groups of a bivariate normal.
 *
 * @param rho - correlation, −1 < ρ < 1
 * @returns row-major k × k, row = parent, poorest first; error below 1e−10
 */
export function gaussianTransitions(rho: number, k = 5): Float64Array {
  if (!(rho > -1 && rho < 1)) throw new RangeError(`rho must lie between -1 and 1, got ${rho}`);
  const cuts = Array.from({ length: k + 1 }, (_, c) =>
    c === 0 ? -9 : c === k ? 9 : normalDistribution.quantile(c / k, 0, 1),
  );
  const s = Math.sqrt(1 - rho * rho);
  const out = new Float64Array(k * k);
  for (let r = 0; r < k; r++) {
    const width = (cuts[r + 1] - cuts[r]) / STEPS;
    for (let step = 0; step <= STEPS; step++) {
      const x = cuts[r] + step * width;
      const weight = ((step === 0 || step === STEPS ? 1 : step % 2 === 1 ? 4 : 2) * width) / 3;
      const density = (weight * Math.exp(-0.5 * x * x)) / Math.sqrt(2 * Math.PI);
      let below = 0;
      for (let c = 0; c < k; c++) {
        const upTo = c === k - 1 ? 1 : normalDistribution.cdf((cuts[c + 1] - rho * x) / s, 0, 1);
        out[r * k + c] += k * density * (upTo - below);
        below = upTo;
      }
    }
  }
  return out;
}
