/**
 * Mobility of two data sets against base R and numpy/scipy: occupations of fathers and sons (Hauser 1979), and
 * wages of 545 men in 1980 and 1987 (Vella and Verbeek 1998).
 */
import { describe, test } from 'vitest';
import { growthByInitialRank, growthIncidence } from '../../sim/measure/incidence.js';
import { elasticity, movement, rankRankSlope, shorrocksEqualisation, spearman } from '../../sim/measure/mobility.js';
import { median } from '../../sim/measure/quantile.js';
import { mean } from '../../sim/measure/spread.js';
import { rowShares, type TransitionMeasures, transitionCounts, transitionMeasures } from '../../sim/measure/transitions.js';
import { type Check, checksOf, columnsOf, expectMatch } from './expected.js';

/** Row-major table as rows. */
function rows(table: ArrayLike<number>): number[][] {
  const k = Math.sqrt(table.length);
  return Array.from({ length: k }, (_, r) => Array.from({ length: k }, (_, c) => table[r * k + c]));
}

const ofTable: Record<string, (m: TransitionMeasures) => unknown> = {
  matrix: (m) => rows(m.matrix),
  stationary: (m) => m.stationary,
  shorrocks: (m) => m.shorrocks,
  abs_lambda2: (m) => m.secondEigenvalue,
  det_index: (m) => m.determinantIndex,
  exit_times: (m) => m.exitTimes,
  immobile_share: (m) => m.immobileShare,
  above_diagonal_share: (m) => m.aboveDiagonalShare,
  bartholomew: (m) => m.bartholomew,
};

describe('mob-hauser', () => {
  const { father, ...sons } = columnsOf('mob-hauser', 'table.csv');
  const counts = father.flatMap((_, r) => Object.values(sons).map((column) => Number(column[r])));
  const measures = transitionMeasures(counts);
  for (const [id, check] of Object.entries(checksOf('mob-hauser'))) {
    test(id, () => {
      const n = counts.reduce((s, v) => s + v, 0);
      expectMatch(id === 'n' ? n : ofTable[id.split('.')[1]](measures), check, id);
    });
  }
});

describe('mob-males', () => {
  const { w1980, w1987 } = columnsOf('mob-males', 'data.csv');
  const before = w1980.map(Number);
  const after = w1987.map(Number);
  const counts = transitionCounts(before, after);
  const measures: Record<string, (check: Check) => unknown> = {
    n: () => before.length,
    rank_rank: () => rankRankSlope(before, after),
    spearman: () => spearman(before, after),
    elasticity: () => elasticity(before, after),
    counts_rank: () => rows(counts),
    transition_rank: () => rows(rowShares(counts)),
    counts_type7: () => rows(transitionCounts(before, after, 5, 'quantile')),
    gic: (check) => growthIncidence(before, after, check.at as number[]).map((g) => g - 1),
    growth_mean: () => mean(after) / mean(before) - 1,
    growth_median: () => median(after) / median(before) - 1,
    gic_panel: () => growthByInitialRank(before, after, 5).map((g) => g - 1),
    fields_ok: () => {
      const { absolute, log } = movement(before, after);
      return { abs: absolute, log };
    },
    shorrocks_R: () => shorrocksEqualisation(before, after),
  };
  for (const [id, check] of Object.entries(checksOf('mob-males'))) {
    const [, name, ofP] = id.split('.');
    test(id, () => {
      expectMatch(name === 'P' ? ofTable[ofP](transitionMeasures(counts)) : measures[name](check), check, id);
    });
  }
});
