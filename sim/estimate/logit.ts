/**
 * Logit by iteratively reweighted least squares, with absorbed effects, separation detected and named, and average
 * marginal effects by the delta method.
 *
 * Each step is a weighted regression of the working outcome; effects are taken out of it by weighted absorption (Stammann
 * 2017). Groups of an effect in which the outcome never varies tell nothing about the slopes and are dropped and counted.
 * Separation: where a combination of columns never points the wrong way for any row and the right way for some, no finite
 * estimate exists (Albert and Anderson 1984); the iterates then run off along it, and their last step is checked to be one.
 *
 * Conventions: sandwich of the scores x(y − p) between inverse information matrices; HC1 n/(n−k), clustered with the full
 * factor; t with G−1 degrees of freedom when clustered, normal otherwise. Marginal effects treat every covariate,
 * dummies too, as continuous.
 */

import { absorb } from './absorb.js';
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
import { crossProducts, powerOfTwoScale } from './doubled.js';
import { factor, inverseFactor, solve } from './factor.js';
import {
  CONSTANT,
  checkSample,
  clusterNotes,
  coefficients,
  type Dropped,
  type Fit,
  type Regressor,
  refuse,
  type Sample,
} from './fit.js';
import { type Groups, selectGroups, withoutSingletons } from './groups.js';
import {
  absorptionNotes,
  clusterCounts,
  constantColumn,
  droppedColumn,
  eigenvalueNotes,
  exactNote,
  squares,
} from './ols.js';

const MOST_STEPS = 50;

/** Steps after which iterates that still move are checked for separation. */
const PATIENCE = 12;

/**
 * Maximum likelihood of P(y = 1) = 1/(1 + e^−xb).
 *
 * Does not change the sample. Cost O(n k²) a step, some ten steps.
 *
 * @throws {InputError} as ols, and not-binary, separation, no-convergence
 */
