/**
 * Ordinary least squares, with absorbed effects and every kind of errors.
 */

import { ABSORB_TOLERANCE, type Absorbed, absorb } from './absorb.js';
import {
  classical,
  correctedMeat,
  counting,
  hc3Residuals,
  sandwiched,
  times,
  whitened,
  withoutNegativeEigenvalues,
} from './covariance.js';
import { fTail } from './distributions.js';
import { crossProducts, powerOfTwoScale, residuals } from './doubled.js';
import { COLLINEAR, factor, inverseFactor, solve } from './factor.js';
import {
  CONSTANT,
  checkSample,
  clusterNotes,
  coefficients,
  type Dropped,
  type Fit,
  type FTest,
  type Regressor,
  refuse,
  type Sample,
} from './fit.js';

/** A column of ones. */
export function constantColumn(n: number): Regressor {
  return { name: CONSTANT, values: new Float64Array(n).fill(1) };
}

/** Σx², and Σ(x−mean)² in two passes. */
export function squares(x: Float64Array): { raw: number; centred: number } {
  let sum = 0;
  let raw = 0;
  for (let i = 0; i < x.length; i++) {
    sum += x[i];
    raw += x[i] * x[i];
  }
  const mean = sum / x.length;
  let centred = 0;
  let drift = 0;
  for (let i = 0; i < x.length; i++) {
    const d = x[i] - mean;
    centred += d * d;
    drift += d;
  }
  return { raw, centred: centred - (drift * drift) / x.length };
}

/** Why a column went: it lies in the effects, does not vary, or is collinear with those before it. */
export function droppedColumn(name: string, rawLength2: number, length2: number, absorbed: boolean): Dropped {
  const gone = !(length2 > COLLINEAR * COLLINEAR * rawLength2);
  if (!(rawLength2 > 0)) return { term: name, why: 'is zero in every row' };
  if (absorbed && gone) return { term: name, why: 'does not vary within the absorbed effects' };
  return { term: name, why: 'is collinear with the terms before it' };
}

/** Sentences on the absorption. */
export function absorptionNotes(absorbed: Absorbed): string[] {
  return absorbed.settled
    ? []
    : [
        `The absorbed effects did not settle to ${ABSORB_TOLERANCE} in 10,000 sweeps: the estimates are approximate; fewer or better connected effects would help.`,
      ];
}

/**
 * Least squares of the outcome on the covariates.
 *
 * Overwrites the sample's columns when effects are absorbed. Cost O(n k²); memory one column and, with clusters,
 * their sums.
 *
 * @throws {InputError} empty-sample, no-variation, one-cluster, too-few-rows, no-terms, hc3-effects
 */
