/**
 * What households want: utility of consumption and of child wealth, and the milestone's extra utility or its loss.
 *
 * U = u(c) + δ·[v(z) + Σ_m π_m·b(z, a_m)], u = v = CRRA. Values only; the choice of z is choice.ts.
 */
import { exp, log } from '../../network/elementary.js';
import type { Preferences } from './types.js';

/** x^(1−σ)/(1−σ), ln x at σ = 1; −Infinity at x = 0 when σ ≥ 1. */
export function crra(x: number, curvature: number): number {
  if (curvature === 1) return log(x);
  const power = 1 - curvature;
  if (x === 0) return power > 0 ? 0 : -Infinity;
  return exp(power * log(x)) / power;
}

/** b(z, a) for a household that plans as if there were no shock. */
export function milestoneUtility(preferences: Preferences, planned: number, aspiration: number): number {
  if (preferences.milestoneShape === 'threshold') {
    if (!(planned > aspiration)) return 0;
    const power = 1 - preferences.milestoneCurvature;
    return exp(power * log(planned - aspiration)) / power;
  }
  const gain = crra(planned, preferences.curvature) - crra(aspiration, preferences.curvature);
  return gain >= 0 ? gain : preferences.lossAversion * gain;
}
