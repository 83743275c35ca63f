/**
 * Isolation and exposure: whom the members of a group have around them.
 *
 * The P* indices (Bell 1954; Massey and Denton 1988): isolation of a group is the average over its members of its own
 * share around them, exposure to another group is the average of that group's share. "Around" is the neighbourhood a
 * household lives in (its place, itself counted, as the indices are used on census tracts) or its own ties.
 */
import { ShapeError } from '../errors.js';
import type { Ties } from '../graph.js';

/**
 * Exposure of each group (rows) to each (columns) by place: Σ_p (members of g in p / members of g) · (members of h in p /
 * households of p). Rows sum to 1; the diagonal is isolation.
 *
 * @param group - labels 0 … groups−1, length n
 * @param place - labels, length n
 * @returns groups × groups, row by row; NaN rows for groups without members. Cost O(n + places · groups²).
 */
export function exposureByPlace(group: Uint32Array, groups: number, place: Uint32Array): Float64Array<ArrayBuffer> {
  const n = group.length;
  if (place.length !== n) throw new ShapeError('place', place.length, n, 'one place per household');
  let places = 0;
  for (let i = 0; i < n; i++) if (place[i] >= places) places = place[i] + 1;
  const count = new Float64Array(places * groups);
  const members = new Float64Array(groups);
  for (let i = 0; i < n; i++) {
    count[place[i] * groups + group[i]]++;
    members[group[i]]++;
  }
  const out = new Float64Array(groups * groups);
  for (let p = 0; p < places; p++) {
    let size = 0;
    for (let g = 0; g < groups; g++) size += count[p * groups + g];
    if (size === 0) continue;
    for (let g = 0; g < groups; g++) {
      for (let h = 0; h < groups; h++) {
        out[g * groups + h] += (count[p * groups + g] * count[p * groups + h]) / size;
      }
    }
  }
  for (let g = 0; g < groups; g++) for (let h = 0; h < groups; h++) out[g * groups + h] /= members[g];
  return out;
}

/**
 * Exposure of each group (rows) to each (columns) by ties: the average over the members of g that have ties of the share
 * of h among these. Every member has one vote, unlike the tie ends of mixing-by-group.ts.
 *
 * @returns groups × groups, row by row; NaN rows for groups none of whose members has a tie. Cost O(n · groups + m).
 */
export function exposureByTies(ties: Ties, group: Uint32Array, groups: number): Float64Array<ArrayBuffer> {
  const { n, start, target } = ties;
  if (group.length !== n) throw new ShapeError('group', group.length, n, 'one label per household');
  const out = new Float64Array(groups * groups);
  const voters = new Float64Array(groups);
  for (let i = 0; i < n; i++) {
    const k = start[i + 1] - start[i];
    if (k === 0) continue;
    voters[group[i]]++;
    for (let e = start[i]; e < start[i + 1]; e++) out[group[i] * groups + group[target[e]]] += 1 / k;
  }
  for (let g = 0; g < groups; g++) for (let h = 0; h < groups; h++) out[g * groups + h] /= voters[g];
  return out;
}
