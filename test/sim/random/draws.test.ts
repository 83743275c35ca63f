import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { Draws, PURPOSES, type Purpose, seedKey } from '../../../sim/random/draws.js';

describe('a draw is a function of seed, replicate, purpose, household and generation', () => {
  test('one household alone gets the bits it gets among all, for any number of households', () => {
    const draws = new Draws('valley-1', 3);
    for (const n of [1, 2, 7, 1000]) {
      const normals = new Float64Array(n);
      const uniforms = new Float64Array(n);
      draws.normals('householdShock', 4, normals);
      draws.uniforms('householdShock', 4, uniforms);
      for (let i = 0; i < n; i++) {
        expect(normals[i]).toBe(draws.normal('householdShock', 4, i));
        expect(uniforms[i]).toBe(draws.uniform('householdShock', 4, i));
      }
    }
  });

  test('any other argument gives another draw', () => {
    const base = new Draws('a', 0).uniform('householdShock', 0, 0);
    const others = [
      new Draws('b', 0).uniform('householdShock', 0, 0),
      new Draws('a', 1).uniform('householdShock', 0, 0),
      new Draws('a', 0).uniform('placeShock', 0, 0),
      new Draws('a', 0).uniform('householdShock', 1, 0),
      new Draws('a', 0).uniform('householdShock', 0, 1),
      new Draws('a', 0).uniform('householdShock', 0, 2),
    ];
    expect(new Set([base, ...others]).size).toBe(7);
    expect(new Draws('a', 0).uniform('householdShock', 0, 0)).toBe(base);
  });

  test('purposes have distinct numbers', () => {
    expect(new Set(Object.values(PURPOSES)).size).toBe(Object.keys(PURPOSES).length);
  });
});

describe('seeds', () => {
  function bits([low, high]: readonly [number, number]): bigint {
    return (BigInt(high) << 32n) | BigInt(low);
  }
  function distance(a: string, b: string): number {
    let x = bits(seedKey(a)) ^ bits(seedKey(b));
    let count = 0;
    for (; x > 0n; x >>= 1n) count += Number(x & 1n);
    return count;
  }

  test('that differ in one character share half their key bits, no more than chance', () => {
    let sum = 0;
    let pairs = 0;
    for (let seed = 0; seed < 2000; seed++) {
      const d = distance(`study ${seed}`, `study ${seed + 1}`);
      // 64 fair bits: 10 or fewer, or 54 or more, has a chance of 3e−8 a pair
      expect(d).toBeGreaterThan(10);
      expect(d).toBeLessThan(54);
      sum += d;
      pairs++;
    }
    // standard deviation of the mean: 4/√2000
    expect(Math.abs(sum / pairs - 32)).toBeLessThan((5 * 4) / Math.sqrt(pairs));
  });

  test('each key bit flips with half of all one-character changes', () => {
    const flips = new Float64Array(64);
    const pairs = 4000;
    for (let seed = 0; seed < pairs; seed++) {
      const x = bits(seedKey(`${seed}-a`)) ^ bits(seedKey(`${seed}-b`));
      for (let bit = 0; bit < 64; bit++) flips[bit] += Number((x >> BigInt(bit)) & 1n);
    }
    for (let bit = 0; bit < 64; bit++) {
      expect(Math.abs(flips[bit] / pairs - 0.5)).toBeLessThan((5 * 0.5) / Math.sqrt(pairs));
    }
  });

  test('of any text have keys of two 32-bit words, and neighbours do not collide', () => {
    fc.assert(
      fc.property(fc.string({ unit: 'binary' }), (seed) => {
        const [low, high] = seedKey(seed);
        expect(low).toBe(low >>> 0);
        expect(high).toBe(high >>> 0);
        expect(bits(seedKey(seed))).not.toBe(bits(seedKey(`${seed} `)));
      }),
      { seed: 1 },
    );
  });
});

describe('distribution', () => {
  const n = 200_000;
  function drawn(purpose: Purpose, generation: number, kind: 'uniforms' | 'normals'): Float64Array {
    const out = new Float64Array(n);
    new Draws('distribution', 0)[kind](purpose, generation, out);
    return out;
  }

  test('normals have the moments of a standard normal', () => {
    const x = drawn('householdShock', 0, 'normals');
    const moment = (p: number): number => x.reduce((sum, v) => sum + v ** p, 0) / n;
    // five standard errors: variances of x, x², x³, x⁴ are 1, 2, 15, 96
    expect(Math.abs(moment(1))).toBeLessThan(5 * Math.sqrt(1 / n));
    expect(Math.abs(moment(2) - 1)).toBeLessThan(5 * Math.sqrt(2 / n));
    expect(Math.abs(moment(3))).toBeLessThan(5 * Math.sqrt(15 / n));
    expect(Math.abs(moment(4) - 3)).toBeLessThan(5 * Math.sqrt(96 / n));
  });

  test('uniforms fill 100 equal cells evenly and lie strictly inside (0, 1)', () => {
    const u = drawn('householdShock', 1, 'uniforms');
    const cells = new Float64Array(100);
    expect(u.every((v) => v > 0 && v < 1)).toBe(true);
    for (const v of u) cells[Math.floor(v * 100)]++;
    const chi2 = cells.reduce((sum, count) => sum + (count - n / 100) ** 2 / (n / 100), 0);
    // 99 degrees of freedom: mean 99, standard deviation 14
    expect(Math.abs(chi2 - 99)).toBeLessThan(5 * Math.sqrt(2 * 99));
  });

  test('neighbouring households, generations and purposes are uncorrelated', () => {
    const x = drawn('householdShock', 0, 'normals');
    const correlate = (y: Float64Array, lag: number): number => {
      let sum = 0;
      for (let i = 0; i + lag < n; i++) sum += x[i + lag] * y[i];
      return sum / n;
    };
    for (const r of [
      correlate(x, 1),
      correlate(x, 2),
      correlate(drawn('householdShock', 1, 'normals'), 0),
      correlate(drawn('placeShock', 0, 'normals'), 0),
    ]) {
      expect(Math.abs(r)).toBeLessThan(5 / Math.sqrt(n));
    }
  });
});
