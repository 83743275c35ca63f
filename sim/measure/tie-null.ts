/**
 * Permutation p-values of Moran's I and of join counts over fixed ties, fast enough for every generation.
 *
 * The statistics are those of network/measure (moran.ts with row-standardised weights, join-counts.ts with binary
 * ones); here only their null distribution, on permutations drawn beforehand, several at a time. Sampling stops early
 * as in pocket-null.ts: no p-value of 0.1 or less is touched by it. For very large graphs see `NORMAL_FROM`.
 */
import { ShapeError } from '../../network/errors.js';
import { type Ties, toPairs, type Uniform } from '../../network/graph.js';
import { countLanes, dealMarks, LANES } from './lanes.js';
import { PermutationPlan } from './permutations.js';

/** Ties as a list, with what Moran's I needs of them. Worth keeping while ties do not change. */
export interface TieList {
  readonly n: number;
  /** Ends of each tie, once each. */
  readonly source: Uint32Array;
  readonly target: Uint32Array;
  /** Row-standardised weight of a tie in both directions together: 1/degree of one end + 1/degree of the other. */
  readonly weight: Float64Array;
  /** Households with ties. */
  readonly tied: number;
  /** 1 where a household has ties, or null when all have. */
  readonly isTied: Uint8Array | null;
}

/** Lists the ties. Cost O(n + ties). */
export function tieList(ties: Ties): TieList {
  const { source, target } = toPairs(ties);
  const weight = new Float64Array(source.length);
  const degree = (i: number): number => ties.start[i + 1] - ties.start[i];
  for (let e = 0; e < weight.length; e++) weight[e] = 1 / degree(source[e]) + 1 / degree(target[e]);
  const isTied = new Uint8Array(ties.n);
  let tied = 0;
  for (let i = 0; i < ties.n; i++) {
    if (degree(i) === 0) continue;
    isTied[i] = 1;
    tied++;
  }
  return { n: ties.n, source, target, weight, tied, isTied: tied === ties.n ? null : isTied };
}

/** Permutations for tests over these ties: households without ties change places among themselves only. */
export function tiePlan(list: TieList, permutations: number, uniform: Uniform): PermutationPlan {
  return new PermutationPlan(list.n, permutations, uniform, list.isTied);
}

/** A p-value and the permutations behind it. */
export interface NullResult {
  /** (1 + permutations at least as extreme) / (1 + permutations drawn); NaN when nothing can vary. */
  readonly p: number;
  readonly drawn: number;
}

/**
 * Tied households from which the normal approximation takes the permutations' place: the null distributions' skewness
 * falls with 1/√n, and their moments under random arrangement are exact (Cliff and Ord 1981).
 */
export const NORMAL_FROM = 50_000;

/** Permutations of Moran's I worked at once. */
const WIDTH = 8;
/** Sums of the same terms in another order may differ by this much. */
const SLACK = 1e-12;

/**
 * Two-sided permutation p-value of Moran's I: as far from −1/(n − 1), either way.
 *
 * @param value - length n, finite
 * @param i - the observed I, row-standardised weights (network/measure/moran.ts)
 * @param plan - from `tiePlan`
 * @returns cost O(permutations · (n + ties))
 */
export function moranNull(list: TieList, value: Float64Array, i: number, plan: PermutationPlan): NullResult {
  const { n, source, target, weight, tied, isTied } = list;
  if (value.length !== n) throw new ShapeError('value', value.length, n, 'one value per household');
  const { count } = plan;
  if (Number.isNaN(i) || count === 0) return { p: NaN, drawn: 0 };
  let mean = 0;
  for (let h = 0; h < n; h++) if (isTied === null || isTied[h] === 1) mean += value[h];
  mean /= tied;
  const z = new Float64Array(n);
  let square = 0;
  for (let h = 0; h < n; h++) {
    if (isTied !== null && isTied[h] === 0) continue;
    z[h] = value[h] - mean;
    square += z[h] * z[h];
  }
  const expected = -1 / (tied - 1);
  const limit = Math.abs(i - expected) - SLACK * Math.max(1, Math.abs(i));
  const enough = Math.ceil(0.1 * (count + 1));
  const spread = new Float64Array(n * WIDTH);
  const cross = new Float64Array(WIDTH);
  let extreme = 0;
  let drawn = 0;
  while (drawn < count && extreme < enough) {
    const lanes = Math.min(WIDTH, count - drawn);
    // household h is given the value of household order[h]: as random as the other way round, and writes in order
    for (let lane = 0; lane < lanes; lane++) {
      const order = plan.list(drawn + lane);
      for (let h = 0, at = lane; h < n; h++, at += WIDTH) spread[at] = z[order[h]];
    }
    crossProducts(source, target, weight, spread, cross);
    for (let lane = 0; lane < lanes; lane++) if (Math.abs(cross[lane] / square - expected) >= limit) extreme++;
    drawn += lanes;
  }
  return { p: (1 + extreme) / (1 + drawn), drawn };
}

