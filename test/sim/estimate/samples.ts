/** Seeded samples for the regression tests. */
import seedrandom from 'seedrandom';
import type { Regressor, Sample } from '../../../sim/estimate/fit.js';
import { type Groups, groupsOf } from '../../../sim/estimate/groups.js';

export interface Luck {
  uniform(): number;
  normal(): number;
  below(n: number): number;
}

export function luck(seed: string): Luck {
  const uniform = seedrandom(seed);
  return {
    uniform,
    // Box–Muller
    normal: () => Math.sqrt(-2 * Math.log(1 - uniform())) * Math.cos(2 * Math.PI * uniform()),
    below: (n) => Math.floor(uniform() * n),
  };
}

export function column(name: string, n: number, value: (i: number) => number): Regressor {
  const values = new Float64Array(n);
  for (let i = 0; i < n; i++) values[i] = value(i);
  return { name, values };
}

export function grouping(name: string, n: number, value: (i: number) => number): Groups {
  return groupsOf(name, column(name, n, value).values);
}

export function sample(outcome: Regressor, covariates: readonly Regressor[], more: Partial<Sample> = {}): Sample {
  return {
    place: 'test',
    outcome,
    covariates,
    constant: true,
    effects: [],
    clusters: [],
    errors: 'classical',
    level: 0.95,
    ...more,
  };
}

/** Copies, because kernels demean in place. */
export function copy(s: Sample): Sample {
  const again = (x: Regressor): Regressor => ({ name: x.name, values: x.values.slice() });
  return {
    ...s,
    outcome: again(s.outcome),
    covariates: s.covariates.map(again),
    ...(s.endogenous ? { endogenous: s.endogenous.map(again) } : {}),
    ...(s.instruments ? { instruments: s.instruments.map(again) } : {}),
  };
}

/** 0/1 columns of every group but the first. */
export function dummies(g: Groups): Regressor[] {
  return Array.from({ length: g.count - 1 }, (_, c) =>
    column(`${g.name}=${c + 1}`, g.codes.length, (i) => (g.codes[i] === c + 1 ? 1 : 0)),
  );
}
