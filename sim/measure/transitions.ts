/**
 * Transition tables between quantile groups of parents and children, and what is read off them.
 *
 * Rows are parents, columns children, poorest group first unless the caller's table says otherwise.
 */
import { EigenvalueDecomposition, Matrix, solve } from 'ml-matrix';
import { pow } from '../../network/elementary.js';
import { ShapeError } from '../../network/errors.js';
import { averageRanks, orderOf, rankBins } from './order.js';
import { quantileOfSorted } from './quantile.js';

/**
 * Counts of dynasties by parent's and child's quantile group.
 *
 * @param k - groups, default 5
 * @param cut - `rank` (default): group floor(k (average rank − ½)/n), ties stay together; `quantile`: cut at type-7
 *   quantiles, a value equal to a cut goes to the lower group
 * @returns row-major k × k counts. Cost O(n).
 */
export function transitionCounts(
  parent: ArrayLike<number>,
  child: ArrayLike<number>,
  k = 5,
  cut: 'rank' | 'quantile' = 'rank',
): Float64Array {
  if (child.length !== parent.length) throw new ShapeError('child', child.length, parent.length, 'one per parent');
  const bins = (x: ArrayLike<number>): ArrayLike<number> =>
    cut === 'rank' ? rankBins(averageRanks(x), k) : quantileBins(x, k);
  return countPairs(bins(parent), bins(child), k);
}

/** Counts pairs of group numbers. @returns row-major k × k, rows the first. */
export function countPairs(from: ArrayLike<number>, to: ArrayLike<number>, k: number): Float64Array {
  const counts = new Float64Array(k * k);
  for (let i = 0; i < from.length; i++) counts[from[i] * k + to[i]]++;
  return counts;
}

function quantileBins(values: ArrayLike<number>, k: number): Uint16Array {
  const n = values.length;
  const order = orderOf(values);
  const sorted = new Float64Array(n);
  for (let i = 0; i < n; i++) sorted[i] = values[order[i]];
  const bin = new Uint16Array(n);
  let b = 0;
  for (let i = 0; i < n; i++) {
    while (b < k - 1 && sorted[i] > quantileOfSorted(sorted, (b + 1) / k)) b++;
    bin[order[i]] = b;
  }
  return bin;
}

/** Row shares of a square table of counts, row-major; a row without counts is NaN. */
export function rowShares(counts: ArrayLike<number>): Float64Array {
  const k = Math.sqrt(counts.length);
  const out = new Float64Array(k * k);
  for (let r = 0; r < k; r++) {
    let total = 0;
    for (let c = 0; c < k; c++) total += counts[r * k + c];
    for (let c = 0; c < k; c++) out[r * k + c] = counts[r * k + c] / total;
  }
  return out;
}

/** What a transition table says. k classes. */
export interface TransitionMeasures {
  /** Row shares, row-major k × k. */
  readonly matrix: Float64Array;
  /** Long-run shares of the classes under this matrix, length k. */
  readonly stationary: Float64Array;
  /** Shorrocks' (Prais') index (k − trace)/(k − 1): 0 nobody moves, 1 origin does not matter. */
  readonly shorrocks: number;
  /** Modulus of the second largest eigenvalue: how slowly origin is forgotten. */
  readonly secondEigenvalue: number;
  /** 1 − |det P|^(1/(k−1)). */
  readonly determinantIndex: number;
  /** Mean number of generations until leaving each class, 1/(1 − p_ii). */
  readonly exitTimes: Float64Array;
  /** Share of all counts on the diagonal. */
  readonly immobileShare: number;
  /** Share of all counts above the diagonal (child's class number higher). */
  readonly aboveDiagonalShare: number;
  /** Bartholomew's index: mean number of classes moved. */
  readonly bartholomew: number;
}

/**
 * Measures of a square transition table.
 *
 * @param counts - row-major k × k, ≥ 0, every row with a positive sum (shares do as well as counts, but then every
 *   origin class weighs the same)
 * @throws {RangeError} if the table is not square or a row is empty
 */
export function transitionMeasures(counts: ArrayLike<number>): TransitionMeasures {
  const k = Math.sqrt(counts.length);
  if (!Number.isInteger(k) || k < 2) throw new RangeError(`a transition table is k × k, got ${counts.length} cells`);
  const matrix = rowShares(counts);
  let total = 0;
  let diagonal = 0;
  let above = 0;
  let moved = 0;
  let trace = 0;
  const exitTimes = new Float64Array(k);
  for (let r = 0; r < k; r++) {
    if (Number.isNaN(matrix[r * k])) throw new RangeError(`row ${r} of the transition table is empty`);
    for (let c = 0; c < k; c++) {
      const count = counts[r * k + c];
      total += count;
      if (c === r) diagonal += count;
      if (c > r) above += count;
      moved += count * Math.abs(c - r);
    }
    trace += matrix[r * k + r];
    exitTimes[r] = 1 / (1 - matrix[r * k + r]);
  }
  const p = Matrix.from1DArray(k, k, matrix);
  const { realEigenvalues, imaginaryEigenvalues } = new EigenvalueDecomposition(p, { assumeSymmetric: false });
  const moduli = realEigenvalues.map((re, i) => Math.sqrt(re * re + imaginaryEigenvalues[i] * imaginaryEigenvalues[i]));
  moduli.sort((a, b) => b - a);
  const determinant = moduli.reduce((product, m) => product * m, 1);
  return {
    matrix,
    stationary: stationaryOf(p),
    shorrocks: (k - trace) / (k - 1),
    secondEigenvalue: moduli[1],
    determinantIndex: 1 - pow(determinant, 1 / (k - 1)),
    exitTimes,
    immobileShare: diagonal / total,
    aboveDiagonalShare: above / total,
    bartholomew: moved / total,
  };
}

/** s with s P = s and Σ s = 1; the last balance equation, which the others imply, gives way to the sum. */
function stationaryOf(p: Matrix): Float64Array {
  const k = p.rows;
  const a = p.transpose().sub(Matrix.eye(k, k));
  for (let c = 0; c < k; c++) a.set(k - 1, c, 1);
  const right = Matrix.zeros(k, 1);
  right.set(k - 1, 0, 1);
  return Float64Array.from(solve(a, right, true).to1DArray());
}
