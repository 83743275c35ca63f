/**
 * Ties more likely between households of similar wealth rank (homophily by rank).
 *
 * With `strength` s, a share s of a household's ties goes to households near it in the order of wealth, and the rest
 * to anyone alike: s = 0 is the random network, and the assortativity of wealth rank comes out close to s. "Near" is
 * within h ranks, h = n/50 or twice the mean degree, whichever is more. At the poor and rich ends the window folds
 * back, so that the poorest and the richest expect as many ties as everybody else.
 */
import { log } from '../elementary.js';
import type { Labels, Ties, Uniform } from '../graph.js';
import { byWealth } from './order.js';
import { PairList } from './pair-list.js';
import { checkMeanDegree, checkShare } from './refuse.js';
import { joinWithin } from './skip.js';
import type { SimilaritySpec } from './spec.js';

/**
 * @param spec - `mean_degree` in 0 … n−1; `strength` in 0 … 1
 * @param labels - wealth gives the ranks
 * @returns ties; expected degree is `mean_degree` at every rank (less at most one part in 2h at the ends).
 *   Cost O(n log n + m), the sort of wealth included.
 * @throws InputError `network-infeasible` when there are too few households
 */
export function similarity(spec: SimilaritySpec, labels: Labels, uniform: Uniform): Ties {
  const { n } = labels;
  const d = spec.mean_degree;
  checkMeanDegree('mean_degree', d, n);
  checkShare('strength', spec.strength);
  const out = new PairList((n * d) / 2);
  if (n < 2 || d === 0) return out.toTies(n);
  const order = byWealth(labels.wealth);
  const h = Math.min(n - 1, Math.max(Math.ceil(2 * d), Math.floor(n / 50)));
  const anyone = (d * (1 - spec.strength)) / (n - 1);
  const near = (d * spec.strength) / (2 * h);
  joinWithin(order, 0, n, anyone, uniform, out);
  // three layers of independent coins whose union has exactly the probability wanted: anyone + near (+ near once
  // more where the window folds back)
  const direct = near / (1 - anyone);
  const folded = near / (1 - anyone - near);
  joinWindow(n, direct, uniform, (i) => [i + 1, Math.min(n - 1, i + h)], order, out);
  joinWindow(n, folded, uniform, (i) => [i + 1, Math.min(n - 1, h - 1 - i)], order, out);
  joinWindow(n, folded, uniform, (i) => [Math.max(i + 1, 2 * n - 1 - i - h), n - 1], order, out);
  return out.toSimpleTies(n);
}

/** Joins rank i and each rank of `window(i)` (first and last, both included) with probability p. */
function joinWindow(
  n: number,
  p: number,
  uniform: Uniform,
  window: (i: number) => readonly [number, number],
  order: Uint32Array,
  out: PairList,
): void {
  if (!(p > 0)) return;
  const logFail = p < 1 ? log(1 - p) : -Infinity;
  const gap = (): number => (p < 1 ? Math.floor(log(1 - uniform()) / logFail) : 0);
  // coins left unthrown carry over from one row to the next, so empty rows cost no draw
  let wait = gap();
  for (let i = 0; i < n; i++) {
    const [first, last] = window(i);
    let at = first + wait;
    while (at <= last) {
      out.push(order[i], order[at]);
      at += 1 + gap();
    }
    wait = last >= first ? at - last - 1 : wait;
  }
}
