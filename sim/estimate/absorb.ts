/**
 * Takes group effects out of columns by alternating projections.
 *
 * One effect: subtract group means. Several: sweep through them forth and back, the symmetric sweep being
 * accelerated by conjugate gradients (Hernández-Ramos, Escalante and Raydan 2011), until a full sweep changes a
 * column by less than 1e−10 of its length. Does not decide degrees of freedom (groups.ts).
 */

import type { Groups } from './groups.js';

/** A column is done when a sweep changes it by less than this share of its length. */
export const ABSORB_TOLERANCE = 1e-10;

const MOST_SWEEPS = 10_000;

/** What absorption took. */
export interface Absorbed {
  /** Most sweeps any column needed. */
  readonly sweeps: number;
  /** False when a column had not settled after 10,000 sweeps. */
  readonly settled: boolean;
}

/**
 * Demeans columns in place by every effect.
 *
 * @param columns - overwritten; each of length n
 * @param effects - groupings of the n rows
 * @param weights - [all 1] n weights > 0 of the means
 * Cost O(n · effects) per sweep; memory four columns and the groups' sums.
 */
export function absorb(columns: readonly Float64Array[], effects: readonly Groups[], weights?: Float64Array): Absorbed {
  if (effects.length === 0) return { sweeps: 0, settled: true };
  const n = effects[0].codes.length;
  const inverse = effects.map((effect) => {
    const total = new Float64Array(effect.count);
    for (let i = 0; i < n; i++) total[effect.codes[i]] += weights ? weights[i] : 1;
    for (let g = 0; g < total.length; g++) total[g] = total[g] > 0 ? 1 / total[g] : 0;
    return total;
  });
  const sums = effects.map((effect) => new Float64Array(effect.count));
  const demean = (x: Float64Array, e: number): void => {
    const { codes } = effects[e];
    const sum = sums[e];
    const inv = inverse[e];
    sum.fill(0);
    if (weights) for (let i = 0; i < n; i++) sum[codes[i]] += weights[i] * x[i];
    else for (let i = 0; i < n; i++) sum[codes[i]] += x[i];
    for (let g = 0; g < sum.length; g++) sum[g] *= inv[g];
    for (let i = 0; i < n; i++) x[i] -= sum[codes[i]];
  };
  const dot = (a: Float64Array, b: Float64Array): number => {
    let s = 0;
    if (weights) for (let i = 0; i < n; i++) s += weights[i] * a[i] * b[i];
    else for (let i = 0; i < n; i++) s += a[i] * b[i];
    return s;
  };

  let sweeps = 0;
  let settled = true;
  const last = effects.length - 1;
  const work = last > 0 ? [new Float64Array(n), new Float64Array(n), new Float64Array(n)] : [];
  for (const y of columns) {
    const before = dot(y, y);
    // twice: the first pass takes out a large mean, the second the rounding it left
    for (let pass = 0; pass < 2; pass++) for (let e = 0; e <= last; e++) demean(y, e);
    if (last === 0) continue;
    const [r, u, v] = work;
    const sweep = (from: Float64Array, to: Float64Array): void => {
      to.set(from);
      for (let e = 0; e <= last; e++) demean(to, e);
      for (let e = last - 1; e >= 0; e--) demean(to, e);
      for (let i = 0; i < n; i++) to[i] = from[i] - to[i];
    };
    sweep(y, r);
    u.set(r);
    let rr = dot(r, r);
    // a column that the effects explain altogether settles at rounding level of what it was
    const floor = (before * 1e-28) / ABSORB_TOLERANCE ** 2;
    let size = Math.max(dot(y, y), floor);
    let count = 0;
    while (rr > ABSORB_TOLERANCE ** 2 * size) {
      if (++count > MOST_SWEEPS) {
        settled = false;
        break;
      }
      sweep(u, v);
      const alpha = rr / dot(u, v);
      for (let i = 0; i < n; i++) {
        y[i] -= alpha * u[i];
        r[i] -= alpha * v[i];
      }
      const next = dot(r, r);
      const beta = next / rr;
      rr = next;
      for (let i = 0; i < n; i++) u[i] = r[i] + beta * u[i];
      size = Math.max(dot(y, y), floor);
    }
    for (let e = 0; e <= last; e++) demean(y, e);
    if (count > sweeps) sweeps = count;
  }
  return { sweeps: Math.max(1, sweeps), settled };
}
