/**
 * Quantiles, the median and the ratio of the 90th to the 10th percentile.
 *
 * Without weights type 7 of Hyndman and Fan (1996), linear interpolation at (n − 1)p; type 2, the inverse of the
 * step function averaged at its jumps, on request. With weights the smallest value whose cumulative weight share
 * exceeds p, averaged with the one before when a share equals p: type 2 when all weights are equal.
 */
import { type Sample, sampleOf, type Values, type Weighting } from './sample.js';

/** Weight shares closer than this count as equal: room for rounding in a cumulative sum of a million terms. */
const SAME_SHARE = 1e-12;

/**
 * Quantile of a distribution.
 *
 * @param p - probability in [0, 1]
 * @param type - 7 (default) or 2; with weights always the weighted form of type 2
 * @returns in the unit of the values; NaN for no rows. Cost O(1) on a sample without weights, else O(n).
 * @throws {RangeError} if p is outside [0, 1]
 */
export function quantile(values: Values, p: number, weighting?: Weighting, type: 7 | 2 = 7): number {
  if (!(p >= 0 && p <= 1)) throw new RangeError(`p must be in [0, 1], got ${p}`);
  const sample = sampleOf(values, weighting);
  if (sample.n === 0) return NaN;
  if (sample.weight !== null || type === 2) return stepQuantile(sample, p);
  return quantileOfSorted(sample.value, p);
}

/** Type-7 quantile of ascending values, without checks. */
export function quantileOfSorted(value: Float64Array, p: number): number {
  const at = (value.length - 1) * p;
  const low = Math.floor(at);
  const high = Math.min(value.length - 1, low + 1);
  return value[low] + (at - low) * (value[high] - value[low]);
}

function stepQuantile({ n, value, weight, total }: Sample, p: number): number {
  const goal = p * total;
  const near = SAME_SHARE * total;
  let cumulative = 0;
  for (let k = 0; k < n; k++) {
    cumulative += weight === null ? 1 : weight[k];
    if (cumulative > goal + near) return value[k];
    if (cumulative >= goal - near && goal > near) {
      let next = k + 1;
      // rows of weight 0 are not there
      while (next < n && weight !== null && weight[next] === 0) next++;
      return next < n ? (value[k] + value[next]) / 2 : value[k];
    }
  }
  return value[n - 1];
}

/** Median: the middle value, the middle two averaged when their number is even; weighted as `quantile`. */
export function median(values: Values, weighting?: Weighting): number {
  return quantile(values, 0.5, weighting);
}

/** Ratio of the 90th to the 10th percentile (type 7 without weights); NaN when the 10th is 0 or less. */
export function p90p10(values: Values, weighting?: Weighting): number {
  const sample = sampleOf(values, weighting);
  const low = quantile(sample, 0.1);
  return low > 0 ? quantile(sample, 0.9) / low : NaN;
}
