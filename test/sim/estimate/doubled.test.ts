import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import {
  crossProducts,
  divide,
  multiply,
  powerOfTwoScale,
  residuals,
  squareRoot,
} from '../../../sim/estimate/doubled.js';
import { factor, solve } from '../../../sim/estimate/factor.js';

// whole numbers up to 2^53: their products and sums are exact in whole-number arithmetic
const whole = fc.maxSafeInteger();

describe('arithmetic in twice the precision', () => {
  test('cross-products of whole numbers are right to 30 digits, whatever cancels', () => {
    fc.assert(
      fc.property(fc.array(fc.tuple(whole, whole), { minLength: 1, maxLength: 30 }), (rows) => {
        const x = Float64Array.from(rows, (r) => r[0]);
        const y = Float64Array.from(rows, (r) => r[1]);
        const gram = crossProducts([x, y], [1, 1]);
        const exact = rows.reduce((s, [a, b]) => s + BigInt(a) * BigInt(b), 0n);
        const size = rows.reduce((s, [a, b]) => s + Math.abs(a * b), 0);
        const error = exact - BigInt(gram.high[1]) - BigInt(gram.low[1]);
        // Ogita, Rump and Oishi 2005, prop. 5.5: n² ε² of the sum of magnitudes, ε = 1.1e-16
        expect(Math.abs(Number(error))).toBeLessThanOrEqual(rows.length ** 2 * 1.3e-32 * size + 1);
      }),
    );
  });

  test('division undoes multiplication, a square its root', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 1e-100, max: 1e100, noNaN: true }),
        fc.double({ min: 1e-100, max: 1e100, noNaN: true }),
        (a, b) => {
          const back = divide(multiply([a, 0], [b, 0]), [b, 0]);
          // a few units of 2^-104
          expect(Math.abs(back[0] - a + back[1])).toBeLessThanOrEqual(4e-31 * a);
          const root = squareRoot(multiply([a, 0], [a, 0]));
          expect(Math.abs(root[0] - a + root[1])).toBeLessThanOrEqual(4e-31 * a);
        },
      ),
    );
  });

  test('a power of two brings the largest value near 1, however large or small', () => {
    fc.assert(
      fc.property(fc.double({ min: 1e-300, max: 1e300, noNaN: true }), (v) => {
        const s = powerOfTwoScale(Float64Array.of(0, -v));
        expect(v * s).toBeGreaterThanOrEqual(1);
        expect(v * s).toBeLessThan(2);
        expect(Number.isInteger(Math.log2(s))).toBe(true);
      }),
    );
    expect(powerOfTwoScale(Float64Array.of(0, 0))).toBe(1);
  });

  test('least squares on a Hilbert matrix, condition 1e13, where plain normal equations give none', () => {
    // y is the sum of the columns in whole numbers scaled exactly, so the coefficients are exactly 1
    const k = 10;
    const multiple = 232792560; // of 1 … 19
    const columns = Array.from({ length: k }, (_, j) =>
      Float64Array.from({ length: k }, (_, i) => multiple / (i + j + 1)),
    );
    const y = Float64Array.from({ length: k }, (_, i) => columns.reduce((s, x) => s + x[i], 0));
    const all = [...columns, y];
    const scale = all.map(powerOfTwoScale);
    const at = columns.map((_, j) => j);
    // lengths of zero: nothing is dropped, however collinear
    const f = factor(crossProducts(all, scale), at, new Array<number>(k + 1).fill(0));
    const b = solve(f, k).map((v, j) => [(v[0] * scale[j]) / scale[k], (v[1] * scale[j]) / scale[k]] as const);
    // κ² of the doubled unit: (1e13)² · 1e-32 at worst 1e-6; the factorisation loses far less here
    for (const [v] of b) expect(Math.abs(v - 1)).toBeLessThan(1e-6);
    const e = residuals(y, columns, b, new Float64Array(k));
    for (const v of e) expect(Math.abs(v)).toBeLessThan(1e-9 * multiple);
  });
});
