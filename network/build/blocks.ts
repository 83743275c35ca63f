/**
 * Stochastic block model over places and groups (Holland, Laskey and Leinhardt 1983).
 *
 * Every household expects the same number of ties. Two households of different places are tied with one probability,
 * the same for all such pairs; groups do not matter there. Inside a place, two of different groups are tied with
 * κ times the probability that would hold if groups did not matter, and each group's ties to its own fill up the
 * rest; one κ is found so that the share of same-group ties inside places is the one asked for. Where a group is so
 * small in its place that it could not fill its ties at that κ, its ties across take the nearest value that lets it.
 *
 * The library's block generators build graphs of objects and know one size of block; places here are unequal.
 */
import type { Labels, Ties, Uniform } from '../graph.js';
import { type Cells, cells } from './order.js';
import { PairList } from './pair-list.js';
import { checkMeanDegree, checkShare, infeasible } from './refuse.js';
import { joinBetween, joinWithin } from './skip.js';
import type { BlocksSpec } from './spec.js';

/**
 * @param spec - see {@link BlocksSpec}; `within_place` below 1 needs two places, and so for `within_group`
 * @param labels - place and group of each household; places may be unequal and small
 * @returns ties. Expected degree `mean_degree` for every household, expected shares as asked over all households.
 *   Cost O(n + m).
 * @throws InputError `network-infeasible` when a place is too small for the ties asked for, or a share is out of reach
 */
export function blocks(spec: BlocksSpec, labels: Labels, uniform: Uniform): Ties {
  const { n } = labels;
  const d = spec.mean_degree;
  checkMeanDegree('mean_degree', d, n);
  if (spec.within_place !== undefined) checkShare('within_place', spec.within_place);
  if (spec.within_group !== undefined) checkShare('within_group', spec.within_group);
  const out = new PairList((n * d) / 2);
  if (n < 2 || d === 0) return out.toTies(n);
  const sorted = cells(labels);
  const outside = probabilityBetweenPlaces(spec, sorted, n);
  const inside = insideDegrees(spec, sorted, n, outside);
  const kappas = groupMixing(spec, sorted, inside);

  const { members, places, placeStart, cellStart, placeCells } = sorted;
  for (let p = 0; p < places; p++) {
    const from = placeStart[p];
    const to = placeStart[p + 1];
    const size = to - from;
    if (size === 0) continue;
    joinBetween(members, from, to, to, n, outside, uniform, out);
    if (size === 1) continue;
    const base = inside[p] / (size - 1);
    // ends of ties to the smaller groups already passed
    let fromSmaller = 0;
    for (let c = placeCells[p]; c < placeCells[p + 1]; c++) {
      const own = cellStart[c + 1] - cellStart[c];
      const larger = to - cellStart[c + 1];
      const crossing = base * kappas[c];
      const same = own > 1 ? (inside[p] - fromSmaller - crossing * larger) / (own - 1) : 0;
      joinWithin(members, cellStart[c], cellStart[c + 1], same, uniform, out);
      joinBetween(members, cellStart[c], cellStart[c + 1], cellStart[c + 1], to, crossing, uniform, out);
      fromSmaller += crossing * own;
    }
  }
  return out.toTies(n);
}

/** Probability of a tie between two households of different places. */
function probabilityBetweenPlaces(spec: BlocksSpec, sorted: Cells, n: number): number {
  const d = spec.mean_degree;
  if (spec.within_place === undefined) return d / (n - 1);
  const leaving = d * (1 - spec.within_place);
  if (leaving === 0) return 0;
  let others = 0;
  for (let p = 0; p < sorted.places; p++) {
    const size = sorted.placeStart[p + 1] - sorted.placeStart[p];
    others += size * (n - size);
  }
  if (others === 0) {
    throw infeasible(
      'within_place',
      `a share of ${1 - spec.within_place} of ties should leave their place, but there is one place only`,
      'leave within_place out, or give the population more places',
    );
  }
  const p = leaving / (others / n);
  if (p > 1) {
    throw infeasible(
      'within_place',
      `${leaving} ties of each household should leave its place, but other places have ${others / n} households`,
      'raise within_place or lower mean_degree',
    );
  }
  return p;
}

/**
 * Expected ties inside its place of a household of each place. A place too small (or too large) for what is asked has
 * the nearest it can have, so that a few odd ones among places of uneven size do not stop a study; when more than half
 * of the households live in such places the request cannot be met and is refused.
 */
