import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import {
  atkinson,
  ratioMeasures,
  theilL,
  theilLSplit,
  theilT,
  theilTBetween,
  theilTSplit,
} from '../../../sim/measure/entropy.js';
import { gini, giniSplit } from '../../../sim/measure/gini.js';
import { lorenz, palma, quantileShares, shareBottom, shareTop } from '../../../sim/measure/lorenz.js';
import { averageRanks, orderOf, rankBins, unitRanks } from '../../../sim/measure/order.js';
import { median, p90p10, quantile } from '../../../sim/measure/quantile.js';
import { sampleOf } from '../../../sim/measure/sample.js';
import { wolfson } from '../../../sim/measure/wolfson.js';

const wealth = fc.array(fc.double({ min: 0.01, max: 1e6, noNaN: true }), { minLength: 2, maxLength: 200 });
/** Long enough for the radix sort. */
const anyNumbers = fc.array(fc.double({ noNaN: true, noDefaultInfinity: true }), { maxLength: 400 });

const relative: [string, (x: number[], w?: number[]) => number][] = [
  ['gini', (x, w) => gini(x, { weights: w })],
  ['theilT', (x, w) => theilT(x, { weights: w })],
  ['theilL', (x, w) => theilL(x, { weights: w })],
  ['atkinson ½', (x, w) => atkinson(x, 0.5, { weights: w })],
  ['atkinson 1', (x, w) => atkinson(x, 1, { weights: w })],
  ['atkinson 2', (x, w) => atkinson(x, 2, { weights: w })],
  ['atkinson 1.5', (x, w) => atkinson(x, 1.5, { weights: w })],
];

// rounding of sums of a few hundred terms, relative to measures of order 1
const ROUNDING = 1e-11;

function expectNear(a: number, b: number, tolerance = ROUNDING): void {
  expect(Math.abs(a - b), `${a} against ${b}`).toBeLessThanOrEqual(tolerance * Math.max(1, Math.abs(b)));
}

describe('order', () => {
  test('sorts like a stable comparison sort, negatives, zeros and subnormals included', () => {
    fc.assert(
      fc.property(anyNumbers, (x) => {
        const expected = x.map((_, i) => i).sort((a, b) => x[a] - x[b] || a - b);
        expect(Array.from(orderOf(x))).toEqual(expected);
      }),
    );
  });

  test('refuses numbers that are not finite', () => {
    expect(() => orderOf([1, NaN])).toThrow('value 1 is NaN');
    expect(() => gini([1, Infinity])).toThrow(RangeError);
  });

  test('ties share their average rank, and stay in one bin', () => {
    expect(Array.from(averageRanks([3, 1, 3, 2]))).toEqual([3.5, 1, 3.5, 2]);
    expect(Array.from(unitRanks([3, 1, 3, 2]))).toEqual([2.5 / 3, 0, 2.5 / 3, 1 / 3]);
    expect(Array.from(rankBins(averageRanks([1, 1, 1, 1, 2]), 5))).toEqual([2, 2, 2, 2, 4]);
    expect(Array.from(unitRanks([7]))).toEqual([0.5]);
  });
});

