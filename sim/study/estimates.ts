/**
 * The plan of regressions: what a user may write, inside a study (`estimates:`) or in a plan file of its own.
 *
 * Types, validation and explanations come from the schema here. Which columns there are, and checks that need the data,
 * are the estimators' (sim/estimate). Reads no files.
 */
import { z } from 'zod';
import type { Path, StudyProblem } from './problems.js';

/** Estimators. */
export const METHODS = ['ols', 'logit', 'iv'] as const;

/** Kinds of standard errors. */
export const ERROR_KINDS = ['classical', 'robust', 'robust-hc3', 'clustered'] as const;

const columnName = z.string().min(1).max(200);
const scalar = z.union([z.string(), z.number(), z.boolean()]);

/** How a regressor is made from columns. A plain text is a column's name, or `log_` before one. */
export type Term =
  | string
  | { readonly log: Term }
  | { readonly square: Term }
  | { readonly power: readonly [Term, number] }
  | { readonly product: readonly [Term, Term] }
  | { readonly lag: Term }
  | { readonly lead: Term }
  | { readonly dummy: string; readonly base?: string | number | boolean | undefined };

/** Keys of a term that is not a plain column. */
export const TERM_KEYS = ['log', 'square', 'power', 'product', 'lag', 'lead', 'dummy'] as const;

const dummy = z.strictObject({
  dummy: columnName.describe('The column whose values become 0/1 terms, one each but the base.'),
  base: scalar
    .optional()
    .describe('The value left out; the first in order (of arms, the first in the data) unless given.'),
});

// terms may hold terms, three deep: spelt out rather than recursive, so that the JSON Schema stays a plain tree
function termSchema(depth: number): z.ZodType<Term> {
  if (depth === 0) return columnName as unknown as z.ZodType<Term>;
  const inner = termSchema(depth - 1);
  return z.union([
    columnName,
    z.strictObject({ log: inner.describe('Natural logarithm; values not above 0 count as missing.') }),
    z.strictObject({ square: inner.describe('The square.') }),
    z.strictObject({ power: z.tuple([inner, z.int().min(1).max(20)]).describe('A whole power, [term, exponent].') }),
    z.strictObject({ product: z.tuple([inner, inner]).describe('The product of two terms.') }),
    z.strictObject({ lag: inner.describe('Its value in the household’s generation before.') }),
    z.strictObject({ lead: inner.describe('Its value in the household’s next generation.') }),
    dummy,
  ]) as unknown as z.ZodType<Term>;
}

const term = termSchema(3);

/** A grouping to absorb or cluster by: a column, or the cells of several. */
export type Grouping = string | { readonly product: readonly string[] };

const grouping = z.union([
  columnName,
  z.strictObject({ product: z.array(columnName).min(2).max(4).describe('Cells in which all these columns agree.') }),
]);

const groupings = z.union([z.literal('none'), columnName, z.array(grouping)]);

/** Which rows to keep, by column. */
export type Filter =
  | string
  | number
  | boolean
  | readonly (string | number | boolean)[]
  | { readonly from?: number | undefined; readonly to?: number | undefined }
  | { readonly in: readonly (string | number | boolean)[] };

const filter = z.union([
  z.string(),
  z.number(),
  z.boolean(),
  z.array(z.string()).min(1),
  z.array(z.number()).min(1),
  z.strictObject({ from: z.number().optional(), to: z.number().optional() }),
  z.strictObject({ in: z.array(scalar).min(1) }),
]) as unknown as z.ZodType<Filter>;

const Draw = z.strictObject({
  places: z.int().min(1).describe('Places drawn, each with the same chance.'),
  households_per_place: z.int().min(1).describe('Households drawn in each place; all of them where there are fewer.'),
});

