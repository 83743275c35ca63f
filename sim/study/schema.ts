/**
 * The study file: what a user may write, in one definition.
 *
 * Types, validation, the JSON Schema that editors use, the defaults and the explanations of the study sheet all
 * come from here. Each field's `describe` is one sentence for the user, `usual` what the literature tends to
 * use (*common practice* unless a source is named). Checks that need two fields at once are in check.ts;
 * positions in errors are parse.ts.
 */
import { z } from 'zod';
import { Estimates } from './estimates.js';

/** What the study sheet shows beside a field. */
interface Note {
  readonly title: string;
  readonly usual?: string;
  /** True for what the sheet leaves to the text beside it. */
  readonly textOnly?: boolean;
  readonly [key: string]: unknown;
}

function note<S extends z.ZodType>(schema: S, title: string, sentence: string, usual?: string): S {
  const meta: Note = usual === undefined ? { title } : { title, usual };
  return schema.describe(sentence).meta({ ...meta, description: sentence }) as S;
}

const share = z.number().min(0).max(1);
const positive = z.number().gt(0);
const filePath = z.string().min(1);

/** Names in tables and on screen: one line, not empty, no control characters. */
const name = z
  .string()
  .min(1)
  .max(80)
  .regex(/^[^\p{Cc}]*$/u, 'must be one line of text');

// ── preferences, technology, shock ──────────────────────────────────────────────────────────────

const preferenceFields = {
  curvature: note(
    positive,
    'Curvature',
    'How fast the worth of one more unit of consumption falls with wealth (CRRA σ).',
    '0.5 to 2; below 1 growth can be bounded away from zero at every aspiration',
  ),
  child_weight: note(
    positive,
    'Child weight',
    'How much the child’s wealth counts beside own consumption (δ).',
    '0.2 to 1',
  ),
  milestone_shape: note(
    z.enum(['threshold', 'gain-loss']),
    'Milestone shape',
    'threshold: only wealth beyond the milestone adds satisfaction. gain-loss: falling short also hurts.',
  ),
  milestone_curvature: note(
    z.number().gt(0).lt(1),
    'Milestone curvature',
    'How fast the satisfaction beyond a milestone flattens (η), threshold shape; the curvature unless given.',
    'equal to the curvature',
  ),
  loss_aversion: note(
    z.number().min(1),
    'Loss aversion',
    'How much more a shortfall weighs than a gain of the same size (λ), gain-loss shape.',
    '1.5 to 2.5',
  ),
  child_weight_spread: note(
    z.number().min(0).max(3),
    'Spread of child weight',
    'Standard deviation of the log of child weight across households; 0 makes all households alike.',
    '0 to 0.5',
  ),
};

const Preferences = z.strictObject({
  curvature: preferenceFields.curvature,
  child_weight: preferenceFields.child_weight,
  milestone_shape: preferenceFields.milestone_shape.default('threshold'),
  milestone_curvature: preferenceFields.milestone_curvature.optional(),
  loss_aversion: preferenceFields.loss_aversion.optional(),
  child_weight_spread: preferenceFields.child_weight_spread.default(0),
});

const PartialPreferences = z.strictObject({
  curvature: preferenceFields.curvature.optional(),
  child_weight: preferenceFields.child_weight.optional(),
  milestone_shape: preferenceFields.milestone_shape.optional(),
  milestone_curvature: preferenceFields.milestone_curvature.optional(),
  loss_aversion: preferenceFields.loss_aversion.optional(),
  child_weight_spread: preferenceFields.child_weight_spread.optional(),
});

const grossReturn = note(
  positive,
  'Gross return',
  'Child wealth per unit invested, a gross factor per generation (R).',
  '2 to 4 over 25 years (3 to 6 % a year)',
);
const scale = note(positive, 'Scale', 'Child wealth that one unit of investment gives (A).');
const elasticity = note(
  z.number().gt(0).lt(1),
  'Elasticity',
  'Per cent more child wealth from one per cent more investment (α).',
  '0.3 to 0.7',
);
const depreciation = note(
  share,
  'Depreciation',
  'Share of the invested capital that is used up within the generation (d).',
  '1 over a generation',
);

