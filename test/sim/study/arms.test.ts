/**
 * What a group in an arm ends up with when study, arm and group each say something of preferences.
 */
import { describe, expect, test } from 'vitest';
import { InputError } from '../../../network/errors.js';
import { compileModel } from '../../../sim/study/compile.js';
import { parseStudy } from '../../../sim/study/parse.js';

function study(shared: string, group: string, arm: string): string {
  return `study: t
seed: t
generations: 1
population:
  households: 40
  groups: [{name: g, share: 1, preferences: ${group}}]
  wealth: {shape: lognormal, mean: 1, gini: 0.3}
technology: {kind: linear, gross_return: 2}
preferences: ${shared}
reference: {milestones: [{weight: 1, mix: [{from: self, weight: 1}]}]}
arms: [{name: a, network: {kind: random, mean_degree: 4}, preferences: ${arm}}]
`;
}

const compiled = (text: string) => {
  const parsed = parseStudy(text, 's.yaml').study;
  return compileModel(parsed, parsed.arms[0]!, ['g']).preferences[0]!;
};

describe('preferences of a group in an arm', () => {
  test('a group that goes back to thresholds in a gain-loss arm has its curvature as milestone curvature', () => {
    const got = compiled(
      study(
        '{curvature: 0.8, child_weight: 1}',
        '{milestone_shape: threshold}',
        '{milestone_shape: gain-loss, loss_aversion: 2}',
      ),
    );
    expect(got).toMatchObject({ milestoneShape: 'threshold', curvature: 0.8, milestoneCurvature: 0.8 });
  });

  test('what is missing once both are laid over the study is refused at the arm', () => {
    const steep = study(
      '{curvature: 1.5, child_weight: 1, milestone_curvature: 0.7}',
      '{milestone_shape: threshold}',
      '{milestone_shape: gain-loss, loss_aversion: 2}',
    );
    expect(() => parseStudy(steep, 's.yaml')).toThrow(InputError);
    expect(() => parseStudy(steep, 's.yaml')).toThrow(
      /s\.yaml:11:72: in arm 'a', group 'g' has .*add milestone_curvature between 0 and 1/,
    );
    const averse = study(
      '{curvature: 0.8, child_weight: 1, milestone_shape: gain-loss, loss_aversion: 2.5}',
      '{milestone_shape: gain-loss}',
      '{milestone_shape: threshold}',
    );
    expect(() => parseStudy(averse, 's.yaml')).toThrow(/add loss_aversion, at least 1/);
  });
});
