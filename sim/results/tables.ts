/**
 * The tables of a results folder: one row per what, and their columns in order.
 *
 * The panel's columns are in columns.ts; those of the indicators and the evidence for regimes come from the measures'
 * registries by way of the facts.
 */
import { panelColumns } from './columns.js';
import type { Entry, Facts } from './facts.js';
import type { Field, FieldType } from './field.js';

export const TABLE_NAMES = [
  'panel',
  'households',
  'ties',
  'indicators',
  'contrasts',
  'incidence',
  'transitions',
  'pockets',
  'regimes',
  'frustration',
] as const;
export type TableName = (typeof TABLE_NAMES)[number];

export interface Table {
  readonly name: TableName;
  readonly title: string;
  readonly rowPer: string;
  /** Columns that together name a row. */
  readonly key: readonly string[];
  /** `kept`: in the formats the study keeps; `csv`: always CSV. */
  readonly formats: 'kept' | 'csv';
  /** `parts`: rows come arm by arm and replicate by replicate; `whole`: computed from all of them at the end. */
  readonly made: 'parts' | 'whole';
  readonly fields: readonly Field[];
}

/** A file format a table can be written in. */
export type Format = 'parquet' | 'csv';

/** Formats a table is written in when the study keeps `kept`. */
export function formatsOf(table: Table, kept: readonly Format[]): readonly Format[] {
  return table.formats === 'kept' ? kept : ['csv'];
}

function field(
  name: string,
  type: FieldType,
  unit: string,
  meaning: string,
  formula: string,
  missing: string | null = null,
): Field {
  return { name, type, unit, meaning, formula, missing };
}

function measured(entry: Entry): Field {
  const formula = entry.source === '' ? entry.formula : `${entry.formula} (${entry.source})`;
  return field(entry.name, entry.type ?? 'number', entry.unit, entry.meaning, formula, 'not defined there');
}

const ENDED = 'the pocket has ended';

