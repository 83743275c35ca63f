/** What a mixing may be asked for, with the keys of a study file, and what it reports back. */
import type { Ties } from '../graph.js';

/** What mixing may aim at. */
export const MIX_TARGETS = ['assortativity', 'economic_connectedness', 'e_i_group'] as const;
export type MixTarget = (typeof MIX_TARGETS)[number];

/** Swap a share of the ties at random. */
export interface MixShare {
  /** 0 … 1, share of ties that take part in a swap. */
  share: number;
}

/** Swap until a measure stands at a value. */
export interface MixToward {
  target: MixTarget;
  value: number;
  /** Keep the nearest value found when the target is out of reach, instead of refusing. */
  best_effort?: boolean | undefined;
}

export type MixSpec = MixShare | MixToward;

export interface MixResult {
  /** Same degrees, simple, weights with their ties. */
  readonly ties: Ties;
  /** What was aimed at, or null when a share was swapped. */
  readonly target: MixTarget | null;
  /** The value aimed at (of the target, or the share). */
  readonly asked: number;
  /** The target's value before (null for a share). */
  readonly before: number | null;
  /** The target's value after, or the share of ties that took part in a swap. */
  readonly reached: number;
  /** Pairs of ties looked at, and those swapped. */
  readonly tried: number;
  readonly accepted: number;
  /** True when `reached` is not `asked` within the tolerance (only with `best_effort`, or a share that got stuck). */
  readonly outOfReach: boolean;
  /** False when not a single pair of ties can be swapped, as in a star, a path of three or a complete network. */
  readonly rewirable: boolean;
}
