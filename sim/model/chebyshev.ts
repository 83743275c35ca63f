/**
 * Chebyshev interpolation on 16 fixed nodes, deterministic: no cosine of the engine is called.
 */

/** Nodes and coefficients of one panel. */
export const TERMS = 16;

/** cos(mπ/32), m = 0 … 63, from half-angle and addition formulas. */
const COSINE = new Float64Array(4 * TERMS);
{
  let c = 0;
  for (let step = 0; step < 4; step++) c = Math.sqrt(0.5 * (1 + c));
  const sine = Math.sqrt(1 - c * c);
  let x = 1;
  let y = 0;
  for (let m = 0; m < 4 * TERMS; m++) {
    COSINE[m] = x;
    const next = x * c - y * sine;
    y = x * sine + y * c;
    x = next;
  }
}

/** Node j = 0 … 15 on (−1, 1), ascending. */
export function chebyshevNode(j: number): number {
  return -COSINE[2 * j + 1];
}

/** Coefficients of the polynomial of degree 15 through values[j] at node j; written to out[at …]. */
export function chebyshevFit(values: Float64Array, out: Float64Array, at: number): void {
  for (let p = 0; p < TERMS; p++) {
    let sum = 0;
    // T_p(−cos θ) = (−1)^p cos(pθ)
    for (let j = 0; j < TERMS; j++) sum += values[j] * COSINE[(p * (2 * j + 1)) % (4 * TERMS)];
    out[at + p] = ((p === 0 ? 1 : 2) / TERMS) * (p % 2 === 0 ? sum : -sum);
  }
}

/** Value at u in [−1, 1] of the polynomial with coefficients[at …], by Clenshaw's recurrence. */
export function chebyshevAt(coefficients: Float64Array, at: number, u: number): number {
  let b1 = 0;
  let b2 = 0;
  for (let p = TERMS - 1; p > 0; p--) {
    const next = 2 * u * b1 - b2 + coefficients[at + p];
    b2 = b1;
    b1 = next;
  }
  return u * b1 - b2 + coefficients[at];
}
