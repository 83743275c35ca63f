/**
 * Certified values of the Statistical Reference Datasets, linear least squares (National Institute of Standards and
 * Technology), with 15 digits: the classical path must give at least 9 of them, 7 on Filip, whose powers of x lose
 * that many to rounding before any arithmetic begins.
 */
import { readFileSync } from 'node:fs';
import { describe, expect, test } from 'vitest';
import type { Regressor } from '../../sim/estimate/fit.js';
import { ols } from '../../sim/estimate/ols.js';
import { parsePlan } from '../../sim/estimate/plan.js';
import { runEstimates } from '../../sim/estimate/run.js';
import { csvSource } from '../../sim/estimate/table.js';
import { checksOf, expectMatch } from './expected.js';
import { Data, estimates, standardErrors } from './regression.js';

const checks = checksOf('reg-nist');
const DEGREE: Record<string, number> = { filip: 10, noint1: 1, noint2: 1, norris: 1, pontius: 2 };

describe.each([
  'filip',
  'longley',
  'noint1',
  'noint2',
  'norris',
  'pontius',
  'wampler1',
  'wampler2',
  'wampler3',
  'wampler4',
  'wampler5',
])('%s', (set) => {
  const data = new Data('reg-nist', `${set}.csv`);
  const covariates: Regressor[] =
    set === 'longley'
      ? ['x1', 'x2', 'x3', 'x4', 'x5', 'x6'].map((name) => data.regressor(name))
      : powers(data.values('x'), DEGREE[set] ?? 5);
  const fit = ols(data.sample('y', covariates, { constant: !set.startsWith('noint') }));
  const digits = set === 'filip' ? 1e-7 : 1e-9;
  // Wampler 1 and 2 fit exactly: zero is compared absolutely, as their certificate says
  const exact = set === 'wampler1' || set === 'wampler2';

  test('keeps every column', () => expect(fit.dropped).toEqual([]));

  test.each(['coef', 'se', 'resid_sd', 'r2', 'rss', 'F'])('%s', (what) => {
    const check = checks[`${set}.${what}`];
    if (check === undefined) return expect(exact && what === 'F').toBe(true);
    const actual = {
      coef: estimates(fit),
      se: standardErrors(fit),
      resid_sd: fit.diagnostics.fit?.['sigma'],
      r2: fit.r_squared,
      rss: fit.diagnostics.fit?.['rss'],
      F: fit.diagnostics.fit?.['F'],
    }[what];
    expectMatch(actual, { ...check, rtol: Math.min(check.rtol, digits) }, `${set}.${what}`);
  });
});

test.each(['filip', 'wampler5'])('%s from a table and a plan', async (set) => {
  const degree = DEGREE[set] ?? 5;
  const terms = Array.from({ length: degree }, (_, d) => `{power: [x, ${d + 1}]}`);
  const plan = parsePlan(`estimates: [{name: ${set}, outcome: y, covariates: [${terms.join(', ')}]}]`, 'plan.yaml');
  const text = readFileSync(new URL(`reg-nist/${set}.csv`, import.meta.url), 'utf8');
  const { estimates: found } = await runEstimates(plan.estimates, csvSource(text, `${set}.csv`), plan.place);
  const rtol = set === 'filip' ? 1e-7 : 1e-9;
  expectMatch(
    found[0].terms.map((term) => term.estimate),
    { ...checks[`${set}.coef`], rtol },
    set,
  );
});

function powers(x: Float64Array, degree: number): Regressor[] {
  return Array.from({ length: degree }, (_, d) => ({
    name: `x^${d + 1}`,
    values: x.map((v) => {
      let p = v;
      for (let i = 0; i < d; i++) p *= v;
      return p;
    }),
  }));
}
