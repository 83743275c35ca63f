/**
 * Growth incidence: which part of the distribution grew, and which dynasties.
 *
 * Growth is a gross factor over the span between the two columns (1.25 = +25 %), not annualised.
 */
import { ShapeError } from '../../network/errors.js';
import { averageRanks, rankBins } from './order.js';
import { quantile } from './quantile.js';
import { sampleOf, type Values } from './sample.js';

/** Percentiles of `incidence.csv`. */
export const PERCENTILES = 100;

/**
 * Anonymous growth incidence curve (Ravallion and Chen 2003): child quantile over parent quantile.
 *
 * @param at - probabilities; default the middles of 100 percentiles, 0.005 … 0.995
 * @returns gross growth factor at each probability, type-7 quantiles; not finite where the parent quantile is 0
 */
export function growthIncidence(parent: Values, child: Values, at: ArrayLike<number> = middles()): Float64Array {
  const before = sampleOf(parent);
  const after = sampleOf(child);
  const out = new Float64Array(at.length);
  for (let k = 0; k < out.length; k++) out[k] = quantile(after, at[k]) / quantile(before, at[k]);
  return out;
}

/**
 * Non-anonymous growth incidence: growth of the mean of the dynasties that started in each bin of rank.
 *
 * @param bins - default 100; ties stay together, so a bin may be empty (NaN)
 * @param rank - average ranks of `parent`, when the caller has them
 * @returns gross growth factor of each bin, poorest start first. Cost O(n) and a sort.
 */
export function growthByInitialRank(
  parent: ArrayLike<number>,
  child: ArrayLike<number>,
  bins = PERCENTILES,
  rank: ArrayLike<number> = averageRanks(parent),
): Float64Array {
  const n = parent.length;
  if (child.length !== n) throw new ShapeError('child', child.length, n, 'one child per parent');
  const bin = rankBins(rank, bins);
  const before = new Float64Array(bins);
  const after = new Float64Array(bins);
  for (let i = 0; i < n; i++) {
    before[bin[i]] += parent[i];
    after[bin[i]] += child[i];
  }
  for (let b = 0; b < bins; b++) after[b] /= before[b];
  return after;
}

function middles(): Float64Array {
  return Float64Array.from({ length: PERCENTILES }, (_, k) => (k + 0.5) / PERCENTILES);
}
