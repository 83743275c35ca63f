/**
 * Sizes of circles: how many are one or two ties away (friends of friends).
 */
import type { Ties } from '../graph.js';

/**
 * Households exactly two ties away: ties of ties, each counted once, itself and its own ties left out.
 * @returns length n. Cost O(sum over ties of the degrees at their ends).
 */
export function secondCircleSizes(ties: Ties): Uint32Array<ArrayBuffer> {
  const { n, start, target } = ties;
  const out = new Uint32Array(n);
  const seen = new Uint32Array(n);
  for (let i = 0; i < n; i++) {
    const mark = i + 1;
    seen[i] = mark;
    for (let e = start[i]; e < start[i + 1]; e++) seen[target[e]] = mark;
    for (let e = start[i]; e < start[i + 1]; e++) {
      const j = target[e];
      for (let f = start[j]; f < start[j + 1]; f++) {
        const k = target[f];
        if (seen[k] === mark) continue;
        seen[k] = mark;
        out[i]++;
      }
    }
  }
  return out;
}

/**
 * Two-step walks that do not come straight back: Σ over neighbours of (degree − 1). Counts repeats, and ties that are
 * also ties of ties.
 * @returns length n. Cost O(n + m).
 */
export function secondStepWalks(ties: Ties): Float64Array<ArrayBuffer> {
  const { n, start, target } = ties;
  const out = new Float64Array(n);
  for (let i = 0; i < n; i++) {
    for (let e = start[i]; e < start[i + 1]; e++) out[i] += start[target[e] + 1] - start[target[e]] - 1;
  }
  return out;
}
