/**
 * Two arms compared replicate by replicate: the difference that remains when the luck is shared.
 *
 * Arms of a study share each replicate's households and shocks, so differences are taken within replicates and their
 * spread, not that of the arms, says how sure one can be. Does not know what the numbers measure.
 */
import tDistribution from '@stdlib/stats-base-dists-t';
import { ShapeError } from '../../network/errors.js';

/** A row of `contrasts.csv` without its labels. Values are NaN where too few replicates leave them undefined. */
export interface Contrast {
  /** Mean over replicates of arm − baseline. */
  readonly difference: number;
  /** Monte-Carlo standard error of that mean: sd of the differences (denominator R − 1) / √R. */
  readonly mcSe: number;
  /** t interval with R − 1 degrees of freedom. */
  readonly ciLow: number;
  readonly ciHigh: number;
  /** Pairs with a value in both arms, R. */
  readonly replicates: number;
  /** Two-sided p-value of the paired t test of no difference. */
  readonly pValue: number;
  /** Variance of the differences over the sum of the arms' variances: below 1 where sharing the luck helps. */
  readonly varianceRatio: number;
}

/**
 * Paired contrast of an indicator between two arms.
 *
 * @param arm - one value a replicate; NaN = missing, and the pair is left out
 * @param baseline - same replicates in the same order
 * @param level - coverage of the interval, default 0.95
 */
export function pairedContrast(arm: ArrayLike<number>, baseline: ArrayLike<number>, level = 0.95): Contrast {
  if (baseline.length !== arm.length)
    throw new ShapeError('baseline', baseline.length, arm.length, 'one per replicate');
  const a: number[] = [];
  const b: number[] = [];
  const d: number[] = [];
  for (let r = 0; r < arm.length; r++) {
    const difference = arm[r] - baseline[r];
    if (Number.isNaN(difference)) continue;
    a.push(arm[r]);
    b.push(baseline[r]);
    d.push(difference);
  }
  const replicates = d.length;
  const difference = meanOf(d);
  const varianceOfD = varianceOf(d);
  const mcSe = Math.sqrt(varianceOfD / replicates);
  const half = replicates > 1 ? criticalT(level, replicates - 1) * mcSe : NaN;
  const unpaired = varianceOf(a) + varianceOf(b);
  return {
    difference,
    mcSe,
    ciLow: difference - half,
    ciHigh: difference + half,
    replicates,
    pValue: pairedP(difference, mcSe, replicates),
    varianceRatio: unpaired > 0 ? varianceOfD / unpaired : NaN,
  };
}

/**
 * Replicates needed for an interval no wider than ± `halfWidth`, if the differences keep the spread seen so far.
 *
 * @param halfWidth - wanted precision, in the unit of the indicator, above 0
 * @returns smallest R ≥ 2 with t(R − 1) · sd/√R ≤ halfWidth; NaN when the spread is unknown
 */
export function replicatesNeeded(
  contrast: Pick<Contrast, 'mcSe' | 'replicates'>,
  halfWidth: number,
  level = 0.95,
): number {
  if (!(halfWidth > 0)) throw new RangeError(`halfWidth must be above 0, got ${halfWidth}`);
  const sd = contrast.mcSe * Math.sqrt(contrast.replicates);
  if (Number.isNaN(sd)) return NaN;
  const enough = (r: number): boolean => (criticalT(level, r - 1) * sd) / Math.sqrt(r) <= halfWidth;
  let high = 2;
  while (!enough(high)) high *= 2;
  let low = high / 2;
  while (high - low > 1) {
    const middle = Math.floor((low + high) / 2);
    if (middle >= 2 && enough(middle)) high = middle;
    else low = middle;
  }
  return high;
}

/** Mean over replicates with its Monte-Carlo standard error; missing values left out. */
export function meanOverReplicates(values: ArrayLike<number>): { mean: number; mcSe: number; replicates: number } {
  const kept = Array.from(values).filter((v) => !Number.isNaN(v));
  return { mean: meanOf(kept), mcSe: Math.sqrt(varianceOf(kept) / kept.length), replicates: kept.length };
}

function pairedP(difference: number, se: number, replicates: number): number {
  if (replicates < 2) return NaN;
  // every replicate agrees exactly: nothing is left to chance
  if (se === 0) return difference === 0 ? 1 : 0;
  return 2 * tDistribution.cdf(-Math.abs(difference / se), replicates - 1);
}

function criticalT(level: number, df: number): number {
  return tDistribution.quantile((1 + level) / 2, df);
}

function meanOf(values: readonly number[]): number {
  let sum = 0;
  for (const v of values) sum += v;
  return sum / values.length;
}

function varianceOf(values: readonly number[]): number {
  if (values.length < 2) return NaN;
  const m = meanOf(values);
  let sum = 0;
  for (const v of values) sum += (v - m) * (v - m);
  return sum / (values.length - 1);
}
