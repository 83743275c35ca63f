/**
 * Statistics of wealth over the people one household has in sight through ties: its neighbours or its second circle.
 *
 * Rows are short, so every statistic is computed row by row. Does not know whose rows they are (reference.ts).
 */

import { exp, log } from '../../network/elementary.js';
import type { Ties } from '../../network/graph.js';
import { rowKernel } from '../kernel/rows.js';
import { quantileOfSorted } from './set-statistic.js';
import type { Part } from './types.js';

/** Members in compressed rows; `weight` counts for the mean only. */
export interface Rows {
  readonly start: Uint32Array;
  readonly target: Uint32Array;
  readonly weight: Float64Array | null;
}

/** Scratch space for one row, as long as the longest. */
export interface Scratch {
  readonly values: Float64Array;
}

/**
 * Statistic of every household's row; own wealth and a mark where the row is empty (or all its weights are 0).
 *
 * @param out - length n, overwritten
 * @param isolated - set to 1 where the row is missing, else left alone
 */
export function rowStatistics(
  part: Part,
  rows: Rows,
  wealth: Float64Array,
  scratch: Scratch,
  out: Float64Array,
  isolated: Uint8Array,
): void {
  const n = wealth.length;
  const { start, target, weight } = rows;
  const plainMean = part.statistic === 'mean' && weight === null;
  if (plainMean || part.statistic === 'upward_mean') {
    const upward = part.statistic === 'upward_mean';
    // second circles would push the ties out of the kernel's memory every generation
    const compiled = part.from === 'neighbours' ? rowKernel() : null;
    if (compiled?.means(upward, start, target, wealth, out) !== true) plainMeans(upward, rows, wealth, out);
    for (let i = 0; i < n; i++) if (start[i] === start[i + 1]) isolated[i] = 1;
    return;
  }
  for (let i = 0; i < n; i++) {
    const value = rowStatistic(part, target, start[i], start[i + 1], weight, wealth, wealth[i], scratch);
    if (Number.isNaN(value)) {
      out[i] = wealth[i];
      isolated[i] = 1;
    } else out[i] = value;
  }
}

/** Mean (or mean of the richer) of every row without the kernel; own wealth where there are none. */
export function plainMeans(upward: boolean, rows: Rows, wealth: Float64Array, out: Float64Array): void {
  const { start, target } = rows;
  const n = wealth.length;
  for (let i = 0; i < n; i++) {
    const own = wealth[i];
    const from = start[i];
    const to = start[i + 1];
    let sum = 0;
    let count = 0;
    if (upward) {
      for (let e = from; e < to; e++) {
        const other = wealth[target[e]];
        // without a branch: which neighbours are richer cannot be predicted
        const richer = other > own ? 1 : 0;
        sum += richer * other;
        count += richer;
      }
    } else {
      for (let e = from; e < to; e++) sum += wealth[target[e]];
      count = to - from;
    }
    out[i] = count > 0 ? sum / count : own;
  }
}

/**
 * Statistic of one row, target[from … to−1]; NaN when the row is empty or all its weights are 0.
 *
 * @param own - the household's own wealth
 */
