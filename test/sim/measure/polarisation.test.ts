import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { dip, dipPValue, dipTest } from '../../../sim/measure/dip.js';
import { duclosEstebanRay } from '../../../sim/measure/duclos-esteban-ray.js';
import { estebanRay, estebanRayOfClasses, wealthClasses } from '../../../sim/measure/esteban-ray.js';
import { densityAtPoints } from '../../../sim/measure/gauss-sum.js';
import { gini } from '../../../sim/measure/gini.js';
import { densityModes, gridDensity, silvermanBandwidth } from '../../../sim/measure/modes.js';
import { sampleOf } from '../../../sim/measure/sample.js';
import { normalQuantile } from '../../../sim/random/normal.js';
import { stream } from '../../../sim/random/stream.js';

const wealth = fc.array(fc.double({ min: 0.1, max: 1000, noNaN: true }), { minLength: 3, maxLength: 120 });

/** Even quantiles of a normal: a sample without luck. */
const normal = (n: number, mean = 0, sd = 1): number[] =>
  Array.from({ length: n }, (_, i) => mean + sd * normalQuantile((i + 0.5) / n));

describe('Esteban–Ray', () => {
  test('alpha 0 is twice the Gini times the mean', () => {
    fc.assert(
      fc.property(wealth, (x) => {
        const mean = x.reduce((s, v) => s + v, 0) / x.length;
        const value = estebanRay(new Float64Array(x.length).fill(1 / x.length), x, 0);
        expect(Math.abs(value - 2 * gini(x) * mean)).toBeLessThan(1e-9 * mean);
      }),
    );
  });

  test('is largest for two equal camps at the ends, and identification is what separates it from inequality', () => {
    const camps = estebanRay([0.5, 0, 0.5], [0, 1, 2], 1.3);
    fc.assert(
      fc.property(fc.double({ min: 0, max: 1, noNaN: true }), fc.double({ min: 0, max: 1, noNaN: true }), (a, b) => {
        const p = [a * b, a * (1 - b), 1 - a];
        expect(estebanRay(p, [0, 1, 2], 1.3)).toBeLessThanOrEqual(camps + 1e-12);
      }),
    );
    // joining two neighbouring small groups at their mean: less unequal, more polarised (axiom 1) where α is large
    const apart = estebanRay([0.5, 0.25, 0.25], [0, 10, 12], 1.5);
    const joined = estebanRay([0.5, 0.5], [0, 11], 1.5);
    expect(joined).toBeGreaterThan(apart);
    expect(estebanRay([0.5, 0.5], [0, 11], 0)).toBeLessThan(estebanRay([0.5, 0.25, 0.25], [0, 10, 12], 0));
  });

  test('classes are cut where each cut is the mean of the two classes it parts', () => {
    fc.assert(
      fc.property(wealth, (x) => {
        const { shares, means, cuts } = wealthClasses(x, 3);
        expect(shares.reduce((s, v) => s + v, 0)).toBeCloseTo(1, 12);
        const overall = shares.reduce((s, p, c) => s + p * means[c], 0);
        expect(overall).toBeCloseTo(x.reduce((s, v) => s + v, 0) / x.length, 8);
        for (let c = 0; c < cuts.length; c++) {
          const both = (shares[c] * means[c] + shares[c + 1] * means[c + 1]) / (shares[c] + shares[c + 1]);
          // nobody lies between the mean of both and the cut on the wrong side
          for (const v of x) {
            if (v < cuts[c]) expect(v).toBeLessThanOrEqual(both * (1 + 1e-12));
            else expect(v).toBeGreaterThanOrEqual(both * (1 - 1e-12));
          }
        }
      }),
    );
  });

  test('classes find camps, and the index has no unit', () => {
    const camps = [1, 1, 1, 5, 5, 5, 20, 20];
    expect(Array.from(wealthClasses(camps, 3).means)).toEqual([1, 5, 20]);
    expect(estebanRayOfClasses(camps, 0.5)).toBeCloseTo(
      estebanRayOfClasses(
        camps.map((v) => 7 * v),
        0.5,
      ),
      12,
    );
    expect(wealthClasses([4, 4, 4], 3).shares.length).toBe(1);
    expect(estebanRayOfClasses([4, 4, 4], 0.5)).toBe(0);
  });
});

