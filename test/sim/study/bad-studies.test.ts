/**
 * Wrong studies, each with the place and the words a user must see. Everything is refused before anything is made.
 */
import { describe, expect, test } from 'vitest';
import { InputError, describe as sentence } from '../../../network/errors.js';
import { completeStudy } from '../../../sim/study/complete.js';
import { parseStudy, studyText } from '../../../sim/study/parse.js';
import { StudyFile } from '../../../sim/study/schema.js';

const GOOD = `study: Two valleys
seed: valley-1
replicates: 4
generations: 10
population:
  households: 300
  places: 6
  groups:
    - {name: lowland, share: 0.65}
    - {name: upland, share: 0.35, relative_wealth: 0.5}
  wealth:
    shape: lognormal
    mean: 100
    gini: 0.42
    between_places: 0.4
technology: {kind: linear, gross_return: 2.5}
shock: {sd_log: 0.2}
preferences:
  curvature: 0.6
  child_weight: 0.35
reference:
  milestones:
    - weight: 0.6
      mix:
        - {from: self, weight: 0.1}
        - {from: neighbours, statistic: upward_mean, weight: 0.9}
arms:
  - name: segregated
    network: {kind: blocks, mean_degree: 10, within_place: 0.9, within_group: 0.8}
  - name: mixed
    network: {from: segregated, mixing: {share: 0.5}}
`;

/** Problems of a study text, as the command line shows them. */
function problems(text: string): string[] {
  try {
    parseStudy(text, 's.yaml');
  } catch (error) {
    if (error instanceof InputError) return error.problems.map(sentence);
    throw error;
  }
  return [];
}

type Case = [what: string, from: string, to: string, expected: string];

