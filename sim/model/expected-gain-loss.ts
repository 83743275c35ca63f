/**
 * The choice under the gain-loss shape by a household that counts on the shock: expected utility in closed form.
 *
 * E b = λ·E[v(zε) − v(a)] − (λ−1)·E[(v(zε) − v(a))_+], and the last is a lognormal partial moment. Each state's utility is
 * concave in z, so the objective is and has one peak. "Met" is by the plan, z ≥ a.
 */
import { exp, log } from '../../network/elementary.js';
import { normalCdf, normalDensity } from '../random/normal.js';
import { type RealFunction, rootBetween } from './bracket.js';
import type { Choice, Peak } from './choice.js';
import { crra } from './preferences.js';
import { childWealthOf, investmentFor, marginalReturn } from './technology.js';
import type { Preferences, Technology } from './types.js';

export function expectedGainLossChoice(
  technology: Technology,
  sdLog: number,
  preferences: Preferences,
  milestoneWeights: readonly number[],
): Choice {
  return new ExpectedGainLossChoice(technology, sdLog, preferences, milestoneWeights);
}

class ExpectedGainLossChoice implements Choice, RealFunction {
  planned: number;
  met: number;
  investment: number;
  private readonly technology: Technology;
  private readonly s: number;
  private readonly sigma: number;
  private readonly lambda: number;
  private readonly pi: Float64Array;
  /** E ε^(1−σ). */
  private readonly mu: number;
  private readonly logA: Float64Array;
  private readonly a: Float64Array;
  private y: number;
  private delta: number;

  constructor(technology: Technology, sdLog: number, preferences: Preferences, milestoneWeights: readonly number[]) {
    this.planned = 0.5;
    this.met = 0;
    this.investment = 0.5;
    this.technology = technology;
    this.s = sdLog;
    this.sigma = preferences.curvature;
    this.lambda = preferences.lossAversion;
    this.pi = Float64Array.from(milestoneWeights);
    this.mu = exp(-0.5 * this.sigma * (1 - this.sigma) * sdLog * sdLog);
    this.logA = new Float64Array(milestoneWeights.length);
    this.a = new Float64Array(milestoneWeights.length);
    this.y = 0.5;
    this.delta = 0.5;
  }

  solve(wealth: number, aspirations: ArrayLike<number>, childWeight: number): void {
    const M = this.pi.length;
    this.y = wealth;
    this.delta = childWeight;
    for (let m = 0; m < M; m++) {
      this.a[m] = aspirations[m];
      this.logA[m] = log(aspirations[m]);
    }
    // shrink towards 0 until utility still rises: at 0 the slope is +∞
    let low = 0.5 * wealth;
    let atLow = this.at(low);
    let high = wealth;
    let atHigh = Infinity;
    while (atLow >= 0) {
      high = low;
      atHigh = atLow;
      low *= 0.125;
      atLow = this.at(low);
    }
    // and towards y until it falls: at y consumption would be 0
    let rest = wealth - low;
    while (atHigh === Infinity) {
      rest *= 0.125;
      const k = wealth - rest;
      if (k === wealth) break;
      const value = this.at(k);
      if (value < 0) {
        low = k;
        atLow = value;
      } else {
        high = k;
        atHigh = value;
      }
    }
    const k = atHigh === Infinity ? low : rootBetween(this, low, high, atLow, atHigh, 4e-16);
    this.investment = k;
    this.planned = childWealthOf(this.technology, k);
    this.met = 0;
    for (let m = 0; m < M; m++) if (this.planned >= aspirations[m]) this.met++;
  }

  /** [δ f′(k) S(f(k))]^(−1/σ) − (y − k): negative while expected utility rises in k. */
  at(k: number): number {
    const { s, sigma, lambda, pi, logA } = this;
    const z = childWealthOf(this.technology, k);
    const logZ = log(z);
    let factor = 1;
    for (let m = 0; m < pi.length; m++) {
      const d = (logZ - logA[m]) / s + (0.5 - sigma) * s;
      factor += pi[m] * (lambda - (lambda - 1) * normalCdf(d));
    }
    const marginal = this.delta * marginalReturn(this.technology, k) * this.mu * factor;
    return exp((log(marginal) - sigma * logZ) / -sigma) - (this.y - k);
  }

  objective(wealth: number, z: number, aspirations: ArrayLike<number>, childWeight: number): number {
    const k = investmentFor(this.technology, z);
    const c = wealth - k;
    if (c < -1e-14 * wealth) return -Infinity;
    const { s, sigma, lambda, pi, mu } = this;
    const mean = expectedCrra(z, sigma, s, mu);
    let value = mean;
    for (let m = 0; m < pi.length; m++) {
      const a = aspirations[m];
      const d = log(z / a) / s - 0.5 * s;
      const va = crra(a, sigma);
      const above =
        sigma === 1
          ? s * (d * normalCdf(d) + normalDensity(d))
          : mu * crra(z, sigma) * normalCdf(d + (1 - sigma) * s) - va * normalCdf(d);
      value += pi[m] * (lambda * (mean - va) - (lambda - 1) * above);
    }
    return crra(Math.max(c, 0), sigma) + childWeight * value;
  }

  candidates(wealth: number, aspirations: ArrayLike<number>, childWeight: number): Peak[] {
    this.solve(wealth, aspirations, childWeight);
    const { planned, investment, met } = this;
    return [{ z: planned, investment, met, utility: this.objective(wealth, planned, aspirations, childWeight) }];
  }

  qStar(): number {
    return NaN;
  }

  lowGrowth(childWeight: number): number {
    return expectedLowGrowth(this.technology, this.sigma, this.mu, childWeight);
  }
}

/** E v(zε), with μ = E ε^(1−σ). */
export function expectedCrra(z: number, sigma: number, s: number, mu: number): number {
  return sigma === 1 ? log(z) - 0.5 * s * s : mu * crra(z, sigma);
}

/** g_low when v is weighted by μ; NaN unless the technology is linear. */
export function expectedLowGrowth(technology: Technology, sigma: number, mu: number, childWeight: number): number {
  if (technology.kind !== 'linear') return NaN;
  const kappa = exp(log(childWeight * mu * technology.grossReturn) / sigma);
  return kappa / (1 + kappa / technology.grossReturn);
}
