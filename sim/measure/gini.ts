/**
 * The Gini coefficient, plug-in form, and its split by classes.
 *
 * All rows count, zeros and negatives too. Negatives leave it defined while the mean is above 0, though no longer
 * bounded by 1; otherwise NaN.
 */
import { groupingOf, isSample, sampleOf, type Values, type Weighting } from './sample.js';

/**
 * Gini coefficient: mean absolute difference over all n² ordered pairs, divided by twice the mean.
 *
 *     G = Σ_i (2i − n − 1) y_(i) / (n Σ y),   with weights Σ w_i y_i (2 C_i − w_i − W) / (W Σ w y)
 *
 * C_i is the cumulative weight up to and with row i. No n/(n − 1): see `giniSmallSample`.
 *
 * @returns 0 … (n−1)/n for values ≥ 0; NaN unless the mean is above 0. Cost O(n) after the sort.
 */
export function gini(values: Values, weighting?: Weighting): number {
  const { n, value, weight, total, sum, mean } = sampleOf(values, weighting);
  if (!(mean > 0)) return NaN;
  let moment = 0;
  if (weight === null) {
    // around the mean, so that equal values give 0 exactly up to the rounding of one subtraction
    for (let k = 0; k < n; k++) moment += (2 * k + 1 - n) * (value[k] - mean);
  } else {
    let cumulative = 0;
    for (let k = 0; k < n; k++) {
      moment += weight[k] * (value[k] - mean) * (2 * cumulative + weight[k] - total);
      cumulative += weight[k];
    }
  }
  return moment / (total * sum);
}

/** Gini over pairs of different rows: the plug-in times n/(n − 1). Weights are not meant here: n is the number of rows. */
export function giniSmallSample(values: Values): number {
  const sample = sampleOf(values);
  return (gini(sample) * sample.n) / (sample.n - 1);
}

/** Pyatt's split of the Gini. */
export interface GiniSplit {
  /** Σ population share × share of the total × Gini within. */
  readonly within: number;
  /** Gini of the class means. */
  readonly between: number;
  /** What is left: how far the classes overlap. */
  readonly overlap: number;
  /** Gini of each class, in the order of `levels`. */
  readonly byGroup: Float64Array;
  readonly levels: readonly (string | number)[];
}

/**
 * Splits the Gini by classes (Pyatt 1976): G = within + between + overlap.
 *
 * @param labels - class of each row, in the order of the original values. Cost O(n) after the sort.
 */
export function giniSplit(values: Values, labels: ArrayLike<string | number>, weighting?: Weighting): GiniSplit {
  const sample = sampleOf(values, weighting);
  const { n, value, weight, order, total, sum } = sample;
  const { of, count, levels } = groupingOf(labels, isSample(values) ? labels.length : values.length);
  const size = new Float64Array(count);
  const held = new Float64Array(count);
  // Σ w y (2C + w) of each class in one ascending pass
  const moment = new Float64Array(count);
  for (let k = 0; k < n; k++) {
    const g = of[order[k]];
    const w = weight === null ? 1 : weight[k];
    moment[g] += w * value[k] * (2 * size[g] + w);
    size[g] += w;
    held[g] += w * value[k];
  }
  const byGroup = new Float64Array(count);
  const means = new Float64Array(count);
  let within = 0;
  for (let g = 0; g < count; g++) {
    byGroup[g] = held[g] > 0 ? moment[g] / (size[g] * held[g]) - 1 : NaN;
    means[g] = held[g] / size[g];
    if (size[g] > 0 && held[g] > 0) within += (size[g] / total) * (held[g] / sum) * byGroup[g];
  }
  const present = Array.from(size.keys()).filter((g) => size[g] > 0);
  const between = gini(
    present.map((g) => means[g]),
    { weights: present.map((g) => size[g]) },
  );
  return { within, between, overlap: gini(sample) - within - between, byGroup, levels };
}
