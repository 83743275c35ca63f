/**
 * Columbus neighbourhoods (source in SOURCES.md): least squares, two-stage least squares with a spatial lag, and the
 * linear-in-means equation with friends-of-friends instruments (Bramoullé, Djebbari and Fortin 2009).
 */
import { describe, test } from 'vitest';
import type { Regressor } from '../../sim/estimate/fit.js';
import { iv } from '../../sim/estimate/iv.js';
import { ols } from '../../sim/estimate/ols.js';
import { checksOf, columnsOf, expectMatch } from './expected.js';
import { Data, estimates, pValues, standardErrors } from './regression.js';

const checks = checksOf('spatial-columbus');
const data = new Data('spatial-columbus');
const neighbours = neighbourLists();

/** Mean over neighbours, the row-standardised spatial lag. */
function lag(x: Regressor): Regressor {
  return {
    name: `W*${x.name}`,
    values: x.values.map((_, i) => neighbours[i].reduce((sum, j) => sum + x.values[j], 0) / neighbours[i].length),
  };
}

function neighbourLists(): number[][] {
  const at = new Map(data.columns['id'].map((id, i) => [id, i]));
  const lists: number[][] = data.columns['id'].map(() => []);
  const { source, target } = columnsOf('spatial-columbus', 'edges.csv');
  source.forEach((id, e) => {
    const i = at.get(id) as number;
    const j = at.get(target[e]) as number;
    lists[i].push(j);
    lists[j].push(i);
  });
  return lists;
}

const X = ['INC', 'HOVAL'].map((name) => data.regressor(name));
const WX = X.map(lag);
const W2X = WX.map(lag);
const W3X = W2X.map(lag);
const WY = lag(data.regressor('CRIME'));

describe('least squares', () => {
  test.each([
    ['classical', 'se'],
    ['robust', 'se_HC1'],
    ['robust-hc3', 'se_HC3'],
  ] as const)('%s', (errors, id) => {
    const fit = ols(data.sample('CRIME', X, { errors }));
    expectMatch(estimates(fit), checks['ols.coef'], 'coef');
    expectMatch(standardErrors(fit), checks[`ols.${id}`], id);
    if (errors === 'classical') {
      expectMatch(pValues(fit), checks['ols.p'], 'p');
      expectMatch(
        fit.terms.map((term) => term.statistic),
        checks['ols.t'],
        't',
      );
      const { sigma, r2, adj_r2, F, rss, loglik } = fit.diagnostics.fit as Record<string, number>;
      expectMatch({ sigma, r2, adj_r2, F, loglik, rss, n: fit.nobs }, checks['ols.fit'], 'fit');
    }
  });

  test('linear in means, biased', () => {
    const fit = ols(data.sample('CRIME', [WY, ...X, ...WX]));
    expectMatch(estimates(fit, checks['lim.ols.coef'].names), checks['lim.ols.coef'], 'coef');
  });
});

describe.each([
  { id: 'stsls.w1x', covariates: X, instruments: WX },
  { id: 'stsls.w2x', covariates: X, instruments: [...WX, ...W2X] },
  { id: 'lim.w2', covariates: [...X, ...WX], instruments: W2X },
  { id: 'lim.w2w3', covariates: [...X, ...WX], instruments: [...W2X, ...W3X] },
])('$id', ({ id, covariates, instruments }) => {
  const check = (what: string) => checks[`${id}.${what}`];
  const names = check('coef').names;
  const sample = (more: Parameters<Data['sample']>[2] = {}) =>
    data.sample('CRIME', covariates, { endogenous: [WY], instruments, ...more });

  test('coefficients and classical errors', () => {
    const fit = iv(sample());
    expectMatch(estimates(fit, names), check('coef'), 'coef');
    expectMatch(standardErrors(fit, names), check('se'), 'se');
    const sigma = fit.diagnostics.fit?.['sigma'] as number;
    if (check('sigma')) expectMatch(sigma, check('sigma'), 'sigma');
    if (check('sigma2')) expectMatch(sigma * sigma, check('sigma2'), 'sigma2');
    for (const what of ['first_stage_F', 'wu_hausman', 'sargan'] as const) {
      if (check(what)) expectMatch(fit.diagnostics[what], check(what), what);
    }
  });

  test('robust errors', () => {
    expectMatch(standardErrors(iv(sample({ errors: 'robust' })), names), check('se_HC1'), 'HC1');
  });
});
