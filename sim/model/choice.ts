/**
 * The household's choice of planned child wealth, given wealth and aspirations: exact to rounding, no allocation.
 *
 *     max over z of  u(y − k) + δ·[v(z) + Σ_m π_m·b(z, a_m)],   z = f(k),  0 ≤ k ≤ y
 *
 * Four solvers share this interface: planned risk (planned.ts), its one-milestone linear table (growth-table.ts),
 * expected risk with the threshold shape (expected-threshold.ts) and with the gain-loss shape (expected-gain-loss.ts).
 * Does not know how aspirations came about (reference.ts) or what luck does to the plan (shock.ts).
 */
import { expectedGainLossChoice } from './expected-gain-loss.js';
import { expectedThresholdChoice } from './expected-threshold.js';
import { growthTableChoice } from './growth-table.js';
import { plannedChoice } from './planned.js';
import type { Preferences, Shock, Technology } from './types.js';

/** A local peak of the objective. */
export interface Peak {
  /** Planned child wealth. */
  readonly z: number;
  readonly investment: number;
  readonly utility: number;
  /** Milestones met there, 0 … M. */
  readonly met: number;
}

/** The solver for one group's preferences. `solve` writes its answer on these fields; not for concurrent use. */
export interface Choice {
  /** z of the last `solve`. */
  planned: number;
  /** Milestones met by the plan of the last `solve`, 0 … M. */
  met: number;
  /** k of the last `solve`. */
  investment: number;
  /**
   * @param wealth - y > 0
   * @param aspirations - a_m, any order, length M
   * @param childWeight - δ > 0 of this household
   */
  solve(wealth: number, aspirations: ArrayLike<number>, childWeight: number): void;
  /** U at planned child wealth z in [0, f(y)]; −Infinity beyond. */
  objective(wealth: number, z: number, aspirations: ArrayLike<number>, childWeight: number): number;
  /** All local peaks in ascending z; the choice is the best, the higher z in a tie. */
  candidates(wealth: number, aspirations: ArrayLike<number>, childWeight: number): Peak[];
  /**
   * q*, the ratio of aspiration to wealth up to which the milestone is met, for the linear technology with one
   * milestone, planned risk, threshold shape and η = σ; NaN for every other model.
   */
  qStar(childWeight: number): number;
  /** g_low, the growth factor when no milestone is met; NaN unless the technology is linear. */
  lowGrowth(childWeight: number): number;
}

/** Compiles the solver for one group. Cost: up to some 30 ms for expected risk, which tabulates a partial moment. */
export function compileChoice(
  technology: Technology,
  shock: Shock,
  preferences: Preferences,
  milestoneWeights: readonly number[],
): Choice {
  if (shock.risk === 'expected' && shock.sdLog > 0) {
    return preferences.milestoneShape === 'threshold'
      ? expectedThresholdChoice(technology, shock.sdLog, preferences, milestoneWeights)
      : expectedGainLossChoice(technology, shock.sdLog, preferences, milestoneWeights);
  }
  if (
    technology.kind === 'linear' &&
    preferences.milestoneShape === 'threshold' &&
    preferences.milestoneCurvature === preferences.curvature &&
    milestoneWeights.length === 1 &&
    milestoneWeights[0] > 0
  ) {
    return growthTableChoice(technology.grossReturn, technology, preferences, milestoneWeights[0]);
  }
  return plannedChoice(technology, preferences, milestoneWeights);
}
