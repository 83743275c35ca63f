import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { compileChoice } from '../../../sim/model/choice.js';
import type { Preferences, Shock, Technology } from '../../../sim/model/types.js';
import { type Problem, solveByBruteForce, utility } from './brute-force.js';

// the accuracy the model demands
const Z_RTOL = 1e-9;
// two plans whose utilities agree this closely may be exchanged
const UTILITY_RTOL = 1e-12;

const technologies: fc.Arbitrary<Technology> = fc.oneof(
  fc.double({ min: 0.8, max: 4, noNaN: true }).map((grossReturn) => ({ kind: 'linear' as const, grossReturn })),
  fc
    .tuple(
      fc.double({ min: 1, max: 10, noNaN: true }),
      fc.double({ min: 0.2, max: 0.9, noNaN: true }),
      fc.oneof(fc.constant(1), fc.double({ min: 0, max: 1, noNaN: true })),
    )
    .map(([scale, elasticity, depreciation]) => ({ kind: 'concave' as const, scale, elasticity, depreciation })),
);

const curvatures = fc.oneof(
  fc.double({ min: 0.3, max: 0.9, noNaN: true }).map((sigma) => ({ sigma, eta: sigma })),
  fc
    .tuple(fc.double({ min: 0.3, max: 2.5, noNaN: true }), fc.double({ min: 0.2, max: 0.85, noNaN: true }))
    .map(([sigma, eta]) => ({ sigma, eta })),
  fc.double({ min: 0.2, max: 0.85, noNaN: true }).map((eta) => ({ sigma: 1, eta })),
);

function problems(shape: Preferences['milestoneShape'], risk: Shock['risk']): fc.Arbitrary<Problem> {
  return fc
    .record({
      technology: technologies,
      sdLog: risk === 'expected' ? fc.double({ min: 0.05, max: 0.8, noNaN: true }) : fc.constant(0.3),
      curvature: curvatures,
      childWeight: fc.double({ min: 0.15, max: 1.5, noNaN: true }),
      lossAversion: fc.double({ min: 1, max: 3, noNaN: true }),
      weights: fc.array(fc.double({ min: 0.05, max: 2, noNaN: true }), { minLength: 1, maxLength: 4 }),
      ratios: fc.array(fc.double({ min: 0.02, max: 1.4, noNaN: true }), { minLength: 4, maxLength: 4 }),
      wealth: fc.double({ min: 0.5, max: 200, noNaN: true }),
    })
    .map(({ technology, sdLog, curvature, childWeight, lossAversion, weights, ratios, wealth }) => {
      const most =
        technology.kind === 'linear'
          ? technology.grossReturn * wealth
          : technology.scale * wealth ** technology.elasticity + (1 - technology.depreciation) * wealth;
      return {
        technology,
        shock: { sdLog, sharedByPlace: 0, risk },
        preferences: {
          curvature: curvature.sigma,
          childWeight,
          milestoneShape: shape,
          milestoneCurvature: curvature.eta,
          lossAversion,
        },
        weights,
        wealth,
        aspirations: weights.map((_, m) => ratios[m] * most),
        childWeight,
      };
    });
}

function checkAgainstBruteForce(problem: Problem, gridSize: number): void {
  const choice = compileChoice(problem.technology, problem.shock, problem.preferences, problem.weights);
  choice.solve(problem.wealth, problem.aspirations, problem.childWeight);
  const { planned, met, investment } = choice;
  const truth = solveByBruteForce(problem, gridSize);
  const reached = utility(problem, planned);
  const scale = Math.abs(truth.utility) + Math.abs(reached);
  if (Math.abs(planned - truth.z) > Z_RTOL * truth.z) {
    expect(Math.abs(truth.utility - reached), `plan ${planned} against ${truth.z}`).toBeLessThanOrEqual(
      UTILITY_RTOL * scale,
    );
  } else {
    const trueMet = problem.aspirations.filter((a) => truth.z >= a * (1 - 1e-13)).length;
    const strictlyMet = problem.aspirations.filter((a) => truth.z >= a * (1 + 1e-13)).length;
    expect(met).toBeGreaterThanOrEqual(strictlyMet);
    expect(met).toBeLessThanOrEqual(trueMet);
  }
  // what is written must agree with itself
  expect(met).toBe(problem.aspirations.filter((a) => planned >= a).length);
  expect(investment).toBeGreaterThan(0);
  expect(investment).toBeLessThan(problem.wealth);
}

describe('the choice agrees with brute force', () => {
  test('threshold milestones, planned risk', () => {
    fc.assert(
      fc.property(problems('threshold', 'planned'), (problem) => checkAgainstBruteForce(problem, 400)),
      { numRuns: 300, seed: 1, endOnFailure: true },
    );
  });
  test('gain-loss milestones, planned risk', () => {
    fc.assert(
      fc.property(problems('gain-loss', 'planned'), (problem) => checkAgainstBruteForce(problem, 200)),
      { numRuns: 200, seed: 2, endOnFailure: true },
    );
  });
  test('threshold milestones, expected risk', () => {
    fc.assert(
      fc.property(problems('threshold', 'expected'), (problem) => checkAgainstBruteForce(problem, 40)),
      { numRuns: 8, seed: 3, endOnFailure: true },
    );
  });
  test('gain-loss milestones, expected risk', () => {
    fc.assert(
      fc.property(problems('gain-loss', 'expected'), (problem) => checkAgainstBruteForce(problem, 40)),
      { numRuns: 25, seed: 4, endOnFailure: true },
    );
  });
});
