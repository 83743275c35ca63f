/**
 * Economic connectedness and its two parts, exposure and friending bias (Chetty et al. 2022, Nature 608).
 *
 * Connectedness of a below-median household is twice the share of above-median households among its ties, so 1 means
 * as many as in the population. Exposure is twice the share of above-median households in its place: whom it could
 * meet at home. Friending bias is 1 − the share among its ties / the share in its place: how much fewer it has than
 * that, 0 when it befriends at random in its place; ties to other places can make it negative. Ties count alike,
 * whatever their weights. A household exactly at the median is on neither side.
 */
import type { Ties } from '../graph.js';
import { median } from './ranks.js';

/** +1 above the median of `value`, −1 below, 0 at it. Cost O(n log n). */
export function aboveMedian(value: Float64Array): Int8Array {
  const middle = median(value);
  const out = new Int8Array(value.length);
  for (let i = 0; i < value.length; i++) out[i] = value[i] > middle ? 1 : value[i] < middle ? -1 : 0;
  return out;
}

export interface EconomicConnectedness {
  /** Mean over below-median households that have ties; 0 … 2; NaN when there are none. */
  readonly connectedness: number;
  /** Mean over the same households of twice the above-median share of their place; 0 … 2. */
  readonly exposure: number;
  /** Mean over those of them in places with an above-median household of 1 − share / place share; ≤ 1. */
  readonly friendingBias: number;
  /** By place 0 … places−1: below-median households that have ties. */
  readonly households: Uint32Array;
  readonly connectednessByPlace: Float64Array;
  readonly exposureByPlace: Float64Array;
  /** NaN where a place has no above-median household, or no below-median one with ties. */
  readonly biasByPlace: Float64Array;
}

/**
 * @param value - wealth, length n
 * @param place - place of each household, 0 … places−1
 * @returns see the fields. Cost O(n log n + m).
 */
export function economicConnectedness(ties: Ties, value: Float64Array, place: Uint32Array): EconomicConnectedness {
  const { n, start, target } = ties;
  const side = aboveMedian(value);
  let places = 0;
  for (let i = 0; i < n; i++) if (place[i] >= places) places = place[i] + 1;
  const size = new Float64Array(places);
  const above = new Float64Array(places);
  for (let i = 0; i < n; i++) {
    size[place[i]]++;
    if (side[i] > 0) above[place[i]]++;
  }
  const households = new Uint32Array(places);
  const connectednessByPlace = new Float64Array(places);
  for (let i = 0; i < n; i++) {
    const degree = start[i + 1] - start[i];
    if (side[i] >= 0 || degree === 0) continue;
    let rich = 0;
    for (let e = start[i]; e < start[i + 1]; e++) if (side[target[e]] > 0) rich++;
    households[place[i]]++;
    connectednessByPlace[place[i]] += (2 * rich) / degree;
  }
  let low = 0;
  let lowBiased = 0;
  let connectedness = 0;
  let exposure = 0;
  let bias = 0;
  const exposureByPlace = new Float64Array(places);
  const biasByPlace = new Float64Array(places).fill(NaN);
  for (let p = 0; p < places; p++) {
    const count = households[p];
    exposureByPlace[p] = size[p] > 0 ? (2 * above[p]) / size[p] : NaN;
    if (count === 0) {
      connectednessByPlace[p] = NaN;
      continue;
    }
    low += count;
    connectedness += connectednessByPlace[p];
    exposure += count * exposureByPlace[p];
    connectednessByPlace[p] /= count;
    if (above[p] > 0) {
      biasByPlace[p] = 1 - connectednessByPlace[p] / exposureByPlace[p];
      bias += count * biasByPlace[p];
      lowBiased += count;
    }
  }
  return {
    connectedness: low > 0 ? connectedness / low : NaN,
    exposure: low > 0 ? exposure / low : NaN,
    friendingBias: lowBiased > 0 ? bias / lowBiased : NaN,
    households,
    connectednessByPlace,
    exposureByPlace,
    biasByPlace,
  };
}
