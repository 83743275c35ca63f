/**
 * What a generation's measures need of the ties alone: kept while ties do not change, for all generations of an arm.
 */
import type { Ties, Uniform } from '../../network/graph.js';
import { coleman, externalInternal, groupAssortativity, groupTies } from '../../network/measure/mixing-by-group.js';
import type { PermutationPlan } from './permutations.js';
import { type TieList, tieList, tiePlan } from './tie-null.js';

/** Measures of ties and labels, and the permutations of tests over them. */
export interface TieFacts {
  readonly ties: Ties;
  readonly list: TieList;
  readonly plan: PermutationPlan;
  readonly assortativityGroup: number;
  readonly assortativityPlace: number;
  readonly colemanGroup: number;
  readonly externalInternalGroup: number;
}

/**
 * Measures the ties of an arm once.
 *
 * @param place - place of each household
 * @param group - social group of each household
 * @param permutations - of the tests over ties
 * @param uniform - stream they are drawn from; one of the arm or the replicate
 */
export function tieFacts(
  ties: Ties,
  place: Uint32Array,
  group: Uint32Array,
  permutations: number,
  uniform: Uniform,
): TieFacts {
  const list = tieList(ties);
  const byGroup = groupTies(ties, group);
  return {
    ties,
    list,
    plan: tiePlan(list, permutations, uniform),
    assortativityGroup: groupAssortativity(byGroup),
    assortativityPlace: groupAssortativity(groupTies(ties, place)),
    colemanGroup: coleman(byGroup),
    externalInternalGroup: externalInternal(byGroup),
  };
}
