/** Columns of a reference set as samples for the regression kernels. */
import type { Fit, Regressor, Sample } from '../../sim/estimate/fit.js';
import { type Groups, groupsOf } from '../../sim/estimate/groups.js';
import { columnsOf } from './expected.js';

export class Data {
  readonly columns: Record<string, string[]>;
  constructor(set: string, file = 'data.csv', keep?: (row: Record<string, string>) => boolean) {
    const all = columnsOf(set, file);
    const names = Object.keys(all);
    const rows = all[names[0]].map((_, r) => r);
    const kept = keep ? rows.filter((r) => keep(Object.fromEntries(names.map((n) => [n, all[n][r]])))) : rows;
    this.columns = Object.fromEntries(names.map((n) => [n, kept.map((r) => all[n][r])]));
  }
  values(name: string): Float64Array {
    return Float64Array.from(this.columns[name], Number);
  }
  regressor(name: string): Regressor {
    return { name, values: this.values(name) };
  }
  group(name: string): Groups {
    return groupsOf(name, this.values(name));
  }
  sample(outcome: string, covariates: readonly (string | Regressor)[], more: Partial<Sample> = {}): Sample {
    return {
      place: 'test',
      outcome: this.regressor(outcome),
      covariates: covariates.map((x) => (typeof x === 'string' ? this.regressor(x) : x)),
      constant: true,
      effects: [],
      clusters: [],
      errors: 'classical',
      level: 0.95,
      ...more,
    };
  }
}

/** Estimates of a fit in the order of `names`, or as they come. */
export function estimates(fit: Fit, names?: unknown): number[] {
  return inOrder(fit, names).map((term) => term.estimate);
}

export function standardErrors(fit: Fit, names?: unknown): number[] {
  return inOrder(fit, names).map((term) => term.std_error);
}

export function pValues(fit: Fit, names?: unknown): number[] {
  return inOrder(fit, names).map((term) => term.p_value);
}

function inOrder(fit: Fit, names?: unknown): Fit['terms'] {
  if (names === undefined) return fit.terms;
  return (names as string[]).map((name) => {
    const term = fit.terms.find((t) => t.term === name);
    if (!term) throw new Error(`no term ${name} among ${fit.terms.map((t) => t.term).join(', ')}`);
    return term;
  });
}