export function logit(input: Sample): Fit {
  checkSample(input);
  const { place, errors } = input;
  for (const v of input.outcome.values) {
    if (v !== 0 && v !== 1) {
      refuse(
        'not-binary',
        place,
        `the outcome ${input.outcome.name} is ${v} in some row`,
        'logit needs an outcome of 0 and 1',
      );
    }
  }
  const { sample, notes } = withVaryingEffects(input);
  const { effects } = sample;
  const y = sample.outcome.values;
  const n = y.length;
  if (errors === 'robust-hc3' && effects.length > 0) {
    refuse(
      'hc3-effects',
      place,
      'robust-hc3 needs every row’s leverage, which a logit with absorbed effects does not give',
      'use robust or clustered errors',
    );
  }

  // collinear columns, once, on the columns as they are
  const regressors = [...(sample.constant && effects.length === 0 ? [constantColumn(n)] : []), ...sample.covariates];
  if (regressors.length === 0) refuse('no-terms', place, 'there is nothing to estimate', 'name covariates');
  const kept: Regressor[] = [];
  const dropped: Dropped[] = [];
  {
    const columns = regressors.map((x) => x.values);
    const raw = columns.map((x) => squares(x).raw);
    const within = effects.length > 0 ? columns.map((x) => x.slice()) : columns;
    notes.push(...absorptionNotes(absorb(within, effects)));
    const scale = within.map(powerOfTwoScale);
    const gram = crossProducts(within, scale);
    const lengths = raw.map((length, j) => length * scale[j] * scale[j]);
    const f = factor(
      gram,
      within.map((_, j) => j),
      lengths,
    );
    for (const j of f.kept) kept.push(regressors[j]);
    for (const j of f.dropped) {
      dropped.push(droppedColumn(regressors[j].name, lengths[j], gram.high[j * within.length + j], effects.length > 0));
    }
  }
  const k = kept.length;
  if (k === 0) refuse('no-terms', place, 'every covariate was dropped', 'name covariates that vary');
  const count = counting(sample);
  if (n - k - count.absorbed <= 0) {
    refuse('too-few-rows', place, `${n} rows cannot carry ${k} coefficients`, 'use more rows or fewer terms');
  }

  const X = kept.map((x) => x.values);
  const scale = X.map(powerOfTwoScale);
  const work = effects.length > 0 ? X.map((x) => x.slice()) : X;
  const eta = new Float64Array(n);
  const p = new Float64Array(n);
  const w = new Float64Array(n);
  const target = new Float64Array(n);
  let b: Float64Array = new Float64Array(k);
  let step = new Float64Array(k);
  let move = new Float64Array(0);
  let deviance = Infinity;
  let inverse: Float64Array = new Float64Array(0);
  let converged = false;
  for (let i = 0; i < n; i++) eta[i] = (y[i] - 0.5) * 0.5;
  if (effects.length === 0) eta.fill(0);
  for (let iteration = 0; iteration < MOST_STEPS && !converged; iteration++) {
    logistic(eta, p, w);
    // the working residual alone: least squares of it on the columns gives the step, free of the size of eta
    for (let i = 0; i < n; i++) target[i] = (y[i] - p[i]) / w[i] + (effects.length > 0 ? eta[i] : 0);
    if (effects.length > 0) {
      work.forEach((x, j) => {
        x.set(X[j]);
      });
      absorb([...work, target], effects, w);
    }
    const all = [...work, target];
    const unit = [...scale, powerOfTwoScale(target)];
    const f = factor(
      crossProducts(all, unit, w),
      work.map((_, j) => j),
      work.map(() => 0),
    );
    if (f.dropped.length > 0) break;
    inverse = inverseFactor(f);
    for (let i = 0; i < k; i++) for (let j = i; j < k; j++) inverse[i * k + j] *= unit[i];
    const solution = solve(f, k).map((v, j) => (v[0] * unit[j]) / unit[k]);
    const next = new Float64Array(k);
    const etaNext = new Float64Array(n);
    if (effects.length > 0) {
      // the weighted residual of the working outcome is z − eta, so eta needs no effects of its own
      for (let i = 0; i < n; i++) etaNext[i] = (y[i] - p[i]) / w[i] + eta[i] - target[i];
      for (let j = 0; j < k; j++) {
        next[j] = solution[j];
        const x = work[j];
        for (let i = 0; i < n; i++) etaNext[i] += solution[j] * x[i];
      }
    } else {
      for (let j = 0; j < k; j++) next[j] = b[j] + solution[j];
      index(X, next, etaNext);
    }
    let nextDeviance = devianceOf(y, etaNext);
    // halve a step that makes the fit worse
    let halvings = 0;
    while (!(nextDeviance <= deviance * (1 + 1e-12)) && halvings < 20) {
      halvings++;
      for (let j = 0; j < k; j++) next[j] = (next[j] + b[j]) / 2;
      for (let i = 0; i < n; i++) etaNext[i] = (etaNext[i] + eta[i]) / 2;
      nextDeviance = devianceOf(y, etaNext);
    }
    step = new Float64Array(k);
    let largest = 0;
    for (let j = 0; j < k; j++) {
      step[j] = next[j] - b[j];
      const size = Math.abs(step[j]) / Math.max(Math.abs(next[j]), 1 / (scale[j] * 1e3));
      if (size > largest) largest = size;
    }
    move = new Float64Array(n);
    for (let i = 0; i < n; i++) move[i] = etaNext[i] - eta[i];
    b = next;
    eta.set(etaNext);
    const settled = Math.abs(deviance - nextDeviance) <= 1e-13 * (nextDeviance + 1e-3) && largest < 1e-9;
    deviance = nextDeviance;
    if (iteration >= PATIENCE && !settled) separation(sample, kept, y, move, step);
    converged = settled;
  }
  if (!converged) {
    separation(sample, kept, y, move, step);
    refuse(
      'no-convergence',
      place,
      `the logit did not settle in ${MOST_STEPS} steps`,
      'look for covariates that almost predict the outcome, or on wildly different scales',
    );
  }
  if (perfect(y, eta)) separation(sample, kept, y, move, step);

  // covariance at the estimate
  logistic(eta, p, w);
  if (effects.length > 0) {
    work.forEach((x, j) => {
      x.set(X[j]);
    });
    absorb(work, effects, w);
  }
  {
    const f = factor(
      crossProducts(work, scale, w),
      work.map((_, j) => j),
      work.map(() => 0),
    );
    inverse = inverseFactor(f);
    for (let i = 0; i < k; i++) for (let j = i; j < k; j++) inverse[i * k + j] *= scale[i];
  }
  const score = new Float64Array(n);
  for (let i = 0; i < n; i++) score[i] = y[i] - p[i];
  let V: Float64Array;
  if (errors === 'classical') V = classical(inverse, k, 1);
  else {
    const q = whitened(work, inverse);
    let used: Float64Array = score;
    if (errors === 'robust-hc3') {
      const { weighted, exact } = hc3Residuals(n, k, q, score, [], w);
      used = weighted;
      if (exact > 0) notes.push(exactNote(exact));
    }
    V = sandwiched(inverse, correctedMeat(sample, count, k, k, times(q, k, used)), k);
    if (sample.clusters.length === 2) notes.push(...eigenvalueNotes(withoutNegativeEigenvalues(V, k)));
  }
  notes.push(...clusterNotes(sample));
  if (effects.length > 0) {
    notes.push(
      'Logit with absorbed effects: with few rows per group the slopes are biased away from zero (incidental parameters), and the errors of the marginal effects take the effects as known.',
    );
  }
  const df = errors === 'clustered' ? count.clusters - 1 : Infinity;
  const names = kept.map((x) => x.name);

  let ones = 0;
  for (let i = 0; i < n; i++) ones += y[i];
  const share = ones / n;
  const loglik = -deviance / 2;
  const loglik0 = n * (share * Math.log(share) + (1 - share) * Math.log(1 - share));
  const parameters = k + count.absorbed;
  return {
    method: 'logit',
    errors,
    terms: coefficients(names, Array.from(b), V, df, sample.level),
    covariance: V,
    df,
    nobs: n,
    df_resid: n - parameters,
    r_squared: 1 - loglik / loglik0,
    within_r_squared: null,
    ...clusterCounts(sample),
    dropped,
    diagnostics: {
      fit: { loglik, loglik0, mcfadden: 1 - loglik / loglik0, aic: 2 * parameters - 2 * loglik, n },
    },
    marginal_effects: marginalEffects(names, work, b, p, w, V, df, sample.level),
    notes,
  };
}

