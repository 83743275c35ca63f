/**
 * Measures a replicate while it runs, and hands the rows to the tables.
 *
 * Listens to the loop, keeps what one generation needs of the one before, and turns what the measures say into
 * rows of indicators and frustration and into the counts behind incidence and transitions.
 */
import { frustrationRows } from '../measure/frustration.js';
import { growthByInitialRank, growthIncidence } from '../measure/incidence.js';
import { INDICATORS, IndicatorContext, indicatorRow } from '../measure/indicators.js';
import { averageRanks, rankBins } from '../measure/order.js';
import { countPairs } from '../measure/transitions.js';
import { stream } from '../random/stream.js';
import type { Study } from '../study/complete.js';
import type { ArmRecord, GenerationRecord } from '../study/record.js';
import type { Entry, Facts } from './facts.js';
import type { PartWriter } from './parts.js';
import { encodePlane } from './plane.js';

/** Fifths of transitions. */
export const FIFTHS = 5;

/** What the measures add to the tables of a study. */
export function measureFacts(study: Study): Pick<Facts, 'extras' | 'indicators' | 'evidence'> {
  return {
    extras: [],
    indicators: INDICATORS.map(
      ({ name, meaning, formula, source, unit }): Entry => ({
        name,
        meaning,
        formula,
        source,
        unit: unit === 'wealth' ? study.currency : unit,
        type: unit === 'count' ? 'integer' : 'number',
      }),
    ),
    evidence: [],
  };
}

/** What is carried from one generation to the next within an arm. */
interface Carried {
  readonly record: ArmRecord;
  readonly incidence: number[];
  readonly transitions: number[];
  /** Fifth of each household in generation 0. */
  firstFifth: ArrayLike<number> | null;
  parentFifth: ArrayLike<number> | null;
  parent: { rank: Float64Array; logWealth: Float64Array } | null;
}

/** Listener that measures one replicate, arm after arm. */
export class Measured {
  private readonly study: Study;
  private readonly writer: PartWriter;
  private arm: Carried | null = null;

  constructor(study: Study, writer: PartWriter) {
    this.study = study;
    this.writer = writer;
  }

  armStarts(record: ArmRecord): void {
    this.writer.armStarts(record);
    this.writer.keep('network.json', JSON.stringify(record.network));
    this.arm = { record, incidence: [], transitions: [], firstFifth: null, parentFifth: null, parent: null };
  }

  generation(record: GenerationRecord): void {
    const arm = this.arm!;
    const { households, groupNames, replicate } = arm.record;
    const { columns, generation } = record;
    const n = households.n;
    const frustrated = new Uint8Array(n);
    if (record.decided) for (let i = 0; i < n; i++) frustrated[i] = columns.met[i] === 0 ? 1 : 0;
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
      permutations: this.study.pockets.permutations,
      uniform: stream(this.study.seed, replicate, `permutations:${arm.record.arm}:${generation}`),
    });
    const row: Record<string, number> = { generation };
    indicatorRow(context).forEach((value, k) => {
      row[INDICATORS[k]!.name] = value;
    });
    this.writer.rows('indicators', [row]);

    const rank = context.rank;
    const fifth = rankBins(rank, FIFTHS);
    if (record.parentWealth !== null) {
      arm.incidence.push(
        ...growthIncidence(record.parentWealth, columns.wealth),
        ...growthByInitialRank(
          record.parentWealth,
          columns.wealth,
          undefined,
          arm.parent?.rank ?? averageRanks(record.parentWealth),
        ),
      );
      arm.transitions.push(...countPairs(arm.parentFifth!, fifth, FIFTHS));
    }
    arm.firstFifth ??= fifth;
    if (!record.decided) arm.transitions.push(...countPairs(arm.firstFifth, fifth, FIFTHS));
    arm.parentFifth = fifth;
    arm.parent = { rank, logWealth: context.logWealth };

    if (record.decided) {
      const growth = new Float64Array(n);
      for (let i = 0; i < n; i++) growth[i] = columns.childWealth[i] / columns.wealth[i];
      this.writer.rows(
        'frustration',
        frustrationRows({
          wealth: columns.wealth,
          frustrated,
          growth,
          place: households.place,
          group: households.group,
          places: households.places,
          groupNames,
          rank,
        }).map(({ by, level, households: size, shareFrustrated, meanGrowth }) => ({
          generation,
          by,
          level,
          households: size,
          share_frustrated: shareFrustrated,
          mean_growth: meanGrowth,
        })),
      );
    }
    this.writer.generation(record);
  }

  armEnds(): void {
    const arm = this.arm!;
    this.writer.keep('incidence', encodePlane(arm.incidence));
    this.writer.keep('transitions', encodePlane(arm.transitions));
    this.writer.armEnds();
    this.arm = null;
  }
}
