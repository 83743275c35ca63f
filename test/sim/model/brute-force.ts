/**
 * The household's problem solved in another way than the engine does: in z rather than k, by a dense grid on the utility
 * itself, then bisection on its derivative; expectations by Simpson's rule on a substituted integral; platform
 * exp, log and pow. Slow and plain on purpose.
 */
import type { Preferences, Shock, Technology } from '../../../sim/model/types.js';

export interface Problem {
  readonly technology: Technology;
  readonly shock: Shock;
  readonly preferences: Preferences;
  readonly weights: readonly number[];
  readonly wealth: number;
  readonly aspirations: readonly number[];
  readonly childWeight: number;
}

export function output(technology: Technology, k: number): number {
  return technology.kind === 'linear'
    ? technology.grossReturn * k
    : technology.scale * Math.pow(k, technology.elasticity) + (1 - technology.depreciation) * k;
}

/** k with f(k) = z by bisection on the logarithm, to the last bit. */
export function input(technology: Technology, z: number, most: number): number {
  if (technology.kind === 'linear') return z / technology.grossReturn;
  let low = 0;
  let high = most * 1.0000001;
  for (let step = 0; step < 200; step++) {
    const middle = 0.5 * (low + high);
    if (middle === low || middle === high) break;
    if (output(technology, middle) < z) low = middle;
    else high = middle;
  }
  return 0.5 * (low + high);
}

function crra(x: number, sigma: number): number {
  return sigma === 1 ? Math.log(x) : Math.pow(x, 1 - sigma) / (1 - sigma);
}

/** Simpson nodes of a standard normal on ±9.5, for expectations of smooth functions. */
function expectation(s: number, g: (eps: number) => number, from = -9.5): number {
  const cells = 400;
  const h = (9.5 + 2 * s + 0 - from) / cells;
  let sum = 0;
  for (let j = 0; j <= cells; j++) {
    const x = from + j * h;
    const w = j === 0 || j === cells ? 1 : j % 2 === 1 ? 4 : 2;
    sum += w * g(Math.exp(s * x - 0.5 * s * s)) * Math.exp(-0.5 * x * x);
  }
  return (sum * h) / 3 / Math.sqrt(2 * Math.PI);
}

/** E[g(ε)·(zε − a)_+^power] for power > −1: the substitution zε − a = t^p leaves no singularity at t = 0. */
function truncated(s: number, z: number, a: number, power: number, tilt: number): number {
  const p = Math.max(4, 4 / (1 + power));
  const most = z * Math.exp(s * (9.5 + 2 * s) - 0.5 * s * s) - a;
  if (most <= 0) return 0;
  const end = Math.pow(most, 1 / p);
  // the density may sit in a small part of the range: start where it does
  const least = z * Math.exp(-9.5 * s - 0.5 * s * s) - a;
  const from = least > 0 ? Math.pow(least, 1 / p) : 0;
  const cells = 1000;
  const h = (end - from) / cells;
  let sum = 0;
  for (let j = 0; j <= cells; j++) {
    const t = from + j * h;
    const eps = (a + Math.pow(t, p)) / z;
    const x = (Math.log(eps) + 0.5 * s * s) / s;
    const density = Math.exp(-0.5 * x * x) / (Math.sqrt(2 * Math.PI) * s * eps);
    const body = t === 0 ? (p * (1 + power) - 1 > 0 ? 0 : p) : p * Math.pow(t, p * (1 + power) - 1);
    const w = j === 0 || j === cells ? 1 : j % 2 === 1 ? 4 : 2;
    sum += (w * body * density * Math.pow(eps, tilt)) / z;
  }
  return (sum * h) / 3;
}

