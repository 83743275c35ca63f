/**
 * Local Moran: where like sits with like (Anselin 1995).
 *
 *     I_i = (z_i / m2) Σ_j w_ij z_j,   m2 = Σ z² / n  (not n − 1)
 *
 * Household by household, with analytic moments (given z_i, Sokal, Oden and Thomson 1998; or over all arrangements,
 * Anselin 1995) and, in local-permutation.ts, permutation p-values. Households without ties are left out and get NaN.
 */
import { ShapeError } from '../errors.js';
import type { Ties } from '../graph.js';
import { normalP } from './normal.js';
import { tiedHouseholds, type WeightStyle } from './tie-weights.js';

/** All columns have length n; NaN for households without ties. */
export interface LocalMoran {
  readonly i: Float64Array<ArrayBuffer>;
  readonly expected: Float64Array<ArrayBuffer>;
  readonly variance: Float64Array<ArrayBuffer>;
  readonly z: Float64Array<ArrayBuffer>;
  /** Two-sided normal p-value of z. Poor for few ties and skewed values: prefer the permutation p-value. */
  readonly p: Float64Array<ArrayBuffer>;
}

/**
 * @param value - length n, finite
 * @param moments - `conditional` on the household's own value, or `total` over all arrangements
 * @returns see {@link LocalMoran}. Cost O(n + m).
 */
export function localMoran(
  ties: Ties,
  value: Float64Array,
  style: WeightStyle,
  moments: 'conditional' | 'total' = 'conditional',
): LocalMoran {
  if (value.length !== ties.n) throw new ShapeError('value', value.length, ties.n, 'one value per household');
  const { start, target } = ties;
  const households = tiedHouseholds(ties);
  const n = households.length;
  const out = {
    i: new Float64Array(ties.n).fill(NaN),
    expected: new Float64Array(ties.n).fill(NaN),
    variance: new Float64Array(ties.n).fill(NaN),
    z: new Float64Array(ties.n).fill(NaN),
    p: new Float64Array(ties.n).fill(NaN),
  };
  let mean = 0;
  for (const i of households) mean += value[i];
  mean /= n;
  let m2 = 0;
  let m4 = 0;
  for (const i of households) {
    const z = value[i] - mean;
    m2 += z * z;
    m4 += z * z * z * z;
  }
  m2 /= n;
  m4 /= n;
  const kurtosis = m4 / (m2 * m2);
  for (const i of households) {
    const k = start[i + 1] - start[i];
    const z = value[i] - mean;
    let sum = 0;
    for (let e = start[i]; e < start[i + 1]; e++) sum += value[target[e]] - mean;
    // row sums of the weights and of their squares
    const w = style === 'row' ? 1 : k;
    const w2 = style === 'row' ? 1 / k : k;
    out.i[i] = (z / m2) * (style === 'row' ? sum / k : sum);
    if (moments === 'conditional') {
      out.expected[i] = -(z * z * w) / ((n - 1) * m2);
      out.variance[i] = (z / m2) * (z / m2) * (n / (n - 2)) * (w2 - (w * w) / (n - 1)) * (m2 - (z * z) / (n - 1));
    } else {
      out.expected[i] = -w / (n - 1);
      out.variance[i] =
        (w2 * (n - kurtosis)) / (n - 1) +
        ((w * w - w2) * (2 * kurtosis - n)) / ((n - 1) * (n - 2)) -
        (w * w) / ((n - 1) * (n - 1));
    }
    out.z[i] = (out.i[i] - out.expected[i]) / Math.sqrt(out.variance[i]);
    out.p[i] = normalP(out.z[i], 'two-sided');
  }
  return out;
}