export function rowStatistic(
  part: Part,
  target: Uint32Array,
  from: number,
  to: number,
  weight: Float64Array | null,
  wealth: Float64Array,
  own: number,
  scratch: Scratch,
): number {
  if (from === to) return NaN;
  switch (part.statistic) {
    case 'mean': {
      let sum = 0;
      if (weight === null) {
        for (let e = from; e < to; e++) sum += wealth[target[e]];
        return sum / (to - from);
      }
      let total = 0;
      for (let e = from; e < to; e++) {
        sum += weight[e] * wealth[target[e]];
        total += weight[e];
      }
      return total > 0 ? sum / total : NaN;
    }
    case 'upward_mean': {
      let sum = 0;
      let count = 0;
      for (let e = from; e < to; e++) {
        const other = wealth[target[e]];
        if (other > own) {
          sum += other;
          count++;
        }
      }
      return count > 0 ? sum / count : own;
    }
    case 'max': {
      let max = wealth[target[from]];
      for (let e = from + 1; e < to; e++) if (wealth[target[e]] > max) max = wealth[target[e]];
      return max;
    }
    case 'similarity_mean':
      return similarityOfRow(target, from, to, wealth, own, part.window);
    default: {
      const values = scratch.values;
      const size = to - from;
      if (size > 64) {
        for (let e = from; e < to; e++) values[e - from] = wealth[target[e]];
        values.subarray(0, size).sort();
      } else {
        for (let e = from; e < to; e++) {
          const value = wealth[target[e]];
          let at = e - from;
          while (at > 0 && values[at - 1] > value) {
            values[at] = values[at - 1];
            at--;
          }
          values[at] = value;
        }
      }
      return quantileOfSorted(values, 0, size, part.statistic === 'median' ? 0.5 : part.q);
    }
  }
}

function similarityOfRow(
  target: Uint32Array,
  from: number,
  to: number,
  wealth: Float64Array,
  own: number,
  window: number,
): number {
  const factor = -0.5 / (window * window);
  const logOwn = log(own);
  // relative to the most similar member, so that a household far from everyone it knows still gets a mean
  let nearest = Infinity;
  for (let e = from; e < to; e++) {
    const d = log(wealth[target[e]]) - logOwn;
    if (d * d < nearest) nearest = d * d;
  }
  let sum = 0;
  let total = 0;
  for (let e = from; e < to; e++) {
    const value = wealth[target[e]];
    const d = log(value) - logOwn;
    const w = exp(factor * (d * d - nearest));
    sum += w * value;
    total += w;
  }
  return sum / total;
}

/** Finds second circles: ties of ties, the household and its own ties left out, each once, ascending. */
export class SecondCircle {
  private readonly ties: Ties;
  /** mark[j] is the number of the last search that saw j. */
  private readonly mark: Uint32Array;
  private searches: number;
  /** Members of the last household asked for, in the first `size` places. */
  members: Uint32Array;
  size: number;

  constructor(ties: Ties) {
    this.ties = ties;
    this.mark = new Uint32Array(ties.n);
    this.searches = 0;
    this.members = new Uint32Array(256);
    this.size = 0;
  }

  /** Cost: the sum of the degrees of i's ties. */
  find(i: number): void {
    const { start, target } = this.ties;
    const mark = this.mark;
    if (this.searches === 0xffffffff) {
      mark.fill(0);
      this.searches = 0;
    }
    const stamp = ++this.searches;
    mark[i] = stamp;
    for (let e = start[i]; e < start[i + 1]; e++) mark[target[e]] = stamp;
    let size = 0;
    for (let e = start[i]; e < start[i + 1]; e++) {
      const j = target[e];
      for (let f = start[j]; f < start[j + 1]; f++) {
        const far = target[f];
        if (mark[far] === stamp) continue;
        mark[far] = stamp;
        if (size === this.members.length) {
          const longer = new Uint32Array(2 * size);
          longer.set(this.members);
          this.members = longer;
        }
        this.members[size++] = far;
      }
    }
    this.size = size;
  }

  /** Every second circle as rows, or null when they would take more than `limit` members in all. */
  rows(limit: number): Rows | null {
    const n = this.ties.n;
    const start = new Uint32Array(n + 1);
    let target = new Uint32Array(Math.min(limit, 16 * n + 64));
    let used = 0;
    for (let i = 0; i < n; i++) {
      this.find(i);
      const end = used + this.size;
      if (end > limit) return null;
      if (end > target.length) {
        const longer = new Uint32Array(Math.min(limit, Math.max(end, 2 * target.length)));
        longer.set(target);
        target = longer;
      }
      target.set(this.members.subarray(0, this.size), used);
      target.subarray(used, end).sort();
      used = end;
      start[i + 1] = used;
    }
    return { start, target: target.slice(0, used), weight: null };
  }
}
