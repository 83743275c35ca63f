/**
 * Grunfeld's investment data (source in SOURCES.md): between and first-difference estimators, the way a user gets them
 * from collapsed or differenced columns. Least squares, errors and effects on these data are in reg-petersen.test.ts.
 */
import { test } from 'vitest';
import type { Regressor } from '../../sim/estimate/fit.js';
import { ols } from '../../sim/estimate/ols.js';
import { checksOf, expectMatch } from './expected.js';
import { Data, estimates, standardErrors } from './regression.js';

const checks = checksOf('reg-grunfeld');
const data = new Data('reg-grunfeld');
const firm = data.values('firm');
const NAMES = ['value', 'capital'];

function between(name: string): Regressor {
  const sums = new Map<number, { sum: number; n: number }>();
  data.values(name).forEach((v, i) => {
    const s = sums.get(firm[i]) ?? { sum: 0, n: 0 };
    s.sum += v;
    s.n++;
    sums.set(firm[i], s);
  });
  return { name, values: Float64Array.from(sums.values(), ({ sum, n }) => sum / n) };
}

function differences(name: string): Regressor {
  const x = data.values(name);
  const out: number[] = [];
  for (let i = 1; i < x.length; i++) if (firm[i] === firm[i - 1]) out.push(x[i] - x[i - 1]);
  return { name, values: Float64Array.from(out) };
}

test.each([
  ['between', between],
  ['fd', differences],
] as const)('%s estimator', (id, make) => {
  const fit = ols({ ...data.sample('inv', NAMES.map(make)), outcome: make('inv') });
  expectMatch(estimates(fit), checks[`${id}.coef`], 'coef');
  expectMatch(standardErrors(fit), checks[`${id}.se`], 'se');
});
