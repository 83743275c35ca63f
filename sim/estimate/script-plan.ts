/** The plan as the scripts for other languages carry it: JSON, every default written out. */
import { type Estimate, errorsOf, groupingsOf } from './plan.js';
import { poolsArms } from './terms.js';

export function scriptPlan(estimates: readonly Estimate[]): string {
  return JSON.stringify(
    estimates.map((estimate) => ({
      ...estimate,
      effects: groupingsOf(estimate.effects),
      cluster: groupingsOf(estimate.cluster),
      errors: errorsOf(estimate),
      pool_arms: poolsArms(estimate),
    })),
    null,
    1,
  );
}
