import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { gaussianTransitions } from '../../../sim/measure/gaussian-mobility.js';
import { growthByInitialRank, growthIncidence } from '../../../sim/measure/incidence.js';
import { elasticity, movement, rankRankSlope, spearman, upwardMobility } from '../../../sim/measure/mobility.js';
import { sampleOf } from '../../../sim/measure/sample.js';
import { rowShares, transitionCounts, transitionMeasures } from '../../../sim/measure/transitions.js';

/** Whole numbers, so that no scale makes different ones equal by rounding. */
const pairs = fc.array(fc.tuple(fc.integer({ min: 1, max: 10_000 }), fc.integer({ min: 1, max: 10_000 })), {
  minLength: 10,
  maxLength: 150,
});

describe('mobility', () => {
  test('children like their parents do not move; children like their parents’ squares have elasticity 2', () => {
    const parent = [1, 2, 4, 8, 16, 32, 64];
    expect(elasticity(parent, parent).slope).toBeCloseTo(1, 12);
    expect(
      elasticity(
        parent,
        parent.map((v) => v * v),
      ).slope,
    ).toBeCloseTo(2, 12);
    expect(
      rankRankSlope(
        parent,
        parent.map((v) => 100 - v),
      ).slope,
    ).toBeCloseTo(-1, 12);
    expect(upwardMobility(parent, parent)).toBe(0);
    expect(
      upwardMobility(
        parent,
        parent.map((v) => 1.1 * v),
      ),
    ).toBe(1);
    expect(
      movement(
        parent,
        parent.map((v) => 2 * v),
      ).log,
    ).toBeCloseTo(Math.log(2), 12);
    expect(upwardMobility([], [])).toBeNaN();
    expect(() => upwardMobility([1], [1, 2])).toThrow('child has length 2');
  });

  test('equal parents have no slope', () => {
    expect(elasticity([5, 5, 5], [1, 2, 3]).slope).toBeNaN();
    expect(rankRankSlope([5, 5, 5], [1, 2, 3]).slope).toBeNaN();
  });

  test('ranks know no unit and no monotone scale; elasticity knows no unit', () => {
    fc.assert(
      fc.property(pairs, fc.double({ min: 0.01, max: 100, noNaN: true }), (rows, unit) => {
        const parent = rows.map(([p]) => p);
        const child = rows.map(([, c]) => c);
        const slope = rankRankSlope(parent, child).slope;
        expect(
          rankRankSlope(
            parent.map((v) => v * unit),
            child.map((v) => Math.sqrt(v)),
          ).slope,
        ).toBeCloseTo(slope, 9);
        expect(Math.abs(spearman(parent, child))).toBeLessThanOrEqual(1 + 1e-12);
        const e = elasticity(parent, child).slope;
        expect(
          Math.abs(
            elasticity(
              parent.map((v) => v * unit),
              child,
            ).slope - e,
          ),
        ).toBeLessThan(1e-6 * Math.max(1, Math.abs(e)));
      }),
    );
  });
});

describe('transitions', () => {
  test('counts add up to the pairs, whichever way they are cut', () => {
    fc.assert(
      fc.property(pairs, fc.integer({ min: 2, max: 7 }), (rows, k) => {
        const parent = rows.map(([p]) => p);
        const child = rows.map(([, c]) => c);
        for (const cut of ['rank', 'quantile'] as const) {
          const counts = transitionCounts(parent, child, k, cut);
          expect(counts.reduce((s, v) => s + v, 0)).toBe(rows.length);
          const reversed = transitionCounts(child, parent, k, cut);
          for (let r = 0; r < k; r++) for (let c = 0; c < k; c++) expect(reversed[c * k + r]).toBe(counts[r * k + c]);
        }
      }),
    );
  });

  test('nobody moving and origin not mattering are the two ends of the Shorrocks index', () => {
    const still = transitionMeasures([3, 0, 0, 0, 3, 0, 0, 0, 3]);
    expect(still.shorrocks).toBe(0);
    expect(still.exitTimes[0]).toBe(Infinity);
    expect(still.bartholomew).toBe(0);
    const lottery = transitionMeasures(new Float64Array(9).fill(4));
    expect(lottery.shorrocks).toBeCloseTo(1, 12);
    expect(lottery.secondEigenvalue).toBeCloseTo(0, 12);
    expect(Array.from(lottery.stationary)).toEqual(expect.arrayContaining([expect.closeTo(1 / 3, 12)]));
    expect(() => transitionMeasures([1, 2, 3])).toThrow(RangeError);
    expect(() => transitionMeasures([0, 0, 1, 1])).toThrow('row 0');
  });

  test('a Gaussian table has equal rows and columns that sum to 1', () => {
    const m = gaussianTransitions(-0.4, 4);
    for (let r = 0; r < 4; r++) {
      for (let c = 0; c < 4; c++) expect(m[r * 4 + c]).toBeCloseTo(m[c * 4 + r], 9);
      expect(m.slice(r * 4, r * 4 + 4).reduce((s, v) => s + v, 0)).toBeCloseTo(1, 9);
    }
    expect(rowShares([1, 1, 0, 4])).toEqual(Float64Array.of(0.5, 0.5, 0, 1));
    expect(() => gaussianTransitions(1)).toThrow(RangeError);
  });
});

describe('growth incidence', () => {
  test('equal growth for all is the same number at every percentile, both ways', () => {
    const parent = Float64Array.from({ length: 500 }, (_, i) => 1 + ((i * 37) % 500));
    const child = parent.map((v) => 1.25 * v);
    const anonymous = growthIncidence(parent, child);
    const followed = growthByInitialRank(parent, child);
    expect(anonymous.length).toBe(100);
    for (const g of [...anonymous, ...followed]) expect(g).toBeCloseTo(1.25, 12);
    expect(Array.from(growthIncidence(sampleOf(parent), sampleOf(child)))).toEqual(Array.from(anonymous));
  });

  test('reshuffling who is rich is growth by start, but not for the distribution', () => {
    const parent = Float64Array.from({ length: 100 }, (_, i) => 1 + i);
    const child = parent.slice().reverse();
    for (const g of growthIncidence(parent, child)) expect(g).toBeCloseTo(1, 12);
    const followed = growthByInitialRank(parent, child, 10);
    for (let b = 1; b < 10; b++) expect(followed[b]).toBeLessThan(followed[b - 1]);
    // a hundred households that are all alike leave every bin but the middle one empty
    expect(growthByInitialRank(new Float64Array(100).fill(2), child, 100).filter((g) => !Number.isNaN(g)).length).toBe(
      1,
    );
  });
});
