/**
 * Two-stage least squares, with absorbed effects, every kind of errors and its diagnostics.
 *
 * One matrix of cross-products, of exogenous columns, instruments, instrumented columns and outcome, carries both
 * stages and the classical tests; robust and clustered ones take another pass over the rows.
 *
 * Conventions: residuals from the actual regressors, variance RSS/(n−k); first-stage F classical; Wu–Hausman in its
 * regression form; Sargan n·R² of the residuals on all instruments; Hansen's J at the two-step efficient estimate, the
 * weights from the 2SLS residuals without small-sample factor (Hansen 1982).
 */

import { absorb } from './absorb.js';
import {
  classical,
  correctedMeat,
  counting,
  hc3Residuals,
  sandwiched,
  smallSample,
  times,
  transformed,
  whitened,
  withoutNegativeEigenvalues,
} from './covariance.js';
import { chiSquareTail, fTail } from './distributions.js';
import {
  add,
  crossProducts,
  type Doubled,
  type DoubledMatrix,
  doubledMatrix,
  get,
  powerOfTwoScale,
  residuals,
  set,
} from './doubled.js';
import { type Factor, factor, inverseFactor, projected, solve } from './factor.js';
import {
  type ChiSquareTest,
  checkSample,
  clusterNotes,
  coefficients,
  type Diagnostics,
  type Dropped,
  type Fit,
  type FTest,
  refuse,
  type Sample,
} from './fit.js';
import {
  absorptionNotes,
  clusterCounts,
  constantColumn,
  droppedColumn,
  eigenvalueNotes,
  exactNote,
  nestedF,
  ols,
  squares,
} from './ols.js';
import { quadraticForm } from './small.js';
import { andersonRubin, craggDonald, effectiveF, type Reduced, weakNotes, zeroTest } from './weak.js';

/**
 * Two-stage least squares of the outcome on constant, instrumented columns and covariates, in this order.
 *
 * Overwrites the sample's columns when effects are absorbed. Cost O(n (k+q)²).
 *
 * @throws {InputError} as ols, and not-identified when instruments are too few or explain nothing
 */
