/**
 * Whether a network has any degree-preserving swap at all.
 */
import type { Uniform } from '../graph.js';
import type { TieSlots } from './tie-slots.js';

/** Below this many ties every pair is looked at. */
const EVERY_PAIR = 2000;

/**
 * True when some two ties can be swapped. Exact up to 2,000 ties; beyond that 2,000,000 random pairs are tried, and a
 * network where none of them fits (a star with stray ties, an almost complete one) is called rigid.
 */
export function rewirable(slots: TieSlots, uniform: Uniform): boolean {
  const m = slots.source.length;
  const either = (e: number, f: number): boolean => {
    if (slots.swappable(e, f)) return true;
    slots.turn(f);
    return slots.swappable(e, f);
  };
  if (m <= EVERY_PAIR) {
    for (let e = 0; e < m; e++) for (let f = e + 1; f < m; f++) if (either(e, f)) return true;
    return false;
  }
  for (let t = 0; t < 2_000_000; t++) {
    const e = Math.floor(uniform() * m);
    const f = Math.floor(uniform() * m);
    if (e !== f && either(e, f)) return true;
  }
  return false;
}