const CASES: Case[] = [
  // shape of the file
  ['a tab for indentation', '  households: 300', '\thouseholds: 300', 's.yaml:6:1: this is not valid YAML'],
  ['an unclosed bracket', '{sd_log: 0.2}', '{sd_log: 0.2', 's.yaml:18:1: this is not valid YAML'],
  ['a key that stands twice', 'replicates: 4', 'seed: again', 's.yaml:3:1: this key stands twice; keep one of the two'],
  // unknown keys and values
  [
    'a mistyped section',
    'technology:',
    'tecnology:',
    "s.yaml:16:1: unknown key 'tecnology' in the study; did you mean 'technology'?",
  ],
  [
    'a mistyped key in a section',
    '  households: 300',
    '  housholds: 300',
    "s.yaml:6:3: unknown key 'housholds' in population; did you mean 'households'?",
  ],
  [
    'a mistyped key in a list',
    'relative_wealth: 0.5',
    'relative_welth: 0.5',
    "s.yaml:10:35: unknown key 'relative_welth' in population.groups[1]; did you mean 'relative_wealth'?",
  ],
  [
    'a mistyped key of a network',
    'mean_degree: 10',
    'mean_degre: 10',
    "s.yaml:29:29: unknown key 'mean_degre' in arms[0].network; did you mean 'mean_degree'?",
  ],
  [
    'a mistyped key of mixing',
    '{share: 0.5}',
    '{shares: 0.5}',
    "s.yaml:31:42: unknown key 'shares' in arms[1].network.mixing; did you mean 'share'?",
  ],
  [
    'a key nobody knows',
    'seed: valley-1',
    'seed: valley-1\nweather: fine',
    "s.yaml:3:1: unknown key 'weather' in the study; use one of study, seed",
  ],
  [
    'an unknown technology',
    'kind: linear',
    'kind: liner',
    "s.yaml:16:20: technology.kind is text 'liner'; did you mean 'linear'?",
  ],
  ['an unknown network kind', 'kind: blocks', 'kind: block', "did you mean 'blocks'?"],
  [
    'an unknown wealth shape',
    'shape: lognormal',
    'shape: normal',
    "s.yaml:12:12: population.wealth.shape is text 'normal'; did you mean 'lognormal'? (one of lognormal, pareto_tail, quantile_shares, sample)",
  ],
  [
    'an unknown reference part',
    'from: self',
    'from: myself',
    "s.yaml:25:18: reference.milestones[0].mix[0].from is text 'myself'",
  ],
  [
    'an unknown statistic',
    'statistic: upward_mean',
    'statistic: average',
    "s.yaml:26:41: reference.milestones[0].mix[1].statistic is text 'average'; use one of mean, median",
  ],
  [
    'an unknown risk',
    '{sd_log: 0.2}',
    '{sd_log: 0.2, risk: none}',
    "s.yaml:17:28: shock.risk is text 'none'; use one of planned, expected",
  ],
  [
    'an unknown mixing target',
    '{share: 0.5}',
    '{target: homophily, value: 0.5}',
    "arms[1].network.mixing.target is text 'homophily'; use one of assortativity",
  ],
  [
    'an unknown milestone shape',
    'curvature: 0.6',
    'curvature: 0.6\n  milestone_shape: step',
    "s.yaml:20:20: preferences.milestone_shape is text 'step'; use one of threshold, gain-loss",
  ],
  // missing
  ['no seed', 'seed: valley-1\n', '', 's.yaml:1:1: seed is missing; give text or a number'],
  ['no arms', GOOD.slice(GOOD.indexOf('arms:')), '', 's.yaml:1:1: arms is missing; add it (a list)'],
  [
    'no child weight',
    '\n  child_weight: 0.35',
    '',
    's.yaml:19:3: preferences.child_weight is missing; add it (a number)',
  ],
  [
    'no households',
    '  households: 300\n',
    '',
    'population.households is missing; give the number of households, or a households_file',
  ],
  [
    'no wealth',
    GOOD.slice(GOOD.indexOf('  wealth:'), GOOD.indexOf('technology')),
    '',
    'population.wealth is missing; say how initial wealth is distributed',
  ],
  ['no network kind', 'kind: blocks, ', '', 'arms[0].network.kind is missing; use one of blocks, similarity'],
  [
    'no gross return',
    '{kind: linear, gross_return: 2.5}',
    '{kind: linear}',
    's.yaml:16:13: technology.gross_return is missing; add it (a number)',
  ],
  [
    'an empty value',
    'child_weight: 0.35',
    'child_weight:',
    's.yaml:20:3: preferences.child_weight is nothing (an empty value); give a number',
  ],
  // types
  ['text for a number', 'generations: 10', 'generations: ten', "s.yaml:4:14: generations is text 'ten'; give a number"],
  [
    'a decimal comma',
    'gini: 0.42',
    "gini: '0,42'",
    "s.yaml:14:11: population.wealth.gini is text '0,42'; give a number",
  ],
  [
    'a fraction of a household',
    'households: 300',
    'households: 300.5',
    's.yaml:6:15: population.households is 300.5; give a whole number',
  ],
  [
    'a list for a section',
    'shock: {sd_log: 0.2}',
    'shock: [0.2]',
    's.yaml:17:8: shock is a list of 1; give a group of keys',
  ],
  [
    'a section for a list',
    '    - {name: lowland, share: 0.65}\n    - {name: upland, share: 0.35, relative_wealth: 0.5}',
    '    name: lowland',
    's.yaml:9:5: population.groups is a group of keys; give a list',
  ],
  [
    'text for places',
    'places: 6',
    'places: six',
    "s.yaml:7:11: population.places is text 'six'; give a number or a group of keys",
  ],
  // ranges
  ['no generation', 'generations: 10', 'generations: 0', 's.yaml:4:14: generations is 0; give a number at least 1'],
  ['a negative spread', 'sd_log: 0.2', 'sd_log: -0.2', 's.yaml:17:17: shock.sd_log is -0.2; give a number at least 0'],
  ['a Gini of one', 'gini: 0.42', 'gini: 1', 's.yaml:14:11: population.wealth.gini is 1; give a number below 1'],
  [
    'a share above one',
    'within_place: 0.9',
    'within_place: 9',
    'arms[0].network.within_place is 9; give a number at most 1',
  ],
  [
    'curvature zero',
    'curvature: 0.6',
    'curvature: 0',
    's.yaml:19:14: preferences.curvature is 0; give a number above 0',
  ],
  ['no replicate', 'replicates: 4', 'replicates: 0', 's.yaml:3:13: replicates is 0; give a number at least 1'],
  ['an empty title', 'study: Two valleys', "study: ''", 's.yaml:1:8: study is empty; give at least 1'],
  [
    'more places than households',
    'places: 6',
    'places: 301',
    's.yaml:7:11: population.places is 301, more than the 300 households',
  ],
  [
    'more ties than others',
    'mean_degree: 10',
    'mean_degree: 300',
    'mean_degree is 300, but a household can have at most 299 ties',
  ],
  [
    'a target no network reaches',
    '{share: 0.5}',
    '{target: e_i_group, value: 2}',
    'e_i_group 2 cannot be reached by any network; give a value between -1 and 1',
  ],
  [
    'an odd ring',
    '{kind: blocks, mean_degree: 10, within_place: 0.9, within_group: 0.8}',
    '{kind: ring, degree: 5}',
    "a ring's degree is 5; give an even number",
  ],
  // sums and order
  [
    'group shares that miss one',
    'share: 0.35',
    'share: 0.25',
    "s.yaml:9:5: the groups' shares sum to 0.9; make them sum to 1",
  ],
  [
    'weights that miss one',
    'weight: 0.9}',
    'weight: 0.8}',
    "s.yaml:25:9: the weights of milestone 1's mix sum to 0.9; make them sum to 1",
  ],
  [
    'quantile shares that miss one',
    'shape: lognormal\n    mean: 100\n    gini: 0.42',
    'shape: quantile_shares\n    mean: 100\n    quantile_shares: [0.1, 0.2, 0.3]',
    's.yaml:14:22: quantile_shares sum to 0.6; make them sum to 1',
  ],
  [
    'quantile shares that fall',
    'shape: lognormal\n    mean: 100\n    gini: 0.42',
    'shape: quantile_shares\n    mean: 100\n    quantile_shares: [0.6, 0.4]',
    's.yaml:14:28: quantile_shares fall from 0.6 to 0.4; list them poorest first',
  ],
  // keys that go, or do not go, together
  [
    'both gini and sd_log',
    'gini: 0.42',
    'gini: 0.42\n    sd_log: 0.8',
    's.yaml:15:5: wealth gives both gini and sd_log; give one of the two',
  ],
  ['neither gini nor sd_log', '    gini: 0.42\n', '', 'wealth gives neither gini nor sd_log; give one of the two'],
  [
    'a Pareto shape without its tail',
    'shape: lognormal',
    'shape: pareto_tail',
    "wealth shape pareto_tail needs 'pareto_tail'; add pareto_tail",
  ],
  [
    'a tail on a lognormal',
    'gini: 0.42',
    'gini: 0.42\n    pareto_tail: {above_quantile: 0.9, exponent: 1.8}',
    "s.yaml:15:5: wealth shape lognormal takes no 'pareto_tail'; remove it or change the shape",
  ],
  [
    'a households file beside households',
    'households: 300',
    'households: 300\n  households_file: h.csv',
    's.yaml:6:3: population.households stands beside households_file, which brings its own; remove one of the two',
  ],
  [
    'variance between a single place',
    'places: 6',
    'places: 1',
    'wealth.between_places is above 0, but there is one place',
  ],
  [
    'a quantile without q',
    'statistic: upward_mean',
    'statistic: quantile',
    "s.yaml:26:11: statistic quantile needs 'q'; add q",
  ],
  [
    'a window nobody uses',
    'statistic: upward_mean',
    'statistic: upward_mean, window: 0.5',
    "'window' goes with statistic similarity_mean, here it is upward_mean",
  ],
  [
    'a steep curvature without its milestone curvature',
    'curvature: 0.6',
    'curvature: 1.5',
    's.yaml:19:3: curvature is 1.5, and a threshold milestone needs a curvature below 1; add milestone_curvature between 0 and 1',
  ],
  [
    'gain-loss without loss aversion',
    'curvature: 0.6',
    'curvature: 0.6\n  milestone_shape: gain-loss',
    'milestone_shape gain-loss needs loss_aversion; add loss_aversion, at least 1',
  ],
  [
    'loss aversion at a threshold',
    'curvature: 0.6',
    'curvature: 0.6\n  loss_aversion: 2',
    's.yaml:20:3: loss_aversion stands beside milestone_shape: threshold, which does not use it',
  ],
  [
    'a group without its share',
    '{name: lowland, share: 0.65}',
    '{name: lowland}',
    "s.yaml:9:7: group 'lowland' has no share; give every group its share of households",
  ],
  [
    'two groups of one name',
    'name: upland',
    'name: lowland',
    "s.yaml:10:14: two groups are named 'lowland'; give each group its own name",
  ],
  // arms
  [
    'two arms of one name',
    'name: mixed',
    'name: segregated',
    "s.yaml:30:11: two arms are named 'segregated'; give each arm its own name",
  ],
  [
    'an arm from nowhere',
    'from: segregated',
    'from: segregatd',
    "s.yaml:31:21: there is no arm named 'segregatd'; did you mean 'segregated'?",
  ],
  [
    'an arm from itself',
    'from: segregated',
    'from: mixed',
    "s.yaml:31:21: arm 'mixed' takes its ties from itself; start from an arm with a network kind of its own",
  ],
  [
    'arms in a circle',
    '{kind: blocks, mean_degree: 10, within_place: 0.9, within_group: 0.8}',
    '{from: mixed}',
    'arms take their ties from each other in a circle',
  ],
  [
    'a scale on a linear technology',
    'name: mixed',
    'name: mixed\n    technology: {scale: 3}',
    "s.yaml:31:18: a linear technology takes no 'scale'; use gross_return, or name another kind",
  ],
  [
    'a file of an unknown kind',
    '{kind: blocks, mean_degree: 10, within_place: 0.9, within_group: 0.8}',
    '{kind: file, path: ties.xlsx}',
    "'ties.xlsx' ends in neither .csv nor .graphml",
  ],
  [
    'a share beside a target',
    '{share: 0.5}',
    '{share: 0.5, target: e_i_group, value: 0}',
    "'share' does not go with 'target', 'value' in arms[1].network.mixing; keep one or the other",
  ],
  // not in this version
  [
    'programme changes',
    'arms:',
    'changes:\n  - {at: 3, do: mix, share: 0.2}\narms:',
    "s.yaml:27:1: programme changes cannot be simulated in this version; remove 'changes'",
  ],
  [
    'changing ties',
    'arms:',
    'ties: {rule: homophily, share: 0.05}\narms:',
    's.yaml:27:1: ties that change over the generations cannot be simulated in this version',
  ],
  [
    'a format twice',
    'arms:',
    'keep: {formats: [csv, csv]}\narms:',
    'keep.formats names a format twice; name each once',
  ],
];