export function iv(sample: Sample): Fit {
  checkSample(sample);
  const { outcome, effects, place, errors } = sample;
  const endogenous = sample.endogenous ?? [];
  const instruments = sample.instruments ?? [];
  if (endogenous.length === 0 || instruments.length === 0) {
    refuse('not-identified', place, 'method iv needs endogenous terms and instruments', 'name both, or use ols');
  }
  const n = outcome.values.length;
  const exogenous = [...(sample.constant && effects.length === 0 ? [constantColumn(n)] : []), ...sample.covariates];
  const regressors = [...exogenous, ...instruments, ...endogenous];
  const columns = regressors.map((x) => x.values);
  const total = squares(outcome.values);
  const rawLengths = columns.map((x) => squares(x).raw);
  const absorbed = absorb([outcome.values, ...columns], effects);
  const withinTotal = effects.length > 0 ? squares(outcome.values).raw : NaN;

  const all = [...columns, outcome.values];
  const scale = all.map(powerOfTwoScale);
  const gram = crossProducts(all, scale);
  const K = columns.length;
  const lengths = [...rawLengths, total.raw].map((length, j) => length * scale[j] * scale[j]);
  const why = (j: number): Dropped =>
    droppedColumn(regressors[j].name, lengths[j], gram.high[j * (K + 1) + j], effects.length > 0);
  const firstEndogenous = exogenous.length + instruments.length;

  // first stage: exogenous columns, then instruments, taken out of the rest
  const first = factor(
    gram,
    regressors.map((_, j) => j).filter((j) => j < firstEndogenous),
    lengths,
  );
  const dropped = first.dropped.map(why);
  const z = first.kept;
  const m = z.length;
  const m1 = z.filter((j) => j < exogenous.length).length;
  const q = m - m1;

  // second stage, in the order constant, instrumented, covariates
  const x1 = z.filter((j) => j < exogenous.length);
  const constantFirst = sample.constant && effects.length === 0 && x1[0] === 0 ? [0] : [];
  const endogenousAt = endogenous.map((_, j) => firstEndogenous + j);
  const order = [...constantFirst, ...endogenousAt, ...x1.slice(constantFirst.length)];
  const own = factor(gram, [...x1, ...endogenousAt], lengths);
  const endogenousKept = endogenousAt.filter((j) => own.kept.includes(j));
  for (const j of own.dropped) dropped.push(why(j));
  const p = endogenousKept.length;
  if (p === 0)
    refuse(
      'not-identified',
      place,
      `no instrumented term is left (${dropped.map((d) => `${d.term} ${d.why}`).join('; ')})`,
      'name endogenous terms that vary',
    );
  if (q < p) {
    refuse(
      'not-identified',
      place,
      `${p} instrumented term${p > 1 ? 's' : ''} but only ${q} usable instrument${q === 1 ? '' : 's'}${dropped.length ? ` (${dropped.map((d) => `${d.term} ${d.why}`).join('; ')})` : ''}`,
      'name at least as many instruments as endogenous terms',
    );
  }
  const regressorsKept = order.filter((j) => own.kept.includes(j));
  const k = regressorsKept.length;
  const count = counting(sample);
  const dfResid = n - k - count.absorbed;
  if (n - m - p - count.absorbed <= 0) {
    refuse(
      'too-few-rows',
      place,
      `${n} rows cannot carry ${m} instruments and ${k} coefficients`,
      'use more rows or fewer terms',
    );
  }

  const normal = projections(first, [...regressorsKept, K]);
  const second = factor(
    normal,
    regressorsKept.map((_, a) => a),
    regressorsKept.map((j) => gram.high[j * (K + 1) + j]),
  );
  if (second.dropped.length > 0) {
    const names = second.dropped.map((a) => regressors[regressorsKept[a]].name);
    refuse(
      'not-identified',
      place,
      `the instruments do not move ${names.join(' and ')} apart from the other terms`,
      'use other instruments, or fewer instrumented terms',
    );
  }

  const names = regressorsKept.map((j) => regressors[j].name);
  const X = regressorsKept.map((j) => columns[j]);
  const Z = z.map((j) => columns[j]);
  const y = outcome.values;
  const inScale = solve(second, k);
  const b = inScale.map((v, a) => rescale(v, scale[regressorsKept[a]] / scale[K]));
  const u = residuals(y, X, b, new Float64Array(n));
  const rss = squares(u).raw;
  const R2inverse = inverseFactor(second);
  const inverse = R2inverse.slice();
  for (let i = 0; i < k; i++) for (let j = i; j < k; j++) inverse[i * k + j] *= scale[regressorsKept[i]];
  const Zinverse = inverseFactor(first);
  for (let i = 0; i < m; i++) for (let j = i; j < m; j++) Zinverse[i * m + j] *= scale[z[i]];

  const notes = [...absorptionNotes(absorbed), ...clusterNotes(sample)];
  const qz = whitened(Z, Zinverse);
  let V: Float64Array;
  if (errors === 'classical') V = classical(inverse, k, rss / dfResid);
  else {
    // orthonormal projected regressors: T q with T = R₂⁻ᵀ Rx'
    const T = new Float64Array(k * m);
    for (let a = 0; a < k; a++) {
      for (let c = 0; c < m; c++) {
        let sum = 0;
        for (let i = 0; i <= a; i++) sum += R2inverse[i * k + a] * get(first.rows, c, regressorsKept[i])[0];
        T[a * m + c] = sum;
      }
    }
    const projectedRows = transformed(qz, m, T);
    let score = u;
    if (errors === 'robust-hc3') {
      if (effects.length > 1) {
        refuse(
          'hc3-effects',
          place,
          'robust-hc3 needs every row’s leverage, which two or more absorbed effects do not give',
          'absorb one effect and write the others as {dummy: …}, or use robust or clustered errors',
        );
      }
      const { weighted, exact } = hc3Residuals(n, k, projectedRows, u, effects);
      score = weighted;
      if (exact > 0) notes.push(exactNote(exact));
    }
    V = sandwiched(inverse, correctedMeat(sample, count, k, k, times(projectedRows, k, score)), k);
    if (sample.clusters.length === 2) notes.push(...eigenvalueNotes(withoutNegativeEigenvalues(V, k)));
  }
  const df = errors === 'clustered' ? count.clusters - 1 : dfResid;
  const terms = coefficients(
    names,
    b.map((v) => v[0]),
    V,
    df,
    sample.level,
  );

  // what the diagnostics of weak instruments need: the reduced form on orthonormal instruments, in original units
  const free = n - m - count.absorbed;
  const reduced: Reduced = {
    q,
    instrumented: endogenousKept.map((j) => reducedRow(first, j, m1, scale[j])),
    outcome: reducedRow(first, K, m1, scale[K]),
    residualProducts: residualProducts(first, [...endogenousKept, K], scale),
    free,
    df2: errors === 'clustered' ? count.clusters - 1 : free,
    covariance: null,
  };
  if (errors !== 'classical') {
    const parts = [...endogenousKept, K].map((target) => {
      const on = solve(first, target).map((v, a) => rescale(v, scale[z[a]] / scale[target]));
      return residuals(all[target], Z, on, new Float64Array(n));
    });
    const D = q * parts.length;
    const block = transformedTail(qz, m, m1);
    const stacked = (from: number, size: number, out: readonly Float64Array[]): void => {
      block(from, size, out.slice(0, q));
      for (let part = parts.length - 1; part >= 0; part--) {
        for (let c = 0; c < q; c++) {
          const target = out[part * q + c];
          const source = out[c];
          const v = parts[part];
          for (let r = 0; r < size; r++) target[r] = source[r] * v[from + r];
        }
      }
    };
    const kind = errors === 'robust-hc3' ? 'robust' : errors;
    (reduced as { covariance: Float64Array | null }).covariance = correctedMeat(
      sample,
      count,
      m,
      D,
      stacked,
      smallSample(kind, count, m),
    );
  }

  const diagnostics: Record<string, unknown> = {
    fit: {
      sigma: Math.sqrt(rss / dfResid),
      rss,
      n,
    },
  };
  endogenousKept.forEach((j, at) => {
    let excluded: Doubled = [0, 0];
    for (let row = m1; row < m; row++) excluded = add(excluded, projected(first, j, j, row, row + 1));
    const rss1 = get(first.rest, j, j)[0];
    const test = nestedF(rss1 + excluded[0], rss1, q, free);
    diagnostics[p > 1 ? `first_stage_F${at + 1}` : 'first_stage_F'] = test;
  });
  if (p === 1) diagnostics['effective_F'] = effectiveF(reduced);
  else diagnostics['cragg_donald'] = { F: craggDonald(reduced) };
  diagnostics['wu_hausman'] = wuHausman(gram, first, regressorsKept, endogenousKept, K, n - count.absorbed);
  if (errors !== 'classical') {
    diagnostics['wu_hausman_robust'] = robustWuHausman(
      sample,
      X,
      names,
      Z,
      first,
      endogenousKept,
      scale,
      all,
      regressors,
    );
  }
  if (q > p) {
    if (errors === 'classical') diagnostics['sargan'] = sargan(first, regressorsKept, inScale, K, scale, n, rss);
    else {
      const J = hansen(sample, first, regressorsKept, K, scale, m, times(qz, m, u));
      if (J) diagnostics['hansen_j'] = J;
      else notes.push('Hansen’s J is not available: fewer clusters than instruments.');
    }
  }
  const main = terms.find((term) => term.term === regressors[endogenousKept[0]].name);
  if (p === 1 && main) {
    diagnostics['anderson_rubin'] = andersonRubin(reduced, sample.level, main.term, main.estimate, main.std_error);
  } else diagnostics['anderson_rubin_zero'] = zeroTest(reduced);
  notes.push(...weakNotes(diagnostics as Diagnostics, errors, p));

  return {
    method: 'iv',
    errors,
    terms,
    covariance: V,
    df,
    nobs: n,
    df_resid: dfResid,
    r_squared: 1 - rss / (sample.constant || effects.length > 0 ? total.centred : total.raw),
    within_r_squared: effects.length > 0 ? 1 - rss / withinTotal : null,
    ...clusterCounts(sample),
    dropped,
    diagnostics: diagnostics as Diagnostics,
    notes,
  };
}

