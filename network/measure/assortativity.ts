/**
 * Assortativity: whether ties join like with like (Newman 2003, "Mixing patterns in networks").
 *
 * A correlation over tie ends, every tie entered in both orientations. Ties count alike unless weights are asked for.
 * Not the correlation of a household's value with its neighbours' mean, which gives every household one vote.
 */
import { ShapeError } from '../errors.js';
import type { Ties } from '../graph.js';
import { midRanks } from './ranks.js';

/**
 * Numeric assortativity (Newman 2003, eq. 21): Pearson correlation of the values at the two ends of a tie.
 *
 * @param value - length n; ties with an end that is NaN are left out
 * @param weighted - count each tie by its weight
 * @returns −1 … 1, NaN when undefined (no ties, or the same value at every end). Cost O(n + m).
 */
export function assortativity(ties: Ties, value: ArrayLike<number>, weighted = false): number {
  const { n, start, target } = ties;
  if (value.length !== n) throw new ShapeError('value', value.length, n, 'one value per household');
  const weight = weighted ? ties.weight : null;
  // two passes: deviations from the mean over ends keep the digits of values far from zero
  let total = 0;
  let sum = 0;
  for (let i = 0; i < n; i++) {
    for (let e = start[i]; e < start[i + 1]; e++) {
      if (Number.isNaN(value[i]) || Number.isNaN(value[target[e]])) continue;
      const w = weight === null ? 1 : weight[e];
      total += w;
      sum += w * value[i];
    }
  }
  const mean = sum / total;
  let product = 0;
  let square = 0;
  let largest = 0;
  for (let i = 0; i < n; i++) {
    const x = value[i] - mean;
    for (let e = start[i]; e < start[i + 1]; e++) {
      const y = value[target[e]] - mean;
      if (Number.isNaN(x) || Number.isNaN(y)) continue;
      const w = weight === null ? 1 : weight[e];
      product += w * x * y;
      square += w * x * x;
      largest = Math.max(largest, Math.abs(x));
    }
  }
  // equal values at every end leave only the rounding of their mean
  if (!(largest > 1e-14 * Math.abs(mean))) return NaN;
  return product / square;
}

/** Assortativity of degree (Newman 2002). @returns as {@link assortativity}; NaN when all tied degrees are equal */
export function degreeAssortativity(ties: Ties): number {
  const degree = new Float64Array(ties.n);
  for (let i = 0; i < ties.n; i++) degree[i] = ties.start[i + 1] - ties.start[i];
  return assortativity(ties, degree);
}

/** Assortativity of the rank of a value, ties in the value averaged. @returns as {@link assortativity} */
export function rankAssortativity(ties: Ties, value: Float64Array): number {
  return assortativity(ties, midRanks(value));
}
