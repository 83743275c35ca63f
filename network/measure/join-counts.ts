/**
 * Join counts: whether households of one status are tied to each other more often than chance would have it (Moran 1948;
 * Cliff and Ord 1981, pp. 19–20).
 *
 * A join between two marked households is half the double sum of w_ij over both, so that with binary weights each
 * such tie counts once; row-standardised weights give fractions. Expectation and variance are over arrangements of
 * the same number of marks (nonfree sampling). Households without ties are left out first.
 */
import { ShapeError } from '../errors.js';
import type { Ties, Uniform } from '../graph.js';
import { normalP } from './normal.js';
import { type Alternative, permutationP, shuffleValues } from './permute.js';
import { tiedHouseholds, type WeightStyle, weightSums } from './tie-weights.js';

export interface JoinCount {
  readonly count: number;
  readonly expected: number;
  /** NaN below four tied households. */
  readonly variance: number;
  /** (count − expected) / √variance; NaN when nothing can vary (nobody marked, or everybody). */
  readonly z: number;
  /** Normal p-value of z against more joins than chance (for unlike joins: fewer). */
  readonly p: number;
}

export interface JoinCounts {
  /** Ties between two marked households. */
  readonly marked: JoinCount;
  /** Ties between two unmarked ones. */
  readonly unmarked: JoinCount;
  /** Ties between a marked and an unmarked one. */
  readonly unlike: JoinCount;
}

/**
 * @param mark - 1 for marked households (frustrated), 0 for others, length n
 * @returns the three counts with their moments. Cost O(n + m).
 */
export function joinCounts(ties: Ties, mark: ArrayLike<number>, style: WeightStyle): JoinCounts {
  if (mark.length !== ties.n) throw new ShapeError('mark', mark.length, ties.n, 'one mark per household');
  const { n, s0, s1, s2 } = weightSums(ties, style);
  let count = 0;
  let like = 0;
  let total = 0;
  for (let i = 0; i < ties.n; i++) {
    const k = ties.start[i + 1] - ties.start[i];
    if (k === 0) continue;
    if (mark[i] === 1) count++;
    let marked = 0;
    for (let e = ties.start[i]; e < ties.start[i + 1]; e++) marked += mark[ties.target[e]];
    const w = style === 'row' ? 1 / k : 1;
    if (mark[i] === 1) like += w * marked;
    else total += w * (k - marked);
  }
  like /= 2;
  const unmarked = total / 2;
  const unlike = s0 / 2 - like - unmarked;
  const others = n - count;
  const falling = (a: number, k: number): number => {
    let product = 1;
    for (let t = 0; t < k; t++) product *= a - t;
    return product;
  };
  const share = (a: number, k: number): number => falling(a, k) / falling(n, k);
  const rest = s0 * s0 + s1 - s2;
  const same = (a: number): { expected: number; variance: number } => {
    const expected = a < 2 ? 0 : 0.5 * s0 * share(a, 2);
    const variance = 0.25 * (s1 * share(a, 2) + (s2 - 2 * s1) * share(a, 3) + rest * share(a, 4)) - expected * expected;
    return { expected, variance };
  };
  const marks = same(count);
  const blanks = same(others);
  const mixedExpected = (s0 * count * others) / falling(n, 2);
  const mixedVariance =
    0.25 *
      ((2 * s1 * count * others) / falling(n, 2) +
        ((s2 - 2 * s1) * count * others * (n - 2)) / falling(n, 3) +
        (4 * rest * falling(count, 2) * falling(others, 2)) / falling(n, 4)) -
    mixedExpected * mixedExpected;
  return {
    marked: joinCount(like, marks.expected, marks.variance, 'greater', s0),
    unmarked: joinCount(unmarked, blanks.expected, blanks.variance, 'greater', s0),
    unlike: joinCount(unlike, mixedExpected, mixedVariance, 'less', s0),
  };
}

function joinCount(count: number, expected: number, variance: number, tail: Alternative, s0: number): JoinCount {
  // nothing can vary when nobody or everybody is marked; the variance is then rounding, far below one join
  const z = variance > 1e-12 * s0 ? (count - expected) / Math.sqrt(variance) : NaN;
  return { count, expected, variance, z, p: normalP(z, tail) };
}

/**
 * Permutation p-value of the joins between marked households: marks are shuffled over the tied households.
 *
 * @param mark - as in {@link joinCounts}
 * @param alternative - default: more joins than chance
 * @returns p in (0, 1]; NaN when nobody or everybody is marked. Cost O(permutations · (n + ties of marked ones)); on a
 *   million households the normal p-value of {@link joinCounts} serves as well and costs nothing.
 */
export function joinCountPermutation(
  ties: Ties,
  mark: ArrayLike<number>,
  style: WeightStyle,
  permutations: number,
  uniform: Uniform,
  alternative: Alternative = 'greater',
): number {
  const counts = joinCounts(ties, mark, style).marked;
  if (Number.isNaN(counts.z)) return NaN;
  const households = tiedHouseholds(ties);
  const marks = Float64Array.from(households, (i) => mark[i]);
  const spread = new Float64Array(ties.n);
  const { start, target } = ties;
  return permutationP(counts.count, counts.expected, alternative, permutations, () => {
    shuffleValues(marks, uniform);
    for (let a = 0; a < households.length; a++) spread[households[a]] = marks[a];
    let sum = 0;
    for (let a = 0; a < households.length; a++) {
      if (marks[a] === 0) continue;
      const i = households[a];
      let marked = 0;
      for (let e = start[i]; e < start[i + 1]; e++) marked += spread[target[e]];
      sum += style === 'row' ? marked / (start[i + 1] - start[i]) : marked;
    }
    return sum / 2;
  });
}
