/**
 * The choice for the linear technology, one threshold milestone, planned risk and η = σ, by table.
 *
 * Only q = a/y matters and the plan is a growth factor: g_low above the threshold q*, g(q) up to it, where g solves
 * δR[g^(−σ) + π(g−q)^(−σ)] = (1 − g/R)^(−σ). g(q) is smooth on [0, q*]: it is kept as polynomials of degree 5 on equal
 * cells, doubled in number until the relative error against the solver, at points between the nodes, is below 1e−11
 * (1e−9 is demanded). q* itself is solved to rounding. Households whose child weight is not the one tabulated
 * (a spread of δ) go through the solver of planned.ts.
 */
import { exp, log } from '../../network/elementary.js';
import type { Kernel } from '../kernel/kernel.js';
import type { Choice, Peak } from './choice.js';
import { PlannedChoice } from './planned.js';
import type { Preferences, Technology } from './types.js';

const DEGREE = 5;
const STRIDE = DEGREE + 1;

export function growthTableChoice(
  grossReturn: number,
  technology: Technology,
  preferences: Preferences,
  milestoneWeight: number,
): GrowthTableChoice {
  return new GrowthTableChoice(grossReturn, technology, preferences, milestoneWeight);
}

export class GrowthTableChoice implements Choice {
  planned: number;
  met: number;
  investment: number;
  /** δ the table was made for. */
  readonly childWeight: number;
  /** q* at that δ. */
  readonly threshold: number;
  /** g_low at that δ. */
  readonly low: number;
  readonly grossReturn: number;
  /** Polynomial coefficients, lowest first, `stride` a cell, in the position within the cell, 0 … 1. */
  readonly coefficients: Float64Array;
  readonly cells: number;
  /** Solver for child weights that are not tabulated. */
  readonly exact: PlannedChoice;
  private readonly sigma: number;
  private readonly pi: number;
  private readonly one: Float64Array;

  constructor(grossReturn: number, technology: Technology, preferences: Preferences, milestoneWeight: number) {
    this.planned = 0.5;
    this.met = 0;
    this.investment = 0.5;
    this.exact = new PlannedChoice(technology, preferences, [milestoneWeight]);
    this.sigma = preferences.curvature;
    this.pi = milestoneWeight;
    this.grossReturn = grossReturn;
    this.one = new Float64Array(1);
    this.childWeight = preferences.childWeight;
    this.low = this.exact.lowGrowth(this.childWeight);
    this.threshold = this.qStar(this.childWeight);
    let cells = 16;
    let table = this.tabulate(cells);
    while (cells < 1024 && this.tableError(table, cells) > 1e-11) {
      cells *= 2;
      table = this.tabulate(cells);
    }
    this.coefficients = table;
    this.cells = cells;
  }

  solve(wealth: number, aspirations: ArrayLike<number>, childWeight: number): void {
    if (childWeight !== this.childWeight) {
      this.exact.solve(wealth, aspirations, childWeight);
      this.planned = this.exact.planned;
      this.met = this.exact.met;
      this.investment = this.exact.investment;
      return;
    }
    const a = aspirations[0];
    const q = a / wealth;
    if (q > this.threshold) {
      this.planned = this.low * wealth;
      this.met = 0;
    } else {
      // a tiny milestone weight puts the peak within rounding of the aspiration
      this.planned = Math.max(growthAt(this.coefficients, this.cells, this.threshold, Math.max(q, 0)) * wealth, a);
      this.met = 1;
    }
    this.investment = this.planned / this.grossReturn;
  }

  /** Gives the kernel the table, for `chooseByTable` calls that give the same plans as `solve`. */
  prepare(compiled: Kernel): void {
    compiled.growth.set(this.coefficients);
  }

  objective(wealth: number, z: number, aspirations: ArrayLike<number>, childWeight: number): number {
    return this.exact.objective(wealth, z, aspirations, childWeight);
  }

  candidates(wealth: number, aspirations: ArrayLike<number>, childWeight: number): Peak[] {
    return this.exact.candidates(wealth, aspirations, childWeight);
  }

  lowGrowth(childWeight: number): number {
    return this.exact.lowGrowth(childWeight);
  }

