/**
 * Aspirations: the wealth a household hopes its child will reach, given whom it looks at.
 *
 *     a_im = scale_m · Σ_p w_p · S_p(i),   and with persistence φ·(inherited) + (1 − φ)·(that)
 *
 * Reference groups may be local (the household's own ties), so two households of equal wealth can aspire to different
 * things. Group, place and society include the household itself. Where a part needs ties and there are none (or all
 * weigh 0), own wealth stands in and the household is marked isolated. A statistic that several milestones or parts
 * share is computed once. Does not know what a household does next (choice.ts).
 */
import { ShapeError } from '../../network/errors.js';
import type { Ties } from '../../network/graph.js';
import { rowKernel } from '../kernel/rows.js';
import { type Rows, rowStatistic, rowStatistics, type Scratch, SecondCircle } from './row-statistic.js';
import { compensatedSum, lowerBound, quantileOfSorted, similarityMeans, upwardMeans } from './set-statistic.js';
import type { Households, Milestone, Part } from './types.js';

/** What one part shows one household. */
export interface Sight {
  readonly from: Part['from'];
  readonly statistic: Part['statistic'];
  /** Weight in each milestone's mix, length M. */
  readonly weights: readonly number[];
  /** Households looked at, ascending; null for everyone. */
  readonly members: Uint32Array | null;
  readonly value: number;
}

/** Forms aspirations for one set of milestones, households and ties. */
export interface Reference {
  /**
   * @param wealth - y, length n, > 0
   * @param inherited - the parents' aspirations, a column a milestone, or null in the first generation
   * @param out - overwritten, a column a milestone; may be the same columns as `inherited`
   * @param isolated - overwritten with 0 and 1, length n
   * @param factor - multiplies each household's mix (a programme that raises aspirations), or null
   */
  form(
    wealth: Float64Array,
    inherited: readonly Float64Array[] | null,
    out: readonly Float64Array[],
    isolated: Uint8Array,
    factor?: Float64Array | null,
  ): void;
  /** Whom one household looks at and what each part's statistic is. Cost O(n) for parts over everyone. */
  referenceOf(household: number, wealth: Float64Array): Sight[];
  /** The same milestones and households under other ties. */
  withTies(ties: Ties): Reference;
}

/** Second circles are kept as rows up to this many members in all (128 MB), else found anew each generation. */
const SECOND_CIRCLE_LIMIT = 1 << 25;

/** @param secondCircleLimit - members of second circles to keep in memory; results do not depend on it */
export function compileReference(
  milestones: readonly Milestone[],
  persistence: number,
  households: Households,
  ties: Ties,
  secondCircleLimit: number = SECOND_CIRCLE_LIMIT,
): Reference {
  return new CompiledReference(milestones, persistence, households, ties, secondCircleLimit);
}

/** One distinct statistic: where its values are kept between computing and mixing. */
interface Source {
  readonly part: Part;
  /** Weight in each milestone. */
  readonly weights: number[];
  /** A value a household; not so for `self` (wealth itself) and for one number for everyone. */
  readonly perHousehold: boolean;
  /** Those values, once they have been needed. */
  column: Float64Array | null;
  /** The one number. */
  scalar: number;
}

class CompiledReference implements Reference {
  private readonly milestones: readonly Milestone[];
  private readonly persistence: number;
  private readonly households: Households;
  private readonly ties: Ties;
  private readonly sources: Source[];
  private readonly scratch: Scratch;
  private readonly limit: number;
  private circles: Rows | SecondCircle | null;

  constructor(
    milestones: readonly Milestone[],
    persistence: number,
    households: Households,
    ties: Ties,
    limit: number,
  ) {
    if (ties.n !== households.n) throw new ShapeError('ties', ties.n, households.n, 'one row per household');
    this.milestones = milestones;
    this.persistence = persistence;
    this.households = households;
    this.ties = ties;
    this.limit = limit;
    this.circles = null;
    this.sources = distinctSources(milestones);
    let longest = 0;
    for (let i = 0; i < ties.n; i++) longest = Math.max(longest, ties.start[i + 1] - ties.start[i]);
    this.scratch = { values: new Float64Array(longest) };
    if (this.sources.some((source) => source.part.from === 'second_circle')) {
      const finder = new SecondCircle(ties);
      this.circles = finder.rows(limit) ?? finder;
      // a second circle can be as long as the population
      this.scratch = { values: new Float64Array(ties.n) };
    }
  }

  withTies(ties: Ties): Reference {
    return new CompiledReference(this.milestones, this.persistence, this.households, ties, this.limit);
  }

