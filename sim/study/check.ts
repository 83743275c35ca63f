/**
 * What a study must satisfy beyond the shape of single fields: sums, pairs of keys that go together, arms that
 * derive from arms, values a technology or a target allows.
 *
 * Reads the parsed study only; the files it names are read by inputs.ts.
 */
import { nearest } from '../../network/errors.js';
import { checkEstimates } from './estimates.js';
import { type Path, pathText, type StudyProblem } from './problems.js';
import type { ArmFile, PartialPreferencesFile, PreferencesFile, StudyFile, WealthFile } from './schema.js';

/** Sums of shares and weights may miss 1 by this much: room for thirds written with six digits, no more. */
const SUM_TOLERANCE = 1e-5;

/** Every problem of a parsed study, in the order of the file's sections. */
export function checkStudy(study: StudyFile): StudyProblem[] {
  const found: StudyProblem[] = [];
  checkPopulation(study, found);
  checkPreferences(study.preferences, ['preferences'], found);
  study.population.groups?.forEach((group, g) => {
    if (group.preferences !== undefined) {
      checkOverride(study.preferences, group.preferences, ['population', 'groups', g, 'preferences'], found);
    }
  });
  checkReference(study.reference.milestones, ['reference', 'milestones'], found);
  checkArms(study, found);
  const { formats } = study.keep;
  if (new Set(formats).size < formats.length) {
    found.push(problem('duplicate', ['keep', 'formats'], 'keep.formats names a format twice', 'name each once'));
  }
  if (study.estimates !== undefined) {
    found.push(...checkEstimates(study.estimates));
    if (study.keep.panel === 'none') {
      found.push(
        problem(
          'no-panel',
          ['estimates'],
          'estimates need a panel and keep.panel is none',
          'use keep: {panel: all}',
          true,
        ),
      );
    }
  }
  return found;
}

function problem(code: string, path: Path, text: string, remedy: string, atKey = false): StudyProblem {
  return { code, path, problem: text, remedy, atKey };
}

function checkPopulation(study: StudyFile, found: StudyProblem[]): void {
  const { population } = study;
  const at = (...rest: (string | number)[]): Path => ['population', ...rest];
  if (population.households_file !== undefined) {
    for (const key of ['households', 'places', 'wealth'] as const) {
      if (population[key] === undefined) continue;
      found.push(
        problem(
          'keys-exclude',
          at(key),
          `population.${key} stands beside households_file, which brings its own`,
          `remove one of the two`,
          true,
        ),
      );
    }
    population.groups?.forEach((group, g) => {
      for (const key of ['share', 'relative_wealth'] as const) {
        if (group[key] === undefined) continue;
        found.push(
          problem(
            'keys-exclude',
            at('groups', g, key),
            `${pathText(at('groups', g, key))} stands beside households_file, whose group column says who is in it`,
            'remove it (a group here may carry its own preferences)',
            true,
          ),
        );
      }
    });
  } else {
    if (population.households === undefined) {
      found.push(
        problem(
          'missing-key',
          at(),
          'population.households is missing',
          'give the number of households, or a households_file',
        ),
      );
    }
    if (population.wealth === undefined) {
      found.push(problem('missing-key', at(), 'population.wealth is missing', 'say how initial wealth is distributed'));
    } else {
      checkWealth(population.wealth, found);
      const places = placeCount(population.places);
      if (population.wealth.between_places > 0 && places === 1) {
        found.push(
          problem(
            'keys-disagree',
            at('wealth', 'between_places'),
            'wealth.between_places is above 0, but there is one place',
            'set population.places, or between_places: 0',
          ),
        );
      }
    }
    const places = placeCount(population.places);
    if (population.households !== undefined && places > population.households) {
      found.push(
        problem(
          'out-of-range',
          at('places'),
          `population.places is ${places}, more than the ${population.households} households`,
          'give fewer places or more households',
        ),
      );
    }
    const groups = population.groups;
    if (groups !== undefined) {
      let sum = 0;
      groups.forEach((group, g) => {
        if (group.share === undefined && groups.length > 1) {
          found.push(
            problem(
              'missing-key',
              at('groups', g),
              `group '${group.name}' has no share`,
              'give every group its share of households',
            ),
          );
        }
        sum += group.share ?? 1;
      });
      if (groups.every((group) => group.share !== undefined) && Math.abs(sum - 1) > SUM_TOLERANCE) {
        found.push(problem('bad-sum', at('groups'), `the groups' shares sum to ${round(sum)}`, 'make them sum to 1'));
      }
    }
  }
  const seen = new Set<string>();
  population.groups?.forEach((group, g) => {
    if (seen.has(group.name)) {
      found.push(
        problem(
          'duplicate',
          at('groups', g, 'name'),
          `two groups are named '${group.name}'`,
          'give each group its own name',
        ),
      );
    }
    seen.add(group.name);
  });
}