/** Σ over ties of weight × the values at both ends, for eight arrangements side by side. Ties are sorted by source. */
function crossProducts(
  source: Uint32Array,
  target: Uint32Array,
  weight: Float64Array,
  spread: Float64Array,
  out: Float64Array,
): void {
  out.fill(0);
  const ties = weight.length;
  for (let e = 0; e < ties; ) {
    const from = source[e];
    let s0 = 0;
    let s1 = 0;
    let s2 = 0;
    let s3 = 0;
    let s4 = 0;
    let s5 = 0;
    let s6 = 0;
    let s7 = 0;
    for (; e < ties && source[e] === from; e++) {
      const b = target[e] * WIDTH;
      const w = weight[e];
      s0 += w * spread[b];
      s1 += w * spread[b + 1];
      s2 += w * spread[b + 2];
      s3 += w * spread[b + 3];
      s4 += w * spread[b + 4];
      s5 += w * spread[b + 5];
      s6 += w * spread[b + 6];
      s7 += w * spread[b + 7];
    }
    const a = from * WIDTH;
    out[0] += spread[a] * s0;
    out[1] += spread[a + 1] * s1;
    out[2] += spread[a + 2] * s2;
    out[3] += spread[a + 3] * s3;
    out[4] += spread[a + 4] * s4;
    out[5] += spread[a + 5] * s5;
    out[6] += spread[a + 6] * s6;
    out[7] += spread[a + 7] * s7;
  }
}

/**
 * Permutation p-value of the ties that join two marked households: at least as many by chance.
 *
 * @param mark - 0 or 1 by household
 * @param plan - from `tiePlan`
 * @returns NaN p when no tied household or every one is marked. Cost O(permutations · (marked + ties / 32)).
 */
export function joinCountNull(list: TieList, mark: Uint8Array, plan: PermutationPlan): NullResult {
  const { n, source, target, tied, isTied } = list;
  if (mark.length !== n) throw new ShapeError('mark', mark.length, n, 'one mark per household');
  const { count } = plan;
  const holders = new Uint32Array(n);
  let holding = 0;
  for (let h = 0; h < n; h++) if (mark[h] === 1 && (isTied === null || isTied[h] === 1)) holders[holding++] = h;
  const marked = holders.subarray(0, holding);
  if (marked.length === 0 || marked.length === tied || count === 0) return { p: NaN, drawn: 0 };
  let observed = 0;
  for (let e = 0; e < source.length; e++) observed += mark[source[e]] & mark[target[e]];
  const enough = Math.ceil(0.1 * (count + 1));
  const words = new Int32Array(n);
  const joined = new Int32Array(source.length);
  const joins = new Uint32Array(LANES);
  let reached = 0;
  let drawn = 0;
  while (drawn < count && reached < enough) {
    const lanes = Math.min(LANES, count - drawn);
    words.fill(0);
    for (let lane = 0; lane < lanes; lane++) dealMarks(words, plan.list(drawn + lane), marked, 1 << lane);
    for (let e = 0; e < joined.length; e++) joined[e] = words[source[e]] & words[target[e]];
    countLanes(joined, joined.length, joins);
    for (let lane = 0; lane < lanes; lane++) if (joins[lane] >= observed) reached++;
    drawn += lanes;
  }
  return { p: (1 + reached) / (1 + drawn), drawn };
}
