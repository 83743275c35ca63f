/** Refusals of the builders: a network that cannot exist with these households. */
import { InputError } from '../errors.js';

/**
 * @param key - the key that asks too much (`mean_degree`); callers that know the file replace the place
 * @param problem - what is wrong, with the numbers
 * @param remedy - what to do
 */
export function infeasible(key: string, problem: string, remedy: string): InputError {
  return new InputError({ code: 'network-infeasible', place: `network.${key}`, problem, remedy });
}

/** A share must lie in [0, 1]. */
export function checkShare(key: string, share: number): void {
  if (!(share >= 0 && share <= 1)) {
    throw new InputError({
      code: 'network-share',
      place: `network.${key}`,
      problem: `${share} is not a share`,
      remedy: 'give a number from 0 to 1',
    });
  }
}

/** A mean degree must be finite, not negative, and no more than everybody else. */
export function checkMeanDegree(key: string, mean: number, n: number): void {
  if (!(mean >= 0 && Number.isFinite(mean))) {
    throw new InputError({
      code: 'network-degree',
      place: `network.${key}`,
      problem: `${mean} is not a number of ties`,
      remedy: 'give a number that is 0 or more',
    });
  }
  if (mean > Math.max(0, n - 1)) {
    throw infeasible(
      key,
      `${mean} ties for each of ${n} households, who have only ${Math.max(0, n - 1)} others`,
      'lower it or add households',
    );
  }
}