function placeCount(places: StudyFile['population']['places']): number {
  return places === undefined ? 1 : typeof places === 'number' ? places : places.count;
}

/** Which keys a wealth shape takes besides `between_places`. */
const WEALTH_KEYS = {
  lognormal: { needs: ['mean'], spread: true, may: [] },
  pareto_tail: { needs: ['mean', 'pareto_tail'], spread: true, may: [] },
  quantile_shares: { needs: ['mean', 'quantile_shares'], spread: false, may: [] },
  sample: { needs: ['sample'], spread: false, may: ['mean'] },
} as const;

function checkWealth(wealth: WealthFile, found: StudyProblem[]): void {
  const at = (...rest: string[]): Path => ['population', 'wealth', ...rest];
  const rule = WEALTH_KEYS[wealth.shape];
  const takes = new Set<string>([
    'shape',
    'between_places',
    ...rule.needs,
    ...rule.may,
    ...(rule.spread ? ['gini', 'sd_log'] : []),
  ]);
  for (const key of rule.needs) {
    if (wealth[key] === undefined) {
      found.push(problem('missing-key', at(), `wealth shape ${wealth.shape} needs '${key}'`, `add ${key}`));
    }
  }
  for (const key of Object.keys(wealth) as (keyof WealthFile)[]) {
    if (wealth[key] !== undefined && !takes.has(key)) {
      found.push(
        problem(
          'keys-exclude',
          at(key),
          `wealth shape ${wealth.shape} takes no '${key}'`,
          'remove it or change the shape',
          true,
        ),
      );
    }
  }
  if (rule.spread && (wealth.gini === undefined) === (wealth.sd_log === undefined)) {
    const both = wealth.gini !== undefined;
    found.push(
      problem(
        both ? 'keys-exclude' : 'missing-key',
        both ? at('sd_log') : at(),
        both ? 'wealth gives both gini and sd_log' : 'wealth gives neither gini nor sd_log',
        'give one of the two',
        both,
      ),
    );
  }
  if (wealth.quantile_shares !== undefined) {
    const shares = wealth.quantile_shares;
    const sum = shares.reduce((a, b) => a + b, 0);
    if (Math.abs(sum - 1) > SUM_TOLERANCE) {
      found.push(
        problem('bad-sum', at('quantile_shares'), `quantile_shares sum to ${round(sum)}`, 'make them sum to 1'),
      );
    }
    const fall = shares.findIndex((value, i) => i > 0 && value < shares[i - 1]!);
    if (fall > 0) {
      found.push(
        problem(
          'not-ascending',
          ['population', 'wealth', 'quantile_shares', fall],
          `quantile_shares fall from ${shares[fall - 1]} to ${shares[fall]}`,
          'list them poorest first',
        ),
      );
    }
  }
}

function checkPreferences(preferences: PreferencesFile, path: Path, found: StudyProblem[]): void {
  if (preferences.milestone_shape === 'threshold') {
    if (preferences.curvature >= 1 && preferences.milestone_curvature === undefined) {
      found.push(
        problem(
          'missing-key',
          path,
          `curvature is ${preferences.curvature}, and a threshold milestone needs a curvature below 1`,
          'add milestone_curvature between 0 and 1',
        ),
      );
    }
    if (preferences.loss_aversion !== undefined) {
      found.push(
        problem(
          'keys-exclude',
          [...path, 'loss_aversion'],
          'loss_aversion stands beside milestone_shape: threshold, which does not use it',
          'remove it, or set milestone_shape: gain-loss',
          true,
        ),
      );
    }
    return;
  }
  if (preferences.loss_aversion === undefined) {
    found.push(
      problem('missing-key', path, 'milestone_shape gain-loss needs loss_aversion', 'add loss_aversion, at least 1'),
    );
  }
  if (preferences.milestone_curvature !== undefined) {
    found.push(
      problem(
        'keys-exclude',
        [...path, 'milestone_curvature'],
        'milestone_curvature stands beside milestone_shape: gain-loss, which does not use it',
        'remove it, or set milestone_shape: threshold',
        true,
      ),
    );
  }
}

