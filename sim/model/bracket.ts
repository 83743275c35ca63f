/**
 * Root of a continuous function of one variable between two points of opposite sign, without derivatives.
 *
 * Chandrupatla 1997: inverse quadratic steps where they are safe, bisection elsewhere. Used where the slope of the
 * first-order condition has no cheap form; planned.ts has its own Newton.
 */

/** A function of one variable as an object, so that a caller in a loop allocates nothing. */
export interface RealFunction {
  at(x: number): number;
}

/**
 * @param f - continuous, f(low) and f(high) of opposite sign or zero
 * @param tolerance - relative to |x|
 */
export function rootBetween(
  f: RealFunction,
  low: number,
  high: number,
  atLow: number,
  atHigh: number,
  tolerance: number,
): number {
  let b = low;
  let a = high;
  let fb = atLow;
  let fa = atHigh;
  let c = a;
  let fc = fa;
  let t = 0.5;
  for (let step = 0; step < 200; step++) {
    const x = a + t * (b - a);
    const fx = f.at(x);
    if (fx > 0 === fa > 0) {
      c = a;
      fc = fa;
    } else {
      c = b;
      fc = fb;
      b = a;
      fb = fa;
    }
    a = x;
    fa = fx;
    const best = Math.abs(fa) < Math.abs(fb) ? a : b;
    if (fa === 0) return a;
    const limit = tolerance * Math.abs(best);
    const tl = limit / Math.abs(b - a);
    if (tl > 0.5) return best;
    const xi = (a - b) / (c - b);
    const phi = (fa - fb) / (fc - fb);
    if (phi * phi < xi && (1 - phi) * (1 - phi) < 1 - xi) {
      t = ((fa / (fb - fa)) * fc) / (fb - fc) + (((((c - a) / (b - a)) * fa) / (fc - fa)) * fb) / (fc - fb);
    } else {
      t = 0.5;
    }
    if (t < tl) t = tl;
    if (t > 1 - tl) t = 1 - tl;
  }
  return a;
}
