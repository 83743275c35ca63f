/**
 * The Lorenz curve and what is read off it: shares of quantile groups, the Palma ratio, the quintile share ratio.
 *
 * The curve joins the cumulative points (0, 0), (w_1, w_1 y_1), … by straight lines, so a row may be split between
 * two groups. All rows count, zeros and negatives too; the total must be above 0.
 */
import { quantile } from './quantile.js';
import { type Sample, sampleOf, type Values, type Weighting } from './sample.js';

/**
 * Lorenz ordinates: share of the total held by the poorest share p.
 *
 * @param at - probabilities in [0, 1], any order
 * @returns one ordinate per probability; NaN where the total is 0 or less. Cost O(n) after the sort.
 * @throws {RangeError} if a probability is outside [0, 1]
 */
export function lorenz(values: Values, at: ArrayLike<number>, weighting?: Weighting): Float64Array {
  const sample = sampleOf(values, weighting);
  const { n, value, weight, total, sum } = sample;
  const out = new Float64Array(at.length).fill(NaN);
  const asked = Array.from(at, (p, index) => ({ p, index })).sort((a, b) => a.p - b.p);
  for (const { p } of asked) if (!(p >= 0 && p <= 1)) throw new RangeError(`p must be in [0, 1], got ${p}`);
  if (n === 0 || !(sum > 0)) return out;
  let k = 0;
  let mass = 0;
  let held = 0;
  for (const { p, index } of asked) {
    const goal = p * total;
    while (k < n) {
      const w = weight === null ? 1 : weight[k];
      if (mass + w > goal) break;
      mass += w;
      held += w * value[k];
      k++;
    }
    out[index] = p === 1 ? 1 : (held + (k < n ? (goal - mass) * value[k] : 0)) / sum;
  }
  return out;
}

/** Share of the total held by the poorest share p, 0 … 1. */
export function shareBottom(values: Values, p: number, weighting?: Weighting): number {
  return lorenz(values, [p], weighting)[0];
}

/** Share of the total held by the richest share p, 0 … 1. */
export function shareTop(values: Values, p: number, weighting?: Weighting): number {
  return 1 - lorenz(values, [1 - p], weighting)[0];
}

/**
 * Shares of the total held by k groups of equal size, poorest first.
 *
 * @param k - number of groups, 5 for quintiles, 10 for tenths
 * @returns length k, summing to 1 up to rounding
 */
export function quantileShares(values: Values, k: number, weighting?: Weighting): Float64Array {
  const at = Float64Array.from({ length: k }, (_, g) => (g + 1) / k);
  const curve = lorenz(values, at, weighting);
  for (let g = k - 1; g > 0; g--) curve[g] -= curve[g - 1];
  return curve;
}

/** Palma ratio: share of the richest tenth over that of the poorest four tenths (Palma 2011). NaN when the latter is ≤ 0. */
export function palma(values: Values, weighting?: Weighting): number {
  const curve = lorenz(values, [0.4, 0.9], weighting);
  return curve[0] > 0 ? (1 - curve[1]) / curve[0] : NaN;
}

/**
 * Quintile share ratio S80/S20 over whole rows: the sum above the 80 % quantile over the sum at or below the
 * 20 % quantile. Quantiles are those of the step function (weighted, or type 2), as official statistics take them.
 */
export function quintileShareRatio(values: Values, weighting?: Weighting): number {
  const sample: Sample = sampleOf(values, weighting);
  const { n, value, weight } = sample;
  const low = quantile(sample, 0.2, undefined, 2);
  const high = quantile(sample, 0.8, undefined, 2);
  let bottom = 0;
  let top = 0;
  for (let k = 0; k < n; k++) {
    const held = weight === null ? value[k] : weight[k] * value[k];
    if (value[k] <= low) bottom += held;
    if (value[k] > high) top += held;
  }
  return top / bottom;
}
