/**
 * Diagnostics and inference when instruments may be weak.
 *
 * Effective F: Montiel Olea and Pflueger 2013, with their critical value for a worst-case bias of a tenth of the
 * benchmark. Anderson–Rubin: Anderson and Rubin 1949, with robust and clustered covariance of the reduced form; its
 * confidence set keeps its coverage however weak the instruments, and may be unbounded or empty. Cragg and Donald 1993
 * for several instrumented terms. All work on the reduced form on orthonormal instruments, so that cost does not depend
 * on the rows.
 */

import { EigenvalueDecomposition, Matrix } from 'ml-matrix';
import { fQuantile, fTail, noncentralChiSquareQuantile } from './distributions.js';
import type { ConfidenceSet, Diagnostics, ErrorKind, FTest } from './fit.js';
import { quadraticForm } from './small.js';

/** The reduced form: instrumented terms and outcome on q orthonormal instruments, exogenous columns taken out. */
export interface Reduced {
  readonly q: number;
  /** Per instrumented term, its q coefficients. */
  readonly instrumented: readonly (readonly number[])[];
  /** The outcome's q coefficients. */
  readonly outcome: readonly number[];
  /** Cross-products of the residuals, instrumented terms first and outcome last, row by row. */
  readonly residualProducts: Float64Array;
  /** n less instruments, exogenous columns and absorbed effects. */
  readonly free: number;
  /** Denominator degrees of freedom of the tests: G−1 with clusters, `free` without. */
  readonly df2: number;
  /** Covariance of all coefficients, stacked like the residuals in blocks of q; null under classical errors. */
  readonly covariance: Float64Array | null;
}

/** Covariance block (a, b) of the reduced form, q × q, added to `out` with a factor. */
function addBlock(form: Reduced, a: number, b: number, times: number, out: Float64Array): void {
  const { q } = form;
  const parts = form.instrumented.length + 1;
  if (form.covariance) {
    const D = parts * q;
    for (let i = 0; i < q; i++) {
      for (let j = 0; j < q; j++) out[i * q + j] += times * form.covariance[(a * q + i) * D + b * q + j];
    }
  } else {
    const s = form.residualProducts[a * parts + b] / form.free;
    for (let i = 0; i < q; i++) out[i * q + i] += times * s;
  }
}

/** Anderson–Rubin statistic, divided by q, that the coefficients are `beta`. */
function statisticAt(form: Reduced, beta: readonly number[]): number {
  const { q } = form;
  const p = form.instrumented.length;
  const weights = [...beta.map((b) => -b), 1];
  const g: number[] = [];
  for (let i = 0; i < q; i++) {
    let v = form.outcome[i];
    for (let j = 0; j < p; j++) v -= beta[j] * form.instrumented[j][i];
    g.push(v);
  }
  const omega = new Float64Array(q * q);
  for (let a = 0; a <= p; a++) for (let b = 0; b <= p; b++) addBlock(form, a, b, weights[a] * weights[b], omega);
  return quadraticForm(omega, g) / q;
}

/** Anderson–Rubin test that the coefficients are `beta`. */
export function andersonRubinTest(form: Reduced, beta: readonly number[]): FTest {
  const F = statisticAt(form, beta);
  return { F, df1: form.q, df2: form.df2, p: fTail(F, form.q, form.df2) };
}

/** Joint Anderson–Rubin test that every instrumented coefficient is zero. */
export function zeroTest(form: Reduced): FTest {
  return andersonRubinTest(
    form,
    form.instrumented.map(() => 0),
  );
}

/** Points at which the statistic is looked at, evenly spaced in the angle of (β − centre)/spread. */
const ANGLES = 4001;

/**
 * Confidence set of one instrumented coefficient.
 *
 * The line is walked in the angle θ of β = centre + spread·tan θ, which covers it with its two ends meeting at ±∞, and
 * the ends of the pieces are found by bisection to 1e−12 in θ. With one instrument or classical errors the set is one
 * piece or two rays; with several and robust errors there can be more.
 */
