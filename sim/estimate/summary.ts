/**
 * What an estimator does over replicates: where it centres, how much it varies, whether its standard errors say so, how
 * often it rejects zero, and how often its interval covers the truth.
 */
import type { Coefficient } from './fit.js';
import type { Estimate } from './plan.js';
import type { EstimateFailure, EstimateResult } from './run.js';

export interface TermSummary {
  readonly term: string;
  /** Replicates in which the term was estimated. */
  readonly replicates: number;
  readonly mean: number;
  /** Standard deviation over replicates; null with one. */
  readonly sd: number | null;
  /** Monte-Carlo standard error of the mean, sd/√replicates. */
  readonly mc_se: number | null;
  readonly mean_std_error: number;
  /** Mean standard error over the standard deviation: 1 when the errors are honest. */
  readonly se_ratio: number | null;
  /** Share of replicates whose interval leaves zero out: power, or size where the truth is zero. */
  readonly rejects_zero: number;
  readonly truth: number | null;
  readonly bias: number | null;
  /** Share of replicates whose interval holds the truth. */
  readonly coverage: number | null;
  /** Share of replicates whose Anderson–Rubin set holds the truth (iv with one endogenous term). */
  readonly anderson_rubin_coverage: number | null;
}

export interface EstimateSummary {
  readonly name: string;
  readonly method: Estimate['method'];
  readonly outcome: string;
  readonly arm: string | null;
  readonly replicates: number;
  readonly failed: number;
  readonly mean_nobs: number;
  readonly level: number;
  /** Smallest and middle effective (or first-stage) F over replicates; iv only. */
  readonly weakest_F: number | null;
  readonly median_F: number | null;
  readonly terms: readonly TermSummary[];
  /** Average marginal effects over replicates (logit only). */
  readonly marginal_effects: readonly TermSummary[] | null;
  readonly notes: readonly string[];
}

/** Summaries of one estimate, one an arm, in the order of the results. */
export function summarise(
  estimate: Estimate,
  results: readonly EstimateResult[],
  failed: readonly EstimateFailure[],
): EstimateSummary[] {
  const own = results.filter((result) => result.name === estimate.name);
  const arms = [...new Set(own.map((result) => result.arm))];
  return arms.map((arm) => {
    const mine = own.filter((result) => result.arm === arm);
    const strength = mine
      .map(
        (r) => (r.errors === 'classical' ? undefined : r.diagnostics.effective_F?.F) ?? r.diagnostics.first_stage_F?.F,
      )
      .filter((F) => F !== undefined)
      .sort((a, b) => a - b);
    const terms = summariseTerms(mine, (result) => result.terms, estimate.truth);
    const known = new Set(terms.map((term) => term.term));
    const notes = Object.keys(estimate.truth)
      .filter((term) => !known.has(term))
      .map((term) => `truth names ${term}, which is not among the terms (${[...known].join(', ')}).`);
    return {
      name: estimate.name,
      method: estimate.method,
      outcome: mine[0].outcome,
      arm,
      replicates: mine.length,
      failed: new Set(failed.filter((f) => f.name === estimate.name && f.arm === arm).map((f) => f.replicate)).size,
      mean_nobs: mean(mine.map((result) => result.nobs)),
      level: estimate.level,
      weakest_F: strength[0] ?? null,
      median_F:
        strength.length > 0 ? (strength[(strength.length - 1) >> 1] + strength[strength.length >> 1]) / 2 : null,
      terms,
      marginal_effects: estimate.method === 'logit' ? summariseTerms(mine, (r) => r.marginal_effects ?? [], {}) : null,
      notes,
    };
  });
}

function summariseTerms(
  results: readonly EstimateResult[],
  termsOf: (result: EstimateResult) => readonly Coefficient[],
  truth: Readonly<Record<string, number>>,
): TermSummary[] {
  const names = [...new Set(results.flatMap((result) => termsOf(result).map((term) => term.term)))];
  return names.map((name) => {
    const found = results.flatMap((result) => termsOf(result).filter((term) => term.term === name));
    const n = found.length;
    const centre = mean(found.map((term) => term.estimate));
    const sd = n > 1 ? Math.sqrt(found.reduce((s, t) => s + (t.estimate - centre) ** 2, 0) / (n - 1)) : null;
    const meanError = mean(found.map((term) => term.std_error));
    const true_ = truth[name] ?? null;
    const sets = results.map((result) => result.diagnostics.anderson_rubin).filter((set) => set?.term === name);
    return {
      term: name,
      replicates: n,
      mean: centre,
      sd,
      mc_se: sd === null ? null : sd / Math.sqrt(n),
      mean_std_error: meanError,
      se_ratio: sd === null || sd === 0 ? null : meanError / sd,
      rejects_zero: mean(found.map((term) => (term.ci_low > 0 || term.ci_high < 0 ? 1 : 0))),
      truth: true_,
      bias: true_ === null ? null : centre - true_,
      coverage: true_ === null ? null : mean(found.map((t) => (t.ci_low <= true_ && true_ <= t.ci_high ? 1 : 0))),
      anderson_rubin_coverage:
        true_ !== null && sets.length > 0
          ? mean(
              sets.map((set) =>
                set?.intervals.some(([low, high]) => (low ?? -Infinity) <= true_ && true_ <= (high ?? Infinity))
                  ? 1
                  : 0,
              ),
            )
          : null,
    };
  });
}

function mean(values: readonly number[]): number {
  return values.reduce((sum, v) => sum + v, 0) / values.length;
}
