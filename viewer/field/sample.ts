/**
 * A fixed order of a list in which any first part is a fair sample, so that fewer marks or ties still say the same.
 *
 * The order steps through the list by a constant near its golden section, modulo its length (Weyl's sequence, as in
 * additive quasi-random sampling): a first part lies evenly over the list, and the same part returns every time.
 */

/** A step near the golden section of m that shares no factor with it. */
export function fairStep(m: number): number {
  let step = Math.max(1, Math.round(m * 0.6180339887498949));
  const gcd = (a: number, b: number): number => (b === 0 ? a : gcd(b, a % b));
  while (gcd(step, m) !== 1) step++;
  return step;
}
