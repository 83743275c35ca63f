import { describe, expect, test } from 'vitest';
import { meanOverReplicates, pairedContrast, replicatesNeeded } from '../../../sim/measure/contrast.js';

describe('paired contrast', () => {
  // Student's sleep data (Student 1908, Biometrika 6; values from memory): extra hours under two drugs, ten patients
  const first = [0.7, -1.6, -0.2, -1.2, -0.1, 3.4, 3.7, 0.8, 0.0, 2.0];
  const second = [1.9, 0.8, 1.1, 0.1, -0.1, 4.4, 5.5, 1.6, 4.6, 3.4];

  test('reproduces the paired t test of the sleep data', () => {
    const c = pairedContrast(second, first);
    // published: mean difference 1.58, t = 4.0621 with 9 degrees of freedom, p = 0.002833, interval 0.7001 to 2.4599
    expect(c.difference).toBeCloseTo(1.58, 12);
    expect(c.difference / c.mcSe).toBeCloseTo(4.0621, 4);
    expect(c.pValue).toBeCloseTo(0.002833, 6);
    expect(c.ciLow).toBeCloseTo(0.7001142, 6);
    expect(c.ciHigh).toBeCloseTo(2.4598858, 6);
    expect(c.replicates).toBe(10);
    // variance of the differences 1.5129, of the arms 3.2006 and 4.0090
    expect(c.varianceRatio).toBeCloseTo(1.5128889 / (3.2005556 + 4.009), 6);
  });

  test('leaves out pairs with a missing value, and says so in the count', () => {
    const c = pairedContrast([1, NaN, 3], [0, 1, NaN]);
    expect(c.replicates).toBe(1);
    expect(c.difference).toBe(1);
    expect([c.mcSe, c.ciLow, c.pValue]).toEqual([NaN, NaN, NaN]);
  });

  test('differences without spread leave nothing to chance', () => {
    expect(pairedContrast([2, 3], [1, 2])).toMatchObject({ difference: 1, mcSe: 0, ciLow: 1, ciHigh: 1, pValue: 0 });
    expect(pairedContrast([2, 3], [2, 3]).pValue).toBe(1);
  });

  test('replicates needed: the precision reached needs no more, half of it about four times as many', () => {
    const c = pairedContrast(second, first);
    const reached = c.ciHigh - c.difference;
    expect(replicatesNeeded(c, reached * (1 + 1e-12))).toBe(10);
    const four = replicatesNeeded(c, reached / 2);
    // fewer than 40, as the t quantile falls with the degrees of freedom
    expect(four).toBeGreaterThan(30);
    expect(four).toBeLessThan(40);
  });

  test('means over replicates carry their error', () => {
    expect(meanOverReplicates([1, 3, NaN])).toEqual({ mean: 2, mcSe: 1, replicates: 2 });
  });
});