/** U(z). */
export function utility(problem: Problem, z: number): number {
  const { technology, preferences, shock, weights, aspirations, wealth, childWeight } = problem;
  const { curvature: sigma, milestoneCurvature: eta, lossAversion: lambda } = preferences;
  const c = wealth - input(technology, z, wealth);
  const risky = shock.risk === 'expected' && shock.sdLog > 0;
  const s = shock.sdLog;
  let value = risky ? expectation(s, (eps) => crra(z * eps, sigma)) : crra(z, sigma);
  weights.forEach((pi, m) => {
    const a = aspirations[m];
    if (preferences.milestoneShape === 'threshold') {
      if (risky) value += (pi * truncated(s, z, a, 1 - eta, 0)) / (1 - eta);
      else if (z > a) value += (pi * Math.pow(z - a, 1 - eta)) / (1 - eta);
    } else if (risky) {
      // two smooth pieces, so that the kink is at an end of each
      const cut = (Math.log(a / z) + 0.5 * s * s) / s;
      const mean = expectation(s, (eps) => crra(z * eps, sigma) - crra(a, sigma));
      const gain = cut > 9 ? 0 : expectation(s, (eps) => crra(z * eps, sigma) - crra(a, sigma), Math.max(cut, -9.5));
      value += pi * (lambda * mean - (lambda - 1) * gain);
    } else {
      const gain = crra(z, sigma) - crra(a, sigma);
      value += pi * (gain >= 0 ? gain : lambda * gain);
    }
  });
  return crra(Math.max(c, 0), sigma) + childWeight * value;
}

/** Sign-carrying U′(z) between kinks; `side` says which side of a milestone counts when z is on it. */
export function marginal(problem: Problem, z: number, side: -1 | 1): number {
  const { technology, preferences, shock, weights, aspirations, wealth, childWeight } = problem;
  const { curvature: sigma, milestoneCurvature: eta, lossAversion: lambda } = preferences;
  const k = input(technology, z, wealth);
  const slope =
    technology.kind === 'linear'
      ? technology.grossReturn
      : technology.scale * technology.elasticity * Math.pow(k, technology.elasticity - 1) + 1 - technology.depreciation;
  const risky = shock.risk === 'expected' && shock.sdLog > 0;
  const s = shock.sdLog;
  const mu = risky ? Math.exp(-0.5 * sigma * (1 - sigma) * s * s) : 1;
  let value = mu * Math.pow(z, -sigma);
  weights.forEach((pi, m) => {
    const a = aspirations[m];
    const above = z > a || (z === a && side === 1);
    if (preferences.milestoneShape === 'threshold') {
      if (risky) value += pi * truncated(s, z, a, -eta, 1);
      else if (above) value += pi * Math.pow(z - a, -eta);
    } else if (risky) {
      const cut = (Math.log(a / z) + 0.5 * s * s) / s;
      const up = cut > 9 ? 0 : expectation(s, (eps) => Math.pow(eps, 1 - sigma), Math.max(cut, -9.5));
      value += pi * Math.pow(z, -sigma) * (lambda * mu - (lambda - 1) * up);
    } else value += pi * (above ? 1 : lambda) * Math.pow(z, -sigma);
  });
  return childWeight * value - Math.pow(Math.max(wealth - k, 0), -sigma) / slope;
}

/** The best z, and the best utility among plans on the other side of the met/unmet decision for each milestone count. */
export function solveByBruteForce(problem: Problem, gridSize: number): { z: number; utility: number } {
  const { technology, wealth, aspirations, shock } = problem;
  const most = output(technology, wealth);
  const points: number[] = [];
  for (let j = 1; j < gridSize; j++) points.push((most * j) / gridSize);
  const s = shock.risk === 'expected' ? shock.sdLog : 0;
  for (const a of aspirations) {
    if (a < most) points.push(a);
    // just above a threshold the peak may be close by, and under risk the hump is as wide as s
    for (let e = -30; e < 0; e++) points.push(a * (1 + 2 ** e));
    for (let v = -40; s > 0 && v <= 40; v++) points.push(a * Math.exp((s * v) / 8));
  }
  for (let e = 1; e < 60; e++) points.push((most / gridSize) * 2 ** -e, most * (1 - 2 ** -e / gridSize));
  const sorted = points.filter((z) => z > 0 && z < most).sort((p, q) => p - q);
  let best = { z: Number.NaN, utility: -Infinity };
  const consider = (z: number): void => {
    const u = utility(problem, z);
    if (u >= best.utility) best = { z, utility: u };
  };
  for (let j = 0; j + 1 < sorted.length; j++) {
    let low = sorted[j];
    let high = sorted[j + 1];
    const atLow = marginal(problem, low, 1);
    const atHigh = marginal(problem, high, -1);
    if (atLow > 0 && atHigh <= 0) {
      for (let step = 0; step < 100; step++) {
        const middle = 0.5 * (low + high);
        if (middle === low || middle === high) break;
        if (marginal(problem, middle, 1) > 0) low = middle;
        else high = middle;
      }
      consider(0.5 * (low + high));
    } else if (atHigh > 0 && marginal(problem, high, 1) <= 0) consider(high);
  }
  return best;
}
