/**
 * Random degree-preserving swaps of a share of the ties (Maslov and Sneppen 2002).
 *
 * The share is of ties, not of attempts: a random subset of that size is chosen and every tie of it is swapped with
 * another of the subset, so a share of 1 leaves no tie as it was drawn and 0.5 leaves half of them alone. A tie that
 * finds no partner after many tries stays, and the share reached says so.
 */
import { shuffled } from '../build/order.js';
import type { Uniform } from '../graph.js';
import type { TieSlots } from './tie-slots.js';

/** Partners tried for a tie before it is left; on a sparse network the first almost always fits. */
const PARTNERS = 200;

export interface SwapCount {
  tried: number;
  accepted: number;
  /** Ties that took part in at least one swap. */
  moved: number;
}

/** Swaps within `slots`. Cost O(share · m · degree). */
export function swapShare(slots: TieSlots, share: number, uniform: Uniform): SwapCount {
  const m = slots.source.length;
  // a swap takes two ties; one tie alone cannot be swapped
  const size = share > 0 ? Math.min(m, Math.max(2, Math.round(share * m))) : 0;
  const chosen = shuffled(m, uniform).subarray(0, size);
  const moved = new Uint8Array(m);
  let tried = 0;
  let accepted = 0;
  let count = 0;
  for (let at = 0; at < size && size > 1; at++) {
    const e = chosen[at];
    if (moved[e] === 1) continue;
    for (let t = 0; t < PARTNERS; t++) {
      tried++;
      // a partner not yet moved first, so that ties of the subset pair off; near the end any of the subset
      const free = t < PARTNERS / 2 && at + 1 < size;
      const f = free ? chosen[at + 1 + Math.floor(uniform() * (size - at - 1))] : chosen[Math.floor(uniform() * size)];
      if (f === e || (free && moved[f] === 1 && t < PARTNERS / 4)) continue;
      if (uniform() < 0.5) slots.turn(f);
      if (!slots.swappable(e, f)) continue;
      slots.swap(e, f);
      accepted++;
      count += 1 - moved[f] + 1;
      moved[e] = 1;
      moved[f] = 1;
      break;
    }
  }
  return { tried, accepted, moved: count };
}
