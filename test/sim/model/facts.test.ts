/**
 * Facts of the aspirations literature that the choice must reproduce. *Common practice*: no single source.
 */
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { compileChoice } from '../../../sim/model/choice.js';
import type { Preferences, Technology } from '../../../sim/model/types.js';

const planned = { sdLog: 0, sharedByPlace: 0, risk: 'planned' } as const;

function preferencesOf(sigma: number, childWeight: number): Preferences {
  return { curvature: sigma, childWeight, milestoneShape: 'threshold', milestoneCurvature: sigma, lossAversion: 1 };
}

const linearEconomies = fc.record({
  R: fc.double({ min: 1, max: 4, noNaN: true }),
  sigma: fc.double({ min: 0.2, max: 0.9, noNaN: true }),
  delta: fc.double({ min: 0.1, max: 1.2, noNaN: true }),
  pi: fc.double({ min: 0.1, max: 2, noNaN: true }),
});

// rounding of plans that are equal in exact arithmetic, with the table's stated 1e−11 on top
const PLAN_RTOL = 1e-10;

describe('linear technology, one milestone, a common aspiration (common practice, fact 1)', () => {
  test('growth is flat at g_low below the threshold, jumps, then declines with wealth, bounded above g_low', () => {
    fc.assert(
      fc.property(linearEconomies, ({ R, sigma, delta, pi }) => {
        const choice = compileChoice({ kind: 'linear', grossReturn: R }, planned, preferencesOf(sigma, delta), [pi]);
        const aspiration = 100;
        const threshold = aspiration / choice.qStar(delta);
        const low = choice.lowGrowth(delta);
        const floor = choice.lowGrowth(delta * (1 + pi));
        const growthAt = (wealth: number): number => {
          choice.solve(wealth, [aspiration], delta);
          return choice.planned / wealth;
        };
        for (const share of [0.001, 0.2, 0.7, 0.99, 1 - 1e-9]) {
          expect(Math.abs(growthAt(threshold * share) / low - 1)).toBeLessThan(PLAN_RTOL);
          expect(choice.met).toBe(0);
        }
        let last = Infinity;
        for (const multiple of [1 + 1e-9, 1.01, 1.1, 1.5, 2, 4, 10, 100, 1e4]) {
          const growth = growthAt(threshold * multiple);
          expect(choice.met).toBe(1);
          expect(growth).toBeLessThan(last * (1 + PLAN_RTOL));
          expect(growth).toBeGreaterThan(floor * (1 - PLAN_RTOL));
          last = growth;
        }
        expect(floor).toBeGreaterThan(low);
        // utility is continuous where growth jumps
        const [giveUp, strive] = choice.candidates(threshold, [aspiration], delta);
        expect(strive.z).toBeGreaterThan(giveUp.z * 1.0001);
        // 1e−12 of utility, and what a rounding of the aspiration itself does to it
        const rounding = delta * pi * (strive.z - aspiration) ** -sigma * aspiration * 1e-15;
        expect(Math.abs(strive.utility - giveUp.utility)).toBeLessThan(1e-12 * giveUp.utility + rounding);
      }),
      { numRuns: 60, seed: 1, endOnFailure: true },
    );
  });

  test('with wealth very large, growth falls to g_low at child weight δ(1 + π)', () => {
    const choice = compileChoice({ kind: 'linear', grossReturn: 2.5 }, planned, preferencesOf(0.6, 0.35), [0.6]);
    choice.solve(1e12, [100], 0.35);
    // the aspiration is 1e−10 of wealth, and moves growth by as much
    expect(Math.abs(choice.planned / 1e12 / choice.lowGrowth(0.35 * 1.6) - 1)).toBeLessThan(1e-9);
  });
});