/** Preferences with an override laid over them; keys that the other shape owns fall away. */
export function overridePreferences(base: PreferencesFile, over: PartialPreferencesFile | undefined): PreferencesFile {
  const merged: PreferencesFile = { ...base, ...defined(over ?? {}) };
  const changesShape = over?.milestone_shape !== undefined && over.milestone_shape !== base.milestone_shape;
  if (changesShape && merged.milestone_shape === 'gain-loss' && over?.milestone_curvature === undefined) {
    delete merged.milestone_curvature;
  }
  if (changesShape && merged.milestone_shape === 'threshold' && over?.loss_aversion === undefined) {
    delete merged.loss_aversion;
  }
  return merged;
}

/** What a group in an arm ends up with, once both have been laid over the study's preferences. */
function checkGroupsInArm(study: StudyFile, arm: ArmFile, a: number, found: StudyProblem[]): void {
  if (arm.preferences === undefined) return;
  const own = overridePreferences(study.preferences, arm.preferences);
  for (const group of study.population.groups ?? []) {
    if (group.preferences === undefined) continue;
    const merged = overridePreferences(own, group.preferences);
    const missing =
      merged.milestone_shape === 'gain-loss'
        ? merged.loss_aversion === undefined && 'loss_aversion, at least 1'
        : merged.milestone_curvature === undefined && merged.curvature >= 1 && 'milestone_curvature between 0 and 1';
    if (missing === false) continue;
    found.push(
      problem(
        'missing-key',
        ['arms', a, 'preferences'],
        `in arm '${arm.name}', group '${group.name}' has milestone shape ${merged.milestone_shape} and curvature ${merged.curvature}`,
        `add ${missing} to the arm or the group`,
      ),
    );
  }
}

function checkOverride(base: PreferencesFile, over: PartialPreferencesFile, path: Path, found: StudyProblem[]): void {
  const before = found.length;
  checkPreferences(overridePreferences(base, over), path, found);
  // a fault of the shared preferences is reported there, once
  const shared: StudyProblem[] = [];
  checkPreferences(base, path, shared);
  if (shared.length > 0) found.length = before;
}

function checkReference(milestones: StudyFile['reference']['milestones'], path: Path, found: StudyProblem[]): void {
  milestones.forEach((milestone, m) => {
    const sum = milestone.mix.reduce((a, part) => a + part.weight, 0);
    if (Math.abs(sum - 1) > SUM_TOLERANCE) {
      found.push(
        problem(
          'bad-sum',
          [...path, m, 'mix'],
          `the weights of milestone ${m + 1}'s mix sum to ${round(sum)}`,
          'make them sum to 1',
        ),
      );
    }
    milestone.mix.forEach((part, p) => {
      const at: Path = [...path, m, 'mix', p];
      for (const [key, statistic] of [
        ['q', 'quantile'],
        ['window', 'similarity_mean'],
      ] as const) {
        if (part.statistic === statistic && part[key] === undefined) {
          found.push(problem('missing-key', at, `statistic ${statistic} needs '${key}'`, `add ${key}`));
        }
        if (part.statistic !== statistic && part[key] !== undefined) {
          found.push(
            problem(
              'keys-exclude',
              [...at, key],
              `'${key}' goes with statistic ${statistic}, here it is ${part.statistic}`,
              `remove it, or set statistic: ${statistic}`,
              true,
            ),
          );
        }
      }
    });
  });
}

const TARGET_RANGE = {
  assortativity: [-1, 1],
  economic_connectedness: [0, 2],
  e_i_group: [-1, 1],
} as const;

function checkArms(study: StudyFile, found: StudyProblem[]): void {
  const { arms } = study;
  const names = arms.map((arm) => arm.name);
  const n = study.population.households ?? Infinity;
  arms.forEach((arm, a) => {
    const at = (...rest: (string | number)[]): Path => ['arms', a, ...rest];
    if (names.indexOf(arm.name) < a) {
      found.push(problem('duplicate', at('name'), `two arms are named '${arm.name}'`, 'give each arm its own name'));
    }
    checkNetwork(arm, a, names, n, found);
    checkArmTechnology(study, arm, a, found);
    if (arm.preferences !== undefined) checkOverride(study.preferences, arm.preferences, at('preferences'), found);
    checkGroupsInArm(study, arm, a, found);
    if (arm.reference?.milestones !== undefined) {
      checkReference(arm.reference.milestones, at('reference', 'milestones'), found);
    }
  });
  checkDerivation(arms, found);
}

