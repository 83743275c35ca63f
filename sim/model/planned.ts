/**
 * The choice of a household that plans as if there were no shock, for any technology, shape and number of milestones.
 *
 * Between two neighbouring milestones the objective is strictly concave in k, so each segment has at most one interior
 * peak. Threshold shape: slope just above a milestone is +∞, the best of the segments' peaks wins. Gain-loss shape:
 * concave throughout, so the one peak is interior or at a kink. The first-order condition is solved as
 *
 *     φ(k) = [δ·f′(k)·S(f(k))]^(−1/σ) − (y − k) = 0,   S(z) = z^−σ + Σ_met π_m (z − a_m)^−η,
 *
 * because φ rises and is nearly straight (exactly so with no milestone and linear f; concave with η = σ, a CES form), by
 * Halley's method (Newton's with the second derivative, which costs no further power) kept inside a bracket.
 */
import { exp, log } from '../../network/elementary.js';
import type { Kernel } from '../kernel/kernel.js';
import type { Choice, Peak } from './choice.js';
import { crra, milestoneUtility } from './preferences.js';
import { childWealthOf, investmentFor } from './technology.js';
import type { Preferences, Technology } from './types.js';

/** Share of wealth so small that no household would plan to invest it. */
const NEGLIGIBLE = 1e-200;

export function plannedChoice(
  technology: Technology,
  preferences: Preferences,
  milestoneWeights: readonly number[],
): PlannedChoice {
  return new PlannedChoice(technology, preferences, milestoneWeights);
}

export class PlannedChoice implements Choice {
  planned: number;
  met: number;
  investment: number;
  private readonly technology: Technology;
  private readonly preferences: Preferences;
  private readonly weights: Float64Array;
  private readonly linear: boolean;
  private readonly threshold: boolean;
  private readonly sigma: number;
  private readonly eta: number;
  private readonly lambda: number;
  /** A, α and 1 − d of the concave technology; R, 1 and 0 of the linear. */
  private readonly scale: number;
  private readonly alpha: number;
  private readonly kept: number;
  /** Aspirations ascending, with their weights. */
  private readonly a: Float64Array;
  private readonly pi: Float64Array;
  /** φ′ and φ″ of the last evaluation. */
  private slope: number;
  private curvature: number;
  private peaks: Peak[] | null;

  constructor(technology: Technology, preferences: Preferences, milestoneWeights: readonly number[]) {
    this.planned = 0.5;
    this.met = 0;
    this.investment = 0.5;
    this.technology = technology;
    this.preferences = preferences;
    this.weights = Float64Array.from(milestoneWeights);
    this.linear = technology.kind === 'linear';
    this.threshold = preferences.milestoneShape === 'threshold';
    this.sigma = preferences.curvature;
    this.eta = preferences.milestoneCurvature;
    this.lambda = preferences.lossAversion;
    this.scale = technology.kind === 'linear' ? technology.grossReturn : technology.scale;
    this.alpha = technology.kind === 'linear' ? 1 : technology.elasticity;
    this.kept = technology.kind === 'linear' ? 0 : 1 - technology.depreciation;
    this.a = new Float64Array(milestoneWeights.length);
    this.pi = new Float64Array(milestoneWeights.length);
    this.slope = 0.5;
    this.curvature = 0.5;
    this.peaks = null;
  }

  solve(wealth: number, aspirations: ArrayLike<number>, childWeight: number): void {
    this.sort(aspirations);
    if (this.threshold) this.solveThreshold(wealth, childWeight);
    else this.solveGainLoss(wealth, childWeight);
  }

  /** Tells the kernel this problem, for `choose` calls that give the same plans as `solve`. */
  prepare(compiled: Kernel): void {
    compiled.weights.set(this.weights);
    compiled.call.setProblem(
      this.linear ? 1 : 0,
      this.threshold ? 1 : 0,
      this.scale,
      this.alpha,
      this.kept,
      this.sigma,
      this.eta,
      this.lambda,
      this.weights.length,
    );
  }

  objective(wealth: number, z: number, aspirations: ArrayLike<number>, childWeight: number): number {
    const k = investmentFor(this.technology, z);
    // z = f(y) may come back a place or two above y
    const c = wealth - k;
    if (c < -1e-14 * wealth) return -Infinity;
    let value = crra(z, this.sigma);
    for (let m = 0; m < this.weights.length; m++) {
      value += this.weights[m] * milestoneUtility(this.preferences, z, aspirations[m]);
    }
    return crra(Math.max(c, 0), this.sigma) + childWeight * value;
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
    if (!this.linear) return NaN;
    const kappa = exp(log(childWeight * this.scale) / this.sigma);
    return kappa / (1 + kappa / this.scale);
  }

