/**
 * Degree-preserving swaps toward a value of a measure.
 *
 * After Xulvi-Brunet and Sokolov (2004): two ties drawn at random, their far ends exchanged when that brings the
 * measure nearer to its target. They draw a share of swaps blindly to set the level; here the search simply stops at
 * the target, from either side. When improving swaps become rare, swaps that leave the measure where it is are
 * allowed, so that a small network does not stick at a local best.
 */
import type { Uniform } from '../graph.js';
import type { Objective } from './objective.js';
import type { TieSlots } from './tie-slots.js';

/** A target counts as reached this near: half a point, well below what two draws of one network differ by. */
export const TOLERANCE = 0.005;

/**
 * On a small network a single swap may move the value further than that: then half a swap is near enough, up to 0.02
 * (a network of a hundred ties). Smaller ones are refused rather than called reached.
 */
export function toleranceOf(aim: Objective): number {
  return Math.max(TOLERANCE, Math.min(aim.step / 2, 0.02));
}

/** The search goes on to here where it can: cheap on a large network, and arms then differ by their target alone. */
const CLOSE = 1e-4;

export interface TowardResult {
  before: number;
  reached: number;
  tried: number;
  accepted: number;
}

/**
 * Swaps within `slots` until the objective is at `goal`.
 * Stops when it is within 1e-4, when it is within the tolerance and m tries in a row did not help, or when
 * max(20 m, 20,000) tries in a row did not help. Cost O(tries · degree).
 */
export function swapToward(slots: TieSlots, aim: Objective, goal: number, uniform: Uniform): TowardResult {
  const { source, target } = slots;
  const m = source.length;
  let sum = sumOf(slots, aim);
  const before = aim.value(sum);
  let value = before;
  let tried = 0;
  let accepted = 0;
  let idle = 0;
  let sinceResum = 0;
  const patience = Math.max(20 * m, 20_000);
  const neutralAfter = Math.max(m, 1000);
  while (m > 1) {
    const off = Math.abs(value - goal);
    if (off <= CLOSE || (off <= toleranceOf(aim) && idle >= m) || idle >= patience) break;
    tried++;
    idle++;
    const e = Math.floor(uniform() * m);
    const f = Math.floor(uniform() * m);
    if (e === f) continue;
    // either pairing of the four ends, each half the time
    if (uniform() < 0.5) slots.turn(f);
    const a = source[e];
    const b = target[e];
    const c = source[f];
    const d = target[f];
    const change = aim.term(a, d) + aim.term(c, b) - aim.term(a, b) - aim.term(c, d);
    const next = aim.value(sum + change);
    const gain = off - Math.abs(next - goal);
    const better = gain > 1e-13;
    if (!better && !(idle > neutralAfter && gain > -1e-13)) continue;
    if (!slots.swappable(e, f)) continue;
    slots.swap(e, f);
    accepted++;
    sum += change;
    if (better) idle = 0;
    // the running sum gathers rounding; a fresh one every m swaps costs nothing beside them
    if (++sinceResum >= m) {
      sum = sumOf(slots, aim);
      sinceResum = 0;
    }
    value = aim.value(sum);
  }
  return { before, reached: aim.value(sumOf(slots, aim)), tried, accepted };
}

function sumOf(slots: TieSlots, aim: Objective): number {
  let sum = 0;
  for (let e = 0; e < slots.source.length; e++) sum += aim.term(slots.source[e], slots.target[e]);
  return sum;
}
