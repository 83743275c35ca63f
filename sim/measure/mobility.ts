/**
 * Mobility between two generations of the same dynasties: elasticity, rank–rank slope, upward mobility, movement.
 *
 * Parent and child are two columns in the same order of rows. Tables of transitions are in transitions.ts.
 */
import { log } from '../../network/elementary.js';
import { ShapeError } from '../../network/errors.js';
import { gini } from './gini.js';
import { averageRanks } from './order.js';

/** A least-squares line with its classical standard error. */
export interface Line {
  readonly intercept: number;
  readonly slope: number;
  /** Classical standard error of the slope, n − 2 degrees of freedom. */
  readonly se: number;
  /** Correlation of x and y. */
  readonly corr: number;
  readonly n: number;
}

/** Least-squares line of y on x. Slope NaN when x does not vary. Cost O(n). */
export function line(x: ArrayLike<number>, y: ArrayLike<number>): Line {
  const n = x.length;
  if (y.length !== n) throw new ShapeError('y', y.length, n, 'one value per x');
  let sumX = 0;
  let sumY = 0;
  for (let i = 0; i < n; i++) {
    sumX += x[i];
    sumY += y[i];
  }
  const meanX = sumX / n;
  const meanY = sumY / n;
  let xx = 0;
  let xy = 0;
  let yy = 0;
  for (let i = 0; i < n; i++) {
    const dx = x[i] - meanX;
    const dy = y[i] - meanY;
    xx += dx * dx;
    xy += dx * dy;
    yy += dy * dy;
  }
  // a spread that is only rounding has no slope
  const flat = !(xx > 1e-24 * n * Math.max(1, meanX * meanX));
  const slope = flat ? NaN : xy / xx;
  const residual = Math.max(0, yy - slope * xy);
  return {
    intercept: meanY - slope * meanX,
    slope,
    se: Math.sqrt(residual / (n - 2) / xx),
    corr: flat ? NaN : xy / Math.sqrt(xx * yy),
    n,
  };
}

function logsOf(values: ArrayLike<number>): Float64Array {
  const out = new Float64Array(values.length);
  for (let i = 0; i < out.length; i++) out[i] = log(values[i]);
  return out;
}

/**
 * Intergenerational elasticity: slope of log child wealth on log parent wealth, least squares over all pairs.
 *
 * @param parent - length n, above 0 (NaN or −∞ logs make the result NaN)
 * @param child - same rows
 */
export function elasticity(parent: ArrayLike<number>, child: ArrayLike<number>): Line {
  return line(logsOf(parent), logsOf(child));
}

/**
 * Rank–rank slope: child's rank on parent's rank, ties sharing their average rank, ranks divided by n.
 *
 * The slope does not depend on that scale; the intercept does.
 */
export function rankRankSlope(parent: ArrayLike<number>, child: ArrayLike<number>): Line {
  const n = parent.length;
  const x = averageRanks(parent);
  const y = averageRanks(child);
  for (let i = 0; i < n; i++) {
    x[i] /= n;
    y[i] /= n;
  }
  return line(x, y);
}

/** Spearman's rank correlation, average ranks. */
export function spearman(parent: ArrayLike<number>, child: ArrayLike<number>): number {
  return line(averageRanks(parent), averageRanks(child)).corr;
}

/** Absolute upward mobility: share of children who have more than their parent, 0 … 1; NaN for no pairs. */
export function upwardMobility(parent: ArrayLike<number>, child: ArrayLike<number>): number {
  const n = parent.length;
  if (child.length !== n) throw new ShapeError('child', child.length, n, 'one child per parent');
  let up = 0;
  for (let i = 0; i < n; i++) if (child[i] > parent[i]) up++;
  return up / n;
}

/** Fields–Ok movement (Fields and Ok 1996, 1999): mean |child − parent|, and the same in logs. */
export function movement(parent: ArrayLike<number>, child: ArrayLike<number>): { absolute: number; log: number } {
  const n = parent.length;
  let absolute = 0;
  let logs = 0;
  for (let i = 0; i < n; i++) {
    absolute += Math.abs(child[i] - parent[i]);
    logs += Math.abs(log(child[i]) - log(parent[i]));
  }
  return { absolute: absolute / n, log: logs / n };
}

/**
 * Shorrocks' mobility as equalisation of long-run wealth (Shorrocks 1978): 1 − G(sum) over the average of the two
 * Ginis weighted by their means.
 */
export function shorrocksEqualisation(parent: ArrayLike<number>, child: ArrayLike<number>): number {
  const n = parent.length;
  const both = new Float64Array(n);
  let held = 0;
  let heldChild = 0;
  for (let i = 0; i < n; i++) {
    both[i] = parent[i] + child[i];
    held += parent[i];
    heldChild += child[i];
  }
  return 1 - (gini(both) * (held + heldChild)) / (held * gini(parent) + heldChild * gini(child));
}
