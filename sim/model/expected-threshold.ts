/**
 * The choice under the threshold shape by a household that counts on the shock: expected utility.
 *
 *     u(y − k) + δ[μ v(z) + Σ π_m z^(1−η) B(a_m/z)/(1−η)],   E v(zε) = μ v(z) (at σ = 1, v(z) − s²/2)
 *
 * Smooth, with several peaks: each milestone is a hump of width s in log z in the marginal utility. Peaks are the
 * points where φ of planned.ts turns from negative to positive; it is followed on a grid a quarter of s apart near every
 * milestone (s apart farther out), and each crossing is solved to rounding. A pair of crossings inside one cell would be a dent in utility
 * too shallow to decide. "Met" is by the plan, z ≥ a.
 */
import { exp, log } from '../../network/elementary.js';
import { type RealFunction, rootBetween } from './bracket.js';
import type { Choice, Peak } from './choice.js';
import { expectedCrra, expectedLowGrowth } from './expected-gain-loss.js';
import { PartialMoment } from './partial-moment.js';
import { PlannedChoice } from './planned.js';
import { crra } from './preferences.js';
import { childWealthOf, investmentFor } from './technology.js';
import type { Preferences, Technology } from './types.js';

/** Grid around a milestone, in standard deviations of log: beyond it B is straight or zero. */
const REACH = 9;
/** Nearer than this the marginal utility may turn, and the grid is fine. */
const HUMP = 3;
const GRID = 0.25;
/** Coarse points in k between the plan that ignores milestones and all of wealth. */
const COARSE = 24;

export function expectedThresholdChoice(
  technology: Technology,
  sdLog: number,
  preferences: Preferences,
  milestoneWeights: readonly number[],
): Choice {
  return new ExpectedThresholdChoice(technology, sdLog, preferences, milestoneWeights);
}

class ExpectedThresholdChoice implements Choice, RealFunction {
  planned: number;
  met: number;
  investment: number;
  private readonly technology: Technology;
  private readonly s: number;
  private readonly sigma: number;
  private readonly eta: number;
  private readonly pi: Float64Array;
  private readonly mu: number;
  private readonly moment: PartialMoment;
  /** The plan without milestones, which no plan lies below. */
  private readonly bare: PlannedChoice;
  private readonly none: Float64Array;
  private readonly a: Float64Array;
  private readonly grid: Float64Array;
  private y: number;
  private delta: number;
  private peaks: Peak[] | null;

  constructor(technology: Technology, sdLog: number, preferences: Preferences, milestoneWeights: readonly number[]) {
    this.planned = 0.5;
    this.met = 0;
    this.investment = 0.5;
    this.technology = technology;
    this.s = sdLog;
    this.sigma = preferences.curvature;
    this.eta = preferences.milestoneCurvature;
    this.pi = Float64Array.from(milestoneWeights);
    this.mu = exp(-0.5 * this.sigma * (1 - this.sigma) * sdLog * sdLog);
    this.moment = new PartialMoment(sdLog, this.eta);
    this.bare = new PlannedChoice(technology, preferences, []);
    this.none = new Float64Array(0);
    this.a = new Float64Array(milestoneWeights.length);
    this.grid = new Float64Array(COARSE + 1 + milestoneWeights.length * (2 * (REACH / GRID) + 1));
    this.y = 0.5;
    this.delta = 0.5;
    this.peaks = null;
  }

