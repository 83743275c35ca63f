/**
 * Inequality and polarisation of named distributions against closed forms (confirmed by 30-digit quadrature).
 *
 * Each distribution is handed to the measures as a weighted sample at the nodes of a trapezoid rule in a variable in
 * which the density dies off on both sides at least exponentially: means over it are then exact to rounding. Measures
 * of order (Gini, polarisation) carry the rule's error in the cumulative share, of order h², so they are extrapolated
 * from steps h and h/2; what is left is below the tolerances of the set.
 */
import { describe, test } from 'vitest';
import { polarisationAtDensity } from '../../sim/measure/duclos-esteban-ray.js';
import { ratioMeasures, generalisedEntropy2 } from '../../sim/measure/entropy.js';
import { gini } from '../../sim/measure/gini.js';
import { lorenz } from '../../sim/measure/lorenz.js';
import { median } from '../../sim/measure/quantile.js';
import { type Sample, sampleOf } from '../../sim/measure/sample.js';
import { type Check, checksOf, expectMatch } from './expected.js';

/** x(t), density of x there, and dx/dt, for t in [from, to]. */
interface Family {
  readonly from: number;
  readonly to: number;
  readonly at: (t: number) => readonly [x: number, density: number, slope: number];
}

const lognormal = (s: number, meanOne = false): Family => ({
  from: -15,
  to: 17,
  at: (z) => {
    const x = Math.exp(s * z - (meanOne ? (s * s) / 2 : 0));
    return [x, Math.exp((-z * z) / 2) / (s * x * Math.sqrt(2 * Math.PI)), s * x];
  },
});

/** A positive variable u = exp(t − e^(−t)), which approaches 0 double-exponentially. */
const halfLine = (t: number): [number, number] => {
  const u = Math.exp(t - Math.exp(-t));
  return [u, u * (1 + Math.exp(-t))];
};

const pareto = (a: number, meanOne = false): Family => ({
  from: -4,
  to: 6,
  at: (t) => {
    const [u, du] = halfLine(t);
    const x = (meanOne ? (a - 1) / a : 1) * Math.exp(u);
    return [x, (a * Math.exp(-a * u)) / x, x * du];
  },
});

const weibull = (k: number): Family => ({
  from: -4,
  to: 5,
  at: (t) => {
    const [u, du] = halfLine(t);
    const x = u ** (1 / k);
    const slope = ((x / u) * du) / k;
    return [x, (Math.exp(-u) * du) / slope, slope];
  },
});

/** Density up to its constant: the weights are made to sum to 1. */
const gamma = (k: number): Family => ({
  from: -5,
  to: 5,
  at: (t) => {
    const [u, du] = halfLine(t);
    return [u, u ** (k - 1) * Math.exp(-u), du];
  },
});

const uniform: Family = {
  from: -4,
  to: 4,
  at: (t) => {
    const x = 1 / (1 + Math.exp(-2 * Math.sinh(t)));
    return [x, 1, x * (1 - x) * 2 * Math.cosh(t)];
  },
};

const normal = (s: number): Family => ({
  from: -12,
  to: 12,
  at: (z) => [s * z, Math.exp((-z * z) / 2) / (s * Math.sqrt(2 * Math.PI)), s],
});

function nodes({ from, to, at }: Family, intervals: number): { sample: Sample; density: Float64Array } {
  const step = (to - from) / intervals;
  const x: number[] = [];
  const f: number[] = [];
  const w: number[] = [];
  for (let k = 0; k <= intervals; k++) {
    const [value, density, slope] = at(from + k * step);
    const weight = density * slope;
    // below any tolerance here, and where x itself may have overflowed
    if (!(weight > 1e-300) || !(value < 1e150)) continue;
    x.push(value);
    f.push(density);
    w.push(weight);
  }
  const total = w.reduce((s, v) => s + v, 0);
  return { sample: sampleOf(x, { weights: w.map((v) => v / total) }), density: Float64Array.from(f) };
}

/** Removes the h² term of a measure of order. */
function extrapolated(family: Family, measure: (n: ReturnType<typeof nodes>) => number[]): number[] {
  const coarse = measure(nodes(family, 20_000));
  const fine = measure(nodes(family, 40_000));
  return fine.map((v, k) => v + (v - coarse[k]) / 3);
}

const families: [RegExp, (parameter: number) => Family][] = [
  [/^lognormal_s/, lognormal],
  [/^pareto_a/, pareto],
  [/^weibull_k/, weibull],
  [/^gamma_k/, gamma],
  [/^uniform01$/, () => uniform],
];

const polarised: [RegExp, (parameter: number) => Family][] = [
  [/^der_uniform01$/, () => uniform],
  [/^der_normal_s/, normal],
  [/^der_exponential$/, () => weibull(1)],
  [/^der_pareto_a/, (a) => pareto(a, true)],
  [/^der_lognormal_s/, (s) => lognormal(s, true)],
];

function familyOf(name: string, list: typeof families): Family {
  for (const [pattern, make] of list) if (pattern.test(name)) return make(Number(name.replace(pattern, '')));
  throw new Error(`no distribution for ${name}`);
}

/** Lorenz ordinates join the nodes by straight lines: at this many a unit of t less than 1e-11 of the total is left. */
const PER_UNIT = 25_000;

const measures: Record<string, (family: Family, check: Check) => unknown> = {
  gini: (family) => extrapolated(family, ({ sample }) => [gini(sample)])[0],
  theil_T: (family) => ratioMeasures(nodes(family, 4000).sample).theilT,
  theil_L: (family) => ratioMeasures(nodes(family, 4000).sample).theilL,
  ge2: (family) => generalisedEntropy2(nodes(family, 4000).sample),
  atkinson: (family) => {
    const { atkinsonHalf, atkinson1, atkinson2 } = ratioMeasures(nodes(family, 4000).sample);
    return [atkinsonHalf, atkinson1, atkinson2];
  },
  lorenz: (family, check) => lorenz(nodes(family, PER_UNIT * (family.to - family.from)).sample, check.at as number[]),
  mean_over_median: (family) => {
    const { sample } = nodes(family, 4000);
    return sample.mean / median(sample);
  },
};

describe('ineq-closedform', () => {
  for (const [id, check] of Object.entries(checksOf('ineq-closedform'))) {
    test(id, () => {
      if (id.startsWith('der_')) {
        const alphas = (check.alphas as number[] | undefined) ?? [0, 0.25, 0.5, 0.75, 1];
        const values = extrapolated(familyOf(id, polarised), ({ sample, density }) =>
          alphas.map((alpha) => polarisationAtDensity(sample, density, alpha)),
        );
        expectMatch(values, check, id);
        return;
      }
      const dot = id.lastIndexOf('.');
      const measure = measures[id.slice(dot + 1)];
      expectMatch(measure(familyOf(id.slice(0, dot), families), check), check, id);
    });
  }
});
