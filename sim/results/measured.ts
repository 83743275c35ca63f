/**
 * Measures a replicate while it runs, and hands the rows to the tables.
 *
 * Listens to the loop, keeps what one generation needs of the one before, and turns what the measures say into
 * rows of indicators, frustration and pockets, columns of the panel, and the counts behind incidence and transitions.
 */
import { localMoran } from '../../network/measure/local-moran.js';
import { localPermutation } from '../../network/measure/local-permutation.js';
import { CAUSES, type Causes, causesOf } from '../measure/cause.js';
import { fatesOf, type Statuses } from '../measure/fates.js';
import { frustrationRows } from '../measure/frustration.js';
import { growthByInitialRank, growthIncidence } from '../measure/incidence.js';
import { INDICATORS, IndicatorContext, indicatorRow } from '../measure/indicators.js';
import { averageRanks, rankBins } from '../measure/order.js';
import type { PermutationPlan } from '../measure/permutations.js';
import { type PocketCensus, PocketTracker, pocketPlan } from '../measure/pocket-tracker.js';
import { type PocketRule, ROLES } from '../measure/pockets.js';
import { classifyRegime, observeRegime, type RegimeObservation, type RegimeVerdict } from '../measure/regime.js';
import type { Sample } from '../measure/sample.js';
import { type TieFacts, tieFacts } from '../measure/tie-facts.js';
import { countPairs } from '../measure/transitions.js';
import { stream } from '../random/stream.js';
import type { Study } from '../study/complete.js';
import type { ArmRecord, GenerationRecord } from '../study/record.js';
import type { Extras } from './columns.js';
import type { Entry, ExtraName, Facts } from './facts.js';
import type { PartWriter } from './parts.js';
import { encodePlane } from './plane.js';
import { keepsGeneration, keepsReplicate } from './thin.js';

/** Fifths of transitions. */
export const FIFTHS = 5;

/** Columns of evidence beside a regime: where the classification rests, in the words of regime.ts. */
const EVIDENCE: readonly (Entry & { readonly key: keyof RegimeVerdict })[] = (
  [
    ['from', 'window_from', 'First generation of the window looked at', 'last third of 0 … T', 'generation', 'integer'],
    ['to', 'window_to', 'Last generation of the window looked at', 'T', 'generation', 'integer'],
    [
      'sdLogFrom',
      'sd_log_from',
      'Standard deviation of log wealth at the start of the window',
      'sd of ln y',
      '',
      'number',
    ],
    ['sdLogTo', 'sd_log_to', 'Standard deviation of log wealth at its end', 'sd of ln y', '', 'number'],
    [
      'spreadTrend',
      'spread_trend',
      'Trend of that spread, relative to its mean',
      'least-squares slope / mean',
      'a generation',
      'number',
    ],
    [
      'levelTrend',
      'level_trend',
      'Trend of the median of log wealth',
      'least-squares slope',
      'log points a generation',
      'number',
    ],
    [
      'meanGrowth',
      'mean_growth',
      'Mean growth of mean wealth over the window',
      'mean of mean y(t+1) / mean y(t)',
      'gross factor per generation',
      'number',
    ],
    [
      'shareFrustrated',
      'share_frustrated',
      'Mean share frustrated over the window',
      'mean of share_frustrated',
      'share',
      'number',
    ],
    ['modes', 'modes', 'Most common number of modes of the log-wealth density', 'mode of modes', 'count', 'integer'],
    [
      'period',
      'period',
      'Generations after which the distribution returns to itself',
      'smallest period at which quantile profiles return',
      'generations',
      'integer',
    ],
    [
      'distance',
      'distance',
      'Mean distance of quantile profiles one period, or one generation, apart',
      'mean |ΔQ(p)| of ln y, p = 0.05 … 0.95',
      'log points',
      'number',
    ],
    [
      'moreGenerations',
      'more_generations',
      'Undecided: about how many more generations would tell',
      'steps carried on at their pace',
      'generations',
      'integer',
    ],
  ] as const
).map(([key, name, meaning, formula, unit, type]) => ({ key, name, meaning, formula, unit, type, source: '' }));

/** What the measures add to the tables of a study. */
export function measureFacts(study: Study): Pick<Facts, 'extras' | 'indicators' | 'evidence'> {
  const extras: ExtraName[] = ['pocket', 'pocket_role', 'cause', 'sheltered', 'complacent'];
  if (study.arms.length > 1) extras.push('contrast_frustrated');
  if (study.keep.local_moran) extras.push('local_moran', 'local_moran_p');
  return {
    extras,
    indicators: INDICATORS.map(
      ({ name, meaning, formula, source, unit }): Entry => ({
        name,
        meaning,
        formula,
        source,
        unit: unit === 'wealth' ? study.currency : unit,
      }),
    ),
    evidence: EVIDENCE,
  };
}

