/**
 * Arithmetic in twice the working precision, and the cross-products of columns in it.
 *
 * A regression through X'X loses as many digits as κ², one through Householder QR as many as κ; in doubled
 * precision X'X carries 32 digits, so its Cholesky factor, which is the R of QR, is better than plain QR until κ
 * is about 1e16, needs no copy of the data, and one matrix serves least squares, instruments and their tests.
 *
 * Sources: Dekker 1971 (two-product, doubled operations), Knuth (two-sum), Ogita, Rump and Oishi 2005 (Dot2: a dot
 * product as if computed in doubled precision). Overflow is avoided by scaling every column with a power of two,
 * which is exact.
 */

/** high + low, |low| at most half a unit in the last place of high. */
export type Doubled = readonly [high: number, low: number];

export const ZERO: Doubled = [0, 0];

const SPLITTER = 134217729; // 2^27 + 1: halves a 53-bit significand

function twoSum(a: number, b: number): Doubled {
  const s = a + b;
  const t = s - a;
  return [s, a - (s - t) + (b - t)];
}

function twoProduct(a: number, b: number): Doubled {
  const p = a * b;
  let t = SPLITTER * a;
  const ah = t - (t - a);
  const al = a - ah;
  t = SPLITTER * b;
  const bh = t - (t - b);
  const bl = b - bh;
  return [p, ah * bh - p + ah * bl + al * bh + al * bl];
}

function quickSum(a: number, b: number): Doubled {
  const s = a + b;
  return [s, b - (s - a)];
}

export function add(a: Doubled, b: Doubled): Doubled {
  const [s, e] = twoSum(a[0], b[0]);
  const [t, f] = twoSum(a[1], b[1]);
  const [u, g] = quickSum(s, e + t);
  return quickSum(u, g + f);
}

export function negate(a: Doubled): Doubled {
  return [-a[0], -a[1]];
}

export function subtract(a: Doubled, b: Doubled): Doubled {
  return add(a, negate(b));
}

export function multiply(a: Doubled, b: Doubled): Doubled {
  const [p, e] = twoProduct(a[0], b[0]);
  return quickSum(p, e + (a[0] * b[1] + a[1] * b[0]));
}

export function divide(a: Doubled, b: Doubled): Doubled {
  const q = a[0] / b[0];
  const r = subtract(a, multiply([q, 0], b));
  const q2 = r[0] / b[0];
  const r2 = subtract(r, multiply([q2, 0], b));
  return add(quickSum(q, q2), [r2[0] / b[0], 0]);
}

/** Square root; 0 for anything not above 0. */
export function squareRoot(a: Doubled): Doubled {
  if (!(a[0] > 0)) return ZERO;
  const s = Math.sqrt(a[0]);
  const r = subtract(a, twoProduct(s, s));
  return quickSum(s, r[0] / (2 * s));
}

/** A dense matrix in doubled precision, row by row. */
export interface DoubledMatrix {
  readonly rows: number;
  readonly columns: number;
  readonly high: Float64Array;
  readonly low: Float64Array;
}

export function doubledMatrix(rows: number, columns: number): DoubledMatrix {
  return { rows, columns, high: new Float64Array(rows * columns), low: new Float64Array(rows * columns) };
}

export function get(m: DoubledMatrix, i: number, j: number): Doubled {
  const at = i * m.columns + j;
  return [m.high[at], m.low[at]];
}

export function set(m: DoubledMatrix, i: number, j: number, value: Doubled): void {
  const at = i * m.columns + j;
  m.high[at] = value[0];
  m.low[at] = value[1];
}

/** Rows handled at a time: two halves of 20 columns fit in a processor's second-level cache. */
export const BLOCK = 1024;

/** Power of two that brings the largest magnitude of a column into [1, 2); 1 for a column of zeros. */
export function powerOfTwoScale(column: Float64Array): number {
  let largest = 0;
  for (let i = 0; i < column.length; i++) {
    const a = Math.abs(column[i]);
    if (a > largest) largest = a;
  }
  if (!(largest > 0) || largest === Infinity) return 1;
  // built from the exponent bits, because Math.log2 and Math.pow may round differently between engines
  const view = new DataView(new ArrayBuffer(8));
  view.setFloat64(0, largest);
  const exponent = ((view.getUint32(0) >>> 20) & 0x7ff) - 1023;
  const target = Math.max(-1022, Math.min(1022, -exponent));
  view.setUint32(0, (target + 1023) << 20);
  view.setUint32(4, 0);
  return view.getFloat64(0);
}

