/**
 * The triangular factor of a least-squares problem, with collinear columns dropped.
 *
 * Cholesky of the cross-products in doubled precision, which gives the R of QR. Pivoting is limited: columns keep
 * the order in which the plan names them, and a column is dropped when what is left of it, after the columns kept
 * before it, is below 1e−9 of its length. So of two collinear columns the one named later goes, as a reader expects,
 * where full pivoting would keep whichever happens to be longer.
 */

import {
  add,
  type Doubled,
  type DoubledMatrix,
  divide,
  doubledMatrix,
  get,
  multiply,
  set,
  squareRoot,
  subtract,
  ZERO,
} from './doubled.js';

/** A column is collinear when the part the others do not explain is below this share of its length. */
export const COLLINEAR = 1e-9;

/** Partial Cholesky factor of a symmetric matrix G of order K. */
export interface Factor {
  /** Indices into G of the pivots kept, in order; m of them. */
  readonly kept: readonly number[];
  /** Indices into G of the pivots that were collinear with those before them. */
  readonly dropped: readonly number[];
  /** m × K: row p is the product of every column of G with the p-th orthonormal direction. */
  readonly rows: DoubledMatrix;
  /** K × K: G with the directions taken out (cross-products of residuals). */
  readonly rest: DoubledMatrix;
}

/**
 * @param gram - G, symmetric positive semi-definite
 * @param pivots - indices of the columns to take out, in this order
 * @param lengths - reference length² for the collinearity test, [the diagonal of G]; columns that were demeaned
 * before pass their length before, so that a column the effects explain is seen to vanish
 */
export function factor(gram: DoubledMatrix, pivots: readonly number[], lengths?: readonly number[]): Factor {
  const K = gram.rows;
  const rest = doubledMatrix(K, K);
  rest.high.set(gram.high);
  rest.low.set(gram.low);
  const rows = doubledMatrix(pivots.length, K);
  const kept: number[] = [];
  const dropped: number[] = [];
  for (const p of pivots) {
    const d = get(rest, p, p);
    const length2 = lengths ? lengths[p] : gram.high[p * K + p];
    if (!(d[0] > COLLINEAR * COLLINEAR * length2) || !(d[0] > 0)) {
      dropped.push(p);
      continue;
    }
    const m = kept.length;
    const root = squareRoot(d);
    for (let j = 0; j < K; j++) set(rows, m, j, j === p ? root : divide(get(rest, p, j), root));
    for (let i = 0; i < K; i++) {
      const ri = get(rows, m, i);
      if (ri[0] === 0) continue;
      for (let j = i; j < K; j++) {
        const v = subtract(get(rest, i, j), multiply(ri, get(rows, m, j)));
        set(rest, i, j, v);
        set(rest, j, i, v);
      }
    }
    // what is left of a pivot is rounding: exactly nothing by definition
    for (let j = 0; j < K; j++) {
      set(rest, p, j, ZERO);
      set(rest, j, p, ZERO);
    }
    kept.push(p);
  }
  // a kept pivot's later rows are zero by construction; make them so exactly
  kept.forEach((p, at) => {
    for (let m = at + 1; m < kept.length; m++) set(rows, m, p, ZERO);
  });
  return { kept, dropped, rows, rest };
}

/** Coefficients of column `target` of G on the kept pivots: solves R b = R_{·,target}. Length m, in the order of `kept`. */
export function solve(f: Factor, target: number): Doubled[] {
  const m = f.kept.length;
  const b: Doubled[] = new Array<Doubled>(m).fill(ZERO);
  for (let i = m - 1; i >= 0; i--) {
    let v = get(f.rows, i, target);
    for (let j = i + 1; j < m; j++) v = subtract(v, multiply(get(f.rows, i, f.kept[j]), b[j]));
    b[i] = divide(v, get(f.rows, i, f.kept[i]));
  }
  return b;
}

/** R⁻¹ of the kept pivots, m × m upper triangular, rounded to working precision, row by row. */
export function inverseFactor(f: Factor): Float64Array {
  const m = f.kept.length;
  const out = new Float64Array(m * m);
  for (let c = 0; c < m; c++) {
    const x: Doubled[] = new Array<Doubled>(m).fill(ZERO);
    for (let i = c; i >= 0; i--) {
      let v: Doubled = i === c ? [1, 0] : ZERO;
      for (let j = i + 1; j <= c; j++) v = subtract(v, multiply(get(f.rows, i, f.kept[j]), x[j]));
      x[i] = divide(v, get(f.rows, i, f.kept[i]));
    }
    for (let i = 0; i <= c; i++) out[i * m + c] = x[i][0];
  }
  return out;
}

/** R of the kept pivots, m × m, rounded to working precision, row by row. */
export function roundedFactor(f: Factor): Float64Array {
  const m = f.kept.length;
  const out = new Float64Array(m * m);
  for (let i = 0; i < m; i++) for (let j = i; j < m; j++) out[i * m + j] = get(f.rows, i, f.kept[j])[0];
  return out;
}

/** a'Pb for two columns of G, P the projection on the pivots in rows [from, to) of the factor. */
export function projected(f: Factor, a: number, b: number, from = 0, to = f.kept.length): Doubled {
  let sum: Doubled = ZERO;
  for (let p = from; p < to; p++) sum = add(sum, multiply(get(f.rows, p, a), get(f.rows, p, b)));
  return sum;
}
