/**
 * Covariance of estimated coefficients: classical, HC1, HC3, clustered by one or two groupings.
 *
 * Scores are formed on orthonormal columns q = x R⁻¹ (whitened), where their meat is well scaled, and carried back
 * by R⁻¹ at the end: V = R⁻¹ (Σ s s') R⁻ᵀ, s the sum of q·e over a cluster.
 *
 * Conventions. HC1: n/(n−K), K counting absorbed effects. HC3: e²/(1−h)². Clustered: G/(G−1)·(n−1)/(n−k), k
 * counting absorbed effects unless nested in a cluster; two groupings by inclusion and exclusion (Cameron, Gelbach and
 * Miller 2011) with one factor from the smaller G, negative eigenvalues set to zero.
 */

import { EigenvalueDecomposition, Matrix } from 'ml-matrix';
import { BLOCK } from './doubled.js';
import type { ErrorKind, Sample } from './fit.js';
import { cells, effectsRank, type Groups, nestedIn } from './groups.js';

/** Fills `out` (one array of BLOCK per dimension) with a vector for each of rows from … from+size−1. */
export type RowVectors = (from: number, size: number, out: readonly Float64Array[]) => void;

/** Orthonormal rows q = x R⁻¹ of `columns`; `inverse` is m × m upper triangular, row by row, units of the columns. */
export function whitened(columns: readonly Float64Array[], inverse: Float64Array): RowVectors {
  const m = columns.length;
  return (from, size, out) => {
    for (let c = 0; c < m; c++) {
      const q = out[c];
      q.fill(0, 0, size);
      for (let j = 0; j <= c; j++) {
        const w = inverse[j * m + c];
        if (w === 0) continue;
        const x = columns[j];
        for (let r = 0; r < size; r++) q[r] += w * x[from + r];
      }
    }
  };
}

/** T q for a k × m matrix T, row by row. */
export function transformed(source: RowVectors, m: number, T: Float64Array): RowVectors {
  const k = T.length / m;
  const q = buffers(m);
  return (from, size, out) => {
    source(from, size, q);
    for (let a = 0; a < k; a++) {
      const target = out[a];
      target.fill(0, 0, size);
      for (let c = 0; c < m; c++) {
        const w = T[a * m + c];
        if (w === 0) continue;
        const x = q[c];
        for (let r = 0; r < size; r++) target[r] += w * x[r];
      }
    }
  };
}

/** Each vector multiplied by a number of its row. */
export function times(source: RowVectors, dimension: number, factor: Float64Array): RowVectors {
  return (from, size, out) => {
    source(from, size, out);
    for (let c = 0; c < dimension; c++) {
      const x = out[c];
      for (let r = 0; r < size; r++) x[r] *= factor[from + r];
    }
  };
}

export function buffers(dimension: number): Float64Array[] {
  return Array.from({ length: dimension }, () => new Float64Array(BLOCK));
}

/** Σ_g S_g S_g' with S_g the sum of the vectors over group g (every row its own group without `groups`); D × D. */
export function meat(n: number, dimension: number, vectors: RowVectors, groups?: Groups): Float64Array {
  const out = new Float64Array(dimension * dimension);
  const block = buffers(dimension);
  if (!groups) {
    for (let from = 0; from < n; from += BLOCK) {
      const size = Math.min(BLOCK, n - from);
      vectors(from, size, block);
      for (let a = 0; a < dimension; a++) {
        for (let b = a; b < dimension; b++) {
          const x = block[a];
          const y = block[b];
          let sum = 0;
          for (let r = 0; r < size; r++) sum += x[r] * y[r];
          out[a * dimension + b] += sum;
        }
      }
    }
  } else {
    const sums = new Float64Array(groups.count * dimension);
    const { codes } = groups;
    for (let from = 0; from < n; from += BLOCK) {
      const size = Math.min(BLOCK, n - from);
      vectors(from, size, block);
      for (let a = 0; a < dimension; a++) {
        const x = block[a];
        for (let r = 0; r < size; r++) sums[codes[from + r] * dimension + a] += x[r];
      }
    }
    for (let at = 0; at < sums.length; at += dimension) {
      for (let a = 0; a < dimension; a++) {
        for (let b = a; b < dimension; b++) out[a * dimension + b] += sums[at + a] * sums[at + b];
      }
    }
  }
  for (let a = 0; a < dimension; a++) for (let b = 0; b < a; b++) out[a * dimension + b] = out[b * dimension + a];
  return out;
}

/** Degrees of freedom and small-sample factors of a sample with `k` coefficients. */
export interface Counting {
  readonly n: number;
  /** Rank of the absorbed effects. */
  readonly absorbed: number;
  /** Of those, the rank that clustered errors count: effects nested in a cluster left out. */
  readonly absorbedForClusters: number;
  /** Smallest number of clusters, Infinity without. */
  readonly clusters: number;
}

export function counting(sample: Sample): Counting {
  const { effects, clusters, errors } = sample;
  const absorbed = effectsRank(effects);
  const clustered = errors === 'clustered';
  const free = clustered ? effects.filter((effect) => !clusters.some((cluster) => nestedIn(effect, cluster))) : effects;
  return {
    n: sample.outcome.values.length,
    absorbed,
    absorbedForClusters: free.length === effects.length ? absorbed : effectsRank(free),
    clusters: clustered ? Math.min(...clusters.map((cluster) => cluster.count)) : Infinity,
  };
}