  form(
    wealth: Float64Array,
    inherited: readonly Float64Array[] | null,
    out: readonly Float64Array[],
    isolated: Uint8Array,
    factor: Float64Array | null = null,
  ): void {
    const n = this.households.n;
    if (wealth.length !== n) throw new ShapeError('wealth', wealth.length, n, 'one value per household');
    isolated.fill(0);
    const formsAnew = factor === null && (inherited === null || this.persistence === 0);
    const straight = formsAnew ? this.straightSource() : null;
    for (const source of this.sources) if (source !== straight) this.compute(source, wealth, isolated);
    if (straight !== null) {
      if (this.mixStraight(straight, wealth, out[0], isolated)) return;
      this.compute(straight, wealth, isolated);
    }
    for (let m = 0; m < this.milestones.length; m++) {
      this.mix(m, wealth, inherited === null ? null : inherited[m], out[m], factor);
    }
  }

  referenceOf(household: number, wealth: Float64Array): Sight[] {
    const sights: Sight[] = [];
    for (const source of this.sources) {
      const { part, weights } = source;
      const members = this.membersOf(part, household);
      let value = wealth[household];
      if (part.from !== 'self') {
        const everyone = members ?? Uint32Array.from({ length: wealth.length }, (_, i) => i);
        const weight =
          part.from === 'neighbours' && this.ties.weight !== null
            ? this.ties.weight.slice(this.ties.start[household], this.ties.start[household + 1])
            : null;
        const scratch = { values: new Float64Array(everyone.length) };
        const found = rowStatistic(part, everyone, 0, everyone.length, weight, wealth, wealth[household], scratch);
        if (!Number.isNaN(found)) value = found;
      }
      sights.push({ from: part.from, statistic: part.statistic, weights: weights.slice(), members, value });
    }
    return sights;
  }

  private membersOf(part: Part, household: number): Uint32Array | null {
    const { place, group, n } = this.households;
    switch (part.from) {
      case 'self':
        return Uint32Array.of(household);
      case 'neighbours':
        return this.ties.target.slice(this.ties.start[household], this.ties.start[household + 1]);
      case 'second_circle': {
        const finder = new SecondCircle(this.ties);
        finder.find(household);
        return finder.members.slice(0, finder.size).sort();
      }
      case 'society':
        return null;
      default: {
        const label = part.from === 'place' ? place : group;
        const members: number[] = [];
        for (let i = 0; i < n; i++) if (label[i] === label[household]) members.push(i);
        return Uint32Array.from(members);
      }
    }
  }

  private compute(source: Source, wealth: Float64Array, isolated: Uint8Array): void {
    const { part } = source;
    if (source.perHousehold) source.column ??= new Float64Array(wealth.length);
    const column = source.column;
    switch (part.from) {
      case 'self':
        return;
      case 'neighbours':
        rowStatistics(part, this.ties, wealth, this.scratch, column!, isolated);
        return;
      case 'second_circle':
        this.computeCircles(part, wealth, column!, isolated);
        return;
      case 'society':
        if (column === null) source.scalar = societyScalar(part, wealth);
        else {
          const sorted = wealth.slice().sort();
          spread(part, sorted, wealth, null, column);
        }
        return;
      default: {
        const { place, places, group, groups } = this.households;
        if (part.from === 'place') setStatistics(part, place, places, wealth, column!);
        else setStatistics(part, group, groups, wealth, column!);
      }
    }
  }

  private computeCircles(part: Part, wealth: Float64Array, column: Float64Array, isolated: Uint8Array): void {
    const circles = this.circles!;
    if (!(circles instanceof SecondCircle)) {
      rowStatistics(part, circles, wealth, this.scratch, column, isolated);
      return;
    }
    for (let i = 0; i < wealth.length; i++) {
      circles.find(i);
      // the same order of summing as in rows kept: ascending
      const members = circles.members.subarray(0, circles.size).sort();
      const value = rowStatistic(part, members, 0, circles.size, null, wealth, wealth[i], this.scratch);
      if (Number.isNaN(value)) {
        column[i] = wealth[i];
        isolated[i] = 1;
      } else column[i] = value;
    }
  }

  /** The one statistic of the one milestone that the row kernel can mix as it goes, without a column in between. */
  private straightSource(): Source | null {
    const columns = this.sources.filter((source) => source.perHousehold);
    if (this.milestones.length !== 1 || columns.length !== 1) return null;
    const { from, statistic } = columns[0].part;
    const plain = statistic === 'upward_mean' || (statistic === 'mean' && this.ties.weight === null);
    return from === 'neighbours' && plain ? columns[0] : null;
  }

  private mixStraight(source: Source, wealth: Float64Array, out: Float64Array, isolated: Uint8Array): boolean {
    const { start, target } = this.ties;
    let own = 0;
    let common = 0;
    for (const other of this.sources) {
      if (other.part.from === 'self') own += other.weights[0];
      else if (other !== source) common += other.weights[0] * other.scalar;
    }
    const { scale } = this.milestones[0];
    const upward = source.part.statistic === 'upward_mean';
    const mixed = rowKernel()?.mixes(upward, start, target, wealth, scale, own, common, source.weights[0], out);
    if (mixed !== true) return false;
    for (let i = 0; i < wealth.length; i++) if (start[i] === start[i + 1]) isolated[i] = 1;
    return true;
  }

