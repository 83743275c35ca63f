/**
 * Erdős–Rényi ties: every pair joined with the same probability, independently (Gilbert 1959, G(n, p)).
 *
 * Not the library's generator: that one builds objects and cannot make ten million ties in seconds.
 */
import type { Labels, Ties, Uniform } from '../graph.js';
import { PairList } from './pair-list.js';
import { checkMeanDegree } from './refuse.js';
import { joinWithin } from './skip.js';
import type { RandomSpec } from './spec.js';

/**
 * @param spec - `mean_degree` in 0 … n−1, expected ties of a household
 * @param labels - only the number of households is used
 * @returns ties; expected number n · mean_degree / 2. Cost O(n + m).
 * @throws InputError `network-infeasible` when there are too few households
 */
export function random(spec: RandomSpec, labels: Labels, uniform: Uniform): Ties {
  const { n } = labels;
  checkMeanDegree('mean_degree', spec.mean_degree, n);
  const out = new PairList((n * spec.mean_degree) / 2);
  const everyone = new Uint32Array(n);
  for (let i = 0; i < n; i++) everyone[i] = i;
  if (n > 1) joinWithin(everyone, 0, n, spec.mean_degree / (n - 1), uniform, out);
  return out.toTies(n);
}
