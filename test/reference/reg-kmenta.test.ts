/**
 * Kmenta's demand and supply, and Mroz's wage equation by two-stage least squares with its diagnostics; sources in
 * SOURCES.md.
 */
import { describe, expect, test } from 'vitest';
import type { FTest } from '../../sim/estimate/fit.js';
import { iv } from '../../sim/estimate/iv.js';
import { checksOf, expectMatch } from './expected.js';
import { Data, estimates, standardErrors } from './regression.js';

const mroz = new Data('reg-mroz', 'data.csv', (row) => row['lfp'] === '1');
const exper2 = { name: 'exper2', values: mroz.values('exper').map((x) => x * x) };

describe.each([
  { set: 'reg-kmenta', id: 'demand', data: new Data('reg-kmenta'), y: 'Q', x: ['D'], endogenous: 'P', z: ['F', 'A'] },
  { set: 'reg-kmenta', id: 'supply', data: new Data('reg-kmenta'), y: 'Q', x: ['F', 'A'], endogenous: 'P', z: ['D'] },
  { set: 'reg-mroz', id: 'iv', data: mroz, y: 'lwage', x: ['exper', exper2], endogenous: 'educ', z: ['meduc', 'feduc'] },
  {
    set: 'reg-mroz',
    id: 'iv3',
    data: mroz,
    y: 'lwage',
    x: ['exper', exper2],
    endogenous: 'educ',
    z: ['meduc', 'feduc', 'heduc'],
  },
  { set: 'reg-mroz', id: 'iv_just', data: mroz, y: 'lwage', x: ['exper', exper2], endogenous: 'educ', z: ['feduc'] },
])('$set $id', ({ set, id, data, y, x, endogenous, z }) => {
  const checks = checksOf(set);
  const check = (what: string) => checks[`${id}.${what}`];
  const sample = (more: Parameters<Data['sample']>[2] = {}) =>
    data.sample(y, x, {
      endogenous: [data.regressor(endogenous)],
      instruments: z.map((name) => data.regressor(name)),
      ...more,
    });
  const fit = iv(sample());

  test('coefficients and classical errors', () => {
    expectMatch(estimates(fit, check('coef').names), check('coef'), 'coef');
    expectMatch(standardErrors(fit, check('coef').names), check('se'), 'se');
    expectMatch(fit.diagnostics.fit?.['sigma'], check('sigma'), 'sigma');
  });

  test('robust errors', () => {
    const robust = iv(sample({ errors: 'robust' }));
    expectMatch(standardErrors(robust, check('coef').names), check('se_HC1'), 'HC1');
  });

  test('first-stage F, Wu–Hausman and Sargan', () => {
    expectMatch(fit.diagnostics.first_stage_F, check('first_stage_F'), 'F');
    expectMatch(fit.diagnostics.wu_hausman, check('wu_hausman'), 'wu_hausman');
    if (check('sargan')) expectMatch(fit.diagnostics.sargan, check('sargan'), 'sargan');
    else expect(fit.diagnostics.sargan).toBeUndefined();
  });

  test('under classical errors the effective F is the first-stage F', () => {
    const F = (fit.diagnostics.first_stage_F as FTest).F;
    // same numbers by another route; rounding only
    expect(Math.abs((fit.diagnostics.effective_F?.F ?? NaN) / F - 1)).toBeLessThan(1e-10);
  });
});

test('Mroz: clustered errors', () => {
  const checks = checksOf('reg-mroz');
  const fit = iv(
    mroz.sample('lwage', ['exper', exper2], {
      endogenous: [mroz.regressor('educ')],
      instruments: ['meduc', 'feduc'].map((name) => mroz.regressor(name)),
      errors: 'clustered',
      clusters: [mroz.group('age')],
    }),
  );
  expectMatch(standardErrors(fit, checks['iv.coef'].names), checks['iv.se_cl.full'], 'full');
});