describe('a wrong study is refused with its place and what to do', () => {
  test.each(CASES)('%s', (_what, from, to, expected) => {
    expect(GOOD).toContain(from);
    const text = GOOD.replace(from, () => to);
    const found = problems(text);
    expect(found.join('\n')).toContain(expected);
    // every problem has a place, what is wrong and what to do
    for (const line of found) expect(line).toMatch(/^s\.yaml:\d+:\d+: .+; .+/);
  });

  test.each([
    ['an empty file', '', 's.yaml:1:1: the study file is empty'],
    ['only a comment', '# nothing here\n', 's.yaml:1:1: the study file is empty'],
    ['a sentence', 'hello there', 's.yaml:1:1: this is not a study'],
    ['a list', '- one\n- two\n', 's.yaml:1:1: this is not a study'],
    ['two documents', `${GOOD}---\nstudy: another\n`, 'a second document begins here; keep one of the two'],
  ])('%s', (_what, text, expected) => {
    expect(problems(text).join('\n')).toContain(expected);
  });

  test('all problems are told at once, in the order of the file', () => {
    const found = problems(
      GOOD.replace('generations: 10', 'generations: ten')
        .replace('kind: linear', 'kind: lin')
        .replace('mean_degree: 10', 'mean: 10'),
    );
    expect(found.map((line) => line.split(':')[1])).toEqual(['4', '16', '29', '29']);
  });
});

