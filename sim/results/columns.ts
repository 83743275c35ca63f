/**
 * The panel, column by column: what each one says and how it is filled from a generation.
 *
 * The registry gives the panel its columns and order, the codebook its text, regressions their terms and the viewer
 * its colourings. To add a column the engine can compute, add an entry; to add one a measure hands over, add its
 * name to `EXTRA_NAMES` (facts.ts) and an entry that calls `extra`.
 */
import { neighbourMeans, secondCircleMeans } from '../../network/measure/neighbours.js';
import { unitRanks } from '../measure/order.js';
import type { ArmRecord, GenerationRecord } from '../study/record.js';
import { EXTRA_NAMES, type ExtraName, type Facts } from './facts.js';
import type { Column, Field } from './field.js';

/** Values measured outside the engine for one generation, n long each. */
export type Extras = Partial<Readonly<Record<ExtraName, Column>>>;

/** One generation of one arm, with what several columns need. */
export interface PanelContext {
  readonly arm: ArmRecord;
  readonly record: GenerationRecord;
  readonly extras: Extras;
  /** Child wealth / wealth; NaN where wealth is 0. */
  readonly growth: Float64Array;
  /** 1 where no milestone is met. */
  readonly frustrated: Uint8Array;
  /** An array of n numbers kept under this name from one generation to the next, to be overwritten. */
  scratch(name: string): Float64Array;
}

export interface PanelColumn extends Field {
  /** Values of the n households. Valid until the next generation. */
  fill(context: PanelContext): Column;
}

/** Makes contexts for the generations of one arm; allocates once. */
export class PanelSource {
  readonly #arm: ArmRecord;
  readonly #growth: Float64Array;
  readonly #frustrated: Uint8Array;
  readonly #kept = new Map<string, Float64Array>();

  constructor(arm: ArmRecord) {
    this.#arm = arm;
    this.#growth = new Float64Array(arm.households.n);
    this.#frustrated = new Uint8Array(arm.households.n);
  }

