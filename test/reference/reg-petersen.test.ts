/**
 * Petersen's simulated panel (Petersen 2009; data and expected values in SOURCES.md) and Grunfeld's investment data:
 * least squares, HC1, HC3, one- and two-way clustered errors and absorbed effects.
 *
 * Of the conventions the sets carry, ours are: clustered `full` and t with G−1 degrees of freedom; two-way `minG`;
 * effects nested in the cluster not counted, `sss`; HC1 with effects counted, `HC1.lsdv`.
 */
import { describe, expect, test } from 'vitest';
import { ols } from '../../sim/estimate/ols.js';
import { checksOf, expectMatch } from './expected.js';
import { Data, estimates, pValues, standardErrors } from './regression.js';

describe.each([
  { set: 'reg-petersen', outcome: 'y', covariates: ['x'] },
  { set: 'reg-grunfeld', outcome: 'inv', covariates: ['value', 'capital'] },
])('$set', ({ set, outcome, covariates }) => {
  const checks = checksOf(set);
  const data = new Data(set);
  const firm = data.group('firm');
  const year = data.group('year');
  const sample = (more: Parameters<Data['sample']>[2] = {}) => data.sample(outcome, covariates, more);

  test('least squares, classical errors', () => {
    const fit = ols(sample());
    expectMatch(estimates(fit, checks['ols.coef'].names), checks['ols.coef'], 'ols.coef');
    expectMatch(standardErrors(fit), checks['ols.se'], 'ols.se');
    const { sigma, r2, adj_r2, F, rss, loglik, n } = fit.diagnostics.fit as Record<string, number>;
    expectMatch({ sigma, r2, adj_r2, F, rss, loglik, n }, checks['ols.fit'], 'ols.fit');
  });

  test.each([
    ['robust', 'HC1'],
    ['robust-hc3', 'HC3'],
  ] as const)('%s', (errors, id) => {
    expectMatch(standardErrors(ols(sample({ errors }))), checks[`ols.se_${id}`], id);
  });

  test.each(['firm', 'year'])('clustered by %s', (by) => {
    const fit = ols(sample({ errors: 'clustered', clusters: [data.group(by)] }));
    expectMatch(standardErrors(fit), checks[`ols.se_cl_${by}.full`], by);
    expectMatch(pValues(fit), checks[`ols.p_cl_${by}.tG1`], by);
    expect(fit.clusters).toBe(data.group(by).count);
  });

  test('clustered by firm and year', () => {
    const fit = ols(sample({ errors: 'clustered', clusters: [firm, year] }));
    expectMatch(standardErrors(fit), checks['ols.se_cl2.minG'], 'minG');
    expect(fit.clusters).toBe(Math.min(firm.count, year.count));
    expect(fit.df).toBe(Math.min(firm.count, year.count) - 1);
  });

  test.each(['fe_firm', 'fe_both'])('%s', (id) => {
    const effects = () => (id === 'fe_firm' ? [firm] : [firm, year]);
    const fit = ols(sample({ effects: effects() }));
    expectMatch(estimates(fit), checks[`${id}.coef`], 'coef');
    expectMatch(standardErrors(fit), checks[`${id}.se`], 'se');
    expectMatch(fit.within_r_squared, checks[`${id}.r2_within`], 'r2_within');
    expectMatch(fit.df_resid, checks[`${id}.df_resid`], 'df_resid');
    expectMatch(fit.diagnostics.fit?.['rss'], checks[`${id}.rss`], 'rss');
    if (checks[`${id}.se_HC1.lsdv`]) {
      const robust = ols(sample({ effects: effects(), errors: 'robust' }));
      expectMatch(standardErrors(robust), checks[`${id}.se_HC1.lsdv`], 'HC1');
    }
  });

  test('absorbed firms, clustered by firm: effects nested in the cluster are not counted', () => {
    const fit = ols(sample({ effects: [firm], errors: 'clustered', clusters: [firm] }));
    expectMatch(standardErrors(fit), checks['fe_firm.se_cl.sss'], 'sss');
  });

  test('absorbed firms and years, clustered by firm: years are counted, all of them', () => {
    const check = checks['fe_both.se_cl.none'];
    if (!check) return;
    const fit = ols(sample({ effects: [firm, year], errors: 'clustered', clusters: [firm] }));
    const n = fit.nobs;
    const G = firm.count;
    const factor = Math.sqrt((G / (G - 1)) * ((n - 1) / (n - covariates.length - year.count)));
    expectMatch(
      standardErrors(fit).map((se) => se / factor),
      check,
      'none',
    );
  });
});

test('Grunfeld: the F test that all firm effects are equal, from two residual sums of squares', () => {
  const checks = checksOf('reg-grunfeld');
  const data = new Data('reg-grunfeld');
  const pooled = ols(data.sample('inv', ['value', 'capital']));
  const within = ols(data.sample('inv', ['value', 'capital'], { effects: [data.group('firm')] }));
  const rss0 = pooled.diagnostics.fit?.['rss'] as number;
  const rss1 = within.diagnostics.fit?.['rss'] as number;
  const expected = checks['fe_firm.F_effects'];
  const { F, df2 } = expected.value as { F: number; df2: number };
  expect(Math.abs((rss0 - rss1) / 9 / (rss1 / df2) - F)).toBeLessThanOrEqual(expected.rtol * F);
});
