/**
 * The model of one study under the headings of the ODD protocol (Grimm et al. 2006, 2010, 2020), with its own numbers.
 *
 * Everything is read from the complete study: what is said here is what was run.
 */
import { type ArmSettings, armSettings, type Study } from '../../study/complete.js';
import type { ArmFile, PreferencesFile, ReferenceFile, ShockFile, TechnologyFile } from '../../study/schema.js';
import { safe } from '../figures/figure.js';
import { bullets, count, grouped, list, num, p, pct, sentence, table } from './words.js';

/** The section, without its heading. @param households - households a replicate has */
export function modelSection(study: Study, households: number): string {
  const parts: [string, string][] = [
    ['Purpose and patterns', purpose(study)],
    ['Entities, state variables and scales', entities(study, households)],
    ['Process overview and scheduling', processes(study)],
    ['Design concepts', concepts(study)],
    ['Initialization', initialization(study, households)],
    ['Input data', inputData(study)],
    ['Submodels', submodels(study)],
  ];
  return (
    p(
      'Described under the headings of the ODD protocol for simulation models (Grimm et al. 2006, 2010, 2020), with the numbers ' +
        'of this study. Greek letters name the quantities as the formulas do.',
    ) + parts.map(([title, body], k) => `<h3>${k + 1}. ${safe(title)}</h3>${body}`).join('\n')
  );
}

function purpose(study: Study): string {
  const compared =
    study.arms.length > 1
      ? `the same households with the same luck in ${count(study.arms.length, 'network')} (${list(study.arms.map((arm) => `‘${arm.name}’`))})`
      : `one network (‘${study.arms[0].name}’)`;
  return (
    p(
      `The model asks how the people a family looks to shape what it hopes for its children, and so what it invests, when whom ` +
        `it looks to depends on its social ties. This study compares ${compared}.`,
    ) +
    p(
      'It is meant to explore mechanisms, not to forecast. It is held to patterns that the literature on aspirations knows ' +
        '(common practice): investment rises with aspirations and then falls as they move out of reach; growth jumps where a ' +
        'milestone comes within reach; from the same rules either catching-up or growing apart can follow, depending on the ' +
        'starting spread.',
    )
  );
}

function entities(study: Study, households: number): string {
  const places = study.population.places?.count;
  const groups = study.population.groups;
  const milestones = Math.max(...study.arms.map((arm) => armSettings(study, arm).reference.milestones.length));
  return (
    p(
      `Households are dynasties: one decision maker a generation, whose child is the next. There are ${grouped(households)} of them` +
        `${places !== undefined && places > 1 ? ` in ${count(places, 'place')}` : ''}` +
        `${groups !== undefined && groups.length > 1 ? ` and ${count(groups.length, 'group')} (${list(groups.map((g) => g.name))})` : ''}, ` +
        'joined by ties without direction. Arms are networks over the same households.',
    ) +
    table(
      'State variables of a household',
      ['variable', 'symbol', 'unit', 'changes'],
      [
        ['wealth', 'y', study.currency, 'every generation'],
        [
          `aspiration${milestones > 1 ? `s, ${milestones} milestones` : ''}`,
          milestones > 1 ? 'a₁ …' : 'a',
          study.currency,
          'every generation',
        ],
        ['investment in the child', 'k', study.currency, 'every generation'],
        ['planned child wealth', 'z', study.currency, 'every generation'],
        ['status: frustrated or satisfied', '', 'none', 'every generation'],
        ['ties', '', 'households', 'never in this study'],
        ['place, group', '', 'none', 'never'],
        ['child weight', 'δ', 'none', 'never'],
      ],
      { words: [1, 2, 3] },
    ) +
    p(
      `One step is a generation, taken as ${num(study.years_per_generation)} years when annual rates are stated; ` +
        `${count(study.generations, 'generation')} decide (t = 0 to ${study.generations - 1}) and generation ${study.generations} is the ` +
        `outcome of the last decision. Space is social: place and ties, no distances${usesDistance(study) ? ' but those between places when ties are drawn' : ''}.`,
    )
  );
}

function usesDistance(study: Study): boolean {
  return study.arms.some((arm) => 'kind' in arm.network && arm.network.kind === 'spatial');
}