export function andersonRubin(
  form: Reduced,
  level: number,
  term: string,
  centre: number,
  spread: number,
): ConfidenceSet {
  const critical = fQuantile(level, form.q, form.df2);
  const unit = spread > 0 && Number.isFinite(spread) ? spread : Math.max(1, Math.abs(centre));
  const betaAt = (theta: number): number => centre + unit * Math.tan(theta);
  const inside = (theta: number): boolean => statisticAt(form, [betaAt(theta)]) <= critical;
  const half = Math.PI / 2;
  // the limit at ±∞: only the first stage counts, so it is the same test with the instrumented term alone
  const omega = new Float64Array(form.q * form.q);
  addBlock(form, 0, 0, 1, omega);
  const infinityInside = quadraticForm(omega, form.instrumented[0]) / form.q <= critical;

  const edges: number[] = [];
  const states: boolean[] = [infinityInside];
  let before = infinityInside;
  let theta0 = -half;
  for (let i = 1; i <= ANGLES; i++) {
    const theta = i === ANGLES ? half : -half + (Math.PI * i) / ANGLES;
    const now = i === ANGLES ? infinityInside : inside(theta);
    if (now !== before) {
      let low = theta0;
      let high = theta;
      while (high - low > 1e-12) {
        const middle = (low + high) / 2;
        if (inside(middle) === before) low = middle;
        else high = middle;
      }
      edges.push(betaAt((low + high) / 2));
      states.push(now);
      before = now;
    }
    theta0 = theta;
  }
  const zero = zeroTest(form);
  const percent = `${Math.round(level * 1000) / 10} %`;
  const bounds: [number | null, number | null][] = [];
  for (let s = 0; s < states.length; s++) {
    if (states[s]) bounds.push([s === 0 ? null : edges[s - 1], s === states.length - 1 ? null : edges[s]]);
  }
  const show = (x: number | null): string => (x === null ? '∞' : x.toPrecision(4));
  if (bounds.length === 0) {
    return {
      term,
      level,
      kind: 'empty',
      intervals: [],
      words: `No value of ${term} passes the Anderson–Rubin test: the instruments contradict each other or the equation.`,
      zero,
    };
  }
  if (edges.length === 0) {
    return {
      term,
      level,
      kind: 'whole line',
      intervals: bounds,
      words: `The ${percent} Anderson–Rubin set for ${term} is the whole line: the instruments say nothing about it.`,
      zero,
    };
  }
  if (bounds.length === 1 && bounds[0][0] !== null && bounds[0][1] !== null) {
    return {
      term,
      level,
      kind: 'interval',
      intervals: bounds,
      words: `The ${percent} Anderson–Rubin interval for ${term}, valid however weak the instruments, is ${show(bounds[0][0])} to ${show(bounds[0][1])}.`,
      zero,
    };
  }
  const pieces = bounds.map(([low, high]) => `${low === null ? '−' : ''}${show(low)} to ${show(high)}`).join(' and ');
  const unbounded = bounds.some(([low, high]) => low === null || high === null);
  return {
    term,
    level,
    kind: bounds.length === 2 && infinityInside ? 'two rays' : 'pieces',
    intervals: bounds,
    words: `The ${percent} Anderson–Rubin set for ${term} is ${unbounded ? 'unbounded' : 'in pieces'}: ${pieces}.`,
    zero,
  };
}

/** Share of the benchmark that the worst-case bias may reach before instruments count as weak. */
const WORST_BIAS = 0.1;

/** Effective first-stage F of one instrumented term, its critical value and effective degrees of freedom. */
export function effectiveF(form: Reduced): NonNullable<Diagnostics['effective_F']> {
  const { q } = form;
  const W = new Float64Array(q * q);
  addBlock(form, 0, 0, 1, W);
  let trace = 0;
  let square = 0;
  for (let i = 0; i < q; i++) {
    trace += W[i * q + i];
    for (let j = 0; j < q; j++) square += W[i * q + j] * W[i * q + j];
  }
  const length2 = form.instrumented[0].reduce((sum, v) => sum + v * v, 0);
  const largest = q === 1 ? W[0] : Math.max(...eigenvalues(W, q));
  const x = 1 / WORST_BIAS;
  const df = (trace * trace * (1 + 2 * x)) / (square + 2 * x * trace * largest);
  return {
    F: length2 / trace,
    critical: noncentralChiSquareQuantile(0.95, df, x * df) / df,
    effective_df: df,
  };
}