const Technology = z.discriminatedUnion('kind', [
  z.strictObject({ kind: z.literal('linear'), gross_return: grossReturn }),
  z.strictObject({ kind: z.literal('concave'), scale, elasticity, depreciation: depreciation.default(1) }),
]);

/** An arm changes single keys of the technology; naming a kind replaces it. */
const PartialTechnology = z.strictObject({
  kind: note(
    z.enum(['linear', 'concave']),
    'Kind',
    'linear: every unit invested brings the same. concave: the more is invested, the less the next unit brings.',
  ).optional(),
  gross_return: grossReturn.optional(),
  scale: scale.optional(),
  elasticity: elasticity.optional(),
  depreciation: depreciation.optional(),
});

const sdLog = note(
  z.number().min(0).max(3),
  'Shock',
  'Standard deviation of the log of the luck that falls on child wealth; its mean is 1.',
  '0.1 to 0.5 over a generation',
);
const sharedByPlace = note(
  share,
  'Shared by place',
  'Share of that luck’s log variance that all households of a place have in common.',
  '0 to 0.5',
);
const risk = note(
  z.enum(['planned', 'expected']),
  'Risk',
  'planned: households decide as if luck were 1. expected: they weigh the luck that may fall.',
);

const Shock = z.strictObject({
  sd_log: sdLog.default(0),
  shared_by_place: sharedByPlace.default(0),
  risk: risk.default('planned'),
});

const PartialShock = z.strictObject({
  sd_log: sdLog.optional(),
  shared_by_place: sharedByPlace.optional(),
  risk: risk.optional(),
});

// ── reference groups ────────────────────────────────────────────────────────────────────────────

const Part = z.strictObject({
  from: note(
    z.enum(['self', 'neighbours', 'second_circle', 'group', 'place', 'society']),
    'Whom they look at',
    'The households this part is taken over: itself, its ties, the ties of its ties, its group, its place, or everyone.',
  ),
  statistic: note(
    z.enum(['mean', 'median', 'quantile', 'upward_mean', 'similarity_mean', 'max']),
    'Statistic',
    'What is taken of their wealth; upward_mean is the mean over those richer than the household.',
    'upward_mean for neighbours: surveys find that people look up, not down',
  ).default('mean'),
  weight: note(share, 'Weight', 'Weight of this part; the weights of a mix sum to 1.'),
  q: note(share, 'Quantile', 'Which quantile (0 to 1, type 7), for the statistic quantile.').optional(),
  window: note(
    positive,
    'Similarity window',
    'How far apart in log wealth households may be and still count, for similarity_mean (h).',
    '0.2 to 1',
  ).optional(),
});

const Milestone = z.strictObject({
  weight: note(z.number().min(0), 'Weight', 'How much satisfaction beyond this milestone counts (π).', '0.3 to 1.5'),
  scale: note(
    positive,
    'Scale',
    'Multiplies the mix: 1.2 aspires to a fifth more than what is seen.',
    '0.8 to 1.5',
  ).default(1),
  mix: note(
    z.array(Part).min(1),
    'Mix',
    'The parts the milestone is made of, each a statistic over a set of households with a weight.',
  ),
});

const persistence = note(
  z.number().min(0).lt(1),
  'Persistence',
  'Weight of the aspiration inherited from the parent against what is seen now (φ).',
  '0 to 0.5',
);
const milestones = note(
  z.array(Milestone).min(1).max(4),
  'Milestones',
  'One to four milestones, each with its own mix.',
);

const Reference = z.strictObject({ persistence: persistence.default(0), milestones });
const PartialReference = z.strictObject({ persistence: persistence.optional(), milestones: milestones.optional() });

// ── population ──────────────────────────────────────────────────────────────────────────────────

const Places = z.union([
  z.int().min(1),
  z.strictObject({
    count: note(z.int().min(1), 'Places', 'Number of places.'),
    size_cv: note(
      z.number().min(0).max(3),
      'Spread of place sizes',
      'Coefficient of variation of the number of households in a place; 0 makes them equal.',
      '0 to 0.6',
    ).default(0),
  }),
]);

const Group = z.strictObject({
  name: note(name, 'Name', 'What the group is called in tables and on screen.'),
  share: note(share, 'Share', 'Share of households in this group; the shares sum to 1.').optional(),
  relative_wealth: note(
    positive,
    'Relative wealth',
    'Multiplies the wealth of the group’s households before everything is rescaled to the mean.',
    '0.3 to 1',
  ).optional(),
  preferences: note(
    PartialPreferences,
    'Own preferences',
    'What this group’s households weigh differently; the rest as in preferences.',
  ).optional(),
});