describe('laws of inequality', () => {
  for (const [name, measure] of relative) {
    test(`${name} ignores the unit, replication and the order of rows`, () => {
      fc.assert(
        fc.property(wealth, fc.double({ min: 1e-3, max: 1e3, noNaN: true }), (x, unit) => {
          const value = measure(x);
          expectNear(measure(x.map((v) => v * unit)), value);
          expectNear(measure([...x, ...x, ...x]), value);
          expectNear(measure([...x].reverse()), value);
          expectNear(
            measure(
              x,
              x.map(() => 3),
            ),
            value,
          );
        }),
      );
    });

    test(`${name} falls when a richer household gives to a poorer one`, () => {
      fc.assert(
        fc.property(wealth, fc.double({ min: 0.05, max: 0.45, noNaN: true }), (x, share) => {
          const low = x.indexOf(Math.min(...x));
          const high = x.indexOf(Math.max(...x));
          // apart enough that the fall exceeds rounding
          fc.pre(x[high] > 1.01 * x[low]);
          const moved = share * (x[high] - x[low]);
          const after = x.map((v, i) => (i === low ? v + moved : i === high ? v - moved : v));
          expect(measure(after)).toBeLessThan(measure(x) + 1e-13);
        }),
      );
    });

    test(`${name} is 0 at equality`, () => {
      expectNear(measure([7, 7, 7, 7]), 0, 1e-15);
    });
  }

  test('weights count as repeated rows', () => {
    fc.assert(
      fc.property(
        fc.array(fc.tuple(fc.double({ min: 0.1, max: 100, noNaN: true }), fc.nat(3)), { maxLength: 60 }),
        (rows) => {
          fc.pre(rows.some(([, w]) => w > 0));
          const x = rows.map(([v]) => v);
          const w = rows.map(([, k]) => k);
          const repeated = rows.flatMap(([v, k]) => Array<number>(k).fill(v));
          for (const [, measure] of relative) expectNear(measure(x, w), measure(repeated));
          expectNear(quantile(x, 0.3, { weights: w }), quantile(repeated, 0.3, undefined, 2));
          const at = [0.1, 0.45, 0.9];
          const curve = lorenz(x, at, { weights: w });
          lorenz(repeated, at).forEach((v, k) => {
            expectNear(curve[k], v);
          });
        },
      ),
    );
  });

  test('Theil splits sum to the whole, and Gini parts to the Gini', () => {
    fc.assert(
      fc.property(
        fc.array(fc.tuple(fc.double({ min: 0.1, max: 1e4, noNaN: true }), fc.nat(5)), { minLength: 2, maxLength: 150 }),
        (rows) => {
          const x = rows.map(([v]) => v);
          const g = rows.map(([, k]) => k);
          const t = theilTSplit(x, g);
          const l = theilLSplit(x, g);
          expectNear(t.within + t.between, theilT(x));
          expectNear(l.within + l.between, theilL(x));
          expect(Math.min(t.within, t.between, l.within, l.between)).toBeGreaterThan(-1e-14);
          expectNear(theilTBetween(x, g, 6), t.between);
          const parts = giniSplit(x, g);
          expectNear(parts.within + parts.between + parts.overlap, gini(x));
        },
      ),
    );
  });

  test('near equality the measures keep their digits: T and L approach half the squared coefficient of variation', () => {
    const x = Array.from({ length: 1000 }, (_, i) => 50 * (1 + 1e-7 * (i % 2 === 0 ? 1 : -1)));
    const { theilT: t, theilL: l } = ratioMeasures(x);
    // half of 1e-14, known to the 1e-9 that 16 digits leave of a relative gap of 1e-7
    expect(Math.abs(t / 5e-15 - 1)).toBeLessThan(1e-6);
    expect(Math.abs(l / 5e-15 - 1)).toBeLessThan(1e-6);
  });

  test('zeros, negatives and empty data are told apart', () => {
    expect(theilL([0, 1, 2])).toBe(Infinity);
    expect(theilT([-1, 3])).toBeNaN();
    expect(theilT([-1, 3, 3], { positiveOnly: true })).toBe(0);
    expect(gini([])).toBeNaN();
    expect(gini([-3, 1])).toBeNaN();
    expect(median([])).toBeNaN();
    expect(p90p10([0, 0, 5])).toBeNaN();
    expect(() => gini([1, 2], { weights: [1] })).toThrow('weights has length 1');
    expect(() => gini([1, 2], { weights: [1, -1] })).toThrow(RangeError);
    expect(() => theilTSplit([1, 2], ['a'])).toThrow('labels has length 1');
  });
});

describe('shares', () => {
  test('quantile shares sum to 1, and agree with bottom and top shares and Palma', () => {
    fc.assert(
      fc.property(wealth, (x) => {
        const tenths = quantileShares(x, 10);
        expectNear(
          tenths.reduce((s, v) => s + v, 0),
          1,
        );
        expectNear(
          tenths.slice(0, 4).reduce((s, v) => s + v, 0),
          shareBottom(x, 0.4),
        );
        expectNear(tenths[9], shareTop(x, 0.1));
        expectNear(palma(x) * shareBottom(x, 0.4), shareTop(x, 0.1));
        for (let k = 1; k < 10; k++) expect(tenths[k]).toBeGreaterThanOrEqual(tenths[k - 1] - 1e-12);
      }),
    );
  });

  test('a sample made once gives what the plain numbers give', () => {
    const x = [5, 1, 4, 2, 9, 9];
    const w = [1, 2, 1, 3, 1, 2];
    const sample = sampleOf(x, { weights: w });
    expect(gini(sample)).toBe(gini(x, { weights: w }));
    expect(wolfson(sample)).toBe(wolfson(x, { weights: w }));
    expect(theilTSplit(sample, ['a', 'b', 'a', 'b', 'a', 'b']).between).toBe(
      theilTSplit(x, ['a', 'b', 'a', 'b', 'a', 'b'], { weights: w }).between,
    );
    expect(() => gini(sample, { weights: w })).toThrow(TypeError);
  });
});

test('Wolfson: 0 at equality, largest when half hold nothing more than the other half', () => {
  expectNear(wolfson([4, 4, 4, 4]), 0, 1e-14);
  // two equal masses at 1 and 3: T = ½ − ¼ = ¼, Gini ¼, mean = median = 2
  expectNear(wolfson([1, 1, 3, 3]), 0.5, 1e-14);
});
