/**
 * What a generation's measures need of the ties alone: kept while ties do not change, for all generations of an arm.
 */
import type { Ties, Uniform } from '../../network/graph.js';
import { exposureByPlace, exposureByTies } from '../../network/measure/isolation.js';
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
  /** Share of a household's own group around it, mean over households: in its place, among its ties. */
  readonly isolationPlace: number;
  readonly isolationTies: number;
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
  let groups = 1;
  for (let i = 0; i < group.length; i++) if (group[i] >= groups) groups = group[i] + 1;
  return {
    ties,
    list,
    plan: tiePlan(list, permutations, uniform),
    assortativityGroup: groupAssortativity(byGroup),
    assortativityPlace: groupAssortativity(groupTies(ties, place)),
    colemanGroup: coleman(byGroup),
    externalInternalGroup: externalInternal(byGroup),
    isolationPlace: isolation(exposureByPlace(group, groups, place), group, groups),
    isolationTies: isolation(exposureByTies(ties, group, groups), group, groups),
  };
}

/** Isolation of the groups (the diagonal of their exposure), averaged over households; groups without one left out. */
function isolation(exposure: Float64Array, group: Uint32Array, groups: number): number {
  let sum = 0;
  let count = 0;
  for (let i = 0; i < group.length; i++) {
    const own = exposure[group[i] * groups + group[i]];
    if (Number.isNaN(own)) continue;
    sum += own;
    count++;
  }
  return count > 0 ? sum / count : NaN;
}