/** One regression. */
export const Estimate = z.strictObject({
  name: z.string().min(1).max(200).describe('What the estimate is called in tables and figures.'),
  method: z
    .enum(METHODS)
    .default('ols')
    .describe('ols: least squares. logit: a 0/1 outcome. iv: two-stage least squares with instruments.'),
  outcome: term.describe('The left-hand side: a column or a term.'),
  covariates: z
    .array(term)
    .default([])
    .describe(
      'The right-hand side: columns, log_…, {square: x}, {product: [x, y]}, {lag: x}, {lead: x}, {dummy: group}.',
    ),
  endogenous: z.array(term).optional().describe('iv: regressors that are instrumented.'),
  instruments: z.array(term).optional().describe('iv: terms that move the endogenous ones and nothing else.'),
  constant: z.boolean().default(true).describe('Whether the equation has a constant.'),
  effects: groupings.default([]).describe('Group effects that are absorbed, any number.'),
  cluster: groupings.default([]).describe('Errors may be correlated within these groups: none, one or two.'),
  errors: z
    .enum(ERROR_KINDS)
    .optional()
    .describe('classical, robust (HC1), robust-hc3 or clustered; clustered where cluster is given, else classical.'),
  where: z
    .record(z.string(), filter)
    .default({})
    .describe('Rows kept: a value; for text a list of values; for numbers a range [from, to], both included.'),
  draw: z
    .union([z.literal('everyone'), Draw])
    .default('everyone')
    .describe('A survey’s sample of places and households, drawn anew in each replicate.'),
  pool_arms: z
    .boolean()
    .optional()
    .describe('One regression over all arms rather than one an arm; so already where a term is {dummy: arm}.'),
  level: z.number().gt(0).lt(1).default(0.95).describe('Level of the intervals.'),
  truth: z
    .record(z.string(), z.number())
    .default({})
    .describe('True values by term, where known: the summary then gives bias and coverage.'),
});

export type Estimate = z.output<typeof Estimate>;

/** `estimates:` of a study or a plan. */
export const Estimates = z.array(Estimate).min(1).describe('Regressions run on the panel after the study.');

/** Checks that need two fields at once. `at` is where the list of estimates stands. */
export function checkEstimates(estimates: readonly Estimate[], at: Path = ['estimates']): StudyProblem[] {
  const problems: StudyProblem[] = [];
  const names = new Set<string>();
  estimates.forEach((estimate, i) => {
    const path = [...at, i];
    const add = (field: string, code: string, problem: string, remedy: string): void => {
      problems.push({ code, path: [...path, field], problem: `${estimate.name}: ${problem}`, remedy });
    };
    if (names.has(estimate.name)) add('name', 'duplicate-name', 'two estimates have this name', 'rename one');
    names.add(estimate.name);
    const { method, errors } = estimate;
    if (method === 'iv') {
      if (!estimate.endogenous?.length)
        add('method', 'no-endogenous', 'iv has no endogenous terms', 'name them, or use ols');
      if (!estimate.instruments?.length)
        add('method', 'no-instruments', 'iv has no instruments', 'name them, or use ols');
    } else {
      for (const field of ['endogenous', 'instruments'] as const) {
        if (estimate[field]?.length)
          add(field, 'not-iv', `${field} belong to method iv, this is ${method}`, `use method: iv or remove ${field}`);
      }
    }
    const clusters = groupingsOf(estimate.cluster);
    if (clusters.length > 2)
      add('cluster', 'too-many-clusters', `${clusters.length} clusterings are given`, 'name one or two');
    if (errors === 'clustered' && clusters.length === 0) {
      add('errors', 'no-cluster', 'clustered errors need something to cluster by', 'add cluster: [place]');
    }
    if (errors !== undefined && errors !== 'clustered' && clusters.length > 0) {
      add(
        'errors',
        'idle-cluster',
        `errors are ${errors} but cluster is given`,
        'use errors: clustered, or remove cluster',
      );
    }
    if (
      errors === 'robust-hc3' &&
      (groupingsOf(estimate.effects).length > 1 || (method === 'logit' && groupingsOf(estimate.effects).length > 0))
    ) {
      add(
        'errors',
        'hc3-effects',
        'robust-hc3 needs every row’s leverage, which these absorbed effects do not give',
        'write effects as {dummy: …}, or use robust or clustered errors',
      );
    }
    if (typeof estimate.outcome === 'object' && 'dummy' in estimate.outcome) {
      add('outcome', 'dummy-outcome', 'the outcome is a dummy of several values', 'name a 0/1 column');
    }
    if (method !== 'iv' && estimate.covariates.length === 0 && !estimate.constant) {
      add('covariates', 'no-terms', 'there is nothing to estimate', 'name covariates');
    }
  });
  return problems;
}

/** Groupings as a list, whichever way they were written. */
export function groupingsOf(written: Estimate['effects']): readonly Grouping[] {
  if (written === 'none') return [];
  return typeof written === 'string' ? [written] : written;
}

/** Errors of an estimate, the default filled in. */
export function errorsOf(estimate: Estimate): (typeof ERROR_KINDS)[number] {
  return estimate.errors ?? (groupingsOf(estimate.cluster).length > 0 ? 'clustered' : 'classical');
}

/** Keys of a survey draw. */
export const DRAW_KEYS = Object.keys(Draw.shape);
