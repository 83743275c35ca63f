/**
 * Permutation p-values: how often chance alone does as well as what was seen.
 */
import type { Uniform } from '../graph.js';

/** Which outcomes of chance count as "at least as extreme". Two-sided: as far from the expectation, either way. */
export type Alternative = 'greater' | 'less' | 'two-sided';

/** Shuffles a list of values in place (Fisher and Yates). */
export function shuffleValues(list: Float64Array, uniform: Uniform): void {
  for (let i = list.length - 1; i > 0; i--) {
    const j = Math.floor(uniform() * (i + 1));
    const held = list[i];
    list[i] = list[j];
    list[j] = held;
  }
}

/**
 * (1 + permutations at least as extreme) / (1 + permutations), the observed arrangement counted among them (Phipson and
 * Smyth 2010), so never 0.
 *
 * @param observed - the statistic as seen
 * @param expected - its expectation over permutations, for two-sided tests
 * @param draw - the statistic of one more random arrangement
 * @returns p in (0, 1]; NaN when `observed` is NaN or no permutation is asked for
 */
export function permutationP(
  observed: number,
  expected: number,
  alternative: Alternative,
  permutations: number,
  draw: () => number,
): number {
  if (Number.isNaN(observed) || permutations < 1) return NaN;
  const score = (s: number): number =>
    alternative === 'greater' ? s : alternative === 'less' ? -s : Math.abs(s - expected);
  // arrangements that give the same value may differ in the last digits, summed in another order
  const limit = score(observed) - 1e-12 * Math.max(1, Math.abs(observed));
  let extreme = 1;
  for (let r = 0; r < permutations; r++) if (score(draw()) >= limit) extreme++;
  return extreme / (permutations + 1);
}
