/**
 * Moran's I: whether households tied to each other have similar values (Moran 1950; Cliff and Ord 1981, ch. 1–2).
 *
 *     I = (n / S0) · Σ_ij w_ij z_i z_j / Σ_i z_i²,  z the deviations from the mean
 *
 * Households without ties are left out first. `row` weights give every household one vote, `binary` every tie.
 */
import { ShapeError } from '../errors.js';
import type { Ties, Uniform } from '../graph.js';
import { normalP } from './normal.js';
import { type Alternative, permutationP, shuffleValues } from './permute.js';
import { tiedHouseholds, type WeightStyle, weightSums } from './tie-weights.js';

export interface Moran {
  /** I; NaN without ties or when all tied households have one value. */
  readonly i: number;
  /** −1 / (n − 1), n the households with ties. */
  readonly expected: number;
  /** Variance over random arrangements of the values (uses their kurtosis m4/m2²). NaN below 4 households. */
  readonly varianceRandom: number;
  /** Variance for values drawn from a normal distribution. */
  readonly varianceNormal: number;
  /** (I − expected) / √varianceRandom, and its two-sided normal p-value. */
  readonly zRandom: number;
  readonly pRandom: number;
  /** (I − expected) / √varianceNormal, and its two-sided normal p-value. */
  readonly zNormal: number;
  readonly pNormal: number;
}

/**
 * Moran's I with its moments.
 *
 * @param value - length n, finite
 * @param style - see tie-weights.ts
 * @returns see {@link Moran}. Cost O(n + m).
 */
export function moran(ties: Ties, value: Float64Array, style: WeightStyle): Moran {
  const { z, i } = statistic(ties, value, style);
  const { n, s0, s1, s2 } = weightSums(ties, style);
  let m2 = 0;
  let m4 = 0;
  for (let a = 0; a < z.length; a++) {
    m2 += z[a] * z[a];
    m4 += z[a] * z[a] * z[a] * z[a];
  }
  m2 /= n;
  m4 /= n;
  const kurtosis = m4 / (m2 * m2);
  const expected = -1 / (n - 1);
  const varianceRandom =
    n < 4
      ? NaN
      : (n * ((n * n - 3 * n + 3) * s1 - n * s2 + 3 * s0 * s0) -
          kurtosis * ((n * n - n) * s1 - 2 * n * s2 + 6 * s0 * s0)) /
          ((n - 1) * (n - 2) * (n - 3) * s0 * s0) -
        expected * expected;
  const varianceNormal = (n * n * s1 - n * s2 + 3 * s0 * s0) / (s0 * s0 * (n * n - 1)) - expected * expected;
  const zRandom = (i - expected) / Math.sqrt(varianceRandom);
  const zNormal = (i - expected) / Math.sqrt(varianceNormal);
  return {
    i,
    expected,
    varianceRandom,
    varianceNormal,
    zRandom,
    pRandom: normalP(zRandom, 'two-sided'),
    zNormal,
    pNormal: normalP(zNormal, 'two-sided'),
  };
}

/**
 * Permutation p-value of Moran's I: values are shuffled over the tied households.
 *
 * @param alternative - two-sided by default, as the normal p-values above
 * @returns p in (0, 1], NaN when I is. Cost O(permutations · (n + m)); on a million households the normal p-value of
 *   {@link moran} serves as well and costs nothing.
 */
export function moranPermutation(
  ties: Ties,
  value: Float64Array,
  style: WeightStyle,
  permutations: number,
  uniform: Uniform,
  alternative: Alternative = 'two-sided',
): number {
  const { z, households, i } = statistic(ties, value, style);
  const { n, s0 } = weightSums(ties, style);
  let square = 0;
  for (let a = 0; a < z.length; a++) square += z[a] * z[a];
  const spread = new Float64Array(ties.n);
  return permutationP(i, -1 / (n - 1), alternative, permutations, () => {
    shuffleValues(z, uniform);
    for (let a = 0; a < households.length; a++) spread[households[a]] = z[a];
    return ((n / s0) * crossProduct(ties, spread, style)) / square;
  });
}

/** Deviations of the tied households, and I. */
function statistic(
  ties: Ties,
  value: Float64Array,
  style: WeightStyle,
): { z: Float64Array<ArrayBuffer>; households: Uint32Array<ArrayBuffer>; i: number } {
  if (value.length !== ties.n) throw new ShapeError('value', value.length, ties.n, 'one value per household');
  const households = tiedHouseholds(ties);
  const n = households.length;
  const z = new Float64Array(n);
  let mean = 0;
  for (let a = 0; a < n; a++) mean += value[households[a]];
  mean /= n;
  const spread = new Float64Array(ties.n);
  let square = 0;
  let largest = 0;
  for (let a = 0; a < n; a++) {
    z[a] = value[households[a]] - mean;
    spread[households[a]] = z[a];
    square += z[a] * z[a];
    largest = Math.max(largest, Math.abs(z[a]));
  }
  // equal values leave only the rounding of their mean
  if (!(largest > 1e-14 * Math.abs(mean))) return { z, households, i: NaN };
  const s0 = style === 'binary' ? ties.target.length : n;
  return { z, households, i: ((n / s0) * crossProduct(ties, spread, style)) / square };
}

/** Σ_ij w_ij z_i z_j. */
function crossProduct(ties: Ties, z: Float64Array, style: WeightStyle): number {
  const { n, start, target } = ties;
  let total = 0;
  for (let i = 0; i < n; i++) {
    const from = start[i];
    const to = start[i + 1];
    if (from === to) continue;
    let sum = 0;
    for (let e = from; e < to; e++) sum += z[target[e]];
    total += style === 'row' ? (z[i] * sum) / (to - from) : z[i] * sum;
  }
  return total;
}
