/**
 * Ties within and between groups: assortativity by group, modularity, the E–I index and Coleman's homophily index.
 *
 * All come from three sums per group: tie ends of its members, tie ends that stay in the group, and members. Groups may
 * be places. Ties count alike unless weights are asked for.
 */
import { ShapeError } from '../errors.js';
import type { Ties } from '../graph.js';

export interface GroupTies {
  /** Number of groups: largest label + 1. */
  readonly groups: number;
  /** Members of each group, isolates included. */
  readonly members: Float64Array;
  /** Tie ends (or their weight) of each group's members. */
  readonly ends: Float64Array;
  /** Of those, the ends of ties inside the group. */
  readonly inside: Float64Array;
  readonly totalEnds: number;
  readonly totalInside: number;
}

/**
 * Counts tie ends by group.
 *
 * @param group - label of each household, 0 … groups−1, length n
 * @param weighted - count each tie by its weight
 * @returns see {@link GroupTies}. Cost O(n + m + groups).
 */
export function groupTies(ties: Ties, group: Uint32Array, weighted = false): GroupTies {
  const { n, start, target } = ties;
  if (group.length !== n) throw new ShapeError('group', group.length, n, 'one label per household');
  const weight = weighted ? ties.weight : null;
  let groups = 0;
  for (let i = 0; i < n; i++) if (group[i] >= groups) groups = group[i] + 1;
  const members = new Float64Array(groups);
  const ends = new Float64Array(groups);
  const inside = new Float64Array(groups);
  for (let i = 0; i < n; i++) {
    const g = group[i];
    members[g]++;
    for (let e = start[i]; e < start[i + 1]; e++) {
      const w = weight === null ? 1 : weight[e];
      ends[g] += w;
      if (group[target[e]] === g) inside[g] += w;
    }
  }
  let totalEnds = 0;
  let totalInside = 0;
  for (let g = 0; g < groups; g++) {
    totalEnds += ends[g];
    totalInside += inside[g];
  }
  return { groups, members, ends, inside, totalEnds, totalInside };
}

/** Share of ties that stay in their group; NaN without ties. */
export function sameShare(counts: GroupTies): number {
  return counts.totalInside / counts.totalEnds;
}

/** Share of ties that would stay if ends were matched at random: Σ (ends of g / ends)². */
function chanceShare(counts: GroupTies): number {
  let sum = 0;
  for (let g = 0; g < counts.groups; g++) {
    const share = counts.ends[g] / counts.totalEnds;
    sum += share * share;
  }
  return sum;
}

/** Modularity of the split, resolution 1 (Newman and Girvan 2004): same-group share less chance. NaN without ties. */
export function modularity(counts: GroupTies): number {
  return sameShare(counts) - chanceShare(counts);
}

/**
 * Categorical assortativity (Newman 2003, eq. 2): modularity over the most it could be.
 * @returns ≤ 1; NaN when every tie end is in one group, or without ties
 */
export function groupAssortativity(counts: GroupTies): number {
  const chance = chanceShare(counts);
  return chance < 1 ? (sameShare(counts) - chance) / (1 - chance) : NaN;
}

/** E–I index (Krackhardt and Stern 1988): (external − internal ties) / all; −1 … 1; NaN without ties. */
export function externalInternal(counts: GroupTies): number {
  return 1 - 2 * sameShare(counts);
}

/**
 * Homophily of each group: share of its members' tie ends that stay (pooled over ends; Currarini, Jackson and Pin 2009).
 * NaN for a group without ties.
 */
export function homophilyByGroup(counts: GroupTies): Float64Array<ArrayBuffer> {
  const out = new Float64Array(counts.groups);
  for (let g = 0; g < counts.groups; g++) out[g] = counts.inside[g] / counts.ends[g];
  return out;
}

/**
 * Coleman's (1958) inbreeding homophily of each group: (H − w) / (1 − w), H as in {@link homophilyByGroup}, w the group's
 * share of the population, isolates counted. 0 at chance, 1 when no tie leaves; NaN for a group without ties, or when
 * it is everybody.
 */
export function colemanByGroup(counts: GroupTies): Float64Array<ArrayBuffer> {
  const out = homophilyByGroup(counts);
  let n = 0;
  for (let g = 0; g < counts.groups; g++) n += counts.members[g];
  for (let g = 0; g < counts.groups; g++) {
    const w = counts.members[g] / n;
    out[g] = w < 1 ? (out[g] - w) / (1 - w) : NaN;
  }
  return out;
}

/**
 * Coleman's homophily index of the whole network: ties inside groups less those expected, over the most they could
 * exceed it, Σ_g ends_g (H_g − w_g) / Σ_g ends_g (1 − w_g). The groups' indices weighted by what each could exceed.
 * @returns ≤ 1; NaN without ties or with one group
 */
export function coleman(counts: GroupTies): number {
  let n = 0;
  for (let g = 0; g < counts.groups; g++) n += counts.members[g];
  let excess = 0;
  let most = 0;
  for (let g = 0; g < counts.groups; g++) {
    const expected = (counts.ends[g] * counts.members[g]) / n;
    excess += counts.inside[g] - expected;
    most += counts.ends[g] - expected;
  }
  return most > 0 ? excess / most : NaN;
}

/**
 * Mixing matrix: tie ends of group g (rows) whose other end is in h (columns), row by row. Every tie is entered in both
 * orientations, so the sum is twice the ties. For a handful of groups: groups² numbers.
 */
export function mixingMatrix(ties: Ties, group: Uint32Array, groups: number): Float64Array<ArrayBuffer> {
  const { n, start, target } = ties;
  const out = new Float64Array(groups * groups);
  for (let i = 0; i < n; i++) {
    for (let e = start[i]; e < start[i + 1]; e++) out[group[i] * groups + group[target[e]]]++;
  }
  return out;
}