/**
 * Cross-products of columns, X'WX, after scaling column j by `scale[j]`.
 *
 * @param columns - k columns of length n
 * @param scale - k powers of two, from powerOfTwoScale
 * @param weights - [all 1] n weights ≥ 0; applied as √w to each factor, so rounded once in working precision
 * @returns k × k, symmetric; relative error about n·1e−32 of the product of the two columns' lengths. Cost about
 * 15 n k²/2 operations; memory k blocks.
 */
export function crossProducts(
  columns: readonly Float64Array[],
  scale: readonly number[],
  weights?: Float64Array,
): DoubledMatrix {
  const k = columns.length;
  const n = k > 0 ? columns[0].length : 0;
  const out = doubledMatrix(k, k);
  const value = new Float64Array(k * BLOCK);
  const upper = new Float64Array(k * BLOCK);
  const root = new Float64Array(BLOCK);
  for (let from = 0; from < n; from += BLOCK) {
    const size = Math.min(BLOCK, n - from);
    if (weights) for (let r = 0; r < size; r++) root[r] = Math.sqrt(weights[from + r]);
    for (let j = 0; j < k; j++) {
      const column = columns[j];
      const s = scale[j];
      const at = j * BLOCK;
      for (let r = 0; r < size; r++) {
        const x = weights ? column[from + r] * s * root[r] : column[from + r] * s;
        const t = SPLITTER * x;
        value[at + r] = x;
        upper[at + r] = t - (t - x);
      }
    }
    for (let a = 0; a < k; a++) {
      for (let b = a; b < k; b++) {
        const where = a * k + b;
        let sum = out.high[where];
        let rest = out.low[where];
        let p = a * BLOCK;
        let q = b * BLOCK;
        const end = p + size;
        for (; p < end; p++, q++) {
          const x = value[p];
          const xh = upper[p];
          const xl = x - xh;
          const y = value[q];
          const yh = upper[q];
          const yl = y - yh;
          const product = x * y;
          const error = xh * yh - product + xh * yl + xl * yh + xl * yl;
          const s = sum + product;
          const t = s - sum;
          rest += sum - (s - t) + (product - t) + error;
          sum = s;
        }
        out.high[where] = sum;
        out.low[where] = rest;
      }
    }
  }
  for (let a = 0; a < k; a++) {
    for (let b = a; b < k; b++) {
      const tidy = quickSum(out.high[a * k + b], out.low[a * k + b]);
      set(out, a, b, tidy);
      set(out, b, a, tidy);
    }
  }
  return out;
}

/**
 * Residuals y − Xb, each as if computed in doubled precision and then rounded.
 *
 * @param outcome - y, length n
 * @param columns - k columns of length n
 * @param coefficients - k coefficients
 * @param out - overwritten, length n; may be `outcome` itself
 */
export function residuals(
  outcome: Float64Array,
  columns: readonly Float64Array[],
  coefficients: readonly Doubled[],
  out: Float64Array,
): Float64Array {
  const n = outcome.length;
  const k = columns.length;
  const high = new Float64Array(BLOCK);
  const low = new Float64Array(BLOCK);
  for (let from = 0; from < n; from += BLOCK) {
    const size = Math.min(BLOCK, n - from);
    for (let r = 0; r < size; r++) {
      high[r] = outcome[from + r];
      low[r] = 0;
    }
    for (let j = 0; j < k; j++) {
      const column = columns[j];
      const b = -coefficients[j][0];
      const rest = -coefficients[j][1];
      let t = SPLITTER * b;
      const bh = t - (t - b);
      const bl = b - bh;
      for (let r = 0; r < size; r++) {
        const x = column[from + r];
        t = SPLITTER * x;
        const xh = t - (t - x);
        const xl = x - xh;
        const product = x * b;
        const error = xh * bh - product + xh * bl + xl * bh + xl * bl;
        const s = high[r] + product;
        t = s - high[r];
        low[r] += high[r] - (s - t) + (product - t) + error + x * rest;
        high[r] = s;
      }
    }
    for (let r = 0; r < size; r++) out[from + r] = high[r] + low[r];
  }
  return out;
}
