/**
 * Esteban–Ray polarisation: groups that are alike within and far apart from each other.
 *
 * For groups given by the caller, and for wealth classes found from the data. Not normalised (K = 1).
 */
import { pow } from '../../network/elementary.js';
import { ShapeError } from '../../network/errors.js';
import { orderOf } from './order.js';
import { type Sample, sampleOf, type Values, type Weighting } from './sample.js';

/**
 * Esteban–Ray index (Esteban and Ray 1994, eq. 3): Σ_i Σ_j p_i^(1+α) p_j |y_i − y_j|, K = 1.
 *
 * @param shares - population share of each group, summing to 1 (not checked)
 * @param values - position of each group, in any unit; divide by the mean for a scale-free index
 * @param alpha - identification; 0 gives twice the Gini times the mean, the axioms ask for 0 < α ≤ 1.6
 * @returns in the unit of the values. Cost O(g log g) for g groups.
 */
export function estebanRay(shares: ArrayLike<number>, values: ArrayLike<number>, alpha: number): number {
  const g = values.length;
  if (shares.length !== g) throw new ShapeError('shares', shares.length, g, 'one per group');
  const order = orderOf(values);
  let share = 0;
  let held = 0;
  let allHeld = 0;
  let allShare = 0;
  for (let k = 0; k < g; k++) {
    allShare += shares[k];
    allHeld += shares[k] * values[k];
  }
  let sum = 0;
  for (let k = 0; k < g; k++) {
    const p = shares[order[k]];
    const y = values[order[k]];
    share += p;
    held += p * y;
    // Σ_j p_j |y − y_j|, groups below and above apart
    const alienation = y * (2 * share - allShare) + allHeld - 2 * held;
    if (p > 0) sum += pow(p, 1 + alpha) * alienation;
  }
  return sum;
}

/** Wealth classes found from the data. */
export interface WealthClasses {
  /** Population share of each class, poorest first. */
  readonly shares: Float64Array;
  /** Mean value of each class. */
  readonly means: Float64Array;
  /** Values at which one class ends and the next begins, length classes − 1. */
  readonly cuts: Float64Array;
}

/** Rounds of moving the cuts; each only improves the fit, and a few dozen settle any sample tried. */
const ROUNDS = 200;

/**
 * Splits a distribution into k classes that stand for it best: cuts that minimise the inequality left inside.
 *
 * The distribution of class means has the largest Gini when every cut equals the mean of the two classes it
 * parts taken together (Aghevli and Mehran 1981); the cuts are moved there in turn, starting from equal classes.
 * This is the partition Esteban, Gradín and Ray (2007) use. A local best; classes may be empty when fewer than k
 * values differ, and are then left out.
 *
 * @returns at most k classes. Cost O(n) after the sort, O(k log n) a round.
 */
export function wealthClasses(values: Values, k: number, weighting?: Weighting): WealthClasses {
  const sample = sampleOf(values, weighting);
  const { n, value, weight } = sample;
  const mass = new Float64Array(n + 1);
  const held = new Float64Array(n + 1);
  for (let i = 0; i < n; i++) {
    const w = weight === null ? 1 : weight[i];
    mass[i + 1] = mass[i] + w;
    held[i + 1] = held[i] + w * value[i];
  }
  const bound = new Uint32Array(k + 1);
  for (let c = 0; c <= k; c++) bound[c] = Math.round((c * n) / k);
  for (let round = 0; round < ROUNDS; round++) {
    let moved = false;
    for (let c = 1; c < k; c++) {
      const low = bound[c - 1];
      const high = bound[c + 1];
      const cut = (held[high] - held[low]) / (mass[high] - mass[low]);
      const at = countUpTo(sample, cut, low, high);
      if (at !== bound[c]) {
        bound[c] = at;
        moved = true;
      }
    }
    if (!moved) break;
  }
  const shares: number[] = [];
  const means: number[] = [];
  const cuts: number[] = [];
  for (let c = 0; c < k; c++) {
    const m = mass[bound[c + 1]] - mass[bound[c]];
    if (!(m > 0)) continue;
    if (shares.length > 0) cuts.push(value[bound[c]]);
    shares.push(m / mass[n]);
    means.push((held[bound[c + 1]] - held[bound[c]]) / m);
  }
  return { shares: Float64Array.from(shares), means: Float64Array.from(means), cuts: Float64Array.from(cuts) };
}

/** First position in low … high whose value lies above the cut. */
function countUpTo({ value }: Sample, cut: number, low: number, high: number): number {
  while (low < high) {
    const middle = (low + high) >>> 1;
    if (value[middle] <= cut) low = middle + 1;
    else high = middle;
  }
  return low;
}

/**
 * Esteban–Ray index of a distribution over its best k classes, values divided by their mean.
 *
 * @param alpha - identification, 0 < α ≤ 1.6
 * @param classes - k, default 3: poor, middle, rich
 * @returns scale-free; NaN unless the mean is above 0
 */
export function estebanRayOfClasses(values: Values, alpha: number, classes = 3, weighting?: Weighting): number {
  const sample = sampleOf(values, weighting);
  if (!(sample.mean > 0)) return NaN;
  const { shares, means } = wealthClasses(sample, classes);
  for (let c = 0; c < means.length; c++) means[c] /= sample.mean;
  return estebanRay(shares, means, alpha);
}