function insideDegrees(spec: BlocksSpec, sorted: Cells, n: number, outside: number): Float64Array {
  const d = spec.mean_degree;
  const inside = new Float64Array(sorted.places);
  let small = 0;
  let large = 0;
  for (let p = 0; p < sorted.places; p++) {
    const size = sorted.placeStart[p + 1] - sorted.placeStart[p];
    if (size === 0) continue;
    const k = d - outside * (n - size);
    // rounding may leave 1e-15 of a tie where exactly none, or exactly everyone, was asked for
    if (k > size - 1 + 1e-9 * d) small += size;
    if (k < -1e-9 * d) large += size;
    if (small > n / 2) {
      throw infeasible(
        'mean_degree',
        `place ${p} has ${size} ${size === 1 ? 'household' : 'households'}, too few for ${round(k)} ties each inside it, and most places are like it`,
        `lower mean_degree or within_place, or make places larger than ${Math.ceil(k)} households`,
      );
    }
    if (large > n / 2) {
      throw infeasible(
        'within_place',
        `households of place ${p} (${size} of ${n}) would have ${round(d - k)} ties to other places, more than mean_degree`,
        'raise within_place or make places more equal',
      );
    }
    inside[p] = Math.min(Math.max(k, 0), size - 1);
  }
  return inside;
}

/**
 * κ of each cell, for its ties to the larger groups of its place: one value for all, held within the bounds of each
 * cell, such that the same-group share of ties inside places is `within_group`.
 *
 * With cells sorted by size within a place, the smaller of two groups is always the one whose bounds bind: a small
 * group has few of its own to fill its ties with (lower bound) and runs out of ties to give away first (upper bound).
 */
function groupMixing(spec: BlocksSpec, sorted: Cells, inside: Float64Array): Float64Array {
  const { places, placeStart, cellStart, placeCells } = sorted;
  const count = cellStart.length - 1;
  const kappas = new Float64Array(count).fill(1);
  if (spec.within_group === undefined) return kappas;
  const low = new Float64Array(count);
  const high = new Float64Array(count).fill(1);
  // tie ends inside places, and those across groups at κ = 1
  const across = new Float64Array(count);
  let total = 0;
  for (let p = 0; p < places; p++) {
    const size = placeStart[p + 1] - placeStart[p];
    const k = inside[p];
    if (size < 2 || k === 0) continue;
    total += size * k;
    for (let c = placeCells[p]; c < placeCells[p + 1]; c++) {
      const own = cellStart[c + 1] - cellStart[c];
      if (own === size) continue;
      const neutral = (k / (size - 1)) * (size - own);
      across[c] = (2 * own * k * (placeStart[p + 1] - cellStart[c + 1])) / (size - 1);
      low[c] = Math.min(1, Math.max(0, (k - (own - 1)) / neutral));
      high[c] = Math.max(1, Math.min(k / neutral, (size - 1) / k));
    }
  }
  const wanted = (1 - spec.within_group) * total;
  const at = (kappa: number): number => {
    let sum = 0;
    for (let c = 0; c < count; c++) sum += across[c] * Math.min(Math.max(kappa, low[c]), high[c]);
    return sum;
  };
  let a = 0;
  let b = 1;
  for (let c = 0; c < count; c++) b = Math.max(b, high[c]);
  const least = at(a);
  const most = at(b);
  // 1e-9 of all ties: rounding of the two sums, far below one tie
  if (wanted < least - 1e-9 * total || wanted > most + 1e-9 * total) {
    throw infeasible(
      'within_group',
      `a share of ${spec.within_group} of ties inside places to the own group cannot be had with these groups and places`,
      `give a share from ${round(1 - most / total)} to ${round(1 - least / total)}, or leave it out`,
    );
  }
  // 60 halvings exhaust a double
  for (let step = 0; step < 60; step++) {
    const middle = (a + b) / 2;
    if (at(middle) < wanted) a = middle;
    else b = middle;
  }
  for (let c = 0; c < count; c++) kappas[c] = Math.min(Math.max((a + b) / 2, low[c]), high[c]);
  return kappas;
}

/** Four digits for messages. */
function round(x: number): number {
  return Math.round(x * 1e4) / 1e4;
}