describe('a right study', () => {
  test('is read without problems', () => {
    expect(problems(GOOD)).toEqual([]);
  });

  test('with every default written out is the same study', () => {
    const once = parseStudy(GOOD, 's.yaml').study;
    const text = studyText(once);
    expect(studyText(parseStudy(text, 's.yaml').study)).toBe(text);
    expect(once.population.places).toEqual({ count: 6, size_cv: 0 });
    expect(once.preferences.milestone_curvature).toBe(0.6);
    expect(once.reference.milestones[0]!.mix[0]!.statistic).toBe('mean');
  });

  test("an arm's own curvature moves its milestone curvature as the study's would", () => {
    const file = StudyFile.parse(parseStudy(GOOD, 's.yaml').study);
    delete file.preferences.milestone_curvature;
    const study = completeStudy({
      ...file,
      arms: [file.arms[0]!, { ...file.arms[1]!, preferences: { curvature: 0.8 } }],
    });
    expect(study.arms[1]!.preferences).toEqual({ curvature: 0.8, milestone_curvature: 0.8 });
    expect(completeStudy(StudyFile.parse(study))).toEqual(study);
  });

  test('ties that stay fixed and no changes are what this version does', () => {
    expect(problems(GOOD.replace('arms:', 'ties: {rule: fixed}\nchanges: []\narms:'))).toEqual([]);
  });
});
