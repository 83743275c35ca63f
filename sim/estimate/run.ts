/**
 * Runs a plan on a source of rows: every estimate, arm by arm, replicate by replicate, and sums up over replicates.
 */

import { InputError, type Problem } from '../../network/errors.js';
import { assemble } from './assemble.js';
import type { Fit } from './fit.js';
import type { FrameSource } from './frame.js';
import { iv } from './iv.js';
import { logit } from './logit.js';
import { ols } from './ols.js';
import { type Estimate, type Placer, placed } from './plan.js';
import { type EstimateSummary, summarise } from './summary.js';
import { checkTerms, columnsOfEstimate, poolsArms } from './terms.js';

/** One regression on one arm (or several pooled) of one replicate. Keys are those of `estimates.json`. */
export interface EstimateResult extends Omit<Fit, 'covariance' | 'df'> {
  readonly name: string;
  readonly outcome: string;
  /** The arm, several joined by ' + ' when pooled, null where the data have none. */
  readonly arm: string | null;
  readonly replicate: number | null;
  readonly df: number | null;
  readonly households: number | null;
  /** Rows after `where` and the draw, before incomplete ones and singletons are dropped. */
  readonly rows_chosen: number;
  readonly rows_missing: number;
  readonly missing: Readonly<Record<string, number>>;
  readonly singletons: number;
  readonly level: number;
}

/** Households a survey draw took. */
export interface SurveyDraw {
  readonly name: string;
  readonly arm: string | null;
  readonly replicate: number | null;
  readonly households: readonly number[];
}

/** An estimate that could not be had in one arm and replicate. */
export interface EstimateFailure extends Problem {
  readonly name: string;
  readonly arm: string | null;
  readonly replicate: number | null;
}

export interface PlanResults {
  readonly estimates: readonly EstimateResult[];
  readonly failed: readonly EstimateFailure[];
  /** One an estimate and arm, over replicates. */
  readonly summary: readonly EstimateSummary[];
  readonly draws: readonly SurveyDraw[];
}

export interface RunOptions {
  /** Seed of survey draws; the source's unless given. */
  readonly seed?: string | number | undefined;
  /** Where the list of estimates stands in the file, [estimates]. */
  readonly at?: readonly (string | number)[];
  /** Called before each regression with how many are done, of how many. */
  readonly onProgress?: (done: number, total: number, name: string) => void;
}

/**
 * Runs every estimate of a plan.
 *
 * What fails in some replicates (separation in a small draw, say) is listed under `failed`; an estimate that fails in all
 * of them is an error.
 *
 * @param place - gives `file:line:column` of a part of the plan
 * @throws {InputError} for names that are no columns, arms that do not exist, and estimates that cannot be had at all
 */
export async function runEstimates(
  estimates: readonly Estimate[],
  source: FrameSource,
  place: Placer,
  options: RunOptions = {},
): Promise<PlanResults> {
  const at = options.at ?? ['estimates'];
  const problems = estimates.flatMap((estimate, i) => [
    ...checkTerms(estimate, source.kinds, [...at, i]),
    ...checkArms(estimate, source, [...at, i]),
  ]);
  if (problems.length > 0) throw placed(problems, place);
  const seed = String(options.seed ?? source.seed);

  const jobs = estimates.flatMap((estimate, i) => {
    const wanted = source.arms === null ? null : armsOf(estimate, source.arms);
    const armSets = wanted === null ? [null] : poolsArms(estimate) ? [wanted] : wanted.map((arm) => [arm]);
    const replicates = source.replicates === null ? [null] : source.replicates;
    return armSets.flatMap((arms) => replicates.map((replicate) => ({ estimate, i, arms, replicate })));
  });
  const results: EstimateResult[] = [];
  const failed: EstimateFailure[] = [];
  const draws: SurveyDraw[] = [];
  let done = 0;
  for (const { estimate, i, arms, replicate } of jobs) {
    options.onProgress?.(done++, jobs.length, estimate.name);
    const arm = arms === null ? null : arms.join(' + ');
    const where = [
      `${place([...at, i])} (${estimate.name}`,
      ...(arm === null || (source.arms?.length ?? 0) < 2 ? [] : [`arm ${arm}`]),
      ...(replicate === null || (source.replicates?.length ?? 0) < 2 ? [] : [`replicate ${replicate}`]),
    ].join(', ');
    try {
      // the frame is read for one regression and let go: memory stays that of one replicate
      const names = columnsOfEstimate(estimate, source.kinds);
      const frame = await source.read(names, arms, replicate);
      const made = assemble(frame, estimate, `${where})`, seed, replicate ?? 0);
      const { sample, chosen, missingRows, missing, singletons, households, drawn, notes } = made;
      if (drawn !== null) draws.push({ name: estimate.name, arm, replicate, households: drawn });
      const fit = estimate.method === 'iv' ? iv(sample) : estimate.method === 'logit' ? logit(sample) : ols(sample);
      const { covariance: _, df, ...rest } = fit;
      results.push({
        name: estimate.name,
        outcome: sample.outcome.name,
        arm,
        replicate,
        ...rest,
        df: Number.isFinite(df) ? df : null,
        households,
        rows_chosen: chosen,
        rows_missing: missingRows,
        missing,
        singletons,
        level: estimate.level,
        notes: [...notes, ...fit.notes],
      });
    } catch (error) {
      if (!(error instanceof InputError)) throw error;
      for (const problem of error.problems) failed.push({ ...problem, name: estimate.name, arm, replicate });
    }
  }
  options.onProgress?.(done, jobs.length, '');
  const hopeless = failed.filter(
    (failure) => !results.some((result) => result.name === failure.name && result.arm === failure.arm),
  );
  if (hopeless.length > 0) throw new InputError(oncePerArm(hopeless));
  return { estimates: results, failed, summary: estimates.flatMap((e) => summarise(e, results, failed)), draws };
}

/** The first failure of each estimate and arm: the other replicates only repeat it. */
function oncePerArm(failures: readonly EstimateFailure[]): Problem[] {
  const seen = new Set<string>();
  return failures.filter((failure) => {
    const key = `${failure.name}\n${failure.arm}`;
    if (seen.has(key)) return false;
    seen.add(key);
    return true;
  });
}

/** Arms an estimate is for: those its filter on `arm` names, else all. */
function armsOf(estimate: Estimate, arms: readonly string[]): string[] {
  const filter = estimate.where['arm'];
  if (filter === undefined) return [...arms];
  const wanted = Array.isArray(filter) ? filter : typeof filter === 'object' && 'in' in filter ? filter.in : [filter];
  return arms.filter((arm) => wanted.includes(arm));
}

function checkArms(estimate: Estimate, source: FrameSource, at: readonly (string | number)[]) {
  const filter = estimate.where['arm'];
  if (source.arms === null || filter === undefined) return [];
  const wanted = Array.isArray(filter) ? filter : typeof filter === 'object' && 'in' in filter ? filter.in : [filter];
  const known = source.arms;
  return wanted
    .filter((arm) => !known.includes(String(arm)))
    .map((arm) => ({
      code: 'unknown-arm',
      path: [...at, 'where', 'arm'],
      problem: `${estimate.name}: there is no arm ${JSON.stringify(arm)}`,
      remedy: `use ${known.join(', ')}`,
    }));
}
