/**
 * Duclos–Esteban–Ray polarisation: every household identifies with those near it and feels apart from those far off.
 *
 * The estimate of Duclos, Esteban and Ray (2004): no classes to choose, a kernel density instead. Values are
 * divided by their mean, so the index has no unit; it is not halved (α = 0 gives twice the Gini).
 */
import { pow } from '../../network/elementary.js';
import { ShapeError } from '../../network/errors.js';
import { densityAtPoints } from './gauss-sum.js';
import { type Sample, sampleOf, type Values, type Weighting } from './sample.js';
import { variance } from './spread.js';

/** How the density is estimated. */
export interface KernelWeighting extends Weighting {
  /** Standard deviation of the Gaussian kernel, in units of the mean; default 4.7 σ α^0.1 / √n. */
  readonly bandwidth?: number | undefined;
}

/**
 * Duclos–Esteban–Ray index: mean of f(y)^α E|y − Y| over the sample, y in units of the mean.
 *
 * The default bandwidth is the rule of thumb of the 2004 paper for samples not far from normal (eq. 21, from
 * memory), σ the standard deviation in units of the mean. The kernel sum is exact to 1e−9 of the density's peak.
 *
 * @param alpha - identification, ¼ ≤ α ≤ 1 by the axioms
 * @returns NaN unless the mean is above 0; 0 when all values are equal (the limit is not defined there). Cost O(n)
 *   after the sort.
 */
export function duclosEstebanRay(values: Values, alpha: number, weighting: KernelWeighting = {}): number {
  const { bandwidth, ...rest } = weighting;
  const sample = sampleOf(values, rest);
  const { n, value, weight, order, total, sum, mean } = sample;
  if (!(mean > 0)) return NaN;
  const relative = new Float64Array(n);
  for (let k = 0; k < n; k++) relative[k] = value[k] / mean;
  const scaled: Sample = { n, value: relative, weight, order, total, sum: sum / mean, mean: 1 };
  const width = bandwidth ?? (4.7 * Math.sqrt(variance(scaled)) * pow(alpha, 0.1)) / Math.sqrt(n);
  // spread lost in rounding: nobody is apart from anybody
  if (!(width > 1e-12)) return 0;
  return polarisationAtDensity(scaled, densityAtPoints(relative, weight, width), alpha);
}

/**
 * The index when the density at each value is known: Σ w f^α a / W, a = E|y − Y| over the sample.
 *
 * @param values - raw or in units of the mean; the result is in that unit to the power 1 − α
 * @param density - f at each value, ascending values, length n
 */
export function polarisationAtDensity(values: Values, density: ArrayLike<number>, alpha: number): number {
  const { n, value, weight, total, sum } = sampleOf(values);
  if (density.length !== n) throw new ShapeError('density', density.length, n, 'one per value');
  let mass = 0;
  let held = 0;
  let result = 0;
  for (let k = 0; k < n; k++) {
    const w = weight === null ? 1 : weight[k];
    mass += w;
    held += w * value[k];
    const apart = value[k] * (2 * mass - total) + sum - 2 * held;
    const f = density[k];
    const identification = alpha === 0.5 ? Math.sqrt(f) : alpha === 1 ? f : pow(f, alpha);
    result += w * identification * apart;
  }
  return result / (total * total);
}
