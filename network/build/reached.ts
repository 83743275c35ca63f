/**
 * What a network came out as, beside what was asked for.
 */
import { type Labels, type Ties, tieCount } from '../graph.js';

export interface Reached {
  readonly households: number;
  readonly ties: number;
  /** 2 × ties / households. */
  readonly mean_degree: number;
  /** Share of ties that join two households of one place; NaN without ties. */
  readonly within_place: number;
  /** Of the ties inside a place, the share that join two of one group; NaN when there are none. */
  readonly within_group: number;
}

/** Counts ties by place and group. Cost O(n + m). */
export function reached(ties: Ties, labels: Labels): Reached {
  const { n, start, target } = ties;
  const { place, group } = labels;
  let inPlace = 0;
  let inGroup = 0;
  for (let i = 0; i < n; i++) {
    for (let e = start[i]; e < start[i + 1]; e++) {
      const j = target[e];
      if (place[i] !== place[j]) continue;
      inPlace++;
      if (group[i] === group[j]) inGroup++;
    }
  }
  return {
    households: n,
    ties: tieCount(ties),
    mean_degree: n > 0 ? target.length / n : NaN,
    within_place: target.length > 0 ? inPlace / target.length : NaN,
    within_group: inPlace > 0 ? inGroup / inPlace : NaN,
  };
}