function processes(study: Study): string {
  return (
    p('In each generation, all households at once (nobody sees what others decide in the same generation):') +
    `<ol>${[
      'every household forms its aspiration from the wealth it sees;',
      'every household chooses how much to invest in its child, and so what wealth it plans for the child;',
      study.shock.sd_log > 0 || study.arms.some((arm) => (arm.shock?.sd_log ?? 0) > 0)
        ? 'luck falls: the child’s wealth is the planned one times a shock;'
        : 'the child has the planned wealth (this study has no shocks);',
      'the child becomes the household of the next generation, with the parent’s ties, place and group.',
    ]
      .map((step) => `<li>${safe(step)}</li>`)
      .join('')}</ol>`
  );
}

function concepts(study: Study): string {
  return bullets([
    'Basic principles: milestone aspirations with reference groups; a household draws extra satisfaction from child wealth beyond a milestone, so a milestone within reach spurs it and one out of reach does not.',
    'Emergence: frustration, its clusters, inequality and mobility emerge; none is imposed.',
    'Adaptation and objectives: each household maximises its own lifetime utility exactly; there is no learning by trial.',
    `Prediction: a household ${study.shock.risk === 'expected' ? 'weighs the luck that may fall on its child' : 'plans as if its child’s luck were average'}; it does not foresee what others will do.`,
    `Sensing: households see the present wealth of their reference group (${referenceSeen(study)}), nothing else.`,
    'Interaction: only through what households see of each other’s wealth.',
    `Stochasticity: initial wealth, ties${study.shock.sd_log > 0 ? ', shocks' : ''} are drawn; every draw is a function of seed, replicate, purpose, household and generation, so all arms share each household’s start and luck and differ by their network alone.`,
    'Collectives: pockets of frustration are found in the results; households do not know of them.',
    'Observation: every household in every generation, without error; indicators, contrasts and their intervals over replicates.',
  ]);
}

function referenceSeen(study: Study): string {
  const from = new Set(
    study.arms.flatMap((arm) =>
      armSettings(study, arm).reference.milestones.flatMap((milestone) => milestone.mix.map((part) => part.from)),
    ),
  );
  return list([...from].map((name) => FROM[name]));
}

const FROM = {
  self: 'itself',
  neighbours: 'those it has ties to',
  second_circle: 'the ties of its ties',
  group: 'its group',
  place: 'its place',
  society: 'everyone',
} as const;

function initialization(study: Study, households: number): string {
  const { population } = study;
  const out: string[] = [];
  if (population.households_file !== undefined) {
    out.push(`Households, their wealth and labels come from the file ${population.households_file}.`);
  } else {
    const places = population.places;
    if (places !== undefined && places.count > 1) {
      out.push(
        `${grouped(households)} households live in ${grouped(places.count)} places ` +
          `${places.size_cv > 0 ? `whose sizes have a coefficient of variation of ${num(places.size_cv)}` : 'of equal size'}.`,
      );
    }
    const groups = population.groups ?? [];
    if (groups.length > 1) {
      out.push(
        `Groups: ${list(
          groups.map(
            (g) =>
              `${g.name} (${pct(g.share ?? NaN)} of households${g.relative_wealth !== undefined && g.relative_wealth !== 1 ? `, wealth multiplied by ${num(g.relative_wealth)}` : ''})`,
          ),
        )}.`,
      );
    }
  }
  const wealth = population.wealth;
  if (wealth !== undefined) {
    const shape = {
      lognormal: 'lognormal',
      pareto_tail: `lognormal with a Pareto tail${wealth.pareto_tail === undefined ? '' : ` (exponent ${num(wealth.pareto_tail.exponent)} above quantile ${num(wealth.pareto_tail.above_quantile)})`}`,
      quantile_shares: `drawn to the shares of ${count(wealth.quantile_shares?.length ?? 0, 'quantile group')}`,
      sample: `resampled from ${wealth.sample?.file ?? 'a survey'}, column ${wealth.sample?.column ?? ''}`,
    }[wealth.shape];
    out.push(
      `Initial wealth is ${shape}` +
        `${wealth.mean === undefined ? '' : `, mean ${num(wealth.mean)} ${study.currency}`}` +
        `${wealth.gini === undefined ? '' : `, Gini ${num(wealth.gini)}`}` +
        `${wealth.sd_log === undefined ? '' : `, standard deviation of log wealth ${num(wealth.sd_log)}`}` +
        `${wealth.between_places > 0 ? `; ${pct(wealth.between_places)} of the variance of log wealth lies between places` : ''}.`,
    );
  }
  return (
    out.map((line) => p(line)).join('') +
    p('Ties, by arm:') +
    bullets(study.arms.map((arm) => `‘${arm.name}’: ${networkWords(arm)}`))
  );
}