const Wealth = z.strictObject({
  shape: note(
    z.enum(['lognormal', 'pareto_tail', 'quantile_shares', 'sample']),
    'Shape',
    'The distribution of initial wealth: lognormal, lognormal with a Pareto tail, shares by quantile group, or a survey column.',
  ),
  mean: note(
    positive,
    'Mean',
    'Mean wealth in the currency unit; with sample, the sample’s own mean unless given.',
  ).optional(),
  gini: note(
    z.number().min(0).lt(1),
    'Gini',
    'Gini coefficient of the lognormal (or of the body of a Pareto tail).',
    '0.3 to 0.8 for wealth',
  ).optional(),
  sd_log: note(
    z.number().min(0).max(5),
    'Spread',
    'Standard deviation of log wealth, instead of a Gini.',
    '0.4 to 1.2',
  ).optional(),
  between_places: note(
    share,
    'Between places',
    'Share of the variance of log wealth that lies between places rather than within them.',
    '0.1 to 0.5',
  ).default(0),
  pareto_tail: note(
    z.strictObject({
      above_quantile: note(z.number().gt(0).lt(1), 'Above quantile', 'Where the tail begins.', '0.9 to 0.99'),
      exponent: note(z.number().gt(1), 'Exponent', 'Pareto exponent of the tail.', '1.3 to 2.5'),
    }),
    'Pareto tail',
    'Wealth above a quantile follows the Pareto law.',
  ).optional(),
  quantile_shares: note(
    z.array(z.number().gt(0).lt(1)).min(2).max(1000),
    'Quantile shares',
    'Share of all wealth held by each of equally many households, poorest first; they sum to 1.',
  ).optional(),
  sample: note(
    z.strictObject({
      file: note(filePath, 'File', 'A CSV with one row a surveyed household.'),
      column: note(z.string().min(1), 'Column', 'The column that holds wealth.'),
      weight: note(z.string().min(1), 'Weight', 'The column that holds survey weights; equal unless given.').optional(),
    }),
    'Sample',
    'Wealth resampled from a survey column, with survey weights if named.',
  ).optional(),
});

const Population = z.strictObject({
  households: note(
    z.int().min(2).max(20_000_000),
    'Households',
    'Number of households (dynasties).',
    'as many as the survey or programme area has',
  ).optional(),
  places: note(Places, 'Places', 'Villages, neighbourhoods or schools: a number, or count and size_cv.').optional(),
  groups: note(
    z.array(Group).min(1).max(200),
    'Groups',
    'Social groups with their share, relative wealth and own preferences.',
  ).optional(),
  wealth: note(Wealth, 'Wealth', 'How initial wealth is distributed.').optional(),
  households_file: note(
    filePath,
    'Households file',
    'A CSV with columns household, wealth [, place, group, x_…] instead of drawing households.',
  ).optional(),
});

// ── networks ────────────────────────────────────────────────────────────────────────────────────

const meanDegree = note(positive, 'Ties each', 'Expected number of ties of a household.', '5 to 20 for close ties');
const withinPlace = note(
  share,
  'Within place',
  'Expected share of a household’s ties that stay in its place.',
  '0.6 to 0.97',
);
const withinGroup = note(
  share,
  'Within group',
  'Expected share of a household’s ties that stay in its group; without it, as if group did not matter.',
  '0.5 to 0.95',
);

const Degrees = z.discriminatedUnion('kind', [
  z.strictObject({ kind: z.literal('poisson'), mean: meanDegree }),
  z.strictObject({
    kind: z.literal('lognormal'),
    mean: meanDegree,
    sd_log: note(
      z.number().min(0).max(3),
      'Spread of ties',
      'Standard deviation of the log of the number of ties.',
      '0.3 to 1',
    ),
  }),
  z.strictObject({
    kind: z.literal('file'),
    path: note(filePath, 'File', 'A CSV with the number of ties of each household, one row a household.'),
    column: note(z.string().min(1), 'Column', 'The column that holds the number of ties.').optional(),
  }),
]);