function rescale(v: Doubled, factorOf: number): Doubled {
  return [v[0] * factorOf, v[1] * factorOf];
}

/** Cross-products of columns after projection on the instruments. */
function projections(first: Factor, which: readonly number[]): DoubledMatrix {
  const out = doubledMatrix(which.length, which.length);
  which.forEach((a, i) => {
    which.forEach((b, j) => {
      if (j >= i) {
        const v = projected(first, a, b);
        set(out, i, j, v);
        set(out, j, i, v);
      }
    });
  });
  return out;
}

/** Coefficients of a column on the orthonormal instruments, exogenous columns taken out. */
function reducedRow(first: Factor, target: number, m1: number, unit: number): number[] {
  const out: number[] = [];
  for (let row = m1; row < first.kept.length; row++) out.push(get(first.rows, row, target)[0] / unit);
  return out;
}

/** Cross-products of first-stage and reduced-form residuals, row by row. */
function residualProducts(first: Factor, which: readonly number[], scale: readonly number[]): Float64Array {
  const d = which.length;
  const out = new Float64Array(d * d);
  which.forEach((a, i) => {
    which.forEach((b, j) => {
      out[i * d + j] = get(first.rest, a, b)[0] / (scale[a] * scale[b]);
    });
  });
  return out;
}