/** How an arm's ties come about. */
export function networkWords(arm: ArmFile): string {
  const { network } = arm;
  if ('from' in network) {
    const { mixing } = network;
    if (mixing === undefined) return `the ties of ‘${network.from}’.`;
    const keep = 'every household keeps its number of ties (degree-preserving swaps, Maslov and Sneppen 2002).';
    if ('share' in mixing)
      return `the ties of ‘${network.from}’ with ${pct(mixing.share)} of them swapped at random; ${keep}`;
    const target = {
      assortativity: 'assortativity of wealth rank',
      economic_connectedness: 'economic connectedness',
      e_i_group: 'the E–I index of groups',
    }[mixing.target];
    return `the ties of ‘${network.from}’ swapped until ${target} is ${num(mixing.value)}; ${keep}`;
  }
  const within = (n: { within_place?: number | undefined; within_group?: number | undefined }): string =>
    `${n.within_place === undefined ? '' : `; ${pct(n.within_place)} of a household’s ties are expected to stay in its place`}` +
    `${n.within_group === undefined ? '' : `; of these ${pct(n.within_group)} in its group`}`;
  switch (network.kind) {
    case 'blocks':
      return `random ties over places and groups (stochastic block model), ${num(network.mean_degree)} a household on average${within(network)}.`;
    case 'similarity':
      return `ties more likely between households of similar wealth rank (strength ${num(network.strength)}), ${num(network.mean_degree)} a household on average.`;
    case 'ring':
      return `a ring of households in ${network.order === 'random' ? 'random order' : `order of ${network.order}`}, ${network.degree} ties each, ${pct(network.rewire)} of them rewired (Watts and Strogatz 1998).`;
    case 'random':
      return `ties at random (Erdős and Rényi 1959), ${num(network.mean_degree)} a household on average.`;
    case 'preferential':
      return `growth with preferential attachment, ${network.ties} ties a newcomer (Barabási and Albert 1999).`;
    case 'spatial':
      return `ties between near households, places laid out in the plane (spread ${num(network.spread)}), ${num(network.mean_degree)} a household on average.`;
    case 'configuration':
      return `ties with given numbers a household (${network.degrees.kind === 'file' ? `from ${network.degrees.path}` : `${network.degrees.kind}, mean ${num(network.degrees.mean)}`})${within(network)}.`;
    case 'file':
      return `the ties of the file ${network.path}.`;
    case 'named':
      return `the graph known as ${network.name}.`;
  }
}

function inputData(study: Study): string {
  const files = new Set<string>();
  if (study.population.households_file !== undefined) files.add(study.population.households_file);
  if (study.population.wealth?.sample !== undefined) files.add(study.population.wealth.sample.file);
  for (const { network } of study.arms) {
    if ('from' in network) continue;
    if (network.kind === 'file') files.add(network.path);
    if (network.kind === 'configuration' && network.degrees.kind === 'file') files.add(network.degrees.path);
  }
  return files.size === 0
    ? p('None: households, ties and luck are drawn from the distributions stated; nothing from outside drives the run.')
    : p(
        `Read at the start: ${list([...files])}. Nothing from outside drives the run afterwards. Files with people in them belong on the researcher’s own machine, without names or identifiers.`,
      );
}

function submodels(study: Study): string {
  const base = armSettings(study, study.arms[0]);
  const shared: [string, string][] = [
    ['Aspirations', referenceWords(base.reference)],
    ['Preferences', preferenceWords(base.preferences)],
    ['Technology', technologyWords(base.technology)],
    ['Shocks', shockWords(base.shock)],
    ['Choice', choiceWords(base)],
    [
      'Frustration',
      'A milestone is met when the plan reaches it, z ≥ a. A household is frustrated when it meets none, satisfied when it meets at least one.',
    ],
    [
      'Pockets',
      `A core household has been frustrated for at least ${count(study.pockets.min_spell, 'generation')} in a row and at least ${pct(study.pockets.core_share)} of its ties are frustrated. ` +
        `A pocket is a connected set of at least ${study.pockets.min_size} core households. Its p-value is the share of ${study.pockets.permutations} random reshufflings of statuses ` +
        `${study.pockets.null === 'everyone' ? 'over everyone' : 'within places'} whose largest pocket is at least as large.`,
    ],
  ];
  const own = study.arms.slice(1).flatMap((arm) => differences(study, arm, base));
  return (
    `<dl>${shared.map(([name, text]) => `<dt>${safe(name)}</dt><dd>${safe(text)}</dd>`).join('')}</dl>` +
    (own.length === 0 ? p(study.arms.length > 1 ? 'The same in every arm.' : '') : bullets(own))
  );
}

