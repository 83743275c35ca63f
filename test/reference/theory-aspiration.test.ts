/**
 * Two-peaked choice with one aspiration, linear technology: thresholds, plans and met decisions by two routes (R uniroot;
 * mpmath bisection, confirmed by a 200001-point grid search). There the child's utility has weight d0 and the milestone
 * d1, so the milestone weight here is d1/d0.
 */
import { describe, expect, test } from 'vitest';
import { type Choice, compileChoice } from '../../sim/model/choice.js';
import { PlannedChoice } from '../../sim/model/planned.js';
import type { Preferences, Technology } from '../../sim/model/types.js';
import { checksOf, expectMatch } from './expected.js';

const checks = checksOf('theory-aspiration');
const cases = ['case1', 'case2', 'case3', 'case4', 'case5'];

describe.each(cases)('theory-aspiration %s', (name) => {
  const { s, d0, d1, rho } = checks[`${name}.z_frustrated`]['parameters'] as Record<string, number>;
  const technology: Technology = { kind: 'linear', grossReturn: rho };
  const preferences: Preferences = {
    curvature: s,
    childWeight: d0,
    milestoneShape: 'threshold',
    milestoneCurvature: s,
    lossAversion: 1,
  };
  const table = compileChoice(technology, { sdLog: 0, sharedByPlace: 0, risk: 'planned' }, preferences, [d1 / d0]);
  const newton = new PlannedChoice(technology, preferences, [d1 / d0]);

  test('growth of the frustrated and the threshold', () => {
    expectMatch(table.lowGrowth(d0), checks[`${name}.z_frustrated`], `${name}.z_frustrated`);
    expectMatch(table.qStar(d0), checks[`${name}.threshold`], `${name}.threshold`);
  });

  test.each([
    ['table', table],
    ['Newton', newton],
  ] as [string, Choice][])('plans by %s', (_, choice) => {
    const ratios = checks[`${name}.z`]['a_over_y'] as number[];
    // wealth of 7 shows that only the ratio matters
    const plans = ratios.map((q) => {
      choice.solve(7, [7 * q], d0);
      return { z: choice.planned / 7, met: choice.met };
    });
    expectMatch(
      plans.map((plan) => plan.z),
      checks[`${name}.z`],
      `${name}.z`,
    );
    expectMatch(
      plans.map((plan) => plan.met),
      checks[`${name}.satisfied`],
      `${name}.satisfied`,
    );
    const threshold = checks[`${name}.threshold`].value as number;
    const peaks = choice.candidates(1, [threshold], d0);
    expect(peaks).toHaveLength(2);
    expectMatch(peaks[1].z, checks[`${name}.z_at_threshold`], `${name}.z_at_threshold`);
    expectMatch(peaks[0].z, checks[`${name}.z_frustrated`], `${name}.z_frustrated`);
    // indifference: the stated threshold is accurate to rounding, and so is utility
    expect(Math.abs(peaks[0].utility - peaks[1].utility)).toBeLessThan(1e-13 * Math.abs(peaks[0].utility));
  });
});