  solve(wealth: number, aspirations: ArrayLike<number>, childWeight: number): void {
    const { a, grid, s } = this;
    const M = a.length;
    this.y = wealth;
    this.delta = childWeight;
    for (let m = 0; m < M; m++) a[m] = aspirations[m];
    this.bare.solve(wealth, this.none, childWeight * this.mu);
    const start = this.bare.investment;
    const zStart = childWealthOf(this.technology, start);
    const zEnd = childWealthOf(this.technology, wealth);
    let size = 0;
    for (let j = 1; j <= COARSE; j++) {
      grid[size++] = childWealthOf(this.technology, start + ((wealth - start) * j) / (COARSE + 1));
    }
    for (let m = 0; m < M; m++) {
      for (let v = -REACH; v <= REACH; v += v >= -HUMP && v < HUMP ? GRID : 1) {
        const z = a[m] * exp(v * s);
        if (z > zStart && z < zEnd) grid[size++] = z;
      }
    }
    grid.subarray(0, size).sort();
    let best = -Infinity;
    // φ is at most rounding above 0 where milestones are ignored: the first crossing may be right there
    let low = start * (1 - 1e-9);
    let atLow = this.at(low);
    for (let g = 0; g <= size; g++) {
      let high: number;
      let atHigh: number;
      if (g < size) {
        high = investmentFor(this.technology, grid[g]);
        atHigh = this.phi(high, grid[g]);
      } else {
        // towards y until φ is positive: at y consumption would be 0
        let rest = (wealth - low) * 0.5;
        high = wealth - rest;
        atHigh = this.at(high);
        while (atHigh < 0 && rest > 1e-15 * wealth) {
          low = high;
          atLow = atHigh;
          rest *= 0.125;
          high = wealth - rest;
          atHigh = this.at(high);
        }
      }
      if (atLow < 0 && atHigh >= 0) {
        const k = rootBetween(this, low, high, atLow, atHigh, 4e-16);
        const z = childWealthOf(this.technology, k);
        const utility = this.utilityAt(wealth - k, z, a, childWeight);
        let met = 0;
        for (let m = 0; m < M; m++) if (z >= a[m]) met++;
        if (this.peaks !== null) this.peaks.push({ z, investment: k, utility, met });
        if (utility >= best) {
          best = utility;
          this.planned = z;
          this.investment = k;
          this.met = met;
        }
      }
      low = high;
      atLow = atHigh;
    }
  }

  /** φ(k) = [δ f′(k) S(f(k))]^(−1/σ) − (y − k), S = μ z^−σ + Σ π z^−η H(a/z): negative while utility rises. */
  at(k: number): number {
    return this.phi(k, childWealthOf(this.technology, k));
  }

  private phi(k: number, z: number): number {
    const { sigma, eta, pi, a, moment, technology } = this;
    const logZ = log(z);
    let s = 0;
    for (let m = 0; m < pi.length; m++) s += pi[m] * moment.slopeAt(a[m] / z);
    const bare = exp(-sigma * logZ);
    s = s * (eta === sigma ? bare : exp(-eta * logZ)) + this.mu * bare;
    let marginal: number;
    if (technology.kind === 'linear') marginal = technology.grossReturn;
    else {
      // f′ from f: α·A·k^α/k and what is kept
      const kept = 1 - technology.depreciation;
      marginal = (technology.elasticity * (z - kept * k)) / k + kept;
    }
    return exp(log(this.delta * marginal * s) / -sigma) - (this.y - k);
  }

  objective(wealth: number, z: number, aspirations: ArrayLike<number>, childWeight: number): number {
    const c = wealth - investmentFor(this.technology, z);
    if (c < -1e-14 * wealth) return -Infinity;
    return this.utilityAt(Math.max(c, 0), z, aspirations, childWeight);
  }

  candidates(wealth: number, aspirations: ArrayLike<number>, childWeight: number): Peak[] {
    const peaks: Peak[] = [];
    this.peaks = peaks;
    this.solve(wealth, aspirations, childWeight);
    this.peaks = null;
    return peaks;
  }

  qStar(): number {
    return NaN;
  }

  lowGrowth(childWeight: number): number {
    return expectedLowGrowth(this.technology, this.sigma, this.mu, childWeight);
  }

  private utilityAt(c: number, z: number, a: ArrayLike<number>, childWeight: number): number {
    const power = 1 - this.eta;
    let bonus = 0;
    for (let m = 0; m < this.pi.length; m++) bonus += this.pi[m] * this.moment.valueAt(a[m] / z);
    const child = expectedCrra(z, this.sigma, this.s, this.mu) + (bonus * exp(power * log(z))) / power;
    return crra(c, this.sigma) + childWeight * child;
  }
}