  private sort(aspirations: ArrayLike<number>): void {
    const { a, pi, weights } = this;
    for (let m = 0; m < weights.length; m++) {
      const value = aspirations[m];
      let at = m;
      while (at > 0 && a[at - 1] > value) {
        a[at] = a[at - 1];
        pi[at] = pi[at - 1];
        at--;
      }
      a[at] = value;
      pi[at] = weights[m];
    }
  }

  private solveThreshold(y: number, delta: number): void {
    const { a } = this;
    const M = a.length;
    const reach = this.childWealth(y);
    let best = -Infinity;
    let kLow = 0;
    for (let j = 0; j <= M; j++) {
      const lower = j > 0 ? a[j - 1] : 0;
      const upper = j < M ? a[j] : Infinity;
      if (lower >= reach) break;
      if (!(upper > lower) || upper <= 0) continue;
      let kHigh = y;
      let atHigh = 0;
      if (upper < reach) {
        kHigh = this.linear ? upper / this.scale : investmentFor(this.technology, upper);
        // so far down that powers would underflow: met by any plan
        if (!(kHigh > NEGLIGIBLE * y)) continue;
        // still rising at the next milestone: what lies beyond it is better
        atHigh = this.evaluate(kHigh, upper, y, delta, j);
        if (atHigh < 0) {
          kLow = kHigh;
          continue;
        }
      }
      // a milestone of weight 0 adds no slope, so the peak of this segment may lie below it
      const bare = kLow > 0 && this.pi[j - 1] === 0;
      if (!bare || this.evaluate(kLow, lower, y, delta, j) < 0) {
        const k = this.root(kLow, kHigh, atHigh, y, delta, j);
        let z = this.childWealth(k);
        if (z < lower) z = lower;
        let met = j;
        if (z >= upper) {
          z = upper;
          while (met < M && a[met] <= z) met++;
        }
        const utility = this.utilityAt(y - k, z, delta, j);
        if (this.peaks !== null) this.peaks.push({ z, investment: k, utility, met });
        if (utility >= best) {
          best = utility;
          this.planned = z;
          this.investment = k;
          this.met = met;
        }
      }
      kLow = kHigh;
    }
  }

  private solveGainLoss(y: number, delta: number): void {
    const { a, pi } = this;
    const M = a.length;
    const reach = this.childWealth(y);
    let kLow = 0;
    // utility differences count λ-fold below a milestone: as if the child weight fell at each one met
    for (let j = 0; j <= M; j++) {
      const lower = j > 0 ? a[j - 1] : 0;
      const upper = j < M ? a[j] : Infinity;
      if (j < M && upper <= 0) continue;
      let factor = 1;
      for (let m = 0; m < M; m++) factor += m < j ? pi[m] : this.lambda * pi[m];
      const weight = delta * factor;
      let kHigh = y;
      let atHigh = 0;
      if (upper < reach) {
        kHigh = this.linear ? upper / this.scale : investmentFor(this.technology, upper);
        if (!(kHigh > NEGLIGIBLE * y)) continue;
        atHigh = this.evaluate(kHigh, upper, y, weight, 0);
        if (atHigh < 0) {
          kLow = kHigh;
          continue;
        }
      }
      let k: number;
      let z: number;
      if (kLow > 0 && this.evaluate(kLow, lower, y, weight, 0) >= 0) {
        k = kLow;
        z = lower;
      } else {
        k = this.root(kLow, kHigh, atHigh, y, weight, 0);
        z = this.childWealth(k);
        if (z < lower) z = lower;
        if (z > upper) z = upper;
      }
      let met = 0;
      while (met < M && a[met] <= z) met++;
      this.planned = z;
      this.investment = k;
      this.met = met;
      if (this.peaks !== null) {
        this.peaks.push({ z, investment: k, utility: this.gainLossUtility(y - k, z, delta), met });
      }
      return;
    }
  }

  private childWealth(k: number): number {
    return this.linear ? this.scale * k : childWealthOf(this.technology, k);
  }

  private utilityAt(c: number, z: number, delta: number, met: number): number {
    let value = crra(z, this.sigma);
    const power = 1 - this.eta;
    for (let m = 0; m < met; m++) {
      const above = z - this.a[m];
      if (above > 0) value += (this.pi[m] * exp(power * log(above))) / power;
    }
    return crra(c, this.sigma) + delta * value;
  }

