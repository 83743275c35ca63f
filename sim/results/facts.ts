/**
 * What decides which columns the tables of a run have: one plain object for the whole run, the same in every
 * worker. Arms and replicates may lack a value; they never lack a column.
 */
import type { Covariate } from '../study/record.js';

/** Panel columns whose values come from measures outside the engine, handed over with each generation. */
export const EXTRA_NAMES = [
  'pocket',
  'pocket_role',
  'cause',
  'sheltered',
  'complacent',
  'contrast_frustrated',
  'local_moran',
  'local_moran_p',
] as const;
export type ExtraName = (typeof EXTRA_NAMES)[number];

/** A measured column as its registry describes it. */
export interface Entry {
  readonly name: string;
  readonly meaning: string;
  readonly formula: string;
  /** Published source, or ''. */
  readonly source: string;
  readonly unit: string;
  /** Default `number`. */
  readonly type?: 'number' | 'integer' | 'text';
}

export interface Facts {
  /** Milestones of the arm that has most. */
  readonly milestones: number;
  /** Unit of wealth, as the study names it. */
  readonly currency: string;
  /** Measured columns the panel has. */
  readonly extras: readonly ExtraName[];
  /** Covariates of the household file. */
  readonly covariates: readonly { readonly name: string; readonly type: 'number' | 'text' }[];
  /** True when households come from a file: places have names besides their numbers, households their ids. */
  readonly placeNames: boolean;
  /** True when the household table has betweenness (costs a search from every household: small populations only). */
  readonly betweenness: boolean;
  /** Columns of the indicator table. */
  readonly indicators: readonly Entry[];
  /** Columns of evidence beside the regime. */
  readonly evidence: readonly Entry[];
}

/** Most households for which betweenness is computed. */
export const BETWEENNESS_LIMIT = 5000;

/** Name and type of covariates, for `Facts.covariates`. */
export function covariateFacts(covariates: readonly Covariate[]): Facts['covariates'] {
  return covariates.map(({ name, values }) => ({ name, type: values instanceof Float64Array ? 'number' : 'text' }));
}