/** The last m − m1 of the m whitened columns. */
function transformedTail(source: ReturnType<typeof whitened>, m: number, m1: number): ReturnType<typeof whitened> {
  const T = new Float64Array((m - m1) * m);
  for (let c = m1; c < m; c++) T[(c - m1) * m + c] = 1;
  return transformed(source, m, T);
}

/** Regression form: the projected instrumented columns added to the equation, F test on them. */
function wuHausman(
  gram: DoubledMatrix,
  first: Factor,
  kept: readonly number[],
  endogenous: readonly number[],
  outcome: number,
  n: number,
): FTest {
  const k = kept.length;
  const p = endogenous.length;
  const size = k + p + 1;
  const column = (i: number): number => (i < k ? kept[i] : i < k + p ? endogenous[i - k] : outcome);
  const out = doubledMatrix(size, size);
  for (let i = 0; i < size; i++) {
    for (let j = i; j < size; j++) {
      const hat = (i >= k && i < k + p) || (j >= k && j < k + p);
      const v = hat ? projected(first, column(i), column(j)) : get(gram, column(i), column(j));
      set(out, i, j, v);
      set(out, j, i, v);
    }
  }
  const at = Array.from({ length: k + p }, (_, i) => i);
  const rss0 = get(factor(out, at.slice(0, k)).rest, size - 1, size - 1)[0];
  const full = factor(out, at);
  const added = full.kept.length - k;
  if (added <= 0) return { F: NaN, df1: 0, df2: n - k, p: NaN };
  return nestedF(rss0, get(full.rest, size - 1, size - 1)[0], added, n - k - added);
}

/** The same as a Wald test under the sample's errors: first-stage residuals added to least squares. */
function robustWuHausman(
  sample: Sample,
  X: readonly Float64Array[],
  names: readonly string[],
  Z: readonly Float64Array[],
  first: Factor,
  endogenous: readonly number[],
  scale: readonly number[],
  all: readonly Float64Array[],
  regressors: readonly { name: string }[],
): FTest {
  const n = sample.outcome.values.length;
  const parts = endogenous.map((target) => {
    const on = solve(first, target).map((v, a) => rescale(v, scale[first.kept[a]] / scale[target]));
    return {
      name: `residual of ${regressors[target].name}`,
      values: residuals(all[target], Z, on, new Float64Array(n)),
    };
  });
  const fit = ols({
    ...sample,
    errors: sample.errors === 'robust-hc3' ? 'robust' : sample.errors,
    covariates: [...X.map((values, j) => ({ name: names[j], values })), ...parts],
    constant: false,
    endogenous: [],
    instruments: [],
  });
  const at = fit.terms.map((term, j) => (parts.some((part) => part.name === term.term) ? j : -1)).filter((j) => j >= 0);
  const size = at.length;
  if (size === 0) return { F: NaN, df1: 0, df2: fit.df, p: NaN };
  const k = fit.terms.length;
  const V = new Float64Array(size * size);
  at.forEach((i, a) => {
    at.forEach((j, c) => {
      V[a * size + c] = fit.covariance[i * k + j];
    });
  });
  const F =
    quadraticForm(
      V,
      at.map((j) => fit.terms[j].estimate),
    ) / size;
  return { F, df1: size, df2: fit.df, p: fTail(F, size, fit.df) };
}