function differences(study: Study, arm: ArmFile, base: ArmSettings): string[] {
  const mine = armSettings(study, arm);
  const out: string[] = [];
  const differ = (a: unknown, b: unknown): boolean => JSON.stringify(a) !== JSON.stringify(b);
  if (differ(mine.reference, base.reference)) out.push(referenceWords(mine.reference));
  if (differ(mine.preferences, base.preferences)) out.push(preferenceWords(mine.preferences));
  if (differ(mine.technology, base.technology)) out.push(technologyWords(mine.technology));
  if (differ(mine.shock, base.shock)) out.push(shockWords(mine.shock));
  return out.map((text) => `In ‘${arm.name}’: ${text}`);
}

const STATISTIC = {
  mean: 'mean wealth of',
  median: 'median wealth of',
  quantile: 'quantile of the wealth of',
  upward_mean: 'mean wealth of those richer than itself among',
  similarity_mean: 'mean wealth, weighted by similarity, of',
  max: 'highest wealth among',
} as const;

/** How aspirations are formed. */
export function referenceWords(reference: ReferenceFile): string {
  const many = reference.milestones.length > 1;
  const milestones = reference.milestones.map((milestone, m) => {
    const parts = milestone.mix.map((part) => {
      const what =
        part.from === 'self'
          ? 'own wealth'
          : `the ${part.statistic === 'quantile' ? `${num(part.q ?? NaN)} ` : ''}${STATISTIC[part.statistic]} ${FROM[part.from]}`;
      return `${num(part.weight)} × ${what}${part.window === undefined ? '' : ` (window ${num(part.window)} in log wealth)`}`;
    });
    return (
      `${many ? `milestone ${m + 1} (weight π = ${num(milestone.weight)})` : `the aspiration`} is ` +
      `${milestone.scale === 1 ? '' : `${num(milestone.scale)} times the sum of `}${parts.join(' + ')}`
    );
  });
  const inherited =
    reference.persistence > 0
      ? ` A share φ = ${num(reference.persistence)} is inherited from the parent’s aspiration.`
      : '';
  return `${sentence(milestones.join('; '))}.${inherited} Without ties, own wealth stands in for the missing part.`;
}

function preferenceWords(preferences: PreferencesFile): string {
  const shape =
    preferences.milestone_shape === 'threshold'
      ? `b(z, a) = (z − a)^(1−η)/(1−η) beyond the milestone and 0 below it, η = ${num(preferences.milestone_curvature ?? preferences.curvature)}`
      : `b(z, a) = v(z) − v(a), a shortfall counting ${num(preferences.loss_aversion ?? 1)} times (loss aversion)`;
  return (
    `U = u(c) + δ·[v(z) + Σ π·b(z, a)], with constant relative risk aversion σ = ${num(preferences.curvature)} in consumption c and child wealth z, ` +
    `child weight δ = ${num(preferences.child_weight)}${preferences.child_weight_spread > 0 ? ` (lognormal over households, spread ${num(preferences.child_weight_spread)})` : ''}; ${shape}.`
  );
}

function technologyWords(technology: TechnologyFile): string {
  return technology.kind === 'linear'
    ? `Child wealth is z = R·k with gross return R = ${num(technology.gross_return)} a generation.`
    : `Child wealth is z = A·k^α + (1 − d)·k with A = ${num(technology.scale)}, α = ${num(technology.elasticity)}, d = ${num(technology.depreciation)}: each further unit of investment gives less.`;
}

function shockWords(shock: ShockFile): string {
  if (shock.sd_log === 0) return 'None: a plan comes true.';
  return (
    `Child wealth is multiplied by luck of mean 1 whose log has standard deviation ${num(shock.sd_log)}` +
    `${shock.shared_by_place > 0 ? `, ${pct(shock.shared_by_place)} of its variance common to a place` : ', independent between households'}. ` +
    (shock.risk === 'planned' ? 'Households plan as if it were 1.' : 'Households maximise expected utility over it.')
  );
}

function choiceWords(base: ArmSettings): string {
  return (
    'The household chooses consumption c and investment k with c + k = y and k ≥ 0 (no borrowing) to maximise U. ' +
    `${base.reference.milestones.length > 1 ? 'Between milestones' : 'Below and beyond the milestone'} the problem has one peak each; the best of them is the choice, found to a relative error below 10⁻⁹; a tie goes to the higher plan.`
  );
}