const BuiltNetwork = z.discriminatedUnion('kind', [
  z.strictObject({
    kind: z.literal('blocks'),
    mean_degree: meanDegree,
    within_place: withinPlace.optional(),
    within_group: withinGroup.optional(),
  }),
  z.strictObject({
    kind: z.literal('similarity'),
    mean_degree: meanDegree,
    strength: note(
      share,
      'Strength',
      'How strongly ties prefer households of similar wealth rank; 0 is no preference.',
      '0.3 to 0.9',
    ),
  }),
  z.strictObject({
    kind: z.literal('ring'),
    degree: note(z.int().min(2), 'Ties each', 'Ties of a household on the ring before rewiring (even).'),
    rewire: note(share, 'Rewired', 'Share of ties moved to a random household.', '0.01 to 0.2').default(0),
    order: note(z.enum(['wealth', 'random', 'place']), 'Order', 'What orders the households along the ring.').default(
      'random',
    ),
  }),
  z.strictObject({ kind: z.literal('random'), mean_degree: meanDegree }),
  z.strictObject({
    kind: z.literal('preferential'),
    ties: note(z.int().min(1), 'Ties of a newcomer', 'Ties each household makes when it joins.', '2 to 10'),
  }),
  z.strictObject({
    kind: z.literal('spatial'),
    mean_degree: meanDegree,
    spread: note(
      z.number().min(0),
      'Spread',
      'How far a place’s households lie apart, in distances between places; 0 is one spot.',
      '0.1 to 0.5',
    ),
  }),
  z.strictObject({
    kind: z.literal('configuration'),
    degrees: note(Degrees, 'Degrees', 'How many ties each household has.'),
    within_place: withinPlace.optional(),
    within_group: withinGroup.optional(),
  }),
  z.strictObject({
    kind: z.literal('file'),
    path: note(filePath, 'File', 'An edge list (.csv: source,target[,weight]) or .graphml.'),
  }),
  z.strictObject({ kind: z.literal('named'), name: note(z.string().min(1), 'Name', 'A small graph known by name.') }),
]);

const bestEffort = note(
  z.boolean(),
  'Best effort',
  'Accept the nearest value when the target is out of reach, instead of stopping.',
).default(false);

const Mixing = z.union([
  z.strictObject({ share: note(share, 'Share swapped', 'Share of ties that random degree-preserving swaps move.') }),
  z.strictObject({
    target: note(
      z.enum(['assortativity', 'economic_connectedness', 'e_i_group']),
      'Target',
      'What the swaps steer: assortativity of wealth rank, economic connectedness, or the E–I index of groups.',
    ),
    value: note(z.number(), 'Value', 'The value to reach.'),
    best_effort: bestEffort,
  }),
]);

const DerivedNetwork = z.strictObject({
  from: note(name, 'From arm', 'The arm whose ties are taken.'),
  mixing: note(Mixing, 'Mixing', 'How those ties are rearranged; every household keeps its number of ties.').optional(),
});

const Network = z.union([BuiltNetwork, DerivedNetwork]);

const Arm = z.strictObject({
  name: note(name, 'Name', 'What the arm is called in tables and on screen.'),
  network: note(Network, 'Network', 'How this arm’s ties are arranged.'),
  technology: note(PartialTechnology, 'Own technology', 'What this arm changes of the technology.').optional(),
  shock: note(PartialShock, 'Own shock', 'What this arm changes of the shock.').optional(),
  preferences: note(PartialPreferences, 'Own preferences', 'What this arm changes of the preferences.').optional(),
  reference: note(PartialReference, 'Own reference', 'What this arm changes of the reference groups.').optional(),
});

// ── pockets, keeping, the whole ─────────────────────────────────────────────────────────────────

const Pockets = z.strictObject({
  min_spell: note(
    z.int().min(1),
    'Shortest spell',
    'Generations in a row a core household must have been frustrated.',
  ).default(2),
  core_share: note(share, 'Core share', 'Share of a core household’s ties that must be frustrated.').default(0.5),
  min_size: note(z.int().min(1), 'Smallest pocket', 'Core households that make a pocket.').default(5),
  permutations: note(
    z.int().min(0).max(99_999),
    'Permutations',
    'Random reshufflings of status behind a p-value.',
    '199 to 999',
  ).default(199),
  null: note(
    z.enum(['everyone', 'within_place']),
    'Null',
    'Whether statuses are reshuffled over everyone or within each place.',
  ).default('everyone'),
});