/** p = 1/(1 + e^−eta) and w = p(1 − p), w kept above rounding so that working outcomes stay finite. */
function logistic(eta: Float64Array, p: Float64Array, w: Float64Array): void {
  for (let i = 0; i < eta.length; i++) {
    const e = Math.exp(-Math.abs(eta[i]));
    const small = e / (1 + e);
    p[i] = eta[i] >= 0 ? 1 / (1 + e) : small;
    w[i] = Math.max(small / (1 + e), 1e-290);
  }
}

function index(X: readonly Float64Array[], b: Float64Array, out: Float64Array): void {
  out.fill(0);
  for (let j = 0; j < X.length; j++) {
    const x = X[j];
    const bj = b[j];
    for (let i = 0; i < out.length; i++) out[i] += bj * x[i];
  }
}

/** −2 log-likelihood. */
function devianceOf(y: Float64Array, eta: Float64Array): number {
  let sum = 0;
  for (let i = 0; i < y.length; i++) {
    const s = y[i] === 1 ? -eta[i] : eta[i];
    sum += s > 0 ? s + Math.log1p(Math.exp(-s)) : Math.log1p(Math.exp(s));
  }
  return 2 * sum;
}

/** Every row on its own side with an index beyond 15: nothing was left to fit. */
function perfect(y: Float64Array, eta: Float64Array): boolean {
  for (let i = 0; i < y.length; i++) if ((y[i] === 1 ? eta[i] : -eta[i]) < 15) return false;
  return true;
}

/** Raises `separation` when the last step points no row the wrong way and some the right way. */
function separation(
  sample: Sample,
  kept: readonly Regressor[],
  y: Float64Array,
  move: Float64Array,
  step: Float64Array,
): void {
  let largest = 0;
  for (let i = 0; i < move.length; i++) largest = Math.max(largest, Math.abs(move[i]));
  if (!(largest > 0)) return;
  // overlapping rows settle quadratically while separated ones move by about one a step
  const tolerance = 1e-4 * largest;
  let right = 0;
  for (let i = 0; i < move.length; i++) {
    const s = y[i] === 1 ? move[i] : -move[i];
    if (s < -tolerance) return;
    if (s > tolerance) right++;
  }
  if (right === 0 || largest < 1e-2) return;
  const reach = kept.map((x, j) => Math.abs(step[j]) * Math.sqrt(squares(x.values).centred / y.length));
  const most = Math.max(...reach);
  const names = kept.filter((x, j) => x.name !== CONSTANT && reach[j] > 1e-3 * most).map((x) => x.name);
  refuse(
    'separation',
    sample.place,
    `${names.join(', ')} predict${names.length === 1 ? 's' : ''} the outcome ${sample.outcome.name} without error in ${right} of ${y.length} rows, so that no finite logit coefficient exists`,
    `leave out ${names.length === 1 ? 'this term' : 'one of these terms'} or the rows it decides, or use ols`,
  );
}

