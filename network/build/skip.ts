/**
 * Independent coin throws over many pairs at the price of the successes only.
 *
 * The gap between two successes of a coin with probability p is geometric, so the next success is found with one
 * uniform draw instead of one throw per pair (Batagelj and Brandes 2005, "Efficient generation of large random
 * networks"). A library's generator builds a graph of objects and uses the engine's own logarithm; these work on
 * index lists and give the same pairs in every engine.
 */
import { log } from '../elementary.js';
import type { Uniform } from '../graph.js';
import type { PairList } from './pair-list.js';

/** Failures before the next success of a coin with probability p in (0, 1), given `logFail` = log(1 − p). */
function gap(logFail: number, uniform: Uniform): number {
  return Math.floor(log(1 - uniform()) / logFail);
}

/**
 * Joins each of the pairs within `members[from … to−1]` with probability p, independently.
 * Cost O(to − from + pairs joined).
 */
export function joinWithin(
  members: Uint32Array,
  from: number,
  to: number,
  p: number,
  uniform: Uniform,
  out: PairList,
): void {
  if (!(p > 0)) return;
  if (p >= 1) {
    for (let v = from + 1; v < to; v++) for (let w = from; w < v; w++) out.push(members[w], members[v]);
    return;
  }
  const logFail = log(1 - p);
  let v = from + 1;
  let w = from - 1;
  while (v < to) {
    w += 1 + gap(logFail, uniform);
    while (v < to && w >= v) {
      w = from + (w - v);
      v++;
    }
    if (v < to) out.push(members[w], members[v]);
  }
}

/**
 * Joins each pair of one of `members[aFrom … aTo−1]` and one of `members[bFrom … bTo−1]` with probability p,
 * independently; the two ranges must not overlap. Cost O(pairs joined + 1).
 */
export function joinBetween(
  members: Uint32Array,
  aFrom: number,
  aTo: number,
  bFrom: number,
  bTo: number,
  p: number,
  uniform: Uniform,
  out: PairList,
): void {
  const width = bTo - bFrom;
  const total = (aTo - aFrom) * width;
  if (!(p > 0) || total <= 0) return;
  if (p >= 1) {
    for (let a = aFrom; a < aTo; a++) for (let b = bFrom; b < bTo; b++) out.push(members[a], members[b]);
    return;
  }
  const logFail = log(1 - p);
  // pairs numbered row by row: up to n²/4, exact in a double for any population that fits in memory
  let at = gap(logFail, uniform);
  while (at < total) {
    const row = Math.floor(at / width);
    out.push(members[aFrom + row], members[bFrom + (at - row * width)]);
    at += 1 + gap(logFail, uniform);
  }
}