/** Cragg–Donald statistic (as an F): the smallest eigenvalue of the first stages, in units of their noise. */
export function craggDonald(form: Reduced): number {
  const p = form.instrumented.length;
  const signal = new Float64Array(p * p);
  const noise = new Float64Array(p * p);
  for (let a = 0; a < p; a++) {
    for (let b = 0; b < p; b++) {
      let sum = 0;
      for (let i = 0; i < form.q; i++) sum += form.instrumented[a][i] * form.instrumented[b][i];
      signal[a * p + b] = sum;
      noise[a * p + b] = form.residualProducts[a * (p + 1) + b] / form.free;
    }
  }
  // L⁻¹ signal L⁻ᵀ with noise = L L'
  const L = new Float64Array(p * p);
  for (let i = 0; i < p; i++) {
    for (let j = 0; j <= i; j++) {
      let sum = noise[i * p + j];
      for (let l = 0; l < j; l++) sum -= L[i * p + l] * L[j * p + l];
      L[i * p + j] = i === j ? Math.sqrt(Math.max(sum, 0)) : sum / L[j * p + j];
    }
  }
  const forward = (M: Float64Array): Float64Array => {
    const out = new Float64Array(p * p);
    for (let c = 0; c < p; c++) {
      for (let i = 0; i < p; i++) {
        let sum = M[i * p + c];
        for (let l = 0; l < i; l++) sum -= L[i * p + l] * out[l * p + c];
        out[i * p + c] = sum / L[i * p + i];
      }
    }
    return out;
  };
  const half = forward(signal);
  const turned = new Float64Array(p * p);
  for (let i = 0; i < p; i++) for (let j = 0; j < p; j++) turned[i * p + j] = half[j * p + i];
  return Math.min(...eigenvalues(forward(turned), p)) / form.q;
}

function eigenvalues(M: Float64Array, d: number): number[] {
  const matrix = new Matrix(Array.from({ length: d }, (_, i) => Array.from(M.subarray(i * d, (i + 1) * d))));
  return new EigenvalueDecomposition(matrix, { assumeSymmetric: true }).realEigenvalues;
}

/** Warnings in words. F below 10 is the rule of thumb of Staiger and Stock 1997. */
export function weakNotes(diagnostics: Diagnostics, errors: ErrorKind, instrumented: number): string[] {
  const notes: string[] = [];
  const { effective_F, first_stage_F, cragg_donald, anderson_rubin } = diagnostics;
  const points = (x: number): string => (x >= 100 ? x.toFixed(0) : x.toPrecision(3));
  if (instrumented === 1 && first_stage_F && effective_F) {
    if (errors === 'classical') {
      if (first_stage_F.F < 10) {
        notes.push(
          `Weak instruments: the first-stage F is ${points(first_stage_F.F)}, below 10. The 2SLS estimate leans towards OLS and its standard error is not to be trusted; use the Anderson–Rubin interval.`,
        );
      }
    } else if (effective_F.F < 10) {
      notes.push(
        `Weak instruments: the effective F is ${points(effective_F.F)}, below 10. The 2SLS estimate leans towards OLS and its standard error is not to be trusted; use the Anderson–Rubin interval.`,
      );
    } else if (effective_F.F < effective_F.critical) {
      notes.push(
        `Instruments of middling strength: the effective F is ${points(effective_F.F)}, short of the ${points(effective_F.critical)} that would rule out a bias of a tenth; prefer the Anderson–Rubin interval.`,
      );
    }
  } else if (cragg_donald && cragg_donald.F < 10) {
    notes.push(
      `Weak instruments: taken together they give a Cragg–Donald F of ${points(cragg_donald.F)}, below 10. The estimates lean towards OLS and their standard errors are not to be trusted.`,
    );
  }
  if (anderson_rubin && anderson_rubin.kind !== 'interval') notes.push(anderson_rubin.words);
  return notes;
}
