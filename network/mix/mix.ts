/**
 * Mixing: the same households with the same numbers of ties, tied to other people.
 *
 * Degrees, the number of ties and their weights stay; only who is tied to whom changes, so an arm that is mixed from
 * a segregated one differs from it in nothing else. The network stays simple.
 */
import { InputError } from '../errors.js';
import type { Labels, Ties, Uniform } from '../graph.js';
import { toPairs } from '../graph.js';
import { objective } from './objective.js';
import { rewirable } from './rewirable.js';
import type { MixResult, MixShare, MixSpec, MixToward } from './spec.js';
import { swapShare } from './swap-share.js';
import { swapToward, TOLERANCE, toleranceOf } from './swap-toward.js';
import { TieSlots } from './tie-slots.js';

/**
 * Mixes ties by a share of random swaps, or by swaps toward a target.
 *
 * @param ties - left as it is; the result shares nothing with it
 * @param spec - `{share}`, or `{target, value, best_effort?}` with target `assortativity` (of wealth rank; Newman 2003,
 *   eq. 21), `economic_connectedness` (0 … 2) or `e_i_group` (−1 … 1); value above or below the present one
 * @param labels - wealth and groups of the households
 * @param uniform - seeded stream
 * @returns ties and what was asked, reached, tried and accepted. A network in which no two ties can be swapped comes
 *   back as it was, with `rewirable` false. Cost O(m) for a share; for a target about 10–100 tries a tie, more near
 *   the limits of what degrees allow.
 * @throws InputError `target-out-of-reach` when the target cannot be had within 0.005 and `best_effort` is not set;
 *   `mix-share`, `mix-value` for numbers outside their range; `target-undefined` when the measure is undefined here
 */
export function mix(ties: Ties, spec: MixSpec, labels: Labels, uniform: Uniform): MixResult {
  return 'share' in spec ? mixShare(ties, spec, uniform) : mixToward(ties, spec, labels, uniform);
}

function mixShare(ties: Ties, spec: MixShare, uniform: Uniform): MixResult {
  const { share } = spec;
  if (!(share >= 0 && share <= 1)) {
    throw new InputError({
      code: 'mix-share',
      place: 'mixing.share',
      problem: `${share} is not a share of ties`,
      remedy: 'give a number from 0 to 1',
    });
  }
  const { weight } = toPairs(ties);
  const slots = TieSlots.of(ties);
  const m = slots.source.length;
  const count = swapShare(slots, share, uniform);
  const reached = m > 0 ? count.moved / m : 0;
  return {
    ties: slots.toTies(weight),
    target: null,
    asked: share,
    before: null,
    reached,
    tried: count.tried,
    accepted: count.accepted,
    // a share is of whole ties, so the nearest may be half a tie off
    outOfReach: m > 0 && share - reached > Math.max(TOLERANCE, 1 / m),
    rewirable: count.accepted > 0 || rewirable(slots, uniform),
  };
}

function mixToward(ties: Ties, spec: MixToward, labels: Labels, uniform: Uniform): MixResult {
  const aim = objective(spec.target, ties, labels);
  const name = spec.target;
  if (aim === null) {
    throw new InputError({
      code: 'target-undefined',
      place: 'mixing.target',
      problem: `${name} is not defined on this network`,
      remedy: 'it needs ties between households that differ; mix by a share instead',
    });
  }
  const [least, most] = aim.range;
  if (!(spec.value >= least && spec.value <= most)) {
    throw new InputError({
      code: 'mix-value',
      place: 'mixing.value',
      problem: `${spec.value} is not a value of ${name}`,
      remedy: `give a number from ${least} to ${most}`,
    });
  }
  const { weight } = toPairs(ties);
  const slots = TieSlots.of(ties);
  const canSwap = rewirable(slots, uniform);
  const result = canSwap ? swapToward(slots, aim, spec.value, uniform) : still(slots, aim);
  const outOfReach = Math.abs(result.reached - spec.value) > toleranceOf(aim);
  if (outOfReach && spec.best_effort !== true) {
    throw new InputError({
      code: 'target-out-of-reach',
      place: 'mixing.value',
      problem: canSwap
        ? `${name} ${spec.value} is out of reach with these degrees: it started at ${four(result.before)} and swaps ended at ${four(result.reached)}`
        : `${name} ${spec.value} is out of reach: it is ${four(result.before)} and no two ties of this network can be swapped`,
      remedy: canSwap
        ? `ask for ${four(result.reached)}, or set best_effort: true`
        : 'set best_effort: true to keep it as it is',
    });
  }
  return {
    ties: slots.toTies(weight),
    target: spec.target,
    asked: spec.value,
    before: result.before,
    reached: result.reached,
    tried: result.tried,
    accepted: result.accepted,
    outOfReach,
    rewirable: canSwap,
  };
}

function still(
  slots: TieSlots,
  aim: { value(sum: number): number; term(i: number, j: number): number },
): { before: number; reached: number; tried: number; accepted: number } {
  let sum = 0;
  for (let e = 0; e < slots.source.length; e++) sum += aim.term(slots.source[e], slots.target[e]);
  const value = aim.value(sum);
  return { before: value, reached: value, tried: 0, accepted: 0 };
}

/** Four decimals for messages. */
function four(x: number): number {
  return Math.round(x * 1e4) / 1e4;
}