describe('several milestones (common practice, fact 2)', () => {
  test('growth against wealth is a saw-tooth: each tooth declines towards a floor, and floors rise', () => {
    fc.assert(
      fc.property(
        linearEconomies,
        fc.double({ min: 0.2, max: 2, noNaN: true }),
        fc.double({ min: 1.5, max: 4, noNaN: true }),
        ({ R, sigma, delta, pi }, pi2, apart) => {
          const technology: Technology = { kind: 'linear', grossReturn: R };
          const choice = compileChoice(technology, planned, preferencesOf(sigma, delta), [pi, pi2]);
          const floors = [0, pi, pi + pi2].map((sum) => choice.lowGrowth(delta * (1 + sum)));
          expect(floors[0]).toBeLessThan(floors[1]);
          expect(floors[1]).toBeLessThan(floors[2]);
          let last = Infinity;
          let tooth = 0;
          const steps = 400;
          for (let j = 0; j < steps; j++) {
            // from where the milestones are out of reach to where the least ambitious plan meets both
            const from = 90 / R;
            const wealth = from * ((110 * apart) / choice.lowGrowth(delta) / from) ** (j / (steps - 1));
            choice.solve(wealth, [100, 100 * apart], delta);
            const growth = choice.planned / wealth;
            // richer households never meet fewer milestones
            expect(choice.met).toBeGreaterThanOrEqual(tooth);
            if (choice.met > tooth) {
              tooth = choice.met;
              expect(growth).toBeGreaterThan(last);
            } else expect(growth).toBeLessThanOrEqual(last * (1 + PLAN_RTOL));
            expect(growth).toBeGreaterThan(floors[choice.met] * (1 - PLAN_RTOL));
            last = growth;
          }
          expect(tooth).toBe(2);
        },
      ),
      { numRuns: 40, seed: 2, endOnFailure: true },
    );
  });
});

describe('raising aspirations (common practice, fact 6)', () => {
  test.each<[string, Technology]>([
    ['linear', { kind: 'linear', grossReturn: 2.5 }],
    ['concave', { kind: 'concave', scale: 8, elasticity: 0.6, depreciation: 1 }],
  ])('raises investment up to a point and then lowers it: %s technology', (_, technology) => {
    const choice = compileChoice(technology, planned, preferencesOf(0.6, 0.5), [1]);
    const wealth = 50;
    choice.solve(wealth, [1e-9], 0.5);
    let last = choice.investment;
    const start = last;
    let dropped = false;
    for (let aspiration = 1; aspiration < 250; aspiration++) {
      choice.solve(wealth, [aspiration], 0.5);
      if (!dropped && choice.investment < last) {
        dropped = true;
        // gives up: below where no aspiration at all would leave it
        expect(choice.investment).toBeLessThan(start);
        expect(last).toBeGreaterThan(start * 1.1);
      } else if (dropped) expect(Math.abs(choice.investment / last - 1)).toBeLessThan(PLAN_RTOL);
      else expect(choice.investment).toBeGreaterThan(last);
      last = choice.investment;
    }
    expect(dropped).toBe(true);
  });
});

test('linear technology with η = σ is scale-free', () => {
  fc.assert(
    fc.property(
      linearEconomies,
      fc.array(fc.double({ min: 0.1, max: 3, noNaN: true }), { minLength: 1, maxLength: 4 }),
      fc.double({ min: 1e-6, max: 1e6, noNaN: true }),
      ({ R, sigma, delta, pi }, ratios, factor) => {
        const weights = ratios.map((_, m) => pi / (m + 1));
        const choice = compileChoice({ kind: 'linear', grossReturn: R }, planned, preferencesOf(sigma, delta), weights);
        choice.solve(
          10,
          ratios.map((q) => 10 * q),
          delta,
        );
        const { planned: z, met } = choice;
        choice.solve(
          10 * factor,
          ratios.map((q) => 10 * factor * q),
          delta,
        );
        // Newton stops within rounding of the root, from starts that differ by rounding
        expect(Math.abs(choice.planned / factor / z - 1)).toBeLessThan(1e-12);
        expect(choice.met).toBe(met);
      },
    ),
    { numRuns: 300, seed: 4, endOnFailure: true },
  );
});