/** n·u'Pu / u'u, u the residuals and P the projection on all instruments. */
function sargan(
  first: Factor,
  kept: readonly number[],
  b: readonly Doubled[],
  outcome: number,
  scale: readonly number[],
  n: number,
  rss: number,
): ChiSquareTest {
  const m = first.kept.length;
  let sum = 0;
  for (let row = 0; row < m; row++) sum += moment(first, row, kept, b, outcome) ** 2;
  const stat = (n * sum) / (rss * scale[outcome] * scale[outcome]);
  const df = m - kept.length;
  return { stat, df, p: chiSquareTail(stat, df) };
}

/** Inner product of an orthonormal instrument with the residual y − Xb (scaled units). */
function moment(first: Factor, row: number, kept: readonly number[], b: readonly Doubled[], outcome: number): number {
  let v = get(first.rows, row, outcome);
  kept.forEach((j, a) => {
    const r = get(first.rows, row, j);
    v = add(v, multiplyNegative(r, b[a]));
  });
  return v[0];
}

function multiplyNegative(a: Doubled, b: Doubled): Doubled {
  // working precision suffices beyond the leading product: both factors are rounded sums already
  const high = -a[0] * b[0];
  return [high, -(a[0] * b[1] + a[1] * b[0])];
}

/** Hansen's J at the two-step efficient estimate; undefined when the weights cannot be inverted. */
function hansen(
  sample: Sample,
  first: Factor,
  kept: readonly number[],
  outcome: number,
  scale: readonly number[],
  m: number,
  scores: ReturnType<typeof whitened>,
): ChiSquareTest | undefined {
  const k = kept.length;
  if (sample.errors === 'clustered' && Math.min(...sample.clusters.map((c) => c.count)) <= m) return undefined;
  const S = correctedMeat(sample, counting(sample), k, m, scores, 1);
  const columns = kept.map((j) => {
    const out: number[] = [];
    for (let row = 0; row < m; row++) out.push(get(first.rows, row, j)[0] / scale[j]);
    return out;
  });
  const target: number[] = [];
  for (let row = 0; row < m; row++) target.push(get(first.rows, row, outcome)[0] / scale[outcome]);
  const stat = minimumQuadraticForm(S, columns, target);
  if (stat === undefined) return undefined;
  const df = m - k;
  return { stat, df, p: chiSquareTail(stat, df) };
}

/** min over b of (t − Cb)'S⁻¹(t − Cb), by least squares after whitening with the Cholesky factor of S. */
function minimumQuadraticForm(
  S: Float64Array,
  columns: readonly number[][],
  target: readonly number[],
): number | undefined {
  const m = target.length;
  const L = new Float64Array(m * m);
  for (let i = 0; i < m; i++) {
    for (let j = 0; j <= i; j++) {
      let sum = S[i * m + j];
      for (let l = 0; l < j; l++) sum -= L[i * m + l] * L[j * m + l];
      if (i === j) {
        if (!(sum > 1e-12 * S[i * m + i])) return undefined;
        L[i * m + i] = Math.sqrt(sum);
      } else L[i * m + j] = sum / L[j * m + j];
    }
  }
  const whiten = (v: readonly number[]): Float64Array => {
    const out = new Float64Array(m);
    for (let i = 0; i < m; i++) {
      let sum = v[i];
      for (let l = 0; l < i; l++) sum -= L[i * m + l] * out[l];
      out[i] = sum / L[i * m + i];
    }
    return out;
  };
  const all = [...columns.map(whiten), whiten(target)];
  const scale = all.map(powerOfTwoScale);
  const at = columns.map((_, j) => j);
  const f = factor(crossProducts(all, scale), at);
  const last = all.length - 1;
  return get(f.rest, last, last)[0] / (scale[last] * scale[last]);
}