  /** Root of the utility gap between meeting the milestone and giving it up, by Newton in a bracket; see choice.ts. */
  qStar(childWeight: number): number {
    const { sigma, pi, grossReturn: R } = this;
    const power = 1 - sigma;
    const g0 = this.exact.lowGrowth(childWeight);
    const giveUp = exp(power * log(1 - g0 / R)) + childWeight * exp(power * log(g0));
    let below = 0;
    let above = R;
    // g_low is within reach at no cost in utility: the milestone is surely met there
    let q = Math.min(g0, 0.999 * R);
    for (let step = 0; step < 200; step++) {
      const g = this.striving(q, childWeight);
      const gap =
        exp(power * log(1 - g / R)) + childWeight * (exp(power * log(g)) + pi * exp(power * log(g - q))) - giveUp;
      if (gap === 0) return q;
      if (gap > 0) below = q;
      else above = q;
      // envelope theorem: only the direct effect of q counts
      let next = q + gap / (power * childWeight * pi * exp(-sigma * log(g - q)));
      if (!(next > below && next < above)) next = 0.5 * (below + above);
      if (Math.abs(next - q) <= 2e-16 * q || next === below || next === above) return next;
      q = next;
    }
    return q;
  }

  /** The upper peak g(q), for 0 ≤ q < R. */
  private striving(q: number, childWeight: number): number {
    this.one[0] = q;
    const peaks = this.exact.candidates(1, this.one, childWeight);
    const top = peaks[peaks.length - 1];
    return top !== undefined && top.met === 1 ? top.z : q;
  }

  private tabulate(cells: number): Float64Array {
    const table = new Float64Array(cells * STRIDE);
    const node = new Float64Array(STRIDE);
    const value = new Float64Array(STRIDE);
    for (let cell = 0; cell < cells; cell++) {
      for (let j = 0; j < STRIDE; j++) {
        node[j] = NODES[j];
        value[j] = this.striving((this.threshold * (cell + NODES[j])) / cells, this.childWeight);
      }
      interpolate(node, value, table.subarray(cell * STRIDE, (cell + 1) * STRIDE));
    }
    return table;
  }

  private tableError(table: Float64Array, cells: number): number {
    let worst = 0;
    for (let cell = 0; cell < cells; cell++) {
      for (let j = 0; j < 3; j++) {
        const q = (this.threshold * (cell + 0.02 + 0.48 * j)) / cells;
        const g = this.striving(q, this.childWeight);
        worst = Math.max(worst, Math.abs(growthAt(table, cells, this.threshold, q) / g - 1));
      }
    }
    return worst;
  }
}

/** Chebyshev nodes of degree 5 on [0, 1]: (1 − cos((2j+1)π/12))/2. */
const NODES = [
  0.01703708685546585, 0.1464466094067262, 0.3705904774487396, 0.6294095225512604, 0.8535533905932737,
  0.9829629131445341,
];

/** Monomial coefficients of the polynomial through (node, value), by Newton's divided differences. */
function interpolate(node: Float64Array, value: Float64Array, out: Float64Array): void {
  const n = node.length;
  for (let order = 1; order < n; order++) {
    for (let j = n - 1; j >= order; j--) value[j] = (value[j] - value[j - 1]) / (node[j] - node[j - order]);
  }
  out.fill(0);
  out[0] = value[n - 1];
  for (let j = n - 2; j >= 0; j--) {
    for (let p = n - 1; p > 0; p--) out[p] = out[p - 1] - node[j] * out[p];
    out[0] = value[j] - node[j] * out[0];
  }
}

/** g(q) from a table, for 0 ≤ q ≤ threshold. */
export function growthAt(coefficients: Float64Array, cells: number, threshold: number, q: number): number {
  const position = (q / threshold) * cells;
  let cell = position | 0;
  if (cell >= cells) cell = cells - 1;
  const x = position - cell;
  const at = cell * STRIDE;
  return (
    coefficients[at] +
    x *
      (coefficients[at + 1] +
        x * (coefficients[at + 2] + x * (coefficients[at + 3] + x * (coefficients[at + 4] + x * coefficients[at + 5]))))
  );
}
