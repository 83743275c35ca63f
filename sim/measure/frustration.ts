/**
 * How frustration is spread: shares by group, by fifth of places and by fifth of households, and the aspiration gap.
 *
 * Knows nothing of how a household came to be frustrated (sim/model) nor of its ties (pockets.ts).
 */
import { averageRanks, rankBins } from './order.js';
import { sumOf } from './sample.js';

/** Share of households that meet no milestone, 0 … 1; NaN for none. */
export function shareFrustrated(frustrated: ArrayLike<number>): number {
  return sumOf(frustrated) / frustrated.length;
}

/**
 * Mean aspiration gap: mean of 1 − wealth/aspiration of the first milestone.
 *
 * Positive where people aspire above what they have. Households whose aspiration is 0 or less are left out.
 */
export function meanAspirationGap(wealth: ArrayLike<number>, aspiration: ArrayLike<number>): number {
  let sum = 0;
  let n = 0;
  for (let i = 0; i < wealth.length; i++) {
    if (!(aspiration[i] > 0)) continue;
    sum += 1 - wealth[i] / aspiration[i];
    n++;
  }
  return sum / n;
}

/** What a table of frustration is made from, one generation of one arm. */
export interface FrustrationInput {
  readonly wealth: ArrayLike<number>;
  /** 0 or 1 for each household. */
  readonly frustrated: ArrayLike<number>;
  /** Child wealth / wealth. */
  readonly growth: ArrayLike<number>;
  readonly place: ArrayLike<number>;
  readonly group: ArrayLike<number>;
  readonly places: number;
  /** Names of the groups, in the order of their numbers. */
  readonly groupNames: readonly string[];
  /** Average ranks 1 … n of wealth, when the caller has them already. */
  readonly rank?: ArrayLike<number> | undefined;
}

/** A row of `frustration.csv` without arm, replicate and generation. */
export interface FrustrationRow {
  readonly by: 'group' | 'place_quintile' | 'wealth_quintile';
  /** Group name, or 1 (poorest fifth) … 5. */
  readonly level: string;
  readonly households: number;
  readonly shareFrustrated: number;
  readonly meanGrowth: number;
}

/** Fifths, poorest first. */
const FIFTHS = 5;

/**
 * Frustration and growth by group, by fifth of places (ranked by mean wealth) and by fifth of households.
 *
 * Fifths are cut by average rank, ties staying together, so with fewer than five places some do not appear.
 *
 * @returns rows with at least one household, groups first. Cost O(n) and a sort.
 */
export function frustrationRows(input: FrustrationInput): FrustrationRow[] {
  const { wealth, frustrated, growth, place, group, places, groupNames } = input;
  const n = wealth.length;
  const rows: FrustrationRow[] = [];
  const tally = (by: FrustrationRow['by'], of: (i: number) => number, names: readonly string[]): void => {
    const households = new Float64Array(names.length);
    const count = new Float64Array(names.length);
    const growthSum = new Float64Array(names.length);
    for (let i = 0; i < n; i++) {
      const g = of(i);
      households[g]++;
      count[g] += frustrated[i];
      growthSum[g] += growth[i];
    }
    for (let g = 0; g < names.length; g++) {
      if (households[g] === 0) continue;
      rows.push({
        by,
        level: names[g],
        households: households[g],
        shareFrustrated: count[g] / households[g],
        meanGrowth: growthSum[g] / households[g],
      });
    }
  };
  const fifthNames = Array.from({ length: FIFTHS }, (_, f) => String(f + 1));
  tally('group', (i) => group[i], groupNames);
  const placeFifth = fifthOfPlaces(wealth, place, places);
  tally('place_quintile', (i) => placeFifth[place[i]], fifthNames);
  const fifth = rankBins(input.rank ?? averageRanks(wealth), FIFTHS);
  tally('wealth_quintile', (i) => fifth[i], fifthNames);
  return rows;
}

/** Fifth (0 … 4) of each place by mean wealth; places without households take no part in the ranking. */
export function fifthOfPlaces(wealth: ArrayLike<number>, place: ArrayLike<number>, places: number): Uint8Array {
  const size = new Float64Array(places);
  const held = new Float64Array(places);
  for (let i = 0; i < wealth.length; i++) {
    size[place[i]]++;
    held[place[i]] += wealth[i];
  }
  const present = Array.from(size.keys()).filter((p) => size[p] > 0);
  const bins = rankBins(averageRanks(present.map((p) => held[p] / size[p])), FIFTHS);
  const fifth = new Uint8Array(places);
  for (let k = 0; k < present.length; k++) fifth[present[k]] = bins[k];
  return fifth;
}