  private mix(
    m: number,
    wealth: Float64Array,
    inherited: Float64Array | null,
    out: Float64Array,
    factor: Float64Array | null,
  ): void {
    const n = wealth.length;
    const { scale } = this.milestones[m];
    let own = 0;
    let common = 0;
    const columns: Float64Array[] = [];
    const weights: number[] = [];
    for (const source of this.sources) {
      const w = source.weights[m];
      if (w === 0) continue;
      if (source.part.from === 'self') own += w;
      else if (!source.perHousehold) common += w * source.scalar;
      else {
        columns.push(source.column!);
        weights.push(w);
      }
    }
    const phi = inherited === null ? 0 : this.persistence;
    if (columns.length === 1 && factor === null && phi === 0) {
      const column = columns[0];
      const w = weights[0];
      for (let i = 0; i < n; i++) out[i] = scale * (own * wealth[i] + common + w * column[i]);
      return;
    }
    for (let i = 0; i < n; i++) {
      let sum = own * wealth[i] + common;
      for (let c = 0; c < columns.length; c++) sum += weights[c] * columns[c][i];
      let formed = scale * sum;
      if (factor !== null) formed *= factor[i];
      out[i] = phi === 0 ? formed : phi * inherited![i] + (1 - phi) * formed;
    }
  }
}

function distinctSources(milestones: readonly Milestone[]): Source[] {
  const sources = new Map<string, Source>();
  milestones.forEach((milestone, m) => {
    for (const part of milestone.mix) {
      if (!(part.weight > 0)) continue;
      const detail = part.statistic === 'quantile' ? part.q : part.statistic === 'similarity_mean' ? part.window : '';
      const key = part.from === 'self' ? 'self' : `${part.from} ${part.statistic} ${detail}`;
      let source = sources.get(key);
      if (source === undefined) {
        const ofOwnWealth = part.statistic === 'upward_mean' || part.statistic === 'similarity_mean';
        const single = part.from === 'self' || (part.from === 'society' && !ofOwnWealth);
        source = {
          part,
          weights: milestones.map(() => 0),
          perHousehold: !single,
          column: null,
          scalar: 0.5,
        };
        sources.set(key, source);
      }
      source.weights[m] += part.weight;
    }
  });
  return [...sources.values()];
}

function societyScalar(part: Part, wealth: Float64Array): number {
  switch (part.statistic) {
    case 'mean':
      return compensatedSum(wealth) / wealth.length;
    case 'max': {
      let max = wealth[0];
      for (let i = 1; i < wealth.length; i++) if (wealth[i] > max) max = wealth[i];
      return max;
    }
    default: {
      const sorted = wealth.slice().sort();
      return quantileOfSorted(sorted, 0, sorted.length, part.statistic === 'median' ? 0.5 : part.q);
    }
  }
}

/** Statistic over each label's members, for every household. Cost O(n log n). */
function setStatistics(part: Part, label: Uint32Array, labels: number, wealth: Float64Array, out: Float64Array): void {
  const n = wealth.length;
  const start = new Uint32Array(labels + 1);
  for (let i = 0; i < n; i++) start[label[i] + 1]++;
  for (let s = 0; s < labels; s++) start[s + 1] += start[s];
  const members = new Uint32Array(n);
  const values = new Float64Array(n);
  const fill = start.slice(0, labels);
  for (let i = 0; i < n; i++) {
    const at = fill[label[i]]++;
    members[at] = i;
    values[at] = wealth[i];
  }
  for (let s = 0; s < labels; s++) {
    if (start[s] === start[s + 1]) continue;
    const ofSet = values.subarray(start[s], start[s + 1]);
    const ids = members.subarray(start[s], start[s + 1]);
    if (part.statistic === 'upward_mean' || part.statistic === 'similarity_mean') {
      ofSet.sort();
      spread(part, ofSet, wealth, ids, out);
    } else {
      const value = societyScalar(part, ofSet);
      for (let e = 0; e < ids.length; e++) out[ids[e]] = value;
    }
  }
}

/** Statistics that depend on own wealth, computed for the sorted values and read back by each member. */
function spread(
  part: Part,
  sorted: Float64Array,
  wealth: Float64Array,
  members: Uint32Array | null,
  out: Float64Array,
): void {
  const seen = new Float64Array(sorted.length);
  if (part.statistic === 'upward_mean') upwardMeans(sorted, seen);
  else similarityMeans(sorted, part.window, seen);
  const count = members === null ? wealth.length : members.length;
  for (let e = 0; e < count; e++) {
    const i = members === null ? e : members[e];
    out[i] = seen[lowerBound(sorted, 0, sorted.length, wealth[i])];
  }
}
