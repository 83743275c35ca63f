/**
 * Mean, variance, variance of logs, Hoover's index and the share of variance between classes.
 *
 * Denominators are n (or the sum of weights), never n − 1. Values in any unit; Hoover and the variance of logs have none.
 */
import { log } from '../../network/elementary.js';
import { groupingOf, isSample, sampleOf, type Values, type Weighting } from './sample.js';

/** Mean; NaN for no rows. */
export function mean(values: Values, weighting?: Weighting): number {
  return sampleOf(values, weighting).mean;
}

/** Variance around the mean with denominator n (sum of weights); NaN for no rows. Cost O(n) after the sort. */
export function variance(values: Values, weighting?: Weighting): number {
  const { n, value, weight, total, mean: mu } = sampleOf(values, weighting);
  let sum = 0;
  for (let k = 0; k < n; k++) {
    const d = value[k] - mu;
    sum += weight === null ? d * d : weight[k] * d * d;
  }
  return sum / total;
}

/** Variance of the natural logarithm, denominator n; NaN when a value is 0 or less (unless `positiveOnly`). */
export function varianceOfLogs(values: Values, weighting?: Weighting): number {
  const { n, value, weight, total } = sampleOf(values, weighting);
  if (!(value[0] > 0)) return NaN;
  const logs = new Float64Array(n);
  let sum = 0;
  for (let k = 0; k < n; k++) {
    logs[k] = log(value[k]);
    sum += weight === null ? logs[k] : weight[k] * logs[k];
  }
  const mu = sum / total;
  let squares = 0;
  for (let k = 0; k < n; k++) {
    const d = logs[k] - mu;
    squares += weight === null ? d * d : weight[k] * d * d;
  }
  return squares / total;
}

/**
 * Hoover's index: half the mean absolute deviation relative to the mean, Σ|y − μ| / (2 n μ).
 *
 * The share of the total that would have to move for equality. All rows are used; NaN unless the mean is above 0.
 */
export function hoover(values: Values, weighting?: Weighting): number {
  const { n, value, weight, sum: total, mean: mu } = sampleOf(values, weighting);
  if (!(mu > 0)) return NaN;
  let sum = 0;
  for (let k = 0; k < n; k++) {
    const d = Math.abs(value[k] - mu);
    sum += weight === null ? d : weight[k] * d;
  }
  return sum / (2 * total);
}

/**
 * Share of the variance that lies between classes (eta squared): Σ p_g (μ_g − μ)² / variance.
 *
 * @param labels - class of each row, in the order of the original values
 * @returns 0 … 1; NaN when all values are equal
 */
export function varianceBetween(values: Values, labels: ArrayLike<string | number>, weighting?: Weighting): number {
  const sample = sampleOf(values, weighting);
  const { n, value, weight, order, total, mean: mu } = sample;
  const { of, count } = groupingOf(labels, isSample(values) ? labels.length : values.length);
  const size = new Float64Array(count);
  const sum = new Float64Array(count);
  for (let k = 0; k < n; k++) {
    const w = weight === null ? 1 : weight[k];
    size[of[order[k]]] += w;
    sum[of[order[k]]] += w * value[k];
  }
  let between = 0;
  for (let g = 0; g < count; g++) {
    if (size[g] === 0) continue;
    const d = sum[g] / size[g] - mu;
    between += size[g] * d * d;
  }
  return between / total / variance(sample);
}