  private gainLossUtility(c: number, z: number, delta: number): number {
    let value = crra(z, this.sigma);
    for (let m = 0; m < this.a.length; m++) value += this.pi[m] * milestoneUtility(this.preferences, z, this.a[m]);
    return crra(c, this.sigma) + delta * value;
  }

  /**
   * φ(k) with the lowest `met` milestones met; leaves φ′(k) and φ″(k) in `slope` and `curvature`. `z` is f(k), passed in
   * where it is known exactly.
   */
  private evaluate(k: number, z: number, y: number, delta: number, met: number): number {
    const { sigma, eta, a, pi } = this;
    let marginal = this.scale;
    // f″/f′ and its derivative
    let bend = 0;
    let bendSlope = 0;
    if (!this.linear) {
      const power = (this.alpha * (z - this.kept * k)) / k;
      marginal = power + this.kept;
      bend = ((this.alpha - 1) * power) / (k * marginal);
      bendSlope = bend * ((this.alpha - 2) / k - bend);
    }
    // S, −S′ and S″
    let s = exp(-sigma * log(z));
    let fall = (sigma * s) / z;
    let fall2 = ((sigma + 1) * fall) / z;
    for (let m = 0; m < met; m++) {
      const above = z - a[m];
      if (!(above > 0)) {
        if (pi[m] === 0) continue;
        this.slope = Infinity;
        this.curvature = 0;
        return k - y;
      }
      const term = pi[m] * exp(-eta * log(above));
      const first = (eta * term) / above;
      s += term;
      fall += first;
      fall2 += ((eta + 1) * first) / above;
    }
    const p = exp(log(delta * marginal * s) / -sigma);
    const drop = (marginal * fall) / s;
    // first and second derivative of ln p
    const l = (drop - bend) / sigma;
    const l2 = (drop * (drop + bend) - (marginal * marginal * fall2) / s - bendSlope) / sigma;
    this.slope = 1 + p * l;
    this.curvature = p * (l * l + l2);
    return p - (y - k);
  }

  /**
   * The root of φ in (low, high), where φ(low) < 0 ≤ φ(high); `atHigh` is φ(high), 0 if not known. Halley's method in a
   * bracket.
   */
  private root(low: number, high: number, atHigh: number, y: number, delta: number, met: number): number {
    const from = low;
    let k = this.start(low, high, atHigh, y, delta, met);
    let lastMove = high - low;
    for (let step = 0; step < 200; step++) {
      const value = this.evaluate(k, this.childWealth(k), y, delta, met);
      if (value === 0) return k;
      if (value < 0) low = k;
      else high = k;
      let move = -value / this.slope;
      const bendBy = 1 - (0.5 * value * this.curvature) / (this.slope * this.slope);
      if (bendBy > 0.2 && bendBy < 5) move /= bendBy;
      let next = k + move;
      let size = move < 0 ? -move : move;
      // convergence is cubic: what a step of 1e−4 leaves is near 1e−12
      if (size <= 1e-4 * Math.min(k - from, y - k)) return next < low ? low : next > high ? high : next;
      if (!(next > low && next < high) || size > 0.7 * lastMove) {
        next = 0.5 * (low + high);
        move = next - k;
        size = move < 0 ? -move : move;
      }
      lastMove = size;
      if (next === k || next <= low || next >= high) return k;
      k = next;
    }
    return k;
  }

  private start(low: number, high: number, atHigh: number, y: number, delta: number, met: number): number {
    // a straight line through φ at both ends, where known
    let k = atHigh > 0 ? low + ((high - low) * (y - low)) / (y - low + atHigh) : 0.5 * (low + high);
    if (this.linear && this.eta === this.sigma) {
      // each term of S alone gives a root left of the true one: S^(−1/σ) is below every term's
      const kappa = exp(log(delta * this.scale) / this.sigma);
      const bare = y / (1 + this.scale / kappa);
      if (bare > k || met === 0) k = bare;
      for (let m = 0; m < met; m++) {
        if (this.pi[m] === 0) continue;
        const kappaM = kappa * exp(log(this.pi[m]) / this.sigma);
        // R·k − a = κ_m (y − k)
        const alone = (this.a[m] + kappaM * y) / (this.scale + kappaM);
        if (alone > k) k = alone;
      }
    }
    return k > low && k < high ? k : 0.5 * (low + high);
  }
}
