/**
 * What every estimator takes and gives back, and the last step they share: from coefficients and their covariance
 * to standard errors, tests and intervals. Keys of results are those of `estimates.json`.
 */

import { InputError } from '../../network/errors.js';
import type { ERROR_KINDS, METHODS } from '../study/estimates.js';
import { twoSidedCritical, twoSidedP } from './distributions.js';
import type { Groups } from './groups.js';

export type Method = (typeof METHODS)[number];

export type ErrorKind = (typeof ERROR_KINDS)[number];

/** A column with the name it has in the results. */
export interface Regressor {
  readonly name: string;
  readonly values: Float64Array;
}

/** Complete rows, ready to be regressed: no missing values, singletons gone, groups recoded to these rows. */
export interface Sample {
  /** Where a problem is reported: the estimate's name and place. */
  readonly place: string;
  readonly outcome: Regressor;
  readonly covariates: readonly Regressor[];
  /** Instrumented regressors (iv only). */
  readonly endogenous?: readonly Regressor[];
  /** Instruments left out of the equation (iv only). */
  readonly instruments?: readonly Regressor[];
  /** Whether the equation has a constant; with absorbed effects it lies in their span and is not reported. */
  readonly constant: boolean;
  readonly effects: readonly Groups[];
  /** One or two, for clustered errors. */
  readonly clusters: readonly Groups[];
  readonly errors: ErrorKind;
  /** Of the intervals, 0.95 for instance. */
  readonly level: number;
}

/** The constant's name in results. */
export const CONSTANT = '(const)';

export interface Coefficient {
  readonly term: string;
  readonly estimate: number;
  readonly std_error: number;
  /** estimate / std_error: t, or z where `df` is infinite. */
  readonly statistic: number;
  readonly p_value: number;
  readonly ci_low: number;
  readonly ci_high: number;
}

/** A test with its statistic, degrees of freedom and p-value. */
export interface FTest {
  readonly F: number;
  readonly df1: number;
  readonly df2: number;
  readonly p: number;
}

export interface ChiSquareTest {
  readonly stat: number;
  readonly df: number;
  readonly p: number;
}

/** Values of β that an Anderson–Rubin test does not reject; bounds are null where it has none. */
export interface ConfidenceSet {
  readonly term: string;
  readonly level: number;
  readonly kind: 'interval' | 'two rays' | 'pieces' | 'whole line' | 'empty';
  readonly intervals: readonly (readonly [number | null, number | null])[];
  readonly words: string;
  /** The test that the coefficient is zero. */
  readonly zero: FTest;
}

/** Diagnostics by name; which are present depends on method and errors. */
export interface Diagnostics {
  readonly fit?: Readonly<Record<string, number>>;
  readonly first_stage_F?: FTest;
  readonly effective_F?: {
    readonly F: number;
    /** Above this, the worst-case bias of 2SLS is below a tenth with 95 % confidence (Montiel Olea and Pflueger 2013). */
    readonly critical: number;
    readonly effective_df: number;
  };
  readonly cragg_donald?: { readonly F: number };
  readonly wu_hausman?: FTest;
  readonly wu_hausman_robust?: FTest;
  readonly sargan?: ChiSquareTest;
  readonly hansen_j?: ChiSquareTest;
  readonly anderson_rubin?: ConfidenceSet;
  /** Joint test that every instrumented coefficient is zero, where there are several. */
  readonly anderson_rubin_zero?: FTest;
  readonly [more: `first_stage_F${number}`]: FTest;
}

/** A term that could not be estimated. */
export interface Dropped {
  readonly term: string;
  readonly why: string;
}

export interface Fit {
  readonly method: Method;
  readonly errors: ErrorKind;
  readonly terms: readonly Coefficient[];
  /** Covariance of `terms`, row by row. */
  readonly covariance: Float64Array;
  /** Degrees of freedom of the t tests; Infinity means normal. */
  readonly df: number;
  readonly nobs: number;
  readonly df_resid: number;
  readonly r_squared: number;
  readonly within_r_squared: number | null;
  /** The smaller number of clusters, null without. */
  readonly clusters: number | null;
  readonly clusters_by: Readonly<Record<string, number>>;
  readonly absorbed: Readonly<Record<string, number>>;
  readonly dropped: readonly Dropped[];
  readonly diagnostics: Diagnostics;
  /** Average marginal effects (logit only). */
  readonly marginal_effects?: readonly Coefficient[];
  /** Plain sentences: warnings and what was done. */
  readonly notes: readonly string[];
}

/** Standard errors, tests and intervals from a covariance matrix (row by row). */
export function coefficients(
  names: readonly string[],
  estimates: readonly number[],
  covariance: Float64Array,
  df: number,
  level: number,
): Coefficient[] {
  const k = names.length;
  const critical = twoSidedCritical(level, df);
  return names.map((term, j) => {
    const variance = covariance[j * k + j];
    const se = Math.sqrt(variance);
    const estimate = estimates[j];
    const statistic = estimate / se;
    return {
      term,
      estimate,
      std_error: se,
      statistic,
      p_value: twoSidedP(statistic, df),
      ci_low: estimate - critical * se,
      ci_high: estimate + critical * se,
    };
  });
}

/** An `InputError` about the data an estimate was given. */
export function refuse(code: string, place: string, problem: string, remedy: string): never {
  throw new InputError({ code, place, problem, remedy });
}

/** Refuses samples no estimator can use: no rows, an outcome that does not vary, a single cluster. */
export function checkSample(sample: Sample): void {
  const { outcome, place } = sample;
  const n = outcome.values.length;
  if (n === 0) {
    refuse('empty-sample', place, 'no rows are left to estimate from', 'widen `where`, or look at the missing values');
  }
  let varies = false;
  for (let i = 1; i < n && !varies; i++) varies = outcome.values[i] !== outcome.values[0];
  if (!varies) {
    refuse(
      'no-variation',
      place,
      `the outcome ${outcome.name} is ${outcome.values[0]} in all ${n} rows`,
      'choose rows or an outcome that vary',
    );
  }
  if (sample.errors === 'clustered') {
    if (sample.clusters.length < 1 || sample.clusters.length > 2) {
      throw new RangeError(`clustered errors need one or two groupings, got ${sample.clusters.length}`);
    }
    for (const cluster of sample.clusters) {
      if (cluster.count < 2) {
        refuse(
          'one-cluster',
          place,
          `all rows lie in one cluster of ${cluster.name}`,
          'clustered errors need at least two, and about forty to be trusted: cluster by something finer',
        );
      }
    }
  }
}

/** Cautions that depend on the clusters alone. */
export function clusterNotes(sample: Sample): string[] {
  if (sample.errors !== 'clustered') return [];
  return sample.clusters
    .filter((cluster) => cluster.count < 20)
    .map(
      (cluster) =>
        `Only ${cluster.count} clusters of ${cluster.name}: clustered errors tend to be too small with so few; read p-values near 5 % with care.`,
    );
}
