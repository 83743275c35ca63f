/**
 * Normal p-values of z statistics.
 */
import normal from '@stdlib/stats-base-dists-normal';
import type { Alternative } from './permute.js';

/** Chance of a standard normal at least as extreme as z; NaN for NaN. */
export function normalP(z: number, alternative: Alternative): number {
  if (alternative === 'greater') return normal.cdf(-z, 0, 1);
  if (alternative === 'less') return normal.cdf(z, 0, 1);
  return 2 * normal.cdf(-Math.abs(z), 0, 1);
}