const Keep = z.strictObject({
  panel: note(
    z.union([
      z.enum(['all', 'none']),
      z.strictObject({
        replicates: note(z.int().min(1), 'Replicates', 'The first so many replicates are kept.').optional(),
        every: note(z.int().min(1), 'Every', 'Every so many generations, from 0.').optional(),
        households: note(z.int().min(1), 'Households', 'So many households, spread evenly over the list.').optional(),
      }),
    ]),
    'Panel',
    'Which household rows are written: all, none, or a part; the indicators always use everything.',
  ).default('all'),
  formats: note(
    z.array(z.enum(['parquet', 'csv'])).min(1),
    'Formats',
    'Formats of the panel, households and ties.',
  ).default(['parquet']),
  local_moran: note(
    z.boolean(),
    'Local Moran',
    'Adds to the panel each household’s local Moran statistic of log wealth and its p-value.',
  ).default(false),
});

/** The study as written: defaults of single fields are filled in by parsing, those that need others by complete.ts. */
export const StudyFile = z.strictObject({
  study: note(z.string().min(1).max(200), 'Title', 'What the study is called.'),
  seed: note(z.union([z.string().min(1), z.number()]), 'Seed', 'Any text; the same seed gives the same numbers.'),
  replicates: note(
    z.int().min(1).max(100_000),
    'Replicates',
    'Independent draws of households, ties and luck.',
    '20 to 200',
  ).default(1),
  generations: note(z.int().min(1).max(10_000), 'Generations', 'Decisions simulated, t = 0 … T − 1.', '5 to 20'),
  years_per_generation: note(positive, 'Years per generation', 'Only used to state annual rates.', '25 to 30').default(
    25,
  ),
  currency: note(z.string().min(1).max(80), 'Currency', 'The unit of all wealth.').default('wealth units'),
  population: note(Population, 'Population', 'Who the households are.'),
  technology: note(Technology, 'Technology', 'How investment becomes child wealth.'),
  shock: note(Shock, 'Shock', 'The luck that falls on child wealth.').prefault({}),
  preferences: note(Preferences, 'Preferences', 'What households weigh.'),
  reference: note(Reference, 'Reference groups', 'Whom households look at when they form aspirations.'),
  arms: note(z.array(Arm).min(1).max(50), 'Arms', 'The networks compared, on the same households and the same luck.'),
  pockets: note(Pockets, 'Pockets', 'What counts as a local aspiration trap, and how it is tested.').prefault({}),
  keep: note(Keep, 'Keep', 'What is written.').prefault({}),
  estimates: Estimates.optional().meta({
    title: 'Estimates',
    description: 'Regressions run on the panel after the study.',
    textOnly: true,
  } satisfies Note & { description: string }),
});

export type StudyFile = z.output<typeof StudyFile>;
export type StudyFileInput = z.input<typeof StudyFile>;
export type PreferencesFile = z.output<typeof Preferences>;
export type PartialPreferencesFile = z.output<typeof PartialPreferences>;
export type TechnologyFile = z.output<typeof Technology>;
export type ShockFile = z.output<typeof Shock>;
export type ReferenceFile = z.output<typeof Reference>;
export type GroupFile = z.output<typeof Group>;
export type WealthFile = z.output<typeof Wealth>;
export type BuiltNetworkFile = z.output<typeof BuiltNetwork>;
export type DerivedNetworkFile = z.output<typeof DerivedNetwork>;
export type ArmFile = z.output<typeof Arm>;
export type PocketsFile = z.output<typeof Pockets>;
export type KeepFile = z.output<typeof Keep>;

/** Keys that a later version will read; refused with a sentence until then. */
export const NOT_YET: Readonly<Record<string, string>> = {
  changes: 'programme changes cannot be simulated in this version',
  ties: 'ties that change over the generations cannot be simulated in this version',
};

/** The JSON Schema (draft 2020-12) of the study file, for editors. */
export function studyJsonSchema(): Record<string, unknown> {
  return {
    ...(z.toJSONSchema(StudyFile, { io: 'input', unrepresentable: 'any' }) as Record<string, unknown>),
    title: 'Study file',
  };
}