/** The study's rule for pockets in the words of the measures. */
export function pocketRule(study: Study): PocketRule {
  const { min_spell, core_share, min_size, permutations, null: nullModel } = study.pockets;
  return {
    minSpell: min_spell,
    coreShare: core_share,
    minSize: min_size,
    permutations,
    null: nullModel === 'within_place' ? 'place' : 'everyone',
  };
}

/** Who is frustrated in the arm a household's outcome is compared with: a column a generation. */
export type OtherArm = readonly Uint8Array[];

/** What is carried from one generation to the next within an arm. */
interface Carried {
  readonly record: ArmRecord;
  readonly tracker: PocketTracker;
  readonly incidence: number[];
  readonly transitions: number[];
  readonly regime: RegimeObservation[];
  statuses: Statuses | null;
  tieFacts: TieFacts | null;
  /** Fifth of each household in generation 0. */
  firstFifth: ArrayLike<number> | null;
  parentFifth: ArrayLike<number> | null;
  parent: { sample: Sample; rank: Float64Array; logWealth: Float64Array } | null;
}

/** Listener that measures one replicate, arm after arm. */
export class Measured {
  private readonly study: Study;
  private readonly writer: PartWriter;
  private readonly otherOf: (armIndex: number) => OtherArm | null;
  private plan: PermutationPlan | null = null;
  private arm: Carried | null = null;

  /** @param otherOf - the arm that arm's households are compared with, null where there is none */
  constructor(study: Study, writer: PartWriter, otherOf: (armIndex: number) => OtherArm | null) {
    this.study = study;
    this.writer = writer;
    this.otherOf = otherOf;
  }

  armStarts(record: ArmRecord): void {
    this.writer.armStarts(record);
    this.writer.keep('network.json', JSON.stringify(record.network));
    const rule = pocketRule(this.study);
    // one set of permutations for all arms of a replicate: they share this luck too
    this.plan ??= pocketPlan(
      rule,
      record.households.place,
      stream(this.study.seed, record.replicate, 'pocket permutations'),
    );
    this.arm = {
      record,
      tracker: new PocketTracker(rule, this.plan),
      incidence: [],
      transitions: [],
      regime: [],
      statuses: null,
      tieFacts: null,
      firstFifth: null,
      parentFifth: null,
      parent: null,
    };
  }

  generation(record: GenerationRecord): void {
    const arm = this.arm!;
    const { households, replicate } = arm.record;
    const { columns, generation } = record;
    const n = households.n;
    const frustrated = new Uint8Array(n);
    if (record.decided) for (let i = 0; i < n; i++) frustrated[i] = columns.met[i] === 0 ? 1 : 0;
    if (arm.tieFacts === null || record.tiesChanged) {
      arm.tieFacts = tieFacts(
        record.ties,
        households.place,
        households.group,
        this.study.pockets.permutations,
        stream(this.study.seed, replicate, `tie permutations:${arm.record.arm}`),
      );
    }
    const causes = record.underSociety === null ? null : causesUnderSociety(record, frustrated);
    const pockets = record.decided
      ? arm.tracker.generation({
          frustrated,
          wealth: columns.wealth,
          place: households.place,
          ties: record.ties,
          cause: causes?.cause,
        })
      : null;
    const statuses = pockets === null ? null : { frustrated, role: pockets.role };
    const other = this.otherOf(arm.record.armIndex);
    const context = new IndicatorContext({
      wealth: columns.wealth,
      place: households.place,
      places: households.places,
      group: households.group,
      groups: households.groups,
      ties: record.ties,
      decision: record.decided ? { frustrated, aspiration: columns.aspirations[0]! } : null,
      parent:
        record.parentWealth === null
          ? null
          : { wealth: record.parentWealth, rank: arm.parent?.rank, logWealth: arm.parent?.logWealth },
      tieFacts: arm.tieFacts,
      permutations: this.study.pockets.permutations,
      uniform: () => {
        throw new Error('permutations are drawn with the facts of the ties');
      },
      pockets,
      causes,
      fates: statuses === null ? null : fatesOf(statuses, arm.statuses, other?.[generation] ?? null),
    });
    arm.statuses = statuses;
    const row: Record<string, number> = { generation };
    indicatorRow(context).forEach((value, k) => {
      row[INDICATORS[k]!.name] = value;
    });
    this.writer.rows('indicators', [row]);
    this.mobility(record, context);
    const decision = record.decided
      ? { shareFrustrated: row.share_frustrated!, meanGrowth: mean(columns.childWealth) / mean(columns.wealth) }
      : null;
    arm.regime.push(observeRegime(context, decision));
    if (pockets !== null) this.pocketTable(generation, pockets);
    if (record.decided) this.frustrationTable(record, frustrated, context.rank);
    this.writer.generation(record, this.extras(record, pockets, causes, context));
  }

