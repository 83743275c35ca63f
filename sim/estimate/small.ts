/** Quadratic forms of small symmetric matrices, without allocating a matrix object each time. */

/** x'A⁻¹x for a positive definite A (row by row); NaN when it is not. Cost O(d³). */
export function quadraticForm(A: Float64Array, x: readonly number[]): number {
  const d = x.length;
  const L = new Float64Array(d * d);
  const w = new Float64Array(d);
  let out = 0;
  for (let i = 0; i < d; i++) {
    for (let j = 0; j <= i; j++) {
      let sum = A[i * d + j];
      for (let l = 0; l < j; l++) sum -= L[i * d + l] * L[j * d + l];
      if (i === j) {
        if (!(sum > 0)) return NaN;
        L[i * d + i] = Math.sqrt(sum);
      } else L[i * d + j] = sum / L[j * d + j];
    }
    let v = x[i];
    for (let l = 0; l < i; l++) v -= L[i * d + l] * w[l];
    w[i] = v / L[i * d + i];
    out += w[i] * w[i];
  }
  return out;
}
