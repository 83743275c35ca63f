/**
 * Getis–Ord G: where high values gather, and where low ones do (Getis and Ord 1992; Ord and Getis 1995).
 *
 * The z form of Ord and Getis (1995, eqs. 6 and 14) with binary weights: the sum over a household's ties against what
 * as many households drawn from the others (G) or from everyone, itself included (G*), would sum to. Positive where
 * high values gather. Households without ties are left out and get NaN.
 */
import { ShapeError } from '../errors.js';
import type { Ties } from '../graph.js';
import { tiedHouseholds } from './tie-weights.js';

/**
 * @param value - length n, finite
 * @param itself - false: G, the household's own value left out; true: G*, counted among its ties
 * @returns z of each household, length n; NaN without ties, or when it is tied to everyone. Cost O(n + m).
 */
export function getisOrd(ties: Ties, value: Float64Array, itself: boolean): Float64Array<ArrayBuffer> {
  if (value.length !== ties.n) throw new ShapeError('value', value.length, ties.n, 'one value per household');
  const { start, target } = ties;
  const households = tiedHouseholds(ties);
  const n = households.length;
  const out = new Float64Array(ties.n).fill(NaN);
  // deviations from the mean: G does not change when a constant is added, and sums of squares keep their digits
  let mean = 0;
  for (const i of households) mean += value[i];
  mean /= n;
  let square = 0;
  for (const i of households) square += (value[i] - mean) * (value[i] - mean);
  for (const i of households) {
    const own = value[i] - mean;
    let w = start[i + 1] - start[i];
    let sum = 0;
    for (let e = start[i]; e < start[i + 1]; e++) sum += value[target[e]] - mean;
    // over the others: their mean is −own / (n − 1), since deviations sum to 0
    let centre = -own / (n - 1);
    let s2 = (square - own * own) / (n - 1) - centre * centre;
    let pool = n - 1;
    if (itself) {
      w += 1;
      sum += own;
      centre = 0;
      s2 = square / n;
      pool = n;
    }
    const variance = (s2 * (pool * w - w * w)) / (pool - 1);
    out[i] = variance > 0 ? (sum - w * centre) / Math.sqrt(variance) : NaN;
  }
  return out;
}