/** The factor on a meat of `k` estimated coefficients. */
export function smallSample(kind: ErrorKind, count: Counting, k: number): number {
  const { n } = count;
  if (kind === 'robust') return n / (n - k - count.absorbed);
  if (kind === 'clustered') {
    const G = count.clusters;
    return (G / (G - 1)) * ((n - 1) / (n - k - count.absorbedForClusters));
  }
  return 1;
}

/**
 * Meat of vectors under the sample's kind of errors, small-sample factor included (not for classical errors).
 * HC3 weights, if any, are already in the vectors.
 */
export function correctedMeat(
  sample: Sample,
  count: Counting,
  k: number,
  dimension: number,
  vectors: RowVectors,
  factor = smallSample(sample.errors, count, k),
): Float64Array {
  const { n } = count;
  if (sample.errors !== 'clustered') return scaled(meat(n, dimension, vectors), factor);
  const [first, second] = sample.clusters;
  const out = meat(n, dimension, vectors, first);
  if (second) {
    const other = meat(n, dimension, vectors, second);
    const both = meat(n, dimension, vectors, cells(first, second));
    for (let i = 0; i < out.length; i++) out[i] += other[i] - both[i];
  }
  return scaled(out, factor);
}

function scaled(m: Float64Array, factor: number): Float64Array {
  for (let i = 0; i < m.length; i++) m[i] *= factor;
  return m;
}

/** A M A' for k × k matrices, row by row. */
export function sandwiched(A: Float64Array, M: Float64Array, k: number): Float64Array {
  const half = new Float64Array(k * k);
  const out = new Float64Array(k * k);
  for (let i = 0; i < k; i++) {
    for (let j = 0; j < k; j++) {
      let sum = 0;
      for (let l = 0; l < k; l++) sum += A[i * k + l] * M[l * k + j];
      half[i * k + j] = sum;
    }
  }
  for (let i = 0; i < k; i++) {
    for (let j = i; j < k; j++) {
      let sum = 0;
      for (let l = 0; l < k; l++) sum += half[i * k + l] * A[j * k + l];
      out[i * k + j] = sum;
      out[j * k + i] = sum;
    }
  }
  return out;
}

/** s² R⁻¹R⁻ᵀ. */
export function classical(inverse: Float64Array, k: number, variance: number): Float64Array {
  const identity = new Float64Array(k * k);
  for (let i = 0; i < k; i++) identity[i * k + i] = variance;
  return sandwiched(inverse, identity, k);
}

/**
 * Sets negative eigenvalues of a covariance to zero, in place.
 * @returns how many there were, rounding (1e−12 of the largest) not counted unless a variance is negative
 */
export function withoutNegativeEigenvalues(V: Float64Array, k: number): number {
  const matrix = new Matrix(Array.from({ length: k }, (_, i) => Array.from(V.subarray(i * k, (i + 1) * k))));
  const { realEigenvalues, eigenvectorMatrix } = new EigenvalueDecomposition(matrix, { assumeSymmetric: true });
  const largest = Math.max(...realEigenvalues);
  let negativeVariance = false;
  for (let i = 0; i < k; i++) if (V[i * k + i] < 0) negativeVariance = true;
  const below = negativeVariance ? 0 : -1e-12 * largest;
  const negative = realEigenvalues.filter((value) => value < below).length;
  if (negative === 0) return 0;
  for (let i = 0; i < k; i++) {
    for (let j = 0; j < k; j++) {
      let sum = 0;
      for (let l = 0; l < k; l++) {
        if (realEigenvalues[l] > 0)
          sum += realEigenvalues[l] * eigenvectorMatrix.get(i, l) * eigenvectorMatrix.get(j, l);
      }
      V[i * k + j] = sum;
    }
  }
  return negative;
}

/**
 * Weights 1/(1−h) of HC3 times the residuals, h the leverage of the row: |q|² plus what its absorbed effect takes.
 *
 * @param leverageWeights - [all 1] factor on |q|² (the logit's p(1−p))
 * @returns the weighted residuals and how many rows were fitted exactly (their score is zero whatever the weight)
 */
export function hc3Residuals(
  n: number,
  dimension: number,
  q: RowVectors,
  residual: Float64Array,
  effects: readonly Groups[],
  leverageWeights?: Float64Array,
): { weighted: Float64Array; exact: number } {
  const weighted = new Float64Array(n);
  const block = buffers(dimension);
  const size = effects.map((effect) => {
    const out = new Float64Array(effect.count);
    for (let i = 0; i < n; i++) out[effect.codes[i]]++;
    return out;
  });
  let exact = 0;
  for (let from = 0; from < n; from += BLOCK) {
    const rows = Math.min(BLOCK, n - from);
    q(from, rows, block);
    for (let r = 0; r < rows; r++) {
      let h = 0;
      for (let c = 0; c < dimension; c++) h += block[c][r] * block[c][r];
      if (leverageWeights) h *= leverageWeights[from + r];
      for (let e = 0; e < effects.length; e++) h += 1 / size[e][effects[e].codes[from + r]];
      if (h > 1 - 1e-10) exact++;
      else weighted[from + r] = residual[from + r] / (1 - h);
    }
  }
  return { weighted, exact };
}
