import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { exp, log, pow } from '../../network/elementary.js';

const BITS = 200n;
const ONE = 1n << BITS;

/** A double as a fixed-point integer, exact for |x| in 2^−140 … 2^1000. */
function fixed(x: number): bigint {
  let scale = 0n;
  let v = x;
  while (!Number.isInteger(v)) {
    v *= 2;
    scale++;
  }
  return (BigInt(v) << BITS) >> scale;
}

/** e^x in fixed point: halve the argument until small, sum the series, square back. */
function expFixed(x: bigint): bigint {
  const halvings = 24n;
  const small = x >> halvings;
  let term = ONE;
  let sum = 0n;
  for (let m = 1n; term !== 0n && term !== -1n; m++) {
    sum += term;
    term = ((term * small) >> BITS) / m;
  }
  for (let h = 0n; h < halvings; h++) sum = (sum * sum) >> BITS;
  return sum;
}

/** ln x in fixed point by Newton on e^y = x from the platform's logarithm. */
function logFixed(x: number): bigint {
  let y = fixed(Math.log(x));
  for (let step = 0; step < 3; step++) {
    const e = expFixed(y);
    y += (2n * (fixed(x) - e) * ONE) / (fixed(x) + e);
  }
  return y;
}

/** Error in units in the last place of `exact`. */
function ulps(value: number, exact: bigint): number {
  const rounded = Math.abs(Number(exact) / 2 ** 200);
  const unit = 2 ** (Math.floor(Math.log2(rounded)) - 52);
  return Number(fixed(value) - exact) / 2 ** 200 / unit;
}

describe('against 200-bit fixed point', () => {
  test('log is within 0.51 units in the last place', () => {
    fc.assert(
      fc.property(
        fc.oneof(
          fc.double({ min: 1e-12, max: 1e12, noNaN: true }),
          fc.double({ min: 0.9, max: 1.1, noNaN: true }),
          fc.double({ min: 1, max: 2, noNaN: true }),
          fc.double({ min: 0.996, max: 1.004, noNaN: true }),
          fc.integer({ min: 0, max: 256 }).map((cell) => 1 + (cell + 0.5) / 256),
        ),
        (x) => {
          if (x === 1) return;
          expect(Math.abs(ulps(log(x), logFixed(x)))).toBeLessThan(0.51);
        },
      ),
      { numRuns: 1500, seed: 1 },
    );
  });

  test('exp is within 0.51 units in the last place', () => {
    fc.assert(
      fc.property(
        fc.oneof(fc.double({ min: -60, max: 60, noNaN: true }), fc.double({ min: -1, max: 1, noNaN: true })),
        (x) => {
          expect(Math.abs(ulps(exp(x), expFixed(fixed(x))))).toBeLessThan(0.51);
        },
      ),
      { numRuns: 1500, seed: 2 },
    );
  });

  test('pow is within its stated bound', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 1e-4, max: 1e4, noNaN: true }),
        fc.double({ min: -3, max: 3, noNaN: true }),
        (x, y) => {
          if (x === 1 || Math.abs(y) < 1e-3) return;
          const exact = expFixed((fixed(y) * logFixed(x)) >> BITS);
          // half a unit each from log and from the product, doubled where the mantissa of the result is near 2
          const bound = 0.6 + 2.1 * Math.abs(y * Math.log(x));
          expect(Math.abs(ulps(pow(x, y), exact))).toBeLessThan(bound);
        },
      ),
      { numRuns: 800, seed: 3 },
    );
  });
});

describe('against the platform over the whole range', () => {
  // V8's exp and log are themselves within a unit in the last place
  test('exp', () => {
    // below the normal range the result is rounded twice
    for (let x = -745; x < 709.78; x += 0.173) {
      const platform = Math.exp(x);
      expect(Math.abs(exp(x) - platform)).toBeLessThanOrEqual(Math.max(2.3e-16 * platform, 1e-323));
    }
  });
  test('log', () => {
    for (let x = 5e-324; x < 1.7e308; x *= 1.37 + 1e-3) {
      expect(Math.abs(log(x) - Math.log(x))).toBeLessThanOrEqual(2.3e-16 * Math.abs(Math.log(x)));
      if (x < 1e-322) x *= 8;
    }
  });
});

test('edges', () => {
  expect([log(0), log(-1), log(Infinity), log(1)]).toEqual([-Infinity, NaN, Infinity, 0]);
  expect(log(NaN)).toBeNaN();
  expect([exp(-Infinity), exp(Infinity), exp(0), exp(-746), exp(710)]).toEqual([0, Infinity, 1, 0, Infinity]);
  expect(exp(NaN)).toBeNaN();
  expect([pow(5, 0), pow(5, 1), pow(0, 2), pow(0, -2), pow(1, 77), pow(Infinity, -1)]).toEqual([
    1,
    5,
    0,
    Infinity,
    1,
    0,
  ]);
  expect(pow(-2, 3)).toBeNaN();
});

test('exp and log undo each other and keep order', () => {
  fc.assert(
    fc.property(fc.double({ min: -700, max: 700, noNaN: true }), (x) => {
      // log divides the relative error of exp by |x|; absolute error below one unit of 1 plus that of x
      expect(Math.abs(log(exp(x)) - x)).toBeLessThanOrEqual(2.3e-16 * (1 + Math.abs(x)));
      expect(exp(x + 1e-9 * Math.abs(x) + 1e-12)).toBeGreaterThan(exp(x));
    }),
    { seed: 4 },
  );
});
