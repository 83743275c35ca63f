import normal from '@stdlib/stats-base-dists-normal';
import { expect, test } from 'vitest';
import { normalCdf, normalDensity, normalQuantile } from '../../../sim/random/normal.js';

/** Φ(x) for 0 ≤ x ≤ 6 from the alternating-free series φ(x)·Σ x^(2m+1)/(1·3·…·(2m+1)) in 80-digit integers. */
function cdfBySeries(x: number): number {
  const one = 10n ** 80n;
  const fixed = (v: number): bigint => (BigInt(Math.round(v * 2 ** 40)) * one) >> 40n;
  const t = fixed(x);
  let term = t;
  let sum = 0n;
  for (let m = 1n; term > 0n; m += 2n) {
    sum += term;
    term = (((term * t) / one) * t) / one / (m + 2n);
  }
  // e^(−x²/2)/√(2π)
  let e = one;
  let expSum = 0n;
  const half = (t * t) / one / 2n;
  for (let m = 1n; e > 0n; m++) {
    expSum += e;
    e = (e * half) / one / m;
  }
  const root2pi = 250662827463100050241576528481104525300698674060993n * 10n ** 30n;
  const density = (one * one) / expSum;
  const above = one / 2n - (((sum * density) / one) * one) / root2pi;
  return Number(above) / 1e80;
}

test('the upper tail agrees with an exact series to 1e−15', () => {
  for (let m = 0; m <= 24; m++) {
    const x = m / 4;
    const exact = cdfBySeries(x);
    // Cody states 1e−18 for his coefficients; what is left is the rounding of exp and of the argument: a few 1e−16
    expect(Math.abs(normalCdf(-x) / exact - 1)).toBeLessThan(2e-15 + x * x * 1.2e-16);
    expect(Math.abs(normalCdf(x) - (1 - exact))).toBeLessThan(3e-16);
  }
});

test('distribution, density and quantile agree with a statistics library', () => {
  for (let x = -37; x <= 8; x += 0.0917) {
    // a few 1e−15 in the bulk; in the tail each of two roundings of the argument, on both sides, costs x²·1.1e−16
    const tolerance = 4e-15 + x * x * 4.5e-16;
    expect(Math.abs(normalCdf(x) / normal.cdf(x, 0, 1) - 1)).toBeLessThan(tolerance);
    expect(Math.abs(normalDensity(x) / normal.pdf(x, 0, 1) - 1)).toBeLessThan(tolerance);
  }
  for (let m = 1; m < 400; m++) {
    const u = m / 400;
    // AS 241 states about one part in 1e16; the library states 1e−13
    const x = normal.quantile(u, 0, 1);
    expect(Math.abs(normalQuantile(u) - x)).toBeLessThanOrEqual(1e-13 * Math.abs(x) + 1e-16);
  }
});

// scipy 1.17.1, stats.norm.ppf; the library above is off by a percent out here
test.each([
  [1e-300, -37.0470962993612],
  [1e-100, -21.273453560965322],
  [1e-50, -14.933337534788487],
  [1e-20, -9.262340089798409],
  [1e-16, -8.222082216130435],
  [1e-12, -7.034483825301131],
  [1e-8, -5.612001244174789],
])('quantile of %d', (u, x) => {
  // AS 241 states about one part in 1e16
  expect(Math.abs(normalQuantile(u) / x - 1)).toBeLessThan(1e-15);
});

test('quantile inverts the distribution function and is odd about one half', () => {
  for (let m = 1; m < 1000; m++) {
    const u = m / 1000;
    // Φ is no steeper than 0.4, so errors of x carry over at most 0.4-fold: a few rounding units
    expect(Math.abs(normalCdf(normalQuantile(u)) - u)).toBeLessThan(5e-16);
    if (m < 500) expect(Math.abs(normalQuantile(u) + normalQuantile(1 - u))).toBeLessThan(1e-14);
  }
});