describe('Duclos–Esteban–Ray', () => {
  test('the density at the points is the direct sum of Gaussians, heavy tails included', () => {
    fc.assert(
      fc.property(
        fc.array(fc.double({ min: -3, max: 12, noNaN: true }), { minLength: 1, maxLength: 150 }),
        fc.double({ min: 0.01, max: 5, noNaN: true }),
        (logs, h) => {
          const { value } = sampleOf(logs.map((v) => Math.exp(v)));
          const direct = value.map((x) => {
            let sum = 0;
            for (const y of value) sum += Math.exp(-0.5 * ((x - y) / h) ** 2);
            return sum / (value.length * h * Math.sqrt(2 * Math.PI));
          });
          const peak = 1 / (h * Math.sqrt(2 * Math.PI));
          densityAtPoints(value, null, h).forEach((f, i) => {
            // the stated error
            expect(Math.abs(f - direct[i])).toBeLessThan(1e-9 * peak);
          });
        },
      ),
      { numRuns: 60 },
    );
  });

  test('has no unit, does not change with replication at a fixed bandwidth, and is 0 at equality', () => {
    const x = normal(300).map((z) => Math.exp(0.6 * z));
    const value = duclosEstebanRay(x, 0.5);
    expect(
      duclosEstebanRay(
        x.map((v) => 1000 * v),
        0.5,
      ),
    ).toBeCloseTo(value, 10);
    const fixed = duclosEstebanRay(x, 0.5, { bandwidth: 0.2 });
    expect(duclosEstebanRay([...x, ...x], 0.5, { bandwidth: 0.2 })).toBeCloseTo(fixed, 10);
    expect(duclosEstebanRay(x, 0.5, { bandwidth: 0.2, weights: x.map(() => 3) })).toBeCloseTo(fixed, 10);
    expect(duclosEstebanRay([2, 2, 2], 0.5)).toBe(0);
    expect(duclosEstebanRay(x, 0, { bandwidth: 0.2 })).toBeCloseTo(2 * gini(x), 10);
  });

  test('two camps are more polarised than one heap of the same spread', () => {
    const camps = [...normal(500, 10, 0.5), ...normal(500, 30, 0.5)];
    const sd = Math.sqrt(camps.reduce((s, v) => s + (v - 20) ** 2, 0) / 1000);
    const heap = normal(1000, 20, sd).filter((v) => v > 0);
    expect(duclosEstebanRay(camps, 0.5)).toBeGreaterThan(1.2 * duclosEstebanRay(heap, 0.5));
  });
});

describe('dip', () => {
  test('is at least 1/(2n) and at most ¼, and knows no unit, origin or direction', () => {
    // whole numbers, so that no change of unit makes different ones equal by rounding
    const whole = fc.array(fc.integer({ min: 1, max: 300 }), { minLength: 3, maxLength: 120 });
    fc.assert(
      fc.property(whole, (x) => {
        const { dip: d, n } = dip(x);
        expect(d).toBeGreaterThanOrEqual(1 / (2 * n) - 1e-15);
        expect(d).toBeLessThanOrEqual(0.25 + 1e-12);
        // slopes of other numbers round elsewhere
        expect(dip(x.map((v) => 4 * v + 8)).dip).toBeCloseTo(d, 9);
        expect(dip(x.map((v) => -v)).dip).toBeCloseTo(d, 9);
      }),
    );
  });

  test('two far lumps reach ¼, a triangle of steps its exact value', () => {
    expect(dip([0, 0, 0, 0, 1, 1, 1, 1]).dip).toBeCloseTo(0.25, 12);
    expect(dip([3, 3, 3]).dip).toBeCloseTo(1 / 6, 12);
    expect(dip([]).dip).toBeNaN();
  });

  test('p-values of uniform samples are spread evenly', () => {
    let low = 0;
    const draws = 400;
    for (let r = 0; r < draws; r++) {
      const draw = stream('dip', r, 'test');
      if (dipTest(Float64Array.from({ length: 60 }, () => draw())).p <= 0.1) low++;
    }
    // 99.9 % binomial interval around 40 of 400
    expect(low).toBeGreaterThan(20);
    expect(low).toBeLessThan(62);
  });

  test('p falls with the dip, and tiny samples prove nothing', () => {
    let before = 1;
    for (let d = 0.005; d < 0.06; d += 0.001) {
      const p = dipPValue(d, 1234);
      expect(p).toBeLessThanOrEqual(before);
      before = p;
    }
    expect(before).toBe(0);
    expect(dipPValue(0.2, 3)).toBe(1);
    expect(dipPValue(0.001, 1_000_000)).toBeGreaterThan(0);
  });
});

describe('modes', () => {
  test('one heap has one mode where it is highest, whatever its tail', () => {
    const one = densityModes(normal(2000, 5, 0.7));
    expect(one.length).toBe(1);
    expect(one[0].at).toBeCloseTo(5, 1);
    for (let r = 0; r < 30; r++) {
      const draw = stream('modes', r, 'test');
      expect(densityModes(Array.from({ length: 1500 }, () => normalQuantile(draw()))).length).toBe(1);
    }
  });

  test('separate heaps are counted, points as well as hills', () => {
    expect(densityModes([...normal(700, 0, 0.3), ...normal(300, 4, 0.3)]).length).toBe(2);
    const points = [...Array<number>(500).fill(1), ...Array<number>(300).fill(2), ...Array<number>(200).fill(3.5)];
    expect(densityModes(points).map((m) => Math.round(10 * m.at) / 10)).toEqual([1, 2, 3.5]);
    expect(densityModes([7, 7, 7]).length).toBe(1);
    expect(densityModes([])).toEqual([]);
  });

  test('the density on the grid integrates to 1 and is the kernel sum up to its stated error', () => {
    const x = normal(400);
    const h = silvermanBandwidth(x);
    // 0.9 · IQR/1.34 · n^(−1/5), the quartiles of a normal being ±0.6745
    expect(h).toBeCloseTo((0.9 * (2 * 0.6745)) / 1.34 / 400 ** 0.2, 2);
    const { origin, step, density } = gridDensity(x, h);
    expect(density.reduce((s, f) => s + f, 0) * step).toBeCloseTo(1, 6);
    const peak = Math.max(...density);
    for (let k = 0; k < density.length; k += 10) {
      const at = origin + k * step;
      const direct =
        x.reduce((s, v) => s + Math.exp(-0.5 * ((at - v) / h) ** 2), 0) / (400 * h * Math.sqrt(2 * Math.PI));
      // binning widens the kernel's variance by 0.3 %; the cut-off at four bandwidths drops 0.03 % of a point's peak
      expect(Math.abs(density[k] - direct)).toBeLessThan(3e-3 * peak);
    }
  });
});
