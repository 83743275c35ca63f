/**
 * What the estimators do over many draws whose truth is known. Seeds are fixed, so these cannot fail by chance; bands are
 * binomial intervals, or a number of Monte-Carlo standard errors.
 */
import { expect, test } from 'vitest';
import { iv } from '../../../sim/estimate/iv.js';
import { ols } from '../../../sim/estimate/ols.js';
import { column, grouping, luck, sample } from './samples.js';

const CLUSTERS = 40;
const ROWS = 20;
const n = CLUSTERS * ROWS;
const cluster = grouping('cluster', n, (i) => Math.floor(i / ROWS));

/** 95 % interval of a share p over `draws`, normal approximation. */
function band(p: number, draws: number): [number, number] {
  const half = 1.96 * Math.sqrt((p * (1 - p)) / draws);
  return [p - half, p + half];
}

test('clustered errors with 40 clusters reject a true null in 5 % of draws', () => {
  const { normal } = luck('size');
  const draws = 1000;
  let clustered = 0;
  let classical = 0;
  for (let d = 0; d < draws; d++) {
    const a = Float64Array.from({ length: CLUSTERS }, normal);
    const b = Float64Array.from({ length: CLUSTERS }, normal);
    const x = column('x', n, (i) => 0.7 * a[cluster.codes[i]] + normal());
    const y = column('y', n, (i) => b[cluster.codes[i]] + normal());
    if (ols(sample(y, [x], { errors: 'clustered', clusters: [cluster] })).terms[1].p_value < 0.05) clustered++;
    if (ols(sample(y, [x])).terms[1].p_value < 0.05) classical++;
  }
  const [low, high] = band(0.05, draws);
  expect(clustered / draws).toBeGreaterThanOrEqual(low);
  expect(clustered / draws).toBeLessThanOrEqual(high);
  // the errors that ignore the clusters reject far too often: the test can tell
  expect(classical / draws).toBeGreaterThan(0.15);
});

test('Anderson–Rubin sets keep their coverage under weak instruments, where 2SLS intervals lose theirs', () => {
  const { normal } = luck('weak');
  const draws = 400;
  let held = 0;
  let wald = 0;
  for (let d = 0; d < draws; d++) {
    const common = Float64Array.from({ length: CLUSTERS }, normal);
    const Z = [0, 1, 2].map((j) => column(`z${j}`, n, normal));
    const u = Float64Array.from({ length: n }, (_, i) => normal() + 0.5 * common[cluster.codes[i]]);
    const x = column('x', n, (i) => 0.8 * u[i] + 0.6 * normal() + 0.03 * Z.reduce((s, z) => s + z.values[i], 0));
    const y = column('y', n, (i) => x.values[i] + u[i]);
    const fit = iv({ ...sample(y, [], { errors: 'clustered', clusters: [cluster] }), endogenous: [x], instruments: Z });
    if (
      fit.diagnostics.anderson_rubin?.intervals.some(
        ([low, high]) => (low ?? -Infinity) <= 1 && 1 <= (high ?? Infinity),
      )
    )
      held++;
    if (fit.terms[1].ci_low <= 1 && 1 <= fit.terms[1].ci_high) wald++;
  }
  const [low, high] = band(0.95, draws);
  expect(held / draws).toBeGreaterThanOrEqual(low);
  expect(held / draws).toBeLessThanOrEqual(high);
  expect(wald / draws).toBeLessThan(0.8);
});

test('linear in means: friends-of-friends instruments find the peer effect that least squares misses', () => {
  // y = 1 + 0.4·mean(y of friends) + x + 0.5·mean(x of friends) + e, solved by its series; Bramoullé, Djebbari and Fortin 2009
  const { normal, below } = luck('linear in means');
  const households = 4000;
  const friends: number[][] = Array.from({ length: households }, () => []);
  for (let tie = 0; tie < 2 * households; ) {
    const i = below(households);
    const j = below(households);
    if (i === j || friends[i].includes(j)) continue;
    friends[i].push(j);
    friends[j].push(i);
    tie++;
  }
  friends.forEach((list, i) => {
    if (list.length === 0) {
      const j = (i + 1) % households;
      list.push(j);
      friends[j].push(i);
    }
  });
  const mean = (v: Float64Array): Float64Array =>
    v.map((_, i) => friends[i].reduce((s, j) => s + v[j], 0) / friends[i].length);
  const x = Float64Array.from({ length: households }, normal);
  const Gx = mean(x);
  const e = Float64Array.from({ length: households }, normal);
  const base = x.map((v, i) => 1 + v + 0.5 * Gx[i] + e[i]);
  let y = base.slice();
  // 0.4^60 is below rounding
  for (let step = 0; step < 60; step++) {
    const Gy = mean(y);
    y = base.map((v, i) => v + 0.4 * Gy[i]);
  }
  const Gy = { name: 'Gy', values: mean(y) };
  const covariates = [
    { name: 'x', values: x },
    { name: 'Gx', values: Gx },
  ];
  const G2x = mean(Gx);
  const instruments = [
    { name: 'G2x', values: G2x },
    { name: 'G3x', values: mean(G2x) },
  ];
  const outcome = { name: 'y', values: y };
  const two = iv({ ...sample(outcome, covariates, { errors: 'robust' }), endogenous: [Gy], instruments });
  const one = ols(sample(outcome, [Gy, ...covariates]));
  for (const [term, truth] of [
    ['Gy', 0.4],
    ['x', 1],
    ['Gx', 0.5],
  ] as const) {
    const found = two.terms.find((t) => t.term === term);
    // three standard errors, themselves small
    expect(Math.abs((found?.estimate ?? NaN) - truth)).toBeLessThan(3 * (found?.std_error ?? NaN));
    expect(found?.std_error).toBeLessThan(0.1);
  }
  const naive = one.terms[1];
  expect(naive.estimate - 0.4).toBeGreaterThan(5 * naive.std_error);
  expect(two.diagnostics.effective_F?.F).toBeGreaterThan(two.diagnostics.effective_F?.critical ?? Infinity);
});
