/**
 * Wolfson's index of bipolarisation: how far the distribution has emptied around its median.
 *
 * All rows count; needs a mean and a median above 0.
 */
import { gini } from './gini.js';
import { lorenz } from './lorenz.js';
import { median } from './quantile.js';
import { sampleOf, type Values, type Weighting } from './sample.js';

/**
 * Wolfson's index (Wolfson 1994): 2 (2 T − G) μ / median, with T = ½ − L(½) and G the plug-in Gini.
 *
 * @returns 0 at equality; NaN unless mean and median are above 0. Cost O(n) after the sort.
 */
export function wolfson(values: Values, weighting?: Weighting): number {
  const sample = sampleOf(values, weighting);
  const middle = median(sample);
  if (!(sample.mean > 0 && middle > 0)) return NaN;
  const t = 0.5 - lorenz(sample, [0.5])[0];
  return (2 * (2 * t - gini(sample)) * sample.mean) / middle;
}