  armEnds(): void {
    const arm = this.arm!;
    const verdict = classifyRegime(arm.regime);
    const evidence = Object.fromEntries(EVIDENCE.map(({ key, name }) => [name, verdict[key]]));
    this.writer.rows('regimes', [{ regime: verdict.regime, ...evidence }]);
    this.writer.keep('incidence', encodePlane(arm.incidence));
    this.writer.keep('transitions', encodePlane(arm.transitions));
    this.writer.armEnds();
    this.arm = null;
  }

  /** Adds a generation to the growth incidence curves and the transitions. */
  private mobility(record: GenerationRecord, context: IndicatorContext): void {
    const arm = this.arm!;
    const { rank } = context;
    const fifth = rankBins(rank, FIFTHS);
    const { parentWealth } = record;
    if (parentWealth !== null) {
      const { wealth } = record.columns;
      const parentRank = arm.parent?.rank ?? averageRanks(parentWealth);
      arm.incidence.push(
        ...growthIncidence(arm.parent?.sample ?? parentWealth, context.sample),
        ...growthByInitialRank(parentWealth, wealth, undefined, parentRank),
      );
      arm.transitions.push(...countPairs(arm.parentFifth!, fifth, FIFTHS));
    }
    arm.firstFifth ??= fifth;
    if (!record.decided) arm.transitions.push(...countPairs(arm.firstFifth, fifth, FIFTHS));
    arm.parentFifth = fifth;
    arm.parent = { sample: context.sample, rank, logWealth: context.logWealth };
  }

  private pocketTable(generation: number, { rows }: PocketCensus): void {
    this.writer.rows(
      'pockets',
      rows.map((row) => ({
        generation,
        pocket: row.pocket,
        size: row.size,
        fringe: row.fringe,
        places: row.places,
        mean_wealth: row.meanWealth,
        p_value: row.pValue,
        event: row.event,
        parent: row.parent,
        local: row.local,
        general: row.general,
      })),
    );
  }

  private frustrationTable(record: GenerationRecord, frustrated: Uint8Array, rank: Float64Array): void {
    const { households, groupNames } = this.arm!.record;
    const { wealth, childWealth } = record.columns;
    const growth = new Float64Array(wealth.length);
    for (let i = 0; i < growth.length; i++) growth[i] = childWealth[i] / wealth[i];
    const { place, group, places } = households;
    const rows = frustrationRows({ wealth, frustrated, growth, place, group, places, groupNames, rank });
    this.writer.rows(
      'frustration',
      rows.map((row) => ({
        generation: record.generation,
        by: row.by,
        level: row.level,
        households: row.households,
        share_frustrated: row.shareFrustrated,
        mean_growth: row.meanGrowth,
      })),
    );
  }

  /** Columns of the panel that come from measures; nothing where no row of the generation is kept. */
  private extras(
    record: GenerationRecord,
    pockets: PocketCensus | null,
    causes: Causes | null,
    context: IndicatorContext,
  ): Extras {
    const { panel } = this.study.keep;
    const { replicate, armIndex, arm } = this.arm!.record;
    if (pockets === null || causes === null || !keepsReplicate(panel, replicate)) return {};
    if (!keepsGeneration(panel, record.generation)) return {};
    const other = this.otherOf(armIndex);
    const extras: Extras = {
      pocket: pockets.pocket,
      pocket_role: { codes: emptyFirst(pockets.role), names: ROLES.slice(1) },
      cause: { codes: emptyFirst(causes.cause), names: CAUSES.slice(1) },
      sheltered: causes.sheltered,
      complacent: causes.complacent,
      ...(other === null ? {} : { contrast_frustrated: other[record.generation]! }),
    };
    if (!this.study.keep.local_moran) return extras;
    const { seed, pockets: rule } = this.study;
    const uniform = stream(seed, replicate, `local permutations:${arm}:${record.generation}`);
    return {
      ...extras,
      local_moran: localMoran(record.ties, context.logWealth, 'row').i,
      local_moran_p: localPermutation(record.ties, context.logWealth, rule.permutations, uniform).p,
    };
  }
}

function mean(x: Float64Array): number {
  let sum = 0;
  for (let i = 0; i < x.length; i++) sum += x[i];
  return sum / x.length;
}

/** Codes 0 = empty, 1 … as codes from 0 with the empty ones past the names. */
function emptyFirst(codes: Uint8Array): Uint8Array {
  const out = new Uint8Array(codes.length);
  for (let i = 0; i < codes.length; i++) out[i] = codes[i] === 0 ? 255 : codes[i] - 1;
  return out;
}

function causesUnderSociety(record: GenerationRecord, frustrated: Uint8Array): Causes {
  const { wealth, planned } = record.columns;
  const other = record.underSociety!();
  const growth = new Float64Array(wealth.length);
  const otherGrowth = new Float64Array(wealth.length);
  for (let i = 0; i < wealth.length; i++) {
    growth[i] = planned[i] / wealth[i];
    otherGrowth[i] = other.planned[i] / wealth[i];
  }
  return causesOf(frustrated, other.met, growth, otherGrowth);
}