/** Drops groups of an effect in which the outcome never varies, then singletons, until none is left. */
function withVaryingEffects(sample: Sample): { sample: Sample; notes: string[] } {
  const notes: string[] = [];
  let current = sample;
  const gone: Record<string, number> = {};
  for (let again = sample.effects.length > 0; again; ) {
    again = false;
    for (let e = 0; e < current.effects.length; e++) {
      const effect = current.effects[e];
      const y = current.outcome.values;
      const ones = new Int32Array(effect.count);
      const size = new Int32Array(effect.count);
      for (let i = 0; i < y.length; i++) {
        size[effect.codes[i]]++;
        if (y[i] === 1) ones[effect.codes[i]]++;
      }
      const rows: number[] = [];
      for (let i = 0; i < y.length; i++) {
        const g = effect.codes[i];
        if (ones[g] > 0 && ones[g] < size[g]) rows.push(i);
      }
      if (rows.length === y.length) continue;
      let groups = 0;
      for (let g = 0; g < effect.count; g++) if (ones[g] === 0 || ones[g] === size[g]) groups++;
      gone[effect.name] = (gone[effect.name] ?? 0) + groups;
      current = rowsOf(current, Int32Array.from(rows));
      again = true;
    }
    const rows = withoutSingletons(current.effects, current.outcome.values.length);
    if (rows) {
      current = rowsOf(current, rows);
      again = true;
    }
  }
  for (const [name, groups] of Object.entries(gone)) {
    notes.push(
      `${groups} group${groups > 1 ? 's' : ''} of ${name}, in which ${sample.outcome.name} never varies, ${groups > 1 ? 'were' : 'was'} dropped: they say nothing about the slopes.`,
    );
  }
  if (current !== sample) checkSample(current);
  return { sample: current, notes };
}

/** The sample on some of its rows, groups recoded. */
export function rowsOf(sample: Sample, rows: Int32Array): Sample {
  const pick = (x: Regressor): Regressor => {
    const values = new Float64Array(rows.length);
    for (let r = 0; r < rows.length; r++) values[r] = x.values[rows[r]];
    return { name: x.name, values };
  };
  const regroup = (g: Groups): Groups => selectGroups(g, rows);
  return {
    ...sample,
    outcome: pick(sample.outcome),
    covariates: sample.covariates.map(pick),
    ...(sample.endogenous ? { endogenous: sample.endogenous.map(pick) } : {}),
    ...(sample.instruments ? { instruments: sample.instruments.map(pick) } : {}),
    effects: sample.effects.map(regroup),
    clusters: sample.clusters.map(regroup),
  };
}

/**
 * Average of b_j p(1−p) over rows, standard errors by the delta method. `work` are the columns, demeaned within the
 * effects, so that the effects follow the slopes.
 */
function marginalEffects(
  names: readonly string[],
  work: readonly Float64Array[],
  b: Float64Array,
  p: Float64Array,
  w: Float64Array,
  V: Float64Array,
  df: number,
  level: number,
): ReturnType<typeof coefficients> {
  const n = p.length;
  const k = names.length;
  let mean = 0;
  for (let i = 0; i < n; i++) mean += w[i];
  mean /= n;
  // ∂ mean w / ∂ b_l
  const slope = work.map((x) => {
    let sum = 0;
    for (let i = 0; i < n; i++) sum += w[i] * (1 - 2 * p[i]) * x[i];
    return sum / n;
  });
  const at = names.map((_, j) => j).filter((j) => names[j] !== CONSTANT);
  const d = at.length;
  const covariance = new Float64Array(d * d);
  const jacobian = at.map((j) => names.map((_, l) => (j === l ? mean : 0) + b[j] * slope[l]));
  for (let a = 0; a < d; a++) {
    for (let c = 0; c < d; c++) {
      let sum = 0;
      for (let i = 0; i < k; i++) for (let l = 0; l < k; l++) sum += jacobian[a][i] * V[i * k + l] * jacobian[c][l];
      covariance[a * d + c] = sum;
    }
  }
  return coefficients(
    at.map((j) => names[j]),
    at.map((j) => b[j] * mean),
    covariance,
    df,
    level,
  );
}
