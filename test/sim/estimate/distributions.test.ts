/**
 * Tails and quantiles against scipy 1.17.1 (scipy.stats: t, f, chi2, ncx2, norm). The critical values of the effective F
 * agree with the printed table of Montiel Olea and Pflueger 2013 for a tenth of the benchmark (23.11, 19.29, 17.67; from
 * memory).
 */
import { expect, test } from 'vitest';
import {
  chiSquareTail,
  fQuantile,
  fTail,
  noncentralChiSquareQuantile,
  twoSidedCritical,
  twoSidedP,
} from '../../../sim/estimate/distributions.js';

// both sides evaluate special functions in double precision; far tails lose a few digits in the exponent
const RTOL = 1e-10;

function near(actual: number, expected: number, rtol = RTOL): void {
  expect(Math.abs(actual - expected)).toBeLessThanOrEqual(rtol * Math.abs(expected));
}

test.each([
  [3.84, 1, 0.05004352124870519],
  [100, 3, 1.5541594313896026e-21],
  [50, 10, 2.669083424904495e-7],
  [0.3, 7, 0.9998999626177479],
  [700, 4, 3.4852862290889247e-150],
  [1e-8, 1, 0.9999202115440526],
])('χ² tail at %d with %d', (x, df, p) => near(chiSquareTail(x, df), p));

test.each([
  [300, 2, 40, 8.271806125530277e-25],
  [4, 3, 17, 0.025230226435125413],
  [0.2, 5, 9, 0.9544516850435977],
  [1e4, 1, 423, 1.8322723146559466e-296],
])('F tail at %d with %d and %d', (x, a, b, p) => near(fTail(x, a, b), p));

test.each([
  [30, 9, 2.4837047041582635e-10],
  [1.96, 39, 0.05716893993387916],
  [0.01, 3, 0.992649111412852],
  [40, 499, 8.817210478092078e-158],
  [20, Infinity, 5.507248237212311e-89],
])('two-sided t tail at %d with %d', (x, df, p) => {
  near(twoSidedP(x, df), p);
  near(twoSidedP(-x, df), p);
});

test('edges', () => {
  expect(twoSidedP(Infinity, 5)).toBe(0);
  expect(twoSidedP(NaN, 5)).toBeNaN();
  expect(fTail(-1, 2, 3)).toBe(1);
  expect(fTail(2, 1, 0)).toBeNaN();
  expect(chiSquareTail(0, 2)).toBe(1);
  near(fTail(2, 3, Infinity), chiSquareTail(6, 3));
});

test('quantiles', () => {
  near(twoSidedCritical(0.95, 39), 2.022690920036761);
  near(twoSidedCritical(0.95, Infinity), 1.959963984540054);
  near(fQuantile(0.95, 3, 39), 2.845067805279349);
  near(fQuantile(0.99, 1, 100), 6.895301030578023);
});

test.each([
  [1, 23.10851121],
  [2, 19.29434345],
  [3, 17.66865501],
  [2.5, 18.35393091],
])('critical value of the effective F with %d degrees of freedom', (df, value) => {
  // eight printed decimals
  near(noncentralChiSquareQuantile(0.95, df, 10 * df) / df, value, 1e-9);
});