/** All tables of a run. */
export function tablesOf(facts: Facts): Table[] {
  const panel = panelColumns(facts);
  const shared = (name: string): Field => {
    const found = panel.find((column) => column.name === name);
    if (found === undefined) throw new Error(`the panel has no column ${name}`);
    return found;
  };
  const arm = shared('arm');
  const replicate = shared('replicate');
  const unit = facts.currency;
  const generation = field(
    'generation',
    'integer',
    '',
    'Generation t; the last one, T, holds the children of the last decision.',
    '0 … T',
  );
  return [
    {
      name: 'panel',
      title: 'Panel',
      rowPer: 'arm × replicate × generation × household, in that order',
      key: ['arm', 'replicate', 'generation', 'household'],
      formats: 'kept',
      made: 'parts',
      fields: panel,
    },
    {
      name: 'households',
      title: 'Households',
      rowPer: 'arm × replicate × household',
      key: ['arm', 'replicate', 'household'],
      formats: 'kept',
      made: 'parts',
      fields: [
        arm,
        replicate,
        shared('household'),
        ...(facts.placeNames
          ? [
              field(
                'household_id',
                'text',
                '',
                'Id of the household in the household file.',
                'as in the household file',
              ),
            ]
          : []),
        shared('place'),
        ...(facts.placeNames
          ? [field('place_name', 'text', '', 'Name of the place.', 'as in the household file')]
          : []),
        shared('group'),
        field('degree', 'integer', 'ties', 'Ties the household has at the start.', 'number of ties in generation 0'),
        field(
          'strength',
          'number',
          '',
          'Sum of the weights of its ties at the start.',
          'Σ weight; the degree where all ties weigh 1',
        ),
        field(
          'clustering',
          'number',
          'share',
          'Share of the pairs among its ties that have a tie to each other, at the start.',
          'closed pairs / pairs (Watts and Strogatz 1998)',
          'fewer than two ties',
        ),
        ...(facts.betweenness
          ? [
              field(
                'betweenness',
                'number',
                'pairs',
                'On how many shortest paths between two others it lies, at the start; weights play no part.',
                'Σ over pairs of the share of their shortest paths through it, not normalised (Brandes 2001)',
              ),
            ]
          : []),
        field(
          'child_weight',
          'number',
          '',
          'Weight δ on the child in the household’s preferences.',
          'δ after group and spread',
        ),
        shared('treated'),
        ...facts.covariates.map(({ name, type }) =>
          field(
            name,
            type,
            '',
            'Covariate of the household file.',
            'as in the household file',
            'missing in the household file',
          ),
        ),
      ],
    },
    {
      name: 'ties',
      title: 'Ties',
      rowPer: 'arm × replicate × tie',
      key: ['arm', 'replicate', 'source', 'target', 'from_generation'],
      formats: 'kept',
      made: 'parts',
      fields: [
        arm,
        replicate,
        field('from_generation', 'integer', '', 'First generation in which the tie stands.', '0 … T − 1'),
        field('to_generation', 'integer', '', 'Last generation in which the tie stands.', '0 … T − 1'),
        field('source', 'integer', '', 'Household at one end.', 'source < target'),
        field('target', 'integer', '', 'Household at the other end.', 'source < target'),
        field('weight', 'number', '', 'Weight of the tie.', '1 where ties have no weights'),
      ],
    },
    {
      name: 'indicators',
      title: 'Indicators',
      rowPer: 'arm × replicate × generation',
      key: ['arm', 'replicate', 'generation'],
      formats: 'csv',
      made: 'parts',
      fields: [arm, replicate, generation, ...facts.indicators.map(measured)],
    },
    {
      name: 'contrasts',
      title: 'Contrasts between arms',
      rowPer: 'pair of arms × indicator × generation',
      key: ['arm', 'baseline', 'indicator', 'generation'],
      formats: 'csv',
      made: 'whole',
      fields: [
        arm,
        field('baseline', 'text', '', 'Arm compared with.', 'name in the study file'),
        field('indicator', 'text', '', 'What is compared.', 'a column of the indicators'),
        generation,
        field(
          'difference',
          'number',
          'that of the indicator',
          'Mean over replicates of arm minus baseline.',
          'd̄ = mean of paired differences d',
        ),
        field(
          'mc_se',
          'number',
          'that of the indicator',
          'Monte Carlo standard error of the difference.',
          'sd(d)/√replicates',
          'fewer than two replicates',
        ),
        field(
          'ci_low',
          'number',
          'that of the indicator',
          'Lower end of the 95 % interval.',
          'd̄ − t(0.975, replicates − 1)·mc_se',
          'fewer than two replicates',
        ),
        field(
          'ci_high',
          'number',
          'that of the indicator',
          'Upper end of the 95 % interval.',
          'd̄ + t(0.975, replicates − 1)·mc_se',
          'fewer than two replicates',
        ),
        field('replicates', 'integer', 'replicates', 'Replicates in which both arms have the indicator.', 'count'),
        field(
          'p_value',
          'number',
          '',
          'p-value of no difference, two-sided.',
          'paired t test',
          'fewer than two replicates, or no spread',
        ),
        field(
          'variance_ratio',
          'number',
          '',
          'Variance of the paired difference over that of an unpaired one: below 1 where shared luck helps.',
          'var(d) / (var(arm) + var(baseline))',
          'fewer than two replicates, or no spread',
        ),
      ],
    },
    {
      name: 'incidence',
      title: 'Growth incidence curves',
      rowPer: 'arm × generation × percentile',
      key: ['arm', 'generation', 'percentile'],
      formats: 'csv',
      made: 'whole',
      fields: [
        arm,
        field('generation', 'integer', '', 'Generation t that grows into t + 1.', '0 … T − 1'),
        field('percentile', 'number', '', 'Percentile of wealth, the poorest first.', 'p in 0 … 100'),
        field(
          'growth',
          'number',
          'gross factor per generation',
          'Growth of the percentile, whoever is in it (anonymous).',
          'quantile p of t + 1 / quantile p of t, mean over replicates',
          'not defined there',
        ),
        field(
          'growth_by_initial_rank',
          'number',
          'gross factor per generation',
          'Growth of the households that were in the percentile (non-anonymous).',
          'mean child wealth / mean wealth of those in percentile p at t, mean over replicates',
          'not defined there',
        ),
        field(
          'mc_se',
          'number',
          'gross factor per generation',
          'Monte Carlo standard error of growth.',
          'sd over replicates / √replicates',
          'fewer than two replicates',
        ),
        field(
          'mc_se_by_initial_rank',
          'number',
          'gross factor per generation',
          'Monte Carlo standard error of growth by initial rank.',
          'sd over replicates / √replicates',
          'fewer than two replicates',
        ),
      ],
    },
    {
      name: 'transitions',
      title: 'Transitions between fifths',
      rowPer: 'arm × generation span × quintile × quintile',
      key: ['arm', 'from_generation', 'to_generation', 'from_quintile', 'to_quintile'],
      formats: 'csv',
      made: 'whole',
      fields: [
        arm,
        field('from_generation', 'integer', '', 'Generation of the ancestors.', '0 … T − 1'),
        field('to_generation', 'integer', '', 'Generation of the descendants.', '1 … T'),
        field('from_quintile', 'integer', '', 'Fifth of wealth of the ancestor.', '1 poorest … 5 richest'),
        field('to_quintile', 'integer', '', 'Fifth of wealth of the descendant.', '1 poorest … 5 richest'),
        field(
          'share',
          'number',
          'share',
          'Share of the dynasties of the first fifth that are in the second.',
          'rows of a span sum to 1 over to_quintile; mean over replicates',
          'nobody is in the fifth',
        ),
      ],
    },
    {
      name: 'pockets',
      title: 'Pockets of frustration',
      rowPer: 'arm × replicate × generation × pocket',
      key: ['arm', 'replicate', 'generation', 'pocket'],
      formats: 'csv',
      made: 'parts',
      fields: [
        arm,
        replicate,
        field('generation', 'integer', '', 'Generation t that decides.', '0 … T − 1'),
        field('pocket', 'integer', '', 'Pocket; the same number is the same pocket over generations.', '0, 1, 2 …'),
        field(
          'size',
          'integer',
          'households',
          'Core households; 0 in the row that tells of its end.',
          'members of the connected component',
        ),
        field('fringe', 'integer', 'households', 'Frustrated ties of core households that are not core.', 'count'),
        field('places', 'integer', 'places', 'Places its core households live in.', 'count of different places'),
        field('mean_wealth', 'number', unit, 'Mean wealth of its core households.', 'mean of y', ENDED),
        field(
          'p_value',
          'number',
          '',
          'Share of permutations of statuses whose largest pocket is at least as large.',
          '(1 + count)/(1 + permutations); drawing stops once a tenth of the permutations have reached it (p above 0.1)',
          `${ENDED}, or no permutations were asked for`,
        ),
        field(
          'event',
          'text',
          '',
          'What happened to it since the generation before.',
          'born, holds, grows, shrinks (the same pocket by largest overlap of members, Jaccard ≥ 0.3), merges (took in at least half of another), splits (at least half of it out of parent), dissolves (gone), absorbed (gone, at least half of it into parent)',
          'not followed',
        ),
        field(
          'parent',
          'integer',
          '',
          'Pocket it came out of (splits) or went into (absorbed).',
          'number of that pocket',
          'the event has no other pocket',
        ),
        field(
          'local',
          'integer',
          'households',
          'Core households that only their own reference keeps from a milestone.',
          'count of cause local',
          'causes were not worked out',
        ),
        field(
          'general',
          'integer',
          'households',
          'Core households frustrated under the society-wide reference too.',
          'count of cause general',
          'causes were not worked out',
        ),
      ],
    },
    {
      name: 'regimes',
      title: 'Regimes',
      rowPer: 'arm × replicate',
      key: ['arm', 'replicate'],
      formats: 'csv',
      made: 'parts',
      fields: [
        arm,
        replicate,
        field(
          'regime',
          'text',
          '',
          'Where the arm is heading, from the last third of the horizon.',
          'rules on the evidence beside it',
        ),
        ...facts.evidence.map(measured),
      ],
    },
    {
      name: 'frustration',
      title: 'Frustration by part of society',
      rowPer: 'arm × replicate × generation × part',
      key: ['arm', 'replicate', 'generation', 'by', 'level'],
      formats: 'csv',
      made: 'parts',
      fields: [
        arm,
        replicate,
        field('generation', 'integer', '', 'Generation t that decides.', '0 … T − 1'),
        field(
          'by',
          'text',
          '',
          'How society is parted.',
          'group, place_quintile (places ranked by mean wealth) or wealth_quintile',
        ),
        field('level', 'text', '', 'The part.', 'name of the group, or 1 poorest … 5 richest'),
        field('households', 'integer', 'households', 'Households in it.', 'count'),
        field(
          'share_frustrated',
          'number',
          'share',
          'Share of them that meet no milestone.',
          'mean of frustrated',
          'nobody is in it',
        ),
        field(
          'mean_growth',
          'number',
          'gross factor per generation',
          'Mean of their growth.',
          'mean of growth',
          'nobody is in it',
        ),
      ],
    },
  ];
}

/** A table by name. */
export function tableNamed(tables: readonly Table[], name: TableName): Table {
  const found = tables.find((table) => table.name === name);
  if (found === undefined) throw new Error(`no table ${name}`);
  return found;
}