  /** Context of one generation that decides. Cost O(n). */
  context(record: GenerationRecord, extras: Extras): PanelContext {
    const { wealth, childWealth, met } = record.columns;
    const growth = this.#growth;
    const frustrated = this.#frustrated;
    for (let i = 0; i < growth.length; i++) {
      growth[i] = wealth[i] > 0 ? childWealth[i] / wealth[i] : Number.NaN;
      frustrated[i] = met[i] === 0 ? 1 : 0;
    }
    const scratch = (name: string): Float64Array => {
      let array = this.#kept.get(name);
      if (array === undefined) {
        array = new Float64Array(growth.length);
        this.#kept.set(name, array);
      }
      return array;
    };
    return { arm: this.#arm, record, extras, growth, frustrated, scratch };
  }
}

/** Row number of each household in the n of a population, 0 … n−1. */
function householdNumbers(n: number): Uint32Array {
  const out = new Uint32Array(n);
  for (let i = 0; i < n; i++) out[i] = i;
  return out;
}

function extra(context: PanelContext, name: ExtraName): Column {
  const column = context.extras[name];
  if (column === undefined) throw new Error(`the panel has a column ${name} but its values were not handed over`);
  return column;
}

const label = { unit: '', missing: null } as const;
const NO_TIES = 'the household has no ties';

/** Measured columns that stand after the others. */
const ON_TOP: readonly ExtraName[] = ['contrast_frustrated', 'local_moran', 'local_moran_p'];

/** Columns of the panel, in order. */
export function panelColumns(facts: Facts): PanelColumn[] {
  const unit = facts.currency;
  const numbers = new Map<number, Uint32Array>();
  const columns: PanelColumn[] = [
    {
      ...label,
      name: 'arm',
      type: 'text',
      meaning: 'Arm of the study: a network, and what else the arm changes.',
      formula: 'name in the study file',
      fill: ({ arm }) => ({ value: arm.arm }),
    },
    {
      ...label,
      name: 'replicate',
      type: 'integer',
      meaning: 'Replicate. The same replicate of all arms has the same households and the same luck.',
      formula: '0, 1, 2 …',
      fill: ({ arm }) => ({ value: arm.replicate }),
    },
    {
      ...label,
      name: 'generation',
      type: 'integer',
      meaning: 'Generation t that decides.',
      formula: '0 … T − 1',
      fill: ({ record }) => ({ value: record.generation }),
    },
    {
      ...label,
      name: 'household',
      type: 'integer',
      meaning: 'Household (dynasty); the same number is the same dynasty in every generation and arm of a replicate.',
      formula: '0 … N − 1',
      fill: ({ arm }) => {
        const { n } = arm.households;
        let all = numbers.get(n);
        if (all === undefined) numbers.set(n, (all = householdNumbers(n)));
        return all;
      },
    },
    {
      ...label,
      name: 'place',
      type: 'integer',
      meaning: 'Place the household lives in: village, neighbourhood or school.',
      formula: '0 … places − 1',
      fill: ({ arm }) => arm.households.place,
    },
    {
      ...label,
      name: 'group',
      type: 'text',
      meaning: 'Social group of the household.',
      formula: 'name in the study file or the household file',
      fill: ({ arm }) => ({ codes: arm.households.group, names: arm.groupNames }),
    },
    {
      name: 'wealth',
      type: 'number',
      unit,
      meaning: 'Wealth y when the household decides, after the changes of its generation.',
      formula: 'y(t)',
      missing: null,
      fill: ({ record }) => record.columns.wealth,
    },
  ];
  for (let m = 0; m < facts.milestones; m++) {
    columns.push({
      name: `aspiration_${m + 1}`,
      type: 'number',
      unit,
      meaning: `Aspiration: the child wealth at which milestone ${m + 1} counts as reached.`,
      formula: 'a = φ·a(t − 1) + (1 − φ)·scale·Σ weight·statistic of the reference groups',
      missing: m === 0 ? null : 'the arm has fewer milestones',
      fill: ({ record }) => record.columns.aspirations[m] ?? { value: null },
    });
  }
  columns.push(
    {
      name: 'investment',
      type: 'number',
      unit,
      meaning: 'Investment k in the child.',
      formula: 'k, 0 ≤ k ≤ y, maximises u(y − k) + δ·[v(z) + Σ π·b(z, a)]',
      missing: null,
      fill: ({ record }) => record.columns.investment,
    },
    {
      name: 'consumption',
      type: 'number',
      unit,
      meaning: 'Consumption c.',
      formula: 'c = y − k',
      missing: null,
      fill: ({ record }) => record.columns.consumption,
    },
    {
      name: 'planned_child_wealth',
      type: 'number',
      unit,
      meaning: 'Child wealth z as planned, before the shock.',
      formula: 'z = f(k)',
      missing: null,
      fill: ({ record }) => record.columns.planned,
    },
    {
      name: 'shock',
      type: 'number',
      unit: '',
      meaning: 'Luck that multiplies planned child wealth; the same in all arms of a replicate.',
      formula: 'ln ε = s·(√ω·ξ(place, t) + √(1 − ω)·ξ(i, t)) − s²/2',
      missing: null,
      fill: ({ record }) => record.columns.shock,
    },
    {
      name: 'child_wealth',
      type: 'number',
      unit,
      meaning: 'Wealth of the child, before the changes of its own generation.',
      formula: 'z·ε',
      missing: null,
      fill: ({ record }) => record.columns.childWealth,
    },
    {
      name: 'growth',
      type: 'number',
      unit: 'gross factor per generation',
      meaning: 'Growth of the dynasty: 1.25 is 25 % more than the parent.',
      formula: 'child_wealth / wealth',
      missing: 'wealth is 0',
      fill: ({ growth }) => growth,
    },
    {
      ...label,
      name: 'milestones_met',
      type: 'integer',
      meaning: 'Milestones the plan meets.',
      formula: 'number of m with z ≥ a_m',
      fill: ({ record }) => record.columns.met,
    },
    {
      ...label,
      name: 'frustrated',
      type: 'flag',
      meaning: '1 when the plan meets no milestone.',
      formula: '1 if milestones_met = 0, else 0',
      fill: ({ frustrated }) => frustrated,
    },
    {
      ...label,
      name: 'milestones_reached',
      type: 'integer',
      meaning: 'Milestones the child reaches, after the shock.',
      formula: 'number of m with child_wealth ≥ a_m',
      fill: ({ record }) => record.columns.reached,
    },
    {
      ...label,
      name: 'wealth_rank',
      type: 'number',
      meaning: 'Rank in wealth among all households of the generation: 0 poorest, 1 richest.',
      formula: '(rank − 1)/(N − 1), ties sharing their average rank; ½ when N = 1',
      fill: ({ record }) => unitRanks(record.columns.wealth),
    },
    {
      name: 'neighbour_mean_wealth',
      type: 'number',
      unit,
      meaning: 'Mean wealth of those the household has ties to, every tie counting the same.',
      formula: 'Σ_j y_j / degree over ties j',
      missing: NO_TIES,
      fill: ({ record, scratch }) =>
        neighbourMeans(record.ties, record.columns.wealth, scratch('neighbour_mean_wealth')),
    },
    {
      name: 'second_circle_mean_wealth',
      type: 'number',
      unit,
      meaning: 'Mean wealth of the ties of its ties, itself and its own ties left out, everyone counted once.',
      formula: 'mean of y over households two ties away',
      missing: 'nobody is two ties away',
      fill: ({ record, scratch }) =>
        secondCircleMeans(record.ties, record.columns.wealth, scratch('second_circle_mean_wealth')),
    },
    {
      name: 'neighbour_frustrated_share',
      type: 'number',
      unit: 'share',
      meaning: 'Share of those it has ties to who are frustrated in the same generation.',
      formula: 'mean of frustrated over ties',
      missing: NO_TIES,
      fill: ({ record, frustrated, scratch }) =>
        neighbourMeans(record.ties, frustrated, scratch('neighbour_frustrated_share')),
    },
    {
      name: 'neighbour_mean_growth',
      type: 'number',
      unit: 'gross factor per generation',
      meaning: 'Mean growth of those it has ties to, in the same generation.',
      formula: 'mean of growth over ties',
      missing: `${NO_TIES}, or none whose wealth is positive`,
      fill: ({ record, growth, scratch }) => neighbourMeans(record.ties, growth, scratch('neighbour_mean_growth')),
    },
    {
      name: 'aspiration_gap',
      type: 'number',
      unit: '',
      meaning: 'How far wealth lies below the first milestone: 0 at it, negative above it, toward 1 far below.',
      formula: '1 − wealth / aspiration_1',
      missing: 'aspiration_1 is 0',
      fill: ({ record, scratch }) => {
        const { wealth, aspirations } = record.columns;
        const out = scratch('aspiration_gap');
        const first = aspirations[0];
        for (let i = 0; i < out.length; i++) out[i] = first[i] > 0 ? 1 - wealth[i] / first[i] : Number.NaN;
        return out;
      },
    },
    {
      ...label,
      name: 'isolated',
      type: 'flag',
      meaning:
        '1 when a part of its reference needs ties and the household has none, so that its own wealth stands in.',
      formula: '1 or 0',
      fill: ({ record }) => record.columns.isolated,
    },
  );
  const measured: Record<ExtraName, Omit<Field, 'name'>> = {
    pocket: {
      type: 'integer',
      unit: '',
      meaning: 'Pocket of frustration the household belongs to, as core or fringe.',
      formula: 'number of a connected component of core households, with its fringe',
      missing: 'the household is in no pocket',
    },
    pocket_role: {
      type: 'text',
      unit: '',
      meaning: 'Part the household has in its pocket.',
      formula:
        'core: frustrated for min_spell generations with core_share of its ties frustrated; fringe: frustrated tie of a core',
      missing: 'the household is in no pocket',
    },
    cause: {
      type: 'text',
      unit: '',
      meaning: 'Why a frustrated household is frustrated: local when only its own reference keeps it from a milestone.',
      formula:
        'choice solved again with the society-wide mean as reference: general when frustrated under both, else local',
      missing: 'the household is not frustrated',
    },
    sheltered: {
      type: 'flag',
      unit: '',
      meaning: '1 when satisfied, but frustrated under the society-wide reference.',
      formula: '1 or 0',
      missing: null,
    },
    complacent: {
      type: 'flag',
      unit: '',
      meaning: '1 when satisfied, yet growing more slowly than under the society-wide reference.',
      formula: '1 or 0',
      missing: null,
    },
    contrast_frustrated: {
      type: 'flag',
      unit: '',
      meaning: 'Whether the same household is frustrated in the other arm in the same generation and replicate.',
      formula: '1 or 0; the other arm is the study’s first, and for the first arm the second',
      missing: null,
    },
    local_moran: {
      type: 'number',
      unit: '',
      meaning: 'Local Moran statistic of log wealth: above 0 where ties are alike, below 0 where they differ.',
      formula: 'z_i · mean of z over its ties, z standardised log wealth (Anselin 1995)',
      missing: NO_TIES,
    },
    local_moran_p: {
      type: 'number',
      unit: '',
      meaning: 'Two-sided p-value of the local Moran statistic by conditional permutation.',
      formula: 'twice the smaller tail among random sets of as many others, at most 1',
      missing: NO_TIES,
    },
  };
  const add = (name: ExtraName): void => {
    if (facts.extras.includes(name)) columns.push({ ...measured[name], name, fill: (context) => extra(context, name) });
  };
  for (const name of EXTRA_NAMES) if (!ON_TOP.includes(name)) add(name);
  columns.push({
    ...label,
    name: 'treated',
    type: 'flag',
    meaning: '1 when a change of the study acts on the household in this arm in any generation.',
    formula: '1 or 0; 0 where the study changes nothing',
    fill: ({ arm }) => arm.treated ?? { value: 0 },
  });
  for (const name of ON_TOP) add(name);
  return columns;
}