export function ols(sample: Sample): Fit {
  checkSample(sample);
  const { outcome, effects, place, errors } = sample;
  const n = outcome.values.length;
  const centre = sample.constant || effects.length > 0;
  const regressors = [...(sample.constant && effects.length === 0 ? [constantColumn(n)] : []), ...sample.covariates];
  if (regressors.length === 0) refuse('no-terms', place, 'there is nothing to estimate', 'name covariates');
  if (errors === 'robust-hc3' && effects.length > 1) {
    refuse(
      'hc3-effects',
      place,
      'robust-hc3 needs every row’s leverage, which two or more absorbed effects do not give',
      'absorb one effect and write the others as {dummy: …}, or use robust or clustered errors',
    );
  }
  const columns = regressors.map((x) => x.values);
  const total = squares(outcome.values);
  const rawLengths = columns.map((x) => squares(x).raw);
  const absorbed = absorb([outcome.values, ...columns], effects);
  const withinTotal = effects.length > 0 ? squares(outcome.values).raw : NaN;

  const K = columns.length;
  const all = [...columns, outcome.values];
  const scale = all.map(powerOfTwoScale);
  const gram = crossProducts(all, scale);
  const lengths = [...rawLengths, total.raw].map((length, j) => length * scale[j] * scale[j]);
  const f = factor(
    gram,
    columns.map((_, j) => j),
    lengths,
  );
  const dropped = f.dropped.map((j) =>
    droppedColumn(regressors[j].name, lengths[j], gram.high[j * (K + 1) + j], effects.length > 0),
  );
  const kept = f.kept;
  const k = kept.length;
  if (k === 0) {
    refuse(
      'no-terms',
      place,
      `every covariate was dropped (${dropped.map((d) => `${d.term} ${d.why}`).join('; ')})`,
      'name covariates that vary',
    );
  }
  const count = counting(sample);
  const dfResid = n - k - count.absorbed;
  if (dfResid <= 0) {
    refuse(
      'too-few-rows',
      place,
      `${n} rows cannot carry ${k} coefficients${count.absorbed ? ` and ${count.absorbed} absorbed effects` : ''}`,
      'use more rows or fewer terms',
    );
  }

  const names = kept.map((j) => regressors[j].name);
  const X = kept.map((j) => columns[j]);
  const unit = kept.map((j) => scale[j]);
  const b = solve(f, K).map((v, a) => {
    const u = unit[a] / scale[K];
    return [v[0] * u, v[1] * u] as const;
  });
  const e = residuals(outcome.values, X, b, new Float64Array(n));
  const rss = squares(e).raw;
  const inverse = inverseFactor(f);
  for (let i = 0; i < k; i++) for (let j = i; j < k; j++) inverse[i * k + j] *= unit[i];

  const notes = [...absorptionNotes(absorbed), ...clusterNotes(sample)];
  let V: Float64Array;
  if (errors === 'classical') V = classical(inverse, k, rss / dfResid);
  else {
    const q = whitened(X, inverse);
    let score = e;
    if (errors === 'robust-hc3') {
      const { weighted, exact } = hc3Residuals(n, k, q, e, effects);
      score = weighted;
      if (exact > 0) notes.push(exactNote(exact));
    }
    V = sandwiched(inverse, correctedMeat(sample, count, k, k, times(q, k, score)), k);
    if (sample.clusters.length === 2) notes.push(...eigenvalueNotes(withoutNegativeEigenvalues(V, k)));
  }
  const df = errors === 'clustered' ? count.clusters - 1 : dfResid;
  const tss = centre ? total.centred : total.raw;
  const r2 = 1 - rss / tss;
  const slopes = k - (sample.constant && effects.length === 0 && kept[0] === 0 ? 1 : 0);
  const F = ((tss - rss) / slopes / rss) * dfResid;
  return {
    method: 'ols',
    errors,
    terms: coefficients(
      names,
      b.map((v) => v[0]),
      V,
      df,
      sample.level,
    ),
    covariance: V,
    df,
    nobs: n,
    df_resid: dfResid,
    r_squared: r2,
    within_r_squared: effects.length > 0 ? 1 - rss / withinTotal : null,
    ...clusterCounts(sample),
    dropped,
    diagnostics: {
      fit: {
        sigma: Math.sqrt(rss / dfResid),
        r2,
        adj_r2: 1 - ((1 - r2) * (n - (centre ? 1 : 0))) / dfResid,
        rss,
        loglik: (-n / 2) * (Math.log((2 * Math.PI * rss) / n) + 1),
        n,
        ...(effects.length === 0 && slopes > 0 ? { F, F_p: fTail(F, slopes, dfResid) } : {}),
      },
    },
    notes,
  };
}

/** Cluster and effect counts of a fit. */
export function clusterCounts(sample: Sample): Pick<Fit, 'clusters' | 'clusters_by' | 'absorbed'> {
  const clusters = sample.errors === 'clustered' ? sample.clusters : [];
  return {
    clusters: clusters.length > 0 ? Math.min(...clusters.map((c) => c.count)) : null,
    clusters_by: Object.fromEntries(clusters.map((c) => [c.name, c.count])),
    absorbed: Object.fromEntries(sample.effects.map((effect) => [effect.name, effect.count])),
  };
}

export function eigenvalueNotes(negative: number): string[] {
  return negative === 0
    ? []
    : [
        `The two-way clustered covariance had ${negative} negative eigenvalue${negative > 1 ? 's' : ''}, set to zero: too few clusters in one of the groupings for these errors to be trusted.`,
      ];
}

export function exactNote(exact: number): string {
  return `${exact} row${exact > 1 ? 's are' : ' is'} fitted exactly and add${exact > 1 ? '' : 's'} nothing to the HC3 errors.`;
}

/** An F test from two residual sums of squares. */
export function nestedF(rss0: number, rss1: number, df1: number, df2: number): FTest {
  const F = (rss0 - rss1) / df1 / (rss1 / df2);
  return { F, df1, df2, p: fTail(F, df1, df2) };
}
