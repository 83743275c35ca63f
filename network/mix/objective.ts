/**
 * Measures that mixing aims at, kept up to date swap by swap.
 *
 * Degrees never change, so each measure is a constant plus a sum over ties of a term of the two ends; a swap of a–b and
 * c–d into a–d and c–b changes four terms. The whole-network measures of network/measure/ give the same values.
 */
import type { Labels, Ties } from '../graph.js';
import { aboveMedian } from '../measure/economic-connectedness.js';
import { midRanks } from '../measure/ranks.js';
import type { MixTarget } from './spec.js';

export interface Objective {
  /** Value when the ties' terms sum to `sum`. */
  value(sum: number): number;
  /** Term of a tie between i and j. */
  term(i: number, j: number): number;
  /** Lowest and highest value that the definition allows. */
  readonly range: readonly [number, number];
  /** How far a swap moves the value where it moves it by whole steps, 0 where values lie dense. */
  readonly step: number;
}

/**
 * The objective of a target on these ties, or null when it is undefined on them (no ties, all ranks equal among tied
 * households, nobody below the median with a tie). Cost O(n log n + m).
 */
export function objective(target: MixTarget, ties: Ties, labels: Labels): Objective | null {
  switch (target) {
    case 'assortativity':
      return rankAssortativity(ties, labels);
    case 'economic_connectedness':
      return connectedness(ties, labels);
    case 'e_i_group':
      return externalInternal(ties, labels);
  }
}

function rankAssortativity(ties: Ties, labels: Labels): Objective | null {
  const { n, start, target } = ties;
  const ends = target.length;
  const x = midRanks(labels.wealth);
  let mean = 0;
  for (let i = 0; i < n; i++) mean += (start[i + 1] - start[i]) * x[i];
  mean /= ends;
  let variance = 0;
  for (let i = 0; i < n; i++) {
    x[i] -= mean;
    variance += (start[i + 1] - start[i]) * x[i] * x[i];
  }
  if (!(variance > 0)) return null;
  // over both orientations of every tie, the covariance is twice the sum over ties
  const scale = 2 / variance;
  return {
    term: (i, j) => x[i] * x[j],
    value: (sum) => sum * scale,
    range: [-1, 1],
    step: 0,
  };
}

function connectedness(ties: Ties, labels: Labels): Objective | null {
  const { n, start } = ties;
  const side = aboveMedian(labels.wealth);
  const share = new Float64Array(n);
  let low = 0;
  let ends = 0;
  for (let i = 0; i < n; i++) {
    const k = start[i + 1] - start[i];
    if (side[i] >= 0 || k === 0) continue;
    low++;
    ends += k;
    share[i] = 1 / k;
  }
  if (low === 0) return null;
  const scale = 2 / low;
  return {
    term: (i, j) => (side[j] > 0 ? share[i] : 0) + (side[i] > 0 ? share[j] : 0),
    value: (sum) => sum * scale,
    range: [0, 2],
    // one tie of a household with as many ties as the ties below the median have on average
    step: 4 / Math.max(1, ends),
  };
}

function externalInternal(ties: Ties, labels: Labels): Objective | null {
  const m = ties.target.length / 2;
  if (m === 0) return null;
  const { group } = labels;
  return {
    term: (i, j) => (group[i] === group[j] ? -1 : 1),
    value: (sum) => sum / m,
    range: [-1, 1],
    // two ties within groups become two across them, or the other way round
    step: 4 / m,
  };
}
