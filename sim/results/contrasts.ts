/**
 * Arms against each other: every indicator and generation, paired over replicates that share households and luck.
 */
import { pairedContrast } from '../measure/contrast.js';
import type { IndicatorCube } from './cube.js';

/** One row of contrasts.csv. */
export interface ContrastRow {
  readonly arm: string;
  readonly baseline: string;
  readonly indicator: string;
  readonly generation: number;
  readonly difference: number;
  readonly mc_se: number;
  readonly ci_low: number;
  readonly ci_high: number;
  readonly replicates: number;
  readonly p_value: number;
  readonly variance_ratio: number;
}

/** Every pair of arms, the earlier one as baseline; indicators in their order; generations that have the indicator. */
export function contrastRows(cube: IndicatorCube): ContrastRow[] {
  const rows: ContrastRow[] = [];
  for (let b = 0; b < cube.arms.length; b++) {
    for (let a = b + 1; a < cube.arms.length; a++) {
      for (const indicator of cube.names) {
        for (let generation = 0; generation < cube.generations; generation++) {
          const row = contrastRow(cube, a, b, indicator, generation);
          if (row !== null) rows.push(row);
        }
      }
    }
  }
  return rows;
}

/** Arm `a` minus arm `b`, or null when no replicate has the indicator in both. */
export function contrastRow(
  cube: IndicatorCube,
  a: number,
  b: number,
  indicator: string,
  generation: number,
): ContrastRow | null {
  const contrast = pairedContrast(cube.over(indicator, a, generation), cube.over(indicator, b, generation));
  if (contrast.replicates === 0) return null;
  return {
    arm: cube.arms[a]!,
    baseline: cube.arms[b]!,
    indicator,
    generation,
    difference: contrast.difference,
    mc_se: contrast.mcSe,
    ci_low: contrast.ciLow,
    ci_high: contrast.ciHigh,
    replicates: contrast.replicates,
    p_value: contrast.pValue,
    variance_ratio: contrast.varianceRatio,
  };
}
