/**
 * The files of a plan's results, as text: `estimates.csv`, `estimates_summary.csv`, `estimates.json`, scripts and draws.
 */
import type { Estimate } from './plan.js';
import type { EstimateResult, PlanResults } from './run.js';
import { pythonScript } from './script-python.js';
import { rScript } from './script-r.js';

/** Every file that goes beside the panel: tables, JSON, and the scripts that rerun the plan, by name. */
export function estimateFiles(
  estimates: readonly Estimate[],
  results: PlanResults,
  head: Readonly<Record<string, unknown>> = {},
): Readonly<Record<string, string>> {
  const draws = drawsCsv(results);
  return {
    'estimates.csv': estimatesCsv(results),
    'estimates_summary.csv': summaryCsv(results),
    'estimates.json': estimatesJson(results, head),
    'panel.py': pythonScript(estimates),
    'panel.R': rScript(estimates),
    ...(draws === undefined ? {} : { 'estimates_draws.csv': draws }),
  };
}

/** `estimates.json`: every regression, the summaries over replicates, what failed. */
export function estimatesJson(results: PlanResults, head: Readonly<Record<string, unknown>> = {}): string {
  const { estimates, summary, failed } = results;
  return `${JSON.stringify({ ...head, estimates, summary, failed }, null, 2)}\n`;
}

const CSV_COLUMNS = [
  'name',
  'arm',
  'replicate',
  'method',
  'outcome',
  'kind',
  'term',
  'estimate',
  'std_error',
  'statistic',
  'df',
  'p_value',
  'ci_low',
  'ci_high',
  'nobs',
  'households',
  'clusters',
  'r_squared',
  'within_r_squared',
] as const;

/** One row a term: coefficients (`kind` coefficient) and, for logit, marginal effects (`kind` marginal_effect). */
export function estimatesCsv(results: PlanResults): string {
  const rows = results.estimates.flatMap((result: EstimateResult) =>
    [
      ...result.terms.map((term) => ({ ...term, kind: 'coefficient' })),
      ...(result.marginal_effects ?? []).map((term) => ({ ...term, kind: 'marginal_effect' })),
    ].map((term) => CSV_COLUMNS.map((name) => ({ ...result, ...term })[name])),
  );
  return csv(CSV_COLUMNS, rows);
}

const SUMMARY_COLUMNS = [
  'name',
  'arm',
  'method',
  'outcome',
  'term',
  'replicates',
  'failed',
  'mean',
  'sd',
  'mc_se',
  'mean_std_error',
  'se_ratio',
  'rejects_zero',
  'truth',
  'bias',
  'coverage',
  'anderson_rubin_coverage',
  'mean_nobs',
] as const;

/** One row an estimate, arm and term. */
export function summaryCsv(results: PlanResults): string {
  const rows = results.summary.flatMap((summary) =>
    summary.terms.map((term) => SUMMARY_COLUMNS.map((name) => ({ ...summary, ...term })[name])),
  );
  return csv(SUMMARY_COLUMNS, rows);
}

/** Households each survey draw took, one a row; undefined when nothing was drawn. */
export function drawsCsv(results: PlanResults): string | undefined {
  if (results.draws.length === 0) return undefined;
  return csv(
    ['name', 'arm', 'replicate', 'household'],
    results.draws.flatMap((draw) => draw.households.map((id) => [draw.name, draw.arm, draw.replicate, id])),
  );
}

function csv(header: readonly string[], rows: readonly (readonly unknown[])[]): string {
  return [header, ...rows].map((row) => `${row.map(cell).join(',')}\r\n`).join('');
}

/** Numbers read back to the same double; null and NaN are empty. */
function cell(value: unknown): string {
  if (value === null || value === undefined) return '';
  if (typeof value === 'number')
    return Number.isNaN(value) ? '' : value === Infinity ? 'INF' : value === -Infinity ? '-INF' : String(value);
  const text = String(value);
  return /[",\r\n]/.test(text) ? `"${text.replaceAll('"', '""')}"` : text;
}
