/**
 * Mroz's labour force participation and Spector's grades by logit, Mroz's wages by least squares; sources in SOURCES.md.
 * Two-stage least squares on Mroz's data is in reg-kmenta.test.ts.
 */
import { describe, test } from 'vitest';
import { logit } from '../../sim/estimate/logit.js';
import { ols } from '../../sim/estimate/ols.js';
import { checksOf, expectMatch } from './expected.js';
import { Data, estimates, standardErrors } from './regression.js';

const checks = checksOf('reg-mroz');
const all = new Data('reg-mroz');
const working = new Data('reg-mroz', 'data.csv', (row) => row['lfp'] === '1');
const squared = (data: Data) => ({ name: 'exper2', values: data.values('exper').map((x) => x * x) });
const COVARIATES = (data: Data) => ['nwifeinc', 'educ', 'exper', squared(data), 'age', 'kids5', 'kids618'];

describe.each([
  { id: 'ols', data: working, y: 'lwage', x: ['educ', 'exper', squared(working)] },
  { id: 'lpm', data: all, y: 'lfp', x: COVARIATES(all) },
])('$id', ({ id, data, y, x }) => {
  test.each([
    ['classical', 'se'],
    ['robust', 'se_HC1'],
    ['robust-hc3', 'se_HC3'],
  ] as const)('%s', (errors, what) => {
    const fit = ols(data.sample(y, x, { errors }));
    expectMatch(estimates(fit), checks[`${id}.coef`], 'coef');
    expectMatch(standardErrors(fit), checks[`${id}.${what}`], what);
    const { sigma, r2, adj_r2, F, rss, loglik, n } = fit.diagnostics.fit as Record<string, number>;
    expectMatch({ sigma, r2, adj_r2, F, rss, loglik, n }, checks[`${id}.fit`], 'fit');
  });
});

describe.each([
  { set: 'reg-mroz', data: all, y: 'lfp', x: COVARIATES(all) },
  { set: 'reg-spector', data: new Data('reg-spector'), y: 'GRADE', x: ['GPA', 'TUCE', 'PSI'] },
])('$set logit', ({ set, data, y, x }) => {
  const expected = checksOf(set);

  test('coefficients, errors, fit and average marginal effects', () => {
    const fit = logit(data.sample(y, x));
    expectMatch(estimates(fit), expected['logit.coef'], 'coef');
    expectMatch(standardErrors(fit), expected['logit.se'], 'se');
    expectMatch(fit.diagnostics.fit, expected['logit.fit'], 'fit');
    expectMatch(
      fit.marginal_effects?.map((term) => term.estimate),
      expected['logit.ame'],
      'ame',
    );
  });

  test('robust', () => {
    expectMatch(standardErrors(logit(data.sample(y, x, { errors: 'robust' }))), expected['logit.se_HC1'], 'HC1');
  });

  test.runIf(expected['logit.se_cl.full'])('clustered', () => {
    const fit = logit(data.sample(y, x, { errors: 'clustered', clusters: [data.group('age')] }));
    expectMatch(standardErrors(fit), expected['logit.se_cl.full'], 'full');
  });
});