function checkNetwork(arm: ArmFile, a: number, names: readonly string[], n: number, found: StudyProblem[]): void {
  const { network } = arm;
  const at = (...rest: (string | number)[]): Path => ['arms', a, 'network', ...rest];
  if ('from' in network) {
    if (!names.includes(network.from)) {
      const guess = nearest(network.from, names);
      found.push(
        problem(
          'unknown-arm',
          at('from'),
          `there is no arm named '${network.from}'`,
          guess === undefined ? `use one of ${names.join(', ')}` : `did you mean '${guess}'?`,
        ),
      );
    }
    const mixing = network.mixing;
    if (mixing !== undefined && 'target' in mixing) {
      const [low, high] = TARGET_RANGE[mixing.target];
      if (mixing.value < low || mixing.value > high) {
        found.push(
          problem(
            'out-of-range',
            at('mixing', 'value'),
            `${mixing.target} ${mixing.value} cannot be reached by any network`,
            `give a value between ${low} and ${high}`,
          ),
        );
      }
    }
    return;
  }
  const degree: [string, number] | null =
    'mean_degree' in network
      ? ['mean_degree', network.mean_degree]
      : network.kind === 'ring'
        ? ['degree', network.degree]
        : network.kind === 'preferential'
          ? ['ties', network.ties]
          : null;
  if (degree !== null && degree[1] > n - 1) {
    found.push(
      problem(
        'out-of-range',
        at(degree[0]),
        `${degree[0]} is ${degree[1]}, but a household can have at most ${n - 1} ties`,
        'give fewer ties or more households',
      ),
    );
  }
  if (network.kind === 'ring' && network.degree % 2 === 1) {
    found.push(problem('out-of-range', at('degree'), `a ring's degree is ${network.degree}`, 'give an even number'));
  }
  if (network.kind === 'file' && !/\.(csv|graphml)$/i.test(network.path)) {
    found.push(
      problem(
        'unknown-value',
        at('path'),
        `'${network.path}' ends in neither .csv nor .graphml`,
        'give an edge list as CSV, or GraphML',
      ),
    );
  }
}

function checkArmTechnology(study: StudyFile, arm: ArmFile, a: number, found: StudyProblem[]): void {
  const over = arm.technology;
  if (over === undefined) return;
  const kind = over.kind ?? study.technology.kind;
  const takes = kind === 'linear' ? ['kind', 'gross_return'] : ['kind', 'scale', 'elasticity', 'depreciation'];
  for (const key of Object.keys(over) as (keyof typeof over)[]) {
    if (over[key] === undefined || takes.includes(key)) continue;
    found.push(
      problem(
        'keys-exclude',
        ['arms', a, 'technology', key],
        `a ${kind} technology takes no '${key}'`,
        `use ${takes.slice(1).join(', ')}, or name another kind`,
        true,
      ),
    );
  }
  if (kind === study.technology.kind) return;
  const needs = kind === 'linear' ? ['gross_return'] : ['scale', 'elasticity'];
  for (const key of needs) {
    if (over[key as keyof typeof over] !== undefined) continue;
    found.push(problem('missing-key', ['arms', a, 'technology'], `a ${kind} technology needs '${key}'`, `add ${key}`));
  }
}

function checkDerivation(arms: readonly ArmFile[], found: StudyProblem[]): void {
  arms.forEach((arm, a) => {
    const seen = [arm.name];
    let at: ArmFile | undefined = arm;
    while (at !== undefined && 'from' in at.network) {
      const from: string = at.network.from;
      if (from === arm.name) {
        found.push(
          problem(
            'circular-arms',
            ['arms', a, 'network', 'from'],
            seen.length === 1
              ? `arm '${arm.name}' takes its ties from itself`
              : `arms take their ties from each other in a circle (${[...seen, from].join(' ← ')})`,
            'start from an arm with a network kind of its own',
          ),
        );
        return;
      }
      if (seen.includes(from)) return;
      seen.push(from);
      at = arms.find((other) => other.name === from);
    }
  });
}

/** The keys of an object that have a value. */
export function defined<T extends object>(object: T): { [K in keyof T]?: Exclude<T[K], undefined> } {
  return Object.fromEntries(Object.entries(object).filter(([, value]) => value !== undefined)) as {
    [K in keyof T]?: Exclude<T[K], undefined>;
  };
}

function round(x: number): number {
  return Math.round(x * 1e6) / 1e6;
}
